"""How the bits of a film leg are drawn: segments of the width of its unit, with the ends that each has.

A segment of length L has ohm_per_square L/(W - bias) of body, and two ends; strings of segments are parallel.
Lengths are rounded down to the grid, so that a piece is never more than was asked.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Protocol, TypeAlias

from tcplan.made import FilmLeg
from tcplan.material.model import Material
from tcplan.parts.film_task import DEFAULT_GRID

Limit: TypeAlias = tuple[float, float]
"""What the body and the ends of a film are multiplied with in one device."""

_ON_GRID = 1e-9  # of a step


@dataclass(frozen=True, slots=True, kw_only=True)
class Piece:
    """A bit, or the rest of a leg: its body and its ends [ohm], and its size where it is drawn."""

    body: float
    ends: float = 0.0
    strings: int = 0
    units: int = 0
    length: float = 0.0

    def at(self, limit: Limit) -> float:
        """Return its value in a device [ohm]."""
        return limit[0] * self.body + limit[1] * self.ends


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawn:
    """A bit, or the rest of a leg, as it is drawn: strings in parallel, each of units and one segment.

    Parameters
    ----------
    strings : int
        Alike, in parallel.
    units : int
        Whole units in each string; 0 of a bit.
    length : float
        Of the one other segment of each string [m].
    width : float
        Of all of them, as drawn [m].
    body_ohms, ends_ohms : float
        Of the piece, at the reference [ohm].
    area : float
        Of its place, with spacing and ends [m^2].
    """

    strings: int
    units: int
    length: float
    width: float
    body_ohms: float
    ends_ohms: float
    area: float

    @property
    def ohms(self) -> float:
        """Of the piece at the reference [ohm]."""
        return self.body_ohms + self.ends_ohms

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data, units in the names."""
        return {
            "strings": self.strings,
            "units": self.units,
            "length_m": self.length,
            "width_m": self.width,
            "body_ohms": self.body_ohms,
            "ends_ohms": self.ends_ohms,
            "area_m2": self.area,
        }


class Drawing(Protocol):
    """What turns values into pieces."""

    def bit(self, most: Sequence[tuple[Limit, float]]) -> Piece:
        """Return the largest bit that has in no device more than the value given for it [ohm]."""

    def base(self, limit: Limit, ohms: float) -> Piece:
        """Return the rest of a leg that has in one device no more than a value [ohm]."""

    def drawn(self, piece: Piece) -> Drawn | None:
        """Return a piece as it is drawn; None where there is nothing to draw."""

    def fits(self, base: Piece) -> bool:
        """Return whether the rest of a leg can be made."""


@dataclass(frozen=True, slots=True)
class Free:
    """A film without a unit: values as they come, and no drawing."""

    def bit(self, most: Sequence[tuple[Limit, float]]) -> Piece:
        """Return the largest bit that has in no device more than the value given for it [ohm]."""
        return Piece(body=min(ohms / limit[0] for limit, ohms in most))

    def base(self, limit: Limit, ohms: float) -> Piece:
        """Return the rest of a leg that has a value [ohm] in one device."""
        return Piece(body=ohms / limit[0])

    def drawn(self, piece: Piece) -> Drawn | None:
        """Return nothing: there is no drawing."""
        return None

    def fits(self, base: Piece) -> bool:
        """Return whether the rest of a leg is above zero."""
        return base.body > 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Strip:
    """What the pieces of a leg are drawn from: the width and the ends of its unit, and the grid.

    Parameters
    ----------
    width, unit_length, grid : float
        Of the unit, and the step of lengths [m].
    per_length : float
        Of the body of a segment [ohm/m].
    ends : float
        Of both ends of a segment [ohm].
    strings : int
        Of the leg: no piece has fewer, so that no segment carries more than the units do.
    pitch, extra : float
        What a segment takes across, and along it beyond its length [m].
    """

    width: float
    unit_length: float
    grid: float
    per_length: float
    ends: float
    strings: int
    pitch: float
    extra: float

    @property
    def least(self) -> float:
        """The shortest segment [m]: a square, on the grid."""
        return math.ceil(self.width / self.grid - _ON_GRID) * self.grid

    def bit(self, most: Sequence[tuple[Limit, float]]) -> Piece:
        """Return the largest bit that has in no device more than the value given for it [ohm].

        It has as few strings as a square allows: more of them, longer, would take more area.
        """
        square = self.per_length * self.least
        fewest = max((square * body + self.ends * ends) / ohms for (body, ends), ohms in most)
        strings = max(self.strings, math.ceil(fewest - _ON_GRID))
        length = min(
            (strings * ohms - self.ends * ends) / (self.per_length * body) for (body, ends), ohms in most
        )
        return self._piece(strings, 0, length)

    def base(self, limit: Limit, ohms: float) -> Piece:
        """Return the rest of a leg that has in one device no more than a value [ohm].

        Whole units and one more segment; where that were below a square, one unit less and a longer one.
        """
        body, ends = self.per_length * limit[0], self.ends * limit[1]
        unit, of_string = body * self.unit_length + ends, ohms * self.strings
        units = max(math.floor(of_string / unit + _ON_GRID), 0)
        length = (of_string - units * unit - ends) / body
        if units and length < self.least * (1.0 - _ON_GRID):
            units, length = units - 1, (of_string - (units - 1) * unit - ends) / body
        return self._piece(self.strings, units, length)

    def _piece(self, strings: int, units: int, length: float) -> Piece:
        on_grid = math.floor(length / self.grid + _ON_GRID) * self.grid
        return Piece(
            body=self.per_length * (units * self.unit_length + on_grid) / strings,
            ends=self.ends * (units + 1) / strings,
            strings=strings,
            units=units,
            length=on_grid,
        )

    def drawn(self, piece: Piece) -> Drawn | None:
        """Return a piece as it is drawn."""
        along = piece.units * (self.unit_length + self.extra) + piece.length + self.extra
        return Drawn(
            strings=piece.strings,
            units=piece.units,
            length=piece.length,
            width=self.width,
            body_ohms=piece.body,
            ends_ohms=piece.ends,
            area=piece.strings * self.pitch * along,
        )

    def fits(self, base: Piece) -> bool:
        """Return whether the rest of a leg has a square at least."""
        return base.length >= self.least * (1.0 - _ON_GRID)


def strip_of(leg: FilmLeg, material: Material) -> Strip:
    """Return what the pieces of a film leg are drawn from; what is not stated of the film counts 0."""
    film, unit = material.film, leg.unit
    spacing = 0.0 if film is None else film.spacing or 0.0
    end = 0.0 if film is None else film.end_length or 0.0
    return Strip(
        width=unit.width,
        unit_length=unit.length,
        grid=(None if film is None else film.grid) or DEFAULT_GRID,
        per_length=unit.body_ohms / unit.length,
        ends=unit.ends_ohms,
        strings=leg.in_parallel,
        pitch=unit.width + spacing,
        extra=2.0 * end + spacing,
    )
