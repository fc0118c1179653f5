"""A plan seen by its parts: what they make stands in the place of its options."""

from __future__ import annotations

from dataclasses import replace

from tcplan.errors import InputError, Problem
from tcplan.parts.network import Assembly, assembled
from tcplan.plan import MadeValue, PartsRecord, Plan
from tcplan.workflow.options import option_of


def plan_as_made(plan: Plan) -> Plan:
    """Return a plan whose options are what its parts make, at each value.

    Raises
    ------
    InputError
        When it has no parts.
    """
    parts = parts_of(plan)
    options = tuple(made.option for made in parts.made)
    return replace(plan, materials=parts.materials, options=options, chosen=options[0].id, parts=None)


def parts_of(plan: Plan) -> PartsRecord:
    """Return the parts of a plan.

    Raises
    ------
    InputError
        When it has none.
    """
    if plan.parts is None:
        todo = "Make them first: tcplan parts PLAN -o DIR writes the plan again with its parts."
        raise InputError(
            Problem(where="plan.parts", found="a plan without parts", expected="a plan with parts", todo=todo)
        )
    return plan.parts


def assembly_of(plan: Plan, made: MadeValue) -> Assembly:
    """Return the network that the legs of a made value are, with what each leaf of it is made of.

    Raises
    ------
    InputError
        When it is not the network that was checked.
    """
    ideal = option_of(plan, parts_of(plan).option)
    assembly = assembled(ideal.network, made.legs, plan.by_name)
    if assembly.network != made.option.network:
        raise InputError(
            Problem(
                where=f"plan.parts {made.option.id}",
                found="a network that is not the one of its legs",
                expected="the network of the legs",
                todo="Make the parts again.",
            )
        )
    return assembly
