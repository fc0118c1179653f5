"""Formulas from text: what is read, what is refused, and that nothing hangs or runs."""

from __future__ import annotations

import math
import time

import numpy as np
import pytest

from tcplan.errors import ExpressionError
from tcplan.material.expression import FUNCTIONS, MAX_LENGTH, parse_expression

NAMES = ("T", "T0", "B")


def value(text: str, **values: float) -> float:
    return float(parse_expression(text, tuple(values)).numpy(values))


@pytest.mark.parametrize(
    ("text", "expected"),
    # the usual rules of arithmetic; Python's own operators give the same
    [
        ("1 + 2*3", 7.0),
        ("(1 + 2)*3", 9.0),
        ("8 - 4 - 2", 2.0),
        ("8/4/2", 1.0),
        ("-3^2", -9.0),
        ("2**3**2", 512.0),
        ("2^-1", 0.5),
        ("2**-2**2", 2.0**-4),
        ("--3", 3.0),
        ("+3 - -2", 5.0),
        ("2*-3", -6.0),
        (".5e1 + 5.", 10.0),
        ("1E-3", 1e-3),
        (" ( ( 4 ) )\n", 4.0),
        ("pi", math.pi),
        ("sqrt(16)", 4.0),
        ("log(exp(2))", 2.0),
        ("ln(exp(2)) + log10(1000)", 5.0),
    ],
)
def test_constants_follow_the_rules_of_arithmetic(text: str, expected: float) -> None:
    assert value(text) == pytest.approx(expected, rel=1e-15)


@pytest.mark.parametrize(
    "text",
    [
        "a - b - c*a/b/c",
        "-a**2*b + a^-c",
        "a*(b + c)**3/(a - 3*b)",
        "2**(a*b)",
        "a**b**0.5",
        "-(a - (b - (c - 1)))",
    ],
)
def test_names_follow_the_rules_of_arithmetic(text: str) -> None:
    import sympy

    # sympy's own symbols are combined by Python's operators: the reading of the text is not shared
    a, b, c = sympy.symbols("a b c", positive=True)
    by_hand = {
        "a - b - c*a/b/c": a - b - c * a / b / c,
        "-a**2*b + a^-c": -(a**2) * b + a**-c,
        "a*(b + c)**3/(a - 3*b)": a * (b + c) ** 3 / (a - 3 * b),
        "2**(a*b)": 2 ** (a * b),
        "a**b**0.5": a ** (b**0.5),
        "-(a - (b - (c - 1)))": -(a - (b - (c - 1))),
    }
    values = {"a": 1.7, "b": 0.4, "c": 2.3}
    tree = parse_expression(text, ("a", "b", "c"))
    expected = float(by_hand[text].subs({a: 1.7, b: 0.4, c: 2.3}))
    assert float(tree.numpy(values)) == pytest.approx(expected, rel=1e-14)
    symbolic = tree.sympy({"a": a, "b": b, "c": c})
    assert float(symbolic.subs({a: 1.7, b: 0.4, c: 2.3})) == pytest.approx(expected, rel=1e-14)
    with_numbers = tree.sympy({"a": a, "b": 0.4, "c": 2.3})
    assert with_numbers.free_symbols == {a}
    assert float(with_numbers.subs({a: 1.7})) == pytest.approx(expected, rel=1e-14)


@pytest.mark.parametrize("name", sorted(FUNCTIONS))
def test_every_function_is_that_of_the_mathematics_library(name: str) -> None:
    twin = {"ln": math.log}.get(name) or getattr(math, name)
    at = 1.234
    tree = parse_expression(f"{name}(x)", ("x",))
    assert float(tree.numpy({"x": at})) == pytest.approx(twin(at), rel=1e-15)
    import sympy

    x = sympy.Symbol("x", positive=True)
    assert float(tree.sympy({"x": x}).subs(x, at)) == pytest.approx(twin(at), rel=1e-14)


@pytest.mark.parametrize("name", sorted(FUNCTIONS))
def test_series_of_every_function_are_its_derivatives(name: str) -> None:
    import sympy

    from tcplan.material.series import variable

    x = sympy.Symbol("x", positive=True)
    tree = parse_expression(f"{name}(x^2/3)", ("x",))
    exact = getattr(sympy, {"ln": "log", "log10": "log"}.get(name, name))(x**2 / 3)
    exact = exact / sympy.log(10) if name == "log10" else exact
    series = tree.series({"x": variable(1.1, 4)})
    for order, coefficient in enumerate(series):
        derivative = sympy.diff(exact, x, order).subs(x, sympy.Rational(11, 10)).evalf(30)
        assert float(coefficient) == pytest.approx(float(derivative) / math.factorial(order), rel=1e-11)


def test_arrays_are_broadcast() -> None:
    tree = parse_expression("a*T", ("a", "T"))
    assert tree.numpy({"a": np.ones((2, 1)), "T": np.arange(3.0)}).shape == (2, 3)


def test_trees_can_be_compared_and_hashed() -> None:
    assert parse_expression("T+1", ("T",)) == parse_expression("T+1", ("T",))
    assert len({parse_expression("T+1", ("T",)), parse_expression("T+1", ("T",))}) == 1
    assert parse_expression("T + T0*2", NAMES).names == {"T", "T0"}


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("__import__('os')", "at character 12"),
        ("T.__class__", "'.__class__'"),
        ("().__class__", "'.__class__'"),
        ("eval(T)", "the function 'eval'"),
        ("T[0]", "'[0]'"),
        ("T < T0", "'< T0'"),
        ("T == T0", "'== T0'"),
        ("lambda: T", "': T'"),
        ("T if B else 0", "'if B else 0'"),
        ("f'{T}'", "{T}"),
        ('"T"', '"T"'),
        ("[T for T in B]", "'[T for T in B]'"),
        ("exp(T, B)", "', B)'"),
        ("exp(x=T)", "'=T)'"),
        ("T; B", "'; B'"),
        ("T := 2", "':= 2'"),
        ("T % 2", "'% 2'"),
        ("T // 2", "'/ 2'"),
        ("T @ B", "'@ B'"),
        ("~T", "'~T'"),
        ("T & B", "'& B'"),
        ("1j", "'j'"),
        ("0x10", "'x10'"),
        ("1_000", "'_000'"),
        ("2T", "'T'"),
        ("T T0", "'T0'"),
        ("(T)(T0)", "'(T0)'"),
        ("T(2)", "'(2)'"),
        ("exp", "'exp'"),
        ("exp + 1", "'exp + 1'"),
        ("exp()", "')'"),
        ("(T", "the end of '(T'"),
        ("T)", "')'"),
        ("T +", "the end of 'T +'"),
        ("* T", "'* T'"),
        ("()", "')'"),
        ("", "no formula"),
        ("   ", "no formula"),
        ("T − 1", "− 1"),
        ("T²", "²"),
        ("٣*T", "٣"),
        ("1e999*T", "'1e999*T'"),
        ("nan", "the name 'nan'"),
        ("abs(T)", "the function 'abs'"),
        ("__dunder__", "the name '__dunder__'"),
        ("1/0", "'1/0', a constant part that gives inf"),
        ("T + 0/0", "'0/0', a constant part that gives nan"),
        ("sqrt(-1)*T", "'sqrt(-1)', a constant part that gives nan"),
        ("exp(1000)", "'exp(1000)', a constant part that gives inf"),
        ("(-8)^(1/3)", "a constant part that gives nan"),
        ("T^21", "'T^21', a power of 21"),
        ("T^-20.5", "a power of -20.5"),
        ("T^9^9^9^9", "a power of"),
        ("9**9**9**9", "a power of"),
        ("((T + T)^20)^20", "nested powers of degree 400"),
    ],
)
def test_everything_else_is_refused_and_quoted(text: str, found: str) -> None:
    with pytest.raises(ExpressionError) as caught:
        parse_expression(text, NAMES, where="materials.toml: law")
    (problem,) = caught.value.problems
    assert found in problem.found
    assert problem.where == "materials.toml: law"
    assert problem.expected


def test_a_refusal_lists_what_is_allowed_and_the_nearest_name() -> None:
    with pytest.raises(ExpressionError) as caught:
        parse_expression("alpa*T", ("T", "alpha"))
    (problem,) = caught.value.problems
    assert problem.todo == "Did you mean alpha?"
    for word in ("alpha", "T", "pi", "**", "^", *FUNCTIONS):
        assert word in problem.expected
    with pytest.raises(ExpressionError, match="Did you mean sqrt"):
        parse_expression("sqr(T)", ("T",))


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("1+" * 400 + "1", "characters"),
        ("(" * 100 + "T" + ")" * 100, "deep"),
        ("-" * 200 + "T", "deep"),
        ("T^" * 100 + "T", "deep"),
        ("exp(" * 80 + "T" + ")" * 80, "deep"),
        ("+".join(["T"] * 100), "nested or chained"),
        ("(" * 499, "deep"),
    ],
)
def test_size_is_limited(text: str, found: str) -> None:
    with pytest.raises(ExpressionError) as caught:
        parse_expression(text, NAMES)
    assert found in str(caught.value)
    assert MAX_LENGTH == 500


def test_a_sum_of_forty_terms_is_fine() -> None:
    assert float(parse_expression("+".join(["T"] * 40), NAMES).numpy({"T": 2.0})) == 80.0


@pytest.mark.parametrize("name", ["exp", "pi", "2a", "a-b", "", "a b", "é"])
def test_names_that_cannot_be_used_are_refused(name: str) -> None:
    with pytest.raises(ExpressionError, match="the name"):
        parse_expression("1", ("T", name))


def test_a_name_given_twice_is_refused() -> None:
    with pytest.raises(ExpressionError, match="each name once"):
        parse_expression("T", ("T", "T"))


def test_binding_keeps_the_limits() -> None:
    tree = parse_expression("T**n", ("T", "n"))
    assert float(tree.bind({"n": 2.0}).numpy({"T": 3.0})) == 9.0
    with pytest.raises(ExpressionError, match="a power of 1e"):
        tree.bind({"n": 1e9})
    with pytest.raises(ExpressionError, match="constant part"):
        parse_expression("T/(a - 1)*exp(1/(a - 1))", ("T", "a")).bind({"a": 1.0})


HARD = [
    # whole numbers and towers as they stand would keep sympy busy for ever, or fill the memory
    "((((T - T + 9)^20)^5)^20)^20",
    "exp(exp(exp(exp(T - T + 100))))",
    "(T + T)^(T/T*1000000000)",
    "((T + T)^(T/T*20))^(T/T*20)",
    "sin((T/T*10)^20)^20*sin(exp(T - T + 700))",
    "((T+T)/T)^20*(((T+T)/T)^20)^20",
    "tan(T/T*1e300)",
    "(T*T*T*T*T)^20*(T+T)^(B*T)",
    "1/(T - T)",
    "exp(T + 1e300)/exp(T)",
]


@pytest.mark.parametrize("text", HARD)
def test_no_formula_keeps_the_program_busy(text: str) -> None:
    import sympy

    symbols = {name: sympy.Symbol(name, positive=True) for name in NAMES}
    start = time.process_time()
    try:
        tree = parse_expression(text, NAMES)
        tree.numpy({"T": 300.0, "T0": 298.15, "B": 1.0})
        tree.sympy(symbols)
    except ExpressionError:
        pass  # refused is as good as answered; only the time counts here
    assert time.process_time() - start < 5.0


def test_no_warning_where_a_formula_has_no_value() -> None:
    # warnings are errors in these tests
    tree = parse_expression("log(T - 300) + 1/(T - 301)", ("T",))
    values = tree.numpy({"T": np.array([299.0, 301.0, 302.0])})
    assert list(np.isfinite(values)) == [False, False, True]
