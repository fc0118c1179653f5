"""Preferred values: the E series of IEC 60063 and the neighbours of a value in them."""

from __future__ import annotations

import math
from bisect import bisect_left, bisect_right
from functools import cache

from tcplan.errors import InputError, Problem
from tcplan.names import nearest_name, shown

SERIES = ("E3", "E6", "E12", "E24", "E48", "E96", "E192")

# Where the standard keeps older values instead of the rounded geometric ones (IEC 60063).
_E24_EXCEPTIONS = {10: 27, 11: 30, 12: 33, 13: 36, 14: 39, 15: 43, 16: 47, 22: 82}
_E192_EXCEPTIONS = {185: 920}

_SAME = 1e-9  # relative: values closer than this differ by arithmetic only
_SMALLEST, _LARGEST = 1e-12, 1e18  # ohm; beyond these the input is a mistake


@cache
def preferred_values(series: str) -> tuple[int, ...]:
    """Return the significands of one decade of an E series.

    Parameters
    ----------
    series : str
        One of ``SERIES``.

    Returns
    -------
    tuple of int
        Rising; two digits (10 to 99) for E24 and coarser, three (100 to 999) for E48 and finer.

    Raises
    ------
    InputError
        If there is no such series.

    References
    ----------
    IEC 60063, Preferred number series for resistors and capacitors.
    """
    if series not in SERIES:
        raise InputError(_unknown_series(series))
    count = int(series[1:])
    if count <= 24:
        return _e24()[:: 24 // count]
    return _e192()[:: 192 // count]


def nearest_preferred(value: float, series: str) -> tuple[float, float]:
    """Return the two neighbours of a value in an E series; they are equal when it is a member.

    Parameters
    ----------
    value : float
        A resistance [ohm], above zero.
    series : str
        One of ``SERIES``.

    Returns
    -------
    below, above : float
        The largest member not above the value, and the smallest not below it [ohm].

    Raises
    ------
    InputError
        If there is no such series, or the value is not a resistance that a part can have.

    Examples
    --------
    >>> nearest_preferred(4800.0, "E24")
    (4700.0, 5100.0)
    """
    significands = preferred_values(series)
    if not _SMALLEST <= value <= _LARGEST:
        raise InputError(_not_a_part(value))
    lowest = significands[0]
    exponent = math.floor(math.log10(value)) - int(math.log10(lowest))
    scaled = value / 10.0**exponent
    ladder = (*significands, 10 * lowest)
    below = ladder[bisect_right(ladder, scaled * (1 + _SAME)) - 1]
    above = ladder[bisect_left(ladder, scaled * (1 - _SAME))]
    # Through text, so that 4.7 kohm is the float 4700.0 and 0.47 ohm is 0.47, to the last bit.
    return float(f"{below}e{exponent}"), float(f"{above}e{exponent}")


def _e24() -> tuple[int, ...]:
    return tuple(_E24_EXCEPTIONS.get(i, round(10 ** (1 + i / 24))) for i in range(24))


def _e192() -> tuple[int, ...]:
    return tuple(_E192_EXCEPTIONS.get(i, round(10 ** (2 + i / 192))) for i in range(192))


def _unknown_series(series: str) -> Problem:
    near = nearest_name(series, SERIES)
    return Problem(
        where="series",
        found=shown(series),
        expected=f"one of {', '.join(SERIES)}",
        todo=f"Did you mean {near}?" if near else "Choose one of these.",
    )


def _not_a_part(value: float) -> Problem:
    return Problem(
        where="value",
        found=f"{shown(value)} ohm",
        expected=f"a resistance from {_SMALLEST:g} to {_LARGEST:g} ohm",
        todo="Check the value and its unit.",
    )
