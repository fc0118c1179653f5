"""What was made of an option or of a ratio, with all that is said of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from tcplan.errors import InternalError
from tcplan.made import MadeLeg, leg_to_dict
from tcplan.parts.films import FilmChoice
from tcplan.parts.network import Assembly
from tcplan.parts.placement import Placement
from tcplan.parts.trim import TrimPlan
from tcplan.plan import Option, PartsRecord, Plan
from tcplan.ratio.check import RatioCheck
from tcplan.units import to_celsius


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmWay:
    """One unit cell for every film together, and the judged figure of what they make (a fraction).

    ``area`` is that of all arrays together, dummies included [m^2].
    """

    choices: tuple[FilmChoice, ...]
    figure: float
    area: float

    @property
    def error(self) -> float:
        """The largest relative value error of a leg."""
        return max(choice.error for choice in self.choices)

    def to_dict(self) -> dict[str, Any]:
        """Return the way as plan.json holds it."""
        return {
            "area_m2": self.area,
            "figure_ppm": self.figure * 1e6,
            "value_error": self.error,
            "units": [
                {"material": c.unit.material, "width_m": c.unit.width, "length_m": c.unit.length}
                for c in self.choices
            ],
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Load:
    """What one leg carries at the operating point, the largest over the range.

    ``temperature`` is that of the element [K]. ``density`` is the current per drawn width of a string of
    units [A/m], None where it is not drawn.
    """

    leg: str
    voltage: float
    current: float
    power: float
    temperature: float
    density: float | None = None

    def to_dict(self) -> dict[str, Any]:
        """Return the load as plan.json holds it."""
        return {
            "leg": self.leg,
            "voltage_V": self.voltage,
            "current_A": self.current,
            "power_W": self.power,
            "temperature_degC": to_celsius(self.temperature),
            "current_density_A_per_m": self.density,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class MadePlan:
    """A plan with the parts of one of its options.

    Parameters
    ----------
    plan : Plan
        With its ``parts``.
    ideal : Option
    assemblies : tuple of Assembly
        The made network of each value.
    ways : tuple of FilmWay
        Those to draw the films that none beats in both area and judged figure, least area first.
    way : FilmWay, optional
        The one that is taken; None without films.
    loads : tuple of tuple of Load
        Of the legs at each value; empty without an operating point.
    placements : tuple of tuple of Placement
        Of the films at each value.
    trims : tuple of TrimPlan
        Of each value; empty where none is asked.
    stops : str
        Which rule keeps a plan that meets its limit from meeting it as made; empty when none does.
    """

    plan: Plan
    ideal: Option
    assemblies: tuple[Assembly, ...]
    ways: tuple[FilmWay, ...] = ()
    way: FilmWay | None = None
    loads: tuple[tuple[Load, ...], ...] = ()
    placements: tuple[tuple[Placement, ...], ...] = ()
    trims: tuple[TrimPlan, ...] = ()
    stops: str = ""

    @property
    def parts(self) -> PartsRecord:
        """The parts of the plan."""
        if self.plan.parts is None:
            raise InternalError("a made plan without parts")
        return self.plan.parts

    @property
    def verdict(self) -> str:
        """That of all values: MET only when each is."""
        verdicts = [made.option.verdict for made in self.parts.made]
        return next((v for v in ("NOT MET", "NOT JUDGED") if v in verdicts), "MET")


@dataclass(frozen=True, slots=True, kw_only=True)
class MadeRatio:
    """A ratio with the parts of both its resistors; ``first`` and ``second`` are their legs.

    ``error`` is what a leg may be off without a word, as a fraction of its value.
    """

    ideal: RatioCheck
    checked: RatioCheck
    first: tuple[MadeLeg, ...]
    second: tuple[MadeLeg, ...]
    choices: tuple[FilmChoice, ...]
    placements: tuple[Placement, ...]
    error: float

    def to_dict(self) -> dict[str, Any]:
        """Return ratio.json with its parts; see docs/ratio.md."""
        return {
            **self.ideal.to_dict(),
            "parts": {
                "first": [leg_to_dict(leg) for leg in self.first],
                "second": [leg_to_dict(leg) for leg in self.second],
                "placement": [placement.to_dict() for placement in self.placements],
                "made": self.checked.to_dict(),
            },
        }
