"""The shares that a one-node network may have: a polytope, held by its vertices.

A support is a set of materials. Its shares sum to what the fixed members leave, each holds the least
share, and what can be made cuts off the rest: every limit is a half-space of the shares. A polytope
is cut by a half-space exactly: the vertices inside stay, and the segments from a vertex inside to one
outside add the points where they cross.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import combinations

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.material.bounds import LawBounds
from tcplan.material.model import Material
from tcplan.material.spread import value_half_width
from tcplan.network import Network, Parallel, Series, resistance, value
from tcplan.plan import Space
from tcplan.process import Variation, step_groups
from tcplan.trees import PARALLEL, SERIES, Tree, assigned_trees, is_mixed, with_fixed

INSIDE = 1e-12
MOST_VERTICES = 150  # beyond which tangents are left out
LEAST_TANGENT = 1e-9  # share at which the area of a parallel leg is cut at least


def fixed_group(space: Space) -> Network | None:
    """Return the fixed members as one network, or None."""
    if len(space.fixed) < 2:
        return space.fixed[0] if space.fixed else None
    parallel = space.arrangement == "parallel" or space.fixed_in_parallel
    return Parallel(space.fixed) if parallel else Series(space.fixed)


def fixed_ratio(
    space: Space, materials: Mapping[str, Material], reference: float, T: FloatArray
) -> FloatArray:
    """Return R(T)/R(T_ref) of the fixed members together; 1 when there are none."""
    group = fixed_group(space)
    if group is None:
        return np.ones_like(T)
    ratios = {leg.material: materials[leg.material].ratio(T, reference) for leg in space.fixed}
    return resistance(group, ratios) / value(group)


def total_of(space: Space) -> tuple[float, int]:
    """Return a value [ohm] and how ln of the total over it goes with ln of the fixed members' share u.

    The total itself and 0 where it is given; else the value of the fixed members, and -1 where they are
    in series (total = own/u) or 1 where they are in parallel (total = u own).
    """
    if space.ohms is not None:
        return space.ohms, 0
    group = fixed_group(space)
    if group is None:
        raise ValueError("a total is needed when nothing is fixed")
    return value(group), 1 if space.fixed_in_parallel else -1


class KindBounds:
    """The lowest and highest law ratios of the materials of a space, and last of its fixed members.

    Fixed members together are looked at with their nominal values.
    """

    def __init__(
        self, space: Space, materials: Mapping[str, Material], variation: Variation, reference: float
    ) -> None:
        names = spread_names(space)
        self._count, self._group, self._names = len(space.materials), fixed_group(space), names
        self._bounds = LawBounds(
            [materials[n].law for n in names], [variation.spreads[n] for n in names], reference
        )

    def at(self, T: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return them at some temperatures [K], both of the shape (kinds, T); 1 without fixed members."""
        low, high = self._bounds.at(T)
        return self._with_fixed(low), self._with_fixed(high)

    def _with_fixed(self, ratios: FloatArray) -> FloatArray:
        last = np.ones_like(ratios[0])
        if self._group is not None:
            named = dict(zip(self._names, ratios, strict=True))
            last = resistance(self._group, named) / value(self._group)
        return np.concatenate([ratios[: self._count], last[None, :]])


def kind_half_widths(
    space: Space, materials: Mapping[str, Material], variation: Variation, reference: float
) -> tuple[FloatArray, IntArray]:
    """Return the half-widths of the value factors of all kinds, fixed members last, and their groups.

    Kinds of one group move in full step. Fixed members of one material move with it; of several they
    are taken at their nominal values, which is one device of the box.
    """
    names, count = spread_names(space), len(space.materials)
    half = [value_half_width(materials[n].law, variation.spreads[n], reference) for n in names]
    groups = step_groups(names, materials, variation.spreads, variation.process, reference)
    alone = {leg.material for leg in space.fixed}
    if len(alone) != 1:
        # What moves with a fixed member stays nominal too.
        held = {group for name, group in zip(names, groups, strict=True) if name in alone}
        own = [0.0 if group in held else h for h, group in zip(half[:count], groups, strict=False)]
        return np.array([*own, 0.0]), np.array([*groups[:count], len(names)])
    at = names.index(alone.pop())
    return np.array([*half[:count], half[at]]), np.array([*groups[:count], groups[at]])


def spread_names(space: Space) -> tuple[str, ...]:
    """Return the materials of a space, and then those of its fixed members that are not among them."""
    return tuple(dict.fromkeys((*space.materials, *(leg.material for leg in space.fixed))))


def spread_columns(space: Space) -> FloatArray:
    """Return how much of each material a column of a one-node mix holds, shape (materials, columns).

    The columns are the materials of the space and last the fixed members together, which hold each of
    theirs in proportion (of resistance in series, of conductance in parallel).
    """
    names, count = spread_names(space), len(space.materials)
    out = np.zeros((len(names), count + 1))
    out[:count, :count] = np.eye(count)
    parallel = space.arrangement == "parallel"
    sizes = [1.0 / leg.ohms if parallel else leg.ohms for leg in space.fixed]
    for leg, size in zip(space.fixed, sizes, strict=True):
        out[names.index(leg.material), count] += size / sum(sizes)
    return out


def mixed_trees(space: Space) -> tuple[Tree, ...]:
    """Return the mixed trees of a space; the fixed members are the leaf after the last material."""
    count = len(space.materials)
    kind = PARALLEL if space.fixed_in_parallel else SERIES
    whole = (
        with_fixed(tree, kind, count) if space.fixed else tree
        for size in range(1, space.legs + 1)
        for tree in assigned_trees(size, count, space.most)
    )
    return tuple(tree for tree in whole if is_mixed(tree))


def fixed_ends(space: Space, taken: float) -> tuple[float, ...]:
    """Return the least and the greatest share of the fixed members beside legs that take this much.

    Empty when there is no room for the least.
    """
    low, high = space.fixed_share
    high = min(high, 1.0 - taken)
    if low > high + INSIDE:
        return ()
    return (low,) if high <= low else (low, high)


def simplex_vertices(space: Space, support: Sequence[int], *, least_share: bool = True) -> FloatArray:
    """Return the vertices without the limits of size, shape (vertices, materials + 1).

    The last share is that of the fixed members together; it lies between its bounds.
    """
    count = len(space.materials)
    least = space.min_share if least_share else 0.0
    found = []
    for u in fixed_ends(space, len(support) * least):
        rest = 1.0 - u - len(support) * least
        for i in support:
            point = np.zeros(count + 1)
            point[list(support)] = least
            point[i] += rest
            point[count] = u
            found.append(point)
    return np.array(found).reshape(-1, count + 1)


def size_rows(space: Space, support: Sequence[int]) -> list[tuple[FloatArray, float]]:
    """Return the half-spaces a x <= b of what can be made, for the shares of a support.

    With the total V given, a series leg has w V ohm and a parallel leg V/g. With fixed members that
    set the total (V = F/u in series, u F in parallel) both are still linear in the shares and u.
    """
    sizes, count = space.sizes, len(space.materials)
    if sizes is None or not sizes.bounded:
        return []
    group = fixed_group(space)
    own = value(group) if group is not None else 0.0
    rows: list[tuple[FloatArray, float]] = []

    def add(legs: dict[int, float], whole: float, at_most: bool) -> None:
        """Ask sum legs x <= whole (or >=), whole in the unit that the shares have."""
        row = np.zeros(count + 1)
        for i, factor in legs.items():
            row[i] = factor
        bound = whole
        if space.ohms is None:
            row[count], bound = -whole, 0.0
        sign = 1.0 if at_most else -1.0
        rows.append((sign * row, sign * bound))

    # Shares of a leg of R ohm: w = R/V or, by u, R u/F; g = V/R or u F/R.
    total = space.ohms if space.ohms is not None else own
    for i in support:
        least, most = sizes.least_ohms[i], sizes.most_ohms[i]
        if sizes.area_per_ohm[i] > 0:  # no leg alone may take more than all of the area
            most = min(most, sizes.max_area / sizes.area_per_ohm[i])
        if space.arrangement == "parallel":
            least, most = (
                (total * total / most if most < np.inf else 0.0),
                (total * total / least if least > 0 else np.inf),
            )
        if least > 0:
            add({i: total}, least, at_most=False)
        if most < np.inf:
            add({i: total}, most, at_most=True)
    if sizes.max_area < np.inf and space.arrangement != "parallel":
        add({i: sizes.area_per_ohm[i] * total for i in support}, sizes.max_area, at_most=True)
    return rows


def tangent_row(space: Space, support: Sequence[int], at: Sequence[float]) -> tuple[FloatArray, float]:
    """Return the half-space that the area of a parallel mix, cut by its tangent at some shares, leaves.

    The area sum a/g is convex in g, hence above its tangent: sum a (2/g0 - g/g0^2) <= the most.
    """
    sizes, count = space.sizes, len(space.materials)
    if sizes is None or space.ohms is None:
        raise ValueError("a tangent needs a limit of area and a given total")
    row, bound = np.zeros(count + 1), sizes.max_area
    for i, share in zip(support, at, strict=True):
        g = max(float(share), LEAST_TANGENT)
        a = sizes.area_per_ohm[i] * space.ohms
        row[i] = -a / g**2
        bound -= 2.0 * a / g
    return row, bound


def area_of(space: Space, shares: FloatArray) -> float:
    """Return the area [m^2] of a mix of given total."""
    sizes = space.sizes
    if sizes is None or space.ohms is None:
        return 0.0
    total = 0.0
    for i, share in enumerate(shares[:-1]):
        if share > 0:
            ohms = space.ohms / share if space.arrangement == "parallel" else space.ohms * share
            total += sizes.area_per_ohm[i] * float(ohms)
    return total


def cut(
    points: FloatArray, row: FloatArray, bound: float, walls: Sequence[tuple[FloatArray, float]] = ()
) -> FloatArray:
    """Return the vertices of a polytope cut by row x <= bound; empty when nothing is left.

    ``walls`` are the half-spaces that the polytope has so far: only two vertices on enough walls in
    common can be the ends of an edge, and only edges cross the cut in a vertex.
    """
    # In the unit of the shares, whatever that of the row is (areas are tiny, values are large).
    unit = float(np.max(np.abs(row))) or 1.0
    excess = (points @ row - bound) / unit
    inside = excess <= INSIDE
    if inside.all():
        return points
    kept, lost = np.nonzero(inside)[0], np.nonzero(~inside)[0]
    pairs = np.stack(np.meshgrid(kept, lost, indexing="ij"), axis=-1).reshape(-1, 2)
    pairs = pairs[_may_be_edges(points, pairs, walls)]
    a, b = excess[pairs[:, 0]][:, None], excess[pairs[:, 1]][:, None]
    step = np.clip(-a / (b - a), 0.0, 1.0)
    crossing = points[pairs[:, 0]] + step * (points[pairs[:, 1]] - points[pairs[:, 0]])
    return _distinct(np.concatenate([points[kept], crossing]))


def _may_be_edges(
    points: FloatArray, pairs: IntArray, walls: Sequence[tuple[FloatArray, float]]
) -> BoolArray:
    """Return which pairs of vertices lie on as many walls in common as an edge must."""
    if not walls or not len(pairs):
        return np.ones(len(pairs), dtype=bool)
    rows = np.array([wall / np.max(np.abs(wall)) for wall, _ in walls])
    bounds = np.array([limit / np.max(np.abs(wall)) for wall, limit in walls])
    tight = np.abs(points @ rows.T - bounds) <= 1e-9
    tight = tight[:, ~tight.all(axis=0)]  # a wall that holds them all parts none of them
    centred = points - points.mean(axis=0)
    size = int(np.linalg.matrix_rank(centred, tol=1e-10))
    common = (tight[pairs[:, 0]] & tight[pairs[:, 1]]).sum(axis=1)
    enough: BoolArray = common >= size - 1
    return enough


def _distinct(points: FloatArray) -> FloatArray:
    """Return the points, each once."""
    _, first = np.unique(points.round(12), axis=0, return_index=True)
    return points[np.sort(first)]


def _walls(space: Space, support: Sequence[int]) -> list[tuple[FloatArray, float]]:
    """Return the half-spaces of the shares without sizes: least shares, and bounds of the fixed one."""
    count = len(space.materials)
    walls = []
    for i in support:
        row = np.zeros(count + 1)
        row[i] = -1.0
        walls.append((row, -space.min_share))
    last = np.zeros(count + 1)
    last[count] = 1.0
    low, high = space.fixed_share
    return [*walls, (last, high), (-last, -low)]


def share_vertices(
    space: Space,
    support: Sequence[int],
    tangents: Sequence[Sequence[float]] = (),
) -> FloatArray:
    """Return the vertices of the shares that a support may have, shape (vertices, materials + 1).

    Parameters
    ----------
    space : Space
    support : sequence of int
        Positions of the materials.
    tangents : sequence of sequence of float
        Shares of the support at which the area of a parallel mix is cut.

    Returns
    -------
    array
        Empty when the support can not be made. With the area of a parallel mix limited, the
        polytope holds all mixes that can be made, and more tangents make it tighter.
    """
    points = simplex_vertices(space, support)
    walls = _walls(space, support)
    sizes = size_rows(space, support)
    rows = [*sizes, *(tangent_row(space, support, at) for at in tangents)]
    for position, (row, bound) in enumerate(rows):
        # A tangent that is left out leaves a larger polytope: still one that holds every mix.
        if not len(points) or (position >= len(sizes) and len(points) > MOST_VERTICES):
            break
        points = cut(points, row, bound, walls)
        walls.append((row, bound))
    return points


def all_supports(space: Space) -> list[list[tuple[int, ...]]]:
    """Return the supports by size. Without least shares or sizes a larger one holds the smaller."""
    count = len(space.materials)
    most = min(space.most, count)
    nested = space.min_share == 0 and not (space.sizes is not None and space.sizes.bounded)
    return [list(combinations(range(count), k)) for k in ([most] if nested else range(1, most + 1))]
