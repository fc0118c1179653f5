"""Cells of the box of a pair: where they start, their vertices, and their halves."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.ratio.space import Space


@dataclass(frozen=True, slots=True, eq=False)
class Cells:
    """Cells, shape (cells, coordinates), each at one temperature of the grid."""

    low: FloatArray
    high: FloatArray
    at: IntArray
    bound: FloatArray

    def taken(self, which: IntArray | BoolArray | slice) -> Cells:
        """Return some of the cells."""
        return Cells(self.low[which], self.high[which], self.at[which], self.bound[which])

    def __len__(self) -> int:
        return len(self.at)


def start_cells(space: Space, temperatures: int) -> Cells:
    """Return the cells that hold every ratio of the box, at each temperature."""
    moving, scales = space.moving_values()
    low, high = -space.half, space.half.copy()
    for group in range(space.groups):
        if group not in moving:
            low[group] = high[group] = 0.0
    lows, highs = [], []
    for group in moving if scales else [-1]:
        lows.append(low.copy())
        highs.append(high.copy())
        if group >= 0:
            lows[-1][group] = 1.0
    faces = len(lows)
    at = np.tile(np.arange(temperatures), faces)
    pick = np.repeat(np.arange(faces), temperatures)
    return Cells(np.stack(lows)[pick], np.stack(highs)[pick], at, np.full(len(at), np.inf))


def joined(one: Cells, other: Cells) -> Cells:
    """Return the cells of both."""
    return Cells(
        np.concatenate([one.low, other.low]),
        np.concatenate([one.high, other.high]),
        np.concatenate([one.at, other.at]),
        np.concatenate([one.bound, other.bound]),
    )


def corner_count(space: Space, cells: Cells) -> int:
    """Return how many vertices each of these cells has at most."""
    tracked = [at for at, _ in space.tracked]
    within = {int(k) + space.groups for at in tracked for k in at}
    free = [j for j in np.flatnonzero((cells.high > cells.low).any(axis=0)) if int(j) not in within]
    return int(2 ** len(free) * np.prod([4 * len(at) * 2 ** len(at) for at in tracked]))


def corners(space: Space, cells: Cells) -> tuple[FloatArray, BoolArray]:
    """Return the vertices of cells, shape (cells, vertices, coordinates), and which of them there are."""
    points = 0.5 * (cells.low + cells.high)[:, None, :]
    there = np.ones(points.shape[:2], dtype=bool)
    within = {int(k) + space.groups for at, _ in space.tracked for k in at}
    for j in np.flatnonzero((cells.high > cells.low).any(axis=0)):
        if int(j) not in within:
            both = [points.copy(), points]
            both[0][:, :, j], both[1][:, :, j] = cells.low[:, None, j], cells.high[:, None, j]
            points, there = np.concatenate(both, axis=1), np.concatenate([there, there], axis=1)
    for at, most in space.tracked:
        own = at + space.groups
        options, possible = _tracked_corners(cells.low[:, own], cells.high[:, own], most)
        count = points.shape[1]
        points = np.repeat(points, options.shape[1], axis=1)
        points[:, :, own] = np.tile(options, (1, count, 1))
        there = np.repeat(there, options.shape[1], axis=1) & np.tile(possible, (1, count))
    return points, there


def _tracked_corners(low: FloatArray, high: FloatArray, most: float) -> tuple[FloatArray, BoolArray]:
    """Return the vertices of a box whose coordinates differ by ``most`` at most.

    With c the least of them, each lies between max(low, c) and min(high, c + most); at a vertex c is the
    limit of one coordinate, or that less ``most``, and each coordinate is at one end.
    """
    least = np.concatenate([low, high, low - most, high - most], axis=1)[:, :, None]
    lower, upper = np.maximum(low[:, None, :], least), np.minimum(high[:, None, :], least + most)
    possible = (lower <= upper).all(axis=2)
    sides = np.array(list(product((0, 1), repeat=low.shape[1])))
    ends = np.where(sides[None, None] == 1, upper[:, :, None], lower[:, :, None])
    count = len(low)
    return ends.reshape(count, -1, low.shape[1]), np.repeat(possible, len(sides), axis=1)


def halved(cells: Cells, along: IntArray) -> Cells:
    """Return both halves of each cell; one that is a single point is done, and stays as one."""
    rows = np.arange(len(cells))
    middle = 0.5 * (cells.low + cells.high)[rows, along]
    low, high = cells.low.copy(), cells.high.copy()
    low[rows, along] = high[rows, along] = middle
    first = Cells(cells.low, high, cells.at, cells.bound)
    second = Cells(low, cells.high, cells.at, cells.bound)
    return joined(first, second)
