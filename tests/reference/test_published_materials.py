"""The shipped materials: what they hold, and the figures that others published."""

from __future__ import annotations

import math
import tomllib
from dataclasses import replace
from importlib import resources
from typing import Any

import numpy as np
import pytest

from tcplan.material.files import published, published_names
from tcplan.material.model import Material, material_from_dict

COUNTS = {"alloys": 7, "metals": 8}
# Sum of every coefficient of the file in ppm/K^n and of every plain number of its formulas in ppm, typed in
# from the rows of the sources by a second addition: a digit changed by accident shows here.
SUMS = {
    "alloys": -55.090 - 74.372 + 93.023 + 93.023 + 1726.974 + 1706.414 + 80.0 - 0.5 + 10.0 + 0.2 + 3 * 20.0,
    "metals": 3930.0
    + (4043.359 + 4038.054)
    + (4306.302 + 4308.632)
    + (3774.630 + 3856.793)
    + (3646.342 + 3774.847)
    + (4269.751 + 4519.930)
    + (5485.0 + 6.650 + 2.805e-5 - 2.0e-11),
}


def material(name: str) -> Material:
    return {**published("metals"), **published("alloys")}[name]


def ratio(name: str, *degrees: float) -> Any:
    of = material(name)
    return of.ratio(np.array(degrees) + 273.15, of.reference)


def raw(name: str) -> dict[str, Any]:
    text = resources.files("tcplan.material").joinpath("published", f"{name}.toml").read_text("utf-8")
    return tomllib.loads(text)["material"]


def coefficients(table: dict[str, Any]) -> float:
    keys = ("tc1", "tc2", "cold_tcr", "hot_tcr")
    total = sum(float(table[key].split()[0]) for key in keys if key in table)
    total += 1e6 * sum(table.get("law_parameters", {}).values())
    return total + (coefficients(table["spread"]) if "spread" in table else 0.0)


@pytest.mark.parametrize("name", ["alloys", "metals"])
def test_rows_and_sums_are_pinned(name: str) -> None:
    assert set(published_names()) == set(COUNTS)
    assert len(published(name)) == COUNTS[name]
    assert sum(coefficients(table) for table in raw(name).values()) == pytest.approx(SUMS[name], rel=1e-12)


@pytest.mark.parametrize("name", ["alloys", "metals"])
def test_every_row_names_a_source_a_reference_and_a_range(name: str) -> None:
    known = ("IEC 60028", "IEC 60751", "DIN 43760", "CRC Handbook", "NBS Monograph 39", "ASTM B267")
    for row in published(name).values():
        assert row.source.startswith(known)
        assert row.label != row.name
        assert row.valid[0] <= row.reference <= row.valid[1]
        back = material_from_dict(row.to_dict())
        assert replace(back, law=row.law) == row
        at = np.linspace(*row.valid, 9)
        np.testing.assert_allclose(back.law.ratio(at), row.law.ratio(at), rtol=1e-14)


def test_rows_without_curvature_say_so() -> None:
    for row in (*published("metals").values(), *published("alloys").values()):
        only_tc1 = getattr(row.law, "coefficients", ()) == row.law.taylor(row.reference, 1)
        assert only_tc1 == ("curvature is not given" in row.source)


def test_rows_state_no_size() -> None:
    # Resistance per length depends on the wire, so a published row cannot know it.
    assert {row.kind for name in published_names() for row in published(name).values()} == {"plain"}


def test_platinum() -> None:
    # IEC 60751, coefficients and table seen, four decimals computed.
    degrees = (-200, -55, -40, -20, 0, 25, 50, 85, 100, 125, 150, 200, 850)
    ohms = (
        *(18.5201, 78.3189, 84.2707, 92.1599, 100.0, 109.7347, 119.3971),
        *(132.8033, 138.5055, 147.9514, 157.3251, 175.8560, 390.4811),
    )
    np.testing.assert_allclose(100.0 * ratio("platinum", *degrees), ohms, rtol=0, atol=5.1e-5)


def test_nickel() -> None:
    # DIN 43760 law, seen; values computed.
    degrees = (-60, -40, 25, 85, 100, 125, 150)
    ohms = (69.5203, 79.1312, 114.1292, 151.5728, 161.7785, 179.6303, 198.6348)
    np.testing.assert_allclose(100.0 * ratio("nickel", *degrees), ohms, rtol=0, atol=5.1e-5)


def test_copper_at_other_references() -> None:
    # IEC 60028, 0.00393 at 20 degC; the other rows agree with NBS Handbook 100 table 2 from memory.
    expected = {0: 0.004265, 15: 0.004009, 25: 0.003854, 30: 0.003781, 50: 0.003516}
    for degrees, alpha in expected.items():
        assert material("copper").referred_taylor(degrees + 273.15)[0] == pytest.approx(alpha, abs=5e-7)


# CRC Handbook, wire tables, resistivities in 1e-8 ohm m, seen in a copy. Rows built from other points
# (200 K, 20 degC, 400 K) are independent of these figures. The last column is how
# many units of the last digit are allowed: 1 is the rounding of a figure and of the one at the reference. The
# table's own points scatter more for aluminium (0 degC) and constantan (20 to 25 degC).
WIRE_TABLES = [
    ("aluminium", 2.650, {0: 2.417, 25: 2.709, 100: 3.56}, 5),
    ("brass", 6.08, {0: 5.87, 25: 6.13, 100: 6.91}, 1),
    ("constantan", 45.38, {0: 45.43, 25: 45.35, 100: 45.11}, 2),
    ("copper_pure", 1.678, {0: 1.543, 25: 1.712, 100: 2.22}, 1),
    ("nichrome", 107.5, {0: 107.3, 25: 107.6, 100: 108.3}, 1),
    ("silver", 1.587, {0: 1.467, 25: 1.617, 100: 2.07}, 1),
    ("tungsten", 5.28, {0: 4.82, 25: 5.39, 100: 7.18}, 1),
    ("gold", 2.214, {0: 2.051, 25: 2.255}, 1),  # table of pure metals, at 273 and 298 K
]


@pytest.mark.parametrize(
    ("name", "at_20", "printed", "units"), WIRE_TABLES, ids=[row[0] for row in WIRE_TABLES]
)
def test_printed_resistivities_are_met(
    name: str, at_20: float, printed: dict[int, float], units: int
) -> None:
    for degrees, value in printed.items():
        unit = 10.0 ** -len(str(value).partition(".")[2])
        assert at_20 * float(ratio(name, degrees)[0]) == pytest.approx(value, abs=1.01 * units * unit)


def test_nichrome_and_constantan_pair() -> None:
    # Resistivities seen in the CRC Handbook, shares computed from them: mean TCR 20..100 degC +93.02 and
    # -74.37 ppm/K; a nichrome share of .444290 makes R(20) = R(100); the drift at 0 degC is then -214.3 ppm.
    chord = {name: (float(ratio(name, 100)[0]) - 1.0) / 80.0 * 1e6 for name in ("nichrome", "constantan")}
    assert chord["nichrome"] == pytest.approx(93.02, abs=0.005)
    assert chord["constantan"] == pytest.approx(-74.37, abs=0.005)
    share = -chord["constantan"] / (chord["nichrome"] - chord["constantan"])
    assert share == pytest.approx(0.444290, abs=1e-6)
    mix = share * float(ratio("nichrome", 0)[0]) + (1.0 - share) * float(ratio("constantan", 0)[0])
    assert 1e6 * (mix - 1.0) == pytest.approx(-214.3, abs=0.06)


@pytest.mark.parametrize(
    ("name", "alpha", "rel"),
    [
        # Textbook alphas at 20 degC per K, a table seen in a copy. Two sources that agree to the
        # purity of the metals: within 0.5 %, platinum (thermometer grade is purer) within 4 %.
        ("tungsten", 0.004403, 0.005),
        ("aluminium", 0.004308, 0.005),
        ("copper_pure", 0.004041, 0.005),
        ("silver", 0.003819, 0.005),
        ("gold", 0.003715, 0.005),
        ("platinum", 0.003729, 0.04),
        # and the IEC 60028 line is lower than pure copper, by less than 3 %
        ("copper", 0.004041, 0.03),
    ],
)
def test_slope_at_20_degc_agrees_with_textbook_alphas(name: str, alpha: float, rel: float) -> None:
    assert float(material(name).slope(np.array([293.15]))[0]) == pytest.approx(alpha, rel=rel)


def test_alloys_lie_where_textbooks_put_them() -> None:
    # Constantan -.000074, manganin +/-.000015 per K at 20 degC: a textbook table seen in a copy. The
    # constantan chord from 20 to 100 degC is that figure; manganin at 20 degC is within it.
    assert (float(ratio("constantan", 100)[0]) - 1.0) / 80.0 == pytest.approx(-74e-6, abs=0.5e-6)
    assert abs(float(material("manganin").slope(np.array([293.15]))[0])) < 15e-6


def test_manganin_spread_is_that_of_its_source() -> None:
    # NBS Monograph 39, from memory: a within +/-10e-6, b -3e-7 to -7e-7, about 25 degC.
    of = material("manganin")
    assert of.spread is not None
    tc1, tc2, _ = of.referred_taylor(298.15)
    assert tc1 == pytest.approx(0.0, abs=1e-15)
    assert (tc2 - of.spread.tc2, tc2 + of.spread.tc2) == pytest.approx((-7e-7, -3e-7), rel=1e-12)
    assert of.spread.tc1 == 10e-6
    assert of.spread.unstated == ("value",)
    assert math.isclose(of.reference, 298.15)
