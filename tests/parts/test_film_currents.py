"""Film parts with a limited current, and refusals whose nearest figure is fed back."""

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from makers import film

from tcplan.errors import InputError
from tcplan.material.files import parse_materials
from tcplan.material.model import Film
from tcplan.parts.count_trade import trade
from tcplan.parts.counts import Cell, count_ratios
from tcplan.parts.films import FilmRules, current_density, film_legs
from tcplan.units import parse_quantity

UM = 1e-6
REFERENCE = 298.15
PER_WIDTH = 600.0  # A/m, 0.6 mA/um
DRAWN = Film(
    min_width=1 * UM,
    width_bias=0.05 * UM,
    end_resistance=35 * UM,
    end_tc1=-900e-6,
    matching=1.5e-2 * UM,
    spacing=0.6 * UM,
    grid=0.1 * UM,
    max_current=PER_WIDTH,
)
FOUR = (("a", 14237.0), ("b", 3763.0), ("c", 812.0), ("d", 22345.0))


def drawn_film(**changes):
    return replace(film("pp", 150.0, 0.5, ohm_per_square=320.0), film=replace(DRAWN, **changes))


def of(legs, rules, **changes):
    return film_legs(drawn_film(**changes), legs, REFERENCE, rules)


def square_film(**changes):
    """Return a film without bias, ends and mismatch: 320 ohm per drawn square."""
    return drawn_film(width_bias=None, end_resistance=None, end_tc1=None, matching=None, **changes)


# ---- what carries a current


def test_a_leg_of_one_square_gets_a_square_of_units():
    # By hand: 1.8 mA at 0.6 mA/um needs 3 um; units of 1 um can be no wider here, so 3 strings, each of 3
    # units of one square, make the 320 ohm of one.
    rules = FilmRules(
        most_count=4, error=1e-6, max_length_squares=1.0, currents=(("a", 1.8e-3),), max_width=UM
    )
    (choice,) = film_legs(square_film(), [("a", 320.0)], REFERENCE, rules).choices
    assert (choice.legs[0].in_series, choice.legs[0].in_parallel) == (3, 3)
    assert choice.area == pytest.approx(9 * 1.6e-6 * 1.6e-6, rel=1e-12)
    assert current_density(choice.legs[0], 1.8e-3) == pytest.approx(PER_WIDTH, rel=1e-12)


def test_a_wider_unit_is_taken_where_its_area_is_less():
    # By hand: 3 um together, 0.6 um between units. One unit of 3 um by 3 um: 3.6 * 3.6 = 12.96 um^2. Nine of
    # 1 um: 9 * 1.6^2 = 23.04. Two by two of 1.5 um: 4 * 2.1^2 = 17.64. Two strings of one unit of 1.5 um by
    # 3 um: 2 * 3.6 * 2.1 = 15.12.
    rules = FilmRules(most_count=4, error=1e-6, currents=(("a", 1.8e-3),))
    (choice,) = film_legs(square_film(), [("a", 320.0)], REFERENCE, rules).choices
    assert (choice.unit.width, choice.unit.length) == pytest.approx((3 * UM, 3 * UM), rel=1e-12)
    assert choice.legs[0].units == 1
    assert choice.area == pytest.approx(12.96e-12, rel=1e-12)


def test_current_density_is_the_hand_figure():
    # By hand: 12 mA in 4 strings of 2 um is 3 mA on 2 um, 1.5 mA/um.
    rules = FilmRules(error=1e-6, currents=(("a", 4.8e-3),), max_width=2 * UM)
    material = square_film(preferred_width=2 * UM)
    leg = film_legs(material, [("a", 320.0)], REFERENCE, rules).choices[0].legs[0]
    assert (leg.in_parallel, leg.unit.width) == (4, pytest.approx(2 * UM, rel=1e-12))
    assert current_density(leg, 12e-3) == pytest.approx(1500.0, rel=1e-12)


@pytest.mark.parametrize("current", [0.4e-3, 3e-3, 17e-3, 90e-3])
@pytest.mark.parametrize("mismatch", [None, 1e-3])
def test_every_choice_carries_every_current(current, mismatch):
    currents = tuple((name, current * (k + 1) / 4) for k, (name, _) in enumerate(FOUR))
    rules = FilmRules(error=5e-3, mismatch=mismatch, currents=currents)
    result = of(FOUR, rules)
    assert result.choices
    offered = [*result.choices, *([result.zero_tc] if result.zero_tc else [])]
    for choice in offered:
        assert choice.error <= 5e-3
        assert choice.unit.width <= 100 * UM * (1 + 1e-9)  # 100 times the least width
        for leg in choice.legs:
            assert leg.ohms == pytest.approx(leg.wanted_ohms, rel=5e-3)
            assert current_density(leg, dict(currents)[leg.id]) <= PER_WIDTH * (1 + 1e-8)
            assert max(leg.in_series, leg.in_parallel) <= 64
            assert mismatch is None or leg.mismatch <= mismatch * (1 + 1e-9)
    assert result.choices[0].area >= of(FOUR, replace(rules, currents=())).choices[0].area


def test_more_current_never_takes_less_area_at_one_width():
    areas = []
    for current in np.linspace(0.0, 30e-3, 16):
        rules = FilmRules(error=0.02, max_width=UM, currents=(("b", float(current)),))
        areas.append(of(FOUR, rules).choices[0].area)
    assert areas == sorted(areas)
    assert areas[-1] > areas[0]


def test_without_a_limit_or_a_current_nothing_changes():
    plain = of(FOUR, FilmRules(error=5e-3))
    assert of(FOUR, FilmRules(error=5e-3, currents=(("b", 1.0),)), max_current=None) == plain
    assert of(FOUR, FilmRules(error=5e-3, currents=(("other", 1.0),))) == plain
    assert of(FOUR, FilmRules(error=5e-3, currents=(("a", 0.0), ("b", 0.59e-3)))) == plain


# ---- exhaustive enumeration


def enumerated(wanted, widths, rules, currents):
    """Return (area, error) of all that no other one beats, by trying everything at the widths given."""
    counts = list(itertools.product(range(1, rules.most_count + 1), repeat=2))
    together = 0.0 if rules.mismatch is None else (DRAWN.matching / rules.mismatch) ** 2 / 2
    found = []
    for width in widths:
        steps = round(width / (0.1 * UM))
        for length in (k * 0.1 * UM for k in range(steps, round(rules.max_length_squares * steps) + 1)):
            unit = 320 * length / (width - 0.05 * UM) + 2 * 35 * UM / width
            fit = [
                [
                    (s * p, abs(unit * s / p / ohms - 1))
                    for s, p in counts
                    if abs(unit * s / p / ohms - 1) <= rules.error
                    and width * length * s * p >= together * (1 - 1e-9)
                    and current / p <= PER_WIDTH * width * (1 + 1e-9)
                ]
                for ohms, current in zip(wanted, currents, strict=True)
            ]
            area = (length + 0.6 * UM) * (width + 0.6 * UM)
            found += [
                (sum(n for n, _ in chosen) * area, max(max(e for _, e in chosen), 1e-6))
                for chosen in itertools.product(*fit)
            ]
    best = []
    for area, off in sorted((round(area, 25), off) for area, off in found):
        if not best or off < best[-1][1] * (1 - 1e-9):
            best.append((area, off))
    return best


# By hand, at 0.6 mA/um and a grid of 0.1 um: 1.5 mA needs 2.5 um, so 2.5 and 1.25, on the grid 1.3 um (one
# and two strings); 3.3 mA needs 5.5 um, so 5.5, 2.75 and 1.375, on the grid 2.8 and 1.4 um; the widest is
# 2 um, which takes the place of those above. Mismatch: (1.5 %*um / 0.75 %)^2 / 2 = 2 um^2, 1.414 um wide.
CASES = [
    ((0.0, 0.0), None, (1.0,)),
    ((1.5e-3, 0.0), None, (1.0, 1.3, 2.0)),
    ((0.7e-3, 1.5e-3), None, (1.0, 1.3, 2.0)),
    ((3.3e-3, 1.1e-3), None, (1.0, 1.4, 2.0)),
    ((0.0, 0.0), 7.5e-3, (1.0, 1.5)),
    ((1.5e-3, 0.7e-3), 7.5e-3, (1.0, 1.3, 1.5, 2.0)),
]


@pytest.mark.parametrize(("currents", "mismatch", "widths"), CASES)
@pytest.mark.parametrize("wanted", [(1000.0, 430.0), (700.0, 1900.0), (333.0, 333.0)])
@pytest.mark.parametrize("most", [4, 5])
def test_the_choices_are_those_of_exhaustive_enumeration(wanted, most, currents, mismatch, widths):
    rules = FilmRules(
        most_count=most,
        error=0.08,
        max_length_squares=4.0,
        mismatch=mismatch,
        currents=(("a", currents[0]), ("b", currents[1])),
        max_width=2 * UM,
    )
    expected = enumerated(wanted, [width * UM for width in widths], rules, currents)
    got = [(c.area, max(c.error, 1e-6)) for c in of(list(zip("ab", wanted, strict=True)), rules).choices]
    assert expected
    if len(expected) <= 12:
        np.testing.assert_allclose(got, expected, rtol=1e-9)
    else:  # both ends, and no point that is not of the trade
        np.testing.assert_allclose((got[0], got[-1]), (expected[0], expected[-1]), rtol=1e-9)
        assert all(any(np.allclose(point, other, rtol=1e-9, atol=0) for other in expected) for point in got)


@pytest.mark.parametrize("seed", range(10))
def test_points_of_another_width_only_take_away_what_they_beat(seed):
    rng = np.random.default_rng(seed)
    wanted = [float(ohms) for ohms in rng.uniform(150, 2500, 2)]
    lengths, ratios = np.arange(10, 45) * 1e-7, count_ratios(5)
    cells = [
        Cell(
            per_length=320 / (w - 0.05e-6),
            ends=70e-6 / w,
            pitch=w + 0.6e-6,
            extra=1e-6,
            least_strings=strings,
        )
        for w, strings in ((1e-6, (1, 3)), (1.6e-6, (1, 2)))
    ]
    first, second = (trade(cell, lengths, wanted, ratios, 0.1) for cell in cells)
    fewer = trade(cells[1], lengths, wanted, ratios, 0.1, first)

    def joint(points):
        kept = []
        for area, off in sorted((point.area, max(point.error, 1e-6)) for point in points):
            if not kept or off < kept[-1][1]:
                kept.append((area, off))
        return kept

    assert first
    assert second
    assert joint((*first, *fewer)) == joint((*first, *second))
    assert all(p >= least for point in first for (_, p), least in zip(point.counts, (1, 3), strict=True))


# ---- refusals, and their figures fed back


def figure(text, unit):
    """Return the figure that a text starts or ends with [unit]."""
    words = text.split(":")[0].split(" of all ")[0].split()
    return parse_quantity(" ".join(words[-2:]), unit)


def test_a_current_above_the_limit_in_every_width_is_refused_with_the_largest():
    # By hand: 4 strings of 2 um, the widest, carry 4 * 2 * 0.6 = 4.8 mA, as two by two, three by three or
    # four by four of a square do at 320 ohm.
    rules = FilmRules(most_count=4, error=1e-3, max_width=2 * UM, currents=(("a", 12e-3),))
    (refusal,) = film_legs(square_film(), [("a", 320.0)], REFERENCE, rules).refusals
    assert (refusal.leg, refusal.rule) == ("a", "current")
    assert refusal.found == "12 mA through leg a"
    assert refusal.nearest == "4.8 mA: 4 strings in parallel, 2 um wide"


def test_a_long_leg_carries_no_more_than_its_units_allow():
    # By hand: 2560 ohm are 8 squares; 4 units of at most 4 squares in series are 16, so 2 strings of 2 um.
    rules = FilmRules(
        most_count=4, error=1e-3, max_length_squares=4.0, max_width=2 * UM, currents=(("a", 9e-3),)
    )
    (refusal,) = film_legs(square_film(), [("a", 2560.0)], REFERENCE, rules).refusals
    assert refusal.nearest == "2.4 mA: 2 strings in parallel, 2 um wide"
    single = replace(rules, most_count=1, max_length_squares=8.0)
    (refusal,) = film_legs(square_film(), [("a", 2560.0)], REFERENCE, single).refusals
    assert refusal.nearest == "1.2 mA: 1 string, 2 um wide"


@pytest.mark.parametrize("seed", range(8))
def test_the_largest_currents_are_carried_and_no_more(seed):
    rng = np.random.default_rng(seed)
    legs = [(name, float(ohms)) for name, ohms in zip("abc", 10 ** rng.uniform(2, 4, 3), strict=True)]
    currents = tuple((name, float(10 ** rng.uniform(-1.5, 0))) for name, _ in legs)
    rules = FilmRules(
        most_count=int(rng.integers(8, 17)),
        error=0.05,
        mismatch=[None, 2e-3][seed % 2],
        currents=currents,
        max_width=float(rng.uniform(2e-6, 9e-6)),
    )
    refusals = of(legs, rules).refusals
    assert {refusal.rule for refusal in refusals} == {"current"}
    nearest = {refusal.leg: figure(refusal.nearest, "A") for refusal in refusals}
    held = {**dict(currents), **nearest}
    assert of(legs, replace(rules, currents=tuple(held.items()))).choices
    last = refusals[-1].leg  # the others are held at their largest beside it
    more = {**held, last: nearest[last] * 1.001}
    again = of(legs, replace(rules, currents=tuple(more.items()))).refusals
    assert [refusal.rule for refusal in again] == ["current"]


def test_a_mismatch_below_that_of_the_widest_unit_is_refused_with_the_least():
    # By hand: 2560 ohm are 8 squares: one unit of 2 um by 16 um, 1.5 % / sqrt(2 * 2 * 16) = 0.1875 %.
    material = replace(square_film(), film=replace(square_film().film, matching=1.5e-2 * UM))
    rules = FilmRules(most_count=1, error=1e-6, mismatch=1e-3, max_width=2 * UM)
    (refusal,) = film_legs(material, [("a", 2560.0)], REFERENCE, rules).refusals
    assert (refusal.leg, refusal.rule) == ("a", "mismatch")
    assert refusal.found == "a mismatch of 0.1 % with units up to 2 um wide, counts up to 1"
    least = parse_quantity(refusal.nearest.removeprefix("a mismatch of "), "1")
    assert least == pytest.approx(1.875e-3, rel=1e-3)
    nearest = replace(rules, mismatch=least)
    assert film_legs(material, [("a", 2560.0)], REFERENCE, nearest).choices
    (free,) = film_legs(material, [("a", 2560.0)], REFERENCE, replace(rules, max_width=None)).choices
    assert free.legs[0].mismatch <= 1e-3
    assert free.unit.width > 2 * UM


def test_the_nearest_value_is_made():
    rules = FilmRules(error=1e-3)
    for wanted in (2.0, 9e6):
        (refusal,) = of([("a", wanted)], rules).refusals
        assert refusal.rule == "count"
        assert of([("a", figure(refusal.nearest, "ohm"))], rules).choices
    exact = FilmRules(error=1e-6, most_count=3)
    (refusal,) = of([("a", 1e6)], exact).refusals
    assert of([("a", figure(refusal.nearest, "ohm"))], exact).choices  # printed to as many digits as it takes


def test_the_nearest_ratio_is_made():
    rules = FilmRules(most_count=4, error=2e-3)
    (refusal,) = of([("a", 1000.0), ("b", 100e3)], rules).refusals
    nearest = parse_quantity(refusal.nearest.split(": ")[1].removesuffix(" for the smallest"), "ohm")
    assert nearest == 6250.0  # by hand: 100 kohm / 4^2
    assert of([("a", nearest), ("b", 100e3)], rules).choices


def test_the_nearest_length_is_drawn():
    # By hand: 1.2 to 1.4 squares of 2 um are 2.4 to 2.8 um; the next on a grid of 2 um is 4 um, 2 squares.
    rules = FilmRules(min_squares=1.2, max_length_squares=1.4, error=0.02)
    (refusal,) = of([("a", 3763.0)], rules, grid=2 * UM).refusals
    assert refusal.rule == "grid"
    assert "1.2 to 1.4 squares at a width of 2 um on a grid of 2 um" in refusal.found
    squares = float(refusal.nearest.split(", ")[1].removesuffix(" squares"))
    assert of([("a", 3763.0)], replace(rules, max_length_squares=squares), grid=2 * UM).choices


@pytest.mark.parametrize("currents", [(), (("a", 5e-3), ("c", 20e-3))])
def test_the_smallest_area_is_enough(currents):
    rules = FilmRules(error=5e-3, currents=currents, max_area=1e-12)
    (refusal,) = of(FOUR, rules).refusals
    assert refusal.rule == "area"
    assert refusal.found == "at most 1 um^2 for all legs of pp"
    nearest = figure(refusal.nearest, "m^2")
    assert of(FOUR, replace(rules, max_area=nearest)).choices
    assert of(FOUR, replace(rules, max_area=nearest * 0.99)).refusals


def test_the_least_error_is_reached():
    rules = FilmRules(most_count=2, error=0.01)
    legs = [("a", 1000.0), ("b", 1500.0)]
    (refusal,) = of(legs, rules).refusals
    assert of(legs, replace(rules, error=figure(refusal.nearest, "1"))).choices


def test_with_too_small_an_error_and_too_large_a_current_the_error_is_said_first():
    rules = FilmRules(most_count=2, error=0.01, currents=(("a", 1.0),))
    legs = [("a", 1000.0), ("b", 1500.0)]
    (refusal,) = of(legs, rules).refusals
    assert refusal.rule == "count"
    wider = replace(rules, error=figure(refusal.nearest, "1"))
    (refusal,) = of(legs, wider).refusals
    assert refusal.rule == "current"
    assert of(legs, replace(wider, currents=(("a", figure(refusal.nearest, "A")),))).choices


# ---- bad input


def test_a_preferred_width_below_the_least_is_refused_when_the_material_is_read():
    table = {
        "source": "invented",
        "reference": "25 degC",
        "valid": ["-60 degC", "160 degC"],
        "tc1": "150 ppm/K",
        "ohm_per_square": "320 ohm",
        "film": {"min_width": "1 um", "preferred_width": "0.5 um"},
    }
    with pytest.raises(InputError) as caught:
        parse_materials({"pp": table}, "films.toml")
    (problem,) = caught.value.problems
    assert "pp.film.preferred_width" in problem.where
    assert problem.found == "500 nm, below min_width"
    assert problem.expected == "at least min_width, 1 um"  # the nearest that can be drawn
    table["film"]["preferred_width"] = "1 um"
    (material,) = parse_materials({"pp": table}, "films.toml").values()
    assert film_legs(material, [("a", 3200.0)], REFERENCE, FilmRules()).choices


def test_a_largest_width_below_the_first_is_refused_with_it():
    rules = FilmRules(max_width=1.5 * UM)
    with pytest.raises(InputError) as caught:
        of(FOUR, rules, preferred_width=2 * UM)
    (problem,) = caught.value.problems
    assert (problem.where, problem.found) == ("max_width of units", "1.5 um")
    assert problem.expected == "at least 2 um, the width that pp starts from"
    assert of(FOUR, replace(rules, max_width=2 * UM, error=0.01), preferred_width=2 * UM).choices


@pytest.mark.parametrize(
    "currents", [(("a", -1e-3),), (("a", math.inf),), (("a", math.nan),), (("a", 1e-3), ("a", 2e-3))]
)
def test_wrong_currents_are_refused(currents):
    with pytest.raises(InputError, match="one current of each leg"):
        FilmRules(currents=currents)


@pytest.mark.parametrize("width", [0.0, -1e-6, math.inf, math.nan])
def test_a_wrong_largest_width_is_refused(width):
    with pytest.raises(InputError, match=r"parts\.max_width"):
        FilmRules(max_width=width)
