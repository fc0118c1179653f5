"""How far a device can be from its nominal law, and what that does to R(T)/R(reference).

A shift (da, db) of TC1 and TC2 is additive at the material's own reference temperature T0, whatever the law::

    device(T) = law(T)/law(T0) + da (T - T0) + db (T - T0)^2

For a polynomial law this moves TC1 and TC2 themselves; for any other law it moves the slope and the
curvature at T0 by the same amounts. The worst case of a network is built from the range of
device(T)/device(reference) over the box of (da, db).

Long, since what a spread is, what it must satisfy and what it does to a law belong together.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import TYPE_CHECKING, Any, Literal, get_args

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.names import shown

if TYPE_CHECKING:
    from tcplan.material.law import Law

Meaning = Literal["limits", "sigma"]
Shape = Literal["normal", "rectangular"]
Shift = tuple[float, float]
"""(da [1/K], db [1/K^2])."""

SIGMAS_PER_LIMIT = 3.0
_KEYS = {
    "value": "value",
    "tc1": "tc1_per_K",
    "tc2": "tc2_per_K2",
    "end_resistance": "end_resistance",
    "end_tc1": "end_tc1_per_K",
    "width_bias": "width_bias_m",
    "tcr": "tcr_per_K",
}
"""Each component, by its key in plan.json."""


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
    end_resistance : float, optional
        Of the end resistance of a film, as a fraction.
    end_tc1 : float, optional
        Of the first temperature coefficient of the ends [1/K].
    width_bias : float, optional
        Of the drawn minus effective width of a film [m].
    tcr : float, optional
        The TCR limit k of a data sheet [1/K]: abs(dR/R) <= k abs(T - T0), on each side of T0 with a sign
        of its own.
    shape : {"normal", "rectangular"}
        How draws take the half-widths: normal with limits of 3 sigma, or anything between the limits
        alike. The worst case does not depend on it.

    Raises
    ------
    InputError
        For a half-width that is negative or not finite, a value or an end that could reach zero, or
        standard deviations of a rectangular shape.
    """

    meaning: Meaning
    value: float | None = None
    tc1: float | None = None
    tc2: float | None = None
    end_resistance: float | None = None
    end_tc1: float | None = None
    width_bias: float | None = None
    tcr: float | None = None
    shape: Shape = "normal"

    def __post_init__(self) -> None:
        problems = [problem for name in _KEYS if (problem := self._component_problem(name))]
        if self.meaning not in get_args(Meaning):
            problems.insert(0, _meaning_problem(self.meaning))
        elif not problems:
            fractions = ("value", "end_resistance")
            problems.extend(_fraction_problem(self, name) for name in fractions if self._reaches_one(name))
        if self.shape not in get_args(Shape) or (self.shape == "rectangular" and self.meaning == "sigma"):
            problems.append(_shape_problem(self))
        if problems:
            raise InputError(problems)

    @property
    def unstated(self) -> tuple[str, ...]:
        """Names of those of value, tc1 and tc2 that are not stated; a TCR limit covers both TCs."""
        names = ("value",) if self.tcr is not None else ("value", "tc1", "tc2")
        return tuple(name for name in names if getattr(self, name) is None)

    @property
    def tc1_and_tcr(self) -> float | None:
        """The half-width of TC1 with the TCR limit [1/K], None when neither is stated.

        At any one temperature a device within a TCR limit is one whose TC1 is off by at most as much.
        """
        return _total(self.tc1, self.tcr)

    def limits(self) -> Spread:
        """Return the spread as limits: limits as they are, standard deviations times 3."""
        if self.meaning == "limits":
            return self
        scaled = {name: _scaled(getattr(self, name), self._scale) for name in _KEYS}
        return Spread(meaning="limits", shape=self.shape, **scaled)

    def widened(self, added: Spread) -> Spread:
        """Return the limits of this spread plus the limits of ``added``, component by component."""
        mine, more = self.limits(), added.limits()
        totals = {name: _total(getattr(mine, name), getattr(more, name)) for name in _KEYS}
        return Spread(meaning="limits", shape=self.shape, **totals)

    def with_width(self, width: float | None) -> Spread:
        """Return the limits with the width error moved into the value.

        A film is wide W -/+ e, so its value is within (1 -/+ D)/(1 +/- e/W); the half-width that covers
        both ends is D' = (1 + D)/(1 - e/W) - 1.

        Parameters
        ----------
        width : float, optional
            The nominal effective width W [m].

        Returns
        -------
        Spread
            This one when there is no width error or no width; else limits whose ``value`` is D' and whose
            ``width_bias`` is 0.

        Raises
        ------
        InputError
            When the width or the value could reach zero.
        """
        if width is None or not self.width_bias:
            return self
        limits = self.limits()
        error = (limits.width_bias or 0.0) / width
        if error >= 1.0 or (1.0 + (limits.value or 0.0)) / (1.0 - error) >= 2.0:
            raise InputError(_width_problem(limits, width))
        value = (1.0 + (limits.value or 0.0)) / (1.0 - error) - 1.0
        return replace(limits, value=value, width_bias=0.0)

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data; the inverse of `spread_from_dict`."""
        half_widths = {key: getattr(self, name) for name, key in _KEYS.items()}
        return {"meaning": self.meaning, **half_widths, "shape": self.shape}

    @property
    def _scale(self) -> float:
        return SIGMAS_PER_LIMIT if self.meaning == "sigma" else 1.0

    def _reaches_one(self, name: str) -> bool:
        return self._scale * (getattr(self, name) or 0.0) >= 1.0

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
    half_widths = {name: data[key] for name, key in _KEYS.items()}
    return Spread(meaning=data["meaning"], shape=data["shape"], **half_widths)


def law_vertices(spread: Spread) -> tuple[Shift, ...]:
    """Return the distinct corners (da, db) of the limits of TC1 and TC2: four, two or one.

    A TCR limit counts as a half-width of TC1.

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
    return tuple((da, db) for da in _both_signs(limits.tc1_and_tcr) for db in _both_signs(limits.tc2))


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
    denominator, so it is monotone along every line through the box and its extremes are at corners. A
    TCR limit, whose sign may differ from side to side, reaches no further: on one side it is a TC1, and
    with T and the reference on two sides the extremes have one sign.

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


@lru_cache(maxsize=4096)
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


def _fraction_problem(spread: Spread, name: str) -> Problem:
    return Problem(
        where=f"spread.{name}",
        found=f"{100.0 * getattr(spread, name):g} % ({spread.meaning})",
        expected="limits below 100 % (a standard deviation counts three times)",
        todo="A value that can reach zero cannot be planned with; check the meaning and the figure.",
    )


def _shape_problem(spread: Spread) -> Problem:
    wrong = spread.shape not in get_args(Shape)
    return Problem(
        where="spread.shape",
        found=shown(str(spread.shape)) if wrong else "rectangular with standard deviations",
        expected='"normal" or "rectangular"' if wrong else "limits: a rectangular spread ends at them",
        todo="" if wrong else 'Write meaning = "limits" with the limits, or shape = "normal".',
    )


def _width_problem(limits: Spread, width: float) -> Problem:
    value = f"a value spread of {100.0 * limits.value:g} % and " if limits.value else ""
    return Problem(
        where="spread.width_bias",
        found=f"{value}a width error of {1e6 * (limits.width_bias or 0.0):g} um (limits) "
        f"in {1e6 * width:g} um of effective width",
        expected="less than 100 % of the value together",
        todo="Draw it wider: preferred_width in [film]; or check the unit of the width error.",
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
