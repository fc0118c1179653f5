"""The [operating] table of a brief: the voltage or current that the resistor works at, and what heats it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from tcplan.brief.model import Operating
from tcplan.material.model import Material
from tcplan.names import nearest_name, shown
from tcplan.table_reader import TableReader


def read_operating(reader: TableReader, materials: Mapping[str, Material]) -> Operating | None:
    """Return what the resistor works at; None when not stated, or wrong. Mistakes go to the reader."""
    table = reader.inner("operating")
    if table is None:
        return None
    before = len(reader.problems)
    if reader.has("ratio"):
        expected = "[operating] in a brief of one resistor: it is not for a ratio"
        reader.refuse("operating", "[operating] together with ratio", expected)
    if table.has("voltage") and table.has("current"):
        table.refuse("current", "voltage and current together", "one of the two")
    if not table.has("voltage", "current"):
        table.refuse("voltage", "nothing", 'voltage = "5 V", or current = "2 mA"')
    if table.has("thermal_resistance") and table.has("leg_thermal_resistance"):
        found = "thermal_resistance and leg_thermal_resistance together"
        table.refuse("leg_thermal_resistance", found, "one of the two")
    _check_rise(reader, table)
    operating = Operating(
        voltage=table.above_zero("voltage", "V"),
        current=table.above_zero("current", "A"),
        thermal_resistance=table.above_zero("thermal_resistance", "K/W"),
        leg_thermal_resistance=_by_material(table, materials),
    )
    return operating if len(reader.problems) == before else None


def _check_rise(reader: TableReader, table: TableReader) -> None:
    """Refuse a rise that is stated beside what it would be computed from: it would count twice."""
    temperature = reader.inner("temperature")
    if temperature is None or not table.has("thermal_resistance", "leg_thermal_resistance"):
        return
    if temperature.has("rise"):
        temperature.refuse(
            "rise",
            "a rise beside a thermal resistance",
            "one of the two: the rise follows from [operating]",
            "Remove rise; low and high are then ambient, and heating is a row of the budget.",
        )


def _by_material(table: TableReader, materials: Mapping[str, Material]) -> tuple[tuple[str, float], ...]:
    """Return the thermal resistance of a leg of each material that is named [K/W], by name."""
    inner = table.inner("leg_thermal_resistance")
    if inner is None:
        return ()
    if not inner.table:
        table.refuse("leg_thermal_resistance", "an empty table", 'rows such as red_film = "400 K/W"')
    found = {}
    for name in inner.table:
        if materials and name not in materials:
            near = nearest_name(name, materials)
            todo = f"Did you mean {near}?" if near else ""
            inner.refuse(shown(name)[1:-1], f"the unknown material {shown(name)}", "a material in use", todo)
        size = inner.above_zero(name, "K/W")
        if size is not None:
            found[name] = size
    return tuple(sorted(found.items()))


# --- from plan.json -----------------------------------------------------------------------------------


def operating_from_dict(data: Mapping[str, Any] | None) -> Operating | None:
    """Return what ``Operating.to_dict`` wrote; None stays None.

    Raises
    ------
    KeyError, TypeError, ValueError
        When the data are not of that form.
    """
    if data is None:
        return None
    voltage, current = _size(data["voltage_V"]), _size(data["current_A"])
    common = _size(data["thermal_resistance_K_per_W"])
    rows = data["leg_thermal_resistance_K_per_W"]
    own = tuple((str(row["material"]), _above_zero(row["K_per_W"])) for row in rows)
    if (voltage is None) == (current is None) or (common is not None and own):
        raise ValueError("not one of voltage and current, or two kinds of thermal resistance")
    return Operating(voltage=voltage, current=current, thermal_resistance=common, leg_thermal_resistance=own)


def _size(value: Any) -> float | None:
    return None if value is None else _above_zero(value)


def _above_zero(value: Any) -> float:
    number = float(value)
    if isinstance(value, bool) or not (math.isfinite(number) and number > 0.0):
        raise ValueError(f"{shown(value)}, not a number above zero")
    return number
