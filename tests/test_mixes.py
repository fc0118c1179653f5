"""The polytope of shares of one support: it holds all that can be made, and its vertices can be made."""

from dataclasses import replace

import numpy as np
import pytest
from makers import leg
from scipy.optimize import linprog

from tcplan.mixes import (
    all_supports,
    area_of,
    fixed_ends,
    fixed_group,
    share_vertices,
    simplex_vertices,
    tangent_row,
)
from tcplan.network import value
from tcplan.plan import Sizes, Space

INF = float("inf")
NAMES = ("a", "b", "c", "d")
COILS = (leg("x", 300.0), leg("y", 100.0))


def space(kind, min_share=0.0, most=4, **more):
    return Space(arrangement=kind, materials=NAMES, most=most, min_share=min_share, **more)


def sizes(least=0.0, most=INF, per_ohm=0.0, max_area=INF):
    """Return limits that differ from material to material by round factors."""
    factors = np.array([1.0, 2.0, 0.5, 1.5])
    return Sizes(
        least_ohms=tuple(least * factors),
        most_ohms=tuple(most * factors) if most < INF else (INF,) * 4,
        area_per_ohm=tuple(per_ohm * factors),
        max_area=max_area,
    )


def leg_ohms(of, support, points):
    """Return the values of the legs by Ohm's law alone, shape (points, legs)."""
    parallel = of.arrangement == "parallel"
    total = of.ohms
    if total is None:
        own = 400.0 if not parallel else 75.0  # 300 + 100, and 300 || 100
        total = (own * points[:, -1] if parallel else own / points[:, -1])[:, None]
    part = points[:, list(support)]
    with np.errstate(divide="ignore"):
        return total / part if parallel else total * part


def can_be_made(of, support, points, slack=0.0):
    """Whether shares keep every limit, each from its own definition, to a relative slack."""
    where = list(support)
    low, high = of.fixed_share
    fine = np.all(points[:, where] >= of.min_share * (1.0 - slack), axis=1)
    fine &= (points[:, -1] >= low - 1e-12) & (points[:, -1] <= high + 1e-12)
    if of.sizes is None:
        return fine
    ohms = leg_ohms(of, support, points)
    fine &= np.all(ohms >= np.array(of.sizes.least_ohms)[where] * (1 - slack), axis=1)
    fine &= np.all(ohms <= np.array(of.sizes.most_ohms)[where] * (1 + slack), axis=1)
    if of.sizes.max_area < INF:
        fine &= ohms @ np.array(of.sizes.area_per_ohm)[where] <= of.sizes.max_area * (1 + slack)
    return fine


def thrown(of, support, rng, spread=1.0, count=20_000):
    """Return shares thrown at random over the simplex, whether they can be made or not."""
    u = rng.uniform(*of.fixed_share, count)
    points = np.zeros((count, len(NAMES) + 1))
    points[:, list(support)] = (1.0 - u)[:, None] * rng.dirichlet(np.full(len(support), spread), count)
    points[:, -1] = u
    return points


def random_points(of, support, count, rng):
    """Return shares that can be made, kept from many that are thrown."""
    found = np.zeros((0, len(NAMES) + 1))
    for spread in (0.5, 1.0, 3.0):
        points = thrown(of, support, rng, spread)
        found = np.vstack([found, points[can_be_made(of, support, points)][:count]])
    assert len(found) >= 2
    return found


def outside(vertices, x):
    """Return how far a point is from the hull of some vertices, in the largest coordinate."""
    count, width = vertices.shape
    shares = np.c_[vertices.T, -np.ones(width)], np.c_[-vertices.T, -np.ones(width)]
    result = linprog(
        np.r_[np.zeros(count), 1.0],
        A_ub=np.vstack(shares),
        b_ub=np.r_[x, -x],
        A_eq=np.r_[np.ones(count), 0.0][None, :],
        b_eq=[1.0],
        method="highs",
    )
    return float(result.fun)


LIMITS = {
    "no limits": {"min_share": 0.0},
    "least share": {"min_share": 0.08},
    "values, series": {"sizes": sizes(least=120.0, most=450.0), "ohms": 1000.0},
    "values, parallel": {"kind": "parallel", "sizes": sizes(least=900.0, most=6000.0), "ohms": 1000.0},
    "least value and share": {"min_share": 0.1, "sizes": sizes(least=150.0), "ohms": 1000.0},
    # Areas of films are small numbers in m^2: 500 ohm of 1 um^2 each.
    "area, series": {"sizes": sizes(per_ohm=1e-12, max_area=9e-10), "ohms": 1000.0},
    "area and values, series": {
        "sizes": sizes(least=50.0, most=700.0, per_ohm=1e-12, max_area=1.1e-9),
        "ohms": 1000.0,
        "min_share": 0.03,
    },
    "fixed, total given": {
        "sizes": sizes(least=80.0, most=500.0),
        "ohms": 1000.0,
        "fixed": COILS,
        "fixed_share": (0.4, 0.4),
    },
    "fixed, total free, series": {
        "sizes": sizes(least=60.0, most=500.0),
        "fixed": COILS,
        "fixed_share": (0.1, 0.9),
    },
    "fixed, total free, parallel": {
        "kind": "parallel",
        "sizes": sizes(least=60.0, most=1500.0),
        "fixed": COILS,
        "fixed_share": (0.1, 0.9),
        "min_share": 0.02,
    },
    "fixed, area, series": {
        "sizes": sizes(per_ohm=2e-12, max_area=2.5e-9),
        "fixed": COILS,
        "fixed_share": (0.15, 1.0),
    },
}
SUPPORTS = ((1,), (0, 2), (0, 1, 3), (0, 1, 2, 3))


def space_of(name):
    return space(**{"kind": "series", **LIMITS[name]})


@pytest.mark.parametrize("name", LIMITS)
def test_every_mix_that_can_be_made_is_in_the_hull_and_every_vertex_can_be_made(name):
    of, rng, tried = space_of(name), np.random.default_rng(len(name)), 0
    for support in SUPPORTS:
        vertices = share_vertices(of, support)
        if not len(vertices):
            continue
        tried += 1
        np.testing.assert_allclose(vertices.sum(axis=1), 1.0, atol=1e-12)
        others = [i for i in range(len(NAMES)) if i not in support]
        assert np.all(vertices[:, others] == 0)
        assert can_be_made(of, support, vertices, slack=1e-8).all()
        if len(support) > 1:
            assert all(outside(vertices, x) <= 1e-9 for x in random_points(of, support, 5, rng))
    assert tried >= 2


@pytest.mark.parametrize("name", LIMITS)
def test_a_support_without_vertices_can_not_be_made(name):
    """Nothing of 20 000 random points can be made where no vertex is left."""
    of, rng = space_of(name), np.random.default_rng(3)
    for support in all_supports(of)[0]:
        if len(share_vertices(of, support)):
            continue
        assert not can_be_made(of, support, thrown(of, support, rng)).any()


def test_the_vertices_of_least_shares_by_hand():
    """Three materials of at least 0.1: one takes the other 0.8."""
    vertices = simplex_vertices(space("series", 0.1), (0, 1, 3))
    expected = [[0.8, 0.1, 0, 0.1, 0], [0.1, 0.8, 0, 0.1, 0], [0.1, 0.1, 0, 0.8, 0]]
    np.testing.assert_allclose(vertices, expected, atol=1e-15)


def test_two_legs_between_their_limits_by_hand():
    """Total 1000: a from 120 to 450 and b from 240 to 900, so a holds 0.12 to 0.45 of the whole."""
    of = space_of("values, series")
    vertices = share_vertices(of, (0, 1))
    np.testing.assert_allclose(sorted(vertices[:, 0]), [0.12, 0.45], atol=1e-12)
    of = space_of("values, parallel")  # a from 900 to 6000, b from 1800 to 12000: b holds 1/12 to 5/9
    vertices = share_vertices(of, (0, 1))
    np.testing.assert_allclose(sorted(vertices[:, 1]), [1 / 12, 5 / 9], atol=1e-12)


@pytest.mark.parametrize(
    ("of", "support"),
    [
        (space("series", 0.26), (0, 1, 2, 3)),
        (space("series", ohms=1000.0, sizes=sizes(least=1100.0)), (0,)),
        (space("series", ohms=1000.0, sizes=sizes(most=300.0)), (0, 2)),
        (space("parallel", ohms=1000.0, sizes=sizes(most=1500.0)), (0, 2)),
        (space("parallel", ohms=1000.0, sizes=sizes(least=2500.0)), (0, 3)),
        (space("series", ohms=1000.0, sizes=sizes(per_ohm=1e-12, max_area=4.9e-10)), (2, 3)),
        (space("series", 0.2, fixed=COILS, fixed_share=(0.7, 0.7), ohms=4e3 / 7), (0, 1)),
    ],
)
def test_a_support_that_can_not_be_made_is_empty(of, support):
    assert share_vertices(of, support).shape == (0, len(NAMES) + 1)


# --- the area of a parallel mix ---------------------------------------------------------------


AREA = space("parallel", ohms=1000.0, sizes=sizes(per_ohm=1e-12, max_area=1.6e-8))


@pytest.mark.parametrize("support", [(0, 2), (0, 1, 2), (0, 2, 3)])
def test_tangents_cut_off_no_mix_that_can_be_made(support):
    rng = np.random.default_rng(len(support))
    points = random_points(AREA, support, 10, rng)
    tangents = [tuple(x) for x in rng.dirichlet(np.full(len(support), 0.7), 12) if x.min() > 1e-6]
    hulls = [share_vertices(AREA, support, tangents[:count]) for count in (0, 2, len(tangents))]
    for vertices in hulls:
        assert all(outside(vertices, x) <= 1e-9 for x in points)
    worst = [max(area_or_inf(v) for v in vertices) for vertices in hulls]
    assert worst[2] <= worst[1] <= worst[0]


def area_or_inf(shares):
    used = shares[:-1] > 0
    if used.sum() < 2:
        return INF
    return area_of(AREA, shares)


def test_more_tangents_leave_less_beyond_the_limit():
    """Tangents at what was left: the largest area of a vertex comes down to the limit."""
    support, tangents, areas = (0, 2), [(0.5, 0.5)], []
    for _ in range(12):
        vertices = share_vertices(AREA, support, tangents)
        worst = max(vertices, key=area_or_inf)
        areas.append(area_or_inf(worst))
        tangents.append((worst[0], worst[2]))
    assert areas[-1] <= AREA.sizes.max_area * (1 + 1e-6)
    assert areas[0] > 1.05 * AREA.sizes.max_area


def test_a_tangent_touches_the_area_where_it_is_laid():
    """The gradient of sum a/g by hand: -a/g^2."""
    at = (0.3, 0.2, 0.5)
    row, bound = tangent_row(AREA, (0, 1, 2), at)
    a = np.array([1.0, 2.0, 0.5]) * 1e-12 * 1000.0
    g = np.array(at)
    np.testing.assert_allclose(row[:3], -a / g**2, rtol=1e-14)
    excess = np.r_[at, 0.0, 0.0] @ row - bound
    assert excess == pytest.approx(np.sum(a / g) - 1.6e-8, abs=1e-20)


def test_a_tangent_needs_a_limit_and_a_total():
    with pytest.raises(ValueError, match="given total"):
        tangent_row(space("parallel"), (0, 1), (0.5, 0.5))


def test_area_by_hand():
    """1000 ohm of 1e-12 m^2/ohm (a) and 2e-12 (b): by Ohm's law 4000 || 4000/3, and 250 + 750."""
    x = np.array([0.25, 0.75, 0.0, 0.0, 0.0])
    assert area_of(AREA, x) == pytest.approx(4000e-12 + 2 * 4000e-12 / 3, rel=1e-14)
    series = space("series", ohms=1000.0, sizes=sizes(per_ohm=1e-12, max_area=1.0))
    assert area_of(series, x) == pytest.approx(250e-12 + 2 * 750e-12, rel=1e-14)


# --- parts ------------------------------------------------------------------------------------


def test_a_triangle_cut_by_a_line_by_hand():
    """Three materials of any share, the second of at most half the whole: four corners."""
    of = space("series", ohms=1000.0, sizes=replace(sizes(), most_ohms=(INF, 500.0, INF, INF)))
    corners = share_vertices(of, (0, 1, 2))
    expected = [[0, 0, 1, 0, 0], [0, 0.5, 0.5, 0, 0], [0.5, 0.5, 0, 0, 0], [1, 0, 0, 0, 0]]
    np.testing.assert_allclose(sorted(corners.tolist()), expected, atol=1e-14)


@pytest.mark.parametrize("unit", [1e-15, 1e-12, 1e-9, 1.0, 1e6])
def test_the_vertices_do_not_depend_on_the_unit_of_area(unit):
    """1000 ohm of which a takes 1, b 2 and c 1/2 of a unit of area an ohm, 900 units at most.

    By hand: c alone takes 500, a alone 1000; on the edge from c to a, 0.8 of a; to b, 4/15 of b.
    """
    of = space("series", ohms=1000.0, sizes=sizes(per_ohm=unit, max_area=900.0 * unit))
    corners = share_vertices(of, (0, 1, 2))
    expected = [[0, 0, 1, 0, 0], [0, 4 / 15, 11 / 15, 0, 0], [0.8, 0, 0.2, 0, 0]]
    np.testing.assert_allclose(sorted(corners.tolist()), expected, atol=1e-12)


def test_many_limits_leave_few_vertices():
    """Six legs of 50 to 400 of 1000: every vertex has all but one leg at a limit, so at most 6 * 2^5."""
    names = tuple("abcdef")
    limits = Sizes(least_ohms=(50.0,) * 6, most_ohms=(400.0,) * 6, area_per_ohm=(1e-12,) * 6)
    of = Space(arrangement="series", materials=names, most=6, min_share=0.0, ohms=1000.0, sizes=limits)
    vertices = share_vertices(of, range(6))
    at_limit = np.isclose(vertices[:, :6], 0.05, atol=1e-9) | np.isclose(vertices[:, :6], 0.4, atol=1e-9)
    assert np.all(at_limit.sum(axis=1) >= 5)
    # Four at 50, one at 400, and the last one takes 400 = 1000 - 4 * 50 - 400: 15 of them.
    assert len(vertices) == 15


def test_the_share_of_the_fixed_members():
    bounded = space("series", fixed=COILS, fixed_share=(0.2, 0.6))
    assert fixed_ends(bounded, 0.0) == (0.2, 0.6)
    assert fixed_ends(bounded, 0.5) == (0.2, 0.5)
    assert fixed_ends(bounded, 0.9) == ()
    assert fixed_ends(space("series"), 0.5) == (0.0,)
    assert value(fixed_group(bounded)) == 400.0
    assert value(fixed_group(space("parallel", fixed=COILS))) == pytest.approx(75.0, rel=1e-14)
    assert value(fixed_group(space("mixed", fixed=COILS, fixed_in_parallel=True))) == pytest.approx(75.0)
    assert value(fixed_group(space("mixed", fixed=COILS))) == 400.0
    assert fixed_group(space("series")) is None


def test_supports_by_size():
    """Without least shares the largest supports hold the smaller ones: 6 pairs of four; else 4 and 6."""
    assert [len(group) for group in all_supports(space("series", most=2))] == [6]
    assert [len(group) for group in all_supports(space("series", 0.1, most=2))] == [4, 6]
    sized = space("series", most=3, ohms=1000.0, sizes=sizes(least=1.0))
    assert [len(group) for group in all_supports(sized)] == [4, 6, 4]
