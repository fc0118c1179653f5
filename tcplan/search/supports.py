"""Which materials: the best mixes over all supports, pruned by the bank of duals, exact and proved.

A support is a set of materials, at most so many, each with its least share. The best bound is
solved first; every solve adds duals that rule out others, so few of the supports are ever solved.
"""

from __future__ import annotations

from dataclasses import replace
from math import comb

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.mixes import all_supports, fixed_ends, share_vertices
from tcplan.search.solver import Mix, Solver, closed

MOST_SUPPORTS = 80_000
MOST_SOLVES = 400
RECENT = 60  # dual vectors that are tried on a support before it is solved


def _bank_bounds(solver: Solver, y: FloatArray, supports: IntArray) -> FloatArray:
    """Return what one dual vector proves for every support of one size, shape (supports,)."""
    space = solver.programme.space
    size = supports.shape[1]
    n, b, d = solver._line(y, np.eye(solver.count + 1))
    lowest = np.full(len(supports), np.inf)
    centres = (-solver.centre_limit, solver.centre_limit) if solver.centre_limit else (0.0,)
    for u in fixed_ends(space, size * space.min_share):
        rest = 1.0 - u - size * space.min_share
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
        return _grown(solver, few), False
    groups = [np.array(group) for group in all_supports(space)]
    bounds = [np.zeros(len(group)) for group in groups]
    seen = 0
    found: dict[frozenset[int], Mix] = {}
    sized = space.sizes is not None and space.sizes.bounded
    if start is not None and len(start.used) <= most and space.min_share == 0 and not sized:
        found[start.used] = start
    solves = 0
    while solves < MOST_SOLVES:
        for y in solver.bank[seen:]:
            for group, bound in zip(groups, bounds, strict=True):
                np.maximum(bound, _bank_bounds(solver, y, group), out=bound)
        seen = len(solver.bank)
        which = min(range(len(groups)), key=lambda g: bounds[g].min())
        at = int(np.argmin(bounds[which]))
        ranked = sorted(mix.figure for mix in found.values())
        worst_kept = ranked[few - 1] if len(ranked) >= few else np.inf
        lowest = float(bounds[which][at])
        if not np.isfinite(lowest) or lowest >= worst_kept or closed(worst_kept, lowest):
            break
        support = tuple(int(i) for i in groups[which][at])
        if sized and _ruled_out(solver, support, worst_kept):
            bounds[which][at] = np.inf
            continue
        solves += 1
        mix = solver.solve(support, enough=worst_kept)
        bounds[which][at] = np.inf
        if mix is not None and (mix.used not in found or mix.figure < found[mix.used].figure):
            found[mix.used] = mix
    return sorted(found.values(), key=lambda mix: mix.figure)[:few], True


def _ruled_out(solver: Solver, support: tuple[int, ...], worst_kept: float) -> bool:
    """Whether a support can not be made, or the bank proves that it is not among the best."""
    weights = share_vertices(solver.programme.space, support).T
    return not weights.shape[1] or (
        bool(solver.bank) and solver.bound_of(weights, solver.bank[-RECENT:]) >= worst_kept
    )


def _grown(solver: Solver, few: int) -> list[Mix]:
    """Return good mixes where the supports are too many for all: grown from the best pairs.

    All pairs are searched exactly when they are not too many themselves (else those of the materials
    that the unlimited optimum uses), and the best supports take in one more material at a time, the
    best of all that are on offer.
    """
    space = solver.programme.space
    most = min(space.most, solver.count)
    pairs = Solver(replace(solver.programme, space=replace(space, most=min(2, most))))
    if comb(solver.count, min(2, most)) <= MOST_SUPPORTS:
        best, _ = best_mixes(pairs, few)
    else:
        start = pairs.solve(tuple(range(solver.count)), relaxed=True)
        used = sorted(start.used) if start is not None else []
        found = [pairs.solve(tuple(sorted({i, j}))) for i in used for j in range(solver.count) if i != j]
        best = sorted((mix for mix in found if mix is not None), key=lambda mix: mix.figure)[:few]
    for size in range(3, most + 1):
        wider: dict[tuple[int, ...], Mix] = {}
        for mix in best:
            for other in range(solver.count):
                support = tuple(sorted({*mix.used, other}))
                if len(support) <= size and support not in wider:
                    taken = solver.solve(support, enough=best[0].figure)
                    if taken is not None:
                        wider[support] = taken
        best = sorted([*best, *wider.values()], key=lambda mix: mix.figure)[:few]
    distinct: dict[frozenset[int], Mix] = {}
    for mix in best:
        distinct.setdefault(mix.used, mix)
    return list(distinct.values())
