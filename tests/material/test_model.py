"""Material: checked at construction, exact inverse, sizes at the material's own reference."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tcplan.errors import InputError
from tcplan.material.law import Expression, Law, Platinum, Polynomial, SteinhartHart, Table, Thermistor
from tcplan.material.model import Film, Material, material_from_dict
from tcplan.material.spread import Spread

LAW = Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6))
VALID = (218.15, 423.15)
FILM = Film(
    min_width=1e-6,
    width_bias=0.05e-6,
    end_resistance=35e-6,
    end_tc1=-900e-6,
    matching=1.2e-8,
    spacing=0.6e-6,
    grid=5e-9,
    max_current=600.0,
)


def film(**changes: Any) -> Material:
    given: dict[str, Any] = {
        "name": "red_film",
        "label": "Red film, 320 ohm per square",
        "source": "process table, rev C",
        "law": LAW,
        "valid": VALID,
        "kind": "film",
        "ohm_per_square": 320.0,
        "spread": Spread(meaning="limits", value=0.15, tc1=40e-6, tc2=0.1e-6),
        "film": FILM,
    }
    return Material(**{**given, **changes})


def plain(law: Law = LAW, **changes: Any) -> Material:
    given: dict[str, Any] = {
        "name": "m",
        "label": "m",
        "source": "s",
        "law": law,
        "valid": VALID,
        "kind": "plain",
    }
    return Material(**{**given, **changes})


def problems_of(build: Any, **changes: Any) -> list[str]:
    with pytest.raises(InputError) as caught:
        build(**changes)
    return [problem.where for problem in caught.value.problems]


def test_ratio_is_referred_to_the_reference_of_the_brief() -> None:
    T = np.array([233.15, 298.15, 398.15])
    ratio = film().ratio(T, 298.15)
    assert ratio[1] == 1.0
    for t, value in zip(T, ratio, strict=True):  # plain floats, from the definition of TC1 and TC2
        at = 1.0 - 120e-6 * (t - 300.15) + 0.55e-6 * (t - 300.15) ** 2
        there = 1.0 - 120e-6 * -2.0 + 0.55e-6 * 4.0
        assert value == pytest.approx(at / there, rel=1e-14)


def test_referred_taylor_shifts_the_coefficients() -> None:
    # By hand, d the shift: a' = (a + 2 b d)/D, b' = b/D, D = 1 + a d + b d^2.
    d = -2.0
    D = 1.0 - 120e-6 * d + 0.55e-6 * d**2
    tc1, tc2, tc3 = film().referred_taylor(298.15)
    assert tc1 == pytest.approx((-120e-6 + 2 * 0.55e-6 * d) / D, rel=1e-12)
    assert tc2 == pytest.approx(0.55e-6 / D, rel=1e-12)
    assert tc3 == pytest.approx(0.0, abs=1e-18)


def test_slope_is_the_derivative_of_ln_r() -> None:
    T, h = np.array([250.0, 300.15, 400.0]), 1e-3
    numeric = (np.log(film().ratio(T + h, 298.15)) - np.log(film().ratio(T - h, 298.15))) / (2 * h)
    np.testing.assert_allclose(film().slope(T), numeric, rtol=1e-6)


def test_squares_count_the_value_at_the_own_reference() -> None:
    steep = film(law=Polynomial(reference=273.15, coefficients=(0.004,)), spread=None)
    # 1080 ohm at 20 degC is 1000 ohm at 0 degC for 0.004 per K at 0 degC (definition).
    assert steep.squares(1080.0, 293.15) == pytest.approx(1000.0 / 320.0, rel=1e-12)
    assert steep.squares(320.0, 273.15) == pytest.approx(1.0, rel=1e-15)
    assert steep.length(320.0, 273.15) is None


def test_length_of_a_wire() -> None:
    wire = plain(kind="wire", ohm_per_metre=8.5, law=Polynomial(reference=273.15, coefficients=(0.004,)))
    assert wire.length(1080.0, 293.15) == pytest.approx(1000.0 / 8.5, rel=1e-12)
    assert wire.squares(1080.0, 293.15) is None


LAWS: tuple[Law, ...] = (
    LAW,
    Platinum(reference=273.15),
    Thermistor(reference=298.15, beta=3435.0),
    # constants published widely, for (5 degC, 25000 ohm), (25, 10000), (45, 4000)
    SteinhartHart(reference=298.15, a=2.108508173e-3, b=0.7979204727e-4, c=6.535076315e-7),
    Table(reference=298.15, points=((210.0, 0.9), (298.15, 1.0), (440.0, 1.2))),
    Expression(reference=298.15, text="exp(B*(1/T - 1/T0))", constants=(("B", 1234.5),)),
)


@pytest.mark.parametrize("law", LAWS, ids=lambda law: law.kind)
def test_dict_round_trip_is_exact_also_through_json(law: Law) -> None:
    for material in (
        plain(law=law),
        film(
            law=law,
            spread=None,
            extrapolated=(210.0, 440.0),
            extrapolation=Spread(meaning="limits", tc1=1e-5),
        ),
        plain(law=law, kind="part", series="E96", spread=Spread(meaning="sigma", value=0.01)),
    ):
        data = json.loads(json.dumps(material.to_dict(), allow_nan=False))
        assert material_from_dict(data) == material


def test_dict_of_a_film_is_self_sufficient() -> None:
    data = film().to_dict()
    assert data["film"]["end_resistance_ohm_m"] == 35e-6
    assert data["valid_K"] == [218.15, 423.15]
    assert data["film"]["etch"] is None
    assert data["spread"] == {
        "meaning": "limits",
        "value": 0.15,
        "tc1_per_K": 40e-6,
        "tc2_per_K2": 0.1e-6,
        "end_resistance": None,
        "end_tc1_per_K": None,
        "width_bias_m": None,
        "tcr_per_K": None,
        "shape": "normal",
    }


@pytest.mark.parametrize("damage", ["law", "film", "name", "valid_K"])
def test_damaged_data_are_refused_with_a_message(damage: str) -> None:
    data = film().to_dict()
    del data[damage]
    with pytest.raises(InputError, match="missing or wrong entry"):
        material_from_dict(data)


def test_data_of_the_wrong_type_are_refused() -> None:
    for wrong in (None, [], 3.0):
        with pytest.raises(InputError):
            material_from_dict({**film().to_dict(), "law": wrong})
        with pytest.raises(InputError):
            material_from_dict({**film().to_dict(), "name": wrong})


@pytest.mark.parametrize(
    "name",
    [
        "",
        "9x",
        "two words",
        "a\nb",
        "a,b",
        'a"b',
        "a=b",
        "<script>",
        "a'b",
        "a.b",
        "x" * 41,
        "é",
        "m\n",
    ],
)
def test_names_that_could_do_harm_are_refused(name: str) -> None:
    with pytest.raises(InputError) as caught:
        plain(name=name)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("label", ["two\nlines", "\x1b[31m", "", "   ", "x" * 121, "a\u2028b"])
def test_labels_are_one_printable_line(label: str) -> None:
    assert problems_of(plain, label=label) == ["material.m.label"]


def test_a_label_may_hold_any_printable_character() -> None:
    label = "=cmd|' /C calc'!A0 <b>\u03a9/sq</b>, \"320\""  # writers escape it
    assert plain(label=label).label == label


def test_no_source_no_material() -> None:
    assert problems_of(plain, source="") == ["material.m.source"]


@pytest.mark.parametrize("valid", [(423.15, 218.15), (300.0, 300.0), (math.nan, 400.0), (-5.0, 400.0)])
def test_the_valid_range_runs_upwards(valid: tuple[float, float]) -> None:
    assert problems_of(plain, valid=valid) == ["material.m.valid"]


@pytest.mark.parametrize("tc1", [-8000e-6, -20000e-6])
def test_a_law_that_reaches_zero_in_its_range_is_refused(tc1: float) -> None:
    law = Polynomial(reference=298.15, coefficients=(tc1,))
    with pytest.raises(InputError, match=r"material\.m"):
        plain(law=law)


@pytest.mark.parametrize(
    "changes",
    [
        {"kind": "film"},
        {"kind": "plain", "ohm_per_square": 320.0},
        {"kind": "film", "ohm_per_square": 320.0, "series": "E96"},
        {"kind": "blob"},
    ],
)
def test_the_kind_and_the_size_go_together(changes: dict[str, Any]) -> None:
    assert problems_of(plain, **changes) == ["material.m"]


@pytest.mark.parametrize("size", [0.0, -1.0, math.nan, math.inf])
def test_sizes_are_finite_and_above_zero(size: float) -> None:
    assert problems_of(plain, kind="wire", ohm_per_metre=size) == ["material.m.ohm_per_metre"]


def test_an_unknown_series_is_refused() -> None:
    with pytest.raises(InputError, match="E96"):
        plain(kind="part", series="E69")


def test_film_data_belong_to_films() -> None:
    assert problems_of(plain, film=FILM) == ["material.m.film"]


@pytest.mark.parametrize(
    ("changes", "where"),
    [
        ({"min_width": 0.0}, "film.min_width"),
        ({"grid": -5e-9}, "film.grid"),
        ({"matching": math.nan}, "film.matching"),
        ({"end_tc1": math.inf}, "film.end_tc1"),
        ({"width_bias": 1e-6}, "film.width_bias"),
        ({"preferred_width": 0.5e-6}, "film.preferred_width"),
    ],
)
def test_wrong_film_data_are_refused(changes: dict[str, float], where: str) -> None:
    given: dict[str, Any] = {"min_width": 1e-6, **changes}
    assert problems_of(Film, **given) == [where]


def test_extrapolation_widens_the_range_and_the_spread() -> None:
    wide = film(extrapolated=(208.15, 448.15), extrapolation=Spread(meaning="limits", tc1=20e-6))
    assert wide.usable == (208.15, 448.15)
    assert film().usable == VALID
    assert not wide.is_extrapolated(*VALID)
    assert wide.is_extrapolated(218.15, 423.16)
    assert wide.effective_spread(*VALID) == wide.spread
    beyond = wide.effective_spread(208.15, 423.15)
    assert beyond is not None
    assert beyond.tc1 == pytest.approx(60e-6, rel=1e-14)
    assert plain().effective_spread(200.0, 500.0) is None


WIDTHS = Film(min_width=1e-6, preferred_width=2e-6, width_bias=0.1e-6, etch="poly", end_resistance=35e-6)


def test_the_effective_spread_covers_the_width_error_of_the_width_that_is_drawn() -> None:
    spread = Spread(meaning="limits", value=0.15, tc1=40e-6, width_bias=0.05e-6)
    wide = film(film=WIDTHS, spread=spread)
    assert (wide.width, wide.effective_width) == pytest.approx((2e-6, 1.9e-6), rel=1e-14)
    effective = wide.effective_spread(*VALID)
    assert effective is not None
    assert effective.value == pytest.approx(1.15 / (1 - 0.05 / 1.9) - 1, rel=1e-13)  # by hand
    text = (Path(__file__).parents[2] / "docs" / "input.md").read_text(encoding="utf-8")
    assert f"For 15 %, 0.05 um and W = 1.9 um that is {100 * effective.value:.1f} %." in text
    assert (effective.tc1, effective.width_bias) == (40e-6, 0.0)
    assert wide.spread == spread  # plain, for draws
    least = film(film=FILM, spread=spread).effective_spread(*VALID)
    assert least is not None
    assert least.value == pytest.approx(1.15 / (1 - 0.05 / 0.95) - 1, rel=1e-13)


def test_extrapolation_is_added_to_the_widened_value() -> None:
    spread = Spread(meaning="sigma", value=0.05, width_bias=0.01e-6)
    added = Spread(meaning="limits", tc1=20e-6)
    wide = film(film=WIDTHS, spread=spread, extrapolated=(208.15, 448.15), extrapolation=added)
    beyond = wide.effective_spread(208.15, 423.15)
    assert beyond is not None
    assert beyond.tc1 == 20e-6
    assert beyond.value == pytest.approx(1.15 / (1 - 0.03 / 1.9) - 1, rel=1e-13)  # sigma counts three times


@pytest.mark.parametrize(
    ("spread", "changes", "where"),
    [
        ({"width_bias": 1e-8}, {"film": None}, "red_film.spread.width_bias"),
        ({"width_bias": 1e-8}, {"film": None, "kind": "plain", "ohm_per_square": None}, "width_bias"),
        ({"end_resistance": 0.4}, {"film": Film(min_width=1e-6)}, "red_film.spread.end_resistance"),
        ({"end_tc1": 1e-4}, {"film": Film(min_width=1e-6)}, "red_film.spread.end_tc1"),
        ({"tcr": 25e-6}, {}, "red_film.spread.tcr"),
        ({"width_bias": 1.9e-6}, {"film": WIDTHS}, "red_film.spread.width_bias"),
        ({"value": 0.8, "width_bias": 0.2e-6}, {"film": WIDTHS}, "red_film.spread.width_bias"),
    ],
)
def test_a_half_width_needs_what_it_belongs_to(
    spread: dict[str, float], changes: dict[str, Any], where: str
) -> None:
    [found] = problems_of(film, spread=Spread(meaning="limits", **spread), **changes)  # type: ignore[arg-type]
    assert found.endswith(where)


def test_etch_is_a_name_and_is_kept() -> None:
    made = film(film=WIDTHS)
    assert material_from_dict(json.loads(json.dumps(made.to_dict()))) == made
    assert made.to_dict()["film"]["etch"] == "poly"
    assert problems_of(Film, min_width=1e-6, etch="a b") == ["film.etch"]


def test_extrapolation_needs_an_added_spread_and_the_other_way_round() -> None:
    assert problems_of(plain, extrapolated=(200.0, 450.0)) == ["material.m.extrapolation"]
    zero = Spread(meaning="limits", tc1=0.0)
    assert problems_of(plain, extrapolated=(200.0, 450.0), extrapolation=zero) == ["material.m.extrapolation"]
    assert problems_of(plain, extrapolation=Spread(meaning="limits", tc1=1e-5)) == [
        "material.m.extrapolate_to"
    ]


def test_all_mistakes_are_told_at_once() -> None:
    where = problems_of(plain, label="a\nb", source="", valid=(400.0, 300.0), film=FILM, kind="film")
    assert where == ["material.m.label", "material.m.source", "material.m.valid", "material.m"]
