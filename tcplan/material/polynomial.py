"""The polynomial law: TC1, TC2 and higher coefficients about a reference temperature."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, ClassVar

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.law_base import (
    Law,
    checked_reference,
    finite,
    freeze,
    temperature_symbol,
    to_degC,
    to_ppm,
)
from tcplan.material.series import Series

if TYPE_CHECKING:
    import sympy

MAX_COEFFICIENTS = 8


@dataclass(frozen=True, slots=True, kw_only=True)
class Polynomial(Law):
    """R(T)/R(reference) = 1 + tc1 x + tc2 x^2 + .., x = T - reference.

    Parameters
    ----------
    reference : float
        Reference temperature [K].
    coefficients : tuple of float
        (tc1, tc2, ..), 1 to 8 of them; coefficient n in 1/K^n.

    Raises
    ------
    InputError
        When there are none or more than 8 coefficients, or one is not finite.

    Examples
    --------
    >>> law = Polynomial(reference=298.15, coefficients=(-120e-6, 0.55e-6))
    >>> float(law.ratio(398.15))
    0.9935
    """

    kind: ClassVar[str] = "polynomial"
    coefficients: tuple[float, ...]

    def __post_init__(self) -> None:
        count = len(self.coefficients)
        if not 1 <= count <= MAX_COEFFICIENTS:
            raise InputError(
                Problem(
                    where="coefficients",
                    found=f"{count} of them",
                    expected=f"1 to {MAX_COEFFICIENTS}: tc1, tc2, ..",
                )
            )
        values = tuple(finite(c, f"tc{n}") for n, c in enumerate(self.coefficients, start=1))
        freeze(self, reference=checked_reference(self.reference), coefficients=values)

    def ratio(self, temperature: FloatArray | float) -> FloatArray:
        """Return R(T)/R(reference); see `Law.ratio`."""
        x = np.asarray(temperature, dtype=np.float64) - self.reference
        with np.errstate(all="ignore"):
            return np.asarray(1.0 + x * _horner(self.coefficients, x))

    def slope(self, temperature: FloatArray | float) -> FloatArray:
        """Return the exact slope d ln R/dT [1/K]; see `Law.slope`."""
        x = np.asarray(temperature, dtype=np.float64) - self.reference
        derivative = tuple(n * c for n, c in enumerate(self.coefficients, start=1))
        with np.errstate(all="ignore"):
            return np.asarray(_horner(derivative, x) / (1.0 + x * _horner(self.coefficients, x)))

    def symbolic(self) -> sympy.Expr:
        """Return the formula; see `Law.symbolic`."""
        import sympy

        x = temperature_symbol() - sympy.Float(self.reference)
        terms = (sympy.Float(c) * x**n for n, c in enumerate(self.coefficients, start=1) if c)
        return sympy.Add(sympy.Integer(1), *terms)

    def parameters(self) -> dict[str, object]:
        """Return reference_degC, tc1_ppm_per_K, tc2_ppm_per_K2, ..; see `Law.parameters`."""
        names = coefficient_names(len(self.coefficients))
        values = (to_ppm(c) for c in self.coefficients)
        return {
            "law": self.kind,
            "reference_degC": to_degC(self.reference),
            **dict(zip(names, values, strict=True)),
        }

    def referred_to(self, reference: float) -> Polynomial:
        """Return the same law, re-referenced exactly: the polynomial shifted, divided by its value there.

        Raises
        ------
        InputError
            When the law is not above zero at the new reference.
        """
        if reference == self.reference:
            return self
        shifted = _shifted((1.0, *self.coefficients), checked_reference(reference) - self.reference)
        if not shifted[0] > 0.0:
            raise InputError(
                Problem(
                    where="reference",
                    found=f"R(T)/R({to_degC(self.reference):g} degC) = {shifted[0]:.4g} "
                    f"at {to_degC(reference):g} degC",
                    expected="a law above zero at its reference",
                    todo="Check the signs and units of the coefficients.",
                )
            )
        return Polynomial(reference=reference, coefficients=tuple(c / shifted[0] for c in shifted[1:]))

    def _series(self, temperature: FloatArray | float, order: int) -> Series:
        x = np.asarray(temperature, dtype=np.float64) - self.reference
        shifted = _shifted((1.0, *self.coefficients), x)
        return tuple(np.asarray(c) for c in (*shifted, *(0.0,) * order))[: order + 1]


def coefficient_names(count: int) -> tuple[str, ...]:
    """Return the names tc1_ppm_per_K, tc2_ppm_per_K2, .. of ``count`` coefficients."""
    return tuple(f"tc{n}_ppm_per_K{n if n > 1 else ''}" for n in range(1, count + 1))


def from_chords(reference: float, cold: float, cold_tcr: float, hot: float, hot_tcr: float) -> Polynomial:
    """Return the quadratic R(T)/R(reference) = 1 + tcr (T - reference) through two chord TCRs, cold and hot.

    Parameters
    ----------
    reference, cold, hot : float
        Temperatures [K], cold < reference < hot.
    cold_tcr, hot_tcr : float
        Chord TCR from the reference to cold and to hot [1/K].

    Raises
    ------
    InputError
        When cold < reference < hot does not hold.
    """
    if not cold < reference < hot:
        temperatures = ", ".join(f"{to_degC(t):g}" for t in (cold, reference, hot))
        raise InputError(
            Problem(
                where="cold_tcr, hot_tcr",
                found=f"cold, reference and hot at {temperatures} degC",
                expected="cold below the reference and hot above it",
            )
        )
    tc2 = (hot_tcr - cold_tcr) / (hot - cold)
    tc1 = cold_tcr - tc2 * (cold - reference)
    return Polynomial(reference=reference, coefficients=(tc1, tc2))


def from_peak(peak: float, tc2: float, reference: float) -> Polynomial:
    """Return the peak form of alloys, R = R_peak [1 + tc2 (T - peak)^2], re-referenced exactly.

    Parameters
    ----------
    peak : float
        Temperature of the highest (or lowest) resistance [K].
    tc2 : float
        Curvature coefficient about the peak [1/K^2]; negative for a highest value.
    reference : float
        Reference temperature of the returned law [K].

    Raises
    ------
    InputError
        When the parabola is not above zero at the reference.
    """
    return Polynomial(reference=peak, coefficients=(0.0, tc2)).referred_to(reference)


def chord_tcr(law: Law, at: float, reference: float) -> float:
    """Return the chord TCR, [R(at)/R(reference) - 1]/(at - reference) [1/K].

    When the two temperatures coincide it is the slope, the limit of the chord.

    Parameters
    ----------
    law : Law
        Any law.
    at, reference : float
        Temperatures [K].
    """
    if at == reference:
        return float(law.slope(reference))
    if isinstance(law, Polynomial):
        # divided by x before the sum, so that a small chord is not lost beside the 1
        return float(_horner(law.referred_to(reference).coefficients, np.asarray(at - reference)))
    return float((law.ratio(at) / law.ratio(reference) - 1.0) / (at - reference))


def _horner(coefficients: tuple[float, ...], x: FloatArray) -> FloatArray:
    total = np.full_like(x, coefficients[-1])
    for coefficient in reversed(coefficients[:-1]):
        total = total * x + coefficient
    return total


def _shifted(coefficients: tuple[float, ...], shift: Any) -> tuple[Any, ...]:
    """Return the coefficients of p(x + shift) for a number or an array, by repeated synthetic division."""
    work: list[Any] = list(coefficients)
    for first in range(len(work) - 1):
        for k in range(len(work) - 2, first - 1, -1):
            work[k] = work[k] + shift * work[k + 1]
    return tuple(work)
