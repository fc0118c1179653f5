"""What a film part starts from: the unit as a function of its size, and the sizes that may be drawn."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.model import Film, Material
from tcplan.parts.counts import Cell, Point, Ratios, count_ratios, front, trade
from tcplan.parts.network import ends_material

DEFAULT_GRID = 5e-9
_MOST_WIDTHS = 6
_WORK, _FEWEST, _MOST_LENGTHS = 1.6e6, 4000, 400_000  # lengths looked through: fewer where more counts fit
_ON_GRID = 1e-9  # of a step


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmRules:
    """What a film part must keep.

    Parameters
    ----------
    most_count : int
        Units in series, and strings in parallel, of a leg; 256 at most.
    error : float
        Largest relative value error of a leg.
    max_area : float, optional
        Of all legs of the film together [m^2].
    mismatch : float, optional
        Largest sigma of dR/R of a leg.
    max_length_squares, min_squares : float
        Largest and least L/W of a unit.
    """

    most_count: int = 64
    error: float = 1e-3
    max_area: float | None = None
    mismatch: float | None = None
    max_length_squares: float = 200.0
    min_squares: float = 1.0

    def __post_init__(self) -> None:
        checks = (
            ("most_count", self.most_count, 1 <= self.most_count <= 256, "a whole number from 1 to 256"),
            ("error", self.error, 0.0 < self.error < 1.0, "above 0 and below 1"),
            ("max_area", self.max_area, self.max_area is None or self.max_area > 0.0, "above 0"),
            ("mismatch", self.mismatch, self.mismatch is None or self.mismatch > 0.0, "above 0"),
            ("min_squares", self.min_squares, self.min_squares > 0.0, "above 0"),
            (
                "max_length_squares",
                self.max_length_squares,
                self.min_squares <= self.max_length_squares < math.inf,
                "finite, and not below min_squares",
            ),
        )
        if problems := [
            Problem(where=f"parts.{key}", found=f"{value}", expected=expected)
            for key, value, good, expected in checks
            if not good
        ]:
            raise InputError(problems)


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmTask:
    """The legs of one film, what is known of it, and the rules."""

    material: Material
    film: Film
    names: tuple[str, ...]
    wanted: tuple[float, ...]
    reference: float
    rules: FilmRules
    ratios: Ratios

    @property
    def grid(self) -> float:
        """Step of W and L [m]."""
        return self.film.grid or DEFAULT_GRID

    def widths(self) -> tuple[float, ...]:
        """Return the widths to try [m]: the one stated, and wider ones where mismatch asks for them.

        At the widest, one unit of the least length has the mismatch that is wanted.
        """
        start = self.film.preferred_width or self.film.min_width
        widest = math.sqrt(self._mismatch_area() / self.rules.min_squares)
        steps = math.ceil(2.0 * math.log2(max(widest / start, 1.0)) - _ON_GRID)
        count = min(steps, _MOST_WIDTHS - 1)
        stages = [start * (widest / start) ** (k / count) for k in range(1, count + 1)]
        return tuple(dict.fromkeys(_up_to_grid(width, self.grid) for width in (start, *stages)))

    def cell(self, width: float) -> Cell:
        """Return the unit of a width [m], its length open."""
        return Cell(
            per_length=per_length(self.material, width, self.reference),
            ends=ends_ohms(self.material, width, self.reference),
            pitch=width + (self.film.spacing or 0.0),
            least_together=self._mismatch_area() / width,
        )

    def length_steps(self, width: float) -> tuple[int, int]:
        """Return the least and the largest L in steps of the grid; the first is above the second if none."""
        steps = width / self.grid
        low = math.ceil(self.rules.min_squares * steps - _ON_GRID)
        return max(low, 1), math.floor(self.rules.max_length_squares * steps + _ON_GRID)

    def points(self, width: float, error: float) -> tuple[Point, ...]:
        """Return the trade at one width [m]."""
        low, high = self.length_steps(width)
        most = int(min(max(_WORK / (self.rules.most_count**2 * error), _FEWEST), _MOST_LENGTHS))
        cell = self.cell(width)
        if high - low < most:
            lengths = np.arange(low, high + 1, dtype=np.float64) * self.grid
            return trade(cell, lengths, self.wanted, self.ratios, error)
        sample = np.concatenate((np.geomspace(low, high, most), self._exact_lengths(cell) / self.grid))
        points = trade(cell, self._around(sample, low, high), self.wanted, self.ratios, error)
        finer = self._around(self._balanced(cell, points) / self.grid, low, high)
        return front((*points, *trade(cell, finer, self.wanted, self.ratios, error)))

    def inside(self, drawn: Sequence[tuple[float, Point]]) -> list[tuple[float, Point]]:
        """Return those (width, point) that keep the largest area."""
        most = self.rules.max_area
        return [(width, point) for width, point in drawn if most is None or point.area <= most]

    def _mismatch_area(self) -> float:
        """Return the least area [m^2] of the bodies of a leg together; 0 where no mismatch is wanted."""
        if self.rules.mismatch is None or self.film.matching is None:
            return 0.0
        return (self.film.matching / self.rules.mismatch) ** 2 / 2.0

    def _exact_lengths(self, cell: Cell) -> FloatArray:
        """Return the lengths [m] at which some leg is exact with some counts."""
        ohms: FloatArray = np.concatenate([value / self.ratios.value for value in self.wanted])
        return (ohms - cell.ends) / cell.per_length

    def _balanced(self, cell: Cell, points: Sequence[Point]) -> FloatArray:
        """Return for each point the length [m] at which, with its counts, the largest error is least."""
        ends = []
        for point in points:
            of_leg = [s / p / value for (s, p), value in zip(point.counts, self.wanted, strict=True)]
            ends.append(2.0 / (min(of_leg) + max(of_leg)))
        return (np.asarray(ends, dtype=np.float64) - cell.ends) / cell.per_length

    def _around(self, steps: FloatArray, low: int, high: int) -> FloatArray:
        """Return the lengths [m] on the grid on both sides of each, from ``low`` to ``high`` steps."""
        both = np.unique(np.concatenate((np.floor(steps), np.ceil(steps))))
        return both[(both >= low) & (both <= high)] * self.grid


def film_task(
    material: Material, legs: Sequence[tuple[str, float]], reference: float, rules: FilmRules
) -> FilmTask:
    """Return the checked task of `film_legs`; its parameters are those."""
    film = material.film
    if film is None or material.ohm_per_square is None:
        raise InputError(_undrawable(material, "no [film] table", "ohm_per_square and [film] with min_width"))
    if rules.mismatch is not None and film.matching is None:
        raise InputError(
            _undrawable(material, "no matching", "matching, because a mismatch is wanted of this film")
        )
    if not legs or not all(0.0 < ohms < math.inf for _, ohms in legs):
        raise InputError(
            Problem(
                where=f"legs of {material.name}",
                found="no leg, or a value that is not above zero",
                expected="finite values above zero",
            )
        )
    return FilmTask(
        material=material,
        film=film,
        names=tuple(name for name, _ in legs),
        wanted=tuple(float(ohms) for _, ohms in legs),
        reference=reference,
        rules=rules,
        ratios=count_ratios(rules.most_count),
    )


def per_length(material: Material, width: float, reference: float) -> float:
    """Return the resistance of the body per length [ohm/m] at ``reference`` [K], at a drawn width [m]."""
    bias = 0.0 if material.film is None else material.film.width_bias or 0.0
    squares_per_ohm = material.squares(1.0, reference)
    if squares_per_ohm is None:
        raise InputError(_undrawable(material, "no ohm_per_square", "a film"))
    return 1.0 / squares_per_ohm / (width - bias)


def ends_ohms(material: Material, width: float, reference: float) -> float:
    """Return the resistance of both ends [ohm] at ``reference`` [K]; 0 where none is stated.

    From the own reference of the film by the law of the ends.
    """
    film, ends = material.film, ends_material(material)
    if film is None or film.end_resistance is None or ends is None:
        return 0.0
    ratio = float(ends.ratio(np.asarray([reference]), material.reference)[0])
    return 2.0 * film.end_resistance * ratio / width


def _up_to_grid(size: float, grid: float) -> float:
    """Return the next size on the grid [m], the same number where it is on it."""
    steps = math.ceil(size / grid - _ON_GRID)
    return size if abs(steps - size / grid) <= _ON_GRID else steps * grid


def _undrawable(material: Material, found: str, expected: str) -> Problem:
    return Problem(
        where=f"material.{material.name}",
        found=found,
        expected=expected,
        todo="Complete the material, or leave its parts out.",
    )
