"""Properties of every law, on drawn parameters."""

from __future__ import annotations

import math
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tcplan.arrays import FloatArray
from tcplan.material.law import (
    Expression,
    Law,
    Platinum,
    Polynomial,
    SteinhartHart,
    Table,
    Thermistor,
    chord_tcr,
    from_chords,
    from_peak,
    law_from_parameters,
    temperature_symbol,
)

few = settings(derandomize=True, max_examples=15, deadline=None)
references = st.floats(263.15, 333.15)
temperatures = st.floats(220.0, 420.0)
ppm = st.floats(-500.0, 500.0)
small = st.floats(-1.0, 1.0)


@st.composite
def polynomials(draw: Any) -> Polynomial:
    tail = draw(st.lists(st.floats(-1e-10, 1e-10), max_size=1))
    coefficients = (draw(ppm) * 1e-6, draw(small) * 1e-6, *tail)
    return Polynomial(reference=draw(references), coefficients=coefficients)


@st.composite
def steinhart_harts(draw: Any) -> SteinhartHart:
    a, b, c = draw(st.floats(5e-4, 2e-3)), draw(st.floats(5e-5, 3e-4)), draw(st.floats(1e-8, 7e-7))
    return SteinhartHart(reference=draw(references), a=a, b=b, c=c)


@st.composite
def tables(draw: Any) -> Table:
    steps = draw(st.lists(st.floats(5.0, 60.0), min_size=4, max_size=9))
    ends = np.cumsum(steps) - steps[0]
    knots = tuple(float(t) for t in 200.0 + 260.0 * ends / ends[-1])
    values = draw(st.lists(st.floats(0.8, 1.2), min_size=len(knots), max_size=len(knots)))
    return Table(reference=draw(references), points=tuple(zip(knots, values, strict=True)))


@st.composite
def expressions(draw: Any) -> Expression:
    text, scale = draw(
        st.sampled_from(
            (
                ("exp(B*(1/T - 1/T0)) * (1 + a*(T - T0)^2)", 1e-6),
                ("B/1000 + tanh(a*(T - T0)) + 0.1*sin(T/100)*cos(T/90)", 1e-2),
                ("sqrt(B + a*T) + log(T/T0 + 1) + atan(T/T0)/5 - 0.2*log10(T)", 1.0),
                ("B*(T/T0)^1.5*(2 + a*(T - T0))^(-3) + (T/T0)^(T/T0)", 1e-3),
                ("B/T + sinh(a*T) + cosh(a*T) + tan(a*T)^2 + ln(T)", 1e-3),
            )
        )
    )
    constants = (("B", draw(st.floats(2000.0, 4000.0))), ("a", scale * draw(small)))
    return Expression(
        reference=draw(references), text=text, constants=constants, origin=draw(st.none() | references)
    )


laws = st.one_of(
    polynomials(),
    st.builds(Platinum, reference=references),
    st.builds(Thermistor, reference=references, beta=st.floats(1000.0, 5000.0)),
    steinhart_harts(),
    tables(),
    expressions(),
)


@given(law=laws)
@few
def test_ratio_is_exactly_one_at_the_reference(law: Law) -> None:
    assert float(law.ratio(law.reference)) == 1.0
    assert law.ratio(np.array([300.0, law.reference, 350.0]))[1] == 1.0


@given(law=laws, at=temperatures)
@settings(few, max_examples=40)
def test_slope_equals_the_finite_difference_of_the_ratio(law: Law, at: float) -> None:
    step = 0.01
    if any(abs(at - t) < 2.0 * step for t in law.breakpoints):
        at += 4.0 * step
    low, high = (float(law.ratio(at + sign * step)) for sign in (-1.0, 1.0))
    difference = (high - low) / (2.0 * step) / float(law.ratio(at))
    assert float(law.slope(at)) == pytest.approx(difference, rel=1e-5, abs=1e-9)


@given(law=laws)
@few
def test_slope_is_the_first_taylor_coefficient_at_every_temperature(law: Law) -> None:
    at = np.linspace(221.0, 419.0, 5)
    slopes = law.slope(at)
    assert slopes.shape == at.shape
    assert slopes == pytest.approx([law.taylor(float(t), 1)[0] for t in at], rel=1e-12, abs=1e-18)


@given(
    law=st.one_of(polynomials(), expressions(), steinhart_harts(), st.builds(Platinum, reference=references))
)
@settings(few, max_examples=8)
def test_taylor_equals_the_derivatives_of_sympy(law: Law) -> None:
    import sympy

    at, symbol, formula = 305.0, temperature_symbol(), law.symbolic()
    start = float(formula.subs(symbol, at))
    expected = []
    for order in (1, 2, 3):
        value = sympy.diff(formula, symbol, order).subs(symbol, sympy.Float(at, 40)).evalf(30)
        expected.append(float(value) / math.factorial(order) / start)
    for coefficient, exact, floor in zip(law.taylor(at, 3), expected, (1e-14, 1e-16, 1e-18), strict=True):
        assert coefficient == pytest.approx(exact, rel=1e-9, abs=floor)


@given(law=laws, at=temperatures)
@settings(few, max_examples=30)
def test_symbolic_equals_the_numeric_ratio(law: Law, at: float) -> None:
    value = float(law.symbolic().subs(temperature_symbol(), at))
    assert value == pytest.approx(float(law.ratio(at)), rel=1e-12)


@given(law=laws, reference=references, at=temperatures)
@settings(few, max_examples=40)
def test_referring_to_another_temperature_divides_and_comes_back(
    law: Law, reference: float, at: float
) -> None:
    moved = law.referred_to(reference)
    assert float(moved.ratio(reference)) == 1.0
    expected = float(law.ratio(at)) / float(law.ratio(reference))
    assert float(moved.ratio(at)) == pytest.approx(expected, rel=1e-12)
    back = moved.referred_to(law.reference)
    assert float(back.ratio(at)) == pytest.approx(float(law.ratio(at)), rel=1e-12)


@given(law=polynomials(), reference=references)
@few
def test_polynomial_coefficients_come_back(law: Polynomial, reference: float) -> None:
    back = law.referred_to(reference).referred_to(law.reference)
    spans = 100.0 ** -np.arange(1, len(law.coefficients) + 1)  # what matters over 100 K
    assert back.coefficients == pytest.approx(law.coefficients, rel=1e-12, abs=1e-12 * spans[-1])


@given(cold_tcr=ppm, hot_tcr=ppm, reference=references)
@few
def test_chords_make_the_law_and_are_read_back(cold_tcr: float, hot_tcr: float, reference: float) -> None:
    law = from_chords(reference, 218.15, cold_tcr * 1e-6, 398.15, hot_tcr * 1e-6)
    assert chord_tcr(law, 218.15, reference) == pytest.approx(cold_tcr * 1e-6, rel=1e-12, abs=1e-18)
    assert chord_tcr(law, 398.15, reference) == pytest.approx(hot_tcr * 1e-6, rel=1e-12, abs=1e-18)
    ratio = 1.0 + cold_tcr * 1e-6 * (218.15 - reference)
    assert float(law.ratio(218.15)) == pytest.approx(ratio, rel=1e-14)


@given(peak=temperatures, tc2=st.floats(-1e-6, -1e-8), reference=references)
@few
def test_peak_form_peaks_where_it_says(peak: float, tc2: float, reference: float) -> None:
    law = from_peak(peak, tc2, reference)
    assert float(law.slope(peak)) == pytest.approx(0.0, abs=1e-14)
    at = 350.0
    expected = (1.0 + tc2 * (at - peak) ** 2) / (1.0 + tc2 * (reference - peak) ** 2)
    assert float(law.ratio(at)) == pytest.approx(expected, rel=1e-13)


@given(law=laws)
@settings(few, max_examples=40)
def test_plain_data_states_the_law_in_full(law: Law) -> None:
    again = law_from_parameters(law.parameters())
    assert type(again) is type(law)
    assert again.reference == pytest.approx(law.reference, rel=1e-15)
    assert again.breakpoints == pytest.approx(law.breakpoints, rel=1e-15)
    at = np.linspace(230.0, 410.0, 4)
    assert again.ratio(at) == pytest.approx(law.ratio(at), rel=1e-12)
    if isinstance(law, Polynomial) and isinstance(again, Polynomial):
        assert again.coefficients == pytest.approx(law.coefficients, rel=1e-15, abs=0.0)


@given(law=st.one_of(tables(), st.builds(Platinum, reference=references)))
@few
def test_laws_are_smooth_between_breakpoints_and_twice_differentiable_at_them(law: Law) -> None:
    assert law.breakpoints == tuple(sorted(law.breakpoints))
    knots = law.breakpoints[1:-1] if isinstance(law, Table) else law.breakpoints
    for knot in knots:
        below, above = law.taylor(math.nextafter(knot, 0.0), 2), law.taylor(knot, 2)
        assert below == pytest.approx(above, rel=1e-9, abs=1e-11)
    ends = [200.0, *knots, 460.0]
    for low, high in pairwise(ends):
        # within a piece, two centres must tell the same: ln R is cubic (tables), R is a polynomial (platinum)
        inside = np.linspace(low, high, 7)[1:-1]
        values = np.log(law.ratio(inside)) if isinstance(law, Table) else law.ratio(inside)
        expected = 0.0 if isinstance(law, Table) else _fourth_difference(law, inside)
        assert float(np.diff(values, 4)[0]) == pytest.approx(expected, abs=1e-12)


def _fourth_difference(law: Law, inside: FloatArray) -> float:
    # IEC 60751: the coefficient of t^4 is C below 0 degC and 0 above
    coefficient = -4.183e-12 if inside[0] < 273.15 else 0.0
    at_zero = Platinum(reference=273.15).ratio(law.reference)
    return float(24.0 * coefficient * (inside[1] - inside[0]) ** 4 / at_zero)
