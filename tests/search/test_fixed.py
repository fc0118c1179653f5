"""Members that are given: the total fixed, bounded or free, in series and in parallel."""

import numpy as np
import pytest
from makers import brief, by_name, film, need_of, over

from tcplan.goal import Limit
from tcplan.network import Leg, legs, value
from tcplan.plan import Sizes, Space
from tcplan.search.linear import least_total, search_space
from tcplan.search.mixed_search import mixed_proposals
from tcplan.verify.option import Case, check, nominal_figure
from tcplan.verify.tree_bound import MixedBound
from tcplan.workflow.planning import make_plan

TEXT = """
schema = 1
title = "Coil"
[resistor]
{resistor}
[temperature]
low = "-20 degC"
high = "80 degC"
[goal]
{goal}
[search]
use = ["flat", "falling"]
[[fixed]]
material = "copper"
value = "400 ohm"
place = "{place}"
[material.copper]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "150 degC"]
tc1 = "3900 ppm/K"
[material.copper.spread]
meaning = "limits"
value = "1 %"
tc1 = "20 ppm/K"
[material.flat]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "150 degC"]
tc1 = "15 ppm/K"
tc2 = "-0.1 ppm/K^2"
[material.flat.spread]
meaning = "limits"
value = "1 %"
tc1 = "10 ppm/K"
[material.falling]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "150 degC"]
tc1 = "-300 ppm/K"
tc2 = "0.4 ppm/K^2"
[material.falling.spread]
meaning = "limits"
value = "3 %"
tc1 = "30 ppm/K"
"""


def plan_of(resistor, goal='drift = "1.5 %"\njudge = "nominal"', place="series"):
    return make_plan(brief(TEXT.format(resistor=resistor, goal=goal, place=place)))


def copper_ohms(plan):
    return {leg.material: leg.ohms for leg in legs(plan.best.network)}["copper"]


def test_total_fixed_in_series():
    plan = plan_of('value = "3 kohm"')
    assert value(plan.best.network) == pytest.approx(3000.0, rel=1e-12)
    assert copper_ohms(plan) == 400.0
    assert all(option.arrangement == "series" for option in plan.options)
    # By hand, on a scan of the one free share: 400 of copper, s of falling, the rest flat.
    x = np.linspace(-45, 55, 2001)
    drifts = []
    for s in np.linspace(0, 2600, 5201):
        parts = (
            400 * 3900e-6 * x + s * (-300e-6 * x + 0.4e-6 * x**2) + (2600 - s) * (15e-6 * x - 0.1e-6 * x**2)
        )
        drifts.append(np.max(np.abs(parts)) / 3000)
    best = min(option.proof.figure_ppm for option in plan.options)
    assert best == pytest.approx(min(drifts) * 1e6, rel=1e-3)


def test_total_fixed_in_parallel():
    plan = plan_of('value = "100 ohm"', place="parallel")
    assert value(plan.best.network) == pytest.approx(100.0, rel=1e-12)
    assert copper_ohms(plan) == 400.0
    assert plan.best.arrangement == "parallel"


def test_total_at_most():
    plan = plan_of('at_most = "9 kohm"')
    totals = [value(option.network) for option in plan.options]
    assert all(total <= 9000 * (1 + 1e-9) for total in totals)
    roles = [option.role for option in plan.options]
    assert "least total" in roles


def test_least_total_cannot_be_undercut():
    """A total 0.1 % smaller cannot meet the limit: the search at that total, proved, says so."""
    plan = plan_of('value = "free"')
    least = value(plan.best.network)
    assert plan.best.role == "least total"
    assert plan.best.verdict == "MET"
    tighter = plan_of(f'value = "{least * 0.999:.6f} ohm"')
    assert all(option.verdict == "NOT MET" for option in tighter.options)
    assert min(option.proof.lower_bound_ppm for option in tighter.options) > 15000
    looser = plan_of(f'value = "{least * 1.001:.6f} ohm"')
    assert looser.best.verdict == "MET"


def test_greatest_total_in_parallel():
    plan = plan_of('value = "free"', place="parallel")
    assert plan.best.role == "greatest total"
    assert plan.best.verdict == "MET"
    greatest = value(plan.best.network)
    larger = plan_of(f'value = "{greatest * 1.001:.6f} ohm"', place="parallel")
    assert all(option.verdict == "NOT MET" for option in larger.options)


def test_least_total_judged_on_the_worst_case():
    goal = 'drift = "1.5 %"\njudge = "worst-case"'
    plan = plan_of('value = "free"', goal)
    assert plan.best.verdict == "MET"
    assert plan.best.worst_case.upper_bound_ppm <= 15000 * (1 + 1e-9)
    assert plan.best.worst_case.peak_ppm >= 0.98 * 15000
    assert value(plan.best.network) > value(plan_of('value = "free"').best.network)


def test_a_limit_that_no_total_meets_says_by_how_much():
    text = TEXT.format(resistor='value = "free"', goal='drift = "2 ppm"', place="series")
    plan = make_plan(brief(text.replace('use = ["flat", "falling"]', 'use = ["flat"]')))
    assert plan.best.verdict == "NOT MET"
    assert plan.best.proof.figure_ppm > 2


@pytest.mark.parametrize("kind", ["series", "parallel"])
def test_bisection_agrees_with_a_scan_of_the_share(kind):
    films = by_name(film("cu", 3900), film("a", 40, -0.1), film("b", -250, 0.3))
    need = need_of(Limit(kind="drift", value=0.02))
    space = Space(
        arrangement=kind,
        materials=("a", "b"),
        most=2,
        min_share=0.0,
        fixed=(Leg(material="cu", ohms=100.0),),
        fixed_share=(1e-4, 1.0),
    )
    found = least_total(space, need, films, 0.02)
    total = value(found.network)
    u = 100.0 / total if kind == "series" else total / 100.0
    from dataclasses import replace

    from makers import over

    case = Case(materials=films, spreads={}, over=over(), need=need)
    for step, meets in ((0.999, True), (1.001, False)):
        at = replace(space, fixed_share=(u * step, u * step))
        network = search_space(at, need, films, 1)[0].network
        assert (nominal_figure(network, case) <= 0.02) == meets
    assert check(found, case, "x").verdict == "MET"


def test_a_least_share_beside_fixed_members_of_free_share():
    """Copper 100 ohm with 390 ohm of -1000 ppm/K has no drift: it is inside a total of 2 kohm."""
    films = by_name(film("cu", 3900), film("neg", -1000))
    space = Space(
        arrangement="series",
        materials=("neg",),
        most=1,
        min_share=0.03,
        fixed=(Leg(material="cu", ohms=100.0),),
        fixed_share=(100 / 2000, 1.0),
    )
    network = search_space(space, need_of(), films, 1)[0].network
    assert {one.material: one.ohms for one in legs(network)}["neg"] == pytest.approx(390.0, rel=1e-6)


# --- mixed networks whose total is set by the coil ------------------------------------------------

NTC = """
[material.ntc]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "150 degC"]
law = "thermistor"
beta = "3400 K"
"""
MIXED = TEXT.replace('use = ["flat", "falling"]', 'use = ["flat", "ntc"]') + NTC


def ratio_by_hand(t, flat, ntc):
    """Return R(t)/R(25) of 400 ohm of copper in series with flat || ntc, each in ohm at 25 degC."""

    def ohms(t):
        x = t - 25.0
        wire = flat * (1 + 15e-6 * x - 0.1e-6 * x**2)
        bead = ntc * np.exp(3400.0 * (1 / (t + 273.15) - 1 / 298.15))
        return 400.0 * (1 + 3900e-6 * x) + wire * bead / (wire + bead)

    return ohms(t) / ohms(25.0)


def test_a_bead_across_the_wire_gives_a_far_smaller_total():
    """The usual thermistor compensation of a copper coil, against a scan of both values by hand."""
    text = MIXED.format(resistor='value = "free"', goal='drift = "1.5 %"\njudge = "nominal"', place="series")
    plan = make_plan(brief(text))
    by_kind = {option.arrangement: option for option in plan.options if option.role == "least total"}
    assert value(by_kind["mixed"].network) < 0.3 * value(by_kind["series"].network)
    assert by_kind["mixed"].verdict == "MET"
    assert plan.best is by_kind["mixed"]
    t, least = np.linspace(-20, 80, 101), np.inf
    for flat in np.geomspace(100, 2000, 80):
        for ntc in np.geomspace(100, 2000, 80):
            if np.max(np.abs(ratio_by_hand(t, flat, ntc) - 1)) <= 0.015:
                least = min(least, 400.0 + flat * ntc / (flat + ntc))
    assert value(by_kind["mixed"].network) <= least * (1 + 1e-6)
    assert value(by_kind["mixed"].network) >= 0.9 * least


@pytest.mark.parametrize("place", ["series", "parallel"])
def test_mixed_networks_of_a_bounded_total_are_proved(place):
    """At most 1.5 kohm beside the coil: no network on a scan is below the proved bound."""
    films = by_name(film("cu", 3900), film("up", 900, 2.0), film("down", -2500, 3.0))
    share = (400 / 1500, 1.0) if place == "series" else (0.3, 0.9)
    of = Space(
        arrangement="mixed",
        materials=("down", "up"),
        most=2,
        min_share=0.0,
        legs=2,
        fixed=(Leg(material="cu", ohms=400.0),),
        fixed_share=share,
        fixed_in_parallel=place == "parallel",
    )
    need = need_of()
    found = mixed_proposals(of, need, films)
    case = Case(materials=films, spreads={}, over=over(), need=need)
    best = min(nominal_figure(p.network, case) for p in found)
    bounds = [MixedBound(of, need, films).below(best * part, 0.01) for part in (1.0, 1.05)]
    x = np.linspace(-65, 125, 191)
    cu, up, down = 1 + 3900e-6 * x, 1 + 900e-6 * x + 2e-6 * x**2, 1 - 2500e-6 * x + 3e-6 * x**2
    least = np.inf
    for u in np.linspace(*share, 60):
        for s in np.linspace(0.001, 0.999, 400):
            if place == "series":
                curve = u * cu + (1 - u) / (s / up + (1 - s) / down)
            else:
                curve = 1 / (u / cu + (1 - u) / (s * up + (1 - s) * down))
            least = min(least, float(np.max(np.abs(curve - 1))))
    assert max(bounds) <= least * (1 + 1e-9)
    assert best <= least * (1 + 1e-3)
    assert bounds[0] >= 0.98 * best
    for proposal in found:
        total = value(proposal.network)
        own = 400 / total if place == "series" else total / 400
        assert share[0] - 1e-9 <= own <= share[1] + 1e-9


def test_sizes_hold_where_the_coil_sets_the_total():
    """No leg above 300 ohm: against a scan by hand of what is allowed."""
    films = by_name(film("cu", 3900), film("up", 900, 2.0), film("down", -2500, 3.0))
    sizes = Sizes(least_ohms=(0.0, 0.0), most_ohms=(300.0, 300.0), area_per_ohm=(0.0, 0.0))
    of = Space(
        arrangement="mixed",
        materials=("down", "up"),
        most=2,
        min_share=0.0,
        legs=2,
        fixed=(Leg(material="cu", ohms=400.0),),
        fixed_share=(0.2, 1.0),
        sizes=sizes,
    )
    need, x = need_of(), np.linspace(-65, 125, 96)
    case = Case(materials=films, spreads={}, over=over(), need=need)
    best = mixed_proposals(of, need, films)[0]
    figure = nominal_figure(best.network, case)
    assert max(leg.ohms for leg in legs(best.network) if leg.material != "cu") <= 300.0 * (1 + 1e-6)
    cu, up, down = 1 + 3900e-6 * x, 1 + 900e-6 * x + 2e-6 * x**2, 1 - 2500e-6 * x + 3e-6 * x**2
    least = np.inf
    for a in np.linspace(5, 300, 120):
        for b in np.linspace(5, 300, 120):
            whole = 400 * cu + 1 / (1 / (a * up) + 1 / (b * down))
            least = min(least, float(np.max(np.abs(whole / (400 + a * b / (a + b)) - 1))))
    assert figure <= least * (1 + 1e-4)
    assert MixedBound(of, need, films).below(figure, 0.01) <= least * (1 + 1e-9)
