"""The curves of a plan as functions of temperature [K], and its limits as bounds on the drift."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.drift import Curve, breakpoints, extremes, panels, ratio_curve
from tcplan.goal import Goal
from tcplan.material.law import law_from_parameters
from tcplan.material.spread import shifted_ratio
from tcplan.network import deviated, resistance, used_materials, value
from tcplan.plan import Option, Plan
from tcplan.process import Corner
from tcplan.units import from_celsius, to_celsius

SAMPLES = 201


@dataclass(frozen=True, slots=True, kw_only=True)
class Bound:
    """One limit of the goal: the drift stays between ``lower`` and ``upper`` [fractions].

    ``degC``, ``lower`` and ``upper`` are corners to join by straight lines; NaN leaves a gap.
    """

    kind: str
    degC: FloatArray
    lower: FloatArray
    upper: FloatArray
    amount: float


def reference(plan: Plan) -> float:
    """Return the reference temperature of the brief [K]."""
    return from_celsius(plan.range.reference_degC)


def ends(plan: Plan) -> tuple[float, float]:
    """Return the low and the high end of the range [K]."""
    return from_celsius(plan.range.low_degC), from_celsius(plan.range.high_degC)


def _goal(plan: Plan) -> Goal:
    wanted = plan.brief["goal"]["wanted"]
    return Goal(wanted=law_from_parameters(wanted) if wanted else None)


def _less_wanted(ratio: Curve, plan: Plan) -> Curve:
    """Return the drift of a ratio: R(T)/R(T_ref) less the wanted law."""
    goal, at = _goal(plan), reference(plan)
    return lambda T: ratio(T) - goal.wanted_ratio(T, at)


def material_drift(plan: Plan, name: str) -> Curve:
    """Return the drift (a fraction) of a resistor made of one material alone."""
    material, at = plan.by_name[name], reference(plan)
    return _less_wanted(lambda T: material.ratio(T, at), plan)


def option_drift(plan: Plan, option: Option) -> Curve:
    """Return the drift (a fraction) of an option, all materials nominal."""
    return _less_wanted(ratio_curve(option.network, plan.by_name, reference(plan)), plan)


def worst_drift(plan: Plan) -> Curve | None:
    """Return the drift (a fraction) of the device that is the worst case of the chosen option."""
    worst = plan.best.worst_case
    if worst is None:
        return None
    return _device_drift(
        plan,
        {name: moved.ohm_per_square for name, moved in worst.point.items()},
        {name: (moved.tc1 * 1e-6, moved.tc2 * 1e-6) for name, moved in worst.point.items()},
    )


def corner_drift(plan: Plan, corner: Corner) -> Curve:
    """Return the drift (a fraction) of the chosen option at a named process corner."""
    names = used_materials(plan.best.network)
    return _device_drift(
        plan,
        {name: 1.0 + corner.shift(name, "value") for name in names},
        {name: (corner.shift(name, "tc1"), corner.shift(name, "tc2")) for name in names},
    )


def _device_drift(
    plan: Plan, factors: Mapping[str, float], shifts: Mapping[str, tuple[float, float]]
) -> Curve:
    """Return the drift of one device of the chosen option: value factors and shifts [1/K, 1/K^2]."""
    materials, at = plan.by_name, reference(plan)
    network = deviated(plan.best.network, factors)

    def ratio(T: FloatArray) -> FloatArray:
        ratios = {name: shifted_ratio(materials[name].law, own, at, T) for name, own in shifts.items()}
        return resistance(network, ratios) / value(network)

    return _less_wanted(ratio, plan)


def _splits(plan: Plan, names: Sequence[str]) -> tuple[float, ...]:
    wanted = _goal(plan).wanted
    return (*breakpoints(plan.by_name, names), *(wanted.breakpoints if wanted else ()))


def temperatures(plan: Plan, samples: int = SAMPLES) -> FloatArray:
    """Return the temperatures [K] to draw at: even ones, and all where something is marked or bends."""
    low, high = ends(plan)
    worst = plan.best.worst_case
    marked = [plan.best.nominal.at_degC, *([worst.at_degC] if worst else [])]
    extra = [reference(plan), *map(from_celsius, marked), *_splits(plan, list(plan.by_name))]
    every = np.concatenate([np.linspace(low, high, samples), extra])
    return np.unique(every[(every >= low) & (every <= high)])


# --- limits -----------------------------------------------------------------------------------


def bounds(plan: Plan, held: Curve) -> tuple[Bound, ...]:
    """Return every limit of the goal as a bound on the drift.

    Parameters
    ----------
    plan : Plan
    held : callable
        The drift that is held against them: a band may lie at any height, so it is laid around it.
    """
    return tuple(_bound(plan, limit, held) for limit in plan.brief["goal"]["limits"])


def _bound(plan: Plan, limit: dict[str, Any], held: Curve) -> Bound:
    kind, over = limit["kind"], plan.range
    amount = limit["ppm_per_K" if kind in ("chord_tcr", "box_tcr") else "ppm"] * 1e-6
    at, middle = np.array([over.low_degC, over.high_degC]), 0.0
    if kind == "mask":
        at, half = _mask_corners(plan, limit["windows"])
    elif kind == "chord_tcr":
        at = np.array([over.low_degC, over.reference_degC, over.high_degC])
        half = amount * np.abs(at - over.reference_degC)
    elif kind == "drift":
        half = np.full(2, amount)
    else:
        middle = _middle(plan, held)
        half = np.full(2, 0.5 * amount * ((over.high_degC - over.low_degC) if kind == "box_tcr" else 1.0))
    return Bound(kind=kind, degC=at, lower=middle - half, upper=middle + half, amount=amount)


def _middle(plan: Plan, held: Curve) -> float:
    """Return the middle between the highest and the lowest point of a curve."""
    splits = _splits(plan, used_materials(plan.best.network))
    found = extremes(held, panels(*ends(plan), splits))
    return 0.5 * (found.low.value + found.high.value)


def _mask_corners(plan: Plan, windows: Sequence[dict[str, float]]) -> tuple[FloatArray, FloatArray]:
    """Return the corners [degC, fraction] of a mask: where its lines overlap the tightest binds."""
    low, high = plan.range.low_degC, plan.range.high_degC
    lines = [(max(w["low_degC"], low), min(w["high_degC"], high), w["limit_ppm"] * 1e-6) for w in windows]
    edges = sorted({edge for start, end, _ in lines if start <= end for edge in (start, end)})
    at, upper = [], []
    for start, end in pairwise(edges):
        over = [limit for first, last, limit in lines if first <= start and end <= last]
        at += [start, end]
        upper += [min(over, default=np.nan)] * 2
    return np.array(at), np.array(upper)


def celsius(temperature: FloatArray) -> FloatArray:
    """Return temperatures [degC] of temperatures [K]."""
    return np.array([to_celsius(T) for T in temperature])
