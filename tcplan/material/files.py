"""Materials files: TOML to checked materials, every mistake of the file in one error.

A file holds ``schema = 1`` and one table ``[material.NAME]`` for each material::

    label = "Red film, 320 ohm per square"     # optional; the name when absent
    source = "process table, rev C"            # required
    reference = "27 degC"                      # of this material's data; required
    valid = ["-55 degC", "150 degC"]           # where the law was established; required

and its law in exactly one of these forms::

    tc1 = "-120 ppm/K"                         # with tc2, tc3 as known; about the reference
    cold = "-55 degC"; cold_tcr = "-40 ppm/K"; hot = "125 degC"; hot_tcr = "25 ppm/K"   # two chords
    peak = "45 degC"; tc2 = "-0.04 ppm/K^2"    # a parabola about its peak
    law = "platinum"                           # IEC 60751
    law = "thermistor"; beta = "3435 K"        # IEC 60539-1
    law = "steinhart-hart"; a = 1.1e-3; b = 2.4e-4; c = 7.5e-8      # 1/T = a + b ln R + c (ln R)^3, K and ohm
    law = "steinhart-hart"; points = [["5 degC", "25 kohm"], ["25 degC", "10 kohm"], ["45 degC", "4 kohm"]]
    law = "table"; points = [["-40 degC", "9.86 kohm"], ...]        # only the ratios of the resistances count
    law = "exp(B*(1/T - 1/T0))"                # any formula of T and T0, the reference, in kelvin,
    [material.NAME.law_parameters]             # with its plain numbers
    B = 3435

(each key on a line of its own). The size is ``ohm_per_square`` (a film), ``ohm_per_metre`` (a wire),
``series = "E96"`` (a part) or none. ``[material.NAME.spread]`` needs ``meaning``, and holds the half-widths
``tc1``, ``tc2`` and of the size: ``ohm_per_square`` in a film, ``ohm_per_metre`` in a wire, else ``value``;
in films also ``end_resistance``, ``end_tc1`` and ``width_bias``, in parts ``tcr`` in place of the TCs.
``shape`` says how draws take them: see `tcplan.material.spread.Spread`.
``[material.NAME.film]`` holds what is needed to make a film: see `tcplan.material.model.Film`.
``voltage_coefficient`` is "20 ppm/V" of one unit, or of a film "30 ppm*um/V" times its length.
``extrapolate_to = ["-55 degC", "175 degC"]`` with the half-widths ``tc1``, ``tc2`` that it adds, in
``[material.NAME.extrapolation]``, allows a law outside ``valid``.

Beside the materials a file may hold what they share, ``[[correlation]]``, ``[[tracking]]`` and
``[corner.NAME]``. It may name materials of other files, so only its shape is checked here; a brief reads
it: see `tcplan.brief.process_tables`. Long for a module of this package: all shapes of the file stand
together, and pydantic with them.

Long, since the keys of a materials file, their units and their mistakes are told in one place.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace
from importlib import resources
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from tcplan.errors import InputError, InternalError, Problem
from tcplan.material.file_laws import MAX_POINTS, read_law, read_temperature
from tcplan.material.law import Law, check_positive
from tcplan.material.model import (
    NAME,
    Film,
    Interval,
    Kind,
    Material,
    VoltageCoefficient,
    interval_problem,
    text_problems,
)
from tcplan.material.spread import Meaning, Shape, Spread
from tcplan.names import nearest_name, shown
from tcplan.table_reader import TableReader
from tcplan.toml_input import join, place, read_toml, read_toml_text, shape_problems

SCHEMA = 1
PROCESS_KEYS = ("correlation", "tracking", "corner")
MOST_PROCESS_ROWS = 200


@dataclass(frozen=True, slots=True, kw_only=True)
class MaterialFile:
    """What a materials file holds.

    Parameters
    ----------
    where : str
        The file, for messages.
    materials : dict of str to Material
        By name, in the order of the file.
    tables : mapping
        What the materials share: the tables ``correlation``, ``tracking`` and ``corner`` that are there,
        as TOML gives them, of the right shape.
    """

    where: str
    materials: dict[str, Material]
    tables: Mapping[str, Any]


def read_material_file(path: Path) -> MaterialFile:
    """Return what a materials file holds.

    Parameters
    ----------
    path : Path
        A materials file (TOML, 2 MB at most).

    Returns
    -------
    MaterialFile

    Raises
    ------
    InputError
        With every mistake in the file, each with its place.
    """
    return _file_of(read_toml(path), str(path))


def read_materials(path: Path) -> dict[str, Material]:
    """Return the materials of a file, by name, in the order of the file.

    Parameters
    ----------
    path : Path
        A materials file (TOML, 2 MB at most).

    Returns
    -------
    dict of str to Material

    Raises
    ------
    InputError
        With every mistake in the file, each with its place.

    Examples
    --------
    >>> films = read_materials(Path("examples/brake_sensor_films/films.toml"))
    >>> films["red_film"].kind, films["red_film"].ohm_per_square
    ('film', 320.0)
    """
    return read_material_file(path).materials


def parse_materials(data: Mapping[str, Any], where: str) -> dict[str, Material]:
    """Return the materials of the ``material`` table of a materials file or a brief.

    Parameters
    ----------
    data : mapping
        Name to table, as TOML gives it.
    where : str
        The file, put before every place.

    Returns
    -------
    dict of str to Material

    Raises
    ------
    InputError
        With every mistake, each with its place.
    """
    materials: dict[str, Material] = {}
    problems: list[Problem] = []
    for name, table in data.items():
        try:
            materials[name] = _material(name, table, where)
        except InputError as error:
            problems.extend(error.problems)
    if problems:
        raise InputError(problems)
    return materials


def published_names() -> tuple[str, ...]:
    """Return the names of the materials files that come with tcplan."""
    entries = (entry.name for entry in _published_folder().iterdir())
    return tuple(sorted(name.removesuffix(".toml") for name in entries if name.endswith(".toml")))


def published(name: str) -> dict[str, Material]:
    """Return the materials of a file that comes with tcplan; each row states its source.

    Parameters
    ----------
    name : str
        One of `published_names`.

    Returns
    -------
    dict of str to Material

    Raises
    ------
    InputError
        When there is no such file.

    Examples
    --------
    >>> list(published("metals"))[:3]
    ['copper', 'copper_pure', 'aluminium']
    """
    known = published_names()
    if name not in known:
        near = nearest_name(name, known)
        raise InputError(
            Problem(
                where=f"published:{name if NAME.fullmatch(name) else shown(name)}",
                found="no such published file",
                expected="one of " + ", ".join(known),
                todo=f"Did you mean published:{near}?" if near else "",
            )
        )
    text = _published_folder().joinpath(f"{name}.toml").read_text(encoding="utf-8")
    return _file_of(read_toml_text(text, f"published:{name}"), f"published:{name}").materials


def _published_folder() -> Any:
    return resources.files("tcplan.material").joinpath("published")


def process_tables(content: Mapping[str, Any]) -> dict[str, Any]:
    """Return those tables of a file or a brief that say what its materials share."""
    return {key: content[key] for key in PROCESS_KEYS if key in content}


def process_mistakes(tables: Mapping[str, Any], where: str) -> tuple[Problem, ...]:
    """Return what is wrong with the shape of the tables that say what materials share, in our words."""
    try:
        _ProcessShape.model_validate(tables)
    except ValidationError as error:
        return shape_problems(error.errors(include_url=False), _ProcessShape, where)
    return ()


def _file_of(content: Mapping[str, Any], where: str) -> MaterialFile:
    problems = _top_problems(content, where)
    tables = content.get("material")
    try:
        materials = parse_materials(tables, where) if isinstance(tables, dict) else {}
    except InputError as error:
        problems.extend(error.problems)
    shared = process_tables(content)
    problems.extend(process_mistakes(shared, where))
    if problems:
        raise InputError(problems)
    return MaterialFile(where=where, materials=materials, tables=shared)


def _top_problems(content: Mapping[str, Any], where: str) -> list[Problem]:
    problems = []
    if type(content.get("schema")) is not int or content["schema"] != SCHEMA:
        found = shown(content["schema"]) if "schema" in content else "nothing"
        todo = "Write it as the first line."
        problems.append(
            Problem(where=f"{where}: schema", found=found, expected=f"schema = {SCHEMA}", todo=todo)
        )
    known = ("schema", "material", *PROCESS_KEYS)
    for key in content:
        if key not in known:
            near = nearest_name(key, known)
            todo = f"Did you mean {near}?" if near else ""
            found, expected = f"the unknown key {shown(key)}", f"{', '.join(known)} only"
            problems.append(
                Problem(where=f"{where}: {place([key])}", found=found, expected=expected, todo=todo)
            )
    if not isinstance(content.get("material"), dict) or not content["material"]:
        expected = "one or more tables [material.NAME]"
        problems.append(Problem(where=f"{where}: material", found="no materials", expected=expected))
    return problems


# ---- shape: which keys, and what kind of value each has


class _Shape(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, defer_build=True)


def _text(example: str) -> Any:
    return Field(default=None, examples=[f'"{example}"'])


class _SpreadShape(_Shape):
    meaning: Literal["limits", "sigma"]
    ohm_per_square: str | None = _text("15 %")
    ohm_per_metre: str | None = _text("5 %")
    value: str | None = _text("1 %")
    tc1: str | None = _text("40 ppm/K")
    tc2: str | None = _text("0.1 ppm/K^2")
    tcr: str | None = _text("25 ppm/K")
    end_resistance: str | None = _text("40 %")
    end_tc1: str | None = _text("200 ppm/K")
    width_bias: str | None = _text("0.02 um")
    shape: Literal["normal", "rectangular"] | None = None


class _ExtrapolationShape(_Shape):
    tc1: str | None = _text("20 ppm/K")
    tc2: str | None = _text("0.1 ppm/K^2")


class _FilmShape(_Shape):
    min_width: str = Field(examples=['"1 um"'])
    preferred_width: str | None = _text("4 um")
    width_bias: str | None = _text("0.05 um")
    end_resistance: str | None = _text("35 ohm*um")
    end_tc1: str | None = _text("-900 ppm/K")
    matching: str | None = _text("1.2 %*um")
    spacing: str | None = _text("0.6 um")
    end_length: str | None = _text("0.8 um")
    grid: str | None = _text("5 nm")
    max_current: str | None = _text("0.6 mA/um")
    etch: str | None = _text("poly")


_Pair = Annotated[list[str], Field(min_length=2, max_length=2)]


class _MaterialShape(_Shape):
    label: str | None = _text("Red film, 320 ohm per square")
    source: str = Field(examples=['"process table, rev C"'])
    reference: str = Field(examples=['"25 degC"'])
    valid: _Pair = Field(examples=['["-55 degC", "150 degC"]'])
    tc1: str | None = _text("-120 ppm/K")
    tc2: str | None = _text("0.55 ppm/K^2")
    tc3: str | None = _text("0.001 ppm/K^3")
    cold: str | None = _text("-55 degC")
    cold_tcr: str | None = _text("-40 ppm/K")
    hot: str | None = _text("125 degC")
    hot_tcr: str | None = _text("25 ppm/K")
    peak: str | None = _text("45 degC")
    law: str | None = _text("exp(B*(1/T - 1/T0))")
    law_parameters: dict[str, float] | None = None
    beta: str | None = _text("3435 K")
    a: float | None = None
    b: float | None = None
    c: float | None = None
    points: Annotated[list[_Pair], Field(max_length=MAX_POINTS)] | None = None
    ohm_per_square: str | None = _text("320 ohm")
    ohm_per_metre: str | None = _text("8.5 ohm/m")
    series: str | None = _text("E96")
    voltage_coefficient: str | None = _text("20 ppm/V")
    spread: _SpreadShape | None = None
    film: _FilmShape | None = None
    extrapolate_to: _Pair | None = None
    extrapolation: _ExtrapolationShape | None = None


class _CorrelationShape(_Shape):
    between: _Pair = Field(examples=['["red_film.ohm_per_square", "red_film.tc1"]'])
    value: Annotated[float, Field(ge=-1, le=1)] = Field(examples=["-0.6"])


class _TrackingShape(_Shape):
    materials: Annotated[list[str], Field(min_length=2)] = Field(examples=['["red_film", "blue_film"]'])
    within: str = Field(examples=['"3 ppm/K"'])


class _ShiftsShape(_Shape):
    ohm_per_square: str | None = _text("+12 %")
    ohm_per_metre: str | None = _text("+2 %")
    value: str | None = _text("+1 %")
    tc1: str | None = _text("-20 ppm/K")
    tc2: str | None = _text("0.05 ppm/K^2")


class _ProcessShape(_Shape):
    correlation: Annotated[list[_CorrelationShape], Field(max_length=MOST_PROCESS_ROWS)] | None = None
    tracking: Annotated[list[_TrackingShape], Field(max_length=MOST_PROCESS_ROWS)] | None = None
    corner: dict[str, dict[str, _ShiftsShape]] | None = None


def _shape_mistakes(table: object, where: str) -> tuple[Problem, ...]:
    try:
        _MaterialShape.model_validate(table)
    except ValidationError as error:
        return shape_problems(error.errors(include_url=False), _MaterialShape, where)
    return ()


# ---- one material


def _material(name: str, table: object, where: str) -> Material:
    """Return one material, or raise with every mistake of its table."""
    at = f"{where}: {place(['material', name])}"
    shape = _shape_mistakes(table, at)
    reader = TableReader(table if isinstance(table, dict) else {}, at)
    values = _values(reader, name)
    law: Law | None = values["law"]
    valid: Interval | None = values["valid"]
    words = _word_problems(reader, name, where)
    if words or shape or reader.problems:
        if law is not None and valid is not None and valid[0] < valid[1]:
            # Material checks this too, but it is not built from a table with mistakes.
            reader.guarded(lambda: check_positive(law, *valid, ""))
        raise InputError([*words, *shape, *reader.problems])
    if law is None or valid is None or values["source"] is None:
        raise InternalError(f"{at}: incomplete, and no mistake was told")
    try:
        return Material(name=name, **values)
    except InputError as error:
        raise InputError(problem.inside(where) for problem in error.problems) from error


def _values(reader: TableReader, name: str) -> dict[str, Any]:
    label = reader.text("label")
    kind, size = _size(reader)
    return {
        "label": name if label is None else label,
        "source": reader.text("source"),
        "law": read_law(reader, read_temperature(reader, "reference")),
        "valid": _interval(reader, "valid"),
        "kind": kind,
        **size,
        "spread": _spread(reader, kind),
        "film": _film(reader),
        "extrapolated": _interval(reader, "extrapolate_to"),
        "extrapolation": _extrapolation(reader),
        "voltage_coefficient": _voltage_coefficient(reader),
    }


def _word_problems(reader: TableReader, name: str, where: str) -> list[Problem]:
    """Return what is wrong with name, label and source; an absent one is told by the shape."""
    label, source = reader.text("label"), reader.text("source")
    problems = text_problems(name, "-" if label is None else label, "-" if source is None else source)
    return [problem.inside(where) for problem in problems]


def _interval(reader: TableReader, key: str) -> Interval | None:
    pair = reader.tuple_of(reader.table.get(key), ("K", "K"), key)
    if pair is None:
        return None
    interval = (pair[0], pair[1])
    if problem := interval_problem(join(reader.where, key), interval):
        reader.problems.append(problem)
    return interval


def _size(reader: TableReader) -> tuple[Kind, dict[str, Any]]:
    sizes: dict[str, Any] = {
        "ohm_per_square": reader.quantity("ohm_per_square", "ohm"),
        "ohm_per_metre": reader.quantity("ohm_per_metre", "ohm/m"),
        "series": reader.text("series"),
    }
    kinds: dict[str, Kind] = {"ohm_per_square": "film", "ohm_per_metre": "wire", "series": "part"}
    given = [key for key in sizes if reader.has(key)]
    if len(given) > 1:
        todo = "Make two materials of it, or remove all but one."
        reader.refuse(
            "", " and ".join(given), "one of ohm_per_square, ohm_per_metre and series at most", todo
        )
    return (kinds[given[0]] if given else "plain"), sizes


def _spread(reader: TableReader, kind: Kind) -> Spread | None:
    inner = reader.inner("spread")
    if inner is None:
        return None
    size = {"film": "ohm_per_square", "wire": "ohm_per_metre"}.get(kind, "value")
    for key in ("ohm_per_square", "ohm_per_metre", "value"):
        if key != size and inner.has(key):
            inner.refuse(key, f"{key} in a material of the kind {kind}", f"{size}", f"Write {size} instead.")
    for key in ("tc1", "tc2"):
        if inner.has("tcr") and inner.has(key):
            found = f"tcr and {key} together"
            inner.refuse(key, found, "one of the two", "A TCR limit covers slope and curvature.")
    half_widths = {"value": inner.quantity(size, "1")}
    half_widths |= {key: inner.quantity(key, unit) for key, unit in _HALF_WIDTH_UNITS.items()}
    meanings: dict[str | None, Meaning] = {"limits": "limits", "sigma": "sigma"}
    meaning = meanings.get(inner.text("meaning"))
    if meaning is None:
        return None
    shape = _shape(inner.text("shape"), kind, meaning)
    told = len(reader.problems)
    spread = reader.guarded(lambda: Spread(meaning=meaning, shape=shape, **half_widths))
    reader.problems[told:] = [_at_size(problem, size) for problem in reader.problems[told:]]
    return spread


_HALF_WIDTH_UNITS = {
    "tc1": "1/K",
    "tc2": "1/K^2",
    "tcr": "1/K",
    "end_resistance": "1",
    "end_tc1": "1/K",
    "width_bias": "m",
}


def _shape(stated: str | None, kind: Kind, meaning: Meaning) -> Shape:
    """Return how draws take the half-widths: what is bought is sorted, so anything up to its limits."""
    shapes: dict[str | None, Shape] = {"normal": "normal", "rectangular": "rectangular"}
    default: Shape = "rectangular" if kind in ("wire", "part") and meaning == "limits" else "normal"
    return shapes.get(stated, default)


def _at_size(problem: Problem, size: str) -> Problem:
    """Return the problem at the key of the file: ``Spread`` calls the half-width of every size ``value``."""
    stem = problem.where.removesuffix(".value")
    return problem if stem == problem.where else replace(problem, where=f"{stem}.{size}")


def _extrapolation(reader: TableReader) -> Spread | None:
    inner = reader.inner("extrapolation")
    if inner is None:
        return None
    tc1, tc2 = inner.quantity("tc1", "1/K"), inner.quantity("tc2", "1/K^2")
    return reader.guarded(lambda: Spread(meaning="limits", tc1=tc1, tc2=tc2))


def _voltage_coefficient(reader: TableReader) -> VoltageCoefficient | None:
    """Return the voltage coefficient: per volt, or with a length in its unit times the length."""
    text = reader.text("voltage_coefficient") or ""
    # ppm holds an m of its own, and that of mV is no length.
    if re.search(r"m(?!V)|\binch", text.replace("ppm", "")):
        size = reader.quantity("voltage_coefficient", "m/V")
        return None if size is None else VoltageCoefficient(metre_per_volt=size)
    size = reader.quantity("voltage_coefficient", "1/V")
    return None if size is None else VoltageCoefficient(per_volt=size)


_FILM_UNITS = {
    "min_width": "m",
    "preferred_width": "m",
    "width_bias": "m",
    "end_resistance": "ohm*m",
    "end_tc1": "1/K",
    "matching": "1*m",
    "spacing": "m",
    "end_length": "m",
    "grid": "m",
    "max_current": "A/m",
}


def _film(reader: TableReader) -> Film | None:
    inner = reader.inner("film")
    if inner is None:
        return None
    sizes = {key: inner.quantity(key, unit) for key, unit in _FILM_UNITS.items()}
    min_width = sizes.pop("min_width")
    if min_width is None:
        return None
    etch = inner.text("etch")
    return reader.guarded(lambda: Film(min_width=min_width, etch=etch, **sizes))
