"""Sweeps read from files: CSV text in the forms that instruments and spreadsheets write, or XLSX.

A row is read or listed as refused with its line; nothing is dropped silently and nothing is guessed.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import Path

from tcplan.errors import InputError, Problem
from tcplan.input_file import file_bytes, too_large
from tcplan.measure.reading_cells import Block, decimal_mark, read_rows, record_at, split_rows
from tcplan.measure.reading_fast import read_lines
from tcplan.measure.reading_header import EXAMPLE, Columns, has_both, parse_header
from tcplan.measure.reading_rows import MAX_ROWS, Gathering, ReadSweep
from tcplan.measure.reading_xlsx import XLSX_START, parse_xlsx_sweep

__all__ = ["ReadSweep", "parse_sweep", "read_sweep"]

MAX_BYTES = 100_000_000
_PARTS = "Read it in parts."
_DELIMITERS = ("\t", ";", ",")
_LARGEST_BLOCK = 1024
_SMALLEST_BLOCK = 64


def read_sweep(path: Path) -> ReadSweep:
    """Return the readings of a file.

    Parameters
    ----------
    path : Path
        CSV text in UTF-8, or an XLSX workbook, of 100 MB at most.

    Returns
    -------
    ReadSweep
        The sweep in SI, rows that are no readings listed, and notes on what is not used.

    Raises
    ------
    InputError
        When the file cannot be read, its header is wrong, or it holds no reading.
    """
    return parse_sweep(
        file_bytes(path, MAX_BYTES, (".csv", ".xlsx"), "a readable CSV or XLSX file", _PARTS), str(path)
    )


def parse_sweep(content: bytes, name: str) -> ReadSweep:
    """Return the readings of the content of a file.

    Parameters
    ----------
    content : bytes
        CSV text in UTF-8, or an XLSX workbook, of 100 MB at most.
    name : str
        What messages call it: a path, or "standard input".

    Returns
    -------
    ReadSweep
        The sweep in SI, rows that are no readings listed, and notes on what is not used.

    Raises
    ------
    InputError
        When it is not text, its header is wrong, or it holds no reading.

    References
    ----------
    RFC 4180, Common format for comma-separated values files, for quoted cells.
    """
    if len(content) > MAX_BYTES:
        raise InputError(too_large(name, f"{len(content)} bytes", MAX_BYTES, _PARTS))
    if content.startswith(XLSX_START):
        return parse_xlsx_sweep(content, name)
    lines = _lines(_text(content, name), name)
    start = next((k for k, line in enumerate(lines) if _has_content(line)), None)
    if start is None:
        raise InputError(
            Problem(where=name, found="no text", expected=f"a header, such as {EXAMPLE}, and readings below")
        )
    delimiter, head, body = _header(lines, start)
    gathering = Gathering(parse_header(head, f"{name}, line {start + 1}"), name)
    mark = _mark(lines, body, delimiter, gathering.columns)
    for block in _blocks(lines, body, gathering.columns, delimiter, mark):
        gathering.add(block)
    return gathering.result()


def _blocks(lines: Sequence[str], at: int, columns: Columns, delimiter: str, mark: str) -> Iterator[Block]:
    """Yield what the lines hold: the fast way where that works, else row by row.

    The size of a block shrinks where one fails and grows again after, so that few bad rows cost little.
    """
    size = _LARGEST_BLOCK
    while at < len(lines):
        stop = min(at + size, len(lines))
        block = read_lines(lines[at:stop], at + 1, columns, delimiter, mark)
        if block is None and size > _SMALLEST_BLOCK:
            size = max(size // 4, _SMALLEST_BLOCK)
            continue
        if block is None:
            rows = list(split_rows(lines, at, stop, delimiter))
            block = read_rows(((first + 1, cells) for first, _, cells in rows), columns, mark)
            stop = rows[-1][1]  # a quoted cell may run beyond the block
        else:
            size = min(2 * size, _LARGEST_BLOCK)
        yield block
        at = stop


def _header(lines: Sequence[str], start: int) -> tuple[str, list[str], int]:
    """Return the delimiter, the cells of the header, and where the rows start.

    The delimiter is the first of tab, semicolon and comma that makes columns of T and R, else the one
    that makes most columns.
    """
    found = [(delimiter, *record_at(lines, start, delimiter)) for delimiter in _DELIMITERS]
    read = [(delimiter, cells, after) for delimiter, cells, after in found if cells]
    if not read:
        return ",", lines[start].split(","), start + 1
    good = [split for split in read if has_both(split[1])]
    return good[0] if good else max(read, key=lambda split: len(split[1]))


def _mark(lines: Sequence[str], body: int, delimiter: str, columns: Columns) -> str:
    """Return the decimal mark of the file; a comma only where cells end with something else."""
    if delimiter == "," or not any("," in line for line in lines[body:]):
        return "."
    rows = split_rows(lines, body, len(lines), delimiter)
    return decimal_mark((cells for _, _, cells in rows if cells), columns)


def _has_content(line: str) -> bool:
    return bool(line.strip(' \t;,"')) and not line.startswith("#")


# ---- bytes to lines


def _text(content: bytes, name: str) -> str:
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as fault:
        before = content[: fault.start].replace(b"\r\n", b"\n").replace(b"\r", b"\n")
        raise InputError(
            Problem(
                where=f"{name}, line {before.count(10) + 1}",
                found=f"the byte 0x{content[fault.start]:02x}, which is not UTF-8 text",
                expected="CSV text in UTF-8",
                todo="Save the file as CSV in UTF-8.",
            )
        ) from fault
    if "\0" in text:
        raise InputError(
            Problem(where=name, found="a binary file", expected="CSV text in UTF-8, or an XLSX workbook")
        )
    return text


def _lines(text: str, name: str) -> list[str]:
    """Return the lines of a text, whether they end with CR, LF or both."""
    text = text.replace("\r\n", "\n").replace("\r", "\n")
    if text.count("\n") > MAX_ROWS:
        raise InputError(
            Problem(where=name, found=f"{text.count(chr(10))} lines", expected=f"{MAX_ROWS} at most")
        )
    return text.removesuffix("\n").split("\n")
