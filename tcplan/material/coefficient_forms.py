"""The forms in which temperature coefficients are stated, and the way between them, uncertainties included.

All go through one form, R(T)/R(reference) = 1 + tc1 x + tc2 x^2 with x = T - reference, and the covariance
of tc1 and tc2. Uncertainties are standard uncertainties, carried by the Jacobian of each map: exactly where
the map is linear (chords both ways, a table with exact weights), to first order elsewhere.

A little long, so that every form stands beside its inverse; a table of R is in
`tcplan.material.coefficient_points`, what a box TCR leaves open in `tcplan.material.coefficient_box`.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material import polynomial
from tcplan.material.polynomial import Polynomial
from tcplan.units import format_celsius

Covariance = tuple[tuple[float, float], tuple[float, float]]


@dataclass(frozen=True, slots=True, kw_only=True)
class Uncertain:
    """A number and its standard uncertainty, in the same unit; None where none is stated."""

    value: float
    uncertainty: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Quadratic:
    """R(T)/R(reference) = 1 + tc1 x + tc2 x^2, x = T - reference, with what is known of tc1 and tc2.

    Parameters
    ----------
    reference : float
        Temperature [K].
    tc1, tc2 : float
        [1/K], [1/K^2]
    covariance : tuple of tuple of float, optional
        Of (tc1, tc2), SI units; None where no uncertainty is stated.
    """

    reference: float
    tc1: float
    tc2: float
    covariance: Covariance | None = None

    @property
    def law(self) -> Polynomial:
        """The law without its uncertainty."""
        return Polynomial(reference=self.reference, coefficients=(self.tc1, self.tc2))

    def uncertainty(self, position: int) -> float | None:
        """Return the standard uncertainty of tc1 (0) or tc2 (1)."""
        return _root(self.covariance, position)

    @property
    def correlation(self) -> float | None:
        """Of tc1 and tc2; None where one of them has no uncertainty."""
        return correlation_of(self.covariance)


@dataclass(frozen=True, slots=True, kw_only=True)
class Peak:
    """R(T) = R(at) [1 + tc2 (T - at)^2]: ``at`` [K], ``tc2`` [1/K^2] about it, their covariance."""

    at: float
    tc2: float
    covariance: Covariance | None = None

    def uncertainty(self, position: int) -> float | None:
        """Return the standard uncertainty of the temperature (0) or of tc2 (1)."""
        return _root(self.covariance, position)

    @property
    def correlation(self) -> float | None:
        """Of the temperature and tc2; None where one of them has no uncertainty."""
        return correlation_of(self.covariance)


# --- covariances --------------------------------------------------------------------------------------


def pair_covariance(first: float | None, second: float | None, correlation: float = 0.0) -> Covariance | None:
    """Return the covariance of two numbers from their uncertainties; None where neither is stated.

    One that is not stated beside one that is counts as exact.

    Parameters
    ----------
    first, second : float or None
        Standard uncertainties.
    correlation : float
        From -1 to 1.
    """
    if first is None and second is None:
        return None
    one, two = first or 0.0, second or 0.0
    both = correlation * one * two
    return (one * one, both), (both, two * two)


def correlation_of(covariance: Covariance | None) -> float | None:
    """Return the correlation of two numbers; None where one of them has no uncertainty."""
    if covariance is None or not (covariance[0][0] > 0.0 and covariance[1][1] > 0.0):
        return None
    scale = math.sqrt(covariance[0][0]) * math.sqrt(covariance[1][1])
    return max(-1.0, min(1.0, covariance[0][1] / scale))


def _root(covariance: Covariance | None, position: int) -> float | None:
    return None if covariance is None else math.sqrt(max(covariance[position][position], 0.0))


def _carried(covariance: Covariance | None, jacobian: Sequence[Sequence[float]]) -> Covariance | None:
    """Return J C J' of two numbers made of two."""
    if covariance is None:
        return None
    rows: FloatArray = np.asarray(jacobian, dtype=np.float64)
    with np.errstate(all="ignore"):
        (a, b), (c, d) = (rows @ np.asarray(covariance) @ rows.T).tolist()
    return (finite(a), finite(0.5 * (b + c))), (finite(0.5 * (b + c)), finite(d))


def _of_one(covariance: Covariance | None, gradient: tuple[float, float]) -> float | None:
    """Return the standard uncertainty of one number made of two."""
    if covariance is None:
        return None
    row = np.asarray(gradient)
    with np.errstate(all="ignore"):
        return math.sqrt(max(finite(float(row @ np.asarray(covariance) @ row)), 0.0))


def finite(value: float) -> float:
    """Return a finite number, or raise."""
    if math.isfinite(value):
        return value
    found, expected = "numbers that leave the range of floats on the way", "coefficients of a resistor"
    raise InputError(Problem(where="coefficients", found=found, expected=expected, todo="Check the units."))


# --- reference ----------------------------------------------------------------------------------------


def moved(form: Quadratic, reference: float) -> Quadratic:
    """Return the same law about another reference: tc1' = (tc1 + 2 tc2 d)/D, tc2' = tc2/D.

    d is the shift and D = 1 + tc1 d + tc2 d^2.

    Parameters
    ----------
    form : Quadratic
    reference : float
        Where it is wanted [K].

    Raises
    ------
    InputError
        When the law is not above zero there.
    """
    if reference == form.reference:
        return form
    tc1, tc2 = form.law.referred_to(reference).coefficients
    d = reference - form.reference
    whole = 1.0 + d * (form.tc1 + d * form.tc2)
    jacobian = (
        ((1.0 - tc1 * d) / whole, d * (2.0 - tc1 * d) / whole),
        (-tc2 * d / whole, (1.0 - tc2 * d * d) / whole),
    )
    return Quadratic(reference=reference, tc1=tc1, tc2=tc2, covariance=_carried(form.covariance, jacobian))


# --- chords -------------------------------------------------------------------------------------------


def from_chords(
    reference: float,
    cold: float,
    cold_tcr: float,
    hot: float,
    hot_tcr: float,
    covariance: Covariance | None = None,
) -> Quadratic:
    """Return the quadratic of a cold and a hot chord TCR; a linear map, so exact with its covariance.

    Parameters
    ----------
    reference, cold, hot : float
        Temperatures [K], cold < reference < hot.
    cold_tcr, hot_tcr : float
        Chord TCR from the reference to cold and to hot [1/K].
    covariance : tuple of tuple of float, optional
        Of the two chord TCRs.

    Raises
    ------
    InputError
        When cold < reference < hot does not hold.

    References
    ----------
    MIL-STD-202, method 304: chord TCRs from the reference (the definition; the equation from memory).
    """
    tc1, tc2 = polynomial.from_chords(reference, cold, cold_tcr, hot, hot_tcr).coefficients
    span, x, y = hot - cold, cold - reference, hot - reference
    jacobian = ((y / span, -x / span), (-1.0 / span, 1.0 / span))
    return Quadratic(reference=reference, tc1=tc1, tc2=tc2, covariance=_carried(covariance, jacobian))


def chord(form: Quadratic, at: float) -> Uncertain:
    """Return the chord TCR from the reference to ``at`` [K]: tc1 + tc2 x [1/K]."""
    with np.errstate(all="ignore"):
        value = finite(polynomial.chord_tcr(form.law, at, form.reference))
    return Uncertain(value=value, uncertainty=_of_one(form.covariance, (1.0, at - form.reference)))


def chord_covariance(form: Quadratic, cold: float, hot: float) -> Covariance | None:
    """Return the covariance of the chord TCRs to cold and to hot [1/K^2]; inverse of `from_chords`."""
    return _carried(form.covariance, ((1.0, cold - form.reference), (1.0, hot - form.reference)))


# --- peak ---------------------------------------------------------------------------------------------


def from_peak(form: Peak, reference: float) -> Quadratic:
    """Return the quadratic of a peak form about a reference [K].

    With d = reference - peak and D = 1 + tc2 d^2: tc1 = 2 tc2 d/D, tc2' = tc2/D.

    Raises
    ------
    InputError
        When the parabola is not above zero at the reference.
    """
    tc1, tc2 = polynomial.from_peak(form.at, form.tc2, reference).coefficients
    d, c = reference - form.at, form.tc2
    whole = 1.0 + c * d * d
    jacobian = (
        (-2.0 * c * (1.0 - c * d * d) / (whole * whole), 2.0 * d / (whole * whole)),
        (2.0 * c * c * d / (whole * whole), 1.0 / (whole * whole)),
    )
    return Quadratic(reference=reference, tc1=tc1, tc2=tc2, covariance=_carried(form.covariance, jacobian))


def peak(form: Quadratic) -> Peak | None:
    """Return the peak form: where the slope is 0, and tc2 about it; inverse of `from_peak`.

    None for a straight line, for a parabola that is not above zero at its peak, and where the peak would
    lie below absolute zero.
    """
    if form.tc2 == 0.0:
        return None
    with np.errstate(all="ignore"):
        a, b = np.float64(form.tc1), np.float64(form.tc2)
        shift = float(-a / (2.0 * b))
        value = float(1.0 - a * a / (4.0 * b))
        c = float(b / value)
    at = form.reference + shift
    if not (math.isfinite(c) and value > 0.0 and 0.0 < at < math.inf):
        return None
    jacobian = (
        (-1.0 / (2.0 * form.tc2), -shift / form.tc2),
        (-shift * c / value, (1.0 - c * shift * shift) / value),
    )
    return Peak(at=at, tc2=c, covariance=_carried(form.covariance, jacobian))


# --- box ----------------------------------------------------------------------------------------------


def box_tcr(form: Quadratic, low: float, high: float) -> Uncertain:
    """Return the box TCR over low..high [K]: the band of R(T)/R(reference) over the span [1/K].

    Raises
    ------
    InputError
        When low is not below high.
    """
    check_span(low, high)
    x = [low - form.reference, high - form.reference]
    if form.tc2 != 0.0 and x[0] < (vertex := -form.tc1 / (2.0 * form.tc2)) < x[1]:
        x.append(vertex)
    top = max(x, key=lambda d: d * (form.tc1 + d * form.tc2))
    bottom = min(x, key=lambda d: d * (form.tc1 + d * form.tc2))
    # (top - bottom) as a factor, so that a small band is not lost in the difference
    value = finite((top - bottom) * (form.tc1 + form.tc2 * (top + bottom)) / (high - low))
    # the vertex moves with tc1 and tc2, but the curve is flat there: it adds nothing to first order
    gradient = ((top - bottom) / (high - low), (top - bottom) * (top + bottom) / (high - low))
    return Uncertain(value=value, uncertainty=_of_one(form.covariance, gradient))


def check_span(low: float, high: float) -> None:
    """Raise unless low is below high."""
    if not low < high:
        found = f"{format_celsius(low)} to {format_celsius(high)}"
        raise InputError(Problem(where="range", found=found, expected="the lower temperature first"))


# --- R(T) --------------------------------------------------------------------------------------------


def ratio(form: Quadratic, at: float) -> Uncertain:
    """Return R(at)/R(reference), ``at`` in kelvin."""
    x = at - form.reference
    value = finite(1.0 + x * (form.tc1 + x * form.tc2))
    return Uncertain(value=value, uncertainty=_of_one(form.covariance, (x, x * x)))
