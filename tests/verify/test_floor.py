"""The floor: below every network that can be built, and equal to the optimum where that is known."""

from dataclasses import replace

import numpy as np
import pytest
from makers import brute_ratio, by_name, film, grid, leg, need_of, over, random_films, random_tree

from tcplan.goal import Limit
from tcplan.material.law import Thermistor
from tcplan.material.model import Material
from tcplan.network import Parallel, Series
from tcplan.plan import Space
from tcplan.search.floor import floor_evidence
from tcplan.search.linear import search_space
from tcplan.verify.floor import floor, least_slope_integral, slope_bound, spread_bound
from tcplan.verify.option import Case, nominal_figure
from tcplan.worst.evaluation import worst_case


def floor_of(films, need=None, figure=1.0, spreads=None):
    need = need or need_of()
    space = Space(arrangement="series", materials=tuple(films), most=len(films), min_share=0.0)
    return floor(floor_evidence(space, need, films, figure), need, films, spreads, figure)


def test_films_of_falling_curvature():
    """Independent prototype: TC1 300 -250 120 -80, TC2 -.8 -.5 -.4 -.6: sandwich 3457.4 = the
    series optimum."""
    rows = ((300, -0.8), (-250, -0.5), (120, -0.4), (-80, -0.6))
    films = by_name(*(film(f"f{k}", a, b) for k, (a, b) in enumerate(rows)))
    need = need_of()
    space = Space(arrangement="series", materials=tuple(films), most=4, min_share=0.0)
    series = search_space(replace(space, ohms=1.0), need, films, 1)[0].network
    case = Case(materials=films, spreads={}, over=over(), need=need)
    assert floor_of(films).nominal_ppm == pytest.approx(3457.4, abs=0.1)
    assert nominal_figure(series, case) * 1e6 == pytest.approx(3457.4, abs=0.1)
    assert slope_bound(need, list(films.values()), 1.0)[0] == 0.0


@pytest.mark.parametrize("seed", range(10))
def test_no_random_network_is_below_the_floor(seed):
    rng = np.random.default_rng(seed)
    films = random_films(seed, 3)
    bottom = floor_of(films).nominal_ppm * 1e-6
    T = grid(count=401)
    for _ in range(60):
        network = random_tree(rng, tuple(films), int(rng.integers(1, 6)))
        assert np.max(np.abs(brute_ratio(network, films, T) - 1)) >= bottom * (1 - 1e-9)


def test_slopes_of_one_sign_by_hand():
    """ln R rises by at least ln(1 + 400e-6*190*...) from cold to hot when every slope is positive."""
    films = by_name(film("a", 400), film("b", 900))
    bound, (low, high) = slope_bound(need_of(), list(films.values()), 1.0)
    # Linear laws: the least slope is film a's at every temperature, so R(T_ref) = 1 and the hot end
    # anchored at the reference leaves 400e-6 * 125.
    assert bound == pytest.approx(400e-6 * 125, rel=1e-9)
    assert (low, high) == pytest.approx((298.15, 423.15))


def test_slopes_against_tanh_for_a_pair_of_temperatures():
    """Slope bound: over a stretch of integral I the drift is at least tanh(|I|/2), here with a mask
    that leaves
    the reference out."""
    from tcplan.goal import Window

    films = by_name(film("a", -600), film("b", -900))
    window = Window(low=333.15, high=423.15, limit=0.01)
    need = need_of(Limit(kind="mask", value=0.01, windows=(window,)))
    bound, _ = slope_bound(need, list(films.values()), 1.0)
    slopes = np.log((1 - 600e-6 * 125) / (1 - 600e-6 * 35))
    assert bound >= np.tanh(abs(slopes) / 2) * (1 - 1e-9)


def test_integral_of_the_least_slope_by_a_fine_sum():
    films = list(random_films(7, 5).values())
    T = np.linspace(233.15, 423.15, 24)
    fine = np.linspace(233.15, 423.15, 200_001)
    least = np.min([m.slope(fine) for m in films], axis=0)
    total = np.concatenate([[0], np.cumsum((least[1:] + least[:-1]) / 2 * np.diff(fine))])
    got = least_slope_integral(films, T)
    np.testing.assert_allclose(got, np.interp(T, fine, total), atol=2e-9)


def test_thermistors_have_a_slope_floor():
    ntc = Material(
        name="ntc",
        label="ntc",
        source="invented",
        law=Thermistor(reference=298.15, beta=3435.0),
        valid=(233.15, 423.15),
        kind="plain",
    )
    need = need_of()
    bound, _ = slope_bound(need, [ntc], 1.0)
    own = np.max(np.abs(ntc.ratio(grid(count=5001), 298.15) - 1))
    assert bound == pytest.approx(own, rel=1e-6)


@pytest.mark.parametrize("seed", range(6))
def test_spread_floor_is_below_the_worst_case_of_every_network(seed):
    rng = np.random.default_rng(seed)
    films = random_films(seed, 3)
    spreads = {n: m.spread for n, m in films.items()}
    need = need_of()
    bound, at, _ = spread_bound(need, list(films.values()), spreads)
    # About min dTC1 |x|: 30 ppm/K over 125 K.
    assert bound == pytest.approx(30e-6 * 125, rel=0.35)
    assert at == pytest.approx(423.15)
    for _ in range(5):
        network = random_tree(rng, tuple(films), 3)
        assert worst_case(network, films, spreads, need).upper >= bound


def test_floor_of_a_band_is_below_the_best_band():
    films = random_films(3, 4)
    need = need_of(Limit(kind="band", value=0.01))
    case = Case(materials=films, spreads={}, over=over(), need=need)
    figures = []
    for kind in ("series", "parallel"):
        space = Space(arrangement=kind, materials=tuple(films), most=4, min_share=0.0)
        figures.append(
            nominal_figure(search_space(replace(space, ohms=1.0), need, films, 1)[0].network, case)
        )
    bottom = floor_of(films, need, min(figures))
    assert bottom.nominal_ppm <= min(figures) * 1e6


def test_fixed_members_in_parallel_enter_by_their_own_ratio():
    """Two different fixed members in parallel: a network that holds them is not below the floor.

    A and B fixed in parallel (100 ohm, 1 kohm), C and D free, total 55 ohm, -40..125 degC:
    A || B || (C + D) with C 77.97 ohm and D 61.27 ohm reaches about 15283 ppm, by brute force here.
    """
    rows = {"A": 1000, "B": -3000, "C": -2500, "D": 1500}
    films = by_name(*(film(n, tc1, -1.0) for n, tc1 in rows.items()))
    fixed = (leg("A", 100.0), leg("B", 1000.0))
    group = 1 / (1 / 100 + 1 / 1000)
    space = Space(
        arrangement="parallel",
        materials=("C", "D"),
        most=2,
        min_share=0.0,
        fixed=fixed,
        fixed_share=(55 / group, 55 / group),
    )
    need = need_of(high=125.0)
    bottom = floor(floor_evidence(space, need, films, 1.0), need, films, None, 1.0)
    network = Parallel((*fixed, Series((leg("C", 77.97), leg("D", 61.27)))))
    reached = np.max(np.abs(brute_ratio(network, films, grid(high=125.0, count=801)) - 1))
    assert reached * 1e6 == pytest.approx(15283, rel=1e-2)
    assert bottom.nominal_ppm <= reached * 1e6
