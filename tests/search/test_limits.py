"""Limits on the legs of mixed networks against networks whose legs are measured one by one."""

from dataclasses import replace

import numpy as np
import pytest
from makers import leg

from tcplan.network import legs, shares
from tcplan.plan import Sizes, Space
from tcplan.search.curves import network_at, paths
from tcplan.search.limits import limits_of
from tcplan.trees import paired, shape_of, shapes

NAMES = ("a", "b", "c")
INF = float("inf")
SIZES = Sizes(
    least_ohms=(40.0, 90.0, 0.0),
    most_ohms=(500.0, INF, 800.0),
    area_per_ohm=(1e-12, 3e-12, 2e-12),
    max_area=2e-9,
)


def space(min_share=0.05, sizes=SIZES, **more):
    return Space(
        arrangement="mixed",
        materials=NAMES,
        most=3,
        min_share=min_share,
        ohms=1000.0,
        sizes=sizes,
        legs=4,
        **more,
    )


def excesses(of, network):
    """Return every excess in ln, leg by leg from the network itself; an unnamed leg is fixed."""
    found, area = [], 0.0
    for part, share in zip(legs(network), shares(network), strict=True):
        if part.material == "":
            continue
        k = NAMES.index(part.material)
        if of.min_share > 0:
            found.append(np.log(of.min_share / share))
        if of.sizes.least_ohms[k] > 0:
            found.append(np.log(of.sizes.least_ohms[k] / part.ohms))
        if of.sizes.most_ohms[k] < INF:
            found.append(np.log(part.ohms / of.sizes.most_ohms[k]))
        area += of.sizes.area_per_ohm[k] * part.ohms
    if of.sizes.max_area < INF:
        found.append(np.log(area / of.sizes.max_area))
    return np.array(found)


def cases():
    for size in (3, 4):
        for k, shape in enumerate(shapes(size)):
            rng = np.random.default_rng(10 * size + k)
            yield paired(shape_of(shape)), rng.integers(0, 3, size), rng.uniform(0.02, 0.98, size - 1)


@pytest.mark.parametrize("min_share", [0.0, 0.05])
@pytest.mark.parametrize("max_area", [2e-9, INF])
def test_rows_and_their_worst_are_those_of_the_network(min_share, max_area):
    of = space(min_share, replace(SIZES, max_area=max_area))
    limits = limits_of(of)
    for pair, kinds, x in cases():
        expected = excesses(of, network_at(pair, tuple(NAMES[k] for k in kinds), x, 1000.0))
        rows, _ = limits.rows(paths(pair), tuple(kinds), x)
        np.testing.assert_allclose(rows, expected, atol=1e-10)
        together = limits.excess(paths(pair), kinds[None, :], x[:, None, None])
        assert together[0, 0] == pytest.approx(expected.max(), abs=1e-10)


def test_slopes_of_the_rows_are_those_of_finite_differences():
    limits = limits_of(space())
    for pair, kinds, x in cases():
        _, slopes = limits.rows(paths(pair), tuple(kinds), x)
        for k in range(len(x)):
            step = 1e-6 * np.eye(len(x))[k]
            up, _ = limits.rows(paths(pair), tuple(kinds), x + step)
            down, _ = limits.rows(paths(pair), tuple(kinds), x - step)
            np.testing.assert_allclose(slopes[:, k], (up - down) / 2e-6, rtol=1e-5, atol=1e-6)


def test_the_fixed_members_have_no_limits_of_their_own():
    """A coil of 2 % of the whole beside a least share of 5 %, and no area."""
    of = space(fixed=(leg("coil", 20.0),), fixed_share=(0.02, 0.02))
    limits = limits_of(of)
    pair = paired(shape_of(("series", (0, ("parallel", (0, 0))))))
    kinds, x = (3, 0, 1), np.array([0.02, 0.5])
    network = network_at(pair, ("", "a", "b"), x, 1000.0)
    rows, _ = limits.rows(paths(pair), kinds, x)
    np.testing.assert_allclose(rows, excesses(of, network), atol=1e-10)
    together = limits.excess(paths(pair), np.array([kinds]), x[:, None, None])
    assert together[0, 0] == pytest.approx(rows.max(), abs=1e-12)
    assert not limits.chosen(3)
    assert limits.chosen(2)


def test_whether_anything_is_asked():
    free = Sizes(least_ohms=(0.0,) * 3, most_ohms=(INF,) * 3, area_per_ohm=(1e-12,) * 3)
    assert not limits_of(space(0.0, free)).any
    assert not limits_of(space(0.0, None)).any
    assert limits_of(space(0.01, None)).any
    assert limits_of(space(0.0)).any
    pair = paired(shape_of(shapes(3)[1]))
    rows, slopes = limits_of(space(0.0, free)).rows(paths(pair), (0, 1, 2), np.array([0.3, 0.3]))
    assert rows.shape == (0,)
    assert slopes.shape == (0, 2)
