"""From a plan to its parts: what each leg is made of, and the network that it makes, checked again."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import product
from math import inf, prod
from pathlib import Path
from typing import Any

from tcplan.budget.rebuilt import Asked, asked_of
from tcplan.errors import InputError, Problem
from tcplan.goal import requirement
from tcplan.material.model import Material
from tcplan.names import nearest_name, shown
from tcplan.network import Leg, Network, leg_names, legs, used_materials, value
from tcplan.output import check_folder, write_files
from tcplan.parts import Made, MadeLeg, PlainLeg, StockLeg, made_network
from tcplan.parts.films import FilmChoice, FilmRules, film_legs
from tcplan.parts.record import FilmWay, MadePlan, made_materials, parts_json
from tcplan.parts.stock_choice import stock_choices
from tcplan.parts.wire import wire_legs
from tcplan.plan import Option, Plan, Proposal
from tcplan.process import Process
from tcplan.spec.parts_text import parts_csv
from tcplan.verify.option import Case, check, nominal_figure, with_likely
from tcplan.worst.evaluation import worst_case

NEAR = 1e-9
MOST_WAYS = 100
BETTER = 0.99  # a way with more area is of interest when its figure is below this part of the last
LONGER = (4.0, 12.0, 40.0, 120.0)  # least squares of a unit that are tried
PARTS_FILES = ("parts.json", "parts.csv")


@dataclass(frozen=True, slots=True, kw_only=True)
class PartsRules:
    """What parts may be: rules of films, and whether a stock leg may be two parts."""

    films: FilmRules
    pairs: bool = True
    wire_step: float = 1e-3


def make_parts(plan: Plan, rules: PartsRules, option: str | None = None) -> MadePlan:
    """Return an option of a plan as parts.

    Parameters
    ----------
    plan : Plan
    rules : PartsRules
    option : str, optional
        An option id; the chosen one when not given.

    Raises
    ------
    InputError
        When a leg can not be made: which rule stops it, and the nearest feasible figure.
    """
    asked, ideal = asked_of(plan), _option(plan, option)
    made, ways = _made(plan, asked, ideal, rules)
    network = made_network(ideal.network, made)
    case = _case(plan, asked, network)
    checked = with_likely(check(Proposal(network=network, role="made"), case, f"{ideal.id}-made"), case)
    return MadePlan(plan=plan, ideal=ideal, made=made, checked=checked, ways=ways)


def write_parts(made: MadePlan, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write parts.json and parts.csv, both or neither.

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written.
    """
    check_folder(folder, PARTS_FILES, force=force)
    texts = {"parts.json": parts_json(made), "parts.csv": parts_csv(made.made.legs)}
    return write_files(folder, {name: texts[name].encode() for name in PARTS_FILES}, force=force)


def _option(plan: Plan, name: str | None) -> Option:
    if name is None:
        return plan.best
    known = {option.id: option for option in plan.options}
    if name not in known:
        near = nearest_name(name, known)
        todo = f"Did you mean {near}?" if near else ""
        raise InputError(
            Problem(where="--option", found=shown(name), expected=f"one of {', '.join(known)}", todo=todo)
        )
    return known[name]


# --- the legs -------------------------------------------------------------------------------------------


def _made(plan: Plan, asked: Asked, ideal: Option, rules: PartsRules) -> tuple[Made, tuple[FilmWay, ...]]:
    """Return the parts of every leg; stock parts are chosen last, all together."""
    fixed = _fixed(asked, ideal.network)
    names = leg_names(len(legs(ideal.network)))
    done: dict[str, MadeLeg] = {}
    films: list[tuple[FilmChoice, ...]] = []
    problems: list[Problem] = []
    for material in used_materials(ideal.network):
        data = plan.by_name[material]
        mine = [
            (name, leg.ohms)
            for k, (name, leg) in enumerate(zip(names, legs(ideal.network), strict=True))
            if leg.material == material and k not in fixed
        ]
        try:
            if mine and data.kind == "film" and data.film is not None:
                films.append(_choices(data, mine, asked.over.reference, rules.films))
            elif mine and data.kind == "wire":
                cut = wire_legs(data, mine, asked.over.reference, step=rules.wire_step)
                done.update({leg.id: leg for leg in cut})
        except InputError as error:
            problems.extend(error.problems)
    if problems:
        raise InputError(problems)
    ways = _ways(plan, asked, ideal, done, films)
    done.update({leg.id: leg for choice in _taken(plan, ways) for leg in choice.legs})
    done.update(_stock(plan, asked, ideal, rules, done, fixed))
    return _whole(ideal, done), ways


def _whole(ideal: Option, done: Mapping[str, MadeLeg]) -> Made:
    """Return all legs of an option; those that are not made stay as they are."""
    own = legs(ideal.network)
    names = leg_names(len(own))
    return Made(
        option=ideal.id,
        legs=tuple(
            done.get(name) or PlainLeg(id=name, material=leg.material, wanted_ohms=leg.ohms)
            for name, leg in zip(names, own, strict=True)
        ),
    )


def _choices(
    data: Material, legs_: Sequence[tuple[str, float]], reference: float, rules: FilmRules
) -> tuple[FilmChoice, ...]:
    """Return the unit cells of a film that are tried, and refuse when there is none.

    Of least area within the error asked: without more, then with longer and longer units, which have
    less of their ends; and the one whose body and ends cancel.
    """
    first = film_legs(data, legs_, reference, rules)
    if first.refusals:
        raise InputError(
            Problem(
                where=f"leg {r.leg}", found=r.found, expected=f"a leg within the {r.rule}", todo=r.nearest
            )
            for r in first.refusals
        )
    results = [first]
    for least in LONGER:
        if rules.min_squares < least <= rules.max_length_squares:
            results.append(film_legs(data, legs_, reference, replace(rules, min_squares=least)))
    found = [
        next((c for c in result.choices if c.error <= rules.error), result.choices[-1])
        for result in results
        if result.choices
    ]
    if first.zero_tc is not None and first.zero_tc.error <= rules.error:
        found.append(first.zero_tc)
    return tuple({(c.unit, c.area): c for c in found}.values())


def _ways(
    plan: Plan,
    asked: Asked,
    ideal: Option,
    done: Mapping[str, MadeLeg],
    films: Sequence[Sequence[FilmChoice]],
) -> tuple[FilmWay, ...]:
    """Return the ways to draw all films together that none beats in both area and judged figure."""
    if not films:
        return ()
    while prod(len(choices) for choices in films) > MOST_WAYS:
        films = [_thinned(choices) if len(choices) == max(map(len, films)) else choices for choices in films]
    found = []
    for choices in product(*films):
        legs_ = {**done, **{leg.id: leg for choice in choices for leg in choice.legs}}
        network = made_network(ideal.network, _whole(ideal, legs_))
        figure = _judged(plan, network, _case(plan, asked, network))
        found.append(FilmWay(choices=choices, figure=figure))
    found.sort(key=lambda way: (way.area, way.figure))
    best, ways = inf, []
    for way in found:
        if way.figure < best * BETTER:
            best = way.figure
            ways.append(way)
    return tuple(ways)


def _thinned(choices: Sequence[FilmChoice]) -> Sequence[FilmChoice]:
    """Return one choice fewer: the last but one is left out."""
    return [*choices[:-2], choices[-1]]


def _judged(plan: Plan, network: Network, case: Case) -> float:
    """Return the figure that the plan judges, as far as the spreads are known (a fraction)."""
    known = all(name in case.spreads for name in used_materials(network))
    if plan.limit.judge == "nominal" or not known:
        return nominal_figure(network, case)
    return worst_case(network, case.materials, case.spreads, case.need, case.process).upper


def _taken(plan: Plan, ways: Sequence[FilmWay]) -> tuple[FilmChoice, ...]:
    """Return the way of least area that keeps the limit, else the one of the least figure."""
    if not ways:
        return ()
    limit = plan.limit.drift_ppm
    within = [way for way in ways if limit is not None and way.figure <= limit * 1e-6 * (1.0 + NEAR)]
    return (within or [ways[-1]])[0].choices


def _stock(
    plan: Plan,
    asked: Asked,
    ideal: Option,
    rules: PartsRules,
    done: Mapping[str, MadeLeg],
    fixed: frozenset[int],
) -> dict[str, StockLeg]:
    """Return the stock parts, chosen with the other legs as they are made."""
    own = legs(ideal.network)
    if not any(plan.by_name[leg.material].kind == "part" for k, leg in enumerate(own) if k not in fixed):
        return {}
    names = leg_names(len(own))
    ohms = [done[name].ohms if name in done else leg.ohms for name, leg in zip(names, own, strict=True)]
    network = _with_values(ideal.network, iter(ohms))
    lowest, highest = asked.stock_values
    choices = stock_choices(
        network,
        plan.by_name,
        requirement(asked.goal, asked.over),
        plan.target.ohms or value(ideal.network),
        lowest=lowest,
        highest=highest,
        pairs=rules.pairs,
        given=fixed,
    )
    best = min(choices, key=lambda c: (not _good(c.value_error, rules), c.figure, c.parts))
    return {name: leg for name, leg in zip(names, best.legs, strict=True) if leg is not None}


def _good(value_error: float, rules: PartsRules) -> bool:
    return abs(value_error) <= rules.films.error


def _with_values(node: Network, ohms: Any) -> Network:
    if isinstance(node, Leg):
        return replace(node, ohms=next(ohms))
    return type(node)(tuple(_with_values(child, ohms) for child in node.children))


def _fixed(asked: Asked, network: Network) -> frozenset[int]:
    """Return the positions of the fixed members, which are as they are."""
    left = list(asked.fixed)
    found = set()
    for k, leg in enumerate(legs(network)):
        for row in left:
            if row[0] == leg.material and abs(row[1] - leg.ohms) <= NEAR * leg.ohms:
                left.remove(row)
                found.add(k)
                break
    return frozenset(found)


# --- what it reaches ------------------------------------------------------------------------------------


def _case(plan: Plan, asked: Asked, network: Network) -> Case:
    materials = {m.name: m for m in made_materials(plan, network)}
    spreads = {n: m.effective_spread(asked.over.low, asked.over.high) for n, m in materials.items()}
    process: Process = asked.process
    return Case(
        materials=materials,
        spreads={n: spread for n, spread in spreads.items() if spread is not None},
        over=asked.over,
        need=requirement(asked.goal, asked.over),
        process=process,
    )
