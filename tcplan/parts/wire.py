"""Wire: the length of every leg, cut to a step, the cutting list, and what a cut may be off."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Sequence
from decimal import Decimal

from tcplan.errors import InputError, Problem
from tcplan.made import Refusal, WireLeg
from tcplan.material.model import Material
from tcplan.units import format_ohms, format_si

STEP = 1e-3  # m
_EXACT = 1e-9  # relative: arithmetic only


def wire_refusals(
    material: Material,
    legs: Sequence[tuple[str, float]],
    reference: float,
    *,
    step: float = STEP,
    min_length: float = 0.0,
) -> tuple[Refusal, ...]:
    """Return the legs that are too short to cut, each with the shortest length and its value.

    The parameters are those of `wire_legs`.
    """
    per_metre = _ohm_per_metre(material, reference)
    _check_cut(step, min_length)
    least = _metres(_least_steps(step, min_length), step)
    nearest = f"{format_si(least, 'm')}, {format_ohms(least * per_metre)}"
    return tuple(
        Refusal(leg=name, rule="length of wire", found=_found(material, ohms, per_metre), nearest=nearest)
        for name, ohms in legs
        if _too_short(ohms / per_metre, step, min_length)
    )


def wire_legs(
    material: Material,
    legs: Sequence[tuple[str, float]],
    reference: float,
    *,
    step: float = STEP,
    min_length: float = 0.0,
) -> tuple[WireLeg, ...]:
    """Return the legs of one wire, each cut to the nearest step: length = ohms / ohm_per_metre.

    Parameters
    ----------
    material : Material
        With ``ohm_per_metre``, which counts at the material's own reference.
    legs : sequence of (id, ohms)
        Values [ohm] at ``reference``.
    reference : float
        Of the plan [K].
    step : float
        To which lengths are cut [m].
    min_length : float
        The shortest length that can be wound [m]; a length above it is not rounded below it.

    Returns
    -------
    tuple of WireLeg
        In the order of ``legs``.

    Raises
    ------
    InputError
        When the material is no wire, a leg is too short, or a size is not one.
    """
    refused = wire_refusals(material, legs, reference, step=step, min_length=min_length)
    if refused:
        raise InputError(map(_uncut, refused))
    per_metre, least = _ohm_per_metre(material, reference), _least_steps(step, min_length)
    return tuple(
        WireLeg(
            id=name,
            material=material.name,
            wanted_ohms=ohms,
            length=_metres(max(least, round(ohms / per_metre / step)), step),
            ohm_per_metre=per_metre,
        )
        for name, ohms in legs
    )


def cutting_list(legs: Sequence[WireLeg]) -> tuple[tuple[str, float, int], ...]:
    """Return (material, length [m], count): by material, the longest first."""
    counted = Counter((leg.material, leg.length) for leg in legs)
    rows = ((material, length, count) for (material, length), count in counted.items())
    return tuple(sorted(rows, key=lambda row: (row[0], -row[1])))


def relative_error_of(legs: Sequence[WireLeg], length_tolerance: float) -> tuple[float, ...]:
    """Return what a tolerance of every cut [m] adds to the value half-width of each leg, a fraction.

    It is length_tolerance / length. Each cut is its own: unlike the tolerance of the wire, it is not
    common to the legs.

    Raises
    ------
    InputError
        When the tolerance is negative, or not below the length of a leg.
    """
    if not 0.0 <= length_tolerance < min((leg.length for leg in legs), default=math.inf):
        raise InputError(
            Problem(
                where="length tolerance",
                found=f"{length_tolerance:g} m",
                expected="a length that is not negative, and below that of every leg",
            )
        )
    return tuple(length_tolerance / leg.length for leg in legs)


def _ohm_per_metre(material: Material, reference: float) -> float:
    """Return the ohm per metre at the reference of the plan."""
    length = material.length(1.0, reference)
    if length is None:
        raise InputError(
            Problem(
                where=f"material.{material.name}",
                found=f"a {material.kind}",
                expected="a wire",
                todo="Give the material ohm_per_metre.",
            )
        )
    return 1.0 / length


def _check_cut(step: float, min_length: float) -> None:
    wrong = []
    if not 0.0 < step < math.inf:
        wrong.append(Problem(where="step of length", found=f"{step:g} m", expected="a length above zero"))
    if not 0.0 <= min_length < math.inf:
        wrong.append(
            Problem(where="min_length", found=f"{min_length:g} m", expected="a length, not negative")
        )
    if wrong:
        raise InputError(wrong)


def _least_steps(step: float, min_length: float) -> int:
    """Return the shortest length in steps."""
    return max(1, math.ceil(min_length / step * (1 - _EXACT)))


def _too_short(length: float, step: float, min_length: float) -> bool:
    return length < min_length * (1 - _EXACT) or round(length / step) < 1


def _metres(steps: int, step: float) -> float:
    """Return a number of steps [m], as the float of its decimal text: 0.003, not 3 * 0.001."""
    return float(steps * Decimal(repr(step)))


def _found(material: Material, ohms: float, per_metre: float) -> str:
    return f"{format_si(ohms / per_metre, 'm')} of {material.name} ({format_ohms(ohms)})"


def _uncut(refusal: Refusal) -> Problem:
    return Problem(
        where=f"leg {refusal.leg}",
        found=refusal.found,
        expected="a length that can be cut and wound",
        todo=f"The nearest is {refusal.nearest}: take a thinner wire, or a larger share.",
    )
