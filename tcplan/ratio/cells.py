r"""The extreme of a ratio over its box at some temperatures: cells, each with a bound on all its devices.

With the legs u = m r(T) and m their values at the reference, ln of the quotient is

    ln A(u) + ln B(m) - ln A(m) - ln B(u),

and ln of the resistance of any network is concave. In a cell the first two terms are at most their
tangents at its centre; what is then left is convex in the factors m, and convex in the shifts of the laws,
so it is largest at a vertex. Common spreads cancel in it to second order in the size of the cell. Cells are
halved until no device can be beyond the best one found by more than `GAP`, or the work allowed is done.

Long, since the bound, the cells and the vertices that it is taken at are one argument.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import product

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.errors import InternalError
from tcplan.ratio.space import Grid, Quotient, Space, log_value, material_shares

GAP = 5e-5
LEAST_GAP = 1e-10  # a figure; what is closer is of no account
MOST_WORK = 6_000_000  # vertices, after which the bound stays as it is
POINTS = 40_000  # vertices at a time


@dataclass(frozen=True, slots=True, eq=False)
class Side:
    """The worst device found on one side: its figure, its point, the position of its temperature.

    No device is above ``upper`` at the temperatures that were asked for.
    """

    figure: float
    upper: float
    point: FloatArray
    at: int
    up: bool


@dataclass(frozen=True, slots=True, eq=False)
class _Cells:
    """Cells, shape (cells, coordinates), each at one temperature of the grid."""

    low: FloatArray
    high: FloatArray
    at: IntArray
    bound: FloatArray

    def taken(self, which: IntArray | BoolArray | slice) -> _Cells:
        return _Cells(self.low[which], self.high[which], self.at[which], self.bound[which])

    def __len__(self) -> int:
        return len(self.at)


def side_extreme(
    space: Space, grid: Grid, *, up: bool, floor: float = -np.inf, work: int = MOST_WORK
) -> Side:
    """Return how far above (or below) what is wanted the ratio goes, in figures of the goal.

    Parameters
    ----------
    space : Space
    grid : Grid
    up : bool
        Above; else below.
    floor : float
        A figure that is reached already: what cannot pass it is not searched.
    work : int
        Vertices after which the bound stays as it is.
    """
    quotient = space.quotient(up=up)
    cells, best, closed = _start(space, len(grid.T)), Side(-np.inf, np.inf, np.empty(0), 0, up), -np.inf
    while len(cells):
        enough = max(best.figure, floor)
        done = np.asarray(cells.bound <= enough + max(GAP * abs(enough), LEAST_GAP))
        if best.point.size:
            closed = max(closed, float(cells.bound[done].max(initial=-np.inf)))
            cells = cells.taken(~done)
        if not len(cells) or work <= 0:
            break
        cells = cells.taken(np.argsort(-cells.bound, kind="stable"))
        count = max(1, POINTS // _corner_count(space, cells))
        now, cells = cells.taken(slice(count)), cells.taken(slice(count, None))
        work -= len(now) * _corner_count(space, now)
        found, best = _examined(space, grid, quotient, now, best)
        cells = _joined(cells, found)
    if not best.point.size:
        raise InternalError("a box of ratios without a device")
    left = float(cells.bound.max(initial=-np.inf))
    return Side(best.figure, max(best.figure, closed, left), best.point, best.at, up)


# --- cells --------------------------------------------------------------------------------------------


def _start(space: Space, temperatures: int) -> _Cells:
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
    return _Cells(np.stack(lows)[pick], np.stack(highs)[pick], at, np.full(len(at), np.inf))


def _joined(one: _Cells, other: _Cells) -> _Cells:
    return _Cells(
        np.concatenate([one.low, other.low]),
        np.concatenate([one.high, other.high]),
        np.concatenate([one.at, other.at]),
        np.concatenate([one.bound, other.bound]),
    )


def _corner_count(space: Space, cells: _Cells) -> int:
    """Return how many vertices each of these cells has at most."""
    tracked = [at for at, _ in space.tracked]
    within = {int(k) + space.groups for at in tracked for k in at}
    free = [j for j in np.flatnonzero((cells.high > cells.low).any(axis=0)) if int(j) not in within]
    return int(2 ** len(free) * np.prod([4 * len(at) * 2 ** len(at) for at in tracked]))


def _corners(space: Space, cells: _Cells) -> tuple[FloatArray, BoolArray]:
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


# --- bounds -------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True, eq=False)
class _Local:
    """The laws of cells, linear in the shifts about the centres, with what that leaves out."""

    centre: FloatArray
    law: FloatArray
    per_tc1: FloatArray
    per_tc2: FloatArray
    missed: FloatArray
    apart: FloatArray

    def laws(self, space: Space, z: FloatArray) -> FloatArray:
        """Return the laws at points, shape (2, cells, points, materials)."""
        tc1 = space.tc1(z) - space.tc1(self.centre)[:, None]
        tc2 = space.tc2(z) - space.tc2(self.centre)[:, None]
        common = self.law[:, None] + tc1 * self.per_tc1[:, None] + tc2 * self.per_tc2[:, None]
        return np.asarray(common[None] + self.apart[:, :, None])


def _local(space: Space, grid: Grid, cells: _Cells, up: bool) -> _Local:
    """Return the laws about the centres: (P + dP)/(Q + dQ) = P/Q + linear - linear dQ/(Q + dQ)."""
    centre, wide = 0.5 * (cells.low + cells.high), 0.5 * (cells.high - cells.low)
    x = grid.x[cells.at]
    at_reference = space.base + space.tc1(centre) * space.x + space.tc2(centre) * space.x**2
    law = (grid.base[cells.at] + space.tc1(centre) * x + space.tc2(centre) * x**2) / at_reference
    per_tc1, per_tc2 = (x - law * space.x) / at_reference, (x**2 - law * space.x**2) / at_reference
    linear = space.tc1(wide) * np.abs(per_tc1) + space.tc2(wide) * np.abs(per_tc2)
    below = space.tc1(wide) * np.abs(space.x) + space.tc2(wide) * space.x**2
    missed = linear * below / (at_reference - below)
    return _Local(centre, law, per_tc1, per_tc2, missed, space.apart(grid.T[cells.at], up=up))


def _exact_laws(space: Space, grid: Grid, at: IntArray, apart: FloatArray, z: FloatArray) -> FloatArray:
    """Return the laws at one point of each cell, shape (2, cells, materials)."""
    x = grid.x[at]
    above = grid.base[at] + space.tc1(z) * x + space.tc2(z) * x**2
    below = space.base + space.tc1(z) * space.x + space.tc2(z) * space.x**2
    return np.asarray((above / below)[None] + apart)


def _examined(space: Space, grid: Grid, quotient: Quotient, cells: _Cells, best: Side) -> tuple[_Cells, Side]:
    """Return the halves of cells with the bounds of the wholes, and the best device so far."""
    local = _local(space, grid, cells, quotient.up)
    points, there = _corners(space, cells)
    tangent = _Tangent.at(space, quotient, local)
    value = tangent.above(points) - _subtracted(space, quotient, local, points)
    value[~there] = -np.inf
    bound = _figure(grid, cells.at, value.max(axis=1), quotient.up)
    rows = np.arange(len(cells))
    highest = points[rows, value.argmax(axis=1)]
    for z, real in ((highest, there.any(axis=1)), (local.centre, _tracks(space, local.centre))):
        laws = _exact_laws(space, grid, cells.at, local.apart, z)
        reached = _figure(grid, cells.at, _log(space, quotient, laws, z), quotient.up)
        reached[~real] = -np.inf
        k = int(np.argmax(reached))
        if reached[k] > best.figure:
            best = Side(float(reached[k]), np.inf, z[k].copy(), int(cells.at[k]), quotient.up)
    kept = np.asarray(there.any(axis=1))
    whole = _Cells(cells.low, cells.high, cells.at, bound)
    split = _widest(space, tangent, local, cells)
    return _halved(whole.taken(kept), split[kept]), best


def _figure(grid: Grid, at: IntArray, log: FloatArray, up: bool) -> FloatArray:
    """Return the figures of logarithms of the quotient."""
    with np.errstate(over="ignore"):
        off = np.exp(log) - grid.wanted[at] if up else grid.wanted[at] - np.exp(-log)
    return np.asarray(off / grid.weight[at])


def _log(space: Space, quotient: Quotient, laws: FloatArray, z: FloatArray) -> FloatArray:
    """Return ln of the quotient at points."""
    total = np.zeros(laws.shape[1:-1])
    for sign, network, plain in zip((1.0, -1.0), quotient.networks, quotient.plain, strict=True):
        m = np.ones_like(laws) if plain else np.broadcast_to(space.factors(z), laws.shape)
        total += sign * (
            log_value(network, space.names, m * laws) - log_value(network, space.names, m * np.ones(()))
        )
    return total


def _subtracted(space: Space, quotient: Quotient, local: _Local, z: FloatArray) -> FloatArray:
    """Return ln A(m) + ln B(u) at points, the laws of B at their least."""
    (top, bottom), (top_plain, bottom_plain) = quotient.networks, quotient.plain
    laws = local.laws(space, z) - local.missed[None, :, None]
    m = np.broadcast_to(space.factors(z), laws.shape)
    one = np.ones(()) if bottom_plain else m
    own = np.ones_like(laws) if top_plain else m
    return log_value(top, space.names, own) + log_value(bottom, space.names, one * laws)


@dataclass(frozen=True, slots=True, eq=False)
class _Tangent:
    """The tangents of ln A(u) and ln B(m) at the centres of cells."""

    space: Space
    quotient: Quotient
    local: _Local
    level: FloatArray
    of_top: FloatArray
    of_bottom: FloatArray

    @staticmethod
    def at(space: Space, quotient: Quotient, local: _Local) -> _Tangent:
        """Return the tangents; as both are homogeneous, their slopes times the centre sum to 1."""
        laws = local.laws(space, local.centre[:, None])[:, :, 0]
        m = np.broadcast_to(space.factors(local.centre), laws.shape)
        top = laws if quotient.plain[0] else m * laws
        bottom = np.ones_like(laws) if quotient.plain[1] else m
        networks = quotient.networks
        level = log_value(networks[0], space.names, top) + log_value(networks[1], space.names, bottom)
        of_top = material_shares(networks[0], space.names, top) / top
        return _Tangent(
            space,
            quotient,
            local,
            level - 2.0,
            of_top,
            material_shares(networks[1], space.names, bottom) / bottom,
        )

    def above(self, z: FloatArray) -> FloatArray:
        """Return the tangents at points, shape (cells, points), the laws of A at their highest."""
        u, m = self._legs(z, self.local.missed)
        return self._tangents(u, m)

    def misses(self, z: FloatArray) -> FloatArray:
        """Return by how much the tangents are above what they stand for."""
        u, m = self._legs(z, np.zeros_like(self.local.missed))
        networks, names = self.quotient.networks, self.space.names
        return self._tangents(u, m) - log_value(networks[0], names, u) - log_value(networks[1], names, m)

    def _legs(self, z: FloatArray, more: FloatArray) -> tuple[FloatArray, FloatArray]:
        laws = self.local.laws(self.space, z) + more[None, :, None]
        m = np.broadcast_to(self.space.factors(z), laws.shape)
        return (laws if self.quotient.plain[0] else m * laws), (
            np.ones_like(laws) if self.quotient.plain[1] else m
        )

    def _tangents(self, u: FloatArray, m: FloatArray) -> FloatArray:
        rise = np.einsum("scn,scpn->cp", self.of_top, u) + np.einsum("scn,scpn->cp", self.of_bottom, m)
        return np.asarray(self.level[:, None] + rise)


def _tracks(space: Space, z: FloatArray) -> BoolArray:
    """Return whether points keep to the tracking of the materials."""
    kept = np.ones(len(z), dtype=bool)
    for at, most in space.tracked:
        kept &= np.ptp(space.tc1(z)[:, at], axis=1) <= most * (1.0 + 1e-12)
    return kept


# --- halving ------------------------------------------------------------------------------------------


def _widest(space: Space, tangent: _Tangent, local: _Local, cells: _Cells) -> IntArray:
    """Return the coordinate of each cell along which the tangents miss most."""
    wide = 0.5 * (cells.high - cells.low)
    steps = np.eye(wide.shape[1])[None] * wide[:, None, :]
    centre = local.centre[:, None, :]
    missed = sum(tangent.misses(centre + sign * steps) for sign in (1.0, -1.0))
    score = np.asarray(missed) + _left_out(space, local)
    # Without anything missed the widest side is as good as any.
    relative = wide / np.where(space.half > 0.0, space.half, 1.0)
    return np.asarray(np.argmax(np.where(wide > 0.0, score + 1e-15 * relative, -np.inf), axis=1))


def _left_out(space: Space, local: _Local) -> FloatArray:
    """Return what the linear laws leave out, for the coordinates of their shifts."""
    missed = local.missed
    return np.concatenate([np.zeros((len(missed), space.groups)), missed, missed], axis=1)


def _halved(cells: _Cells, along: IntArray) -> _Cells:
    """Return both halves of each cell; one that is a single point is done, and stays as one."""
    rows = np.arange(len(cells))
    middle = 0.5 * (cells.low + cells.high)[rows, along]
    low, high = cells.low.copy(), cells.high.copy()
    low[rows, along] = high[rows, along] = middle
    first = _Cells(cells.low, high, cells.at, cells.bound)
    second = _Cells(low, cells.high, cells.at, cells.bound)
    return _joined(first, second)


def temperatures(space: Space, count: int) -> Iterator[tuple[FloatArray, FloatArray, bool]]:
    """Yield for each piece of the goal its temperatures [K], their weights, and whether it is centred."""
    for piece in space.pair.need.pieces:
        points = np.linspace(piece.low, piece.high, count if piece.high > piece.low else 1)
        yield points, np.full(len(points), piece.weight), piece.centred
