"""Extremes over a continuous range: functions whose extremes are known in closed form."""

import numpy as np
import pytest

from tcplan.drift import centring, extremes, panels
from tcplan.errors import InternalError


def test_cosines_of_many_periods():
    found = extremes(lambda t: np.cos(0.9 * t), panels(0.0, 100.0))
    assert found.high.value == pytest.approx(1.0, abs=1e-12)
    assert found.low.value == pytest.approx(-1.0, abs=1e-12)


@pytest.mark.parametrize("centre", [233.2, 271.83, 310.01, 422.9])
def test_a_narrow_bump_is_found(centre):
    """1/(1 + ((t - c)/w)^2) with w = 0.8 K in 190 K: 17 fixed nodes would miss it."""
    found = extremes(lambda t: 1 / (1 + ((t - centre) / 0.8) ** 2), panels(233.15, 423.15))
    assert found.high.value == pytest.approx(1.0, abs=1e-10)
    assert found.high.at == pytest.approx(centre, abs=1e-4)


def test_runge_function():
    found = extremes(lambda t: 1 / (1 + 25 * t**2), panels(-1.0, 1.0))
    assert found.high.value == pytest.approx(1.0, abs=1e-12)
    assert found.low.value == pytest.approx(1 / 26, abs=1e-12)


def test_a_kink_at_a_breakpoint_and_one_that_is_not_declared():
    for splits in ((300.0,), ()):
        found = extremes(lambda t: np.abs(t - 300.0) - 7.0, panels(250.0, 340.0, splits))
        assert found.low.value == pytest.approx(-7.0, abs=1e-6)
        assert found.high.value == pytest.approx(43.0, abs=1e-12)


def test_a_constant_and_a_line():
    assert extremes(lambda t: np.full_like(t, 3.0), panels(0.0, 1.0)).band == 0.0
    line = extremes(lambda t: 2 * t, panels(0.0, 1.0))
    assert (line.low.at, line.high.at) == (0.0, 1.0)


def test_one_temperature():
    assert extremes(lambda t: t**2, panels(5.0, 5.0)).peak.value == 25.0


def test_not_finite_is_a_fault():
    with pytest.raises(InternalError):
        extremes(lambda t: np.full_like(t, np.nan), panels(0.0, 1e-9))


def test_panels_split_inside_only():
    assert panels(0.0, 10.0, (10.0, -1.0, 4.0, 4.0)) == ((0.0, 4.0), (4.0, 10.0))


@pytest.mark.parametrize(("low", "high", "value"), [(-1.0, 3.0, 2.0), (-5.0, 1.0, 4.5), (0.0, 0.3, 0.01125)])
def test_minimax_line_through_a_parabola(low, high, value):
    """x^2 approximated by a line on [a, b] errs by (b - a)^2/8 (Chebyshev; Cheney, Rivlin)."""
    middle = (low + high) / 2
    offset = (high - low) ** 2 / 8

    def residual(x):
        # The best line: the chord's slope, and midway between chord and tangent.
        return x**2 - ((low + high) * x - middle**2 + offset)

    found = extremes(residual, panels(low, high))
    assert found.peak.value == pytest.approx(value, abs=1e-12)
    assert found.high.value == pytest.approx(-found.low.value, abs=1e-12)


def test_centring_by_its_definition():
    found = extremes(lambda t: 0.01 * t, panels(-1.0, 3.0))
    offset, left = centring(found)
    assert (1 + offset) * 1.03 - 1 == pytest.approx(left)
    assert 1 - (1 + offset) * 0.99 == pytest.approx(left)
