"""The files of a plan, all of them or none."""

from __future__ import annotations

from pathlib import Path

from tcplan.output import check_folder, write_files
from tcplan.plan import Plan, plan_json

PLAN_FILES = (
    "plan.json",
    "mix.csv",
    "spec.md",
    "network.svg",
    "network.png",
    "drift.svg",
    "drift.png",
    "slope-curvature.svg",
    "slope-curvature.png",
)


def write_plan(plan: Plan, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write plan.json, mix.csv, spec.md and the figures of a plan, all of them or none.

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
        The files, in the order of ``PLAN_FILES``.

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written.
    """
    from tcplan.figures.files import figure_files
    from tcplan.spec.markdown import spec_markdown
    from tcplan.spec.mix_csv import mix_csv

    check_folder(folder, PLAN_FILES, force=force)
    texts = {"plan.json": plan_json(plan), "mix.csv": mix_csv(plan), "spec.md": spec_markdown(plan)}
    contents = {**{name: text.encode() for name, text in texts.items()}, **figure_files(plan)}
    return write_files(folder, {name: contents[name] for name in PLAN_FILES}, force=force)
