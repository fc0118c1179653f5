"""Ratios of many trees at once against networks evaluated one leg and one temperature at a time."""

import numpy as np
import pytest
from makers import brute_ratio, grid, random_films

from tcplan.network import legs, shares, value
from tcplan.search.curves import log_ohms, log_shares, network_at, path_slopes, paths, ratio, ratio_and_slopes
from tcplan.trees import paired, shape_of, shapes

FILMS = random_films(5, 5)
NAMES = tuple(sorted(FILMS))
T = grid(count=23)
LAWS = [FILMS[name].ratio(T, 298.15) for name in NAMES]
CASES = [(size, k) for size in (2, 3, 4, 5) for k in range(len(shapes(size)))]
STEP = 1e-6


def case(size, k):
    """Return a shape as pairs, the materials of its legs, and shares: all from the case's numbers."""
    rng = np.random.default_rng(1000 * size + k)
    pair = paired(shape_of(shapes(size)[k]))
    return pair, rng.integers(0, len(NAMES), size), rng.uniform(0.05, 0.95, size - 1)


def network_of(pair, kinds, x, ohms):
    return network_at(pair, tuple(NAMES[k] for k in kinds), x, ohms)


def differences(function, x):
    """Return central differences by every share; their error is about STEP^2 of the function."""
    steps = STEP * np.eye(len(x))
    return [(function(x + step) - function(x - step)) / (2 * STEP) for step in steps]


@pytest.mark.parametrize(("size", "k"), CASES)
def test_ratio_is_that_of_the_network(size, k):
    pair, kinds, x = case(size, k)
    network = network_of(pair, kinds, x, 1234.5)
    assert value(network) == pytest.approx(1234.5, rel=1e-13)
    expected = brute_ratio(network, FILMS, T)
    curves = [LAWS[kind] for kind in kinds]
    np.testing.assert_allclose(ratio(pair, curves, list(x)), expected, rtol=1e-12)
    np.testing.assert_allclose(ratio_and_slopes(pair, curves, x)[0], expected, rtol=1e-12)


@pytest.mark.parametrize(("size", "k"), CASES)
def test_slopes_of_the_ratio_are_those_of_finite_differences(size, k):
    pair, kinds, x = case(size, k)
    _, slopes = ratio_and_slopes(pair, [LAWS[kind] for kind in kinds], x)

    def by_hand(at):
        return brute_ratio(network_of(pair, kinds, at, 1.0), FILMS, T)

    assert sorted(slopes) == list(range(size - 1))
    for share, expected in enumerate(differences(by_hand, x)):
        np.testing.assert_allclose(slopes[share], expected, rtol=1e-6, atol=1e-8)


@pytest.mark.parametrize(("size", "k"), CASES)
def test_logarithms_of_shares_and_values_are_those_of_the_network(size, k):
    pair, kinds, x = case(size, k)
    network = network_of(pair, kinds, x, 50.0)
    routes = paths(pair)
    assert len(routes) == size
    np.testing.assert_allclose([np.exp(log_shares(p, x)) for p in routes], shares(network), rtol=1e-12)
    ohms = [leg.ohms / 50.0 for leg in legs(network)]
    np.testing.assert_allclose([np.exp(log_ohms(p, x)) for p in routes], ohms, rtol=1e-12)


@pytest.mark.parametrize(("size", "k"), CASES)
def test_path_slopes_are_those_of_finite_differences(size, k):
    pair, kinds, x = case(size, k)
    for leg, path in enumerate(paths(pair)):

        def own_ohms(at, leg=leg):
            return np.log(legs(network_of(pair, kinds, at, 1.0))[leg].ohms)

        def own_share(at, leg=leg):
            return np.log(shares(network_of(pair, kinds, at, 1.0))[leg])

        for of_ohms, function in ((True, own_ohms), (False, own_share)):
            got = path_slopes(path, x, of_ohms=of_ohms)
            np.testing.assert_allclose(got, differences(function, x), rtol=1e-6, atol=1e-7)


def test_arrays_of_trees_and_points_broadcast():
    """Two assignments of one shape at three points, at once and one by one."""
    pair, _, _ = case(4, 7)
    rng = np.random.default_rng(2)
    kinds, x = rng.integers(0, len(NAMES), (2, 4)), rng.uniform(0.1, 0.9, (3, 2, 3))
    curves = [np.array([LAWS[kind] for kind in kinds[:, leg]])[:, None, :] for leg in range(4)]
    together = ratio(pair, curves, [row[..., None] for row in x])
    assert together.shape == (2, 3, len(T))
    for tree in range(2):
        for point in range(3):
            network = network_of(pair, kinds[tree], x[:, tree, point], 7.0)
            np.testing.assert_allclose(together[tree, point], brute_ratio(network, FILMS, T), rtol=1e-12)
            for leg, path in enumerate(paths(pair)):
                assert log_ohms(path, x)[tree, point] == pytest.approx(
                    np.log(legs(network)[leg].ohms / 7.0), abs=1e-12
                )


def test_a_single_leg_has_no_shares():
    curve, slopes = ratio_and_slopes(0, [LAWS[2]], np.empty(0))
    np.testing.assert_array_equal(curve, LAWS[2])
    assert slopes == {}
    assert paths(0)[0].steps == ()
    assert log_ohms(paths(0)[0], np.empty(0)) == 0.0
