"""The operating point of a network: what every leaf carries, and how hot it gets."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.brief.model import Operating
from tcplan.errors import InternalError
from tcplan.material.model import Material
from tcplan.network import Network, legs
from tcplan.operating.device import Device, state_of
from tcplan.operating.elements import Element
from tcplan.operating.loads import Joined, joined_legs
from tcplan.operating.raising import raised
from tcplan.operating.refusals import check_ambient, refusal


@dataclass(frozen=True, slots=True, kw_only=True)
class OperatingPoint:
    """A network under power, at each ambient temperature.

    Parameters
    ----------
    T : array, shape (T,)
        Ambient temperatures [K].
    ohms, cold_ohms : array, shape (T,)
        Of the whole [ohm]: voltage over current at the operating point, and without power.
    total_voltage, total_current : array, shape (T,)
        Of the whole [V], [A].
    voltage, current, power, temperature : array, shape (leaf, T)
        Of each leaf [V], [A], [W], [K].
    elements : tuple of Element
        One a leaf.
    joined : mapping of leg id to {"one", "series", "parallel", "apart"}
        How the leaves of a leg stand to each other.
    not_stated : tuple of str
        Materials without a voltage coefficient, which counts as 0.
    no_length : tuple of str
        Materials whose coefficient is per length and whose length is not known; it counts as 0.
    not_heated : tuple of str
        Materials of legs without a thermal resistance.
    """

    T: FloatArray
    ohms: FloatArray
    cold_ohms: FloatArray
    total_voltage: FloatArray
    total_current: FloatArray
    voltage: FloatArray
    current: FloatArray
    power: FloatArray
    temperature: FloatArray
    elements: tuple[Element, ...]
    joined: Mapping[str, Joined]
    not_stated: tuple[str, ...]
    no_length: tuple[str, ...]
    not_heated: tuple[str, ...]

    @property
    def unit_voltage(self) -> FloatArray:
        """Across one unit of each leaf [V], shape (leaf, T)."""
        return np.asarray(self.voltage / np.array([[e.units] for e in self.elements]))

    @property
    def unit_current(self) -> FloatArray:
        """Through one string of each leaf [A], shape (leaf, T)."""
        return np.asarray(self.current / np.array([[e.strings] for e in self.elements]))


def operating_point(
    network: Network,
    materials: Mapping[str, Material],
    elements: Sequence[Element],
    operating: Operating,
    reference: float,
    T: FloatArray,
    *,
    by_heat_only: bool = False,
) -> OperatingPoint:
    """Return the operating point of a network: R = V/I, with R(V) = R(0) (1 + k |V|) of each unit.

    Parameters
    ----------
    network : Network
        The nominal device.
    materials : mapping of name to Material
    elements : sequence of Element
        One a leaf, in the order of the network.
    operating : Operating
    reference : float
        Where the values of the legs hold, without power [K].
    T : array, shape (T,)
        Ambient temperatures [K].
    by_heat_only : bool
        Whether the voltage coefficients count as 0.

    Returns
    -------
    OperatingPoint
        Solved together until ln R of every leaf moves by less than 1e-11.

    Raises
    ------
    InputError
        At "operating": for a drive without a stable point (thermal runaway), or one at which a leaf
        leaves the temperatures that its material is usable for; with the largest drive that has one.
    """
    leaves = tuple(materials[leg.material] for leg in legs(network))
    if len(elements) != len(leaves):
        raise InternalError(f"{len(elements)} elements for {len(leaves)} leaves")
    at = np.atleast_1d(np.asarray(T, dtype=np.float64))
    device = _device(network, leaves, elements, operating, reference, by_heat_only=by_heat_only)
    drive = operating.voltage if operating.voltage is not None else operating.current
    if drive is None:
        raise InternalError("an operating point without a voltage or a current")
    check_ambient(device, at)
    end = raised(device, at, drive)
    if end.part < 1.0:
        raise refusal(device, at, drive, end)
    state = end.state
    ohms = state.division.ohms
    voltage = np.full_like(at, drive) if device.by_voltage else drive * ohms
    return OperatingPoint(
        T=at,
        ohms=ohms,
        cold_ohms=state_of(device, at, 0.0, device.cold(at)).division.ohms,
        total_voltage=voltage,
        total_current=voltage / ohms,
        voltage=state.voltage,
        current=state.power / state.voltage,
        power=state.power,
        temperature=state.temperature,
        elements=tuple(elements),
        joined=joined_legs(network, elements),
        not_stated=_once(
            m.name
            for m, e in zip(leaves, elements, strict=True)
            if m.voltage_coefficient is None and not e.ends
        ),
        no_length=_once(m.name for m, e in zip(leaves, elements, strict=True) if _per_volt(m, e) is None),
        not_heated=_once(m.name for m, row in zip(leaves, device.heating, strict=True) if not row.any()),
    )


def _once(names: Iterable[str]) -> tuple[str, ...]:
    return tuple(dict.fromkeys(names))


def _device(
    network: Network,
    leaves: tuple[Material, ...],
    elements: Sequence[Element],
    operating: Operating,
    reference: float,
    *,
    by_heat_only: bool,
) -> Device:
    rows = zip(leaves, elements, strict=True)
    per_volt = [0.0 if by_heat_only else (_per_volt(m, e) or 0.0) / e.units for m, e in rows]
    return Device(
        network=network,
        materials=leaves,
        reference=reference,
        per_volt=np.array(per_volt),
        heating=_heating(leaves, elements, operating),
        by_voltage=operating.voltage is not None,
    )


def _per_volt(material: Material, element: Element) -> float | None:
    """Return the voltage coefficient of one unit [1/V]; None when its length is not known."""
    stated = material.voltage_coefficient
    if stated is None:
        return 0.0
    if stated.per_volt is not None:
        return stated.per_volt
    if stated.metre_per_volt is None or element.length is None:
        return None
    return stated.metre_per_volt / element.length


def _heating(leaves: tuple[Material, ...], elements: Sequence[Element], operating: Operating) -> FloatArray:
    """Return the rise of each leaf by the power of each other [K/W]."""
    size = len(leaves)
    if operating.thermal_resistance is not None:
        return np.full((size, size), operating.thermal_resistance)
    stated = dict(operating.leg_thermal_resistance)
    own: dict[str, float] = {}
    for material, element in zip(leaves, elements, strict=True):
        if material.name in stated:  # the ends of a film are not named; they heat with its body
            own.setdefault(element.leg, stated[material.name])
    names = [element.leg for element in elements]
    return np.array([[own.get(one, 0.0) if one == other else 0.0 for other in names] for one in names])
