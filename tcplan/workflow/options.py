"""Which options of a plan are meant, and which of their legs are given members."""

from __future__ import annotations

from collections.abc import Sequence

from tcplan.budget.rebuilt import Asked
from tcplan.errors import InputError, Problem
from tcplan.names import nearest_name, shown
from tcplan.network import Network, legs
from tcplan.plan import Option, Plan

NEAR = 1e-9  # relative; how far arithmetic may put a value from the one that is given


def options_of(plan: Plan, names: Sequence[str] | None) -> tuple[Option, ...]:
    """Return options by their ids; the chosen one when no ids are given.

    Raises
    ------
    InputError
        With every id that is not one, and the nearest.
    """
    if names is None:
        return (plan.best,)
    known = {option.id: option for option in plan.options}
    problems = []
    for name in names:
        if name not in known:
            near = nearest_name(name, known)
            todo = f"Did you mean {near}?" if near else ""
            expected = f"one of {', '.join(known)}"
            problems.append(Problem(where="option", found=shown(name), expected=expected, todo=todo))
    if problems:
        raise InputError(problems)
    return tuple(known[name] for name in names)


def option_of(plan: Plan, name: str | None) -> Option:
    """Return one option by its id; the chosen one when no id is given."""
    (option,) = options_of(plan, None if name is None else (name,))
    return option


def given_positions(asked: Asked, network: Network) -> frozenset[int]:
    """Return the positions of the legs that are given members of the brief."""
    left, found = list(asked.fixed), set()
    for k, leg in enumerate(legs(network)):
        own = [row for row in left if row[0] == leg.material and abs(row[1] - leg.ohms) <= NEAR * leg.ohms]
        if own:
            left.remove(own[0])
            found.add(k)
    return frozenset(found)
