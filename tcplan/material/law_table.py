"""A law given by points: a smooth curve through a measured or printed table."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any, ClassVar

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material import series
from tcplan.material.law_base import Law, checked_reference, freeze, temperature_symbol, to_degC
from tcplan.material.series import Series

if TYPE_CHECKING:
    import sympy

MIN_POINTS = 3
MAX_POINTS = 200

Points = tuple[tuple[float, float], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Table(Law):
    """R(T) through points: a cubic spline of ln R, twice continuously differentiable, not-a-knot at its ends.

    A shape-preserving (monotone) interpolant was not taken: it is only once differentiable, and it forces
    the slope to zero at the highest point of a table, so it is wrong by most near a peak, where flat
    materials are used. What the spline may overshoot between knots is estimated by `interpolation_error`.
    ln R keeps R above zero and makes thermistor tables nearly straight. Beyond its ends the law goes on as a
    straight line of ln R.

    Parameters
    ----------
    reference : float
        The temperature at which the ratio is 1 [K], inside the table.
    points : tuple of pairs of float
        (T [K], R), T rising, R above zero in any unit; 3 to 200 of them (4 or more are better).

    Raises
    ------
    InputError
        When the points are too few, too many, not rising or not above zero, or the reference is outside.

    References
    ----------
    de Boor, A Practical Guide to Splines (1978), chapter IV (not-a-knot).
    """

    kind: ClassVar[str] = "table"
    points: Points

    def __post_init__(self) -> None:
        points = _checked_points(self.points)
        reference = checked_reference(self.reference)
        low, high = points[0][0], points[-1][0]
        if not low <= reference <= high:
            raise InputError(
                Problem(
                    where="reference",
                    found=f"{to_degC(reference):g} degC",
                    expected=f"a temperature inside the table, {to_degC(low):g} to {to_degC(high):g} degC",
                )
            )
        freeze(self, reference=reference, points=points)

    def ratio(self, temperature: FloatArray | float) -> FloatArray:
        """Return R(T)/R(reference); see `Law.ratio`."""
        at = np.asarray(temperature, dtype=np.float64)
        spline = _spline(self.points)
        with np.errstate(all="ignore"):
            return np.asarray(np.exp(spline.value(at) - spline.value(np.asarray(self.reference))))

    def symbolic(self) -> sympy.Expr:
        """Return the formula, one piece per interval; see `Law.symbolic`."""
        import sympy

        symbol = temperature_symbol()
        spline = _spline(self.points)
        start = sympy.Float(float(spline.value(np.asarray(self.reference))))
        pieces = []
        for base, coefficients in zip(spline.bases, spline.coefficients.T, strict=True):
            u = symbol - sympy.Float(float(base))
            a, b, c, d = (sympy.Float(float(k)) for k in coefficients)
            pieces.append(sympy.exp(a - start + u * (b + u * (c + u * d))))
        ends = [symbol < sympy.Float(t) for t in self._knots()]
        return sympy.Piecewise(*zip(pieces, [*ends, True], strict=True))

    def parameters(self) -> dict[str, object]:
        """Return reference_degC and the points; see `Law.parameters`."""
        points = [[to_degC(t), r] for t, r in self.points]
        return {"law": self.kind, "reference_degC": to_degC(self.reference), "points_degC": points}

    @property
    def breakpoints(self) -> tuple[float, ...]:
        """The temperatures of the points [K]: the third derivative jumps there."""
        return self._knots()

    def interpolation_error(self) -> float:
        """Return the stated error of the interpolation, as a ratio.

        The largest |R'/R - 1| over the interior points, R' being interpolated from all points but this one:
        on the safe side for a smooth law, because leaving a point out doubles the step there. A wild point
        shows in it too.
        """
        left_out = range(1, len(self.points) - 1)
        return max(_error_without(self.points, k) for k in left_out)

    def _knots(self) -> tuple[float, ...]:
        return tuple(t for t, _ in self.points)

    def _series(self, temperature: FloatArray | float, order: int) -> Series:
        at = np.asarray(temperature, dtype=np.float64)
        _, b, c, d = _spline(self.points).about(at)
        zero = np.zeros_like(at)
        return series.exp((zero, b, c, d, *(zero,) * order)[: order + 1])


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Spline:
    """Cubic pieces: a line before the first knot, one piece per interval, a line after the last knot."""

    knots: FloatArray
    bases: FloatArray
    coefficients: FloatArray

    def value(self, at: FloatArray) -> FloatArray:
        piece = self._piece(at)
        a, b, c, d = self.coefficients[:, piece]
        u = at - self.bases[piece]
        return np.asarray(a + u * (b + u * (c + u * d)))

    def about(self, at: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Return the four Taylor coefficients about each temperature."""
        piece = self._piece(at)
        a, b, c, d = self.coefficients[:, piece]
        u = at - self.bases[piece]
        return (
            np.asarray(a + u * (b + u * (c + u * d))),
            np.asarray(b + u * (2.0 * c + 3.0 * u * d)),
            np.asarray(c + 3.0 * u * d),
            d,
        )

    def _piece(self, at: FloatArray) -> Any:
        piece = np.searchsorted(self.knots, at, side="right")
        return piece - (at == self.knots[-1])  # the last knot belongs to the last interval


@lru_cache(maxsize=256)
def _spline(points: Points) -> _Spline:
    knots = np.array([t for t, _ in points])
    logs = np.log([r for _, r in points])
    steps = np.diff(knots)
    chords = np.diff(logs) / steps
    slopes = _knot_slopes(steps, chords)
    c = (3.0 * chords - 2.0 * slopes[:-1] - slopes[1:]) / steps
    d = (slopes[:-1] + slopes[1:] - 2.0 * chords) / steps**2
    rows = (
        [logs[0], *logs],
        [slopes[0], *slopes],
        [0.0, *c, 0.0],
        [0.0, *d, 0.0],
    )
    spline = _Spline(knots=knots, bases=np.array([knots[0], *knots]), coefficients=np.array(rows))
    for array in (spline.knots, spline.bases, spline.coefficients):
        array.flags.writeable = False
    return spline


def _knot_slopes(steps: FloatArray, chords: FloatArray) -> FloatArray:
    """Return the slopes at the knots that make the second derivative continuous, with not-a-knot ends."""
    count = len(steps) + 1
    if count == 2:
        return np.array([chords[0], chords[0]])
    if count == 3:  # both end conditions say the same; the parabola through the points
        middle = (steps[1] * chords[0] + steps[0] * chords[1]) / (steps[0] + steps[1])
        return np.array([2.0 * chords[0] - middle, middle, 2.0 * chords[1] - middle])
    matrix = np.zeros((count, count))
    right = np.zeros(count)
    for k in range(1, count - 1):
        before, after = steps[k - 1], steps[k]
        matrix[k, k - 1 : k + 2] = after, 2.0 * (before + after), before
        right[k] = 3.0 * (after * chords[k - 1] + before * chords[k])
    matrix[0, :2], right[0] = _end(steps[0], steps[1], chords[0], chords[1])
    matrix[-1, :-3:-1], right[-1] = _end(steps[-1], steps[-2], chords[-1], chords[-2])
    return np.asarray(np.linalg.solve(matrix, right))


def _end(outer: float, inner: float, outer_chord: float, inner_chord: float) -> tuple[Any, float]:
    """Return the row of a not-a-knot end: the third derivative is continuous at the knot next to it."""
    both = outer + inner
    right = ((outer + 2.0 * both) * inner * outer_chord + outer**2 * inner_chord) / both
    return (inner, both), right


def _error_without(points: Points, k: int) -> float:
    others = points[:k] + points[k + 1 :]
    temperature, value = points[k]
    # not through the cache, which these one-time splines would fill
    interpolated = _spline.__wrapped__(others).value(np.asarray(temperature))
    return abs(math.expm1(float(interpolated) - math.log(value)))


def _checked_points(points: Sequence[Sequence[float]]) -> Points:
    count = len(points)
    if not MIN_POINTS <= count <= MAX_POINTS:
        need = f"{MIN_POINTS} to {MAX_POINTS} points"
        raise InputError(Problem(where="points", found=f"{count} of them", expected=need))
    pairs = tuple((float(t), float(r)) for t, r in points)
    problems = [p for n in range(count) if (p := _point_problem(pairs, n)) is not None]
    if problems:
        raise InputError(problems)
    return pairs


def _point_problem(points: Points, n: int) -> Problem | None:
    temperature, value = points[n]
    before = points[n - 1][0] if n else 0.0
    where, found = f"point {n + 1}", f"{value:g} at {to_degC(temperature):g} degC"
    if not (math.isfinite(temperature) and temperature > before):
        return Problem(where=where, found=found, expected="a temperature above that of the point before it")
    if not (math.isfinite(value) and value > 0.0):
        return Problem(where=where, found=found, expected="a resistance above zero")
    return None
