"""``tcplan coefficients``: between the forms in which temperature coefficients are stated."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from tcplan.cli.coefficient_data import box_data, forms_data, table_data
from tcplan.cli.coefficient_input import Asked, asked, form_of
from tcplan.cli.talk import say, say_json

if TYPE_CHECKING:
    from tcplan.material.coefficient_box import BoxLimits
    from tcplan.material.coefficient_forms import Uncertain
    from tcplan.material.coefficient_points import PointFit
    from tcplan.workflow.conversions import Coefficients

Row = tuple[str, str]

DIGITS = 6
RATIO_DIGITS = 9
U_DIGITS = 2
MOST_DIGITS = 12

EXAMPLES = """\
\b
Examples:
  tcplan coefficients --tc1 "-120 +- 5 ppm/K" --tc2 "0.55 ppm/K^2" \\
    --reference "27 degC" --to "25 degC" --cold "-55 degC" --hot "125 degC"
  tcplan coefficients --reference "25 degC" --cold "-55 degC" \\
    --cold-tcr "-35 ppm/K" --hot "125 degC" --hot-tcr "30 ppm/K"
  tcplan coefficients --peak "45 degC" --tc2 "-0.04 ppm/K^2"
  tcplan coefficients --box-tcr "25 ppm/K" --cold "-55 degC" --hot "125 degC"
  tcplan coefficients --point "-40 degC: 992.1 ohm" \\
    --point "25 degC: 1000 ohm" --point "125 degC: 1019.6 ohm"
"""


@click.command("coefficients", short_help="TC1 and TC2 from and to other forms.", epilog=EXAMPLES)
@click.option("--tc1", metavar="TEXT", help='First coefficient, "-120 ppm/K".')
@click.option("--tc2", metavar="TEXT", help='Second coefficient, "0.55 ppm/K^2"; 0 when not given.')
@click.option(
    "--reference", default="25 degC", show_default=True, help="Where these, or the chords, are from."
)
@click.option("--to", help="Where TC1 and TC2 are wanted; the reference when not given.")
@click.option("--cold", help='Cold end of a chord or of the range, "-55 degC".')
@click.option("--hot", help='Hot end of a chord or of the range, "125 degC".')
@click.option("--cold-tcr", help='Chord TCR from the reference to the cold end, "-35 ppm/K".')
@click.option("--hot-tcr", help='Chord TCR from the reference to the hot end, "30 ppm/K".')
@click.option("--peak", help='Temperature of the peak of a parabola, "45 degC"; with --tc2 about it.')
@click.option("--box-tcr", help='Band over span from the cold to the hot end, "25 ppm/K".')
@click.option("--point", multiple=True, help='R at a temperature, "25 degC: 1 kohm"; three or more.')
@click.option("--table", metavar="FILE", help="A file with such a pair on each line.")
@click.option("--at", multiple=True, help="Where R(T)/R(reference) is wanted; more than once.")
@click.option("--correlation", type=float, help="Of the two coefficients given, -1 to 1; 0 by default.")
@click.option("--json", "as_json", is_flag=True, help="Print JSON, at full precision.")
def command(
    as_json: bool,
    point: tuple[str, ...],
    table: str | None,
    at: tuple[str, ...],
    correlation: float | None,
    **options: str | None,
) -> None:
    """Turn temperature coefficients from one form into the others.

    The forms: TC1 and TC2 about a reference; chord TCRs, [R(T)/R(reference) - 1]/(T - reference), what a
    data sheet calls TCR; the peak of a parabola; R at temperatures; a box TCR, which leaves a range open.

    A number may have a standard uncertainty, "-120 +- 5 ppm/K"; it is carried to every result.
    """
    texts = {name: text for name, text in options.items() if text is not None}
    given = asked(texts, point, table, at, correlation)
    if "box_tcr" in given.numbers:
        _show_box(given, as_json=as_json)
        return
    _show(given, as_json=as_json)


def _show(given: Asked, *, as_json: bool) -> None:
    from tcplan.workflow.conversions import coefficients_at

    ends = given.temperatures
    wanted = ends.get("to", ends["reference"])
    fit = _fit(given, wanted) if given.points else None
    form = form_of(given) if fit is None else fit.quadratic
    chords_to = [ends[end] for end in ("cold", "hot") if end in ends]
    found = coefficients_at(form, wanted, chords_to, given.at)
    if as_json:
        say_json(forms_data(found) | ({} if fit is None else {"table": table_data(fit, given)}))
    else:
        say(_columns([*_rows(found), *(_fit_rows(fit, given) if fit else ())]))


def _fit(given: Asked, reference: float) -> PointFit:
    from tcplan.errors import InputError, Problem
    from tcplan.material.coefficient_points import from_points

    stated = [r.uncertainty for _, r in given.points if r.uncertainty is not None]
    if stated and len(stated) < len(given.points):
        found, expected = (
            f"uncertainties at {len(stated)} of {len(given.points)} points",
            "at all, or at none",
        )
        raise InputError(Problem(where="table", found=found, expected=expected))
    values = [r.value for _, r in given.points]
    return from_points([t for t, _ in given.points], values, reference, stated or None)


# --- text ---------------------------------------------------------------------------------------------


def _columns(rows: list[Row]) -> str:
    label = max(len(name) for name, _ in rows)
    return "\n".join(f"{name:<{label}}  {text}" for name, text in rows)


def _rows(found: Coefficients) -> list[Row]:
    from tcplan.material.coefficient_forms import Uncertain
    from tcplan.units import format_celsius

    form, at = found.form, format_celsius(found.form.reference)
    rows = [
        (f"TC1 at {at}", _ppm(Uncertain(value=form.tc1, uncertainty=form.uncertainty(0)), "ppm/K")),
        (f"TC2 at {at}", _ppm(Uncertain(value=form.tc2, uncertainty=form.uncertainty(1)), "ppm/K^2")),
    ]
    if form.correlation is not None:
        rows.append(("correlation of TC1 and TC2", f"{form.correlation:.3f}"))
    rows.extend((f"chord TCR to {format_celsius(end)}", _ppm(tcr, "ppm/K")) for end, tcr in found.chords)
    if found.chord_correlation is not None:
        rows.append(("correlation of the chords", f"{found.chord_correlation:.3f}"))
    if found.box is not None:
        ends = " to ".join(format_celsius(end) for end, _ in found.chords)
        rows.append((f"box TCR, {ends}", _ppm(found.box, "ppm/K")))
    for t, value in found.ratios:
        rows.append((f"R({format_celsius(t)})/R({at})", _text(value, 0, "", RATIO_DIGITS)))
    return [*rows, *_peak_rows(found)]


def _peak_rows(found: Coefficients) -> list[Row]:
    from tcplan.material.coefficient_forms import Uncertain
    from tcplan.units import to_celsius

    top = found.peak
    if top is None:
        return []
    at = Uncertain(value=to_celsius(top.at), uncertainty=top.uncertainty(0))
    tc2 = Uncertain(value=top.tc2, uncertainty=top.uncertainty(1))
    return [("peak at", _text(at, 0, " degC")), ("TC2 about the peak", _ppm(tc2, "ppm/K^2"))]


def _fit_rows(fit: PointFit, given: Asked) -> list[Row]:
    from tcplan.units import format_celsius, format_ppm

    rows = [("R at the reference", _text(fit.ohms, 0, " ohm")), ("points", f"{len(given.points)}")]
    if fit.dof == 0:
        return [*rows, ("residual", "none: the quadratic goes through the three points")]
    worst = max(range(len(fit.residuals)), key=lambda k: abs(fit.residuals[k]))
    at = format_celsius(given.points[worst][0])
    return [*rows, ("largest residual", f"{format_ppm(fit.residuals[worst])} at {at}")]


def _ppm(number: Uncertain, unit: str) -> str:
    return _text(number, 6, f" {unit}")


def _text(number: Uncertain, shift: int, unit: str, digits: int = DIGITS) -> str:
    """Return a number in 10^-shift, to the second digit of its uncertainty where that is known."""
    from decimal import Decimal

    value = Decimal(repr(float(number.value))).scaleb(shift)
    if not number.uncertainty:
        return f"{_plain(_rounded(value, digits).normalize())}{unit}"
    size = Decimal(repr(float(number.uncertainty))).scaleb(shift)
    least = size.adjusted() - U_DIGITS + 1
    place = Decimal(1).scaleb(max(least, max(value.adjusted(), size.adjusted()) - MOST_DIGITS))
    return f"{_plain(value.quantize(place))} +- {_plain(size.quantize(place))}{unit}"


def _rounded(value: Any, digits: int) -> Any:
    return value.quantize(value.__class__(1).scaleb(value.adjusted() - digits + 1)) if value else value


def _plain(value: Any) -> str:
    value = value if value else abs(value)  # no minus zero
    return format(value, "f" if not value or -9 <= value.adjusted() <= MOST_DIGITS else "e")


# --- box TCR ------------------------------------------------------------------------------------------


def _show_box(given: Asked, *, as_json: bool) -> None:
    from tcplan.material.coefficient_box import box_limits

    ends = given.temperatures
    low, high = ends["cold"], ends["hot"]
    found = box_limits(given.numbers["box_tcr"], ends["reference"], low, high, (low, high, *given.at))
    if as_json:
        say_json(box_data(found))
    else:
        say(_columns(_box_rows(found)))


def _box_rows(found: BoxLimits) -> list[Row]:
    from tcplan.units import format_celsius

    ends = f"{format_celsius(found.low)} to {format_celsius(found.high)}"
    return [
        (f"box TCR, {ends}", _ppm(found.box, "ppm/K")),
        ("TC2, if TC1 is not known", _between(found.tc2, "ppm/K^2")),
        (f"TC1 at {format_celsius(found.reference)}", _between(found.tc1, "ppm/K")),
        *((f"chord TCR to {format_celsius(at)}", _between(tcr, "ppm/K")) for at, tcr in found.chords),
    ]


def _between(most: Uncertain, unit: str) -> str:
    """Return the range from minus to plus a figure, rounded outward; its uncertainty is that of each end."""
    from tcplan.units import round_outward

    if most.uncertainty:
        value, _, size = _ppm(most, unit).partition(" +- ")
        return f"-{value} to {value} {unit}, each end +- {size}"
    end = _text(type(most)(value=round_outward(most.value, DIGITS)), 6, "")
    return f"-{end} to {end} {unit}" if most.value else f"0 {unit}"
