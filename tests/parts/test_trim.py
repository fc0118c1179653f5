"""Trim: aims and gains by hand, codes against all codes, networks with switches against a scalar evaluation.

A cut aims at 1/(1 + D) and needs a gain of (1 + D)/(1 - D): common practice, no source. The rest follows
from the laws of series and parallel resistors, worked out here a second time.
"""

import csv
import io
import itertools
import json
import time

import numpy as np
import pytest
from makers import by_name, film, grid, leg, need_of

from tcplan.brief.model import Trim
from tcplan.errors import InputError
from tcplan.goal import Limit
from tcplan.made import FilmLeg, FilmUnit, PlainLeg
from tcplan.material.law import Polynomial
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Leg, Parallel, Series, legs, value
from tcplan.parts.trim import codes_csv, trim_plan
from tcplan.parts.trim.bits import Factor, code_ohms, codes_beside
from tcplan.parts.trim.coded import coded_drift, coded_network
from tcplan.parts.trim.codes import (
    TwoPoints,
    leg_ohms,
    one_temperature_codes,
    two_temperature_codes,
    with_legs,
)
from tcplan.parts.trim.devices import draw_devices, needed, whole
from tcplan.parts.trim.members import Member, members_of
from tcplan.parts.trim.sizing import row_for
from tcplan.process import INDEPENDENT, Correlation, Parameter, Process

REFERENCE = 298.15
NEED = need_of(Limit(kind="drift", value=0.006))
TWO = Series((leg("pp", 12e3), leg("np", 6e3)))
ONE = Trim(method="one-temperature")


def two_films(value_percent=15.0, tc1_spread=40.0, tc2=0.5):
    return by_name(
        film("pp", -150.0, tc2, value_percent=value_percent, tc1_spread_ppm=tc1_spread),
        film("np", 310.0, 0.8 * tc2, value_percent=value_percent, tc1_spread_ppm=tc1_spread),
    )


def plain(network):
    names = iter("abcdefgh")
    return tuple(PlainLeg(id=next(names), material=x.material, wanted_ohms=x.ohms) for x in legs(network))


def planned(network, materials, trim, *, made=None, process=INDEPENDENT, target=None, need=NEED, **options):
    spreads = {name: m.spread for name, m in materials.items() if m.spread is not None}
    return trim_plan(
        network,
        made or plain(network),
        materials,
        spreads,
        process,
        need,
        trim,
        target or value(network),
        **options,
    )


def setting(network, materials, draws=40, seed=3, made=None):
    """Return the legs and the devices of a network."""
    spreads = {name: m.spread for name, m in materials.items()}
    members = members_of(network, made or plain(network), materials, spreads, REFERENCE)
    return members, draw_devices(network, members, materials, spreads, INDEPENDENT, NEED, draws, seed)


def member(half_width, share=1.0, ohms=1000.0, name="a"):
    return Member(
        id=name,
        material="pp",
        leaves=(0,),
        ohms=ohms,
        share=share,
        mismatch=0.0,
        half_width=half_width,
        film=True,
        parts=(ohms,),
        limits=tuple((f, f) for f in (1.0 - half_width, 1.0, 1.0 + half_width)),
    )


# --- bits -----------------------------------------------------------------------------------------------


def test_the_bits_of_a_leg_by_hand():
    # 1 kohm +/- 20 %: from 1000/1.2 to 1000/0.8, 416.67 ohm; at 1 % of the whole 6 bits, 416.67/63 a step.
    row = row_for(member(0.2), 1000.0, 0.01, 0.0)
    assert row.base_ohms == pytest.approx(1000.0 / 1.2, rel=1e-12)
    assert row.step_ohms == pytest.approx((1000.0 / 0.8 - 1000.0 / 1.2) / 63.0, rel=1e-12)
    assert row.bit_ohms == pytest.approx([row.step_ohms * 2**k for k in range(6)], rel=1e-12)
    assert row.step == pytest.approx(row.step_ohms / 1000.0, rel=1e-12)
    # The highest device has the largest steps, 1.2 of nominal.
    assert row.gaps == pytest.approx([row.step * f for f in (0.8, 1.0, 1.2)], rel=1e-9)
    # Of a leg that is a third of the whole 30 ohm are allowed at 1.2 of nominal: 416.67/15 x 1.2 = 33.3, is
    # too much, 416.67/31 x 1.2 = 16.1 ohm is not.
    assert len(row_for(member(0.2, share=1.0 / 3.0), 1000.0, 0.01, 0.0).bit_ohms) == 5


@pytest.mark.parametrize("switch", [0.0, 0.5, 20.0])
def test_the_codes_cover_the_spread_in_steps_within_the_one_asked(switch):
    row = row_for(member(0.15), 1000.0, 2e-3, switch)
    bits = np.array(row.bit_ohms)
    sums = np.array([[bool(code & (1 << k)) for k in range(len(bits))] for code in range(2 ** len(bits))])
    gaps = []
    for factor in (0.85, 1.0, 1.15):  # twin: all codes of one device, sorted
        cleared = factor * bits * switch / (factor * bits + switch)
        ohms = factor * row.base_ohms + np.where(sums, factor * bits, cleared).sum(axis=1)
        gaps.append(np.diff(np.sort(ohms)).max() / 1000.0)
        if factor == 1.15:
            assert ohms[0] == pytest.approx(1000.0, rel=1e-9)
        if factor == 0.85:
            assert ohms[-1] == pytest.approx(1000.0, rel=1e-9)
    assert row.gaps == pytest.approx(gaps, rel=1e-9)
    assert row.gap == max(row.gaps) <= 2e-3
    # One bit less would leave a larger gap than was asked.
    assert row.gap * 2.0 > 2e-3


def test_a_code_is_its_units_and_switches():
    # Twin: one device, one code, bit by bit.
    row = row_for(member(0.15), 1000.0, 5e-3, 12.0)
    for code in (0, 5, 2 ** len(row.bit_ohms) - 1):
        ohms = 1.07 * row.base_ohms
        for k, unit in enumerate(row.bit_ohms):
            ohms += 1.07 * unit if code & (1 << k) else 1.0 / (1.0 / (1.07 * unit) + 1.0 / 12.0)
        assert code_ohms(row, np.array([code]), Factor.of(1.07))[0] == pytest.approx(ohms, rel=1e-14)


@pytest.mark.parametrize("switch", [0.0, 15.0])
@pytest.mark.parametrize("each_side", [1, 4])
def test_the_codes_beside_a_value_are_those_of_all_codes(switch, each_side):
    row = row_for(member(0.2), 1000.0, 4e-3, switch)
    rng = np.random.default_rng(5)
    factor, wanted = rng.uniform(0.75, 1.25, 60), rng.uniform(900.0, 1100.0, 60)
    found = codes_beside(row, Factor(body=factor, ends=factor), wanted, each_side)
    everything = np.arange(2 ** len(row.bit_ohms))
    for k in range(60):
        own = Factor.of(factor[k])
        ohms = code_ohms(row, everything, own)
        below = sorted(ohms[ohms <= wanted[k]])[::-1][:each_side]
        above = sorted(ohms[ohms > wanted[k]])[:each_side]
        if len(below) == each_side and len(above) == each_side:
            assert code_ohms(row, found[k], own) == pytest.approx([*below, *above], rel=1e-12)
        else:  # beyond the codes: the last ones are still among them
            nearest = ohms[np.argmin(np.abs(ohms - wanted[k]))]
            assert np.min(np.abs(code_ohms(row, found[k], own) - nearest)) < 1e-9


def test_too_fine_a_step_is_refused_with_the_nearest():
    with pytest.raises(InputError, match=r"16 bits on leg a are not enough.*expected 7\.63 ppm or more"):
        # 416.67 ohm in 65535 steps of 1 kohm, 6.358 ppm, and 1.2 times that in the highest device.
        row_for(member(0.2), 1000.0, 1e-6, 0.0)
    assert len(row_for(member(0.2), 1000.0, 7.63e-6, 0.0).bit_ohms) == 16


def test_switches_beyond_the_leg_are_refused():
    with pytest.raises(InputError, match="the switches alone exceed leg a"):
        row_for(member(0.2), 1000.0, 1e-3, 1e3)


# --- networks -------------------------------------------------------------------------------------------


def test_what_a_leg_has_to_be_by_hand():
    network = Series((leg("a", 10.0), Parallel((leg("b", 30.0), leg("c", 60.0)))))
    leaves = [np.array([x]) for x in (10.0, 30.0, 60.0)]
    assert whole(network, leaves)[0] == pytest.approx(30.0)
    assert needed(network, leaves, 0, 33.0)[0] == pytest.approx(13.0)
    # 24 ohm for the pair: 1/24 - 1/60 = 1/40.
    assert needed(network, leaves, 1, 34.0)[0] == pytest.approx(40.0)
    assert needed(network, leaves, 1, 71.0)[0] == np.inf
    assert needed(network, leaves, 0, 15.0)[0] < 0.0
    assert needed(network, leaves, 1, 9.0)[0] < 0.0


def made_film(name, material, body, ends, mismatch=None):
    unit = FilmUnit(material=material, width=2e-6, length=1e-5, body_ohms=body, ends_ohms=ends, area=2e-11)
    return FilmLeg(
        id=name,
        material=material,
        wanted_ohms=body + ends,
        unit=unit,
        in_series=1,
        in_parallel=1,
        mismatch=mismatch,
    )


def with_ends(mismatch=0.002):
    """Return a network with the ends of one film as a leaf, its legs and materials."""
    ends = Material(
        name="pp_ends",
        label="ends",
        source="invented",
        law=Polynomial(reference=REFERENCE, coefficients=(-900e-6,)),
        valid=(213.15, 433.15),
        kind="plain",
        spread=Spread(meaning="limits", value=0.4, tc1=2e-4),
    )
    network = Series((leg("pp", 11.6e3), leg("pp_ends", 400.0), leg("np", 6e3)))
    made = (made_film("a", "pp", 11.6e3, 400.0, mismatch), PlainLeg(id="b", material="np", wanted_ohms=6e3))
    return network, made, {**two_films(), "pp_ends": ends}


def scalar_curve(member_, row, code, leaves_at, switch_at):
    """Return the value of a leg with bits by a twin: bit by bit, at one temperature."""
    factors = [leaves_at[k] / part for k, part in zip(member_.leaves, member_.parts, strict=True)]
    base, *bits = [
        factors[0] * (row.base_ohms if drawn is None else drawn.body_ohms)
        + factors[-1] * (0.0 if drawn is None else drawn.ends_ohms)
        for drawn in [row.base]
    ] + [
        factors[0] * (ohms if drawn is None else drawn.body_ohms)
        + factors[-1] * (0.0 if drawn is None else drawn.ends_ohms)
        for ohms, drawn in zip(row.bit_ohms, row.bits or [None] * len(row.bit_ohms), strict=True)
    ]
    switch = row.switch_ohms * switch_at
    for k, unit in enumerate(bits):
        if code & (1 << k):
            base += unit
        else:
            base += unit * switch / (unit + switch) if switch else 0.0
    return base


@pytest.mark.parametrize("switch", [0.0, 30.0])
def test_bits_and_switches_are_members_of_the_network(switch):
    """The judged drift with codes against a dense grid, the network being evaluated device by device."""
    network, made, materials = with_ends()
    members, devices = setting(network, materials, draws=5, made=made)
    rows = [row_for(m, m.ohms, 2e-3, switch) for m in members]
    tc1 = 3500e-6
    coded = coded_network(network, members, rows, materials, tc1, REFERENCE)
    rng = np.random.default_rng(1)
    codes = [rng.integers(0, 2 ** len(row.bit_ohms), 5) for row in rows]
    found = coded_drift(devices, coded, rows, codes)
    T = grid()
    leaves = devices.ohms([*T, REFERENCE])
    for d in range(5):
        curve = [
            sum(
                scalar_curve(m, row, int(code[d]), leaves[n, :, d], 1.0 + tc1 * (t - REFERENCE))
                for m, row, code in zip(members, rows, codes, strict=True)
            )
            for n, t in enumerate([*T[::50], REFERENCE])
            for n in [n * 50 if t != REFERENCE else len(T)]
        ]
        drift = np.abs(np.array(curve[:-1]) / curve[-1] - 1.0).max()
        assert found[d] == pytest.approx(drift, rel=2e-3)
        assert found[d] >= drift - 1e-9


def test_a_switch_is_seen_in_the_drift_after():
    """One film of TC1 zero: what drifts is the switches, n S a dT of the whole, by hand."""
    materials = by_name(film("pp", 0.0, value_percent=15.0))
    network = leg("pp", 10e3)
    without = planned(network, materials, ONE, draws=200)
    trim = Trim(method="one-temperature", switch_resistance=20.0, switch_tc1=3500e-6)
    found = planned(network, materials, trim, draws=200)
    assert without.after.drift.worst < 1e-12
    assert found.perfect.drift.worst < 1e-12
    # All bits bypassed is the most that switches can add: their part of the value times 3500 ppm/K x 125 K.
    (row,) = found.rows
    most = len(row.bit_ohms) * 20.0 / 10e3 * 3500e-6 * 125.0
    assert 0.05 * most < found.after.drift.worst < most


# --- one temperature ------------------------------------------------------------------------------------


def test_codes_at_one_temperature_are_the_best_of_all():
    """Brute force: every pair of codes; those beside the restored mix, and of them the nearest value."""
    materials = two_films()
    members, devices = setting(TWO, materials)
    rows = tuple(row_for(m, m.ohms, 8e-3, 7.0) for m in members)
    chosen = one_temperature_codes(devices, members, rows, 18e3)
    leaves = devices.ohms([REFERENCE])[0]
    for d in range(40):
        ohms = [
            code_ohms(row, np.arange(2 ** len(row.bit_ohms)), Factor.of(leaves[k, d] / members[k].ohms))
            for k, row in enumerate(rows)
        ]
        beside = [
            [max(o[o <= w], default=min(o)), min(o[o > w], default=max(o))]
            for o, w in zip(ohms, (12e3, 6e3), strict=True)  # both legs have bits: the mix is nominal
        ]
        best = min(abs(a + b - 18e3) for a, b in itertools.product(*beside))
        own = [o[code[d]] for o, code in zip(ohms, chosen.codes, strict=True)]
        assert abs(sum(own) - 18e3) == pytest.approx(best, abs=1e-6)


def test_fine_codes_restore_the_nominal_drift():
    materials = two_films(tc1_spread=0.0)
    found = planned(TWO, materials, Trim(method="one-temperature", step=1e-5), draws=400)
    # By hand: TC1 (-150 x 12 + 310 x 6)/18, TC2 (0.5 x 12 + 0.4 x 6)/18, at 150 degC.
    nominal = (60.0 / 18.0 * 125.0 + 8.4 / 18.0 * 125.0**2) * 1e-6
    assert found.perfect.drift.worst == pytest.approx(nominal, abs=1e-9)
    assert found.perfect.drift.median == pytest.approx(nominal, abs=1e-9)
    assert found.after.drift.median == pytest.approx(nominal, abs=1e-6)
    inside = found.after.value.median
    assert inside < 1e-5
    assert found.before.value.median > 1e-2


def test_a_spread_of_tc1_alone_is_not_trimmed():
    """Values that move in full step leave the mix as it is: the trim then changes the value and no drift."""
    materials = two_films()
    step = Correlation(
        first=Parameter(material="pp", component="value"),
        second=Parameter(material="np", component="value"),
        value=1.0,
    )
    found = planned(
        TWO, materials, Trim(method="one-temperature", step=1e-5), process=Process(correlations=(step,))
    )
    assert found.perfect.drift.worst == pytest.approx(found.before.drift.worst, rel=1e-9)
    assert found.perfect.drift.median == pytest.approx(found.before.drift.median, rel=1e-9)
    assert found.after.drift.median == pytest.approx(found.before.drift.median, rel=1e-3)
    assert found.after.value.median < 1e-5 < found.before.value.median


def test_ends_and_mismatch_are_measured_with_their_leg():
    network, made, materials = with_ends()
    found = planned(network, materials, ONE, made=made, draws=300)
    assert found.perfect.value.worst < 1e-9
    assert found.perfect.mix.worst < 1e-9
    # (11.6 x 15 % + 0.4 x 40 %)/12 with 3 sigma of mismatch on top.
    half_width = (1.0 + (11.6 * 0.15 + 0.4 * 0.4) / 12.0) * (1.0 + 0.006) - 1.0
    assert found.rows[0].half_width == pytest.approx(half_width, rel=1e-12)


def test_other_legs_are_made_up_for():
    """A part without bits is off as it is; the films, in their nominal mix, bring the whole to its target."""
    part = Material(
        name="chip",
        label="chip",
        source="invented",
        law=Polynomial(reference=REFERENCE, coefficients=(0.0,)),
        valid=(213.15, 433.15),
        kind="part",
        series="E96",
        spread=Spread(meaning="limits", value=0.01, shape="rectangular"),
    )
    network = Series((leg("pp", 12e3), leg("np", 6e3), leg("chip", 2e3)))
    found = planned(network, {**two_films(), "chip": part}, ONE, draws=300)
    assert [row.leg for row in found.rows] == ["a", "b"]
    assert found.perfect.value.worst < 1e-9
    assert found.after.value.median < 0.5e-3


# --- two temperatures -----------------------------------------------------------------------------------


def test_two_linear_films_are_left_without_a_slope():
    """Laws without curvature: what is left is no more than a step of codes makes of a mix."""
    materials = two_films(tc2=0.0)
    trim = Trim(method="two-temperatures", step=1e-4, temperatures=(REFERENCE, 398.15))
    found = planned(TWO, materials, trim)
    assert found.out_of_codes < 0.01
    assert found.perfect.chord.worst < 1e-12
    assert found.perfect.drift.quantile < 1e-9
    # A step on one leg, 100 ppm of the whole, moves its slope by 100 ppm of what the two are apart.
    assert found.after.chord.median < 1e-4 * 460e-6 * 2.0
    assert found.after.value.median < 1e-4
    assert found.after.drift.median < 0.1 * found.before.drift.median
    assert found.before.chord.median > 5e-6


@pytest.mark.parametrize("switch", [0.0, 6.0])
def test_codes_at_two_temperatures_are_the_best_of_all(switch):
    materials = by_name(
        film("pp", -900.0, value_percent=8.0, tc1_spread_ppm=60.0),
        film("np", 1800.0, value_percent=8.0, tc1_spread_ppm=60.0),
    )
    members, devices = setting(TWO, materials, draws=25)
    rows = tuple(row_for(m, m.ohms, 2e-2, switch, more=0.25) for m in members)
    other, tc1 = 398.15, 3500e-6
    leaves = devices.ohms([REFERENCE, other])
    points = TwoPoints(
        devices=devices,
        members=(members[0], members[1]),
        rows=(rows[0], rows[1]),
        leaves=(leaves[0], leaves[1]),
        target=18e3,
        goal=1.0,
        switch=1.0 + tc1 * 100.0,
    )
    chosen = two_temperature_codes(points)
    for d in range(25):

        def worst(codes, d=d):
            errors = []
            for n, ratio in ((0, 1.0), (1, points.switch)):
                films = [Factor.of(leaves[n, k, d] / members[k].ohms) for k in (0, 1)]
                first, second = (
                    code_ohms(row, c, f, row.switch_ohms * ratio)
                    for row, c, f in zip(rows, codes, films, strict=True)
                )
                errors.append(np.abs((first + second) / 18e3 - 1.0))
            return np.maximum(*errors)

        first, second = (np.arange(2 ** len(row.bit_ohms)) for row in rows)
        best = worst((first[:, None], second[None, :])).min()
        own = worst([np.array([code[d]]) for code in chosen.codes])[0]
        assert own == pytest.approx(best, rel=1e-9)


def test_the_two_films_that_differ_most_have_the_codes():
    materials = {**two_films(), **by_name(film("mid", 40.0, value_percent=10.0))}
    network = Series((leg("pp", 9e3), leg("mid", 5e3), leg("np", 4e3)))
    trim = Trim(method="two-temperatures", temperatures=(REFERENCE, 398.15))
    assert [row.leg for row in planned(network, materials, trim, draws=100).rows] == ["a", "c"]
    with pytest.raises(InputError, match="two films of different TC1"):
        planned(leg("pp", 1e3), materials, trim)


def test_a_wanted_slope_is_reached():
    wanted = Polynomial(reference=REFERENCE, coefficients=(100e-6,))
    need = need_of(Limit(kind="drift", value=0.006), wanted=wanted)
    materials = two_films(tc2=0.0)
    network = Series((leg("pp", 8e3), leg("np", 10e3)))  # -150 x 8/18 + 310 x 10/18 = 106 ppm/K
    trim = Trim(method="two-temperatures", step=1e-4, temperatures=(REFERENCE, 398.15))
    found = planned(network, materials, trim, need=need, draws=400)
    assert found.perfect.drift.quantile < 1e-9
    assert found.after.drift.median < 50e-6


# --- cuts -----------------------------------------------------------------------------------------------


def cut(largest=0.9):
    return Trim(method="cut", largest_cut=largest)


@pytest.mark.parametrize("percent", [10.0, 25.0])
def test_aim_and_gain_of_one_film(percent):
    D = percent / 100.0
    materials = by_name(film("pp", -150.0, 0.5, value_percent=percent, tc1_spread_ppm=40.0))
    found = planned(leg("pp", 10e3), materials, cut())
    (only,) = found.cuts
    assert only.aims == pytest.approx([1.0 / (1.0 + D)], rel=1e-12)
    assert only.gains == pytest.approx([(1.0 + D) / (1.0 - D)], rel=1e-12)
    assert (found.whole_aim, found.whole_gain) == pytest.approx((only.aims[0], only.gains[0]), rel=1e-12)
    assert found.after.value.quantile < 1e-9
    assert found.after.drift.worst == pytest.approx(found.before.drift.worst, rel=1e-9)


def test_one_leg_covers_the_spread_of_the_whole():
    found = planned(TWO, two_films(), cut())
    alone = {one.legs: one for one in found.cuts}
    # Leg a: 12 x 1.15 a + 6 x 1.15 = 18; then 12 x 0.85 a g + 6 x 0.85 = 18.
    aim = (18.0 - 6.9) / 13.8
    assert alone["a",].aims == pytest.approx([aim], rel=1e-12)
    assert alone["a",].gains == pytest.approx([(18.0 - 5.1) / (10.2 * aim)], rel=1e-12)
    assert not alone["b",].feasible
    assert alone["a", "b"].aims == pytest.approx([1.0 / 1.15] * 2, rel=1e-12)
    assert found.whole_gain == pytest.approx(1.15 / 0.85, rel=1e-12)
    assert found.cuts[0].legs == ("a",)


def test_the_leg_is_cut_with_which_the_worst_drift_is_least():
    network = Series((leg("pp", 9.5e3), leg("np", 8.5e3)))
    found = planned(network, two_films(6.0), cut(3.0))
    alone = [one for one in found.cuts if len(one.legs) == 1]
    assert all(one.feasible for one in alone)
    assert alone[0] is found.cuts[0]
    assert alone[0].reached.drift.worst < alone[1].reached.drift.worst


def test_a_cut_of_all_legs_restores_the_mix_as_perfect_codes_do():
    materials = two_films()
    codes = planned(TWO, materials, ONE)
    together = next(one for one in planned(TWO, materials, cut()).cuts if len(one.legs) == 2)
    assert together.reached.drift.median == pytest.approx(codes.perfect.drift.median, rel=1e-9)
    # TC1 of the nominal mix, in the median, to what 2000 devices tell of 40 ppm/K limits.
    assert together.tc1.median == pytest.approx(60e-6 / 18.0, abs=1e-6)
    assert together.share.median == pytest.approx(2.0 / 3.0, rel=1e-6)


def test_a_cut_only_raises():
    """Devices above target stay as they are, those that need more than is allowed fall short."""
    materials = by_name(film("pp", -150.0, value_percent=15.0))
    # Beyond 3 sigma are 0.135 % of a normal on either side (tables of the normal distribution).
    found = planned(leg("pp", 10e3), materials, cut(1.15 / 0.85 - 1.0), draws=10_000, seed=2)
    chosen = found.cuts[0]
    assert 0.0005 < chosen.above < 0.0025
    assert 0.0005 < chosen.short < 0.0025
    assert 1e-3 < found.after.value.worst < 0.2
    assert found.after.value.median < 1e-9


def test_too_large_a_gain_is_refused_with_the_least():
    materials = by_name(film("pp", -150.0, 0.5, value_percent=25.0))
    # (1.25/0.75 - 1) = 66.7 %, rounded up.
    with pytest.raises(InputError, match=r"30 %, where the least gain .* 1\.667 .*expected 66\.7 % or more"):
        planned(leg("pp", 10e3), materials, cut(0.3))
    assert planned(leg("pp", 10e3), materials, cut(0.667)).cuts[0].feasible


def test_a_leg_that_can_not_cover_the_spread():
    """10 kohm parallel to 1 kohm, both +/- 15 %: with the small one 15 % low, no larger one is enough."""
    network = Parallel((leg("pp", 10e3), leg("np", 1e3)))
    found = planned(network, two_films(), cut())
    alone = {one.legs: one for one in found.cuts}
    assert alone["a",].gains == (None,)
    assert alone["a",].reached is None
    assert found.cuts[0].legs == ("b",)


# --- all ------------------------------------------------------------------------------------------------


EVERY = (
    Trim(method="one-temperature", switch_resistance=20.0, switch_tc1=3e-3),
    Trim(method="two-temperatures", temperatures=(REFERENCE, 398.15)),
    cut(),
)


@pytest.mark.parametrize("trim", EVERY, ids=lambda t: t.method)
def test_the_result_depends_on_the_seed_alone(trim):
    network, made, materials = with_ends()
    first, again, other = (planned(network, materials, trim, made=made, draws=200, seed=s) for s in (7, 7, 8))
    assert first == again
    assert first.after != other.after
    assert (first.rows, first.whole_gain) == (other.rows, other.whole_gain)
    data = first.to_dict()
    assert json.loads(json.dumps(data, allow_nan=False)) == data


def test_nothing_known_nothing_trimmed():
    bare = by_name(film("pp", -150.0), film("np", 310.0, value_percent=10.0))
    with pytest.raises(InputError, match="pp without a spread: the range of the trim is not known"):
        planned(TWO, bare, ONE)
    spread = Spread(meaning="limits", tc1=4e-5)
    laws = {**two_films(), "pp": Material(**{**fields_of(two_films()["pp"]), "spread": spread})}
    with pytest.raises(InputError, match="pp without a spread of its value"):
        planned(TWO, laws, ONE)
    with pytest.raises(InputError, match="spread of zero"):
        planned(TWO, two_films(0.0), ONE)
    plain_materials = {
        name: Material(**{**fields_of(m), "kind": "plain", "ohm_per_square": None})
        for name, m in two_films().items()
    }
    with pytest.raises(InputError, match="a network without a film"):
        planned(TWO, plain_materials, ONE)
    with pytest.raises(InputError, match="a network without a film"):
        planned(TWO, plain_materials, cut())
    with pytest.raises(InputError, match="draws"):
        planned(TWO, two_films(), ONE, draws=0)


def fields_of(material):
    names = ("name", "label", "source", "law", "valid", "kind", "ohm_per_square", "spread")
    return {name: getattr(material, name) for name in names}


def test_the_code_table():
    found = planned(TWO, two_films(), Trim(method="one-temperature", step=5e-3), draws=50)
    table = list(csv.reader(io.StringIO(codes_csv(found), newline="")))
    assert table[0] == ["code", "leg", "ohms", "step_ppm_of_whole", "of"]
    assert codes_csv(found).endswith("\r\n")  # RFC 4180
    for row in found.rows:
        own = [line for line in table[1:] if line[1] == row.leg]
        assert [int(line[0]) for line in own] == list(range(2 ** len(row.bit_ohms)))
        ohms = [float(line[2]) for line in own]
        assert ohms[-1] == pytest.approx(row.base_ohms + sum(row.bit_ohms), rel=1e-12)
        steps = np.array([float(line[3]) for line in own[1:]])
        assert steps == pytest.approx(np.diff(ohms) / 18e3 * 1e6, rel=1e-6)
    assert codes_csv(planned(TWO, two_films(), cut(), draws=50)).count("\n") == 1


def test_legs_follow_the_leaves():
    network, made, materials = with_ends()
    members, devices = setting(network, materials, made=made)
    assert [m.leaves for m in members] == [(0, 1), (2,)]
    leaves = devices.ohms([REFERENCE])[0]
    own = with_legs(leaves, members[:1], [leg_ohms(leaves, members[0])])
    assert whole(network, own) == pytest.approx(whole(network, leaves), rel=1e-12)
    with pytest.raises(ValueError, match="legs of 2 leaves"):
        members_of(network, plain(TWO), materials, {n: m.spread for n, m in materials.items()}, REFERENCE)


def test_2000_devices_take_less_than_a_second():
    network, made, materials = with_ends()
    start = time.process_time()
    planned(network, materials, Trim(method="one-temperature", step=5e-4, switch_resistance=20.0), made=made)
    assert time.process_time() - start < 5.0  # on a slow machine that is busy; well below 1 s alone


def test_a_leg_named_like_the_switch():
    materials = by_name(film("switch", -150.0, value_percent=10.0))
    trim = Trim(method="one-temperature", switch_resistance=20.0)
    network: Leg = leg("switch", 10e3)
    assert planned(network, materials, trim, draws=50).after.value.median < 1e-3
