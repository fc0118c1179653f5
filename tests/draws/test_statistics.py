"""Statistics against published values and against all figures at once."""

import numpy as np
import pytest

from tcplan.draws.products import own_products, product
from tcplan.draws.statistics import (
    Tally,
    bin_of,
    capability,
    clopper_pearson,
    middle_of,
    moments_of,
    quantile_ranks,
    tolerance_factor,
    variance_shares,
)


def test_exact_binomial_interval():
    # NIST/SEMATECH e-Handbook 7.2.4, and the reference values of scipy's own tests.
    assert clopper_pearson(4, 20, 0.90) == pytest.approx((0.0713539, 0.4010281), rel=1e-6)
    assert clopper_pearson(20, 100) == pytest.approx((0.1266555521, 0.2918426891), rel=1e-6)
    assert clopper_pearson(0, 10) == pytest.approx((0.0, 0.3084971), rel=1e-6)


def test_no_failure_supports_a_bound_only():
    # All n inside: (alpha/2)^(1/n), any text on the exact interval.
    low, high = clopper_pearson(1000, 1000)
    assert high == 1.0
    assert low == pytest.approx(0.025 ** (1 / 1000), rel=1e-12)


@pytest.mark.parametrize(("count", "quantile"), [(50, 0.5), (1000, 0.9), (20_000, 0.9973), (10**9, 0.9973)])
def test_ranks_of_a_quantile(count, quantile):
    from scipy.stats import binom

    rank, low, high = quantile_ranks(count, quantile)
    assert rank == int(np.ceil(quantile * count))
    # Order statistics: the rank of the quantile is binomial (David and Nagaraja, from memory).
    assert binom.cdf(low - 1, count, quantile) <= 0.025 + 1e-9
    assert 1 - binom.cdf(high - 1, count, quantile) <= 0.025 + 1e-9
    assert binom.cdf(low, count, quantile) > 0.025
    assert 1 - binom.cdf(high - 2, count, quantile) > 0.025


def test_few_draws_support_no_upper_end():
    _, _, high = quantile_ranks(500, 0.9973)
    assert high > 500


def tally_of(figures):
    tally = Tally()
    for part in np.array_split(figures, 7):
        bins = bin_of(part)
        tally.add(int(bins.min()), np.bincount(bins - bins.min()))
        tally.add_moments([moments_of(part)])
        tally.least, tally.largest = min(tally.least, part.min()), max(tally.largest, part.max())
    return tally


@pytest.mark.parametrize("scale", [1e-8, 3e-3, 40.0])
def test_streamed_statistics_are_those_of_all_figures(scale):
    figures = scale * np.random.default_rng(4).gamma(2.0, size=50_000)
    tally = tally_of(figures)
    ordered = np.sort(figures)
    for rank in (1, 2, 700, 25_000, 49_865, 50_000):
        assert tally.order_statistics([rank])[0] == pytest.approx(ordered[rank - 1], rel=1e-4)
    assert tally.moments.mean == pytest.approx(figures.mean(), rel=1e-12)
    assert tally.moments.sigma == pytest.approx(figures.std(ddof=1), rel=1e-12)
    edges, counts = tally.coarse()
    assert len(edges) == len(counts) + 1
    assert sum(counts) == 50_000
    assert (edges[0], edges[-1]) == (ordered[0], ordered[-1])
    whole = np.histogram(figures, edges)[0]
    assert np.abs(np.cumsum(counts) - np.cumsum(whole)).max() <= 50


def test_bins_and_their_middles():
    figures = np.exp(np.random.default_rng(1).uniform(np.log(1e-11), np.log(1e6), 1000))
    assert middle_of(bin_of(figures.copy())) == pytest.approx(figures, rel=1 / 16384 + 1e-12)
    assert middle_of(bin_of(np.zeros(1)))[0] == 0.0
    same = tally_of(np.full(100, 0.25))
    assert same.order_statistics([50])[0] == 0.25
    assert sum(same.coarse()[1]) == 100


def test_capability():
    # Cpk = the nearer limit less the mean, over 3 sigma: common practice (ISO 22514-2, from memory).
    drift = np.array([[3.0, 5.0, 3.0, 5.0], [-1.0, 1.0, -1.0, 1.0], [2.0, 2.0, 2.0, 2.0]])
    sigma = np.sqrt(4 / 3)  # by hand: four values one off their mean
    assert capability(np.array([10.0, 10.0, 10.0]), drift) == pytest.approx(6.0 / (3 * sigma))
    assert capability(np.array([10.0, 2.0, 10.0]), drift) == pytest.approx(2.0 / (3 * sigma))
    assert capability(np.array([10.0]), drift[2:]) is None
    assert capability(np.array([10.0]), drift[:1, :1]) is None


def test_shares_of_variance():
    rng = np.random.default_rng(2)
    x = rng.standard_normal((3, 200_000)) * np.array([[1.0], [2.0], [5.0]])
    y = 3.0 + 4.0 * x[0] - 1.5 * x[1]
    table = np.concatenate([np.ones((1, 200_000)), x, y[None]])
    # Var(4 a) = 16 and Var(1.5 b) = 9 with sigma 1 and 2: shares 16/25 and 9/25, from the definition.
    assert variance_shares(table @ table.T) == pytest.approx([0.64, 0.36, 0.0], abs=0.01)
    table[-1] = 7.0
    assert np.all(variance_shares(table @ table.T) == 0.0)


@pytest.mark.parametrize("lots", [1, 100, 8192])
def test_products_in_pieces_are_products(lots):
    rng = np.random.default_rng(1)
    matrix, values = rng.standard_normal((35, 17)), rng.standard_normal((17, lots))
    assert product(matrix, values) == pytest.approx(matrix @ values, rel=1e-12, abs=1e-12)
    assert own_products(values) == pytest.approx(values @ values.T, rel=1e-12, abs=1e-9)


def test_the_tolerance_factor():
    # NIST/SEMATECH e-Handbook 7.2.6.3: 43 values, 90 % coverage at 99 % confidence, Howe: 2.2173159.
    assert tolerance_factor(43, 0.90, 0.99) == pytest.approx(2.2173159, abs=1e-6)
    with pytest.raises(ValueError, match="two values"):
        tolerance_factor(1, 0.9, 0.99)
