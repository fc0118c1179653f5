"""What each leg carries at most, over all temperatures."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal, TypeAlias

from tcplan.arrays import FloatArray
from tcplan.network import Leg, Network, Series, legs
from tcplan.operating.elements import Element

if TYPE_CHECKING:
    from tcplan.operating.point import OperatingPoint

Joined: TypeAlias = Literal["one", "series", "parallel", "apart"]


@dataclass(frozen=True, slots=True, kw_only=True)
class LegLoad:
    """The largest voltage [V], power [W], current [A] and temperature [K] of a leg, each at its most."""

    voltage: float
    power: float
    current: float
    temperature: float


def worst_by_leg(point: OperatingPoint) -> dict[str, LegLoad]:
    """Return what each leg carries at most over the temperatures of an operating point.

    Parameters
    ----------
    point : OperatingPoint

    Returns
    -------
    dict of leg id to LegLoad
        Power is that of all leaves of the leg together. The voltage of leaves in series, and the current
        of leaves in parallel, are summed as well; of leaves that stand apart it is that of the largest.
    """
    found = {}
    for name, joined in point.joined.items():
        rows = [k for k, element in enumerate(point.elements) if element.leg == name]
        voltage, current = point.voltage[rows], point.current[rows]
        found[name] = LegLoad(
            voltage=_most(voltage, together=joined == "series"),
            power=_most(point.power[rows], together=True),
            current=_most(current, together=joined == "parallel"),
            temperature=_most(point.temperature[rows], together=False),
        )
    return found


def _most(rows: FloatArray, *, together: bool) -> float:
    return float((rows.sum(axis=0) if together else rows).max())


def joined_legs(network: Network, elements: Sequence[Element]) -> dict[str, Joined]:
    """Return how the leaves of each leg stand: members of one series or one parallel node, or apart.

    Parameters
    ----------
    network : Network
    elements : sequence of Element
        One a leaf, in its order.
    """
    names = [element.leg for element in elements]
    found: dict[str, Joined] = {
        name: "one" if names.count(name) == 1 else "apart" for name in dict.fromkeys(names)
    }
    _look(network, names, names, found)
    return found


def _look(node: Network, inside: list[str], names: list[str], found: dict[str, Joined]) -> None:
    """Note the legs all of whose leaves are members of this node, and look inside its children.

    ``inside`` holds the leg of every leaf of this node, ``names`` that of every leaf there is.
    """
    if isinstance(node, Leg):
        return
    members: list[str] = []
    start = 0
    for child in node.children:
        own = inside[start : start + len(legs(child))]
        members += own if isinstance(child, Leg) else []
        start += len(own)
        _look(child, own, names, found)
    for name in set(members):
        if members.count(name) > 1 and members.count(name) == names.count(name):
            found[name] = "series" if isinstance(node, Series) else "parallel"
