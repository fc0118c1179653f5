"""What an option is made of: film units and their counts, stock values, lengths of wire."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

Joined: TypeAlias = Literal["one", "series", "parallel"]


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmUnit:
    """The unit cell of one film, shared by all its legs.

    Parameters
    ----------
    material : str
    width, length : float
        Drawn, of the body between its ends [m].
    body_ohms : float
        Of the body [ohm], at the reference of the plan.
    ends_ohms : float
        Of both ends together [ohm], at the same temperature; 0 where no end resistance is stated.
    area : float
        With its spacing [m^2].
    """

    material: str
    width: float
    length: float
    body_ohms: float
    ends_ohms: float
    area: float

    @property
    def ohms(self) -> float:
        """Of the whole unit [ohm]."""
        return self.body_ohms + self.ends_ohms


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmLeg:
    """One leg of units: ``in_parallel`` strings of ``in_series`` units each.

    ``mismatch`` is the sigma of dR/R of the leg, None where the film states no matching.
    """

    id: str
    material: str
    wanted_ohms: float
    unit: FilmUnit
    in_series: int
    in_parallel: int
    mismatch: float | None = None

    @property
    def units(self) -> int:
        """How many units the leg has."""
        return self.in_series * self.in_parallel

    @property
    def ohms(self) -> float:
        """Of the leg as made [ohm], at the reference."""
        return self.unit.ohms * self.in_series / self.in_parallel

    @property
    def area(self) -> float:
        """Of the leg, spacing included [m^2]."""
        return self.units * self.unit.area


@dataclass(frozen=True, slots=True, kw_only=True)
class StockLeg:
    """One leg of one or two stock values [ohm]."""

    id: str
    material: str
    wanted_ohms: float
    values: tuple[float, ...]
    joined: Joined

    @property
    def ohms(self) -> float:
        """Of the leg as made [ohm]."""
        if self.joined == "parallel":
            return 1.0 / sum(1.0 / value for value in self.values)
        return sum(self.values)


@dataclass(frozen=True, slots=True, kw_only=True)
class WireLeg:
    """One leg of wire, cut to ``length`` [m]; ``ohm_per_metre`` is at the reference of the plan."""

    id: str
    material: str
    wanted_ohms: float
    length: float
    ohm_per_metre: float

    @property
    def ohms(self) -> float:
        """Of the leg as made [ohm]."""
        return self.length * self.ohm_per_metre


@dataclass(frozen=True, slots=True, kw_only=True)
class PlainLeg:
    """One leg of a material without a size, or a fixed member: made as it is written."""

    id: str
    material: str
    wanted_ohms: float

    @property
    def ohms(self) -> float:
        """Of the leg [ohm]."""
        return self.wanted_ohms


MadeLeg: TypeAlias = FilmLeg | StockLeg | WireLeg | PlainLeg


@dataclass(frozen=True, slots=True, kw_only=True)
class Refusal:
    """Why a leg can not be made: the rule that stops it, and the nearest feasible figure."""

    leg: str
    rule: Literal["width", "length", "count", "grid", "stock", "area", "current", "length of wire"]
    found: str
    nearest: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Made:
    """An option as it is made, leg by leg in the order of its network."""

    option: str
    legs: tuple[MadeLeg, ...]
    refusals: tuple[Refusal, ...] = ()

    @property
    def area(self) -> float:
        """Of all film legs [m^2]."""
        return sum(leg.area for leg in self.legs if isinstance(leg, FilmLeg))
