"""A device whose leg values may change: its drift and its level as functions of the changes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import exp, log

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.errors import InternalError
from tcplan.measure.comparison import Expected
from tcplan.measure.composite import Composite
from tcplan.network import Leg, Network, leg_shares, legs, resistance, value

POINTS = 41  # temperatures a piece
ROUNDING = 1e-10  # a figure that is no drift


@dataclass(frozen=True, slots=True, eq=False)
class Task:
    """A device whose leg values may change: x are the logarithms of the factors of the free legs.

    ``leaf`` is for each leaf its position in x, -1 where it cannot change. ``ratios`` are at the temperatures
    of the points and then the reference.
    """

    network: Network
    leaf: IntArray
    ratios: dict[str, FloatArray]
    wanted: FloatArray
    weight: FloatArray
    centred: FloatArray
    ohms: float
    scale: float

    @property
    def free(self) -> int:
        """How many legs can change."""
        return int(self.leaf.max()) + 1

    def factors(self, x: FloatArray) -> tuple[float, ...]:
        """Return the factor of every leaf."""
        return tuple(exp(x[k]) if k >= 0 else 1.0 for k in self.leaf.tolist())

    def drift(self, x: FloatArray) -> FloatArray:
        """Return the drift at the points, in units of the scale."""
        ohms = resistance(changed(self.network, self.factors(x)), self.ratios)
        return np.asarray((ohms[:-1] / ohms[-1] - self.wanted) / self.scale)

    def drift_slopes(self, x: FloatArray) -> FloatArray:
        """Return d(drift)/dx, shape (points, free)."""
        network = changed(self.network, self.factors(x))
        ohms, share = resistance(network, self.ratios), self._shares(network)
        return np.asarray((ohms[:-1] / ohms[-1])[:, None] * (share[:-1] - share[-1]) / self.scale)

    def level(self, x: FloatArray) -> float:
        """Return ln R(reference) less that of the wanted value."""
        ohms = resistance(changed(self.network, self.factors(x)), self.ratios)
        return log(float(ohms[-1]) / self.ohms)

    def level_slopes(self, x: FloatArray) -> FloatArray:
        """Return d(level)/dx."""
        return np.asarray(self._shares(changed(self.network, self.factors(x)))[-1])

    def _shares(self, network: Network) -> FloatArray:
        """Return d ln R/dx, shape (points and the reference, free)."""
        found = np.zeros((len(self.wanted) + 1, self.free))
        for k, share in zip(self.leaf.tolist(), leg_shares(network, self.ratios), strict=True):
            if k >= 0:
                found[:, k] += share
        return found


def changed(network: Network, factors: Sequence[float]) -> Network:
    """Return the network with each leaf multiplied by its factor."""
    rest = iter(factors)

    def made(node: Network) -> Network:
        if isinstance(node, Leg):
            return Leg(material=node.material, ohms=node.ohms * next(rest), strings=node.strings)
        return type(node)(tuple(made(child) for child in node.children))

    return made(network)


def task_of(expected: Expected, composite: Composite, deviations: FloatArray) -> Task:
    """Return a device, with its deviations, as one whose leg values may change."""
    pieces = [(p, np.linspace(p.low, p.high, POINTS if p.high > p.low else 1)) for p in expected.need.pieces]
    T = np.concatenate([points for _, points in pieces])
    ratios = composite.ratios(deviations, np.r_[T, composite.reference])
    if ratios is None:
        raise InternalError("the mean of devices reaches zero, and none of them does")
    groups = expected.changed or tuple(range(len(legs(expected.network))))
    free = sorted(set(groups) - expected.fixed)
    ohms = resistance(expected.network, ratios)
    wanted = expected.need.wanted(T)
    weight = np.concatenate([np.full(len(points), p.weight) for p, points in pieces])
    drift = ohms[:-1] / ohms[-1] - wanted
    return Task(
        network=expected.network,
        leaf=np.array([free.index(g) if g in free else -1 for g in groups], dtype=np.intp),
        ratios=ratios,
        wanted=wanted,
        weight=weight,
        centred=np.concatenate([np.full(len(points), float(p.centred)) for p, points in pieces]),
        ohms=value(expected.network) if expected.level_known else float(ohms[-1]),
        scale=max(float(np.max(np.abs(drift) / weight)), ROUNDING),
    )
