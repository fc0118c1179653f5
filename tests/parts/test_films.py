"""Film parts: the unit by hand figures, the counts against exhaustive enumeration, and every refusal."""

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from makers import brute_ratio, film, grid, leg

from tcplan.errors import InputError
from tcplan.material.model import Film
from tcplan.network import Series
from tcplan.parts import assembled, ends_material, ends_name
from tcplan.parts.count_trade import trade
from tcplan.parts.counts import Cell, count_ratios
from tcplan.parts.films import FilmRules, film_legs, zero_tc_length
from tcplan.parts.placement import place
from tcplan.parts.range_least import RangeLeast

UM = 1e-6
REFERENCE = 298.15
DRAWN = Film(
    min_width=1 * UM,
    preferred_width=2 * UM,
    width_bias=0.05 * UM,
    end_resistance=35 * UM,
    end_tc1=-900e-6,
    matching=1.5e-2 * UM,
    spacing=0.6 * UM,
    grid=5e-9,
)
SIX = (("a", 14237.0), ("b", 3763.0), ("c", 812.0), ("d", 22345.0), ("e", 5111.0), ("f", 1234.0))


def drawn_film(tc1_ppm=150.0, tc2_ppm=0.5, ohm_per_square=320.0, reference=REFERENCE, **changes):
    material = film("pp", tc1_ppm, tc2_ppm, ohm_per_square=ohm_per_square, reference=reference)
    return replace(material, film=replace(DRAWN, **changes))


def only(result):
    assert not result.refusals
    (choice,) = result.choices
    return choice


# ---- the unit


def test_one_unit_is_the_hand_figure():
    # By hand: 320 ohm * 10 um / (2 - 0.05) um = 1641.0256 ohm; ends 2 * 35 ohm um / 2 um = 35 ohm;
    # area (10 + 0.6) um * (2 + 0.6) um = 27.56 um^2. R = sheet * L/W is CHECKS 22, common practice.
    rules = FilmRules(most_count=1, error=1e-6)
    choice = only(film_legs(drawn_film(), [("a", 320 * 10 / 1.95 + 35)], REFERENCE, rules))
    assert choice.unit.width == 2 * UM
    assert choice.unit.length == pytest.approx(10 * UM, rel=1e-12)
    assert choice.unit.body_ohms == pytest.approx(1641.025641025641, rel=1e-12)
    assert choice.unit.ends_ohms == pytest.approx(35.0, rel=1e-12)
    assert choice.area == choice.unit.area == pytest.approx(27.56e-12, rel=1e-12)
    assert choice.error < 1e-12


@pytest.mark.parametrize(
    ("stated", "area"),
    [
        ({}, 10.6 * 2.6),
        ({"end_length": 0.8 * UM}, 12.2 * 2.6),
        ({"end_length": 0.8 * UM, "spacing": None}, 11.6 * 2.0),
        ({"spacing": None}, 10.0 * 2.0),
    ],
)
def test_the_area_of_a_unit_is_that_of_its_place_in_an_array(stated, area):
    # By hand: (L + 2 end_length + spacing) (W + spacing) of 2 um by 10 um, with what is not stated 0.
    material, one = drawn_film(**stated), 320 * 10 / 1.95 + 35
    legs = [("a", 3 * one), ("b", 4 * one)]
    choices = film_legs(material, legs, REFERENCE, FilmRules(most_count=4, error=1e-6)).choices
    choice = next(c for c in choices if c.unit.length == pytest.approx(10 * UM, rel=1e-9))
    array = place(choice.legs, material)
    assert choice.unit.area == pytest.approx(area * UM**2, rel=1e-12)
    assert choice.area == pytest.approx(7 * area * UM**2, rel=1e-12)
    assert array.area * array.units / (array.units + array.dummies) == pytest.approx(choice.area, rel=1e-12)


def test_many_tiny_units_are_not_free():
    # By hand, 320 ohm per square, no bias and no ends, 1 um wide: 64 squares in one unit of 64 um take
    # (64 + 1.2) * 1.6 = 104.32 um^2 with ends of 0.3 um; as 64 units of one square, 64 * 2.2 * 1.6 = 225.28.
    plain = {"preferred_width": None, "width_bias": None, "end_resistance": None, "end_tc1": None}
    material = drawn_film(**plain, end_length=0.3 * UM)
    few = only(film_legs(material, [("a", 64 * 320.0)], REFERENCE, FilmRules(error=1e-6)))
    many = only(
        film_legs(material, [("a", 64 * 320.0)], REFERENCE, FilmRules(max_length_squares=1.0, error=1e-6))
    )
    assert (few.legs[0].units, many.legs[0].units) == (1, 64)
    assert few.area == pytest.approx(104.32e-12, rel=1e-12)
    assert many.area == pytest.approx(225.28e-12, rel=1e-12)


def test_without_bias_ends_and_spacing_the_area_is_that_of_the_material():
    material = drawn_film(width_bias=None, end_resistance=None, end_tc1=None, spacing=None)
    choice = only(film_legs(material, [("a", 3200.0)], REFERENCE, FilmRules(most_count=1, error=1e-6)))
    assert choice.unit.length == pytest.approx(20 * UM, rel=1e-12)  # by hand: 10 squares of 2 um
    assert choice.unit.ends_ohms == 0.0
    assert choice.area == pytest.approx(material.area(3200.0, REFERENCE), rel=1e-12)


def test_body_and_ends_are_taken_to_the_reference_of_the_plan_by_their_own_laws():
    # By hand, 25 K above the film's own reference: body 1 + 200e-6*25 = 1.005, ends 1 - 900e-6*25 = 0.9775.
    material = drawn_film(tc1_ppm=200.0, tc2_ppm=0.0)
    wanted = 1.005 * 320 * 10 / 1.95 + 0.9775 * 35
    rules = FilmRules(most_count=1, error=1e-6)
    unit = only(film_legs(material, [("a", wanted)], REFERENCE + 25, rules)).unit
    assert unit.length == pytest.approx(10 * UM, rel=1e-12)
    assert unit.body_ohms == pytest.approx(1.005 * 320 * 10 / 1.95, rel=1e-12)
    assert unit.ends_ohms == pytest.approx(0.9775 * 35, rel=1e-12)


def test_the_width_is_the_preferred_one_else_the_least_on_the_grid():
    def width(**changes):
        return film_legs(drawn_film(**changes), SIX[:1], REFERENCE, FilmRules()).choices[0].unit.width

    assert width() == 2 * UM
    assert width(preferred_width=None) == 1 * UM
    assert width(preferred_width=2.013 * UM) == pytest.approx(2.015 * UM, rel=1e-12)  # next on 5 nm
    assert width(preferred_width=2.013 * UM, grid=None) == pytest.approx(2.015 * UM, rel=1e-12)


# ---- ends


def test_the_length_of_zero_tc1_is_the_hand_figure():
    # By hand: 2 * 35/2 * 900 ppm = 31500 = 320 L / 1.95 * 150 ppm, L = 1.2796875 um.
    assert zero_tc_length(drawn_film(), 2 * UM, REFERENCE) == pytest.approx(1.2796875 * UM, rel=1e-12)


@pytest.mark.parametrize("reference", [REFERENCE, REFERENCE - 30.0, REFERENCE + 60.0])
@pytest.mark.parametrize("tc1_ppm", [40.0, 150.0, 900.0])
def test_at_that_length_body_and_ends_have_no_tc1(tc1_ppm, reference):
    material = drawn_film(tc1_ppm=tc1_ppm, tc2_ppm=0.3, end_tc1=-1100e-6)
    length = zero_tc_length(material, 2 * UM, reference)
    ends = ends_material(material)
    step = 0.01

    def ohms(T):  # the two resistors as defined, each from its own reference, 25 degC
        body = 320 * length / (1.95 * UM) * material.law.ratio(np.array([T]))[0]
        return body + 35.0 * ends.law.ratio(np.array([T]))[0]

    slope = (ohms(reference + step) - ohms(reference - step)) / (2 * step)  # exact for a quadratic
    assert abs(slope / ohms(reference)) < 1e-9


def test_no_such_length_where_the_signs_agree_or_no_ends_are_stated():
    assert zero_tc_length(drawn_film(tc1_ppm=-150.0), 2 * UM, REFERENCE) is None
    assert zero_tc_length(drawn_film(end_tc1=None), 2 * UM, REFERENCE) is None
    assert zero_tc_length(drawn_film(end_resistance=None, end_tc1=None), 2 * UM, REFERENCE) is None
    assert zero_tc_length(drawn_film(end_resistance=0.0), 2 * UM, REFERENCE) is None
    assert zero_tc_length(film("pp", 150.0), 2 * UM, REFERENCE) is None


def test_the_length_of_zero_tc1_is_offered_on_the_grid_inside_the_rules():
    # By hand: 31500 * 1.95 / (320 * 40) = 4.79883 um, 4.8 um on 5 nm: a unit of 320 * 4.8/1.95 + 35 ohm.
    unit = 320 * 4.8 / 1.95 + 35
    material, legs = drawn_film(tc1_ppm=40.0), [("a", 12 * unit), ("b", 3 * unit)]
    exact = zero_tc_length(material, 2 * UM, REFERENCE)
    offered = film_legs(material, legs, REFERENCE, FilmRules()).zero_tc
    assert exact == pytest.approx(4.798828125 * UM, rel=1e-12)
    assert offered.unit.length == pytest.approx(4.8 * UM, rel=1e-12)
    assert [made.units for made in offered.legs] == [12, 3]
    assert offered.error < 1e-12
    assert film_legs(material, legs, REFERENCE, FilmRules(min_squares=3.0)).zero_tc is None  # 2.4 squares
    tight = film_legs(material, legs, REFERENCE, FilmRules(max_area=offered.area * 0.999))
    assert tight.zero_tc is None


def test_scaling_all_counts_leaves_the_ratio_unchanged():
    material = drawn_film()
    choice = film_legs(material, SIX[:2], REFERENCE, FilmRules(most_count=32)).choices[0]
    ideal = Series(tuple(leg("pp", ohms) for _, ohms in SIX[:2]))
    twice = tuple(replace(x, in_series=2 * x.in_series, in_parallel=2 * x.in_parallel) for x in choice.legs)
    longer = tuple(replace(x, in_series=3 * x.in_series) for x in choice.legs)
    T = grid(count=20)

    def ratio(made):
        assembly = assembled(ideal, made, {"pp": material})
        assert ends_name("pp") in assembly.by_name
        return brute_ratio(assembly.network, assembly.by_name, T)

    for legs in (twice, longer):
        np.testing.assert_allclose(ratio(legs), ratio(choice.legs), rtol=1e-12)
    assert sum(x.ohms for x in twice) == pytest.approx(sum(x.ohms for x in choice.legs), rel=1e-12)


# ---- mismatch


def test_mismatch_is_that_of_pelgrom():
    # Pelgrom, Duinmaijer, Welbers, JSSC 24 (1989) 1433, the law from memory (CHECKS 21). By hand: a pair
    # 1.5 %*um / sqrt(2 um * 10 um) = 0.33541 %, a single one 0.23717 %.
    ohms = 320 * 10 / 1.95 + 35
    one = only(film_legs(drawn_film(), [("a", ohms)], REFERENCE, FilmRules(most_count=1, error=1e-6)))
    assert one.legs[0].mismatch == pytest.approx(0.015 / math.sqrt(20) / math.sqrt(2), rel=1e-12)
    assert one.legs[0].mismatch == pytest.approx(0.0023717, rel=1e-4)
    for choice in film_legs(drawn_film(), SIX, REFERENCE, FilmRules()).choices:
        single = 0.015 * UM / math.sqrt(2 * choice.unit.width * choice.unit.length)
        for made in choice.legs:
            assert made.mismatch == pytest.approx(single / math.sqrt(made.units), rel=1e-12)


@pytest.mark.parametrize(("series", "parallel"), [(1, 1), (5, 1), (1, 4), (3, 4), (7, 3)])
def test_mismatch_of_a_leg_is_that_of_drawn_units(series, parallel):
    # Each unit drawn on its own, with the sigma of the law of Pelgrom, Duinmaijer, Welbers, JSSC 24 (1989)
    # 1433 (from memory): that of a pair over sqrt(2). 40000 draws know a sigma to 0.35 %.
    one = 320 * 10 / 1.95 + 35
    rules = FilmRules(most_count=max(series, parallel), error=1e-6)
    result = film_legs(drawn_film(), [("a", one * series / parallel), ("b", one)], REFERENCE, rules)
    choice = next(c for c in result.choices if c.unit.length == pytest.approx(10 * UM, rel=1e-9))
    made = choice.legs[0]
    assert (made.in_series, made.in_parallel) == (series, parallel)
    rng = np.random.Generator(np.random.Philox(series * 10 + parallel))
    sigma = 0.015 / math.sqrt(2 * 10) / math.sqrt(2)
    units = 1 + sigma * rng.standard_normal((40_000, parallel, series))
    ohms = 1 / np.sum(1 / np.sum(units, axis=-1), axis=-1)
    assert np.std(ohms) / np.mean(ohms) == pytest.approx(made.mismatch, rel=0.02)


def test_four_times_the_area_halves_the_mismatch():
    def of(width):
        material = drawn_film(preferred_width=width, width_bias=None, end_resistance=None, end_tc1=None)
        return only(film_legs(material, [("a", 1600.0)], REFERENCE, FilmRules(most_count=1, error=1e-6)))

    small, large = of(2 * UM), of(4 * UM)  # both of 5 squares
    assert large.unit.width * large.unit.length == pytest.approx(4 * 2 * 10 * UM**2, rel=1e-12)
    assert large.legs[0].mismatch == pytest.approx(small.legs[0].mismatch / 2, rel=1e-12)


def test_a_wanted_mismatch_is_kept_by_every_leg_and_no_matching_states_none():
    plain = film_legs(drawn_film(), SIX[:3], REFERENCE, FilmRules())
    limit = min(made.mismatch for made in plain.choices[0].legs) / 3
    strict = film_legs(drawn_film(), SIX[:3], REFERENCE, FilmRules(mismatch=limit))
    assert strict.choices
    assert all(made.mismatch <= limit * (1 + 1e-9) for c in strict.choices for made in c.legs)
    assert strict.choices[0].area > plain.choices[0].area
    unknown = film_legs(drawn_film(matching=None), SIX[:1], REFERENCE, FilmRules())
    assert unknown.choices[0].legs[0].mismatch is None


# ---- the optimiser


def enumerated(widths, lengths_of, wanted, most, error, *, ohms_of, area_of, may):
    """Return (area, error) of all that no other one beats, by trying everything.

    ``may`` is asked of the length and width of all units together, their strings, and the leg.
    """
    found = []
    counts = list(itertools.product(range(1, most + 1), repeat=2))
    for width in widths:
        for length in lengths_of(width):
            unit = ohms_of(width, length)
            fit = [
                [
                    (s * p, abs(unit * s / p / value - 1))
                    for s, p in counts
                    if abs(unit * s / p / value - 1) <= error and may(width * length * s * p, p, leg)
                ]
                for leg, value in enumerate(wanted)
            ]
            found += [
                (sum(n for n, _ in chosen) * area_of(width, length), max(e for _, e in chosen))
                for chosen in itertools.product(*fit)
            ]
    best, floor = [], 1e-6  # errors below 1 ppm are alike
    for area, off in sorted((round(a, 25), max(e, floor)) for a, e in found):
        if not best or off < best[-1][1] * (1 - 1e-9):
            best.append((area, off))
    return best


@pytest.mark.parametrize("together", [0.0, 1.3e-5])
@pytest.mark.parametrize("strings", [(), (1, 3, 2)])
@pytest.mark.parametrize("seed", range(9))
def test_the_trade_is_that_of_exhaustive_enumeration(seed, strings, together):
    rng = np.random.default_rng(seed)
    wanted = [float(ohms) for ohms in rng.uniform(150, 2500, 1 + seed % 3)]
    lengths, extra = np.arange(10, 45) * 1e-7, (0.0, 0.6e-6, 2.2e-6)[seed // 3]
    cell = Cell(
        per_length=320 / 0.95e-6,
        ends=70.0,
        pitch=1.6e-6,
        extra=extra,
        least_together=together,
        least_strings=strings[: len(wanted)],
    )
    points = trade(cell, lengths, wanted, count_ratios(5), 0.1)
    expected = enumerated(
        [1.0],
        lambda _: lengths,
        wanted,
        5,
        0.1,
        ohms_of=lambda _, length: 320 * length / 0.95e-6 + 70,
        area_of=lambda _, length: 1.6e-6 * (length + extra),
        may=lambda sum_of, p, k: sum_of >= together * (1 - 1e-9) and p >= (*strings, 1, 1, 1)[k],
    )
    got = [(point.area, max(point.error, 1e-6)) for point in points]
    assert expected
    np.testing.assert_allclose(got, expected, rtol=1e-9)


@pytest.mark.parametrize("size", [1, 2, 3, 8, 29])
def test_the_least_of_every_stretch_is_found(size):
    numbers = np.random.default_rng(size).integers(0, 9, size).astype(float)  # with ties
    first, after = (np.array(each) for each in zip(*itertools.combinations(range(size + 1), 2), strict=True))
    at = RangeLeast.of(numbers).at(first, after)
    assert np.all((first <= at) & (at < after))
    assert [numbers[k] for k in at] == [min(numbers[a:b]) for a, b in zip(first, after, strict=True)]


@pytest.mark.parametrize("mismatch", [None, 0.0075])
@pytest.mark.parametrize("wanted", [(700.0,), (1000.0, 430.0), (2310.0, 1150.0, 777.0)])
def test_the_choices_are_those_of_exhaustive_enumeration(wanted, mismatch):
    material = drawn_film(preferred_width=None, grid=0.1 * UM, end_length=0.4 * UM)
    rules = FilmRules(most_count=4, error=0.08, max_length_squares=4.0, mismatch=mismatch)
    result = film_legs(material, [(f"l{k}", v) for k, v in enumerate(wanted)], REFERENCE, rules)
    # By hand: (1.5 %*um / 0.75 %)^2 / 2 = 2 um^2, so the widest is 1.414 um, 1.5 um on the grid.
    widths = (1e-6,) if mismatch is None else (1e-6, 1.5e-6)
    expected = enumerated(
        widths,
        lambda width: [k * 1e-7 for k in range(round(width / 1e-7), round(4 * width / 1e-7) + 1)],
        wanted,
        4,
        0.08,
        ohms_of=lambda width, length: 320 * length / (width - 0.05e-6) + 70e-6 / width,
        area_of=lambda width, length: (width + 0.6e-6) * (length + 2 * 0.4e-6 + 0.6e-6),
        may=lambda together, *_: mismatch is None or together >= 2e-12 * (1 - 1e-9),
    )
    got = [(choice.area, max(choice.error, 1e-6)) for choice in result.choices]
    assert expected
    if len(expected) <= 12:
        np.testing.assert_allclose(got, expected, rtol=1e-9)
    else:  # both ends, and no point that is not of the trade
        np.testing.assert_allclose((got[0], got[-1]), (expected[0], expected[-1]), rtol=1e-9)
        assert all(any(np.allclose(point, other, rtol=1e-9, atol=0) for other in expected) for point in got)


@pytest.mark.parametrize(
    "rules",
    [
        FilmRules(),
        FilmRules(error=0.02, most_count=20),
        FilmRules(mismatch=2e-4, error=2e-3),
        FilmRules(error=0.01, most_count=256),
    ],
)
def test_every_choice_keeps_the_rules(rules):
    result = film_legs(drawn_film(), SIX, REFERENCE, rules)
    assert 1 <= len(result.choices) <= 12
    assert not result.refusals
    for choice in result.choices:
        unit = choice.unit
        steps = unit.length / 5e-9
        assert steps == pytest.approx(round(steps), abs=1e-6)
        assert 1 - 1e-9 <= unit.length / unit.width <= 200 + 1e-9
        assert unit.body_ohms == pytest.approx(320 * unit.length / (unit.width - 0.05 * UM), rel=1e-12)
        assert unit.ends_ohms == pytest.approx(70 * UM / unit.width, rel=1e-12)
        assert all(1 <= n <= rules.most_count for x in choice.legs for n in (x.in_series, x.in_parallel))
        errors = [abs(x.ohms / x.wanted_ohms - 1) for x in choice.legs]
        assert max(errors) == choice.error <= rules.error * (1 + 1e-9)
        assert choice.area == pytest.approx(sum(x.units for x in choice.legs) * unit.area, rel=1e-12)
        assert tuple((x.id, x.wanted_ohms) for x in choice.legs) == SIX
    areas, errors = [c.area for c in result.choices], [c.error for c in result.choices]
    assert areas == sorted(set(areas))
    assert errors == sorted(set(errors), reverse=True)
    assert film_legs(drawn_film(), SIX, REFERENCE, rules) == result


def test_a_grid_too_fine_to_look_through_loses_no_more_than_a_hair():
    # The same film on 5 nm looked through in full, and on 0.05 nm by closely spaced lengths: the finer
    # grid has every length of the coarse one, so its trade can not be worse than by the spacing, 0.01 %.
    material, legs = drawn_film(), SIX[:2]
    full = film_legs(material, legs, REFERENCE, FilmRules())
    fine = film_legs(drawn_film(grid=5e-11), legs, REFERENCE, FilmRules())
    assert fine.choices[0].area <= full.choices[0].area * 1.0001
    assert fine.choices[-1].error <= full.choices[-1].error
    for choice in fine.choices:
        steps = choice.unit.length / 5e-11
        assert steps == pytest.approx(round(steps), abs=1e-5)


def test_more_counts_than_can_be_looked_through_lose_no_more_than_a_hair():
    # 256 counts have 40 thousand ratios, of which those of the fewest units are looked through; 32 counts, in
    # full, are among them, so that the area can not be more nor the least error larger than by the spacing.
    full = film_legs(drawn_film(), SIX, REFERENCE, FilmRules(most_count=32, error=0.01))
    more = film_legs(drawn_film(), SIX, REFERENCE, FilmRules(most_count=256, error=0.01))
    assert more.choices[0].area <= full.choices[0].area * 1.0005
    assert more.choices[-1].error <= full.choices[-1].error


# ---- refusals


def refused(legs, rules, **changes):
    result = film_legs(drawn_film(**changes), legs, REFERENCE, rules)
    assert result.choices == ()
    assert result.zero_tc is None
    return result.refusals


def test_a_value_beyond_the_counts_is_refused_with_the_nearest_one():
    # By hand: the shortest unit, 2 um, is 320 * 2/1.95 + 35 = 363.205 ohm; 64 in parallel are 5.675 ohm.
    # The longest, 400 um, is 65676.03 ohm; 64 in series are 4.203 Mohm.
    low, high = refused([("a", 2.0), ("b", 1000.0), ("c", 9e6)], FilmRules())
    assert (low.leg, low.rule, low.found) == ("a", "count", "2 ohm")
    assert low.nearest.startswith("5.675 ohm")
    assert (high.leg, high.rule, high.found) == ("c", "count", "9 Mohm")
    assert high.nearest.startswith("4.203 Mohm")


def test_legs_too_far_apart_are_refused_with_the_nearest_ratio():
    (refusal,) = refused([("a", 1000.0), ("b", 100e3)], FilmRules(most_count=4))
    assert (refusal.leg, refusal.rule) == ("a", "count")
    assert refusal.nearest == "a ratio of at most 16: 6.25 kohm for the smallest"  # by hand


def test_no_length_on_the_grid_is_refused_with_the_next_one():
    rules = FilmRules(min_squares=1.2, max_length_squares=1.4)
    refusals = refused(SIX[:2], rules, grid=2 * UM)  # by hand: 2.4 to 2.8 um, the next is 4 um
    assert [(r.leg, r.rule) for r in refusals] == [("a", "grid"), ("b", "grid")]
    assert refusals[0].nearest == "a length of 4 um, 2 squares"


def test_an_area_below_the_smallest_is_refused_with_it():
    smallest = film_legs(drawn_film(), SIX[:2], REFERENCE, FilmRules()).choices[0]
    assert film_legs(drawn_film(), SIX[:2], REFERENCE, FilmRules(max_area=smallest.area * 1.001)).choices
    (refusal,) = refused(SIX[:2], FilmRules(max_area=smallest.area * 0.99))
    assert refusal.rule == "area"
    largest = max(smallest.legs, key=lambda made: made.units)
    assert refusal.leg == largest.id
    stated = float(refusal.nearest.removeprefix("the smallest area possible is ").removesuffix(" um^2"))
    assert smallest.area <= stated * 1e-12 <= smallest.area * 1.001


def test_an_error_that_is_not_reached_is_refused_with_the_least_one():
    # By hand: counts up to 2 give legs that are alike or differ by 2 or 4; wanted is 1.5. Nearest is 2, off
    # by 4/3 in all, shared by both legs: (1 + r) / (1 - r) = 4/3, r = 1/7 = 14.29 %, rounded up.
    (refusal,) = refused([("a", 1000.0), ("b", 1500.0)], FilmRules(most_count=2, error=0.01))
    assert refusal.leg in ("a", "b")
    assert refusal.rule == "count"
    assert refusal.nearest == "the least error reached is 14.3 %"
    assert refusal.found == "an error of 1 % wanted of counts up to 2"


def test_bad_input_is_refused():
    for legs in ([], [("a", 0.0)], [("a", math.inf)], [("a", math.nan)]):
        with pytest.raises(InputError, match="above zero"):
            film_legs(drawn_film(), legs, REFERENCE, FilmRules())
    with pytest.raises(InputError, match="min_width"):
        film_legs(film("pp", 100.0), SIX, REFERENCE, FilmRules())
    with pytest.raises(InputError, match="matching"):
        film_legs(drawn_film(matching=None), SIX, REFERENCE, FilmRules(mismatch=1e-3))
    with pytest.raises(InputError) as caught:
        FilmRules(most_count=0, error=0.0, max_area=0.0, mismatch=-1.0, min_squares=0.0)
    assert len(caught.value.problems) == 5
    with pytest.raises(InputError, match="max_length_squares"):
        FilmRules(min_squares=5.0, max_length_squares=4.0)
