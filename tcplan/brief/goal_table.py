"""The [goal] table of a brief: limits, how they are judged, and the wanted law."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from tcplan.brief.shape import MOST_ROWS
from tcplan.goal import KINDS, Goal, Judge, Limit, LimitKind, Window
from tcplan.material.law import Expression, Law, Polynomial, Table, check_positive
from tcplan.ranges import TemperatureRange
from tcplan.table_reader import TableReader
from tcplan.units import format_celsius

_LIMIT_UNITS = {"drift": "1", "band": "1", "chord_tcr": "1/K", "box_tcr": "1/K"}


def read_goal(reader: TableReader, over: TemperatureRange | None) -> Goal | None:
    """Return the goal over a range; None when the range is wrong. Mistakes go to the reader."""
    table = reader.inner("goal") or TableReader({}, f"{reader.where}: goal", reader.problems)
    limits = [limit for kind in KINDS if (limit := _limit(table, kind, over)) is not None]
    judges: dict[str | None, Judge] = {"worst-case": "worst-case", "quantile": "quantile"}
    judge = judges.get(table.text("judge"), "nominal")
    if table.has("quantile") and judge != "quantile":
        table.refuse("quantile", "quantile without its judge", 'judge = "quantile" beside it')
    quantile = table.number("quantile")
    if over is None:
        return None
    wanted = _wanted(table, over)
    if wanted is not None:
        table.guarded(lambda: check_positive(wanted, over.low, over.high, "law"))
    goal = Goal(limits=tuple(limits), judge=judge, wanted=wanted)
    return goal if quantile is None else replace(goal, quantile=quantile)


def _limit(table: TableReader, kind: LimitKind, over: TemperatureRange | None) -> Limit | None:
    if kind == "mask":
        rows = table.list_of("mask", ("K", "K", "1"), MOST_ROWS)
        return _mask(table, rows, over) if rows else None
    amount = table.above_zero(kind, _LIMIT_UNITS[kind])
    return None if amount is None else Limit(kind=kind, value=amount)


def _mask(
    table: TableReader, rows: tuple[tuple[float, ...], ...], over: TemperatureRange | None
) -> Limit | None:
    for n, (low, high, limit) in enumerate(rows, 1):
        if low >= high:
            table.refuse(f"mask[{n}]", f"{format_celsius(low)} to {format_celsius(high)}", "low below high")
        if limit <= 0:
            table.refuse(f"mask[{n}]", f"a limit of {limit * 1e6:g} ppm", "a limit above zero")
    if over is not None and not any(low <= over.high and high >= over.low for low, high, _ in rows):
        table.refuse("mask", "no line inside the temperature range", f"lines inside {over.text()}")
        return None
    inside = [row for row in rows if over is None or (row[0] <= over.high and row[1] >= over.low)]
    windows = tuple(Window(low=low, high=high, limit=limit) for low, high, limit in inside)
    if any(w.low >= w.high or w.limit <= 0 for w in windows):
        return None
    return Limit(kind="mask", value=min(w.limit for w in windows), windows=windows)


def _wanted(table: TableReader, over: TemperatureRange) -> Law | None:
    """Return the wanted law, in exactly one of its forms; None when flat."""
    forms = [form for form in ("tc1", "law", "table") if table.has(form)]
    if table.has("tc2") and not table.has("tc1"):
        forms.append("tc2")
    if len(forms) > 1:
        table.refuse(forms[1], " and ".join(forms), "one wanted law: tc1 (with tc2), law, or table")
        return None
    if not forms:
        return None
    if forms[0] == "law":
        parameters = tuple(sorted((table.table.get("law_parameters") or {}).items()))
        return table.guarded(
            lambda: Expression(text=table.text("law") or "", constants=parameters, reference=over.reference)
        )
    if forms[0] == "table":
        rows = table.list_of("table", ("K", "1"), MOST_ROWS)
        return _wanted_table(table, rows, over) if rows else None
    tc1 = table.quantity("tc1", "1/K") if table.has("tc1") else 0.0
    tc2 = table.quantity("tc2", "1/K^2") if table.has("tc2") else 0.0
    if tc1 is None or tc2 is None:
        return None
    return Polynomial(reference=over.reference, coefficients=(tc1, tc2))


def _wanted_table(
    table: TableReader, rows: tuple[tuple[float, ...], ...], over: TemperatureRange
) -> Law | None:
    if rows[0][0] > over.low or rows[-1][0] < over.high:
        table.refuse(
            "table",
            f"points from {format_celsius(rows[0][0])} to {format_celsius(rows[-1][0])}",
            f"points over the whole range, {format_celsius(over.low)} to {format_celsius(over.high)}",
        )
        return None
    points = tuple((temperature, 1.0 + drift) for temperature, drift in rows)
    law = table.guarded(lambda: Table(points=points, reference=over.reference))
    if law is not None and abs(_value_of(points, law, over.reference) - 1.0) > 1e-6:
        off = (_value_of(points, law, over.reference) - 1.0) * 100
        table.refuse(
            "table",
            f"a drift of {off:.4g} % at the reference, {format_celsius(over.reference)}",
            "0 % there: drift is counted from the reference",
        )
        return None
    return law


def _value_of(points: tuple[tuple[float, float], ...], law: Table, reference: float) -> float:
    """Return what the table itself says at the reference, before it is referred to it."""
    temperature, value = points[0]
    return float(value / law.ratio(np.array([temperature]))[0] * law.ratio(np.array([reference]))[0])
