"""What each class of spread adds to the highest and the lowest drift, at every temperature.

The classes are added in a fixed order, and the contribution of one is by how much it moves the extreme
of those before it. So they sum to the worst case at that temperature, whatever their interplay.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.material.spread import Spread
from tcplan.network import arrangement, resistance, value
from tcplan.worst.box import Box
from tcplan.worst.cells import Grid, cell_search, excursions, grid_of, halved, start_cells
from tcplan.worst.factors import one_node_factors

CLASSES = ("residual curvature", "TC1 spread", "TC2 spread", "value-ratio spread")
CELLS = 512  # by which the value factors of a mixed network are bounded at all temperatures at once
NOTHING = 1e-9  # an excursion below which there is nothing to search


def class_extremes(box: Box, T: FloatArray, *, exact: bool = True) -> tuple[FloatArray, FloatArray]:
    """Return the highest and the lowest drift as the classes are added one by one.

    Parameters
    ----------
    box : Box
    T : array
        Temperatures [K].
    exact : bool
        For a mixed network, whether the last class is searched at each temperature until no device is
        beyond it by more than 1 part in 10^4; else its bound is quick and a little wider.

    Returns
    -------
    up, down : array, shape (classes, T)
        Drift as a fraction. The last row is the worst case at each temperature: exact in one series or
        parallel node, a guaranteed bound for a mixed network.
    """
    wanted = box.need.wanted(T)
    inside = [_laws_only(replace(box, spreads=kept), T) for kept in _growing(box)]
    top, bottom = _with_values(box, T, inside[-1][0], inside[-1][1], exact=exact)
    up = np.stack([*(high - wanted for high, _ in inside), top])
    down = np.stack([*(low - wanted for _, low in inside), bottom])
    return np.maximum.accumulate(up, axis=0), np.minimum.accumulate(down, axis=0)


def _growing(box: Box) -> tuple[dict[str, Spread], ...]:
    """Return the spreads without any class of the laws, with TC1, and with TC1 and TC2."""
    limits = {name: replace(box.spreads[name].limits(), value=None) for name in box.names}
    tc1 = {name: replace(spread, tc2=None) for name, spread in limits.items()}
    none = {name: replace(spread, tc1=None, tcr=None) for name, spread in tc1.items()}
    return none, tc1, limits


def _laws_only(box: Box, T: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the highest and lowest R(T)/R(T_ref) with the values at nominal: laws all one way."""
    lo, hi = box.bounds(T)
    own = value(box.network)
    high, low = (resistance(box.network, dict(zip(box.names, side, strict=True))) / own for side in (hi, lo))
    return high, low


def one_comparison(box: Box) -> bool:
    """Whether one comparison decides each value factor: one node, factors of a coordinate alike."""
    kind = arrangement(box.network)
    return kind != "mixed" and (kind != "parallel" or box.in_step())


def _with_values(
    box: Box, T: FloatArray, high: FloatArray, low: FloatArray, *, exact: bool
) -> tuple[FloatArray, FloatArray]:
    """Return the highest and the lowest drift over the whole box.

    ``high`` and ``low`` are the extreme ratios with all values at nominal.
    """
    grid = grid_of(box, T, np.ones_like(T))
    if one_comparison(box):
        top, _ = one_node_factors(box, grid.hi, 1)
        bottom, _ = one_node_factors(box, grid.lo, -1)
        return top - grid.wanted, bottom - grid.wanted
    up, down = _quick(box, grid)
    if exact:
        for k in np.nonzero(up + down > NOTHING)[0]:
            at = slice(k, k + 1)
            one = Grid(T[at], grid.weight[at], grid.wanted[at], grid.lo[:, at], grid.hi[:, at])
            rise, fall = float(high[k] - grid.wanted[k]), float(grid.wanted[k] - low[k])
            up[k], down[k] = (
                min(up[k], _one_side(box, one, max(0.0, 0.5 * (float(down[k]) - rise)), 1)),
                min(down[k], _one_side(box, one, max(0.0, 0.5 * (float(up[k]) - fall)), -1)),
            )
    return up, -down


def _quick(box: Box, grid: Grid) -> tuple[FloatArray, FloatArray]:
    """Return bounds on the excursions up and down at all temperatures, from one set of cells."""
    centre, width = start_cells(box)
    while len(centre) < CELLS and width.max() > 0:
        centre, width = halved(centre, width)
    return excursions(box, centre, width, grid)


def _one_side(box: Box, grid: Grid, lead: float, sign: int) -> float:
    """Return a bound on the excursion of one side at one temperature.

    The search judges both sides at once; moving the wanted ratio by ``lead``, half of what the other side
    could be ahead, makes this side the larger one.
    """
    found = cell_search(box, replace(grid, wanted=grid.wanted - sign * lead))
    return found.upper - lead
