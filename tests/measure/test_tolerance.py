"""Mean squares of devices in lots, variances and tolerance limits, against published figures and draws."""

import numpy as np
import pytest
from scipy import stats
from scipy.integrate import quad
from scipy.optimize import brentq

from tcplan.draws.statistics import tolerance_factor
from tcplan.errors import InputError
from tcplan.measure.tolerance import Variance, check_fractions, mean_squares, tolerance_half_width

# Strength of cloth from four looms, four pieces of each: the usual worked example of a random effect in
# Montgomery, Design and Analysis of Experiments (data and results from memory).
LOOMS = ((98, 97, 99, 96), (91, 90, 93, 92), (96, 95, 97, 95), (95, 96, 99, 98))


def squares_of(groups, noise=0.0):
    values = np.array([value for group in groups for value in group], dtype=float)
    lots = np.repeat(np.arange(len(groups)), [len(group) for group in groups])
    return mean_squares(values[:, None], np.full((len(values), 1, 1), noise**2), lots)


def test_the_loom_example():
    found = squares_of(LOOMS)
    assert 4 * found.between[0, 0] == pytest.approx(29.73, abs=0.005)
    assert found.within[0, 0] == pytest.approx(1.90, abs=0.005)
    assert found.lot(0).value == pytest.approx(6.96, abs=0.005)
    assert found.device(0).value == pytest.approx(1.90, abs=0.005)
    assert found.total(0).value == pytest.approx(8.85, abs=0.01)
    # Its interval of the error variance, 22.75 over the chi-square points 23.34 and 4.40.
    assert found.device(0).bounds(0.95) == pytest.approx((22.75 / 23.34, 22.75 / 4.40), rel=2e-3)


def test_equal_lots_are_the_analysis_of_variance():
    rng = np.random.Generator(np.random.Philox(5))
    groups = rng.normal(0, 1, (5, 7)) + rng.normal(0, 1, (5, 1))
    found = squares_of(groups)
    # Independent twin: scipy.stats.f_oneway.
    f = stats.f_oneway(*groups).statistic
    assert 7 * found.between[0, 0] / found.within[0, 0] == pytest.approx(f, rel=1e-12)


def test_unequal_lots_by_hand():
    # Computed by hand: lot means 2 and 8, their mean 5; within lots (1 + 1)/(3 - 2).
    found = squares_of(((1.0, 3.0), (8.0,)), noise=0.5)
    assert found.mean == pytest.approx([5.0])
    assert found.within[0, 0] == pytest.approx(2.0)
    assert found.between[0, 0] == pytest.approx(18.0)
    assert found.inverse_size == pytest.approx(0.75)
    assert found.device(0).value == pytest.approx(2.0 - 0.25)
    assert found.lot(0).value == pytest.approx(18.0 - 0.75 * 2.0)  # the noise cancels: it is in both
    assert found.total(0).value == pytest.approx(18.0 + 0.25 * 2.0 - 0.25)
    assert found.mean_variance(0) == pytest.approx(9.0)


def test_expected_mean_squares_by_draws():
    rng = np.random.Generator(np.random.Philox(8))
    counts, lot, device = (1, 2, 6), 2.0, 1.0
    lots = np.repeat(np.arange(3), counts)
    noise = np.linspace(0.1, 1.0, 9)  # of each device its own
    runs = 4000
    found = np.zeros(3)
    y = rng.normal(0, lot, (runs, 3))[:, lots] + rng.normal(0, device, (runs, 9))
    y += rng.normal(0, 1, (runs, 9)) * noise
    for row in y:
        one = mean_squares(row[:, None], (noise**2)[:, None, None], lots)
        found += [one.device(0).value, one.lot(0).value, one.total(0).value]
    # Unbiased: the model that the draws are made from.
    assert found / runs == pytest.approx([1.0, 4.0, 5.0], rel=0.06)


def test_the_published_tolerance_factor():
    # NIST/SEMATECH e-Handbook 7.2.6.3: 43 values, 90 % coverage, 99 % confidence, Howe: 2.2173159.
    one = Variance(terms=((1.0, 1.0, 42),))
    assert tolerance_half_width(one, 1.0 / 43, 0.90, 0.99) == pytest.approx(2.2173159, abs=1e-6)


def exact_factor(count, coverage, confidence):
    """The two-sided factor by its defining integral over the mean (Odeh and Owen, 1980)."""

    def reached(k):
        def chance(z):
            off = z / np.sqrt(count)
            need = brentq(lambda w: stats.norm.cdf(off + w) - stats.norm.cdf(off - w) - coverage, 0.1, 30)
            return 2 * stats.norm.pdf(z) * stats.chi2.sf((count - 1) * (need / k) ** 2, count - 1)

        return quad(chance, 0, 7, limit=60, epsabs=1e-6)[0] - confidence

    return brentq(reached, 1.0, 200.0, rtol=1e-4)


@pytest.mark.parametrize(("count", "table"), [(5, 5.077), (10, 3.393)])
def test_howe_is_close_to_the_exact_factor(count, table):
    exact = exact_factor(count, 0.95, 0.95)
    # Odeh and Owen, Tables for Normal Tolerance Limits, 1980 (from memory).
    assert exact == pytest.approx(table, rel=1e-3)
    one = Variance(terms=((1.0, 1.0, count - 1),))
    own = tolerance_half_width(one, 1.0 / count, 0.95, 0.95)
    assert own == pytest.approx(tolerance_factor(count, 0.95, 0.95), rel=1e-12)
    assert -0.005 < own / exact - 1.0 < 0.015


def test_a_difference_is_zero_where_the_ratio_is_critical():
    # The interval must agree with the F test of the ratio (Ting et al. 1990), with the points of scipy.stats.
    for dof1, dof2 in ((2, 9), (4, 30), (9, 3)):
        at = float(stats.f.ppf(0.975, dof1, dof2))
        one = Variance(terms=((1.0, at / 3.0, dof1), (-1.0 / 3.0, 1.0, dof2)))
        assert one.bounds(0.95)[0] == pytest.approx(0.0, abs=1e-9)
        assert one.bounds(0.95)[1] > 0.0
        below = float(stats.f.ppf(0.025, dof1, dof2))
        other = Variance(terms=((1.0, below / 3.0, dof1), (-1.0 / 3.0, 1.0, dof2)))
        assert other.bounds(0.95)[1] == pytest.approx(0.0, abs=1e-9)


def test_effective_freedom():
    # Satterthwaite: of one mean square its own; of the mean of two alike the sum.
    assert Variance(terms=((1.0, 3.0, 7),)).dof == pytest.approx(7.0)
    assert Variance(terms=((0.5, 2.0, 6), (0.5, 2.0, 6))).dof == pytest.approx(12.0)
    assert Variance(terms=((1.0, 1.0, 7),), measured=2.0).dof == 0.0
    assert Variance(terms=((1.0, 0.0, 7),)).dof == 7.0


@pytest.mark.parametrize(
    ("counts", "lot", "device", "noise"),
    [((8,), 0.0, 1.0, 0.4), ((4, 4, 4, 4), 1.0, 1.0, 0.3), ((2, 5, 3, 6), 1.5, 1.0, 0.2)],
)
def test_intervals_hold_what_they_say(counts, lot, device, noise):
    rng = np.random.Generator(np.random.Philox(11))
    lots, runs = np.repeat(np.arange(len(counts)), counts), 1500
    total = np.hypot(lot, device)
    known = np.full((len(lots), 1, 1), noise**2)
    held = {"device": [], "lot": [], "total": [], "tolerance": []}
    for _ in range(runs):
        y = rng.normal(0, lot, len(counts))[lots] + rng.normal(0, np.hypot(device, noise), len(lots))
        one = mean_squares(y[:, None], known, lots)
        for name, truth in (("device", device), ("lot", lot), ("total", total)):
            if (variance := getattr(one, name)(0)) is not None:
                low, high = variance.bounds(0.95)
                held[name].append(low <= truth**2 <= high)
        k = tolerance_half_width(one.total(0), one.mean_variance(0), 0.9973, 0.95)
        mean = one.mean[0]
        part = stats.norm.cdf((mean + k) / total) - stats.norm.cdf((mean - k) / total)
        held["tolerance"].append(part >= 0.9973)
    # 95 % within 2.5 %, four standard errors of so many runs; tolerance limits may hold more.
    for name in ("device", "lot", "total"):
        assert not held[name] or 0.925 < np.mean(held[name]) < 0.975, name
    assert 0.93 < np.mean(held["tolerance"]) < 0.985


def test_common_errors_widen_the_limits():
    one = Variance(terms=((1.0, 1.0, 9),))
    plain = tolerance_half_width(one, 0.1, 0.95, 0.95)
    wider = tolerance_half_width(one, 0.1, 0.95, 0.95, common=4.0)
    z = stats.norm.ppf(0.975)
    assert wider**2 - plain**2 == pytest.approx(4.0 * z * z, rel=1e-12)


def test_nothing_scatters():
    one = Variance(terms=((1.0, 0.0, 3),))
    assert one.bounds(0.95) == (0.0, 0.0)
    assert tolerance_half_width(one, 0.0, 0.95, 0.95) == 0.0


def test_fractions_are_checked_together():
    with pytest.raises(InputError) as caught:
        check_fractions(1.0, float("nan"))
    assert [problem.where for problem in caught.value.problems] == ["coverage", "confidence"]
