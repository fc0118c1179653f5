"""Temperature ranges: named grades with their standards, or a low and a high end."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from types import MappingProxyType

from tcplan.errors import InputError, Problem
from tcplan.names import nearest_name, shown
from tcplan.units import format_celsius, format_si, from_celsius, to_celsius

REFERENCE = 298.15
"""The usual reference temperature, 25 degC [K]."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Grade:
    """A named range of ambient temperature and where its figures come from.

    Parameters
    ----------
    name : str
        What a brief calls it.
    low_degC, high_degC : float
        Ends of the ambient range [degC].
    standard : str
        The standard and its grade, or that there is none.
    """

    name: str
    low_degC: float
    high_degC: float
    standard: str


_PRACTICE = "common practice; sources differ"

GRADES: Mapping[str, Grade] = MappingProxyType(
    {
        name: Grade(name=name, low_degC=low, high_degC=high, standard=standard)
        for name, low, high, standard in (
            ("automotive-0", -40.0, 150.0, "AEC-Q100 grade 0"),
            ("automotive-1", -40.0, 125.0, "AEC-Q100 grade 1"),
            ("automotive-2", -40.0, 105.0, "AEC-Q100 grade 2"),
            ("automotive-3", -40.0, 85.0, "AEC-Q100 grade 3"),
            ("passive-0", -50.0, 150.0, "AEC-Q200 grade 0"),
            ("passive-1", -40.0, 125.0, "AEC-Q200 grade 1"),
            ("passive-2", -40.0, 105.0, "AEC-Q200 grade 2"),
            ("passive-3", -40.0, 85.0, "AEC-Q200 grade 3"),
            ("passive-4", 0.0, 70.0, "AEC-Q200 grade 4"),
            ("commercial", 0.0, 70.0, _PRACTICE),
            ("industrial", -40.0, 85.0, _PRACTICE),
            ("military", -55.0, 125.0, _PRACTICE),
        )
    }
)
"""The named grades by name, in the order in which they are listed to a reader."""


@dataclass(frozen=True, slots=True, kw_only=True)
class TemperatureRange:
    """The temperatures that the element goes through, with its reference inside.

    Parameters
    ----------
    name : str
        The name of a grade, or empty.
    low : float
        Lowest temperature of the element [K].
    high : float
        Highest temperature of the element [K]; it includes ``rise``.
    reference : float
        Temperature at which values and drift are stated [K].
    rise : float
        How far the element is above ambient at the high end [K].
    standard : str
        Where the ends come from, or empty.

    Raises
    ------
    InputError
        If the ends are not finite and above zero, are in the wrong order, or leave the reference out.
    """

    name: str = ""
    low: float
    high: float
    reference: float
    rise: float = 0.0
    standard: str = ""

    def __post_init__(self) -> None:
        problems = tuple(_not_temperatures(self)) or tuple(_disorder(self))
        if problems:
            raise InputError(problems)

    @property
    def span(self) -> float:
        """Width of the range [K]."""
        return round(self.high - self.low, 9)

    @property
    def ambient_high(self) -> float:
        """High end of the ambient, without the rise [K]."""
        return round(self.high - self.rise, 9)

    @property
    def low_degC(self) -> float:  # noqa: N802 - a value that is not SI wears its unit
        """Lowest temperature of the element [degC]."""
        return to_celsius(self.low)

    @property
    def high_degC(self) -> float:  # noqa: N802
        """Highest temperature of the element, rise included [degC]."""
        return to_celsius(self.high)

    @property
    def reference_degC(self) -> float:  # noqa: N802
        """Reference temperature [degC]."""
        return to_celsius(self.reference)

    def text(self) -> str:
        """Return the range in words, always with its numbers: grades of one name differ by source.

        Returns
        -------
        str
            Such as ``-40 degC to 125 degC (automotive-1, AEC-Q100 grade 1)``.
        """
        ends = f"{format_celsius(self.low)} to {format_celsius(self.ambient_high)}"
        if self.rise:
            ends = f"ambient {ends}, element {format_si(self.rise, 'K')} above at the high end"
        origin = ", ".join(part for part in (self.name, self.standard) if part)
        return f"{ends} ({origin})" if origin else ends


def temperature_range(
    low: float, high: float, reference: float, rise: float = 0.0, name: str = ""
) -> TemperatureRange:
    """Return the range of an element whose ambient goes from ``low`` to ``high``.

    Parameters
    ----------
    low, high : float
        Ends of the ambient range [K].
    reference : float
        Temperature at which values and drift are stated [K].
    rise : float
        How far the element is above ambient at the high end [K].
    name : str
        A name to print beside the numbers, or empty.

    Returns
    -------
    TemperatureRange
        With its high end at ``high + rise``.

    Raises
    ------
    InputError
        If these are not the ends of a range, or it leaves the reference out.

    Examples
    --------
    >>> temperature_range(248.15, 378.15, 298.15).text()
    '-25 degC to 105 degC'
    """
    # To a nanokelvin, so that 398.15 + 10 prints and compares as 408.15.
    top = round(high + rise, 9)
    return TemperatureRange(name=name, low=low, high=top, reference=reference, rise=rise)


def named_range(name: str, reference: float = REFERENCE, rise: float = 0.0) -> TemperatureRange:
    """Return the range of a named grade.

    Parameters
    ----------
    name : str
        A key of ``GRADES``.
    reference : float
        Temperature at which values and drift are stated [K].
    rise : float
        How far the element is above ambient at the high end [K].

    Returns
    -------
    TemperatureRange
        With its high end at that of the grade plus ``rise``.

    Raises
    ------
    InputError
        If there is no such grade, or its range leaves the reference out.

    References
    ----------
    AEC-Q100 and AEC-Q200, tables of temperature grades.

    Examples
    --------
    >>> over = named_range("automotive-1", rise=10.0)
    >>> over.low_degC, over.high_degC, over.reference_degC
    (-40.0, 135.0, 25.0)
    """
    grade = GRADES.get(name)
    if grade is None:
        raise InputError(_unknown_grade(name))
    return TemperatureRange(
        name=name,
        low=from_celsius(grade.low_degC),
        high=from_celsius(grade.high_degC + rise),
        reference=reference,
        rise=rise,
        standard=grade.standard,
    )


def _not_temperatures(ends: TemperatureRange) -> Iterator[Problem]:
    for where, value in (("low", ends.low), ("high", ends.high), ("reference", ends.reference)):
        if not (math.isfinite(value) and value > 0):
            yield Problem(
                where=where,
                found=f"{value} K",
                expected="a finite temperature above absolute zero",
                todo='Write it as in "-40 degC".',
            )
    if not (math.isfinite(ends.rise) and ends.rise >= 0):
        yield Problem(
            where="rise",
            found=f"{ends.rise} K",
            expected="a finite rise, zero or more",
            todo='Write it as in "10 K".',
        )


def _disorder(ends: TemperatureRange) -> Iterator[Problem]:
    low, top = format_celsius(ends.low), format_celsius(ends.high)
    if not (ends.low < ends.high and ends.low <= ends.ambient_high):
        yield Problem(
            where="low, high",
            found=f"{low} to {format_celsius(ends.ambient_high)}",
            expected="a low end below the high end",
            todo="Exchange or correct the two ends.",
        )
    elif not ends.low <= ends.reference <= ends.high:
        yield Problem(
            where="reference",
            found=format_celsius(ends.reference),
            expected=f"a temperature inside the range, {low} to {top}",
            todo="Widen the range or choose a reference inside it.",
        )


def _unknown_grade(name: str) -> Problem:
    near = nearest_name(name, GRADES)
    return Problem(
        where="range",
        found=shown(name),
        expected=f"one of {', '.join(GRADES)}",
        todo=f"Did you mean {near}?" if near else 'Choose one of these, or give "low" and "high".',
    )
