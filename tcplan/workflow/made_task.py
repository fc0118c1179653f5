"""What an option is to be made of: its networks at every value, the rules, and how a made one is judged."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from tcplan.budget.rebuilt import Asked
from tcplan.goal import requirement
from tcplan.made import MadeLeg, PlainLeg
from tcplan.network import Network, leg_names, legs, used_materials, value
from tcplan.operating import operating_point, plain_elements, worst_by_leg
from tcplan.parts.films import FilmRules
from tcplan.parts.network import Assembly, assembled, made_process
from tcplan.plan import Option, Plan
from tcplan.units import format_ohms
from tcplan.verify.option import Case, nominal_figure
from tcplan.worst.corners import corner_figure
from tcplan.worst.evaluation import worst_case

NEAR = 1e-9
DIGITS = 9  # of a value in a label: two values of a brief differ in fewer
POINTS = 33  # ambient temperatures at which a load is looked at


@dataclass(frozen=True, slots=True, kw_only=True)
class PartsRules:
    """What parts may be: rules of films, whether a stock leg may be two parts, and how wire is cut [m]."""

    films: FilmRules = field(default_factory=FilmRules)
    pairs: bool = True
    wire_step: float = 1e-3
    cut_error: float = 0.5e-3

    def to_dict(self) -> dict[str, Any]:
        """Return the rules as plan.json holds them."""
        films = self.films
        return {
            "value_error": films.error,
            "most_units": films.most_count,
            "max_area_m2": films.max_area,
            "max_width_m": films.max_width,
            "mismatch": films.mismatch,
            "pairs": self.pairs,
            "wire_step_m": self.wire_step,
            "cut_error_m": self.cut_error,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Task:
    """One option of a plan that is to be made.

    ``networks`` are the ideal ones, one for each value that is asked, of one shape; ``fixed`` are the
    positions of members that are as they are. Films are drawn for ``room`` times the current of the ideal.
    """

    plan: Plan
    asked: Asked
    ideal: Option
    rules: PartsRules
    networks: tuple[Network, ...]
    fixed: frozenset[int]
    room: float = 1.0

    @property
    def names(self) -> tuple[str, ...]:
        """The ids of the legs, in the order of each network."""
        return leg_names(len(legs(self.ideal.network)))

    def label(self, k: int, name: str) -> str:
        """Return what a leg of the network ``k`` is called among those of all values."""
        whole = format_ohms(value(self.networks[k]), DIGITS)
        return name if len(self.networks) == 1 else f"{name} of {whole}"

    def wanted(self, material: str, networks: Sequence[Network] | None = None) -> Iterator[tuple[str, float]]:
        """Yield label and value [ohm] of every leg of a material that is to be made."""
        for k, network in enumerate(networks or self.networks):
            for n, (name, leg) in enumerate(zip(self.names, legs(network), strict=True)):
                if leg.material == material and n not in self.fixed:
                    yield self.label(k, name), leg.ohms

    def whole(self, k: int, done: Mapping[str, MadeLeg]) -> tuple[MadeLeg, ...]:
        """Return the legs of the network ``k``, by label where they are made, else as they are."""
        return tuple(
            done.get(self.label(k, name)) or PlainLeg(id=name, material=leg.material, wanted_ohms=leg.ohms)
            for name, leg in zip(self.names, legs(self.networks[k]), strict=True)
        )

    def assembly(self, own: Sequence[MadeLeg]) -> Assembly:
        """Return the network that legs make."""
        return assembled(self.networks[0], own, self.plan.by_name, cut_error=self.rules.cut_error)

    def case(self, assembly: Assembly) -> Case:
        """Return what a made network is checked against."""
        over = self.asked.over
        spreads = {m.name: m.effective_spread(over.low, over.high) for m in assembly.materials}
        return Case(
            materials=assembly.by_name,
            spreads={name: spread for name, spread in spreads.items() if spread is not None},
            over=over,
            need=requirement(self.asked.goal, over),
            process=made_process(self.asked.process, assembly),
        )

    def judged(self, own: Sequence[MadeLeg]) -> float:
        """Return the figure that the plan judges of what legs make, as far as spreads are known."""
        return self._figure(own, lambda n, c: worst_case(n, c.materials, c.spreads, c.need, c.process).upper)

    def judged_quickly(self, own: Sequence[MadeLeg]) -> float:
        """Return the same from below, for comparing many: of a worst case that of the corner devices."""
        return self._figure(own, lambda n, c: corner_figure(n, c.materials, c.spreads, c.need, c.process))

    def _figure(self, own: Sequence[MadeLeg], worst: Callable[[Network, Case], float]) -> float:
        assembly = self.assembly(own)
        case = self.case(assembly)
        known = all(name in case.spreads for name in used_materials(assembly.network))
        if self.plan.limit.judge == "nominal" or not known:
            return nominal_figure(assembly.network, case)
        return worst(assembly.network, case)

    def within(self, figure: float) -> bool:
        """Whether a figure keeps the limit of the plan; no without one."""
        limit = self.plan.limit.drift_ppm
        return limit is not None and figure <= limit * 1e-6 * (1.0 + NEAR)

    def currents(self) -> tuple[tuple[str, float], ...]:
        """Return label and current [A] that every leg is drawn for; empty without an operating point."""
        operating = self.asked.operating
        if operating is None:
            return ()
        over, materials = self.asked.over, self.plan.by_name
        T = np.linspace(over.low, over.high, POINTS)
        found: list[tuple[str, float]] = []
        for k, network in enumerate(self.networks):
            elements = plain_elements(network, materials, over.reference)
            point = operating_point(network, materials, elements, operating, over.reference, T)
            carried = worst_by_leg(point).items()
            found += [(self.label(k, name), load.current * self.room) for name, load in carried]
        return tuple(found)
