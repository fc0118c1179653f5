"""Curves of a material over temperature: against the coefficients, and against devices drawn at random."""

import numpy as np
import pytest
from campaigns import fitted_text, sweep_text

from tcplan.measure.bands import ratio_band
from tcplan.measure.fit_curves import ohms_curves, ratio_curves

T = np.linspace(218.15, 413.15, 27)


def test_one_device_has_the_band_of_its_fit_and_no_limits():
    one = fitted_text(sweep_text(1, 1))
    value, half = ratio_band(one.fits[0], T)
    curves = ratio_curves(one, T)
    assert curves.limits is None
    np.testing.assert_allclose(curves.value, value, rtol=1e-15)
    np.testing.assert_allclose(curves.band * value, half, rtol=1e-12)
    ohms = ohms_curves(one, T)
    np.testing.assert_allclose(ohms.value, one.found.ohms * value, rtol=1e-14)
    assert np.all(ohms.band >= 0.999 * one.fits[0].point_covariance[0][0] ** 0.5 / one.found.ohms)


@pytest.mark.parametrize("lots", [1, 6])
def test_limits_at_the_reference_are_those_of_the_value_and_zero_of_the_ratio(lots):
    one = fitted_text(sweep_text(lots, 4))
    at = np.array([one.request.reference])
    assert ratio_curves(one, at).limits == pytest.approx([0.0], abs=1e-15)
    [half] = ohms_curves(one, at).limits
    assert half == pytest.approx(one.found.scatter("value").half_width, rel=1e-9)


def test_a_line_that_scatters_in_tc1_alone_has_the_limits_of_tc1_times_x():
    one = fitted_text(sweep_text(5, 3, tc1=0.0, tc2=0.0), order=1)
    x = T - one.request.reference
    limits = ratio_curves(one, T).limits * one.found.law.ratio(T)
    np.testing.assert_allclose(limits, one.found.scatter("tc1").half_width * np.abs(x), rtol=1e-9, atol=1e-15)


def test_the_band_of_a_line_is_student_t_times_the_mean_tc1():
    """8 lots, so 7 degrees of freedom: Student's t of 2.3646 for 95 % (any table)."""
    text = sweep_text(8, 2, tc1=0.0, tc2=0.0)
    one = fitted_text(text, order=1)
    x = T - one.request.reference
    tc1 = one.found.scatter("tc1")
    common = max(fit.covariance[1][1] - fit.point_covariance[1][1] for fit in one.fits)
    scatter = (tc1.uncertainty**2 - common) ** 0.5
    band = ratio_curves(one, T).band * one.found.law.ratio(T)
    np.testing.assert_allclose(band, 2.3646 * scatter * np.abs(x), rtol=2e-3, atol=1e-12)


@pytest.mark.parametrize("seed", range(3))
def test_the_limits_hold_devices_that_were_not_measured(seed):
    one = fitted_text(sweep_text(10, 3, seed=seed))
    more = fitted_text(sweep_text(60, 3, seed=100 + seed))
    ratio, ohms = ratio_curves(one, T), ohms_curves(one, T)
    apart = np.array([np.abs(fit.law.ratio(T) / ratio.value - 1.0) for fit in more.fits])
    assert np.mean(np.all(apart <= ratio.limits + 1e-12, axis=1)) >= 0.98
    off = np.array([np.abs(fit.ohms * fit.law.ratio(T) / ohms.value - 1.0) for fit in more.fits])
    assert np.mean(np.all(off <= ohms.limits, axis=1)) >= 0.98
