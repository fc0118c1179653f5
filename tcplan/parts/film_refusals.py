"""Why the legs of a film can not be made, with the nearest figure that can."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import takewhile
from math import ceil, floor, log10

from tcplan.made import Refusal
from tcplan.parts.counts import Point
from tcplan.parts.film_task import FilmTask
from tcplan.units import format_ohms, format_si, round_outward

_LARGEST_ERROR = 0.9
_SLACK = 1e-9  # relative, of the arithmetic
_BISECTED = 1e-5  # decades
_CURRENT_DIGITS = 6  # finer than a step of the grid in any usual width: the same width is found again


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
    free = task.with_currents({})
    return _grid(free) or _reach(free) or _ratio(free) or _mismatch(free) or _current(task) or (_error(free),)


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
    digits = max(4, 1 + ceil(-log10(error)))  # so that the nearest value, as printed, is within the error
    least, most = min(smallest) / count, max(largest) * count
    found: list[Refusal] = []
    for name, ohms in zip(task.names, task.wanted, strict=True):
        if least > ohms * (1.0 + error):
            nearest = f"{format_ohms(least, digits)}: {count} of the shortest unit in parallel"
        elif most < ohms * (1.0 - error):
            nearest = f"{format_ohms(most, digits)}: {count} of the longest unit in series"
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


def _mismatch(task: FilmTask) -> tuple[Refusal, ...]:
    """Return that no unit within the largest width has the mismatch, and the least one that some has."""
    wanted = task.rules.mismatch
    if wanted is None or _can(task) or not _can(task.with_mismatch(None)):
        return ()
    low, high = log10(wanted), 0.0
    while high - low > _BISECTED:
        middle = 0.5 * (low + high)
        low, high = (low, middle) if _can(task.with_mismatch(10.0**middle)) else (middle, high)
    width, count = f"{format_si(task.widest, 'm')} wide", task.rules.most_count
    return (
        Refusal(
            leg=task.names[task.wanted.index(min(task.wanted))],
            rule="mismatch",
            found=f"a mismatch of {_percent(100.0 * wanted)} with units up to {width}, counts up to {count}",
            nearest=f"a mismatch of {_percent(round_outward(100.0 * 10.0**high, 4))}",
        ),
    )


def _current(task: FilmTask) -> tuple[Refusal, ...]:
    """Return the legs whose current nothing carries, with the largest one that something does.

    Leg by leg: what is carried beside it are the currents of the legs before, as far as they can be.
    """
    if not _can(task.with_currents({})):
        return ()
    held: dict[str, float] = {}
    found: list[Refusal] = []
    for name, current in task.currents.items():
        held[name] = current
        if not _can(task.with_currents(held)):
            width, strings = _widest_together(task, held, name)
            held[name] = _rounded_down(width * strings * (task.film.max_current or 0.0))
            found.append(
                _too_much(name, current, held[name], f"{_strings(strings)}, {format_si(width, 'm')} wide")
            )
    return tuple(found)


def _too_much(name: str, current: float, most: float, by: str) -> Refusal:
    return Refusal(
        leg=name,
        rule="current",
        found=f"{format_si(current, 'A')} through leg {name}",
        nearest=f"{format_si(most, 'A', _CURRENT_DIGITS)}: {by}",
    )


def _can(task: FilmTask) -> bool:
    return any(task.can(width) for width in sorted(task.widths(), reverse=True))


def _widest_together(task: FilmTask, held: Mapping[str, float], name: str) -> tuple[float, int]:
    """Return the width [m] and the strings of a leg that carry most beside the other currents [A]."""
    others = task.with_currents({key: value for key, value in held.items() if key != name})
    best_width, best_strings = 0.0, 0
    for width in sorted({*task.widths(), *others.widths()}, reverse=True):
        enough = floor(best_width * best_strings / width * (1.0 + _SLACK))
        strings = _most_strings(task, held, name, width, enough)
        if strings > enough:
            best_width, best_strings = width, strings
    return best_width, best_strings


def _most_strings(task: FilmTask, held: Mapping[str, float], name: str, width: float, enough: int) -> int:
    """Return the most strings that a leg can have at a width [m]; ``enough`` where no more than that."""
    of_string = width * (task.film.max_current or 0.0)
    low, high = enough, task.rules.most_count
    middle = low + 1  # no more than enough is the usual answer
    while low < high:
        can = task.with_currents({**held, name: middle * of_string}).can(width)
        if not can and middle == enough + 1:
            return enough
        low, high = (middle, high) if can else (low, middle - 1)
        middle = (low + high + 1) // 2
    return low


def _rounded_down(current: float) -> float:
    scale = 10.0 ** (_CURRENT_DIGITS - 1 - floor(log10(current)))
    return floor(current * scale * (1.0 + _SLACK)) / scale


def _strings(count: int) -> str:
    return "1 string" if count == 1 else f"{count} strings in parallel"


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
