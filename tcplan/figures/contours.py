"""Peak drift of a quadratic law as a length in the TC1-TC2 plane, and its contours, exactly."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray

DIRECTIONS = 721
STEPS = (1.0, 2.0, 5.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class PeakDrift:
    """Peak of |TC1 x + TC2 x^2| over ``cold`` <= x <= ``hot`` [K], x = T - T_ref.

    It is a norm of (TC1, TC2), so every contour is the unit one made larger.
    """

    cold: float
    hot: float

    def of(self, tc1: FloatArray, tc2: FloatArray) -> FloatArray:
        """Return the peak [ppm]: the larger of the two ends and the vertex, if that is inside.

        Parameters
        ----------
        tc1, tc2 : array
            [ppm/K], [ppm/K^2]; of one shape.
        """
        a, b = np.asarray(tc1, dtype=np.float64), np.asarray(tc2, dtype=np.float64)
        at_ends = np.maximum(np.abs(self.cold * (a + b * self.cold)), np.abs(self.hot * (a + b * self.hot)))
        bent = b != 0.0
        vertex = np.divide(-a, 2.0 * b, out=np.zeros_like(a + b), where=bent)
        inside = bent & (vertex > self.cold) & (vertex < self.hot)
        at_vertex = np.where(inside, np.abs(vertex * (a + b * vertex)), 0.0)
        return np.asarray(np.maximum(at_ends, at_vertex))

    @property
    def reach(self) -> float:
        """The longer of the two arms of the range [K]."""
        return max(abs(self.cold), abs(self.hot))

    def contour(self, level: float) -> tuple[FloatArray, FloatArray]:
        """Return the closed curve of (TC1, TC2) whose peak is ``level`` [ppm]."""
        turn = np.linspace(0.0, 2.0 * np.pi, DIRECTIONS)
        a, b = np.cos(turn) / self.reach, np.sin(turn) / self.reach**2
        size = level / self.of(a, b)
        return a * size, b * size


def round_levels(largest: float, count: int) -> tuple[float, ...]:
    """Return the ``count`` largest levels below ``largest`` out of 1, 2, 5 times a power of ten."""
    decade = int(np.floor(np.log10(largest)))
    levels = [step * 10.0**power for power in range(decade, decade - count - 1, -1) for step in STEPS[::-1]]
    return tuple(level for level in levels if level < largest)[:count]


def convex_hull(points: Sequence[tuple[float, float]]) -> tuple[tuple[float, float], ...]:
    """Return the corners of the smallest convex set that holds the points, anticlockwise.

    References
    ----------
    A. M. Andrew, Another efficient algorithm for convex hulls in two dimensions, Information
    Processing Letters 9 (1979) 216: the monotone chain.
    """
    order = sorted(set(points))
    if len(order) < 3:
        return tuple(order)
    return (*_chain(order)[:-1], *_chain(order[::-1])[:-1])


def _chain(order: Sequence[tuple[float, float]]) -> list[tuple[float, float]]:
    """Return the part of the hull to the right of the way from the first point to the last."""
    kept: list[tuple[float, float]] = []
    for point in order:
        while len(kept) > 1 and _turn(kept[-2], kept[-1], point) <= 0.0:
            kept.pop()
        kept.append(point)
    return kept


def _turn(first: tuple[float, float], second: tuple[float, float], third: tuple[float, float]) -> float:
    """Return twice the area of the triangle, above zero when it turns left."""
    return (second[0] - first[0]) * (third[1] - first[1]) - (second[1] - first[1]) * (third[0] - first[0])
