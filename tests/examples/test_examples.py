"""Every example is run, and every figure of its plan is recomputed from plan.json alone.

The recomputation shares no code with tcplan: its own laws, tree walk and extremes (numpy, and scipy's
bounded scalar minimiser), on what plan.json states.
"""

import json
from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from tcplan.brief import read_brief
from tcplan.plan import plan_json
from tcplan.workflow.planning import make_plan

EXAMPLES = Path(__file__).parents[2] / "examples"
BRIEFS = sorted(
    path
    for path in EXAMPLES.glob("*/brief.toml")
    if "[ratio]" not in path.read_text(encoding="utf-8").split("\n")
)  # a ratio has its own file, and its own test in tests/ratio
EXPECTED = {
    "brake_sensor_films": "MET",
    "bridge_check": "MET",
    "cabinet_reference_wire": "MET",
    "coil_swamp": "MET",
    "flat_mixed_films": "MET",
    "gain_films": "MET",
    "span_trim_stock": "MET",
}
REL = 1e-6


def polynomial(stated, shift=(0.0, 0.0)):
    """Return T [degC] -> R(T)/R(own reference) of a law of plan.json, shifted by (da, db)."""
    assert stated["law"] == "polynomial", "the examples use polynomial laws only"
    reference = stated["reference_degC"]
    terms = [(int(k[2]), v * 1e-6) for k, v in stated.items() if k.startswith("tc")]

    def ratio(t):
        x = t - reference
        return 1 + sum(c * x**n for n, c in terms) + shift[0] * x + shift[1] * x**2

    return ratio


def law(entry, shift=(0.0, 0.0)):
    """Return T [degC] -> R(T)/R(own reference) of one material of plan.json, shifted by (da, db)."""
    return polynomial(entry["law"], shift)


def wanted_curve(plan):
    """Return T [degC] -> the wanted R(T)/R(T_ref): 1 when the goal is flat."""
    stated, reference = plan["brief"]["goal"]["wanted"], plan["range"]["reference_degC"]
    if stated is None:
        return np.ones_like
    own = polynomial(stated)
    return lambda t: own(t) / own(reference)


def resistance(tree, legs, ratios, t):
    (kind, content), *_ = tree.items()
    if kind == "leg":
        leg = legs[content]
        return leg["ohms"] * ratios[leg["material"]](t)
    parts = [resistance(child, legs, ratios, t) for child in content]
    return sum(parts) if kind == "series" else 1 / sum(1 / part for part in parts)


def extremes(curve, low, high):
    """Return the lowest and highest value: a fine grid, each candidate refined by scipy."""
    t = np.linspace(low, high, 4001)
    values = curve(t)
    found = []
    for sign in (1, -1):
        k = int(np.argmin(sign * values))
        a, b = t[max(k - 1, 0)], t[min(k + 1, len(t) - 1)]
        inner = minimize_scalar(
            lambda x, s=sign: s * curve(x), bounds=(a, b), method="bounded", options={"xatol": 1e-10}
        )
        found.append(sign * min(inner.fun, sign * values[k]))
    return found[0], found[1]


def ratio_curve(plan, option, device=None):
    """Return T [degC] -> R(T)/R(T_ref) of an option, nominal or at a point of its spread."""
    reference = plan["range"]["reference_degC"]
    legs = {leg["id"]: dict(leg) for leg in option["legs"]}
    ratios = {}
    for name in {leg["material"] for leg in legs.values()}:
        point = (device or {}).get(name, {"ohm_per_square": 1.0, "tc1": 0.0, "tc2": 0.0})
        own = law(plan["materials"][name], (point["tc1"] * 1e-6, point["tc2"] * 1e-6))
        ratios[name] = lambda t, own=own: own(t) / own(reference)
        for leg in legs.values():
            if leg["material"] == name:
                leg["ohms"] *= point["ohm_per_square"]
    at_reference = resistance(option["tree"], legs, ratios, reference)
    return lambda t: resistance(option["tree"], legs, ratios, t) / at_reference


def figure(plan, ratio):
    """Return the judged figure [ppm] from the goal as the brief states it."""
    span = plan["range"]
    low, high, reference = span["low_degC"], span["high_degC"], span["reference_degC"]
    wanted = wanted_curve(plan)

    def drift(t):
        return (ratio(t) - wanted(t)) * 1e6

    def peak(a, b):
        bottom, top = extremes(drift, a, b)
        return max(-bottom, top)

    used = []
    for limit in plan["brief"]["goal"]["limits"]:
        if limit["kind"] == "drift":
            used.append(peak(low, high) / limit["ppm"])
        elif limit["kind"] == "box_tcr":
            bottom, top = extremes(drift, low, high)
            used.append((top - bottom) / (high - low) / limit["ppm_per_K"])
        elif limit["kind"] == "mask":
            for window in limit["windows"]:
                a, b = max(low, window["low_degC"]), min(high, window["high_degC"])
                used.append(peak(a, b) / window["limit_ppm"])
        else:
            raise AssertionError(f"recompute {limit['kind']} here: {reference}")
    return max(used) * plan["limit"]["drift_ppm"]


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


def half_widths(entry):
    """Return the limits of value, TC1 and TC2 that a material of plan.json states."""
    spread = entry["spread"]
    scale = 3.0 if spread["meaning"] == "sigma" else 1.0
    stated = (
        spread["value"],
        (spread["tc1_per_K"] or 0.0) + (spread["tcr_per_K"] or 0.0),
        spread["tc2_per_K2"],
    )
    return [scale * (half or 0.0) for half in stated]


def test_no_device_of_the_spread_box_is_beyond_the_worst_case(example):
    """Devices inside the box and at its corners, sampled from plan.json alone."""
    _, plan = example
    rng, span = np.random.default_rng(4), plan["range"]
    t = np.linspace(span["low_degC"], span["high_degC"], 101)
    wanted = wanted_curve(plan)(t)
    masked = any(limit["kind"] != "drift" for limit in plan["brief"]["goal"]["limits"])
    for option in plan["options"]:
        if option["worst_case"] is None:
            continue
        names = sorted({leg["material"] for leg in option["legs"]})
        limits = {name: half_widths(plan["materials"][name]) for name in names}
        most = option["worst_case"]["upper_bound_ppm"]
        for k in range(40 if masked else 400):
            spot = {n: np.sign(z) if k % 2 else z for n in names for z in [rng.uniform(-1, 1, 3)]}
            device = {
                n: {
                    "ohm_per_square": 1 + spot[n][0] * limits[n][0],
                    "tc1": spot[n][1] * limits[n][1] * 1e6,
                    "tc2": spot[n][2] * limits[n][2] * 1e6,
                }
                for n in names
            }
            curve = ratio_curve(plan, option, device)
            reached = figure(plan, curve) if masked else np.max(np.abs(curve(t) - wanted)) * 1e6
            assert reached <= most * (1 + REL)


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
