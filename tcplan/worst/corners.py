"""The worst of the corner devices of a spread box: quick, and from below.

For comparing many networks. What is reported of one of them comes from `tcplan.worst.evaluation`.
"""

from __future__ import annotations

from collections.abc import Mapping
from itertools import product

import numpy as np

from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network
from tcplan.process import INDEPENDENT, Process
from tcplan.worst.box import Box
from tcplan.worst.cells import device_values, grid_of
from tcplan.worst.evaluation import worst_case

POINTS = 33  # temperatures a piece
MOST_COORDINATES = 9


def corner_figure(
    network: Network,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    need: Requirement,
    process: Process = INDEPENDENT,
) -> float:
    """Return the largest figure of the devices whose value factors are all at a limit, or nominal.

    It is reached, at temperatures 1/32 of a piece apart; some other device may be a little worse. Of a
    band, and of very many materials, the worst case itself is returned. The parameters are those of
    :func:`tcplan.worst.evaluation.worst_case`.
    """
    box = Box(network, materials, spreads, need, process)
    count = int(box.coordinate_of().max()) + 1
    if need.centred or count > MOST_COORDINATES:
        return worst_case(network, materials, spreads, need, process).upper
    T = np.concatenate([np.linspace(piece.low, piece.high, POINTS) for piece in need.pieces])
    grid = grid_of(box, T, np.repeat([piece.weight for piece in need.pieces], POINTS))
    points = np.vstack([np.zeros(count), np.array(list(product((-1.0, 1.0), repeat=count)))])
    high, low = (device_values(box, points, ratios) for ratios in (grid.hi, grid.lo))
    above, below = (high - grid.wanted) / grid.weight, (grid.wanted - low) / grid.weight
    return float(max(above.max(), below.max()))
