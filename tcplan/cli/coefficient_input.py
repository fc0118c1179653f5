"""What the options of ``tcplan coefficients`` say: one form of coefficients, in SI, mistakes all told."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

from tcplan.errors import InputError, Problem
from tcplan.names import shown

if TYPE_CHECKING:
    from tcplan.material.coefficient_forms import Quadratic, Uncertain

T = TypeVar("T")

CHORDS = ("cold", "cold_tcr", "hot", "hot_tcr")
FORMS = "one of --tc1 (with --tc2), --cold-tcr, --peak, --box-tcr, and --point or --table"
UNITS = {"tc1": "1/K", "tc2": "1/K^2", "cold_tcr": "1/K", "hot_tcr": "1/K", "peak": "K", "box_tcr": "1/K"}
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?", re.ASCII)
_SEPARATOR = re.compile(r"[:,;\t]")


@dataclass(frozen=True, slots=True, kw_only=True)
class Asked:
    """The options as read: ``numbers`` and ``temperatures`` by name, in SI; points of a table."""

    numbers: dict[str, Uncertain]
    temperatures: dict[str, float]
    points: tuple[tuple[float, Uncertain], ...]
    at: tuple[float, ...]
    correlation: float | None

    def plain(self, name: str) -> tuple[float, float | None]:
        """Return a number and its uncertainty."""
        return self.numbers[name].value, self.numbers[name].uncertainty


@dataclass(slots=True)
class _Reader:
    """Reads texts and notes every mistake."""

    problems: list[Problem] = field(default_factory=list)

    def guarded(self, build: Callable[..., T], *arguments: Any, **named: Any) -> T | None:
        try:
            return build(*arguments, **named)
        except InputError as error:
            self.problems.extend(error.problems)
            return None


def asked(
    texts: dict[str, str],
    points: tuple[str, ...],
    table: str | None,
    at: tuple[str, ...],
    correlation: float | None,
) -> Asked:
    """Return the options in SI; every mistake is told at once.

    Parameters
    ----------
    texts : dict of str to str
        The options with one text each that were given, by name.
    points : tuple of str
        "temperature : resistance" of each ``--point``.
    table : str, optional
        A file with such a pair on each line.
    at : tuple of str
        Temperatures of ``--at``.
    correlation : float, optional
    """
    from tcplan.units import parse_quantity

    reader = _Reader()
    numbers: dict[str, Uncertain] = {}
    temperatures: dict[str, float] = {}
    ratios: list[float] = []
    for name, text in texts.items():
        where = option(name)
        if name in UNITS:
            if (number := reader.guarded(uncertain, text, UNITS[name], where)) is not None:
                numbers[name] = number
        elif (value := reader.guarded(parse_quantity, text, "K", where=where)) is not None:
            temperatures[name] = value
    for text in at:
        if (value := reader.guarded(parse_quantity, text, "K", where="--at")) is not None:
            ratios.append(value)
    found = _points(reader, points, table)
    reader.problems.extend(_mixed_up({*texts, *(["point"] if points or table else [])}))
    if not reader.problems:
        reader.problems.extend(_correlation_problems(numbers, correlation))
    if reader.problems:
        raise InputError(reader.problems)
    return Asked(
        numbers=numbers, temperatures=temperatures, points=found, at=tuple(ratios), correlation=correlation
    )


def option(name: str) -> str:
    """Return the option of a name: --cold-tcr of cold_tcr."""
    return f"--{name.replace('_', '-')}"


# --- texts --------------------------------------------------------------------------------------------


def uncertain(text: str, unit: str, where: str) -> Uncertain:
    """Read a quantity with or without its standard uncertainty: "-120 +- 5 ppm/K".

    Also "(-120 +- 5) ppm/K", "-120 ppm/K +- 5 ppm/K", "-120 ppm/K +- 4 %" of the value; "+/-" and the sign of
    one character mean the same.

    Raises
    ------
    InputError
        When it is not one number, or two with one sign between them.
    """
    from tcplan.material.coefficient_forms import Uncertain
    from tcplan.units import parse_quantity

    halves = text.replace("\u00b1", "+-").replace("+/-", "+-").split("+-")
    if len(halves) == 1:
        return Uncertain(value=parse_quantity(text, unit, where=where))
    if len(halves) != 2:
        found, expected = shown(text), 'one number and its uncertainty, such as "-120 +- 5 ppm/K"'
        raise InputError(Problem(where=where, found=found, expected=expected))
    first, second = _both_with_units(*halves)
    value = parse_quantity(first, unit, where=where)
    size = _size(second, unit, value, where)
    if size < 0.0:
        found, expected = f"{shown(second)} after +-", "an uncertainty that is not below 0"
        raise InputError(Problem(where=where, found=found, expected=expected))
    return Uncertain(value=value, uncertainty=size)


def _both_with_units(first: str, second: str) -> tuple[str, str]:
    """Return value and uncertainty as texts of their own, where the unit stands once for both."""
    first, second = first.strip(), second.strip()
    if first.startswith("(") and ")" in second:
        inside, _, unit = second.partition(")")
        return f"{first[1:]} {unit}", f"{inside} {unit}"
    number = _NUMBER.match(second)
    if _NUMBER.fullmatch(first) and number is not None:
        return f"{first} {second[number.end() :]}", second
    return first, second


def _size(text: str, unit: str, value: float, where: str) -> float:
    from tcplan.units import parse_quantity

    if unit != "K" and re.search(r"[0-9.]\s*(%|ppm|percent)$", text):
        return parse_quantity(text, "1", where=where) * abs(value)
    return parse_quantity(text, "delta_K" if unit == "K" else unit, where=where)


def _points(
    reader: _Reader, points: tuple[str, ...], table: str | None
) -> tuple[tuple[float, Uncertain], ...]:
    named = [(f"--point {n}", text) for n, text in enumerate(points, 1)]
    if table is not None:
        named.extend(reader.guarded(_rows, table) or ())
    read = [reader.guarded(_pair, text, where) for where, text in named]
    return tuple(pair for pair in read if pair is not None)


def _rows(table: str) -> list[tuple[str, str]]:
    """Return the lines of a table that hold something, each with its place."""
    from tcplan.toml_input import file_text

    lines = re.split(r"\r\n|\r|\n", file_text(Path(table)))
    plain = ((n, line.partition("#")[0].strip()) for n, line in enumerate(lines, 1))
    return [(f"{table}: line {n}", line) for n, line in plain if line]


def _pair(text: str, where: str) -> tuple[float, Uncertain]:
    from tcplan.units import parse_quantity

    parts = _SEPARATOR.split(text, maxsplit=1)
    if len(parts) != 2:
        found, expected = shown(text), 'a temperature and a resistance, such as "25 degC : 100 ohm"'
        raise InputError(Problem(where=where, found=found, expected=expected))
    return parse_quantity(parts[0], "K", where=where), uncertain(parts[1], "ohm", where)


# --- the options as a set -----------------------------------------------------------------------------


def _mixed_up(given: set[str]) -> list[Problem]:
    """Return what is wrong with the options as a set: one form, whole, and nothing of another."""
    keys = [key for key in ("tc1", "cold_tcr", "hot_tcr", "peak", "box_tcr", "point") if key in given]
    forms = {"hot_tcr": "cold_tcr"}
    if len({forms.get(key, key) for key in keys}) > 1:
        found = f"{' and '.join(option(key) for key in keys)} together"
        return [Problem(where="command line", found=found, expected=FORMS)]
    if not keys:
        return [Problem(where="command line", found="no --tc1", expected=FORMS)]
    form = forms.get(keys[0], keys[0])
    if "tc2" in given and form not in ("tc1", "peak"):
        found = f"{' and '.join(option(key) for key in (*keys, 'tc2'))} together"
        return [Problem(where="command line", found=found, expected="--tc2 with --tc1 or --peak")]
    if form == "box_tcr" and "to" in given:
        found, todo = "--to with --box-tcr", "Give the reference of the box TCR as --reference."
        return [Problem(where="command line", found=found, expected="no --to", todo=todo)]
    needs = {"cold_tcr": CHORDS, "peak": ("tc2",), "box_tcr": ("cold", "hot")}.get(form, ())
    missing = [option(name) for name in needs if name not in given]
    if missing:
        found, expected = f"no {', '.join(missing)}", " and ".join(option(n) for n in (form, *needs))
        return [Problem(where="command line", found=found, expected=expected)]
    return []


def _correlation_problems(numbers: dict[str, Uncertain], correlation: float | None) -> list[Problem]:
    if correlation is None:
        return []
    if not -1.0 <= correlation <= 1.0:
        found = f"{correlation:g}"
        return [Problem(where="--correlation", found=found, expected="a number from -1 to 1")]
    if sum(number.uncertainty is not None for number in numbers.values()) != 2:
        found, expected = "a correlation", "two coefficients with their uncertainties to correlate"
        return [Problem(where="--correlation", found=found, expected=expected)]
    return []


# --- the form -----------------------------------------------------------------------------------------


def form_of(given: Asked) -> Quadratic:
    """Return the law that the options state, about the reference; not for a box TCR or points."""
    from tcplan.material import coefficient_forms as forms

    reference, values = given.temperatures["reference"], given.numbers
    correlation = given.correlation or 0.0
    if "peak" in values:
        (at, u_at), (tc2, u_tc2) = given.plain("peak"), given.plain("tc2")
        top = forms.Peak(at=at, tc2=tc2, covariance=forms.pair_covariance(u_at, u_tc2, correlation))
        return forms.from_peak(top, reference)
    if "cold_tcr" in values:
        (cold, u_cold), (hot, u_hot) = given.plain("cold_tcr"), given.plain("hot_tcr")
        covariance = forms.pair_covariance(u_cold, u_hot, correlation)
        ends = given.temperatures
        return forms.from_chords(reference, ends["cold"], cold, ends["hot"], hot, covariance)
    tc1, u_tc1 = given.plain("tc1")
    tc2, u_tc2 = given.plain("tc2") if "tc2" in values else (0.0, None)
    covariance = forms.pair_covariance(u_tc1, u_tc2, correlation)
    return forms.Quadratic(reference=reference, tc1=tc1, tc2=tc2, covariance=covariance)
