"""Forms of coefficients: round trips, published values, twins of numpy, uncertainties against draws."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tcplan.errors import InputError
from tcplan.material.coefficient_box import box_limits
from tcplan.material.coefficient_forms import (
    Peak,
    Quadratic,
    Uncertain,
    box_tcr,
    chord,
    chord_covariance,
    from_chords,
    from_peak,
    moved,
    pair_covariance,
    peak,
    ratio,
)
from tcplan.material.coefficient_points import from_points

REFERENCE, COLD, HOT = 298.15, 218.15, 398.15
EXACT = 1e-12
AGREES = settings(derandomize=True, max_examples=100, deadline=None)

tc1s = st.floats(-2e-3, 4e-3)
tc2s = st.one_of(st.floats(-5e-6, -1e-8), st.floats(1e-8, 5e-6))
temperatures = st.floats(218.15, 423.15)
sizes = st.floats(1e-3, 0.3)
correlations = st.floats(-0.95, 0.95)


def form(tc1=-120e-6, tc2=0.55e-6, u1=None, u2=None, r=0.0, reference=REFERENCE):
    return Quadratic(reference=reference, tc1=tc1, tc2=tc2, covariance=pair_covariance(u1, u2, r))


def same(one, other, rel=EXACT):
    """Compare two laws by R(T) and by their covariances in the scale of their own sizes."""
    assert one.reference == pytest.approx(other.reference, rel=1e-15)
    assert one.tc1 == pytest.approx(other.tc1, rel=rel, abs=1e-15)
    assert one.tc2 == pytest.approx(other.tc2, rel=rel, abs=1e-17)
    if other.covariance is None:
        assert one.covariance is None
        return
    for i in range(2):
        for j in range(2):
            scale = math.sqrt(other.covariance[i][i] * other.covariance[j][j])
            assert one.covariance[i][j] == pytest.approx(other.covariance[i][j], abs=1e-9 * scale)


laws = st.builds(form, tc1s, tc2s, sizes.map(lambda s: s * 1e-4), sizes.map(lambda s: s * 1e-6), correlations)


# --- round trips ----------------------------------------------------------------------------------


@AGREES
@given(laws, temperatures)
def test_to_another_reference_and_back(law, to):
    same(moved(moved(law, to), REFERENCE), law)


@AGREES
@given(laws, st.floats(200.0, 290.0), st.floats(305.0, 450.0))
def test_to_chords_and_back(law, cold, hot):
    tcrs = chord(law, cold).value, chord(law, hot).value
    back = from_chords(REFERENCE, cold, tcrs[0], hot, tcrs[1], chord_covariance(law, cold, hot))
    same(back, law)


@AGREES
@given(tc1s, tc2s, sizes, sizes, correlations)
def test_to_the_peak_and_back(tc1, tc2, s1, s2, r):
    law = form(tc1 * 0.2, tc2, abs(tc1) * s1, abs(tc2) * s2, r)
    top = peak(law)
    if top is None:
        # the vertex is below zero, or below absolute zero
        shift = -law.tc1 / (2 * law.tc2)
        assert 1 + law.tc1 * shift + law.tc2 * shift**2 <= 1e-12 or REFERENCE + shift <= 0
        return
    back = from_peak(top, REFERENCE)
    far = max(1.0, abs(top.at - REFERENCE) / 100.0)  # a far peak loses digits: its distance squared
    assert back.tc1 == pytest.approx(law.tc1, rel=EXACT * far**2, abs=1e-15)
    assert back.tc2 == pytest.approx(law.tc2, rel=EXACT * far**2)
    assert back.uncertainty(0) == pytest.approx(law.uncertainty(0), rel=1e-6 * far**2, abs=1e-15)


@AGREES
@given(st.floats(250.0, 350.0), tc2s, temperatures)
def test_from_the_peak_and_back(at, tc2, reference):
    top = Peak(at=at, tc2=tc2, covariance=pair_covariance(2.0, abs(tc2) * 0.1, 0.3))
    back = peak(from_peak(top, reference))
    assert back.at == pytest.approx(at, rel=EXACT)
    assert back.tc2 == pytest.approx(tc2, rel=EXACT)
    assert back.uncertainty(0) == pytest.approx(2.0, rel=1e-9)
    assert back.correlation == pytest.approx(0.3, abs=1e-9)


@AGREES
@given(laws, st.floats(200.0, 260.0), st.floats(270.0, 340.0), st.floats(350.0, 450.0), temperatures)
def test_to_a_table_of_three_points_and_back(law, low, middle, high, reference):
    points = (low, middle, high)
    table = [1000.0 * ratio(law, t).value for t in points]
    back = from_points(points, table, reference)
    here = moved(law, reference)
    # R has 16 digits: of a coefficient those remain that its part of R has
    assert back.quadratic.tc1 == pytest.approx(here.tc1, rel=EXACT, abs=2e-16 * 100)
    assert back.quadratic.tc2 == pytest.approx(here.tc2, rel=EXACT, abs=2e-16)
    assert back.ohms.value == pytest.approx(1000.0 * ratio(law, reference).value, rel=EXACT)
    assert (back.dof, back.sigma) == (0, None)


# --- published values -----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("degC", "alpha"), [(0, 0.004265), (15, 0.004009), (25, 0.003854), (30, 0.003781), (50, 0.003516)]
)
def test_copper_at_other_references(degC, alpha):
    # IEC 60028: alpha 0.00393 per K at 20 degC; NBS Handbook 100, table 2, agrees (from memory)
    copper = form(tc1=0.00393, tc2=0.0, reference=293.15)
    assert moved(copper, degC + 273.15).tc1 == pytest.approx(alpha, abs=5e-7)


@pytest.mark.parametrize(("degC", "ppm"), [(85, 3503.702), (125, 3482.651), (150, 3469.494)])
def test_hot_chords_of_platinum(degC, ppm):
    # IEC 60751 coefficients at 0 degC with the definition of MIL-STD-202 method 304, from 25 degC
    platinum = moved(form(3.9083e-3, -5.775e-7, reference=273.15), REFERENCE)
    assert chord(platinum, degC + 273.15).value * 1e6 == pytest.approx(ppm, abs=0.01)


def test_the_least_band_of_a_curvature():
    # Chebyshev: on a span s the least band of b x^2 + a x + c is |b| s^2/4, so the box TCR is |b| s/4
    b, middle = 0.6e-6, 0.5 * (COLD + HOT)
    even = form(tc1=-2 * b * (middle - REFERENCE), tc2=b)
    assert box_tcr(even, COLD, HOT).value == pytest.approx(b * (HOT - COLD) / 4, rel=EXACT)
    assert box_limits(box_tcr(even, COLD, HOT), REFERENCE, COLD, HOT).tc2.value == pytest.approx(b, rel=EXACT)


@AGREES
@given(laws)
def test_the_box_is_the_band_on_a_fine_grid(law):
    T = np.linspace(COLD, HOT, 20001)
    x = T - REFERENCE
    band = np.ptp(x * (law.tc1 + law.tc2 * x))
    assert box_tcr(law, COLD, HOT).value == pytest.approx(band / (HOT - COLD), rel=1e-6)


@pytest.mark.parametrize(
    ("low", "high", "reference"),
    [(218.15, 398.15, 298.15), (273.15, 343.15, 298.15), (233.15, 398.15, 293.15), (298.15, 398.15, 298.15)],
)
def test_what_a_box_leaves_open_by_brute_force(low, high, reference):
    box, ends = 25e-6, (low, 0.25 * low + 0.75 * high, high)
    found = box_limits(Uncertain(value=box), reference, low, high, ends)
    # every quadratic up to a factor, by the angle of its two coefficients; scaled to the band of the box
    angle = np.linspace(0.0, np.pi, 40001)
    b, a = np.cos(angle) / (high - low), np.sin(angle)
    x = np.linspace(low, high, 301) - reference
    scale = np.empty_like(a)
    for k in range(len(a)):
        scale[k] = box * (high - low) / np.ptp(x * (a[k] + b[k] * x))
    most = {
        "tc1": np.max(np.abs(scale * a)),
        "tc2": np.max(np.abs(scale * b)),
        **{at: np.max(np.abs(scale * (a + b * (at - reference)))) for at in ends},
    }
    assert found.tc1.value == pytest.approx(most["tc1"], rel=1e-4)
    assert found.tc2.value == pytest.approx(most["tc2"], rel=1e-4)
    for at, tcr in found.chords:
        assert tcr.value == pytest.approx(most[at], rel=1e-4)


def test_a_box_carries_its_uncertainty_in_proportion():
    found = box_limits(Uncertain(value=25e-6, uncertainty=1e-6), REFERENCE, COLD, HOT, (HOT,))
    for figure in (found.tc1, found.tc2, found.chords[0][1]):
        assert figure.uncertainty == pytest.approx(figure.value / 25, rel=EXACT)


# --- least squares: the independent twin is numpy's polyfit ------------------------------------------

T_TABLE = np.array([233.15, 260.0, 285.0, 298.15, 330.0, 360.0, 398.15])
R_TABLE = np.array([993.2, 995.4, 998.6, 1000.2, 1005.1, 1011.0, 1019.4])


def relative(coefficients, covariance):
    """Return tc1, tc2 and their covariance by finite differences, from numpy's (c2, c1, c0)."""
    value = np.array([coefficients[1] / coefficients[2], coefficients[0] / coefficients[2]])
    rows = np.empty((2, 3))
    for k in range(3):
        for sign in (1, -1):
            near = coefficients.copy()
            near[k] *= 1 + sign * 1e-6
            other = np.array([near[1] / near[2], near[0] / near[2]])
            rows[:, k] = other if sign == 1 else (rows[:, k] - other) / (2e-6 * coefficients[k])
    return value, rows @ covariance @ rows.T


@pytest.mark.parametrize("reference", [273.15, 298.15, 390.0])
@pytest.mark.parametrize("stated", [None, np.array([0.1, 0.1, 0.05, 0.05, 0.05, 0.2, 0.2])])
def test_more_points_than_three(reference, stated):
    x = T_TABLE - reference
    weights = None if stated is None else 1 / stated
    coefficients, covariance = np.polyfit(
        x, R_TABLE, 2, w=weights, cov=True if stated is None else "unscaled"
    )
    value, spread = relative(coefficients, covariance)
    found = from_points(T_TABLE, R_TABLE, reference, stated)
    law = found.quadratic
    assert (law.tc1, law.tc2) == pytest.approx(tuple(value), rel=1e-9)
    assert np.asarray(law.covariance) == pytest.approx(spread, rel=1e-5)
    assert found.ohms.value == pytest.approx(coefficients[2], rel=EXACT)
    assert found.ohms.uncertainty == pytest.approx(math.sqrt(covariance[2, 2]), rel=1e-8)
    fitted = np.polyval(coefficients, x)
    assert found.residuals == pytest.approx(tuple(R_TABLE / fitted - 1), abs=1e-14)
    assert found.sigma == pytest.approx(math.sqrt(np.sum((R_TABLE - fitted) ** 2) / 4), rel=1e-9)


# --- uncertainties against draws --------------------------------------------------------------------

MANY = 200_000


def drawn(first, second, u1, u2, r, seed):
    """Return draws of two correlated normal numbers."""
    a, b = np.random.default_rng(seed).standard_normal((2, MANY))
    return first + u1 * a, second + u2 * (r * a + math.sqrt(1 - r * r) * b)


def agrees(covariance, *samples):
    """Compare with the covariance of the draws: 1 % of the sizes is about three of its own sigmas."""
    found = np.cov(np.stack(samples))
    root = np.sqrt(np.diag(found))
    assert np.asarray(covariance) / np.outer(root, root) == pytest.approx(
        found / np.outer(root, root), abs=0.01
    )


def test_chords_to_coefficients_by_draws():
    cold, hot = drawn(-35e-6, 30e-6, 4e-6, 3e-6, 0.5, 1)
    law = from_chords(REFERENCE, COLD, -35e-6, HOT, 30e-6, pair_covariance(4e-6, 3e-6, 0.5))
    # R = 1 + chord x at both ends, solved for the two coefficients
    x, y = COLD - REFERENCE, HOT - REFERENCE
    matrix = np.linalg.inv(np.array([[x, x * x], [y, y * y]]))
    tc1, tc2 = matrix @ np.stack([cold * x, hot * y])
    agrees(law.covariance, tc1, tc2)


def test_another_reference_by_draws():
    tc1, tc2 = drawn(1500e-6, 0.6e-6, 20e-6, 0.05e-6, -0.4, 2)
    law = moved(form(1500e-6, 0.6e-6, 20e-6, 0.05e-6, -0.4), 398.15)
    whole = 1 + 100 * tc1 + 1e4 * tc2
    agrees(law.covariance, (tc1 + 200 * tc2) / whole, tc2 / whole)


def test_the_peak_by_draws():
    tc1, tc2 = drawn(2e-6, -0.04e-6, 0.2e-6, 0.001e-6, 0.3, 3)
    top = peak(form(2e-6, -0.04e-6, 0.2e-6, 0.001e-6, 0.3))
    at = REFERENCE - tc1 / (2 * tc2)
    agrees(top.covariance, at, tc2 / (1 - tc1**2 / (4 * tc2)))


def test_the_peak_form_by_draws():
    at, tc2 = drawn(318.15, -0.04e-6, 2.0, 0.002e-6, -0.5, 4)
    top = Peak(at=318.15, tc2=-0.04e-6, covariance=pair_covariance(2.0, 0.002e-6, -0.5))
    d = REFERENCE - at
    whole = 1 + tc2 * d * d
    agrees(from_peak(top, REFERENCE).covariance, 2 * tc2 * d / whole, tc2 / whole)


def test_chord_box_and_ratio_by_draws():
    law = form(-120e-6, 0.55e-6, 5e-6, 0.02e-6, -0.4)
    tc1, tc2 = drawn(-120e-6, 0.55e-6, 5e-6, 0.02e-6, -0.4, 5)
    assert chord(law, HOT).uncertainty == pytest.approx(np.std(tc1 + 100 * tc2), rel=0.01)
    assert ratio(law, HOT).uncertainty == pytest.approx(np.std(100 * tc1 + 1e4 * tc2), rel=0.01)
    x = np.linspace(COLD, HOT, 91)[:, None] - REFERENCE
    curves = x * (tc1[:20000] + tc2[:20000] * x)
    assert box_tcr(law, COLD, HOT).uncertainty == pytest.approx(
        np.std(np.ptp(curves, axis=0)) / 180, rel=0.03
    )


def test_a_table_by_draws():
    u = np.full(len(T_TABLE), 0.1)
    found = from_points(T_TABLE, R_TABLE, REFERENCE, u)
    noise = np.random.default_rng(6).standard_normal((MANY, len(u))) * 0.1
    c2, c1, c0 = np.polyfit(T_TABLE - REFERENCE, (R_TABLE + noise).T, 2)
    agrees(found.quadratic.covariance, c1 / c0, c2 / c0)


def test_what_is_not_stated_stays_not_stated():
    law = form()
    assert moved(law, HOT).covariance is None
    assert chord(law, HOT).uncertainty is None
    assert box_tcr(law, COLD, HOT).uncertainty is None
    one = form(u1=5e-6)
    assert np.asarray(one.covariance) == pytest.approx(np.array([[25e-12, 0.0], [0.0, 0.0]]), rel=EXACT)
    assert one.correlation is None


# --- refusals -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("make", "told"),
    [
        (lambda: moved(form(-0.01, 0.0), 423.15), "-0.25 at 150 degC"),
        (lambda: from_chords(REFERENCE, HOT, 0.0, COLD, 0.0), "cold below"),
        (lambda: box_tcr(form(), HOT, COLD), "lower temperature first"),
        (lambda: box_limits(Uncertain(value=-1e-6), REFERENCE, COLD, HOT), "not below 0"),
        (lambda: box_limits(Uncertain(value=1e-6), 200.0, COLD, HOT), "inside its range"),
        (lambda: from_points((250.0, 300.0, 300.0), (1.0, 1.0, 1.0), 300.0), "2 different temperatures"),
        (lambda: from_points((250.0, 300.0, 350.0), (1.0, 0.0, 1.0), 300.0), "above zero"),
        (lambda: from_points((250.0, 300.0, 350.0), (1.0, 1.0, 1.0), 300.0, (1.0, 0.0, 1.0)), "point 2"),
        (lambda: from_points((290.0, 300.0, 310.0), (1.0, 2.0, 1.0), 500.0), "a quadratic that is"),
        (lambda: chord(form(1e308, 1e308), HOT), "range of floats"),
        (lambda: chord(form(1.0, 1.0, 1e300, 1e300), HOT), "range of floats"),
    ],
)
def test_wrong_forms_are_refused(make, told):
    with pytest.raises(InputError, match=told):
        make()


def test_there_is_no_peak_of_a_line_or_below_zero():
    assert peak(form(1e-3, 0.0)) is None
    # 1 + 0.1 x + 1e-3 x^2 is -1.5 at its lowest
    assert peak(form(0.1, 1e-3)) is None
