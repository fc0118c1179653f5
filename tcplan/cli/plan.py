"""``tcplan plan``: the main job."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tcplan.cli.exits import CANNOT_BE_MET, DONE, NOT_MET
from tcplan.cli.talk import colourful, complain, say, say_json_text, width

if TYPE_CHECKING:
    from collections.abc import Sequence

    from tcplan.brief import Brief
    from tcplan.plan import Plan

STDIN = "-"

EXAMPLES = """\
\b
Examples:
  tcplan plan brief.toml
  tcplan plan brief.toml -o out --force
  tcplan plan brief.toml --json | python -m json.tool
  tcplan plan - -o out < brief.toml
"""


@click.command(
    "plan", short_help="Find the mix for a brief, prove it, write the spec sheet.", epilog=EXAMPLES
)
@click.argument("brief")
@click.option(
    "-o", "--output", metavar="DIR", help="Folder to write to; NAME-plan for NAME.toml when not given."
)
@click.option("--force", is_flag=True, help="Replace files that exist.")
@click.option("--json", "as_json", is_flag=True, help="Print plan.json; write files only with -o.")
@click.option("--gap", metavar="PERCENT", help='How near mixed networks are to be proved; "1 %".')
@click.option("--workers", type=click.IntRange(1, 64), default=1, help="Processes for the mixed search.")
@click.option("--scheduler", metavar="ADDRESS", help="A Dask scheduler for the mixed search.")
def command(
    brief: str,
    output: str | None,
    force: bool,
    as_json: bool,
    gap: str | None,
    workers: int,
    scheduler: str | None,
) -> int:
    """Find the mix of materials for BRIEF (a TOML file; - is stdin), check it and write the result.

    Writes plan.json, mix.csv, the spec sheet (html, md, json) and the figures network, drift,
    slope-curvature and, where spreads are stated, spread (SVG and PNG), all of them or none. The
    options and the verdict go to stdout, everything else to stderr.

    A brief with [ratio] is checked in its place: that writes ratio.json and the figure drift.

    Exit code 0: the limit is met, or none was given. 1: not met, or not judged. 3: proved that no
    network of these materials can meet it.
    """
    from tcplan.errors import Stopped
    from tcplan.output import check_folder
    from tcplan.plan import Plan
    from tcplan.workflow.delivery import PLAN_FILES, write_plan

    asked, folder = _read(brief), _folder(brief, output, as_json=as_json)
    if asked.ratio is not None:
        return _ratio(asked, folder, force=force, as_json=as_json)
    if folder is not None:
        check_folder(folder, PLAN_FILES, force=force)
    try:
        plan = _planned(asked, _gap(gap), workers, scheduler)
    except Stopped as stopped:
        if isinstance(stopped.best, Plan):
            _show(stopped.best, as_json=as_json)
        raise
    paths = write_plan(plan, folder, force=force) if folder is not None else ()
    _show(plan, as_json=as_json)
    _tell(paths, folder)
    return _code(plan)


def _ratio(asked: Brief, folder: Path | None, *, force: bool, as_json: bool) -> int:
    """Check the ratio of a brief, write it, show it."""
    from tcplan.cli.ratio_screen import ratio_screen
    from tcplan.output import check_folder
    from tcplan.workflow.ratio import RATIO_FILES, make_ratio, ratio_json, write_ratio

    if folder is not None:
        check_folder(folder, RATIO_FILES, force=force)
    check = make_ratio(asked)
    paths = write_ratio(check, folder, force=force) if folder is not None else ()
    if as_json:
        say_json_text(ratio_json(check))
    else:
        say(ratio_screen(check, width(), colour=colourful()))
    _tell(paths, folder)
    return DONE if check.verdict == "MET" or check.pair.need.scale is None else NOT_MET


def _tell(paths: Sequence[Path], folder: Path | None) -> None:
    if paths:
        complain(f"wrote {len(paths)} files to {folder}: {', '.join(path.name for path in paths)}")


def _planned(asked: Brief, gap: float, workers: int, scheduler: str | None) -> Plan:
    from tcplan.cli.progress import Progress
    from tcplan.effort import Effort
    from tcplan.workflow.executors import executor_for
    from tcplan.workflow.planning import make_plan

    progress = Progress()
    try:
        with executor_for(workers, scheduler) as executor:
            return make_plan(asked, gap=gap, effort=Effort(executor=executor, report=progress))
    finally:
        progress.close()


def _gap(text: str | None) -> float:
    """Return the relative gap at which mixed networks count as proved."""
    from tcplan.errors import InputError, Problem
    from tcplan.units import parse_quantity

    if text is None:
        return 0.01
    gap = parse_quantity(text, "1", where="--gap")
    if not 1e-5 <= gap <= 0.5:
        raise InputError(Problem(where="--gap", found=text, expected="0.001 % to 50 %"))
    return gap


def _read(brief: str) -> Brief:
    from tcplan.brief import read_brief
    from tcplan.toml_input import MAX_BYTES
    from tcplan.workflow.conversions import brief_from_bytes

    if brief == STDIN:
        return brief_from_bytes(sys.stdin.buffer.read(MAX_BYTES + 1), Path())
    return read_brief(Path(brief))


def _folder(brief: str, output: str | None, *, as_json: bool) -> Path | None:
    """Return where to write: the folder asked for, else one in the current folder named after the brief."""
    if output is not None:
        return Path(output)
    if as_json:
        return None
    return Path("plan" if brief == STDIN else f"{Path(brief).stem}-plan")


def _show(plan: Plan, *, as_json: bool) -> None:
    from tcplan.cli.screen import screen
    from tcplan.plan import plan_json
    from tcplan.spec.summary import summary_of

    if as_json:
        say_json_text(plan_json(plan))
    else:
        say(screen(summary_of(plan), width(), colour=colourful()))


def _code(plan: Plan) -> int:
    from tcplan.spec.statements import cannot_be_met

    if plan.limit.drift_ppm is None or plan.best.verdict == "MET":
        return DONE
    return CANNOT_BE_MET if cannot_be_met(plan) else NOT_MET
