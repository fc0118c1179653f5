"""Sweeps from workbooks: as from text, of formulas the stored values only."""

import datetime
import io
import sys
import zipfile

import openpyxl
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tcplan.errors import InputError
from tcplan.measure.reading import parse_sweep, read_sweep


def book(*rows, sheets=()):
    """Return the bytes of a workbook with these rows on its first sheet."""
    whole = openpyxl.Workbook()
    for row in rows:
        whole.active.append(row)
    for title in sheets:
        whole.create_sheet(title)
    stream = io.BytesIO()
    whole.save(stream)
    return stream.getvalue()


BOOK = book(("T [K]", "R [ohm]"), (300, 10), (310, 11))


def with_stored_value(content, formula, value):
    """Return the workbook with a stored value beside a formula, as a spreadsheet program leaves it."""
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(out, "w") as new:
        for entry in old.infolist():
            data = old.read(entry)
            before = f"<f>{formula}</f><v />".encode()
            if entry.filename.endswith("sheet1.xml"):
                assert before in data.replace(b"<v></v>", b"<v />")
                data = data.replace(b"<v></v>", b"<v />").replace(
                    before, f"<f>{formula}</f><v>{value}</v>".encode()
                )
            new.writestr(entry, data)
    return out.getvalue()


def test_a_workbook_reads_like_text(tmp_path):
    rows = [("device", "R [kohm]", "T [degC]", "u(R) [%]"), ("A", 1.25, 25, 0.1), ("B", 1, -40.5, 0)]
    content = book(("# invented",), (), *rows, sheets=("other",))
    text = "# invented\n\n" + "\n".join(",".join(str(cell) for cell in row) for row in rows)
    (tmp_path / "sweep.xlsx").write_bytes(content)
    found, same = read_sweep(tmp_path / "sweep.xlsx"), parse_sweep(text.encode(), "text").sweep
    for name in ("T", "R", "u_R", "line", "device"):
        assert getattr(found.sweep, name).tolist() == getattr(same, name).tolist()
    assert found.sweep.devices == ("A", "B")
    assert found.notes == ("Sheets that are not read: 'other'.",)


def test_rows_that_are_no_readings():
    content = book(
        ("T [K]", "R [ohm]"),
        (300, 10),
        (300, True),
        (300, datetime.datetime(2020, 1, 1)),
        (300, "12 kohm"),
        (300, "11"),
        (300, None),
        (),
        (300, "#DIV/0!"),
        ("#N/A", 10),
        (-1, 10),
        ("# two words",),
    )
    found = parse_sweep(content, "book")
    assert found.sweep.R.tolist() == [10.0, 11.0]
    assert [row.line for row in found.sweep.refused] == [3, 4, 5, 7, 9, 10, 11]
    assert found.sweep.refused[0].found == "'True' under 'R [ohm]'"
    assert "line 12" in found.notes[0]


def test_formulas_are_never_evaluated():
    content = book(("T [K]", "R [ohm]"), (300, "=5+6"), (301, "=2+3"), (302, 1))
    found = parse_sweep(with_stored_value(content, "5+6", "12.5"), "book").sweep
    assert found.R.tolist() == [12.5, 1.0]  # what is stored, not 11
    assert [(row.line, row.found) for row in found.refused] == [(3, "nothing under 'R [ohm]'")]


@pytest.mark.parametrize(
    ("content", "found"),
    [
        (b"PK\x03\x04", "a damaged workbook"),
        (book()[:-30], "a damaged workbook"),
        (book(), "an empty sheet"),
        (book(("T [K]", "R [ohm]")), "no rows below the header"),
        (book((1, 2)), "numbers where the header belongs"),
        (book(("T", "R [ohm]")), "no unit"),
    ],
)
def test_a_wrong_workbook_is_told(content, found):
    with pytest.raises(InputError) as caught:
        parse_sweep(content, "book")
    assert found in str(caught.value)


def test_an_archive_that_unpacks_to_too_much_is_not_unpacked():
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive, archive.open("a", "w") as inner:
        for _ in range(510):
            inner.write(bytes(1_000_000))
    with pytest.raises(InputError, match="bytes unpacked"):
        parse_sweep(stream.getvalue(), "book")


def test_without_openpyxl_the_extra_is_named(monkeypatch):
    monkeypatch.setitem(sys.modules, "openpyxl", None)
    with pytest.raises(InputError, match=r'Install "tcplan\[xlsx\]"'):
        parse_sweep(BOOK, "book")


def survives(content):
    """Whether it is a sweep with readings, or an error meant for the user; anything else ends the test."""
    try:
        return parse_sweep(content, "book").sweep.T.size > 0
    except InputError as error:
        return bool(error.problems)


@given(st.integers(0, len(BOOK) - 1), st.binary(max_size=8))
@settings(max_examples=100, deadline=None)
def test_damaged_workbooks(at, patch):
    assert survives(BOOK[:at] + patch + BOOK[at + len(patch) :])


@given(st.binary(max_size=60))
@settings(max_examples=60, deadline=None)
def test_damaged_sheets(patch):
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(BOOK)) as old, zipfile.ZipFile(stream, "w") as new:
        for entry in old.infolist():
            data = old.read(entry)
            half = len(data) // 2
            hit = entry.filename.endswith("sheet1.xml")
            new.writestr(entry, data[:half] + patch + data[half:] if hit else data)
    assert survives(stream.getvalue())
