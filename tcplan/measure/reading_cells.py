"""Lines of a sweep split into cells (RFC 4180), and cells read as plain numbers and names.

This is the exact way, which takes row by row and says what is wrong with one.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.measure.reading_header import Column, Columns
from tcplan.names import shown

_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_MARKED = re.compile(r"[+-]?(?=[.,]?[0-9])[0-9]*([.,])[0-9]*(?:[eE][+-]?[0-9]+)?")
_WITH_UNIT = re.compile(r"[+-]?[0-9.,]+(?:[eE][+-]?[0-9]+)?\s*[^\s0-9.,eE+-].*", re.DOTALL)
_SEPARATED = re.compile(r"[+-]?[0-9 ,.?'_\u2019\u00a0\u202f]+(?:[eE][+-]?[0-9]+)?")
_QUOTED = {d: re.compile(rf' *"((?:[^"]+|"")*+)" *(?={d}|\Z)') for d in ("\t", ";", ",")}
_MINUS = str.maketrans({"\u2212": "-"})  # spreadsheets of some languages write the minus sign
_LONGEST_NAME = 100
_MOST_JOINED = 10


class NotAReading(ValueError):
    """A row that is no reading: what was found, and what was expected."""

    def __init__(self, found: str, expected: str) -> None:
        self.found = found
        self.expected = expected
        super().__init__(found)


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """Rows of plain numbers, not yet in SI, with the rows among them that are none.

    ``numbers`` has one row for each column of numbers, in the order of the header record; ``names`` has
    (lot, device) for each reading, and is empty where the file has neither column.
    """

    lines: Sequence[int]
    numbers: FloatArray
    names: Sequence[tuple[str, str]] = ()
    faults: Sequence[tuple[int, NotAReading]] = ()
    comments: Sequence[int] = ()


@dataclass(slots=True)
class _Rows:
    """What the exact way has read so far."""

    lines: list[int] = field(default_factory=list)
    numbers: list[list[float]] = field(default_factory=list)
    names: list[tuple[str, str]] = field(default_factory=list)
    faults: list[tuple[int, NotAReading]] = field(default_factory=list)
    comments: list[int] = field(default_factory=list)


# ---- lines to cells


def cells_of(line: str, delimiter: str) -> list[str] | None:
    """Return the cells of one record; None when a quote in it is not closed, or not at the end of a cell."""
    if '"' not in line:
        return line.split(delimiter)
    cells, at = [], 0
    while True:
        quoted = _QUOTED[delimiter].match(line, at)
        end = quoted.end() if quoted else line.find(delimiter, at)
        end = len(line) if end < 0 else end
        cell = quoted[1].replace('""', '"') if quoted else line[at:end]
        if not quoted and cell.lstrip(" ").startswith('"'):
            return None
        cells.append(cell)
        if end == len(line):
            return cells
        at = end + 1


def record_at(lines: Sequence[str], at: int, delimiter: str) -> tuple[list[str] | None, int]:
    """Return the cells of the record that starts at a line, and where the next starts.

    A quoted cell may run over a few lines; a quote that is never closed costs its own line only.
    """
    text = lines[at]
    for end in range(at + 1, min(at + 1 + _MOST_JOINED, len(lines) + 1)):
        cells = cells_of(text, delimiter)
        if cells is not None:
            return cells, end
        text = "\n".join(lines[at : end + 1])
    return None, at + 1


def split_rows(
    lines: Sequence[str], start: int, stop: int, delimiter: str
) -> Iterator[tuple[int, int, list[str] | None]]:
    """Yield (position, position of the next, cells) of the records that start before ``stop``."""
    at = start
    while at < stop:
        # A line from # on is one cell: its delimiters and quotes mean nothing.
        comment = lines[at].startswith("#")
        cells, after = ([lines[at]], at + 1) if comment else record_at(lines, at, delimiter)
        yield at, after, cells
        at = after


# ---- cells to numbers and names


def decimal_mark(rows: Iterable[Sequence[str]], columns: Columns) -> str:
    """Return the mark of the first number that has one; a point where none has."""
    places = [column.position for column in columns.numbers.values()]
    for cells in rows:
        for place in places:
            marked = _MARKED.fullmatch(cells[place].strip()) if place < len(cells) else None
            if marked:
                return marked[1]
    return "."


def plain_number(text: str, column: Column, mark: str) -> float:
    """Return the number of a cell.

    Raises
    ------
    NotAReading
        When it is anything but one finite number with this decimal mark.
    """
    plain = text.strip().translate(_MINUS)
    if mark == ",":
        plain = plain.replace(".", "?").replace(",", ".")
    if _NUMBER.fullmatch(plain) and math.isfinite(float(plain)):
        return float(plain)
    if not plain:
        raise NotAReading(f"nothing under {column.head}", "a number")
    raise NotAReading(f"{shown(text.strip())} under {column.head}", _expected(plain, column, mark))


def _expected(plain: str, column: Column, mark: str) -> str:
    """Return what to write in place of a cell that is no number."""
    if _NUMBER.fullmatch(plain) or plain.lower().lstrip("+-") in ("nan", "inf", "infinity"):
        return "a finite number"
    if _SEPARATED.fullmatch(plain):
        kind = "comma" if mark == "," else "point"
        return f"a number without thousands separators, with a decimal {kind} in every row"
    if _WITH_UNIT.fullmatch(plain):
        return f"a plain number in {column.unit}: the unit stands in the header"
    return f"a plain number in {column.unit}"


def is_good_name(name: str) -> bool:
    """Whether text can be the name of a device or lot."""
    return 0 < len(name) <= _LONGEST_NAME and name.isprintable()


def _name(cells: Sequence[str], place: int | None, what: str) -> str:
    """Return a name from a row, empty where the file has no such column."""
    if place is None:
        return ""
    name = cells[place].strip() if place < len(cells) else ""
    if not is_good_name(name):
        found = shown(name) if name else "nothing"
        expected = f"a name of 1 to {_LONGEST_NAME} printable characters"
        raise NotAReading(f"{found} under {what}", expected)
    return name


# ---- the exact way: row by row


def read_rows(rows: Iterable[tuple[int, Sequence[str] | None]], columns: Columns, mark: str) -> Block:
    """Return what rows hold; each is its line and its cells, or None where its quotes are wrong.

    Rows without any text are blank; a row whose first cell alone has text, from # on, is a comment.
    """
    read = _Rows()
    for line, cells in rows:
        if cells is not None and not any(map(str.strip, cells)):
            continue
        if cells is not None and cells[0].startswith("#") and not any(map(str.strip, cells[1:])):
            read.comments.append(line)
            continue
        try:
            numbers, names = _reading(cells, columns, mark)
        except NotAReading as fault:
            read.faults.append((line, fault))
        else:
            read.lines.append(line)
            read.numbers.append(numbers)
            read.names.append(names)
    named = columns.device is not None or columns.lot is not None
    return Block(
        lines=read.lines,
        numbers=np.array(read.numbers, dtype=float).reshape(len(read.lines), len(columns.numbers)).T,
        names=read.names if named else (),
        faults=read.faults,
        comments=read.comments,
    )


def _reading(cells: Sequence[str] | None, columns: Columns, mark: str) -> tuple[list[float], tuple[str, str]]:
    if cells is None:
        raise NotAReading(
            "a quote that is not closed at the end of its cell", "cells as RFC 4180 quotes them"
        )
    if any(map(str.strip, cells[columns.count :])):
        expected = f"{columns.count}, as in the header (a decimal comma needs semicolons between cells)"
        raise NotAReading(f"{len(cells)} cells", expected)
    numbers = [
        plain_number(cells[column.position] if column.position < len(cells) else "", column, mark)
        for column in columns.numbers.values()
    ]
    return numbers, (_name(cells, columns.lot, "lot"), _name(cells, columns.device, "device"))
