"""Which devices of a sweep have readings enough to be compared with a plan."""

from __future__ import annotations

import numpy as np

from tcplan.errors import InputError, Problem
from tcplan.measure.compare_readings import range_of_readings
from tcplan.measure.comparison import Expected, Skipped
from tcplan.measure.fit_readings import device_place
from tcplan.measure.fit_repeats import NEARNESS
from tcplan.measure.model import Sweep
from tcplan.units import format_celsius

LEAST_SCATTER = 3  # readings of a straight line that show their scatter


def with_enough(sweep: Sweep, expected: Expected) -> tuple[Sweep, tuple[Skipped, ...]]:
    """Return the readings of the devices that have enough of them, and the other devices.

    Parameters
    ----------
    sweep : Sweep
    expected : Expected

    Returns
    -------
    Sweep
        Of one device or more.
    tuple of Skipped
        In the order of the file.

    Raises
    ------
    InputError
        When no device has enough, naming each.
    """
    own = [sweep.of_device(position) for position in np.unique(sweep.device).tolist()]
    low, high = range_of_readings(expected)
    few = [(one, found) for one in own if (found := _few(one, low, high))]
    if len(few) == len(own):
        raise InputError([_problem(one, found, expected) for one, found in few])
    left_out = [int(one.device[0]) for one, _ in few]
    kept = sweep.taken(np.flatnonzero(~np.isin(sweep.device, left_out))) if few else sweep
    return kept, tuple(_skipped(one, found, expected) for one, found in few)


def _few(own: Sweep, low: float, high: float) -> str:
    """Return what there is too little of; empty when there is enough."""
    inside = own.T[(low <= own.T) & (high >= own.T)]
    if not len(inside):
        return f"readings from {format_celsius(float(own.T.min()))} to {format_celsius(float(own.T.max()))}"
    if float(np.ptp(inside)) <= NEARNESS:
        return f"readings at one temperature, {format_celsius(float(inside[0]))}"
    if own.u_R is None and own.u_T is None and len(inside) < LEAST_SCATTER:
        return f"{len(inside)} readings in the range of the plan, without u(R)"
    return ""


def _problem(own: Sweep, found: str, expected: Expected) -> Problem:
    return Problem(
        where=device_place(own),
        found=found,
        expected=_wanted(expected),
        todo=f"{_todo(own)} Check the unit of T: degC, K and degF are told apart by the header.",
    )


def _skipped(own: Sweep, found: str, expected: Expected) -> Skipped:
    return Skipped(
        device=own.devices[int(own.device[0])], found=found, expected=_wanted(expected), todo=_todo(own)
    )


def _wanted(expected: Expected) -> str:
    over = expected.over
    planned = f"{format_celsius(over.low)} to {format_celsius(over.high)}"
    return f"two temperatures in the range of the plan, {planned}, and u(R) or three readings"


def _todo(own: Sweep) -> str:
    name = own.devices[int(own.device[0])]
    return f"Give more readings of device {name}, or leave it out." if name else "Give more readings."
