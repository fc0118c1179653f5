"""The mix found again with the ends of its films in it.

A leg of units is no longer of its film alone: a part of it is ends, with another temperature coefficient.
The values that were best for the film are not best for its units. With the part of the ends held, the
values of the legs are moved until the judged figure of what they make is least.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.network import Leg, Network, legs, scaled, value

MOST_CALLS = 60  # of the figure, per leg that moves
_STEP = 0.05  # of a value, first
_NEAR = 1e-5
_FARTHEST = math.log(20.0)


def retuned(ideal: Network, figure: Callable[[Network], float]) -> Network:
    """Return the network of the same shape and total whose figure is least, found near the ideal one.

    Parameters
    ----------
    ideal : Network
    figure : callable
        Of a network of the values that legs shall have, their ends included, the figure that what is
        made of them reaches.

    Returns
    -------
    Network
        The ideal one where nothing near it is better.

    Notes
    -----
    Nelder and Mead, Computer Journal 7 (1965) 308, on the logarithms of the values: the figure has kinks.
    """
    from scipy.optimize import minimize

    own = legs(ideal)
    if len(own) == 1:
        return ideal

    def network(x: FloatArray) -> Network:
        factors = (*np.exp(x), 1.0)
        changed = with_values(ideal, [leg.ohms * f for leg, f in zip(own, factors, strict=True)])
        return scaled(changed, value(ideal) / value(changed))

    start = np.zeros(len(own) - 1)
    simplex = np.vstack([start, start + _STEP * np.eye(len(start))])
    found = minimize(
        lambda x: figure(network(x)) if np.abs(x).max() < _FARTHEST else math.inf,
        start,
        method="Nelder-Mead",
        options={
            "initial_simplex": simplex,
            "maxfev": MOST_CALLS * len(start),
            "xatol": _NEAR,
            "fatol": 1e-9,
        },
    )
    return network(found.x) if found.fun < figure(ideal) else ideal


def with_values(node: Network, ohms: Sequence[float]) -> Network:
    """Return a network of the same shape whose legs have these values [ohm], in its order."""
    rest = iter(ohms)

    def changed(node: Network) -> Network:
        if isinstance(node, Leg):
            return replace(node, ohms=float(next(rest)))
        return type(node)(tuple(changed(child) for child in node.children))

    return changed(node)
