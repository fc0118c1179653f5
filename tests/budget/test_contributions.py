"""The classes of spread sum to the worst case, exactly, at every temperature."""

from __future__ import annotations

from dataclasses import replace
from itertools import product

import numpy as np
import pytest
from makers import by_name, film, leg, need_of, over, random_films, random_tree

from tcplan.budget.case import Case
from tcplan.budget.contributions import CLASSES, class_extremes, one_comparison
from tcplan.goal import Limit
from tcplan.network import Network, Parallel, Series, deviated, resistance, used_materials, value
from tcplan.worst.box import Box
from tcplan.worst.evaluation import worst_case

NEED = need_of(Limit(kind="drift", value=0.01), judge="worst-case")


def spread_films(seed: int) -> dict:
    """Return three random films with a spread of value, TC1 and TC2."""
    films = random_films(seed, 3)
    return {
        name: replace(m, spread=replace(m.spread, tc2=0.05e-6, value=0.08 + 0.04 * k))
        for k, (name, m) in enumerate(films.items())
    }


def box_of(network: Network, materials: dict) -> Box:
    return Case(materials=materials, over=over(), need=NEED).box(network)


def networks(seed: int) -> list[Network]:
    rng = np.random.default_rng(seed)
    names = tuple(random_films(1, 3))
    a, b, c = (leg(name, float(10 ** rng.uniform(2, 4))) for name in names)
    return [
        a,
        Series((a, b, c)),
        Parallel((a, b, c)),
        random_tree(rng, names, 3),
        Parallel((Series((a, b)), c)),
    ]


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("which", range(5))
def test_the_classes_sum_to_the_worst_case(seed: int, which: int) -> None:
    """`tcplan.worst` reaches its figure with a named device and bounds all others: an account apart."""
    network, materials = networks(seed)[which], spread_films(seed)
    box = box_of(network, materials)
    worst = worst_case(network, materials, box.spreads, NEED)
    up, down = class_extremes(box, np.array([worst.judged.at]))
    added_up, added_down = np.diff(up, axis=0, prepend=0.0), np.diff(down, axis=0, prepend=0.0)
    assert len(added_up) == len(CLASSES)
    total = max(added_up.sum(), -added_down.sum())
    # One node is exact; a mixed network is a bound, at most 1 part in 10^4 of the larger side wide.
    slack = 1e-9 if one_comparison(box) else 2.5e-4 * max(up[-1, 0], -down[-1, 0])
    assert worst.judged.figure - 1e-12 <= total <= worst.judged.figure + slack


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("which", range(5))
def test_no_corner_is_beyond_a_class_and_some_reach_it(seed: int, which: int) -> None:
    """Brute force: all corners of the spreads, class by class, at three temperatures."""
    network, materials = networks(seed)[which], spread_films(seed)
    box = box_of(network, materials)
    T = np.array([233.15, 350.0, 423.15])
    up, down = class_extremes(box, T)
    for k in range(len(CLASSES)):
        reached = np.array([corner - 1.0 for corner in corners(network, materials, T, k)])
        assert (reached.max(axis=0) <= up[k] + 1e-12).all()
        assert (reached.min(axis=0) >= down[k] - 1e-12).all()
        if k < 3 or one_comparison(box):
            assert reached.max(axis=0) == pytest.approx(up[k], abs=1e-12)
            assert reached.min(axis=0) == pytest.approx(down[k], abs=1e-12)


def corners(network: Network, materials: dict, T: np.ndarray, k: int):
    """Yield R(T)/R(T_ref) of every corner of the first k classes: TC1, TC2, values."""
    names = used_materials(network)
    sides = [(-1, 1) if k >= n else (0,) for n in (1, 2, 3)]
    for signs in product(*(s for s in sides for _ in names)):
        a, b, v = (signs[n * len(names) : (n + 1) * len(names)] for n in range(3))
        ratios, factors = {}, {}
        for j, name in enumerate(names):
            spread, law = materials[name].spread, materials[name].law
            x = T - law.reference
            tc1, tc2 = law.coefficients
            ratios[name] = 1 + (tc1 + a[j] * spread.tc1) * x + (tc2 + b[j] * spread.tc2) * x**2
            factors[name] = 1 + v[j] * spread.value
        device = deviated(network, factors)
        yield resistance(device, ratios) / value(device)


def test_a_quick_bound_is_never_below_an_exact_one() -> None:
    materials = spread_films(2)
    box = box_of(networks(2)[4], materials)
    T = np.linspace(233.15, 423.15, 9)
    quick, exact = class_extremes(box, T, exact=False), class_extremes(box, T)
    assert (quick[0] >= exact[0] - 1e-15).all()
    assert (quick[1] <= exact[1] + 1e-15).all()
    assert np.abs(quick[0][-1] - exact[0][-1]).max() < 0.02 * exact[0][-1].max()


def test_a_single_leg_has_no_ratio() -> None:
    """One film: its value cancels, whatever its spread; TC1 alone moves it by a |x| (by hand)."""
    one = by_name(film("a", 100.0, 0.5, value_percent=20.0, tc1_spread_ppm=30.0))
    up, down = class_extremes(box_of(leg("a", 1e3), one), np.array([398.15, 298.15]))
    assert np.diff(up[:, 0]) * 1e6 == pytest.approx([3000.0, 0.0, 0.0], abs=1e-6)
    assert np.diff(down[:, 0]) * 1e6 == pytest.approx([-3000.0, 0.0, 0.0], abs=1e-6)
    assert up[0, 0] * 1e6 == pytest.approx(100.0 * 100 + 0.5 * 100**2)
    assert np.abs(up[:, 1]).max() == pytest.approx(0.0, abs=1e-15)
