"""Why the legs of a film can not be made, with the nearest figure that can."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import takewhile

from tcplan.made import Refusal
from tcplan.parts.counts import Point
from tcplan.parts.film_task import FilmTask
from tcplan.units import format_ohms, format_si, round_outward

_LARGEST_ERROR = 0.9


def refusals(task: FilmTask, too_large: Sequence[Point]) -> tuple[Refusal, ...]:
    """Return what stops the legs of a film, the first rule that does.

    Parameters
    ----------
    task : FilmTask
    too_large : sequence of Point
        What could be made but for its area.
    """
    if too_large:
        return (_area(task, too_large),)
    return _grid(task) or _reach(task) or _ratio(task) or (_error(task),)


def _area(task: FilmTask, points: Sequence[Point]) -> Refusal:
    least = min(points, key=lambda point: point.area)
    units = [series * parallel for series, parallel in least.counts]
    return Refusal(
        leg=task.names[units.index(max(units))],
        rule="area",
        found=f"at most {format_si(task.rules.max_area or 0.0, 'm^2')} for all legs of {task.material.name}",
        nearest=f"the smallest area possible is {format_si(round_outward(least.area, 4), 'm^2')}",
    )


def _grid(task: FilmTask) -> tuple[Refusal, ...]:
    """Return that no length is on the grid: said of each leg."""
    steps = [(width, *task.length_steps(width)) for width in task.widths()]
    if any(low <= high for _, low, high in steps):
        return ()
    width, low, _ = steps[0]
    rules, length = task.rules, low * task.grid
    found = (
        f"no length of {rules.min_squares:g} to {rules.max_length_squares:g} squares at a width of "
        f"{format_si(width, 'm')} on a grid of {format_si(task.grid, 'm')}"
    )
    nearest = f"a length of {format_si(length, 'm')}, {length / width:.4g} squares"
    return tuple(Refusal(leg=name, rule="grid", found=found, nearest=nearest) for name in task.names)


def _reach(task: FilmTask) -> tuple[Refusal, ...]:
    """Return the legs below the least and above the largest value that the counts give."""
    smallest, largest = [], []
    for width in task.widths():
        (low, high), cell = task.length_steps(width), task.cell(width)
        if low <= high:
            smallest.append(cell.per_length * low * task.grid + cell.ends)
            largest.append(cell.per_length * high * task.grid + cell.ends)
    count, error = task.rules.most_count, task.rules.error
    least, most = min(smallest) / count, max(largest) * count
    found: list[Refusal] = []
    for name, ohms in zip(task.names, task.wanted, strict=True):
        if least > ohms * (1.0 + error):
            nearest = f"{format_ohms(least)}: {count} of the shortest unit in parallel"
        elif most < ohms * (1.0 - error):
            nearest = f"{format_ohms(most)}: {count} of the longest unit in series"
        else:
            continue
        found.append(Refusal(leg=name, rule="count", found=format_ohms(ohms), nearest=nearest))
    return tuple(found)


def _ratio(task: FilmTask) -> tuple[Refusal, ...]:
    """Return that the legs lie too far apart for one unit, whatever its size."""
    small, large = min(task.wanted), max(task.wanted)
    most, error = task.rules.most_count**2, task.rules.error
    if large * (1.0 - error) <= small * (1.0 + error) * most:
        return ()
    return (
        Refusal(
            leg=task.names[task.wanted.index(small)],
            rule="count",
            found=f"legs of one unit from {format_ohms(small)} to {format_ohms(large)}",
            nearest=f"a ratio of at most {most}: {format_ohms(large / most)} for the smallest",
        ),
    )


def _error(task: FilmTask) -> Refusal:
    """Return that no counts reach the error wanted, and the least error that some do."""
    count, wanted = task.rules.most_count, task.rules.error
    limits = takewhile(lambda error: error < _LARGEST_ERROR, (wanted * 4.0**k for k in range(1, 40)))
    for limit in (*limits, _LARGEST_ERROR):
        points = [(width, p) for width in task.widths() for p in task.points(width, limit)]
        if points:
            width, best = min(points, key=lambda d: (d[1].error, d[1].area))
            nearest = f"the least error reached is {_percent(round_outward(100.0 * best.error))}"
            return Refusal(leg=_worst(task, width, best), rule="count", found=_asked(task), nearest=nearest)
    nearest = f"no counts up to {count} come within {_percent(100.0 * _LARGEST_ERROR)}"
    return Refusal(leg=task.names[0], rule="count", found=_asked(task), nearest=nearest)


def _asked(task: FilmTask) -> str:
    rules = task.rules
    mismatch = "" if rules.mismatch is None else f" with a mismatch of {_percent(100.0 * rules.mismatch)}"
    return f"an error of {_percent(100.0 * rules.error)}{mismatch} wanted of counts up to {rules.most_count}"


def _worst(task: FilmTask, width: float, point: Point) -> str:
    """Return the leg that is farthest from its value."""
    cell = task.cell(width)
    unit = cell.per_length * point.length + cell.ends
    off = [abs(unit * s / p / ohms - 1.0) for (s, p), ohms in zip(point.counts, task.wanted, strict=True)]
    return task.names[off.index(max(off))]


def _percent(value: float) -> str:
    return f"{value:.4g} %"
