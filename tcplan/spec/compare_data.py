"""A comparison of measured devices with their plan as plain data, for JSON."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from typing import Any

from tcplan.measure.comparison import Compared, Comparison, FoundDeviation, Point
from tcplan.network import leg_names, legs
from tcplan.plan import Option, Plan
from tcplan.units import to_celsius


def compared_option(plan: Plan, comparison: Comparison) -> Option:
    """Return the option of the plan that was measured."""
    return next(option for option in plan.options if option.id == comparison.name)


def comparison_data(plan: Plan, comparison: Comparison) -> dict[str, Any]:
    """Return a comparison as plain JSON data, units in the names, at full precision."""
    curves = comparison.curves
    return {
        "title": plan.brief["title"],
        "option": comparison.name,
        "source": comparison.source,
        "good": comparison.good,
        "reference_degC": to_celsius(comparison.reference),
        "planned_ohms": comparison.planned,
        "tolerance": comparison.tolerance,
        "limit_ppm": plan.limit.drift_ppm,
        "level_known": comparison.level_known,
        "no_spread_stated": list(comparison.unspread),
        "devices": [_device_data(one) for one in comparison.devices],
        "not_compared": [
            {"device": one.device, "found": one.found, "expected": one.expected} for one in comparison.skipped
        ],
        "predicted": {
            "degC": [to_celsius(T) for T in curves.T],
            "nominal_ppm": _ppm(curves.nominal),
            "lowest_ppm": _ppm(curves.lowest),
            "highest_ppm": _ppm(curves.highest),
            "likely_low_ppm": _ppm(curves.likely_low),
            "likely_high_ppm": _ppm(curves.likely_high),
            "likely_part": plan.limit.quantile,
        },
        "centring": _centring_data(plan, comparison),
    }


def _ppm(fractions: Sequence[float] | None) -> list[float] | None:
    return None if fractions is None else [1e6 * one for one in fractions]


def _device_data(one: Compared) -> dict[str, Any]:
    explanation = one.explanation
    return {
        "device": one.device,
        "ohms": one.ohms,
        "ohms_uncertainty": one.ohms_uncertainty,
        "ohms_by": one.by,
        "fit_order": one.order,
        "uncertainty_stated": one.stated,
        "value_place": one.value_place,
        "place": one.place,
        "farthest": one.farthest,
        "outside_from_uncertainties": one.factor,
        "left_out": one.left_out,
        "figure": None
        if one.figure is None
        else {
            "figure_ppm": 1e6 * one.figure.figure,
            "at_degC": to_celsius(one.figure.at),
            "uncertainty_ppm": 1e6 * one.figure.uncertainty,
            "place": one.figure.place,
        },
        "points": [_point_data(point) for point in one.points],
        "explanation": {
            "deviations": [_deviation_data(d) for d in explanation.deviations],
            "common_errors": [_deviation_data(d) for d in explanation.common],
            "covariance": [list(row) for row in explanation.covariance],
            "hardly_told_apart": [list(pair) for pair in explanation.twins],
            "norm_sigmas": explanation.norm,
            "spread_check": asdict(explanation.spread),
            "misfit_check": asdict(explanation.misfit),
            "residual_rms_ppm": 1e6 * explanation.residual,
            "residual_largest_ppm": 1e6 * explanation.largest,
            "drift_ppm": _ppm(one.curve),
        },
    }


def _point_data(point: Point) -> dict[str, Any]:
    drifts = ("drift", "uncertainty", "nominal", "lowest", "highest", "explained")
    return {
        "line": point.line,
        "degC": to_celsius(point.T),
        "ohms": point.ohms,
        **{f"{name}_ppm": 1e6 * getattr(point, name) for name in drifts},
        "beyond_uncertainties": point.beyond,
    }


def _deviation_data(one: FoundDeviation) -> dict[str, Any]:
    """Return a deviation in SI: a fraction, 1/K or 1/K^2 of a material; K, a fraction or ohm of the sweep."""
    named = {"material": one.material} if one.material else {}
    return {
        **named,
        "parameter": one.slot,
        "value": one.value,
        "uncertainty": one.uncertainty,
        "sigma": one.sigma,
        "sigmas": one.sigmas,
    }


def _centring_data(plan: Plan, comparison: Comparison) -> dict[str, Any]:
    centring = comparison.centring
    if centring is None:
        return {"why_not": comparison.why_not}
    own = legs(compared_option(plan, comparison).network)
    rows = zip(leg_names(len(own)), own, centring.ohms, centring.factors, strict=True)
    return {
        "legs": [
            {"id": name, "material": leg.material, "planned_ohms": leg.ohms, "ohms": ohms, "factor": factor}
            for name, leg, ohms, factor in rows
        ],
        "reference_ohms": centring.value,
        "level": centring.level,
        "limited": centring.limited,
        "left_out": list(centring.left_out),
        "devices": [
            {
                "device": one.device,
                "before_ppm": 1e6 * one.before,
                "after_ppm": 1e6 * one.after,
                "uncertainty_ppm": 1e6 * one.uncertainty,
                "clear_gain": one.clear,
            }
            for one in centring.devices
        ],
    }
