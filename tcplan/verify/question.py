"""A goal at a limit, asked of all mixed networks: on nodes, and the columns that answer it.

A column is by how much one child of a top node is outside the goal at each node, at least. One vector
y >= 0 that is positive on every column proves that no mix of the children is within the goal.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.mixes import fixed_ratio
from tcplan.plan import Space
from tcplan.trees import Pair
from tcplan.verify.hull import Cells, hull_of, top_members

NODES = 17  # temperatures a piece


@dataclass(frozen=True, slots=True)
class Question:
    """The goal at a limit, on nodes, and what is asked: is any network of a space within it.

    ``ratios`` has a row for each material and a last one for the fixed members, whose share of the
    whole is ``fixed_share`` (0 when there are none). Logarithms of ohms are of ohms over the total.
    """

    high: FloatArray
    low: FloatArray
    free: FloatArray
    ratios: FloatArray
    reach: float
    min_share: float
    fixed_share: float
    least_ohms: FloatArray
    most_ohms: FloatArray
    area: FloatArray
    max_area: float

    @property
    def sized(self) -> bool:
        """Whether the size of a leg is limited."""
        values = bool(np.isfinite(self.least_ohms).any() or np.isfinite(self.most_ohms).any())
        return values or self.max_area < np.inf


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
    T, weight, free = [], [], []
    z = np.cos(np.pi * np.arange(NODES) / (NODES - 1))
    for piece in need.pieces:
        points = 0.5 * (piece.low + piece.high) - 0.5 * (piece.high - piece.low) * z
        inside = [t for t in more if piece.low <= t <= piece.high]
        points = np.unique(np.clip(np.r_[points, inside], piece.low, piece.high))
        T.append(points)
        weight.append(np.full(len(points), piece.weight))
        free.append(np.full(len(points), 1.0 if piece.centred else 0.0))
    at, w = np.concatenate(T), np.concatenate(weight)
    wanted = need.wanted(at)
    low, high, area, max_area = _sizes(space)
    return Question(
        high=wanted + limit * w,
        low=wanted - limit * w,
        free=np.concatenate(free),
        ratios=_ratios(space, need, materials, at),
        reach=next((p.weight * limit for p in need.pieces if p.centred), 0.0),
        min_share=space.min_share,
        fixed_share=space.fixed_share[0] if space.fixed else 0.0,
        least_ohms=low,
        most_ohms=high,
        area=area,
        max_area=max_area,
    )


def _ratios(space: Space, need: Requirement, materials: Mapping[str, Material], T: FloatArray) -> FloatArray:
    own = [materials[name].ratio(T, need.reference) for name in space.materials]
    return np.stack([*own, fixed_ratio(space, materials, need.reference, T)])


def _sizes(space: Space) -> tuple[FloatArray, FloatArray, FloatArray, float]:
    count = len(space.materials)
    low, high, area = np.full(count + 1, -np.inf), np.full(count + 1, np.inf), np.zeros(count + 1)
    if space.sizes is None or space.ohms is None:
        return low, high, area, np.inf
    with np.errstate(divide="ignore"):
        low[:count] = np.log(np.array(space.sizes.least_ohms) / space.ohms)
        high[:count] = np.log(np.array(space.sizes.most_ohms) / space.ohms)
    area[:count] = np.array(space.sizes.area_per_ohm) * space.ohms
    return low, high, area, space.sizes.max_area


def _outside(ask: Question, centre: FloatArray, lowest: FloatArray, highest: FloatArray) -> FloatArray:
    """Return by how much curves are outside the goal at least, shape (cells, vertices, 2 nodes).

    Above it in the first half of the nodes, below it in the second.
    """
    high = (ask.high + centre[:, 1:2] * ask.free)[:, None, :]
    low = (ask.low + centre[:, 0:1] * ask.free)[:, None, :]
    return np.concatenate([lowest - high, low - highest], axis=2)


def _outside_inverse(
    ask: Question, centre: FloatArray, lowest: FloatArray, highest: FloatArray
) -> FloatArray:
    """Return the same for inverse curves: R <= h asks 1 <= h/R, and R >= l asks l/R <= 1."""
    high = (ask.high + centre[:, 1:2] * ask.free)[:, None, :]
    low = (ask.low + centre[:, 0:1] * ask.free)[:, None, :]
    below = np.where(low > 0, low * lowest - 1.0, -1.0)
    return np.concatenate([1.0 - high * highest, below], axis=2)


def columns_of(
    pair: Pair, cells: Cells, ask: Question, centre: FloatArray, *, free_top: bool
) -> list[FloatArray]:
    """Return the columns of every cell, one array (cells, vertices, 2 nodes) a child of the top node.

    A column is by how much a child alone is outside the goal at each node, at least. Without a free
    top the whole tree is the only child. A fixed member, the first child, is mixed into all others.
    """
    members = top_members(pair) if free_top else (pair,)
    found = []
    for member in members:
        hull = hull_of(member, cells, conductance=free_top and not pair.series)
        lowest = hull.vertices - hull.below[:, None, :]
        highest = hull.vertices + hull.above[:, None, :]
        side = _outside_inverse if free_top and not pair.series else _outside
        found.append(np.nan_to_num(side(ask, centre, lowest, highest), nan=-1e6, posinf=1e6, neginf=-1e6))
    u = ask.fixed_share
    if u > 0 and free_top:
        return [u * found[0] + (1.0 - u) * other for other in found[1:]]
    return found
