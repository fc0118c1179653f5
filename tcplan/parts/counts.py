"""Counts of equal units: the unit of one width, and the ratios that counts in series and parallel give.

A leg of ``in_parallel`` strings of ``in_series`` units has the value ratio * R_unit, with
ratio = in_series / in_parallel. More units than a ratio in lowest terms needs, a k by k square of it, are
taken only where mismatch or current asks for them: k times the units in series and k times the strings are
the only other counts of the same ratio.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.parts.range_least import RangeLeast

SLACK = 1e-12
"""Of the arithmetic, relative."""


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
        From unit to unit across the current, the width and the spacing [m].
    extra : float
        From unit to unit along the current beyond the length: both ends and the spacing [m].
    least_together : float
        Least length of all units of a leg together [m], for its mismatch; 0 where none is wanted.
    least_strings : tuple of int
        Least strings in parallel of each leg, for its current; empty where no current is limited.
    """

    per_length: float
    ends: float
    pitch: float
    extra: float = 0.0
    least_together: float = 0.0
    least_strings: tuple[int, ...] = ()

    def ohms(self, lengths: FloatArray) -> FloatArray:
        """Return the value [ohm] of a unit at each length [m]."""
        return self.per_length * lengths + self.ends

    def areas(self, lengths: FloatArray) -> FloatArray:
        """Return the area [m^2] that a unit takes at each length [m]."""
        return (lengths + self.extra) * self.pitch

    def area(self, length: float) -> float:
        """Return the area [m^2] that a unit takes at a length [m]."""
        return (length + self.extra) * self.pitch

    def strings(self, leg: int) -> int:
        """Return the least strings in parallel of a leg."""
        return self.least_strings[leg] if self.least_strings else 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Point:
    """One point of the trade: the length of the unit [m] and (in series, in parallel) of each leg."""

    length: float
    counts: tuple[tuple[int, int], ...]
    area: float
    error: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Ratios:
    """Ratios of counts in lowest terms, rising; how many times both counts may and must be taken."""

    in_series: IntArray
    in_parallel: IntArray
    value: FloatArray
    units: FloatArray
    most_times: FloatArray
    least_times: FloatArray

    def carrying(self, strings: int) -> Ratios:
        """Return the ratios of a leg that needs so many strings: those that can have them."""
        least = np.maximum(self.least_times, np.ceil(strings / self.in_parallel))
        return replace(self, least_times=least).only(least <= self.most_times)

    def fewest(self, count: int) -> Ratios:
        """Return about so many ratios, those of the fewest units."""
        if self.units.size <= count:
            return self
        return self.only(self.units <= np.partition(self.units, count - 1)[count - 1])

    def only(self, which: BoolArray) -> Ratios:
        """Return some of the ratios."""
        return Ratios(
            in_series=self.in_series[which],
            in_parallel=self.in_parallel[which],
            value=self.value[which],
            units=self.units[which],
            most_times=self.most_times[which],
            least_times=self.least_times[which],
        )

    def window(self, target: FloatArray, error: float) -> tuple[IntArray, IntArray]:
        """Return the first position within the error of each target, and the one after the last."""
        reach = error + SLACK
        first = np.searchsorted(self.value, target * (1.0 - reach))
        return first, np.searchsorted(self.value, target * (1.0 + reach), side="right")

    def nearest(self, target: FloatArray) -> IntArray:
        """Return the position of the ratio nearest to each target."""
        above = np.searchsorted(self.value, target).clip(0, self.value.size - 1)
        below = np.maximum(above - 1, 0)
        at: IntArray = np.where(target - self.value[below] < self.value[above] - target, below, above)
        return at

    def times(self, at: IntArray, units: FloatArray) -> FloatArray:
        """Return how many times both counts are taken, so that a leg has as many units as it needs."""
        of_units = np.ceil(np.sqrt(units / self.units[at]) * (1.0 - SLACK))
        times: FloatArray = np.maximum(of_units, self.least_times[at])
        return times

    def needed(self, at: IntArray, units: FloatArray) -> FloatArray:
        """Return the units of a leg, infinite where the counts would exceed the most."""
        times = self.times(at, units)
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
        least_times=np.ones(series.size),
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CountedLeg:
    """One leg of a value [ohm] made of a cell, the ratios that carry its current, and their units."""

    cell: Cell
    ohms: float
    ratios: Ratios
    fewest: RangeLeast

    def target(self, lengths: FloatArray) -> FloatArray:
        """Return the ratio that it wants at each length [m]."""
        return self.ohms / self.cell.ohms(lengths)

    def units(self, lengths: FloatArray) -> FloatArray:
        """Return the least number of its units at each length [m], for its mismatch."""
        return self.cell.least_together / lengths


def counted_legs(cell: Cell, wanted: Sequence[float], ratios: Ratios) -> tuple[CountedLeg, ...]:
    """Return the legs of these values [ohm]."""
    strings = [cell.strings(k) for k in range(len(wanted))]
    carrying = {count: ratios.carrying(count) for count in set(strings)}
    fewest = {count: RangeLeast.of(own.least_times**2 * own.units) for count, own in carrying.items()}
    return tuple(
        CountedLeg(cell=cell, ohms=ohms, ratios=carrying[count], fewest=fewest[count])
        for ohms, count in zip(wanted, strings, strict=True)
    )
