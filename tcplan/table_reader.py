"""One table of an input file, read value by value, with the list that its mistakes go to."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from typing import Any, TypeVar

from tcplan.errors import InputError, Problem
from tcplan.toml_input import join
from tcplan.units import parse_quantity

T = TypeVar("T")


@dataclass(frozen=True, slots=True)
class TableReader:
    """A table, its place, and the mistakes found so far.

    A value of the wrong shape (a number where text belongs) is None here: the shape check tells it.
    """

    table: Mapping[str, Any]
    where: str
    problems: list[Problem] = field(default_factory=list)

    def inner(self, key: str) -> TableReader | None:
        """Return the reader of a table inside this one; None when there is none."""
        table = self.table.get(key)
        return TableReader(table, join(self.where, key), self.problems) if isinstance(table, dict) else None

    def rows(self, key: str) -> tuple[TableReader, ...]:
        """Return the readers of a list of tables."""
        tables = self.table.get(key)
        return tuple(
            TableReader(table, join(self.where, f"{key}[{n}]"), self.problems)
            for n, table in enumerate(tables if isinstance(tables, list) else (), 1)
            if isinstance(table, dict)
        )

    def has(self, *keys: str) -> bool:
        """Whether one of the keys is there."""
        return any(key in self.table for key in keys)

    def text(self, key: str) -> str | None:
        """Return text, or None."""
        text = self.table.get(key)
        return text if isinstance(text, str) else None

    def texts(self, key: str) -> tuple[str, ...]:
        """Return the texts of a list."""
        values = self.table.get(key)
        return tuple(v for v in values if isinstance(v, str)) if isinstance(values, list) else ()

    def number(self, key: str) -> float | None:
        """Return a plain number, or None."""
        number = self.table.get(key)
        return float(number) if isinstance(number, (int, float)) and not isinstance(number, bool) else None

    def quantity(self, key: str, unit: str) -> float | None:
        """Return a quantity in SI, or None."""
        return self.parsed(self.table.get(key), unit, key)

    def above_zero(self, key: str, unit: str) -> float | None:
        """Return a quantity in SI that must be above zero, or None."""
        value = self.quantity(key, unit)
        if value is not None and value <= 0:
            self.refuse(key, f"{self.table[key]}", "a value above zero")
            return None
        return value

    def parsed(self, text: object, unit: str, key: str) -> float | None:
        """Return the SI value of a text, or None with its mistake noted at ``key``."""
        if not isinstance(text, str):
            return None
        try:
            return parse_quantity(text, unit, where=join(self.where, key))
        except InputError as error:
            self.problems.extend(error.problems)
            return None

    def tuple_of(self, values: object, units: tuple[str, ...], key: str) -> tuple[float, ...] | None:
        """Return a list of quantities with one unit each, or None when one of them is wrong."""
        if not isinstance(values, list) or len(values) != len(units):
            return None
        read = [self.parsed(text, unit, key) for text, unit in zip(values, units, strict=True)]
        found = tuple(value for value in read if value is not None)
        return found if len(found) == len(units) else None

    def list_of(self, key: str, units: tuple[str, ...], most: int) -> tuple[tuple[float, ...], ...] | None:
        """Return rows of quantities; None when one of them is wrong or there is no list."""
        rows = self.table.get(key)
        if not isinstance(rows, list):
            return None
        read = [self.tuple_of(row, units, f"{key}[{n}]") for n, row in enumerate(rows[:most], 1)]
        found = tuple(row for row in read if row is not None)
        return found if len(found) == len(rows) else None

    def refuse(self, key: str, found: str, expected: str, todo: str = "") -> None:
        """Note a mistake at a key."""
        self.problems.append(Problem(where=join(self.where, key), found=found, expected=expected, todo=todo))

    def guarded(self, build: Callable[[], T]) -> T | None:
        """Return what ``build`` makes, or None with its mistakes put at this table."""
        try:
            return build()
        except InputError as error:
            self.problems.extend(replace(p, where=join(self.where, p.where)) for p in error.problems)
            return None
