"""A law from plain data: the inverse of `Law.parameters`."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from tcplan.errors import InputError, Problem
from tcplan.material.law_base import Law, from_degC
from tcplan.material.law_expression import Expression
from tcplan.material.law_table import Table
from tcplan.material.laws_physical import Platinum, SteinhartHart, Thermistor
from tcplan.material.polynomial import MAX_COEFFICIENTS, Polynomial, coefficient_names
from tcplan.names import nearest_name, shown

_REFERENCE = "reference_degC"
_KEYS: dict[str, tuple[str, ...]] = {
    "polynomial": (_REFERENCE, "tc1_ppm_per_K"),
    "platinum": (_REFERENCE,),
    "thermistor": (_REFERENCE, "beta_K"),
    "steinhart-hart": (_REFERENCE, "a_per_K", "b_per_K", "c_per_K"),
    "table": (_REFERENCE, "points_degC"),
    "expression": (_REFERENCE, "text"),
}
_OPTIONAL: dict[str, tuple[str, ...]] = {
    "polynomial": coefficient_names(MAX_COEFFICIENTS)[1:],
    "expression": ("law_parameters", "t0_degC"),
}
LAW_KINDS = tuple(_KEYS)


def law_from_parameters(data: Mapping[str, object]) -> Law:
    """Return the law that plain data states; the inverse of `Law.parameters` up to the last digit of floats.

    Parameters
    ----------
    data : mapping
        ``law`` (the kind), ``reference_degC``, and what the kind needs. Polynomial: ``tc1_ppm_per_K``,
        ``tc2_ppm_per_K2``, ... Platinum: nothing. Thermistor: ``beta_K``. Steinhart-Hart: ``a_per_K``,
        ``b_per_K``, ``c_per_K``. Table: ``points_degC``, pairs of temperature [degC] and resistance.
        Expression: ``text``, ``law_parameters`` (name: value), ``t0_degC``.

    Raises
    ------
    InputError
        With every key that is unknown, missing or not of its type; or from the law itself.
    """
    kind = data.get("law")
    if not isinstance(kind, str) or kind not in _KEYS:
        near = nearest_name(kind, LAW_KINDS) if isinstance(kind, str) else None
        todo = f"Did you mean {near}?" if near else ""
        raise InputError(
            Problem(where="law", found=shown(kind), expected=f"one of {', '.join(LAW_KINDS)}", todo=todo)
        )
    problems = [*_unknown(kind, data), *_missing(kind, data), *_wrong_numbers(data)]
    if problems:
        raise InputError(problems)
    return _MAKERS[kind](data)


def _unknown(kind: str, data: Mapping[str, object]) -> list[Problem]:
    known = (*_KEYS[kind], *_OPTIONAL.get(kind, ()))
    problems = []
    for key in data:
        if key != "law" and key not in known:
            near = nearest_name(key, known)
            todo = f"Did you mean {near}?" if near else ""
            expected = f"only {', '.join(known)} for the law {kind}"
            problems.append(Problem(where=shown(key), found="an unknown key", expected=expected, todo=todo))
    return problems


def _missing(kind: str, data: Mapping[str, object]) -> list[Problem]:
    needed = list(_KEYS[kind])
    names = coefficient_names(MAX_COEFFICIENTS)
    # coefficients without a gap: a forgotten one must not count as zero
    last = max((n for n, name in enumerate(names) if name in data), default=0)
    if kind == "polynomial":
        needed += names[1:last]
    return [
        Problem(where=key, found="nothing", expected=f"a value, for the law {kind}")
        for key in needed
        if key not in data
    ]


def _wrong_numbers(data: Mapping[str, object]) -> list[Problem]:
    texts = ("law", "text", "points_degC", "law_parameters")
    numbers = {key: value for key, value in data.items() if key not in texts}
    constants = data.get("law_parameters", {})
    problems = []
    if isinstance(constants, Mapping):
        numbers |= {f"law_parameters.{name}": value for name, value in constants.items()}
    else:
        problems.append(
            Problem(where="law_parameters", found=shown(constants), expected="names with numbers")
        )
    if not isinstance(data.get("text", ""), str):
        problems.append(Problem(where="text", found=shown(data["text"]), expected="a formula, as text"))
    if not _are_pairs(data.get("points_degC", ())):
        problems.append(
            Problem(where="points_degC", found=shown(data["points_degC"]), expected="pairs of numbers")
        )
    return problems + [
        Problem(where=key, found=shown(value), expected="a number")
        for key, value in numbers.items()
        if not _is_number(value)
    ]


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _are_pairs(points: object) -> bool:
    return isinstance(points, list | tuple) and all(
        isinstance(p, list | tuple) and len(p) == 2 and all(_is_number(v) for v in p) for p in points
    )


def _kelvin(data: Mapping[str, Any], key: str = _REFERENCE) -> float:
    return from_degC(float(data[key]))


def _polynomial(data: Mapping[str, Any]) -> Law:
    given = (name for name in coefficient_names(MAX_COEFFICIENTS) if name in data)
    return Polynomial(reference=_kelvin(data), coefficients=tuple(data[name] / 1e6 for name in given))


def _platinum(data: Mapping[str, Any]) -> Law:
    return Platinum(reference=_kelvin(data))


def _thermistor(data: Mapping[str, Any]) -> Law:
    return Thermistor(reference=_kelvin(data), beta=data["beta_K"])


def _steinhart_hart(data: Mapping[str, Any]) -> Law:
    return SteinhartHart(reference=_kelvin(data), a=data["a_per_K"], b=data["b_per_K"], c=data["c_per_K"])


def _table(data: Mapping[str, Any]) -> Law:
    points = tuple((from_degC(t), r) for t, r in data["points_degC"])
    return Table(reference=_kelvin(data), points=points)


def _expression(data: Mapping[str, Any]) -> Law:
    return Expression(
        reference=_kelvin(data),
        text=data["text"],
        constants=tuple(data.get("law_parameters", {}).items()),
        origin=_kelvin(data, "t0_degC") if "t0_degC" in data else None,
    )


_MAKERS: dict[str, Callable[[Mapping[str, Any]], Law]] = {
    "polynomial": _polynomial,
    "platinum": _platinum,
    "thermistor": _thermistor,
    "steinhart-hart": _steinhart_hart,
    "table": _table,
    "expression": _expression,
}
