"""What an option is made of: film units and their counts, stock values, lengths of wire."""

from __future__ import annotations

import math
import sys
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any, Literal, TypeAlias, get_args

Joined: TypeAlias = Literal["one", "series", "parallel"]
MOST_COUNT = 4096
"""Of units in series, or strings in parallel, in one leg of a file."""


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
        Of its place in an array [m^2]: with the spacing and the two ends, each 0 where it is not stated.
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
        """Of its units, spacing and ends included [m^2]."""
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
    rule: Literal["mismatch", "count", "grid", "stock", "area", "current", "length of wire"]
    found: str
    nearest: str


def exact(leg: MadeLeg, ohms: float) -> MadeLeg:
    """Return a leg of the same kind of exactly a value [ohm], as if counts, steps and stock were no matter.

    The same part of a film leg is ends; a leg of two stock parts keeps their ratio.
    """
    factor = ohms / leg.ohms
    if isinstance(leg, FilmLeg):
        unit = leg.unit
        own = replace(unit, body_ohms=unit.body_ohms * factor, ends_ohms=unit.ends_ohms * factor)
        return replace(leg, unit=own)
    if isinstance(leg, StockLeg):
        return replace(leg, values=tuple(value * factor for value in leg.values))
    if isinstance(leg, WireLeg):
        return replace(leg, length=leg.length * factor)
    return replace(leg, wanted_ohms=ohms)


# --- plain data -----------------------------------------------------------------------------------------


def leg_to_dict(leg: MadeLeg) -> dict[str, Any]:
    """Return a made leg as plan.json holds it, units in the names; the inverse of :func:`leg_from_dict`."""
    own: dict[str, Any] = {
        "id": leg.id,
        "material": leg.material,
        "wanted_ohms": leg.wanted_ohms,
        "ohms": leg.ohms,
    }
    if isinstance(leg, FilmLeg):
        unit = leg.unit
        return own | {
            "kind": "film",
            "in_series": leg.in_series,
            "in_parallel": leg.in_parallel,
            "width_m": unit.width,
            "length_m": unit.length,
            "unit_body_ohms": unit.body_ohms,
            "unit_ends_ohms": unit.ends_ohms,
            "unit_area_m2": unit.area,
            "mismatch": leg.mismatch,
        }
    if isinstance(leg, StockLeg):
        return own | {"kind": "stock", "values_ohms": list(leg.values), "joined": leg.joined}
    if isinstance(leg, WireLeg):
        return own | {"kind": "wire", "length_m": leg.length, "ohm_per_metre": leg.ohm_per_metre}
    return own | {"kind": "plain"}


def leg_from_dict(row: Mapping[str, Any]) -> MadeLeg:
    """Return the made leg that :func:`leg_to_dict` wrote.

    Raises
    ------
    KeyError, TypeError, ValueError
        When it is not one; the reader of the file says where.
    """
    name, material = str(row["id"]), str(row["material"])
    wanted, kind = _size(row["wanted_ohms"]), row["kind"]
    if kind == "film":
        return _film_leg(row, name, material, wanted)
    if kind == "stock":
        if row["joined"] not in get_args(Joined):
            raise ValueError(f"joined {row['joined']!r}")
        values = tuple(_size(value) for value in row["values_ohms"])
        if len(values) != (1 if row["joined"] == "one" else 2):
            raise ValueError(f"{len(values)} values joined as {row['joined']}")
        return StockLeg(id=name, material=material, wanted_ohms=wanted, values=values, joined=row["joined"])
    if kind == "wire":
        length, per_metre = _size(row["length_m"]), _size(row["ohm_per_metre"])
        return WireLeg(id=name, material=material, wanted_ohms=wanted, length=length, ohm_per_metre=per_metre)
    if kind == "plain":
        return PlainLeg(id=name, material=material, wanted_ohms=wanted)
    raise ValueError(f"kind {kind!r}")


def _film_leg(row: Mapping[str, Any], name: str, material: str, wanted: float) -> FilmLeg:
    ends, mismatch = row["unit_ends_ohms"], row["mismatch"]
    return FilmLeg(
        id=name,
        material=material,
        wanted_ohms=wanted,
        unit=FilmUnit(
            material=material,
            width=_size(row["width_m"]),
            length=_size(row["length_m"]),
            body_ohms=_size(row["unit_body_ohms"]),
            ends_ohms=0.0 if ends == 0.0 and not isinstance(ends, bool) else _size(ends),
            area=_size(row["unit_area_m2"]),
        ),
        in_series=_count(row["in_series"]),
        in_parallel=_count(row["in_parallel"]),
        mismatch=None if mismatch is None else _size(mismatch),
    )


def _size(value: Any) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float) or not 0.0 < value < math.inf:
        raise ValueError(f"{value!r}, not a number above zero")
    if value > sys.float_info.max:  # a whole number can be
        raise ValueError("a number that is too large")
    return float(value)


def _count(value: Any) -> int:
    if isinstance(value, bool) or not isinstance(value, int) or not 1 <= value <= MOST_COUNT:
        raise ValueError(f"{value!r}, not a count")
    return value
