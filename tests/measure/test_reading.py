"""Sweeps from CSV text: every form that is read, and every row that is refused."""

import csv
import io
import time
from pathlib import Path

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from tcplan.errors import InputError
from tcplan.measure.reading import ReadSweep, parse_sweep, read_sweep
from tcplan.measure.reading_cells import cells_of, read_rows, split_rows
from tcplan.measure.reading_fast import read_lines
from tcplan.measure.reading_header import parse_header


def read(text, name="sweep.csv"):
    return parse_sweep(text if isinstance(text, bytes) else text.encode("utf-8"), name)


def refused(text):
    """Return (line, found, expected) of the rows that are no readings."""
    return [(row.line, row.found, row.expected) for row in read(text).sweep.refused]


def problems(text):
    with pytest.raises(InputError) as caught:
        read(text)
    return [str(problem) for problem in caught.value.problems]


PLAIN = "T [degC],R [ohm]\n25,1000\n-40,990.5\n"


# --- what is read -------------------------------------------------------------------------------


def test_a_plain_sweep_is_in_si_to_the_last_bit():
    """0 degC is 273.15 K by definition (ITS-90)."""
    sweep = read(PLAIN).sweep
    assert sweep.T.tolist() == [298.15, 233.15]
    assert sweep.R.tolist() == [1000.0, 990.5]
    assert (sweep.u_T, sweep.u_R) == (None, None)
    assert (sweep.devices, sweep.lots) == (("",), ("",))
    assert sweep.device.tolist() == sweep.lot.tolist() == [0, 0]
    assert sweep.line.tolist() == [2, 3]
    assert (sweep.source, sweep.refused) == ("sweep.csv", ())


SAME = [
    "T [degC],R [ohm]\n25,1000\n-40,990.5",
    "T (degC);R (ohm)\n25;1000\n-40;990,5\n",
    "T/degC\tR/ohm\n25\t1000\n-40\t990,5\n",
    "T / °C\tR / Ω\n25\t1000\n-40\t990.5\n",
    "T/(degC);R/(kohm)\n25;1\n-40;.9905\n",
    "TEMPERATURE [K],resistance [mohm]\n298.15,1000000\n233.15,990500\n",
    "R [kohm],t [degC]\n1,25\n.9905e0,-4E1\n",
    '"T [degC]","R [ohm]"\n"25","1000"\n"-40","990.5"\n',
    '"T\n[degC]";R [ohm]\n "25" ; 1000\n−40;"990,5"\n',
    "\ufeffT [degC],R [ohm]\r\n+25,+1000\r\n-40,990.5\r\n",
    "T [degC],R [ohm]\r25,1000\r-40,990.5\r",
    "# a chamber\n\n;;;\nT [degC];R [ohm];;\n25;1000;;\n\n;;;\n-40;990.5\n",
    "R [ohm],note; long,T [degC]\n1000,,25\n990.5,x,-40\n",
    "T [degC],R [ohm]\n25,1000,\n-40,990.5,,\n",
]


@pytest.mark.parametrize("text", SAME)
def test_every_form_reads_the_same(text):
    sweep = read(text).sweep
    assert sweep.T.tolist() == [298.15, 233.15]
    np.testing.assert_allclose(sweep.R, [1000.0, 990.5], rtol=1e-15)
    assert sweep.refused == ()


def test_lines_are_those_of_an_editor():
    assert read("# one\n\nT [K],R [ohm]\n1,1\n\n# two\n2,2\n").sweep.line.tolist() == [4, 7]
    assert read('T [K],R [ohm],note\n1,1,"a\n,"\n2,2,\n').sweep.line.tolist() == [2, 4]
    assert read("T [K],R [ohm]\r\n\r\n1,1\r2,2").sweep.line.tolist() == [3, 4]


@pytest.mark.parametrize(
    ("head", "number", "u"),
    [
        ("u(R) [ohm]", "0.2", 0.2),
        ("u(R)/mohm", "200", 0.2),
        ("u( resistance ) [%]", "0.01", 0.2),
        ("u(r) (ppm)", "100", 0.2),
        ("u(R)/%", "0.01", 0.2),
    ],
)
def test_uncertainty_of_resistance(head, number, u):
    """In ohms or as a part of each reading of 2 kohm: 0.01 % and 100 ppm of it are 0.2 ohm."""
    sweep = read(f"T [K],{head},R [kohm]\n300,{number},2\n").sweep
    np.testing.assert_allclose(sweep.u_R, [u], rtol=1e-14)


@pytest.mark.parametrize(("unit", "number"), [("K", "0.05"), ("degC", "0.05"), ("mK", "50"), ("°C", "0.05")])
def test_uncertainty_of_temperature_has_no_offset(unit, number):
    sweep = read(f"T [degC];R [ohm];u(T) [{unit}]\n25;1;{number}\n").sweep
    np.testing.assert_allclose(sweep.u_T, [0.05], rtol=1e-15)


def test_devices_and_lots_in_order_of_appearance():
    rows = ["B,1,300,10", "A,1,300,11", "B,2,300,12", "C,2,300,13", "B,1,310,14"]
    sweep = read("device,lot,T [K],R [ohm]\n" + "\n".join(rows)).sweep
    assert sweep.devices == ("1/B", "A", "2/B", "C")
    assert sweep.device.tolist() == [0, 1, 2, 3, 0]
    assert sweep.lots == ("1", "2")
    assert sweep.lot.tolist() == [0, 0, 1, 1, 0]
    assert sweep.of_device(0).R.tolist() == [10.0, 14.0]


def test_names_that_cannot_be_told_apart_are_refused():
    text = "device,lot,T [K],R [ohm]\nB,1,300,10\nB,2,300,11\n1/B,3,300,12\n"
    assert "both be called '1/B'" in problems(text)[0]


def test_many_devices_take_no_long_time():
    rows = "".join(f"d{k % 20000},L{k // 20000},300,1\n" for k in range(40000))
    assert len(read("device,lot,T [K],R [ohm]\n" + rows).sweep.devices) == 40000


def test_lots_without_devices_are_one_device_each():
    sweep = read("lot,T [K],R [ohm]\nx,300,10\ny,300,11\nx,301,12\n").sweep
    assert (sweep.devices, sweep.lots) == (("x", "y"), ("x", "y"))
    assert sweep.device.tolist() == sweep.lot.tolist() == [0, 1, 0]


def test_a_device_without_a_reading_is_none():
    sweep = read("device,T [K],R [ohm]\nA,x,10\nB,300,-1\nC,300,11\n").sweep
    assert sweep.devices == ("C",)
    assert [row.line for row in sweep.refused] == [2, 3]


def test_names_may_look_like_formulas_or_comments_when_quoted():
    sweep = read('device,T [K],R [ohm]\n=1+1,300,10\n@x,300,11\n"#1",300,12\n5",300,13\n').sweep
    assert sweep.devices == ("=1+1", "@x", "#1", '5"')


# --- what is told -------------------------------------------------------------------------------


def test_columns_and_comments_that_are_not_used_are_told():
    found = read("time [s],T [K],,R [ohm]\n0,300,,10\n#1,301,,11\n")
    assert found.notes == (
        "Columns that are not used: 'time [s]', column 3, which has no name.",
        "Among the readings 1 row starts with # and counts as a comment: line 3.",
    )
    assert read(PLAIN).notes == ()


ROWS = [
    ("abc,1", "'abc' under 'T [degC]'", "a plain number in degC"),
    ("25,12 kohm", "'12 kohm' under 'R [ohm]'", "a plain number in ohm: the unit stands in the header"),
    ("25,4k7", "'4k7' under 'R [ohm]'", "a plain number in ohm: the unit stands in the header"),
    ("25,NaN", "'NaN' under 'R [ohm]'", "a finite number"),
    ("-inf,1", "'-inf' under 'T [degC]'", "a finite number"),
    ("25,1e999", "'1e999' under 'R [ohm]'", "a finite number"),
    ("25,0", "0.0 under 'R [ohm]'", "a resistance above zero"),
    ("25,-7", "-7.0 under 'R [ohm]'", "a resistance above zero"),
    ("25,1e-999", "0.0 under 'R [ohm]'", "a resistance above zero"),
    ("-273.15,1", "-273.15 under 'T [degC]'", "a temperature above 0 K"),
    ("-300,1", "-300.0 under 'T [degC]'", "a temperature above 0 K"),
    ("25", "nothing under 'R [ohm]'", "a number"),
    (",1", "nothing under 'T [degC]'", "a number"),
    ("25,1,0", "3 cells", "2, as in the header (a decimal comma needs semicolons between cells)"),
    ("=1+1,1", "'=1+1' under 'T [degC]'", "a plain number in degC"),
    ("@,1", "'@' under 'T [degC]'", "a plain number in degC"),
    ("1_0,1", "'1_0' under 'T [degC]'", "a number without thousands separators, with a decimal point in"),
    ("25,1 000", "'1 000' under 'R [ohm]'", "a number without thousands separators, with a decimal point"),
    ("25,1'000", "\"1'000\" under 'R [ohm]'", "a number without thousands separators"),
    ('25,"1,000"', "'1,000' under 'R [ohm]'", "a number without thousands separators"),
    ("٢٥,1", "'٢٥' under 'T [degC]'", "a plain number in degC"),
    ('25,"1', "a quote that is not closed at the end of its cell", "cells as RFC 4180 quotes them"),
    ('25,"1"0', "a quote that is not closed at the end of its cell", "cells as RFC 4180 quotes them"),
    (" # x", "'# x' under 'T [degC]'", "a plain number in degC"),
]


@pytest.mark.parametrize(("row", "found", "expected"), ROWS)
@pytest.mark.parametrize("rest", ["25,1000", "25,1000\n\n"])
def test_a_bad_row_is_listed_with_its_line(row, found, expected, rest):
    text = f"T [degC],R [ohm]\n-40,990\n{row}\n{rest}"
    [(line, what, wanted)] = refused(text)
    assert line == 3
    assert what == found
    assert wanted.startswith(expected)
    assert read(text).sweep.line.tolist() == [2, 4]
    assert read(text).refused == 1


def test_decimal_marks_are_not_mixed():
    """1.234 below 1,5 could be 1234 or 1.234: it is refused, not guessed."""
    assert refused("T [K];R [ohm]\n300;1,5\n301;1.234\n302;1.234,5\n") == [
        (line, f"'{cell}' under 'R [ohm]'", "a number without thousands separators, with a decimal comma in "
         "every row")
        for line, cell in ((3, "1.234"), (4, "1.234,5"))
    ]  # fmt: skip
    assert [row[0] for row in refused("T [K];R [ohm]\n300;1.5\n301;1,234\n302;1.234.5\n")] == [3, 4]


def test_a_name_with_a_comma_is_no_decimal_mark():
    assert read('T [K];R [ohm];device\n300;1;"a,1"\n301;1.5;"1,5"\n').sweep.R.tolist() == [1.0, 1.5]


def test_bad_uncertainties_and_names():
    text = (
        "T [K],R [ohm],u(T) [K],u(R) [%],device\n1,1,0,0,a\n1,1,-1,0,a\n1,1,0,,a\n1,1,0,1,\n1,1,0,1e308,a\n"
    )
    assert [row[:2] for row in refused(text)] == [
        (3, "-1.0 under 'u(T) [K]'"),
        (4, "nothing under 'u(R) [%]'"),
        (5, "nothing under device"),
    ]
    assert refused(f"T [K],R [ohm],lot\n1,1,{'x' * 101}\n1,1,y\n1,1,a\x1bb\n")[1][1] == "'a\\x1bb' under lot"


def test_what_overflows_in_si_is_refused():
    assert [row[0] for row in refused("T [K],R [kohm],u(R) [%]\n1,1,1\n1,1e307,1\n1,1e300,1e30\n")] == [3, 4]


def test_many_bad_rows_are_counted():
    found = read("T [K],R [ohm]\n1,1\n" + "x,1\n" * 1500)
    assert found.refused == 1500
    assert len(found.sweep.refused) == 1001
    assert found.sweep.refused[999].line == 1002
    assert found.sweep.refused[-1].found == "500 more such rows below this one"


def test_a_quote_that_is_never_closed_costs_one_row():
    sweep = read('T [K],R [ohm],note\n1,1,"x\n' + "2,2,\n" * 30).sweep
    assert [row.line for row in sweep.refused] == [2]
    assert sweep.T.size == 30


# --- what is no sweep ---------------------------------------------------------------------------


def test_all_rows_bad():
    told = problems("T [K],R [ohm]\n" + "x,1\n" * 7)
    assert len(told) == 6
    assert told[0].startswith("sweep.csv, line 2: found 'x' under 'T [K]'; expected a plain number in K")
    assert "no readings among 7 rows" in told[-1]
    assert "no rows below the header" in problems("T [K],R [ohm]\n\n# no more\n")[0]


HEADERS = [
    ("25,1000\n26,1001\n", "line 1: found numbers where the header belongs"),
    ("T [K];V [V]\n1;1\n", "no column of resistance among 'T [K]', 'V [V]'"),
    ("T degC,R ohm\n1,1\n", "no column of temperature among 'T degC', 'R ohm'"),
    ("T,R [ohm]\n1,1\n", "line 1, column 'T': found no unit; expected degC or K."),
    ("T [K],R\n1,1\n", "column 'R': found no unit; expected a unit of resistance: ohm"),
    ("T [],R [ohm]\n1,1\n", "column 'T []': found no unit"),
    ("T [degF],R [ohm]\n1,1\n", "found the unit 'degF'; expected degC or K"),
    ("T [°F],R [ohm]\n1,1\n", "expected degC or K"),
    ("T [C],R [ohm]\n1,1\n", "found the unit 'C'; expected degC or K"),
    ("T [K],R [V]\n1,1\n", "found the unit 'V'; expected a unit of resistance"),
    ("T [K],R [k]\n1,1\n", "found the unit 'k'"),
    ("T [K],R [5 ohm]\n1,1\n", "found the unit '5 ohm'"),
    ("T [K],R [KOhm]\n1,1\n", 'resistance: ohm, mohm, kohm, Mohm. Did you mean "kohm"?'),
    ("T [K],R [ohm],u(R) [K]\n1,1,1\n", "found the unit 'K'; expected a unit of resistance, or % or ppm"),
    ("T [K],R [ohm],u(T) [%]\n1,1,1\n", "found the unit '%'; expected K, mK or degC"),
    ("T [K],R [ohm],temperature [degC]\n1,1,1\n", "found 2 columns of T: 'T [K]', 'temperature [degC]'"),
    ("T [K],R [ohm],device,Device\n1,1,a,a\n", "2 columns of device"),
    ("T [K],R [ohm],U(R) [ohm]\n1,1,1\n", "with U, which stands for an expanded uncertainty"),
    ("", "found no text"),
    ("\ufeff\n,,\n# only this\n", "found no text"),
    ("\0", "found a binary file"),
    (b"T [K],R [ohm]\r\n1,1\r\n# 25 \xb0C\r\n", "line 3: found the byte 0xb0, which is not UTF-8 text"),
    ("T [K],R [ohm]\n1,1".encode("utf-16"), "line 1: found the byte 0xff"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "found"), HEADERS)
def test_a_wrong_file_is_told(text, found):
    """U is an expanded and u a standard uncertainty: GUM (JCGM 100), 6.2 and 2.3.1."""
    assert any(found in problem for problem in problems(text)), problems(text)


def test_all_mistakes_of_a_header_together():
    assert len(problems("T,R,lot,lot,U(R) [K]\n1,1,1,1,1\n")) == 5


def test_files(tmp_path):
    (tmp_path / "sweep.csv").write_bytes(PLAIN.encode())
    assert read_sweep(tmp_path / "sweep.csv").sweep.source == str(tmp_path / "sweep.csv")
    for path, found in [
        (tmp_path, "found a folder"),
        (tmp_path / "sweeps.csv", f"Did you mean {tmp_path / 'sweep.csv'}?"),
        (Path("/dev/null"), "found a device or pipe"),
    ]:
        with pytest.raises(InputError) as caught:
            read_sweep(path)
        assert found in str(caught.value)


# --- laws ---------------------------------------------------------------------------------------


def twin(text, delimiter):
    """Return (T [K], R [ohm], device) by the csv module of the standard library, one cell at a time."""
    rows = list(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter))
    head = rows[0]
    t, r, d = (next(k for k, cell in enumerate(head) if cell.startswith(name)) for name in ("T", "R", "dev"))
    scale = {"R [ohm]": 1.0, "R [kohm]": 1000.0}[head[r]]
    zero = {"T [K]": 0.0, "T [degC]": 273.15}[head[t]]
    number = (lambda cell: float(cell.replace(",", "."))) if delimiter != "," else float
    return [(number(row[t]) + zero, number(row[r]) * scale, row[d].strip()) for row in rows[1:]]


NAMES = st.text(st.characters(codec="ascii", exclude_categories=["Cc"]), max_size=6).map(
    lambda s: f"x{s}".strip()
)
READINGS = st.lists(
    st.tuples(st.floats(1, 2000), st.floats(1e-3, 1e9), NAMES, st.booleans()), min_size=1, max_size=40
)


@given(
    readings=READINGS,
    delimiter=st.sampled_from("\t;,"),
    comma=st.booleans(),
    quoting=st.sampled_from([csv.QUOTE_ALL, csv.QUOTE_MINIMAL]),
    end=st.sampled_from(["\n", "\r\n", "\r"]),
    blank=st.booleans(),
)
@settings(max_examples=150, deadline=None)
def test_a_slow_twin_reads_the_same(readings, delimiter, comma, quoting, end, blank):
    """The same readings in any dress: by the csv module; a blank line rules out the fast way."""
    out = io.StringIO(newline="")
    writer = csv.writer(out, delimiter=delimiter, quoting=quoting, lineterminator=end)
    writer.writerow(["device", "R [kohm]", "T [degC]"])
    for T, R, name, short in readings:
        cells = [f"{R:.6g}" if short else repr(R), repr(T)]
        cells = [c.replace(".", ",") for c in cells] if comma and delimiter != "," else cells
        writer.writerow([name, *cells])
    text = out.getvalue()
    expected = twin(text, delimiter)
    sweep = read(text + end * 2 if blank else text).sweep
    assert sweep.refused == ()
    # degC go to kelvin to a nanokelvin
    np.testing.assert_allclose(sweep.T, [row[0] for row in expected], rtol=1e-12, atol=6e-10)
    np.testing.assert_allclose(sweep.R, [row[1] for row in expected], rtol=1e-12)
    assert [sweep.devices[k] for k in sweep.device] == [row[2] for row in expected]


CELL = st.one_of(
    st.sampled_from(
        ["25", "-1.5e2", "1,5", "1_0", "nan", "", " 7 ", '"8"', '"9""', "=1", "#", "٢", "1e999", "\x1c5"]
    ),
    st.text('0123456789.,eE+-_"# x\x0b\x1c\xa0−', max_size=6),
)


@given(
    rows=st.lists(st.lists(CELL, min_size=3, max_size=4), min_size=1, max_size=6), mark=st.sampled_from(".,")
)
@settings(max_examples=600, deadline=None)
@example(rows=[["25", "1,5", "x"]], mark=",")
def test_the_fast_way_reads_what_the_exact_way_reads(rows, mark):
    columns = parse_header(["T [degC]", "R [ohm]", "device"], "")
    lines = [";".join(row) for row in rows]
    fast = read_lines(lines, 1, columns, ";", mark)
    split = split_rows(lines, 0, len(lines), ";")
    exact = read_rows(((at + 1, cells) for at, _, cells in split), columns, mark)
    if fast is not None:
        assert list(fast.lines) == exact.lines
        assert fast.numbers.tolist() == exact.numbers.tolist()
        assert fast.names == exact.names
        assert exact.faults == [] == exact.comments


def test_the_fast_way_is_taken():
    columns = parse_header(["T [degC]", "R [ohm]", "device"], "")
    for line in ("25,1.5,a", '"25","1.5","a"', " 25 , +1.5e0 ,a,"):
        assert read_lines([line], 1, columns, ",", ".").numbers.tolist() == [[25.0], [1.5]]


@given(st.lists(st.text(' ab"";,\n', max_size=8), min_size=1, max_size=5))
def test_quoted_cells_go_there_and_back(cells):
    """Written by the csv module, which follows RFC 4180."""
    out = io.StringIO(newline="")
    csv.writer(out, quoting=csv.QUOTE_ALL, lineterminator="").writerow(cells)
    assert cells_of(out.getvalue(), ",") == cells


PIECES = st.sampled_from(
    [b"T [degC]", b"R [ohm]", b"u(R) [%]", b"device", b"lot", b"T", b"R/ohm", b",", b";", b"\t", b"\n", b"\r",
     b'"', b"25", b"-40", b"1e3", b"1,5", b"#", b"=1+1", b"\xef\xbb\xbf", b"\xb0", b"\0", b"PK\x03\x04", b" "]
)  # fmt: skip


def survives(content):
    try:
        found = parse_sweep(content, "fuzz")
    except InputError:
        return
    assert isinstance(found, ReadSweep)
    sweep = found.sweep
    assert sweep.T.size == sweep.R.size == sweep.line.size == sweep.device.size == sweep.lot.size > 0
    assert (sweep.T > 0).all()
    assert (sweep.R > 0).all()
    assert set(sweep.device.tolist()) == set(range(len(sweep.devices)))
    assert set(sweep.lot.tolist()) == set(range(len(sweep.lots)))


@given(st.binary(max_size=200))
@settings(max_examples=300, deadline=None)
def test_any_bytes(content):
    survives(content)


@given(st.lists(PIECES, max_size=40).map(b"".join))
@settings(max_examples=400, deadline=None)
def test_any_pieces_of_sweeps(content):
    survives(content)
    survives(b"T [degC],R [ohm],device\n1,2,a\n" + content)
    survives(b"lot;T/K;R/kohm;u(T)/K\na;1;2;0\n" + content)


@given(
    st.lists(
        st.one_of(st.just("1,1"), st.just(" 3 , 3 "), st.sampled_from([r[0] for r in ROWS])), max_size=30
    )
)
@settings(max_examples=100, deadline=None)
def test_no_row_is_lost(rows):
    """Every row with text in it is a reading or refused; quotes are left out, as they may join rows."""
    text = "T [degC],R [ohm]\n300,1\n" + "\n".join(row for row in rows if '"1' not in row)
    found = read(text)
    assert found.sweep.T.size + found.refused == len([line for line in text.split("\n") if line]) - 1
    assert found.refused == len(found.sweep.refused)


def test_a_million_rows_within_five_seconds():
    count = 1_000_000
    text = "T [degC],R [ohm],device\n" + "".join(
        f"{k % 190 - 40}.25,{k + 1}.5,d{k % 9}\n" for k in range(count)
    )
    start = time.perf_counter()
    sweep = read(text).sweep
    assert time.perf_counter() - start < 5.0
    assert sweep.R.sum() == pytest.approx(count * (count + 2) / 2, rel=1e-12)  # Gauss's sum of k + 1.5
