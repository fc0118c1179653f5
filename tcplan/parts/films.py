"""Film parts: one unit cell for all legs of a film, and how many units each leg takes.

The unit is R = ohm_per_square L / (W - width_bias) + 2 end_resistance / W. W is the drawn width, across the
current; L is along it, between the inner edges of the two ends. Its area is that of its place in an array,
(L + 2 end_length + spacing) (W + spacing), with what is not stated 0; dummies are not in it.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.made import FilmLeg, FilmUnit, Refusal
from tcplan.material.model import Film, Material
from tcplan.parts.count_bounds import ALIKE
from tcplan.parts.count_trade import trade
from tcplan.parts.counts import Point
from tcplan.parts.film_refusals import refusals
from tcplan.parts.film_rules import FilmRules
from tcplan.parts.film_task import FilmTask, film_task
from tcplan.parts.film_unit import ends_ohms, per_length
from tcplan.parts.network import ends_material

__all__ = ["FilmChoice", "FilmResult", "FilmRules", "current_density", "film_legs", "zero_tc_length"]

MOST_CHOICES = 12
_Drawn = tuple[float, Point]
"""A width [m] and a point of its trade."""


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmChoice:
    """One way to make all legs of a film: its unit, its legs, their area [m^2] and largest value error."""

    unit: FilmUnit
    legs: tuple[FilmLeg, ...]
    area: float
    error: float


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmResult:
    """The trade between area and error, least area first; why there is none, if so.

    ``zero_tc`` is the choice of least area at the length at which the TC1 of body and ends cancel, on the
    grid: None where there is no such length inside the rules. It need not be one of ``choices``.
    """

    choices: tuple[FilmChoice, ...]
    refusals: tuple[Refusal, ...]
    zero_tc: FilmChoice | None = None


def film_legs(
    material: Material, legs: Sequence[tuple[str, float]], reference: float, rules: FilmRules
) -> FilmResult:
    """Return how all legs of one film can be made of one unit cell.

    W starts at the preferred width, else the least one; a wanted mismatch adds wider ones, and so does a
    current above the limit of the film, which more strings in parallel carry as well. W and L are on the
    grid of the film, 5 nm where none is stated. Where the grid offers more lengths than can be looked
    through, closely spaced ones and those that make one leg exact are taken, and the best are refined.

    Parameters
    ----------
    material : Material
        A film with a least width.
    legs : sequence of (str, float)
        Name and wanted value [ohm] at ``reference`` of each leg.
    reference : float
        Reference temperature of the plan [K].
    rules : FilmRules

    Returns
    -------
    FilmResult
        At most 12 choices that no other one beats in both area and error (errors below 1 ppm are alike).

    Raises
    ------
    InputError
        If the material can not be drawn, a value is not above zero, or a mismatch is wanted of a film
        that states no matching, or the largest width is below the one to start from.

    References
    ----------
    Pelgrom, Duinmaijer, Welbers, IEEE J. Solid-State Circuits 24 (1989) 1433, for the mismatch.
    """
    task = film_task(material, legs, reference, rules)
    drawn = task.all_points()
    inside = task.inside(drawn)
    if not inside:
        return FilmResult(choices=(), refusals=refusals(task, [point for _, point in drawn]))
    choices = tuple(_choice(task, width, point) for width, point in _thinned(_joint_front(inside)))
    return FilmResult(choices=choices, refusals=(), zero_tc=_zero_choice(task))


def zero_tc_length(material: Material, width: float, reference: float) -> float | None:
    """Return the length [m] of a unit at which the TC1 of its body and of its ends cancel.

    With TC1 a of the body and -b of the ends, ohm_per_square L a / (W - width_bias) = 2 end_resistance b / W.

    Parameters
    ----------
    material : Material
        A film.
    width : float
        Drawn [m].
    reference : float
        Reference temperature of the plan [K]: all four figures are those at it.

    Returns
    -------
    float or None
        None where no end resistance is stated or the signs do not oppose.
    """
    ends = ends_material(material)
    if ends is None:
        return None
    (body_tc1,), (end_tc1,) = material.referred_taylor(reference, 1), ends.referred_taylor(reference, 1)
    of_ends = ends_ohms(material, width, reference)
    if body_tc1 * end_tc1 >= 0.0 or of_ends == 0.0:
        return None
    return -of_ends * end_tc1 / body_tc1 / per_length(material, width, reference)


def current_density(leg: FilmLeg, current: float) -> float:
    """Return the current per drawn width in each unit of a leg [A/m]: current / in_parallel / W.

    Parameters
    ----------
    leg : FilmLeg
    current : float
        Through the whole leg [A].
    """
    return current / leg.in_parallel / leg.unit.width


def _joint_front(drawn: Iterable[_Drawn]) -> tuple[_Drawn, ...]:
    """Return what no other one beats in both area and error, over all widths, least area first."""
    kept: list[_Drawn] = []
    for width, point in sorted(drawn, key=lambda d: (d[1].area, d[1].error, d[0], d[1].length)):
        if not kept or max(point.error, ALIKE) < max(kept[-1][1].error, ALIKE):
            kept.append((width, point))
    return tuple(kept)


def _thinned(drawn: Sequence[_Drawn]) -> tuple[_Drawn, ...]:
    """Return at most ``MOST_CHOICES``: both ends, and the least area at errors spaced alike between."""
    if len(drawn) <= MOST_CHOICES:
        return tuple(drawn)
    errors = [max(point.error, ALIKE) for _, point in drawn]
    limits = np.geomspace(errors[0], errors[-1], MOST_CHOICES)[1:-1]
    between = {next(k for k, error in enumerate(errors) if error <= limit) for limit in limits}
    return tuple(drawn[k] for k in sorted({0, *between, len(drawn) - 1}))


def _zero_choice(task: FilmTask) -> FilmChoice | None:
    """Return the choice of least area at the length at which the TC1 of body and ends cancel, if any."""
    choices: list[_Drawn] = []
    for width in task.widths():
        length = zero_tc_length(task.material, width, task.reference)
        low, high = task.length_steps(width)
        steps = -1 if length is None else round(length / task.grid)
        if low <= steps <= high:
            at = np.asarray([steps * task.grid])
            points = trade(task.cell(width), at, task.wanted, task.ratios, task.rules.error)
            choices.extend((width, point) for point in points)
    inside = task.inside(choices)
    return _choice(task, *min(inside, key=lambda d: (d[1].area, d[1].error))) if inside else None


def _choice(task: FilmTask, width: float, point: Point) -> FilmChoice:
    """Return a point of the trade at a width [m] as parts."""
    unit = _unit(task, width, point.length)
    legs = tuple(
        FilmLeg(
            id=name,
            material=task.material.name,
            wanted_ohms=wanted,
            unit=unit,
            in_series=series,
            in_parallel=parallel,
            mismatch=_mismatch(task.film, unit, series * parallel),
        )
        for name, wanted, (series, parallel) in zip(task.names, task.wanted, point.counts, strict=True)
    )
    error = max(abs(leg.ohms / leg.wanted_ohms - 1.0) for leg in legs)
    return FilmChoice(unit=unit, legs=legs, area=sum(leg.area for leg in legs), error=error)


def _unit(task: FilmTask, width: float, length: float) -> FilmUnit:
    cell = task.cell(width)
    return FilmUnit(
        material=task.material.name,
        width=width,
        length=length,
        body_ohms=cell.per_length * length,
        ends_ohms=cell.ends,
        area=cell.area(length),
    )


def _mismatch(film: Film, unit: FilmUnit, units: int) -> float | None:
    """Return the sigma of dR/R of so many units: a single resistor carries 1/sqrt(2) of that of a pair."""
    if film.matching is None:
        return None
    return film.matching / math.sqrt(2.0 * unit.width * unit.length * units)
