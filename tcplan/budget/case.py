"""What a budget is made against: data, spreads, range and limits, and what the brief adds to them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from tcplan.brief.model import Allowance, Operating
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network, deviated, used_materials
from tcplan.operating import Element, plain_elements
from tcplan.process import INDEPENDENT, Process
from tcplan.ranges import TemperatureRange
from tcplan.worst.box import Box


@dataclass(frozen=True, slots=True, kw_only=True)
class Case:
    """What a budget is made against.

    Parameters
    ----------
    materials : mapping of name to Material
    over : TemperatureRange
    need : Requirement
        Over the same range.
    process : Process
        What the materials share.
    allowances : tuple of Allowance
    tolerance, trim_step : float, optional
        Of the value at the reference, as fractions.
    redrawn : mapping of name to float
        By how much the value of the legs of a material differs from that in the option, because its
        data changed and its drawing did not.
    operating : Operating, optional
        What the resistor works at.
    elements : tuple of Element, optional
        What each leaf of a made network is made of, the ends of films among them. When not given every
        leaf is one unit, and the ends are estimated beside them.
    """

    materials: Mapping[str, Material]
    over: TemperatureRange
    need: Requirement
    process: Process = INDEPENDENT
    allowances: tuple[Allowance, ...] = ()
    tolerance: float | None = None
    trim_step: float | None = None
    redrawn: Mapping[str, float] = field(default_factory=dict)
    operating: Operating | None = None
    elements: tuple[Element, ...] | None = None

    def spreads(self) -> dict[str, Spread]:
        """Return the spread of every material over the range; one without any counts as exact."""
        none = Spread(meaning="limits")
        return {
            name: material.effective_spread(self.over.low, self.over.high) or none
            for name, material in self.materials.items()
        }

    def without_spread(self, network: Network) -> tuple[str, ...]:
        """Return the materials of a network that state no spread."""
        return tuple(name for name in used_materials(network) if self.materials[name].spread is None)

    def made_of(self, network: Network) -> tuple[Element, ...]:
        """Return what each leaf of a network is made of."""
        if self.elements is not None:
            return self.elements
        return plain_elements(network, self.materials, self.over.reference)

    def box(self, network: Network) -> Box:
        """Return the spread box of a network, as it comes out with these data."""
        return Box(deviated(network, self.redrawn), self.materials, self.spreads(), self.need, self.process)
