"""Which materials: the best mixes over all supports, pruned by the bank of duals, exact and proved.

A support is a set of materials, at most so many, each with its least share. The best bound is
solved first; every solve adds duals that rule out others, so few of the supports are ever solved.
"""

from __future__ import annotations

from itertools import combinations
from math import comb

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.plan import Space
from tcplan.search.solver import Mix, Solver

MOST_SUPPORTS = 300_000
MOST_SOLVES = 400


def _all_supports(space: Space, count: int) -> list[IntArray]:
    """Return the supports to be searched, one array (supports, size) a size.

    Without a least share a larger support holds the smaller ones, so one size is enough.
    """
    most = min(space.most, count)
    sizes = range(1, most + 1) if space.min_share > 0 else [most]
    return [np.array(list(combinations(range(count), k))) for k in sizes]


def _bank_bounds(solver: Solver, y: FloatArray, supports: IntArray) -> FloatArray:
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
    """Return the best mixes of distinct materials, best first, and whether all supports were covered."""
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
    picks |= {tuple(sorted([*order[: most - 1], other])) for other in order[most : most + 8]}
    mixes = [mix for pick in sorted(picks) if (mix := solver.solve(pick)) is not None]
    return sorted(mixes, key=lambda mix: mix.figure)[:few]
