"""What was made of an option, with what it reaches: the content of parts.json."""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import Any

from tcplan.made import FilmLeg, Made, MadeLeg, StockLeg, WireLeg
from tcplan.material.model import Material
from tcplan.network import Network, network_text, used_materials, value
from tcplan.parts.films import FilmChoice
from tcplan.parts.network import ends_material
from tcplan.plan import Option, Plan


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmWay:
    """One unit cell for every film together, and the judged figure of what they make (a fraction)."""

    choices: tuple[FilmChoice, ...]
    figure: float

    @property
    def area(self) -> float:
        """Of all films [m^2]."""
        return sum(choice.area for choice in self.choices)


@dataclass(frozen=True, slots=True, kw_only=True)
class MadePlan:
    """An option as made, and what it reaches.

    ``ways`` are the ways to draw its films that none beats in both area and judged figure, least area
    first. ``checked`` is the made network, verified like any other.
    """

    plan: Plan
    ideal: Option
    made: Made
    checked: Option
    ways: tuple[FilmWay, ...]

    @property
    def value_error(self) -> float:
        """The value as made over the ideal one, less 1."""
        return value(self.checked.network) / value(self.ideal.network) - 1.0

    def to_dict(self) -> dict[str, Any]:
        """Return parts.json; see docs/parts.md."""
        return {
            "schema": 1,
            "tcplan": self.plan.tcplan,
            "plan": {"title": self.plan.brief["title"], "sha256": self.plan.brief["sha256"]},
            "option": self.ideal.id,
            "legs": [_leg_dict(leg) for leg in self.made.legs],
            "value_error": self.value_error,
            "ideal": {"network": network_text(self.ideal.network), **_figures(self.ideal)},
            "made": {
                **self.checked.to_dict(),
                "materials": {m.name: m.to_dict() for m in made_materials(self.plan, self.checked.network)},
            },
        }


def parts_json(made: MadePlan) -> str:
    """Return parts.json as text, at full precision; never NaN or infinity."""
    return json.dumps(made.to_dict(), indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def made_materials(plan: Plan, network: Network) -> tuple[Material, ...]:
    """Return the materials of a made network, the ends of its films among them."""
    known = dict(plan.by_name)
    for material in plan.materials:
        ends = ends_material(material)
        if ends is not None:
            known[ends.name] = ends
    return tuple(known[name] for name in used_materials(network))


def _figures(option: Option) -> dict[str, Any]:
    worst = option.worst_case
    return {
        "nominal_ppm": option.nominal.figure_ppm,
        "worst_case_ppm": worst.peak_ppm if worst else None,
        "verdict": option.verdict,
    }


def _leg_dict(leg: MadeLeg) -> dict[str, Any]:
    own: dict[str, Any] = {
        "id": leg.id,
        "material": leg.material,
        "wanted_ohms": leg.wanted_ohms,
        "ohms": leg.ohms,
    }
    if isinstance(leg, FilmLeg):
        unit = leg.unit
        own |= {
            "kind": "film",
            "in_series": leg.in_series,
            "in_parallel": leg.in_parallel,
            "width_m": unit.width,
            "length_m": unit.length,
            "unit_body_ohms": unit.body_ohms,
            "unit_ends_ohms": unit.ends_ohms,
            "area_m2": leg.area,
            "mismatch": leg.mismatch,
        }
    elif isinstance(leg, StockLeg):
        own |= {"kind": "stock", "values_ohms": list(leg.values), "joined": leg.joined}
    elif isinstance(leg, WireLeg):
        own |= {"kind": "wire", "length_m": leg.length, "ohm_per_metre": leg.ohm_per_metre}
    else:
        own |= {"kind": "plain"}
    return own
