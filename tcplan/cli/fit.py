"""``tcplan fit``: from sweeps of a chamber and a meter to a materials file."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from tcplan.cli.exits import DONE
from tcplan.cli.paragraphs import labelled, wrapped
from tcplan.cli.talk import complain, say, say_json_text, width

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from tcplan.measure.fit import ModelName
    from tcplan.measure.fit_laws import Formula
    from tcplan.measure.model import CommonErrors
    from tcplan.measure.request import FitRequest, SpreadRules
    from tcplan.workflow.fitting import Fitted

STDIN = "-"
MOST_BYTES = 100_000_000
LABEL = 9
MOST_DEVICES = 30

EXAMPLES = """\
\b
Examples:
  tcplan fit campaign.toml -o fitted
  tcplan fit red_film.csv --source "chamber run 12" --squares 50 -o fitted
  tcplan fit probe.csv --model thermistor --source "lot 7" --lead "20 mohm"
  tcplan fit probe.csv --law "exp(B*(1/T - 1/T0))" --start B=3400 --source "lot 7"
"""


@click.command("fit", short_help="Turn measured sweeps into a materials file.", epilog=EXAMPLES)
@click.argument("file", metavar="SWEEP")
@click.option("--material", metavar="NAME", help="Name of the material; that of the file by default.")
@click.option("--source", metavar="TEXT", help="Where the readings come from; needed for one sweep.")
@click.option("--label", metavar="TEXT", help="One line about the material.")
@click.option(
    "--model",
    type=click.Choice(["polynomial", "platinum", "thermistor", "steinhart-hart"]),
    default="polynomial",
    show_default=True,
)
@click.option("--law", metavar="FORMULA", help="A formula in T and T0 [K] and named parameters instead.")
@click.option("--start", metavar="NAME=VALUE", multiple=True, help="First value of a parameter of --law.")
@click.option("--order", type=click.IntRange(1, 3), help="Of a polynomial; 2 where the data show it.")
@click.option("--reference", default="25 degC", show_default=True, help="Of the law.")
@click.option("--squares", type=float, help="Of each device, a film.")
@click.option("--length", metavar="LENGTH", help="Of each device, a wire.")
@click.option("--exclude", metavar="LINES", help="Lines of readings to leave out, such as 12,40.")
@click.option("--chamber-offset", metavar="TEXT", help='Standard uncertainty of all T together, "0.15 K".')
@click.option("--chamber-scale", metavar="TEXT", help='Of differences of T, "0.1 %".')
@click.option("--lead", metavar="TEXT", help='Of a resistance in series, "20 mohm".')
@click.option("--lead-tc1", metavar="TEXT", help='TC1 of that resistance, "3900 ppm/K".')
@click.option("--meter-scale", metavar="TEXT", help='Of the gain of the meter, "50 ppm".')
@click.option("--sigma", is_flag=True, help="State the spread as sigma, not as limits.")
@click.option("--coverage", default="99.73 %", show_default=True, help="Of devices that the limits hold.")
@click.option("--confidence", default="95 %", show_default=True, help="Of the limits and intervals.")
@click.option("-o", "--output", metavar="DIR", help="Write materials.toml, fit.json and figures there.")
@click.option("--force", is_flag=True, help="Replace files that exist.")
@click.option("--json", "as_json", is_flag=True, help="Print fit.json.")
@click.option("--block", is_flag=True, help="Print materials.toml.")
def command(file: str, output: str | None, force: bool, as_json: bool, block: bool, **options: Any) -> int:
    """Fit SWEEP: a CSV or XLSX file of readings, - for CSV on stdin, or a campaign of several (.toml).

    Each device gets a law with its covariance; several devices and lots get a mean law and a spread.
    What comes out is a materials file that a brief can name.

    Readings are reported, never dropped: rows that are none, outliers and leverage are listed.
    """
    from tcplan.workflow.fitting import fit_json, fit_request, materials_text, write_fit

    request, content = _request(file, options)
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


def _request(file: str, options: dict[str, Any]) -> tuple[FitRequest, dict[str, bytes]]:
    """Return what is to be fitted, and what came in on standard input."""
    from tcplan.measure.request import FitRequest
    from tcplan.measure.request_file import read_request

    if file.casefold().endswith(".toml"):
        _only_for_one(options)
        return read_request(Path(file)), {}
    one = _sweep(file, options)
    content = {one.name: sys.stdin.buffer.read(MOST_BYTES + 1)} if file == STDIN else {}
    return FitRequest(sweeps=(one,), errors=_errors(options), spread=_spread(options)), content


def _only_for_one(options: dict[str, Any]) -> None:
    """Refuse what a campaign states in its file."""
    from tcplan.errors import InputError, Problem

    context = click.get_current_context()
    given = [
        f"--{name.replace('_', '-')}"
        for name in options
        if context.get_parameter_source(name) == click.core.ParameterSource.COMMANDLINE
    ]
    if given:
        found = f"{', '.join(given)} with a campaign"
        raise InputError(Problem(where="command line", found=found, expected="these in the file itself"))


def _sweep(file: str, options: dict[str, Any]) -> Any:
    from tcplan.errors import InputError, Problem
    from tcplan.material.model import text_problems
    from tcplan.measure.block import Size
    from tcplan.measure.request import SweepRequest
    from tcplan.units import parse_quantity

    name = options["material"] or ("sweep" if file == STDIN else Path(file).stem)
    if not options["source"]:
        todo = 'Say it: --source "chamber run 12".'
        raise InputError(
            Problem(where="--source", found="nothing", expected="where the readings come from", todo=todo)
        )
    problems = tuple(text_problems(name, options["label"] or name, options["source"]))
    if problems:
        raise InputError(problems)
    size = None
    if options["squares"] is not None:
        size = Size(key="ohm_per_square", count=options["squares"])
    elif options["length"] is not None:
        size = Size(key="ohm_per_metre", count=parse_quantity(options["length"], "m", where="--length"))
    return SweepRequest(
        name=name,
        file=Path(file),
        source=options["source"],
        label=options["label"],
        model=_model(options),
        order=options["order"],
        reference=parse_quantity(options["reference"], "K", where="--reference"),
        size=size,
        exclude=_lines(options["exclude"]),
    )


def _model(options: dict[str, Any]) -> ModelName | Formula:
    from tcplan.errors import InputError, Problem
    from tcplan.measure.fit_laws import Formula

    if options["law"] is None:
        model: ModelName = options["model"]
        return model
    start = []
    for text in options["start"]:
        name, _, value = text.partition("=")
        try:
            start.append((name.strip(), float(value)))
        except ValueError:
            raise InputError(
                Problem(where="--start", found=text, expected="a name and a number, such as B=3400")
            ) from None
    return Formula(text=options["law"], start=tuple(start))


def _lines(text: str | None) -> tuple[int, ...]:
    from tcplan.errors import InputError, Problem

    words = [] if text is None else [word.strip() for word in text.split(",")]
    if not all(word.isascii() and word.isdigit() and len(word) < 10 for word in words):
        raise InputError(
            Problem(where="--exclude", found=text or "", expected="numbers of lines, such as 12,40")
        )
    return tuple(int(word) for word in words)


def _errors(options: dict[str, Any]) -> CommonErrors:
    from tcplan.errors import InputError, Problem
    from tcplan.measure.model import CommonErrors
    from tcplan.measure.request_file import ERROR_UNITS
    from tcplan.units import parse_quantity

    found = {}
    for key, unit in ERROR_UNITS.items():
        if options[key] is None:
            continue
        flag = f"--{key.replace('_', '-')}"
        found[key] = parse_quantity(options[key], unit, where=flag)
        if found[key] < 0.0 and key != "lead_tc1":
            expected = "a standard uncertainty, zero or more"
            raise InputError(Problem(where=flag, found=options[key], expected=expected))
    return CommonErrors(**found)


def _spread(options: dict[str, Any]) -> SpreadRules:
    from tcplan.measure.request import SpreadRules
    from tcplan.units import parse_quantity

    coverage, confidence = (
        parse_quantity(options[key], "1", where=f"--{key}") for key in ("coverage", "confidence")
    )
    return SpreadRules(
        meaning="sigma" if options["sigma"] else "limits", coverage=coverage, confidence=confidence
    )


# --- what is shown --------------------------------------------------------------------------------------


def _screen(fits: Fitted, across: int) -> Iterator[str]:
    from tcplan.spec.fit_text import device_rows, facts, head

    for n, one in enumerate(fits.materials):
        if n:
            yield ""
        yield from wrapped(head(one), across)
        if len(one.fits) > 1:
            yield ""
            yield from _table(device_rows(one), across)
        yield ""
        for label, texts in facts(one, fits.refused[one.request.name]):
            yield from labelled(label, texts, across, LABEL)
    for names, tracked in fits.tracking:
        yield ""
        half = f"{tracked.half_width * 1e6:.3g} ppm/K"
        told = f"TC1 of {names[0]} and {names[1]} track within {half} of their difference."
        yield from wrapped(told, across)


def _table(rows: Sequence[Sequence[str]], across: int) -> Iterator[str]:
    """Yield rows in columns; what does not fit across is left to fit.json."""
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]))]
    kept = len(widths)
    while kept > 3 and sum(widths[:kept]) + 2 * (kept - 1) > across:
        kept -= 1
    for row in rows[: MOST_DEVICES + 1]:
        cells = (cell.ljust(wide) for cell, wide in zip(row[:kept], widths[:kept], strict=True))
        yield "  ".join(cells).rstrip()[:across]
    if len(rows) > MOST_DEVICES + 1:
        yield f"and {len(rows) - MOST_DEVICES - 1} more devices in fit.json"
