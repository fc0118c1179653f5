"""What a fit says beside its parameters: order, flags, lack of fit, hysteresis."""

from __future__ import annotations

import numpy as np
import pytest
from fit_sweeps import ROOM, generator, noisy, quadratic, sweep_of
from scipy import stats

from tcplan.measure.fit import fit
from tcplan.measure.fit_repeats import temperature_groups
from tcplan.measure.hysteresis import Way, sides, ways

ZERO = 273.15


def hat(T, order):
    """Return the hat matrix by the textbook formula X (X'X)^-1 X', in scaled T."""
    X = np.vander((T - T.mean()) / np.ptp(T), order + 1)
    return X @ np.linalg.inv(X.T @ X) @ X.T


def test_without_an_order_a_quadratic_is_fitted_wherever_it_can_be():
    T, R = noisy(21, tc2=0.0)
    found = fit(sweep_of(T, R), "polynomial", ROOM)
    assert found == fit(sweep_of(T, R), "polynomial", ROOM, order=2)
    assert found.last_term > 0.05
    # only as many coefficients as the readings can give, and one reading more where no u(R) is stated
    few, ohms = T[[0, 10, 20]], quadratic(T[[0, 10, 20]], tc2=2e-6)
    assert fit(sweep_of(few, ohms), "polynomial", ROOM).names == ("R", "tc1")
    assert fit(sweep_of(few, ohms, u_R=1.0), "polynomial", ROOM).names == ("R", "tc1", "tc2")
    # a twice-read temperature makes no third one
    assert fit(sweep_of(few[[0, 0, 2, 2]], ohms[[0, 0, 2, 2]], u_R=1.0), "polynomial", ROOM).dof == 2


def test_a_quadratic_term_that_is_not_there_is_called_significant_as_often_as_the_risk_says():
    # 5 % of straight devices by construction; binomial 3 sigma of 600 trials is 2.7 %
    T = np.linspace(-40.0, 125.0, 9) + ZERO
    noise = generator(22).normal(0.0, 2.0, (600, 9))
    terms = [fit(sweep_of(T, quadratic(T, tc2=0.0) + e), "polynomial", ROOM).last_term for e in noise]
    assert np.mean(np.array(terms) <= 0.05) == pytest.approx(0.05, abs=0.027)


def test_the_last_term_is_tested_by_students_t():
    # twin: covariance of numpy.polyfit and Student's t of scipy.stats; normal where u(R) is stated
    T, R = noisy(23, tc2=0.02e-6)
    p, covariance = np.polyfit(T - ROOM, R, 2, cov=True)
    expected = 2.0 * stats.t.sf(abs(p[0]) / np.sqrt(covariance[0, 0]), len(T) - 3)
    assert fit(sweep_of(T, R), "polynomial", ROOM, order=2).last_term == pytest.approx(expected, rel=1e-6)
    p, covariance = np.polyfit(T - ROOM, R, 2, w=np.full(len(T), 0.5), cov="unscaled")
    expected = 2.0 * stats.norm.sf(abs(p[0]) / np.sqrt(covariance[0, 0]))
    found = fit(sweep_of(T, R, u_R=2.0), "polynomial", ROOM, order=2)
    assert found.last_term == pytest.approx(expected, rel=1e-6)
    falling = 1e4 * np.exp(3435.0 / T - 3435.0 / ROOM)
    assert fit(sweep_of(T, falling), "thermistor", ROOM).last_term is None


@pytest.mark.parametrize("stated", [False, True])
def test_an_outlier_is_flagged_and_kept(stated):
    # twin: the externally studentised residual is the t of a reading against a fit without it
    T, R = noisy(24)
    R[7] += 16.0
    found = fit(sweep_of(T, R, u_R=2.0 if stated else None), "polynomial", ROOM, order=2)
    (flag,) = [flag for flag in found.flags if flag.outlier]
    assert flag.line == 9
    assert found.readings == len(T)
    assert flag.leverage == pytest.approx(hat(T, 2)[7, 7], rel=1e-9)
    x = T - ROOM
    if stated:
        residual = R[7] - np.polyval(np.polyfit(x, R, 2), x[7])
        assert flag.studentised == pytest.approx(residual / 2.0 / np.sqrt(1.0 - flag.leverage), rel=1e-8)
        return
    others = np.delete(np.arange(len(T)), 7)
    p, covariance = np.polyfit(x[others], R[others], 2, cov=True)
    s = np.sqrt(np.sum((R[others] - np.polyval(p, x[others])) ** 2) / (len(others) - 3))
    powers = x[7] ** np.array([2.0, 1.0, 0.0])
    expected = (R[7] - powers @ p) / np.sqrt(s**2 + powers @ covariance @ powers)
    assert flag.studentised == pytest.approx(expected, rel=1e-8)


def test_good_readings_are_called_outliers_in_one_sweep_of_twenty():
    # Bonferroni's bound: at most 5 %, and near it for few correlated residuals; 3 sigma of 500 is 2.9 %
    T = np.linspace(-40.0, 125.0, 12) + ZERO
    noise = generator(25).normal(0.0, 2.0, (500, 12))
    fits = [fit(sweep_of(T, quadratic(T) + e), "polynomial", ROOM, order=2) for e in noise]
    assert 0.015 < np.mean([any(flag.outlier for flag in one.flags) for one in fits]) < 0.08


def test_a_lone_far_reading_has_high_leverage():
    T = np.append(np.linspace(15.0, 35.0, 20), 125.0) + ZERO
    found = fit(sweep_of(T, quadratic(T) + generator(26).normal(0.0, 2.0, 21)), "polynomial", ROOM, order=2)
    (flag,) = found.flags
    assert flag.line == 22
    assert not flag.outlier
    assert flag.leverage == pytest.approx(hat(T, 2)[20, 20], rel=1e-6)
    # the ends of an even sweep are as they should be
    assert fit(sweep_of(*noisy(27)), "polynomial", ROOM, order=2).flags == ()


def test_lack_of_fit_is_the_textbook_f():
    # twin: sums of squares about group means of R, and F of scipy.stats
    T = np.repeat(np.linspace(-40.0, 125.0, 6), 3) + ZERO
    R = quadratic(T, tc2=1e-6) + generator(28).normal(0.0, 2.0, 18)
    found = fit(sweep_of(T, R), "polynomial", ROOM, order=1).lack_of_fit
    groups = R.reshape(6, 3)
    pure = np.sum((groups - groups.mean(axis=1, keepdims=True)) ** 2)
    line = np.polyval(np.polyfit(T - ROOM, R, 1), T - ROOM)
    lack = np.sum((R - line) ** 2) - pure
    f = (lack / 4) / (pure / 12)
    assert (found.lack_dof, found.pure_dof) == (4, 12)
    assert found.f == pytest.approx(f, rel=1e-8)
    assert found.probability == pytest.approx(stats.f.sf(f, 4, 12), rel=1e-6)
    assert found.probability < 1e-6
    assert fit(sweep_of(T, R), "polynomial", ROOM, order=2).lack_of_fit.probability > 0.05


def test_lack_of_fit_needs_repeats_and_freedom():
    assert fit(sweep_of(*noisy(29)), "polynomial", ROOM).lack_of_fit is None
    T = np.repeat([-40.0, 25.0, 125.0], 4) + ZERO
    R = quadratic(T) + generator(29).normal(0.0, 2.0, 12)
    assert fit(sweep_of(T, R), "polynomial", ROOM, order=2).lack_of_fit is None
    # settings a little apart are still repeats, and their own slope is no scatter
    near = T + np.tile([0.0, 0.02, 0.04, 0.06], 3)
    found = fit(sweep_of(near, quadratic(near, tc1=0.01, tc2=0.0)), "polynomial", ROOM, order=1)
    assert found.lack_of_fit.pure_dof == 9
    assert found.sigma < 1e-12


def test_lack_of_fit_is_called_as_often_as_the_risk_says():
    # 5 % by construction; 3 sigma of 600 is 2.7 %
    T = np.repeat(np.linspace(-40.0, 125.0, 5), 2) + ZERO
    noise = generator(30).normal(0.0, 2.0, (600, 10))
    fits = [fit(sweep_of(T, quadratic(T) + e), "polynomial", ROOM, order=2) for e in noise]
    assert np.mean([one.lack_of_fit.probability < 0.05 for one in fits]) == pytest.approx(0.05, abs=0.027)


def test_temperature_groups_are_never_wider_than_nearness():
    # twin: the definition, one reading at a time
    T = ROOM + np.round(generator(31).uniform(0.0, 3.0, 400), 3)
    groups = temperature_groups(T, 0.1)
    expected, first, number = {}, -np.inf, -1
    for t in sorted(set(T.tolist())):
        if t > first + 0.1:
            first, number = t, number + 1
        expected[t] = number
    assert groups.tolist() == [expected[t] for t in T.tolist()]


def test_ways_follow_the_order_of_the_file():
    up, down = np.linspace(25.0, 125.0, 21), np.linspace(120.0, -40.0, 33)
    back = np.linspace(-35.0, 25.0, 13)
    jitter = generator(32).uniform(-0.5, 0.5, 67)
    expected = (
        Way(direction="up", first=0, end=21),
        Way(direction="down", first=21, end=54),
        Way(direction="up", first=54, end=67),
    )
    assert ways(np.concatenate([up, down, back]) + ZERO) == expected
    assert [w.direction for w in ways(np.concatenate([up, down, back]) + jitter)] == ["up", "down", "up"]
    assert ways(down) == (Way(direction="down", first=0, end=33),)
    assert ways(generator(33).permutation(np.linspace(-40.0, 125.0, 67))) == ()


def loop(seed, lift, noise=1.0, count=24):
    """Return a sweep up and down on the same quadratic law, the way down higher by a share of R."""
    up = np.linspace(-40.0, 125.0, count)
    T = np.concatenate([up, up[::-1] - 1.3]) + ZERO
    R = quadratic(T) + generator(seed).normal(0.0, noise, 2 * count)
    return T, R * np.where(np.arange(2 * count) >= count, 1.0 + lift, 1.0)


def test_hysteresis_is_the_difference_of_the_ways():
    T, R = loop(34, 5e-4)
    found = fit(sweep_of(T, R), "polynomial", ROOM, order=2).hysteresis
    # noise of 1e-4 on each of 24 readings: the mean of the differences has 1e-4 sqrt(2/24)
    assert found.uncertainty == pytest.approx(1e-4 * np.sqrt(2.0 / 24.0), rel=0.3)
    assert found.mean == pytest.approx(5e-4, abs=3.0 * found.uncertainty)
    assert found.significant
    assert found.mean < found.most < found.mean + 6e-4
    assert T.min() <= found.at <= T.max()


def test_without_hysteresis_it_is_found_as_often_as_the_risk_says():
    # 5 % by construction; 3 sigma of 500 is 2.9 %
    found = [
        fit(sweep_of(*loop(k, 0.0, count=10)), "polynomial", ROOM, order=2).hysteresis for k in range(500)
    ]
    assert np.mean([one.significant for one in found]) == pytest.approx(0.05, abs=0.03)


def test_hysteresis_needs_both_ways():
    assert fit(sweep_of(*noisy(36)), "polynomial", ROOM).hysteresis is None
    T, R = noisy(36)
    order = generator(37).permutation(len(T))
    assert fit(sweep_of(T[order], R[order]), "polynomial", ROOM).hysteresis is None


def both_ways(seed, *, readings=1, lift=0.0, bend=0.0, tc3=0.0, noise=1.0):
    """Return a sweep up and down that turns once: ``lift`` is alike, ``bend`` a loop, 0 at its ends."""
    up = np.repeat(np.linspace(-40.0, 125.0, 8), readings)
    T = np.concatenate([up, up[::-1][readings:]]) + ZERO
    part = (T - T.min()) / np.ptp(T)
    size = np.where(np.arange(len(T)) >= len(up), 50.0, -50.0)
    R = quadratic(T, tc3=tc3) + size * (lift + bend * 4.0 * part * (1.0 - part))
    return T, R + generator(seed).normal(0.0, noise, len(T))


def test_lack_of_fit_without_the_way_is_that_of_a_model_with_a_way():
    # twin: nested models by numpy.linalg.lstsq (Draper and Smith: extra sum of squares); one reading a way
    T, R = both_ways(50, noise=2.0)
    found = fit(sweep_of(T, R), "polynomial", ROOM, order=2)
    assert not found.hysteresis.significant
    x, way = (T - ROOM) / 100.0, np.sign(7.0 - np.arange(len(T)))

    def left(*columns):
        X = np.column_stack(columns)
        beta = np.linalg.lstsq(X, R, rcond=None)[0]
        return np.sum((R - X @ beta) ** 2), len(R) - np.linalg.matrix_rank(X)

    law, law_dof = left(np.ones_like(x), x, x**2, way)
    full, full_dof = left(*(np.where(np.isclose(T, t), 1.0, 0.0) for t in T[:8]), way)
    f = (law - full) / (law_dof - full_dof) / (full / full_dof)
    assert (found.lack_of_fit.lack_dof, found.lack_of_fit.pure_dof) == (law_dof - full_dof, full_dof)
    assert found.lack_of_fit.f == pytest.approx(f, rel=1e-6)


@pytest.mark.parametrize("move", [{"lift": 0.2}, {"bend": 0.2}, {}], ids=["alike", "a loop", "none"])
def test_hysteresis_makes_no_lack_of_fit(move):
    # 5 % by construction, whether the ways differ by 20 times the noise or not; 3 sigma of 400 is 3.3 %
    sweeps = [both_ways(seed, readings=2, **move) for seed in range(400)]
    found = [fit(sweep_of(T, R), "polynomial", ROOM, order=2).lack_of_fit.probability for T, R in sweeps]
    assert np.mean(np.array(found) < 0.05) == pytest.approx(0.05, abs=0.033)


@pytest.mark.parametrize("move", [{"lift": 0.2}, {"bend": 0.2}], ids=["alike", "a loop"])
def test_hysteresis_hides_no_lack_of_fit(move):
    # what a quadratic leaves of a cubic is tc3 h^3/4, h half the span (Chebyshev): 11 times the noise
    T, R = both_ways(51, readings=2, tc3=8e-9, **move)
    found = fit(sweep_of(T, R), "polynomial", ROOM, order=2)
    assert found.hysteresis.significant
    assert found.lack_of_fit.pure_dof == 14
    assert found.lack_of_fit.probability < 1e-3


def test_repeats_of_one_reading_a_way_say_nothing_under_hysteresis():
    T, R = both_ways(52, bend=0.2)
    found = fit(sweep_of(T, R), "polynomial", ROOM, order=2)
    assert found.hysteresis.significant
    assert found.lack_of_fit is None
    # nor when other devices show that the ways differ
    T, R = both_ways(52)
    assert fit(sweep_of(T, R), "polynomial", ROOM).lack_of_fit.pure_dof == 6
    assert fit(sweep_of(T, R), "polynomial", ROOM, ways_differ=True).lack_of_fit is None


def test_sides_leave_the_turns_out():
    T = np.array([0.0, 10.0, 20.0, 20.05, 10.0, 0.0, -10.0, 0.0, 10.0, 20.0])
    assert sides(T, 0.1).tolist() == [1, 1, 2, 2, -1, -1, -2, 1, 1, 1]


def test_hysteresis_of_many_devices_is_judged_over_their_number():
    # twin: a limit of Student's t over the number of devices (Bonferroni), tables of scipy.stats
    T, R = loop(34, 0.8e-4)
    alone, many = (fit(sweep_of(T, R), "polynomial", ROOM, order=2, devices=n).hysteresis for n in (1, 200))
    size, dof = abs(alone.mean) / alone.uncertainty, 2 * (24 - 1) - 2
    assert stats.t.ppf(1 - 0.05 / 2, dof) < size < stats.t.ppf(1 - 0.05 / 400, dof)
    assert (alone.significant, many.significant) == (True, False)
    assert (alone.mean, alone.uncertainty) == (many.mean, many.uncertainty)
