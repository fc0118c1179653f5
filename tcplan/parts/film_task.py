"""What a film part starts from: the unit as a function of its size, and the sizes that may be drawn."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.model import Film, Material
from tcplan.parts.count_trade import front, possible, trade
from tcplan.parts.counts import Cell, Point, Ratios, count_ratios, counted_legs
from tcplan.parts.film_rules import FilmRules
from tcplan.parts.film_unit import ends_ohms, per_length, undrawable
from tcplan.units import format_si

DEFAULT_GRID = 5e-9
_MOST_WIDTHS = 6
_WIDEST = 100.0  # times the least width
_WORK, _FEWEST, _MOST_LENGTHS = 8e5, 4000, 150_000  # lengths looked through: fewer where more counts fit
_FINE = 20.0  # lengths within the error of a leg, where not all are looked through
_ON_GRID = 1e-9  # of a step


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

    @property
    def start(self) -> float:
        """Width to start from [m]: the preferred one, else the least one, on the grid."""
        return _up_to_grid(self.film.preferred_width or self.film.min_width, self.grid)

    @property
    def widest(self) -> float:
        """Largest width [m], on the grid."""
        most = self.rules.max_width or max(
            _WIDEST * self.film.min_width, _up_to_grid(self._one_unit_width(), self.grid)
        )
        return max(_down_to_grid(most, self.grid), self.start)

    @property
    def currents(self) -> dict[str, float]:
        """The limited current of each leg that has one [A]; none where the film states no limit."""
        if self.film.max_current is None:
            return {}
        return {name: current for name, current in self.rules.currents if name in self.names}

    def widths(self) -> tuple[float, ...]:
        """Return the widths to try [m]: the one to start from, wider ones where mismatch or current asks.

        At the widest for mismatch, one unit of the least length has the mismatch that is wanted. For
        current, those at which 1, 2, 4, 8 and so on strings carry that of the leg with the largest.
        """
        stages = (*self._mismatch_widths(), *self._current_widths())
        on_grid = (min(_up_to_grid(width, self.grid), self.widest) for width in stages)
        return tuple(dict.fromkeys((self.start, *on_grid)))

    def _mismatch_widths(self) -> list[float]:
        start = self.film.preferred_width or self.film.min_width
        widest = self._one_unit_width()
        steps = math.ceil(2.0 * math.log2(max(widest / start, 1.0)) - _ON_GRID)
        count = min(steps, _MOST_WIDTHS - 1)
        return [start * (widest / start) ** (k / count) for k in range(1, count + 1)]

    def _one_unit_width(self) -> float:
        return math.sqrt(self._mismatch_area() / self.rules.min_squares)

    def _current_widths(self) -> list[float]:
        width = max(self.currents.values(), default=0.0) / (self.film.max_current or math.inf)
        strings, widths = 1, []
        while width > self.start * strings * (1.0 + _ON_GRID) and strings <= self.rules.most_count:
            widths.append(width / strings)
            strings *= 2
        return widths

    def cell(self, width: float) -> Cell:
        """Return the unit of a width [m], its length open; what is not stated of the film counts 0."""
        spacing, end = self.film.spacing or 0.0, self.film.end_length or 0.0
        return Cell(
            per_length=per_length(self.material, width, self.reference),
            ends=ends_ohms(self.material, width, self.reference),
            pitch=width + spacing,
            extra=2.0 * end + spacing,
            least_together=self._mismatch_area() / width,
            least_strings=self._least_strings(width),
        )

    def length_steps(self, width: float) -> tuple[int, int]:
        """Return the least and the largest L in steps of the grid; the first is above the second if none."""
        steps = width / self.grid
        low = math.ceil(self.rules.min_squares * steps - _ON_GRID)
        return max(low, 1), math.floor(self.rules.max_length_squares * steps + _ON_GRID)

    def points(self, width: float, error: float, known: Sequence[Point] = ()) -> tuple[Point, ...]:
        """Return the trade at one width [m]; what the known points beat may be left out."""
        cell, (lengths, all_of_them) = self.cell(width), self._lengths(width, error)
        points = trade(cell, lengths, self.wanted, self.ratios, error, known)
        if all_of_them:
            return points
        finer = self._around(self._balanced(cell, points) / self.grid, *self.length_steps(width))
        return front((*points, *trade(cell, finer, self.wanted, self.ratios, error, (*known, *points))))

    def can(self, width: float) -> bool:
        """Return whether all legs can be made at a width [m], whatever the area."""
        error = self.rules.error
        return possible(self.cell(width), self._lengths(width, error)[0], self.wanted, self.ratios, error)

    def all_points(self) -> list[tuple[float, Point]]:
        """Return the trade of all widths [m], narrow ones first."""
        drawn: list[tuple[float, Point]] = []
        for width in sorted(self.widths()):
            known = front(point for _, point in drawn)
            drawn.extend((width, point) for point in self.points(width, self.rules.error, known))
        return drawn

    def with_currents(self, currents: Mapping[str, float]) -> FilmTask:
        """Return the task with these currents of its legs [A] in place of its own."""
        return replace(self, rules=replace(self.rules, currents=tuple(currents.items())))

    def with_mismatch(self, mismatch: float | None) -> FilmTask:
        """Return the task with this mismatch in place of its own."""
        return replace(self, rules=replace(self.rules, mismatch=mismatch))

    def inside(self, drawn: Sequence[tuple[float, Point]]) -> list[tuple[float, Point]]:
        """Return those (width, point) that keep the largest area."""
        most = self.rules.max_area
        return [(width, point) for width, point in drawn if most is None or point.area <= most]

    def _mismatch_area(self) -> float:
        """Return the least area [m^2] of the bodies of a leg together; 0 where no mismatch is wanted."""
        if self.rules.mismatch is None or self.film.matching is None:
            return 0.0
        return (self.film.matching / self.rules.mismatch) ** 2 / 2.0

    def _least_strings(self, width: float) -> tuple[int, ...]:
        """Return the least strings of a width [m] that carry the current of each leg; none if unlimited."""
        currents, per_width = self.currents, self.film.max_current
        if per_width is None or not currents:
            return ()
        of_string = per_width * width * (1.0 + _ON_GRID)
        return tuple(max(math.ceil(currents.get(name, 0.0) / of_string), 1) for name in self.names)

    def _lengths(self, width: float, error: float) -> tuple[FloatArray, bool]:
        """Return the lengths to look through [m] at a width [m], and whether these are all."""
        low, high = self.length_steps(width)
        cell = self.cell(width)
        if max(cell.least_strings, default=1) > self.rules.most_count:
            return np.empty(0), True
        most = int(min(max(_WORK / (self.rules.most_count**2 * error), _FEWEST), _MOST_LENGTHS))
        if high - low < most:
            return np.arange(low, high + 1, dtype=np.float64) * self.grid, True
        enough = math.ceil(_FINE / error * math.log(high / low))
        spaced = np.rint(np.geomspace(low, high, min(most, max(enough, _FEWEST))))
        exact = self._exact_lengths(cell, most // len(self.wanted)) / self.grid
        return self._around(np.concatenate((spaced, exact)), low, high), False

    def _exact_lengths(self, cell: Cell, most: int) -> FloatArray:
        """Return the lengths [m] at which some leg is exact with one of the ratios of fewest units."""
        legs = counted_legs(cell, self.wanted, self.ratios)
        ohms: FloatArray = np.concatenate([leg.ohms / leg.ratios.fewest(most).value for leg in legs])
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
        raise InputError(undrawable(material, "no [film] table", "ohm_per_square and [film] with min_width"))
    if rules.mismatch is not None and film.matching is None:
        raise InputError(
            undrawable(material, "no matching", "matching, because a mismatch is wanted of this film")
        )
    if not legs or not all(0.0 < ohms < math.inf for _, ohms in legs):
        raise InputError(
            Problem(
                where=f"legs of {material.name}",
                found="no leg, or a value that is not above zero",
                expected="finite values above zero",
            )
        )
    task = FilmTask(
        material=material,
        film=film,
        names=tuple(name for name, _ in legs),
        wanted=tuple(float(ohms) for _, ohms in legs),
        reference=reference,
        rules=rules,
        ratios=count_ratios(rules.most_count),
    )
    if rules.max_width is not None and rules.max_width < task.start * (1.0 - _ON_GRID):
        raise InputError(_too_narrow(task, rules.max_width))
    return task


def _too_narrow(task: FilmTask, most: float) -> Problem:
    return Problem(
        where="max_width of units",
        found=format_si(most, "m"),
        expected=f"at least {format_si(task.start, 'm')}, the width that {task.material.name} starts from",
        todo="Allow wider units, or state a smaller min_width or preferred_width.",
    )


def _up_to_grid(size: float, grid: float) -> float:
    """Return the next size on the grid [m], the same number where it is on it."""
    steps = math.ceil(size / grid - _ON_GRID)
    return size if abs(steps - size / grid) <= _ON_GRID else steps * grid


def _down_to_grid(size: float, grid: float) -> float:
    """Return the last size on the grid [m], the same number where it is on it."""
    steps = math.floor(size / grid + _ON_GRID)
    return size if abs(steps - size / grid) <= _ON_GRID else steps * grid
