"""Reading plan.json: untrusted data to a plan, every value checked; the inverse of ``Plan.to_dict``."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import fields
from typing import Any, TypeVar, cast, get_args

from tcplan.errors import InputError, Problem
from tcplan.material.model import material_from_dict
from tcplan.names import shown
from tcplan.network import Leg, network_from_tree
from tcplan.plan import (
    SCHEMA,
    Floor,
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

PLAN_KEYS = (
    "schema",
    "tcplan",
    "brief",
    "range",
    "target",
    "limit",
    "materials",
    "floor",
    "chosen",
    "options",
    "notes",
)
OPTION_KEYS = (
    "id",
    "role",
    "arrangement",
    "network",
    "tree",
    "legs",
    "nominal",
    "worst_case",
    "proof",
    "verdict",
)
LEG_KEYS = ("id", "material", "ohms", "share", "squares")

T = TypeVar("T")


def _keys(data: Any, names: Sequence[str], where: str) -> dict[str, Any]:
    """Return data as a dict that holds exactly these names."""
    if not isinstance(data, Mapping):
        raise InputError(Problem(where=where, found=type(data).__name__, expected="a table of keys"))
    wrong = [
        *(Problem(where=where, found=f"no {n}", expected=f"the key {n}") for n in names if n not in data),
        *(Problem(where=where, found=shown(n), expected="no other key") for n in data if n not in names),
    ]
    if wrong:
        raise InputError(wrong)
    return dict(data)


def _record(kind: type[T], data: Any, where: str) -> T:
    """Return a record read from untrusted data, every mistake reported with its place."""
    from pydantic import TypeAdapter, ValidationError

    content = _keys(data, [entry.name for entry in fields(cast("Any", kind))], where)
    try:
        return TypeAdapter(kind).validate_python(content)
    except ValidationError as error:
        raise InputError(shape_problems(error.errors(include_url=False), kind, where)) from None


def _option(data: Any, where: str) -> Option:
    """Return one option; the derived keys (arrangement, network, share) are made anew."""
    names = [
        "id",
        "role",
        "arrangement",
        "network",
        "tree",
        "legs",
        "nominal",
        "worst_case",
        "proof",
        "verdict",
    ]
    content = _keys(data, names, where)
    rows = [
        _keys(row, ["id", "material", "ohms", "share", "squares"], f"{where}.legs") for row in content["legs"]
    ]
    by_id = {row["id"]: Leg(material=row["material"], ohms=row["ohms"]) for row in rows}
    worst = content["worst_case"]
    if content["verdict"] not in get_args(Verdict):
        raise InputError(
            Problem(
                where=f"{where}.verdict", found=shown(content["verdict"]), expected=str(get_args(Verdict))
            )
        )
    return Option(
        id=content["id"],
        role=content["role"],
        network=network_from_tree(content["tree"], by_id),
        squares=tuple(row["squares"] for row in rows),
        nominal=_record(Nominal, content["nominal"], f"{where}.nominal"),
        worst_case=_record(WorstCase, worst, f"{where}.worst_case") if worst is not None else None,
        proof=_record(Proof, content["proof"], f"{where}.proof"),
        verdict=content["verdict"],
    )


def plan_from_dict(data: Any) -> Plan:
    """Return the plan of plain JSON data; the inverse of :meth:`Plan.to_dict`.

    Raises
    ------
    InputError
        When a key is missing, unknown or of the wrong kind.
    """
    names = [
        "schema",
        "tcplan",
        "brief",
        "range",
        "target",
        "limit",
        "materials",
        "floor",
        "chosen",
        "options",
        "notes",
    ]
    content = _keys(data, names, "plan")
    if content["schema"] != SCHEMA:
        raise InputError(Problem(where="plan.schema", found=repr(content["schema"]), expected=str(SCHEMA)))
    return Plan(
        tcplan=content["tcplan"],
        brief=content["brief"],
        range=_record(RangeRecord, content["range"], "plan.range"),
        target=_record(TargetRecord, content["target"], "plan.target"),
        limit=_record(LimitRecord, content["limit"], "plan.limit"),
        materials=tuple(material_from_dict(entry) for entry in content["materials"].values()),
        floor=_record(Floor, content["floor"], "plan.floor"),
        chosen=content["chosen"],
        options=tuple(_option(row, f"plan.options[{i}]") for i, row in enumerate(content["options"])),
        notes=tuple(content["notes"]),
    )


def read_plan(text: str) -> Plan:
    """Return the plan that the text of a plan.json holds."""
    try:
        data = json.loads(text)
    except ValueError as error:
        raise InputError(Problem(where="plan", found=f"not JSON ({error})", expected="a plan.json")) from None
    return plan_from_dict(data)
