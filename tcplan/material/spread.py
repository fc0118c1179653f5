"""How far a device can be from its nominal law, and what that does to R(T)/R(reference).

A shift (da, db) of TC1 and TC2 is additive at the material's own reference temperature T0, whatever the law::

    device(T) = law(T)/law(T0) + da (T - T0) + db (T - T0)^2

For a polynomial law this moves TC1 and TC2 themselves; for any other law it moves the slope and the
curvature at T0 by the same amounts. The worst case of a network is built from the range of
device(T)/device(reference) over the box of (da, db).
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal, get_args

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.names import shown

if TYPE_CHECKING:
    from tcplan.material.law import Law

Meaning = Literal["limits", "sigma"]
Shift = tuple[float, float]
"""(da [1/K], db [1/K^2])."""

SIGMAS_PER_LIMIT = 3.0
_COMPONENTS = ("value", "tc1", "tc2")


@dataclass(frozen=True, slots=True, kw_only=True)
class Spread:
    """Half-widths of one material; a component that is ``None`` is not stated, counts as 0 and is reported.

    Parameters
    ----------
    meaning : {"limits", "sigma"}
        Whether the half-widths are limits or standard deviations.
    value : float, optional
        Of the value factor, as a fraction: ohm per square (film), ohm per metre (wire), value (part).
    tc1 : float, optional
        Of the first temperature coefficient [1/K], at the material's own reference.
    tc2 : float, optional
        Of the second temperature coefficient [1/K^2], at the material's own reference.

    Raises
    ------
    InputError
        For a half-width that is negative or not finite, or a value that could reach zero.
    """

    meaning: Meaning
    value: float | None = None
    tc1: float | None = None
    tc2: float | None = None

    def __post_init__(self) -> None:
        problems = [problem for name in _COMPONENTS if (problem := self._component_problem(name))]
        if self.meaning not in get_args(Meaning):
            problems.insert(0, _meaning_problem(self.meaning))
        elif not problems and self._scale * (self.value or 0.0) >= 1.0:
            problems.append(_value_problem(self))
        if problems:
            raise InputError(problems)

    @property
    def unstated(self) -> tuple[str, ...]:
        """Names of the components that are not stated."""
        return tuple(name for name in _COMPONENTS if getattr(self, name) is None)

    def limits(self) -> Spread:
        """Return the spread as limits: limits as they are, standard deviations times 3."""
        if self.meaning == "limits":
            return self
        return Spread(
            meaning="limits",
            value=_scaled(self.value, self._scale),
            tc1=_scaled(self.tc1, self._scale),
            tc2=_scaled(self.tc2, self._scale),
        )

    def widened(self, added: Spread) -> Spread:
        """Return the limits of this spread plus the limits of ``added``, component by component."""
        mine, more = self.limits(), added.limits()
        return Spread(
            meaning="limits",
            value=_total(mine.value, more.value),
            tc1=_total(mine.tc1, more.tc1),
            tc2=_total(mine.tc2, more.tc2),
        )

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data; the inverse of `spread_from_dict`."""
        return {"meaning": self.meaning, "value": self.value, "tc1_per_K": self.tc1, "tc2_per_K2": self.tc2}

    @property
    def _scale(self) -> float:
        return SIGMAS_PER_LIMIT if self.meaning == "sigma" else 1.0

    def _component_problem(self, name: str) -> Problem | None:
        half_width = getattr(self, name)
        if half_width is None or (math.isfinite(half_width) and half_width >= 0.0):
            return None
        return Problem(
            where=f"spread.{name}",
            found=f"{half_width:g}",
            expected="a finite half-width, zero or more",
            todo="Give the distance from nominal to one side, without a sign.",
        )


def spread_from_dict(data: Mapping[str, Any]) -> Spread:
    """Return the spread that ``Spread.to_dict`` wrote."""
    return Spread(meaning=data["meaning"], value=data["value"], tc1=data["tc1_per_K"], tc2=data["tc2_per_K2"])


def law_vertices(spread: Spread) -> tuple[Shift, ...]:
    """Return the distinct corners (da, db) of the limits of TC1 and TC2: four, two or one.

    Parameters
    ----------
    spread : Spread
        Of either meaning; taken as limits.

    Returns
    -------
    tuple of (float, float)
        (da [1/K], db [1/K^2]).
    """
    limits = spread.limits()
    return tuple((da, db) for da in _both_signs(limits.tc1) for db in _both_signs(limits.tc2))


def shifted_ratio(law: Law, spread_point: Shift, reference: float, T: FloatArray) -> FloatArray:
    """Return R(T)/R(reference) of a device whose TC1 and TC2 are shifted by (da, db).

    device(T)/device(reference), with device(T) = law(T)/law(T0) + da (T - T0) + db (T - T0)^2.

    Parameters
    ----------
    law : Law
        With its own reference T0.
    spread_point : (float, float)
        (da [1/K], db [1/K^2]).
    reference : float
        Of the brief [K].
    T : array
        Temperatures [K], any shape.

    Returns
    -------
    array
        Of the shape of ``T``.

    Raises
    ------
    InputError
        When the shifted law reaches zero or below at one of the temperatures.
    """
    temperatures = np.asarray(T, dtype=np.float64)
    at_reference = _device(law, spread_point, np.asarray([reference], dtype=np.float64))
    ratio: FloatArray = _device(law, spread_point, temperatures) / at_reference[0]
    return ratio


def law_bounds(
    law: Law, spread: Spread, reference: float, temperature: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return the range of R(T)/R(reference) over the limits of TC1 and TC2, exactly.

    At each T the ratio is a quotient of two functions that are linear in (da, db) with a positive
    denominator, so it is monotone along every line through the box and its extremes are at corners.

    Parameters
    ----------
    law : Law
        With its own reference.
    spread : Spread
        Of either meaning; taken as limits.
    reference : float
        Of the brief [K].
    temperature : array
        Temperatures [K], any shape.

    Returns
    -------
    lo, hi : array
        Of the shape of ``temperature``.

    Raises
    ------
    InputError
        When the law reaches zero or below somewhere in the box.
    """
    curves = np.stack([shifted_ratio(law, shift, reference, temperature) for shift in law_vertices(spread)])
    return np.min(curves, axis=0), np.max(curves, axis=0)


def value_half_width(law: Law, spread: Spread, reference: float) -> float:
    """Return the half-width D of the value at the brief's reference, as a fraction.

    D = (1 + value) max |device(reference)/law(reference)| - 1 over the corners of TC1 and TC2. It is
    ``value`` itself when the material has the brief's reference, and on the safe side otherwise.

    Parameters
    ----------
    law : Law
        With its own reference.
    spread : Spread
        Of either meaning; taken as limits.
    reference : float
        Of the brief [K].

    Returns
    -------
    float
        D, at least ``value`` and below 1.

    Raises
    ------
    InputError
        When the value could reach zero at the brief's reference.
    """
    value = spread.limits().value or 0.0
    if reference == law.reference:
        return value
    at = np.asarray([reference], dtype=np.float64)
    nominal = _device(law, (0.0, 0.0), at)[0]
    factor = max(abs(_device(law, shift, at)[0] / nominal) for shift in law_vertices(spread))
    half_width = float((1.0 + value) * factor - 1.0)
    if half_width >= 1.0:
        raise InputError(_reference_problem(half_width))
    return half_width


def _device(law: Law, shift: Shift, temperature: FloatArray) -> FloatArray:
    x = temperature - law.reference
    nominal = np.asarray(law.ratio(temperature), dtype=np.float64) / float(law.ratio(law.reference))
    device: FloatArray = nominal + shift[0] * x + shift[1] * x**2
    if not np.all(device > 0.0):
        raise InputError(_zero_problem(shift))
    return device


def _both_signs(half_width: float | None) -> tuple[float, ...]:
    return (-half_width, half_width) if half_width else (0.0,)


def _scaled(half_width: float | None, factor: float) -> float | None:
    return None if half_width is None else factor * half_width


def _total(first: float | None, second: float | None) -> float | None:
    return None if first is None and second is None else (first or 0.0) + (second or 0.0)


def _meaning_problem(meaning: object) -> Problem:
    return Problem(
        where="spread.meaning",
        found=shown(str(meaning)),
        expected='"limits" or "sigma"',
        todo="State what the half-widths mean; nothing is assumed.",
    )


def _value_problem(spread: Spread) -> Problem:
    return Problem(
        where="spread.value",
        found=f"{100.0 * (spread.value or 0.0):g} % ({spread.meaning})",
        expected="limits below 100 % (a standard deviation counts three times)",
        todo="A value that can reach zero cannot be planned with; check the meaning and the figure.",
    )


def _zero_problem(shift: Shift) -> Problem:
    return Problem(
        where="spread",
        found=f"a law that reaches zero or below with TC1 off by {1e6 * shift[0]:g} ppm/K "
        f"and TC2 by {1e6 * shift[1]:g} ppm/K^2",
        expected="a resistance above zero over the whole range and spread",
        todo="Narrow the temperature range or the spread of TC1 and TC2.",
    )


def _reference_problem(half_width: float) -> Problem:
    return Problem(
        where="spread",
        found=f"a value that is uncertain by {100.0 * half_width:.3g} % at the brief's reference temperature",
        expected="less than 100 %",
        todo="Use a reference nearer to the material's own, or narrower spreads.",
    )
