"""Why there is no operating point, and the nearest drive that has one."""

from __future__ import annotations

from decimal import ROUND_FLOOR, Decimal

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.operating.device import EDGE, Device
from tcplan.operating.raising import Raised
from tcplan.units import format_celsius, format_si

WHERE = "operating"
NEAR = 1e-4  # of a rise: how near to the end of its range a leaf stands when that end is the limit
DIGITS = 4


def check_ambient(device: Device, T: FloatArray) -> None:
    """Refuse ambient temperatures [K] that a material is not usable at, whatever the drive."""
    for material in device.materials:
        low, high = material.usable
        for edge in (float(T.min()), float(T.max())):
            if edge < low - EDGE or edge > high + EDGE:
                raise InputError(
                    Problem(
                        where=WHERE,
                        found=f"an ambient temperature of {format_celsius(edge)}",
                        expected=f"{format_celsius(low)} to {format_celsius(high)}, where {material.name} "
                        "is usable",
                        todo="Narrow the range, or widen that of the material by extrapolate_to.",
                    )
                )


def refusal(device: Device, T: FloatArray, drive: float, end: Raised) -> InputError:
    """Return the error for a drive that was not reached: runaway, or too hot for the data of a leaf."""
    unit, what = ("V", "voltage") if device.by_voltage else ("A", "current")
    most = inward(end.part * drive, DIGITS)
    asked = f"{format_si(drive, unit, 6)} at an ambient of {{}}"
    edge = _at_edge(device, T, end)
    if edge is not None:
        row, column = edge
        material = device.materials[row]
        low, high = material.usable
        at = format_celsius(float(T[column]))
        found = (
            f"{asked.format(at)}, where a leg of {material.name} leaves {format_celsius(low)} to "
            f"{format_celsius(high)}, the range it is usable in"
        )
        todo = f"Lower the {what} or the thermal resistance, or widen that range by extrapolate_to."
    else:
        at = format_celsius(float(T[int(np.argmax(end.stuck))]))
        found = f"thermal runaway: {asked.format(at)} has no stable operating point"
        todo = f"Lower the {what} or the thermal resistance."
        if not device.heating.any():
            found = f"{asked.format(at)}, at which the voltage coefficients leave no operating point"
            todo = f"Lower the {what}, or check voltage_coefficient."
    expected = f"{format_si(most, unit, DIGITS)} at most" if most > 0 else f"no {what} at all"
    return InputError(Problem(where=WHERE, found=found, expected=expected, todo=todo))


def inward(value: float, digits: int) -> float:
    """Return a value above zero rounded down to significant digits, so that a printed limit still holds."""
    if value <= 0.0:
        return 0.0
    exact = Decimal(repr(float(value)))
    place = Decimal(1).scaleb(exact.adjusted() - digits + 1)
    return float(exact.quantize(place, rounding=ROUND_FLOOR))


def _at_edge(device: Device, T: FloatArray, end: Raised) -> tuple[int, int] | None:
    """Return the leaf, and the ambient temperature, that stands at the end of what is usable.

    Near the limit of a range the last accepted state is as near to it as the drive is; near a runaway
    that would be a coincidence.
    """
    low, high = device.usable
    hot = end.state.temperature
    room = np.where(end.stuck, np.minimum(high - hot, hot - low), np.inf)
    row, column = np.unravel_index(int(np.argmin(room)), room.shape)
    rise = abs(float(hot[row, column] - T[column]))
    return (int(row), int(column)) if room[row, column] <= NEAR * rise + 2.0 * EDGE else None
