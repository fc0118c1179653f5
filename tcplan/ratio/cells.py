r"""The extreme of a ratio over its box at some temperatures: cells, each with a bound on all its devices.

With the legs u = m r(T) and m their values at the reference, ln of the quotient is

    ln A(u) + ln B(m) - ln A(m) - ln B(u),

and ln of the resistance of any network is concave. In a cell the first two terms are at most their
tangents at its centre; what is then left is convex in the factors m, and convex in the shifts of the laws,
so it is largest at a vertex. Common spreads cancel in it to second order in the size of the cell. Cells are
halved until no device can be beyond the best one found by more than `GAP`, or the work allowed is done.

Of two resistors of one shape a bound without vertices (`tcplan.ratio.same_shape`) is tried first, where it is
nearer, to `SHAPE_GAP`; if that leaves the extreme open, both bounds count in each cell.

Long, since the bounds and the search over cells that tightens them are one argument.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.errors import InternalError
from tcplan.ratio.same_shape import SameShape, same_shape_of
from tcplan.ratio.space import Grid, Quotient, Space, log_value, material_shares
from tcplan.ratio.vertices import Cells, corner_count, corners, halved, joined, start_cells

GAP = 5e-5
LEAST_GAP = 1e-10  # a figure; what is closer is of no account
MOST_WORK = 6_000_000  # vertices, after which the bound stays as it is
POINTS = 40_000  # vertices at a time
FIRST = 4  # cells whose bounds by shape and by tangents are compared
SHAPE_CELLS = 128  # cells at a time, where no vertices are needed
CLIMBS = 24
SHAPE_WORK = 3000  # vertices that count as one of these cells
SHAPE_GAP = 9e-4  # what is nearer than this is left to it


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
        A figure that is reached already: where the quick bound of two resistors of one shape is not above
        it, no more is searched.
    work : int
        Vertices after which the bound stays as it is.
    """
    shape = same_shape_of(space.pair)
    search = _Search(space, grid, space.quotient(up=up), shape)
    cells, best = start_cells(space, len(grid.T)), Side(-np.inf, np.inf, np.empty(0), 0, up)
    if shape is None:
        return _by_tangents(search, cells, best, work)
    cells, best, nearer = _shaped(search, cells, best)
    if not nearer:
        return _by_tangents(search, cells, best, work)
    quick = _by_shape(search, cells, best, work // SHAPE_WORK)
    enough = max(quick.figure, floor)
    if quick.upper <= enough + max(SHAPE_GAP * abs(enough), LEAST_GAP):
        return quick
    found = _by_tangents(search, cells, quick, work)
    return replace(found, upper=min(found.upper, max(quick.upper, found.figure)))


def _by_tangents(search: _Search, cells: Cells, best: Side, work: int) -> Side:
    """Return the extreme by the bound at the vertices of cells; work counts these."""
    space, closed = search.space, -np.inf
    while len(cells):
        done = _done(cells, best.figure)
        if best.point.size:
            closed = max(closed, float(cells.bound[done].max(initial=-np.inf)))
            cells = cells.taken(~done)
        if not len(cells) or work <= 0:
            break
        cells = cells.taken(np.argsort(-cells.bound, kind="stable"))
        count = max(1, POINTS // corner_count(space, cells))
        now, cells = cells.taken(slice(count)), cells.taken(slice(count, None))
        work -= len(now) * corner_count(space, now)
        now = replace(now, bound=np.minimum(now.bound, _shape_bound(search, now)))
        found, best = _examined(search, now, best)
        cells = joined(cells, found)
    return _ended(best, closed, cells)


@dataclass(frozen=True, slots=True, eq=False)
class _Search:
    """What is searched: the box, the temperatures, the quotient, the shape of both resistors if it is one."""

    space: Space
    grid: Grid
    quotient: Quotient
    shape: SameShape | None


def _done(cells: Cells, enough: float) -> BoolArray:
    return np.asarray(cells.bound <= enough + max(GAP * abs(enough), LEAST_GAP))


def _ended(best: Side, closed: float, cells: Cells) -> Side:
    if not best.point.size:
        raise InternalError("a box of ratios without a device")
    left = float(cells.bound.max(initial=-np.inf))
    return Side(best.figure, max(best.figure, closed, left), best.point, best.at, best.up)


# --- two resistors of one shape -----------------------------------------------------------------------


def _shaped(search: _Search, cells: Cells, best: Side) -> tuple[Cells, Side, bool]:
    """Return the first cells with the bound by shape, and whether it is nearer than that by tangents."""
    cells = replace(cells, bound=_shape_bound(search, cells))
    first = cells.taken(np.argsort(-cells.bound, kind="stable")[:FIRST])
    kept = np.asarray(corners(search.space, first)[1].any(axis=1))
    if not kept.any():
        return cells, best, False
    tangents, best = _examined(search, replace(first, bound=np.full(len(first), np.inf)), best)
    return cells, best, bool(float(first.bound[kept].max()) < float(tangents.bound.max()))


def _shape_bound(search: _Search, cells: Cells) -> FloatArray:
    if search.shape is None:
        return np.full(len(cells), np.inf)
    log = search.shape.bound(search.space, search.grid, cells, up=search.quotient.up)
    return _figure(search.grid, cells.at, log, search.quotient.up)


def _by_shape(search: _Search, cells: Cells, best: Side, work: int) -> Side:
    """Return the extreme by the bound that needs no vertices; work counts cells."""
    best, closed = _climbed(search, best), -np.inf
    while len(cells):
        done = _done(cells, best.figure)
        closed = max(closed, float(cells.bound[done].max(initial=-np.inf)))
        cells = cells.taken(~done)
        if not len(cells) or work <= 0:
            break
        cells = cells.taken(np.argsort(-cells.bound, kind="stable"))
        now, cells = cells.taken(slice(SHAPE_CELLS)), cells.taken(slice(SHAPE_CELLS, None))
        work -= len(now)
        split = halved(now, _narrowing(search, now))
        split = replace(split, bound=np.minimum(split.bound, _shape_bound(search, split)))
        centre = 0.5 * (split.low + split.high)
        best = _reached(search, split, centre, _tracks(search.space, centre), best)
        cells = joined(cells, split)
    return _ended(best, closed, cells)


def _climbed(search: _Search, best: Side) -> Side:
    """Return the best device that is reached from one by putting coordinate after coordinate at a limit."""
    space = search.space
    moving = np.flatnonzero(space.half > 0.0)
    at = np.full(2 * len(moving), best.at)
    for _ in range(CLIMBS):
        z = np.tile(best.point, (len(at), 1))
        z[np.arange(len(at)), np.tile(moving, 2)] = np.concatenate([space.half[moving], -space.half[moving]])
        tried = _reached(search, Cells(z, z, at, np.full(len(at), np.inf)), z, _tracks(space, z), best)
        if tried.figure <= best.figure:
            break
        best = tried
    return best


def _narrowing(search: _Search, cells: Cells) -> IntArray:
    """Return the coordinate of each cell without whose width its bound would be least."""
    count = cells.low.shape[1]
    which = np.tile(np.arange(len(cells)), count)
    along = np.repeat(np.arange(count), len(cells))
    flat = cells.taken(which)
    middle = 0.5 * (flat.low + flat.high)
    rows = np.arange(len(flat))
    low, high = flat.low.copy(), flat.high.copy()
    low[rows, along] = high[rows, along] = middle[rows, along]
    bound = _shape_bound(search, replace(flat, low=low, high=high)).reshape(count, len(cells)).T
    wide = cells.high > cells.low
    return np.asarray(np.argmin(np.where(wide, bound, np.inf), axis=1))


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


def _local(space: Space, grid: Grid, cells: Cells, up: bool) -> _Local:
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


def _examined(search: _Search, cells: Cells, best: Side) -> tuple[Cells, Side]:
    """Return the halves of cells with the bounds of the wholes, and the best device so far."""
    space, grid, quotient = search.space, search.grid, search.quotient
    local = _local(space, grid, cells, quotient.up)
    points, there = corners(space, cells)
    tangent = _Tangent.at(space, quotient, local)
    value = tangent.above(points) - _subtracted(space, quotient, local, points)
    value[~there] = -np.inf
    bound = np.minimum(cells.bound, _figure(grid, cells.at, value.max(axis=1), quotient.up))
    rows, kept = np.arange(len(cells)), np.asarray(there.any(axis=1))
    best = _reached(search, cells, points[rows, value.argmax(axis=1)], kept, best)
    best = _reached(search, cells, local.centre, _tracks(space, local.centre), best)
    whole = replace(cells, bound=bound)
    split = _widest(space, tangent, local, cells)
    return halved(whole.taken(kept), split[kept]), best


def _reached(search: _Search, cells: Cells, z: FloatArray, real: BoolArray, best: Side) -> Side:
    """Return the best of a device and of one point of each cell, where that is one of the box."""
    space, grid, quotient = search.space, search.grid, search.quotient
    laws = _exact_laws(space, grid, cells.at, space.apart(grid.T[cells.at], up=quotient.up), z)
    reached = _figure(grid, cells.at, _log(space, quotient, laws, z), quotient.up)
    reached[~real] = -np.inf
    k = int(np.argmax(reached))
    if reached[k] <= best.figure:
        return best
    return Side(float(reached[k]), np.inf, z[k].copy(), int(cells.at[k]), quotient.up)


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


def _widest(space: Space, tangent: _Tangent, local: _Local, cells: Cells) -> IntArray:
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


def temperatures(space: Space, count: int) -> Iterator[tuple[FloatArray, FloatArray, bool]]:
    """Yield for each piece of the goal its temperatures [K], their weights, and whether it is centred."""
    for piece in space.pair.need.pieces:
        points = np.linspace(piece.low, piece.high, count if piece.high > piece.low else 1)
        yield points, np.full(len(points), piece.weight), piece.centred
