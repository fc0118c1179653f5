"""Rows and columns of the drift programme: one column a material, one row pair a temperature.

For the shares x of a one-node network the figure is the least e with
``|n x - c b x| <= e d x`` in every row, where

- series:   n = r - t,        d = L,        b = 1
- parallel: n = 1 - t Gamma,  d = L Gamma,  b = Gamma   (Gamma = 1/r)

r the ratio of a material, t the wanted law, L the weight of the piece, c the free centre (b is 0
where a piece is not centred). The last column stands for the fixed members together.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.mixes import fixed_ratio
from tcplan.plan import Space

GRID = 129  # points a piece on which violations are looked for before they are refined
START = 13  # Chebyshev nodes a piece that every programme starts from


@dataclass(frozen=True, slots=True)
class Rows:
    """Some rows of a programme; n, d, b have shape (rows, materials + 1).

    ``side`` is 0 for a nominal row, which binds on both sides; a row of one device has its side of the
    goal and its value ``factors``, shape (rows, factors).
    """

    piece: IntArray
    temperature: FloatArray
    n: FloatArray
    d: FloatArray
    b: FloatArray
    side: IntArray
    factors: FloatArray

    def take(self, where: IntArray) -> Rows:
        """Return the rows at these positions."""
        return Rows(*(getattr(self, name)[where] for name in _FIELDS))

    def joined(self, other: Rows) -> Rows:
        """Return these rows and then the other ones."""
        return Rows(*(np.concatenate([getattr(self, name), getattr(other, name)]) for name in _FIELDS))

    def figures(self, x: FloatArray, centre: float) -> FloatArray:
        """Return the signed figure in every row for shares x, shape (materials + 1,)."""
        return np.asarray((self.n @ x - centre * (self.b @ x)) / (self.d @ x))


_FIELDS = ("piece", "temperature", "n", "d", "b", "side", "factors")


def spread_points(need: Requirement, count: int, *, chebyshev: bool) -> tuple[IntArray, FloatArray]:
    """Return pieces and temperatures [K]: ``count`` over each piece, its ends included."""
    z = np.cos(np.pi * np.arange(count) / (count - 1)) if chebyshev else np.linspace(1.0, -1.0, count)
    pieces, T = [], []
    for k, piece in enumerate(need.pieces):
        points = np.unique(0.5 * (piece.low + piece.high) - 0.5 * (piece.high - piece.low) * z)
        points = np.unique(np.clip(points, piece.low, piece.high))
        T.append(points)
        pieces.append(np.full(len(points), k))
    return np.concatenate(pieces), np.concatenate(T)


@dataclass(slots=True)
class Programme:
    """The columns of a space against a requirement, at any temperature, for nominal materials."""

    space: Space
    need: Requirement
    materials: Mapping[str, Material]
    names: tuple[str, ...]
    grid: Rows = field(init=False)

    def __post_init__(self) -> None:
        self.grid = self.rows(*spread_points(self.need, GRID, chebyshev=False))

    def ratios(self, temperature: FloatArray) -> FloatArray:
        """Return R(T)/R(T_ref) of every column, shape (rows, materials + 1)."""
        reference = self.need.reference
        own = [self.materials[name].ratio(temperature, reference) for name in self.names]
        return np.stack([*own, fixed_ratio(self.space, self.materials, reference, temperature)], axis=1)

    def rows(self, piece: IntArray, temperature: FloatArray) -> Rows:
        """Return the rows at these pieces and temperatures [K], both of shape (rows,)."""
        r = self.ratios(temperature)
        weight = np.array([p.weight for p in self.need.pieces])[piece][:, None]
        free = np.array([1.0 if p.centred else 0.0 for p in self.need.pieces])[piece][:, None]
        t = self.need.wanted(temperature)[:, None]
        base = 1.0 / r if self.space.arrangement == "parallel" else np.ones_like(r)
        n = 1.0 - t * base if self.space.arrangement == "parallel" else r - t
        none, sides = np.empty((len(r), 0)), np.zeros(len(r), dtype=np.intp)
        return Rows(piece, temperature, n, weight * base, free * base, sides, none)

    def start_rows(self) -> Rows:
        """Return the rows that every mix is solved on."""
        return self.rows(*spread_points(self.need, START, chebyshev=True))

    # --- what a mix reaches -------------------------------------------------------------------

    def centre(self, x: FloatArray, rows: Rows) -> float:
        """Return the centre that suits shares x best on these rows."""
        banded = rows.b[:, -1] > 0
        if not banded.any():
            return 0.0
        drift = (rows.n[banded] @ x) / (rows.b[banded] @ x)
        return float(0.5 * (drift.max() + drift.min()))

    def reach(self, x: FloatArray) -> tuple[float, Rows]:
        """Return the figure of shares x over the continuous range, and the rows that set it."""
        peaks = self._refined(x, self._grid_peaks(x))
        all_rows = self.grid.joined(peaks)
        centre = self.centre(x, all_rows)
        figure = float(np.max(np.abs(all_rows.figures(x, centre))))
        return figure, peaks

    def _grid_peaks(self, x: FloatArray) -> IntArray:
        """Return positions on the grid of the local extremes of the drift, ends included."""
        drift, piece = self.grid.figures(x, 0.0), self.grid.piece
        padded = np.r_[np.nan, drift, np.nan]
        edge = np.r_[True, piece[1:] != piece[:-1], True]
        left, right = padded[:-2].copy(), padded[2:].copy()
        left[edge[:-1]], right[edge[1:]] = np.nan, np.nan
        high = ~((left > drift) | (right > drift))
        low = ~((left < drift) | (right < drift))
        return np.nonzero(high | low)[0]

    def _refined(self, x: FloatArray, at: IntArray) -> Rows:
        """Return rows at extremes refined by two steps of parabolic interpolation."""
        piece, t = self.grid.piece[at], self.grid.temperature[at].copy()
        low = np.array([p.low for p in self.need.pieces])[piece]
        high = np.array([p.high for p in self.need.pieces])[piece]
        step = (high - low) / (GRID - 1)
        inside = (t > low) & (t < high)
        t[~inside & (t <= low)] = low[~inside & (t <= low)]
        piece, t, step = piece[inside], t[inside], step[inside]
        ends = self.grid.take(at[~inside])
        for shrink in (1.0, 0.05):
            h = step * shrink
            if not len(t):
                break
            rows = self.rows(np.tile(piece, 3), np.concatenate([t - h, t, t + h]))
            f0, f1, f2 = np.split(rows.figures(x, 0.0), 3)
            bend = f0 - 2 * f1 + f2
            move = np.where(np.abs(bend) > 1e-18, 0.5 * (f0 - f2) / np.where(bend == 0, 1.0, bend), 0.0)
            t = t + h * np.clip(move, -1.0, 1.0)
        t = np.clip(t, low[inside], high[inside])
        return ends.joined(self.rows(piece, t))
