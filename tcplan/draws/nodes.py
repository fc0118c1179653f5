"""Figures of any network from its values at Chebyshev nodes, for many lots at once.

One product gives 33 points of each panel; a peak inside it is then followed on the polynomial itself.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.curves import Curves, Pool
from tcplan.draws.products import product
from tcplan.errors import InternalError
from tcplan.goal import Piece

POINTS = 33
NEAR = 1.01  # a peak that is nearly the larger of the two on the points may be it
WIDTH = 4096  # lots at a time, so that the arrays of a panel stay in cache
MOST_FIGURE = 2.0**20
"""What a lot counts as that is not finite: outside of every limit."""

Ends: TypeAlias = tuple[FloatArray, FloatArray]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Panel:
    """A stretch on which a polynomial through some nodes holds the drift.

    ``points`` (33 + 2, nodes) takes the values at the nodes to evenly spaced points, ends included, and
    then to the slopes at the ends; ``powers`` (nodes, nodes) to the coefficients of 1, t, t^2 .., with
    t from -1 to 1.
    """

    low: float
    high: float
    nodes: slice
    points: FloatArray
    powers: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class NodePeaks:
    """Figures from values at nodes; ``parts`` are the panels of each piece."""

    curves: Curves
    pieces: tuple[Piece, ...]
    parts: tuple[tuple[int, ...], ...]
    panels: tuple[Panel, ...]

    def figures(
        self, rows: FloatArray, pool: Pool | None = None, factors: FloatArray | None = None
    ) -> FloatArray:
        """Return the figure of every lot, shape (lots,); ``pool`` and ``factors`` as in `Curves.drift`."""
        found = np.empty(rows.shape[1])
        pool = pool or Pool()
        for start in range(0, len(found), WIDTH):
            part = slice(start, start + WIDTH)
            pool.reset()
            found[part] = self._figures(rows[:, part], pool, None if factors is None else factors[:, part])
        return found

    def _figures(self, rows: FloatArray, pool: Pool, factors: FloatArray | None) -> FloatArray:
        with np.errstate(all="ignore"):
            drift = self.curves.drift(rows, factors, pool)
            ends = {}
            best: FloatArray | None = None
            for piece, part in zip(self.pieces, self.parts, strict=True):
                for k in part:
                    if (k, piece.centred) not in ends:
                        ends[k, piece.centred] = _extremes(self.panels[k], drift, pool, both=piece.centred)
                figure = _piece_figure([ends[k, piece.centred] for k in part], piece)
                best = figure if best is None else np.maximum(best, figure)
        return finite(best)


def _piece_figure(ends: Sequence[Ends], piece: Piece) -> FloatArray:
    low = stacked(np.minimum, [one for one, _ in ends])
    high = stacked(np.maximum, [one for _, one in ends])
    width = 0.5 * (high - low) if piece.centred else np.maximum(high, -low)
    return np.asarray(width / piece.weight)


def _extremes(panel: Panel, drift: FloatArray, pool: Pool, *, both: bool) -> Ends:
    """Return the lowest and highest drift on one panel; the smaller one roughly unless ``both``."""
    values = drift[panel.nodes]
    if panel.high == panel.low:
        return values[0], values[0]
    found = pool.take((len(panel.points), values.shape[1]))
    product(panel.points, values, out=found)
    points, slopes = found[:POINTS], found[POINTS:]
    low, high = points.min(axis=0), points.max(axis=0)
    # A peak is inside unless an end is highest and the curve falls from it.
    start, end = points[0], points[-1]
    upper = np.where(start == high, slopes[0] > 0.0, (end < high) | (slopes[1] < 0.0))
    lower = np.where(start == low, slopes[0] < 0.0, (end > low) | (slopes[1] > 0.0))
    if not both:
        upper &= NEAR * high >= -low
        lower &= -NEAR * low >= high
    for inside, side, best in ((upper, 1.0, high), (lower, -1.0, low)):
        lots = np.flatnonzero(inside)
        if len(lots):
            best[lots] = side * _polished(panel, points[:, lots] * side, values[:, lots] * side)
    pool.give(found)
    return low, high


def _polished(panel: Panel, points: FloatArray, values: FloatArray) -> FloatArray:
    """Return the highest value of each polynomial, whose highest point lies inside the panel.

    From the vertex through three points one Newton step is enough. Of two peaks that are equal on the
    points to 1 part in 1000 it may be the lower one.
    """
    step = 2.0 / (POINTS - 1)
    at = np.clip(np.argmax(np.ascontiguousarray(points.T), axis=1), 1, POINTS - 2)
    lots = np.arange(points.shape[1])
    before, middle, after = points[at - 1, lots], points[at, lots], points[at + 1, lots]
    bend = before - 2.0 * middle + after
    t = -1.0 + step * (at + np.clip(0.5 * (before - after) / np.where(bend < 0.0, bend, -1.0), -1.0, 1.0))
    total, slope, half_bend = _at(product(panel.powers, values), t)
    gain = -0.25 * slope**2 / np.where(half_bend < 0.0, half_bend, -np.inf)
    return np.asarray(np.maximum(total + np.minimum(gain, -bend), middle))


def _at(powers: FloatArray, t: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return polynomials, their slopes and half their second derivatives at one point each (Horner)."""
    total, slope, half_bend = powers[-1].copy(), np.zeros_like(t), np.zeros_like(t)
    for power in powers[-2::-1]:
        half_bend *= t
        half_bend += slope
        slope *= t
        slope += total
        total *= t
        total += power
    return total, slope, half_bend


def stacked(choose: np.ufunc, points: Sequence[FloatArray]) -> FloatArray:
    """Return the highest or lowest of several arrays, place by place."""
    best = points[0]
    for k, other in enumerate(points[1:]):
        best = choose(best, other) if k == 0 else choose(best, other, out=best)
    return np.asarray(best)


def finite(figures: FloatArray | None) -> FloatArray:
    """Return figures with what is not finite counted as far outside."""
    if figures is None:
        raise InternalError("a requirement without a piece")
    return np.asarray(np.fmin(figures, MOST_FIGURE, out=figures))
