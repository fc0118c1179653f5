"""The box of devices of a pair in numbers: coordinates, networks, laws at temperatures.

The coordinates of a device are those of the value factors (one for the materials whose values move in full
step, in [-1, 1]), then the shifts of TC1 of all materials, then those of TC2. By how much the two
resistors of one material are apart is no coordinate: the ratio rises with every law of one resistor and
falls with every law of the other, so at a temperature both are at their limits.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.material.spread import Spread, value_half_width
from tcplan.network import Network, leg_shares, legs, resistance, used_materials
from tcplan.ratio.pair import SIDES, Pair, PairDevice, alias

EQUAL = 1e-15  # half-widths that differ by less are one


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """Temperatures [K], shape (T,), and what the goal asks there.

    ``base`` is the nominal law and ``x`` the distance from its own reference [K] of each material, shape
    (T, materials).
    """

    T: FloatArray
    weight: FloatArray
    wanted: FloatArray
    base: FloatArray
    x: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class Quotient:
    """A quotient of two networks; with ``up`` it is the ratio, else its inverse.

    ``plain`` says of the top and the bottom that value factors do not change their drift.
    """

    networks: tuple[Network, Network]
    plain: tuple[bool, bool]
    up: bool


@dataclass(frozen=True, slots=True, eq=False)
class Space:
    """The coordinates of a pair and what they do.

    ``half`` holds the half-width of each coordinate, ``own`` the value coordinate that each material
    follows, ``value_half`` its half-width; ``base`` and ``x`` are as in a `Grid`, at the reference.
    """

    pair: Pair
    names: tuple[str, ...]
    half: FloatArray
    own: IntArray
    value_half: FloatArray
    base: FloatArray
    x: FloatArray
    shared: BoolArray
    tracked: tuple[tuple[IntArray, float], ...]

    @property
    def groups(self) -> int:
        """How many coordinates of value factors there are."""
        return int(self.own.max()) + 1

    def factors(self, z: FloatArray) -> FloatArray:
        """Return the value factors, shape (.., materials)."""
        return np.asarray(1.0 + self.value_half * z[..., self.own])

    def tc1(self, z: FloatArray) -> FloatArray:
        """Return the shifts of TC1 [1/K], shape (.., materials)."""
        return z[..., self.groups : self.groups + len(self.names)]

    def tc2(self, z: FloatArray) -> FloatArray:
        """Return the shifts of TC2 [1/K^2], shape (.., materials)."""
        return z[..., self.groups + len(self.names) :]

    def grid(self, T: FloatArray, weight: FloatArray) -> Grid:
        """Return the grid of these temperatures."""
        laws = [self.pair.materials[name].law for name in self.names]
        return Grid(
            T=T,
            weight=weight,
            wanted=self.pair.need.wanted(T),
            base=np.stack([law.ratio(T) / float(law.ratio(law.reference)) for law in laws], axis=1),
            x=np.stack([T - law.reference for law in laws], axis=1),
        )

    def apart(self, T: FloatArray, *, up: bool) -> FloatArray:
        """Return what tracking adds to the laws, shape (2, T, materials), so that the ratio is extreme."""
        size = 0.5 * self.pair.tracking * np.abs(T - self.pair.need.reference)[:, None] * self.shared
        signs = [1.0 if (side == self.pair.rising) == up else -1.0 for side in SIDES]
        return np.stack([sign * size for sign in signs])

    def quotient(self, *, up: bool) -> Quotient:
        """Return the ratio, or its inverse: the least of the one is the largest of the other."""
        top, bottom = self.pair.networks()
        networks = (top, bottom) if up else (bottom, top)
        plain = tuple(self._plain(network) for network in networks)
        return Quotient(networks, (plain[0], plain[1]), up)

    def device(self, z: FloatArray, T: float, *, up: bool) -> PairDevice:
        """Return the device at a point that is extreme at T [K]."""
        step = self.apart(np.array([T]), up=up)[:, 0, :]
        x = T - self.pair.need.reference
        off = step / x if x else np.zeros_like(step)
        tc1, tc2 = self.tc1(z).tolist(), self.tc2(z).tolist()
        return PairDevice(
            dict(zip(self.names, self.factors(z).tolist(), strict=True)),
            {name: (tc1[k], tc2[k]) for k, name in enumerate(self.names)},
            {name: (float(off[0, k]), float(off[1, k])) for k, name in enumerate(self.names)},
        )

    def moving_values(self) -> tuple[list[int], bool]:
        """Return the value coordinates that count, and whether one of them may be put at its limit.

        The ratio does not change when all factors are scaled together; so any device can be scaled until
        its first factor is at its upper limit, unless one does not move or those of one coordinate differ.
        """
        names = {
            leg.material.partition("@")[0]
            for network in self.pair.networks()
            if not self._plain(network)
            for leg in legs(network)
        }
        used = np.array([name in names for name in self.names])
        groups = sorted(set(self.own[used].tolist()))
        halves = [self.value_half[used & (self.own == g)] for g in groups]
        scales = bool(groups) and all(np.ptp(h) <= EQUAL and h.min() > 0.0 for h in halves)
        return [g for g, h in zip(groups, halves, strict=True) if h.max() > 0.0], scales

    def _plain(self, network: Network) -> bool:
        used = {name.partition("@")[0] for name in used_materials(network)}
        at = [k for k, name in enumerate(self.names) if name in used]
        return len(set(self.own[at].tolist())) == 1 and bool(np.ptp(self.value_half[at]) <= EQUAL)


def space_of(pair: Pair) -> Space:
    """Return the box of a pair; a material without a spread does not move."""
    names, need = pair.names, pair.need
    limits = [pair.spreads.get(name, Spread(meaning="limits")).limits() for name in names]
    laws = [pair.materials[name].law for name in names]
    groups = pair.process.value_groups(names)
    order = sorted(set(groups))
    tc1 = np.array([spread.tc1_and_tcr or 0.0 for spread in limits])
    half = [np.ones(len(order)), tc1, np.array([spread.tc2 or 0.0 for spread in limits])]
    reference = np.array([need.reference])
    return Space(
        pair=pair,
        names=names,
        half=np.concatenate(half),
        own=np.array([order.index(group) for group in groups]),
        value_half=np.array(
            [value_half_width(law, s, need.reference) for law, s in zip(laws, limits, strict=True)]
        ),
        base=np.array([float(law.ratio(reference)[0] / law.ratio(law.reference)) for law in laws]),
        x=np.array([need.reference - law.reference for law in laws]),
        shared=np.array([name in pair.shared for name in names]),
        tracked=_tracked(pair, names, tc1),
    )


def _tracked(pair: Pair, names: Sequence[str], tc1: FloatArray) -> tuple[tuple[IntArray, float], ...]:
    """Return which materials track and how closely, where that limits their shifts at all."""
    found = []
    for tracking in pair.process.trackings:
        at = np.array([k for k, name in enumerate(names) if name in tracking.materials and tc1[k] > 0.0])
        if len(at) > 1 and tracking.within < float(np.sum(np.sort(tc1[at])[-2:])):
            found.append((at.astype(np.intp), tracking.within))
    return tuple(found)


def log_value(network: Network, names: Sequence[str], ohms: FloatArray) -> FloatArray:
    """Return ln R of values by resistor and material, shape (2, .., materials) -> (..)."""
    return np.asarray(np.log(resistance(network, _named(names, ohms))))


def material_shares(network: Network, names: Sequence[str], ohms: FloatArray) -> FloatArray:
    """Return d ln R/d ln of each value, shape (2, .., materials) like the values."""
    found = np.zeros_like(ohms)
    place = {alias(name, side): (side - 1, k) for k, name in enumerate(names) for side in SIDES}
    for leg, share in zip(legs(network), leg_shares(network, _named(names, ohms)), strict=True):
        side, k = place[leg.material]
        found[side, ..., k] += share
    return found


def _named(names: Sequence[str], ohms: FloatArray) -> dict[str, FloatArray]:
    return {alias(name, side): ohms[side - 1, ..., k] for k, name in enumerate(names) for side in SIDES}
