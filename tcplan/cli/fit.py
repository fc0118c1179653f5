"""``tcplan fit``: from sweeps of a chamber and a meter to a materials file."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from tcplan.cli.common_errors import common_error_options, common_errors_of
from tcplan.cli.exits import DONE
from tcplan.cli.paragraphs import labelled, wrapped
from tcplan.cli.talk import complain, say, say_json_text, width

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from tcplan.errors import Problem
    from tcplan.measure.request import FitRequest
    from tcplan.workflow.fitting import Fitted

STDIN = "-"
MOST_BYTES = 100_000_000
LABEL = 10
MOST_DEVICES = 12
COMMAND_LINE = "command line"

EXAMPLES = """\
\b
Examples:
  tcplan fit campaign.toml -o fitted
  tcplan fit red_film.csv --source "chamber run 12" --squares 50 -o fitted
  tcplan fit probe.csv --model thermistor --source "lot 7" --lead "20 mohm"
  tcplan fit probe.csv --source "lot 7" --law "exp(B/T)" --start B=3400
"""


@click.command("fit", short_help="Turn measured sweeps into a materials file.", epilog=EXAMPLES)
@click.argument("file", metavar="SWEEP")
@click.option("--material", metavar="NAME", help="Name of the material; that of the file by default.")
@click.option("--source", metavar="TEXT", help="Where the readings come from; needed for one sweep.")
@click.option("--label", metavar="TEXT", help="One line about the material.")
@click.option(
    "--model",
    type=click.Choice(["polynomial", "platinum", "thermistor", "steinhart-hart"]),
    help="Kind of the law; polynomial by default.",
)
@click.option("--law", metavar="FORMULA", help="Instead: a formula in T, T0 [K] and named parameters.")
@click.option("--start", metavar="NAME=VALUE", multiple=True, help="First value of a parameter of --law.")
@click.option("--order", type=int, help="Of a polynomial, 1 to 3; 2 where readings are enough.")
@click.option("--reference", metavar="TEMPERATURE", help="Of the law; 25 degC by default.")
@click.option("--squares", type=float, help="Of each device, a film.")
@click.option("--length", metavar="LENGTH", help="Of each device, a wire.")
@click.option("--exclude", metavar="LINES", help="Lines of readings to leave out, such as 12,40.")
@common_error_options
@click.option("--sigma", is_flag=True, help="State the spread as sigma, not as limits.")
@click.option("--coverage", metavar="PART", help="Of devices that the limits hold; 99.73 % by default.")
@click.option("--confidence", metavar="PART", help="Of the limits and intervals; 95 % by default.")
@click.option("-o", "--output", metavar="DIR", help="Write materials.toml, fit.json and figures here.")
@click.option("--force", is_flag=True, help="Replace files that exist.")
@click.option("--json", "as_json", is_flag=True, help="Print fit.json.")
@click.option("--block", is_flag=True, help="Print materials.toml.")
def command(file: str, output: str | None, force: bool, as_json: bool, block: bool, **options: Any) -> int:
    """Fit SWEEP: a CSV or XLSX file of readings, - for stdin, or a campaign of several (.toml).

    Each device gets a law with its covariance; several devices and lots get a mean law and a spread.
    What comes out is a materials file that a brief can name.

    Readings are reported, never dropped: rows that are none, outliers and leverage are listed. Chamber, lead
    and meter options are standard uncertainties of what is common to all readings.
    """
    from tcplan.workflow.fitting import check_fit_out, fit_json, fit_request, materials_text, write_fit

    _one_of(as_json=as_json, block=block)
    request = _campaign(file, options) if _is_campaign(file) else _one_sweep(file, options)
    if output is not None:
        check_fit_out(request, Path(output), force=force)
    content = {request.sweeps[0].name: sys.stdin.buffer.read(MOST_BYTES + 1)} if file == STDIN else {}
    fits = fit_request(request, content)
    paths = write_fit(fits, Path(output), force=force) if output is not None else ()
    if as_json:
        say_json_text(fit_json(fits))
    elif block:
        say(materials_text(fits).rstrip("\n"))
    else:
        say("\n".join(_screen(fits, width())))
    if paths:
        complain(f"wrote {', '.join(map(str, paths))}")
    return DONE


# --- what is asked --------------------------------------------------------------------------------------


def _one_of(*, as_json: bool, block: bool) -> None:
    from tcplan.errors import InputError, Problem

    if as_json and block:
        raise InputError(Problem(where=COMMAND_LINE, found="--json and --block", expected="one of them"))


def _is_campaign(file: str) -> bool:
    return file.casefold().endswith(".toml")


def _campaign(file: str, options: dict[str, Any]) -> FitRequest:
    """Return the request of a campaign; options for one sweep are refused beside it."""
    from tcplan.errors import InputError, Problem
    from tcplan.measure.request_file import read_request

    context = click.get_current_context()
    given = [
        _flag(name)
        for name in options
        if context.get_parameter_source(name) == click.core.ParameterSource.COMMANDLINE
    ]
    if given:
        found = f"{', '.join(given)} with a campaign"
        raise InputError(Problem(where=COMMAND_LINE, found=found, expected="these in the file itself"))
    return read_request(Path(file))


def _one_sweep(file: str, options: dict[str, Any]) -> FitRequest:
    """Return the request of one sweep: that of a campaign with one table, its places told as options."""
    from tcplan.errors import InputError, Problem
    from tcplan.measure.request_file import request_of

    if not options["source"]:
        todo = 'Say it: --source "chamber run 12".'
        expected = "where the readings come from"
        raise InputError(Problem(where="--source", found="nothing", expected=expected, todo=todo))
    keys = ("source", "label", "model", "law", "order", "reference", "squares", "length")
    table = {key: options[key] for key in keys if options[key] is not None} | {"file": file}
    if options["start"]:
        table["start"] = dict(_start(text) for text in options["start"])
    if options["exclude"] is not None:
        table["exclude"] = _lines(options["exclude"])
    spread = {key: options[key] for key in ("coverage", "confidence") if options[key] is not None}
    spread["meaning"] = "sigma" if options["sigma"] else "limits"
    name = options["material"] or ("sweep" if file == STDIN else Path(file).stem)
    try:
        request = request_of({"schema": 1, "sweep": {name: table}, "spread": spread}, COMMAND_LINE, Path())
    except InputError as error:
        raise InputError(_as_option(problem) for problem in error.problems) from None
    return replace(request, errors=common_errors_of(options))


def _as_option(problem: Problem) -> Problem:
    """Return a problem of a key as one of its option; a name that is none is told at --material."""
    place = problem.where.removeprefix(f"{COMMAND_LINE}: ")
    key = place.rpartition(".")[2]
    if ".start." in place:
        key = "start"
    known = ("file", "source", "label", "law", "start", "order", "squares", "length", "coverage")
    if key in (*known, "model", "reference", "exclude", "confidence") or key.startswith("exclude["):
        return replace(problem, where=_flag(key.partition("[")[0]))
    return replace(problem, where="--material", todo="Say --material NAME; put the long form into --label.")


def _flag(name: str) -> str:
    return "SWEEP" if name == "file" else f"--{name.replace('_', '-')}"


def _start(text: str) -> tuple[str, float]:
    from tcplan.errors import InputError, Problem

    name, _, value = text.partition("=")
    try:
        return name.strip(), float(value)
    except ValueError:
        expected = "a name and a number, such as B=3400"
        raise InputError(Problem(where="--start", found=repr(text), expected=expected)) from None


def _lines(text: str) -> list[int]:
    from tcplan.errors import InputError, Problem

    words = [word.strip() for word in text.split(",")]
    if not all(word.isascii() and word.isdigit() and len(word) < 10 for word in words):
        expected = "numbers of lines, such as 12,40" + ("; ranges are not known" if "-" in text else "")
        raise InputError(Problem(where="--exclude", found=repr(text), expected=expected))
    return [int(word) for word in words]


# --- what is shown --------------------------------------------------------------------------------------


def _screen(fits: Fitted, across: int) -> Iterator[str]:
    from tcplan.spec.fit_text import device_rows, facts, head, tracking_text

    for n, one in enumerate(fits.materials):
        if n:
            yield ""
        yield from wrapped(head(one), across)
        yield ""
        for label, texts in facts(one, fits.refused[one.request.name]):
            yield from labelled(label, texts, across, LABEL)
        if len(one.fits) > 1:
            yield ""
            yield from _table(device_rows(one), across)
    for names, tracked in fits.tracking:
        yield ""
        yield from wrapped(tracking_text(names, tracked), across)


def _table(rows: Sequence[Sequence[str]], across: int) -> Iterator[str]:
    """Yield rows in columns, the names flush left; what does not fit across is left to fit.json."""
    shown = rows[: MOST_DEVICES + 1]
    widths = [max(len(row[k]) for row in shown) for k in range(len(rows[0]))]
    kept = len(widths)
    while kept > 3 and sum(widths[:kept]) + 2 * (kept - 1) > across:
        kept -= 1
    for row in shown:
        cells = (
            cell.ljust(wide) if k < 2 else cell.rjust(wide)
            for k, (cell, wide) in enumerate(zip(row[:kept], widths[:kept], strict=True))
        )
        yield "  ".join(cells).rstrip()[:across]
    if len(rows) > len(shown):
        yield f"and {len(rows) - len(shown)} more devices in fit.json"
