"""Reading a brief: every mistake of it, its materials files included, in one error."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from functools import partial
from pathlib import Path

from tcplan.brief.goal_table import read_goal
from tcplan.brief.members import check_agreement, read_fixed, read_given, read_rules
from tcplan.brief.model import Brief, Fixed, SearchRules, Target
from tcplan.brief.shape import shape_mistakes
from tcplan.errors import InputError
from tcplan.material.files import parse_materials, published, read_materials
from tcplan.material.model import Material
from tcplan.names import shown
from tcplan.network import Network, used_materials
from tcplan.ranges import REFERENCE, TemperatureRange, named_range, temperature_range
from tcplan.table_reader import TableReader
from tcplan.toml_input import file_text, read_toml_text
from tcplan.units import format_celsius


def read_brief(path: Path) -> Brief:
    """Return the checked brief of a file.

    Raises
    ------
    InputError
        With every mistake of the brief and of its materials files.
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
    materials = _materials(reader, folder)
    target = _target(reader)
    over = _range(reader)
    goal = read_goal(reader, over)
    fixed = read_fixed(reader, materials)
    rules = read_rules(reader, materials, fixed)
    given = read_given(reader, materials, target)
    check_agreement(reader, target, fixed, given, goal)
    used = _used(rules, materials, fixed, given)
    if over is not None:
        _validity(reader, used, over)
        _areas(reader, used, over)
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
    )


def _title(text: str) -> str:
    """Return the title on one line of at most 120 printable characters."""
    return "".join(c if c.isprintable() else " " for c in text).strip()[:120]


def _materials(reader: TableReader, folder: Path) -> dict[str, Material]:
    """Return all materials of the files and of the brief itself, by name."""
    found: dict[str, Material] = {}
    sources = [partial(_named_file, name, folder, reader) for name in reader.texts("materials")]
    inline = reader.table.get("material")
    if isinstance(inline, dict):
        sources.append(partial(parse_materials, inline, reader.where))
    for read in sources:
        try:
            group = read()
        except InputError as error:
            reader.problems.extend(error.problems)
            continue
        for name, material in group.items():
            if name in found:
                reader.refuse("materials", f"{name} twice", "each material name once", "Rename one.")
            found.setdefault(name, material)
    if not sources:
        reader.refuse(
            "materials",
            "nothing",
            'a list such as ["films.toml"] or ["published:alloys"], or [material.NAME]',
        )
    return found


def _named_file(name: str, folder: Path, reader: TableReader) -> dict[str, Material]:
    if name.startswith("published:"):
        return published(name.removeprefix("published:"))
    if "\0" in name:
        reader.refuse("materials", shown(name), "the name of a file")
        return {}
    return read_materials(folder / name)


def _target(reader: TableReader) -> Target:
    table = reader.inner("resistor")
    if table is None:
        return Target()
    if table.has("value") and table.has("at_most"):
        table.refuse("at_most", "value and at_most together", "one of the two")
    if table.text("value") == "free":
        return Target()
    return Target(ohms=table.above_zero("value", "ohm"), at_most=table.above_zero("at_most", "ohm"))


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
) -> list[Material]:
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
