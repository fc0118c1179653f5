"""Drift of any network over a continuous range: extremes, band and temperature coefficients.

Extremes are those of a Chebyshev interpolant that is accepted only when its tail and 192 points off
its nodes agree with the function; the roots of its derivative and the ends of the range are the
candidates. A maximum over a grid is never reported.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import TypeAlias

import numpy as np
from numpy.polynomial import chebyshev

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, InternalError, Problem
from tcplan.material.model import Material
from tcplan.network import Network, resistance, taylor, used_materials, value

Curve: TypeAlias = Callable[[FloatArray], FloatArray]
"""A function of temperature [K], shape (n,) -> (n,)."""

TAIL = 1e-13
DEGREES = (16, 32, 64)
MOST_PANELS = 4000
CHECKS = 192  # points off the nodes at which an interpolant must agree
SMALLEST_PANEL = 1e-7  # K; below this a kink is taken as resolved


@dataclass(frozen=True, slots=True, kw_only=True)
class Extreme:
    """A value and the temperature [K] where it is reached."""

    value: float
    at: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Extremes:
    """The lowest and the highest value of a curve over a range."""

    low: Extreme
    high: Extreme

    @property
    def band(self) -> float:
        """Highest minus lowest."""
        return self.high.value - self.low.value

    @property
    def peak(self) -> Extreme:
        """The largest magnitude."""
        largest = self.high if self.high.value >= -self.low.value else self.low
        return Extreme(value=abs(largest.value), at=largest.at)


def panels(low: float, high: float, breakpoints: Iterable[float] = ()) -> tuple[tuple[float, float], ...]:
    """Split [low, high] at the breakpoints inside it; a single temperature is one empty panel."""
    inner = sorted({b for b in breakpoints if low < b < high})
    edges = [low, *inner, high]
    return tuple(itertools.pairwise(edges))


@lru_cache(maxsize=8)
def _chebyshev_points(degree: int) -> tuple[FloatArray, FloatArray]:
    """Return the nodes in [-1, 1] and the matrix from values at them to coefficients."""
    nodes = chebyshev.chebpts1(degree + 1)
    matrix = chebyshev.chebvander(nodes, degree).T * (2.0 / (degree + 1))
    matrix[0] *= 0.5
    return nodes, np.asarray(matrix, dtype=np.float64)


@lru_cache(maxsize=8)
def _check_points(degree: int) -> tuple[FloatArray, FloatArray]:
    """Return points off the nodes, evenly over the panel, and the Chebyshev values there."""
    points = -1.0 + 2.0 * (np.arange(CHECKS) + 0.37) / CHECKS
    return points, np.asarray(chebyshev.chebvander(points, degree), dtype=np.float64)


def _interpolant(curve: Curve, low: float, high: float, degree: int) -> FloatArray | None:
    """Return Chebyshev coefficients on [low, high], or None when they do not hold the curve."""
    nodes, matrix = _chebyshev_points(degree)
    points, check = _check_points(degree)
    middle, half = 0.5 * (low + high), 0.5 * (high - low)
    both = curve(middle + half * np.concatenate([nodes, points]))
    coefficients = np.asarray(matrix @ both[: degree + 1])
    scale = max(1.0, float(np.max(np.abs(coefficients))))
    tail = float(np.max(np.abs(coefficients[-2:])))
    missed = float(np.max(np.abs(check @ coefficients - both[degree + 1 :])))
    return coefficients if tail <= TAIL * scale and missed <= 10 * TAIL * scale else None


def _candidates(coefficients: FloatArray, low: float, high: float) -> list[float]:
    """Return the ends and the stationary points of the interpolant [K]."""
    derivative = chebyshev.chebder(coefficients)
    largest = float(np.max(np.abs(derivative)))
    keep = np.nonzero(np.abs(derivative) > 1e-15 * largest)[0] if largest > 0 else np.array([])
    roots = chebyshev.chebroots(derivative[: keep[-1] + 1]) if len(keep) and keep[-1] > 0 else np.array([])
    real = [float(r.real) for r in np.atleast_1d(roots) if abs(r.imag) < 1e-6 and abs(r.real) <= 1.0 + 1e-9]
    middle, half = 0.5 * (low + high), 0.5 * (high - low)
    return [low, high, *(middle + half * min(1.0, max(-1.0, r)) for r in real)]


def stationary_points(curve: Curve, low: float, high: float) -> list[float]:
    """Return the ends and all stationary temperatures [K] of a curve on one panel.

    Raises
    ------
    InputError
        When the curve is too rough to be followed: after many halvings no interpolant holds it.
    """
    found: list[float] = []
    panels_left = [(low, high)]
    for _ in range(MOST_PANELS):
        if not panels_left:
            return found
        left, right = panels_left.pop()
        accepted = None
        if right - left > SMALLEST_PANEL:
            for degree in DEGREES:
                if (accepted := _interpolant(curve, left, right, degree)) is not None:
                    break
            else:
                middle = 0.5 * (left + right)
                panels_left += [(middle, right), (left, middle)]
                continue
        found += [left, right] if accepted is None else _candidates(accepted, left, right)
    raise InputError(
        Problem(
            where="law",
            found=f"a curve that is rough between {low - 273.15:.4g} and {high - 273.15:.4g} degC",
            expected="a law that is smooth, but for a few kinks",
            todo="A formula should not take differences of nearly equal numbers.",
        )
    )


def extremes(curve: Curve, over: Sequence[tuple[float, float]]) -> Extremes:
    """Return the extremes of a curve over all panels.

    Parameters
    ----------
    curve : callable
        Vectorised function of temperature [K].
    over : sequence of (low, high)
        Panels [K] on each of which the curve is smooth.

    Raises
    ------
    InternalError
        When the curve is not finite somewhere: materials are checked before they come here.
    """
    points = np.array([t for low, high in over for t in stationary_points(curve, low, high)])
    values = curve(points)
    if not np.all(np.isfinite(values)):
        raise InternalError("a curve is not finite inside its range")
    low, high = int(np.argmin(values)), int(np.argmax(values))
    return Extremes(
        low=Extreme(value=float(values[low]), at=float(points[low])),
        high=Extreme(value=float(values[high]), at=float(points[high])),
    )


def ratio_curve(network: Network, materials: Mapping[str, Material], reference: float) -> Curve:
    """Return the function T -> R(T)/R(T_ref) of a network of nominal materials."""
    names = used_materials(network)
    nominal = value(network)

    def curve(temperature: FloatArray) -> FloatArray:
        ratios = {name: materials[name].ratio(temperature, reference) for name in names}
        return resistance(network, ratios) / nominal

    return curve


def breakpoints(materials: Mapping[str, Material], names: Iterable[str]) -> tuple[float, ...]:
    """Return the temperatures [K] where a law of these materials is not smooth."""
    return tuple(sorted({b for name in names for b in materials[name].law.breakpoints}))


def chord_tcr(curve: Curve, at: float, reference: float) -> float:
    """Return [R(T)/R(T_ref) - 1]/(T - T_ref) [1/K]; the definition in MIL-STD-202 method 304."""
    return float((curve(np.array([at]))[0] - 1.0) / (at - reference))


def effective_coefficients(
    network: Network, materials: Mapping[str, Material], reference: float, order: int = 3
) -> tuple[float, ...]:
    """Return TC1, TC2, ... [1/K^n] of the composite about ``reference``, exactly."""
    names = used_materials(network)
    return taylor(network, {name: materials[name].law.taylor(reference, order) for name in names})


def centring(extremes_of_ratio_less_one: Extremes) -> tuple[float, float]:
    """Return the offset of R(T_ref) that centres the value, and the half-width that remains.

    With d_min and d_max the extremes of a flat drift, the offset is
    -(d_max + d_min)/(2 + d_max + d_min) and the value then stays within
    (d_max - d_min)/(2 + d_max + d_min) of its target, either sign.
    """
    top, bottom = extremes_of_ratio_less_one.high.value, extremes_of_ratio_less_one.low.value
    total = 2.0 + top + bottom
    return -(top + bottom) / total, (top - bottom) / total
