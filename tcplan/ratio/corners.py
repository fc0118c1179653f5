"""The worst of the corner devices of a pair: quick, and from below.

For comparing many ratios. What is reported of one of them comes from `tcplan.ratio.worst`.
"""

from __future__ import annotations

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.ratio.cells import temperatures
from tcplan.ratio.pair import Pair
from tcplan.ratio.space import Space, log_value, space_of
from tcplan.ratio.vertices import corner_count, corners, start_cells

POINTS = 33  # temperatures a piece
MOST = 1 << 14  # corners; of more, as many at random
AT_A_TIME = 1 << 10


def corner_figure(pair: Pair) -> float:
    """Return the largest figure of the devices at the corners of the box of a pair, and of the nominal one.

    The resistors are apart by the whole of the tracking, either way. The figure is reached, at
    temperatures 1/32 of a piece apart; some other device may be a little worse.

    Parameters
    ----------
    pair : Pair
        A material without a spread does not move.

    Returns
    -------
    float
    """
    space = space_of(pair)
    points = _corner_points(space)
    found = 0.0
    for T, weight, centred in temperatures(space, POINTS):
        for k in range(0, len(points), AT_A_TIME):
            for up in (True, False):
                drift = _drifts(space, points[k : k + AT_A_TIME], T, up=up)
                size = 0.5 * np.ptp(drift, axis=1) if centred else np.abs(drift).max(axis=1)
                found = max(found, float((size / weight[0]).max()))
    return found


def _corner_points(space: Space) -> FloatArray:
    """Return the nominal device and the corners, shape (points, coordinates)."""
    cells = start_cells(space, 1)
    none = np.zeros((1, len(space.half)))
    if len(cells) * corner_count(space, cells) > MOST:
        return np.concatenate([none, _some(space)])
    points, there = corners(space, cells)
    return np.concatenate([none, points[there]])


def _some(space: Space) -> FloatArray:
    """Return corners drawn at random, always the same ones; what has to track goes together."""
    signs = np.random.default_rng(1).choice((-1.0, 1.0), size=(MOST // 4, len(space.half)))
    for own, _ in space.tracked:
        signs[:, space.groups + own] = signs[:, space.groups + own[:1]]
        space_half = space.half[space.groups + own].min()
        signs[:, space.groups + own] *= space_half / space.half[space.groups + own]
    return np.asarray(signs * space.half)


def _drifts(space: Space, z: FloatArray, T: FloatArray, *, up: bool) -> FloatArray:
    """Return the drift of the ratio less what is wanted, shape (devices, T).

    With ``up`` the resistors are apart so that it is highest where T is above the reference.
    """
    grid = space.grid(T, np.ones_like(T))
    sign = np.where(space.pair.need.reference <= T, 1.0, -1.0)[:, None]
    tc1, tc2 = (np.asarray(c)[:, None] for c in (space.tc1(z), space.tc2(z)))
    at_reference = space.base + tc1 * space.x + tc2 * space.x**2
    law = (grid.base + tc1 * grid.x + tc2 * grid.x**2) / at_reference
    laws = law[None] + (sign * space.apart(T, up=up))[:, None]
    m = np.broadcast_to(space.factors(z)[:, None], laws.shape)
    top, bottom = space.pair.networks()
    log = [log_value(one, space.names, m * laws) - log_value(one, space.names, m) for one in (top, bottom)]
    return np.asarray(np.exp(log[0] - log[1]) - grid.wanted)
