"""What a plan was made for, from its record alone: goal, range, process and allowances.

The inverse of ``Brief.to_dict`` for the parts that a budget needs, so that plan.json is enough.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, TypeVar, get_args

from tcplan.brief.model import Allowance, Nature, Operating, Sides, Trim
from tcplan.brief.operating_table import operating_from_dict
from tcplan.brief.trim_table import trim_from_dict
from tcplan.errors import InputError, Problem
from tcplan.goal import KINDS, Goal, Judge, Limit, Window
from tcplan.material.law import law_from_parameters
from tcplan.names import shown
from tcplan.plan import Plan
from tcplan.process import Process, process_from_dict
from tcplan.ranges import GRADES, TemperatureRange, named_range, temperature_range
from tcplan.units import from_celsius

T = TypeVar("T")


@dataclass(frozen=True, slots=True, kw_only=True)
class Asked:
    """What a plan was made for; ``tolerance`` and ``trim_step`` are fractions.

    ``also`` are the further values [ohm] of the same mix. ``fixed`` holds material and value [ohm] of each
    given member, ``stock_values`` the least and greatest value [ohm] of a bought part.
    """

    goal: Goal
    over: TemperatureRange
    process: Process
    allowances: tuple[Allowance, ...]
    tolerance: float | None
    trim_step: float | None
    fixed: tuple[tuple[str, float], ...]
    stock_values: tuple[float, float]
    also: tuple[float, ...] = ()
    trim: Trim | None = None
    operating: Operating | None = None


def asked_of(plan: Plan) -> Asked:
    """Return what a plan was made for.

    Raises
    ------
    InputError
        When the record of the brief in the plan lacks a part, or holds a wrong one.
    """
    brief = plan.brief
    return Asked(
        goal=_read("brief.goal", lambda: goal_from_dict(brief["goal"])),
        over=_read("range", lambda: _range(plan)),
        process=_read("brief.process", lambda: process_from_dict(brief["process"])),
        allowances=_read(
            "brief.allowances", lambda: tuple(allowance_from_dict(row) for row in brief["allowances"])
        ),
        tolerance=_read("brief.resistor.tolerance", lambda: _fraction(brief["resistor"]["tolerance"])),
        trim_step=_read("brief.resistor.trim_step", lambda: _fraction(brief["resistor"]["trim_step"])),
        fixed=_read(
            "brief.fixed",
            lambda: tuple((str(row["material"]), _above_zero(row["ohms"])) for row in brief["fixed"]),
        ),
        stock_values=_read(
            "brief.search.stock_values_ohms", lambda: _two(brief["search"]["stock_values_ohms"])
        ),
        also=_read(
            "brief.resistor.also_ohms", lambda: tuple(map(_above_zero, brief["resistor"]["also_ohms"]))
        ),
        # A plan made before there was a trim has no such entry.
        trim=_read("brief.trim", lambda: trim_from_dict(brief.get("trim"))),
        operating=_read("brief.operating", lambda: operating_from_dict(brief.get("operating"))),
    )


def _two(values: Any) -> tuple[float, float]:
    low, high = (_above_zero(value) for value in values)
    return low, high


def _above_zero(value: Any) -> float:
    number = float(value)
    if not (math.isfinite(number) and number > 0.0):
        raise ValueError(f"{number:g}")
    return number


def _read(where: str, make: Callable[[], T]) -> T:
    """Return what ``make`` reads from a plan; a fault of the data is told with its place."""
    try:
        return make()
    except InputError as error:
        raise InputError(problem.inside(f"plan.{where}") for problem in error.problems) from None
    except (KeyError, TypeError, ValueError, IndexError, AttributeError) as fault:
        raise InputError(
            Problem(
                where=f"plan.{where}",
                found=f"a missing or wrong entry ({shown(str(fault))})",
                expected="what this version of tcplan writes",
                todo="Make the plan again from its brief.",
            )
        ) from None


def goal_from_dict(data: Mapping[str, Any]) -> Goal:
    """Return the goal that ``Brief.to_dict`` wrote."""
    judge: Judge = _one_of(data["judge"], get_args(Judge), "judge")
    return Goal(
        limits=tuple(_limit(row) for row in data["limits"]),
        judge=judge,
        quantile=float(data["quantile"]),
        wanted=None if data["wanted"] is None else law_from_parameters(data["wanted"]),
    )


def _limit(row: Mapping[str, Any]) -> Limit:
    per_kelvin = row["kind"] in ("chord_tcr", "box_tcr")
    return Limit(
        kind=_one_of(row["kind"], KINDS, "limits.kind"),
        value=_size(row["ppm_per_K" if per_kelvin else "ppm"]),
        windows=tuple(
            Window(
                low=from_celsius(w["low_degC"]),
                high=from_celsius(w["high_degC"]),
                limit=_size(w["limit_ppm"]),
            )
            for w in row["windows"]
        ),
    )


def allowance_from_dict(row: Mapping[str, Any]) -> Allowance:
    """Return the allowance that ``Allowance.to_dict`` wrote."""
    per_kelvin = "size_ppm_per_K" in row
    kind: Nature = _one_of(row["kind"], get_args(Nature), "kind")
    sides: Sides = _one_of(row["sides"], get_args(Sides), "sides")
    return Allowance(
        name=str(row["name"]),
        size=_size(row["size_ppm_per_K" if per_kelvin else "size_ppm"]),
        per_kelvin=per_kelvin,
        sides=sides,
        kind=kind,
        source=str(row["source"]),
    )


def _range(plan: Plan) -> TemperatureRange:
    own = plan.range
    reference, rise = from_celsius(own.reference_degC), own.rise_K
    if own.name in GRADES:
        named = named_range(own.name, reference, rise)
        if (named.low_degC, named.high_degC) == (own.low_degC, own.high_degC):
            return named
    top = from_celsius(own.high_degC - rise)
    return temperature_range(from_celsius(own.low_degC), top, reference, rise, own.name)


def _size(ppm: Any) -> float:
    """Return a size above zero given in ppm or ppm/K, as a fraction or 1/K."""
    if isinstance(ppm, bool) or not 0.0 < float(ppm) < float("inf"):
        raise ValueError(f"{shown(ppm)}, not above zero")
    return float(ppm) * 1e-6


def _fraction(value: Any) -> float | None:
    if value is None:
        return None
    if isinstance(value, bool) or not 0.0 < float(value) < 1.0:
        raise ValueError(f"{shown(value)}, not between 0 and 1")
    return float(value)


def _one_of(value: Any, known: tuple[Any, ...], where: str) -> Any:
    if value not in known:
        raise ValueError(f"{where} {shown(value)}")
    return value
