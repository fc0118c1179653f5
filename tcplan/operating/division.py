"""How a network divides its voltage, and how the division moves with the value of every leaf."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.network import Leg, Network, Series, legs


@dataclass(frozen=True, slots=True)
class Division:
    """A network with the resistances of its leaves.

    ``ohms`` is that of the whole [ohm], shape (T,); ``shares`` is d ln R/d ln R_k and ``fractions`` the
    part of the whole voltage across each leaf, shape (leaf, T); ``moves`` is d ln fraction_j/d ln R_k,
    shape (leaf, leaf, T).
    """

    ohms: FloatArray
    shares: FloatArray
    fractions: FloatArray
    moves: FloatArray


def divide(network: Network, ohms: FloatArray) -> Division:
    """Return the division of a network.

    A child of a series node has the part R_child/R of the voltage, so that its logarithm moves with
    ln R_child - ln R, whose derivatives are shares; a child of a parallel node has all of it.

    Parameters
    ----------
    network : Network
    ohms : array, shape (leaf, T)
        Of each leaf, in the order of the network [ohm].
    """
    if isinstance(network, Leg):
        one = np.ones_like(ohms)
        return Division(ohms[0], one, one, np.zeros((1, *ohms.shape)))
    ends = np.cumsum([len(legs(child)) for child in network.children])
    parts = [divide(child, rows) for child, rows in zip(network.children, _cut(ohms, ends), strict=True)]
    series = isinstance(network, Series)
    sizes = np.stack([part.ohms if series else 1.0 / part.ohms for part in parts])
    whole = sizes.sum(axis=0)
    weights = sizes / whole
    shares = np.concatenate([w * part.shares for w, part in zip(weights, parts, strict=True)])
    moves = np.zeros((len(ohms), *ohms.shape))
    for last, part in zip(ends, parts, strict=True):
        own = slice(last - len(part.shares), last)
        moves[own, own] = part.moves + (part.shares if series else 0.0)
        moves[own] -= shares if series else 0.0
    fractions = [
        w * part.fractions if series else part.fractions for w, part in zip(weights, parts, strict=True)
    ]
    return Division(whole if series else 1.0 / whole, shares, np.concatenate(fractions), moves)


def _cut(ohms: FloatArray, ends: FloatArray) -> list[FloatArray]:
    return np.split(ohms, [int(end) for end in ends[:-1]])
