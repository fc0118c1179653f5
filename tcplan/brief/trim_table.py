"""The [trim] table of a brief: how the value is set after the part is made."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any, get_args

from tcplan.brief.model import Trim, TrimMethod
from tcplan.names import shown
from tcplan.ranges import TemperatureRange
from tcplan.table_reader import TableReader
from tcplan.units import format_celsius, from_celsius

LEAST_APART = 1.0  # K, between the two temperatures
SAME = 1e-6  # K
_CODED = ("step", "switch_resistance", "switch_tc1")
KEYS: dict[TrimMethod, tuple[str, ...]] = {
    "one-temperature": _CODED,
    "two-temperatures": (*_CODED, "temperatures"),
    "cut": ("largest_cut",),
}
"""The keys of each method, beside ``method`` itself."""


def read_trim(reader: TableReader, over: TemperatureRange | None) -> Trim | None:
    """Return the trim; None when there is none, or it is wrong. Mistakes go to the reader."""
    table = reader.inner("trim")
    if table is None:
        return None
    before = len(reader.problems)
    _check_place(reader, table)
    methods: dict[str | None, TrimMethod] = {method: method for method in KEYS}
    method = methods.get(table.text("method"))
    if method is None:
        return None  # the shape tells it
    _check_keys(table, method)
    step, largest = _fraction(table, "step", 1e-3), _fraction(table, "largest_cut", 0.5)
    ohms, tc1 = _switch(table, over)
    temperatures = _temperatures(table, over) if method == "two-temperatures" else None
    if len(reader.problems) > before:
        return None
    return Trim(
        method=method,
        step=step,
        switch_resistance=ohms,
        switch_tc1=tc1,
        temperatures=temperatures,
        largest_cut=largest,
    )


def trim_from_dict(data: Mapping[str, Any] | None) -> Trim | None:
    """Return the trim that ``Trim.to_dict`` wrote; None of None.

    Raises
    ------
    KeyError, TypeError, ValueError
        When it is not one; the reader of the file says where.
    """
    if data is None:
        return None
    if data["method"] not in get_args(TrimMethod):
        raise ValueError(f"method {shown(str(data['method']))}")
    both = data["temperatures_degC"]
    if (both is None) == (data["method"] == "two-temperatures"):
        raise ValueError(f"temperatures of {data['method']}")
    return Trim(
        method=data["method"],
        step=_between(data["step_ppm"] / 1e6, "step_ppm"),
        switch_resistance=_finite(data["switch_ohms"], "switch_ohms"),
        switch_tc1=_finite(data["switch_tc1_ppm_per_K"], "switch_tc1_ppm_per_K") / 1e6,
        temperatures=None if both is None else _two(both),
        largest_cut=_between(data["largest_cut"], "largest_cut"),
    )


def _check_place(reader: TableReader, table: TableReader) -> None:
    """Refuse a trim beside what it contradicts."""
    if reader.has("ratio"):
        found, expected = "[trim] together with [ratio]", "[trim] beside one resistor, or [ratio] alone"
        reader.refuse("trim", found, expected)
    resistor = reader.inner("resistor")
    if resistor is not None and resistor.has("trim_step"):
        resistor.refuse(
            "trim_step",
            "trim_step together with [trim]",
            "one of the two",
            "[trim] itself says what remains of the value.",
        )


def _check_keys(table: TableReader, method: TrimMethod) -> None:
    for key in dict.fromkeys(key for keys in KEYS.values() for key in keys):
        if table.has(key) and key not in KEYS[method]:
            owners = " or ".join(f'method = "{name}"' for name, keys in KEYS.items() if key in keys)
            table.refuse(key, f'{key} with method = "{method}"', f"{key} with {owners} only")


def _fraction(table: TableReader, key: str, default: float) -> float:
    """Return a fraction above zero and below 1."""
    fraction = table.above_zero(key, "1") if table.has(key) else default
    if fraction is not None and fraction >= 1.0:
        table.refuse(key, str(table.table[key]), "less than 100 %")
    return default if fraction is None else fraction


def _switch(table: TableReader, over: TemperatureRange | None) -> tuple[float, float]:
    """Return the resistance [ohm] of a switch that is on, and its TC1 [1/K]."""
    ohms = table.quantity("switch_resistance", "ohm") if table.has("switch_resistance") else 0.0
    tc1 = table.quantity("switch_tc1", "1/K") if table.has("switch_tc1") else 0.0
    if ohms is not None and ohms < 0.0:
        table.refuse("switch_resistance", str(table.table["switch_resistance"]), "zero or more")
    if table.has("switch_tc1") and not ohms:
        table.refuse("switch_tc1", "switch_tc1 without a switch_resistance", "both, or none")
    if tc1 is not None and over is not None:
        ends = [1.0 + tc1 * (end - over.reference) for end in (over.low, over.high)]
        if min(ends) <= 0.0:
            found = f"{table.table['switch_tc1']}, with which a switch reaches zero"
            table.refuse("switch_tc1", found, "a resistance above zero over the whole range")
    return ohms or 0.0, tc1 or 0.0


def _temperatures(table: TableReader, over: TemperatureRange | None) -> tuple[float, float] | None:
    """Return the reference and the other temperature, lower one first [K]."""
    if over is None:
        return None
    if not table.has("temperatures"):
        other = over.high if over.high - over.reference >= LEAST_APART else over.low
        return _ordered(over.reference, other)
    both = table.tuple_of(table.table["temperatures"], ("K", "K"), "temperatures")
    if both is None:
        return None
    low, high = sorted(over.reference if abs(t - over.reference) <= SAME else t for t in both)
    if low < over.low - SAME or high > over.high + SAME:
        table.refuse("temperatures", _shown(low, high), f"both inside {over.text()}")
    elif high - low < LEAST_APART:
        table.refuse("temperatures", _shown(low, high), f"two that are {LEAST_APART:g} K apart or more")
    elif over.reference not in (low, high):
        reference = format_celsius(over.reference)
        todo = "The value is wanted at the reference, so it is measured there."
        table.refuse("temperatures", _shown(low, high), f"one of them the reference, {reference}", todo)
    return low, high


def _shown(low: float, high: float) -> str:
    return f"{format_celsius(low)} and {format_celsius(high)}"


def _ordered(first: float, second: float) -> tuple[float, float]:
    return min(first, second), max(first, second)


def _two(values: Any) -> tuple[float, float]:
    low, high = (from_celsius(_finite(value, "temperatures_degC")) for value in values)
    if not low < high:
        raise ValueError("temperatures_degC")
    return low, high


def _finite(value: Any, what: str) -> float:
    if isinstance(value, bool) or not math.isfinite(value):
        raise ValueError(f"{what} {shown(str(value))}")
    return float(value)


def _between(value: Any, what: str) -> float:
    number = _finite(value, what)
    if not 0.0 < number < 1.0:
        raise ValueError(f"{what} {number:g}, not between 0 and 1")
    return number
