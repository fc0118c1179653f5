"""The brief: a file that says what is wanted, read whole and checked before anything is done.

Every mistake of the brief, its materials files included, is reported in one error. The keys are
those of docs/input.md.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Annotated, Any, Literal, TypeAlias

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from tcplan.errors import InputError, Problem
from tcplan.goal import KINDS, Goal, Judge, Limit, Window
from tcplan.material.files import parse_materials, published, read_materials
from tcplan.material.law import Expression, Law, Polynomial, Table, check_positive
from tcplan.material.model import Material
from tcplan.names import nearest_name, shown
from tcplan.network import Leg, Network, network_text, scaled, used_materials, value
from tcplan.network_text import parse_network
from tcplan.ranges import REFERENCE, TemperatureRange, named_range, temperature_range
from tcplan.table_reader import TableReader
from tcplan.toml_input import file_text, read_toml_text, shape_problems
from tcplan.units import format_celsius, format_ohms, to_celsius

Searched: TypeAlias = Literal["single", "series", "parallel"]
SEARCHED: tuple[Searched, ...] = ("single", "series", "parallel")
Place: TypeAlias = Literal["series", "parallel"]
MOST_ROWS = 200


@dataclass(frozen=True, slots=True, kw_only=True)
class Target:
    """The wanted total [ohm]: a number, at most a number, or free (both None)."""

    ohms: float | None = None
    at_most: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Fixed:
    """A member that is given, not chosen."""

    leg: Leg
    place: Place = "series"


@dataclass(frozen=True, slots=True, kw_only=True)
class SearchRules:
    """What the search may use. ``max_materials`` and ``max_legs`` count chosen ones only."""

    arrangements: tuple[Searched, ...] = SEARCHED
    use: tuple[str, ...] = ()
    max_materials: int = 2
    max_legs: int = 3
    min_share: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Brief:
    """A checked request. ``materials`` are those in use, sorted by name."""

    title: str
    sha256: str
    materials: tuple[Material, ...]
    target: Target
    over: TemperatureRange
    goal: Goal
    rules: SearchRules
    fixed: tuple[Fixed, ...] = ()
    given: Network | None = None

    @property
    def by_name(self) -> dict[str, Material]:
        """The materials by name."""
        return {material.name: material for material in self.materials}

    def to_dict(self) -> dict[str, Any]:
        """Return the brief as plan.json holds it, units in the names."""
        rules = self.rules
        return {
            "title": self.title,
            "sha256": self.sha256,
            "resistor": {"value_ohms": self.target.ohms, "at_most_ohms": self.target.at_most},
            "goal": {
                "judge": self.goal.judge,
                "limits": [_limit_dict(limit) for limit in self.goal.limits],
                "wanted": self.goal.wanted.parameters() if self.goal.wanted else None,
            },
            "search": {
                "arrangements": list(rules.arrangements),
                "use": list(rules.use),
                "max_materials": rules.max_materials,
                "max_legs": rules.max_legs,
                "min_share": rules.min_share,
            },
            "fixed": [
                {"material": f.leg.material, "ohms": f.leg.ohms, "place": f.place} for f in self.fixed
            ],
            "given": network_text(self.given) if self.given else None,
        }


def _limit_dict(limit: Limit) -> dict[str, Any]:
    unit = "ppm_per_K" if limit.kind in ("chord_tcr", "box_tcr") else "ppm"
    windows = [
        {"low_degC": to_celsius(w.low), "high_degC": to_celsius(w.high), "limit_ppm": w.limit * 1e6}
        for w in limit.windows
    ]
    return {"kind": limit.kind, unit: limit.value * 1e6, "windows": windows}


# --- shape ------------------------------------------------------------------------------------


class _Shape(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, defer_build=True)


def _text(example: str) -> Any:
    return Field(default=None, examples=[f'"{example}"'])


_Triple = Annotated[list[str], Field(min_length=3, max_length=3)]
_Pair = Annotated[list[str], Field(min_length=2, max_length=2)]


class _ResistorShape(_Shape):
    value: str | None = _text("18 kohm")
    at_most: str | None = _text("3 kohm")


class _TemperatureShape(_Shape):
    range: str | None = _text("automotive-1")
    low: str | None = _text("-40 degC")
    high: str | None = _text("125 degC")
    rise: str | None = _text("10 K")
    reference: str | None = _text("25 degC")


class _GoalShape(_Shape):
    drift: str | None = _text("6000 ppm")
    band: str | None = _text("8000 ppm")
    chord_tcr: str | None = _text("25 ppm/K")
    box_tcr: str | None = _text("25 ppm/K")
    mask: Annotated[list[_Triple], Field(min_length=1, max_length=MOST_ROWS)] | None = None
    judge: Literal["nominal", "worst-case"] | None = None
    tc1: str | None = _text("3000 ppm/K")
    tc2: str | None = _text("0.5 ppm/K^2")
    law: str | None = _text("exp(a*(T - T0))")
    law_parameters: dict[str, float] | None = None
    table: Annotated[list[_Pair], Field(min_length=3, max_length=MOST_ROWS)] | None = None


class _SearchShape(_Shape):
    arrangements: Annotated[list[str], Field(min_length=1, max_length=4)] | None = None
    use: Annotated[list[str], Field(min_length=1)] | None = None
    max_materials: Annotated[int, Field(ge=1, le=12)] | None = None
    max_legs: Annotated[int, Field(ge=1, le=12)] | None = None
    min_share: str | None = _text("3 %")


class _FixedShape(_Shape):
    material: str
    value: str = Field(examples=['"412 ohm"'])
    place: Literal["series", "parallel"] | None = None


class _GivenShape(_Shape):
    network: str = Field(examples=['"film_a 12 kohm + (film_b 4k7 || film_c 3k3)"'])
    scaled: bool | None = None


class _BriefShape(_Shape):
    version: Literal[1] = Field(alias="schema", examples=["1"])
    title: str = Field(examples=['"Span resistor"'])
    materials: list[str] | None = None
    material: dict[str, Any] | None = None
    resistor: _ResistorShape | None = None
    temperature: _TemperatureShape
    goal: _GoalShape | None = None
    search: _SearchShape | None = None
    fixed: Annotated[list[_FixedShape], Field(max_length=16)] | None = None
    given: _GivenShape | None = None


def _shape_mistakes(data: Mapping[str, Any], where: str) -> tuple[Problem, ...]:
    try:
        _BriefShape.model_validate(data)
    except ValidationError as error:
        return shape_problems(error.errors(include_url=False), _BriefShape, where)
    return ()


# --- reading ----------------------------------------------------------------------------------


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
    reader = TableReader(data, name, list(_shape_mistakes(data, name)))
    materials = _materials(reader, folder)
    target = _target(reader)
    over = _range(reader)
    goal = _goal(reader, over)
    fixed = _fixed(reader, materials)
    rules = _rules(reader, materials, fixed)
    given = _given(reader, materials, target)
    _agreement(reader, target, fixed, given, goal)
    used = _used(rules, materials, fixed, given)
    if over is not None:
        _validity(reader, used, over)
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
            "materials", "nothing", 'a list such as ["films.toml"] or ["published:alloys"], or [material.NAME]'
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


# --- goal -------------------------------------------------------------------------------------

_LIMIT_UNITS = {"drift": "1", "band": "1", "chord_tcr": "1/K", "box_tcr": "1/K"}


def _goal(reader: TableReader, over: TemperatureRange | None) -> Goal | None:
    table = reader.inner("goal") or TableReader({}, f"{reader.where}: goal", reader.problems)
    limits = [limit for kind in KINDS if (limit := _limit(table, kind)) is not None]
    judge: Judge = "worst-case" if table.text("judge") == "worst-case" else "nominal"
    if over is None:
        return None
    wanted = _wanted(table, over)
    if wanted is not None:
        table.guarded(lambda: check_positive(wanted, over.low, over.high, "law"))
    return Goal(limits=tuple(limits), judge=judge, wanted=wanted)


def _limit(table: TableReader, kind: str) -> Limit | None:
    if kind == "mask":
        rows = table.list_of("mask", ("K", "K", "1"), MOST_ROWS)
        return _mask(table, rows) if rows else None
    amount = table.above_zero(kind, _LIMIT_UNITS[kind])
    return None if amount is None else Limit(kind=kind, value=amount)  # type: ignore[arg-type]


def _mask(table: TableReader, rows: tuple[tuple[float, ...], ...]) -> Limit | None:
    for n, (low, high, limit) in enumerate(rows, 1):
        if low >= high:
            table.refuse(f"mask[{n}]", f"{format_celsius(low)} to {format_celsius(high)}", "low below high")
        if limit <= 0:
            table.refuse(f"mask[{n}]", f"a limit of {limit * 1e6:g} ppm", "a limit above zero")
    windows = tuple(Window(low=low, high=high, limit=limit) for low, high, limit in rows)
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
            lambda: Expression(text=table.text("law") or "", parameters=parameters, reference=over.reference)
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
    return table.guarded(lambda: Table(points=points, reference=over.reference))


# --- what may be used ---------------------------------------------------------------------------


def _known(table: TableReader, key: str, name: str | None, materials: Mapping[str, Material]) -> bool:
    if name is None or name in materials:
        return name is not None
    if materials:  # without any, the missing materials are the mistake, not the name
        near = nearest_name(name, materials)
        listed = ", ".join(sorted(materials)[:12])
        table.refuse(
            key, f"a material named {shown(name)}", f"one of {listed}", f"Did you mean {near}?" if near else ""
        )
    return False


def _fixed(reader: TableReader, materials: Mapping[str, Material]) -> tuple[Fixed, ...]:
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


def _rules(
    reader: TableReader, materials: Mapping[str, Material], fixed: tuple[Fixed, ...]
) -> SearchRules:
    table = reader.inner("search") or TableReader({}, f"{reader.where}: search", reader.problems)
    use = table.texts("use")
    for name in use:
        _known(table, "use", name, materials)
    if len(set(use)) < len(use):
        table.refuse("use", "a name twice", "each name once")
    share = table.quantity("min_share", "1") if table.has("min_share") else 0.0
    if share is not None and not 0 <= share <= 0.5:
        table.refuse("min_share", f"{share * 100:g} %", "0 % to 50 %")
    fixed_names = {member.leg.material for member in fixed}
    chosen = use or tuple(name for name in materials if name not in fixed_names)
    return SearchRules(
        arrangements=_arrangements(table, fixed),
        use=tuple(sorted(set(chosen))),
        max_materials=int(table.number("max_materials") or 2),
        max_legs=int(table.number("max_legs") or 3),
        min_share=share or 0.0,
    )


def _arrangements(table: TableReader, fixed: tuple[Fixed, ...]) -> tuple[Searched, ...]:
    """Return the arrangements to search; a fixed member leaves only the one that holds it."""
    listed = table.texts("arrangements") or SEARCHED
    if "mixed" in listed:
        table.refuse(
            "arrangements",
            '"mixed"',
            "single, series or parallel",
            "This version searches one-node networks; a mixed network is checked under [given].",
        )
    for name in listed:
        if name not in (*SEARCHED, "mixed"):
            near = nearest_name(name, SEARCHED)
            table.refuse(
                "arrangements", shown(name), "single, series or parallel", f"Did you mean {near}?" if near else ""
            )
    kept = [name for name in SEARCHED if name in listed]
    if not fixed:
        return tuple(kept)
    place = fixed[0].place
    if kept and place not in kept:
        table.refuse("arrangements", ", ".join(kept), f"{place}: that is where the fixed member is")
    return (place,)


def _given(reader: TableReader, materials: Mapping[str, Material], target: Target) -> Network | None:
    table = reader.inner("given")
    if table is None:
        return None
    for other in ("search", "fixed"):
        if reader.has(other):
            reader.refuse(other, f"[given] together with {other}", "[given] alone: it is checked, not searched")
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


def _agreement(
    reader: TableReader,
    target: Target,
    fixed: tuple[Fixed, ...],
    given: Network | None,
    goal: Goal | None,
) -> None:
    """Check that the value, the fixed members and the goal can go together."""
    resistor = reader.inner("resistor") or TableReader({}, f"{reader.where}: resistor", reader.problems)
    free = target.ohms is None
    asked = resistor.has("value") and resistor.text("value") != "free"
    if given is None and free and not asked and not fixed:
        resistor.refuse("value", "no value", 'the value, such as "18 kohm" (free only beside [[fixed]])')
    unlimited = goal is not None and not goal.limits
    bounded = resistor.has("at_most") and all(member.place == "series" for member in fixed)
    if fixed and free and not asked and not bounded and unlimited:
        resistor.refuse("value", "no value and no limit", "a value, or a limit in [goal] that bounds the total")
    if fixed:
        _room(resistor, target, fixed)


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

