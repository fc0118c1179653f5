"""Why what is made misses a limit that the ideal option keeps: the rule that stops it, with a figure."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from tcplan.errors import InputError
from tcplan.made import FilmLeg, MadeLeg, PlainLeg, StockLeg, WireLeg, exact
from tcplan.network import legs
from tcplan.plan import Option
from tcplan.units import format_ppm, format_si, round_outward
from tcplan.workflow.made_films import film_ways, taken
from tcplan.workflow.made_task import Task

_CUT = "the step to which wire is cut"


def what_stops(task: Task, made: Sequence[Option], parts: Sequence[Sequence[MadeLeg]]) -> str:
    """Return which rule keeps an option from meeting its limit as made; empty when none does.

    Asked only where the ideal option meets it. Rules are tried in turn: the area (without it the limit is
    kept), the tolerance and the ends of the parts (at exact values the limit is not kept), and else the
    steps in which values come.
    """
    missed = [n for n, option in enumerate(made) if option.verdict == "NOT MET"]
    if task.ideal.verdict != "MET" or not missed:
        return ""
    k = missed[0]
    own = parts[k]
    if area := _area(task):
        return area
    figure = _figure_at_exact_values(task, k, own)
    if not task.within(figure):
        return f"{_members(own)} At exact values it would be {_ppm(figure)}."
    return _steps(own, figure)


def _figure_at_exact_values(task: Task, k: int, own: Sequence[MadeLeg]) -> float:
    """Return what legs of their wanted values would reach, with the same ends and tolerances."""
    wanted = [
        leg.wanted_ohms if isinstance(leg, FilmLeg) else one.ohms
        for leg, one in zip(own, legs(task.networks[k]), strict=True)
    ]
    return task.judged([exact(leg, ohms) for leg, ohms in zip(own, wanted, strict=True)])


def _members(own: Sequence[MadeLeg]) -> str:
    """Return what the parts bring with them, whatever their values."""
    found = []
    if any(isinstance(leg, FilmLeg) and leg.unit.ends_ohms > 0 for leg in own):
        found.append("The ends of the units stop it: longer or wider units have less of them.")
    if any(isinstance(leg, StockLeg) for leg in own):
        found.append("The parts stop it, each with its own tolerance and TCR: closer ones are needed.")
    if any(isinstance(leg, WireLeg) for leg in own):
        found.append("The tolerance of the cut stops it: a longer, thicker wire suffers less of it.")
    made = {leg.material for leg in own if not isinstance(leg, PlainLeg)}
    if any(isinstance(leg, PlainLeg) and leg.material in made for leg in own):
        found.append("The given member stops it: its spread counts as its own, beside parts of its material.")
    return " ".join(found) or "The spread at the drawn width stops it: wider units vary less."


def _area(task: Task) -> str:
    """Return that the area limit stops it, and the area that would do; empty when it does not."""
    if task.rules.films.max_area is None:
        return ""
    free = replace(task, rules=replace(task.rules, films=replace(task.rules.films, max_area=None)))
    try:
        ways = film_ways(free, {})
    except InputError:
        return ""
    if not ways or not task.within(taken(free, ways).figure):
        return ""
    area = format_si(round_outward(taken(free, ways).area, 3), "m^2")
    return f"The area limit stops it: {area} in all would keep the limit."


def _steps(own: Sequence[MadeLeg], figure: float) -> str:
    """Return that the steps of the values stop it: which ones there are."""
    found = []
    if any(isinstance(leg, FilmLeg) for leg in own):
        found.append("the grid and the counts of units (a smaller --error, more --most-units)")
    if any(isinstance(leg, StockLeg) for leg in own):
        found.append("the steps of the stock values (a finer series, or pairs)")
    if any(isinstance(leg, WireLeg) for leg in own):
        found.append(_CUT)
    which = ", and ".join(found) or "values that can not be made finer"
    stop = "stops" if which.startswith(_CUT) else "stop"
    return f"{which[0].upper()}{which[1:]} {stop} it: at exact values it would be {_ppm(figure)}."


def _ppm(figure: float) -> str:
    return format_ppm(round_outward(figure * 1e6, 3) * 1e-6)
