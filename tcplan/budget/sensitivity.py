"""How the nominal judged figure moves with one parameter: exact derivatives at its peak.

At the temperature T* of the peak the derivative of the figure is that of the drift with T* held
(envelope theorem). With p_k the share of a leg and r_k its law ratio::

    d drift / d ln R_k = (p_k(T*) - p_k(T_ref)) R(T*)/R(T_ref)
    d drift / d a      = (p_k(T*) / r_k(T*)) R(T*)/R(T_ref) dr_k/da,  a = TC1 or TC2 of its material

where r = device(T)/device(T_ref) and device(T) = law(T)/law(T0) + a (T - T0) + b (T - T0)^2.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from tcplan.budget.model import Sensitivity
from tcplan.drift import breakpoints, extremes, panels, ratio_curve, stationary_points
from tcplan.goal import Requirement, judged
from tcplan.material.model import Material
from tcplan.network import Network, leg_shares, legs, resistance, shares, used_materials, value

SHARED = 1e-4  # peaks within this of the highest, relative, are taken as one with it
STEPS = {"value": (0.01, "1 %"), "tc1": (1e-5, "10 ppm/K"), "tc2": (1e-7, "0.1 ppm/K^2")}


@dataclass(frozen=True, slots=True)
class Rates:
    """Derivatives of the judged figure, one for each way, by material and parameter.

    ``more`` is the rate at which the figure grows when the parameter grows, ``less`` that when it falls;
    where one temperature sets the peak they are opposite. A value counts as its logarithm.
    """

    more: dict[tuple[str, str], float]
    less: dict[tuple[str, str], float]


def sensitivities(
    network: Network, materials: Mapping[str, Material], need: Requirement
) -> tuple[Sensitivity, ...]:
    """Return what a step of each parameter costs the nominal judged figure, the dearest first."""
    rates = figure_rates(network, materials, need)
    found = [
        Sensitivity(
            material=name,
            parameter=parameter,  # type: ignore[arg-type]
            step=STEPS[parameter][1],
            more_ppm=rates.more[name, parameter] * STEPS[parameter][0] * 1e6,
            less_ppm=rates.less[name, parameter] * STEPS[parameter][0] * 1e6,
        )
        for name, parameter in rates.more
    ]
    return tuple(sorted(found, key=lambda s: -max(abs(s.more_ppm), abs(s.less_ppm))))


def figure_rates(network: Network, materials: Mapping[str, Material], need: Requirement) -> Rates:
    """Return the derivatives of the judged figure of the nominal network."""
    keys, reference = _keys(network), need.reference
    parts = []
    for peak in peaks(network, materials, need):
        weighed = [(by, drift_rates(network, materials, reference, at)) for at, by in peak]
        parts.append({key: sum(by * rates[key] for by, rates in weighed) for key in keys})
    return Rates(
        more={key: max(part[key] for part in parts) for key in keys},
        less={key: max(-part[key] for part in parts) for key in keys},
    )


def _keys(network: Network) -> list[tuple[str, str]]:
    return [(name, parameter) for name in used_materials(network) for parameter in STEPS]


def drift_rates(
    network: Network, materials: Mapping[str, Material], reference: float, at: float
) -> dict[tuple[str, str], float]:
    """Return d drift(T)/d parameter of every material at one temperature [K]; of a value, d/d ln.

    Parameters
    ----------
    network : Network
    materials : mapping of name to Material
    reference, at : float
        T_ref and T [K].
    """
    T = np.array([at])
    ratios = {name: materials[name].ratio(T, reference) for name in used_materials(network)}
    whole = float((resistance(network, ratios) / value(network))[0])
    rates = dict.fromkeys(_keys(network), 0.0)
    rows = zip(legs(network), leg_shares(network, ratios), shares(network), strict=True)
    for leg, share, own in rows:
        name, ratio = leg.material, float(ratios[leg.material][0])
        rates[name, "value"] += (float(share[0]) - own) * whole
        for parameter, power in (("tc1", 1), ("tc2", 2)):
            moved = _ratio_rate(materials[name], reference, at, ratio, power)
            rates[name, parameter] += float(share[0]) / ratio * whole * moved
    return rates


def _ratio_rate(material: Material, reference: float, at: float, ratio: float, power: int) -> float:
    """Return dr/da of r = device(T)/device(T_ref) for a shift a (T - T0)^power of the device."""
    own = material.reference
    scale = float(material.ratio(np.array([reference]), own)[0])
    return float(((at - own) ** power - ratio * (reference - own) ** power) / scale)


def peaks(
    network: Network, materials: Mapping[str, Material], need: Requirement
) -> list[tuple[tuple[float, float], ...]]:
    """Return what sets the judged figure: pairs of temperature [K] and how its drift counts.

    One entry a peak that is as high as the highest; a band has two temperatures in one entry.
    """
    ratio = ratio_curve(network, materials, need.reference)
    splits = (*breakpoints(materials, used_materials(network)), *need.breakpoints())
    figure = judged(ratio, need, splits).figure
    found: list[tuple[tuple[float, float], ...]] = []

    def drift(T: np.ndarray) -> np.ndarray:
        return np.asarray(ratio(T) - need.wanted(T))

    for piece in need.pieces:
        over = panels(piece.low, piece.high, splits)
        if piece.centred:
            ends = extremes(drift, over)
            if 0.5 * ends.band / piece.weight >= figure * (1.0 - SHARED):
                half = 0.5 / piece.weight
                found.append(((ends.high.at, half), (ends.low.at, -half)))
            continue
        points = np.unique([t for low, high in over for t in stationary_points(drift, low, high)])
        for at, off in zip(points, drift(points), strict=True):
            if abs(off) / piece.weight >= figure * (1.0 - SHARED):
                found.append(((float(at), float(np.sign(off)) / piece.weight),))
    return found
