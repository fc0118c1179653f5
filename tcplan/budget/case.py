"""What a budget is made against: data, spreads, range and limits, and what the brief adds to them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from tcplan.brief.model import Allowance
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network, deviated, used_materials
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
    """

    materials: Mapping[str, Material]
    over: TemperatureRange
    need: Requirement
    process: Process = INDEPENDENT
    allowances: tuple[Allowance, ...] = ()
    tolerance: float | None = None
    trim_step: float | None = None
    redrawn: Mapping[str, float] = field(default_factory=dict)

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

    def box(self, network: Network) -> Box:
        """Return the spread box of a network, as it comes out with these data."""
        return Box(deviated(network, self.redrawn), self.materials, self.spreads(), self.need, self.process)
