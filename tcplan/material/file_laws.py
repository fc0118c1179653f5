"""The law of a material's table, which is stated in exactly one form.

The forms are listed in `tcplan.material.files`. Mistakes are collected, so that a file tells all of them.
"""

from __future__ import annotations

import re
import sys
from collections.abc import Callable, Iterable
from dataclasses import dataclass

from tcplan.material.law import (
    Expression,
    Law,
    Platinum,
    Polynomial,
    SteinhartHart,
    Table,
    Thermistor,
    from_chords,
    from_peak,
    steinhart_hart_from_points,
)
from tcplan.material.model import HOTTEST
from tcplan.names import nearest_name, shown
from tcplan.table_reader import TableReader

MAX_POINTS = 200


@dataclass(frozen=True, slots=True)
class _Form:
    """One way to state a law: the keys that it needs, those that it may have, and how it is made."""

    needed: tuple[str, ...]
    build: Callable[[TableReader, float | None], Law | None]
    optional: tuple[str, ...] = ()


def read_temperature(reader: TableReader, key: str) -> float | None:
    """Return the temperature [K] of a key, or None with its mistake in the reader's list."""
    temperature = reader.quantity(key, "K")
    return temperature if temperature is not None and _is_temperature(reader, key, temperature) else None


def _is_temperature(reader: TableReader, key: str, temperature: float) -> bool:
    if 0.0 < temperature <= HOTTEST:
        return True
    reader.refuse(key, f"{temperature:g} K", f"a temperature above 0 K and up to {HOTTEST:g} K")
    return False


def read_law(reader: TableReader, reference: float | None) -> Law | None:
    """Return the law of a material's table, or None with its mistakes in the reader's list."""
    form = _form(reader)
    if form is None:
        return None
    for key in _LAW_KEYS:
        if reader.has(key) and key not in form.needed + form.optional + ("law",):
            keys = " and ".join(("law", *form.needed) if reader.has("law") else form.needed)
            reader.refuse(key, f"{key} beside {keys}", "the keys of one form of law only", f"Remove {key}.")
    for key in form.needed:
        if not reader.has(key):
            todo = 'Write tc1 = "0 ppm/K" if it is zero.' if key == "tc1" else ""
            reader.refuse(key, "nothing", f"{key}: this form of law needs {', '.join(form.needed)}", todo)
    return reader.guarded(lambda: form.build(reader, reference))


def _form(reader: TableReader) -> _Form | None:
    given = [word for word, keys in _FORM_MARKS.items() if reader.has(*keys)]
    if not given and reader.has("tc2"):
        given = ["tc1"]
    if len(given) != 1:
        found = " and ".join(given) or "no law"
        expected = "exactly one of tc1, cold_tcr with hot_tcr, peak, law"
        reader.refuse("", found, expected, "State the law in one way." if given else "Add one of them.")
        return None
    if given != ["law"]:
        return _FORMS[given[0]]
    text = reader.text("law")
    return None if text is None else _named_form(reader, text.strip())


def _named_form(reader: TableReader, text: str) -> _Form | None:
    if text == "steinhart-hart" and reader.has("points"):
        return _SH_BY_POINTS
    if text in _NAMED:
        return _NAMED[text]
    # A word without any operator is a kind that was misspelt, never a useful formula.
    near = nearest_name(text, _NAMED) if re.fullmatch(r"[A-Za-z][A-Za-z _-]*", text) else None
    if near:
        reader.refuse(
            "law", f"the unknown law {shown(text)}", "a known law or a formula of T", f"Did you mean {near}?"
        )
        return None
    return _EXPRESSION


def _polynomial(reader: TableReader, reference: float | None) -> Law | None:
    units = {"tc1": "1/K", "tc2": "1/K^2", "tc3": "1/K^3"}
    given = {key: reader.quantity(key, unit) for key, unit in units.items() if reader.has(key)}
    coefficients = [given.get(key, 0.0) for key in units]
    if reference is None or not reader.has("tc1") or None in coefficients:
        return None
    count = 3 if "tc3" in given else 2 if "tc2" in given else 1
    return Polynomial(
        reference=reference, coefficients=tuple(c for c in coefficients[:count] if c is not None)
    )


def _chords(reader: TableReader, reference: float | None) -> Law | None:
    cold, hot = read_temperature(reader, "cold"), read_temperature(reader, "hot")
    cold_tcr, hot_tcr = reader.quantity("cold_tcr", "1/K"), reader.quantity("hot_tcr", "1/K")
    if reference is None or cold is None or hot is None or cold_tcr is None or hot_tcr is None:
        return None
    return from_chords(reference, cold, cold_tcr, hot, hot_tcr)


def _peak(reader: TableReader, reference: float | None) -> Law | None:
    peak, tc2 = read_temperature(reader, "peak"), reader.quantity("tc2", "1/K^2")
    return None if reference is None or peak is None or tc2 is None else from_peak(peak, tc2, reference)


def _platinum(reader: TableReader, reference: float | None) -> Law | None:
    return None if reference is None else Platinum(reference=reference)


def _thermistor(reader: TableReader, reference: float | None) -> Law | None:
    beta = reader.quantity("beta", "delta_K")
    return None if reference is None or beta is None else Thermistor(reference=reference, beta=beta)


def _steinhart_hart(reader: TableReader, reference: float | None) -> Law | None:
    a, b, c = (_number(reader, key) for key in "abc")
    if reference is None or a is None or b is None or c is None:
        return None
    return SteinhartHart(reference=reference, a=a, b=b, c=c)


def _steinhart_hart_by_points(reader: TableReader, reference: float | None) -> Law | None:
    points = _points(reader)
    if reference is None or points is None:
        return None
    return steinhart_hart_from_points(points, reference)


def _table(reader: TableReader, reference: float | None) -> Law | None:
    points = _points(reader)
    return None if reference is None or points is None else Table(reference=reference, points=points)


def _expression(reader: TableReader, reference: float | None) -> Law | None:
    inner, text = reader.inner("law_parameters"), reader.text("law")
    names: Iterable[str] = inner.table if inner else ()
    values = {name: _number(inner, name) for name in names} if inner else {}
    if reference is None or text is None or None in values.values():
        return None
    constants = tuple((name, value) for name, value in sorted(values.items()) if value is not None)
    return Expression(reference=reference, text=text, constants=constants)


def _points(reader: TableReader) -> tuple[tuple[float, float], ...] | None:
    rows = reader.list_of("points", ("K", "ohm"), MAX_POINTS)
    if rows is None:
        return None
    good = [_is_temperature(reader, f"points[{n}]", row[0]) for n, row in enumerate(rows, 1)]
    return tuple((temperature, ohms) for temperature, ohms in rows) if all(good) else None


def _number(reader: TableReader, key: str) -> float | None:
    number = reader.table.get(key)
    if isinstance(number, bool) or not isinstance(number, (int, float)):
        return None
    # The shape tells what is not finite; an integer can also be too long for a float.
    return float(number) if abs(number) <= sys.float_info.max else None


_FORM_MARKS = {
    "tc1": ("tc1", "tc3"),
    "cold_tcr": ("cold", "cold_tcr", "hot", "hot_tcr"),
    "peak": ("peak",),
    "law": ("law",),
}
_FORMS = {
    "tc1": _Form(("tc1",), _polynomial, ("tc2", "tc3")),
    "cold_tcr": _Form(("cold", "cold_tcr", "hot", "hot_tcr"), _chords),
    "peak": _Form(("peak", "tc2"), _peak),
}
_NAMED = {
    "platinum": _Form((), _platinum),
    "thermistor": _Form(("beta",), _thermistor),
    "steinhart-hart": _Form(("a", "b", "c"), _steinhart_hart),
    "table": _Form(("points",), _table),
}
_SH_BY_POINTS = _Form(("points",), _steinhart_hart_by_points)
_EXPRESSION = _Form((), _expression, ("law_parameters",))
_LAW_KEYS = (
    *("tc1", "tc2", "tc3", "cold", "cold_tcr", "hot", "hot_tcr", "peak"),
    *("law_parameters", "beta", "a", "b", "c", "points"),
)
