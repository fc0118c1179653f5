"""The trade between the area and the error of all legs together, at one width of their unit."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.parts.count_bounds import ALIKE, Best, extremes, worth_a_look
from tcplan.parts.counts import SLACK, Cell, CountedLeg, Point, Ratios, counted_legs


def trade(
    cell: Cell,
    lengths: FloatArray,
    wanted: Sequence[float],
    ratios: Ratios,
    error: float,
    known: Sequence[Point] = (),
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
    known : sequence of Point
        Of other widths: points that one of these beats may be left out.
    """
    legs = counted_legs(cell, wanted, ratios)
    looked, best = worth_a_look(legs, lengths, error, Best.of_points(known))
    points: list[Point] = []
    for length in looked:
        points.extend(_at_length(legs, float(length), error, best))
    return front(points)


def possible(cell: Cell, lengths: FloatArray, wanted: Sequence[float], ratios: Ratios, error: float) -> bool:
    """Return whether every leg can be made at some length; the parameters are those of `trade`."""
    return extremes(counted_legs(cell, wanted, ratios), lengths, error).lengths.size > 0


def front(points: Iterable[Point]) -> tuple[Point, ...]:
    """Return the points that no other one beats in both area and error, least area first."""
    kept: list[Point] = []
    for point in sorted(points, key=lambda p: (p.area, max(p.error, ALIKE), p.error, p.length, p.counts)):
        if not kept or max(point.error, ALIKE) < max(kept[-1].error, ALIKE):
            kept.append(point)
    return tuple(kept)


@dataclass(frozen=True, slots=True, eq=False)
class _LegTrade:
    """Of a leg at one length: its units, rising, their errors, falling, and their counts."""

    units: FloatArray
    errors: FloatArray
    in_series: IntArray
    in_parallel: IntArray


def _at_length(legs: Sequence[CountedLeg], length: float, error: float, best: Best) -> Iterator[Point]:
    """Yield the trade at one length, each error of a leg as the limit of all in turn; not what is beaten."""
    trades = [_leg_trade(leg, length, error) for leg in legs]
    lowest = max(own.errors[-1] for own in trades)
    limits = np.unique(np.maximum(np.concatenate([own.errors for own in trades]), lowest))
    chosen = [np.searchsorted(-own.errors, -limits) for own in trades]
    units = [own.units[at] for own, at in zip(trades, chosen, strict=True)]
    areas: FloatArray = np.sum(units, axis=0) * legs[0].cell.area(length)
    # Less by the slack: a point that is itself among what is known is not beaten.
    beaten = best.beats(areas, np.maximum(limits, ALIKE) * (1.0 - SLACK))
    for k in np.flatnonzero(~beaten):
        counts = tuple(
            (int(own.in_series[at[k]]), int(own.in_parallel[at[k]]))
            for own, at in zip(trades, chosen, strict=True)
        )
        yield Point(length=length, counts=counts, area=float(areas[k]), error=float(limits[k]))


def _leg_trade(leg: CountedLeg, length: float, error: float) -> _LegTrade:
    """Return the counts of a leg at one length, more units only for less error."""
    ratios, at_length = leg.ratios, np.asarray([length])
    target, least = leg.target(at_length), leg.units(at_length)
    first, after = ratios.window(target, error)
    at = np.arange(first[0], after[0])
    units, off = ratios.needed(at, least), np.abs(ratios.value[at] / target - 1.0)
    order = np.lexsort((off, units))
    order = order[np.isfinite(units[order])]
    kept = order[np.diff(np.minimum.accumulate(off[order]), prepend=np.inf) < 0.0]
    times = ratios.times(at[kept], least).astype(np.int_)
    return _LegTrade(
        units[kept], off[kept], ratios.in_series[at[kept]] * times, ratios.in_parallel[at[kept]] * times
    )
