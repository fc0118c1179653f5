"""A law as a line of text and as LaTeX, rounded for reading; temperatures in kelvin."""

from __future__ import annotations

from typing import Any

from tcplan.material.law_base import Law, to_degC
from tcplan.material.law_expression import Expression
from tcplan.material.law_table import Table
from tcplan.material.laws_physical import (
    PLATINUM_A,
    PLATINUM_B,
    PLATINUM_C,
    Platinum,
    SteinhartHart,
    Thermistor,
)
from tcplan.material.polynomial import Polynomial
from tcplan.units import ZERO_CELSIUS

_DIGITS = 6


def law_text(law: Law) -> str:
    """Return R(T)/R(reference) as one line of text; of polynomials and thermistors a formula in itself."""
    match law:
        case Polynomial():
            return _polynomial_text(law)
        case Platinum():
            return _platinum_text(law)
        case Thermistor():
            return f"exp({_short(law.beta)}*(1/T - 1/{_short(law.reference)}))"
        case SteinhartHart():
            inverse = f"{_short(law.a)} + {_short(law.b)}*ln R + {_short(law.c)}*(ln R)^3"
            return f"R(T)/R({_short(law.reference)}), where 1/T = {inverse}"
        case Table():
            return _table_text(law)
        case Expression():
            return _expression_text(law)
    raise TypeError(f"not a law: {law!r}")


def law_latex(law: Law) -> str:
    """Return R(T)/R(reference) as LaTeX for math mode; of a table, what its curve is."""
    match law:
        case Polynomial():
            return _polynomial_latex(law)
        case Thermistor():
            change = rf"\frac{{1}}{{T}} - \frac{{1}}{{{_short(law.reference)}}}"
            return rf"\exp\left[{_short(law.beta)}\left({change}\right)\right]"
        case Platinum():
            return _platinum_latex(law)
        case Expression():
            return _expression_latex(law)
        case Table():
            return rf"\exp\left[s(T) - s({_short(law.reference)})\right]"
        case _:
            return _rounded_latex(law.symbolic())


def _short(value: float) -> str:
    return f"{value:.{_DIGITS}g}"


def _terms(law: Polynomial) -> list[tuple[str, float, int]]:
    """Return (sign, size, power) of each term that is not zero."""
    numbered = enumerate(law.coefficients, start=1)
    return [("-" if c < 0.0 else "+", abs(c), n) for n, c in numbered if c]


def _in_ppm(size: float) -> bool:
    """Tell whether a coefficient reads well in millionths; films and alloys have 1e-10 to 1e-2."""
    return 1e-10 <= size < 1.0


def _polynomial_text(law: Polynomial) -> str:
    x = f"(T - {_short(law.reference)})"
    parts = ["1"]
    for sign, size, power in _terms(law):
        number = f"{_short(size * 1e6)}e-6" if _in_ppm(size) else _short(size)
        parts.append(f"{sign} {number}*{x}{f'^{power}' if power > 1 else ''}")
    return " ".join(parts)


def _polynomial_latex(law: Polynomial) -> str:
    x = rf"\left(T - {_short(law.reference)}\right)"
    parts = ["1"]
    for sign, size, power in _terms(law):
        number = rf"{_short(size * 1e6)} \cdot 10^{{-6}}" if _in_ppm(size) else _latex_number(size)
        parts.append(rf"{sign} {number}\, {x}{f'^{{{power}}}' if power > 1 else ''}")
    return " ".join(parts)


def _latex_number(size: float) -> str:
    mantissa, _, exponent = _short(size).partition("e")
    return rf"{mantissa} \cdot 10^{{{int(exponent)}}}" if exponent else mantissa


def _platinum_text(law: Platinum) -> str:
    warm = f"1 + {PLATINUM_A:g}*t - {-PLATINUM_B:g}*t^2"
    cold = f"- {-PLATINUM_C:g}*(t - 100)*t^3 below 0 degC"
    at = to_degC(law.reference)
    scale = "" if at == 0.0 else f", divided by its value at t = {at:g}"
    return f"{warm} ({cold}), t = T - 273.15{scale} (IEC 60751)"


def _table_text(law: Table) -> str:
    low, high = (f"{to_degC(t):g}" for t in (law.points[0][0], law.points[-1][0]))
    return f"cubic spline of ln R through {len(law.points)} points from {low} to {high} degC"


def _expression_text(law: Expression) -> str:
    values = [*law.constants, ("T0", law.origin or law.reference)]
    used = [f"{name} = {_short(value)}" for name, value in values if name in law.names]
    scale = "" if law.is_ratio else f", divided by its value at T = {_short(law.reference)}"
    return f"{' '.join(law.text.split())}{', ' if used else ''}{', '.join(used)}{scale}"


def _platinum_latex(law: Platinum) -> str:
    warm = rf"1 + {PLATINUM_A * 1e3:g} \cdot 10^{{-3}}\, t - {-PLATINUM_B * 1e7:g} \cdot 10^{{-7}}\, t^{{2}}"
    cold = rf"{-PLATINUM_C * 1e12:g} \cdot 10^{{-12}}\, (t - 100)\, t^{{3}}"
    formula = rf"{warm} - \left[{cold}\right]_{{t < 0}}"
    scale = float(Platinum(reference=ZERO_CELSIUS).ratio(law.reference))
    ratio = formula if scale == 1.0 else rf"\frac{{{formula}}}{{{_short(scale)}}}"
    return rf"{ratio},\; t = T - {ZERO_CELSIUS}"


def _expression_latex(law: Expression) -> str:
    """Return the formula as it was stated, in its names, and then their values."""
    import sympy

    names = {name: sympy.Symbol(name, positive=True) for name in law.names}
    formula = _rounded_latex(law.tree.sympy(names))
    if not law.is_ratio:
        formula = rf"\frac{{{formula}}}{{{_latex_number(law.scale)}}}"
    values = [*law.constants, ("T0", law.origin or law.reference)]
    used = [
        rf"{sympy.latex(names[name])} = {_latex_number(value)}" for name, value in values if name in names
    ]
    return r",\; ".join((formula, *used))


def _rounded_latex(formula: Any) -> str:
    import sympy

    rounded = {number: sympy.Float(_short(float(number)), _DIGITS) for number in formula.atoms(sympy.Float)}
    return str(sympy.latex(formula.xreplace(rounded), mul_symbol="dot"))
