"""Options: nominal figures against brute force, verdicts, proofs and what is said of them."""

import numpy as np
import pytest
from makers import brute_ratio, by_name, film, grid, leg, need_of, over, random_films, random_tree, six_films

from tcplan.goal import Limit
from tcplan.network import Parallel, Series
from tcplan.plan import Proposal
from tcplan.verify.option import Case, check


def case_of(materials, need=None, spread=True, floor_ppm=0.0):
    spreads = {n: m.spread for n, m in materials.items() if m.spread} if spread else {}
    return Case(
        materials=materials, spreads=spreads, over=over(), need=need or need_of(), floor_ppm=floor_ppm
    )


@pytest.mark.parametrize("seed", range(12))
def test_nominal_figures_against_a_dense_grid(seed):
    rng = np.random.default_rng(seed)
    films = random_films(seed, 3)
    network = random_tree(rng, tuple(films), int(rng.integers(1, 6)))
    nominal = check(Proposal(network=network), case_of(films, spread=False), "x").nominal
    T = grid(count=20001)
    drift = (brute_ratio(network, films, T[::20]) - 1) * 1e6
    assert nominal.peak_ppm == pytest.approx(np.max(np.abs(drift)), rel=1e-4)
    assert nominal.band_ppm == pytest.approx(np.ptp(drift), rel=1e-4)
    assert nominal.box_tcr_ppm_per_K == pytest.approx(nominal.band_ppm / 190.0)
    assert nominal.chord_cold_ppm_per_K == pytest.approx(drift[0] / -65.0, rel=1e-9)
    assert nominal.chord_hot_ppm_per_K == pytest.approx(drift[-1] / 125.0, rel=1e-9)


def test_a_maximum_between_grid_nodes_is_not_missed():
    """Independent prototype: 17 fixed nodes once read 196.33 ppm where the truth was 201.57; here
    by the vertex formula.

    drift = a x + b x^2 with its vertex inside: the peak is a^2/(4 b) at x = -a/(2 b).
    """
    a, b = -63.7e-6, 0.5e-6
    films = by_name(film("a", a * 1e6, b * 1e6))
    need = need_of(low=-40, high=88)
    case = Case(materials=films, spreads={}, over=over(-40, 88), need=need)
    nominal = check(Proposal(network=leg("a", 1.0)), case, "x").nominal
    ends = max(abs(a * x + b * x * x) for x in (-65.0, 63.0))
    assert nominal.peak_ppm == pytest.approx(max(a * a / (4 * b), ends) * 1e6, rel=1e-12)


def test_effective_coefficients_of_series_and_parallel():
    """Second order about the reference.

    Series A = sum w a, B = sum w b; parallel A = sum g a, B = sum g b - var(a).
    """
    a, b, c, d = -400e-6, 0.7e-6, 900e-6, 0.3e-6
    films = by_name(film("p", a * 1e6, b * 1e6), film("q", c * 1e6, d * 1e6))
    w, g = 0.7, 0.7
    series = check(Proposal(network=Series((leg("p", w), leg("q", 1 - w)))), case_of(films), "s").nominal
    parallel = check(
        Proposal(network=Parallel((leg("p", 1 / g), leg("q", 1 / (1 - g))))), case_of(films), "p"
    ).nominal
    assert series.tc1_ppm_per_K == pytest.approx((w * a + (1 - w) * c) * 1e6)
    assert series.tc2_ppm_per_K2 == pytest.approx((w * b + (1 - w) * d) * 1e6)
    mean = g * a + (1 - g) * c
    variance = g * a * a + (1 - g) * c * c - mean**2
    assert parallel.tc1_ppm_per_K == pytest.approx(mean * 1e6)
    assert parallel.tc2_ppm_per_K2 == pytest.approx((g * b + (1 - g) * d - variance) * 1e6)


def test_centring_leaves_equal_excursions():
    films = six_films()
    nominal = check(Proposal(network=Series((leg("pp", 2.0), leg("np", 1.0)))), case_of(films), "x").nominal
    ratio = brute_ratio(Series((leg("pp", 2.0), leg("np", 1.0))), films, grid())
    centred = ratio * (1 + nominal.centring_ppm * 1e-6)
    assert np.max(centred) - 1 == pytest.approx(nominal.centred_peak_ppm * 1e-6, rel=1e-5)
    assert 1 - np.min(centred) == pytest.approx(nominal.centred_peak_ppm * 1e-6, rel=1e-5)


@pytest.mark.parametrize(
    ("judge", "limit_ppm", "with_spread", "expected"),
    [
        ("nominal", 4063.0, True, "MET"),
        ("nominal", 4062.0, True, "NOT MET"),
        ("worst-case", 11390.0, True, "MET"),
        ("worst-case", 11388.0, True, "NOT MET"),
        ("worst-case", 90000.0, False, "NOT JUDGED"),
    ],
)
def test_verdicts(judge, limit_ppm, with_spread, expected):
    need = need_of(Limit(kind="drift", value=limit_ppm * 1e-6), judge=judge)
    network = Series((leg("pp", 2 / 3), leg("np", 1 / 3)))
    option = check(Proposal(network=network), case_of(six_films(), need, spread=with_spread), "x")
    assert option.verdict == expected
    assert (option.worst_case is not None) == with_spread


def test_without_a_limit_nothing_is_judged():
    option = check(Proposal(network=leg("pp", 1.0)), case_of(six_films()), "x")
    assert option.verdict == "NOT JUDGED"


def test_without_evidence_the_bound_is_the_floor():
    option = check(Proposal(network=leg("pp", 1.0)), case_of(six_films(), floor_ppm=42.0), "x")
    assert option.proof.kind == "searched"
    assert option.proof.lower_bound_ppm == pytest.approx(42.0)
    assert option.proof.figure_ppm == pytest.approx(option.nominal.peak_ppm)


def test_movers_are_what_the_worst_point_loses_without_them():
    """pp + np at its worst: undoing pp's factor, np's factor, or a TC1, by hand at 150 degC."""
    option = check(Proposal(network=Series((leg("pp", 2 / 3), leg("np", 1 / 3)))), case_of(six_films()), "x")
    movers = {(m.material, m.parameter): m.ppm for m in option.worst_case.movers}
    rp, rn = -1406.25, 30000.0  # drift of each at 150 degC with its TC1 at +40 ppm/K

    def figure(fp, fn, p=rp, n=rn):
        wp, wn = fp * 2 / 3, fn / 3
        return (wp * p + wn * n) / (wp + wn)

    worst = figure(0.8, 1.1)
    assert movers[("np", "tc1")] == pytest.approx(worst - figure(0.8, 1.1, n=rn - 5000.0), rel=1e-6)
    assert movers[("pp", "tc1")] == pytest.approx(worst - figure(0.8, 1.1, p=rp - 5000.0), rel=1e-6)
    assert movers[("pp", "ohm_per_square")] == pytest.approx(worst - figure(1.0, 1.1), rel=1e-6)
    assert len(movers) == 3
