"""Designs for the worst case: the prototype's figures, brute force, and the proofs beside them."""

from dataclasses import replace
from itertools import product

import numpy as np
import pytest
from makers import by_name, film, grid, leg, need_of, over, random_films, six_films

from tcplan.goal import Limit, Window
from tcplan.mixes import mixed_trees
from tcplan.network import Network, Parallel, Series, deviated, legs, network_text, resistance, shares, value
from tcplan.plan import Sizes, Space
from tcplan.process import Correlation, Parameter, Process, Variation
from tcplan.search.linear import least_total, search_space
from tcplan.search.mixed_search import mixed_proposals
from tcplan.verify.bound import arrangement_bound
from tcplan.verify.option import Case, check
from tcplan.verify.question import device_question
from tcplan.verify.sieve import none_within
from tcplan.verify.tree_bound import mixed_bound
from tcplan.worst.evaluation import worst_case


def variation_of(films, process=None):
    spreads = {name: material.spread for name, material in films.items()}
    return Variation(spreads=spreads, **({"process": process} if process else {}))


def space(films, kind, most, **rest):
    settings = {"min_share": 0.0, "ohms": 1.0, "legs": most, **rest}
    return Space(arrangement=kind, materials=tuple(sorted(films)), most=most, **settings)


def worst_ppm(network, films, need, process=None):
    variation = variation_of(films, process)
    found = worst_case(network, films, variation.spreads, need, variation.process)
    return found.judged.figure * 1e6, found.upper * 1e6


def two_films():
    """Independent prototype: A (250, 0.5, sheet 10 %), B (-1800, 1.9, sheet 15 %), -40..125 degC."""
    return by_name(film("A", 250, 0.5, value_percent=10), film("B", -1800, 1.9, value_percent=15))


# --- one node -----------------------------------------------------------------------------------


# Independent prototype, six films, 25 degC, -40..150 degC; two films, -40..125 degC.
@pytest.mark.parametrize(
    ("films", "kind", "high", "ppm", "parts"),
    [
        (six_films(), "series", 150.0, 8898.83, {"pp": 0.7379, "np": 0.2621}),
        (six_films(), "parallel", 150.0, 8014.34, {"pp": 0.97541, "sp": 0.02459}),
        (two_films(), "series", 125.0, 9228.17, None),
        (two_films(), "parallel", 125.0, 6279.41, None),
    ],
)
def test_series_and_parallel(films, kind, high, ppm, parts):
    need, variation = need_of(high=high), variation_of(films)
    best = search_space(space(films, kind, len(films)), need, films, 1, variation)[0]
    reached, upper = worst_ppm(best.network, films, need)
    assert reached == pytest.approx(ppm, abs=6e-3)
    assert upper == pytest.approx(reached, rel=1e-9)
    bound = arrangement_bound(best.space, best.certificate, need, films, reached * 1e-6, variation) * 1e6
    assert bound == pytest.approx(reached, rel=1e-6)
    if parts:
        found = dict(zip([x.material for x in legs(best.network)], shares(best.network), strict=True))
        assert found == pytest.approx(parts, abs=6e-5)


def brute(network: Network, films, T, steps=5):
    """Return the worst peak over a grid of the factors with all laws high, and all low."""
    names = sorted({x.material for x in legs(network)})
    worst = 0.0
    axes = [np.linspace(1 - films[n].spread.value, 1 + films[n].spread.value, steps) for n in names]
    x = T - 298.15
    for side in (1, -1):
        laws = {n: films[n].ratio(T, 298.15) + side * films[n].spread.tc1 * np.abs(x) for n in names}
        for factors in product(*axes):
            device = deviated(network, dict(zip(names, factors, strict=True)))
            worst = max(worst, float(np.max(np.abs(resistance(device, laws) / value(device) - 1))))
    return worst


@pytest.mark.parametrize("kind", ["series", "parallel"])
@pytest.mark.parametrize("seed", [1, 2, 3])
def test_no_mix_on_a_fine_scan_is_better(kind, seed):
    """Two films, 2001 shares, each judged by brute force over its devices."""
    films, need, T = random_films(seed, 2), need_of(), grid(count=41)
    best = search_space(space(films, kind, 2), need, films, 1, variation_of(films))[0]
    a, b = sorted(films)
    node = Series if kind == "series" else Parallel

    def at(w):
        return brute(
            node(
                (leg(a, w if kind == "series" else 1 / w), leg(b, 1 - w if kind == "series" else 1 / (1 - w)))
            ),
            films,
            T,
            2,
        )

    least = min(at(w) for w in np.linspace(0.0005, 0.9995, 401))
    reached, _ = worst_ppm(best.network, films, need)
    single = min(worst_ppm(leg(n, 1.0), films, need)[0] for n in films)
    assert reached <= min(least * 1e6, single) * (1 + 1e-6)
    assert reached >= min(least * 1e6, single) * (1 - 0.02)


def test_least_shares_and_sizes_hold_in_the_worst_case_too():
    films, need = six_films(), need_of()
    variation = variation_of(films)
    free = worst_ppm(
        search_space(space(films, "parallel", 2), need, films, 1, variation)[0].network, films, need
    )
    held = search_space(space(films, "parallel", 2, min_share=0.05), need, films, 1, variation)[0]
    assert min(shares(held.network)) >= 0.05 - 1e-9
    assert worst_ppm(held.network, films, need)[0] >= free[0]
    sizes = Sizes(least_ohms=(0.0,) * 6, most_ohms=(8.0,) * 6, area_per_ohm=(0.0,) * 6)
    small = search_space(space(films, "parallel", 2, sizes=sizes), need, films, 1, variation)[0]
    assert max(x.ohms for x in legs(small.network)) <= 8.0 * (1 + 1e-9)


def test_a_mask_with_several_pieces():
    """The tighter middle counts: the worst case is that of the scaled goal, reached and bounded."""
    films = six_films()
    windows = (
        Window(low=273.15, high=343.15, limit=0.002),
        Window(low=233.15, high=423.15, limit=0.01),
    )
    need = need_of(Limit(kind="mask", value=0.002, windows=windows))
    variation = variation_of(films)
    best = search_space(space(films, "parallel", 3), need, films, 1, variation)[0]
    reached, upper = worst_ppm(best.network, films, need)
    bound = arrangement_bound(best.space, best.certificate, need, films, reached * 1e-6, variation) * 1e6
    assert bound <= reached * (1 + 1e-9) <= upper * (1 + 1e-9)
    assert bound == pytest.approx(reached, rel=1e-6)


def test_evidence_that_is_not_of_a_device_still_gives_a_true_bound():
    """Factors far outside the box are pressed into it, negative weights count as none."""
    films, need = six_films(), need_of()
    variation = variation_of(films)
    best = search_space(space(films, "series", 3), need, films, 1, variation)[0]
    reached, _ = worst_ppm(best.network, films, need)
    wild = replace(
        best.certificate,
        nodes=tuple(replace(n, factors=tuple(5.0 * f for f in n.factors)) for n in best.certificate.nodes),
        weights=tuple(tuple(w - 0.01 for w in row) for row in best.certificate.weights),
    )
    assert arrangement_bound(best.space, wild, need, films, reached * 1e-6, variation) * 1e6 <= reached * (
        1 + 1e-9
    )


def full_step(*names):
    first = names[0]
    pairs = [(first, other) for other in names[1:]]
    return Process(
        correlations=tuple(
            Correlation(
                first=Parameter(material=a, component="value"),
                second=Parameter(material=b, component="value"),
                value=1.0,
            )
            for a, b in pairs
        )
    )


@pytest.mark.parametrize("kind", ["series", "parallel"])
def test_values_in_full_step_make_the_ratio_exact(kind):
    """Both sheets move as one and by as much: their ratio is exact, so the spread costs nothing."""
    films = by_name(film("A", 250, 0.5, value_percent=12), film("B", -1800, 1.9, value_percent=12))
    need, process = need_of(), full_step("A", "B")
    best = search_space(space(films, kind, 2), need, films, 1, variation_of(films, process))[0]
    nominal = search_space(space(films, kind, 2), need, films, 1)[0]
    reached, upper = worst_ppm(best.network, films, need, process)
    exact, _ = worst_ppm(
        nominal.network,
        by_name(film("A", 250, 0.5, value_percent=0), film("B", -1800, 1.9, value_percent=0)),
        need,
    )
    assert reached == pytest.approx(exact, rel=1e-6)
    assert upper == pytest.approx(reached, rel=1e-9)


# --- mixed --------------------------------------------------------------------------------------


# Independent prototype, two films, -40..125 degC. The first is 3068.9 where only corners are looked at.
@pytest.mark.parametrize(
    ("form", "ppm"),
    [
        ("A + (A || B)", 3086.6),
        ("B || (A + B)", 3177.9),  # the dual form of (A || B) + B
        ("(A + B) || (A + B)", 2939.15),
        ("(A || B) + (A || B)", 2921.73),
    ],
)
def test_mixed_networks_of_two_films(form, ppm):
    films, need = two_films(), need_of(high=125.0)
    found = mixed_proposals(space(films, "mixed", 2, legs=4), need, films, 9, None, variation_of(films))
    by_form = {}
    for proposal in found:
        text = network_text(proposal.network, lambda x: x.material)
        by_form[text] = min(by_form.get(text, np.inf), worst_ppm(proposal.network, films, need)[0])
    assert by_form[form] == pytest.approx(ppm, rel=1e-4)


@pytest.mark.parametrize(("size", "ppm"), [(3, 3086.58), (4, 2921.73)])
def test_the_proof_of_mixed_networks_in_their_worst_case(size, ppm):
    """Proved to 1 %; the best of any two-film network is at least about 2919.2 (independent prototype)."""
    films, need = two_films(), need_of(high=125.0)
    variation = variation_of(films)
    of = space(films, "mixed", 2, legs=size)
    found = mixed_proposals(of, need, films, 2, None, variation)
    worst = [worst_case(p.network, films, variation.spreads, need) for p in found]
    best = min(w.judged.figure for w in worst)
    devices = [(w.judged.at, w.device.factors) for w in worst]
    bound = mixed_bound(of, need, films, [], best, 0.01, variation, devices)
    assert best * 1e6 == pytest.approx(ppm, abs=0.02)
    assert bound == pytest.approx(0.99 * best, rel=1e-9)


@pytest.mark.parametrize("seed", range(6))
def test_no_random_network_is_below_a_proved_worst_case(seed):
    """400 networks at random, each judged by brute force over its devices: none is below the bound.

    Asked for 3 % more than the best, a proof that rules out too much would claim it.
    """
    films, need, T = random_films(seed, 3), need_of(), grid(count=21)
    variation, of = variation_of(films), space(random_films(seed, 3), "mixed", 3, legs=3)
    found = mixed_proposals(of, need, films, 3, None, variation)
    figures = [worst_ppm(p.network, films, need)[0] * 1e-6 for p in found]
    best = min(figures, default=0.05)
    bounds = [mixed_bound(of, need, films, [], best * part, 0.01, variation) for part in (1.0, 1.04)]
    rng, names = np.random.default_rng(seed), of.materials
    for _ in range(400):
        a, b, c = (str(rng.choice(names)) for _ in range(3))
        one, two = (float(10 ** rng.uniform(-2, 2)) for _ in range(2))
        inner = (Parallel if rng.random() < 0.5 else Series)((leg(b, one), leg(c, two)))
        network = (Series if isinstance(inner, Parallel) else Parallel)((leg(a, 1.0), inner))
        assert brute(network, films, T, 2) >= max(bounds) * (1 - 1e-9)


def test_the_least_total_of_a_coil_in_its_worst_case():
    """A total 0.1 % smaller does not meet the limit in its worst case, a proof at that total says so."""
    films = by_name(
        film("cu", 3900, 0.0, value_percent=1, tc1_spread_ppm=20),
        film("flat", 15, -0.1, value_percent=1, tc1_spread_ppm=10),
        film("down", -300, 0.4, value_percent=3, tc1_spread_ppm=30),
    )
    need, variation = need_of(Limit(kind="drift", value=0.02)), variation_of(films)
    coil = {"fixed": (leg("cu", 400.0),), "min_share": 0.0, "most": 2}
    free = Space(arrangement="series", materials=("down", "flat"), fixed_share=(1e-4, 1.0), **coil)
    best = least_total(free, need, films, 0.02, variation)
    total = value(best.network)
    assert worst_ppm(best.network, films, need)[0] == pytest.approx(20_000, rel=1e-6)
    tight = Space(
        arrangement="series",
        materials=("down", "flat"),
        fixed_share=(400 / (0.999 * total),) * 2,
        ohms=0.999 * total,
        **coil,
    )
    case = Case(materials=films, spreads=variation.spreads, over=over(), need=need, designed=True)
    other = check(search_space(tight, need, films, 1, variation)[0], case, "x")
    assert other.proof.of == "worst-case"
    assert other.proof.lower_bound_ppm > 20_000


def test_the_nominal_best_is_not_the_worst_case_best():
    """Independent prototype: the nominal optimum of A || B promises 1401.9 ppm and reaches 6866."""
    films, need = two_films(), need_of(high=125.0)
    nominal = search_space(space(films, "parallel", 2), need, films, 1)[0]
    case = Case(materials=films, spreads=variation_of(films).spreads, over=over(high=125.0), need=need)
    option = check(nominal, case, "x")
    assert option.nominal.peak_ppm == pytest.approx(1401.9, abs=0.1)
    assert option.worst_case.peak_ppm == pytest.approx(6866, abs=1)


# --- what a review found -----------------------------------------------------------------------


def test_a_device_of_other_materials_is_completed_in_step():
    """Evidence that names a but not its mate b, which is in full step with it: b moves along."""
    films = by_name(
        film("a", -1200, 1.0, value_percent=40),
        film("b", 1300, 1.2, value_percent=40),
        film("c", 200, value_percent=5),
    )
    need, process = need_of(), full_step("a", "b")
    variation, of = variation_of(films, process), space(films, "mixed", 2, legs=3)
    found = mixed_proposals(of, need, films, 3, None, variation)
    best = min(worst_ppm(p.network, films, need, process)[0] for p in found) * 1e-6
    for part in (1.02, 1.5, 4.0):
        bound = mixed_bound(
            of, need, films, [], best * part, 0.01, variation, [(400.0, {"a": 0.6, "c": 1.01})]
        )
        assert bound <= best * (1 + 1e-9)


@pytest.mark.parametrize("fixed", [("a",), ("a", "c")])
def test_fixed_members_that_are_on_offer_too_are_one_material(fixed):
    films = by_name(
        film("a", 900, 1.0, value_percent=40),
        film("b", -1300, 1.2, value_percent=40),
        film("c", 2500, value_percent=30),
    )
    need, process = need_of(), full_step("a", "b")
    variation = variation_of(films, process)
    of = Space(
        arrangement="mixed",
        materials=("a", "b"),
        most=2,
        min_share=0.0,
        legs=2,
        ohms=1000.0,
        fixed=tuple(leg(name, 300.0 / len(fixed)) for name in fixed),
        fixed_share=(0.3, 0.3),
    )
    found = mixed_proposals(of, need, films, 3, None, variation)
    worst = [worst_case(p.network, films, variation.spreads, need, process) for p in found]
    best = min(w.judged.figure for w in worst)
    devices = [(w.judged.at, w.device.factors) for w in worst]
    for part in (1.02, 1.3):
        bound = mixed_bound(of, need, films, [], best * part, 0.01, variation, devices)
        assert bound <= best * (1 + 1e-6)


def test_evidence_outside_its_piece_or_of_no_side_is_no_evidence():
    films, need = six_films(), need_of()
    variation = variation_of(films)
    for of, own in ((None, "series"), (variation, "parallel")):
        best = search_space(space(films, own, 6), need, films, 1, of)[0]
        good = arrangement_bound(best.space, best.certificate, need, films, 0.05, of)
        nodes = best.certificate.nodes
        hot = tuple(replace(n, temperature=298.15 + 1.06 * (n.temperature - 298.15)) for n in nodes)
        odd = tuple(replace(n, side=2) for n in nodes)
        lost = tuple(replace(n, piece=7) for n in nodes)
        for wrong in (hot, odd, lost, ()):
            evidence = replace(best.certificate, nodes=wrong)
            assert arrangement_bound(best.space, evidence, need, films, 0.05, of) <= good * (1 + 1e-9)
        empty = replace(best.certificate, weights=())
        assert arrangement_bound(best.space, empty, need, films, 0.05, of) == 0.0


def test_a_lower_limit_below_zero_rules_nothing_out():
    """A mask whose wide line lets R fall to nothing at 1.5 times the figure: the tree stays."""
    windows = (
        Window(low=297.15, high=299.15, limit=1e-6),
        Window(low=233.15, high=423.15, limit=0.3),
    )
    need = need_of(Limit(kind="mask", value=1e-6, windows=windows))
    films = by_name(
        film("a", -3000, value_percent=70, tc1_spread_ppm=5),
        film("b", 6000, value_percent=70, tc1_spread_ppm=5),
    )
    variation, rng = variation_of(films), np.random.default_rng(0)
    best = np.inf
    for _ in range(20):
        x = 10 ** rng.uniform(-1, 1, 4)
        inner = Parallel((leg("b", x[1]), Series((leg("a", x[2]), leg("b", x[3])))))
        network = Series((leg("a", x[0]), inner))
        best = min(best, worst_case(network, films, variation.spreads, need).upper)
    of = space(films, "mixed", 2, legs=4, ohms=1000.0)
    ask = device_question(of, need, films, variation, 1.5 * best)
    assert ask.low.min() < 0
    own = ("series", (0, ("parallel", (1, ("series", (0, 1))))))
    assert own in mixed_trees(of)
    assert not none_within([own], ask, {}, most_cells=4000).proved
