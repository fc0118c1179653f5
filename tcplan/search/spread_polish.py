"""Polish of one tree for its worst case: the rows are devices, and the worst ones found join them.

It starts from the corners of the value factors on a grid of temperatures. Where it ends, the factors
are moved one by one to where they are worst (that can be inside the box), the temperature is refined,
and what is worse than the corners becomes a row; until nothing is worse by more than 1 in 10^4.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.mixes import KindBounds
from tcplan.process import Variation
from tcplan.search.columns import spread_points
from tcplan.search.curves import ratio, ratio_and_slopes
from tcplan.search.devices import Devices, devices_at
from tcplan.search.mixed import Source
from tcplan.search.polish import Linear, Polisher, Walk

GRID = 25  # temperatures a piece
THIN = 6
LOW = 0.3  # rows below this part of the figure are left out of a step
WORSE = 1.0 + 1e-4
LEVELS = np.linspace(-1.0, 1.0, 9)
SWEEPS = 4
NEAR = 0.98


@dataclass(frozen=True, slots=True)
class _Rows:
    """Devices of one tree: R(T) and R(T_ref) of its legs, shape (legs, rows), and the goal there."""

    hot: FloatArray
    cold: FloatArray
    side: FloatArray
    weight: FloatArray
    wanted: FloatArray

    def take(self, at: IntArray) -> _Rows:
        return _Rows(self.hot[:, at], self.cold[:, at], self.side[at], self.weight[at], self.wanted[at])

    def joined(self, other: _Rows) -> _Rows:
        return _Rows(
            np.hstack([self.hot, other.hot]),
            np.hstack([self.cold, other.cold]),
            np.r_[self.side, other.side],
            np.r_[self.weight, other.weight],
            np.r_[self.wanted, other.wanted],
        )


@dataclass(slots=True)
class SpreadPolisher(Polisher):
    """One tree whose worst device is looked at."""

    source: Source
    variation: Variation
    devices: Devices
    bounds: KindBounds
    rows: _Rows = field(init=False)
    corners: FloatArray = field(init=False)

    def __post_init__(self) -> None:
        kinds, devices = np.array([self.leg_materials]), self.devices
        hot, cold = devices.legs(kinds)
        count = hot[0].shape[-1]
        repeats = count // len(devices.T)
        self.corners = devices.corners(kinds)[0]
        self.rows = _Rows(
            np.stack([leg[0, 0] for leg in hot]),
            np.stack([leg[0, 0] for leg in cold]),
            devices.sides(count),
            np.tile(devices.weight, repeats),
            np.tile(devices.wanted, repeats),
        )

    def _figures(self, x: FloatArray, rows: _Rows) -> FloatArray:
        shares = x.tolist()
        top, under = ratio(self.pair, list(rows.hot), shares), ratio(self.pair, list(rows.cold), shares)
        return np.asarray(rows.side * (top / under - rows.wanted) / rows.weight)

    def survey(self, x: FloatArray) -> tuple[float, IntArray]:
        """Return the worst figure of the rows, and which of them matter to a step."""
        figure = self._figures(x, self.rows)
        highest = float(figure.max())
        width = len(self.devices.T)
        first = len(self.corners) * 2 * width
        table = figure[:first].reshape(-1, width)
        above = np.pad(table, ((0, 0), (1, 1)), constant_values=-np.inf)
        matters = np.ones(len(figure), dtype=bool)
        peaks = (table >= above[:, :-2]) & (table >= above[:, 2:])
        peaks[:, ::THIN] = True
        matters[:first] = peaks.ravel()
        return highest, np.nonzero(matters & (figure >= LOW * highest))[0]

    def linear(self, x: FloatArray, active: IntArray) -> Linear:
        """Return the rows that matter, taken linear."""
        rows = self.rows.take(active)
        top, top_slopes = ratio_and_slopes(self.pair, list(rows.hot), x)
        under, under_slopes = ratio_and_slopes(self.pair, list(rows.cold), x)
        factor = rows.side / (rows.weight * under)
        base = factor * (top - rows.wanted * under)
        slopes = [factor * (top_slopes[k] - top / under * under_slopes[k]) for k in range(len(x))]
        return Linear(base, np.stack(slopes), np.zeros_like(base))

    def reached(self, x: FloatArray, active: IntArray, figure: float) -> int:
        """Return how many devices reach the figure."""
        return int((self._figures(x, self.rows.take(active)) >= figure * (1.0 - 1e-4)).sum())

    # --- devices inside the box -------------------------------------------------------------------

    def deepened(self, walk: Walk) -> bool:
        """Add the worst devices of the box to the rows; return whether they are worse than the rows."""
        worst = self._worst_devices(walk.x)
        if float(self._figures(walk.x, worst).max()) <= walk.figure * WORSE:
            return False
        self.rows = self.rows.joined(worst)
        walk.figure, walk.active, walk.excess = self.merit(walk.x)
        return True

    def _worst_devices(self, x: FloatArray) -> _Rows:
        """Return the devices that are worst near every temperature where the figure is about reached."""
        need = self.source.need
        piece, T = spread_points(need, 2 * GRID - 1, chebyshev=False)
        step = np.array([(need.pieces[k].high - need.pieces[k].low) / (2 * GRID - 2) for k in piece])
        found: list[_Rows] = []
        for side in (1.0, -1.0):
            factors, figure = self._ascended(x, self._at(piece, T), side)
            near = np.nonzero(_peaks(figure, piece) & (figure >= NEAR * figure.max()))[0]
            best = _turning(self, x, factors[near], piece[near], T[near], step[near], side)
            found.append(self._device_rows(self._at(piece[near], best), factors[near], side))
        return found[0].joined(found[1])

    def _at(self, piece: IntArray, T: FloatArray) -> Devices:
        return devices_at(self.source, self.variation, piece, T, self.bounds)

    def _device_rows(self, devices: Devices, factors: FloatArray, side: float) -> _Rows:
        """Return one row a temperature, with these factors, shape (T, legs)."""
        laws = (devices.hi if side > 0 else devices.lo)[list(self.leg_materials)]
        sides = np.full(len(devices.T), side)
        return _Rows(factors.T * laws, factors.T, sides, devices.weight, devices.wanted)

    def _ascended(self, x: FloatArray, devices: Devices, side: float) -> tuple[FloatArray, FloatArray]:
        """Return the worst factors found at every temperature, shape (T, legs), and their figures.

        From the best corner, one coordinate after the other, over levels that close in.
        """
        kinds = np.array(self.leg_materials)
        groups, half = devices.groups[kinds], devices.half[kinds]
        tried = np.stack(
            [
                self._figures(x, self._device_rows(devices, np.tile(c, (len(devices.T), 1)), side))
                for c in self.corners
            ]
        )
        factors, best = self.corners[tried.argmax(axis=0)].copy(), tried.max(axis=0)
        for sweep in range(SWEEPS if len(set(groups[half > 0].tolist())) > 1 else 0):
            for group in sorted(set(groups[half > 0].tolist())):
                mine = groups == group
                leads = np.nonzero(mine & (half > 0))[0][0]
                here = (factors[:, leads : leads + 1] - 1.0) / half[leads]
                for level in LEVELS:
                    s = np.clip(here + level * 2.0 * 0.3**sweep, -1.0, 1.0)
                    other = factors.copy()
                    other[:, mine] = 1.0 + half[mine] * s
                    figure = self._figures(x, self._device_rows(devices, other, side))
                    better = figure > best
                    factors[better], best = other[better], np.maximum(best, figure)
        return factors, best


def _peaks(figure: FloatArray, piece: IntArray) -> FloatArray:
    """Return where a figure is not below its neighbours of the same piece."""
    edge = np.r_[True, piece[1:] != piece[:-1], True]
    before = np.where(edge[:-1], -np.inf, np.r_[-np.inf, figure[:-1]])
    after = np.where(edge[1:], -np.inf, np.r_[figure[1:], -np.inf])
    return np.asarray((figure >= before) & (figure >= after))


def _turning(
    polisher: SpreadPolisher,
    x: FloatArray,
    factors: FloatArray,
    piece: IntArray,
    T: FloatArray,
    step: FloatArray,
    side: float,
) -> FloatArray:
    """Return where the figure of each device is highest near T, by a parabola through three points."""
    pieces = [polisher.source.need.pieces[k] for k in piece]
    low, high = np.array([p.low for p in pieces]), np.array([p.high for p in pieces])
    inside = (low < T) & (high > T)
    h = np.where(inside, step, 0.0)
    f0, f1, f2 = (
        polisher._figures(x, polisher._device_rows(polisher._at(piece, T + k * h), factors, side))
        for k in (-1.0, 0.0, 1.0)
    )
    bend = f0 - 2.0 * f1 + f2
    curved = inside & (np.abs(bend) > 1e-18)
    move = np.where(curved, 0.5 * (f0 - f2) / np.where(curved, bend, 1.0), 0.0)
    return np.asarray(np.clip(T + h * np.clip(move, -1.0, 1.0), low, high))
