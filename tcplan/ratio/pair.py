"""Two resistors of one device and their ratio.

Both kinds of ratio are one quotient of two networks, top/bottom: a gain is first/second, a divider
second/(first + second). A device has one value factor and one law shift for each material, common to both
resistors; with tracking, the law of a material may differ from the common one in each resistor by
(T - T_ref) times at most half of it. So each leg stands here by an alias that names its resistor too.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.brief.model import Ratio
from tcplan.drift import Curve, breakpoints
from tcplan.goal import Judged, Requirement, judged
from tcplan.material.model import Material
from tcplan.material.spread import Spread, shifted_ratio
from tcplan.network import Leg, Network, Parallel, Series, mapped, simplified, used_materials, value
from tcplan.network import resistance as _resistance
from tcplan.process import INDEPENDENT, Process

SIDES = (1, 2)
ROUNDING = 1e-12  # relative; values of two networks that differ by less are equal


@dataclass(frozen=True, slots=True)
class PairDevice:
    """One device, by material: value factors, and shifts of TC1 and TC2 that both resistors share.

    ``apart`` is by how much the TC1 [1/K] of the first and of the second resistor are off the common one,
    about the reference of the brief.
    """

    factors: dict[str, float]
    shifts: dict[str, tuple[float, float]]
    apart: dict[str, tuple[float, float]]


@dataclass(frozen=True, slots=True, kw_only=True)
class Pair:
    """A ratio with all that it is judged by.

    ``spreads`` holds the limits of the materials that state them; ``tracking`` is that of the ratio as a
    number, 0 when it is not stated.
    """

    ratio: Ratio
    materials: Mapping[str, Material]
    spreads: Mapping[str, Spread]
    need: Requirement
    process: Process = INDEPENDENT
    tracking: float = 0.0

    @property
    def names(self) -> tuple[str, ...]:
        """The materials, each once, in order of first use."""
        return used_materials(self.together)

    @property
    def together(self) -> Network:
        """Both resistors as one network, its legs those of the first and then of the second."""
        return Series((self.ratio.first, self.ratio.second))

    @property
    def shared(self) -> tuple[str, ...]:
        """The materials that are in both resistors."""
        second = used_materials(self.ratio.second)
        return tuple(name for name in used_materials(self.ratio.first) if name in second)

    @property
    def rising(self) -> int:
        """The resistor, 1 or 2, that the ratio rises with."""
        return 1 if self.ratio.kind == "gain" else 2

    def networks(self) -> tuple[Network, Network]:
        """Return the top and the bottom of the quotient, each leg by the alias of its material."""
        first, second = aliased(self.ratio.first, 1), aliased(self.ratio.second, 2)
        if self.ratio.kind == "gain":
            return simplified(first), simplified(second)
        return simplified(second), simplified(Series((first, second)))

    def value(self, factors: Mapping[str, float] | None = None) -> float:
        """Return the ratio at the reference, nominal or with value factors by material."""
        known = factors or {}
        aliases = {alias(n, side): np.array(known.get(n, 1.0)) for n in self.names for side in SIDES}
        top, bottom = self.networks()
        return float(_resistance(top, aliases) / _resistance(bottom, aliases))

    def nominal(self) -> PairDevice:
        """Return the device that is nowhere off."""
        none = dict.fromkeys(self.names, (0.0, 0.0))
        return PairDevice(dict.fromkeys(self.names, 1.0), none, none)

    def curve(self, device: PairDevice) -> Curve:
        """Return T -> q(T)/q(T_ref) of one device."""
        factors = {alias(n, side): f for n, f in device.factors.items() for side in SIDES}
        top, bottom = (_deviated(network, factors) for network in self.networks())
        own, at = value(top) / value(bottom), self.need.reference

        def ratio(T: FloatArray) -> FloatArray:
            laws = {}
            for name in self.names:
                common = shifted_ratio(self.materials[name].law, device.shifts[name], at, T)
                for side in SIDES:
                    laws[alias(name, side)] = common + device.apart[name][side - 1] * (T - at)
            return np.asarray(_resistance(top, laws) / _resistance(bottom, laws) / own)

        return ratio

    def judge(self, device: PairDevice) -> Judged:
        """Return the figure of one device over the continuous range."""
        return judged(self.curve(device), self.need, breakpoints(self.materials, self.names))

    @property
    def always_flat(self) -> bool:
        """Whether top and bottom have one law in every device: equal networks without tracking."""
        if self.tracking and self.shared:
            return False
        first, second = (normal_form(network) for network in (self.ratio.first, self.ratio.second))
        return _alike(first, second)


def alias(name: str, side: int) -> str:
    """Return what a material is called in one resistor; no name of a material has this sign."""
    return f"{name}@{side}"


def aliased(network: Network, side: int) -> Network:
    """Return the network of one resistor, its legs by their aliases."""
    return mapped(network, lambda leg: replace(leg, material=alias(leg.material, side)))


def _deviated(network: Network, factors: Mapping[str, float]) -> Network:
    return mapped(network, lambda leg: replace(leg, ohms=leg.ohms * factors[leg.material]))


def normal_form(network: Network) -> Network:
    """Return a network of 1 ohm with its members in an order of their own."""
    whole = value(network)
    return _sorted(mapped(simplified(network), lambda leg: Leg(material=leg.material, ohms=leg.ohms / whole)))


def _sorted(network: Network) -> Network:
    if isinstance(network, Leg):
        return network
    return type(network)(tuple(sorted(map(_sorted, network.children), key=_order)))


def _order(network: Network) -> tuple[str, tuple[str, ...], float]:
    kind = "leg" if isinstance(network, Leg) else "series" if isinstance(network, Series) else "parallel"
    return kind, used_materials(network), round(value(network), 9)


def _alike(one: Network, other: Network) -> bool:
    """Whether two networks are the same but for rounding of their values."""
    if isinstance(one, Leg) and isinstance(other, Leg):
        return one.material == other.material and abs(one.ohms - other.ohms) <= ROUNDING * one.ohms
    if isinstance(one, (Series, Parallel)) and type(one) is type(other):
        own, others = one.children, other.children
        return len(own) == len(others) and all(map(_alike, own, others))
    return False
