"""The made network with its bits and switches, and what a code does to each of its leaves.

A bit is its unit, body and ends of the film as drawn, with its switch parallel to it. Where the switch has
no resistance it is left out, and a bypassed unit counts as zero.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.material.law import Polynomial
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Leg, Network, Parallel, Series, legs
from tcplan.parts.trim.bits import set_bits
from tcplan.parts.trim.devices import Devices
from tcplan.parts.trim.members import Member
from tcplan.parts.trim.model import Row

OPEN = 1e15
"""What a switch that is off is multiplied with."""


@dataclass(frozen=True, slots=True, kw_only=True)
class CodedLeaf:
    """A leaf of the network with bits: the leaf it comes from, and whose bit it belongs to, if any."""

    origin: int
    leg: str = ""
    bit: int = -1
    switch: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Coded:
    """The made network with its bits; ``leaves`` follow its leaves."""

    network: Network
    leaves: tuple[CodedLeaf, ...]
    switch: Material


def coded_network(
    network: Network,
    members: Sequence[Member],
    rows: Sequence[Row],
    materials: Mapping[str, Material],
    switch_tc1: float,
    reference: float,
) -> Coded:
    """Return a made network with the bits of some of its legs.

    Parameters
    ----------
    network : Network
        As made.
    members : sequence of Member
        All its legs.
    rows : sequence of Row
        The bits of some of them.
    materials : mapping of name to Material
    switch_tc1, reference : float
        Of a switch [1/K], about a temperature [K].
    """
    switch = _switch(materials, switch_tc1, reference)
    by_leg = {row.leg: row for row in rows}
    bodies = {m.leaves[0]: (m, by_leg[m.id]) for m in members if m.id in by_leg}
    scaled = {
        k: ohms
        for m, row in bodies.values()
        for k, ohms in zip(m.leaves, row.pieces[0][: len(m.leaves)], strict=True)
    }
    leaves: list[CodedLeaf] = []
    old = legs(network)
    place = iter(range(len(old)))

    def rest(k: int) -> Leg:
        leaves.append(CodedLeaf(origin=k))
        return replace(old[k], ohms=scaled.get(k, old[k].ohms))

    def bit(member: Member, row: Row, n: int) -> Network:
        own = row.pieces[n + 1][: len(member.leaves)]
        unit = tuple(replace(old[k], ohms=ohms) for k, ohms in zip(member.leaves, own, strict=True))
        leaves.extend(CodedLeaf(origin=k, leg=row.leg, bit=n) for k in member.leaves)
        one: Network = unit[0] if len(unit) == 1 else Series(unit)
        if row.switch_ohms == 0.0:
            return one
        leaves.append(CodedLeaf(origin=-1, leg=row.leg, bit=n, switch=True))
        return Parallel((one, Leg(material=switch.name, ohms=row.switch_ohms)))

    def node(part: Network) -> Network:
        if not isinstance(part, Leg):
            return type(part)(tuple(node(child) for child in part.children))
        k = next(place)
        own = rest(k)
        if k not in bodies:
            return own
        member, row = bodies[k]
        return Series((own, *(bit(member, row, n) for n in range(len(row.bit_ohms)))))

    return Coded(network=node(network), leaves=tuple(leaves), switch=switch)


def _switch(materials: Mapping[str, Material], tc1: float, reference: float) -> Material:
    """Return the switch as a material whose name is not taken."""
    name = "switch"
    while name in materials:
        name = f"{name}_"
    kelvin = [m.usable for m in materials.values()]
    return Material(
        name=name,
        label="Switch of a bit, on",
        source="trim.switch_resistance of the brief",
        law=Polynomial(reference=reference, coefficients=(tc1,)),
        valid=(max(low for low, _ in kelvin), min(high for _, high in kelvin)),
        kind="plain",
        spread=Spread(meaning="limits", value=0.0, tc1=0.0, tc2=0.0),
    )


def coded_drift(devices: Devices, coded: Coded, rows: Sequence[Row], codes: Sequence[IntArray]) -> FloatArray:
    """Return the judged drift of every device with its codes, one array (devices,) of them a row."""
    bits = {row.leg: (row, set_bits(row, own)) for row, own in zip(rows, codes, strict=True)}
    count = devices.rows.shape[1]
    factors = np.ones((len(coded.leaves), count))
    for k, leaf in enumerate(coded.leaves):
        if leaf.origin >= 0:
            factors[k] = devices.mismatch[leaf.origin]
        if leaf.bit >= 0:
            row, own = bits[leaf.leg]
            if leaf.switch:
                factors[k] = np.where(own[:, leaf.bit], OPEN, 1.0)
            elif row.switch_ohms == 0.0:
                factors[k] *= own[:, leaf.bit]
    names = (*devices.lots.names, coded.switch.name)
    more = replace(
        devices,
        network=coded.network,
        materials={**devices.materials, coded.switch.name: coded.switch},
        lots=replace(devices.lots, names=names),
        rows=np.concatenate([devices.rows, np.ones((1, count))]),
        mismatch=np.ones(factors.shape),
    )
    return more.drift(factors)
