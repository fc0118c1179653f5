"""The best mix of one support: a linear programme on a few temperatures, and node exchange.

A mix is solved on a few temperatures, its violating extremes are added, and so on until what the
mix reaches and what the duals prove agree. Every dual vector is kept: it bounds other supports too.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.minimax import solve_fractional
from tcplan.mixes import area_of, share_vertices, simplex_vertices
from tcplan.search.columns import Programme, Rows
from tcplan.search.spread_columns import SpreadProgramme

RELATIVE, ABSOLUTE = 1e-7, 1e-13
EXCHANGES = 25
VANISHED = 1e-10
TANGENTS = 40
FITS = 1.0 + 1e-9


@dataclass(frozen=True, slots=True)
class Mix:
    """Shares (fixed group last), the figure that they reach, and a bound for their support."""

    shares: FloatArray
    figure: float
    lower: float

    @property
    def used(self) -> frozenset[int]:
        """Positions of the chosen materials that carry a share."""
        return frozenset(int(i) for i in np.nonzero(self.shares[:-1] > VANISHED)[0])


def closed(upper: float, lower: float) -> bool:
    """Whether a figure and its bound agree; never while no figure is known."""
    return upper < np.inf and upper - lower <= max(ABSOLUTE, RELATIVE * abs(upper))


@dataclass(slots=True)
class Solver:
    """One space: its rows so far, and the bank of dual vectors.

    The programme is that of nominal materials, or that of the worst device.
    """

    programme: Programme | SpreadProgramme
    nodes: Rows = field(init=False)
    shared: int = field(init=False)
    bank: list[FloatArray] = field(default_factory=list)
    tangents: dict[tuple[int, ...], list[tuple[float, ...]]] = field(default_factory=dict)
    centre_limit: float = 0.0

    def __post_init__(self) -> None:
        self.nodes = self.programme.start_rows()
        self.shared = len(self.nodes.temperature)
        if self.programme.need.centred:
            self.centre_limit = self._least_single()

    @property
    def count(self) -> int:
        """Number of chosen materials that are on offer."""
        return len(self.programme.names)

    def _least_single(self) -> float:
        """Return a bound on |centre| of anything that beats the best single material.

        The drift is 0 at the reference, so a centre further off than the half-band is beaten.
        """
        space = self.programme.space
        figures = [
            self.programme.reach(vertex)[0]
            for i in range(self.count)
            for vertex in simplex_vertices(space, [i], least_share=False)
        ]
        weight = next(p.weight for p in self.programme.need.pieces if p.centred)
        # A single material may be too large or too small to be made: then any of them may be best.
        sized = space.sizes is not None and space.sizes.bounded
        return 1.001 * weight * (max(figures) if sized else min(figures))

    # --- one support --------------------------------------------------------------------------

    def solve(self, support: tuple[int, ...], *, enough: float = np.inf, relaxed: bool = False) -> Mix | None:
        """Return the best mix of a support, or None when its shares cannot sum to 1.

        Stops early once the proved bound is above ``enough``; ``relaxed`` leaves out the least
        share.
        """
        space = self.programme.space
        if relaxed:
            return self._solved(simplex_vertices(space, support, least_share=False).T, enough)
        tangents = self.tangents.setdefault(support, [])
        for _ in range(TANGENTS):
            weights = share_vertices(space, support, tangents).T
            mix = self._solved(weights, enough) if weights.shape[1] else None
            most = space.sizes.max_area if space.sizes else np.inf
            if mix is None or space.arrangement != "parallel" or area_of(space, mix.shares) <= most * FITS:
                return mix
            tangents.append(tuple(float(mix.shares[i]) for i in support))
        return mix

    def _solved(self, weights: FloatArray, enough: float) -> Mix:
        """Return the best mix of these vertices of the shares."""
        x = weights.mean(axis=1)
        best = Mix(x, float("inf"), 0.0)
        mine = np.arange(self.shared)  # these rows are used for every support
        for _ in range(EXCHANGES):
            rows = self.nodes.take(mine)
            x, dual = self._mix_on(rows, weights, x)
            y = np.zeros(len(self.nodes.temperature))
            y[mine] = dual
            self.bank.append(y)
            lower = max(best.lower, self.bound_of(weights, [y]))
            figure, peaks = self.programme.reach(x)
            if figure < best.figure:
                best = Mix(x, figure, lower)
            best = replace(best, lower=lower)
            if closed(best.figure, lower) or lower > enough:
                break
            known = len(self.nodes.temperature)
            fresh = self._new_rows(peaks, rows)
            if not len(fresh.temperature):
                break
            self.nodes = self.nodes.joined(fresh)
            mine = np.r_[mine, np.arange(known, len(self.nodes.temperature))]
        if self.programme.need.centred and self.programme.space.arrangement == "parallel":
            best = replace(best, lower=self._close_centre(weights, best, mine))
        return best

    def _new_rows(self, peaks: Rows, rows: Rows) -> Rows:
        """Return the peaks that are not among the rows already."""
        near = np.abs(peaks.temperature[:, None] - rows.temperature[None, :]) < 1e-7
        same = near & (peaks.piece[:, None] == rows.piece[None, :])
        same &= peaks.side[:, None] == rows.side[None, :]
        same &= (peaks.factors[:, None, :] == rows.factors[None, :, :]).all(axis=2)
        return peaks.take(np.nonzero(~same.any(axis=1))[0])

    def _mix_on(self, rows: Rows, weights: FloatArray, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return shares and signed duals of the programme on some rows.

        In parallel the product of centre and shares is not linear: it is linearised about the
        last mix, and three rounds leave nothing, since the centre is a small fraction of 1.
        """
        n, d = rows.n @ weights, rows.d @ weights
        rounds = 3 if self.centre_limit and self.programme.space.arrangement == "parallel" else 1
        for _ in range(rounds):
            shift = self.centre_limit * (rows.b @ x)[:, None]
            sides = [n - shift, n + shift] if self.centre_limit else [n]
            if rows.side.any():  # rows of one device bind on their own side
                answer = solve_fractional(n, d)
            else:
                numerator = np.hstack([np.vstack([side, -side]) for side in sides])
                denominator = np.hstack([np.vstack([d, d])] * len(sides))
                answer = solve_fractional(numerator, denominator)
            mix = answer.mix.reshape(len(sides), -1).sum(axis=0)
            x = weights @ mix
        if rows.side.any():
            return x, answer.rows
        up, down = np.split(answer.rows, 2)
        return x, up - down

    def bound_of(self, weights: FloatArray, duals: list[FloatArray]) -> float:
        """Return what the duals prove for a support: the least over the centre of the best of them."""
        lines = [self._line(y, weights) for y in duals]
        if not self.centre_limit:
            return max(float(np.min(n / d)) for n, _, d in lines)
        return least_over_centre(lines, self.centre_limit)[0]

    def _line(self, y: FloatArray, weights: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return y n, y b, |y| d by vertex; the bound at centre c is min (yn - c yb)/(|y|d)."""
        rows = self.nodes
        k = len(y)
        d = np.abs(y) @ rows.d[:k] @ weights
        return y @ rows.n[:k] @ weights, y @ rows.b[:k] @ weights, np.maximum(d, 1e-300)

    def _close_centre(self, weights: FloatArray, best: Mix, mine: IntArray) -> float:
        """Add duals at fixed centres until the bound over all centres meets the figure."""
        rows = self.nodes.take(mine)
        duals = [np.pad(y, (0, len(self.nodes.temperature) - len(y))) for y in self.bank[-3:]]
        for _ in range(80):
            lower, where = least_over_centre([self._line(y, weights) for y in duals], self.centre_limit)
            if closed(best.figure, lower):
                break
            n = (rows.n - where * rows.b) @ weights
            d = rows.d @ weights
            answer = solve_fractional(np.vstack([n, -n]), np.vstack([d, d]))
            up, down = np.split(answer.rows, 2)
            y = np.zeros(len(self.nodes.temperature))
            y[mine] = up - down
            duals.append(y)
            self.bank.append(y)
        return max(best.lower, lower)


def least_over_centre(
    lines: list[tuple[FloatArray, FloatArray, FloatArray]], limit: float
) -> tuple[float, float]:
    """Return the least over |c| <= limit of the best proved bound, and the centre where it lies.

    Every line is concave in c (a minimum of affine functions), so on a cell it is at least the
    lesser of its ends; cells are halved where that leaves the bound loose.
    """
    n, b, d = (np.stack([line[k] for line in lines]) for k in range(3))

    def at(c: float) -> FloatArray:
        return np.asarray(np.min((n - c * b) / d, axis=1))

    cells = [(-limit, limit, at(-limit), at(limit))]
    for _ in range(200):
        bounds = [float(np.max(np.minimum(left, right))) for _, _, left, right in cells]
        worst = int(np.argmin(bounds))
        low, high, left, right = cells[worst]
        middle = 0.5 * (low + high)
        here = at(middle)
        if float(np.max(here)) - bounds[worst] <= 1e-9 * abs(bounds[worst]) + 1e-16:
            return max(0.0, bounds[worst]), middle
        cells[worst : worst + 1] = [(low, middle, left, here), (middle, high, here, right)]
    return max(0.0, min(bounds)), middle
