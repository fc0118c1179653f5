"""The [ratio] table of a brief: two resistors whose ratio counts."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from tcplan.brief.model import Ratio, RatioKind
from tcplan.material.model import Material
from tcplan.material.spread import Spread, law_bounds
from tcplan.network import Network, Series, used_materials
from tcplan.network_reading import parse_network
from tcplan.ranges import TemperatureRange
from tcplan.table_reader import TableReader

MOST_MATERIALS = 4  # of both resistors together: what a worst case is searched over
NODES = 257
_OTHERS = ("resistor", "search", "fixed", "given")


def read_ratio(reader: TableReader, materials: Mapping[str, Material]) -> Ratio | None:
    """Return the ratio to check; None when there is none, or it is wrong. Mistakes go to the reader."""
    table = reader.inner("ratio")
    if table is None:
        return None
    for other in _OTHERS:
        if reader.has(other):
            expected = "[ratio] alone: both resistors are stated, nothing is searched"
            reader.refuse(other, f"[ratio] together with {other}", expected)
    kinds: dict[str | None, RatioKind] = {"divider": "divider", "gain": "gain"}
    kind = kinds.get(table.text("kind"))
    first, second = (_network(table, key, materials) for key in ("first", "second"))
    tracking = table.quantity("tracking", "1/K") if table.has("tracking") else None
    if tracking is not None and tracking < 0.0:
        table.refuse("tracking", str(table.table["tracking"]), "zero or more")
        return None
    if kind is None or first is None or second is None:
        return None
    ratio = Ratio(kind=kind, first=first, second=second, tracking=tracking)
    count = len(used_materials(together(ratio)))
    if count > MOST_MATERIALS:
        table.refuse("second", f"{count} materials in both resistors", f"{MOST_MATERIALS} at most")
        return None
    return ratio


def together(ratio: Ratio) -> Network:
    """Return both resistors as one network."""
    return Series((ratio.first, ratio.second))


def check_tracking(
    reader: TableReader, ratio: Ratio | None, used: Sequence[Material], over: TemperatureRange
) -> None:
    """Refuse a tracking with which a law could reach zero inside the range."""
    table = reader.inner("ratio")
    if ratio is None or not ratio.tracking or reader.problems or table is None:
        return
    T = np.linspace(over.low, over.high, NODES)
    for material in used:
        spread = material.effective_spread(over.low, over.high) or Spread(meaning="limits")
        lowest = law_bounds(material.law, spread, over.reference, T)[0]
        if (lowest - 0.5 * ratio.tracking * np.abs(T - over.reference)).min() <= 0.0:
            found = f"{table.table['tracking']}, with which {material.name} could reach zero"
            table.refuse("tracking", found, "a resistance above zero over the whole range")


def _network(table: TableReader, key: str, materials: Mapping[str, Material]) -> Network | None:
    text = table.text(key)
    if text is None:
        return None
    return table.guarded(lambda: parse_network(text, materials or None, where=key))
