"""The header of a sweep: which column holds what, and in which unit."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from tcplan.errors import InputError, Problem, UnitError
from tcplan.names import shown
from tcplan.units import parse_quantity

EXAMPLE = '"T [degC], R [ohm]"'
_QUANTITIES: Mapping[str, str] = {
    "t": "T",
    "temperature": "T",
    "r": "R",
    "resistance": "R",
    "u(t)": "u(T)",
    "u(temperature)": "u(T)",
    "u(r)": "u(R)",
    "u(resistance)": "u(R)",
    "device": "device",
    "lot": "lot",
}
_UNITS: Mapping[str, tuple[tuple[str, ...], str]] = {
    "T": (("K",), "degC or K"),
    "R": (("ohm",), "a unit of resistance: ohm, mohm, kohm, Mohm"),
    "u(T)": (("delta_K",), "K, mK or degC"),
    "u(R)": (("1", "ohm"), "a unit of resistance, or % or ppm of R"),
}  # what each quantity may be in, for the reader of units and in words
_HEAD = re.compile(
    r"(?P<name>u\s*\(\s*\w+\s*\)|[^\[(/]*)\s*"
    r"(?:\[(?P<square>[^\[\]]*)\]|\((?P<round>[^()]*)\)|/(?P<slash>[^/\[\]].*))?\s*",
    re.IGNORECASE | re.DOTALL,
)
_LONGEST_HEAD = 100


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """A column of numbers: SI is number * ``scale`` + ``offset``, times R where ``of_R``."""

    position: int
    head: str
    unit: str
    scale: float
    offset: float = 0.0
    of_R: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Columns:
    """What the header says: columns of numbers by quantity (T and R first), of names by position.

    ``count`` is how many columns have a head, up to the last that has one.
    """

    numbers: Mapping[str, Column]
    device: int | None
    lot: int | None
    count: int
    unused: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class _Head:
    """One cell of the header taken apart; ``quantity`` is None for a column that is not used."""

    position: int
    text: str
    name: str
    unit: str
    quantity: str | None


def has_both(cells: Sequence[str]) -> bool:
    """Whether there is a column of temperature and one of resistance."""
    return {"T", "R"} <= {head.quantity for head in _heads(cells)}


def parse_header(cells: Sequence[str], where: str) -> Columns:
    """Return what each column of a sweep holds.

    Parameters
    ----------
    cells : sequence of str
        The cells of the header, such as ``T [degC]``, ``R (kohm)``, ``T/K``, ``u(R) [%]``, ``device``.
    where : str
        The place of the header, for messages.

    Returns
    -------
    Columns
        With a scale and an offset for each column of numbers.

    Raises
    ------
    InputError
        With every mistake: no column of T or R, two of one kind, no unit, a wrong unit, an expanded
        uncertainty where a standard one belongs.

    References
    ----------
    ISO 80000-1, Quantities and units, for heads such as T/K.
    """
    heads = _heads(cells)
    problems = [*_missing(heads, where), *_repeated(heads, where), *_expanded(heads, where)]
    numbers: dict[str, Column] = {}
    for quantity in _UNITS:
        for head in heads:
            if head.quantity == quantity:
                try:
                    numbers[quantity] = _column(head, where)
                except InputError as error:
                    problems.extend(error.problems)
    if problems:
        raise InputError(problems)
    places = {head.quantity: head.position for head in heads}
    return Columns(
        numbers=numbers,
        device=places.get("device"),
        lot=places.get("lot"),
        count=max(head.position for head in heads if head.text) + 1,
        unused=tuple(_unused(heads)),
    )


def _heads(cells: Sequence[str]) -> list[_Head]:
    return [_head(position, " ".join(cell.split())) for position, cell in enumerate(cells)]


def _head(position: int, text: str) -> _Head:
    match = _HEAD.fullmatch(text) if len(text) <= _LONGEST_HEAD else None
    if match is None:
        return _Head(position=position, text=text, name=text, unit="", quantity=None)
    name = re.sub(r"\s", "", match["name"])
    unit = (match["square"] or match["round"] or match["slash"] or "").strip()
    if match["slash"] and unit.startswith("(") and unit.endswith(")"):
        unit = unit[1:-1].strip()
    return _Head(
        position=position, text=text, name=name, unit=unit, quantity=_QUANTITIES.get(name.casefold())
    )


def _unused(heads: Sequence[_Head]) -> Iterator[str]:
    last = max((head.position for head in heads if head.text), default=0)
    for head in heads[: last + 1]:
        if head.quantity is None:
            yield shown(head.text) if head.text else f"column {head.position + 1}, which has no name"


# ---- mistakes


def _missing(heads: Sequence[_Head], where: str) -> Iterator[Problem]:
    if heads and all(re.fullmatch(r"[+-]?[0-9.,eE+-]+", head.text) for head in heads if head.text):
        yield Problem(
            where=where,
            found="numbers where the header belongs",
            expected=f"the names and units of the columns, such as {EXAMPLE}",
            todo="Write a header as the first line.",
        )
        return
    names = {"T": "temperature", "R": "resistance"}
    for quantity in names:
        if any(head.quantity == quantity for head in heads):
            continue
        found = ", ".join(shown(head.text) for head in heads[:8]) + (", ..." if len(heads) > 8 else "")
        yield Problem(
            where=where,
            found=f"no column of {names[quantity]} among {found}",
            expected=f"a header such as {EXAMPLE}",
            todo="Columns are told by their names, units in brackets; put # before lines that are no data.",
        )


def _repeated(heads: Sequence[_Head], where: str) -> Iterator[Problem]:
    for quantity in dict.fromkeys(_QUANTITIES.values()):
        same = [shown(head.text) for head in heads if head.quantity == quantity]
        if len(same) > 1:
            yield Problem(
                where=where,
                found=f"{len(same)} columns of {quantity}: {', '.join(same[:8])}",
                expected="one",
                todo="Rename those that should not be used.",
            )


def _expanded(heads: Sequence[_Head], where: str) -> Iterator[Problem]:
    for head in heads:
        if head.quantity in ("u(T)", "u(R)") and head.name.startswith("U"):
            yield Problem(
                where=where,
                found=f"{shown(head.text)}, with U, which stands for an expanded uncertainty",
                expected=f"standard uncertainties, called {head.quantity}",
                todo="Divide by the coverage factor, and write a small u.",
            )


# ---- units


def _column(head: _Head, where: str) -> Column:
    """Return a column of numbers; scale and offset come from its unit, once."""
    if not head.unit:
        raise InputError(_unit_problem(head, where, "no unit"))
    kinds, _ = _UNITS[str(head.quantity)]
    for kind in kinds:
        try:
            zero = parse_quantity(f"0 {head.unit}", kind)
            one = parse_quantity(f"1 {head.unit}", kind)
        except UnitError as error:
            last = error
            continue
        # A temperature is in degC or in K, whose steps are equal: 1.0, without the error of a difference.
        scale = 1.0 if kind == "K" else one
        return Column(
            position=head.position,
            head=shown(head.text),
            unit=head.unit,
            scale=scale,
            offset=zero,
            of_R=kind == "1",
        )
    todo = last.problems[0].todo
    hint = todo if todo.startswith("Did you mean") else ""
    raise InputError(_unit_problem(head, where, f"the unit {shown(head.unit)}", hint)) from last


def _unit_problem(head: _Head, where: str, found: str, todo: str = "") -> Problem:
    example = {"T": "T [degC]", "R": "R [ohm]", "u(T)": "u(T) [K]", "u(R)": "u(R) [ohm]"}
    return Problem(
        where=f"{where}, column {shown(head.text)}",
        found=found,
        expected=_UNITS[str(head.quantity)][1],
        todo=todo or f'Write the name and the unit: "{example[str(head.quantity)]}".',
    )
