"""Series and parallel optima: the prototype's figures, brute force, and properties."""

from itertools import combinations, pairwise

import numpy as np
import pytest
from makers import brute_ratio, by_name, film, grid, need_of, over, random_films, six_films
from scipy.optimize import differential_evolution, minimize_scalar

from tcplan.goal import Limit, Window
from tcplan.network import arrangement, legs, shares, value
from tcplan.plan import Space
from tcplan.search.linear import search_space
from tcplan.verify.bound import arrangement_bound
from tcplan.verify.option import Case, check, nominal_figure


def space(kind, names, most=3, min_share=0.0, **more):
    return Space(arrangement=kind, materials=tuple(names), most=most, min_share=min_share, **more)


def best(kind, materials, need=None, most=3, min_share=0.0, few=1):
    need = need or need_of()
    found = search_space(space(kind, materials, most, min_share, ohms=1000.0), need, materials, few)
    case = Case(materials=materials, spreads={}, over=over(), need=need)
    return [check(proposal, case, "x") for proposal in found]


# Independent prototype, six invented films, 25 degC, -40..150 degC, to the digits given.
@pytest.mark.parametrize(
    ("kind", "names", "ppm", "digits"),
    [
        ("single", "all", 10124, 0.5),
        ("series", "all", 4062.5, 1e-4),
        ("parallel", "all", 671.090, 5e-4),
        ("series", ("hi", "sp"), 18442, 0.5),
        ("parallel", ("hi", "sp"), 12967, 0.5),
    ],
)
def test_six_films_nominal(kind, names, ppm, digits):
    films = six_films()
    chosen = films if names == "all" else {name: films[name] for name in names}
    option = best(kind, chosen, most=1 if kind == "single" else 6)[0]
    assert option.proof.figure_ppm == pytest.approx(ppm, abs=digits)
    assert option.proof.kind == "global"
    assert option.proof.gap_ppm <= max(1e-6, 1e-6 * ppm)


def test_six_films_shares():
    """Independent prototype.

    Series pp 2/3, np 1/3; parallel conductances hi .101369, pp .824706, sp .073925.
    """
    series, parallel = best("series", six_films(), most=6)[0], best("parallel", six_films(), most=6)[0]
    got = {
        leg.material: share for leg, share in zip(legs(series.network), shares(series.network), strict=True)
    }
    assert got == pytest.approx({"pp": 2 / 3, "np": 1 / 3}, abs=1e-9)
    got = {
        leg.material: share
        for leg, share in zip(legs(parallel.network), shares(parallel.network), strict=True)
    }
    assert got == pytest.approx({"hi": 0.101369, "pp": 0.824706, "sp": 0.073925}, abs=5e-7)


def peak_of(kind, mix, materials, T):
    ratios = np.array([m.ratio(T, 298.15) for m in materials.values()])
    ratio = mix @ ratios if kind == "series" else 1.0 / (mix @ (1.0 / ratios))
    return float(np.max(np.abs(ratio - 1.0)))


@pytest.mark.parametrize("kind", ["series", "parallel"])
@pytest.mark.parametrize("seed", range(4))
def test_optimum_against_differential_evolution(kind, seed):
    """The slow independent twin: scipy's differential evolution over the shares, on a dense grid."""
    films = random_films(seed, 4)
    T = grid(count=801)

    def cost(z):
        mix = z / z.sum() if z.sum() > 0 else np.full(4, 0.25)
        return peak_of(kind, mix, films, T)

    slow = differential_evolution(cost, [(0.0, 1.0)] * 4, seed=seed, tol=1e-12, maxiter=400, polish=True)
    fast = best(kind, films, most=4)[0]
    # The grid of the slow twin misses the true peak by up to a few parts in 1e6.
    assert fast.proof.figure_ppm <= slow.fun * 1e6 * (1 + 1e-5) + 1e-6
    assert fast.proof.lower_bound_ppm <= slow.fun * 1e6 * (1 + 1e-5)
    assert fast.proof.figure_ppm == pytest.approx(slow.fun * 1e6, rel=2e-2, abs=0.5)


@pytest.mark.parametrize("kind", ["series", "parallel"])
@pytest.mark.parametrize("min_share", [0.0, 0.03, 0.2])
def test_pairs_against_brute_force_over_all_supports(kind, min_share):
    """Every pair by scipy's bounded scalar minimiser on a dense grid: exact supports, not rounded."""
    films = random_films(11, 6)
    T = grid(count=1501)
    names = sorted(films)
    figures = [peak_of(kind, np.ones(1), {n: films[n]}, T) for n in names]
    for i, first in enumerate(names):
        for second in names[i + 1 :]:
            pair = {first: films[first], second: films[second]}
            ends = (max(min_share, 0.0), 1 - min_share)

            def cost(s, pair=pair):
                return peak_of(kind, np.array([s, 1 - s]), pair, T)

            inner = minimize_scalar(cost, bounds=ends, method="bounded", options={"xatol": 1e-12})
            figures.append(min(inner.fun, cost(ends[0]), cost(ends[1])))
    option = best(kind, films, most=2, min_share=min_share)[0]
    assert option.proof.figure_ppm == pytest.approx(min(figures) * 1e6, rel=1e-4)
    assert option.proof.kind == "global"
    assert all(share >= min_share - 1e-12 for share in shares(option.network))


@pytest.mark.parametrize("kind", ["series", "parallel"])
def test_three_of_nine_is_the_best_of_all_triples(kind):
    """Exact support: the optimum over each of the 84 triples, searched alone, is no better."""
    films = random_films(3, 9)
    whole = best(kind, films, most=3)[0]
    singles = [
        best(kind, {n: films[n] for n in triple}, most=3)[0].proof.figure_ppm
        for triple in combinations(sorted(films), 3)
    ]
    assert whole.proof.figure_ppm == pytest.approx(min(singles), rel=1e-6, abs=1e-6)
    assert len(legs(whole.network)) <= 3


def test_zero_drift_is_reached_when_the_origin_is_in_the_hull():
    """Zero is reachable in series when the origin is inside the hull of (TC1, TC2)."""
    films = by_name(film("a", -400, -0.3), film("b", 300, -0.4), film("c", 20, 0.9))
    option = best("series", films, most=3)[0]
    assert option.proof.figure_ppm <= 1e-6
    assert abs(option.nominal.tc1_ppm_per_K) < 1e-6


@pytest.mark.parametrize("kind", ["series", "parallel"])
@pytest.mark.parametrize(
    "limit",
    [
        Limit(kind="drift", value=0.005),
        Limit(kind="band", value=0.005),
        Limit(kind="box_tcr", value=20e-6),
        Limit(kind="chord_tcr", value=10e-6),
        Limit(
            kind="mask",
            value=0.001,
            windows=(
                Window(low=273.15, high=343.15, limit=0.001),
                Window(low=233.15, high=423.15, limit=0.004),
            ),
        ),
    ],
    ids=lambda limit: limit.kind,
)
def test_every_goal_against_brute_force_on_two_films(kind, limit):
    """Two films: a scan of the one share, each goal computed from its own definition on a grid."""
    films = by_name(film("a", -900, 1.4), film("b", 1200, 0.3))
    T = np.union1d(grid(count=2401), [273.15, 343.15])
    x = T - 298.15
    ra, rb = films["a"].ratio(T, 298.15), films["b"].ratio(T, 298.15)

    def figure(s):
        ratio = s * ra + (1 - s) * rb if kind == "series" else 1 / (s / ra + (1 - s) / rb)
        d = ratio - 1
        if limit.kind == "drift":
            return np.max(np.abs(d))
        if limit.kind in ("band", "box_tcr"):
            return np.max(d) - np.min(d)
        if limit.kind == "chord_tcr":
            return max(abs(d[0] / x[0]), abs(d[-1] / x[-1])) * 125.0
        inner = (T >= 273.15) & (T <= 343.15)
        return max(np.max(np.abs(d[inner])), np.max(np.abs(d)) / 4.0)

    coarse = np.linspace(0, 1, 4001)
    start = coarse[int(np.argmin([figure(s) for s in coarse]))]
    fine = minimize_scalar(
        figure,
        bounds=(max(0, start - 1e-3), min(1, start + 1e-3)),
        method="bounded",
        options={"xatol": 1e-13},
    )
    option = best(kind, films, need_of(limit), most=2)[0]
    assert option.proof.figure_ppm == pytest.approx(fine.fun * 1e6, rel=2e-4)
    assert option.proof.gap_ppm <= 1e-6 * option.proof.figure_ppm + 1e-6


@pytest.mark.parametrize("kind", ["series", "parallel"])
def test_adding_a_material_never_worsens_the_optimum(kind):
    films = random_films(21, 7)
    names = sorted(films)
    figures = [
        best(kind, {n: films[n] for n in names[:count]}, most=3)[0].proof.figure_ppm for count in range(2, 8)
    ]
    assert all(later <= earlier * (1 + 1e-9) + 1e-9 for earlier, later in pairwise(figures))


@pytest.mark.parametrize("kind", ["series", "parallel"])
def test_scaling_the_target_changes_no_figure(kind):
    films = six_films()
    need = need_of()
    case = Case(materials=films, spreads={}, over=over(), need=need)
    small, large = (
        search_space(space(kind, films, ohms=ohms), need, films, 1)[0].network for ohms in (1.0, 1e6)
    )
    assert value(small) == pytest.approx(1.0, rel=1e-12)
    assert value(large) == pytest.approx(1e6, rel=1e-12)
    assert nominal_figure(small, case) == pytest.approx(nominal_figure(large, case), rel=1e-12)


def test_order_of_the_materials_does_not_matter():
    films = six_films()
    turned = dict(reversed(films.items()))
    for kind in ("series", "parallel"):
        assert [o.network for o in best(kind, films, few=3)] == [o.network for o in best(kind, turned, few=3)]


def test_series_and_parallel_are_dual():
    """The band of ln R of a parallel mix of laws 1/r is that of the series mix of laws r, mirrored.

    With Gamma = 1/r as the laws, a parallel mix gives 1/(sum g r): its highest ratio to lowest ratio
    is that of the series mix. Checked with the expression law, at equal shares.
    """
    from tcplan.material.law import Expression
    from tcplan.material.model import Material
    from tcplan.network import Parallel, Series

    films = by_name(film("a", -500, 0.8), film("b", 700, 0.2))
    mirror = {
        name: Material(
            name=name,
            label=name,
            source="invented",
            law=Expression(
                text="1/(1 + a*(T - T0) + b*(T - T0)**2)",
                constants=(("a", tc1 * 1e-6), ("b", tc2 * 1e-6)),
                reference=298.15,
            ),
            valid=(213.15, 433.15),
            kind="plain",
        )
        for name, tc1, tc2 in (("a", -500, 0.8), ("b", 700, 0.2))
    }
    from makers import leg

    T = grid(count=101)
    series = brute_ratio(Series((leg("a", 40.0), leg("b", 60.0))), films, T)
    parallel = brute_ratio(Parallel((leg("a", 1 / 40.0), leg("b", 1 / 60.0))), mirror, T)
    np.testing.assert_allclose(series * parallel, 1.0, rtol=1e-13)


def test_runners_up_are_distinct_and_ranked():
    options = best("parallel", six_films(), most=2, few=3)
    figures = [option.proof.figure_ppm for option in options]
    assert figures == sorted(figures)
    assert len({frozenset(leg.material for leg in legs(o.network)) for o in options}) == 3
    assert [o.proof.kind for o in options] == ["global", "searched", "searched"]


def test_a_certificate_with_wrong_weights_still_proves_only_what_is_true():
    """Any weights give a true bound: random ones never exceed the optimum."""
    from dataclasses import replace

    films, need = six_films(), need_of()
    proposal = search_space(space("parallel", films, ohms=1.0), need, films, 1)[0]
    optimum = best("parallel", films)[0].proof.figure_ppm * 1e-6
    rng = np.random.default_rng(0)
    count = len(proposal.certificate.nodes)
    for _ in range(20):
        weights = tuple(tuple(row) for row in rng.normal(size=(3, count)))
        wrong = replace(proposal.certificate, weights=weights)
        bound = arrangement_bound(proposal.space, wrong, need, films, optimum * 2)
        assert 0.0 <= bound <= optimum * (1 + 1e-12)


def test_many_materials_beyond_the_supports_that_are_enumerated():
    """40 of 8: more supports than are listed; the answer is honest about its bound."""
    films = random_films(2, 40)
    option = best("series", films, most=8)[0]
    assert arrangement(option.network) in ("series", "single")
    assert option.proof.lower_bound_ppm <= option.proof.figure_ppm
    assert len(legs(option.network)) <= 8
