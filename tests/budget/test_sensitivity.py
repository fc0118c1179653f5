"""Exact derivatives against central finite differences of the judged figure."""

from __future__ import annotations

import numpy as np
import pytest
from makers import by_name, film, leg, need_of, random_films, random_tree

from tcplan.budget.sensitivity import figure_rates, peaks, sensitivities
from tcplan.goal import Limit, Requirement, judged
from tcplan.material.law import Polynomial
from tcplan.material.spread import Spread
from tcplan.network import Network, Parallel, Series, used_materials
from tcplan.worst.box import Box, Device

STEP = {"value": 1e-6, "tc1": 1e-9, "tc2": 1e-12}
NEEDS = [
    need_of(Limit(kind="drift", value=0.01)),
    need_of(Limit(kind="band", value=0.01)),
    need_of(Limit(kind="chord_tcr", value=1e-4)),
    need_of(Limit(kind="drift", value=0.01), wanted=Polynomial(reference=298.15, coefficients=(2e-4, 1e-7))),
]


def figure(
    network: Network, materials: dict, need: Requirement, name: str, parameter: str, by: float
) -> float:
    """Return the judged figure of the device that is off in one parameter, by `tcplan.goal.judged`."""
    names = used_materials(network)
    none = {n: Spread(meaning="limits") for n in names}
    factors, shifts = dict.fromkeys(names, 1.0), dict.fromkeys(names, (0.0, 0.0))
    if parameter == "value":
        factors[name] = float(np.exp(by))
    else:
        shifts[name] = (by, 0.0) if parameter == "tc1" else (0.0, by)
    curve = Box(network, materials, none, need).curve(Device(factors, shifts))
    return judged(curve, need).figure


@pytest.mark.parametrize("need", NEEDS, ids=lambda need: need.kind)
@pytest.mark.parametrize("seed", range(4))
def test_rates_are_the_finite_differences(need: Requirement, seed: int) -> None:
    films = random_films(seed, 3)
    # one material with a reference of its own, 20 K from that of the goal
    films["m01"] = film("m01", 400.0, 1.1, reference=318.15)
    network = random_tree(np.random.default_rng(seed), tuple(films), 4)
    rates = figure_rates(network, films, need)
    for (name, parameter), rate in rates.more.items():
        h = STEP[parameter]
        up, down = (figure(network, films, need, name, parameter, by) for by in (h, -h))
        assert rate == pytest.approx((up - down) / (2 * h), rel=2e-5, abs=2e-5 / h * 1e-9)
        assert rates.less[name, parameter] == pytest.approx(-rate)


def test_a_shared_peak_costs_both_ways() -> None:
    """-150 and 150 in series: flat TC1; TC2 0.5 against a TC1 that makes both ends equal, by hand.

    Drift a x + b x^2 at x = -65 and 125 is equal when a = -60 b: b = 0.5 ppm/K^2, a = -30 ppm/K gives
    4062.5 ppm at both ends, which then turn opposite ways.
    """
    one = by_name(film("a", -30.0, 0.5))
    need = NEEDS[0]
    assert len(peaks(leg("a", 1e3), one, need)) == 2
    [tc1] = [s for s in sensitivities(leg("a", 1e3), one, need) if s.parameter == "tc1"]
    assert tc1.step == "10 ppm/K"
    assert tc1.more_ppm == pytest.approx(10 * 125.0)
    assert tc1.less_ppm == pytest.approx(10 * 65.0)


def test_a_share_by_hand() -> None:
    """a + b, 1:1, 200 and 0 ppm/K: at 125 K the drift is 12500 ppm, the share of a 1.025/2.025.

    d drift/d ln R_a = (1.025/2.025 - 1/2) 1.0125 = 0.00625: 1 % more of a costs 62.5 ppm, of b it saves 62.5.
    """
    pair = by_name(film("a", 200.0), film("b", 0.0))
    found = {
        (s.material, s.parameter): s
        for s in sensitivities(Series((leg("a", 1e3), leg("b", 1e3))), pair, NEEDS[0])
    }
    assert found["a", "value"].more_ppm == pytest.approx(62.5)
    assert found["b", "value"].more_ppm == pytest.approx(-62.5)
    assert found["b", "value"].less_ppm == pytest.approx(62.5)
    assert found["a", "tc1"].more_ppm == pytest.approx(10 * 125 / 2)


def test_the_dearest_comes_first() -> None:
    network = Parallel((leg("m00", 1e3), leg("m01", 2e3)))
    found = sensitivities(network, random_films(3, 2), NEEDS[0])
    sizes = [max(abs(s.more_ppm), abs(s.less_ppm)) for s in found]
    assert sizes == sorted(sizes, reverse=True)
    assert len(found) == 6
