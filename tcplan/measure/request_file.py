"""Reading a measurement file: every mistake of it in one error."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path
from typing import Any

from tcplan.errors import InputError
from tcplan.material.law import Expression
from tcplan.material.model import text_problems
from tcplan.measure.block import Size
from tcplan.measure.fit import MODELS, ModelName
from tcplan.measure.fit_laws import Formula
from tcplan.measure.model import COMMON_ERROR_UNITS, CommonErrors
from tcplan.measure.request import FitRequest, SpreadRules, SweepRequest
from tcplan.measure.request_shape import shape_mistakes
from tcplan.names import shown
from tcplan.ranges import REFERENCE
from tcplan.table_reader import TableReader
from tcplan.toml_input import file_text, join, place, read_toml_text


def read_request(path: Path) -> FitRequest:
    """Return the checked content of a measurement file; names of sweeps are relative to it.

    Raises
    ------
    InputError
        With every mistake of the file.
    """
    return parse_request(file_text(path), str(path), path.parent)


def parse_request(text: str, name: str, folder: Path) -> FitRequest:
    """Return the checked content of the text of a measurement file.

    Parameters
    ----------
    text : str
        TOML.
    name : str
        What messages call it.
    folder : Path
        What the names of sweeps are relative to.
    """
    return request_of(read_toml_text(text, name), name, folder)


def request_of(data: dict[str, Any], name: str, folder: Path) -> FitRequest:
    """Return the checked request of plain data in the shape of a measurement file; see `parse_request`."""
    reader = TableReader(data, name, list(shape_mistakes(data, name)))
    tables = data.get("sweep")
    sweeps = [
        _sweep(TableReader(table, join(name, place(("sweep", key))), reader.problems), key, folder)
        for key, table in (tables.items() if isinstance(tables, dict) else ())
        if isinstance(table, dict)
    ]
    errors, spread = _errors(reader.inner("errors")), _spread(reader.inner("spread"))
    same = data.get("same_devices") is True
    if same and isinstance(tables, dict) and len(tables) == 1:
        reader.refuse("same_devices", "one sweep", "sweeps of two materials or more on the same devices")
    if reader.problems:
        raise InputError(reader.problems)
    return FitRequest(
        sweeps=tuple(sweep for sweep in sweeps if sweep is not None),
        errors=errors,
        spread=spread,
        same_devices=same,
    )


def _sweep(table: TableReader, name: str, folder: Path) -> SweepRequest | None:
    """Return one sweep; None when it has mistakes, which are noted."""
    before = len(table.problems)
    file, source, label = (table.text(key) for key in ("file", "source", "label"))
    known = name if label is None else label, "none" if source is None else source
    for problem in text_problems(name, *known):
        key = problem.where.rpartition(".")[2]
        inside = key if key in ("label", "source") else ""
        table.problems.append(replace(problem, where=join(table.where, inside)))
    if file is not None and "\0" in file:
        table.refuse("file", shown(file), "the name of a file")
    reference = table.quantity("reference", "K") if table.has("reference") else REFERENCE
    model, size = _model(table, reference), _size(table)
    exclude = table.table.get("exclude")
    if len(table.problems) > before or file is None or source is None or reference is None:
        return None
    order = table.table.get("order")
    return SweepRequest(
        name=name,
        file=folder / file,
        source=source,
        label=label,
        model=model,
        order=order if isinstance(order, int) else None,
        reference=reference,
        size=size,
        exclude=tuple(exclude) if isinstance(exclude, list) else (),
    )


def _model(table: TableReader, reference: float | None) -> ModelName | Formula:
    """Return what is fitted; "polynomial" where a mistake is noted."""
    known: dict[str | None, ModelName] = {name: name for name in MODELS}
    if not table.has("law"):
        if table.has("start"):
            table.refuse("start", "start values without a law", 'law = "..." beside them')
        model = known.get(table.text("model"), "polynomial")
        if model != "polynomial" and table.has("order"):
            table.refuse("order", f"an order of a {model} law", "the order of a polynomial")
        return model
    if table.has("model", "order"):
        table.refuse("law", "a law beside a model or an order", "one of the two")
    start = table.table.get("start")
    pairs = start.items() if isinstance(start, dict) else ()
    values = tuple((str(key), float(value)) for key, value in pairs if _is_number(value))
    text = table.text("law")
    if text is not None and reference is not None and len(values) == len(pairs):
        # told once here, not once for each device
        table.guarded(lambda: Expression(reference=reference, text=text, constants=values))
    return Formula(text=text or "", start=values)


def _is_number(value: object) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool) and math.isfinite(value)


def _size(table: TableReader) -> Size | None:
    """Return what the devices are made of, None when it is not stated."""
    if table.has("squares") and table.has("length"):
        table.refuse("length", "squares and a length", "squares of a film, or the length of a wire")
        return None
    if table.has("squares"):
        count = table.number("squares")
        good = count is not None and 0.0 < count < math.inf  # what is not is told by the shape
        return Size(key="ohm_per_square", count=count) if count is not None and good else None
    length = table.above_zero("length", "m") if table.has("length") else None
    return None if length is None else Size(key="ohm_per_metre", count=length)


def _errors(table: TableReader | None) -> CommonErrors:
    """Return the common errors; a mistake is noted."""
    if table is None:
        return CommonErrors()
    found = {key: table.quantity(key, unit) for key, unit in COMMON_ERROR_UNITS.items() if table.has(key)}
    for key, value in found.items():
        if value is not None and value < 0.0 and key != "lead_tc1":
            table.refuse(key, str(table.table[key]), "a standard uncertainty, zero or more")
    return CommonErrors(**{key: value for key, value in found.items() if value is not None})


def _spread(table: TableReader | None) -> SpreadRules:
    """Return the meaning of the spread; a mistake is noted."""
    if table is None:
        return SpreadRules()
    found = {key: table.quantity(key, "1") for key in ("coverage", "confidence") if table.has(key)}
    for key, value in found.items():
        if value is not None and not 0.5 <= value < 1.0:
            table.refuse(key, str(table.table[key]), "50 % or more, and less than 100 %")
    fractions = {key: value for key, value in found.items() if value is not None}
    meaning = "sigma" if table.text("meaning") == "sigma" else "limits"
    return SpreadRules(meaning=meaning, **fractions)  # type: ignore[arg-type]
