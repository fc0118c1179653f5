"""Several devices and lots: the mean law, spreads, correlation, and what is refused."""

import numpy as np
import pytest
from fit_sweeps import sweep_of
from measured_fits import fit_of, law_fit, lots_of
from scipy import stats
from scipy.special import ndtr

from tcplan.draws.statistics import tolerance_factor
from tcplan.errors import InputError
from tcplan.material.law import Expression, SteinhartHart, Thermistor
from tcplan.measure.fit import fit
from tcplan.measure.population import UNSTATED, population
from tcplan.measure.spread_laws import local

TC1, TC2 = -120e-6, 0.55e-6


def one_lot(values, **given):
    """Return devices of one lot with these R, TC1 and TC2."""
    return [fit_of(r, (a, b), **given) for r, a, b in values]


def named(count):
    return [""] * count, [f"d{k}" for k in range(count)]


def test_one_lot_is_plain_statistics():
    rng = np.random.Generator(np.random.Philox(2))
    values = np.array([1000.0, TC1, TC2]) + rng.normal(0, 1, (9, 3)) * [20.0, 5e-6, 0.02e-6]
    found = population(one_lot(values), *named(9))
    # Independent twin: numpy's mean and standard deviation, Howe's factor.
    assert found.values == pytest.approx(tuple(values.mean(axis=0)), rel=1e-12)
    assert found.uncertainties == pytest.approx(tuple(values.std(axis=0, ddof=1) / 3.0), rel=1e-10)
    k = tolerance_factor(9, 0.9973, 0.95)
    relative = values / [values[:, 0].mean(), 1.0, 1.0]
    for name, column in zip(("value", "tc1", "tc2"), relative.T, strict=True):
        one = found.scatter(name)
        sigma = column.std(ddof=1)
        low, high = stats.chi2.ppf((0.975, 0.025), 8)
        assert one.device.sigma == pytest.approx(sigma, rel=1e-9)
        assert one.device.low == pytest.approx(sigma * np.sqrt(8 / low), rel=1e-9)
        assert one.device.high == pytest.approx(sigma * np.sqrt(8 / high), rel=1e-9)
        assert one.device.dof == pytest.approx(8.0)
        assert one.total == one.device
        assert one.lot is None
        assert one.half_width == pytest.approx(k * sigma, rel=1e-9)
    assert (found.devices, found.lots, found.counts) == (9, 1, (9,))
    assert "One lot" in found.notes[0]


def test_known_spreads_are_recovered():
    truth = ((0.06, 9e-6, 0.04e-6), (0.03, 6e-6, 0.02e-6))
    found = population(*lots_of(3, (5,) * 80, *truth, noise=(0.01, 3e-6, 0.01e-6)))
    for k, name in enumerate(("value", "tc1", "tc2")):
        one = found.scatter(name)
        # 80 lots know a sigma to 1/sqrt(2*79) = 8 %; 320 freedoms within lots to 4 %: four and more of these.
        assert one.lot.sigma == pytest.approx(truth[0][k], rel=0.35)
        assert one.device.sigma == pytest.approx(truth[1][k], rel=0.17)
        assert one.total.sigma == pytest.approx(np.hypot(one.lot.sigma, one.device.sigma), rel=1e-9)
        assert one.half_width > 3.0 * one.total.sigma
    assert found.lot_spread("tc1") == found.scatter("tc1").lot
    assert found.device_spread("tc1") == found.scatter("tc1").device
    assert found.notes == ()


def test_the_mean_is_that_of_the_lot_means():
    fits = one_lot(((1000.0, 1e-6, 0.0), (1020.0, 3e-6, 0.0), (1100.0, 8e-6, 0.0)))
    found = population(fits, ("a", "a", "b"), ("1", "2", "1"))
    assert found.values == pytest.approx((1055.0, 5e-6, 0.0))
    assert found.law.coefficients == pytest.approx((5e-6, 0.0))
    assert found.counts == (2, 1)


def test_point_noise_is_taken_off():
    noise = np.diag([4.0, 2e-6, 0.0]) ** 2
    values = [(1000.0, TC1 + k * 3e-6, TC2) for k in (-1, 0, 1)]
    found = population(one_lot(values, noise=noise), *named(3))
    one = found.scatter("tc1")
    assert one.device.sigma == pytest.approx(np.sqrt(9e-12 - 4e-12), rel=1e-9)
    assert one.noise == pytest.approx(2e-6)
    # The mean is known no better than noise and scatter allow: 3 ppm/K over the root of 3 devices.
    assert one.uncertainty == pytest.approx(3e-6 / np.sqrt(3), rel=1e-9)
    # R does not scatter at all, though it is known to 0.4 % only: nothing is seen, and it is said.
    value = found.scatter("value")
    assert (value.device.sigma, value.device.floored) == (0.0, True)
    assert value.device.dof == 2.0
    assert value.uncertainty == pytest.approx(0.004 / np.sqrt(3), rel=1e-9)
    assert any(note.startswith("value: no spread of devices") for note in found.notes)


def test_without_stated_uncertainty_nothing_is_taken_off():
    noise = np.diag([4.0, 2e-6, 0.0]) ** 2
    values = [(1000.0, TC1 + k * 3e-6, TC2) for k in (-1, 0, 1)]
    found = population(one_lot(values, noise=noise, stated=False), *named(3))
    known = population(one_lot(values, noise=noise), *named(3))
    one, other = found.scatter("tc1"), known.scatter("tc1")
    assert one.device.sigma == pytest.approx(3e-6, rel=1e-9)
    # The scatter may be all noise: the lower end is that of the case in which the noise is known.
    assert one.device.low == other.device.low
    assert one.half_width > other.half_width
    assert (one.noise, one.uncertainty) == (other.noise, other.uncertainty)
    assert UNSTATED in found.notes
    assert UNSTATED not in known.notes
    assert UNSTATED not in population(one_lot(values[:1], noise=noise, stated=False), *named(1)).notes


def test_limits_hold_with_misfit_that_passes_for_noise():
    """Six lots of three: a cubic term of 1500 ppm at the ends is in all devices, and in no quadratic."""
    rng, held = np.random.Generator(np.random.Philox(33)), []
    T = np.linspace(-55.0, 140.0, 8) + 273.15
    x = T - 298.15
    # What a quadratic makes of the cubic is a part of the mean TC1: numpy's polyfit, an independent twin.
    middle = np.polyfit(x, 1.0 + TC1 * x + TC2 * x**2 + 1500e-6 * (x / 115.0) ** 3, 2)
    middle, lot, device = middle[1] / middle[2], 1e-6, 0.5e-6
    for _ in range(60):
        fits = []
        for _ in range(6):
            of_lot = rng.normal(0.0, lot)
            for _ in range(3):
                a = TC1 + of_lot + rng.normal(0.0, device)
                R = 1e3 * (1.0 + a * x + TC2 * x**2 + 1500e-6 * (x / 115.0) ** 3)
                R *= 1.0 + rng.normal(0.0, 10e-6, len(T))
                fits.append(fit(sweep_of(T, R), "polynomial", 298.15, order=2))
        one = population(fits, [str(k // 3) for k in range(18)], [str(k) for k in range(18)]).scatter("tc1")
        off, sigma = one.mean - middle, np.hypot(lot, device)
        held.append(ndtr((one.half_width - off) / sigma) - ndtr((-one.half_width - off) / sigma) >= 0.9973)
    # 95 % confidence, less four standard errors of 60 campaigns.
    assert np.mean(held) > 0.95 - 4 * np.sqrt(0.95 * 0.05 / 60)


def test_common_errors_stay_in_the_mean_and_off_the_spread():
    common = np.diag([10.0, 5e-6, 0.0]) ** 2
    values = [(1000.0 + 2 * k, TC1 + k * 1e-6, TC2) for k in (-1, 0, 1)]
    plain = population(one_lot(values), *named(3))
    found = population(one_lot(values, common=common), *named(3))
    assert found.scatter("tc1").device == plain.scatter("tc1").device
    assert found.scatter("tc1").uncertainty == pytest.approx(np.sqrt(1e-12 / 3 + 25e-12), rel=1e-9)
    assert found.uncertainties[0] == pytest.approx(np.sqrt(4.0 / 3 + 100.0), rel=1e-9)
    assert found.scatter("tc1").half_width > plain.scatter("tc1").half_width


def test_one_lot_gives_no_lot_spread():
    found = population(one_lot([(1000.0 + k, TC1, TC2) for k in range(3)]), *named(3))
    with pytest.raises(InputError, match="devices of one lot"):
        found.lot_spread("value")


def test_one_device_gives_no_spread():
    noise = np.diag([1.0, 2e-6, 1e-8]) ** 2
    found = population(one_lot([(1000.0, TC1, TC2)], noise=noise), *named(1))
    assert found.spread() is None
    assert found.uncertainties == pytest.approx((1.0, 2e-6, 1e-8))
    assert found.scatter("tc1").half_width is None
    assert found.correlation is None
    assert "One device" in found.notes[0]
    with pytest.raises(InputError, match="one device;"):
        found.device_spread("tc1")


def test_one_device_of_each_lot():
    fits, lots, devices = lots_of(4, (1,) * 6, (0.05, 5e-6, 0.0), (0.01, 5e-6, 0.0))
    found = population(fits, lots, devices)
    one = found.scatter("value")
    assert (one.device, one.lot) == (None, None)
    assert one.total.sigma == pytest.approx(np.std([f.ohms / found.ohms for f in fits], ddof=1), rel=1e-9)
    assert "cannot be told apart" in found.notes[0]
    for ask in (found.lot_spread, found.device_spread):
        with pytest.raises(InputError, match="one device of each lot"):
            ask("value")


def test_spreads_for_a_file():
    found = population(*lots_of(6, (4,) * 6, (0.02, 5e-6, 2e-8), (0.01, 5e-6, 2e-8)))
    limits, sigma = found.spread(), found.spread("sigma")
    assert (limits.meaning, sigma.meaning) == ("limits", "sigma")
    assert limits.tc1 == found.scatter("tc1").half_width
    assert sigma.tc1 == found.scatter("tc1").total.sigma
    # What is safe for few devices is wider than what is likely.
    assert limits.value > sigma.limits().value


def test_so_few_devices_that_the_value_is_open():
    found = population(one_lot([(1000.0, TC1, TC2), (1100.0, TC1, TC2)]), *named(2))
    with pytest.raises(InputError, match=r"from 2 devices of 1 lots; expected a limit below 100 %"):
        found.spread()
    assert found.spread("sigma").value == pytest.approx(100 / np.sqrt(2) / 1050, rel=1e-9)


# ---- correlation


def test_a_correlation_that_the_data_show():
    found = population(*lots_of(7, (4,) * 20, (0.05, 8e-6, 0.0), (0.02, 4e-6, 0.0), correlation=-0.8))
    one = found.correlation
    assert one.is_shown
    assert one.low < -0.8 < one.high
    assert one.value == pytest.approx(-0.8, abs=0.15)


def test_correlated_noise_is_no_correlation():
    rng = np.random.Generator(np.random.Philox(9))
    noise = np.array([[25.0, -2.4e-5 * 0.9, 0.0], [-2.4e-5 * 0.9, 2.4e-11, 0.0], [0.0, 0.0, 1e-20]])
    off = rng.multivariate_normal(np.zeros(3), noise, 400) + rng.normal(0, 1, (400, 3)) * [5.0, 5e-6, 0.0]
    values = np.array([1000.0, TC1, TC2]) + off
    raw = np.corrcoef(values[:, 0], values[:, 1])[0, 1]
    found = population(one_lot(values, noise=noise), *named(400))
    assert raw < -0.3
    assert not found.correlation.is_shown
    assert abs(found.correlation.value) < 0.2


def test_one_lot_without_noise_is_the_interval_of_fisher():
    rng = np.random.Generator(np.random.Philox(10))
    x = rng.normal(0, 1, 12)
    values = [
        (1000 + a, TC1 + (0.5 * a + b) * 1e-6, TC2) for a, b in zip(x, rng.normal(0, 1, 12), strict=True)
    ]
    found = population(one_lot(values), *named(12)).correlation
    # Independent twin: scipy.stats.pearsonr, whose interval is Fisher's.
    twin = stats.pearsonr(*np.array(values)[:, :2].T)
    interval = twin.confidence_interval(0.95)
    assert found.value == pytest.approx(twin.statistic, rel=1e-8)
    assert (found.low, found.high) == pytest.approx((interval.low, interval.high), rel=1e-8)


def test_a_chance_correlation_is_rarely_shown():
    shown = []
    for seed in range(400):
        given = lots_of(1000 + seed, (3,) * 5, (0.03, 8e-6, 0.0), (0.03, 4e-6, 0.0), (0.005, 1e-6, 0.0))
        one = population(*given).correlation
        shown.append(one is not None and one.is_shown)
    # 5 % of those that have none, within four standard errors.
    assert np.mean(shown) < 0.05 + 4 * np.sqrt(0.05 * 0.95 / 400)


@pytest.mark.parametrize("sigma", [0.3e-6, 0.5e-6, 1e-6, 5e-6])
@pytest.mark.parametrize("count", [5, 8, 15])
def test_noise_makes_no_correlation_by_chance(count, sigma):
    """One lot without correlation, TC1 scattering less than its noise and more: 5 % are shown, not more."""
    shown = []
    for seed in range(300):
        given = lots_of(3000 + seed, (count,), (0, 0, 0), (0.003, sigma, 0.0), (20e-6, 0.5e-6, 0.0))
        one = population(*given).correlation
        shown.append(one is not None and one.is_shown)
    assert np.mean(shown) < 0.05 + 4 * np.sqrt(0.05 * 0.95 / 300)


def test_noise_is_taken_off_both_ends_of_the_interval():
    rng = np.random.Generator(np.random.Philox(12))
    x = rng.normal(0, 1, 20)
    noise = np.diag([0.0, 1e-6, 0.0]) ** 2
    tc1 = TC1 + (1.5 * x + rng.normal(0, 2.5, 20)) * 1e-6
    found = population(
        one_lot([(1000 + a, b, TC2) for a, b in zip(x, tc1, strict=True)], noise=noise), *named(20)
    )
    # By hand: Fisher's interval of scipy, over the root of the part of TC1 that is not noise.
    twin = stats.pearsonr(x, tc1)
    interval = twin.confidence_interval(0.95)
    reliable = np.sqrt(1.0 - 1e-12 / np.var(tc1, ddof=1))
    expected = np.array([interval.low, twin.statistic, interval.high]) / reliable
    one = found.correlation
    assert (one.low, one.value, one.high) == pytest.approx(tuple(expected), rel=1e-6)


def test_nearly_full_correlation_stays_below_one():
    values = [(1000.0 + k, TC1 - k * 1e-6, TC2) for k in range(6)]
    one = population(one_lot(values), *named(6)).correlation
    assert (one.value, one.is_shown) == (-0.99, True)


# ---- laws


def test_a_law_of_first_order_has_no_tc2():
    found = population([fit_of(1000.0 + k, (1e-4,)) for k in range(3)], *named(3))
    assert [one.name for one in found.scatters] == ["value", "tc1"]
    assert found.spread().tc2 is None


def test_a_law_of_third_order_says_what_is_left_out():
    found = population([fit_of(1000.0 + k, (1e-4, 1e-7, k * 1e-10)) for k in range(3)], *named(3))
    assert found.law.coefficients == pytest.approx((1e-4, 1e-7, 1e-10))
    assert any("higher coefficients" in note for note in found.notes)


def test_thermistors():
    fits = [
        law_fit(Thermistor(reference=298.15, beta=b), 1e4, ("R", "beta"), (b,), noise=np.diag([0.0, 4.0]))
        for b in (3400.0, 3435.0, 3470.0)
    ]
    found = population(fits, *named(3))
    assert found.law == Thermistor(reference=298.15, beta=3435.0)
    # TC1 = -B/T^2 of the B law (IEC 60539-1), so its standard deviation is that of B over T^2.
    sigma = np.sqrt(35.0**2 - 4.0) / 298.15**2
    assert found.scatter("tc1").mean == pytest.approx(-3435.0 / 298.15**2, rel=1e-9)
    assert found.scatter("tc1").device.sigma == pytest.approx(sigma, rel=1e-6)
    assert found.scatter("tc1").noise == pytest.approx(2.0 / 298.15**2, rel=1e-6)


def test_constants_of_a_thermistor_go_through_their_derivatives():
    law = SteinhartHart(reference=298.15, a=2.1085e-3, b=0.7979e-4, c=6.535e-7)
    noise = np.diag([0.0, 1e-7, 1e-8, 1e-10]) ** 2
    fit = law_fit(law, float(law.ohms(298.15)), ("R", "a", "b", "c"), (law.a, law.b, law.c), noise=noise)
    figures, own, _ = local(fit, fit.ohms)
    # From 1/T = a + b L + c L^3: dL/dT = -1/(T^2 D), D = b + 3 c L^2, which a moves only through L.
    log, T = np.log(float(law.ohms(298.15))), 298.15
    D = law.b + 3 * law.c * log**2
    by_a = -(6 * law.c * log) / (T * T * D**3)
    by_b = 1 / (T * T * D**2) * (1 + 6 * law.c * log * -log / D)
    by_c = 1 / (T * T * D**2) * (3 * log**2 + 6 * law.c * log * -(log**3) / D)
    expected = (by_a * 1e-7) ** 2 + (by_b * 1e-8) ** 2 + (by_c * 1e-10) ** 2
    assert figures[1] == pytest.approx(-1 / (T * T * D), rel=1e-9)
    assert own[1, 1] == pytest.approx(expected, rel=1e-5)


def test_formulas():
    def fit(a):
        law = Expression(
            reference=298.15, text="1 + A*(T - T0) + D*(T - T0)^3", constants=(("A", a), ("D", 1e-9))
        )
        return law_fit(law, 1e3, ("R", "A", "D"), (a, 1e-9))

    found = population([fit(4e-4), fit(5e-4)], *named(2))
    assert dict(found.law.constants) == pytest.approx({"A": 4.5e-4, "D": 1e-9})
    assert found.scatter("tc1").device.sigma == pytest.approx(1e-4 / np.sqrt(2), rel=1e-6)


# ---- what is refused


def test_all_that_is_wrong_is_told_together():
    fits = [
        fit_of(1000.0, (TC1, TC2)),
        fit_of(1000.0, (TC1,)),
        fit_of(1000.0, (TC1, TC2), reference=300.15),
        fit_of(1000.0, (TC1, TC2), low=400.0, high=420.0),
    ]
    with pytest.raises(InputError) as caught:
        population(fits, ("x", "x", "x", "x"), ("1", "2", "3", "1"))
    places = [problem.where for problem in caught.value.problems]
    assert places == [
        "lot 'x', device '1'",
        "lot 'x', device '2'",
        "lot 'x', device '3'",
        "devices",
    ]
    assert "polynomial (R, tc1) about 298.15 K" in str(caught.value)


def test_nothing_to_look_at():
    with pytest.raises(InputError, match="no device"):
        population((), (), ())


def test_a_formula_must_be_the_same_for_all():
    fits = [
        law_fit(Expression(reference=298.15, text=text, constants=(("A", 1e-3),)), 1e3, ("R", "A"), (1e-3,))
        for text in ("1 + A*(T - T0)", "exp(A*(T - T0))")
    ]
    with pytest.raises(InputError, match="as the first"):
        population(fits, *named(2))


def test_a_coverage_of_all_devices_is_refused():
    with pytest.raises(InputError, match="coverage"):
        population([fit_of(1.0, (TC1,))], *named(1), coverage=1.0)
