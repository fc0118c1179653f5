"""Value factors of a mixed network: cells of their coordinates, bounded by tangents, then halved.

The resistance of any network is concave and homogeneous of degree 1 in its legs, so its tangent at
the centre of a cell is above it everywhere; over the cell the ratio of the tangent to R(T_ref) is
largest at a vertex.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import product

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InternalError
from tcplan.network import leg_shares, legs, resistance
from tcplan.worst.box import Box

GAP = 1e-4
MOST_CELLS = 60_000
BATCH = 512


def _faces(box: Box) -> Iterator[tuple[FloatArray, FloatArray]]:
    """Yield (centre, half-width) of the faces on which one coordinate is at its upper limit.

    The ratio does not change when all factors are scaled together, and any point scales up until
    its first factor reaches its limit: these faces hold every ratio of the box. A factor that does
    not move is at its limit from the start, so with one of them the whole box is its only face; so
    it is where the factors of one coordinate differ, since scaled they leave the box.
    """
    count = int(box.coordinate_of().max()) + 1
    if (box.half_widths() == 0).any() or not box.in_step():
        yield np.zeros(count), np.ones(count)
        return
    for k in range(count):
        centre, width = np.zeros(count), np.ones(count)
        centre[k], width[k] = 1.0, 0.0
        yield centre, width


def _cell_values(
    box: Box, centre: FloatArray, width: FloatArray, lo: FloatArray, hi: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Return bounds on the ratio over cells, and its values at their centres.

    Parameters
    ----------
    centre, width : array, shape (cells, coordinates)
    lo, hi : array, shape (materials, T)

    Returns
    -------
    top, bottom : array, shape (cells, T)
        No device of the cell is above or below.
    high, low : array, shape (cells, T)
        What the centre reaches with all laws high, and all low.
    """
    flat = np.ones_like(lo[:, :1])
    middle = box.factors_at(centre)
    grad_hi, high_c = _gradient(box, middle, hi)
    grad_ref, ref_c = _gradient(box, middle, flat)
    _, low_c = _gradient(box, middle, lo)
    top = np.full(high_c.shape, -np.inf)
    bottom = np.full(low_c.shape, np.inf)
    moving = np.nonzero(width.max(axis=0) > 0)[0]
    for signs in product((-1.0, 1.0), repeat=len(moving)):
        corner = centre.copy()
        corner[:, moving] += width[:, moving] * np.array(signs)
        vertex = box.factors_at(corner)
        own_ref = _values(box, vertex, flat)
        own_low = _values(box, vertex, lo)
        tangent_hi = np.einsum("cm,mct->ct", vertex, grad_hi)
        tangent_ref = np.einsum("cm,mct->ct", vertex, grad_ref)
        np.maximum(top, tangent_hi / own_ref, out=top)
        np.minimum(bottom, own_low / tangent_ref, out=bottom)
    return top, bottom, high_c / ref_c, low_c / ref_c


def _scaled_ratios(box: Box, factors: FloatArray, ratios: FloatArray) -> dict[str, FloatArray]:
    return {n: factors[:, k, None] * ratios[k][None, :] for k, n in enumerate(box.names)}


def _values(box: Box, factors: FloatArray, ratios: FloatArray) -> FloatArray:
    """Return R, shape (cells, T)."""
    return resistance(box.network, _scaled_ratios(box, factors, ratios))


def _gradient(box: Box, factors: FloatArray, ratios: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return dR/dm, shape (materials, cells, T), and R."""
    scaled = _scaled_ratios(box, factors, ratios)
    whole = resistance(box.network, scaled)
    gradient = np.zeros((len(box.names), *whole.shape))
    for leg, share in zip(legs(box.network), leg_shares(box.network, scaled), strict=True):
        k = box.names.index(leg.material)
        gradient[k] += share * whole / factors[:, k, None]
    return gradient, whole


@dataclass(frozen=True, slots=True)
class Grid:
    """Temperatures [K] with the weight of the goal, the wanted ratio and the law bounds at each."""

    T: FloatArray
    weight: FloatArray
    wanted: FloatArray
    lo: FloatArray
    hi: FloatArray


def grid_of(box: Box, T: FloatArray, weight: FloatArray) -> Grid:
    """Return the grid of a box at these temperatures."""
    lo, hi = box.bounds(T)
    return Grid(T, weight, box.need.wanted(T), lo, hi)


@dataclass(frozen=True, slots=True)
class Found:
    """The worst point that the cells found, and the bound on all of them.

    ``point`` holds the coordinates of the box; ``sign`` is 1 when all laws are at their highest;
    ``at`` is the position on the grid. ``reach`` and ``by_temperature`` hold, for all laws high and
    all low, what the cells' centres reach at each temperature, and the coordinates that reach it.
    """

    figure: float
    upper: float
    point: FloatArray
    sign: int
    at: int
    reach: FloatArray
    by_temperature: FloatArray


def excursions(box: Box, centre: FloatArray, width: FloatArray, grid: Grid) -> tuple[FloatArray, FloatArray]:
    """Return bounds on how far any device of the cells goes above and below the wanted ratio, by T."""
    top, bottom, _, _ = _cell_values(box, centre, width, grid.lo, grid.hi)
    return (top - grid.wanted).max(axis=0), (grid.wanted - bottom).max(axis=0)


def _examined(box: Box, centre: FloatArray, width: FloatArray, grid: Grid) -> tuple[FloatArray, Found]:
    """Return the bound of every cell of a batch, and the worst of their centres."""
    top, bottom, high, low = _cell_values(box, centre, width, grid.lo, grid.hi)
    t, weight = grid.wanted, grid.weight
    bound = np.maximum((top - t) / weight, (t - bottom) / weight).max(axis=1)
    reach = np.stack([(high - t) / weight, (t - low) / weight])
    side, cell, at = np.unravel_index(int(np.argmax(reach)), reach.shape)
    found = Found(
        figure=float(reach[side, cell, at]),
        upper=0.0,
        point=centre[cell].copy(),
        sign=1 if side == 0 else -1,
        at=int(at),
        reach=reach.max(axis=1),
        by_temperature=centre[reach.argmax(axis=1)],
    )
    return bound, _at_vertices(box, found, width[cell], grid)


def _better(best: Found | None, found: Found) -> Found:
    """Return the worse of two findings, with the worst of both at each temperature."""
    if best is None:
        return found
    better = found.reach > best.reach
    one = found if found.figure > best.figure else best
    return replace(
        one,
        reach=np.maximum(found.reach, best.reach),
        by_temperature=np.where(better[..., None], found.by_temperature, best.by_temperature),
    )


def _at_vertices(box: Box, found: Found, width: FloatArray, grid: Grid) -> Found:
    """Return the worst of the vertices of one cell at the temperature found: a limit is a vertex."""
    steps = np.array(list(product((-1.0, 0.0, 1.0), repeat=int((width > 0).sum()))))
    points = np.tile(found.point, (len(steps), 1))
    points[:, width > 0] += steps * width[width > 0]
    k = found.at
    law = (grid.hi if found.sign > 0 else grid.lo)[:, k : k + 1]
    ratio = device_values(box, points, law)[:, 0]
    figure = found.sign * (ratio - grid.wanted[k]) / grid.weight[k]
    best = int(np.argmax(figure))
    return replace(found, figure=float(figure[best]), point=points[best])


def device_values(box: Box, points: FloatArray, ratios: FloatArray) -> FloatArray:
    """Return R(T)/R(T_ref) of devices at points of the box, shape (points, T), for laws at ``ratios``."""
    factors = box.factors_at(points)
    at_reference = _values(box, factors, np.ones_like(ratios[:, :1]))
    values: FloatArray = _values(box, factors, ratios) / at_reference
    return values


def start_cells(box: Box) -> tuple[FloatArray, FloatArray]:
    """Return centres and half-widths of the faces that hold every ratio of the box."""
    both = list(_faces(box))
    return np.stack([c for c, _ in both]), np.stack([w for _, w in both])


def cell_search(box: Box, grid: Grid) -> Found:
    """Return the worst point of the box on a grid, and a bound within 1 part in 10^4 of it.

    When the count of cells runs out the bound is that of the cells left, and so is looser.
    """
    centre, width = start_cells(box)
    best: Found | None = None
    closed, count = 0.0, 0
    while len(centre):
        keep: list[tuple[FloatArray, FloatArray]] = []
        for k in range(0, len(centre), BATCH):
            c, w = centre[k : k + BATCH], width[k : k + BATCH]
            bound, found = _examined(box, c, w, grid)
            best = _better(best, found)
            open_cells = (bound > best.figure * (1.0 + GAP)) & (count < MOST_CELLS)
            closed = max(closed, float(bound[~open_cells].max(initial=0.0)))
            keep.append((c[open_cells], w[open_cells]))
            count += len(c)
        centre, width = halved(np.concatenate([c for c, _ in keep]), np.concatenate([w for _, w in keep]))
    if best is None:
        raise InternalError("a spread box without a cell")
    return replace(best, upper=max(closed, best.figure))


def halved(centre: FloatArray, width: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Cut every cell in two along its widest side."""
    rows = np.arange(len(centre))
    widest = np.argmax(width, axis=1) if len(centre) else rows
    half = 0.5 * width[rows, widest]
    new_width = width.copy()
    new_width[rows, widest] = half
    left, right = centre.copy(), centre.copy()
    left[rows, widest] -= half
    right[rows, widest] += half
    return np.concatenate([left, right]), np.concatenate([new_width, new_width])
