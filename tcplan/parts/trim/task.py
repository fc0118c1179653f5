"""What every method of trim starts from, and how devices are told: drift, value, mix, slope."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.brief.model import Trim
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network, value
from tcplan.parts.trim.codes import leg_ohms
from tcplan.parts.trim.devices import Devices, stat, whole
from tcplan.parts.trim.members import Member
from tcplan.parts.trim.model import Reached


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Task:
    """A made network, its legs, its devices, and what is wanted of them; ``target`` in ohm."""

    network: Network
    members: tuple[Member, ...]
    materials: Mapping[str, Material]
    spreads: Mapping[str, Spread]
    devices: Devices
    need: Requirement
    trim: Trim
    target: float
    seed: int

    @property
    def draws(self) -> int:
        """How many devices."""
        return int(self.devices.rows.shape[1])

    @property
    def low(self) -> float:
        """The lowest temperature that is judged [K]."""
        return min(piece.low for piece in self.need.pieces)

    @property
    def high(self) -> float:
        """The highest temperature that is judged [K]."""
        return max(piece.high for piece in self.need.pieces)

    def wanted_ohms(self, member: Member) -> float:
        """Return the value of a leg [ohm] with which the nominal whole is on its target."""
        return member.ohms * self.target / value(self.network)

    def wanted_ratio(self, temperature: float) -> float:
        """Return the wanted R(T)/R(T_ref)."""
        return float(self.need.wanted(np.array([temperature]))[0])

    def reached(
        self,
        drift: FloatArray,
        leaves: Sequence[FloatArray],
        legs: Sequence[Member],
        chord: FloatArray | None = None,
    ) -> Reached:
        """Return what devices reach: their judged drift, and their values at the reference leaf by leaf."""
        total = whole(self.network, leaves) / self.target
        own = np.stack([np.broadcast_to(each, total.shape) for each in leaves])
        parts = [leg_ohms(own, leg) / self.wanted_ohms(leg) / total - 1.0 for leg in legs]
        return Reached(
            drift=stat(drift),
            value=stat(total - 1.0),
            mix=stat(np.max(np.abs(parts), axis=0)),
            chord=None if chord is None else stat(chord),
        )

    def factors(self, legs: Sequence[Member], own: Sequence[FloatArray]) -> FloatArray:
        """Return what each leaf is multiplied with, (leaves, devices), some legs having their own factor."""
        found = np.ones(self.devices.mismatch.shape)
        for leg, factor in zip(legs, own, strict=True):
            found[list(leg.leaves)] = factor
        return found
