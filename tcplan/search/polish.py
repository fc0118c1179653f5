"""Polish of one tree: sequential linear programmes with a trust region and node exchange.

About the shares x the drift at every node and the limits of every leg are taken linear; the step that
lowers the worst row most is a small game (its columns are steps along one share each), and it is
taken when the true figure falls. The end is checked for equi-oscillation: the peak is reached at one
more place than there are free shares, or limits hold the rest.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.minimax import solve_game
from tcplan.search.columns import spread_points
from tcplan.search.curves import paths, ratio, ratio_and_slopes
from tcplan.search.limits import LegLimits
from tcplan.search.mixed import Field, Source, field_at
from tcplan.trees import Pair

GRID = 65
ROUNDS = 80
PROBED = 5  # steps after which only the better half of the starts goes on
DEEPENED = 8  # rounds of looking deeper at the end of a walk
FINISHED = 3  # starts that are polished to the end
EDGE = 1e-9  # shares stay this far inside (0, 1)
SMALLEST_STEP = 1e-10
HARD = 1e3  # what a violated limit (in ln) counts as a figure
SAFE = 1e-7  # limits (in ln) are kept with this to spare
SLOW = 1e-7  # relative gain of a step; three such steps in a row end the polish


@dataclass(frozen=True, slots=True)
class Polished:
    """Shares, the figure over the continuous range, and whether the end is a stationary point."""

    shares: FloatArray
    figure: float
    excess: float
    stationary: bool


@dataclass(slots=True)
class Walk:
    """Where the polish of one start stands; ``active`` is what sets its figure."""

    x: FloatArray
    figure: float
    active: Any
    excess: float
    radius: float = 0.1
    slow: int = 0
    done: bool = False


@dataclass(frozen=True, slots=True)
class Linear:
    """One-sided rows about some shares: values, derivatives by the shares (shares, rows), free centres."""

    base: FloatArray
    slopes: FloatArray
    free: FloatArray


@dataclass(slots=True)
class Polisher(ABC):
    """One tree against a goal: what moves the shares, whatever the figure is."""

    pair: Pair
    leg_materials: tuple[int, ...]
    limits: LegLimits
    outermost: tuple[float, float]

    @abstractmethod
    def survey(self, x: FloatArray) -> tuple[float, Any]:
        """Return the figure of some shares, and what sets it."""

    @abstractmethod
    def linear(self, x: FloatArray, active: Any) -> Linear:
        """Return the rows that matter, taken linear about some shares."""

    @abstractmethod
    def reached(self, x: FloatArray, active: Any, figure: float) -> int:
        """Return at how many places the figure is reached."""

    def deepened(self, walk: Walk) -> bool:
        """Look for what the survey misses at the end of a walk; return whether there was any."""
        return False

    def limit_rows(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return by how much (in ln) each limit is broken, and the derivatives by the shares."""
        return self.limits.rows(paths(self.pair), self.leg_materials, x)

    def merit(self, x: FloatArray) -> tuple[float, Any, float]:
        """Return the figure with broken limits added, what sets it, and the excess."""
        figure, active = self.survey(x)
        rows, _ = self.limit_rows(x)
        worst = float(rows.max()) + SAFE if len(rows) else -np.inf
        return figure + HARD * max(0.0, worst), active, worst

    def step(self, x: FloatArray, active: Any, radius: float) -> FloatArray:
        """Return the step of the shares that the linear model likes best, inside the radius.

        Columns of the game: no step, and a step of at most the radius up or down along each share
        and, for a band, of its centre.
        """
        model = self.linear(x, active)
        up = np.minimum(radius, 1.0 - EDGE - x)
        down = np.minimum(radius, x - EDGE)
        least, most = self.outermost
        up[0], down[0] = min(up[0], max(most - x[0], 0.0)), min(down[0], max(x[0] - least, 0.0))
        rows, row_slopes = self.limit_rows(x)
        count, nodes, banded = len(x), len(model.base), bool(model.free.any())
        columns = np.empty((nodes + len(rows), 1 + 2 * count + (2 if banded else 0)))
        columns[:nodes] = model.base[:, None]
        columns[nodes:] = (rows + SAFE)[:, None] * HARD
        for k in range(count):
            for column, reach in ((1 + 2 * k, up[k]), (2 + 2 * k, -down[k])):
                columns[:nodes, column] += reach * model.slopes[k]
                columns[nodes:, column] += reach * row_slopes[:, k] * HARD
        if banded:
            width = float(np.max(np.abs(model.base))) + 1e-12
            columns[:nodes, -2:] += np.outer(model.free, [-width, width])
        mix = solve_game(columns).mix
        return np.array([mix[1 + 2 * k] * up[k] - mix[2 + 2 * k] * down[k] for k in range(count)])

    def begin(self, start: FloatArray) -> Walk:
        """Return the walk that begins at these shares."""
        x = self._inside(start)
        return Walk(x, *self.merit(x))

    def _inside(self, x: FloatArray) -> FloatArray:
        """Return shares inside their bounds."""
        x = np.clip(x, EDGE, 1.0 - EDGE)
        x[0] = min(max(x[0], self.outermost[0]), self.outermost[1])
        return x

    def advance(self, walk: Walk, turns: int) -> None:
        """Take up to so many steps, in place."""
        for _ in range(turns):
            if walk.done:
                return
            move = self.step(walk.x, walk.active, walk.radius)
            reach = float(np.max(np.abs(move), initial=0.0))
            if reach < SMALLEST_STEP:
                walk.done = True
                return
            trial = self._restored(walk.x + move)
            merit, active, excess = self.merit(trial)
            if merit < walk.figure * (1.0 - 1e-12):
                walk.slow = walk.slow + 1 if walk.figure - merit < SLOW * walk.figure else 0
                walk.x, walk.figure, walk.active, walk.excess = trial, merit, active, excess
                walk.radius = min(0.5, walk.radius * 2.0)
                walk.done = walk.slow == 3
            else:
                walk.radius = 0.25 * min(walk.radius, reach)
                walk.done = walk.radius < SMALLEST_STEP

    def finish(self, walk: Walk) -> Polished:
        """Walk to the end, look deeper, and go on until there is nothing new."""
        for _ in range(DEEPENED):
            self.advance(walk, ROUNDS)
            if not self.deepened(walk):
                break
            walk.done, walk.slow, walk.radius = False, 0, max(walk.radius, 0.02)
        return Polished(walk.x, walk.figure, walk.excess, self._stationary(walk))

    def _restored(self, x: FloatArray) -> FloatArray:
        """Return shares moved back inside the limits: along a curved limit a straight step leaves it."""
        held = self.outermost[0] == self.outermost[1]
        for _ in range(4):
            x = self._inside(x)
            rows, slopes = self.limit_rows(x)
            worst = int(np.argmax(rows)) if len(rows) else 0
            if not len(rows) or rows[worst] <= -SAFE:
                break
            slope = slopes[worst].copy()
            if held:
                slope[0] = 0.0
            x = x - (rows[worst] + 2.0 * SAFE) * slope / max(float(slope @ slope), 1e-12)
        return self._inside(x)

    def _stationary(self, walk: Walk) -> bool:
        """Whether the peak is reached at one more place than there are shares, or limits hold."""
        x, figure = walk.x, walk.figure
        rows, _ = self.limit_rows(x)
        active = int((rows > -1e-4).sum()) if len(rows) else 0
        ends = int(((x < 1e-6) | (x > 1.0 - 1e-6)).sum())
        given = int(x[0] in self.outermost)
        places = self.reached(x, walk.active, figure)
        return places + active + ends + given >= len(x) + 1 or figure < 1e-12


@dataclass(slots=True)
class NominalPolisher(Polisher):
    """One tree of nominal materials: the drift on a grid, and at its extremes."""

    source: Source
    grid: Field

    def _legs(self, field: Field) -> list[FloatArray]:
        return [field.ratios[m] for m in self.leg_materials]

    def curve(self, field: Field, x: FloatArray) -> FloatArray:
        """Return R(T)/R(T_ref) at the temperatures of a field."""
        return ratio(self.pair, self._legs(field), x.tolist())

    def peaks(self, drift: FloatArray) -> Field:
        """Return the field at the extremes of the drift on the grid, placed by parabolas through it.

        Where the peak lies is known to the square of the grid's step, and how high it is to the
        fourth power, since the drift is flat there.
        """
        piece, T = self.grid.piece, self.grid.T
        rise = np.diff(drift)
        rise[piece[1:] != piece[:-1]] = 0.0  # the next piece starts anew: both its sides are ends
        before, after = np.concatenate([[0.0], rise]), np.concatenate([rise, [0.0]])
        at = np.nonzero(before * after <= 0)[0]
        # The parabola through three points of equal steps has its top this part of a step away.
        before, after = before[at], after[at]
        bend = after - before
        inner = (before != 0) & (after != 0)
        move = np.where(inner, -0.5 * (before + after) / np.where(inner, bend, 1.0), 0.0)
        places = T[at] + move * (T[np.minimum(at + 1, len(T) - 1)] - T[at])
        return field_at(self.source, piece[at], places, sorted(set(self.leg_materials)))

    def survey(self, x: FloatArray) -> tuple[float, Field]:
        """Return the figure of some shares, and the extremes of their drift."""
        curve = self.curve(self.grid, x)
        peaks = self.peaks(curve - self.grid.wanted)
        return max(float(self.grid.figures(curve)), float(peaks.figures(self.curve(peaks, x)))), peaks

    def linear(self, x: FloatArray, active: Field) -> Linear:
        """Return a few temperatures of the grid and the extremes, taken linear."""
        field = _joined(self.grid, active)
        curve, by_share = ratio_and_slopes(self.pair, self._legs(field), x)
        base = self._centred(curve, field) / field.weight
        slopes = np.stack([by_share[k] / field.weight for k in range(len(x))])
        return Linear(np.r_[base, -base], np.hstack([slopes, -slopes]), np.r_[field.free, -field.free])

    def reached(self, x: FloatArray, active: Field, figure: float) -> int:
        """Return at how many extremes the figure is reached."""
        drift = np.abs(self._centred(self.curve(active, x), active)) / active.weight
        return int((drift >= figure * (1.0 - 1e-4)).sum())

    def _centred(self, curve: FloatArray, field: Field) -> FloatArray:
        drift = curve - field.wanted
        banded = field.free > 0
        centre = 0.5 * (drift[banded].max() + drift[banded].min()) if banded.any() else 0.0
        return np.asarray(drift - centre * field.free)


def _joined(one: Field, other: Field) -> Field:
    """Return the temperatures of both fields; a few of the first are enough beside the extremes."""
    thin = slice(None, None, 8)

    def both(name: str) -> Any:
        return np.concatenate([getattr(one, name)[thin], getattr(other, name)])

    ratios = np.concatenate([one.ratios[:, thin], other.ratios], axis=1)
    return Field(both("piece"), both("T"), both("weight"), both("free"), both("wanted"), ratios)


def polishing_grid(source: Source) -> Field:
    """Return the field on which peaks are looked for before they are refined."""
    return field_at(source, *spread_points(source.need, GRID, chebyshev=False))


def polish(polishers: Sequence[Polisher], starts: Sequence[FloatArray]) -> list[tuple[int, Polished]]:
    """Return the starts that were polished to the end, with their positions.

    All take some steps, the better half some more, and so on until few are left.
    """
    walks = [polisher.begin(start) for polisher, start in zip(polishers, starts, strict=True)]
    order = list(range(len(walks)))
    while len(order) > FINISHED:
        for k in order:
            polishers[k].advance(walks[k], PROBED)
        order = sorted(order, key=lambda k: (walks[k].figure, k))[: max(FINISHED, len(order) // 2)]
    return [(k, polishers[k].finish(walks[k])) for k in order]
