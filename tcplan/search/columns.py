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
from dataclasses import dataclass

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
    """Some rows of the programme; n, d, b have shape (rows, materials + 1)."""

    piece: IntArray
    temperature: FloatArray
    n: FloatArray
    d: FloatArray
    b: FloatArray

    def take(self, where: IntArray) -> Rows:
        """Return the rows at these positions."""
        return Rows(self.piece[where], self.temperature[where], self.n[where], self.d[where], self.b[where])

    def joined(self, other: Rows) -> Rows:
        """Return these rows and then the other ones."""
        return Rows(
            np.concatenate([self.piece, other.piece]),
            np.concatenate([self.temperature, other.temperature]),
            np.vstack([self.n, other.n]),
            np.vstack([self.d, other.d]),
            np.vstack([self.b, other.b]),
        )

    def figures(self, x: FloatArray, centre: float) -> FloatArray:
        """Return the signed figure in every row for shares x, shape (materials + 1,)."""
        return np.asarray((self.n @ x - centre * (self.b @ x)) / (self.d @ x))


@dataclass(frozen=True, slots=True)
class Programme:
    """The columns of a space against a requirement, at any temperature."""

    space: Space
    need: Requirement
    materials: Mapping[str, Material]
    names: tuple[str, ...]

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
        return Rows(piece, temperature, n, weight * base, free * base)

    def spread_rows(self, count: int, *, chebyshev: bool) -> Rows:
        """Return ``count`` rows over every piece, its ends included (one row for a point)."""
        pieces, temperatures = [], []
        for index, piece in enumerate(self.need.pieces):
            z = np.cos(np.pi * np.arange(count) / (count - 1)) if chebyshev else np.linspace(1, -1, count)
            points = 0.5 * (piece.low + piece.high) - 0.5 * (piece.high - piece.low) * z
            points = np.unique(np.clip(points, piece.low, piece.high))
            temperatures.append(points)
            pieces.append(np.full(len(points), index))
        return self.rows(np.concatenate(pieces), np.concatenate(temperatures))
