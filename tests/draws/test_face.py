"""Draws as a whole: known distributions, the worst case, and independence of who does the work."""

from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor
from dataclasses import replace
from math import erf, sqrt
from multiprocessing import get_context

import numpy as np
import pytest
from makers import by_name, film, leg, need_of, random_films, random_tree

from tcplan.draws import blocks, check_draws, draw, draw_curves, draw_units, draw_until
from tcplan.errors import InputError, Stopped
from tcplan.goal import Limit
from tcplan.material.model import Film
from tcplan.material.spread import Spread
from tcplan.network import Parallel, Series, used_materials
from tcplan.process import Correlation, Parameter, Process, Tracking
from tcplan.worst.evaluation import worst_case

DRIFT = need_of(Limit(kind="drift", value=0.01))
HOT = need_of(Limit(kind="drift", value=0.01), low=25.0, high=125.0)  # 100 K, one side


def spreads(materials):
    return {name: material.spread for name, material in materials.items()}


def flat(shape="normal", **spread):
    """Return four films without temperature coefficients that spread in TC1 alone."""
    stated = Spread(meaning="limits", shape=shape, **spread)
    return {n: replace(film(n, 0.0), spread=stated) for n in "abcd"}


def mixed(seed=1):
    materials = random_films(seed, 3)
    tree = random_tree(np.random.default_rng(seed), tuple(materials), 3)
    return Parallel((tree, leg("m00", 3000.0))), materials


@pytest.mark.parametrize(
    ("shape", "limit", "half_width"), [("rectangular", sqrt(3.0), 3.8794067), ("normal", 3.0, 3.92)]
)
def test_a_sum_of_four(shape, limit, half_width):
    # JCGM 101, 9.2: four of unit variance, 95 % half-width 3.8794067 (rectangular), 3.92 (normal).
    materials = flat(shape, tc1=limit * 1e-6)
    network = Series(tuple(leg(n, 100.0) for n in materials))
    drawn = draw(network, materials, spreads(materials), Process(), HOT, count=1_000_000, quantile=0.95)
    assert drawn.quantile_figure / (1e-6 * 100.0 / 4) == pytest.approx(half_width, abs=0.01)
    assert [share for _, share in drawn.shares] == pytest.approx([0.25] * 4, abs=0.02)


def test_the_interval_of_a_quantile_covers_as_often_as_it_says():
    # abs(z) of a normal exceeds 1.6448536 once in ten: any table of the normal distribution.
    materials = flat(tc1=30e-6)
    arguments = (leg("a", 1.0), materials, spreads(materials), Process(), HOT)
    drawn = [draw(*arguments, count=2000, quantile=0.9, seed=seed) for seed in range(200)]
    covered = sum(one.quantile_low <= 1.6448536e-3 <= one.quantile_high for one in drawn)
    assert 180 <= covered < 200  # 190 expected, at least; sigma 3


def test_yield_of_one_normal_parameter():
    # P(abs(z) <= k) = erf(k/sqrt(2)), any text on probability.
    materials = flat(tc1=30e-6)
    drawn = draw(leg("a", 100.0), materials, spreads(materials), Process(), HOT, count=200_000, limit=2e-3)
    expected = erf(2.0 / sqrt(2.0))  # sigma 10 ppm/K over 100 K is 1e-3
    assert drawn.yield_low < expected < drawn.yield_high
    assert drawn.yield_high - drawn.yield_low < 0.002
    assert drawn.quantile_figure == pytest.approx(3.0e-3, rel=0.03)  # 99.73 % of a normal: 3 sigma
    # Half-normal: mean sigma sqrt(2/pi), variance sigma^2 (1 - 2/pi).
    assert drawn.mean == pytest.approx(1e-3 * sqrt(2 / np.pi), rel=0.01)
    assert drawn.sigma == pytest.approx(1e-3 * sqrt(1 - 2 / np.pi), rel=0.01)
    assert drawn.cpk is not None
    assert drawn.shares[0][0] == Parameter(material="a", component="tc1")
    assert drawn.shares[0][1] == pytest.approx(1.0, abs=1e-9)
    assert drawn.shares_at == pytest.approx(398.15)


def test_a_correlation_of_one_makes_the_ratio_of_two_films_exact():
    films = by_name(film("np", 150.0, 0.4, value_percent=15.0), film("pp", -120.0, 0.55, value_percent=15.0))
    network = Series((leg("np", 3000.0), leg("pp", 6000.0)))
    value = [Parameter(material=n, component="value") for n in films]
    step = Process(correlations=(Correlation(first=value[0], second=value[1], value=1.0),))
    # Only the ratio of the two moves the drift, and it does not move.
    exact = draw(network, films, spreads(films), step, DRIFT, limit=0.01)
    assert exact.largest - exact.mean < 1e-12 * exact.mean
    assert exact.sigma < 1e-12 * exact.mean
    assert draw(network, films, spreads(films), Process(), DRIFT).sigma > 0.01 * exact.mean


@pytest.mark.parametrize("seed", range(6))
def test_rectangular_draws_never_exceed_the_worst_case(seed):
    materials = random_films(seed, 3)
    for k, name in enumerate(materials):
        spread = Spread(meaning="limits", value=0.15, tc1=40e-6 * (k + 1), tc2=0.1e-6, shape="rectangular")
        materials[name] = replace(materials[name], spread=spread)
    network = random_tree(np.random.default_rng(seed), tuple(materials), 3)
    used = {n: materials[n].spread for n in used_materials(network)}
    worst = worst_case(network, materials, used, DRIFT)
    drawn = draw(network, materials, used, Process(), DRIFT, count=40_000)
    assert drawn.largest <= worst.upper
    assert drawn.largest > 0.5 * worst.judged.figure


def test_the_same_seed_gives_the_same_result_whoever_draws(monkeypatch):
    network, materials = mixed()

    def drawn(executor=None, count=60_000):
        stated = spreads(materials)
        return draw(network, materials, stated, Process(), DRIFT, count=count, limit=0.02, executor=executor)

    alone = drawn()
    assert drawn() == alone
    with ThreadPoolExecutor(2) as pool:
        assert drawn(pool) == alone
    monkeypatch.setattr(blocks, "TASK_BLOCKS", 1)
    assert drawn() == alone
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool:
        assert drawn(pool) == alone
    monkeypatch.setattr(blocks, "TASK_BLOCKS", 3)
    assert drawn() == alone
    assert drawn(count=59_999).draws == 59_999


def test_another_seed_gives_another_result():
    network, materials = mixed()
    one, two = (
        draw(network, materials, spreads(materials), Process(), DRIFT, count=2000, seed=seed)
        for seed in (1, 2)
    )
    assert one.mean != two.mean
    assert one.mean == pytest.approx(two.mean, rel=0.1)


def test_curves_are_those_that_are_judged():
    network, materials = mixed()
    T = np.linspace(233.15, 423.15, 2001)
    curves = draw_curves(network, materials, Process(), DRIFT, T, 100, seed=9)
    drawn = draw(network, materials, spreads(materials), Process(), DRIFT, count=100, seed=9)
    peaks = np.abs(curves).max(axis=1)
    assert curves.shape == (100, 2001)
    assert drawn.largest == pytest.approx(peaks.max(), rel=1e-4)
    assert drawn.mean == pytest.approx(peaks.mean(), rel=1e-4)


def test_few_draws_claim_no_more_than_they_support():
    materials = flat(tc1=30e-6)
    few = draw(leg("a", 1.0), materials, spreads(materials), Process(), HOT, count=300, limit=1.0)
    assert few.quantile_high is None
    assert few.yield_fraction == 1.0
    assert few.yield_low == pytest.approx(0.025 ** (1 / 300))
    none = draw(leg("a", 1.0), materials, spreads(materials), Process(), HOT, count=1)
    assert (none.inside, none.yield_fraction, none.cpk, none.sigma) == (None, None, None, 0.0)


def test_draws_until_the_interval_is_narrow():
    materials = flat(tc1=30e-6)

    def drawn(precision, most=10_000_000):
        stated = spreads(materials)
        return draw_until(leg("a", 1.0), materials, stated, Process(), HOT, precision=precision, most=most)

    wide, narrow = drawn(0.05), drawn(0.01)
    for found, asked in ((wide, 0.05), (narrow, 0.01)):
        assert (found.quantile_high - found.quantile_low) / found.quantile_figure <= asked
    assert wide.draws < narrow.draws < 10_000_000
    assert drawn(0.01) == narrow
    ended = drawn(1e-6, most=50_000)
    assert ended.draws == 50_000
    once = draw(leg("a", 1.0), materials, spreads(materials), Process(), HOT, count=50_000)
    assert ended == once


def test_tracked_films_share_out_their_common_part():
    materials = flat(tc1=25e-6, shape="rectangular")
    process = Process(trackings=(Tracking(materials=("a", "b"), within=1e-6),))
    network = Series((leg("a", 1.0), leg("b", 1.0)))
    drawn = draw(network, materials, spreads(materials), process, HOT)
    assert [share for _, share in drawn.shares] == pytest.approx([0.5, 0.5], abs=0.02)


@pytest.mark.parametrize("count", [0, -5, 10**9 + 1, 10**12])
def test_absurd_counts_are_refused(count):
    with pytest.raises(InputError, match="1 to 1 000 000 000") as error:
        check_draws(count)
    if count > 0:
        assert "hours" in str(error.value)
        assert "GB" in str(error.value)
    check_draws(10**9)


def test_wrong_requests_are_refused():
    network, materials = mixed()
    stated = spreads(materials)
    for quantile in (0.0, 1.0, float("nan")):
        with pytest.raises(InputError, match="quantile"):
            draw(network, materials, stated, Process(), DRIFT, quantile=quantile)
    with pytest.raises(InputError, match="precision"):
        draw_until(network, materials, stated, Process(), DRIFT, precision=0.0)
    with pytest.raises(ValueError, match="no spread"):
        draw(network, materials, {}, Process(), DRIFT)


def test_an_interrupt_is_told(monkeypatch):
    network, materials = mixed()

    def interrupted(task):
        raise KeyboardInterrupt

    monkeypatch.setattr(blocks.Task, "run", interrupted)
    with pytest.raises(Stopped, match="after 0 of 100"):
        draw(network, materials, spreads(materials), Process(), DRIFT, count=100)


# --- units ------------------------------------------------------------------------------------------


def matched(matching, tc1_spread=0.0):
    stated = Spread(meaning="limits", value=0.0, tc1=tc1_spread)
    body = Film(min_width=1e-6, matching=matching)
    return by_name(
        replace(film("p", 1000.0), spread=stated, film=body),
        replace(film("n", -1000.0), spread=stated, film=body),
    )


def test_units_within_a_lot_against_the_closed_form():
    # Two equal legs of TC1 +/-a: drift = a x (p - n)/(p + n), about a x (e_p - e_n)/2 with independent
    # e of sigma s each: sigma a x s/sqrt(2). Pelgrom's law (JSSC 24 (1989) 1433) gives s.
    films = matched(2e-8)
    network = Series((leg("p", 1000.0), leg("n", 1000.0)))  # 10 squares of 1 um: 10 um^2
    s = 2e-8 / sqrt(2.0) / sqrt(10e-12)
    sigma = 1e-3 * 100.0 * s / sqrt(2.0)
    drawn = draw_units(network, films, spreads(films), Process(), HOT, lots=4, units=50_000, limit=sigma)
    assert drawn.mean_within == pytest.approx(erf(1.0 / sqrt(2.0)), abs=0.005)
    assert drawn.least_within == pytest.approx(erf(1.0 / sqrt(2.0)), abs=0.01)
    assert drawn.lots_inside == 4
    assert drawn.unstated == ()


def test_lot_and_unit_levels_are_apart():
    films = matched(2e-8, tc1_spread=300e-6)
    network = Series((leg("p", 1000.0), leg("n", 1000.0)))
    arguments = (network, films, spreads(films), Process(), HOT)
    units = draw_units(*arguments, lots=2000, units=50, limit=1e-2)
    lots = draw(*arguments, count=2000, limit=1e-2)
    assert units.lots_inside == lots.inside
    assert (units.lots_low, units.lots_high) == (lots.yield_low, lots.yield_high)
    assert units.least_within == 0.0
    assert units.median_within > 0.9
    assert draw_units(*arguments, lots=2000, units=50, limit=1e-2) == units


def test_mismatch_that_is_not_stated():
    films = matched(2e-8)
    films["n"] = replace(films["n"], film=None)
    network = Series((leg("p", 1000.0), leg("n", 1000.0)))
    some = draw_units(network, films, spreads(films), Process(), HOT, lots=2, units=10, limit=1e-3)
    assert some.unstated == ("b",)
    films["p"] = replace(films["p"], film=None)
    assert draw_units(network, films, spreads(films), Process(), HOT, lots=2, units=10, limit=1e-3) is None
    with pytest.raises(InputError, match="draws"):
        draw_units(network, films, spreads(films), Process(), HOT, lots=10**6, units=10**6, limit=1e-3)
