"""Mismatch of a pair: what the areas of its legs leave of the ratio, at random, from unit to unit."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.sampling import leg_mismatch
from tcplan.network import leg_shares, legs, resistance
from tcplan.ratio.pair import Pair
from tcplan.ratio.space import space_of

SIGMAS = 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Mismatch:
    """1 sigma of the ratio at the reference, and of its drift where that is largest [K].

    Both are fractions, of the ratio and of drift. ``unstated`` are the materials that do not say it: their
    legs count as matched. ``value`` and ``drift`` are None when it is known of no leg.
    """

    value: float | None
    drift: float | None
    at: float | None
    unstated: tuple[str, ...]


def mismatch_of(pair: Pair, T: FloatArray) -> Mismatch:
    """Return the mismatch of a pair, its drift part at the worst of some temperatures [K]."""
    sigmas = leg_mismatch(pair.together, pair.materials, pair.need.reference)
    unstated = [leg.material for leg, s in zip(legs(pair.together), sigmas, strict=True) if s is None]
    if len(unstated) == len(sigmas):
        return Mismatch(value=None, drift=None, at=None, unstated=tuple(dict.fromkeys(unstated)))
    known = np.array([sigma or 0.0 for sigma in sigmas])
    drift = drift_sigma(pair, T)
    k = int(np.argmax(drift))
    at_reference = sensitivities(pair, np.array([pair.need.reference]))[:, 0]
    return Mismatch(
        value=float(np.sqrt(np.sum((known * at_reference) ** 2))),
        drift=float(drift[k]),
        at=float(T[k]),
        unstated=tuple(dict.fromkeys(unstated)),
    )


def drift_sigma(pair: Pair, T: FloatArray) -> FloatArray:
    """Return 1 sigma of the drift at temperatures, shape (T,): legs of unknown mismatch count as matched."""
    sigmas = leg_mismatch(pair.together, pair.materials, pair.need.reference)
    known = np.array([sigma or 0.0 for sigma in sigmas])[:, None]
    moved = sensitivities(pair, T) - sensitivities(pair, np.array([pair.need.reference]))
    return np.asarray(np.sqrt(np.sum((known * moved) ** 2, axis=0)) * pair.curve(pair.nominal())(T))


def sensitivities(pair: Pair, T: FloatArray) -> FloatArray:
    """Return d ln q/d ln R_k of every leg, those of the first resistor first, shape (legs, T).

    With p the share of a leg in its resistor it is p and -p for a gain; for a divider q = R2/(R1 + R2) it
    is -(1 - q) p and (1 - q) p.
    """
    ratios = {name: pair.materials[name].ratio(T, pair.need.reference) for name in pair.names}
    first, second = pair.ratio.first, pair.ratio.second
    shares = [np.stack(leg_shares(network, ratios)) for network in (first, second)]
    if pair.ratio.kind == "gain":
        return np.concatenate([shares[0], -shares[1]])
    top, other = resistance(second, ratios), resistance(first, ratios)
    rest = other / (top + other)
    return np.concatenate([-rest * shares[0], rest * shares[1]])


def value_range(pair: Pair) -> tuple[float, float]:
    """Return how far the ratio at the reference goes below and above nominal over the value spreads.

    Fractions, found at limits and middles of the value factors. In one material they are 0: the common
    spread cancels.
    """
    space = space_of(pair)
    own, found = pair.value(), []
    for levels in product((-1.0, 0.0, 1.0), repeat=space.groups):
        z = np.concatenate([np.array(levels), np.zeros(2 * len(space.names))])
        factors = dict(zip(space.names, space.factors(z).tolist(), strict=True))
        found.append(pair.value(factors) / own - 1.0)
    return min(found), max(found)
