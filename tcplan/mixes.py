"""The shares that a one-node network may have: a polytope, held by its vertices.

A support is a set of materials. Its shares sum to what the fixed members leave, each holds the least
share, and what can be made cuts off the rest: every limit is a half-space of the shares. A polytope
is cut by a half-space exactly: the vertices inside stay, and the segments from a vertex inside to one
outside add the points where they cross.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.network import Network, Parallel, Series, value
from tcplan.plan import Space

INSIDE = 1e-12


def fixed_group(space: Space) -> Network | None:
    """Return the fixed members as one network, or None."""
    if len(space.fixed) < 2:
        return space.fixed[0] if space.fixed else None
    parallel = space.arrangement == "parallel" or space.fixed_in_parallel
    return Parallel(space.fixed) if parallel else Series(space.fixed)


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
    for i, g in zip(support, at, strict=True):
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


def cut(points: FloatArray, row: FloatArray, bound: float) -> FloatArray:
    """Return the vertices of a polytope cut by row x <= bound; empty when nothing is left."""
    excess = points @ row - bound
    tolerance = INSIDE * max(1.0, float(np.max(np.abs(row))), abs(bound))
    inside = excess <= tolerance
    if inside.all():
        return points
    kept, lost = points[inside], points[~inside]
    a, b = excess[inside][:, None, None], excess[~inside][None, :, None]
    step = np.clip(-a / (b - a), 0.0, 1.0)
    crossing = (kept[:, None, :] + step * (lost[None, :, :] - kept[:, None, :])).reshape(-1, points.shape[1])
    return np.concatenate([kept, _extreme(crossing)])


def _extreme(points: FloatArray) -> FloatArray:
    """Return the extreme points among points of one face: all of them where that is not easy."""
    if len(points) < 2:
        return points
    points = np.unique(points.round(14), axis=0)
    centred = points - points.mean(axis=0)
    _, singular, axes = np.linalg.svd(centred, full_matrices=False)
    rank = int((singular > 1e-12).sum())
    if rank == 0:
        return points[:1]
    if rank == 1:
        along = centred @ axes[0]
        return points[[int(np.argmin(along)), int(np.argmax(along))]]
    if rank == 2:
        return points[_hull_of_plane(centred @ axes[:2].T)]
    return points


def _hull_of_plane(points: FloatArray) -> list[int]:
    """Return the positions of the convex hull of points in a plane (monotone chain)."""
    order = sorted(range(len(points)), key=lambda k: (points[k][0], points[k][1]))

    def turn(o: int, a: int, b: int) -> float:
        u, v = points[a] - points[o], points[b] - points[o]
        return float(u[0] * v[1] - u[1] * v[0])

    def chain(sequence: list[int]) -> list[int]:
        found: list[int] = []
        for k in sequence:
            while len(found) >= 2 and turn(found[-2], found[-1], k) <= 0:
                found.pop()
            found.append(k)
        return found[:-1]

    return chain(order) + chain(order[::-1])


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
    rows = [*size_rows(space, support), *(tangent_row(space, support, at) for at in tangents)]
    for row, bound in rows:
        if not len(points):
            break
        points = cut(points, row, bound)
    return points


def all_supports(space: Space) -> list[list[tuple[int, ...]]]:
    """Return the supports by size. Without least shares or sizes a larger one holds the smaller."""
    count = len(space.materials)
    most = min(space.most, count)
    nested = space.min_share == 0 and not (space.sizes is not None and space.sizes.bounded)
    return [list(combinations(range(count), k)) for k in ([most] if nested else range(1, most + 1))]
