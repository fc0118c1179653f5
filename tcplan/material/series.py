"""Truncated power series: exact derivatives of any order by arithmetic, for whole temperature arrays at once.

A series is the tuple of its coefficients (c0, c1, .. cn) about a centre; each is an array over centres.
The recurrences are the textbook ones of automatic differentiation (Griewank and Walther, "Evaluating
Derivatives", chapter on Taylor coefficients): each function is written as the differential equation it obeys.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import TypeAlias

import numpy as np

from tcplan.arrays import FloatArray

Series: TypeAlias = tuple[FloatArray, ...]

_ZERO: FloatArray = np.zeros(())


def constant(value: FloatArray | float, order: int) -> Series:
    """Return the series of a constant."""
    return (np.asarray(value, dtype=np.float64), *(_ZERO,) * order)


def variable(centre: FloatArray | float, order: int) -> Series:
    """Return the series of the variable itself about ``centre``; ``order`` is 1 or more."""
    return (np.asarray(centre, dtype=np.float64), np.ones(()), *(_ZERO,) * (order - 1))


def add(a: Series, b: Series) -> Series:
    """Return a + b."""
    return tuple(p + q for p, q in zip(a, b, strict=True))


def subtract(a: Series, b: Series) -> Series:
    """Return a - b."""
    return tuple(p - q for p, q in zip(a, b, strict=True))


def scale(a: Series, factor: FloatArray | float) -> Series:
    """Return factor * a."""
    return tuple(factor * p for p in a)


def negative(a: Series) -> Series:
    """Return -a."""
    return tuple(-p for p in a)


def multiply(a: Series, b: Series) -> Series:
    """Return a * b."""
    return tuple(_total(a[j] * b[k - j] for j in range(k + 1)) for k in range(len(a)))


def divide(a: Series, b: Series) -> Series:
    """Return a / b."""
    quotient: list[FloatArray] = []
    for k in range(len(a)):
        known = _total(b[j] * quotient[k - j] for j in range(1, k + 1))
        quotient.append((a[k] - known) / b[0])
    return tuple(quotient)


def power(a: Series, exponent: float) -> Series:
    """Return a ** exponent for a constant exponent; whole exponents also where a is zero or negative."""
    if float(exponent).is_integer():
        return _whole_power(a, int(exponent))
    result = [np.power(a[0], exponent)]
    for k in range(1, len(a)):
        terms = _total((exponent * j - (k - j)) * a[j] * result[k - j] for j in range(1, k + 1))
        result.append(terms / (k * a[0]))
    return tuple(result)


def general_power(a: Series, b: Series) -> Series:
    """Return a ** b = exp(b ln a) for an exponent that varies; not a number where a is not positive."""
    return exp(multiply(b, log(a)))


def exp(a: Series) -> Series:
    """Return exp(a), from y' = y a'."""
    result = [np.exp(a[0])]
    for k in range(1, len(a)):
        result.append(_chain(a, result, k))
    return tuple(result)


def log(a: Series) -> Series:
    """Return ln(a), from y' = a' / a."""
    return _integral(np.log(a[0]), divide(_derivative(a), a[:-1]))


def sqrt(a: Series) -> Series:
    """Return the square root of a."""
    return power(a, 0.5)


def sin(a: Series) -> Series:
    """Return sin(a)."""
    return _pair(a, np.sin(a[0]), np.cos(a[0]), -1.0)[0]


def cos(a: Series) -> Series:
    """Return cos(a)."""
    return _pair(a, np.sin(a[0]), np.cos(a[0]), -1.0)[1]


def sinh(a: Series) -> Series:
    """Return sinh(a)."""
    return _pair(a, np.sinh(a[0]), np.cosh(a[0]), 1.0)[0]


def cosh(a: Series) -> Series:
    """Return cosh(a)."""
    return _pair(a, np.sinh(a[0]), np.cosh(a[0]), 1.0)[1]


def tan(a: Series) -> Series:
    """Return tan(a), from y' = (1 + y^2) a'."""
    return _riccati(a, np.tan(a[0]), 1.0)


def tanh(a: Series) -> Series:
    """Return tanh(a), from y' = (1 - y^2) a'."""
    return _riccati(a, np.tanh(a[0]), -1.0)


def atan(a: Series) -> Series:
    """Return atan(a), from y' = a' / (1 + a^2)."""
    square = multiply(a, a)
    return _integral(np.arctan(a[0]), divide(_derivative(a), _plus_one(square)[:-1]))


def asinh(a: Series) -> Series:
    """Return asinh(a), from y' = a' / sqrt(1 + a^2)."""
    square = multiply(a, a)
    return _integral(np.arcsinh(a[0]), divide(_derivative(a), sqrt(_plus_one(square))[:-1]))


def log10(a: Series) -> Series:
    """Return the decimal logarithm of a."""
    return scale(log(a), 1.0 / np.log(10.0))


FUNCTIONS: dict[str, Callable[[Series], Series]] = {
    "exp": exp,
    "log": log,
    "ln": log,
    "log10": log10,
    "sqrt": sqrt,
    "sin": sin,
    "cos": cos,
    "tan": tan,
    "atan": atan,
    "sinh": sinh,
    "cosh": cosh,
    "tanh": tanh,
}


def _total(terms: Iterable[FloatArray]) -> FloatArray:
    total = _ZERO
    for term in terms:
        total = total + term
    return total


def _chain(a: Series, outer: list[FloatArray], k: int) -> FloatArray:
    """Return coefficient k of the integral of outer * a'."""
    return _total(j * a[j] * outer[k - j] for j in range(1, k + 1)) / k


def _derivative(a: Series) -> Series:
    return tuple(k * a[k] for k in range(1, len(a)))


def _integral(first: FloatArray, derivative: Series) -> Series:
    return (first, *(c / (k + 1) for k, c in enumerate(derivative)))


def _plus_one(a: Series) -> Series:
    return (1.0 + a[0], *a[1:])


def _pair(a: Series, first: FloatArray, second: FloatArray, sign: float) -> tuple[Series, Series]:
    """Return y and z with y' = z a' and z' = sign y a'."""
    y, z = [first], [second]
    for k in range(1, len(a)):
        # both from the coefficients below k, so neither may be appended before the other is formed
        new_y, new_z = _chain(a, z, k), sign * _chain(a, y, k)
        y.append(new_y)
        z.append(new_z)
    return tuple(y), tuple(z)


def _riccati(a: Series, first: FloatArray, sign: float) -> Series:
    """Return y with y' = (1 + sign y^2) a'."""
    y: list[FloatArray] = [first]
    outer: list[FloatArray] = []
    for k in range(1, len(a)):
        square = _total(y[j] * y[k - 1 - j] for j in range(k))
        outer.append(sign * square + (1.0 if k == 1 else 0.0))
        y.append(_chain(a, outer, k))
    return tuple(y)


def _whole_power(a: Series, exponent: int) -> Series:
    result = constant(1.0, len(a) - 1)
    for _ in range(abs(exponent)):
        result = multiply(result, a)
    return divide(constant(1.0, len(a) - 1), result) if exponent < 0 else result
