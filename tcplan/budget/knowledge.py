"""Which coefficient would have to be known better for the limit to be reachable, and how well.

All laws of a network at their highest and all at their lowest are two devices of it whose ratios differ
by at least rho(T) = min hi/lo over the materials. One of them is off by t (rho - 1)/(rho + 1) at least,
with t the wanted ratio: no network of these materials has a smaller worst case.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.budget.case import Case
from tcplan.budget.model import Knowledge
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread, law_bounds
from tcplan.units import to_celsius

POINTS = 121  # temperatures a piece
HALVINGS = 60
EDGE = 1e-9  # K; rounding of temperatures


def _temperatures(need: Requirement) -> tuple[FloatArray, FloatArray]:
    """Return temperatures [K] and the weight of the limit there; a free centre asks nothing here."""
    T, weight = [], []
    for piece in need.pieces:
        if not piece.centred:
            own = np.linspace(piece.low, piece.high, POINTS if piece.high > piece.low else 1)
            T.append(own)
            weight.append(np.full(len(own), piece.weight))
    return (np.concatenate(T), np.concatenate(weight)) if T else (np.empty(0), np.empty(0))


def floor_curve(
    material: Material, spread: Spread, need: Requirement, T: FloatArray, weight: FloatArray
) -> FloatArray:
    """Return what the spread of one law leaves at each temperature, on the scale of the limit."""
    lo, hi = law_bounds(material.law, spread, need.reference, T)
    rho = hi / lo
    return np.asarray(need.wanted(T) * (rho - 1.0) / (rho + 1.0) / weight)


def knowledge(case: Case) -> Knowledge | None:
    """Return the spread floor of all materials, and what TC1 must come down to for the limit.

    Of the materials the one is named whose TC1 half-width has to shrink least. It is enough for the
    floor, not for a network: that is found by planning with it.

    Parameters
    ----------
    case : Case

    Returns
    -------
    Knowledge or None
        None when a material states no spread, or only bands are asked.
    """
    need, spreads = case.need, case.spreads()
    T, weight = _temperatures(need)
    group = dict(_usable(case))
    if not len(T) or any(material.spread is None for material in group.values()):
        return None
    curves = {name: floor_curve(m, spreads[name], need, T, weight) for name, m in group.items()}
    least = np.min(list(curves.values()), axis=0)
    k = int(np.argmax(least))
    plain = Knowledge(floor_ppm=float(least[k]) * 1e6, at_degC=to_celsius(float(T[k])))
    if need.scale is None or need.met(float(least[k])):
        return plain
    needed = {name: _needed(m, spreads[name], need, T, weight) for name, m in group.items()}
    rated = {n: w / (spreads[n].limits().tc1_and_tcr or 1.0) for n, w in needed.items() if w is not None}
    if not rated:
        name = min(curves, key=lambda n: float(curves[n][k]))
        return replace(plain, material=name, tc1_now_ppm_per_K=_ppm(spreads[name]))
    name = max(rated, key=lambda n: rated[n])
    return replace(
        plain,
        material=name,
        tc1_now_ppm_per_K=_ppm(spreads[name]),
        tc1_needed_ppm_per_K=(needed[name] or 0.0) * 1e6,
    )


def _usable(case: Case) -> Iterator[tuple[str, Material]]:
    """Yield the materials whose law holds over the whole range."""
    for name, material in case.materials.items():
        low, high = material.usable
        if low <= case.over.low + EDGE and high >= case.over.high - EDGE:
            yield name, material


def _ppm(spread: Spread) -> float:
    return (spread.limits().tc1_and_tcr or 0.0) * 1e6


def _needed(
    material: Material, spread: Spread, need: Requirement, T: FloatArray, weight: FloatArray
) -> float | None:
    """Return the largest half-width of TC1 [1/K] that keeps the floor within the limit; None if none does."""
    limits = replace(spread.limits(), tcr=None)

    def within(tc1: float) -> bool:
        curve = floor_curve(material, replace(limits, tc1=tc1), need, T, weight)
        return need.met(float(curve.max()))

    low, high = 0.0, spread.limits().tc1_and_tcr or 0.0
    if not within(low):
        return None
    for _ in range(HALVINGS):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if within(middle) else (low, middle)
    return low
