"""Reading plan.json: untrusted data to a plan, every value checked; the inverse of ``Plan.to_dict``."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Annotated, Any

from pydantic import ConfigDict, Field, TypeAdapter, ValidationError

from tcplan.errors import InputError, Problem
from tcplan.made import MadeLeg, leg_from_dict
from tcplan.material.model import Material, material_from_dict
from tcplan.names import shown
from tcplan.network import Leg, leg_names, legs, network_from_tree, value
from tcplan.plan import (
    SCHEMA,
    Floor,
    Likely,
    LimitRecord,
    MadeValue,
    Nominal,
    Option,
    PartsRecord,
    Plan,
    Proof,
    RangeRecord,
    TargetRecord,
    Verdict,
    WorstCase,
)
from tcplan.toml_input import place, shape_problems

CLOSE = 1e-9  # relative; rounding of a value


@dataclass(frozen=True, slots=True)
class _LegRow:
    id: str
    material: str
    ohms: float
    strings: Annotated[int, Field(ge=1, le=65536)]
    share: float
    squares: float | None
    area_m2: float | None


@dataclass(frozen=True, slots=True)
class _OptionRow:
    id: str
    role: str
    arrangement: str
    network: str
    tree: dict[str, Any]
    legs: list[_LegRow]
    nominal: Nominal
    worst_case: WorstCase | None
    corners_ppm: dict[str, float]
    likely: Likely | None
    proof: Proof
    verdict: Verdict


@dataclass(frozen=True, slots=True)
class _MadeRow:
    target_ohms: Annotated[float, Field(gt=0)]
    value_error: float
    legs: Annotated[list[dict[str, Any]], Field(min_length=1)]
    option: _OptionRow


@dataclass(frozen=True, slots=True)
class _PartsRow:
    option: str
    materials: dict[str, dict[str, Any]]
    made: Annotated[list[_MadeRow], Field(min_length=1)]
    details: dict[str, Any]


@dataclass(frozen=True, slots=True)
class _PlanRow:
    __pydantic_config__ = ConfigDict(allow_inf_nan=False)
    schema: Annotated[int, Field(ge=SCHEMA, le=SCHEMA)]
    tcplan: str
    brief: dict[str, Any]
    range: RangeRecord
    target: TargetRecord
    limit: LimitRecord
    materials: dict[str, dict[str, Any]]
    floor: Floor
    chosen: str
    options: list[_OptionRow]
    notes: list[str]
    parts: _PartsRow | None


def _option(row: _OptionRow, where: str) -> Option:
    """Return one option; what can be derived (arrangement, network, shares) is made anew."""
    by_id = {leg.id: Leg(material=leg.material, ohms=leg.ohms, strings=leg.strings) for leg in row.legs}
    network = network_from_tree(row.tree, by_id)
    if legs(network) != tuple(by_id.values()):
        raise InputError(
            Problem(where=f"{where}.tree", found="legs in another order", expected="each leg of legs, once")
        )
    return Option(
        id=row.id,
        role=row.role,
        network=network,
        squares=tuple(leg.squares for leg in row.legs),
        areas=tuple(leg.area_m2 for leg in row.legs),
        nominal=row.nominal,
        worst_case=row.worst_case,
        corners=row.corners_ppm,
        likely=row.likely,
        proof=row.proof,
        verdict=row.verdict,
    )


def _leg(row: Mapping[str, Any], name: str) -> MadeLeg:
    """Return a made leg; what can be derived, its name and its value, must be as it is derived."""
    leg = leg_from_dict(row)
    if leg.id != name or not abs(float(row["ohms"]) / leg.ohms - 1.0) <= CLOSE:
        raise ValueError(f"id {leg.id!r} of {row['ohms']} ohm, not {name!r} of {leg.ohms:.6g} ohm")
    return leg


def _parts(row: _PartsRow) -> PartsRecord:
    made = []
    for n, one in enumerate(row.made, 1):
        where = f"plan.parts.made[{n}]"
        try:
            own = tuple(_leg(leg, name) for leg, name in zip(one.legs, leg_names(len(one.legs)), strict=True))
        except (KeyError, OverflowError, TypeError, ValueError) as fault:
            found = f"a missing or wrong entry ({shown(str(fault))})"
            raise InputError(
                Problem(where=f"{where}.legs", found=found, expected="legs that `tcplan parts` wrote")
            ) from None
        made.append(
            MadeValue(
                target_ohms=one.target_ohms,
                value_error=one.value_error,
                legs=own,
                option=_option(one.option, f"{where}.option"),
            )
        )
    return PartsRecord(
        option=row.option,
        materials=tuple(material_from_dict(entry) for entry in row.materials.values()),
        made=tuple(made),
        details=row.details,
    )


def _checked_rows(data: Any) -> _PlanRow:
    # As JSON text: in its strict reading "12" is no number and true is not 1, yet lists are tuples.
    try:
        return TypeAdapter(_PlanRow).validate_json(json.dumps(data, allow_nan=False), strict=True)
    except ValidationError as error:
        raise InputError(
            replace(problem, where=f"plan.{place(tuple(one['loc']))}")
            for one in error.errors(include_url=False)
            for problem in shape_problems([one], _PlanRow, "plan")
        ) from None
    except ValueError:
        found = "a number that is not finite"
        raise InputError(Problem(where="plan", found=found, expected="finite numbers")) from None


def _unknown_keys(data: Any, known: Any, where: str) -> Iterator[Problem]:
    """Yield every key of ``data`` that the plan, written again, does not have."""
    if isinstance(data, Mapping) and isinstance(known, Mapping):
        for key, value in data.items():
            if key not in known:
                yield Problem(where=where, found=f"the unknown key {shown(key)}", expected="no other key")
            else:
                yield from _unknown_keys(value, known[key], f"{where}.{key}")
    elif isinstance(data, list) and isinstance(known, (list, tuple)):
        for n, (value, other) in enumerate(zip(data, known, strict=False), 1):
            yield from _unknown_keys(value, other, f"{where}[{n}]")


def _agreement(plan: Plan) -> Iterator[Problem]:
    """Yield what contradicts itself inside a plan."""
    if plan.chosen not in {option.id for option in plan.options}:
        yield Problem(where="plan.chosen", found=shown(plan.chosen), expected="the id of an option")
    for option in plan.options:
        yield from _strangers(option, plan.by_name, f"plan.options {option.id}")
    if plan.parts is None:
        return
    if plan.parts.option not in {option.id for option in plan.options}:
        yield Problem(
            where="plan.parts.option", found=shown(plan.parts.option), expected="the id of an option"
        )
        return
    known = {material.name: material for material in plan.parts.materials}
    ideal = next(option for option in plan.options if option.id == plan.parts.option)
    for n, made in enumerate(plan.parts.made, 1):
        yield from _strangers(made.option, known, f"plan.parts.made[{n}].option")
        yield from _made_agreement(made, ideal, f"plan.parts.made[{n}]")


def _made_agreement(made: MadeValue, ideal: Option, where: str) -> Iterator[Problem]:
    """Yield the legs that are not those of the option, and a value error that is not that of the network."""
    own, wanted = ([leg.material for leg in one] for one in (made.legs, legs(ideal.network)))
    if own != wanted:
        yield Problem(
            where=f"{where}.legs",
            found=f"legs of {', '.join(map(shown, own))}",
            expected=f"one for each leg of option {ideal.id}: {', '.join(wanted)}",
        )
    error = value(made.option.network) / made.target_ohms - 1.0
    if abs(made.value_error - error) > CLOSE:
        yield Problem(
            where=f"{where}.value_error",
            found=f"{made.value_error:.6g}",
            expected=f"{error:.6g}, that of its network",
        )


def _strangers(option: Option, known: Mapping[str, Material], where: str) -> Iterator[Problem]:
    """Yield the legs of an option whose material is not known."""
    for leg in legs(option.network):
        if leg.material not in known:
            yield Problem(where=where, found=shown(leg.material), expected="a material of the plan")


def plan_from_dict(data: Any) -> Plan:
    """Return the plan of plain JSON data; the inverse of :meth:`Plan.to_dict`.

    Raises
    ------
    InputError
        When a key is missing, unknown or of the wrong kind, or the plan contradicts itself.
    """
    rows = _checked_rows(data)
    plan = Plan(
        tcplan=rows.tcplan,
        brief=rows.brief,
        range=rows.range,
        target=rows.target,
        limit=rows.limit,
        materials=tuple(material_from_dict(entry) for entry in rows.materials.values()),
        floor=rows.floor,
        chosen=rows.chosen,
        options=tuple(_option(row, f"plan.options[{n}]") for n, row in enumerate(rows.options, 1)),
        notes=tuple(rows.notes),
        parts=None if rows.parts is None else _parts(rows.parts),
    )
    problems = (*_unknown_keys(data, plan.to_dict(), "plan"), *_agreement(plan))
    if problems:
        raise InputError(problems)
    return plan


def read_plan(text: str) -> Plan:
    """Return the plan that the text of a plan.json holds.

    Raises
    ------
    InputError
        When it is not JSON, or not a plan.
    """
    try:
        data = json.loads(text)
    except (ValueError, RecursionError) as error:
        found = f"not JSON ({shown(str(error))[1:-1]})"
        raise InputError(Problem(where="plan", found=found, expected="the content of a plan.json")) from None
    return plan_from_dict(data)
