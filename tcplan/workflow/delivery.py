"""The files of a plan, all of them or none."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from tcplan.errors import OutputError, Problem
from tcplan.output import check_folder, write_files
from tcplan.plan import Plan, plan_json

PLAN_FILES = (
    "plan.json",
    "mix.csv",
    "spec.html",
    "spec.md",
    "spec.json",
    "network.svg",
    "network.png",
    "drift.svg",
    "drift.png",
    "spread.svg",
    "spread.png",
    "slope-curvature.svg",
    "slope-curvature.png",
)


def write_plan(plan: Plan, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write plan.json, mix.csv, the spec sheet and the figures of a plan, all of them or none.

    Parameters
    ----------
    plan : Plan
    folder : Path
        Made when it does not exist.
    force : bool
        Whether files that exist may be replaced.

    Returns
    -------
    tuple of Path
        The files, in the order of ``PLAN_FILES``; without the figure of the spread where a material of
        the chosen option does not state one.

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written.
    """
    from tcplan.figures.files import figure_files
    from tcplan.spec.mix_csv import mix_csv
    from tcplan.workflow.specs import make_spec, spec_files

    check_folder(folder, PLAN_FILES, force=force)
    figures = figure_files(plan)
    contents = {
        "plan.json": plan_json(plan).encode(),
        "mix.csv": mix_csv(plan).encode(),
        **spec_files(make_spec(plan), figures),
        **figures,
    }
    made = {name: contents[name] for name in PLAN_FILES if name in contents}
    paths = write_files(folder, made, force=force)
    remove_earlier(folder / name for name in PLAN_FILES if name not in made)
    return paths


def remove_earlier(paths: Iterable[Path]) -> None:
    """Remove what an earlier plan left here and this one does not have: it would pass for its own."""
    for path in paths:
        try:
            path.unlink(missing_ok=True)
        except OSError as fault:
            raise OutputError(
                Problem(
                    where=str(path),
                    found=f"a file of an earlier plan that cannot be removed ({fault.strerror})",
                    expected="a folder in which files can be removed",
                    todo="Remove it: it does not belong to this plan.",
                )
            ) from fault
