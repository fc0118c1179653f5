"""From a proposal to a checked option: every figure made anew from the materials' laws."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws import draw
from tcplan.drift import (
    breakpoints,
    centring,
    chord_tcr,
    effective_coefficients,
    extremes,
    panels,
    ratio_curve,
)
from tcplan.errors import InternalError
from tcplan.goal import Requirement, judged
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Leg, Network, legs, shares, used_materials, value
from tcplan.plan import (
    Deviation,
    Likely,
    Mover,
    Nominal,
    Option,
    Parameter,
    Proof,
    Proposal,
    Verdict,
    WorstCase,
)
from tcplan.process import INDEPENDENT, Process, Variation
from tcplan.ranges import TemperatureRange
from tcplan.units import to_celsius
from tcplan.verify.bound import arrangement_bound
from tcplan.verify.tree_bound import closing_gap
from tcplan.worst.box import Box, Device, Worst
from tcplan.worst.evaluation import worst_case

CLOSED_RELATIVE, CLOSED_PPM = 1e-6, 1e-6
DRAWS, SEED = 20_000, 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Case:
    """What an option is checked against.

    ``spreads`` holds the spread of each material that has one, over this range; ``floor_ppm`` is
    the nominal floor, which bounds an option that comes without evidence of its own, ``mixed_ppm``
    the bound of the mixed networks searched, and ``gap`` the relative gap at which these count as
    proved. ``designed`` says that the search was for the worst case: then all of these bounds are of it.
    """

    materials: Mapping[str, Material]
    spreads: Mapping[str, Spread]
    over: TemperatureRange
    need: Requirement
    floor_ppm: float = 0.0
    mixed_ppm: float = 0.0
    gap: float = 0.01
    process: Process = INDEPENDENT
    designed: bool = False

    @property
    def variation(self) -> Variation | None:
        """What the search was to stand, None when it was for nominal materials."""
        return Variation(spreads=self.spreads, process=self.process) if self.designed else None


def nominal_figures(network: Network, case: Case) -> Nominal:
    """Return the drift of a network of nominal materials over the whole range."""
    over, need = case.over, case.need
    ratio = ratio_curve(network, case.materials, over.reference)
    splits = (*breakpoints(case.materials, used_materials(network)), *need.breakpoints())
    whole = panels(over.low, over.high, splits)

    def drift(T: FloatArray) -> FloatArray:
        return ratio(T) - need.wanted(T)

    def relative(T: FloatArray) -> FloatArray:
        return ratio(T) / need.wanted(T) - 1.0

    ends = extremes(drift, whole)
    offset, left = centring(extremes(relative, whole))
    tc1, tc2, *_ = effective_coefficients(network, case.materials, over.reference)

    def chord(at: float) -> float | None:
        return None if at == over.reference else chord_tcr(ratio, at, over.reference) * 1e6

    return Nominal(
        figure_ppm=nominal_figure(network, case) * 1e6,
        peak_ppm=ends.peak.value * 1e6,
        at_degC=to_celsius(ends.peak.at),
        band_ppm=ends.band * 1e6,
        box_tcr_ppm_per_K=ends.band / over.span * 1e6,
        chord_cold_ppm_per_K=chord(over.low),
        chord_hot_ppm_per_K=chord(over.high),
        tc1_ppm_per_K=tc1 * 1e6,
        tc2_ppm_per_K2=tc2 * 1e6,
        centring_ppm=offset * 1e6,
        centred_peak_ppm=left * 1e6,
    )


def nominal_figure(network: Network, case: Case) -> float:
    """Return the figure that the goal sets on a network of nominal materials (a fraction)."""
    ratio = ratio_curve(network, case.materials, case.over.reference)
    return judged(ratio, case.need, breakpoints(case.materials, used_materials(network))).figure


def spread_figures(network: Network, case: Case) -> WorstCase | None:
    """Return the worst case over the spread; None when a material of the network has none."""
    names = used_materials(network)
    if any(name not in case.spreads for name in names):
        return None
    worst = worst_case(network, case.materials, case.spreads, case.need, case.process)
    return WorstCase(
        peak_ppm=worst.judged.figure * 1e6,
        at_degC=to_celsius(worst.judged.at),
        point=_point(worst),
        method=worst.method,
        upper_bound_ppm=worst.upper * 1e6,
        movers=_movers(network, case, worst),
    )


def _movers(network: Network, case: Case, worst: Worst) -> tuple[Mover, ...]:
    """Return the deviations of the worst device that matter most, largest first, three at most.

    Each is undone alone, its device judged again, and the fall of the figure is its weight.
    """
    box = Box(network, case.materials, case.spreads, case.need, case.process)
    found = []
    for name in used_materials(network):
        tc1, tc2 = worst.device.shifts[name]
        undone: dict[Parameter, Device] = {
            "tc1": worst.device.with_shift(name, (0.0, tc2)),
            "tc2": worst.device.with_shift(name, (tc1, 0.0)),
        }
        # Values that move in full step can only be undone together: they count once.
        mates = box.in_step_with(name)
        if mates[0] == name:
            level = {**worst.device.factors, **dict.fromkeys(mates, 1.0)}
            undone["ohm_per_square"] = Device(level, worst.device.shifts)
        for parameter, device in undone.items():
            fall = worst.judged.figure - box.judge(device).figure
            if fall > 1e-9:
                found.append(Mover(material=name, parameter=parameter, ppm=fall * 1e6))
    return tuple(sorted(found, key=lambda m: (-m.ppm, m.material, m.parameter))[:3])


def _point(worst: Worst) -> dict[str, Deviation]:
    device = worst.device
    return {
        name: Deviation(
            ohm_per_square=factor, tc1=device.shifts[name][0] * 1e6, tc2=device.shifts[name][1] * 1e6
        )
        for name, factor in device.factors.items()
    }


def corner_figures(network: Network, case: Case) -> dict[str, float]:
    """Return the figure of each process corner [ppm]; empty where a material has no spread."""
    names = used_materials(network)
    if any(name not in case.spreads for name in names):
        return {}
    box = Box(network, case.materials, case.spreads, case.need, case.process)
    found = {}
    for corner in case.process.corners:
        device = Device(
            {n: 1.0 + corner.shift(n, "value") for n in names},
            {n: (corner.shift(n, "tc1"), corner.shift(n, "tc2")) for n in names},
        )
        found[corner.name] = box.judge(device).figure * 1e6
    return found


def likely_figures(network: Network, case: Case) -> Likely | None:
    """Return what draws say of a network; None when a material of it has no spread."""
    over = case.over
    stated = {n: case.materials[n].drawn_spread(over.low, over.high) for n in used_materials(network)}
    spreads = {n: spread for n, spread in stated.items() if spread is not None}
    if len(spreads) < len(stated):
        return None
    need, fraction = case.need, case.need.goal.quantile
    found = draw(
        network,
        case.materials,
        spreads,
        case.process,
        need,
        count=DRAWS,
        seed=SEED,
        quantile=fraction,
        limit=need.scale,
    )
    high = found.quantile_high
    return Likely(
        fraction=fraction,
        peak_ppm=found.quantile_figure * 1e6,
        low_ppm=found.quantile_low * 1e6,
        high_ppm=None if high is None else high * 1e6,
        inside=found.yield_fraction,
        inside_low=found.yield_low,
        inside_high=found.yield_high,
        draws=found.draws,
        seed=found.seed,
    )


def verdict(need: Requirement, figure: float, worst: WorstCase | None, likely: Likely | None) -> Verdict:
    """Return whether the limit is met; without a limit, or without a spread to judge, not judged.

    A worst case is met only when its guaranteed bound is within the limit, a quantile when its 95 %
    interval is.
    """
    if need.scale is None:
        return "NOT JUDGED"
    if need.goal.judge == "nominal":
        return "MET" if need.met(figure) else "NOT MET"
    if need.goal.judge == "quantile":
        return _likely_verdict(need, likely)
    if worst is None:
        return "NOT JUDGED"
    if need.met(worst.upper_bound_ppm * 1e-6):
        return "MET"
    return "NOT JUDGED" if need.met(worst.peak_ppm * 1e-6) else "NOT MET"


def _likely_verdict(need: Requirement, likely: Likely | None) -> Verdict:
    if likely is None or likely.high_ppm is None:
        return "NOT JUDGED"
    if need.met(likely.high_ppm * 1e-6):
        return "MET"
    return "NOT JUDGED" if need.met(likely.low_ppm * 1e-6) else "NOT MET"


def _proof(proposal: Proposal, figure: float, case: Case) -> Proof:
    """Return the bound that the evidence proves; without evidence, the floor of all networks.

    ``figure`` is the worst case where that was searched for, else the nominal figure.
    """
    bound = min(case.floor_ppm * 1e-6, figure)
    closed = max(CLOSED_PPM * 1e-6, CLOSED_RELATIVE * figure)
    if proposal.space is not None and proposal.space.arrangement == "mixed":
        bound = max(bound, min(case.mixed_ppm * 1e-6, figure))
        closed = max(closed, closing_gap(figure, case.gap) * (1.0 + 1e-4))
    elif proposal.space is not None and proposal.certificate is not None:
        own = arrangement_bound(
            proposal.space, proposal.certificate, case.need, case.materials, figure, case.variation
        )
        bound = max(bound, own)
    gap = max(0.0, figure - bound)
    proved = proposal.space is not None and gap <= closed
    return Proof(
        kind="global" if proved else "searched",
        of="worst-case" if case.designed else "nominal",
        lower_bound_ppm=bound * 1e6,
        gap_ppm=gap * 1e6,
    )


def proved(option: Option, proposal: Proposal, case: Case) -> Option:
    """Return the option of a proposal with its proof made anew, now that more bounds are known."""
    return replace(option, proof=_proof(proposal, option.proof.figure_ppm * 1e-6, case))


def with_likely(option: Option, case: Case) -> Option:
    """Return the option with what draws say of it."""
    return option if option.likely else replace(option, likely=likely_figures(option.network, case))


def _area(leg: Leg, material: Material, reference: float) -> float | None:
    """Return the area of all strings of a leg [m^2]."""
    one = material.area(leg.ohms * leg.strings, reference)
    return None if one is None else one * leg.strings


def check(proposal: Proposal, case: Case, name: str) -> Option:
    """Return the checked option of a proposal.

    Parameters
    ----------
    proposal : Proposal
    case : Case
    name : str
        The id of the option.

    Raises
    ------
    InternalError
        When the network contradicts itself: shares that do not sum to 1.
    """
    network = proposal.network
    if abs(sum(shares(network)) - 1.0) > 1e-9 or not np.isfinite(value(network)):
        raise InternalError(f"option {name}: the shares of its legs do not sum to 1")
    nominal, worst = nominal_figures(network, case), spread_figures(network, case)
    if case.designed and worst is None:
        raise InternalError(f"option {name}: designed for its worst case, and a material has no spread")
    figure = worst.peak_ppm if case.designed and worst else nominal.figure_ppm
    # Draws take longest; the verdict needs them only where a quantile is judged.
    likely = likely_figures(network, case) if case.need.goal.judge == "quantile" else None
    reference = case.over.reference
    return Option(
        id=name,
        network=network,
        squares=tuple(case.materials[leg.material].squares(leg.ohms, reference) for leg in legs(network)),
        areas=tuple(_area(leg, case.materials[leg.material], reference) for leg in legs(network)),
        nominal=nominal,
        worst_case=worst,
        proof=_proof(proposal, figure * 1e-6, case),
        verdict=verdict(case.need, nominal.figure_ppm * 1e-6, worst, likely),
        role=proposal.role,
        corners=corner_figures(network, case),
        likely=likely,
    )
