"""Spread: meaning, limits, and the exact range of a law over the box of TC1 and TC2."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest

from tcplan.errors import InputError
from tcplan.material.law import Law, Platinum, Polynomial, Thermistor
from tcplan.material.spread import (
    Spread,
    law_bounds,
    law_vertices,
    shifted_ratio,
    spread_from_dict,
    value_half_width,
)

LIMITS = Spread(meaning="limits", value=0.15, tc1=40e-6, tc2=0.1e-6)
T = np.linspace(233.15, 423.15, 39)
FILM = Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6))
LAWS = (FILM, Platinum(reference=273.15), Thermistor(reference=298.15, beta=3435.0))


def scalar_ratio(law: Law, da: float, db: float, reference: float, at: float) -> float:
    """One temperature, one device, in plain floats: the slow twin."""

    def device(t: float) -> float:
        x = t - law.reference
        return float(law.ratio(t)) / float(law.ratio(law.reference)) + da * x + db * x * x

    return device(at) / device(reference)


@pytest.mark.parametrize("law", LAWS, ids=lambda law: law.kind)
@pytest.mark.parametrize("reference", [300.15, 298.15, 273.15])
def test_shifted_ratio_agrees_with_its_scalar_twin(law: Law, reference: float) -> None:
    shift = (40e-6, -0.1e-6)
    expected = [scalar_ratio(law, *shift, reference, float(t)) for t in T]
    np.testing.assert_allclose(shifted_ratio(law, shift, reference, T), expected, rtol=1e-12)


def test_a_shift_moves_tc1_and_tc2_of_a_polynomial_themselves() -> None:
    # By definition of TC1 and TC2: R/R_ref = 1 + TC1 x + TC2 x^2.
    shifted = Polynomial(reference=300.15, coefficients=(-80e-6, 0.45e-6))
    np.testing.assert_allclose(
        shifted_ratio(FILM, (40e-6, -0.1e-6), 298.15, T), shifted.ratio(T) / shifted.ratio(298.15), rtol=1e-13
    )


@pytest.mark.parametrize("law", LAWS, ids=lambda law: law.kind)
@pytest.mark.parametrize("reference", [300.15, 320.15])
def test_no_point_of_the_box_leaves_the_bounds_and_corners_reach_them(law: Law, reference: float) -> None:
    lo, hi = law_bounds(law, LIMITS, reference, T)
    steps = np.linspace(-1.0, 1.0, 9)
    curves = np.array(
        [
            [scalar_ratio(law, u * 40e-6, v * 0.1e-6, reference, float(t)) for t in T]
            for u, v in itertools.product(steps, steps)
        ]
    )
    np.testing.assert_allclose(curves.min(axis=0), lo, rtol=1e-12)
    np.testing.assert_allclose(curves.max(axis=0), hi, rtol=1e-12)


def test_bounds_at_the_own_reference_are_the_half_width_u() -> None:
    # By hand, for equal references: r -/+ u with u = |x| dTC1 + x^2 dTC2.
    lo, hi = law_bounds(FILM, LIMITS, 300.15, T)
    x = T - 300.15
    u = np.abs(x) * 40e-6 + x**2 * 0.1e-6
    np.testing.assert_allclose(hi, FILM.ratio(T) + u, rtol=1e-13)
    np.testing.assert_allclose(lo, FILM.ratio(T) - u, rtol=1e-13)


def test_a_reference_20_kelvin_away_changes_the_bounds_as_calculus_says() -> None:
    law = Polynomial(reference=273.15, coefficients=(3900e-6,))
    at = np.array([373.15])
    spread = Spread(meaning="limits", tc1=50e-6)
    lo, hi = law_bounds(law, spread, 293.15, at)
    simple = 2.0 * 80.0 * 50e-6  # r -/+ u with the brief's reference put in for the material's own
    # d[(1 + a 100)/(1 + a 20)]/da = 80/(1 + 20 a)^2: smaller by 1/1.078^2 (calculus)
    assert hi[0] - lo[0] == pytest.approx(simple / 1.078**2, rel=1e-4)


def test_temperature_keeps_its_shape() -> None:
    lo, hi = law_bounds(FILM, LIMITS, 298.15, T.reshape(3, 13))
    assert lo.shape == hi.shape == (3, 13)


def test_sigma_counts_three_times_and_limits_once() -> None:
    # Convention of this package, stated in its docstring: limits = 3 sigma.
    sigma = Spread(meaning="sigma", value=0.05, tc1=10e-6)
    assert sigma.limits().meaning == "limits"
    assert sigma.limits().value == pytest.approx(0.15, rel=1e-15)
    assert sigma.limits().tc1 == pytest.approx(30e-6, rel=1e-15)
    assert sigma.limits().tc2 is None
    assert LIMITS.limits() is LIMITS


def test_what_is_not_stated_is_reported_and_counts_as_zero() -> None:
    spread = Spread(meaning="limits", tc1=40e-6)
    assert spread.unstated == ("value", "tc2")
    assert law_vertices(spread) == ((-40e-6, 0.0), (40e-6, 0.0))
    assert value_half_width(FILM, spread, FILM.reference) == 0.0


def test_vertices_are_the_distinct_corners() -> None:
    assert len(set(law_vertices(LIMITS))) == 4
    assert law_vertices(Spread(meaning="limits")) == ((0.0, 0.0),)


def test_value_half_width_is_the_value_at_the_own_reference() -> None:
    assert value_half_width(FILM, LIMITS, 300.15) == 0.15


def test_value_half_width_covers_every_device_at_another_reference() -> None:
    reference = 340.15
    D = value_half_width(FILM, LIMITS, reference)
    nominal = float(FILM.ratio(reference))
    x = reference - 300.15
    for v, da, db in itertools.product((-0.15, 0.15), (-40e-6, 40e-6), (-0.1e-6, 0.1e-6)):
        device = (1.0 + v) * (nominal + da * x + db * x * x) / nominal
        assert abs(device - 1.0) <= D + 1e-15
    assert D > 0.15


def test_widened_adds_limits_component_by_component() -> None:
    wide = Spread(meaning="sigma", value=0.01, tc1=10e-6).widened(
        Spread(meaning="limits", tc1=5e-6, tc2=1e-7)
    )
    assert wide.meaning == "limits"
    assert (wide.value, wide.tc1, wide.tc2) == pytest.approx((0.03, 35e-6, 1e-7), rel=1e-14)
    assert Spread(meaning="limits").widened(Spread(meaning="limits", tc1=1e-6)).unstated == ("value", "tc2")


def test_sigma_counts_three_times_in_every_component() -> None:
    sigma = Spread(meaning="sigma", end_resistance=0.1, end_tc1=1e-4, width_bias=1e-8, tcr=5e-6)
    limits = sigma.limits()
    found = (limits.end_resistance, limits.end_tc1, limits.width_bias, limits.tcr)
    assert found == pytest.approx((0.3, 3e-4, 3e-8, 15e-6), rel=1e-14)


def test_a_tcr_limit_is_a_half_width_of_tc1_at_each_temperature() -> None:
    # Data sheets: |dR/R| <= k |T - T0|; at one T that is TC1 off by at most k.
    tcr, tc1 = (
        Spread(meaning="limits", value=0.01, tcr=25e-6),
        Spread(meaning="limits", value=0.01, tc1=25e-6),
    )
    assert tcr.unstated == ()
    assert law_vertices(tcr) == law_vertices(tc1)
    for a, b in zip(law_bounds(FILM, tcr, 320.15, T), law_bounds(FILM, tc1, 320.15, T), strict=True):
        np.testing.assert_array_equal(a, b)
    assert value_half_width(FILM, tcr, 320.15) == value_half_width(FILM, tc1, 320.15)
    both = Spread(meaning="limits", tc1=5e-6, tcr=25e-6)
    assert both.tc1_and_tcr == pytest.approx(30e-6, rel=1e-15)
    assert Spread(meaning="limits").tc1_and_tcr is None


@pytest.mark.parametrize("reference", [300.15, 320.15, 260.15])
def test_no_device_within_a_tcr_limit_leaves_the_bounds_whatever_its_sign_on_each_side(
    reference: float,
) -> None:
    k, flat = 100e-6, Polynomial(reference=300.15, coefficients=(0.0,))
    lo, hi = law_bounds(flat, Spread(meaning="limits", tcr=k), reference, T)
    for cold, hot in itertools.product(np.linspace(-k, k, 9), repeat=2):

        def device(t: float, cold: float = cold, hot: float = hot) -> float:
            return 1.0 + (cold if t < 300.15 else hot) * (t - 300.15)

        ratio = np.array([device(float(t)) / device(reference) for t in T])
        assert np.all(ratio <= hi * (1 + 1e-14))
        assert np.all(ratio >= lo * (1 - 1e-14))


def test_the_width_error_widens_the_value() -> None:
    # By hand: R goes as 1/W, so (1 + D)/(1 - e/W) is the highest factor and (1 - D)/(1 + e/W) the lowest.
    spread = Spread(meaning="limits", value=0.1, tc1=40e-6, width_bias=0.05e-6, shape="rectangular")
    wide = spread.with_width(1e-6)
    assert wide.value == pytest.approx(1.1 / 0.95 - 1, rel=1e-14)
    assert (wide.tc1, wide.width_bias, wide.shape) == (40e-6, 0.0, "rectangular")
    for d, e in itertools.product(np.linspace(-0.1, 0.1, 5), np.linspace(-0.05, 0.05, 5)):
        assert abs((1 + d) / (1 + e) - 1) <= (wide.value or 0) + 1e-15
    assert wide.with_width(1e-6) is wide


def test_a_width_error_of_sigma_counts_three_times() -> None:
    wide = Spread(meaning="sigma", width_bias=0.01e-6).with_width(1e-6)
    assert wide.meaning == "limits"
    assert wide.value == pytest.approx(1 / 0.97 - 1, rel=1e-13)


def test_without_a_width_or_its_error_the_spread_stays() -> None:
    assert LIMITS.with_width(1e-6) is LIMITS
    narrow = Spread(meaning="limits", width_bias=1e-8)
    assert narrow.with_width(None) is narrow


@pytest.mark.parametrize(("value", "error"), [(0.0, 1e-6), (0.0, 0.5e-6), (0.9, 0.1e-6)])
def test_a_width_that_can_reach_zero_or_double_the_value_is_refused(value: float, error: float) -> None:
    with pytest.raises(InputError, match="width error"):
        Spread(meaning="limits", value=value, width_bias=error).with_width(1e-6)


def test_dict_round_trip_is_exact() -> None:
    whole = Spread(
        meaning="limits",
        value=0.1,
        tc1=1e-6,
        tc2=2e-8,
        end_resistance=0.4,
        end_tc1=2e-4,
        width_bias=2e-8,
        tcr=3e-6,
        shape="rectangular",
    )
    for spread in (LIMITS, Spread(meaning="sigma", tc2=1 / 3 * 1e-6), whole):
        assert spread_from_dict(spread.to_dict()) == spread


@pytest.mark.parametrize(
    ("values", "where"),
    [
        ({"value": -0.1}, "spread.value"),
        ({"value": 1.0}, "spread.value"),
        ({"tc1": math.nan}, "spread.tc1"),
        ({"tc2": math.inf}, "spread.tc2"),
        ({"meaning": "sigma", "value": 0.34}, "spread.value"),
        ({"meaning": "typical"}, "spread.meaning"),
        ({"end_resistance": 1.0}, "spread.end_resistance"),
        ({"meaning": "sigma", "end_resistance": 0.4}, "spread.end_resistance"),
        ({"end_tc1": -1e-6}, "spread.end_tc1"),
        ({"width_bias": -1e-9}, "spread.width_bias"),
        ({"tcr": math.nan}, "spread.tcr"),
        ({"shape": "triangular"}, "spread.shape"),
        ({"meaning": "sigma", "shape": "rectangular"}, "spread.shape"),
    ],
)
def test_wrong_half_widths_are_refused(values: dict[str, object], where: str) -> None:
    with pytest.raises(InputError) as caught:
        Spread(**{"meaning": "limits", **values})  # type: ignore[arg-type]
    assert [problem.where for problem in caught.value.problems] == [where]


def test_all_wrong_half_widths_are_told_at_once() -> None:
    with pytest.raises(InputError) as caught:
        Spread(meaning="limits", value=-1.0, tc1=math.nan, tc2=math.inf)
    assert len(caught.value.problems) == 3


def test_a_box_in_which_the_law_reaches_zero_is_refused() -> None:
    steep = Polynomial(reference=298.15, coefficients=(-6000e-6,))
    with pytest.raises(InputError, match="reaches zero or below"):
        law_bounds(steep, Spread(meaning="limits", tc1=3000e-6), 298.15, T)


def test_a_value_that_can_reach_zero_at_the_reference_is_refused() -> None:
    with pytest.raises(InputError, match="uncertain by"):
        value_half_width(FILM, Spread(meaning="limits", value=0.9, tc1=2000e-6), 350.15)
