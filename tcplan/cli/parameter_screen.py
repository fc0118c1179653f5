"""What ``tcplan materials`` prints of parameter lines: the materials, how they were read, what was not."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from tcplan.cli.paragraphs import labelled, wrapped
from tcplan.cli.talk import complain, say, say_json, width

if TYPE_CHECKING:
    from collections.abc import Callable

    from tcplan.material.model import Material
    from tcplan.measure.parameter_record import ParameterLines

COLUMN = 12
MOST_UNREAD = 30


def show_lines(
    file: str | None,
    valid: tuple[str, str] | None,
    told: Callable[[Material], str],
    *,
    block: bool,
    as_json: bool,
) -> None:
    """Print a file of parameter lines; ``told`` is the text of one material."""
    from tcplan.measure.parameter_block import parameter_block

    if file is None:
        raise click.UsageError("--lines needs a FILE.")
    if block and as_json:
        raise click.UsageError("--block and --json are two forms; choose one.")
    found = _read(file, valid)
    if as_json:
        say_json(_data(found))
    elif block:
        say(parameter_block(found).rstrip("\n"))
        for line in _unread(found, MOST_UNREAD):
            complain(line)
    else:
        say("\n".join(["\n\n".join(told(material) for material in found.materials), "", *_account(found)]))


def _read(file: str, valid: tuple[str, str] | None) -> ParameterLines:
    from tcplan.units import parse_quantity
    from tcplan.workflow.conversions import parameter_lines_of

    if valid is None:
        return parameter_lines_of(file)
    low, high = (parse_quantity(text, "K", where="--valid") for text in valid)
    return parameter_lines_of(file, (low, high))


def _account(found: ParameterLines) -> list[str]:
    from tcplan.measure.parameter_block import nominal_words
    from tcplan.units import format_celsius

    low, high = (format_celsius(end) for end in found.valid)
    taken = [nominal_words(found), f"Valid {low} to {high} is not from the file.", "No spread is stated."]
    lines = labelled("Read", [*taken, *(f"{note}." for note in found.notes)], width(), COLUMN)
    if not found.unread:
        return lines
    return [*lines, "", "Not read", *_unread(found, MOST_UNREAD)]


def _unread(found: ParameterLines, most: int) -> list[str]:
    lines = [
        line
        for unread in found.unread[:most]
        for line in wrapped(f"line {unread.line}: {unread.text}: {unread.why}", width(), "  ", "      ")
    ]
    more = len(found.unread) - most
    return [*lines, f"  and {more} more; --json lists them all"] if more > 0 else lines


def _data(found: ParameterLines) -> dict[str, Any]:
    from tcplan.units import to_celsius

    return {
        "source": found.source,
        "nominal_degC": None if found.tnom is None else to_celsius(found.tnom),
        "nominal_assumed": found.tnom_assumed,
        "valid_degC": [to_celsius(end) for end in found.valid],
        "materials": {material.name: material.to_dict() for material in found.materials},
        "resistors": [
            {"name": r.name, "line": r.line, "ohms": r.ohms, "material": r.material} for r in found.resistors
        ],
        "notes": list(found.notes),
        "unread": [{"line": u.line, "text": u.text, "why": u.why} for u in found.unread],
    }
