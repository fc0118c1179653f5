"""``tcplan parts``: what each leg is made of, and what the made network reaches."""

from __future__ import annotations

import sys
import textwrap
from pathlib import Path
from typing import TYPE_CHECKING

import click

from tcplan.cli.exits import DONE, NOT_MET
from tcplan.cli.paragraphs import COLOURS, labelled, wrapped
from tcplan.cli.talk import colourful, complain, say, say_json_text, width

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from tcplan.brief import Brief
    from tcplan.errors import InputError
    from tcplan.parts.record import MadePlan, MadeRatio
    from tcplan.workflow.made_task import PartsRules

STDIN = "-"
MOST_PLAN_BYTES = 2_000_000
LABEL = 9
LEAST = 12  # characters in which the last column of a table can stand

EXAMPLES = """\
\b
Examples:
  tcplan parts brief-plan/plan.json
  tcplan parts brief.toml -o made --list made/resistors.cir
  tcplan parts plan.json --error "0.05 %" --most-units 32 --mismatch "0.1 %"
"""


@click.command("parts", short_help="Turn an option of a plan into parts.", epilog=EXAMPLES)
@click.argument("file", metavar="PLAN")
@click.option("--option", "option", metavar="ID", help="An option of the plan; the chosen one by default.")
@click.option("--error", metavar="PERCENT", default="0.1 %", show_default=True, help="Largest, of a value.")
@click.option(
    "--most-units",
    type=click.IntRange(1, 256),
    default=64,
    show_default=True,
    help="In series, and strings in parallel.",
)
@click.option("--max-area", metavar="AREA", help='Of all legs of a film together, such as "0.01 mm^2".')
@click.option("--max-width", metavar="LENGTH", help="Of a unit; 100 times the least width by default.")
@click.option("--mismatch", metavar="PERCENT", help="Largest sigma of a film leg.")
@click.option("--pairs/--no-pairs", default=True, show_default=True, help="Two stock values for one leg.")
@click.option("--wire-step", metavar="LENGTH", default="1 mm", show_default=True, help="Of cut lengths.")
@click.option("--cut-error", metavar="LENGTH", default="0.5 mm", show_default=True, help="Of a cut.")
@click.option("-o", "--output", metavar="DIR", help="Write the plan with its parts, and all files, there.")
@click.option("--list", "listing", metavar="FILE", help="Write the network as a resistor list; - is stdout.")
@click.option("--force", is_flag=True, help="Replace files that exist.")
@click.option("--json", "as_json", is_flag=True, help="Print plan.json with its parts.")
def command(
    file: str,
    option: str | None,
    output: str | None,
    listing: str | None,
    force: bool,
    as_json: bool,
    **limits: str | int | bool | None,
) -> int:
    """Turn an option of PLAN into parts and check what they make.

    PLAN is a plan.json, a brief (.toml, which is planned first), or - for a plan.json on stdin. Films
    get one unit cell each, shared by all legs, with its ends as members of the network; bought parts get
    stock values, wire gets lengths. The made network is then checked like any plan. Of a brief with
    [ratio] both resistors are made.

    -o writes plan.json with its parts, parts.csv, and where there are films or a trim the figures
    placement and trade, trim-codes.csv and trim-bits.csv.

    Exit code 0: it meets the limit, or there is none. 1: it does not, or could not be judged. 2: a leg
    can not be made: the message says which rule stops it, and the nearest that can.
    """
    from tcplan.workflow.budgeting import plan_to_budget
    from tcplan.workflow.made_files import PARTS_FILES, check_out, write_list, write_parts
    from tcplan.workflow.making import make_parts

    rules = _rules(**limits)  # type: ignore[arg-type]
    if file.casefold().endswith(".toml") and (brief := _ratio_brief(file)) is not None:
        if option is not None or listing is not None:
            raise _clash("--option or --list with the brief of a ratio", "a plan of one resistor")
        return _ratio(brief, rules, output, force=force, as_json=as_json)
    if listing == STDIN and as_json:
        raise _clash("--list - with --json", "one of them: both go to standard output")
    to_file = listing if listing not in (None, STDIN) else None
    check_out(output, PARTS_FILES, to_file, force=force)
    content = sys.stdin.buffer.read(MOST_PLAN_BYTES + 1) if file == STDIN else None
    plan = plan_to_budget("standard input" if file == STDIN else file, content)
    made = make_parts(plan, rules, option)
    paths = write_parts(made, Path(output), force=force) if output is not None else ()
    if to_file is not None:
        paths = (*paths, write_list(made, Path(to_file), force=force))
    _show(made, listing, as_json=as_json)
    if paths:
        complain(f"wrote {', '.join(map(str, paths))}")
    met = made.plan.limit.drift_ppm is None or made.verdict == "MET"
    return DONE if met else NOT_MET


def _ratio_brief(file: str) -> Brief | None:
    """Return the brief of a ratio, None when it is one of a resistor."""
    from tcplan.brief import read_brief

    brief = read_brief(Path(file))
    return brief if brief.ratio is not None else None


def _clash(found: str, expected: str) -> InputError:
    from tcplan.errors import InputError, Problem

    return InputError(Problem(where="command line", found=found, expected=expected))


def _ratio(brief: Brief, rules: PartsRules, output: str | None, *, force: bool, as_json: bool) -> int:
    """Make the parts of a ratio, show them, and write them."""
    from tcplan.workflow.made_files import (
        RATIO_PARTS_FILES,
        check_out,
        ratio_parts_json,
        write_ratio_parts,
    )
    from tcplan.workflow.made_ratio import make_ratio_parts

    check_out(output, RATIO_PARTS_FILES, force=force)
    made = make_ratio_parts(brief, rules)
    paths = write_ratio_parts(made, Path(output), force=force) if output is not None else ()
    if as_json:
        say_json_text(ratio_parts_json(made))
    else:
        say("\n".join(_ratio_screen(made, width())))
    if paths:
        complain(f"wrote {', '.join(map(str, paths))}")
    good = made.checked.pair.need.scale is None or made.checked.verdict == "MET"
    return DONE if good else NOT_MET


def _ratio_screen(made: MadeRatio, across: int) -> Iterator[str]:
    from tcplan.spec.parts_text import HEAD, leg_row
    from tcplan.spec.placement_text import grid_text
    from tcplan.spec.ratio_parts_text import ratio_facts

    given = made.checked.pair.need.scale is not None
    verdict = made.checked.verdict if given else "no limit given"
    head = f"{made.ideal.brief.title}, as made: {verdict}"
    yield from _coloured(wrapped(head, across), verdict)
    for name, own in (("First", made.first), ("Second", made.second)):
        yield ""
        yield f"{name} resistor:"
        yield from _columns([HEAD, *map(leg_row, own)], across)
    for placement in made.placements:
        yield ""
        yield from grid_text(placement, across)
    yield ""
    for label, texts in ratio_facts(made):
        yield from labelled(label, texts, across, LABEL)


def _rules(
    *,
    error: str,
    most_units: int,
    max_area: str | None,
    max_width: str | None,
    mismatch: str | None,
    pairs: bool,
    wire_step: str,
    cut_error: str,
) -> PartsRules:
    from tcplan.parts.films import FilmRules
    from tcplan.workflow.making import PartsRules

    return PartsRules(
        films=FilmRules(
            most_count=most_units,
            error=_size(error, "1", "--error", below="100 %"),
            max_area=None if max_area is None else _size(max_area, "m^2", "--max-area"),
            max_width=None if max_width is None else _size(max_width, "m", "--max-width"),
            mismatch=None if mismatch is None else _size(mismatch, "1", "--mismatch"),
        ),
        pairs=pairs,
        wire_step=_size(wire_step, "m", "--wire-step"),
        cut_error=_size(cut_error, "m", "--cut-error", zero=True),
    )


def _size(text: str, unit: str, option: str, *, below: str = "", zero: bool = False) -> float:
    """Return the size that an option states; a wrong one is told by the name of the option."""
    from tcplan.errors import InputError, Problem
    from tcplan.units import parse_quantity

    size = parse_quantity(text, unit, where=option)
    if (size > 0.0 or (zero and size == 0.0)) and (not below or size < parse_quantity(below, unit)):
        return size
    expected = f"{'zero or more' if zero else 'above zero'}{f', below {below}' if below else ''}"
    raise InputError(Problem(where=option, found=f"{text!r}", expected=expected))


def _show(made: MadePlan, listing: str | None, *, as_json: bool) -> None:
    from tcplan.plan import plan_json
    from tcplan.workflow.made_files import list_text

    if listing == STDIN:
        say(list_text(made).rstrip("\n"))
    elif as_json:
        say_json_text(plan_json(made.plan))
    else:
        say("\n".join(_screen(made, width())))


def _screen(made: MadePlan, across: int) -> Iterator[str]:
    """Yield the lines of the screen: the verdict, the legs, the trade, and what is said of them."""
    from tcplan.spec.parts_sheet import facts

    plan = made.plan
    verdict = made.verdict if plan.limit.drift_ppm is not None else "no limit given"
    head = f"{plan.brief['title']}, {made.ideal.id} as made: {verdict}"
    yield from _coloured(wrapped(head, across), verdict)
    yield from _tables(made, across)
    yield ""
    for label, texts in facts(made):
        yield from labelled(label, texts, across, LABEL)


def _tables(made: MadePlan, across: int) -> Iterator[str]:
    """Yield the legs of every value, the ways to draw the films, and where the units stand."""
    from tcplan.spec.parts_text import HEAD, WAYS_HEAD, leg_row, way_row
    from tcplan.spec.placement_text import grid_text
    from tcplan.units import format_ohms

    several = len(made.parts.made) > 1
    for one in made.parts.made:
        yield ""
        if several:
            yield f"{format_ohms(one.target_ohms)}:"
        yield from _columns([HEAD, *map(leg_row, one.legs)], across)
    if made.ways:
        yield ""
        yield from wrapped(f"Ways to draw the films; * is taken, {_why(made)}:", across)
        rows = [way_row(way, taken=way == made.way) for way in made.ways]
        yield from _columns([WAYS_HEAD, *rows], across)
    for placement in (one for own in made.placements for one in own):
        yield ""
        yield from grid_text(placement, across)


def _why(made: MadePlan) -> str:
    """Return why a way to draw the films is taken: the least area within the limit, else the least figure."""
    limit = made.plan.limit.drift_ppm
    kept = limit is not None and made.way is not None and made.way.figure <= limit * 1e-6 * (1.0 + 1e-9)
    return "the smallest tried that keeps the limit" if kept else "of the least figure"


def _columns(rows: Sequence[Sequence[str]], across: int) -> list[str]:
    """Return rows in columns; the last one is wrapped where it does not fit, or put below the others."""
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]) - 1)]
    first = sum(widths) + 2 * len(widths)
    lines: list[str] = []
    for row in rows:
        start = "  ".join(f"{cell:<{w}}" for cell, w in zip(row[:-1], widths, strict=True)) + "  "
        if across - first < LEAST:
            lines += [*wrapped(start.rstrip(), across, "", "  "), *wrapped(row[-1], across, "    ", "    ")]
            continue
        rest = textwrap.wrap(row[-1], across - first) or [""]
        lines += [(start + rest[0]).rstrip(), *(" " * first + more for more in rest[1:])]
    return lines


def _coloured(lines: list[str], verdict: str) -> list[str]:
    if not colourful() or verdict not in COLOURS:
        return lines
    return [click.style(line, fg=COLOURS[verdict]) for line in lines]
