"""Goals: each kind against its own definition."""

import numpy as np
import pytest
from makers import film, need_of, over

from tcplan.errors import InputError
from tcplan.goal import Goal, Limit, Window, judged, requirement
from tcplan.material.law import Polynomial


def curve_of(tc1_ppm, tc2_ppm):
    one = film("x", tc1_ppm, tc2_ppm)
    return lambda T: one.ratio(T, 298.15)


CURVE = curve_of(-60.0, 1.1)
T = np.linspace(233.15, 423.15, 200_001)
DRIFT = CURVE(T) - 1


def test_drift_limit():
    need = need_of(Limit(kind="drift", value=0.004))
    assert need.scale == 0.004
    assert judged(CURVE, need).figure == pytest.approx(np.max(np.abs(DRIFT)), rel=1e-9)


def test_band_limit():
    need = need_of(Limit(kind="band", value=0.004))
    found = judged(CURVE, need)
    assert found.figure == pytest.approx(np.ptp(DRIFT), rel=1e-8)
    assert found.centre == pytest.approx((DRIFT.max() + DRIFT.min()) / 2, rel=1e-8)


def test_box_limit_is_the_band_over_the_span():
    """Box TCR: band over the span of temperature."""
    need = need_of(Limit(kind="box_tcr", value=25e-6))
    assert need.scale == pytest.approx(25e-6 * 190)
    assert judged(CURVE, need).figure == pytest.approx(np.ptp(DRIFT), rel=1e-8)


def test_chord_limit_is_hot_and_cold():
    """Chord TCR from the reference, as in MIL-STD-202 method 304."""
    need = need_of(Limit(kind="chord_tcr", value=25e-6))
    chords = [abs(DRIFT[0] / -65.0), abs(DRIFT[-1] / 125.0)]
    assert judged(CURVE, need).figure / need.scale == pytest.approx(max(chords) / 25e-6, rel=1e-9)


def test_mask_takes_the_tighter_line_where_lines_overlap():
    windows = (Window(low=273.15, high=343.15, limit=0.001), Window(low=233.15, high=423.15, limit=0.01))
    need = need_of(Limit(kind="mask", value=0.001, windows=windows))
    inside = (T >= 273.15) & (T <= 343.15)
    expected = max(np.max(np.abs(DRIFT[inside])), np.max(np.abs(DRIFT)) / 10)
    assert judged(CURVE, need).figure == pytest.approx(expected, rel=1e-4)


def test_a_mask_outside_the_range_is_refused():
    with pytest.raises(InputError, match="mask"):
        need_of(Limit(kind="mask", value=0.01, windows=(Window(low=500.0, high=510.0, limit=0.01),)))


def test_several_limits_must_all_hold():
    need = need_of(Limit(kind="drift", value=0.02), Limit(kind="band", value=0.01))
    figure = judged(CURVE, need).figure
    assert figure == pytest.approx(max(np.max(np.abs(DRIFT)), 2 * np.ptp(DRIFT)), rel=1e-8)
    assert need.kind == "drift and band"


def test_a_wanted_law_is_taken_off():
    wanted = Polynomial(reference=298.15, coefficients=(-60e-6, 1.1e-6))
    need = requirement(Goal(limits=(Limit(kind="drift", value=0.01),), wanted=wanted), over())
    assert judged(CURVE, need).figure < 1e-14


def test_without_a_limit_the_peak_is_the_figure():
    need = need_of()
    assert need.scale is None
    assert need.met(1e9)
    assert judged(CURVE, need).figure == pytest.approx(np.max(np.abs(DRIFT)), rel=1e-9)


def test_the_limit_itself_is_met():
    need = need_of(Limit(kind="drift", value=0.004))
    assert need.met(0.004)
    assert not need.met(0.004001)
