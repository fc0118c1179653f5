"""Games against scipy's HiGHS, and the certificate against any mix at all."""

import numpy as np
import pytest
from scipy.optimize import linprog

from tcplan.minimax import solve_fractional, solve_game


def highs_value(payoff):
    rows, columns = payoff.shape
    result = linprog(
        np.r_[np.zeros(columns), 1.0],
        A_ub=np.c_[payoff, -np.ones(rows)],
        b_ub=np.zeros(rows),
        A_eq=np.r_[np.ones(columns), 0.0][None, :],
        b_eq=[1.0],
        bounds=[(0, None)] * columns + [(None, None)],
    )
    return result.fun


@pytest.mark.parametrize("seed", range(12))
@pytest.mark.parametrize("shape", [(1, 1), (2, 3), (26, 2), (40, 12), (60, 40)])
def test_game_matches_highs_and_is_certified(seed, shape):
    payoff = np.random.default_rng(seed).normal(size=shape)
    game = solve_game(payoff)
    assert game.upper - game.lower <= 1e-11
    assert game.upper == pytest.approx(highs_value(payoff), abs=1e-9)
    assert game.mix.sum() == pytest.approx(1.0)
    assert np.max(payoff @ game.mix) == game.upper


def test_game_of_equal_and_degenerate_rows_ends():
    payoff = np.ones((30, 20))
    payoff[::2] = -1.0
    game = solve_game(payoff)
    assert (game.upper, game.lower) == (1.0, 1.0)


def test_rows_prove_a_bound_that_no_random_mix_beats():
    rng = np.random.default_rng(5)
    payoff = rng.normal(size=(30, 8))
    game = solve_game(payoff)
    mixes = rng.dirichlet(np.ones(8), size=4000)
    assert np.min(np.max(payoff @ mixes.T, axis=0)) >= game.lower


@pytest.mark.parametrize("seed", range(8))
def test_fractional_value_is_where_the_game_vanishes(seed):
    rng = np.random.default_rng(seed)
    numerator = rng.normal(size=(24, 6))
    denominator = rng.uniform(0.5, 2.0, size=(24, 6))
    answer = solve_fractional(numerator, denominator)
    assert answer.upper - answer.lower <= 1e-10
    # Definition of the optimum (Dinkelbach 1967): the game N - e D has value zero there.
    assert highs_value(numerator - answer.upper * denominator) == pytest.approx(0.0, abs=1e-9)
