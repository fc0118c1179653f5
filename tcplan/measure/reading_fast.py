"""The fast way to read a sweep: a block of lines at once.

It gives up (None) on anything but plain numbers and good names, so that it reads what the exact way reads.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.measure.reading_cells import Block, is_good_name
from tcplan.measure.reading_header import Columns


def read_lines(lines: Sequence[str], first: int, columns: Columns, delimiter: str, mark: str) -> Block | None:
    """Return what lines hold when all are readings, else None."""
    width = lines[0].count(delimiter) + 1
    if width < columns.count or any(line.count(delimiter) + 1 != width for line in lines):
        return None
    if any(line.startswith("#") for line in lines):
        return None
    cells = _unquoted(delimiter.join(lines), delimiter)
    if cells is None or any(any(map(str.strip, cells[k::width])) for k in range(columns.count, width)):
        return None
    numbers = [_numbers(cells[c.position :: width], mark) for c in columns.numbers.values()]
    places = (columns.lot, columns.device)
    names = [
        [""] * len(lines) if place is None else [name.strip() for name in cells[place::width]]
        for place in places
    ]
    given = [name for name, place in zip(names, places, strict=True) if place is not None]
    if not all(all(map(is_good_name, set(column))) for column in given):
        return None
    found = [values for values in numbers if values is not None]
    if len(found) < len(numbers):
        return None
    named = places != (None, None)
    return Block(
        lines=range(first, first + len(lines)),
        numbers=np.array(found),
        names=list(zip(*names, strict=True)) if named else (),
    )


def _unquoted(text: str, delimiter: str) -> list[str] | None:
    """Return the cells of a text without their quotes; None when a quote is anywhere but around a cell."""
    cells = text.split(delimiter)
    quotes = text.count('"')
    if not quotes:
        return cells
    around = [len(cell) > 1 and cell[0] == '"' == cell[-1] for cell in cells]
    if quotes != 2 * sum(around):
        return None
    return [cell[1:-1] if inside else cell for cell, inside in zip(cells, around, strict=True)]


def _numbers(cells: Sequence[str], mark: str) -> FloatArray | None:
    """Return the numbers of a column; None when one of its cells may not be a plain finite number."""
    text = "\n".join(cells)
    if "_" in text or not text.isascii():  # float reads 1_000, and digits of other scripts
        return None
    if mark == ",":
        if "." in text:
            return None
        cells = text.replace(",", ".").split("\n")
    try:
        values = np.fromiter(map(float, cells), dtype=float, count=len(cells))
    except ValueError:
        return None
    return values if bool(np.isfinite(values).all()) else None
