"""The unit cells of all films together: which are tried, what each combination reaches, which is taken."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import replace
from itertools import product
from math import inf, prod

from tcplan.errors import InputError, Problem
from tcplan.made import FilmLeg, MadeLeg, Refusal, exact
from tcplan.material.model import Material
from tcplan.network import Network, legs, scaled, used_materials, value
from tcplan.parts.films import FilmChoice, FilmRules, film_legs
from tcplan.parts.placement import outline_area
from tcplan.parts.record import FilmWay
from tcplan.parts.retune import retuned
from tcplan.workflow.made_task import Task

MOST_WAYS = 100
BETTER = 0.99  # a way with more area is of interest when its figure is below this part of the last
LONGER = (4.0, 12.0, 40.0, 120.0)  # least squares of a unit that are tried
NEARLY = 1.03  # area that is spent on nearer values
SHORTER = (50.0, 20.0, 8.0)  # greatest ones


def film_ways(task: Task, done: Mapping[str, MadeLeg]) -> tuple[FilmWay, ...]:
    """Return the ways to draw all films together that none beats in both area and judged figure.

    The mix is first that of the plan; then it is found again with the ends of the best way in it, and
    what comes of that is tried beside it, where it can be drawn.

    Raises
    ------
    InputError
        With every leg that can not be drawn: the rule that stops it, and the nearest feasible figure.
    """
    films = tuple(name for name in used_materials(task.ideal.network) if is_drawn(task, name))
    if not films:
        return ()
    ways = _ways(task, done, _choices_of(task, films, task.networks))
    again = _found_again(task, done, taken(task, ways))
    if again is None:
        return ways
    try:
        choices = _choices_of(task, films, again)
    except InputError:  # some leg got too small, too large or too wide: the mix of the plan stays
        return ways
    return front([*ways, *_ways(task, done, choices)])


def taken(task: Task, ways: Sequence[FilmWay]) -> FilmWay:
    """Return the way of least area that keeps the limit, else the one of the least figure."""
    within = [way for way in ways if task.within(way.figure)]
    return (within or [ways[-1]])[0]


def is_drawn(task: Task, name: str) -> bool:
    """Whether a material is a film of which unit cells can be drawn."""
    data = task.plan.by_name[name]
    return data.kind == "film" and data.film is not None and any(True for _ in task.wanted(name))


def film_rules(task: Task) -> FilmRules:
    """Return the rules of films, with the currents of the legs at the operating point."""
    return replace(task.rules.films, currents=task.currents())


def _choices_of(
    task: Task, films: Iterable[str], networks: Sequence[Network]
) -> list[tuple[FilmChoice, ...]]:
    rules, reference = film_rules(task), task.asked.over.reference
    found: list[tuple[FilmChoice, ...]] = []
    problems: list[Problem] = []
    for name in films:
        try:
            wanted = tuple(task.wanted(name, networks))
            found.append(film_choices(task.plan.by_name[name], wanted, reference, rules))
        except InputError as error:
            problems.extend(error.problems)
    if problems:
        raise InputError(problems)
    return found


def film_choices(
    data: Material, wanted: Sequence[tuple[str, float]], reference: float, rules: FilmRules
) -> tuple[FilmChoice, ...]:
    """Return the unit cells of a film that are tried, and refuse when there is none.

    Of least area within the error asked: without more, then with longer and longer units, which have
    less of their ends, and with shorter and shorter ones, which have smaller dummies; and the one whose
    body and ends cancel.

    Parameters
    ----------
    data : Material
        A film.
    wanted : sequence of (label, ohms)
        Values [ohm] at ``reference`` [K].
    reference : float
    rules : FilmRules

    Raises
    ------
    InputError
        With every leg that can not be drawn.
    """
    first = film_legs(data, wanted, reference, rules)
    if first.refusals:
        raise InputError(map(refused, first.refusals))
    results = [first]
    for least in LONGER:
        if rules.min_squares < least <= rules.max_length_squares:
            results.append(film_legs(data, wanted, reference, replace(rules, min_squares=least)))
    for most in SHORTER:
        if rules.min_squares <= most < rules.max_length_squares:
            results.append(film_legs(data, wanted, reference, replace(rules, max_length_squares=most)))
    found = [_small(result.choices, rules.error) for result in results if result.choices]
    if first.zero_tc is not None and first.zero_tc.error <= rules.error:
        found.append(first.zero_tc)
    return tuple({(c.unit, c.area): c for c in found}.values())


RULES = {
    "count": ("a value that whole counts of one unit reach", "Raise --most-units or --error"),
    "grid": ("a length on the grid", "Change the grid, the width, or the least squares of a unit"),
    "area": ("units within the area", "Raise --max-area"),
    "current": ("units that carry the current", "Lower the current, or raise --max-width or --most-units"),
    "mismatch": ("units that match as asked", "Raise --mismatch, --max-width or --most-units"),
}
"""What each rule expects, and what to do where it stops a leg."""


def refused(refusal: Refusal) -> Problem:
    """Return why a leg can not be drawn, with the nearest that can and what to do."""
    expected, todo = RULES.get(refusal.rule, (f"a leg within the {refusal.rule}", "Change the brief"))
    return Problem(
        where=f"leg {refusal.leg}",
        found=refusal.found,
        expected=expected,
        todo=f"{todo}; the nearest: {refusal.nearest}.",
    )


def _small(choices: Sequence[FilmChoice], error: float) -> FilmChoice:
    """Return the choice of least area within the error, or one nearer its values that is hardly larger."""
    good = [choice for choice in choices if choice.error <= error] or [choices[-1]]
    return min((c for c in good if c.area <= NEARLY * good[0].area), key=lambda c: c.error)


def _ways(
    task: Task, done: Mapping[str, MadeLeg], films: Sequence[Sequence[FilmChoice]]
) -> tuple[FilmWay, ...]:
    """Return the ways that none beats among all combinations of the choices of every film."""
    quick = [
        FilmWay(choices=one, figure=_worst(task, done, one, task.judged_quickly), area=_outlines(task, one))
        for one in combinations(films)
    ]
    return front(replace(way, figure=_worst(task, done, way.choices, task.judged)) for way in front(quick))


def _outlines(task: Task, choices: Sequence[FilmChoice]) -> float:
    """Return the area of the arrays of all films at all values, dummies included [m^2]."""
    total = 0.0
    for choice in choices:
        name, per_value = choice.unit.material, len(choice.legs) // len(task.networks)
        for k in range(0, len(choice.legs), per_value):
            count = sum(leg.units for leg in choice.legs[k : k + per_value])
            total += outline_area(choice.unit, count, task.plan.by_name[name])
    return total


def _worst(
    task: Task,
    done: Mapping[str, MadeLeg],
    choices: Sequence[FilmChoice],
    judged: Callable[[Sequence[MadeLeg]], float],
) -> float:
    """Return the largest judged figure of all values."""
    drawn = {**done, **film_legs_of(choices)}
    return max(judged(task.whole(k, drawn)) for k in range(len(task.networks)))


def film_legs_of(choices: Iterable[FilmChoice]) -> dict[str, FilmLeg]:
    """Return the legs of choices by their label; each is called by its id alone."""
    return {leg.id: replace(leg, id=leg.id.split(" ")[0]) for choice in choices for leg in choice.legs}


def combinations(films: Sequence[Sequence[FilmChoice]]) -> Iterator[tuple[FilmChoice, ...]]:
    """Yield the combinations of the choices of all films; where there are many, of shorter lists."""
    while prod(len(choices) for choices in films) > MOST_WAYS:
        films = [_thinned(choices) if len(choices) == max(map(len, films)) else choices for choices in films]
    yield from product(*films)


def _thinned(choices: Sequence[FilmChoice]) -> Sequence[FilmChoice]:
    """Return one choice fewer: the last but one is left out."""
    return [*choices[:-2], choices[-1]]


def front(ways: Iterable[FilmWay]) -> tuple[FilmWay, ...]:
    """Return the ways that none beats in both area and figure, least area first."""
    best, kept = inf, []
    for way in sorted(ways, key=lambda way: (way.area, way.figure)):
        if way.figure < best * BETTER:
            best = way.figure
            kept.append(way)
    return tuple(kept)


def _found_again(task: Task, done: Mapping[str, MadeLeg], way: FilmWay) -> tuple[Network, ...] | None:
    """Return the networks of the mix that is best for these units; None where it is that of the plan.

    Only where every leg is drawn: members that are given, bought or wound do not move.
    """
    units = {choice.unit.material: choice.unit for choice in way.choices}
    if all(unit.ends_ohms == 0.0 for unit in units.values()):
        return None
    parts = task.whole(0, {**done, **film_legs_of(way.choices)})
    drawn = [part for part in parts if isinstance(part, FilmLeg)]
    if len(drawn) < len(parts):
        return None

    def figure(network: Network) -> float:
        return task.judged_quickly(
            [exact(part, leg.ohms) for part, leg in zip(drawn, legs(network), strict=True)]
        )

    best = retuned(task.networks[0], figure)
    if best == task.networks[0]:
        return None
    whole = value(task.networks[0])
    return tuple(scaled(best, value(network) / whole) for network in task.networks)
