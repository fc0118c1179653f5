"""What a network may hold: the [search], [[fixed]] and [given] tables of a brief."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from tcplan.brief.model import SEARCHED, Fixed, Place, Searched, SearchRules, Target
from tcplan.goal import Goal
from tcplan.material.model import Material
from tcplan.names import nearest_name, shown
from tcplan.network import Leg, Network, scaled, value
from tcplan.network_reading import parse_network
from tcplan.table_reader import TableReader
from tcplan.units import format_ohms

MOST_MATERIALS = 300


def _known(table: TableReader, key: str, name: str | None, materials: Mapping[str, Material]) -> bool:
    if name is None or name in materials:
        return name is not None
    if materials:  # without any, the missing materials are the mistake, not the name
        near = nearest_name(name, materials)
        listed = ", ".join(sorted(materials)[:12])
        table.refuse(
            key,
            f"a material named {shown(name)}",
            f"one of {listed}",
            f"Did you mean {near}?" if near else "",
        )
    return False


def read_fixed(reader: TableReader, materials: Mapping[str, Material]) -> tuple[Fixed, ...]:
    """Return the members that are given, all in one place. Mistakes go to the reader."""
    found = []
    for table in reader.rows("fixed"):
        name, ohms = table.text("material"), table.above_zero("value", "ohm")
        if _known(table, "material", name, materials) and ohms is not None and name is not None:
            place: Place = "parallel" if table.text("place") == "parallel" else "series"
            found.append(Fixed(leg=Leg(material=name, ohms=ohms), place=place))
    if len({fixed.place for fixed in found}) > 1:
        reader.refuse(
            "fixed",
            "members in series and in parallel",
            "all of them in one place",
            "Both make a mixed network: write it under [given].",
        )
    return tuple(found)


def read_rules(
    reader: TableReader, materials: Mapping[str, Material], fixed: tuple[Fixed, ...]
) -> SearchRules:
    """Return what the search may use. Mistakes go to the reader."""
    table = reader.inner("search") or TableReader({}, f"{reader.where}: search", reader.problems)
    use = table.texts("use")
    for name in use:
        _known(table, "use", name, materials)
    fixed_names = {member.leg.material for member in fixed}
    chosen = use or tuple(name for name in materials if name not in fixed_names)
    if len(set(use)) < len(use):
        table.refuse("use", "a name twice", "each name once")
    if len(chosen) > MOST_MATERIALS:
        found = f"{len(chosen)} materials"
        table.refuse("use", found, f"{MOST_MATERIALS} at most", "List those to be searched under use.")
    if fixed and not chosen and materials:
        table.refuse("use", "no material beside the fixed ones", "one to choose", "Or write [given].")
    share = table.quantity("min_share", "1") if table.has("min_share") else 0.0
    if share is not None and not 0 <= share <= 0.5:
        table.refuse("min_share", f"{share * 100:g} %", "0 % to 50 %")
    sizes = _sizes(table)
    return SearchRules(
        arrangements=_arrangements(table, fixed),
        use=tuple(sorted(set(chosen))),
        max_materials=int(table.number("max_materials") or 2),
        max_legs=int(table.number("max_legs") or 3),
        min_share=share or 0.0,
        **sizes,
    )


def _sizes(table: TableReader) -> dict[str, Any]:
    """Return what the brief says of sizes, by the names of the rules; defaults stay out."""
    found: dict[str, Any] = {}
    for key in ("min_squares", "max_squares"):
        if (number := table.number(key)) is not None:
            found[key] = number
    if found.get("min_squares", 5.0) >= found.get("max_squares", 3000.0):
        table.refuse(
            "max_squares", "max_squares not above min_squares", "more than min_squares (5 by default)"
        )
    for key, unit in (("min_length", "m"), ("max_area", "m^2")):
        if table.has(key) and (size := table.above_zero(key, unit)) is not None:
            found[key] = size
    values = table.tuple_of(table.table.get("stock_values"), ("ohm", "ohm"), "stock_values")
    if values is not None:
        if not 0 < values[0] < values[1]:
            table.refuse(
                "stock_values", "values that do not rise from above zero", "the least, then the largest"
            )
        found["stock_values"] = values
    return found


def _arrangements(table: TableReader, fixed: tuple[Fixed, ...]) -> tuple[Searched, ...]:
    """Return the arrangements to search; a fixed member leaves only the one that holds it."""
    listed = table.texts("arrangements") or SEARCHED
    for name in listed:
        if name not in SEARCHED:
            near = nearest_name(name, SEARCHED)
            table.refuse(
                "arrangements",
                shown(name),
                "single, series, parallel or mixed",
                f"Did you mean {near}?" if near else "",
            )
    kept = [name for name in SEARCHED if name in listed]
    if not fixed:
        return tuple(kept)
    place = fixed[0].place
    possible: tuple[Searched, ...] = tuple(name for name in kept if name in (place, "mixed"))
    if kept and not possible:
        table.refuse("arrangements", ", ".join(kept), f"{place} or mixed: that is where the fixed member is")
    return possible


def read_given(reader: TableReader, materials: Mapping[str, Material], target: Target) -> Network | None:
    """Return the network to check, scaled when that is asked. Mistakes go to the reader."""
    table = reader.inner("given")
    if table is None:
        return None
    for other in ("search", "fixed"):
        if reader.has(other):
            reader.refuse(other, f"[given] together with {other}", "[given] alone: it is not searched")
    text = table.text("network")
    if text is None:
        return None
    known = materials or None
    network = table.guarded(lambda: parse_network(text, known, where="network"))
    if network is None or not table.table.get("scaled"):
        return network
    if target.ohms is None:
        table.refuse("scaled", "scaled = true without a value", "[resistor] with the value to scale to")
        return network
    return scaled(network, target.ohms / value(network))


def check_agreement(
    reader: TableReader,
    target: Target,
    fixed: tuple[Fixed, ...],
    given: Network | None,
    goal: Goal | None,
) -> None:
    """Check that the value, the fixed members and the goal can go together."""
    resistor = reader.inner("resistor") or TableReader({}, f"{reader.where}: resistor", reader.problems)
    free = target.ohms is None
    if target.also and given is not None and not (reader.inner("given") or reader).table.get("scaled"):
        todo = "Write scaled = true in [given]: its network is then made at each of them."
        resistor.refuse("value", "several values beside a network as it is written", "one value", todo)
    asked = resistor.has("value") and resistor.text("value") != "free"
    if not reader.has("given") and free and not asked and not fixed:
        resistor.refuse("value", "no value", 'the value, such as "18 kohm" (free only beside [[fixed]])')
    unlimited = goal is not None and not goal.limits
    bounded = resistor.has("at_most") and all(member.place == "series" for member in fixed)
    if fixed and free and not asked and not bounded and unlimited:
        resistor.refuse("value", "no value and no limit", "a value, or a limit in [goal] to bound it")
    if fixed:
        _room(resistor, target, fixed)
        if target.also:
            resistor.refuse("value", "several values beside fixed members", "one value", "The mix differs.")
    _total_needed(reader, target, fixed)


def _room(resistor: TableReader, target: Target, fixed: tuple[Fixed, ...]) -> None:
    """Check that the fixed members leave room for the chosen ones."""
    total = target.ohms or target.at_most
    if total is None:
        return
    if fixed[0].place == "series":
        own = sum(member.leg.ohms for member in fixed)
        wrong, side = total <= own, "more"
    else:
        own = 1.0 / sum(1.0 / member.leg.ohms for member in fixed)
        wrong, side = target.ohms is not None and total >= own, "less"
    if wrong:
        resistor.refuse(
            "value" if target.ohms else "at_most",
            format_ohms(total),
            f"{side} than the fixed members' {format_ohms(own)} in {fixed[0].place}",
        )


def _total_needed(reader: TableReader, target: Target, fixed: tuple[Fixed, ...]) -> None:
    """Refuse what can be searched only with a given total."""
    search = reader.inner("search")
    if search is None or not fixed or target.ohms is not None:
        return
    if set(search.texts("arrangements")) == {"mixed"}:
        search.refuse(
            "arrangements", "mixed alone, without a value", "a value in [resistor], or series or parallel"
        )
    if search.has("max_area"):
        search.refuse("max_area", "max_area without a value", "a value in [resistor]")
