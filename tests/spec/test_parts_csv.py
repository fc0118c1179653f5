"""parts.csv: read back with the reader of the standard library, figure by figure."""

from __future__ import annotations

import csv
import io
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from makers import by_name, film

from tcplan.brief import parse_brief
from tcplan.made import FilmLeg, FilmUnit, PlainLeg, StockLeg, WireLeg
from tcplan.parts.record import Load
from tcplan.plan import MadeValue
from tcplan.spec.parts_csv import COLUMNS, legs_csv, parts_csv
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan

REFERENCE = 298.15
UNIT = FilmUnit(material="slate", width=2e-6, length=5e-6, body_ohms=250.0, ends_ohms=10.0, area=13e-12)
FILM = FilmLeg(
    id="a",
    material="slate",
    wanted_ohms=1000.0 / 3.0,
    unit=UNIT,
    in_series=4,
    in_parallel=3,
    mismatch=4.72e-4,
)
STOCK = StockLeg(id="b", material="flat", wanted_ohms=700.0, values=(1000.0, 2200.0), joined="parallel")
WIRE = WireLeg(id="c", material="up", wanted_ohms=300.0, length=21.734, ohm_per_metre=13.8)
PLAIN = PlainLeg(id="d", material="coil", wanted_ohms=412.0)
MATERIALS = by_name(film("slate", -150.0), *(film(name, 0.0) for name in ("flat", "up", "coil")))
SIZES = COLUMNS[5:]


@pytest.fixture(scope="module")
def option() -> Any:
    """Return some checked option: of a made value only its legs and its target are written."""
    text = """
schema = 1
title = "Invented"
[resistor]
value = "1 kohm"
[temperature]
low = "-40 degC"
high = "125 degC"
reference = "25 degC"
[given]
network = "coil 1 kohm"
[material.coil]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "40 ppm/K"
"""
    return make_parts(make_plan(parse_brief(text, "brief.toml", Path())), PartsRules()).parts.made[0].option


def value_of(option: Any, *legs: Any, target: float = 1e3) -> MadeValue:
    return MadeValue(target_ohms=target, value_error=0.0, legs=legs, option=option)


def rows_of(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text, newline=""), strict=True))


def test_it_is_rfc_4180(option: Any) -> None:
    """Lines end in CR LF, each with as many cells as the head (RFC 4180, 2.1 and 2.4)."""
    text = parts_csv([value_of(option, FILM, STOCK, WIRE, PLAIN)], (), MATERIALS, REFERENCE)
    lines = text.split("\r\n")
    assert lines[-1] == ""
    assert "\n" not in text.replace("\r\n", "")
    cells = list(csv.reader(io.StringIO(text, newline="")))
    assert tuple(cells[0]) == COLUMNS
    assert {len(row) for row in cells} == {len(COLUMNS)}
    assert len(cells) == 6  # the head, and two parts of one leg


def test_a_film_leg_by_hand(option: Any) -> None:
    """4 of 260 ohm, 3 strings: 346.667 ohm; bodies 333.333 ohm, 3.333 squares of 100 ohm; 12 x 13 um^2."""
    [row] = rows_of(parts_csv([value_of(option, FILM)], (), MATERIALS, REFERENCE))
    assert float(row["value_ohms"]) == 1000.0
    assert (row["leg"], row["material"]) == ("a", "slate")
    assert float(row["ohms"]) == pytest.approx(260.0 * 4 / 3, rel=1e-14)
    assert float(row["wanted_ohms"]) == 1000.0 / 3.0  # at full precision: the very same number
    assert float(row["squares"]) == pytest.approx(250.0 / 100.0 * 4 / 3, rel=1e-12)
    assert (row["in_series"], row["in_parallel"]) == ("4", "3")
    assert (float(row["width_m"]), float(row["length_m"])) == (2e-6, 5e-6)
    assert float(row["area_m2"]) == pytest.approx(12 * 13e-12, rel=1e-14)
    assert float(row["mismatch"]) == 4.72e-4
    assert row["part"] == row["part_ohms"] == row["joined"] == row["voltage_V"] == ""


def test_the_other_legs(option: Any) -> None:
    rows = rows_of(parts_csv([value_of(option, STOCK, WIRE, PLAIN)], (), MATERIALS, REFERENCE))
    one, two, wire, plain = rows
    assert [(row["part"], float(row["part_ohms"])) for row in (one, two)] == [("1", 1000.0), ("2", 2200.0)]
    for row in (one, two):
        assert (row["leg"], row["joined"]) == ("b", "parallel")
        assert float(row["ohms"]) == pytest.approx(687.5, rel=1e-14)  # of the leg
        assert row["length_m"] == row["in_series"] == ""
    assert float(wire["ohm_per_metre"]) == 13.8
    assert float(wire["length_m"]) == 21.734
    assert float(wire["ohms"]) == pytest.approx(21.734 * 13.8, rel=1e-14)
    assert {wire[name] for name in SIZES if name not in ("length_m", "ohm_per_metre")} == {""}
    assert {plain[name] for name in SIZES} == {""}
    assert float(plain["ohms"]) == float(plain["wanted_ohms"]) == 412.0


def test_what_is_not_known_is_empty_never_zero(option: Any) -> None:
    bare = replace(FILM, mismatch=None)
    unsized = {**MATERIALS, "slate": replace(MATERIALS["slate"], ohm_per_square=None, kind="plain")}
    [row] = rows_of(parts_csv([value_of(option, bare)], (), unsized, REFERENCE))
    assert row["mismatch"] == row["squares"] == ""


def test_loads_stand_beside_their_own_leg_at_every_value(option: Any) -> None:
    made = [value_of(option, FILM, PLAIN, target=1e3), value_of(option, FILM, PLAIN, target=2e3)]
    loads = [
        [
            Load(leg="d", voltage=4.0 / k, current=1e-3 / k, power=4e-3 / k**2, temperature=398.15),
            Load(
                leg="a",
                voltage=1.0 / k,
                current=1e-3 / k,
                power=1e-3 / k**2,
                temperature=398.15,
                density=82.6 / k,
            ),
        ]
        for k in (1, 2)
    ]
    rows = rows_of(parts_csv(made, loads, MATERIALS, REFERENCE))
    assert [float(row["value_ohms"]) for row in rows] == [1e3, 1e3, 2e3, 2e3]
    assert [float(row["voltage_V"]) for row in rows] == [1.0, 4.0, 0.5, 2.0]
    assert [float(row["power_W"]) for row in rows] == [1e-3, 4e-3, 0.25e-3, 1e-3]
    assert [row["current_density_A_per_m"] for row in rows] == ["82.6", "", "41.3", ""]


@pytest.mark.parametrize("name", ["=1+1", "+cmd|'/c'!A1", "-2+3", "@sum(a1)", "\tx", '=a,"b"', "a,b\r\nc"])
def test_no_name_is_a_formula_or_breaks_a_row(option: Any, name: str) -> None:
    """A cell of a spreadsheet that starts with one of = + - @ tab CR is a formula (common practice)."""
    materials = {name: replace(MATERIALS["coil"], name="x")}
    text = parts_csv([value_of(option, replace(PLAIN, material=name))], (), materials, REFERENCE)
    [row] = rows_of(text)
    assert not row["material"].startswith(("=", "+", "-", "@", "\t", "\r"))
    assert row["material"].removeprefix("'") == name
    assert row["leg"] == "d"
    [again] = rows_of(legs_csv([("first", [replace(PLAIN, material=name)])], materials, REFERENCE))
    assert again["material"] == row["material"]


def test_the_two_resistors_of_a_ratio() -> None:
    text = legs_csv([("first", [FILM, STOCK]), ("second", [replace(FILM, id="c")])], MATERIALS, REFERENCE)
    rows = rows_of(text)
    found = [(row["resistor"], row["leg"], row["part"]) for row in rows]
    assert found == [("first", "a", ""), ("first", "b", "1"), ("first", "b", "2"), ("second", "c", "")]
    # what a leg carries is not known of a ratio
    assert list(rows[0]) == ["resistor", *COLUMNS[1 : COLUMNS.index("voltage_V")]]
    assert float(rows[3]["ohms"]) == float(rows[0]["ohms"])
