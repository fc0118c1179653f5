"""What every law of resistance against temperature offers: ratio, slope, series, formula, plain data."""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import TYPE_CHECKING, ClassVar

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.series import Series
from tcplan.units import ZERO_CELSIUS

if TYPE_CHECKING:
    import sympy

_DECIMALS = 9
_LAST_DIGIT = 1e-13


@lru_cache(maxsize=1)
def temperature_symbol() -> sympy.Symbol:
    """Return the symbol T of every law: the temperature [K], positive."""
    import sympy

    return sympy.Symbol("T", positive=True)


@dataclass(frozen=True, slots=True, kw_only=True)
class Law(ABC):
    """A law R(T)/R(reference), hashable and comparable.

    Parameters
    ----------
    reference : float
        The temperature at which the ratio is exactly 1 [K].

    Raises
    ------
    InputError
        When a parameter is not finite or outside what the law allows.
    """

    kind: ClassVar[str]
    reference: float

    @abstractmethod
    def ratio(self, temperature: FloatArray | float) -> FloatArray:
        """Return R(T)/R(reference).

        Parameters
        ----------
        temperature : array or float
            Temperatures [K], any shape.

        Returns
        -------
        array
            The ratio, of the shape of ``temperature``.
        """

    @abstractmethod
    def symbolic(self) -> sympy.Expr:
        """Return R(T)/R(reference) as a formula in `temperature_symbol`."""

    @abstractmethod
    def parameters(self) -> dict[str, object]:
        """Return plain data that states the law in full; `law_from_parameters` is the inverse."""

    @abstractmethod
    def _series(self, temperature: FloatArray | float, order: int) -> Series:
        """Return the Taylor coefficients of R about each temperature, up to a common factor."""

    def slope(self, temperature: FloatArray | float) -> FloatArray:
        """Return the exact slope d ln R/dT [1/K], of the shape of ``temperature`` [K]."""
        at = np.asarray(temperature, dtype=np.float64)
        with np.errstate(all="ignore"):
            series = self._series(at, 1)
            return np.asarray(series[1] / series[0] + np.zeros_like(at))

    def taylor(self, at: float, order: int = 3) -> tuple[float, ...]:
        """Return the exact coefficients (tc1, tc2, ..): R(T)/R(at) = 1 + tc1 x + tc2 x^2 + .., x = T - at.

        At a breakpoint they are those of the branch above it.

        Parameters
        ----------
        at : float
            Centre [K].
        order : int
            How many coefficients.

        Returns
        -------
        tuple of float
            Coefficient n in 1/K^n.
        """
        with np.errstate(all="ignore"):
            series = self._series(float(at), order)
            return tuple(float(coefficient / series[0]) for coefficient in series[1 : order + 1])

    @property
    def breakpoints(self) -> tuple[float, ...]:
        """The temperatures at which the law is not smooth [K], rising."""
        return ()

    def referred_to(self, reference: float) -> Law:
        """Return the same law with its ratio 1 at another temperature [K]."""
        return replace(self, reference=reference)


def finite(value: float, where: str) -> float:
    """Return ``value`` as a float, or raise when it is not a finite number."""
    if isinstance(value, bool) or not math.isfinite(number := float(value)):
        raise InputError(Problem(where=where, found=str(value), expected="a finite number"))
    return number


def above_zero(value: float, where: str, expected: str) -> float:
    """Return ``value`` as a float, or raise when it is not finite and above zero."""
    number = finite(value, where)
    if number <= 0.0:
        raise InputError(Problem(where=where, found=f"{number:g}", expected=expected))
    return number


def checked_reference(reference: float) -> float:
    """Return a reference temperature [K] as a float, or raise when it is not above absolute zero."""
    return above_zero(reference, "reference", "a temperature above absolute zero, in kelvin")


def freeze(law: Law, **fields: object) -> None:
    """Put checked values in a law under construction (the dataclass is frozen)."""
    for name, value in fields.items():
        object.__setattr__(law, name, value)


def to_degC(temperature: float) -> float:  # noqa: N802 - the unit's own spelling
    """Return a temperature [K] in degC, short where that loses nothing."""
    exact = temperature - ZERO_CELSIUS
    short = round(exact, _DECIMALS)
    return short if from_degC(short) == temperature else exact


def from_degC(temperature: float) -> float:  # noqa: N802 - the unit's own spelling
    """Return a temperature [degC] in kelvin; -40 gives 233.15 and not 233.14999999999998."""
    exact = temperature + ZERO_CELSIUS
    short = round(exact, _DECIMALS)
    return short if abs(short - exact) < _LAST_DIGIT else exact


def to_ppm(coefficient: float) -> float:
    """Return a coefficient in millionths, short where that loses nothing."""
    exact = coefficient * 1e6
    short = float(f"{exact:.12g}")
    return short if short / 1e6 == coefficient else exact
