"""Which lengths of a unit are worth a look: bounds of the trade between area and error over many at once.

At a length of the unit each leg needs a ratio near wanted / R_unit; the ratios, sorted once, are searched
for all lengths together. Both ends of the trade at a length, with the fewest units and with the nearest
ratios, are possible themselves, and bound what lies between.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.parts.counts import CountedLeg, Point

ALIKE = 1e-6
"""Errors below this count as alike: no film is known as well, and no area is spent on the difference."""
LEVEL = 2.0
"""Between the error limits at which the trade over all lengths is bounded."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Extremes:
    """Over lengths, within an error: area and error with the fewest units, and with the nearest ratios."""

    error: float
    lengths: FloatArray
    few: tuple[FloatArray, FloatArray]
    near: tuple[FloatArray, FloatArray]


def extremes(legs: Sequence[CountedLeg], lengths: FloatArray, error: float) -> Extremes:
    """Return both ends of the trade at each length [m] at which every leg can be made.

    The leg of the fewest ratios goes first: it leaves the fewest lengths to the others.
    """
    totals = np.zeros((4, lengths.size))
    for leg in sorted(legs, key=lambda leg: leg.ratios.value.size):
        first, after = leg.ratios.window(leg.target(lengths), error)
        can = first < after
        lengths, totals = lengths[can], totals[:, can]
        own = _leg_extremes(leg, lengths, first[can], after[can])
        can = np.isfinite(own[0])
        lengths, own, totals = lengths[can], own[:, can], totals[:, can]
        totals[[0, 2]] += own[[0, 2]]
        totals[[1, 3]] = np.maximum(totals[[1, 3]], own[[1, 3]])
    unit_areas = legs[0].cell.areas(lengths)
    few_error, near_error = np.maximum(totals[1], ALIKE), np.maximum(totals[3], ALIKE)
    return Extremes(
        error=error,
        lengths=lengths,
        few=(totals[0] * unit_areas, few_error),
        near=(totals[2] * unit_areas, near_error),
    )


def _leg_extremes(leg: CountedLeg, lengths: FloatArray, first: IntArray, after: IntArray) -> FloatArray:
    """Return (units, error) with the fewest units, then with the nearest ratio, at each length.

    The ratios within the error are those from ``first`` to the one before ``after``, never none.
    """
    if leg.cell.least_together > 0.0:
        return _mismatched(leg, lengths, first, after)
    ratios, target = leg.ratios, leg.target(lengths)
    both = np.concatenate((leg.fewest.at(first, after), ratios.nearest(target))).reshape(2, -1)
    units, off = leg.fewest.numbers[both], np.abs(ratios.value[both] / target - 1.0)
    return np.asarray((units[0], off[0], units[1], off[1]))


def _mismatched(leg: CountedLeg, lengths: FloatArray, first: IntArray, after: IntArray) -> FloatArray:
    """Return the same where the units that a ratio needs depend on the length: one ratio after another."""
    ratios, target, least = leg.ratios, leg.target(lengths), leg.units(lengths)
    best = np.full((4, lengths.size), np.inf)
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


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Best:
    """What is known to be possible: areas, rising, and the least error up to each of them."""

    areas: FloatArray
    errors: FloatArray

    @staticmethod
    def of(pairs: Iterable[tuple[FloatArray, FloatArray]]) -> Best:
        """Return the best of (areas, errors)."""
        areas, errors = (np.concatenate(each) for each in zip(*pairs, strict=True))
        order = np.lexsort((errors, areas))
        areas, errors = areas[order], np.minimum.accumulate(errors[order])
        falls = np.diff(errors, prepend=np.inf) < 0.0
        return Best(areas=areas[falls], errors=errors[falls])

    @staticmethod
    def of_points(points: Sequence[Point]) -> Best:
        """Return the best of these points."""
        areas = np.asarray([point.area for point in points], dtype=np.float64)
        errors = np.asarray([point.error for point in points], dtype=np.float64)
        return Best.of(((areas, np.maximum(errors, ALIKE)),))

    def beats(self, area: FloatArray, error: FloatArray) -> BoolArray:
        """Return where something known has no more area and no more error than this, and less of one."""
        if not self.areas.size:
            return np.zeros(area.shape, dtype=np.bool_)
        at = np.searchsorted(self.areas, area, side="right") - 1
        least = np.where(at < 0, np.inf, self.errors[at])
        beaten: BoolArray = (least < error) | ((least == error) & (self.areas[at] < area))
        return beaten


def worth_a_look(
    legs: Sequence[CountedLeg], lengths: FloatArray, error: float, best: Best
) -> tuple[FloatArray, Best]:
    """Return the lengths that may have a point which nothing known beats, and what is known then.

    The error is bounded level by level. With one between the limit of a level and that of the next, a
    length needs at least the area that it has with the fewest units of that level.
    """
    levels: list[Extremes] = []
    limit = error
    while lengths.size and limit > ALIKE / LEVEL:
        level = extremes(legs, lengths, limit)
        levels.append(level)
        best = Best.of(((best.areas, best.errors), level.few, level.near))
        lengths, limit = level.lengths[~best.beats(level.few[0], level.near[1])], limit / LEVEL
    worth = [
        level.lengths[~best.beats(level.few[0], np.maximum(level.near[1], level.error / LEVEL))]
        for level in levels
    ]
    return np.unique(np.concatenate(worth)) if worth else np.empty(0), best
