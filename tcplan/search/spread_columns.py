"""Rows of the worst-case programme of a one-node mix: one device and one side of the goal a row.

R(T) rises with every law ratio, so at one temperature all laws sit at their highest (side 1) or at
their lowest (side -1), r below; the value factors m of the worst device at given shares are found by
one comparison each. For the shares x of the materials the worst figure is the least e with
``n x <= e d x`` in every row, where

- series:   n = side m (r - t),            d = m L
- parallel: n = side (1 - t / r) / m,      d = L / (r m)

t the wanted law, L the weight of the piece. A row of any device of the box is a true condition, so
rows are added where the present mix is worst until no device is worse.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.goal import Requirement
from tcplan.material.bounds import LawBounds
from tcplan.material.model import Material
from tcplan.material.spread import value_half_width
from tcplan.mixes import spread_columns, spread_names
from tcplan.plan import Space
from tcplan.process import Variation, step_groups
from tcplan.search.columns import GRID, START, Rows, spread_points

NEAR = 0.5  # maxima below this part of the highest are no rows


@dataclass(frozen=True, slots=True)
class _Points:
    """Some temperatures of some pieces, and the law bounds of all materials there, shape (T, materials)."""

    piece: IntArray
    T: FloatArray
    lo: FloatArray
    hi: FloatArray


@dataclass(slots=True)
class SpreadProgramme:
    """The columns of a space against a requirement, for the worst device at any temperature."""

    space: Space
    need: Requirement
    materials: Mapping[str, Material]
    names: tuple[str, ...]
    variation: Variation
    half: FloatArray = field(init=False)
    bounds: LawBounds = field(init=False)
    together: FloatArray | None = field(init=False)
    columns: FloatArray = field(init=False)
    grid: _Points = field(init=False)

    def __post_init__(self) -> None:
        names, reference = spread_names(self.space), self.need.reference
        spreads = self.variation.spreads
        self.half = np.array([value_half_width(self.materials[n].law, spreads[n], reference) for n in names])
        laws = [self.materials[n].law for n in names]
        self.bounds = LawBounds(laws, [spreads[n] for n in names], reference)
        groups = np.array(step_groups(names, self.materials, spreads, self.variation.process, reference))
        same = groups[:, None] == groups[None, :]
        self.together = same.astype(float) if same.sum() > len(groups) else None
        self.columns = spread_columns(self.space)
        self.grid = self._points(*spread_points(self.need, GRID, chebyshev=False))

    @property
    def parallel(self) -> bool:
        """Whether the shares are of the conductance."""
        return self.space.arrangement == "parallel"

    def _points(self, piece: IntArray, T: FloatArray) -> _Points:
        lo, hi = self.bounds.at(T)
        return _Points(piece, T, np.ascontiguousarray(lo.T), np.ascontiguousarray(hi.T))

    # --- the worst device of a mix --------------------------------------------------------------

    def _worst(self, x: FloatArray, points: _Points, side: int) -> tuple[FloatArray, FloatArray]:
        """Return the signed figure of the worst device at each point, and its factors (T, materials)."""
        weights = self.columns @ x
        ratios = points.hi if side > 0 else points.lo
        column, sign = (1.0 / ratios, -side) if self.parallel else (ratios, side)
        high, low = self._factors(np.ones_like(ratios)), self._factors(-np.ones_like(ratios))
        if self.parallel:
            high, low = 1.0 / low, 1.0 / high
        # A material that is not in the mix decides as if it had next to nothing of it.
        swing = np.maximum(weights, 1e-9) * (high - low)
        factor = np.ones_like(ratios)
        for _ in range(len(weights) + 2):
            rho = (factor * column) @ weights / (factor @ weights)
            pull = swing * (column - rho[:, None])
            if self.together is not None:  # materials whose values move in full step decide as one
                pull = pull @ self.together
            fresh = np.where(sign * pull > 0, high, low)
            if np.array_equal(fresh, factor):
                break
            factor = fresh
        rho = (factor * column) @ weights / (factor @ weights)
        ratio, factors = (1.0 / rho, 1.0 / factor) if self.parallel else (rho, factor)
        weight = np.array([p.weight for p in self.need.pieces])[points.piece]
        return side * (ratio - self.need.wanted(points.T)) / weight, factors

    def _factors(self, coordinates: FloatArray) -> FloatArray:
        return np.asarray(1.0 + coordinates * self.half)

    # --- rows -------------------------------------------------------------------------------------

    def _rows(self, points: _Points, side: int, factors: FloatArray) -> Rows:
        weight = np.array([p.weight for p in self.need.pieces])[points.piece][:, None]
        t = self.need.wanted(points.T)[:, None]
        r = points.hi if side > 0 else points.lo
        if self.parallel:
            n, d = side * (1.0 - t / r) / factors, weight / (r * factors)
        else:
            n, d = side * factors * (r - t), weight * factors
        n, d = n @ self.columns, d @ self.columns
        sides = np.full(len(points.T), side)
        return Rows(points.piece, points.T, n, d, np.zeros_like(n), sides, factors)

    def start_rows(self) -> Rows:
        """Return rows of devices with nominal values, all laws high and all low."""
        points = self._points(*spread_points(self.need, START, chebyshev=True))
        flat = np.ones_like(points.lo)
        return self._rows(points, 1, flat).joined(self._rows(points, -1, flat))

    def reach(self, x: FloatArray) -> tuple[float, Rows]:
        """Return the worst figure of shares x over the continuous range, and the rows that set it."""
        found, highest = [], -np.inf
        for side in (1, -1):
            figure, _ = self._worst(x, self.grid, side)
            at = self._peaks(figure)
            points = self._refined(x, side, at[figure[at] >= NEAR * max(highest, figure.max())])
            reached, factors = self._worst(x, points, side)
            highest = max(highest, float(figure.max()), float(reached.max(initial=-np.inf)))
            found.append((points, side, factors, reached))
        rows = [
            self._rows(_taken(points, near), side, factors[near])
            for points, side, factors, reached in found
            if (near := reached >= NEAR * highest).any()
        ]
        return highest, rows[0] if len(rows) == 1 else rows[0].joined(rows[1])

    def _peaks(self, figure: FloatArray) -> IntArray:
        """Return positions on the grid of the local maxima, the ends of every piece included."""
        piece = self.grid.piece
        edge = np.r_[True, piece[1:] != piece[:-1], True]
        before = np.where(edge[:-1], -np.inf, np.r_[-np.inf, figure[:-1]])
        after = np.where(edge[1:], -np.inf, np.r_[figure[1:], -np.inf])
        return np.nonzero((figure >= before) & (figure >= after))[0]

    def _refined(self, x: FloatArray, side: int, at: IntArray) -> _Points:
        """Return the maxima placed by two steps of parabolic interpolation."""
        pieces = [self.need.pieces[k] for k in self.grid.piece[at]]
        low, high = np.array([p.low for p in pieces]), np.array([p.high for p in pieces])
        t = self.grid.T[at].copy()
        inside = (t > low) & (t < high)
        step = (high - low) / (GRID - 1)
        for shrink in (1.0, 0.05):
            h = np.where(inside, step * shrink, 0.0)
            three = self._points(np.tile(self.grid.piece[at], 3), np.concatenate([t - h, t, t + h]))
            f0, f1, f2 = np.split(self._worst(x, three, side)[0], 3)
            bend = f0 - 2.0 * f1 + f2
            curved = inside & (np.abs(bend) > 1e-18)
            move = np.where(curved, 0.5 * (f0 - f2) / np.where(curved, bend, 1.0), 0.0)
            t = np.clip(t + h * np.clip(move, -1.0, 1.0), low, high)
        return self._points(self.grid.piece[at], t)


def _taken(points: _Points, where: BoolArray) -> _Points:
    return _Points(points.piece[where], points.T[where], points.lo[where], points.hi[where])
