"""Laws: construction, refusals, plain data, text, and the check of a range."""

from __future__ import annotations

import math
import subprocess
import sys
from dataclasses import FrozenInstanceError, replace

import numpy as np
import pytest

from tcplan.errors import ExpressionError, InputError
from tcplan.material.expression import parse_expression
from tcplan.material.law import (
    LAW_KINDS,
    Expression,
    Law,
    Platinum,
    Polynomial,
    SteinhartHart,
    Table,
    Thermistor,
    check_positive,
    chord_tcr,
    from_chords,
    law_from_parameters,
    law_latex,
    law_text,
    steinhart_hart_from_points,
    temperature_symbol,
)

ZERO = 273.15
ROOM = 298.15
POINTS = ((233.15, 0.95), (273.15, 0.99), (298.15, 1.0), (358.15, 1.03), (398.15, 1.05))


def every_kind() -> list[Law]:
    return [
        Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6)),
        Platinum(reference=ROOM),
        Thermistor(reference=ROOM, beta=3435.0),
        SteinhartHart(reference=ROOM, a=2.1085e-3, b=0.7979e-4, c=6.535e-7),
        Table(reference=ROOM, points=POINTS),
        Expression(reference=ROOM, text="exp(B*(1/T - 1/T0))", constants=(("B", 3435.0),)),
    ]


def by_kind(law: Law) -> str:
    return law.kind


@pytest.mark.parametrize("law", every_kind(), ids=by_kind)
def test_laws_are_frozen_hashable_and_comparable(law: Law) -> None:
    assert law == replace(law)
    assert hash(law) == hash(replace(law))
    assert law != law.referred_to(310.0)
    with pytest.raises(FrozenInstanceError):
        law.reference = 1.0  # type: ignore[misc]


def test_every_kind_has_its_word() -> None:
    assert tuple(law.kind for law in every_kind()) == LAW_KINDS


@pytest.mark.parametrize("law", every_kind(), ids=by_kind)
def test_shapes_follow_the_temperature(law: Law) -> None:
    for shape in ((), (3,), (2, 3)):
        at = np.full(shape, 310.0)
        assert law.ratio(at).shape == shape
        assert law.slope(at).shape == shape
    assert law.ratio(310.0).shape == ()
    assert [len(law.taylor(310.0, order)) for order in (1, 2, 5)] == [1, 2, 5]


@pytest.mark.parametrize("law", every_kind(), ids=by_kind)
@pytest.mark.parametrize("reference", [0.0, -1.0, math.nan, math.inf])
def test_references_that_are_no_temperature_are_refused(law: Law, reference: float) -> None:
    with pytest.raises(InputError, match="reference"):
        replace(law, reference=reference)


# ---- polynomial


def test_polynomial_scalar_twin() -> None:
    law = Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6, 2e-10))
    at = np.linspace(218.15, 423.15, 11)
    twin = [1.0 - 120e-6 * x + 0.55e-6 * x**2 + 2e-10 * x**3 for x in at - 300.15]
    assert law.ratio(at) == pytest.approx(twin, rel=1e-12)


def test_polynomial_re_referencing_matches_rational_arithmetic() -> None:
    import sympy

    # exact rational arithmetic by sympy, nothing of it shared with the law
    x, d = sympy.Symbol("x"), sympy.Rational(-20)
    exact = 1 - sympy.Rational(120, 10**6) * x + sympy.Rational(55, 10**8) * x**2
    shifted = sympy.Poly(sympy.expand(exact.subs(x, x + d) / exact.subs(x, d)), x)
    moved = Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6)).referred_to(280.15)
    expected = [float(c) for c in reversed(shifted.all_coeffs())][1:]
    assert moved.coefficients == pytest.approx(expected, rel=1e-12)


def test_referring_a_polynomial_to_its_own_reference_changes_nothing() -> None:
    law = Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6))
    assert law.referred_to(300.15) is law


@pytest.mark.parametrize("coefficients", [(), (1e-6,) * 9, (math.nan,), (1e-6, math.inf)])
def test_polynomials_with_wrong_coefficients_are_refused(coefficients: tuple[float, ...]) -> None:
    with pytest.raises(InputError):
        Polynomial(reference=ROOM, coefficients=coefficients)


def test_a_reference_where_the_law_is_below_zero_is_refused() -> None:
    with pytest.raises(InputError, match="above zero at its reference"):
        Polynomial(reference=293.15, coefficients=(0.004,)).referred_to(20.0)


def test_chords_need_the_reference_between_them() -> None:
    with pytest.raises(InputError, match="cold below the reference"):
        from_chords(ROOM, 308.15, 1e-6, 398.15, 1e-6)


def test_chord_of_no_length_is_the_slope() -> None:
    law = Thermistor(reference=ROOM, beta=3435.0)
    assert chord_tcr(law, 310.0, 310.0) == pytest.approx(-3435.0 / 310.0**2, rel=1e-12)
    assert chord_tcr(law, 310.0 + 1e-4, 310.0) == pytest.approx(-3435.0 / 310.0**2, rel=1e-5)


def test_small_chords_of_polynomials_keep_their_digits() -> None:
    law = Polynomial(reference=ROOM, coefficients=(1e-12, 0.0))
    assert chord_tcr(law, 299.15, ROOM) == pytest.approx(1e-12, rel=1e-14)


# ---- platinum, thermistors


def test_platinum_breaks_at_zero_celsius_in_the_third_derivative_only() -> None:
    law = Platinum(reference=ROOM)
    assert law.breakpoints == (ZERO,)
    below, above = law.taylor(math.nextafter(ZERO, 0.0), 3), law.taylor(ZERO, 3)
    assert below[:2] == pytest.approx(above[:2], rel=1e-9)
    assert above[2] == 0.0
    assert below[2] == pytest.approx(4.183e-10, rel=1e-6)  # -100 C of IEC 60751


def test_platinum_out_of_reach_of_its_law_is_refused() -> None:
    with pytest.raises(InputError, match="-200 to 850"):
        Platinum(reference=8000.0)


@pytest.mark.parametrize("beta", [0.0, -3435.0, math.nan])
def test_thermistors_need_a_positive_b(beta: float) -> None:
    with pytest.raises(InputError, match="beta"):
        Thermistor(reference=ROOM, beta=beta)


@pytest.mark.parametrize("change", [{"c": 0.0}, {"c": -1e-7}, {"b": 0.0}, {"b": -1e-4}, {"a": math.nan}])
def test_steinhart_hart_needs_constants_above_zero(change: dict[str, float]) -> None:
    with pytest.raises(InputError, match=next(iter(change))):
        SteinhartHart(**{"reference": ROOM, "a": 2e-3, "b": 8e-5, "c": 6e-7, **change})


@pytest.mark.parametrize("change", [{"b": 1.7e308}, {"c": 5e-324}, {"a": -1e3}, {"b": 5e-324}])
def test_steinhart_hart_constants_without_a_resistance_are_refused(change: dict[str, float]) -> None:
    with pytest.raises(InputError, match="no resistance at 25 degC"):
        SteinhartHart(**{"reference": ROOM, "a": 2e-3, "b": 8e-5, "c": 6e-7, **change})


@pytest.mark.parametrize("c", [1e-13, 1e-9, 6.5e-7])
def test_steinhart_hart_solves_its_own_equation(c: float) -> None:
    law = SteinhartHart(reference=ROOM, a=1.1e-3, b=2.4e-4, c=c)
    for temperature in (230.0, 300.0, 400.0):
        log = math.log(float(law.ohms(temperature)))
        assert law.a + law.b * log + law.c * log**3 == pytest.approx(1.0 / temperature, rel=1e-12)
        slope = -1.0 / (temperature**2 * (law.b + 3.0 * law.c * log**2))  # by implicit differentiation
        assert float(law.slope(temperature)) == pytest.approx(slope, rel=1e-8)


@pytest.mark.parametrize(
    "points",
    [
        (),
        ((278.15, 25e3), (298.15, 10e3)),
        ((298.15, 10e3), (278.15, 25e3), (318.15, 4e3)),
        ((278.15, 25e3), (298.15, 10e3), (318.15, 12e3)),
        ((278.15, 25e3), (298.15, 10e3), (318.15, -4e3)),
        ((278.15, 25e3), (298.15, 10e3), (318.15, 9.9e3)),
    ],
)
def test_steinhart_hart_refuses_points_it_cannot_pass(points: tuple[tuple[float, float], ...]) -> None:
    with pytest.raises(InputError):
        steinhart_hart_from_points(points, ROOM)


# ---- table


@pytest.mark.parametrize("count", [3, 4, 5])
def test_tables_are_the_not_a_knot_spline_of_scipy(count: int) -> None:
    from scipy.interpolate import CubicSpline

    points = POINTS[:count]
    law = Table(reference=273.15, points=points)
    spline = CubicSpline([t for t, _ in points], np.log([r for _, r in points]), bc_type="not-a-knot")
    at = np.linspace(points[0][0], points[-1][0], 41)
    assert law.ratio(at) == pytest.approx(np.exp(spline(at) - spline(273.15)), rel=1e-12)
    assert law.slope(at) == pytest.approx(spline(at, 1), rel=1e-9, abs=1e-15)
    tc1, tc2 = law.taylor(points[-1][0], 2)
    curvature = float(spline(points[-1][0], 2))
    assert tc2 == pytest.approx(0.5 * (curvature + tc1**2), rel=1e-9)


def test_tables_pass_through_their_points_and_go_on_straight() -> None:
    law = Table(reference=ROOM, points=POINTS)
    assert law.ratio(np.array([t for t, _ in POINTS])) == pytest.approx([r for _, r in POINTS], rel=1e-14)
    assert law.breakpoints == tuple(t for t, _ in POINTS)
    for end, step in ((233.15, -10.0), (398.15, 10.0)):
        expected = law.ratio(end) * math.exp(float(law.slope(end)) * step)
        assert float(law.ratio(end + step)) == pytest.approx(float(expected), rel=1e-12)


def test_table_error_is_on_the_safe_side_for_a_smooth_law() -> None:
    # the law behind the table is known here: the B formula of IEC 60539-1
    behind = Thermistor(reference=ROOM, beta=3435.0)
    knots = np.linspace(233.15, 398.15, 12)
    law = Table(reference=ROOM, points=tuple((float(t), float(behind.ratio(t))) for t in knots))
    at = np.linspace(233.15, 398.15, 997)
    true_error = float(np.max(np.abs(law.ratio(at) / law.ratio(ROOM) / behind.ratio(at) - 1.0)))
    assert true_error < law.interpolation_error() < 0.05


def test_table_error_without_the_middle_of_three_points() -> None:
    law = Table(reference=300.0, points=((200.0, 1.0), (300.0, 2.0), (400.0, 1.0)))
    assert law.interpolation_error() == pytest.approx(0.5, rel=1e-14)  # a straight line says 1 instead of 2


@pytest.mark.parametrize(
    ("points", "reference", "match"),
    [
        (POINTS[:2], 240.0, "3 to 200 points"),
        (tuple((200.0 + t, 1.0) for t in range(201)), 250.0, "3 to 200 points"),
        ((*POINTS[:3], POINTS[2]), ROOM, "point 4: .*above that of the point before"),
        (((250.0, 1.0), (300.0, 0.0), (350.0, -1.0)), 300.0, "(?s)point 2: .*above zero.*point 3"),
        (((250.0, 1.0), (300.0, math.nan), (350.0, 1.0)), 300.0, "point 2"),
        (POINTS, 500.0, "inside the table, -40 to 125 degC"),
    ],
)
def test_wrong_tables_are_refused(
    points: tuple[tuple[float, float], ...], reference: float, match: str
) -> None:
    with pytest.raises(InputError, match=match):
        Table(reference=reference, points=points)


# ---- expression


def test_expression_equals_the_law_it_states() -> None:
    formula = Expression(reference=ROOM, text="exp(B*(1/T - 1/T0))", constants=(("B", 3435.0),))
    thermistor = Thermistor(reference=ROOM, beta=3435.0)
    at = np.linspace(233.15, 398.15, 9)
    assert formula.ratio(at) == pytest.approx(thermistor.ratio(at), rel=1e-14)
    assert formula.slope(at) == pytest.approx(thermistor.slope(at), rel=1e-12)
    assert formula.taylor(310.0, 4) == pytest.approx(thermistor.taylor(310.0, 4), rel=1e-12)


def test_t0_stays_when_an_expression_is_referred_to_another_temperature() -> None:
    formula = Expression(reference=293.15, text="1 + a*(T - T0)", constants=(("a", 0.00393),))
    copper = Polynomial(reference=293.15, coefficients=(0.00393,))
    moved, expected = formula.referred_to(ROOM), copper.referred_to(ROOM)
    assert float(moved.ratio(398.15)) == pytest.approx(float(expected.ratio(398.15)), rel=1e-14)
    assert law_from_parameters(moved.parameters()) == moved


def test_a_constant_formula_is_a_flat_law() -> None:
    law = Expression(reference=ROOM, text="2")
    at = np.array([250.0, 350.0])
    assert list(law.ratio(at)) == [1.0, 1.0]
    assert list(law.slope(at)) == [0.0, 0.0]
    assert law.taylor(300.0, 2) == (0.0, 0.0)


@pytest.mark.parametrize(
    ("text", "constants", "match"),
    [
        ("1 + a*T", (), "the name 'a'"),
        ("1 + a*T", (("a", 1.0), ("alpha", 2.0)), "alpha, which .* does not use"),
        ("1 + T", (("T", 1.0),), "a constant named T"),
        ("1 + T0", (("T0", 1.0),), "a constant named T0"),
        ("1 + T", (("exp", 1.0),), "the name 'exp'"),
        ("1 + a*T", (("a", 1.0), ("a", 2.0)), "each name once"),
        ("T - T0", (), "above zero at the reference"),
        ("log(T - 300)", (), "above zero at the reference"),
        ("T0 - 2*T", (), "above zero at the reference"),
        ("a*T", (("a", 0.0),), "above zero at the reference"),
        ("T**n", (("n", 40.0),), "a power of 40"),
        ("T.real", (), "'.real'"),
    ],
)
def test_wrong_expressions_are_refused(
    text: str, constants: tuple[tuple[str, float], ...], match: str
) -> None:
    with pytest.raises(ExpressionError, match=match):
        Expression(reference=ROOM, text=text, constants=constants)


def test_a_constant_that_is_not_finite_is_refused() -> None:
    with pytest.raises(InputError, match="a finite number"):
        Expression(reference=ROOM, text="1 + a*T", constants=(("a", math.nan),))


# ---- plain data


def test_polynomial_data_has_the_units_in_its_names() -> None:
    law = Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6, 0.0))
    assert law.parameters() == {
        "law": "polynomial",
        "reference_degC": 27.0,
        "tc1_ppm_per_K": -120.0,
        "tc2_ppm_per_K2": 0.55,
        "tc3_ppm_per_K3": 0.0,
    }


@pytest.mark.parametrize("law", every_kind(), ids=by_kind)
def test_plain_data_survives_json(law: Law) -> None:
    import json

    assert law_from_parameters(json.loads(json.dumps(law.parameters()))) == law


def test_expression_data_may_leave_out_what_has_a_default() -> None:
    law = law_from_parameters({"law": "expression", "reference_degC": 25.0, "text": "T/T0"})
    assert law == Expression(reference=ROOM, text="T/T0", origin=ROOM)


@pytest.mark.parametrize(
    ("data", "match"),
    [
        ({}, "one of polynomial, platinum"),
        ({"law": "platinium", "reference_degC": 0.0}, "Did you mean platinum"),
        ({"law": ["platinum"]}, "one of"),
        ({"law": "platinum"}, "reference_degC: found nothing"),
        ({"law": "platinum", "reference_degC": "25"}, "a number"),
        ({"law": "platinum", "reference_degC": True}, "a number"),
        (
            {"law": "thermistor", "reference_degC": 25.0, "beta_k": 1.0},
            "(?s)Did you mean beta_K.*found nothing",
        ),
        (
            {"law": "polynomial", "reference_degC": 25.0, "tc1_ppm_per_K": 1, "tc3_ppm_per_K3": 1},
            "tc2_ppm_per_K2",
        ),
        ({"law": "polynomial", "reference_degC": 25.0}, "tc1_ppm_per_K: found nothing"),
        ({"law": "table", "reference_degC": 25.0, "points_degC": [[1, 2], [3]]}, "pairs of numbers"),
        ({"law": "table", "reference_degC": 25.0, "points_degC": 7}, "pairs of numbers"),
        ({"law": "expression", "reference_degC": 25.0, "text": 3}, "a formula, as text"),
        (
            {"law": "expression", "reference_degC": 25.0, "text": "a", "law_parameters": [1]},
            "names with numbers",
        ),
        (
            {"law": "expression", "reference_degC": 25.0, "text": "a", "law_parameters": {"a": "1"}},
            "a number",
        ),
    ],
)
def test_wrong_plain_data_is_refused(data: dict[str, object], match: str) -> None:
    with pytest.raises(InputError, match=match):
        law_from_parameters(data)


# ---- text


def test_polynomial_text_is_a_formula_in_ppm() -> None:
    law = Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6))
    assert law_text(law) == "1 - 120e-6*(T - 300.15) + 0.55e-6*(T - 300.15)^2"
    assert law_latex(law) == (
        r"1 - 120 \cdot 10^{-6}\, \left(T - 300.15\right) + 0.55 \cdot 10^{-6}\, \left(T - 300.15\right)^{2}"
    )


@pytest.mark.parametrize(
    "law",
    [
        Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6, 0.0, 2.805e-11)),
        Polynomial(reference=300.15, coefficients=(0.0,)),
        Thermistor(reference=ROOM, beta=3435.0),
    ],
)
def test_text_read_as_a_formula_is_the_law(law: Law) -> None:
    tree = parse_expression(law_text(law), ("T",))
    at = np.linspace(233.15, 398.15, 5)
    assert tree.numpy({"T": at}) + 0.0 * at == pytest.approx(law.ratio(at), rel=1e-6)


@pytest.mark.parametrize("law", every_kind(), ids=by_kind)
def test_latex_is_balanced_and_can_be_drawn(law: Law) -> None:
    from matplotlib.mathtext import MathTextParser

    latex = law_latex(law)
    assert latex.count("{") == latex.count("}")
    assert MathTextParser("path").parse(f"${latex}$").width > 0


def test_text_of_the_other_laws_says_what_they_are() -> None:
    text = {law.kind: law_text(law) for law in every_kind()}
    assert "IEC 60751" in text["platinum"]
    assert "(ln R)^3" in text["steinhart-hart"]
    assert text["table"] == "cubic spline of ln R through 5 points from -40 to 125 degC"
    assert text["expression"] == "exp(B*(1/T - 1/T0)), B = 3435, T0 = 298.15"
    scaled = Expression(reference=ROOM, text="T^2")
    assert law_text(scaled) == "T^2, divided by its value at T = 298.15"


def test_symbol_is_a_positive_temperature() -> None:
    symbol = temperature_symbol()
    assert symbol.name == "T"
    assert symbol.is_positive
    assert Polynomial(reference=ROOM, coefficients=(1e-3,)).symbolic().free_symbols == {symbol}


# ---- ranges


@pytest.mark.parametrize("law", every_kind(), ids=by_kind)
def test_sound_laws_pass_the_check(law: Law) -> None:
    check_positive(law, 233.15, 398.15, "material.x")


@pytest.mark.parametrize(
    ("law", "where"),
    [
        (Polynomial(reference=293.15, coefficients=(0.01,)), "-80 degC"),
        (Polynomial(reference=293.15, coefficients=(-0.01,)), "120 degC"),
        # touches zero only inside, between any nodes of a grid: 1 - 2 y^2 + y^4, y = x/40
        (Polynomial(reference=293.15, coefficients=(0.0, -2.0000001 / 1600.0, 0.0, 1.0 / 40.0**4)), "-19.9"),
        (Expression(reference=ROOM, text="(T - 340)^2 - 1e-9"), "66.85 degC"),
        (Expression(reference=ROOM, text="1 - 1.001*exp(-(T - 340.03)^2*25)"), "66.8"),
    ],
)
def test_laws_that_reach_zero_are_refused_where_they_do(law: Law, where: str) -> None:
    with pytest.raises(InputError) as caught:
        check_positive(law, 173.15, 423.15, "material.x")
    (problem,) = caught.value.problems
    assert problem.where == "material.x"
    assert f"reaches zero at {where}" in problem.found


@pytest.mark.parametrize("coefficients", [(1e308, -1e308, 1e308), (0.001, 1e-320), (1e-3, 1e-6, -1e300)])
def test_coefficients_at_the_ends_of_floats_are_answered(coefficients: tuple[float, ...]) -> None:
    law = Polynomial(reference=ROOM, coefficients=coefficients)
    if max(map(abs, coefficients)) < 1.0:
        check_positive(law, 173.15, 423.15, "material.x")
    else:
        with pytest.raises(InputError, match="found a law that reaches"):
            check_positive(law, 173.15, 423.15, "material.x")


def test_laws_without_a_value_are_refused_where_they_lose_it() -> None:
    law = Expression(reference=ROOM, text="1 + sqrt(T - 250)")
    with pytest.raises(InputError, match=r"not finite at -23\.15 degC"):
        check_positive(law, 233.15, 398.15, "material.x")


def test_importing_and_using_laws_loads_no_heavy_library() -> None:
    code = (
        "import sys; from tcplan.material.law import *; "
        "laws = (Polynomial(reference=300., coefficients=(1e-3,)), Platinum(reference=300.), "
        "Expression(reference=300., text='T/T0')); "
        "[(law.ratio(310.), law.slope(310.), law.taylor(310., 3), law_text(law)) for law in laws]; "
        "sys.exit(any(name in sys.modules for name in ('sympy', 'scipy', 'matplotlib', 'pint')))"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
