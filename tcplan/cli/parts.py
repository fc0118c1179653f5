"""``tcplan parts``: what each leg is made of, and what the made network reaches."""

from __future__ import annotations

import textwrap
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tcplan.cli.exits import DONE, NOT_MET
from tcplan.cli.paragraphs import COLOURS, labelled, wrapped
from tcplan.cli.talk import colourful, complain, say, say_json_text, width

if TYPE_CHECKING:
    from collections.abc import Sequence

    from tcplan.parts.record import MadePlan
    from tcplan.workflow.making import PartsRules

LABEL = 9
WAYS = ("area", "judged", "error", "units, W x L")

EXAMPLES = """\
\b
Examples:
  tcplan parts brief-plan/plan.json
  tcplan parts plan.json --error "0.05 %" --most-units 32 -o made
"""


@click.command("parts", short_help="Turn an option of a plan into parts.", epilog=EXAMPLES)
@click.argument("file", metavar="PLAN")
@click.option("--option", "option", metavar="ID", help="An option of the plan; the chosen one by default.")
@click.option("--error", metavar="PERCENT", default="0.1 %", show_default=True, help="Of a film leg.")
@click.option(
    "--most-units",
    type=click.IntRange(1, 256),
    default=64,
    show_default=True,
    help="In series, and strings in parallel.",
)
@click.option("--max-area", metavar="AREA", help='Of all legs of a film together, such as "0.01 mm^2".')
@click.option("--mismatch", metavar="PERCENT", help="Largest sigma of a film leg.")
@click.option("--pairs/--no-pairs", default=True, show_default=True, help="Two stock values for one leg.")
@click.option("-o", "--output", metavar="FOLDER", help="Write parts.json and parts.csv there.")
@click.option("--force", is_flag=True, help="Replace files that exist.")
@click.option("--json", "as_json", is_flag=True, help="Print JSON, at full precision.")
def command(
    file: str,
    option: str | None,
    error: str,
    most_units: int,
    max_area: str | None,
    mismatch: str | None,
    pairs: bool,
    output: str | None,
    force: bool,
    as_json: bool,
) -> int:
    """Turn an option of PLAN (a plan.json, or a brief in .toml that is planned first) into parts.

    Films get one unit cell each, shared by all legs, with its ends as members of the network; bought
    parts get stock values, wire gets lengths. The made network is then checked like any plan.

    Exit code 0: it meets the limit, or there is none. 1: it does not, or could not be judged. 2: a leg
    can not be made, which says the rule that stops it and the nearest that can.
    """
    from tcplan.parts.record import parts_json
    from tcplan.workflow.budgeting import plan_to_budget
    from tcplan.workflow.making import make_parts, write_parts

    rules = _rules(error, most_units, max_area, mismatch, pairs=pairs)
    made = make_parts(plan_to_budget(file), rules, option)
    paths = write_parts(made, Path(output), force=force) if output is not None else ()
    if as_json:
        say_json_text(parts_json(made))
    else:
        say(_screen(made, width()))
    if paths:
        complain(f"wrote {len(paths)} files to {output}: {', '.join(path.name for path in paths)}")
    met = made.plan.limit.drift_ppm is None or made.checked.verdict == "MET"
    return DONE if met else NOT_MET


def _rules(
    error: str, most_units: int, max_area: str | None, mismatch: str | None, *, pairs: bool
) -> PartsRules:
    from tcplan.parts.films import FilmRules
    from tcplan.units import parse_quantity
    from tcplan.workflow.making import PartsRules

    return PartsRules(
        films=FilmRules(
            most_count=most_units,
            error=parse_quantity(error, "1", where="--error"),
            max_area=None if max_area is None else parse_quantity(max_area, "m^2", where="--max-area"),
            mismatch=None if mismatch is None else parse_quantity(mismatch, "1", where="--mismatch"),
        ),
        pairs=pairs,
    )


def _screen(made: MadePlan, across: int) -> str:
    """Return the screen of the parts of an option."""
    from tcplan.spec.parts_text import HEAD, against_ideal, cutting, leg_row, units_text, way_row
    from tcplan.spec.spec import CAUTIONS

    plan, legs = made.plan, made.made.legs
    verdict = made.checked.verdict if plan.limit.drift_ppm is not None else "no limit given"
    head = f"{plan.brief['title']}, {made.ideal.id} as made: {verdict}"
    table = _columns([HEAD, *(leg_row(leg) for leg in legs)], across)
    ways = [WAYS, *(way_row(way.choices, way.figure) for way in made.ways)]
    trades = ["", "Ways to draw the films, the first that keeps the limit taken:", *_columns(ways, across)]
    facts: tuple[tuple[str, Sequence[str]], ...] = (
        ("Units", units_text(legs)),
        ("Cut", cutting(legs)),
        ("Reaches", against_ideal(made.ideal, made.checked)),
        ("Note", _notes(made)),
        ("Assumed", ("Figures are design estimates, to be confirmed on silicon or hardware.", *CAUTIONS[1:])),
    )
    lines = [line for label, texts in facts for line in labelled(label, texts, across, LABEL)]
    return "\n".join(
        [*_coloured(wrapped(head, across), verdict), "", *table, *(trades if made.ways else []), "", *lines]
    )


def _notes(made: MadePlan) -> list[str]:
    """Return what is measured from where, and what is not in the figures."""
    from tcplan.parts import FilmLeg, PlainLeg

    plain = dict.fromkeys(leg.material for leg in made.made.legs if isinstance(leg, PlainLeg))
    unmade = [name for name in plain if made.plan.by_name[name].kind == "film"]
    notes = [f"No unit cell without [material.{name}.film]: {name} stays as it is." for name in unmade]
    if not any(isinstance(leg, FilmLeg) for leg in made.made.legs):
        return notes
    return [
        *notes,
        "W is the drawn width, across the current; L is along it, between the inner edges of the ends. The "
        "area holds the spacing beside each unit, not its ends and no dummies.",
    ]


def _columns(rows: Sequence[Sequence[str]], across: int) -> list[str]:
    """Return rows in columns; the last one is wrapped where it does not fit."""
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]) - 1)]
    first = sum(widths) + 2 * len(widths)
    lines = []
    for row in rows:
        start = "  ".join(f"{cell:<{w}}" for cell, w in zip(row[:-1], widths, strict=True)) + "  "
        rest = textwrap.wrap(row[-1], max(12, across - first)) or [""]
        lines += [(start + rest[0]).rstrip(), *(" " * first + more for more in rest[1:])]
    return lines


def _coloured(lines: list[str], verdict: str) -> list[str]:
    if not colourful() or verdict not in COLOURS:
        return lines
    return [click.style(line, fg=COLOURS[verdict]) for line in lines]
