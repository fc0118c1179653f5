"""A goal at a limit, asked of all mixed networks: on nodes, and the columns that answer it.

A column is by how much one child of a top node is outside the goal at each node, at least. One vector
y >= 0 that is positive on every column proves that no mix of the children is within the goal.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import cycle, islice, product
from typing import Protocol

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.goal import Piece, Requirement
from tcplan.material.model import Material
from tcplan.mixes import KindBounds, fixed_ratio, kind_half_widths, total_of
from tcplan.plan import Space
from tcplan.process import Variation
from tcplan.trees import Pair
from tcplan.verify.hull import Cells, hull_of, top_members

NODES = 17  # temperatures a piece
DEVICE_NODES = 3  # the same where each of them is there for every device


class Curves(Protocol):
    """The curves of the legs of trees, on the nodes of a question."""

    def of(self, kinds: IntArray) -> FloatArray:
        """Return R of every leg over its nominal value, shape (trees, legs, nodes).

        Of devices the nodes are there twice, at their temperatures and then at the reference.
        """


@dataclass(frozen=True, slots=True)
class NominalCurves:
    """The ratios of every material, and last of the fixed members, shape (kinds, nodes)."""

    ratios: FloatArray

    def of(self, kinds: IntArray) -> FloatArray:
        """Return R(T)/R(T_ref) of every leg."""
        return np.asarray(self.ratios[kinds])


@dataclass(frozen=True, slots=True)
class DeviceCurves:
    """What the devices of a tree are made of: see :func:`device_question`.

    ``lo`` and ``hi`` have the shape (kinds, T); ``factors``, shape (devices, kinds), are looked at
    beside the corners of every tree.
    """

    lo: FloatArray
    hi: FloatArray
    half: FloatArray
    groups: IntArray
    factors: FloatArray
    corners: int

    def of(self, kinds: IntArray) -> FloatArray:
        """Return R of every leg at T, for each device and side, and then at the reference."""
        factors = np.stack([self._factors(row) for row in kinds])
        both = np.stack([self.hi[kinds], self.lo[kinds]], axis=2)
        hot = factors[:, :, :, None, None] * both[:, :, None, :, :]
        cold = np.broadcast_to(factors[:, :, :, None, None], hot.shape)
        shape = (*kinds.shape, -1)
        return np.concatenate([hot.reshape(shape), cold.reshape(shape)], axis=2)

    def _factors(self, kinds: IntArray) -> FloatArray:
        """Return the factors of the legs of one tree, shape (legs, devices)."""
        rows = list(islice(cycle(_corners(kinds, self.half, self.groups)), self.corners))
        return np.vstack([np.array(rows), self.factors[:, kinds]]).T


def _corners(kinds: IntArray, half: FloatArray, groups: IntArray) -> list[list[float]]:
    """Return the corners of the value factors of some legs; the lowest is another point, scaled up."""
    own = sorted(set(groups[kinds].tolist()))
    found = []
    for signs in list(product((1.0, -1.0), repeat=len(own)))[:-1]:
        sign = dict(zip(own, signs, strict=True))
        found.append([1.0 + half[k] * sign[groups[k]] for k in kinds.tolist()])
    return found


@dataclass(frozen=True, slots=True)
class Question:
    """The goal at a limit, on nodes, and what is asked: is any network of a space within it.

    The share of the fixed members of the whole lies inside ``fixed_share`` (0, 0 when there are none).
    Logarithms of ohms are of ohms over the total; where that share sets the total, over the value of the
    fixed members, and ``total`` says how the total goes with it (`tcplan.mixes.total_of`). ``sides`` is
    None for nominal materials, whose nodes bind on both sides; else every node is one device, on its own
    side of the goal.
    """

    high: FloatArray
    low: FloatArray
    free: FloatArray
    curves: Curves
    sides: FloatArray | None
    reach: float
    min_share: float
    fixed_share: tuple[float, float]
    least_ohms: FloatArray
    most_ohms: FloatArray
    area: FloatArray
    max_area: float
    total: int

    @property
    def fixed(self) -> bool:
        """Whether there are fixed members."""
        return self.fixed_share[1] > 0

    @property
    def sized(self) -> bool:
        """Whether the size of a leg is limited."""
        values = bool(np.isfinite(self.least_ohms).any() or np.isfinite(self.most_ohms).any())
        return values or self.max_area < np.inf


def _nodes(need: Requirement, count: int, more: Sequence[float]) -> tuple[FloatArray, list[Piece]]:
    """Return the temperatures [K] of a question and the piece of each."""
    T: list[float] = []
    pieces: list[Piece] = []
    z = np.cos(np.pi * np.arange(count) / (count - 1))
    for piece in need.pieces:
        points = 0.5 * (piece.low + piece.high) - 0.5 * (piece.high - piece.low) * z
        inside = [t for t in more if piece.low <= t <= piece.high]
        own = np.unique(np.clip(np.r_[points, inside], piece.low, piece.high)).tolist()
        T.extend(own)
        pieces.extend([piece] * len(own))
    return np.array(T), pieces


def question(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    limit: float,
    more: Sequence[float] = (),
) -> Question:
    """Return the question whether a network of a space is within ``limit`` (a figure, as a fraction).

    ``more`` are temperatures [K] that join the nodes.
    """
    T, pieces = _nodes(need, NODES, more)
    wanted, room = need.wanted(T), limit * np.array([p.weight for p in pieces])
    return _asked(
        space,
        high=wanted + room,
        low=wanted - room,
        free=np.array([1.0 if p.centred else 0.0 for p in pieces]),
        curves=NominalCurves(_ratios(space, need, materials, T)),
        sides=None,
        reach=next((p.weight * limit for p in need.pieces if p.centred), 0.0),
    )


def device_question(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    variation: Variation,
    limit: float,
    more: Sequence[float] = (),
    devices: Sequence[Mapping[str, float]] = (),
) -> Question:
    """Return the question whether a network of a space is within ``limit`` in its worst case.

    Asked of some devices only: the corners of the value factors, and ``devices`` (value factors by
    material), with all laws high or all low. That asks less, so that "none" is the answer for all.
    """
    T, pieces = _nodes(need, DEVICE_NODES, more)
    wanted, room = need.wanted(T), limit * np.array([p.weight for p in pieces])
    lo, hi = KindBounds(space, materials, variation, need.reference).at(T)
    half, groups = kind_half_widths(space, materials, variation, need.reference)
    names = space.materials
    factors = [_completed(device, space, half, groups) for device in devices]
    corners = 2 ** min(space.most + (1 if space.fixed else 0), space.legs + 1) - 1
    curves = DeviceCurves(lo, hi, half, groups, np.array(factors).reshape(-1, len(names) + 1), corners)
    count = corners + len(factors)
    return _asked(
        space,
        high=np.tile(wanted + room, 2 * count),
        low=np.tile(wanted - room, 2 * count),
        free=np.zeros(2 * count * len(T)),
        curves=curves,
        sides=np.tile(np.repeat([1.0, -1.0], len(T)), count),
        reach=0.0,
    )


def _completed(device: Mapping[str, float], space: Space, half: FloatArray, groups: IntArray) -> list[float]:
    """Return the factors of all kinds at a device of some materials, pressed into the box.

    A material that it does not name takes the coordinate of one that it moves in full step with, and is
    nominal without one; so do the fixed members.
    """
    kinds: list[str | None] = [*space.materials, None]
    fixed = {leg.material for leg in space.fixed}
    if len(fixed) == 1:
        kinds[-1] = next(iter(fixed))
    step: dict[int, float] = {}
    for kind, name in enumerate(kinds):
        if name is not None and name in device and half[kind] > 0:
            own = (device[name] - 1.0) / float(half[kind])
            step.setdefault(int(groups[kind]), min(1.0, max(-1.0, own)))
    return [1.0 + float(h) * step.get(int(group), 0.0) for h, group in zip(half, groups, strict=True)]


def _asked(
    space: Space,
    *,
    high: FloatArray,
    low: FloatArray,
    free: FloatArray,
    curves: Curves,
    sides: FloatArray | None,
    reach: float,
) -> Question:
    least, most, area, max_area = _sizes(space)
    return Question(
        high=high,
        low=low,
        free=free,
        curves=curves,
        sides=sides,
        reach=reach,
        min_share=space.min_share,
        fixed_share=space.fixed_share if space.fixed else (0.0, 0.0),
        least_ohms=least,
        most_ohms=most,
        area=area,
        max_area=max_area,
        total=total_of(space)[1],
    )


def _ratios(space: Space, need: Requirement, materials: Mapping[str, Material], T: FloatArray) -> FloatArray:
    own = [materials[name].ratio(T, need.reference) for name in space.materials]
    return np.stack([*own, fixed_ratio(space, materials, need.reference, T)])


def _sizes(space: Space) -> tuple[FloatArray, FloatArray, FloatArray, float]:
    count = len(space.materials)
    low, high, area = np.full(count + 1, -np.inf), np.full(count + 1, np.inf), np.zeros(count + 1)
    if space.sizes is None:
        return low, high, area, np.inf
    own, _ = total_of(space)
    with np.errstate(divide="ignore"):
        low[:count] = np.log(np.array(space.sizes.least_ohms) / own)
        high[:count] = np.log(np.array(space.sizes.most_ohms) / own)
    area[:count] = np.array(space.sizes.area_per_ohm) * own
    return low, high, area, space.sizes.max_area


def _outside(ask: Question, centre: FloatArray, lowest: FloatArray, highest: FloatArray) -> FloatArray:
    """Return by how much curves are outside the goal at least, shape (cells, vertices, 2 nodes).

    Above it in the first half of the nodes, below it in the second; of devices each on its own side.
    """
    high = (ask.high + centre[:, 1:2] * ask.free)[:, None, :]
    low = (ask.low + centre[:, 0:1] * ask.free)[:, None, :]
    if ask.sides is None:
        return np.concatenate([lowest - high, low - highest], axis=2)
    (hot_low, cold_low), (hot_high, cold_high) = np.split(lowest, 2, axis=2), np.split(highest, 2, axis=2)
    # Without a lower limit above zero nothing can be below it.
    below = np.where(low > 0, low * np.where(low > 0, cold_low, 0.0) - hot_high, -1.0)
    return np.where(ask.sides > 0, hot_low - high * cold_high, below)


def _outside_inverse(
    ask: Question, centre: FloatArray, lowest: FloatArray, highest: FloatArray
) -> FloatArray:
    """Return the same for inverse curves: R <= h asks 1 <= h/R, and R >= l asks l/R <= 1.

    Of devices 1 is the inverse of R(T_ref).
    """
    high = (ask.high + centre[:, 1:2] * ask.free)[:, None, :]
    low = (ask.low + centre[:, 0:1] * ask.free)[:, None, :]
    if ask.sides is not None:
        (hot_low, cold_low), (hot_high, cold_high) = np.split(lowest, 2, axis=2), np.split(highest, 2, axis=2)
        under = np.where(low > 0, low * np.where(low > 0, hot_low, 0.0) - cold_high, -1.0)
        return np.where(ask.sides > 0, cold_low - high * hot_high, under)
    below = np.where(low > 0, low * lowest - 1.0, -1.0)
    return np.concatenate([1.0 - high * highest, below], axis=2)


def columns_of(
    pair: Pair, cells: Cells, ask: Question, centre: FloatArray, *, free_top: bool
) -> list[FloatArray]:
    """Return the columns of every cell, one array (cells, vertices, 2 nodes) a child of the top node.

    A column is by how much a child alone is outside the goal at each node, at least. Without a free
    top the whole tree is the only child. A fixed member, the first child, is mixed into all others, with the
    ends of its share: between them a column is a mix of these.
    """
    members = top_members(pair) if free_top else (pair,)
    found = []
    for member in members:
        hull = hull_of(member, cells, conductance=free_top and not pair.series)
        lowest = hull.vertices - hull.below[:, None, :]
        highest = hull.vertices + hull.above[:, None, :]
        side = _outside_inverse if free_top and not pair.series else _outside
        found.append(np.nan_to_num(side(ask, centre, lowest, highest), nan=-1e6, posinf=1e6, neginf=-1e6))
    if ask.fixed and free_top:
        ends = sorted(set(ask.fixed_share))
        return [
            np.concatenate([u * found[0] + (1.0 - u) * other for u in ends], axis=1) for other in found[1:]
        ]
    return found
