r"""A bound on the ratio of two resistors of one shape, in which what they share cancels exactly.

Let N be the resistance of the shape by the ln of its legs, the first resistor N(a + m), the second
N(b + m), with m the value factors that both share, and their laws r + s and r - s. With d = a - b the ln of
the gain's drift is

    [N(b + m, r + s) - N(b + m, r - s)] + [N(a + m, r + s) - N(b + m, r + s) - N(a + m, 1) + N(b + m, 1)].

The first bracket is the integral of the shares p of the legs times s/(r + t s) over t from -1 to 1: what is
averaged is convex in t, so it is at most the sum at both ends. The second is the integral of the second
derivative of N along d and along l = ln(r + s); in a node of series it is the mean of those of its members,
by their shares, plus the covariance of their d and l, in one of parallel minus it. Shares lie in intervals
over a cell. So tracking comes in by its share, and unequal shares by d times l: spreads that both resistors
have in common come in nowhere else.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.network import Leg, Network, Parallel, Series, legs, value
from tcplan.ratio.pair import Pair, normal_form
from tcplan.ratio.space import EQUAL, Grid, Space
from tcplan.ratio.vertices import Cells

STEPS = 4  # parts of the way from the laws at the reference to those at a temperature

Range = tuple[FloatArray, FloatArray]
"""The lowest and the highest of something, shape (.., cells)."""


@dataclass(frozen=True, slots=True, eq=False)
class SameShape:
    """Two resistors of one shape: its tree, and by leg the material and ln of the value in each."""

    tree: Network
    material: tuple[int, ...]
    first: FloatArray
    second: FloatArray
    divider: bool

    def bound(self, space: Space, grid: Grid, cells: Cells, *, up: bool) -> FloatArray:
        """Return what ln of the quotient (of its inverse without ``up``) is at most in cells.

        The quotient is that of `tcplan.ratio.space.Space.quotient`, its drift at the temperatures of the
        cells.
        """
        # A divider rises when the gain falls: then the resistors change places.
        turned = self.divider == up
        own, other = (self.second, self.first) if turned else (self.first, self.second)
        values = self._values(space, cells)
        gain = _gain_bound(
            self.tree, own, other, values, self._laws(space, grid, cells), self._half(space, grid, cells)
        )
        if not self.divider:
            return gain
        rest = self._rest(values)
        # q is 1/(1 + p (g - 1)) of its value at the reference, with p that part and g the gain's drift.
        if up:
            away = np.expm1(-gain)
            return np.asarray(-np.log1p(np.where(away < 0.0, rest[1], rest[0]) * away))
        away = np.expm1(gain)
        return np.asarray(np.log1p(np.where(away < 0.0, rest[0], rest[1]) * away))

    def _half(self, space: Space, grid: Grid, cells: Cells) -> FloatArray:
        """Return half of what tracking puts the two laws apart, by leg."""
        half = np.abs(space.apart(grid.T, up=True)[0])
        return np.asarray(half[cells.at].T[list(self.material)])

    def _values(self, space: Space, cells: Cells) -> Range:
        """Return ln of the value factors by leg."""
        ends = space.factors(cells.low), space.factors(cells.high)
        own = list(self.material)
        return np.asarray(np.log(ends[0]).T[own]), np.asarray(np.log(ends[1]).T[own])

    def _laws(self, space: Space, grid: Grid, cells: Cells) -> Range:
        """Return the common laws by leg: a quotient of linear functions is extreme at a vertex."""
        x, base = grid.x[cells.at], grid.base[cells.at]
        found = [
            (base + one * x + two * x**2) / (space.base + one * space.x + two * space.x**2)
            for one in (space.tc1(cells.low), space.tc1(cells.high))
            for two in (space.tc2(cells.low), space.tc2(cells.high))
        ]
        own = list(self.material)
        return np.min(found, axis=0).T[own], np.max(found, axis=0).T[own]

    def _rest(self, values: Range) -> Range:
        """Return the part of the first resistor in a divider at the reference."""
        off = (self.first - self.second)[:, None]
        shares = leg_share_ranges(self.tree, _between(self.first, self.second, values))
        gain = np.exp(_least(shares, off)), np.exp(_most(shares, off))
        return gain[0] / (1.0 + gain[0]), gain[1] / (1.0 + gain[1])


def same_shape_of(pair: Pair) -> SameShape | None:
    """Return the shape that both resistors of a pair have, None where they have none in common."""
    networks = pair.ratio.first, pair.ratio.second
    first, second = (normal_form(network) for network in networks)
    if not _same(first, second):
        return None
    logs = [
        np.log([leg.ohms * value(network) for leg in legs(form)])
        for form, network in zip((first, second), networks, strict=True)
    ]
    return SameShape(
        tree=first,
        material=tuple(pair.names.index(leg.material) for leg in legs(first)),
        first=logs[0],
        second=logs[1],
        divider=pair.ratio.kind == "divider",
    )


def _same(one: Network, other: Network) -> bool:
    """Whether two networks differ in the values of their legs at most."""
    if isinstance(one, Leg) or isinstance(other, Leg):
        return isinstance(one, Leg) and isinstance(other, Leg) and one.material == other.material
    own, others = one.children, other.children
    return type(one) is type(other) and len(own) == len(others) and all(map(_same, own, others))


# --- the two brackets ---------------------------------------------------------------------------------


def _gain_bound(
    tree: Network, own: FloatArray, other: FloatArray, values: Range, laws: Range, half: FloatArray
) -> FloatArray:
    """Return what ln of the gain own/other, over that at the reference, is at most."""
    high = np.log(laws[0] + half), np.log(laws[1] + half)
    low = np.log(laws[0] - half)
    logs = _between(other, other, values)
    shares = leg_share_ranges(tree, (logs[0] + low, logs[1] + high[1]))
    tracked = sum(_most(shares, half / (laws[0] + end * half)) for end in (-1.0, 1.0))
    off = own - other
    if float(np.ptp(off)) <= EQUAL:
        return np.asarray(tracked)
    return np.asarray(tracked + _unequal(tree, off, _between(own, other, values), high))


def _unequal(tree: Network, off: FloatArray, logs: Range, law: Range) -> FloatArray:
    """Return what unequal shares add at most: the mean of the second derivative on the way of the laws."""
    total = np.zeros(logs[0].shape[1:])
    apart = np.broadcast_to(off[:, None], logs[0].shape)
    for k in range(STEPS):
        ends = k / STEPS, (k + 1) / STEPS
        low = logs[0] + np.minimum(*(law[0] * end for end in ends))
        high = logs[1] + np.maximum(*(law[1] * end for end in ends))
        total += _bent(tree, (low, high), (apart, apart), law).second[1] / STEPS
    return total


def _between(one: FloatArray, other: FloatArray, values: Range) -> Range:
    """Return ln of the legs of all resistors between two, over the value factors."""
    return np.minimum(one, other)[:, None] + values[0], np.maximum(one, other)[:, None] + values[1]


@dataclass(frozen=True, slots=True, eq=False)
class _Bent:
    """Of a node over cells: the derivatives of ln R along two directions, and the second one along both."""

    one: Range
    other: Range
    second: Range


def _bent(node: Network, logs: Range, one: Range, other: Range) -> _Bent:
    """Return the derivatives of a node by those of its members."""
    if isinstance(node, Leg):
        none = np.zeros_like(logs[0][0])
        return _Bent((one[0][0], one[1][0]), (other[0][0], other[1][0]), (none, none))
    shares = _branch_shares(node, logs)
    members = [_bent(child, _at(logs, own), _at(one, own), _at(other, own)) for child, own in _branches(node)]
    first, then, second = (
        (np.stack([r[0] for r in found]), np.stack([r[1] for r in found]))
        for found in zip(*((m.one, m.other, m.second) for m in members), strict=True)
    )
    moved = _covariance(shares, first, then)
    if isinstance(node, Parallel):
        moved = -moved[1], -moved[0]
    mean = _mean(shares, second)
    return _Bent(_mean(shares, first), _mean(shares, then), (mean[0] + moved[0], mean[1] + moved[1]))


def _covariance(shares: Range, one: Range, other: Range) -> Range:
    """Return the covariance of two quantities under shares: of all pairs p p' (d - d')(l - l')."""
    low, high = np.zeros_like(one[0][0]), np.zeros_like(one[0][0])
    for i, j in combinations(range(len(one[0])), 2):
        both = shares[0][i] * shares[0][j], np.minimum(shares[1][i] * shares[1][j], 0.25)
        part = _times(both, _times(_apart(one, i, j), _apart(other, i, j)))
        low, high = low + part[0], high + part[1]
    # Of a quantity with range d and one with range l it is never beyond d l/4 (Gruess).
    most = 0.25 * np.ptp(np.concatenate(one), axis=0) * np.ptp(np.concatenate(other), axis=0)
    return np.maximum(low, -most), np.minimum(high, most)


def _apart(one: Range, i: int, j: int) -> Range:
    return one[0][i] - one[1][j], one[1][i] - one[0][j]


def _times(one: Range, other: Range) -> Range:
    products = [a * b for a in one for b in other]
    return np.min(products, axis=0), np.max(products, axis=0)


# --- shares over cells --------------------------------------------------------------------------------


def leg_share_ranges(node: Network, logs: Range) -> Range:
    """Return between what the share of each leg lies, by ln of its value, shape (legs, cells)."""
    if isinstance(node, Leg):
        return np.ones_like(logs[0]), np.ones_like(logs[1])
    own = _branch_shares(node, logs)
    below = [leg_share_ranges(child, _at(logs, place)) for child, place in _branches(node)]
    return (
        np.concatenate([share * part[0] for share, part in zip(own[0], below, strict=True)]),
        np.concatenate([share * part[1] for share, part in zip(own[1], below, strict=True)]),
    )


def _branch_shares(node: Series | Parallel, logs: Range) -> Range:
    """Return between what the share of each member of a node lies, shape (members, cells)."""
    found = [_resistances(child, _at(logs, place)) for child, place in _branches(node)]
    if isinstance(node, Parallel):
        found = [(1.0 / high, 1.0 / low) for low, high in found]
    low, high = np.stack([f[0] for f in found]), np.stack([f[1] for f in found])
    return low / (low + high.sum(axis=0) - high), high / (high + low.sum(axis=0) - low)


def _resistances(node: Network, logs: Range) -> Range:
    """Return the lowest and the highest resistance of a node: it rises with every leg."""
    if isinstance(node, Leg):
        return np.exp(logs[0][0]), np.exp(logs[1][0])
    found = [_resistances(child, _at(logs, place)) for child, place in _branches(node)]
    low, high = np.stack([f[0] for f in found]), np.stack([f[1] for f in found])
    if isinstance(node, Series):
        return low.sum(axis=0), high.sum(axis=0)
    return 1.0 / (1.0 / low).sum(axis=0), 1.0 / (1.0 / high).sum(axis=0)


def _branches(node: Series | Parallel) -> Iterator[tuple[Network, slice]]:
    """Yield each member of a node with the places of its legs among those of the node."""
    at = 0
    for child in node.children:
        count = len(legs(child))
        yield child, slice(at, at + count)
        at += count


def _at(one: Range, place: slice) -> Range:
    return one[0][place], one[1][place]


def _mean(shares: Range, of: Range) -> Range:
    return _least(shares, of[0]), _most(shares, of[1])


def _least(shares: Range, of: FloatArray) -> FloatArray:
    return np.asarray(-_most(shares, -of))


def _most(shares: Range, of: FloatArray) -> FloatArray:
    """Return the largest mean by shares that lie in ranges and sum to 1: the largest are filled first."""
    of = np.broadcast_to(of, shares[0].shape)
    order = np.argsort(-of, axis=0)
    low, high, size = (np.take_along_axis(a, order, axis=0) for a in (*shares, of))
    room = high - low
    left = 1.0 - low.sum(axis=0) - (np.cumsum(room, axis=0) - room)
    return np.asarray((size * (low + np.clip(left, 0.0, room))).sum(axis=0))
