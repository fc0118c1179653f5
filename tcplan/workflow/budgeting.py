"""The budgets of a plan's options over one or several ranges, with its own data or with new ones."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from pathlib import Path

from tcplan.brief import Brief, read_brief
from tcplan.budget import Account, Case, Draws, budget
from tcplan.budget.lots import lot_figures
from tcplan.budget.rebuilt import Asked, asked_of
from tcplan.errors import InputError, Problem
from tcplan.goal import requirement
from tcplan.material.law import Table
from tcplan.material.model import Material
from tcplan.names import shown
from tcplan.network import used_materials
from tcplan.operating import Element
from tcplan.parts.network import made_operating, made_process
from tcplan.plan import Option, Plan
from tcplan.plan_file import read_plan
from tcplan.process import INDEPENDENT
from tcplan.ranges import GRADES, TemperatureRange, named_range, temperature_range
from tcplan.ratio.check import RatioCheck
from tcplan.toml_input import file_text
from tcplan.units import format_celsius, from_celsius, parse_quantity
from tcplan.workflow.as_made import assembly_of, parts_of, plan_as_made
from tcplan.workflow.options import options_of
from tcplan.workflow.planning import make_plan
from tcplan.workflow.ratio import make_ratio, over_range

ALL = "all"
EDGE = 1e-9  # K; rounding of temperatures


def plan_to_budget(name: str, content: bytes | None = None) -> Plan:
    """Return the plan of a plan.json, or the plan made of a brief (a name that ends in .toml).

    Parameters
    ----------
    name : str
        A path; what messages call it.
    content : bytes, optional
        What came in on standard input: a plan.json.
    """
    if content is not None:
        if not content.strip():
            raise InputError(Problem(where=name, found="nothing", expected="a plan.json"))
        try:
            return read_plan(content.decode("utf-8-sig"))
        except UnicodeDecodeError as fault:
            found = f"bytes that are not UTF-8 text (at byte {fault.start + 1})"
            raise InputError(Problem(where=name, found=found, expected="a plan.json")) from fault
    if name.casefold().endswith(".toml"):
        return make_plan(read_brief(Path(name)))
    if (inside := Path(name) / "plan.json").is_file():
        raise InputError(
            Problem(where=name, found="a folder", expected="a plan.json", todo=f"Did you mean {inside}?")
        )
    try:
        return read_plan(file_text(Path(name)))
    except InputError as error:
        own = all(problem.where.startswith("plan") for problem in error.problems)
        raise InputError(p.inside(name) if own else p for p in error.problems) from None


def ratio_budgets(brief: Brief, ranges: Sequence[str] = ()) -> tuple[RatioCheck, ...]:
    """Return the check of a ratio, its account included, over each range.

    Parameters
    ----------
    brief : Brief
        With a ratio.
    ranges : sequence of str
        Named ranges or pairs such as "-40:125" [degC]; the brief's own when none is given.

    Raises
    ------
    InputError
        For an unknown range, or one that a material is not valid over.
    """
    own = brief.over
    overs = [range_of(text, own.reference, own.rise) for text in ranges] or [own]
    return tuple(make_ratio(over_range(brief, over)) for over in overs)


def budget_of(
    plan: Plan,
    *,
    options: Sequence[str] | None = None,
    ranges: Sequence[str] = (),
    materials: Mapping[str, Material] | None = None,
    draws: Draws | None = None,
    as_made: bool = False,
) -> tuple[Account, ...]:
    """Return the budget of each option over each range.

    Parameters
    ----------
    plan : Plan
    options : sequence of str, optional
        Option ids; the chosen one when not given.
    ranges : sequence of str
        Named ranges, pairs such as "-40:125" [degC], or "all" for every named range that the materials
        are valid for; the plan's own when none is given. Its reference and rise apply to them all.
    materials : mapping of name to Material, optional
        New data, which replace those of the plan by name. What is drawn stays as it is, so values follow
        a new sheet resistance or resistance per metre.
    draws : Draws, optional
        How many lots to draw; none when not given.
    as_made : bool
        Whether the budget is that of the parts of the plan, at each of its values, in place of options.

    Raises
    ------
    InputError
        For an unknown option or range, or new data that fit none of the plan's materials.
    """
    if as_made:
        return _made_budgets(plan, ranges, draws)
    asked, chosen = asked_of(plan), options_of(plan, options)
    _check_new(plan, materials)
    found = []
    for option in chosen:
        for over in _ranges(plan, asked, ranges, option, materials):
            found.append(_account(plan, asked, option, over, materials, draws))
    return tuple(found)


def _made_budgets(plan: Plan, ranges: Sequence[str], draws: Draws | None) -> tuple[Account, ...]:
    """Return the budget of what is made at each value over each range."""
    made_plan, found = plan_as_made(plan), []
    for made in parts_of(plan).made:
        assembly = assembly_of(plan, made)
        asked = replace(
            asked_of(plan),
            process=made_process(asked_of(plan).process, assembly),
            operating=made_operating(asked_of(plan).operating, assembly),
        )
        for over in _ranges(made_plan, asked, ranges, made.option, None):
            found.append(_account(made_plan, asked, made.option, over, None, draws, assembly.elements))
    return tuple(found)


# --- ranges -------------------------------------------------------------------------------------------


def _ranges(
    plan: Plan,
    asked: Asked,
    texts: Sequence[str],
    option: Option,
    new: Mapping[str, Material] | None,
) -> tuple[TemperatureRange, ...]:
    """Return the ranges of the texts, each once."""
    found: dict[tuple[str, float, float], TemperatureRange] = {}
    problems: list[Problem] = []
    for text in texts:
        try:
            for over in _ranges_of(text, plan, asked, option, new):
                found.setdefault((over.name, over.low, over.high), over)
        except InputError as error:
            problems.extend(problem.inside(f"range {shown(text)}") for problem in error.problems)
    if problems:
        raise InputError(problems)
    return tuple(found.values()) if texts else (asked.over,)


def _ranges_of(
    text: str, plan: Plan, asked: Asked, option: Option, new: Mapping[str, Material] | None
) -> Iterator[TemperatureRange]:
    reference, rise = asked.over.reference, asked.over.rise
    if text == ALL:
        materials = {**plan.by_name, **(new or {})}
        for name, grade in GRADES.items():
            inside = from_celsius(grade.low_degC) <= reference <= from_celsius(grade.high_degC + rise)
            over = named_range(name, reference, rise) if inside else None
            if over is not None and not _not_covered(option, materials, asked, over):
                yield over
    else:
        yield range_of(text, reference, rise)


def range_of(text: str, reference: float, rise: float) -> TemperatureRange:
    """Return a named range, or that of a pair such as "-40:125" [degC]."""
    if ":" not in text:
        return named_range(text, reference, rise)
    low, high = (_degrees(part) for part in text.split(":", 1))
    return temperature_range(low, high, reference, rise)


def _degrees(text: str) -> float:
    """Return a temperature [K]; a bare number is in degC."""
    plain = text.strip()
    try:
        float(plain)
    except ValueError:
        return parse_quantity(plain, "K")
    return parse_quantity(f"{plain} degC", "K")


def _not_covered(
    option: Option, materials: Mapping[str, Material], asked: Asked, over: TemperatureRange
) -> str:
    """Return why the data do not cover a range; empty when they do."""
    for name in used_materials(option.network):
        low, high = materials[name].usable
        if over.low < low - EDGE or over.high > high + EDGE:
            return f"{name} is valid from {format_celsius(low)} to {format_celsius(high)}"
    wanted = asked.goal.wanted
    if isinstance(wanted, Table):
        low, high = wanted.points[0][0], wanted.points[-1][0]
        if over.low < low - EDGE or over.high > high + EDGE:
            return f"the wanted law is given from {format_celsius(low)} to {format_celsius(high)}"
    try:
        requirement(asked.goal, over)
    except InputError as error:
        return "; ".join(f"{problem.where}: {problem.found}" for problem in error.problems)
    return ""


# --- data ---------------------------------------------------------------------------------------------


def _check_new(plan: Plan, new: Mapping[str, Material] | None) -> None:
    """Refuse new data that have no material of the plan, or one sold by another size."""
    if new is None:
        return
    problems = [
        Problem(
            where=f"material.{name}",
            found=f"a {material.kind}",
            expected=f"a {plan.by_name[name].kind}, as in the plan",
        )
        for name, material in new.items()
        if name in plan.by_name and material.kind != plan.by_name[name].kind
    ]
    if not set(new) & set(plan.by_name):
        names = ", ".join(plan.by_name)
        problems.append(
            Problem(where="materials", found="no material of the plan", expected=f"one of {names}")
        )
    if problems:
        raise InputError(problems)


def _redrawn(plan: Plan, new: Mapping[str, Material], reference: float) -> dict[str, float]:
    """Return by how much the value of each material's legs changes while its drawing stays."""
    factors = {}
    for name, material in new.items():
        old = plan.by_name.get(name)
        if old is None:
            continue
        for size in ("squares", "length"):
            before, after = (getattr(m, size)(1.0, reference) for m in (old, material))
            if before is not None and after is not None:
                factors[name] = float(before / after)
    return factors


def _account(
    plan: Plan,
    asked: Asked,
    option: Option,
    over: TemperatureRange,
    new: Mapping[str, Material] | None,
    draws: Draws | None,
    elements: tuple[Element, ...] | None = None,
) -> Account:
    """Return the budget of one option over one range; with new data also that before them.

    With ``elements`` the option is as made: what its leaves are made of is known, its ends are leaves.
    """
    names = used_materials(option.network)
    merged = {**plan.by_name, **{name: m for name, m in (new or {}).items() if name in plan.by_name}}
    if why := _not_covered(option, merged, asked, over):
        return Account(option=option.id, over=over, budget=None, not_covered=why)
    case = replace(_case(asked, over, merged), elements=elements)
    before = None
    if new is not None:
        case = replace(case, redrawn=_redrawn(plan, new, over.reference))
        if not _not_covered(option, plan.by_name, asked, over):
            before = budget(option, _case(asked, over, plan.by_name))
    return Account(
        option=option.id,
        over=over,
        budget=budget(option, case),
        before=before,
        lots=lot_figures(option, case, draws) if draws is not None else None,
        changed=tuple(_changes(names, case, new)) if new is not None else (),
    )


def _case(asked: Asked, over: TemperatureRange, materials: Mapping[str, Material]) -> Case:
    return Case(
        materials=dict(materials),
        over=over,
        need=requirement(asked.goal, over),
        process=asked.process,
        allowances=asked.allowances,
        tolerance=asked.tolerance,
        trim_step=asked.trim_step,
        operating=asked.operating,
    )


def _changes(names: Sequence[str], case: Case, new: Mapping[str, Material]) -> Iterator[str]:
    replaced = [name for name in names if name in new]
    kept = [name for name in names if name not in new]
    if replaced:
        yield f"New data for {', '.join(replaced)}."
    if kept:
        yield f"Not in the new data, so as in the plan: {', '.join(kept)}."
    if case.process != INDEPENDENT:
        yield "Correlations, tracking and corners are those of the plan."
    for name in replaced:
        factor = case.redrawn.get(name, 1.0)
        if abs(factor - 1.0) > EDGE:
            yield f"Drawn as it is, each leg of {name} has {factor:.6g} times its planned value."
