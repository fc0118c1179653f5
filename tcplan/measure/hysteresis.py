"""How far the way down lies above the way up, when a sweep goes both ways."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.measure.fit_repeats import group_sums, temperature_groups
from tcplan.measure.model import Direction, Hysteresis

_TURN = 0.1  # of the span: a smaller way back is jitter of the chamber
_FEWEST = 3  # readings of a way
_RISK = 0.05


@dataclass(frozen=True, slots=True, kw_only=True)
class Way:
    """Readings ``first`` to ``end`` (not included) on the way up or down."""

    direction: Direction
    first: int
    end: int


def ways(T: FloatArray) -> tuple[Way, ...]:
    """Return the ways up and down of a sweep, from the order of its temperatures.

    A turn is a way back of more than a tenth of the span; the reading at the turn belongs to the way that
    leads to it. A file that turns more often than every fourth reading has no order, and gives none.

    Parameters
    ----------
    T : array, shape (reading,)
        Temperatures [K], in the order of the file.
    """
    turns, rising = _turns(T.tolist(), _TURN * float(np.ptp(T)))
    if 4 * len(turns) > len(T):
        return ()
    edges = (0, *(k + 1 for k in turns), len(T))
    found = []
    for first, end in pairwise(edges):
        found.append(Way(direction="up" if rising else "down", first=first, end=end))
        rising = not rising
    return tuple(way for way in found if way.end - way.first >= _FEWEST)


def sides(T: FloatArray, nearness: float) -> IntArray:
    """Return the side of each reading: 1 on a way up, -1 on a way down, 0 on none.

    Readings at the turn that ends a way up are 2, and -2 where it ends a way down: they may be of either.

    Parameters
    ----------
    T : array, shape (reading,)
        Temperatures [K], in the order of the file.
    nearness : float
        Readings within this [K] of a turn are at it.
    """
    found, along = np.zeros(len(T), dtype=np.intp), ways(T)
    for way in along:
        found[way.first : way.end] = 1 if way.direction == "up" else -1
    for way, after in pairwise(along):
        if way.end == after.first:
            at = np.abs(T[way.first : after.end] - T[way.end - 1]) <= nearness
            found[way.first : after.end][at] = 2 if way.direction == "up" else -2
    return found


def _turns(T: list[float], back: float) -> tuple[list[int], bool]:
    """Return the positions of the turns, and whether the first way is up."""
    turns: list[int] = []
    low_at = high_at = direction = 0
    low = high = T[0]
    for k, t in enumerate(T):
        if t > high:
            high, high_at = t, k
        elif t < low:
            low, low_at = t, k
        if direction >= 0 and high - t > back:
            if direction > 0:
                turns.append(high_at)
            direction, low, high, low_at, high_at = -1, t, t, k, k
        elif direction <= 0 and t - low > back:
            if direction < 0:
                turns.append(low_at)
            direction, low, high, low_at, high_at = 1, t, t, k, k
    return turns, (direction > 0) == (len(turns) % 2 == 0)


def hysteresis(
    T: FloatArray, residuals: FloatArray, parameters: int, nearness: float, devices: int = 1
) -> Hysteresis | None:
    """Return the difference of the ways, down less up, or None without both at common temperatures.

    The residuals of the way up are interpolated at the temperatures of the way down, so that the bend of the
    law does not count. The uncertainty of the mean follows from the scatter about the mean of each way. It is
    significant by Student's t at 5 % over the number of devices (Bonferroni), so that of 20 campaigns without
    hysteresis one shows it in any device.

    Parameters
    ----------
    T : array, shape (reading,)
        Temperatures [K], in the order of the file.
    residuals : array, shape (reading,)
        (R - fit)/fit.
    parameters : int
        How many the fit has: the scatter lost as many degrees of freedom to it.
    nearness : float
        Readings within this [K] are of one temperature.
    devices : int, optional
        How many are looked at together.
    """
    up, down = _collected(T, residuals, nearness)
    if up is None or down is None:
        return None
    low, high = up.T[0] - nearness, up.T[-1] + nearness
    at = down.T
    inside = (at >= low) & (at <= high)
    # the mean of all is a parameter of the fit as well as of the two ways
    dof = up.dof + down.dof - (parameters - 1)
    if np.count_nonzero(inside) < 2 or len(up.T) < 2 or dof < 1:
        return None
    at = down.T[inside]
    difference = down.mean[inside] - np.interp(at, up.T, up.mean)
    return _summary(at, difference, _noise_of_mean(up, down, inside, dof), dof, devices)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Side:
    """One direction: T, mean residual and number of each group; the sum of squares about the mean of all."""

    T: FloatArray
    mean: FloatArray
    count: FloatArray
    squares: float
    dof: int


def _collected(T: FloatArray, residuals: FloatArray, nearness: float) -> tuple[_Side | None, _Side | None]:
    found = ways(T)
    sides: list[_Side | None] = []
    for direction in ("up", "down"):
        rows = [np.arange(way.first, way.end) for way in found if way.direction == direction]
        at = np.concatenate(rows) if rows else np.array([], dtype=np.intp)
        sides.append(_side(T[at], residuals[at], nearness) if rows else None)
    return sides[0], sides[1]


def _side(T: FloatArray, residuals: FloatArray, nearness: float) -> _Side:
    groups = temperature_groups(T, nearness)
    count = group_sums(groups, np.ones_like(T))
    return _Side(
        T=group_sums(groups, T) / count,
        mean=group_sums(groups, residuals) / count,
        count=count,
        squares=float(np.sum((residuals - residuals.mean()) ** 2)),
        dof=len(T) - 1,
    )


def _noise_of_mean(up: _Side, down: _Side, inside: BoolArray, dof: int) -> float:
    """Return the standard uncertainty of the mean difference, a weighted sum of the readings."""
    at, m = down.T[inside], int(np.count_nonzero(inside))
    share = np.zeros_like(up.T)
    right = np.clip(np.searchsorted(up.T, at), 1, len(up.T) - 1)
    part = np.clip((at - up.T[right - 1]) / (up.T[right] - up.T[right - 1]), 0.0, 1.0)
    np.add.at(share, right, part / m)
    np.add.at(share, right - 1, (1.0 - part) / m)
    variance = (up.squares + down.squares) / dof
    factor = np.sum(share**2 / up.count) + np.sum(1.0 / down.count[inside]) / m**2
    return float(np.sqrt(variance * factor))


def _summary(at: FloatArray, difference: FloatArray, u: float, dof: int, devices: int) -> Hysteresis:
    from scipy.special import stdtrit

    mean, most = float(difference.mean()), int(np.argmax(np.abs(difference)))
    return Hysteresis(
        mean=mean,
        uncertainty=u,
        most=float(difference[most]),
        at=float(at[most]),
        significant=abs(mean) > -float(stdtrit(dof, _RISK / (2.0 * devices))) * u,
    )
