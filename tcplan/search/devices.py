"""Devices at the corners of the spread box, for many trees at once: the rows of a worst-case search.

A row is one temperature, one side of the goal and one corner of the value factors of a tree. All laws
sit at their highest on the upper side and at their lowest on the lower one; the ratio of the device is
R(T) of its legs over their R(T_ref), so a leg has two numbers a row, and not one. The corner with
all factors low is left out: scaled up, it is another point of the box.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.mixes import KindBounds, kind_half_widths
from tcplan.process import Variation
from tcplan.search.mixed import Source

ALL_CORNERS = 4  # coordinates up to which all corners are looked at


@dataclass(frozen=True, slots=True)
class Devices:
    """The goal at some temperatures, and what the devices of any tree are made of.

    ``lo`` and ``hi``, shape (kinds, T), bound the law ratios of every material and last of the fixed
    members; ``half`` are the half-widths of their value factors, and kinds of one of the ``groups`` move
    in full step.
    """

    T: FloatArray
    weight: FloatArray
    wanted: FloatArray
    lo: FloatArray
    hi: FloatArray
    half: FloatArray
    groups: IntArray

    @property
    def count(self) -> int:
        """About how many rows a tree of three materials has."""
        return 14 * len(self.T)

    def corners(self, kinds: IntArray) -> FloatArray:
        """Return the value factors at the corners, shape (trees, corners, legs), of legs of these kinds."""
        own = self.groups[kinds]
        first = (own[:, :, None] == own[:, None, :]).argmax(axis=2)  # of the legs of one coordinate
        leads = first == np.arange(own.shape[1])
        position = np.take_along_axis(np.cumsum(leads, axis=1) - 1, first, axis=1)
        signs = _signs(int(position.max()) + 1)
        return np.asarray(1.0 + self.half[kinds][:, None, :] * signs[:, position].transpose(1, 0, 2))

    def legs(self, kinds: IntArray) -> tuple[list[FloatArray], list[FloatArray]]:
        """Return R(T) and R(T_ref) of every leg, each of the shape (trees, 1, rows).

        The rows are ordered by side, corner and temperature.
        """
        factors = self.corners(kinds)
        hot, cold = [], []
        for leg in range(kinds.shape[1]):
            m = factors[:, :, leg][:, None, :, None]
            laws = np.stack([self.hi[kinds[:, leg]], self.lo[kinds[:, leg]]], axis=1)[:, :, None, :]
            hot.append((m * laws).reshape(len(kinds), 1, -1))
            cold.append(
                np.broadcast_to(m, np.broadcast_shapes(m.shape, laws.shape)).reshape(len(kinds), 1, -1)
            )
        return hot, cold

    def sides(self, rows: int) -> FloatArray:
        """Return the side of every row, 1 or -1."""
        return np.repeat([1.0, -1.0], rows // 2)

    def figures(self, curve: FloatArray) -> FloatArray:
        """Return the worst figure of ratios R(T)/R(T_ref), rows last."""
        rows = curve.shape[-1]
        value = curve - np.tile(self.wanted, rows // len(self.T))
        value *= self.sides(rows) / np.tile(self.weight, rows // len(self.T))
        return np.asarray(value.max(axis=-1))


def _signs(count: int) -> FloatArray:
    """Return the corners of so many coordinates, without the lowest; with many, only the plain ones."""
    if count <= ALL_CORNERS:
        return np.array(list(product((1.0, -1.0), repeat=count))[:-1]).reshape(-1, count)
    flips = 1.0 - 2.0 * np.eye(count)
    return np.vstack([np.ones(count), flips, -flips])


def devices_at(
    source: Source,
    variation: Variation,
    piece: IntArray,
    T: FloatArray,
    bounds: KindBounds | None = None,
) -> Devices:
    """Return the devices at these pieces and temperatures [K]; ``bounds`` saves making them anew."""
    need = source.need
    own = bounds or KindBounds(source.space, source.materials, variation, need.reference)
    lo, hi = own.at(T)
    half, groups = kind_half_widths(source.space, source.materials, variation, need.reference)
    weight = np.array([p.weight for p in need.pieces])[piece]
    return Devices(T=T, weight=weight, wanted=need.wanted(T), lo=lo, hi=hi, half=half, groups=groups)
