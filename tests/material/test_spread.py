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


def test_dict_round_trip_is_exact() -> None:
    for spread in (LIMITS, Spread(meaning="sigma", tc2=1 / 3 * 1e-6)):
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
