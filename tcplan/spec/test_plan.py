"""Where a composite is measured, how sure the measurement is, and what a device may read there.

The drift at T is read as R(T)/R(T_ref) - 1, so both readings, and both temperatures, are in it:

    u(d) = r sqrt(2 u_m^2 + (s u_T)^2 + (s_ref u_T)^2),    U = 2 u(d),    accepted: |d| <= limit - U,

with r = R(T)/R(T_ref), u_m and u_T the standard uncertainties of the meter (relative) and of the
thermometer, and s, s_ref the slope d ln R/dT at T and at the reference.

References
----------
JCGM 100:2008, 4.3.7 (limits as a rectangle), 5.1.2 (root-sum-square) and 6.2.1 (coverage); JCGM 106:2012,
8.3.2 (guarded acceptance).
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.budget.rebuilt import asked_of
from tcplan.drift import Curve, breakpoints, extremes, panels, ratio_curve
from tcplan.goal import Requirement, requirement
from tcplan.material.spread import shifted_ratio
from tcplan.network import deviated, resistance, used_materials, value
from tcplan.plan import Plan, WorstCase
from tcplan.units import from_celsius, to_celsius

COVERAGE = 2.0
SLOPE_STEP = 0.5  # K to either side, inside the range
SAME = 1e-6  # K; rounding of temperatures
TOGETHER = 1.5  # K; points that are nearer to each other are measured once


@dataclass(frozen=True, slots=True, kw_only=True)
class Instruments:
    """What a test is done with, as limits of error: meter [ppm of the value], temperature [K]."""

    meter_ppm: float = 50.0
    thermometer_K: float = 0.5

    @property
    def meter(self) -> float:
        """The standard uncertainty of one reading, relative: the limits are those of a rectangle."""
        return self.meter_ppm * 1e-6 / math.sqrt(3.0)

    @property
    def thermometer(self) -> float:
        """The standard uncertainty of a temperature [K]."""
        return self.thermometer_K / math.sqrt(3.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Step:
    """One temperature of the test; ``limit_ppm`` is None where no limit holds.

    ``worst_ppm`` is None without a worst case.
    ``nominal_ppm`` and ``worst_ppm`` are the signed drift of the nominal and of the worst device, ``slope``
    the larger slope of the two [ppm/K], ``uncertainty_ppm`` expanded.
    """

    at_degC: float
    is_reference: bool
    why: str
    nominal_ppm: float
    worst_ppm: float | None
    slope_ppm_per_K: float
    uncertainty_ppm: float
    limit_ppm: float | None

    @property
    def accepted_ppm(self) -> float | None:
        """The largest reading that is accepted [ppm], not above zero where none is; None without a limit."""
        return None if self.limit_ppm is None else self.limit_ppm - self.uncertainty_ppm


@dataclass(frozen=True, slots=True, kw_only=True)
class Band:
    """The test of highest less lowest reading, for a limit on the band."""

    limit_ppm: float
    uncertainty_ppm: float

    @property
    def accepted_ppm(self) -> float:
        """The largest band of the readings that is accepted [ppm]; not above zero where none is."""
        return self.limit_ppm - self.uncertainty_ppm


@dataclass(frozen=True, slots=True, kw_only=True)
class TestPlan:
    """The steps of a test by temperature, the band where one is limited, and the value at the reference.

    ``value_uncertainty_ppm`` is the expanded one of a single reading at the reference.
    """

    __test__ = False  # for collectors of tests: it is none

    steps: tuple[Step, ...]
    band: Band | None
    value_uncertainty_ppm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class _Device:
    """One device: its ratio to the reference, and its name in words."""

    ratio: Curve
    name: str


def test_plan(plan: Plan, instruments: Instruments) -> TestPlan:
    """Return the test of the chosen option: at the ends, the reference and the extremes of its devices.

    Parameters
    ----------
    plan : Plan
    instruments : Instruments

    Returns
    -------
    TestPlan
        With acceptance limits that are tighter than the limit by the uncertainty of the test.
    """
    asked = asked_of(plan)
    need = requirement(asked.goal, asked.over)
    devices = tuple(_devices(plan))
    steps = tuple(
        _step(plan, need, devices, instruments, at, why) for at, why in _temperatures(plan, devices)
    )
    at_reference = _slope(plan, devices, need.reference) * instruments.thermometer
    return TestPlan(
        steps=steps,
        band=_band(need, steps),
        value_uncertainty_ppm=COVERAGE * math.hypot(instruments.meter, at_reference) * 1e6,
    )


test_plan.__test__ = False  # type: ignore[attr-defined]


def _devices(plan: Plan) -> Iterator[_Device]:
    """Yield the nominal device, and that of the worst case where one is known."""
    network, reference = plan.best.network, from_celsius(plan.range.reference_degC)
    yield _Device(ratio=ratio_curve(network, plan.by_name, reference), name="nominal")
    if plan.best.worst_case is not None:
        yield _Device(ratio=_worst_ratio(plan, plan.best.worst_case), name="worst device")


def _worst_ratio(plan: Plan, worst: WorstCase) -> Curve:
    reference = from_celsius(plan.range.reference_degC)
    network = deviated(plan.best.network, {name: d.ohm_per_square for name, d in worst.point.items()})
    shifts = {name: (d.tc1 * 1e-6, d.tc2 * 1e-6) for name, d in worst.point.items()}

    def ratio(T: FloatArray) -> FloatArray:
        laws = {n: shifted_ratio(plan.by_name[n].law, own, reference, T) for n, own in shifts.items()}
        return resistance(network, laws) / value(network)

    return ratio


# --- where --------------------------------------------------------------------------------------------


def _temperatures(plan: Plan, devices: tuple[_Device, ...]) -> list[tuple[float, str]]:
    """Return the temperatures [K] with the reason for each, upwards; near ones are one."""
    over = plan.range
    fixed = ((over.low_degC, "low end"), (over.reference_degC, "reference"), (over.high_degC, "high end"))
    found = [(from_celsius(degC), [why]) for degC, why in fixed]
    for device in devices:
        for at, why in _extremes(plan, device):
            near = next((own for own in found if abs(own[0] - at) <= TOGETHER), None)
            if near is None:
                # At an extreme inside the range the slope is 0: a whole degree is as good.
                found.append((from_celsius(round(to_celsius(at))), [why]))
            elif why not in near[1]:
                near[1].append(why)
    return [(at, ", ".join(whys)) for at, whys in sorted(found)]


def _extremes(plan: Plan, device: _Device) -> Iterator[tuple[float, str]]:
    """Yield where a device drifts highest, lowest, and where its worst case was verified [K]."""
    asked = asked_of(plan)
    need = requirement(asked.goal, asked.over)
    names = used_materials(plan.best.network)
    splits = (*breakpoints(plan.by_name, names), *need.breakpoints())
    ends = extremes(
        lambda T: device.ratio(T) - need.wanted(T), panels(asked.over.low, asked.over.high, splits)
    )
    yield ends.high.at, f"{device.name} highest"
    yield ends.low.at, f"{device.name} lowest"
    worst = plan.best.worst_case
    if worst is not None and device.name != "nominal":
        yield from_celsius(worst.at_degC), "worst case"


# --- how sure, and what is accepted -------------------------------------------------------------------


def _step(
    plan: Plan,
    need: Requirement,
    devices: tuple[_Device, ...],
    instruments: Instruments,
    at: float,
    why: str,
) -> Step:
    T, reference = np.array([at]), abs(at - need.reference) < SAME
    drifts = [float((device.ratio(T) - need.wanted(T))[0]) * 1e6 for device in devices]
    slope, first = _slope(plan, devices, at), _slope(plan, devices, need.reference)
    ratio = max(float(device.ratio(T)[0]) for device in devices)
    thermal = math.hypot(slope * instruments.thermometer, first * instruments.thermometer)
    sure = ratio * math.hypot(math.sqrt(2.0) * instruments.meter, thermal)
    return Step(
        at_degC=round(to_celsius(at), 6),
        is_reference=reference,
        why=why,
        nominal_ppm=drifts[0],
        worst_ppm=drifts[1] if len(drifts) > 1 else None,
        slope_ppm_per_K=slope * 1e6,
        uncertainty_ppm=0.0 if reference else COVERAGE * sure * 1e6,
        limit_ppm=None if reference else _limit(need, at),
    )


def _slope(plan: Plan, devices: tuple[_Device, ...], at: float) -> float:
    """Return the largest |d ln R/dT| of the devices [1/K], over a degree inside the range."""
    low, high = from_celsius(plan.range.low_degC), from_celsius(plan.range.high_degC)
    T = np.array([max(at - SLOPE_STEP, low), min(at + SLOPE_STEP, high)])
    return max(abs(float(np.diff(np.log(device.ratio(T)))[0] / (T[1] - T[0]))) for device in devices)


def _limit(need: Requirement, at: float) -> float | None:
    """Return the tightest limit on the drift at a temperature [ppm]."""
    own = [
        piece.weight
        for piece in need.pieces
        if not piece.centred and piece.low - SAME <= at <= piece.high + SAME
    ]
    return min(own) * need.scale * 1e6 if own and need.scale is not None else None


def _band(need: Requirement, steps: tuple[Step, ...]) -> Band | None:
    """Return the test of the band: the two least sure readings count as the highest and the lowest.

    The reading at the reference is in both, and counts twice: that is on the safe side.
    """
    weights = [piece.weight for piece in need.pieces if piece.centred]
    if not weights or need.scale is None:
        return None
    first, second = sorted((step.uncertainty_ppm for step in steps), reverse=True)[:2]
    return Band(limit_ppm=2.0 * min(weights) * need.scale * 1e6, uncertainty_ppm=math.hypot(first, second))
