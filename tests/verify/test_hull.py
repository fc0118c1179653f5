"""Hulls of cells: no network of a cell leaves them, as linear programmes and plain samples show."""

import numpy as np
import pytest
from makers import brute_ratio, grid, random_films
from scipy.optimize import linprog

from tcplan.network import Leg, Parallel, Series
from tcplan.trees import paired, shape_of, shapes
from tcplan.verify.hull import Cells, Hull, exact, hull_of, inverted, mixed, shares_in, top_members

FILMS = random_films(9, 5)
NAMES = tuple(sorted(FILMS))
T = grid(count=9)
LAWS = np.array([FILMS[name].ratio(T, 298.15) for name in NAMES])
CASES = [(size, k) for size in (2, 3, 4) for k in range(len(shapes(size)))]


def network_of(pair, kinds, x):
    """Return a network of 1 ohm of nested pairs, made here from the meaning of the shares."""

    def node(part, ohms):
        if isinstance(part, int):
            return Leg(material=NAMES[kinds[part]], ohms=ohms)
        share = x[part.share]
        if part.series:
            return Series((node(part.first, ohms * share), node(part.second, ohms * (1 - share))))
        return Parallel((node(part.first, ohms / share), node(part.second, ohms / (1 - share))))

    return node(pair, 1.0)


def escape(vertices, below, above, curve):
    """Return by how much a curve leaves every mix of the vertices, at the node where it is worst."""
    count = len(vertices)
    # About the curve and magnified, so that the programme's tolerance of 1e-10 is 1e-13 here.
    rows = 1e3 * np.vstack([vertices.T - curve[:, None], curve[:, None] - vertices.T])
    bounds = 1e3 * np.r_[below, above]
    known = np.isfinite(bounds)
    result = linprog(
        np.r_[np.zeros(count), 1.0],
        A_ub=np.c_[rows, -np.ones(len(rows))][known],
        b_ub=bounds[known],
        A_eq=np.r_[np.ones(count), 0.0][None, :],
        b_eq=[1.0],
        bounds=[(0, None)] * count + [(None, None)],
        method="highs-ds",
        options={"primal_feasibility_tolerance": 1e-10, "dual_feasibility_tolerance": 1e-10},
    )
    weights = np.maximum(result.x[:count], 0.0)
    mix = weights / weights.sum() @ vertices
    return float(max(np.max(mix - below - curve), np.max(curve - mix - above)))


def box(rng, shares):
    """Return a random box of shares: some small, some that touch 0 or 1, some all there is."""
    ends = np.sort(rng.uniform(0.0, 1.0, (2, shares)), axis=0)
    low, high = ends
    whole = rng.random(shares) < 0.2
    return np.where(whole, 0.0, low), np.where(whole, 1.0, high)


@pytest.mark.parametrize("conductance", [False, True])
@pytest.mark.parametrize(("size", "k"), CASES)
def test_no_member_of_a_cell_leaves_its_hull(size, k, conductance):
    rng = np.random.default_rng(100 * size + 10 * k + conductance)
    pair = paired(shape_of(shapes(size)[k]))
    for _ in range(3):
        kinds = rng.integers(0, len(NAMES), size)
        low, high = box(rng, size - 1)
        cells = Cells(tuple(LAWS[kind][None, :] for kind in kinds), low[None, :], high[None, :])
        hull = hull_of(pair, cells, conductance=conductance)
        for z in (rng.random(size - 1), rng.integers(0, 2, size - 1), rng.beta(0.3, 0.3, size - 1)):
            x = np.clip(low + z * (high - low), 1e-12, 1 - 1e-12)
            curve = brute_ratio(network_of(pair, kinds, x), FILMS, T)
            curve = 1.0 / curve if conductance else curve
            assert escape(hull.vertices[0], hull.below[0], hull.above[0], curve) <= 1e-12


@pytest.mark.parametrize(("size", "k"), CASES)
def test_a_small_cell_has_a_tight_hull(size, k):
    """At one point of the shares nothing is left of the width, and every vertex is the curve."""
    rng = np.random.default_rng(k)
    pair = paired(shape_of(shapes(size)[k]))
    kinds, x = rng.integers(0, len(NAMES), size), rng.uniform(0.1, 0.9, size - 1)
    cells = Cells(tuple(LAWS[kind][None, :] for kind in kinds), x[None, :], x[None, :])
    hull = hull_of(pair, cells, conductance=False)
    curve = brute_ratio(network_of(pair, kinds, x), FILMS, T)
    np.testing.assert_allclose(hull.vertices[0], np.tile(curve, (hull.vertices.shape[1], 1)), rtol=1e-12)
    assert max(hull.below.max(), hull.above.max()) <= 1e-14


def test_the_width_falls_with_the_square_of_the_cell():
    """Halving a cell quarters what a parallel node adds, since (1/sqrt(m) - 1/sqrt(M))^2 is second order."""
    pair = next(paired(shape_of(s)) for s in shapes(3) if s[0] == "parallel" and s[1][-1] != 0)
    widths = []
    for half in (0.2, 0.1, 0.05, 0.025):
        low, high = np.full((1, 2), 0.5 - half), np.full((1, 2), 0.5 + half)
        cells = Cells(tuple(LAWS[kind][None, :] for kind in (0, 1, 2)), low, high)
        hull = hull_of(pair, cells, conductance=False)
        widths.append(float(hull.below.max() + hull.above.max()))
    falls = np.array(widths[:-1]) / np.array(widths[1:])
    assert np.all(falls > 3.0)


def test_the_bend_of_an_inversion_is_reached():
    """Two vertices m and M: the mix that is worst leaves exactly (1/sqrt(m) - 1/sqrt(M))^2.

    1/(mean) against the mean of 1/V at the harmonic-geometric weight, scanned on a grid.
    """
    m, M = 0.6, 1.7
    hull = inverted(Hull(np.array([[[m], [M]]]), np.zeros((1, 1)), np.zeros((1, 1))))
    a = np.linspace(0, 1, 200_001)
    gap = np.max(a / m + (1 - a) / M - 1.0 / (a * m + (1 - a) * M))
    assert hull.below[0, 0] == pytest.approx(gap, rel=1e-8)
    assert hull.above[0, 0] == 0.0


def test_an_inversion_of_a_hull_with_width_holds_its_members():
    rng = np.random.default_rng(4)
    for _ in range(200):
        vertices = rng.uniform(0.3, 2.0, (1, 3, 4))
        below, above = rng.uniform(0, 0.25, (2, 1, 4))
        hull = inverted(Hull(vertices, below, above))
        a = rng.dirichlet(np.ones(3))
        member = a @ vertices[0] + rng.choice([-1.0, 1.0, 0.3], 4) * np.where(
            rng.random(4) < 0.5, 0.0, np.minimum(below, above)[0]
        )
        mix = a @ hull.vertices[0]
        assert np.all(1.0 / member >= mix - hull.below[0] - 1e-12)
        assert np.all(1.0 / member <= mix + hull.above[0] + 1e-12)


def test_nothing_is_known_of_an_inversion_that_may_pass_zero():
    hull = inverted(Hull(np.array([[[0.5, 1.0]]]), np.array([[0.6, 0.1]]), np.array([[0.0, 0.0]])))
    assert np.isinf(hull.below[0, 0])
    assert np.isinf(hull.above[0, 0])
    assert np.isfinite(hull.above[0, 1])


def test_a_mix_of_exact_curves_has_four_corners():
    """x in [0.2, 0.6] of curves 1 and 3: 2.6 at one end, 1.8 at the other."""
    one, three = exact(np.array([[1.0]])), exact(np.array([[3.0]]))
    hull = mixed(np.array([0.2]), np.array([0.6]), one, three)
    np.testing.assert_allclose(hull.vertices[0, :, 0], [2.6, 1.8], rtol=1e-14)
    assert hull.below[0, 0] == hull.above[0, 0] == 0.0


def test_children_of_the_top_node_and_shares_of_a_subtree():
    """(a || b) + c + d: three children; the share of the bundle is inside, the two outer ones are not."""
    tree = ("series", (0, 0, ("parallel", (0, 0))))
    pair = paired(shape_of(tree))
    children = top_members(pair)
    assert [isinstance(child, int) for child in children] == [True, True, False]
    assert sorted(shares_in(pair)) == [0, 1, 2]
    assert [len(shares_in(child)) for child in children] == [0, 0, 1]
