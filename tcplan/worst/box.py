"""The spread box of a network: its devices, their curves, and what they are judged to reach."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.drift import Curve
from tcplan.goal import Judged, Requirement, judged
from tcplan.material.bounds import LawBounds
from tcplan.material.model import Material
from tcplan.material.spread import Spread, law_vertices, shifted_ratio, value_half_width
from tcplan.network import Network, deviated, resistance, used_materials, value
from tcplan.process import INDEPENDENT, Process, step_groups


@dataclass(frozen=True, slots=True)
class Device:
    """One point of the spread box: factor, TC1 shift and TC2 shift by material."""

    factors: dict[str, float]
    shifts: dict[str, tuple[float, float]]

    def with_factor(self, name: str, factor: float) -> Device:
        """Return this device with another value factor of one material."""
        return Device({**self.factors, name: factor}, self.shifts)

    def with_shift(self, name: str, shift: tuple[float, float]) -> Device:
        """Return this device with other shifts of one material."""
        return Device(self.factors, {**self.shifts, name: shift})


@dataclass(frozen=True, slots=True)
class Worst:
    """The worst device found, what it reaches, how, and a bound on every device."""

    device: Device
    judged: Judged
    upper: float
    method: str


@dataclass(frozen=True, eq=False)  # without slots: what is asked for in every cell is worked out once
class Box:
    """A network with the limits of its materials.

    A value factor is 1 + D s with D the half-width of its material and s a coordinate in [-1, 1];
    materials whose values move in full step have one coordinate together.
    """

    network: Network
    materials: Mapping[str, Material]
    spreads: Mapping[str, Spread]
    need: Requirement
    process: Process = INDEPENDENT

    @cached_property
    def names(self) -> tuple[str, ...]:
        """The materials of the network."""
        return used_materials(self.network)

    @cached_property
    def _half_widths(self) -> FloatArray:
        laws = [self.materials[n].law for n in self.names]
        reference = self.need.reference
        return np.array(
            [
                value_half_width(law, self.spreads[n], reference)
                for law, n in zip(laws, self.names, strict=True)
            ]
        )

    @cached_property
    def _coordinates(self) -> IntArray:
        groups = step_groups(self.names, self.materials, self.spreads, self.process, self.need.reference)
        order = sorted(set(groups))
        return np.array([order.index(group) for group in groups])

    @cached_property
    def _law_bounds(self) -> LawBounds:
        laws = [self.materials[n].law for n in self.names]
        return LawBounds(laws, [self.spreads[n] for n in self.names], self.need.reference)

    def half_widths(self) -> FloatArray:
        """Return the half-width of each value factor at the brief's reference."""
        return self._half_widths

    def coordinate_of(self) -> IntArray:
        """Return the position of the coordinate that each material follows, 0, 1, ... in order."""
        return self._coordinates

    def factors_at(self, coordinates: FloatArray) -> FloatArray:
        """Return the value factors, shape (.., materials), at coordinates, shape (.., coordinates)."""
        return np.asarray(1.0 + self.half_widths() * coordinates[..., self.coordinate_of()])

    def in_step_with(self, name: str) -> tuple[str, ...]:
        """Return the materials of the network whose values move in full step with one, itself among them."""
        own = dict(zip(self.names, self.coordinate_of().tolist(), strict=True))
        return tuple(other for other in self.names if own[other] == own[name])

    def in_step(self) -> bool:
        """Whether the materials of each coordinate have one half-width, so that their factors are equal."""
        half, own = self.half_widths(), self.coordinate_of()
        return all(np.ptp(half[own == k]) <= 1e-15 for k in range(int(own.max()) + 1))

    def bounds(self, T: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the lowest and highest law ratios, shape (materials, T)."""
        return self._law_bounds.at(T)

    def shifts_at(self, T: float, sign: int) -> dict[str, tuple[float, float]]:
        """Return the corner of (TC1, TC2) of each material that is highest (or lowest) at T."""
        at = np.array([T])
        chosen = {}
        for n in self.names:
            law = self.materials[n].law
            corners = law_vertices(self.spreads[n])
            ratios = [sign * shifted_ratio(law, c, self.need.reference, at)[0] for c in corners]
            chosen[n] = corners[int(np.argmax(ratios))]
        return chosen

    def curve(self, device: Device) -> Curve:
        """Return T -> R(T)/R(T_ref) of one device."""
        network = deviated(self.network, device.factors)
        own = value(network)

        def ratio(T: FloatArray) -> FloatArray:
            ratios = {
                n: shifted_ratio(self.materials[n].law, device.shifts[n], self.need.reference, T)
                for n in self.names
            }
            return resistance(network, ratios) / own

        return ratio

    def judge(self, device: Device) -> Judged:
        """Return the figure of one device over the continuous range."""
        splits = [b for n in self.names for b in self.materials[n].law.breakpoints]
        return judged(self.curve(device), self.need, splits)
