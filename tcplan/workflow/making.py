"""From a plan to its parts: what each leg is made of, and the network that it makes, checked again."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace

import numpy as np

from tcplan.budget.rebuilt import asked_of
from tcplan.errors import InputError, Problem
from tcplan.goal import requirement
from tcplan.made import FilmLeg, MadeLeg, StockLeg
from tcplan.network import Network, legs, scaled, used_materials, value
from tcplan.operating import operating_point, worst_by_leg
from tcplan.parts.network import Assembly, alike, made_operating, made_process
from tcplan.parts.placement import Placement, place
from tcplan.parts.record import Load, MadePlan
from tcplan.parts.retune import with_values
from tcplan.parts.stock_choice import StockChoice, stock_choices
from tcplan.parts.trim import TrimPlan, trim_plan
from tcplan.parts.wire import wire_legs
from tcplan.plan import MadeValue, PartsRecord, Plan, Proposal
from tcplan.units import format_ohms
from tcplan.verify.option import check, with_likely
from tcplan.workflow.made_films import film_legs_of, film_ways, taken
from tcplan.workflow.made_stops import what_stops
from tcplan.workflow.made_task import NEAR, POINTS, PartsRules, Task
from tcplan.workflow.options import given_positions, option_of

__all__ = ["MadePlan", "PartsRules", "make_parts"]

FARTHER = (1.0003, 1.001, 1.003, 1.01)  # by which legs of a free total grow until the limit is kept
MOST_REDRAWN = 3  # times that films are drawn anew for a larger current
MOST_JUDGED = 12  # combinations of stock parts whose judged figure is worked out


def make_parts(plan: Plan, rules: PartsRules, option: str | None = None) -> MadePlan:
    """Return a plan with an option of it as parts.

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
    task = task_of(plan, rules, option)
    made = _carried(task)
    if plan.target.ohms is None and task.ideal.verdict == "MET":
        for factor in FARTHER:
            if made.verdict == "MET":
                break
            made = _carried(_farther(task, factor))
    return made


def _carried(task: Task) -> MadePlan:
    """Return the parts of a task, its films drawn anew for the current of what is made where that is more."""
    made = _made(task)
    for _ in range(MOST_REDRAWN):
        excess = _excess(task, made)
        if excess <= 1.0 + NEAR:
            break
        task = replace(task, room=task.room * excess * (1.0 + task.rules.films.error))
        made = _made(task)
    return made


def _excess(task: Task, made: MadePlan) -> float:
    """Return the largest current density over that of its film; 0 where none is limited."""
    found = 0.0
    for one, loads in zip(made.parts.made, made.loads, strict=bool(made.loads)):
        for leg, load in zip(one.legs, loads, strict=True):
            film = task.plan.by_name[leg.material].film
            if film is not None and film.max_current and load.density is not None:
                found = max(found, load.density / film.max_current)
    return found


def _farther(task: Task, factor: float) -> Task:
    """Return the task with the chosen legs larger, where the total is free: the limit is then kept with room.

    Of the greatest total beside parallel members they get smaller.
    """
    by = 1.0 / factor if task.ideal.role == "greatest total" else factor
    own = legs(task.ideal.network)
    ohms = [leg.ohms if k in task.fixed else leg.ohms * by for k, leg in enumerate(own)]
    return replace(task, networks=(with_values(task.ideal.network, ohms),))


def _made(task: Task) -> MadePlan:
    """Return the parts of a task."""
    plan, done = task.plan, _cut(task)
    ways = film_ways(task, done)
    way = taken(task, ways) if ways else None
    if way is not None:
        done.update(film_legs_of(way.choices))
    owned = [task.whole(k, {**done, **_stock(task, k, done)}) for k in range(len(task.networks))]
    assemblies = alike([task.assembly(own) for own in owned])
    made = [
        _checked(task, k, network, own, assembly)
        for k, (network, own, assembly) in enumerate(zip(task.networks, owned, assemblies, strict=True))
    ]
    loads = tuple(_loads(task, one.legs, a) for one, a in zip(made, assemblies, strict=True))
    loads = loads if task.asked.operating else ()
    placements = tuple(_placed(task, one) for one in made)
    trims = tuple(_trims(task, made, assemblies))
    parts = PartsRecord(
        option=task.ideal.id,
        materials=tuple({m.name: m for a in assemblies for m in a.materials}.values()),
        made=tuple(made),
        details={
            "rules": task.rules.to_dict(),
            "ways": [one.to_dict() for one in ways],
            "loads": [[load.to_dict() for load in own] for own in loads],
            "placement": [[one.to_dict() for one in own] for own in placements],
            "trim": [trim.to_dict() for trim in trims],
        },
    )
    return MadePlan(
        plan=replace(plan, parts=parts),
        ideal=task.ideal,
        assemblies=assemblies,
        ways=ways,
        way=way,
        loads=loads,
        placements=placements,
        trims=trims,
        stops=what_stops(task, [one.option for one in made], [one.legs for one in made]),
    )


def _placed(task: Task, made: MadeValue) -> tuple[Placement, ...]:
    """Return one array for each film that is drawn."""
    drawn = [leg for leg in made.legs if isinstance(leg, FilmLeg)]
    of = format_ohms(made.target_ohms) if task.asked.also else ""
    return tuple(
        place([leg for leg in drawn if leg.material == name], task.plan.by_name[name], of=of)
        for name in dict.fromkeys(leg.material for leg in drawn)
    )


def _trims(task: Task, made: Sequence[MadeValue], assemblies: Sequence[Assembly]) -> Iterator[TrimPlan]:
    """Yield the trim of what is made at each value; nothing where the brief asks for none."""
    if task.asked.trim is None:
        return
    over = task.asked.over
    held = [task.names[k] for k in task.fixed]
    for one, assembly in zip(made, assemblies, strict=True):
        drawn = {m.name: m.drawn_spread(over.low, over.high) for m in assembly.materials}
        yield trim_plan(
            assembly.network,
            one.legs,
            assembly.by_name,
            {name: spread for name, spread in drawn.items() if spread is not None},
            made_process(task.asked.process, assembly),
            requirement(task.asked.goal, over),
            task.asked.trim,
            one.target_ohms,
            held=held,
            label=format_ohms(one.target_ohms) if task.asked.also else "",
        )


def task_of(plan: Plan, rules: PartsRules, option: str | None = None) -> Task:
    """Return what an option of a plan is to be made of."""
    asked, ideal = asked_of(plan), option_of(plan, option)
    whole = value(ideal.network)
    networks = (ideal.network, *(scaled(ideal.network, ohms / whole) for ohms in asked.also))
    return Task(
        plan=plan,
        asked=asked,
        ideal=ideal,
        rules=rules,
        networks=networks,
        fixed=given_positions(asked, ideal.network),
    )


def _checked(task: Task, k: int, network: Network, own: tuple[MadeLeg, ...], assembly: Assembly) -> MadeValue:
    """Return what is made at one value, its network verified like any other."""
    case = task.case(assembly)
    name = f"{task.ideal.id}-made" if len(task.networks) == 1 else f"{task.ideal.id}-made-{k + 1}"
    option = with_likely(check(Proposal(network=assembly.network, role="made"), case, name), case)
    target = value(network)
    return MadeValue(
        target_ohms=target, value_error=value(option.network) / target - 1.0, legs=own, option=option
    )


# --- wire and stock -------------------------------------------------------------------------------------


def _cut(task: Task) -> dict[str, MadeLeg]:
    """Return the legs of wire of every value."""
    done: dict[str, MadeLeg] = {}
    problems: list[Problem] = []
    for name in used_materials(task.ideal.network):
        data, mine = task.plan.by_name[name], tuple(task.wanted(name))
        if data.kind != "wire" or not mine:
            continue
        try:
            cut = wire_legs(data, mine, task.asked.over.reference, step=task.rules.wire_step)
        except InputError as error:
            problems.extend(error.problems)
            continue
        done.update({leg.id: replace(leg, id=leg.id.split(" ")[0]) for leg in cut})
    if problems:
        raise InputError(problems)
    return done


def _stock(task: Task, k: int, done: Mapping[str, MadeLeg]) -> dict[str, StockLeg]:
    """Return the stock parts of one value by their label, chosen with the other legs as they are made."""
    own, plan = legs(task.networks[k]), task.plan
    bought = [n for n, leg in enumerate(own) if plan.by_name[leg.material].kind == "part"]
    if not set(bought) - task.fixed:
        return {}
    parts = task.whole(k, done)
    network = with_values(task.networks[k], [part.ohms for part in parts])
    lowest, highest = task.asked.stock_values
    choices = stock_choices(
        network,
        plan.by_name,
        requirement(task.asked.goal, task.asked.over),
        value(task.networks[k]),
        lowest=lowest,
        highest=highest,
        pairs=task.rules.pairs,
        given=task.fixed,
    )
    good = [c for c in choices if abs(c.value_error) <= task.rules.films.error]
    tried = sorted(good, key=lambda c: (c.figure, c.parts))[:MOST_JUDGED]
    if not tried:
        best = min(choices, key=lambda c: (abs(c.value_error), c.figure, c.parts))
    else:
        best = min(tried, key=lambda c: (task.judged(_joined(parts, c)), c.parts))
    return {
        task.label(k, name): leg for name, leg in zip(task.names, best.legs, strict=True) if leg is not None
    }


def _joined(parts: tuple[MadeLeg, ...], choice: StockChoice) -> tuple[MadeLeg, ...]:
    """Return the legs of an option with a choice of stock parts in it."""
    return tuple(leg or part for leg, part in zip(choice.legs, parts, strict=True))


# --- what it carries ------------------------------------------------------------------------------------


def _loads(task: Task, own: tuple[MadeLeg, ...], assembly: Assembly) -> tuple[Load, ...]:
    """Return what each leg carries at the operating point; empty where none is asked."""
    over = task.asked.over
    operating = made_operating(task.asked.operating, assembly)
    if operating is None:
        return ()
    T = np.linspace(over.low, over.high, POINTS)
    point = operating_point(
        assembly.network, assembly.by_name, assembly.elements, operating, over.reference, T
    )
    by_leg = worst_by_leg(point)
    return tuple(
        Load(
            leg=part.id,
            voltage=by_leg[part.id].voltage,
            current=by_leg[part.id].current,
            power=by_leg[part.id].power,
            temperature=by_leg[part.id].temperature,
            density=_density(part, by_leg[part.id].current),
        )
        for part in own
    )


def _density(part: MadeLeg, current: float) -> float | None:
    return current / part.in_parallel / part.unit.width if isinstance(part, FilmLeg) else None
