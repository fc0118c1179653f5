"""Reading a brief: every mistake of it, its materials files included, in one error."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np

from tcplan.brief.allowance_tables import read_allowances
from tcplan.brief.goal_table import read_goal
from tcplan.brief.members import check_agreement, read_fixed, read_given, read_rules
from tcplan.brief.model import Brief, Fixed, Ratio, SearchRules, Target
from tcplan.brief.operating_table import read_operating
from tcplan.brief.process_tables import read_process
from tcplan.brief.ratio_table import check_tracking, read_ratio, together
from tcplan.brief.shape import shape_mistakes
from tcplan.brief.trim_table import read_trim
from tcplan.errors import InputError
from tcplan.material.files import MaterialFile, parse_materials, published, read_material_file
from tcplan.material.model import Material
from tcplan.material.spread import law_bounds, value_half_width
from tcplan.names import shown
from tcplan.network import Network, used_materials
from tcplan.ranges import REFERENCE, TemperatureRange, named_range, temperature_range
from tcplan.table_reader import TableReader
from tcplan.toml_input import file_text, join, read_toml_text
from tcplan.units import format_celsius

SPREAD_NODES = 1025


def read_brief(path: Path) -> Brief:
    """Return the checked brief of a file.

    Raises
    ------
    InputError
        With every mistake of the brief and of its materials files.

    Examples
    --------
    >>> brief = read_brief(Path("examples/cabinet_reference_wire/brief.toml"))
    >>> brief.title, brief.target.ohms
    ('Wire-wound reference, control cabinet', 1000.0)
    """
    return parse_brief(file_text(path), str(path), path.parent)


def parse_brief(text: str, name: str, folder: Path) -> Brief:
    """Return the checked brief of a text.

    Parameters
    ----------
    text : str
        TOML.
    name : str
        What messages call it: a path, or "standard input".
    folder : Path
        What the names of materials files are relative to.
    """
    data = read_toml_text(text, name)
    reader = TableReader(data, name, list(shape_mistakes(data, name)))
    read = _materials(reader, folder)
    materials = read.materials
    target = _target(reader)
    over = _range(reader)
    goal = read_goal(reader, over)
    fixed = read_fixed(reader, materials)
    rules = read_rules(reader, materials, fixed)
    given = read_given(reader, materials, target)
    ratio = read_ratio(reader, materials)
    if not reader.has("ratio"):
        check_agreement(reader, target, fixed, given, goal)
    wrong = ratio is None and reader.has("ratio")  # then what is in use is not known
    used = [] if wrong else _used(rules, materials, fixed, given, ratio)
    shared = (*read.files, reader)
    process = read_process(shared, materials, {m.name for m in used}, all_read=read.complete)
    allowances = read_allowances(reader, over)
    trim = read_trim(reader, over)
    operating = read_operating(reader, materials)
    if over is not None:
        _validity(reader, used, over)
        _areas(reader, used, over)
        _spreads(reader, used, over)
        check_tracking(reader, ratio, used, over)
    if reader.problems or over is None or goal is None:
        raise InputError(reader.problems)
    return Brief(
        title=_title(data["title"]),
        sha256=hashlib.sha256(text.encode()).hexdigest(),
        materials=tuple(sorted(used, key=lambda material: material.name)),
        target=target,
        over=over,
        goal=goal,
        rules=rules,
        fixed=fixed,
        given=given,
        process=process,
        allowances=allowances,
        ratio=ratio,
        trim=trim,
        operating=operating,
    )


def _title(text: str) -> str:
    """Return the title on one line of at most 120 printable characters."""
    return "".join(c if c.isprintable() else " " for c in text).strip()[:120]


@dataclass(frozen=True, slots=True)
class _Read:
    """All materials by name, the tables of their files, and whether every file could be read."""

    materials: dict[str, Material]
    files: tuple[TableReader, ...]
    complete: bool


def _materials(reader: TableReader, folder: Path) -> _Read:
    """Return all materials of the files and of the brief itself."""
    found: dict[str, Material] = {}
    files: list[TableReader] = []
    sources = [partial(_named_file, name, folder, reader) for name in reader.texts("materials")]
    inline = reader.table.get("material")
    if isinstance(inline, dict):
        sources.append(partial(_inline, inline, reader))
    complete = True
    for read in sources:
        try:
            group = read()
        except InputError as error:
            reader.problems.extend(error.problems)
            complete = False
            continue
        files.append(TableReader(group.tables, group.where, reader.problems))
        for name, material in group.materials.items():
            if name in found:
                reader.refuse("materials", f"{name} twice", "each material name once", "Rename one.")
            found.setdefault(name, material)
    if not sources:
        reader.refuse(
            "materials",
            "nothing",
            'a list such as ["films.toml"] or ["published:alloys"], or [material.NAME]',
        )
    return _Read(found, tuple(files), complete and bool(sources))


def _named_file(name: str, folder: Path, reader: TableReader) -> MaterialFile:
    if name.startswith("published:"):
        rows = published(name.removeprefix("published:"))
        return MaterialFile(where=name, materials=rows, tables={})
    if "\0" in name:
        reader.refuse("materials", shown(name), "the name of a file")
        return MaterialFile(where=shown(name), materials={}, tables={})
    return read_material_file(folder / name)


def _inline(tables: Mapping[str, Any], reader: TableReader) -> MaterialFile:
    """Return the materials of the brief itself; what they share is read from the brief."""
    rows = parse_materials(tables, reader.where)
    return MaterialFile(where=reader.where, materials=rows, tables={})


def _target(reader: TableReader) -> Target:
    table = reader.inner("resistor")
    if table is None:
        return Target()
    if table.has("value") and table.has("at_most"):
        table.refuse("at_most", "value and at_most together", "one of the two")
    if table.has("tolerance") and table.has("trim_step"):
        todo = "What is trimmed keeps no more than half a step of its tolerance."
        table.refuse("trim_step", "tolerance and trim_step together", "one of the two", todo)
    target = Target(tolerance=_part_of_one(table, "tolerance"), trim_step=_part_of_one(table, "trim_step"))
    if table.text("value") == "free":
        return target
    if isinstance(table.table.get("value"), list):
        first, *also = _values(table)
        return replace(target, ohms=first, also=tuple(also))
    return replace(target, ohms=table.above_zero("value", "ohm"), at_most=table.above_zero("at_most", "ohm"))


def _values(table: TableReader) -> tuple[float, ...]:
    """Return the values of a list, each once and above zero; 1 ohm when one is wrong."""
    texts = table.texts("value")
    found = tuple(ohms for text in texts if (ohms := table.parsed(text, "ohm", "value")) is not None)
    if not found or len(found) < len(table.table["value"]):
        return (1.0,)
    if min(found) <= 0.0:
        table.refuse("value", texts[found.index(min(found))], "values above zero")
        return (1.0,)
    if len({f"{ohms:.6g}" for ohms in found}) < len(found):  # nearer ones have one name in 6 digits
        table.refuse("value", "a value twice", "values that differ in their first 6 digits")
    return found


def _part_of_one(table: TableReader, key: str) -> float | None:
    """Return a fraction above zero and below 1, or None."""
    fraction = table.above_zero(key, "1")
    if fraction is not None and fraction >= 1.0:
        table.refuse(key, str(table.table[key]), "less than 100 %")
        return None
    return fraction


def _range(reader: TableReader) -> TemperatureRange | None:
    table = reader.inner("temperature")
    if table is None:
        return None
    before = len(reader.problems)
    reference = table.quantity("reference", "K") if table.has("reference") else REFERENCE
    rise = table.quantity("rise", "delta_K") if table.has("rise") else 0.0
    name = table.text("range")
    if name is not None:
        if table.has("low", "high"):
            table.refuse("range", "range together with low or high", "a named range, or low and high")
        if reference is None or rise is None:
            return None
        return table.guarded(lambda: named_range(name, reference=reference, rise=rise))
    low, high = table.quantity("low", "K"), table.quantity("high", "K")
    if not (table.has("low") and table.has("high")):
        table.refuse("range", "nothing", 'range = "automotive-1" (see: tcplan ranges), or low and high')
    if low is None or high is None or reference is None or rise is None or len(reader.problems) > before:
        return None
    return table.guarded(lambda: temperature_range(low, high, reference, rise))


def _used(
    rules: SearchRules,
    materials: Mapping[str, Material],
    fixed: tuple[Fixed, ...],
    given: Network | None,
    ratio: Ratio | None,
) -> list[Material]:
    given = given if ratio is None else together(ratio)
    if given is not None:
        return [materials[name] for name in used_materials(given) if name in materials]
    names = dict.fromkeys((*rules.use, *(member.leg.material for member in fixed)))
    return [materials[name] for name in names if name in materials]


def _areas(reader: TableReader, used: list[Material], over: TemperatureRange) -> None:
    """Refuse a limit of area beside a film whose area is not known."""
    search = reader.inner("search")
    if search is None or not search.has("max_area"):
        return
    for material in used:
        if material.kind == "film" and material.area(1.0, over.reference) is None:
            search.refuse(
                "max_area",
                f"max_area, and no width of {material.name}",
                f"[material.{material.name}.film] with min_width",
            )


def _validity(reader: TableReader, used: list[Material], over: TemperatureRange) -> None:
    """Refuse a range outside what a material's law was established for."""
    for material in used:
        low, high = material.usable
        if over.low < low - 1e-9 or over.high > high + 1e-9:
            reader.refuse(
                "temperature",
                f"{over.text()}, outside the validity of {material.name}",
                f"within {format_celsius(low)} to {format_celsius(high)}",
                f"Leave {material.name} out of use, or give it extrapolate_to with an added spread.",
            )


def _spreads(reader: TableReader, used: list[Material], over: TemperatureRange) -> None:
    """Refuse a spread over which a law or a value reaches zero inside the range."""
    T = np.linspace(over.low, over.high, SPREAD_NODES)
    for material in used:
        spread = material.effective_spread(over.low, over.high)
        if spread is None or over.low < material.usable[0] or over.high > material.usable[1]:
            continue
        try:
            law_bounds(material.law, spread, over.reference, T)
            value_half_width(material.law, spread, over.reference)
        except InputError as error:
            where = join(reader.where, f"material.{material.name}")
            reader.problems.extend(replace(p, where=f"{where}.{p.where}") for p in error.problems)
