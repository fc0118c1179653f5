"""``tcplan compare``: a measured composite against its plan."""

from __future__ import annotations

import sys
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tcplan.cli.common_errors import common_error_options, common_errors_of
from tcplan.cli.exits import DONE, NOT_MET
from tcplan.cli.paragraphs import labelled, wrapped
from tcplan.cli.talk import colourful, complain, say, say_json, width
from tcplan.errors import InputError, Problem

if TYPE_CHECKING:
    from tcplan.measure.comparison import Comparison
    from tcplan.measure.reading import ReadSweep
    from tcplan.spec.compare_text import CompareText, DeviceText

STDIN = "-"
LABEL = 10
MOST_PLAN_BYTES = 2_000_000
MOST_SWEEP_BYTES = 100_000_000
MOST_TOLD = 5

EXAMPLES = """\
\b
Examples:
  tcplan compare brief-plan/plan.json sweep.csv
  tcplan compare plan.json sweep.csv --chamber-offset "0.2 K" -o compared
  tcplan compare plan.json sweep.csv --as-made --json
  tcplan compare plan.json - < sweep.csv
"""


@click.command("compare", short_help="Compare measured devices with their plan.", epilog=EXAMPLES)
@click.argument("file", metavar="PLAN")
@click.argument("sweep")
@click.option("--option", metavar="ID", help="Which option was measured; the chosen one by default.")
@click.option("--as-made", is_flag=True, help="The parts of the plan were measured, not its ideal legs.")
@click.option("--drift-only", is_flag=True, help="R at the reference says nothing: it was adjusted.")
@common_error_options
@click.option("-o", "--output", metavar="DIR", help="Write compare.json and the figure here.")
@click.option("--force", is_flag=True, help="Replace files that exist.")
@click.option("--json", "as_json", is_flag=True, help="Print JSON, at full precision.")
def command(
    file: str,
    sweep: str,
    option: str | None,
    as_made: bool,
    drift_only: bool,
    output: str | None,
    force: bool,
    as_json: bool,
    **common: str | None,
) -> int:
    """Compare the readings of SWEEP with what PLAN predicts of the resistor.

    PLAN is a plan.json, a brief (.toml, which is planned first), or - for a plan.json on stdin. SWEEP is a
    CSV or XLSX file with columns such as T [degC], R [ohm], u(R) [ohm] and device, or - for one on stdin;
    only one of the two can be. Shown are R at the reference against its tolerance, the drift against the
    worst case of the plan, which deviations of the materials explain it best, and which leg values would
    centre it. Of several devices there is one line each, and those outside in detail, 5 at most.

    Chamber, lead and meter options are standard uncertainties of what is common to all readings.

    Exit code 0: no device is outside of its band, limit or tolerance. 1: one is, or one has too few readings
    to be compared.
    """
    from tcplan.spec.compare_data import comparison_data
    from tcplan.spec.compare_text import compare_text
    from tcplan.workflow.as_made import plan_as_made
    from tcplan.workflow.budgeting import plan_to_budget
    from tcplan.workflow.comparing import Asking, check_compare_out, compare_plan, write_comparison

    _one_stdin(file, sweep)
    errors = common_errors_of(common)
    if output is not None:
        check_compare_out(Path(output), force=force)
    content = sys.stdin.buffer.read(MOST_PLAN_BYTES + 1) if file == STDIN else None
    plan = plan_to_budget("standard input" if file == STDIN else file, content)
    read = _read(sweep)
    asking = Asking(option=option, as_made=as_made, drift_only=drift_only)
    comparison = compare_plan(plan, read.sweep, asking, errors)
    shown = plan_as_made(plan) if as_made else plan
    _tell(read, comparison)
    paths = (
        write_comparison(plan, comparison, asking, Path(output), force=force) if output is not None else ()
    )
    if as_json:
        say_json(comparison_data(shown, comparison))
    else:
        say("\n".join(_screen(compare_text(shown, comparison), width())))
    if paths:
        complain(f"wrote {', '.join(map(str, paths))}")
    return DONE if comparison.good else NOT_MET


def _one_stdin(file: str, sweep: str) -> None:
    if file == sweep == STDIN:
        problem = Problem(
            where="PLAN and SWEEP", found="- for both", expected="one of them on stdin, the other as a file"
        )
        raise InputError(problem)


def _read(sweep: str) -> ReadSweep:
    from tcplan.measure.reading import parse_sweep, read_sweep

    if sweep != STDIN:
        return read_sweep(Path(sweep))
    return parse_sweep(sys.stdin.buffer.read(MOST_SWEEP_BYTES + 1), "standard input")


def _tell(read: ReadSweep, comparison: Comparison) -> None:
    """Say which rows are no readings, what is not used, and which devices are not compared."""
    for row in read.sweep.refused[:MOST_TOLD]:
        complain(
            f"not a reading: {read.sweep.source}, line {row.line}: found {row.found}; "
            f"expected {row.expected}."
        )
    if read.refused > MOST_TOLD:
        complain(f"{read.refused - MOST_TOLD} more rows are no readings.")
    for note in read.notes:
        complain(note)
    for one in comparison.skipped[:MOST_TOLD]:
        complain(
            f"device {one.device or 'without a name'} not compared: found {one.found}; "
            f"expected {one.expected}. {one.todo}"
        )
    if len(comparison.skipped) > MOST_TOLD:
        complain(f"{len(comparison.skipped) - MOST_TOLD} more devices are not compared; --json lists them.")


def _screen(text: CompareText, across: int) -> Iterator[str]:
    from tcplan.spec.compare_table import TABLE_HEAD
    from tcplan.spec.compare_text import LEG_HEAD

    yield from wrapped(text.title, across)
    if text.table:
        yield ""
        yield from _columns([TABLE_HEAD, *text.table], left=1)
        yield ""
        yield from wrapped(text.count, across)
    for device in text.devices:
        yield ""
        yield from _device(device, across)
    if text.legs:
        yield ""
        yield "Leg values that would centre it:"
        yield from _columns([LEG_HEAD, *text.legs], left=2)
    yield ""
    for label, texts in text.facts:
        yield from labelled(label, texts, across, LABEL)


def _device(device: DeviceText, across: int) -> Iterator[str]:
    from tcplan.spec.compare_text import DEVIATION_HEAD, HEAD

    lines = wrapped(device.head, across)
    if colourful():
        lines = [click.style(line, fg="green" if device.good else "red") for line in lines]
    yield from lines
    yield from _columns([HEAD, *device.points], left=0)
    if device.deviations:
        yield ""
        yield from _columns([DEVIATION_HEAD, *device.deviations], left=1)
    yield ""
    for label, texts in device.facts:
        yield from labelled(label, texts, across, LABEL)


def _columns(rows: Sequence[Sequence[str]], left: int) -> list[str]:
    """Return rows in columns two apart: the first ``left`` flush left, the rest flush right."""
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]))]
    return [
        "  ".join(
            cell.ljust(wide) if k < left else cell.rjust(wide)
            for k, (cell, wide) in enumerate(zip(row, widths, strict=True))
        ).rstrip()
        for row in rows
    ]
