"""Reading plan.json: untrusted data to a plan, every value checked; the inverse of ``Plan.to_dict``."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import ConfigDict, Field, TypeAdapter, ValidationError

from tcplan.errors import InputError, Problem
from tcplan.material.model import material_from_dict
from tcplan.names import shown
from tcplan.network import Leg, legs, network_from_tree
from tcplan.plan import (
    SCHEMA,
    Floor,
    Likely,
    LimitRecord,
    Nominal,
    Option,
    Plan,
    Proof,
    RangeRecord,
    TargetRecord,
    Verdict,
    WorstCase,
)
from tcplan.toml_input import shape_problems


@dataclass(frozen=True, slots=True)
class _LegRow:
    id: str
    material: str
    ohms: float
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


def _option(row: _OptionRow, where: str) -> Option:
    """Return one option; what can be derived (arrangement, network, shares) is made anew."""
    by_id = {leg.id: Leg(material=leg.material, ohms=leg.ohms) for leg in row.legs}
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


def _checked_rows(data: Any) -> _PlanRow:
    # As JSON text: in its strict reading "12" is no number and true is not 1, yet lists are tuples.
    try:
        return TypeAdapter(_PlanRow).validate_json(json.dumps(data), strict=True)
    except ValidationError as error:
        raise InputError(shape_problems(error.errors(include_url=False), _PlanRow, "plan")) from None


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
        for leg in legs(option.network):
            if leg.material not in plan.by_name:
                yield Problem(
                    where=f"plan.options {option.id}",
                    found=shown(leg.material),
                    expected="a material of the plan",
                )


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
