"""Exact series and parallel mixes: linear programmes with node exchange, and their supports.

A mix of a support is solved on a few temperatures, its violating extremes are added, and so on
until what the mix reaches and what the duals prove agree. Supports (which materials, at most how
many, each with its least share) are pruned by the bank of all duals found so far, best bound
first, so that the optimum over all supports is exact and proved.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from itertools import combinations
from math import comb

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.network import Leg, Network, Parallel, Series, value
from tcplan.plan import Certificate, Proposal, Space
from tcplan.search.columns import GRID, START, Programme, Rows, fixed_group, vertex_weights
from tcplan.search.minimax import solve_fractional

RELATIVE, ABSOLUTE = 1e-7, 1e-13
EXCHANGES = 25
MOST_SUPPORTS = 300_000
MOST_SOLVES = 400
VANISHED = 1e-10


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
    """Whether a figure and its bound agree."""
    return upper - lower <= max(ABSOLUTE, RELATIVE * abs(upper))


@dataclass(slots=True)
class Solver:
    """One space: its rows so far, and the bank of dual vectors."""

    programme: Programme
    nodes: Rows = field(init=False)
    grid: Rows = field(init=False)
    bank: list[FloatArray] = field(default_factory=list)
    centre_limit: float = 0.0

    def __post_init__(self) -> None:
        self.nodes = self.programme.spread_rows(START, chebyshev=True)
        self.grid = self.programme.spread_rows(GRID, chebyshev=False)
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
        figures = []
        space = self.programme.space
        for i in range(self.count):
            for vertex in vertex_weights(replace(space, min_share=0.0), [i], self.count).T:
                figures.append(self.reach(vertex)[0])
        weight = next(p.weight for p in self.programme.need.pieces if p.centred)
        return 1.001 * weight * min(figures)

    # --- what a mix reaches -------------------------------------------------------------------

    def centre(self, x: FloatArray, rows: Rows) -> float:
        """Return the centre that suits shares x best on these rows."""
        banded = rows.b[:, -1] > 0
        if not banded.any():
            return 0.0
        drift = (rows.n[banded] @ x) / (rows.b[banded] @ x)
        return float(0.5 * (drift.max() + drift.min()))

    def reach(self, x: FloatArray) -> tuple[float, Rows]:
        """Return the figure of shares x over the continuous range, and the rows that set it."""
        peaks = self._refined(x, self._grid_peaks(x))
        all_rows = self.grid.joined(peaks)
        centre = self.centre(x, all_rows)
        figure = float(np.max(np.abs(all_rows.figures(x, centre))))
        return figure, peaks

    def _grid_peaks(self, x: FloatArray) -> FloatArray:
        """Return positions on the grid of the local extremes of the drift, ends included."""
        drift, piece = self.grid.figures(x, 0.0), self.grid.piece
        padded = np.r_[np.nan, drift, np.nan]
        edge = np.r_[True, piece[1:] != piece[:-1], True]
        left, right = padded[:-2].copy(), padded[2:].copy()
        left[edge[:-1]], right[edge[1:]] = np.nan, np.nan
        high = ~((left > drift) | (right > drift))
        low = ~((left < drift) | (right < drift))
        return np.nonzero(high | low)[0]

    def _refined(self, x: FloatArray, at: FloatArray) -> Rows:
        """Return rows at extremes refined by two steps of parabolic interpolation."""
        piece, t = self.grid.piece[at], self.grid.temperature[at].copy()
        low = np.array([p.low for p in self.programme.need.pieces])[piece]
        high = np.array([p.high for p in self.programme.need.pieces])[piece]
        step = (high - low) / (GRID - 1)
        inside = (t > low) & (t < high)
        t[~inside & (t <= low)] = low[~inside & (t <= low)]
        piece, t, step = piece[inside], t[inside], step[inside]
        ends = self.grid.take(at[~inside])
        for shrink in (1.0, 0.05):
            h = step * shrink
            if not len(t):
                break
            rows = self.programme.rows(np.tile(piece, 3), np.concatenate([t - h, t, t + h]))
            f0, f1, f2 = np.split(rows.figures(x, 0.0), 3)
            bend = f0 - 2 * f1 + f2
            move = np.where(np.abs(bend) > 1e-18, 0.5 * (f0 - f2) / np.where(bend == 0, 1.0, bend), 0.0)
            t = t + h * np.clip(move, -1.0, 1.0)
        t = np.clip(t, low[inside], high[inside])
        return ends.joined(self.programme.rows(piece, t))

    # --- one support --------------------------------------------------------------------------

    def solve(
        self, support: tuple[int, ...], *, enough: float = np.inf, relaxed: bool = False
    ) -> Mix | None:
        """Return the best mix of a support, or None when its shares cannot sum to 1.

        Stops early once the proved bound is above ``enough``; ``relaxed`` leaves out the least
        share.
        """
        space = self.programme.space
        weights = vertex_weights(replace(space, min_share=0.0) if relaxed else space, support, self.count)
        if not weights.shape[1]:
            return None
        x = weights.mean(axis=1)
        best = Mix(x, float("inf"), 0.0)
        mine = np.arange(len(self.nodes.temperature))
        mine = mine[: self._shared_count()]
        for _ in range(EXCHANGES):
            rows = self.nodes.take(mine)
            x, dual = self._mix_on(rows, weights, x)
            y = np.zeros(len(self.nodes.temperature))
            y[mine] = dual
            self.bank.append(y)
            lower = max(best.lower, self.bound_of(weights, [y]))
            figure, peaks = self.reach(x)
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

    def _shared_count(self) -> int:
        """Return how many of the first rows every support uses."""
        return sum(1 if p.low == p.high else START for p in self.programme.need.pieces)

    def _new_rows(self, peaks: Rows, rows: Rows) -> Rows:
        """Return the peaks that are not among the rows already."""
        near = np.abs(peaks.temperature[:, None] - rows.temperature[None, :]) < 1e-7
        same = near & (peaks.piece[:, None] == rows.piece[None, :])
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
            numerator = np.hstack([np.vstack([side, -side]) for side in sides])
            denominator = np.hstack([np.vstack([d, d])] * len(sides))
            answer = solve_fractional(numerator, denominator)
            mix = answer.mix.reshape(len(sides), -1).sum(axis=0)
            x = weights @ mix
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

    def _close_centre(self, weights: FloatArray, best: Mix, mine: FloatArray) -> float:
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


# --- all supports ---------------------------------------------------------------------------------


def _all_supports(space: Space, count: int) -> list[FloatArray]:
    """Return the supports to be searched, one array (supports, size) a size.

    Without a least share a larger support holds the smaller ones, so one size is enough.
    """
    most = min(space.most, count)
    sizes = range(1, most + 1) if space.min_share > 0 else [most]
    return [np.array(list(combinations(range(count), k))) for k in sizes]


def _bank_bounds(solver: Solver, y: FloatArray, supports: FloatArray) -> FloatArray:
    """Return what one dual vector proves for every support of one size, shape (supports,)."""
    space = solver.programme.space
    size = supports.shape[1]
    n, b, d = solver._line(y, np.eye(solver.count + 1))
    lowest = np.full(len(supports), np.inf)
    centres = (-solver.centre_limit, solver.centre_limit) if solver.centre_limit else (0.0,)
    for u in set(space.fixed_share):
        rest = 1.0 - u - size * space.min_share
        if rest < -1e-12:
            continue
        for c in centres:
            top = n - c * b
            whole = space.min_share * top[supports].sum(axis=1)[:, None] + rest * top[supports] + u * top[-1]
            under = space.min_share * d[supports].sum(axis=1)[:, None] + rest * d[supports] + u * d[-1]
            lowest = np.minimum(lowest, (whole / under).min(axis=1))
    return lowest


def best_mixes(solver: Solver, few: int) -> tuple[list[Mix], bool]:
    """Return the best ``few`` mixes of distinct materials, best first; and whether all supports
    were covered."""
    space = solver.programme.space
    most = min(space.most, solver.count)
    start = solver.solve(tuple(range(solver.count)), relaxed=True)
    if comb(solver.count, most) > MOST_SUPPORTS:
        return _trimmed(solver, start, few), False
    groups = _all_supports(space, solver.count)
    bounds = [np.zeros(len(group)) for group in groups]
    seen = 0
    found: dict[frozenset[int], Mix] = {}
    if start is not None and len(start.used) <= most and space.min_share == 0:
        found[start.used] = start
    for _ in range(MOST_SOLVES):
        for y in solver.bank[seen:]:
            for group, bound in zip(groups, bounds, strict=True):
                np.maximum(bound, _bank_bounds(solver, y, group), out=bound)
        seen = len(solver.bank)
        which = min(range(len(groups)), key=lambda g: bounds[g].min())
        at = int(np.argmin(bounds[which]))
        ranked = sorted(mix.figure for mix in found.values())
        worst_kept = ranked[few - 1] if len(ranked) >= few else np.inf
        if bounds[which][at] >= worst_kept or not np.isfinite(bounds[which][at]):
            break
        mix = solver.solve(tuple(int(i) for i in groups[which][at]), enough=worst_kept)
        bounds[which][at] = np.inf
        if mix is not None and (mix.used not in found or mix.figure < found[mix.used].figure):
            found[mix.used] = mix
    return sorted(found.values(), key=lambda mix: mix.figure)[:few], True


def _trimmed(solver: Solver, start: Mix | None, few: int) -> list[Mix]:
    """Return mixes of the largest shares of the whole programme: too many supports for all."""
    most = min(solver.programme.space.most, solver.count)
    if start is None:
        return []
    order = [int(i) for i in np.argsort(-start.shares[:-1])]
    picks = {tuple(sorted(order[:most]))}
    picks |= {
        tuple(sorted([*order[: most - 1], other])) for other in order[most : most + 8]
    }
    mixes = [mix for pick in sorted(picks) if (mix := solver.solve(pick)) is not None]
    return sorted(mixes, key=lambda mix: mix.figure)[:few]


# --- from shares to proposals ------------------------------------------------------------------


def network_of(programme: Programme, shares: FloatArray, ohms: float | None) -> Network:
    """Return the network that has these shares; the fixed members keep their own values.

    ``ohms`` is the total; None when the share of the fixed members sets it.
    """
    space = programme.space
    parallel = space.arrangement == "parallel"
    group = fixed_group(space)
    if group is not None:
        own, u = value(group), float(shares[-1])
        ohms = own * u if parallel else own / u
    if ohms is None:
        raise ValueError("a total is needed when nothing is fixed")
    chosen = [
        Leg(material=name, ohms=float(ohms / share if parallel else ohms * share))
        for share, name in sorted(
            ((share, name) for share, name in zip(shares[:-1], programme.names, strict=True)),
            key=lambda pair: (-pair[0], pair[1]),
        )
        if share > VANISHED
    ]
    members = (*space.fixed, *chosen)
    if len(members) == 1:
        return members[0]
    return Parallel(members) if parallel else Series(members)


def certificate(solver: Solver) -> Certificate:
    """Return the bank of duals as evidence."""
    rows = solver.nodes
    size = len(rows.temperature)
    nodes = tuple((int(p), float(t)) for p, t in zip(rows.piece, rows.temperature, strict=True))
    weights = tuple(tuple(np.pad(y, (0, size - len(y))).tolist()) for y in solver.bank)
    return Certificate(nodes=nodes, weights=weights)


def search_space(
    space: Space, need: Requirement, materials: Mapping[str, Material], ohms: float | None, few: int = 3
) -> tuple[Proposal, ...]:
    """Return the best few networks of a space, best first, with the evidence for all of them.

    Parameters
    ----------
    space : Space
    need : Requirement
    materials : mapping of name to Material
    ohms : float or None
        The total [ohm]; None when fixed members and their share set it.
    few : int
        How many are wanted.
    """
    solver = Solver(Programme(space, need, materials, tuple(sorted(space.materials))))
    mixes, complete = best_mixes(solver, few)
    covered = space if complete else replace(space, most=len(space.materials), min_share=0.0)
    evidence = certificate(solver)
    return tuple(
        Proposal(
            network=network_of(solver.programme, mix.shares, ohms), space=covered, certificate=evidence
        )
        for mix in mixes
    )


def least_total(
    space: Space, need: Requirement, materials: Mapping[str, Material], limit: float
) -> Proposal | None:
    """Return the network in which the fixed members hold the largest share within ``limit``.

    In series that is the least total, in parallel the greatest. The least figure over shares
    of at least u never falls as u rises, so u is found by bisection. None when no share does.
    """
    low, high = space.fixed_share

    def best(u: float) -> tuple[Solver, Mix | None]:
        tight = replace(space, fixed_share=(u, high))
        solver = Solver(Programme(tight, need, materials, tuple(sorted(space.materials))))
        mixes, _ = best_mixes(solver, 1)
        return solver, (mixes[0] if mixes else None)

    solver, mix = best(low)
    if mix is None or mix.figure > limit:
        return None
    fits, above = (solver, mix), high
    last_low, last_above = mix.figure - limit, None
    for step in range(60):
        if above - low <= 1e-9 * above:
            break
        guess = 0.5 * (low + above)
        if last_above is not None and step % 3:  # two secant steps, then a halving
            guess = low - last_low * (above - low) / (last_above - last_low)
            guess = min(max(guess, low + 1e-10 * above), above - 1e-10 * above)
        solver, mix = best(guess)
        if mix is not None and mix.figure <= limit:
            fits, low, last_low = (solver, mix), guess, mix.figure - limit
        else:
            above, last_above = guess, (mix.figure - limit if mix else None)
    solver, mix = fits
    return Proposal(
        network=network_of(solver.programme, mix.shares, None),
        space=solver.programme.space,
        certificate=certificate(solver),
        role="least total" if space.arrangement == "series" else "greatest total",
    )
