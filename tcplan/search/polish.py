"""Polish of one tree: sequential linear programmes with a trust region and node exchange.

About the shares x the drift at every node and the limits of every leg are taken linear; the step that
lowers the worst row most is a small game (its columns are steps along one share each), and it is
taken when the true figure falls. The end is checked for equi-oscillation: the peak is reached at one
more place than there are free shares, or limits hold the rest.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.search.curves import log_ohms, log_shares, path_slopes, paths, ratio, ratio_and_slopes
from tcplan.minimax import solve_game
from tcplan.search.mixed import Field, Sizes, field_at, spread_points
from tcplan.trees import Pair

GRID = 97
ROUNDS = 80
EDGE = 1e-9  # shares stay this far inside (0, 1)
SMALLEST_STEP = 1e-10
HARD = 1e3  # what a violated limit (in ln) counts as a figure
SAFE = 1e-7  # limits (in ln) are kept with this to spare
NEAR_PEAK = 1e-6


@dataclass(frozen=True, slots=True)
class Polished:
    """Shares, the figure over the continuous range, and whether the end is a stationary point."""

    shares: FloatArray
    figure: float
    excess: float
    stationary: bool


@dataclass(slots=True)
class Polisher:
    """One tree against a goal."""

    pair: Pair
    leg_materials: tuple[int, ...]
    names: tuple[str, ...]
    materials: Mapping[str, Material]
    need: Requirement
    sizes: Sizes
    grid: Field

    def _legs(self, field: Field) -> list[FloatArray]:
        return [field.ratios[m] for m in self.leg_materials]

    def curve(self, field: Field, x: FloatArray) -> FloatArray:
        """Return R(T)/R(T_ref) at the temperatures of a field."""
        return ratio(self.pair, self._legs(field), list(x))

    def peaks(self, x: FloatArray) -> Field:
        """Return the field at the extremes of the drift, refined by parabolas."""
        drift = self.curve(self.grid, x) - self.grid.wanted
        piece, T = self.grid.piece, self.grid.T
        edge = np.r_[True, piece[1:] != piece[:-1], True]
        left, right = np.r_[np.nan, drift[:-1]], np.r_[drift[1:], np.nan]
        left[edge[:-1]], right[edge[1:]] = np.nan, np.nan
        extreme = ~((left > drift) | (right > drift)) | ~((left < drift) | (right < drift))
        inside = extreme & ~np.isnan(left) & ~np.isnan(right)
        ends = extreme & ~inside
        moved = self._refined(x, piece[inside], T[inside])
        return field_at(
            self.need, self.materials, self.names, np.r_[piece[ends], piece[inside]], np.r_[T[ends], moved]
        )

    def _refined(self, x: FloatArray, piece: IntArray, T: FloatArray) -> FloatArray:
        span = np.array([p.high - p.low for p in self.need.pieces])[piece] / (GRID - 1)
        centre = T.copy()
        for shrink in (1.0, 0.05):
            if not len(T):
                break
            h = span * shrink
            three = field_at(
                self.need, self.materials, self.names, np.tile(piece, 3), np.concatenate([T - h, T, T + h])
            )
            f0, f1, f2 = np.split(self.curve(three, x) - three.wanted, 3)
            bend = f0 - 2.0 * f1 + f2
            move = np.where(np.abs(bend) > 1e-18, 0.5 * (f0 - f2) / np.where(bend == 0, 1.0, bend), 0.0)
            T = T + h * np.clip(move, -1.0, 1.0)
        return np.clip(T, centre - span, centre + span)

    def excess(self, x: FloatArray) -> FloatArray:
        """Return by how much (in ln) each limit of each leg is broken; below zero inside."""
        rows = []
        for leg, path in enumerate(paths(self.pair)):
            if self.sizes.min_share > 0:
                rows.append(np.log(self.sizes.min_share) - log_shares(path, x))
            low, high = (side[self.leg_materials[leg]] for side in (self.sizes.lowest, self.sizes.highest))
            if np.isfinite(low):
                rows.append(low - log_ohms(path, x))
            if np.isfinite(high):
                rows.append(log_ohms(path, x) - high)
        return np.array(rows)

    def excess_slopes(self, x: FloatArray) -> FloatArray:
        """Return the derivative of :meth:`excess` by the shares, shape (limits, shares)."""
        rows = []
        for leg, path in enumerate(paths(self.pair)):
            if self.sizes.min_share > 0:
                rows.append(-path_slopes(path, x, of_ohms=False))
            low, high = (side[self.leg_materials[leg]] for side in (self.sizes.lowest, self.sizes.highest))
            if np.isfinite(low):
                rows.append(-path_slopes(path, x, of_ohms=True))
            if np.isfinite(high):
                rows.append(path_slopes(path, x, of_ohms=True))
        return np.array(rows).reshape(-1, len(x))

    def merit(self, x: FloatArray) -> tuple[float, Field, float]:
        """Return the figure with broken limits added, the extremes that set it, and the excess."""
        peaks = self.peaks(x)
        figure = float(self.grid.figures(self.curve(self.grid, x)))
        figure = max(figure, float(peaks.figures(self.curve(peaks, x))))
        rows = self.excess(x)
        worst = float(rows.max()) + SAFE if len(rows) else -np.inf
        return figure + HARD * max(0.0, worst), peaks, worst

    def step(self, x: FloatArray, field: Field, radius: float) -> FloatArray:
        """Return the step of the shares that the linear model likes best, inside the radius.

        Columns of the game: no step, and a step of at most the radius up or down along each share
        and, for a band, of its centre.
        """
        legs = self._legs(field)
        curve, slopes = ratio_and_slopes(self.pair, legs, x)
        drift = curve - field.wanted
        banded = field.free > 0
        centre = 0.5 * (drift[banded].max() + drift[banded].min()) if banded.any() else 0.0
        base = (drift - centre * field.free) / field.weight
        by_share = [slopes[k] / field.weight for k in range(len(x))]
        up = np.minimum(radius, 1.0 - EDGE - x)
        down = np.minimum(radius, x - EDGE)
        limits, limit_slopes = (self.excess(x) + SAFE) * HARD, self.excess_slopes(x) * HARD
        columns = [np.r_[base, -base, limits]]
        for k, slope in enumerate(by_share):
            for reach in (up[k], -down[k]):
                columns.append(
                    np.r_[base + reach * slope, -base - reach * slope, limits + reach * limit_slopes[:, k]]
                )
        if banded.any():
            width = float(np.max(np.abs(base))) + 1e-12
            for shift in (width, -width):
                moved = base - shift * field.free
                columns.append(np.r_[moved, -moved, limits])
        mix = solve_game(np.stack(columns, axis=1)).mix
        return np.array([mix[1 + 2 * k] * up[k] - mix[2 + 2 * k] * down[k] for k in range(len(x))])

    def run(self, start: FloatArray) -> Polished:
        """Return the polished shares."""
        x = np.clip(start, EDGE, 1.0 - EDGE)
        best, peaks, excess = self.merit(x)
        radius = 0.1
        for _ in range(ROUNDS):
            move = self.step(x, _joined(self.grid, peaks), radius)
            if float(np.max(np.abs(move), initial=0.0)) < SMALLEST_STEP:
                break
            trial = np.clip(x + move, EDGE, 1.0 - EDGE)
            merit, fresh, worst = self.merit(trial)
            if merit < best * (1.0 - 1e-12):
                gain = (best - merit) / best
                x, best, peaks, excess = trial, merit, fresh, worst
                radius = min(0.5, radius * 2.0)
                if gain < 1e-9:
                    break
            else:
                radius = 0.25 * min(radius, float(np.max(np.abs(move))))
                if radius < SMALLEST_STEP:
                    break
        return Polished(x, best, excess, self._stationary(x, peaks, best))

    def _stationary(self, x: FloatArray, peaks: Field, figure: float) -> bool:
        """Whether the peak is reached at one more place than there are shares, or limits hold."""
        drift = self.curve(peaks, x) - peaks.wanted
        banded = peaks.free > 0
        centre = 0.5 * (drift[banded].max() + drift[banded].min()) if banded.any() else 0.0
        reached = np.abs(drift - centre * peaks.free) / peaks.weight >= figure * (1.0 - 1e-4)
        rows = self.excess(x)
        active = int((rows > -1e-4).sum()) if len(rows) else 0
        ends = int(((x < 1e-6) | (x > 1.0 - 1e-6)).sum())
        return int(reached.sum()) + active + ends >= len(x) + 1 or figure < 1e-12


def _joined(one: Field, other: Field) -> Field:
    """Return the temperatures of both fields (a third of the first is enough beside the extremes)."""
    thin = slice(None, None, 3)
    return Field(
        one.need,
        one.names,
        np.r_[one.piece[thin], other.piece],
        np.r_[one.T[thin], other.T],
        np.r_[one.weight[thin], other.weight],
        np.r_[one.free[thin], other.free],
        np.r_[one.wanted[thin], other.wanted],
        np.hstack([one.ratios[:, thin], other.ratios]),
    )


def polishing_grid(
    need: Requirement, materials: Mapping[str, Material], names: tuple[str, ...]
) -> Field:
    """Return the field on which peaks are looked for before they are refined."""
    return field_at(need, materials, names, *spread_points(need, GRID, chebyshev=False))
