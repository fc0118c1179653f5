"""Where the units of a film go: one array with dummies, and a common centroid for the two sides of a ratio.

All units of a film stand in one orientation, W across the array and L along its columns. Films are never
interleaved: their ratio is set by the process, not by placement. Cells are filled in pairs that mirror each
other in the middle of the array, so that a linear gradient cancels in each pair.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from tcplan.arrays import BoolArray, IntArray
from tcplan.errors import InputError, Problem
from tcplan.made import FilmLeg, FilmUnit
from tcplan.material.model import Material
from tcplan.units import format_si

DUMMY = "."
"""What stands in a cell that belongs to no leg."""
_EXTRA = 6  # columns and rows beyond the least that a common centroid may take
_ROW = 7  # cells of a single row that two odd sides need
_Counts = Mapping[str, int]
_Pair = tuple[str, str]


@dataclass(frozen=True, slots=True, kw_only=True)
class Placement:
    """The array of one film.

    Parameters
    ----------
    material : str
    rows : tuple of tuple of str
        Each cell the id of its leg, or ``DUMMY``; both ends of every row are dummies.
    legs : tuple of (str, int)
        Id and number of units of each leg.
    unit_width, unit_length : float
        Drawn, of the body of a unit [m].
    end_length : float
        Of one end of a unit [m]; 0 where it is not stated.
    pitch_x, pitch_y : float
        From unit to unit along a row, and from row to row [m].
    distance : float, optional
        Between the centroids of the two sides of a ratio [m]; None where there are no two sides.
    why_not : str
        Why the centroids do not coincide, or there are no two; empty where they do, or none were asked.
    notes : tuple of str
        What is not stated and was counted as 0, a sentence each.
    of : str
        Which resistor it is of; empty where there is only one.
    """

    material: str
    rows: tuple[tuple[str, ...], ...]
    legs: tuple[tuple[str, int], ...]
    unit_width: float
    unit_length: float
    end_length: float
    pitch_x: float
    pitch_y: float
    distance: float | None = None
    why_not: str = ""
    notes: tuple[str, ...] = ()
    of: str = ""

    @property
    def title(self) -> str:
        """The film, and which resistor it is of where there are several."""
        return f"{self.material} of {self.of}" if self.of else self.material

    @property
    def columns(self) -> int:
        """How many cells a row has, its two dummies included."""
        return len(self.rows[0])

    @property
    def width(self) -> float:
        """Of the outline, half a spacing on both sides included [m]."""
        return self.columns * self.pitch_x

    @property
    def height(self) -> float:
        """Of the outline, half a spacing on both sides included [m]."""
        return len(self.rows) * self.pitch_y

    @property
    def area(self) -> float:
        """Of the outline [m^2]."""
        return self.width * self.height

    @property
    def units(self) -> int:
        """How many units all legs have together."""
        return sum(count for _, count in self.legs)

    @property
    def dummies(self) -> int:
        """How many cells are dummies."""
        return len(self.rows) * self.columns - self.units

    def to_dict(self) -> dict[str, Any]:
        """Return the array as plan.json holds it: its rows as text, cells apart by a blank."""
        return {
            "material": self.material,
            "of": self.of,
            "rows": [" ".join(row) for row in self.rows],
            "outline_m": [self.width, self.height],
            "pitch_m": [self.pitch_x, self.pitch_y],
            "units": self.units,
            "dummies": self.dummies,
            "centroid_distance_m": self.distance,
            "why_not": self.why_not,
        }


def place(
    legs: Sequence[FilmLeg], material: Material, *, sides: Mapping[str, int] | None = None, of: str = ""
) -> Placement:
    """Return the array of all legs of one film.

    Of all arrays the one is taken that fits in the smallest square; of those, the one of fewest cells. For
    the two sides of a ratio only arrays are looked at in which both have one centroid: there always is one,
    but for one unit against one.

    Parameters
    ----------
    legs : sequence of FilmLeg
        All of one unit cell.
    material : Material
        Their film; a spacing or an end length that it does not state counts 0.
    sides : mapping of str to int, optional
        0 or 1 by the id of a leg: the two sides of a ratio.
    of : str
        Which resistor the legs are of, where there are several.

    Returns
    -------
    Placement

    Raises
    ------
    InputError
        If there are no legs, they are not all of one unit of this film, or one has no side.
    """
    _check(legs, material, sides)
    counts = {leg.id: leg.units for leg in legs}
    groups = _groups(counts, sides)
    unit, film = legs[0].unit, material.film
    end = (film.end_length or 0.0) if film else 0.0
    pitch = _pitch(unit, material)
    rows, columns = _outline([sum(group.values()) for group in groups], *pitch)
    cells = _arranged(groups, rows, columns)
    distance = _distance(cells, groups, columns, *pitch)
    return Placement(
        material=material.name,
        of=of,
        rows=tuple((DUMMY, *cells[k : k + columns], DUMMY) for k in range(0, rows * columns, columns)),
        legs=tuple(counts.items()),
        unit_width=unit.width,
        unit_length=unit.length,
        end_length=end,
        pitch_x=pitch[0],
        pitch_y=pitch[1],
        distance=distance,
        why_not="" if sides is None else _why_not(distance),
        notes=tuple(_notes(material)),
    )


def outline_area(unit: FilmUnit, count: int, material: Material) -> float:
    """Return the area [m^2] of the array of so many units of one film, its dummies included."""
    pitch_x, pitch_y = _pitch(unit, material)
    rows, columns = _outline([count], pitch_x, pitch_y)
    return rows * pitch_y * (columns + 2) * pitch_x


def _pitch(unit: FilmUnit, material: Material) -> tuple[float, float]:
    """Return the distance [m] from unit to unit along a row, and from row to row."""
    film = material.film
    spacing, end = (film.spacing or 0.0, film.end_length or 0.0) if film else (0.0, 0.0)
    return unit.width + spacing, unit.length + 2.0 * end + spacing


def _check(legs: Sequence[FilmLeg], material: Material, sides: Mapping[str, int] | None) -> None:
    where = f"placement of {material.name}"
    units = {leg.unit for leg in legs}
    if len(units) != 1 or {leg.material for leg in legs} != {material.name}:
        found = "legs of several unit cells or films" if legs else "no legs"
        raise InputError(Problem(where=where, found=found, expected="legs of one unit cell of this film"))
    if len({leg.id for leg in legs}) != len(legs) or DUMMY in {leg.id for leg in legs}:
        found, expected = "an id twice, or that of dummies", f'ids that differ, none of them "{DUMMY}"'
        raise InputError(Problem(where=where, found=found, expected=expected))
    lacking = [leg.id for leg in legs if sides is not None and sides.get(leg.id) not in (0, 1)]
    if lacking:
        found = f"no side 0 or 1 for leg {', '.join(lacking)}"
        raise InputError(Problem(where=where, found=found, expected="a side for every leg"))


def _groups(counts: _Counts, sides: Mapping[str, int] | None) -> list[dict[str, int]]:
    """Return the counts of each side, of all legs together where there are no two sides."""
    if sides is None:
        return [dict(counts)]
    split = [{name: n for name, n in counts.items() if sides[name] == side} for side in (0, 1)]
    return split if all(split) else [dict(counts)]


def _notes(material: Material) -> Iterator[str]:
    film = material.film
    if film is None or film.spacing is None:
        yield f"No spacing is stated for {material.name}: it counts as 0."
    if film is None or film.end_length is None:
        yield f"No end_length is stated for {material.name}: the outline does not hold the ends."


# --- the outline ----------------------------------------------------------------------------------------


def _outline(sums: Sequence[int], pitch_x: float, pitch_y: float) -> tuple[int, int]:
    """Return rows and columns, dummies at the ends of rows left out, of what fits in the smallest square."""
    if list(sums) == [1, 1]:  # no array has one centroid for them: side by side, whichever is nearer
        return (1, 2) if pitch_x <= pitch_y else (2, 1)
    total, more = sum(sums), _EXTRA if len(sums) > 1 else 0
    rows: IntArray = np.repeat(np.arange(1, total + more + 1), more + 1)
    columns: IntArray = -(-total // rows) + np.tile(np.arange(more + 1), total + more)
    if len(sums) > 1:
        can = _can(sums, rows, columns)
        rows, columns = rows[can], columns[can]
    square = np.maximum((columns + 2) * pitch_x, rows * pitch_y)
    best = np.lexsort((rows, rows * (columns + 2), square))[0]
    return int(rows[best]), int(columns[best])


def _can(sums: Sequence[int], rows: IntArray, columns: IntArray) -> BoolArray:
    """Return in which arrays the pairs, and a middle for what is odd, give both sides one centroid."""
    odd, least = sum(count % 2 for count in sums), min(sums)
    middle: BoolArray = rows * columns % 2 == 1
    if odd == 0:
        return np.ones(rows.shape, dtype=np.bool_)
    if odd == 1:
        return middle
    flat = np.minimum(rows, columns) >= 3
    long = (np.minimum(rows, columns) == 1) & (np.maximum(rows, columns) >= _ROW)
    spare = rows * columns - sum(sums) >= (1 if least > 1 else 3)
    can: BoolArray = middle & (flat | long) & spare
    return can


# --- the cells ------------------------------------------------------------------------------------------


def _arranged(groups: Sequence[_Counts], rows: int, columns: int) -> list[str]:
    """Return what stands in each cell, row by row."""
    size = rows * columns
    cells, taken = [DUMMY] * size, set[int]()
    split = [_pairs(group) for group in groups]
    singles = [single for _, single in split if single]
    streams = [streams for streams, _ in split]
    if len(singles) == 2 and size > 2:
        taken = _odd_sides(cells, singles, streams, rows, columns)
    elif len(singles) == 1 and size % 2 == 1:
        cells[size // 2] = singles[0]
    elif singles:
        streams[0].append([(singles[0], (*singles, DUMMY)[1])])
    pairs = _interleaved([stream for part in streams for stream in part])
    for site, pair in zip(_sites(rows, columns, taken, len(pairs)), pairs, strict=True):
        cells[site], cells[size - 1 - site] = pair
    return cells


def _pairs(counts: _Counts) -> tuple[list[list[_Pair]], str]:
    """Return the pairs of each leg, those of what is left of two legs, and the last odd unit ("" if none)."""
    streams = [[(name, name)] * (count // 2) for name, count in counts.items()]
    left = [name for name, count in counts.items() if count % 2]
    streams.append(list(zip(left[::2], left[1::2], strict=False)))
    return streams, left[-1] if len(left) % 2 else ""


def _interleaved(streams: Sequence[Sequence[_Pair]]) -> list[_Pair]:
    """Return all pairs, those of each leg spaced alike over the whole."""
    spaced = [
        ((2 * k + 1) / len(stream), n, pair)
        for n, stream in enumerate(streams)
        for k, pair in enumerate(stream)
    ]
    return [pair for _, _, pair in sorted(spaced, key=lambda item: item[:2])]


def _sites(rows: int, columns: int, taken: set[int], count: int) -> list[int]:
    """Return one cell of each mirrored pair to fill, to and fro row by row; spare ones are at the ends."""
    free = [k for k in range(rows * columns // 2) if k not in taken]
    by_column = sorted(free, key=lambda k: (k % columns, k))
    used = by_column[len(free) - count :]
    return sorted(used, key=lambda k: (k // columns, -k if k // columns % 2 else k))


def _odd_sides(
    cells: list[str], singles: Sequence[str], streams: Sequence[list[list[_Pair]]], rows: int, columns: int
) -> set[int]:
    """Place an odd unit of both sides about the middle cell and return the cells that are taken.

    Three cells whose vectors from the middle sum to zero have their centroid there, and so have the three
    opposite ones. A side of one unit stands in the middle itself.
    """
    middle = rows * columns // 2
    steps = (1, columns, -1 - columns) if min(rows, columns) > 1 else (1, 2, -3)
    alone = [not any(stream for stream in part) for part in streams]
    sign = 1
    for single, part, lone in zip(singles, streams, alone, strict=True):
        if lone:
            cells[middle] = single
            continue
        pair = next(stream for stream in reversed(part) if stream).pop()
        for step, name in zip(steps, (single, *pair), strict=True):
            cells[middle + sign * step] = name
        sign = -sign
    return {middle, *(middle + step for step in steps), *(middle - step for step in steps)}


def _distance(
    cells: Sequence[str], groups: Sequence[_Counts], columns: int, pitch_x: float, pitch_y: float
) -> float | None:
    """Return the distance of the centroids of two sides [m]; exactly 0 where they coincide."""
    if len(groups) < 2:
        return None
    sums = [(0, 0, 0), (0, 0, 0)]
    side = {name: k for k, group in enumerate(groups) for name in group}
    for at, name in enumerate(cells):
        if name in side:
            n, x, y = sums[side[name]]
            sums[side[name]] = n + 1, x + at % columns, y + at // columns
    (a, ax, ay), (b, bx, by) = sums
    return math.hypot((b * ax - a * bx) * pitch_x, (b * ay - a * by) * pitch_y) / (a * b)


def _why_not(distance: float | None) -> str:
    if distance is None:
        return "All its units are on one side of the ratio: there are no two centroids."
    if distance > 0.0:
        return (
            f"One unit against one has no common centroid in any array; nearest is side by side, "
            f"{format_si(distance, 'm')} apart. Two units a side would have one."
        )
    return ""
