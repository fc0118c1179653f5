"""A sweep read from the first sheet of an XLSX workbook, with the extra ``xlsx``."""

from __future__ import annotations

import datetime
import io
import itertools
import warnings
import zipfile
from collections.abc import Iterator, Sequence
from typing import Any

from tcplan.errors import InputError, Problem
from tcplan.measure.reading_cells import read_rows
from tcplan.measure.reading_header import EXAMPLE, parse_header
from tcplan.measure.reading_rows import Gathering, ReadSweep
from tcplan.names import shown

XLSX_START = b"PK\x03\x04"
"""How every workbook starts: it is a ZIP archive."""

_MAX_UNPACKED = 500_000_000
_SHEET_ROWS = 1_048_576  # the most that a sheet can have
_BLOCK = 1000


def parse_xlsx_sweep(content: bytes, name: str) -> ReadSweep:
    """Return the readings on the first sheet of a workbook; of formulas, the stored values.

    Parameters
    ----------
    content : bytes
        The whole file.
    name : str
        What messages call it.

    Returns
    -------
    ReadSweep
        As from CSV text; lines are the rows of the sheet.

    Raises
    ------
    InputError
        When openpyxl is not installed, the file is no workbook, its header is wrong, or it holds no
        reading.
    """
    titles, rows = _sheet(content, name)
    used = ((line, cells) for line, cells in rows if any(map(str.strip, cells)))
    kept = (row for row in used if not row[1][0].startswith("#"))  # comments above the header
    start, head = next(kept, (0, []))
    if not start:
        raise InputError(
            Problem(where=name, found="an empty sheet", expected=f"a header, such as {EXAMPLE}, and readings")
        )
    gathering = Gathering(parse_header(head, f"{name}, row {start}"), name)
    while block := list(itertools.islice(rows, _BLOCK)):
        gathering.add(read_rows(block, gathering.columns, "."))
    others = ", ".join(shown(title) for title in titles[1:9])
    return gathering.result((f"Sheets that are not read: {others}.",) if others else ())


def _sheet(content: bytes, name: str) -> tuple[list[str], Iterator[tuple[int, Sequence[str]]]]:
    """Return the titles of the sheets, and the rows of the first as (number, cells as text)."""
    openpyxl = _openpyxl(name)
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as archive:
            unpacked = sum(entry.file_size for entry in archive.infolist())
        if unpacked > _MAX_UNPACKED:
            raise InputError(
                Problem(where=name, found=f"{unpacked} bytes unpacked", expected=f"{_MAX_UNPACKED} at most")
            )
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # on styles and drawings, which are not read
            book = openpyxl.load_workbook(io.BytesIO(content), read_only=True, data_only=True)
            titles = [sheet.title for sheet in book.worksheets]
            rows = _text_rows(book.worksheets[0]) if titles else []
            book.close()
    except InputError:
        raise
    except Exception as fault:  # a damaged workbook can raise nearly anything in ZIP, XML and openpyxl
        raise InputError(
            Problem(
                where=name,
                found="a damaged workbook, or an archive of another kind",
                expected="an XLSX workbook",
                todo="Save it again, or as CSV in UTF-8.",
            )
        ) from fault
    return titles, iter(rows)


def _text_rows(sheet: Any) -> list[tuple[int, Sequence[str]]]:
    sheet.reset_dimensions()  # what a file states of its size can be wrong
    rows = itertools.islice(sheet.iter_rows(values_only=True), _SHEET_ROWS)
    return [(line, [_as_text(value) for value in row] or [""]) for line, row in enumerate(rows, 1)]


def _as_text(value: object) -> str:
    """Return the text of a cell: of a number, all its digits; of anything else, no number."""
    if value is None:
        return ""
    if isinstance(value, (datetime.date, datetime.time, datetime.timedelta)):
        return f"a date or time {value}"
    return value if isinstance(value, str) else repr(value)


def _openpyxl(name: str) -> Any:
    try:
        import openpyxl
    except ImportError as fault:
        raise InputError(
            Problem(
                where=name,
                found="an XLSX workbook, and openpyxl is not installed",
                expected="the extra xlsx of tcplan, or CSV text in UTF-8",
                todo='Install "tcplan[xlsx]", or save the sheet as CSV.',
            )
        ) from fault
    return openpyxl
