"""The readings of a sweep that can be compared with a plan: in its range, and of such a resistor."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from tcplan.errors import InputError, Problem
from tcplan.measure.comparison import Expected
from tcplan.measure.fit_readings import device_place
from tcplan.measure.model import Sweep
from tcplan.network import used_materials, value
from tcplan.units import format_ohms

EDGE = 1.0  # K; a chamber that overshoots the ends of a range by so much is meant to be at them
ANOTHER_KIND = 3.0  # times the planned value, up or down: no spread reaches so far
MOST_READINGS = 100_000


def readings_by_device(sweep: Sweep, expected: Expected) -> Iterator[tuple[Sweep, int]]:
    """Yield the readings of each device in the range of the plan, and how many are outside of it.

    Each has some there.

    Raises
    ------
    InputError
        Naming every device that is another resistor.
    """
    low, high = range_of_readings(expected)
    if len(sweep.T) > MOST_READINGS:
        found = f"{len(sweep.T)} readings"
        raise InputError(Problem(where=sweep.source, found=found, expected=f"{MOST_READINGS} at most"))
    problems, taken = [], []
    for position in np.unique(sweep.device).tolist():
        own = sweep.of_device(position)
        inside = own.taken(np.flatnonzero((low <= own.T) & (high >= own.T)))
        if (problem := _another_kind(inside, expected)) is not None:
            problems.append(problem)
        else:
            order = np.argsort(inside.T, kind="stable")
            taken.append((inside.taken(order), len(own.T) - len(inside.T)))
    if problems:
        raise InputError(problems)
    yield from taken


def range_of_readings(expected: Expected) -> tuple[float, float]:
    """Return the range of the plan and a little beyond it, as far as the materials have laws."""
    usable = [expected.materials[name].usable for name in used_materials(expected.network)]
    low, high = max(low for low, _ in usable), min(high for _, high in usable)
    over = expected.over
    return min(over.low, max(over.low - EDGE, low)), max(over.high, min(over.high + EDGE, high))


def _another_kind(own: Sweep, expected: Expected) -> Problem | None:
    planned, median = value(expected.network), float(np.median(own.R))
    times = median / planned
    if 1.0 / ANOTHER_KIND < times < ANOTHER_KIND:
        return None
    thousand = abs(abs(math.log10(times)) / 3.0 - round(abs(math.log10(times)) / 3.0)) < 0.1
    unit = "Check the unit of R in the header: it looks like ohm for kohm." if thousand else ""
    return Problem(
        where=device_place(own),
        found=f"readings of about {format_ohms(median)}, {times:.3g} times the plan",
        expected=f"readings of a resistor planned for {format_ohms(planned)}",
        todo=unit or "Check which option was measured (--option), and the connections.",
    )
