"""Options that state what is common to a whole sweep, for every command that reads one."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any, TypeVar

import click

if TYPE_CHECKING:
    from tcplan.measure.model import CommonErrors

Command = TypeVar("Command", bound=Callable[..., Any])

_OPTIONS = (
    ("chamber_offset", "--chamber-offset", "KELVIN", "Of all temperatures together, such as '0.2 K'."),
    ("chamber_scale", "--chamber-scale", "PART", "Of differences from the reference, such as '0.1 %'."),
    ("lead", "--lead", "OHM", "Of a lead in series with every reading, such as '20 mohm'."),
    ("lead_tc1", "--lead-tc1", "TC", "The known TC1 of that lead, such as '3900 ppm/K'."),
    ("meter_scale", "--meter-scale", "PART", "Of the gain of the meter, such as '15 ppm'."),
)


def common_error_options(command: Command) -> Command:
    """Add the options of the errors common to a sweep; all but the TC1 are standard uncertainties."""
    for name, option, metavar, text in reversed(_OPTIONS):
        command = click.option(option, name, metavar=metavar, help=text)(command)
    return command


def common_errors_of(texts: dict[str, str | None]) -> CommonErrors:
    """Return the errors that the options state; those not given are 0.

    Raises
    ------
    InputError
        With every mistake found.
    """
    from tcplan.errors import InputError, Problem
    from tcplan.measure.model import COMMON_ERROR_UNITS, CommonErrors
    from tcplan.units import parse_quantity

    values: dict[str, float] = {}
    problems: list[Problem] = []
    for name, option, _, _ in _OPTIONS:
        if (text := texts.get(name)) is None:
            continue
        try:
            values[name] = parse_quantity(text, COMMON_ERROR_UNITS[name], where=option)
        except InputError as error:
            problems.extend(error.problems)
            continue
        if name != "lead_tc1" and values[name] < 0.0:
            expected = "a standard uncertainty, zero or more"
            problems.append(Problem(where=option, found=repr(text), expected=expected))
    if problems:
        raise InputError(problems)
    return CommonErrors(**values)
