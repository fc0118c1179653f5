"""The floor: what no network whatever of these materials can beat, nominal and over the spread."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from typing import Protocol

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InternalError
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread, law_bounds
from tcplan.plan import Floor, FloorEvidence
from tcplan.units import format_celsius
from tcplan.verify.bound import MARGIN, sandwich_bound

POINTS = 121  # temperatures a piece; any of them gives a true bound
NARROW = 1e-7  # K


def _temperatures(need: Requirement) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return temperatures [K] inside the goal, the least uncentred weight there, and the band's.

    A weight is infinite where no piece of its kind asks anything.
    """
    lows = [np.linspace(p.low, p.high, POINTS if p.high > p.low else 1) for p in need.pieces]
    T = np.unique(np.concatenate([*lows, [need.reference]]))
    plain, banded = np.full(len(T), np.inf), np.full(len(T), np.inf)
    for piece in need.pieces:
        inside = (piece.low <= T) & (piece.high >= T)
        target = banded if piece.centred else plain
        target[inside] = np.minimum(target[inside], piece.weight)
    return T, plain, banded


def least_slope_integral(materials: Sequence[_Sloped], T: FloatArray) -> FloatArray:
    """Return the integral of min over materials of d ln R/dT from T[0] to each T.

    Where one material has the least slope over a cell, the integral is the change of its ln R;
    cells in which it changes are halved until they are too narrow to matter.
    """

    def between(low: float, high: float) -> float:
        ends = np.array([low, 0.5 * (low + high), high])
        slopes = np.stack([material.slope(ends) for material in materials])
        least = np.argmin(slopes, axis=0)
        if high - low <= NARROW or (least == least[0]).all():
            steps = [np.log(material.ratio(ends[[0, 2]], ends[0])) for material in materials]
            return float(min(step[1] for step in steps))
        return between(low, float(ends[1])) + between(float(ends[1]), high)

    return np.concatenate([[0.0], np.cumsum([between(a, b) for a, b in itertools.pairwise(T)])])


class _Sloped(Protocol):
    """What the slope bound needs of a material."""

    def slope(self, T: FloatArray) -> FloatArray: ...

    def ratio(self, T: FloatArray, reference: float) -> FloatArray: ...


class _Mirror:
    """A material seen with R replaced by 1/R: its slope changes sign, so max becomes min."""

    def __init__(self, material: Material) -> None:
        self._material = material

    def slope(self, T: FloatArray) -> FloatArray:
        return -self._material.slope(T)

    def ratio(self, T: FloatArray, reference: float) -> FloatArray:
        return np.asarray(1.0 / self._material.ratio(T, reference))


def slope_bound(
    need: Requirement, materials: Sequence[Material], figure: float
) -> tuple[float, tuple[float, float]]:
    """Return a lower bound on the figure from the slopes, and the stretch [K] that proves it.

    The slope of any network is a mean of its materials' slopes. Where all of them have one sign,
    R(high)/R(low) is at least e^I (or at most e^-I), I the integral of the slope nearest zero.
    """
    T, plain, banded = _temperatures(need)
    t = need.wanted(T)
    reference = int(np.argmin(np.abs(T - need.reference)))
    best, stretch = 0.0, (need.reference, need.reference)
    for sign in (1, -1):
        group: Sequence[_Sloped] = materials if sign > 0 else [_Mirror(m) for m in materials]
        total = least_slope_integral(group, T)
        # rise[i, j] = least ln of R(T_j)/R(T_i), j > i; for the mirror, of R(T_i)/R(T_j)
        rise = np.triu(total[None, :] - total[:, None], 1)
        growth = np.exp(np.maximum(rise, 0.0))
        first, second = (t[:, None], t[None, :]) if sign > 0 else (t[None, :], t[:, None])
        for weight, anchored in ((plain, True), (banded, False)):
            w = weight.copy()
            shift = 0.0 if anchored else _band_shift(need, figure)
            if anchored:
                w[reference] = 0.0 if np.isfinite(plain).any() else np.inf
            w1, w2 = (w[:, None], w[None, :]) if sign > 0 else (w[None, :], w[:, None])
            with np.errstate(divide="ignore", invalid="ignore"):
                bound = (growth * (first - shift) - (second - shift)) / (w2 + growth * w1)
            bound[~np.isfinite(bound) | (rise <= 0)] = 0.0
            i, j = np.unravel_index(int(np.argmax(bound)), bound.shape)
            if bound[i, j] > best:
                best, stretch = float(bound[i, j]), (float(T[i]), float(T[j]))
    return max(0.0, best - MARGIN), stretch


def _band_shift(need: Requirement, figure: float) -> float:
    """Return the furthest that the centre of a band within ``figure`` can lie from 0."""
    return next((p.weight * figure for p in need.pieces if p.centred), 0.0)


def spread_bound(
    need: Requirement, materials: Sequence[Material], spreads: Mapping[str, Spread]
) -> tuple[float, float, str]:
    """Return a lower bound on the worst case of any network from the spread of the laws alone.

    All laws at their highest and all at their lowest give two devices of the same network whose
    ratios differ by at least rho(T) = min hi/lo, so one of them is off by (rho - 1)/(rho + 1) of t.
    Returned with the temperature [K] and the material that decides it.
    """
    T, plain, _ = _temperatures(need)
    rho = []
    for material in materials:
        lo, hi = law_bounds(material.law, spreads[material.name], need.reference, T)
        rho.append(hi / lo)
    table = np.stack(rho)
    least = table.min(axis=0)
    bound = need.wanted(T) * (least - 1.0) / (least + 1.0) / plain
    k = int(np.argmax(bound))
    return max(0.0, float(bound[k]) - MARGIN), float(T[k]), materials[int(np.argmin(table[:, k]))].name


def floor(
    evidence: FloorEvidence,
    need: Requirement,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread] | None,
    figure: float,
) -> Floor:
    """Return the floor of all networks of the evidence's materials and fixed members.

    Parameters
    ----------
    evidence : FloorEvidence
    need : Requirement
    materials : mapping of name to Material
    spreads : mapping of name to Spread, or None
        None when a material has none: then there is no worst case.
    figure : float
        A figure that one of these networks reaches.
    """
    names = dict.fromkeys((*evidence.space.materials, *(leg.material for leg in evidence.space.fixed)))
    group = [materials[name] for name in names]
    sandwich = sandwich_bound(evidence, need, materials, figure)
    slopes, (low, high) = slope_bound(need, group, figure)
    if max(sandwich, slopes) > figure * (1.0 + 1e-9) + 1e-12:
        raise InternalError(
            f"a floor of {max(sandwich, slopes)} is above a figure of {figure} that was reached"
        )
    nominal = min(max(sandwich, slopes), figure)
    if nominal <= 0:
        why = "the nominal laws alone set no floor above zero"
    elif slopes >= sandwich:
        why = (
            f"between {format_celsius(low)} and {format_celsius(high)} every material has a slope "
            "of one sign, and a network's slope is a mean of them"
        )
    else:
        why = "every network lies between the series and the parallel mix of the same shares"
    if spreads is None:
        return Floor(nominal_ppm=nominal * 1e6, worst_case_ppm=None, why=f"nominal: {why}")
    spread, at, name = spread_bound(need, group, spreads)
    worst = max(nominal, spread)
    if spread > nominal:
        why += (
            f"; worst case: at {format_celsius(at)} the least uncertain law is that of {name}, and "
            "its TC spread alone leaves this much"
        )
    return Floor(nominal_ppm=nominal * 1e6, worst_case_ppm=worst * 1e6, why=f"nominal: {why}")
