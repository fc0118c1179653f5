"""The plan: what a search proposes, what verify makes of it, and the file that holds the result.

A :class:`Proposal` is a claim with the evidence for it; only ``verify`` turns it into an
:class:`Option`. Field names of the records are those of plan.json, units included.

Long, since it is the list of the records of plan.json, each of them short.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import asdict, dataclass, field, replace
from typing import Any, Literal, TypeAlias

from tcplan.goal import Judge
from tcplan.made import MadeLeg, leg_to_dict
from tcplan.material.model import Material
from tcplan.network import (
    Arrangement,
    Leg,
    Network,
    arrangement,
    leg_names,
    legs,
    network_text,
    shares,
    tree,
)

SCHEMA = 3
Verdict: TypeAlias = Literal["MET", "NOT MET", "NOT JUDGED"]
Parameter: TypeAlias = Literal["ohm_per_square", "tc1", "tc2"]


# --- evidence that travels from search to verify --------------------------------------------


@dataclass(frozen=True, slots=True, kw_only=True)
class Sizes:
    """What can be made: limits on the value of a leg by material, and on the area of all legs.

    The tuples follow the materials of the space. Values are in ohm at the reference temperature,
    infinite (or 0) where nothing is asked; ``area_per_ohm`` is in m^2/ohm, 0 where no area is known.
    """

    least_ohms: tuple[float, ...]
    most_ohms: tuple[float, ...]
    area_per_ohm: tuple[float, ...]
    max_area: float = float("inf")

    @property
    def bounded(self) -> bool:
        """Whether any limit is asked."""
        values = any(v > 0 for v in self.least_ohms) or any(v < float("inf") for v in self.most_ohms)
        return values or self.max_area < float("inf")

    def taken(self, positions: Sequence[int]) -> Sizes:
        """Return the sizes of the materials at these positions, in their order."""
        return replace(
            self,
            least_ohms=tuple(self.least_ohms[i] for i in positions),
            most_ohms=tuple(self.most_ohms[i] for i in positions),
            area_per_ohm=tuple(self.area_per_ohm[i] for i in positions),
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Space:
    """A set of networks: which materials, how many of them and of legs, and what a leg may be.

    ``fixed`` are members that are given. Together they hold a share of the whole inside
    ``fixed_share`` (0, 0 when there are none); the chosen legs hold the rest. ``ohms`` is the total,
    None when the share of the fixed members sets it. ``legs`` counts the chosen legs of a mixed network,
    and ``fixed_in_parallel`` says where its fixed members are.
    """

    arrangement: Arrangement
    materials: tuple[str, ...]
    most: int
    min_share: float
    fixed: tuple[Leg, ...] = ()
    fixed_share: tuple[float, float] = (0.0, 0.0)
    ohms: float | None = None
    sizes: Sizes | None = None
    legs: int = 1
    fixed_in_parallel: bool = False

    def taken(self, positions: Sequence[int]) -> Space:
        """Return the space of the materials at these positions, in their order."""
        return replace(
            self,
            materials=tuple(self.materials[i] for i in positions),
            sizes=self.sizes.taken(positions) if self.sizes is not None else None,
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Scenario:
    """One temperature [K] of one piece of the requirement, and the device that is looked at there.

    ``side`` is 0 for the nominal device, on both sides of the goal; 1 for one with all laws at their
    highest, which must not be above it; -1 for one with all laws at their lowest, which must not be below.
    ``factors`` are the value factors of the materials of the space and then of the fixed members' other
    materials, in the order of :func:`tcplan.mixes.spread_names`; empty for the nominal device.
    """

    piece: int
    temperature: float
    side: int = 0
    factors: tuple[float, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Certificate:
    """Dual vectors that bound the figure of every network of a space.

    Each row of ``weights`` holds one weight a node, signed where the node has both sides. Any weights
    give a true bound; good ones give a tight one. ``tangents`` are (support, shares): points at which the
    area of a parallel mix, convex in its shares, is cut.
    """

    nodes: tuple[Scenario, ...]
    weights: tuple[tuple[float, ...], ...]
    tangents: tuple[tuple[tuple[int, ...], tuple[float, ...]], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Proposal:
    """One network that a search (or the user) puts forward, with the evidence for its space."""

    network: Network
    space: Space | None = None
    certificate: Certificate | None = None
    role: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class FloorEvidence:
    """Where and with what weights a bound on every network whatever is to be evaluated.

    Of the ``space`` only the materials and the fixed members matter; these are one member of every
    network.
    """

    space: Space
    nodes: tuple[tuple[int, float], ...]
    upper: tuple[float, ...]
    lower: tuple[float, ...]


# --- records, named as in plan.json -----------------------------------------------------------


@dataclass(frozen=True, slots=True, kw_only=True)
class Nominal:
    """Drift of the nominal network over the range; ``figure_ppm`` is the one that the goal sets."""

    figure_ppm: float
    peak_ppm: float
    at_degC: float
    band_ppm: float
    box_tcr_ppm_per_K: float
    chord_cold_ppm_per_K: float | None
    chord_hot_ppm_per_K: float | None
    tc1_ppm_per_K: float
    tc2_ppm_per_K2: float
    centring_ppm: float
    centred_peak_ppm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Deviation:
    """One material at a point of its spread: value factor, and shifts of TC1 and TC2."""

    ohm_per_square: float
    tc1: float
    tc2: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Mover:
    """How much of the worst case goes when one deviation of its device is undone [ppm]."""

    material: str
    parameter: Parameter
    ppm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class WorstCase:
    """The largest judged drift over the spread box, the device that reaches it, and a bound."""

    peak_ppm: float
    at_degC: float
    point: dict[str, Deviation]
    method: str
    upper_bound_ppm: float
    movers: tuple[Mover, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Likely:
    """What draws of lots say: the figure that ``fraction`` of them do not exceed, with its 95 % interval.

    ``high_ppm`` is None where there are too few draws for it; ``inside`` is the part of the lots within the
    limit, with its exact interval, None without a limit.
    """

    fraction: float
    peak_ppm: float
    low_ppm: float
    high_ppm: float | None
    inside: float | None
    inside_low: float | None
    inside_high: float | None
    draws: int
    seed: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Proof:
    """A lower bound on the judged figure of the arrangement, and the gap of this option to it."""

    kind: Literal["global", "searched"]
    of: Literal["nominal", "worst-case"]
    lower_bound_ppm: float
    gap_ppm: float

    @property
    def figure_ppm(self) -> float:
        """The figure that the bound belongs to."""
        return self.lower_bound_ppm + self.gap_ppm


@dataclass(frozen=True, slots=True, kw_only=True)
class Option:
    """One checked answer to a brief. Only ``verify`` makes one."""

    id: str
    network: Network
    squares: tuple[float | None, ...]
    areas: tuple[float | None, ...]
    nominal: Nominal
    worst_case: WorstCase | None
    proof: Proof
    verdict: Verdict
    role: str = ""
    corners: dict[str, float] = field(default_factory=dict)
    likely: Likely | None = None

    @property
    def arrangement(self) -> Arrangement:
        """The kind of network."""
        return arrangement(self.network)

    @property
    def area(self) -> float | None:
        """The area of all legs [m^2]; None when that of one is not known."""
        known = [area for area in self.areas if area is not None]
        return sum(known) if len(known) == len(self.areas) else None

    def to_dict(self) -> dict[str, Any]:
        """Return the option as plan.json holds it."""
        rows = zip(
            leg_names(len(self.squares)),
            legs(self.network),
            shares(self.network),
            self.squares,
            self.areas,
            strict=True,
        )
        return {
            "id": self.id,
            "role": self.role,
            "arrangement": self.arrangement,
            "network": network_text(self.network),
            "tree": tree(self.network),
            "legs": [
                {
                    "id": i,
                    "material": leg.material,
                    "ohms": leg.ohms,
                    "strings": leg.strings,
                    "share": share,
                    "squares": squares,
                    "area_m2": area,
                }
                for i, leg, share, squares, area in rows
            ],
            "nominal": asdict(self.nominal),
            "worst_case": asdict(self.worst_case) if self.worst_case else None,
            "corners_ppm": dict(self.corners),
            "likely": asdict(self.likely) if self.likely else None,
            "proof": asdict(self.proof),
            "verdict": self.verdict,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class RangeRecord:
    """The temperature range; ``high_degC`` includes ``rise_K``."""

    name: str
    low_degC: float
    high_degC: float
    reference_degC: float
    rise_K: float


@dataclass(frozen=True, slots=True, kw_only=True)
class TargetRecord:
    """The wanted value (None when free) and the wanted coefficients (0 when flat)."""

    ohms: float | None
    tc1_ppm_per_K: float
    tc2_ppm_per_K2: float


@dataclass(frozen=True, slots=True, kw_only=True)
class LimitRecord:
    """The limit as a drift; ``drift_ppm`` is None when no limit was given.

    ``quantile`` is the fraction of lots that the judge "quantile" asks for, and that is shown in any case.
    """

    kind: str
    drift_ppm: float | None
    judge: Judge
    quantile: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Floor:
    """What no network of these materials can beat, and why."""

    nominal_ppm: float
    worst_case_ppm: float | None
    why: str


@dataclass(frozen=True, slots=True, kw_only=True)
class MadeValue:
    """An option at one value, as it is made: its legs, and the network of them, checked like any other."""

    target_ohms: float
    value_error: float
    legs: tuple[MadeLeg, ...]
    option: Option

    def to_dict(self) -> dict[str, Any]:
        """Return it as plan.json holds it."""
        return {
            "target_ohms": self.target_ohms,
            "value_error": self.value_error,
            "legs": [leg_to_dict(leg) for leg in self.legs],
            "option": self.option.to_dict(),
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class PartsRecord:
    """What an option is made of, at each of its values.

    ``materials`` are those of the made networks: the ends of films and every bought part are materials of
    their own. ``details`` holds what is only read by people, as JSON data: ways, load, placement, trim.
    """

    option: str
    materials: tuple[Material, ...]
    made: tuple[MadeValue, ...]
    details: dict[str, Any] = field(default_factory=dict)

    def to_dict(self) -> dict[str, Any]:
        """Return the parts as plan.json holds them."""
        return {
            "option": self.option,
            "materials": {material.name: material.to_dict() for material in self.materials},
            "made": [made.to_dict() for made in self.made],
            "details": self.details,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Plan:
    """The ranked list of options for one brief, best first; ``chosen`` is an option id."""

    tcplan: str
    brief: dict[str, Any]
    range: RangeRecord
    target: TargetRecord
    limit: LimitRecord
    materials: tuple[Material, ...]
    floor: Floor
    chosen: str
    options: tuple[Option, ...]
    notes: tuple[str, ...] = field(default=())
    parts: PartsRecord | None = None

    @property
    def best(self) -> Option:
        """The chosen option."""
        return next(option for option in self.options if option.id == self.chosen)

    @property
    def by_name(self) -> dict[str, Material]:
        """The materials by name."""
        return {material.name: material for material in self.materials}

    def to_dict(self) -> dict[str, Any]:
        """Return the plan as plain JSON data."""
        return {
            "schema": SCHEMA,
            "tcplan": self.tcplan,
            "brief": self.brief,
            "range": asdict(self.range),
            "target": asdict(self.target),
            "limit": asdict(self.limit),
            "materials": {material.name: material.to_dict() for material in self.materials},
            "floor": asdict(self.floor),
            "chosen": self.chosen,
            "options": [option.to_dict() for option in self.options],
            "notes": list(self.notes),
            "parts": self.parts.to_dict() if self.parts else None,
        }


def plan_json(plan: Plan) -> str:
    """Return plan.json as text, at full precision; never NaN or infinity."""
    return json.dumps(plan.to_dict(), indent=2, ensure_ascii=False, allow_nan=False) + "\n"
