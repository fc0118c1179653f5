"""Every example is run, and every figure of its plan is recomputed from plan.json alone.

The recomputation, in recomputed_plans.py, shares no code with tcplan.
"""

import json
from pathlib import Path

import pytest
from recomputed_plans import (
    REL,
    check_spread_box,
    extremes,
    figure,
    law,
    ratio_curve,
    resistance,
    wanted_curve,
)

from tcplan.brief import read_brief
from tcplan.plan import plan_json
from tcplan.workflow.planning import make_plan

EXAMPLES = Path(__file__).parents[2] / "examples"
BRIEFS = sorted(
    path
    for path in EXAMPLES.glob("*/brief.toml")
    if "[ratio]" not in path.read_text(encoding="utf-8").split("\n")
    and not (path.parent / "campaign.toml").exists()
)  # a ratio has its own test in tests/ratio, and what is fitted first in test_film_campaign.py
EXPECTED = {
    "brake_sensor_films": "MET",
    "bridge_check": "MET",
    "cabinet_reference_wire": "MET",
    "coil_swamp": "MET",
    "flat_mixed_films": "MET",
    "gain_films": "MET",
    "span_trim_stock": "MET",
}


@pytest.fixture(scope="module", params=BRIEFS, ids=lambda path: path.parent.name)
def example(request):
    plan = make_plan(read_brief(request.param))
    return request.param.parent.name, json.loads(plan_json(plan))


def test_there_are_at_least_four():
    assert len(BRIEFS) >= 4
    assert set(EXPECTED) == {path.parent.name for path in BRIEFS}


def test_verdict(example):
    name, plan = example
    chosen = next(option for option in plan["options"] if option["id"] == plan["chosen"])
    assert chosen["verdict"] == EXPECTED[name]


def test_every_nominal_figure(example):
    _, plan = example
    span = plan["range"]
    low, high, reference = span["low_degC"], span["high_degC"], span["reference_degC"]
    wanted = wanted_curve(plan)
    for option in plan["options"]:
        ratio, nominal = ratio_curve(plan, option), option["nominal"]
        bottom, top = extremes(lambda t, r=ratio: (r(t) - wanted(t)) * 1e6, low, high)
        assert nominal["peak_ppm"] == pytest.approx(max(-bottom, top), rel=REL)
        at = nominal["at_degC"]
        assert abs((ratio(at) - wanted(at)) * 1e6) == pytest.approx(nominal["peak_ppm"], rel=REL)
        assert nominal["band_ppm"] == pytest.approx(top - bottom, rel=REL)
        assert nominal["box_tcr_ppm_per_K"] == pytest.approx((top - bottom) / (high - low), rel=REL)
        for key, end in (("chord_cold_ppm_per_K", low), ("chord_hot_ppm_per_K", high)):
            chord = (ratio(end) - 1) * 1e6 / (end - reference)
            assert nominal[key] == pytest.approx(chord, rel=REL, abs=1e-9)
        h = 0.5
        slope = (ratio(reference + h) - ratio(reference - h)) / (2 * h) * 1e6
        bend = (ratio(reference + h) + ratio(reference - h) - 2) / (2 * h * h) * 1e6
        assert nominal["tc1_ppm_per_K"] == pytest.approx(slope, rel=1e-4, abs=1e-4)
        assert nominal["tc2_ppm_per_K2"] == pytest.approx(bend, rel=1e-4, abs=1e-5)
        bottom, top = extremes(lambda t, r=ratio: (r(t) / wanted(t) - 1) * 1e6, low, high)  # the value's own
        total = (top + bottom) * 1e-6
        assert nominal["centring_ppm"] == pytest.approx(
            -total / (2 + total) * 1e6, rel=REL, abs=REL * nominal["peak_ppm"]
        )
        left = (top - bottom) * 1e-6 / (2 + total)
        assert nominal["centred_peak_ppm"] == pytest.approx(left * 1e6, rel=REL)


def test_every_judged_figure_and_verdict(example):
    _, plan = example
    for option in plan["options"]:
        own = figure(plan, ratio_curve(plan, option))
        assert option["nominal"]["figure_ppm"] == pytest.approx(own, rel=REL)
        worst, proof = option["worst_case"], option["proof"]
        of = own if proof["of"] == "nominal" else worst["peak_ppm"]
        assert proof["lower_bound_ppm"] + proof["gap_ppm"] == pytest.approx(of, rel=REL)
        if worst is not None:
            reached = figure(plan, ratio_curve(plan, option, worst["point"]))
            assert worst["peak_ppm"] == pytest.approx(reached, rel=REL)
            assert worst["peak_ppm"] >= own * (1 - REL)
        judged = own if plan["limit"]["judge"] == "nominal" else worst and worst["upper_bound_ppm"]
        expected = (
            "NOT JUDGED" if judged is None else "MET" if judged <= plan["limit"]["drift_ppm"] else "NOT MET"
        )
        assert option["verdict"] == expected


def test_no_device_of_the_spread_box_is_beyond_the_worst_case(example):
    """Devices inside the box and at its corners, sampled from plan.json alone."""
    check_spread_box(example[1])


def test_values_and_shares(example):
    _, plan = example
    target = plan["target"]["ohms"]
    for option in plan["options"]:
        legs = {leg["id"]: leg for leg in option["legs"]}
        flat = {leg["material"]: lambda t: 1.0 for leg in legs.values()}
        total = resistance(option["tree"], legs, flat, 25.0)
        if target is not None and option["role"] == "":
            assert total == pytest.approx(target, rel=1e-9)
        assert sum(leg["share"] for leg in legs.values()) == pytest.approx(1.0, abs=1e-12)
        for leg in legs.values():
            entry = plan["materials"][leg["material"]]
            if entry["ohm_per_square"]:
                own = leg["ohms"] / law(entry)(plan["range"]["reference_degC"])
                assert leg["squares"] == pytest.approx(own / entry["ohm_per_square"], rel=1e-9)


def test_nothing_found_is_below_its_bounds(example):
    _, plan = example
    for option in plan["options"]:
        figure_ppm = option["proof"]["lower_bound_ppm"] + option["proof"]["gap_ppm"]
        assert option["proof"]["gap_ppm"] >= 0
        floor = "nominal_ppm" if option["proof"]["of"] == "nominal" else "worst_case_ppm"
        assert plan["floor"][floor] <= figure_ppm * (1 + 1e-9)
        if option["worst_case"] and plan["floor"]["worst_case_ppm"] is not None:
            assert plan["floor"]["worst_case_ppm"] <= option["worst_case"]["upper_bound_ppm"] * (1 + 1e-9)
