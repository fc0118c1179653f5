"""``tcplan coefficients``: TC1 and TC2 about another reference, and chord TCRs both ways."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from tcplan.cli.talk import say, say_json

if TYPE_CHECKING:
    from tcplan.errors import Problem
    from tcplan.material.law import Polynomial
    from tcplan.workflow.conversions import Coefficients

DIGITS = 6
CHORDS = ("cold", "cold_tcr", "hot", "hot_tcr")
UNITS = {
    "tc1": "1/K",
    "tc2": "1/K^2",
    "reference": "K",
    "to": "K",
    "cold": "K",
    "hot": "K",
    "cold_tcr": "1/K",
    "hot_tcr": "1/K",
}

EXAMPLES = """\
\b
Examples:
  tcplan coefficients --tc1 "-120 ppm/K" --tc2 "0.55 ppm/K^2" \\
    --reference "27 degC" --to "25 degC" --cold "-55 degC" --hot "125 degC"
  tcplan coefficients --reference "25 degC" --cold "-55 degC" \\
    --cold-tcr "-35 ppm/K" --hot "125 degC" --hot-tcr "30 ppm/K"
"""


@click.command(
    "coefficients", short_help="Move TC1 and TC2 to another reference; chord TCRs both ways.", epilog=EXAMPLES
)
@click.option("--tc1", metavar="TEXT", help='First coefficient, "-120 ppm/K".')
@click.option("--tc2", metavar="TEXT", help='Second coefficient, "0.55 ppm/K^2"; 0 when not given.')
@click.option(
    "--reference", default="25 degC", show_default=True, help="Where these, or the chords, are from."
)
@click.option("--to", help="Where TC1 and TC2 are wanted; the reference when not given.")
@click.option("--cold", help='Cold end of a chord, "-55 degC".')
@click.option("--hot", help='Hot end of a chord, "125 degC".')
@click.option("--cold-tcr", help='Chord TCR from the reference to the cold end, "-35 ppm/K".')
@click.option("--hot-tcr", help='Chord TCR from the reference to the hot end, "30 ppm/K".')
@click.option("--json", "as_json", is_flag=True, help="Print JSON, at full precision.")
def command(as_json: bool, **options: str | None) -> None:
    """Move TC1 and TC2 to another reference temperature, exactly; turn them into chord TCRs or back.

    A chord TCR is what a data sheet calls TCR: [R(T)/R(reference) - 1] / (T - reference).
    """
    from tcplan.workflow.conversions import coefficients_at

    values = _values({name: text for name, text in options.items() if text is not None})
    law = _law(values)
    chords_to = [values[end] for end in ("cold", "hot") if end in values]
    found = coefficients_at(law, values.get("to", values["reference"]), chords_to)
    if as_json:
        say_json(_data(found))
    else:
        say("\n".join(_lines(found)))


def _values(texts: dict[str, str]) -> dict[str, float]:
    """Return the options in SI; every mistake is told."""
    from tcplan.errors import InputError
    from tcplan.units import parse_quantity

    values: dict[str, float] = {}
    problems: list[Problem] = []
    for name, text in texts.items():
        try:
            values[name] = parse_quantity(text, UNITS[name], where=_option(name))
        except InputError as error:
            problems.extend(error.problems)
    problems.extend(_mixed_up(texts))
    if problems:
        raise InputError(problems)
    return values


def _mixed_up(texts: dict[str, str]) -> list[Problem]:
    """Return what is wrong with the options as a set: TC1 or two chords, not both, not neither."""
    from tcplan.errors import Problem

    given = [_option(name) for name in ("tc1", "tc2", "cold_tcr", "hot_tcr") if name in texts]
    by_chords = "cold_tcr" in texts or "hot_tcr" in texts
    expected = "--tc1 (with --tc2), or --cold, --cold-tcr, --hot and --hot-tcr"
    if by_chords and ("tc1" in texts or "tc2" in texts):
        return [Problem(where="command line", found=f"{' and '.join(given)} together", expected=expected)]
    missing = [_option(name) for name in CHORDS if name not in texts] if by_chords else []
    if missing:
        return [Problem(where="command line", found=f"no {', '.join(missing)}", expected=expected)]
    if not by_chords and "tc1" not in texts:
        return [Problem(where="command line", found="no --tc1", expected=expected)]
    return []


def _option(name: str) -> str:
    return f"--{name.replace('_', '-')}"


def _law(values: dict[str, float]) -> Polynomial:
    from tcplan.material.law import Polynomial, from_chords

    if "cold_tcr" in values:
        chords = (values[name] for name in CHORDS)
        return from_chords(values["reference"], *chords)
    return Polynomial(reference=values["reference"], coefficients=(values["tc1"], values.get("tc2", 0.0)))


def _lines(found: Coefficients) -> list[str]:
    from tcplan.units import format_celsius, format_ppm_per_K, format_ppm_per_K2

    at = format_celsius(found.reference)
    rows = [
        (f"TC1 at {at}", format_ppm_per_K(found.tc1, DIGITS)),
        (f"TC2 at {at}", format_ppm_per_K2(found.tc2, DIGITS)),
        *(
            (f"chord TCR to {format_celsius(end)}", format_ppm_per_K(tcr, DIGITS))
            for end, tcr in found.chords
        ),
    ]
    label = max(len(name) for name, _ in rows)
    return [f"{name:<{label}}  {text}" for name, text in rows]


def _data(found: Coefficients) -> dict[str, object]:
    from tcplan.units import to_celsius

    return {
        "reference_degC": to_celsius(found.reference),
        "tc1_ppm_per_K": found.tc1 * 1e6,
        "tc2_ppm_per_K2": found.tc2 * 1e6,
        "chords": [{"to_degC": to_celsius(at), "tcr_ppm_per_K": tcr * 1e6} for at, tcr in found.chords],
    }
