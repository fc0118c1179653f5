"""Value factors of one series or parallel node: the exact worst ones, by one comparison each."""

from __future__ import annotations

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.network import Network, Series, legs
from tcplan.worst.box import Box


def one_node_factors(box: Box, ratios: FloatArray, sign: int) -> tuple[FloatArray, FloatArray]:
    """Return the extreme of R(T)/R(T_ref) over the value factors, and the factors.

    Parameters
    ----------
    box : Box
        Of a single leg, or of a series or parallel node of legs.
    ratios : array, shape (materials, T)
        The law ratios, all at one side.
    sign : int
        1 for the highest, -1 for the lowest.

    Returns
    -------
    array, shape (T,)
        The extreme ratio.
    array, shape (materials, T)
        The factors that reach it.

    Notes
    -----
    In series rho = sum w m r / sum w m: a factor is at its upper limit exactly when its r is
    above rho. Starting from the nominal factors the ratio moves monotonically and ends after at
    most one step a material. In parallel the same holds for 1/rho with g/m and 1/r. Materials that
    move in full step decide together, by the sum of w D (r - rho); in parallel that is exact where their
    half-widths are equal.
    """
    weights = np.array([_weight(box.network, n) for n in box.names])[:, None]
    half, own = box.half_widths()[:, None], box.coordinate_of()
    series = isinstance(box.network, Series)
    column, side = (ratios, sign) if series else (1.0 / ratios, -sign)
    high, low = (1.0 + half, 1.0 - half) if series else (1.0 / (1.0 - half), 1.0 / (1.0 + half))
    swing = weights * (high - low)
    factor = np.ones_like(ratios)
    rho = (weights * factor * column).sum(axis=0) / (weights * factor).sum(axis=0)
    for _ in range(len(weights) + 2):
        pull = swing * (column - rho)
        together = np.stack([pull[own == k].sum(axis=0) for k in range(int(own.max()) + 1)])[own]
        factor = np.where(side * together > 0, high, low)
        rho = (weights * factor * column).sum(axis=0) / (weights * factor).sum(axis=0)
    return (rho, factor) if series else (1.0 / rho, 1.0 / factor)


def _weight(network: Network, name: str) -> float:
    """Return the resistance (series) or conductance (parallel) of one material in one node."""
    own = [leg.ohms for leg in legs(network) if leg.material == name]
    return sum(own) if isinstance(network, Series) else sum(1.0 / ohms for ohms in own)
