"""What docs/sweeps.md shows and states is so."""

import re
from pathlib import Path

import pytest

from tcplan.errors import InputError
from tcplan.measure import reading
from tcplan.measure.reading import parse_sweep
from tcplan.measure.reading_rows import MAX_ROWS, MOST_REFUSED

TEXT = (Path(__file__).parents[2] / "docs" / "sweeps.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"^```csv ([^\n]*)\n(.*?)^```$", TEXT, re.M | re.S)
ROWS = [
    [cell.strip() for cell in line.split("|")[1:-1]] for line in TEXT.splitlines() if line.startswith("|")
]


def test_there_are_examples_of_both_kinds():
    assert [label.split()[0] for label, _ in BLOCKS] == ["complete", "complete", "refused"]


@pytest.mark.parametrize(("label", "content"), BLOCKS)
def test_examples_are_read_as_stated(label, content):
    found = parse_sweep(content.encode("utf-8"), "example")
    assert [str(row.line) for row in found.sweep.refused] == label.split()[1:]
    assert found.sweep.T.size >= 2
    assert found.notes == ()


def test_every_name_and_unit_of_the_table_is_read():
    rows = [row for row in ROWS if len(row) == 4 and row[0].startswith("`")]
    assert [row[0] for row in rows] == ["`T`", "`R`", "`u(T)`", "`u(R)`", "`device`", "`lot`"]
    base = {"T": "K", "R": "ohm"}
    for own, others, units, _ in rows:
        for name in re.findall(r"`([^`]+)`", own + others):
            for unit in re.findall(r"[A-Za-z%]+", units.replace("as R, or", "").replace("of R", "")):
                head = name if unit == "none" else f"{name} [{unit}]"
                rest = [f"{q} [{u}]" for q, u in base.items() if f"`{q}`" != own]
                found = parse_sweep(f"{head},{','.join(rest)}\n1{',1' * len(rest)}\n".encode(), "table")
                assert found.notes == ()
                assert found.sweep.T.size == 1


def test_what_is_said_to_be_refused_is_refused():
    first = [row[0] for row in ROWS if len(row) == 2]
    for cell in re.findall(r"`([^`]+)`", " ".join(first)) + re.findall(
        r"`(1[^`]*)`", "`1 000` `1'000` `1.234,5`"
    ):
        found = parse_sweep(f"T [K];R [ohm]\n1,5;1\n300;{cell}\n".encode(), "row")
        assert [row.line for row in found.sweep.refused] == [3], cell
    with pytest.raises(InputError):
        parse_sweep(b"T [K],R [ohm],U(R) [ohm]\n1,1,1\n", "capital")


def test_limits_are_those_of_the_package():
    assert "Up to 1000 refused rows" in TEXT
    assert "over 100 MB, or over five million" in TEXT
    assert (MOST_REFUSED, reading.MAX_BYTES, MAX_ROWS) == (1000, 100_000_000, 5_000_000)
