"""The [[allowance]] tables of a brief: what moves the value and is not computed."""

from __future__ import annotations

import re

from tcplan.brief.model import Allowance, Nature, Sides
from tcplan.brief.shape import MOST_ALLOWANCES
from tcplan.material.model import LONGEST_LABEL, LONGEST_SOURCE
from tcplan.names import shown
from tcplan.ranges import TemperatureRange
from tcplan.table_reader import TableReader


def read_allowances(reader: TableReader, over: TemperatureRange | None) -> tuple[Allowance, ...]:
    """Return what the brief adds to the budget, each name once."""
    found: dict[str, Allowance] = {}
    for table in reader.rows("allowance")[:MOST_ALLOWANCES]:
        allowance = _allowance(table, over)
        if allowance is not None and allowance.name in found:
            table.refuse("name", f"{shown(allowance.name)} a second time", "each name once", "Rename one.")
        elif allowance is not None:
            found[allowance.name] = allowance
    return tuple(found.values())


def _allowance(table: TableReader, over: TemperatureRange | None) -> Allowance | None:
    """Return one allowance; a missing key or a wrong word is told by the shape."""
    name = _line(table, "name", LONGEST_LABEL)
    source = _line(table, "source", LONGEST_SOURCE)
    size, per_kelvin = _allowed_size(table, over)
    sides: dict[str | None, Sides] = {None: "both", "both": "both", "up": "up", "down": "down"}
    kinds: dict[str | None, Nature] = {"systematic": "systematic", "random": "random"}
    side, kind = sides.get(table.text("sides")), kinds.get(table.text("kind"))
    if name is None or source is None or size is None or side is None or kind is None:
        return None
    return Allowance(name=name, size=size, per_kelvin=per_kelvin, sides=side, kind=kind, source=source)


def _allowed_size(table: TableReader, over: TemperatureRange | None) -> tuple[float | None, bool]:
    """Return the size of an allowance, and whether it is per kelvin from the reference."""
    text = table.text("size") or ""
    per_kelvin = re.search("[Kd\u00b0\u2103\u212a]", text) is not None
    size = table.above_zero("size", "1/K" if per_kelvin else "1")
    arm = max(over.high - over.reference, over.reference - over.low) if over and per_kelvin else 1.0
    if size is not None and size * arm >= 1.0:
        table.refuse("size", text, "less than 100 % of the value over the whole range")
        return None, per_kelvin
    return size, per_kelvin


def _line(table: TableReader, key: str, longest: int) -> str | None:
    """Return one line of text; what is not printable could forge lines in a report."""
    text = table.text(key)
    if text is not None and (not text.isprintable() or not text.strip() or len(text) > longest):
        expected = f"one line of printable text, 1 to {longest} characters"
        table.refuse(key, shown(text), expected)
        return None
    return text
