"""Measured devices beside their plan: drift and its uncertainty, the band, places, centring, bad input."""

from dataclasses import replace

import numpy as np
import pytest
from makers import brief, by_name, film, leg
from measured_composites import (
    MIXED,
    PARALLEL,
    REFERENCE,
    SERIES,
    device_ohms,
    expected_of,
    films,
    scalar_ohms,
    sweep_of,
)
from scipy.optimize import differential_evolution
from scipy.stats import norm

from tcplan.errors import InputError
from tcplan.goal import Limit
from tcplan.measure.centred import MOST_CHANGE
from tcplan.measure.centring_task import changed
from tcplan.measure.compare import compare
from tcplan.measure.model import CommonErrors
from tcplan.network import Leg, Parallel, Series, legs, value
from tcplan.workflow.comparing import Asking
from tcplan.workflow.comparing import expected_of as expected_of_plan
from tcplan.workflow.planning import make_plan

T = np.array([-40.0, -10.0, 25.0, 60.0, 90.0, 120.0, 150.0]) + 273.15
OFF_REFERENCE = np.array([-40.0, -15.0, 10.0, 45.0, 80.0, 115.0, 150.0]) + 273.15
DRIFT = Limit(kind="drift", value=6000e-6)


def generator(seed):
    return np.random.Generator(np.random.Philox(seed))


def measured(off=None, at=T, u=2e-5, network=PARALLEL, **more):
    ohms = device_ohms(network, films(), off or {}, at)
    return sweep_of(at, ohms, u * ohms, **more)


# --- drift and its uncertainty -------------------------------------------------------------------


@pytest.mark.parametrize("at", [T, OFF_REFERENCE], ids=["reading there", "fit"])
def test_drift_and_r_at_the_reference_are_those_of_the_device(at):
    # Outside: the scalar twin of the tests; the device is no polynomial, and a cubic leaves little of it.
    off = {("pp", "tc1"): 9e-6, ("np", "value"): 0.02}
    one = compare(measured(off, at), expected_of(PARALLEL, films())).devices[0]
    ohms = scalar_ohms(PARALLEL, films(), off, REFERENCE)
    assert one.ohms == pytest.approx(ohms, rel=2e-6)
    exact = device_ohms(PARALLEL, films(), off, at) / ohms - 1.0
    assert [point.drift for point in one.points] == pytest.approx(exact, abs=2e-6)
    assert (one.by, one.order) == (("readings", 0) if at is T else ("fit", 3))


@pytest.mark.parametrize("at", [T, OFF_REFERENCE], ids=["reading there", "fit"])
def test_uncertainties_are_those_of_many_measurements(at):
    # Outside: the scatter of drifts over 250 simulated measurements with noise, chamber and lead errors.
    rng, expected = generator(11), expected_of(PARALLEL, films(), quantile=0.5)
    common = CommonErrors(chamber_offset=0.4, lead=1.0, chamber_scale=2e-3)
    u, u_T = 2e-5 * value(PARALLEL), 0.05
    drifts, values, stated = [], [], None
    for _ in range(250):
        seen = at + 0.4 * rng.standard_normal() + 2e-3 * rng.standard_normal() * (at - REFERENCE)
        seen = seen + u_T * rng.standard_normal(len(at))
        ohms = device_ohms(PARALLEL, films(), {}, seen) + rng.normal(0, u, len(at)) + rng.standard_normal()
        one = compare(sweep_of(at, ohms, u, u_T), expected, common).devices[0]
        drifts.append([point.drift for point in one.points])
        values.append(one.ohms)
        stated = one
    found = np.array([point.uncertainty for point in stated.points])
    assert found == pytest.approx(np.std(drifts, axis=0), rel=0.15, abs=1e-7)
    assert stated.ohms_uncertainty == pytest.approx(np.std(values), rel=0.15)


def test_a_common_lead_that_moves_all_alike_moves_the_drift_by_the_difference():
    # Outside: d(R/R0 - 1) = lead (R0 - R)/R0^2, written out.
    common = CommonErrors(lead=5.0)
    one = compare(measured(u=1e-9), expected_of(PARALLEL, films()), common).devices[0]
    ohms = device_ohms(PARALLEL, films(), {}, T)
    expected = 5.0 * np.abs(one.ohms - ohms) / one.ohms**2
    assert [p.uncertainty for p in one.points] == pytest.approx(expected, rel=1e-2, abs=3e-9)


def test_without_stated_uncertainty_the_scatter_is_taken():
    # Outside: the noise that was drawn; 33 readings about a cubic leave some 13 % of chance.
    at = np.linspace(-40.0, 150.0, 33) + 273.15
    exact = device_ohms(PARALLEL, films(), {}, at)
    ohms = exact * (1.0 + 1e-4 * generator(12).standard_normal(len(at)))
    one = compare(sweep_of(at, ohms), expected_of(PARALLEL, films())).devices[0]
    assert not one.stated
    assert one.points[0].uncertainty == pytest.approx(1.1e-4, rel=0.3)


# --- the band ------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def plan():
    return make_plan(brief())


def test_a_device_at_the_worst_point_of_the_plan_lies_on_the_edge(plan):
    # Outside: the worst point that the plan states, evaluated by the scalar twin.
    option, expected = plan.best, expected_of_plan(plan, Asking())
    off = {}
    for name, moved in option.worst_case.point.items():
        shifts = (("value", moved.ohm_per_square - 1.0), ("tc1", moved.tc1 * 1e-6), ("tc2", moved.tc2 * 1e-6))
        off |= {(name, slot): shift for slot, shift in shifts}
    at = np.unique(np.r_[T, option.worst_case.at_degC + 273.15])
    ohms = device_ohms(option.network, plan.by_name, off, at)
    one = compare(sweep_of(at, ohms, 1e-7 * ohms), expected).devices[0]
    far = min(one.points, key=lambda point: abs(point.T - option.worst_case.at_degC - 273.15))
    edge = far.highest if far.drift > 0 else far.lowest
    assert far.drift == pytest.approx(edge, rel=1e-6)
    assert abs(edge) * 1e6 == pytest.approx(option.worst_case.peak_ppm, rel=1e-6)
    assert one.place in ("inside", "not clear")
    further = {key: 1.2 * shift for key, shift in off.items()}
    ohms = device_ohms(option.network, plan.by_name, further, at)
    assert compare(sweep_of(at, ohms, 1e-6 * ohms), expected).devices[0].place == "outside"


def test_places_are_told_with_the_uncertainty():
    # Outside: the normal quantile for all points together (Bonferroni), from scipy.stats.
    expected = expected_of(PARALLEL, films())
    edge = compare(measured(), expected).devices[0].points[-1].highest
    ohms = device_ohms(PARALLEL, films(), {}, T)
    at_reference = ohms[2]
    for beyond, place in ((-3.0, "inside"), (1.0, "not clear"), (6.0, "outside")):
        u = 2e-5 * at_reference
        trial = ohms.copy()
        trial[-1] = at_reference * (1.0 + edge + beyond * 3e-5)
        one = compare(sweep_of(T, trial, u), expected).devices[0]
        assert one.place == place, beyond
        assert one.points[-1].beyond == pytest.approx(beyond * 3e-5 / one.points[-1].uncertainty, rel=1e-3)
    assert one.factor == pytest.approx(norm.ppf(1.0 - 0.025 / len(T)))
    assert one.farthest == len(T) - 1


def test_value_limit_and_figure_are_judged():
    # Outside: the largest absolute drift of the readings, by hand.
    expected = expected_of(PARALLEL, films(), DRIFT, tolerance=0.01)
    good = compare(measured(), expected).devices[0]
    exact = device_ohms(PARALLEL, films(), {}, T) / scalar_ohms(PARALLEL, films(), {}, REFERENCE) - 1.0
    assert good.figure.figure == pytest.approx(np.max(np.abs(exact)), abs=1e-7)
    assert good.value_place == "inside"
    assert compare(measured({("pp", "value"): 0.1}), expected).devices[0].value_place == "outside"
    tight = expected_of(PARALLEL, films(), Limit(kind="drift", value=0.5 * np.max(np.abs(exact))))
    found = compare(measured(), tight)
    assert found.devices[0].figure.place == "outside"
    assert not found.good


def test_a_band_limit_is_half_the_distance_over_its_weight():
    band = Limit(kind="band", value=8000e-6)
    one = compare(measured(), expected_of(PARALLEL, films(), band)).devices[0]
    drift = [point.drift for point in one.points]
    assert one.figure.figure == pytest.approx(max(drift) - min(drift))


def test_devices_are_told_apart():
    both = np.r_[measured().R, measured({("np", "value"): 0.05}).R]
    device = np.repeat([0, 1], len(T))
    sweep = sweep_of(np.r_[T, T], both, 0.3, names=("D1", "D2"), device=device)
    found = compare(sweep, expected_of(PARALLEL, films()))
    assert [one.device for one in found.devices] == ["D1", "D2"]
    alone = compare(sweep_of(T, both[len(T) :], 0.3), expected_of(PARALLEL, films())).devices[0]
    assert found.devices[1].points == tuple(
        replace(point, line=point.line + len(T)) for point in alone.points
    )
    assert [one.device for one in found.centring.devices] == ["D1", "D2"]


def many(count, seed, jitter=0.0):
    """Return a sweep of devices with TC1 drawn, a third of its limit a sigma, and noise of 20 ppm."""
    rng = generator(seed)
    temperatures, ohms = [], []
    for _ in range(count):
        off = {("pp", "tc1"): 10e-6 * rng.standard_normal(), ("np", "tc1"): 8e-6 * rng.standard_normal()}
        at = np.clip(T + jitter * rng.standard_normal(len(T)) * (T != REFERENCE), T[0], T[-1])
        temperatures.append(at)
        ohms.append(device_ohms(PARALLEL, films(), off, at) * (1.0 + 2e-5 * rng.standard_normal(len(T))))
    names = tuple(f"D{k}" for k in range(count))
    device = np.repeat(np.arange(count), len(T))
    return sweep_of(np.concatenate(temperatures), np.concatenate(ohms), 0.35, names=names, device=device)


@pytest.mark.parametrize("jitter", [0.0, 0.2], ids=["same temperatures", "temperatures as measured"])
def test_the_band_is_found_once_for_all_devices(jitter):
    # Outside: the band asked at the readings of one device alone; h^2/8 |R''| of a 1 K grid is below 1 ppm.
    expected = expected_of(PARALLEL, films())
    asked = []

    def counted(at):
        asked.append(len(at))
        return expected.band(at)

    found = compare(many(40, 5, jitter), replace(expected, band=counted))
    assert len(asked) == 2  # the curves, and all readings together
    assert asked[1] <= 201
    for one in (found.devices[0], found.devices[-1]):
        low, high = expected.band(np.array([point.T for point in one.points]))
        assert [point.lowest for point in one.points] == pytest.approx(low, abs=1e-6)
        assert [point.highest for point in one.points] == pytest.approx(high, abs=1e-6)


def test_a_device_with_too_few_readings_does_not_stop_the_others():
    device = np.r_[np.repeat(0, len(T)), 1, 1, 2, 2, 2, 3, 3]
    at = np.r_[T, T[[0, -1]], np.full(3, REFERENCE), T[[0, 1]] - 100.0]
    noisy = measured().R * (1.0 + 1e-5 * generator(3).standard_normal(len(T)))
    R = np.r_[noisy, noisy[[0, -1]], np.full(3, value(PARALLEL)), noisy[:2]]
    sweep = sweep_of(at, R, None, names=("D1", "D2", "D3", "D4"), device=device)
    found = compare(sweep, expected_of(PARALLEL, films()))
    assert [one.device for one in found.devices] == ["D1"]
    assert [one.device for one in found.skipped] == ["D2", "D3", "D4"]
    for one, words in zip(found.skipped, ("2 readings", "one temperature", "-140 degC"), strict=True):
        assert words in one.found
        assert one.todo == f"Give more readings of device {one.device}, or leave it out."
    assert not found.good
    alone = compare(sweep_of(T, noisy), expected_of(PARALLEL, films())).devices[0]
    assert found.devices[0].points == alone.points


def test_a_file_of_too_few_readings_is_refused_with_each_device():
    ends = [0, -1, 0, -1]
    message = refused(sweep_of(T[ends], measured().R[ends], None, names=("D1", "D2"), device=[0, 0, 1, 1]))
    assert "Give more readings of device D1, or leave it out" in message
    assert "Give more readings of device D2, or leave it out" in message


# --- centring ------------------------------------------------------------------------------------


def peak(network, off, wanted=0.0):
    at = np.linspace(-40.0, 150.0, 191) + 273.15
    ohms = device_ohms(network, films(), off, np.r_[at, REFERENCE])
    return float(np.max(np.abs(ohms[:-1] / ohms[-1] - 1.0 - wanted)))


@pytest.mark.parametrize("network", [SERIES, PARALLEL, MIXED], ids=["series", "parallel", "mixed"])
def test_centring_reaches_what_a_global_search_finds(network):
    # Outside: scipy differential_evolution over the ratios of the legs, the drift by the scalar twin.
    off = {("pp", "tc1"): 20e-6, ("np", "value"): -0.05, ("np", "tc2"): 0.05e-6}
    found = compare(measured(off, u=1e-7, network=network), expected_of(network, films(), DRIFT)).centring
    explained = compare(measured(off, u=1e-7, network=network), expected_of(network, films(), DRIFT))
    deviations = {(d.material, d.slot): d.value for d in explained.devices[0].explanation.deviations}
    count = len(legs(network))

    def aim(x):
        return peak(changed(network, (1.0, *np.exp(x))), deviations)

    least = differential_evolution(
        aim, [(-1.35, 1.35)] * (count - 1), seed=1, tol=1e-8, maxiter=30, popsize=8, polish=False
    )
    own = changed(network, found.factors)
    assert peak(own, deviations) <= least.fun * 1.0101 + 1e-7
    assert found.devices[0].after == pytest.approx(peak(own, deviations), rel=1e-3)
    assert found.devices[0].before == pytest.approx(peak(network, deviations), rel=1e-3)
    assert scalar_ohms(own, films(), deviations, REFERENCE) == pytest.approx(value(network), rel=1e-8)
    assert found.level == "planned"


@pytest.mark.parametrize(
    ("off", "step"), [({("pp", "tc1"): 120e-6}, 0.0), ({}, 3e-4)], ids=["not plausible", "not explained"]
)
def test_what_is_not_explained_is_not_centred(off, step):
    # 12 sigma of a normal TC1, and a zigzag of 15 u(R): either chi-square is far under 0.1 %.
    ohms = device_ohms(PARALLEL, films(), off, T) * (1.0 + step * (np.arange(len(T)) % 2))
    found = compare(sweep_of(T, ohms, 2e-5 * ohms), expected_of(PARALLEL, films()))
    checks = found.devices[0].explanation
    assert min(checks.spread.probability, checks.misfit.probability) < 1e-3
    assert found.centring is None
    assert "under 0.1 %" in found.why_not


def test_one_device_that_is_not_explained_is_left_out_of_the_mean():
    good, bad = many(4, 8), measured({("pp", "tc1"): 120e-6})
    device = np.r_[good.device, np.full(len(T), 4)]
    both = sweep_of(
        np.r_[good.T, bad.T], np.r_[good.R, bad.R], 0.35, names=(*good.devices, "X"), device=device
    )
    expected = expected_of(PARALLEL, films())
    found = compare(both, expected).centring
    assert found.left_out == ("X",)
    assert [one.device for one in found.devices] == list(good.devices)
    assert found.factors == pytest.approx(compare(good, expected).centring.factors, rel=1e-9)


def test_a_gain_smaller_than_what_is_open_is_not_clear():
    # Three readings of 0.2 % say next to nothing of a drift of 0.1 %; readings of 1 ppm say all of it.
    off = {("pp", "tc1"): 15e-6, ("np", "tc1"): 10e-6}
    rough, fine = (
        compare(measured(off, at, u), expected_of(PARALLEL, films())).centring.devices[0]
        for at, u in ((T[[0, 2, -1]], 2e-3), (T, 1e-6))
    )
    assert fine.clear
    assert not rough.clear


@pytest.mark.parametrize(("factor", "limited"), [(3.85, True), (3.4, False)])
def test_a_leg_within_a_tenth_of_the_largest_change_is_told(factor, limited):
    # Outside: Kirchhoff; of two legs at their best, b is made larger by the factor, and a such that R stays.
    a, b = compare(measured(u=1e-6), expected_of(PARALLEL, films())).centring.ohms
    own = 1.0 / (1.0 / a + 1.0 / b)
    start = Parallel((leg("pp", 1.0 / (1.0 / own - 1.0 / (factor * b))), leg("np", factor * b)))
    found = compare(measured(u=1e-6, network=start), expected_of(start, films())).centring
    assert min(found.factors) == pytest.approx(1.0 / factor, rel=0.02)
    assert found.limited == limited


def test_of_equal_answers_the_least_change_is_taken():
    # Outside: two equal legs in series act by their sum, so the squares are least when both change alike.
    network = Series((leg("pp", 4000.0), leg("pp", 4000.0), leg("np", 7000.0)))
    off = {("pp", "tc1"): 25e-6}
    found = compare(measured(off, network=network), expected_of(network, films(), DRIFT)).centring
    assert found.factors[0] == pytest.approx(found.factors[1], rel=1e-4)
    assert found.devices[0].after < found.devices[0].before


def test_a_nominal_device_of_an_optimum_is_left_as_it_is(plan):
    # Outside: a plan of two films whose nominal drift is least has nothing to gain.
    expected = expected_of_plan(plan, Asking())
    ohms = device_ohms(plan.best.network, plan.by_name, {}, T)
    found = compare(sweep_of(T, ohms, 1e-6 * ohms), expected).centring
    assert found.devices[0].after >= plan.floor.nominal_ppm * 1e-6 * (1.0 - 1e-6)
    assert found.devices[0].after <= found.devices[0].before * (1.0 + 1e-9)


def test_the_uncertainty_after_is_that_of_devices_that_the_readings_allow():
    # Outside: the scatter of the drift of devices drawn from the covariance of the explanation.
    found = compare(measured(u=1e-4), expected_of(PARALLEL, films(), DRIFT))
    explanation, rng = found.devices[0].explanation, generator(13)
    own = changed(PARALLEL, found.centring.factors)
    at, drifts = np.linspace(-40.0, 150.0, 9) + 273.15, []
    for row in rng.multivariate_normal(explanation.values, explanation.covariance, size=600):
        off = {(d.material, d.slot): v for d, v in zip(explanation.deviations, row.tolist(), strict=True)}
        ohms = device_ohms(own, films(), off, np.r_[at, REFERENCE])
        drifts.append(ohms[:-1] / ohms[-1])
    assert found.centring.devices[0].uncertainty == pytest.approx(np.std(drifts, axis=0).max(), rel=0.1)


def test_what_cannot_change_is_left_and_told():
    given = compare(measured(), expected_of(PARALLEL, films(), fixed=frozenset({0, 1})))
    assert given.centring is None
    assert "given" in given.why_not
    one = compare(measured(), expected_of(PARALLEL, films(), fixed=frozenset({0})))
    assert "sets it" in one.why_not
    three = Parallel((*PARALLEL.children, leg("nd", 4e5)))
    part = compare(measured(network=three), expected_of(three, films(), fixed=frozenset({0}))).centring
    assert part.factors[0] == 1.0
    assert part.devices[0].after < part.devices[0].before
    single = compare(measured(network=Leg(material="pp", ohms=1e4)), expected_of(leg("pp", 1e4), films()))
    assert "one leg" in single.why_not


def test_members_of_one_leg_change_together():
    network = Series((leg("pp", 4000.0), leg("np", 500.0), leg("np", 6500.0)))
    off = {("pp", "tc1"): 25e-6}
    sweep = measured(off, network=network)
    found = compare(sweep, expected_of(network, films(), DRIFT, changed=(0, 0, 1))).centring
    assert found.factors[0] == found.factors[1] != found.factors[2]
    assert max(found.factors) < MOST_CHANGE


def test_a_free_level_keeps_r_as_it_is():
    off = {("pp", "tc1"): 25e-6}
    sweep = measured(off)
    expected = expected_of(PARALLEL, films(), DRIFT, level_known=False)
    found = compare(sweep_of(T, 1.2 * sweep.R, 1e-5 * sweep.R), expected)
    assert found.centring.level == "kept"
    assert found.devices[0].explanation.norm < 2.5


# --- bad input -----------------------------------------------------------------------------------


def refused(sweep, **more):
    with pytest.raises(InputError) as caught:
        compare(sweep, expected_of(PARALLEL, films(), **more))
    return str(caught.value)


def test_readings_outside_of_the_range_are_refused_or_counted():
    assert "range of the plan, -40 degC to 150 degC" in refused(measured(at=T + 300.0))
    longer = np.r_[T, 473.15]
    sweep = sweep_of(longer, np.r_[measured().R, 2e4], 0.3)
    one = compare(sweep, expected_of(PARALLEL, films())).devices[0]
    assert (one.left_out, len(one.points)) == (1, len(T))


def test_an_overshoot_of_the_chamber_is_at_the_end():
    at = np.r_[T[:-1], T[-1] + 0.4]
    one = compare(measured(at=at), expected_of(PARALLEL, films())).devices[0]
    assert (one.left_out, one.points[-1].T) == (0, at[-1])


@pytest.mark.parametrize("times", [1e-3, 1e3])
def test_another_unit_is_seen(times):
    sweep = measured()
    message = refused(sweep_of(T, times * sweep.R, 1e-5 * times * sweep.R))
    assert "times the plan" in message
    assert "unit of R" in message


def test_another_resistor_is_seen():
    assert "--option" in refused(sweep_of(T, 5.0 * measured().R, 0.1))


def test_one_temperature_says_nothing_of_the_drift():
    at = np.full(4, 300.0)
    assert "one temperature, 26.85 degC" in refused(measured(at=at))


def test_two_readings_without_uncertainty_are_too_few():
    sweep = measured(at=T[[0, -1]])
    assert "u(R)" in refused(replace(sweep, u_R=None))
    found = compare(sweep, expected_of(PARALLEL, films())).devices[0]
    assert (found.by, found.order) == ("fit", 1)


def test_every_bad_device_is_named():
    device = np.repeat([0, 1], len(T))
    sweep = sweep_of(np.r_[T, T], np.r_[9.0 * measured().R, 1e3 * measured().R], 0.3, names=("D1", "D2"),
                     device=device)  # fmt: skip
    message = refused(sweep)
    assert "device D1" in message
    assert "device D2" in message


def test_uncertainties_of_zero_or_of_temperatures_alone_are_refused():
    assert "u(R) of 0" in refused(sweep_of(T, measured().R, 0.0))
    assert "temperatures alone" in refused(sweep_of(T, measured().R, None, 0.1))


def test_a_material_without_spread_is_named():
    materials = by_name(*(film(n, a, b) for n, a, b in (("pp", -120.0, 0.55), ("np", 150.0, 0.4))))
    band = expected_of(PARALLEL, films()).band
    found = compare(measured(), expected_of(PARALLEL, materials, band=band))
    assert found.unspread == ("pp", "np")
    assert found.devices[0].explanation.deviations == ()
    assert found.curves.likely_low is None


def test_ten_thousand_readings_are_compared_quickly():
    at = np.linspace(-40.0, 150.0, 10_000) + 273.15
    x = at - REFERENCE
    parts = [leg.ohms * (1.0 + a * x + b * x**2) for leg, (a, b) in
             zip(legs(PARALLEL), ((-120e-6, 0.55e-6), (150e-6, 0.4e-6)), strict=True)]  # fmt: skip
    ohms = 1.0 / sum(1.0 / part for part in parts)
    one = compare(sweep_of(at, ohms, 1e-5 * ohms), expected_of(PARALLEL, films())).devices[0]
    assert len(one.points) == 10_000
    assert one.place == "inside"
    assert one.explanation.norm < 1e-3
