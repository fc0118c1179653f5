"""The worst case of the drift of a ratio: a device that reaches it, and a bound on every device.

Law shifts move both resistors, so unlike in one network they do not sit all at one end: value factors and
shifts are searched together, cell by cell (`tcplan.ratio.cells`), above and below what is wanted. The
worst device is then followed to the temperature where it is worst, and the search repeated there.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.goal import Judged
from tcplan.ratio.cells import MOST_WORK, Side, side_extreme, temperatures
from tcplan.ratio.pair import Pair, PairDevice
from tcplan.ratio.space import Space, space_of

GRID = 33
CLOSED = 1e-3  # a bound that is nearer than this to what is reached counts as closed
LEAST = 1e-9  # a figure below which all is rounding
ROUNDS = 4
BAND_ROUNDS = 12


@dataclass(frozen=True, slots=True, kw_only=True)
class RatioWorst:
    """The worst device found, what it reaches, and the figure that no device is above.

    ``closed`` is whether the two are within 0.1 %; ``high_at`` and ``low_at`` are the temperatures [K] of
    the highest and of the lowest drift of any device.
    """

    device: PairDevice
    judged: Judged
    upper: float
    closed: bool
    high_at: float
    low_at: float


def worst_of(pair: Pair) -> RatioWorst:
    """Return the worst judged figure over the box of a pair; every material of it has a spread."""
    if pair.always_flat:
        device = pair.nominal()
        reached = pair.judge(device)
        return _worst(device, reached, reached.figure, reached.at, reached.at)
    space = space_of(pair)
    if pair.need.centred:
        return _banded(space)
    high = _followed(space, up=True)
    low = _followed(space, up=False, floor=high.judged.figure)
    one = max((high, low), key=lambda followed: followed.judged.figure)
    upper = max(high.upper, low.upper, one.judged.figure)
    return _worst(one.device, one.judged, upper, high.at, low.at)


def _worst(device: PairDevice, reached: Judged, upper: float, high: float, low: float) -> RatioWorst:
    closed = upper <= reached.figure * (1.0 + CLOSED) + LEAST
    return RatioWorst(device=device, judged=reached, upper=upper, closed=closed, high_at=high, low_at=low)


# --- one temperature ----------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Followed:
    """The worst device of one side at its worst temperature, and the bound of that side."""

    device: PairDevice
    judged: Judged
    upper: float
    at: float


def _followed(space: Space, *, up: bool, floor: float = -np.inf) -> _Followed:
    """Return the worst device of one side, searched again where it turns out to be worst.

    A bound of it that is below ``floor``, what the other side reaches, need not be near.
    """
    pieces = list(temperatures(space, GRID))
    T, weight = (np.concatenate([piece[k] for piece in pieces]) for k in (0, 1))
    side = side_extreme(space, space.grid(T, weight), up=up, floor=floor)
    best = _reached(space, side, float(T[side.at]))
    upper = side.upper
    for _ in range(ROUNDS):
        at = best.judged.at
        grid = space.grid(np.array([at]), np.array([_tightest(space, at)]))
        side = side_extreme(space, grid, up=up, floor=floor)
        found, upper = _reached(space, side, at), max(upper, side.upper)
        if found.judged.figure <= best.judged.figure * (1.0 + 1e-6) + LEAST:
            break
        best = found
    return replace(best, upper=upper)


def _reached(space: Space, side: Side, at: float) -> _Followed:
    """Return what the device of a side reaches over the whole range."""
    device = space.device(side.point, at, up=side.up)
    return _Followed(device, space.pair.judge(device), side.upper, at)


def _tightest(space: Space, at: float) -> float:
    return min(piece.weight for piece in space.pair.need.pieces if piece.low <= at <= piece.high)


def side_at(pair: Pair, T: float, weight: float, *, up: bool) -> float:
    """Return the highest (lowest) drift of any device at one temperature [K], over the weight.

    Signed, as a fraction; reached, and within 0.1 % of the extreme where the work allowed suffices.
    """
    space = space_of(pair)
    side = side_extreme(space, space.grid(np.array([T]), np.array([weight])), up=up, work=MOST_WORK // 10)
    return side.figure if up else -side.figure


# --- bands --------------------------------------------------------------------------------------------


def _banded(space: Space) -> RatioWorst:
    """Return the worst band: two temperatures of one device, so the box itself is searched.

    Limits and middles of one coordinate after another, from the devices of the highest and of the lowest
    drift; the bound adds these two, which need not be one device.
    """
    whole = next(piece for piece in temperatures(space, GRID) if piece[2])
    grid = space.grid(whole[0], whole[1])
    high, low = (side_extreme(space, grid, up=up) for up in (True, False))
    bound = 0.5 * (high.upper + low.upper)
    for T, weight, centred in temperatures(space, GRID):
        if not centred:
            plain = (side_extreme(space, space.grid(T, weight), up=up).upper for up in (True, False))
            bound = max(bound, *plain)
    best = max((_climbed(space, side, grid.T) for side in (high, low)), key=lambda pair: pair[1].figure)
    at = float(grid.T[high.at]), float(grid.T[low.at])
    return _worst(best[0], best[1], max(bound, best[1].figure), *at)


def _climbed(space: Space, side: Side, T: FloatArray) -> tuple[PairDevice, Judged]:
    """Return the worst device reached by moving one coordinate at a time."""
    point, up, pair = side.point, side.up, space.pair
    at = float(T[side.at])
    best = space.device(point, at, up=up)
    reached = pair.judge(best)
    for _ in range(BAND_ROUNDS):
        tried = [(z, d, pair.judge(d)) for z, d in _neighbours(space, point, at)]
        z, device, found = max(tried, key=lambda one: one[2].figure)
        if found.figure <= reached.figure * (1.0 + 1e-9):
            break
        point, best, reached = z, device, found
    return best, reached


def _neighbours(space: Space, point: FloatArray, at: float) -> Iterator[tuple[FloatArray, PairDevice]]:
    """Yield devices that differ in one coordinate, or in the side on which the resistors are apart."""
    for up in (True, False):
        yield point, space.device(point, at, up=up)
        for j in np.flatnonzero(space.half > 0.0):
            for level in (-1.0, 0.0, 1.0):
                z = point.copy()
                z[j] = level * space.half[j]
                if all(np.ptp(space.tc1(z)[own]) <= most * (1.0 + 1e-12) for own, most in space.tracked):
                    yield z, space.device(z, at, up=up)
