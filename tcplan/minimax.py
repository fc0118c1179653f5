"""Games: the least worst row of a mix of columns, with a bound that any row weights prove.

A mix is v >= 0 with sum v = 1. ``solve_game`` finds min over v of max over k of (P v)_k;
``solve_fractional`` the same for (N v)_k / (D v)_k with D v > 0. The dense simplex is trusted for
nothing: what it returns is evaluated (the mix from above, the row weights from below), and where
the two do not meet, HiGHS solves the game again.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray

CLOSED = 1e-12
MAX_PIVOTS = 2000


@dataclass(frozen=True, slots=True)
class Game:
    """A mix of columns, row weights (sum 1), and the values they prove from above and below."""

    mix: FloatArray
    rows: FloatArray
    upper: float
    lower: float


def _evaluated(payoff: FloatArray, mix: FloatArray, rows: FloatArray) -> Game:
    mix, rows = np.maximum(mix, 0.0), np.maximum(rows, 0.0)
    if mix.sum() <= 0 or rows.sum() <= 0:
        return _uniform(payoff)
    mix, rows = mix / mix.sum(), rows / rows.sum()
    return Game(mix, rows, float(np.max(payoff @ mix)), float(np.min(rows @ payoff)))


def _pivoted(payoff: FloatArray) -> Game | None:
    """Solve by the simplex method on the game made positive; None when it does not end.

    max sum x subject to B x <= 1, x >= 0 has a feasible start in its slacks, so there is no first
    phase; the value is 1/sum x. After many pivots the first improving column enters (Bland's rule,
    which cannot cycle) in place of the steepest.
    """
    rows, columns = payoff.shape
    largest = float(np.max(np.abs(payoff))) or 1.0
    table = np.zeros((rows + 1, columns + 1))
    table[:rows, :columns] = payoff / largest + 2.0
    table[:rows, columns] = 1.0
    table[rows, :columns] = -1.0
    basic = np.arange(columns, columns + rows)
    free = np.arange(columns)
    for pivots in range(MAX_PIVOTS):
        column = _entering(table[rows, :columns], first=pivots > MAX_PIVOTS // 4)
        if column is None:
            return _read(payoff, basic, free)
        entries = table[:rows, column]
        possible = entries > 1e-12
        if not possible.any():
            return None
        steps = np.where(possible, table[:rows, columns] / np.where(possible, entries, 1.0), np.inf)
        row = int(np.argmin(steps))
        _pivot(table, row, column)
        basic[row], free[column] = free[column], basic[row]
    return None


def _entering(costs: FloatArray, *, first: bool) -> int | None:
    improving = costs < -1e-14
    if not improving.any():
        return None
    return int(np.argmax(improving)) if first else int(np.argmin(costs))


def _pivot(table: FloatArray, row: int, column: int) -> None:
    """Exchange a basic and a free variable in the compact table, in place."""
    pivot = table[row, column]
    pivot_row = table[row] / pivot
    pivot_column = table[:, column].copy()
    table -= np.outer(pivot_column, pivot_row)
    table[row] = pivot_row
    table[:, column] = -pivot_column / pivot
    table[row, column] = 1.0 / pivot


def _read(payoff: FloatArray, basic: IntArray, free: IntArray) -> Game:
    """Return the game of the last basis, solved anew: the table has gathered rounding by then.

    As many columns are basic as rows are tight: on these the mix makes all rows equal, and the row
    weights all columns.
    """
    rows, columns = payoff.shape
    used, tight = np.sort(basic[basic < columns]), np.sort(free[free >= columns]) - columns
    size = len(used)
    border = np.zeros((size + 1, size + 1))
    border[:size, :size] = payoff[np.ix_(tight, used)]
    border[:size, size] = -1.0
    border[size, :size] = 1.0
    unit = np.zeros(size + 1)
    unit[size] = 1.0
    mix, weights = np.zeros(columns), np.zeros(rows)
    try:
        mix[used] = np.linalg.solve(border, unit)[:size]
        border[:size, :size] = border[:size, :size].T.copy()
        weights[tight] = np.linalg.solve(border, unit)[:size]
    except np.linalg.LinAlgError:
        return _uniform(payoff)
    return _evaluated(payoff, mix, weights)


def _uniform(payoff: FloatArray) -> Game:
    rows, columns = payoff.shape
    return _evaluated(payoff, np.ones(columns), np.ones(rows))


def _by_highs(payoff: FloatArray) -> Game:
    """Solve with scipy's HiGHS: slower a call, and the second opinion when the simplex is loose."""
    from scipy.optimize import linprog

    rows, columns = payoff.shape
    scale = float(np.max(np.abs(payoff))) or 1.0
    result = linprog(
        np.r_[np.zeros(columns), 1.0],
        A_ub=np.c_[payoff / scale, -np.ones(rows)],
        b_ub=np.zeros(rows),
        A_eq=np.r_[np.ones(columns), 0.0][None, :],
        b_eq=[1.0],
        bounds=[(0, None)] * columns + [(None, None)],
        method="highs-ds",
    )
    if result.x is None:
        return _uniform(payoff)
    weights = -np.asarray(result.ineqlin.marginals)
    return _evaluated(payoff, result.x[:columns], weights if weights.sum() > 0 else np.ones(rows))


def solve_game(payoff: FloatArray) -> Game:
    """Return the least worst row over all mixes of the columns.

    Parameters
    ----------
    payoff : array, shape (rows, columns)

    Returns
    -------
    Game
        ``lower <= value <= upper``, both evaluated, equal to rounding when the solve closed.
    """
    if payoff.shape[1] == 1:
        weights = np.zeros(payoff.shape[0])
        weights[int(np.argmax(payoff[:, 0]))] = 1.0
        return _evaluated(payoff, np.ones(1), weights)
    game = _pivoted(payoff)
    scale = float(np.max(np.abs(payoff)))
    if game is not None and game.upper - game.lower <= CLOSED * max(scale, 1e-2):
        return game
    other = _by_highs(payoff)
    if game is None or other.upper - other.lower < game.upper - game.lower:
        return other
    return game


@dataclass(frozen=True, slots=True)
class Fractional:
    """A mix, the ratio it reaches, row weights, and the bound that they prove."""

    mix: FloatArray
    rows: FloatArray
    upper: float
    lower: float


def fractional_bound(rows: FloatArray, numerator: FloatArray, denominator: FloatArray) -> float:
    """Return min over columns of (rows N)/(rows D): no mix has a lower worst ratio."""
    return float(np.min((rows @ numerator) / (rows @ denominator)))


def solve_fractional(numerator: FloatArray, denominator: FloatArray) -> Fractional:
    """Return the mix with the least max over k of (N v)_k / (D v)_k.

    Parameters
    ----------
    numerator, denominator : array, shape (rows, columns)
        ``denominator`` above zero everywhere.

    Notes
    -----
    Dinkelbach's iteration: at the ratio e of the current mix solve the game N - e D; its value is
    never above zero, and zero means that e is optimal. The steps fall superlinearly.
    """
    spread = float(np.max(np.ptp(denominator, axis=1)))
    start = solve_game(numerator / denominator)
    mix, rows = start.mix, start.rows
    upper = float(np.max((numerator @ mix) / (denominator @ mix)))
    lower = fractional_bound(rows, numerator, denominator)
    for _ in range(0 if spread == 0.0 and np.ptp(denominator) == 0.0 else 40):
        if upper - lower <= 1e-13 + 1e-12 * abs(upper):
            break
        game = solve_game(numerator - upper * denominator)
        bound = fractional_bound(game.rows, numerator, denominator)
        if bound > lower:
            rows, lower = game.rows, bound
        reached = float(np.max((numerator @ game.mix) / (denominator @ game.mix)))
        if reached >= upper * (1 - 1e-15):
            break
        mix, upper = game.mix, reached
    return Fractional(mix, rows, upper, lower)
