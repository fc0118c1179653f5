"""Figures of a plan recomputed from plan.json alone, sharing no code with tcplan.

Its own laws, tree walk and extremes: numpy, and scipy's bounded scalar minimiser, on what plan.json states.
"""

import numpy as np
from scipy.optimize import minimize_scalar

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


def check_spread_box(plan):
    """Check devices inside the spread box and at its corners, sampled from plan.json alone."""
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
