"""The worst case of a ratio, against exact identities and against dense sampling of its box."""

import numpy as np
import pytest
from makers import by_name, film, leg, need_of, random_tree
from ratio_pairs import devices, drift_of, films, pair
from scipy.optimize import minimize

from tcplan.goal import Limit
from tcplan.process import Correlation, Parameter, Process, Tracking
from tcplan.ratio import cells
from tcplan.ratio.mismatch import value_range
from tcplan.ratio.space import space_of
from tcplan.ratio.worst import worst_of

A, B = -120e-6, 0.55e-6
RED = by_name(film("red", -120.0, 0.55, value_percent=18.0))
HOT, COLD = 125.0, -65.0  # x at the ends of -40..150 degC about 25 degC


# --- identities -----------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", ["gain", "divider"])
def test_two_equal_networks_never_drift_without_tracking(kind):
    """Identity: R1 = k R2 in every device, whatever the spread, so q is constant."""
    two = films(np.random.default_rng(1), ("a", "b"))
    one = pair(kind, "(a 1k || b 2k) + a 3k", "a 9k + (b 6k || a 3k)", two)
    found = worst_of(one)
    assert one.judge(one.nominal()).figure < 1e-14
    assert found.judged.figure < 1e-14
    assert found.upper < 1e-14
    assert found.closed


def test_gain_of_two_resistors_of_one_film():
    """By hand: (1 + (a + t/2) x + b x^2)/(1 + (a - t/2) x + b x^2) - 1, largest at the hot end."""
    t = 3e-6
    found = worst_of(pair("gain", "red 1k", "red 2k", RED, t))
    exact = (1 + (A + t / 2) * HOT + B * HOT**2) / (1 + (A - t / 2) * HOT + B * HOT**2) - 1
    assert found.judged.figure == pytest.approx(exact, rel=1e-12)
    assert exact <= found.upper <= exact * (1 + 1e-4)


def test_gain_with_a_spread_of_tc1_takes_it_where_it_counts():
    """The same, with a at its lower limit: that makes the denominator smallest."""
    t, K = 3e-6, 40e-6
    red = by_name(film("red", -120.0, 0.55, value_percent=18.0, tc1_spread_ppm=40.0))
    found = worst_of(pair("gain", "red 1k", "red 2k", red, t))
    exact = (1 + (A - K + t / 2) * HOT + B * HOT**2) / (1 + (A - K - t / 2) * HOT + B * HOT**2) - 1
    assert found.judged.figure == pytest.approx(exact, rel=1e-12)
    assert exact <= found.upper <= exact * (1 + 1e-3)
    assert found.device.shifts["red"][0] == pytest.approx(-K)


def test_divider_of_two_equal_resistors_drifts_by_tracking_times_its_share():
    """q = r2/(r1 + r2), 1/2 at the reference; with r2 - r1 = t x the drift is 2 r2/(r1 + r2) - 1 =
    t x/(2 r), r the common law: to first order t |x| times the share 1/2.
    """
    t = 4e-6
    found = worst_of(pair("divider", "red 5k", "red 5k", RED, t))
    exact = t * HOT / 2 / (1 + A * HOT + B * HOT**2)
    assert found.judged.figure == pytest.approx(exact, rel=1e-12)
    assert found.judged.figure == pytest.approx(t * HOT * 0.5, rel=0.01)
    assert found.judged.at == pytest.approx(298.15 + HOT)


def test_divider_of_unequal_resistors_has_the_share_of_the_first():
    """d ln q = (1 - q)(d ln R2 - d ln R1), so to first order the drift is t |x| (1 - q)."""
    t = 1e-6
    flat = by_name(film("red", 0.0, 0.0, value_percent=10.0))
    found = worst_of(pair("divider", "red 9k", "red 1k", flat, t))
    assert found.judged.figure == pytest.approx(t * HOT * 0.9, rel=1e-3)


def test_of_two_films_the_common_shift_is_limited_by_their_tracking():
    """Gain of single resistors of two films, by hand: r1/r2 with TC1 apart by ``within`` at most."""
    K, within = 40e-6, 15e-6
    two = by_name(
        film("p", 100.0, value_percent=20.0, tc1_spread_ppm=40.0),
        film("q", 90.0, value_percent=10.0, tc1_spread_ppm=40.0),
    )
    free = worst_of(pair("gain", "p 1k", "q 2k", two))
    tied = worst_of(
        pair(
            "gain",
            "p 1k",
            "q 2k",
            two,
            process=Process(trackings=(Tracking(materials=("p", "q"), within=within),)),
        )
    )
    assert free.judged.figure == pytest.approx((1 + 140e-6 * HOT) / (1 + 50e-6 * HOT) - 1, rel=1e-12)
    low = 90e-6 - K
    expected = (1 + (low + 10e-6 + within) * HOT) / (1 + low * HOT) - 1
    assert tied.judged.figure == pytest.approx(expected, rel=1e-9)
    assert expected <= tied.upper <= expected * (1 + 1e-3)


def test_values_in_full_step_make_the_ratio_exact():
    """A correlation of one between two sheet resistances: their ratio at the reference does not move."""
    two = by_name(film("p", 100.0, value_percent=15.0), film("q", 90.0, value_percent=15.0))
    one = Parameter(material="p", component="value"), Parameter(material="q", component="value")
    step = Process(correlations=(Correlation(first=one[0], second=one[1], value=1.0),))
    assert value_range(pair("gain", "p 1k", "q 2k", two, process=step)) == pytest.approx(
        (0.0, 0.0), abs=1e-15
    )
    low, high = value_range(pair("gain", "p 1k", "q 2k", two))
    assert (low, high) == pytest.approx((0.85 / 1.15 - 1, 1.15 / 0.85 - 1), rel=1e-12)


# --- against sampling -----------------------------------------------------------------------------


def cases():
    """Yield random pairs: both kinds, one to three films, tracking, other references."""
    for seed in range(8):
        rng = np.random.default_rng(seed)
        names = ("a", "b", "c")[: 1 + seed % 3]
        references = (298.15,) if seed % 2 else (273.15, 293.15, 300.15)
        made = films(rng, names, references)
        first, second = (random_tree(rng, names, int(rng.integers(1, 4))) for _ in range(2))
        used = {n: made[n] for n in names}
        process = Process()
        if seed in (1, 2, 5):
            process = (
                Process(trackings=(Tracking(materials=names, within=20e-6),)) if len(names) > 1 else process
            )
        kind = "gain" if seed < 4 else "divider"
        one = pair(kind, first, second, used, float(rng.uniform(0, 6e-6)), process)
        yield pytest.param(one_in_use(one), id=f"{kind}-{seed}")


def one_in_use(one):
    """Return the pair with the materials of its networks only."""
    used = {n: one.materials[n] for n in one.names}
    return pair(one.ratio.kind, one.ratio.first, one.ratio.second, used, one.tracking, one.process)


@pytest.mark.parametrize("one", list(cases()))
def test_no_sampled_device_is_beyond_the_bound_and_the_worst_is_reached(one):
    found, rng = worst_of(one), np.random.default_rng(7)
    T = np.linspace(-40, 150, 39) + 273.15
    sampled = max(float(np.abs(drift_of(one, *device, T)).max()) for device in devices(one, rng, 800))
    assert sampled <= found.upper * (1 + 1e-9)
    assert sampled <= found.judged.figure * (1 + 1e-3)
    device = found.device
    again = drift_of(one, device.factors, device.shifts, device.apart, np.array([found.judged.at]))
    assert abs(again[0]) == pytest.approx(found.judged.figure, rel=1e-9)
    assert found.closed
    assert found.upper <= found.judged.figure * (1 + 1e-3)


@pytest.mark.parametrize("one", list(cases()))
def test_the_worst_device_is_one_of_the_box(one):
    found = worst_of(one)
    for name, factor in found.device.factors.items():
        limits = one.spreads[name].limits()
        # The reference of the brief may lie off that of the material: then the value is a little wider.
        assert abs(factor - 1) <= limits.value + 0.01
        assert abs(found.device.shifts[name][0]) <= limits.tc1 * (1 + 1e-12)
        assert abs(found.device.shifts[name][1]) <= limits.tc2 * (1 + 1e-12)
        assert max(map(abs, found.device.apart[name])) <= 0.5 * one.tracking * (1 + 1e-12)
    for tracking in one.process.trackings:
        tc1 = [found.device.shifts[n][0] for n in tracking.materials if n in one.names]
        assert np.ptp(tc1) <= tracking.within * (1 + 1e-9)


def test_a_point_inside_the_box_is_found():
    """Two films whose values alone matter: the worst factor lies between its limits, as an ascent finds."""
    two = by_name(film("a", 250.0, 0.5, value_percent=10.0), film("b", -1800.0, 1.9, value_percent=15.0))
    flat = film("c", 0.0, 0.0, value_percent=0.0)
    need = need_of(Limit(kind="drift", value=1e-3), low=-40, high=125)
    # The network of the mixed example of METHODS 6 (independent prototype): legs A || B + A over a flat one.
    one = pair("gain", "(a 0.69538 ohm || b 0.5955 ohm) + a 1 ohm", "c 1 ohm", {**two, "c": flat}, need=need)
    found = worst_of(one)
    # 3086.6 ppm is the worst case of this network alone there; a flat resistor below it changes nothing.
    assert found.judged.figure * 1e6 == pytest.approx(3086.6, rel=1e-4)
    assert found.upper * 1e6 == pytest.approx(3086.6, rel=1e-3)

    T = np.linspace(-40, 125, 166) + 273.15
    zero = dict.fromkeys("abc", (0.0, 0.0))

    def less(z):
        factors = {"a": 1 + 0.1 * np.sin(z[0]), "b": 1 + 0.15 * np.sin(z[1]), "c": 1.0}
        return -float(np.abs(drift_of(one, factors, zero, zero, T)).max())

    starts = [(p, q) for p in (-1.5, 0.1, 1.5) for q in (-1.5, 0.1, 1.5)]
    ascended = max(-minimize(less, start, method="Nelder-Mead").fun for start in starts)
    assert ascended <= found.upper * (1 + 1e-9)
    assert ascended == pytest.approx(found.judged.figure, rel=2e-3)


def test_a_band_is_bounded():
    rng = np.random.default_rng(11)
    one = pair(
        "divider",
        "a 3k + b 2k",
        "a 1k || b 2k",
        films(rng, ("a", "b")),
        3e-6,
        need=need_of(Limit(kind="band", value=1e-3)),
    )
    found, T = worst_of(one), np.linspace(-40, 150, 39) + 273.15
    sampled = max(float(np.ptp(drift_of(one, *device, T))) for device in devices(one, rng, 800))
    assert sampled <= found.upper * (1 + 1e-9)
    assert sampled <= found.judged.figure * (1 + 1e-2)
    device = found.device
    again = drift_of(one, device.factors, device.shifts, device.apart, np.linspace(-40, 150, 4001) + 273.15)
    assert np.ptp(again) == pytest.approx(found.judged.figure, rel=1e-6)


def test_a_bound_holds_when_the_work_ends_early():
    rng = np.random.default_rng(3)
    one = pair("gain", "(a 2k || b 1k) + c 1k", "a 1k || c 3k", films(rng, ("a", "b", "c")), 3e-6)
    space = space_of(one)
    grid = space.grid(np.array([423.15]), np.array([1.0]))
    short = cells.side_extreme(space, grid, up=True, work=2000)
    long = cells.side_extreme(space, grid, up=True)
    assert long.figure <= long.upper <= short.upper
    assert short.figure <= long.figure * (1 + 1e-4)
    assert short.upper > long.upper * (1 + 1e-4)


def test_legs_of_the_ratio_may_be_networks_of_other_materials():
    """A material in one resistor only has no counterpart: tracking does not touch it."""
    two = by_name(
        film("p", 100.0, value_percent=20.0, tc1_spread_ppm=40.0), film("q", 90.0, value_percent=10.0)
    )
    apart = worst_of(pair("gain", leg("p", 1e3), leg("q", 2e3), two, 5e-6))
    same = worst_of(pair("gain", leg("p", 1e3), leg("q", 2e3), two))
    assert apart.judged.figure == same.judged.figure
