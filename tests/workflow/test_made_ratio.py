"""Parts of a ratio, recomputed from ratio.json alone by scalars: no code is shared with what made it."""

from __future__ import annotations

import json
from dataclasses import replace
from itertools import product
from pathlib import Path

import pytest

from tcplan.brief import Brief, parse_brief, read_brief
from tcplan.errors import InputError
from tcplan.parts.films import FilmRules
from tcplan.parts.record import MadeRatio
from tcplan.ratio.pair import Pair
from tcplan.ratio.worst import RatioWorst
from tcplan.workflow import made_ratio
from tcplan.workflow.made_files import ratio_parts_json
from tcplan.workflow.made_ratio import make_ratio_parts
from tcplan.workflow.made_task import PartsRules

EXAMPLE = Path(__file__).parents[2] / "examples" / "sense_divider" / "brief.toml"
RULES = PartsRules()

HEAD = """
schema = 1
title = "Invented pair"
[temperature]
low = "-40 degC"
high = "125 degC"
reference = "25 degC"
[goal]
drift = "{limit}"
judge = "{judge}"
[ratio]
kind = "{kind}"
first = "{first}"
second = "{second}"
"""
SLATE = """
[material.slate]
source = "invented"
reference = "27 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-120 ppm/K"
tc2 = "0.5 ppm/K^2"
ohm_per_square = "320 ohm"
[material.slate.spread]
meaning = "limits"
ohm_per_square = "15 %"
tc1 = "30 ppm/K"
end_resistance = "40 %"
end_tc1 = "200 ppm/K"
[material.slate.film]
min_width = "2 um"
end_resistance = "80 ohm*um"
end_tc1 = "-900 ppm/K"
matching = "1.2 %*um"
spacing = "0.6 um"
"""
OCHRE = """
[material.ochre]
source = "invented"
reference = "20 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "150 ppm/K"
tc2 = "0.4 ppm/K^2"
ohm_per_square = "120 ohm"
[material.ochre.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "40 ppm/K"
[material.ochre.film]
min_width = "2 um"
width_bias = "0.05 um"
matching = "1 %*um"
spacing = "0.6 um"
"""
FLAT = """
[material.flat]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "0 ppm/K"
series = "E96"
[material.flat.spread]
meaning = "limits"
value = "0.1 %"
tcr = "25 ppm/K"
"""
WIRE = """
[material.up]
source = "invented"
reference = "20 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "93 ppm/K"
ohm_per_metre = "13.8 ohm/m"
[material.up.spread]
meaning = "limits"
ohm_per_metre = "2 %"
tc1 = "10 ppm/K"
"""


def pair(
    first: str,
    second: str,
    materials: str,
    *,
    kind: str = "gain",
    limit: str = "9000 ppm",
    judge: str = "worst-case",
) -> Brief:
    head = HEAD.format(limit=limit, judge=judge, kind=kind, first=first, second=second)
    return parse_brief(head + materials, "brief.toml", Path())


def data_of(made: MadeRatio) -> dict:
    """Return ratio.json as a reader of the file has it."""
    return json.loads(ratio_parts_json(made))


# --- the scalar twin: laws, units, resistors, drift ------------------------------------------------------

LAWS = {  # reference degC, TC1 ppm/K, TC2 ppm/K^2, as the briefs above state them
    "slate": (27.0, -120.0, 0.5),
    "slate_ends": (27.0, -900.0, 0.0),
    "ochre": (20.0, 150.0, 0.4),
    "flat": (25.0, 0.0, 0.0),
    "up": (20.0, 93.0, 0.0),
}


def law(name: str, t: float) -> float:
    """Return R(t)/R(25 degC) of a material."""

    def device(at: float) -> float:
        reference, tc1, tc2 = LAWS[name]
        x = at - reference
        return 1 + tc1 * 1e-6 * x + tc2 * 1e-6 * x * x

    return device(t) / device(25.0)


def leg_ohms(leg: dict, t: float) -> float:
    """Return the resistance of a leg of ratio.json at a temperature [degC]."""
    own = leg["material"]
    if leg["kind"] == "film":
        unit = leg["unit_body_ohms"] * law(own, t)
        if leg["unit_ends_ohms"]:
            unit += leg["unit_ends_ohms"] * law(f"{own}_ends", t)
        return unit * leg["in_series"] / leg["in_parallel"]
    if leg["kind"] == "stock":
        (value,) = leg["values_ohms"]
        return value * law(own, t)
    return leg["length_m"] * leg["ohm_per_metre"] * law(own, t)


def ratio_at(data: dict, t: float, kind: str = "gain") -> float:
    """Return first/second, or second/(first + second), of resistors whose legs are in series."""
    first, second = (sum(leg_ohms(leg, t) for leg in data["parts"][side]) for side in ("first", "second"))
    return first / second if kind == "gain" else second / (first + second)


def peak_ppm(data: dict, kind: str = "gain") -> float:
    at = ratio_at(data, 25.0, kind)
    return max(abs(ratio_at(data, -40 + 165 * k / 3000, kind) / at - 1) for k in range(3001)) * 1e6


def centroids(placement: dict, sides: dict[str, int], pitch: tuple[float, float]) -> list[tuple]:
    """Return the centre of the units of each side, from the rows as text."""
    found = []
    for side in (0, 1):
        cells = [
            (x * pitch[0], y * pitch[1])
            for y, row in enumerate(placement["rows"])
            for x, name in enumerate(row.split(" "))
            if name != "." and sides[name] == side
        ]
        found.append(tuple(sum(cell[k] for cell in cells) / len(cells) for k in (0, 1)))
    return found


# --- one film --------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def divider() -> MadeRatio:
    return make_ratio_parts(read_brief(EXAMPLE), RULES)


def test_one_film_is_made_of_common_units_and_its_ratio_is_exact(divider: MadeRatio) -> None:
    """90 kohm over 10 kohm is 9 units over 1, or a multiple: the ratio is then 0.1 whatever a unit is."""
    data = data_of(divider)
    legs = [*data["parts"]["first"], *data["parts"]["second"]]
    assert len({(leg["width_m"], leg["length_m"], leg["unit_body_ohms"]) for leg in legs}) == 1
    first, second = (leg["in_series"] / leg["in_parallel"] for leg in legs)
    assert first == 9 * second
    assert data["parts"]["made"]["ratio"]["value"] == pytest.approx(0.1, rel=1e-14)
    for leg in legs:  # 320 ohm per square at 27 degC, carried to 25 by its law; 0.1 % asked
        unit = 320 * (1 - 120e-6 * -2 + 0.55e-6 * 4) * leg["length_m"] / leg["width_m"]
        assert leg["ohms"] == pytest.approx(unit * leg["in_series"] / leg["in_parallel"], rel=1e-9)
        assert leg["ohms"] == pytest.approx(leg["wanted_ohms"], rel=1e-3)
        count = leg["in_series"] * leg["in_parallel"]
        area = leg["width_m"] * leg["length_m"] * count  # a single one carries 1/sqrt(2) of a pair's
        assert leg["mismatch"] == pytest.approx(1.2e-8 / (2 * area) ** 0.5, rel=1e-12)


def test_only_what_keeps_the_sides_apart_is_left_of_the_drift(divider: MadeRatio) -> None:
    """TC1 of the sides 3 ppm/K apart: of a divider of 0.1 that is 0.9 * 3 ppm/K * 100 K = 270 ppm at 125."""
    made = data_of(divider)["parts"]["made"]
    assert made["nominal"]["figure_ppm"] == pytest.approx(0.0, abs=1e-6)
    assert made["worst_case"]["figure_ppm"] == pytest.approx(270.0, rel=0.02)
    assert made["verdict"] == "MET"


def test_its_mismatch_is_that_of_its_two_sides(divider: MadeRatio) -> None:
    """A divider k = 0.1 moves by (1 - k) of either side's error: independent, so in root-sum-square."""
    data = data_of(divider)
    sigmas = [data["parts"][side][0]["mismatch"] for side in ("first", "second")]
    by_hand = 0.9 * (sigmas[0] ** 2 + sigmas[1] ** 2) ** 0.5 * 1e6
    assert data["parts"]["made"]["mismatch"]["sigma_ppm"] == pytest.approx(by_hand, rel=1e-6)


def test_both_sides_have_one_centroid(divider: MadeRatio) -> None:
    data = data_of(divider)
    [placement] = data["parts"]["placement"]
    one, other = centroids(placement, {"a": 0, "b": 1}, tuple(placement["pitch_m"]))
    assert one == pytest.approx(other, abs=1e-12)
    assert placement["why_not"] == ""
    assert all(row.startswith(".") and row.endswith(".") for row in placement["rows"])
    cells = " ".join(placement["rows"]).split(" ")
    legs = data["parts"]["first"][0], data["parts"]["second"][0]
    assert (cells.count("a"), cells.count("b")) == tuple(leg["in_series"] for leg in legs)


def test_one_unit_against_one_has_no_common_centroid() -> None:
    rules = PartsRules(films=FilmRules(most_count=1))
    made = make_ratio_parts(pair("ochre 6 kohm", "ochre 6 kohm", OCHRE), rules)
    [placement] = data_of(made)["parts"]["placement"]
    assert made.first[0].units == made.second[0].units == 1
    assert placement["centroid_distance_m"] > 0.0
    assert placement["why_not"] != ""


def test_ends_do_not_move_a_ratio_of_common_units() -> None:
    """Every unit has the same ends, so both sides change alike: exact and flat, though the units are not."""
    made = make_ratio_parts(pair("slate 12 kohm", "slate 8 kohm", SLATE, limit="100 ppm"), RULES)
    data = data_of(made)
    assert data["parts"]["first"][0]["unit_ends_ohms"] == pytest.approx(80.0, rel=0.01)  # 2 * 80 ohm*um/2 um
    assert ratio_at(data, 25.0) == pytest.approx(1.5, rel=1e-12)
    assert peak_ppm(data) < 1e-6
    assert data["parts"]["made"]["worst_case"]["figure_ppm"] < 1e-3


def test_a_ratio_that_no_count_meets_is_within_the_errors_of_its_legs() -> None:
    rules = PartsRules(films=FilmRules(error=5e-3))
    data = data_of(make_ratio_parts(pair("ochre 31.4159 kohm", "ochre 10 kohm", OCHRE), rules))
    off = data["parts"]["made"]["ratio"]["value"] / 3.14159 - 1
    assert 0.0 < abs(off) <= 1.01 * (5e-3 + 5e-3)
    assert data["ratio"]["value"] == pytest.approx(3.14159, rel=1e-12)  # the ideal one stays beside it


# --- two films, stock, wire ------------------------------------------------------------------------------


def test_two_films_by_the_scalar_twin() -> None:
    """slate + ochre over slate: value, peak and its verdict, from the units of the file."""
    brief = pair("slate 12 kohm + ochre 3 kohm", "slate 5 kohm", SLATE + OCHRE)
    data = data_of(make_ratio_parts(brief, RULES))
    made = data["parts"]["made"]
    assert [leg["material"] for leg in data["parts"]["first"]] == ["slate", "ochre"]
    assert [leg["id"] for leg in (*data["parts"]["first"], *data["parts"]["second"])] == ["a", "b", "c"]
    assert made["ratio"]["value"] == pytest.approx(ratio_at(data, 25.0), rel=1e-12)
    assert made["nominal"]["figure_ppm"] == pytest.approx(peak_ppm(data), rel=1e-5)
    assert made["worst_case"]["figure_ppm"] > made["nominal"]["figure_ppm"]
    assert sorted(made["materials"]) == ["ochre", "slate", "slate_ends"]
    units = {leg["material"]: set() for leg in data["parts"]["first"]}
    for leg in (*data["parts"]["first"], *data["parts"]["second"]):
        units[leg["material"]].add((leg["width_m"], leg["length_m"]))
    assert all(len(found) == 1 for found in units.values())
    assert [one["material"] for one in data["parts"]["placement"]] == ["slate", "ochre"]  # never interleaved


def test_the_film_of_one_side_alone_is_placed_without_sides() -> None:
    data = data_of(make_ratio_parts(pair("ochre 9 kohm", "slate 6 kohm", SLATE + OCHRE), RULES))
    for placement in data["parts"]["placement"]:
        assert placement["centroid_distance_m"] is None
    assert data["parts"]["made"]["nominal"]["figure_ppm"] == pytest.approx(peak_ppm(data), rel=1e-5)


def test_the_least_area_within_the_limit_is_taken_and_else_the_least_figure() -> None:
    """Of the same pair with an easy and with a hopeless limit."""
    easy = make_ratio_parts(pair("slate 12 kohm", "ochre 3 kohm", SLATE + OCHRE, limit="5 %"), RULES)
    hard = make_ratio_parts(pair("slate 12 kohm", "ochre 3 kohm", SLATE + OCHRE, limit="10 ppm"), RULES)
    assert (easy.checked.verdict, hard.checked.verdict) == ("MET", "NOT MET")
    assert sum(c.area for c in easy.choices) <= sum(c.area for c in hard.choices)
    assert hard.checked.worst.upper <= easy.checked.worst.upper


ENDS = SLATE + OCHRE.replace(
    "matching", 'end_resistance = "20 ohm*um"\nend_tc1 = "-700 ppm/K"\nmatching'
).replace('tc1 = "40 ppm/K"', 'tc1 = "40 ppm/K"\nend_resistance = "30 %"\nend_tc1 = "150 ppm/K"')


def alike() -> Brief:
    """Return two films with ends, both resistors of one mix, whose sides track to 2 ppm/K."""
    brief = pair("slate 12 kohm + ochre 9 kohm", "slate 4 kohm + ochre 3.0001 kohm", ENDS, limit="700 ppm")
    assert brief.ratio is not None
    return replace(brief, ratio=replace(brief.ratio, tracking=2e-6))


def bounded(monkeypatch: pytest.MonkeyPatch) -> list[float]:
    """Return a list that every closed bound goes into."""
    found: list[float] = []
    own = made_ratio.worst_of

    def counted(given: Pair) -> RatioWorst:
        worst = own(given)
        found.append(worst.upper)
        return worst

    monkeypatch.setattr(made_ratio, "worst_of", counted)
    return found


def test_two_films_with_ends_that_track_are_judged(monkeypatch: pytest.MonkeyPatch) -> None:
    """To first order 2 ppm/K times 100 K; one bound is closed, and the least area of all ways taken."""
    found = bounded(monkeypatch)
    made = make_ratio_parts(alike(), RULES)
    assert len(found) == 1
    assert made.checked.verdict == "MET"
    worst = made.checked.worst
    assert worst is not None
    assert worst.judged.figure == pytest.approx(200e-6, rel=0.1)
    assert worst.judged.figure <= worst.upper <= 1.02 * worst.judged.figure


@pytest.mark.parametrize("open_ones", [1, 9])
def test_the_next_larger_way_is_taken_where_a_bound_stays_open(
    monkeypatch: pytest.MonkeyPatch, open_ones: int
) -> None:
    """Ways of 4, 3, 2 .. units of area whose corner devices all keep the limit; bounds that do not."""
    brief = pair("slate 12 kohm", "ochre 3 kohm", SLATE + OCHRE, limit="5 %")
    first = make_ratio_parts(brief, RULES)
    asked: list[int] = []

    def surely(sides: object, own: object) -> float:
        asked.append(1)
        return 1.0 / len(asked) if len(asked) <= open_ones else 1e-9

    monkeypatch.setattr(made_ratio, "_surely", surely)
    made = make_ratio_parts(brief, RULES)
    assert len(asked) <= 5
    assert sum(p.area for p in made.placements) > sum(p.area for p in first.placements)
    assert len(asked) == min(5, 1 + open_ones) or open_ones > len(asked)


def e96() -> list[float]:
    """Return the E96 values from 1 to 999 kohm: 10^(i/96) to three digits (IEC 60063)."""
    return [round(10 ** (i / 96), 2) * 10.0**d for d in range(6) for i in range(96)]


def nearest(ohms: float, count: int = 5) -> list[float]:
    return sorted(e96(), key=lambda one: abs(one / ohms - 1))[:count]


def tried_by_hand(error: float) -> tuple[float, ...]:
    """Return the 5 nearest E96 values of each leg, all tried: 8.25 k + 1.2 k over 1.53 k.

    Of those within the error of the ratio the nearest legs, else the nearest ratio.
    """
    asked = 8250.0, 1200.0, 1530.0
    wanted = 9450.0 / 1530.0

    def order(chosen: tuple[float, ...]) -> tuple[float, float]:
        off = round(abs((chosen[0] + chosen[1]) / chosen[2] / wanted - 1), 12)
        legs = round(max(abs(one / other - 1) for one, other in zip(chosen, asked, strict=True)), 12)
        return (0.0, legs) if off <= error else (off, legs)

    return min(product(*(nearest(one) for one in asked)), key=order)


@pytest.mark.parametrize("error", [1e-7, 1e-3, 2e-3, 1e-2])
def test_stock_values_are_the_nearest_that_make_the_ratio(error: float) -> None:
    """IEC 60063 again by 10^(i/96); the error asked lets the legs stay where they were asked."""
    rules = PartsRules(films=FilmRules(error=error))
    made = make_ratio_parts(pair("flat 8.25 kohm + flat 1.2 kohm", "flat 1.53 kohm", FLAT), rules)
    data = data_of(made)
    legs = [*data["parts"]["first"], *data["parts"]["second"]]
    assert [leg["joined"] for leg in legs] == ["one"] * 3
    assert [leg["values_ohms"][0] for leg in legs] == pytest.approx(tried_by_hand(error), rel=1e-12)
    assert data["parts"]["placement"] == []


def test_a_divider_of_bought_parts_stays_near_what_was_asked() -> None:
    """17.3 k and 4.4 k: 17.4 k and 4.42 k make 0.202566, 979 ppm off; 17.8 k and 4.53 k are 499 ppm off."""
    made = make_ratio_parts(pair("flat 17.3 kohm", "flat 4.4 kohm", FLAT, kind="divider"), RULES)
    assert [leg.ohms for leg in (*made.first, *made.second)] == pytest.approx([17400.0, 4420.0])
    close = make_ratio_parts(
        pair("flat 17.3 kohm", "flat 4.4 kohm", FLAT, kind="divider"),
        PartsRules(films=FilmRules(error=5e-4)),
    )
    assert [leg.ohms for leg in (*close.first, *close.second)] == pytest.approx([17800.0, 4530.0])
    assert close.error == 5e-4


def test_bought_parts_have_each_a_tcr_of_their_own() -> None:
    """25 ppm/K against 25 ppm/K at 100 K: 1.0025/0.9975 - 1 (|dR/R| <= k |x|, each with its own sign)."""
    made = make_ratio_parts(pair("flat 9.09 kohm", "flat 1 kohm", FLAT), RULES)
    data = data_of(made)["parts"]["made"]
    assert data["worst_case"]["figure_ppm"] == pytest.approx((1.0025 / 0.9975 - 1) * 1e6, rel=1e-3)
    assert sorted(data["materials"]) == ["flat_a1", "flat_b1"]
    assert made.ideal.worst.upper < 1.0e-9  # as one material both would be alike


@pytest.mark.parametrize("first", ["up 300 ohm", "up 180 ohm + up 120 ohm"])
def test_wire_is_cut_on_both_sides(first: str) -> None:
    """Cuts of one spool, on whichever side they are; 13.8 ohm/m at 20 degC, carried to 25."""
    made = make_ratio_parts(pair(first, "up 100 ohm", WIRE), RULES)
    data = data_of(made)
    legs = [*data["parts"]["first"], *data["parts"]["second"]]
    for leg in legs:
        metres = leg["wanted_ohms"] / (13.8 * (1 + 93e-6 * 5))
        assert leg["length_m"] == pytest.approx(metres, abs=0.5e-3 + 1e-9)
    assert data["parts"]["made"]["ratio"]["value"] == pytest.approx(ratio_at(data, 25.0), rel=1e-12)
    assert sorted(data["parts"]["made"]["materials"]) == ["up"]
    assert data["parts"]["made"]["nominal"]["figure_ppm"] == pytest.approx(0.0, abs=1e-6)


def test_a_film_beside_a_bought_part() -> None:
    data = data_of(make_ratio_parts(pair("ochre 4.7 kohm", "flat 1 kohm", OCHRE + FLAT), RULES))
    assert [data["parts"][side][0]["kind"] for side in ("first", "second")] == ["film", "stock"]
    assert data["parts"]["made"]["ratio"]["value"] == pytest.approx(ratio_at(data, 25.0), rel=1e-12)
    assert data["parts"]["made"]["nominal"]["figure_ppm"] == pytest.approx(peak_ppm(data), rel=1e-5)


def test_a_nominal_judge_needs_no_spread() -> None:
    bare = OCHRE[: OCHRE.index("[material.ochre.spread]")] + OCHRE[OCHRE.index("[material.ochre.film]") :]
    made = make_ratio_parts(pair("ochre 9 kohm", "ochre 3 kohm", bare, judge="nominal"), RULES)
    assert made.checked.verdict == "MET"
    assert made.checked.worst is None
    assert made.checked.value == pytest.approx(3.0, rel=1e-12)


# --- what is refused -------------------------------------------------------------------------------------


def test_too_many_materials_are_refused_by_name() -> None:
    brief = pair("flat 9 kohm + flat 8 kohm + flat 7 kohm", "flat 1 kohm + flat 2 kohm", FLAT)
    with pytest.raises(InputError) as caught:
        make_ratio_parts(brief, RULES)
    [problem] = caught.value.problems
    assert problem.where == "parts of a ratio"
    assert "5 materials: flat_a1, flat_b1, flat_c1, flat_d1, flat_e1" in problem.found
    assert problem.expected.startswith("4 at most")
    four = make_ratio_parts(pair("flat 9 kohm + flat 8 kohm", "flat 1 kohm + flat 2 kohm", FLAT), RULES)
    assert len(four.checked.pair.names) == 4


def test_what_can_not_be_drawn_is_told_for_every_film() -> None:
    brief = pair("slate 12 kohm", "ochre 3 kohm", SLATE + OCHRE)
    with pytest.raises(InputError) as caught:
        make_ratio_parts(brief, replace(RULES, films=FilmRules(max_area=1e-14)))
    assert {problem.where for problem in caught.value.problems} == {"leg a", "leg b"}
    assert all("area" in problem.expected for problem in caught.value.problems)
