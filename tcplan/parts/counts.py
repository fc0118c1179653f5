"""Counts of equal units at one width: the trade between the area and the error of all legs together.

A leg of ``in_parallel`` strings of ``in_series`` units has the value ratio * R_unit, with
ratio = in_series / in_parallel. At a length of the unit each leg needs a ratio near wanted / R_unit; the
ratios in lowest terms, sorted once, are searched for all lengths together. More units than a ratio needs,
a k by k square of it, are taken only where mismatch asks for them.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray

ALIKE = 1e-6
"""Errors below this count as alike: no film is known as well, and no area is spent on the difference."""
_SLACK = 1e-12  # relative, of the arithmetic
_LEVEL = 4.0  # between the error limits at which the trade over all lengths is bounded


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """A unit of one width, its length still open.

    Parameters
    ----------
    per_length : float
        Of the body [ohm/m].
    ends : float
        Of both ends together [ohm].
    pitch : float
        Area per length, the width and the spacing [m].
    least_together : float
        Least length of all units of a leg together [m], for its mismatch; 0 where none is wanted.
    """

    per_length: float
    ends: float
    pitch: float
    least_together: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Point:
    """One point of the trade: the length of the unit [m] and (in series, in parallel) of each leg."""

    length: float
    counts: tuple[tuple[int, int], ...]
    area: float
    error: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Ratios:
    """All ratios of counts in lowest terms, rising."""

    in_series: IntArray
    in_parallel: IntArray
    value: FloatArray
    units: FloatArray
    most_times: FloatArray

    def times(self, at: IntArray, least: FloatArray) -> FloatArray:
        """Return how many times both counts are taken, so that a leg has the ``least`` units."""
        times: FloatArray = np.ceil(np.sqrt(least / self.units[at]) * (1.0 - _SLACK))
        return np.maximum(times, 1.0)

    def needed(self, at: IntArray, least: FloatArray) -> FloatArray:
        """Return the units of a leg, infinite where the counts would exceed the most."""
        times = self.times(at, least)
        needed: FloatArray = np.where(times <= self.most_times[at], times**2 * self.units[at], np.inf)
        return needed


def count_ratios(most_count: int) -> Ratios:
    """Return the ratios of two counts of at most ``most_count`` each."""
    every = np.arange(1, most_count + 1)
    series, parallel = (side.ravel() for side in np.meshgrid(every, every))
    lowest = np.gcd(series, parallel) == 1
    series, parallel = series[lowest], parallel[lowest]
    order = np.argsort(series / parallel)
    series, parallel = series[order], parallel[order]
    return Ratios(
        in_series=series,
        in_parallel=parallel,
        value=series / parallel,
        units=(series * parallel).astype(np.float64),
        most_times=np.floor(most_count / np.maximum(series, parallel)),
    )


def trade(
    cell: Cell, lengths: FloatArray, wanted: Sequence[float], ratios: Ratios, error: float
) -> tuple[Point, ...]:
    """Return the non-dominated points over all lengths and all counts, least area first.

    Parameters
    ----------
    cell : Cell
    lengths : array
        Lengths of the unit [m] to choose from.
    wanted : sequence of float
        Value of each leg [ohm].
    ratios : Ratios
    error : float
        Largest relative value error of a leg.
    """
    levels: list[_Extremes] = []
    limit = error
    while lengths.size and limit > ALIKE / _LEVEL:
        levels.append(_extremes(cell, lengths, wanted, ratios, limit))
        lengths, limit = levels[-1].lengths, limit / _LEVEL
    points: list[Point] = []
    for length in _worth_a_look(levels):
        points.extend(_at_length(cell, float(length), wanted, ratios, error))
    return front(points)


def front(points: Iterable[Point]) -> tuple[Point, ...]:
    """Return the points that no other one beats in both area and error, least area first."""
    kept: list[Point] = []
    for point in sorted(points, key=lambda p: (p.area, max(p.error, ALIKE), p.error, p.length, p.counts)):
        if not kept or max(point.error, ALIKE) < max(kept[-1].error, ALIKE):
            kept.append(point)
    return tuple(kept)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Extremes:
    """Over lengths, within an error: area and error with the fewest units, and with the nearest ratios."""

    error: float
    lengths: FloatArray
    few: tuple[FloatArray, FloatArray]
    near: tuple[FloatArray, FloatArray]


def _extremes(
    cell: Cell, lengths: FloatArray, wanted: Sequence[float], ratios: Ratios, error: float
) -> _Extremes:
    """Return both ends of the trade at each length at which every leg can be made."""
    totals = np.zeros((4, lengths.size))
    for value in wanted:
        target, least = _needs(cell, lengths, value)
        leg = _leg_extremes(target, least, ratios, error)
        can = np.isfinite(leg[0])
        lengths, leg, totals = lengths[can], leg[:, can], totals[:, can]
        totals[[0, 2]] += leg[[0, 2]]
        totals[[1, 3]] = np.maximum(totals[[1, 3]], leg[[1, 3]])
    unit_areas = lengths * cell.pitch
    few_error, near_error = np.maximum(totals[1], ALIKE), np.maximum(totals[3], ALIKE)
    return _Extremes(
        error=error,
        lengths=lengths,
        few=(totals[0] * unit_areas, few_error),
        near=(totals[2] * unit_areas, near_error),
    )


def _needs(cell: Cell, lengths: FloatArray, value: float) -> tuple[FloatArray, FloatArray]:
    """Return the ratio that a leg wants at each length, and its least number of units."""
    return value / (cell.per_length * lengths + cell.ends), cell.least_together / lengths


def _window(target: FloatArray, ratios: Ratios, error: float) -> tuple[IntArray, IntArray]:
    """Return the first position of the ratios within the error of each target, and the one after the last."""
    reach = error + _SLACK
    first = np.searchsorted(ratios.value, target * (1.0 - reach))
    return first, np.searchsorted(ratios.value, target * (1.0 + reach), side="right")


def _leg_extremes(target: FloatArray, least: FloatArray, ratios: Ratios, error: float) -> FloatArray:
    """Return (units, error) with the fewest units, then with the nearest ratio, at each length."""
    first, after = _window(target, ratios, error)
    best = np.full((4, target.size), np.inf)
    for step in range(int((after - first).max(initial=0))):
        where = np.flatnonzero(first + step < after)
        at = first[where] + step
        units = ratios.needed(at, least[where])
        off = np.where(np.isfinite(units), np.abs(ratios.value[at] / target[where] - 1.0), np.inf)
        few = _before(units, off, best[0, where], best[1, where])
        near = _before(np.maximum(off, ALIKE), units, np.maximum(best[3, where], ALIKE), best[2, where])
        best[:2, where[few]] = units[few], off[few]
        best[2:, where[near]] = units[near], off[near]
    return best


def _before(
    first: FloatArray, second: FloatArray, old_first: FloatArray, old_second: FloatArray
) -> BoolArray:
    """Return where (first, second) comes before the old pair."""
    before: BoolArray = (first < old_first) | ((first == old_first) & (second < old_second))
    return before


def _worth_a_look(levels: Sequence[_Extremes]) -> FloatArray:
    """Return the lengths that may have a point which no point already known beats.

    With an error between the limit of a level and that of the next, a length needs at least the area that it
    has with the fewest units of that level.
    """
    ends = [end for level in levels for end in (level.few, level.near)]
    if not ends:
        return np.empty(0)
    areas, errors = (np.concatenate(each) for each in zip(*ends, strict=True))
    order = np.lexsort((errors, areas))
    areas, errors = areas[order], np.minimum.accumulate(errors[order])
    worth = []
    for level in levels:
        area, error = level.few[0], np.maximum(level.near[1], level.error / _LEVEL)
        at = np.searchsorted(areas, area, side="right") - 1
        first = np.searchsorted(-errors, -errors[at])  # an equal error of a smaller area beats as well
        beaten = (errors[at] < error) | ((errors[at] == error) & (areas[first] < area))
        worth.append(level.lengths[~beaten])
    return np.unique(np.concatenate(worth))


def _at_length(
    cell: Cell, length: float, wanted: Sequence[float], ratios: Ratios, error: float
) -> tuple[Point, ...]:
    """Return the trade at one length: each error of a leg as the limit of all legs in turn."""
    legs = [_leg_trade(cell, length, value, ratios, error) for value in wanted]
    lowest = max(leg[-1][1] for leg in legs)
    limits = {max(off, lowest) for leg in legs for _, off, _ in leg}
    points = []
    for limit in limits:
        chosen = [next(item for item in leg if item[1] <= limit) for leg in legs]
        points.append(
            Point(
                length=length,
                counts=tuple(item[2] for item in chosen),
                area=sum(item[0] for item in chosen) * length * cell.pitch,
                error=max(item[1] for item in chosen),
            )
        )
    return front(points)


def _leg_trade(
    cell: Cell, length: float, value: float, ratios: Ratios, error: float
) -> list[tuple[float, float, tuple[int, int]]]:
    """Return (units, error, counts) of a leg at one length, more units only for less error."""
    target, least = _needs(cell, np.asarray([length]), value)
    first, after = _window(target, ratios, error)
    at = np.arange(first[0], after[0])
    units, times = ratios.needed(at, least), ratios.times(at, least)
    off = np.abs(ratios.value[at] / target - 1.0)
    kept: list[tuple[float, float, tuple[int, int]]] = []
    for k in np.lexsort((off, units)):
        if np.isfinite(units[k]) and (not kept or off[k] < kept[-1][1]):
            counts = int(ratios.in_series[at[k]] * times[k]), int(ratios.in_parallel[at[k]] * times[k])
            kept.append((float(units[k]), float(off[k]), counts))
    return kept
