"""The unit of a film as a function of its width: the resistance of its body per length, and of its ends."""

from __future__ import annotations

import numpy as np

from tcplan.errors import InputError, Problem
from tcplan.material.model import Material
from tcplan.parts.network import ends_material


def per_length(material: Material, width: float, reference: float) -> float:
    """Return the resistance of the body per length [ohm/m] at ``reference`` [K], at a drawn width [m]."""
    bias = 0.0 if material.film is None else material.film.width_bias or 0.0
    squares_per_ohm = material.squares(1.0, reference)
    if squares_per_ohm is None:
        raise InputError(undrawable(material, "no ohm_per_square", "a film"))
    return 1.0 / squares_per_ohm / (width - bias)


def ends_ohms(material: Material, width: float, reference: float) -> float:
    """Return the resistance of both ends [ohm] at ``reference`` [K]; 0 where none is stated.

    From the own reference of the film by the law of the ends.
    """
    film, ends = material.film, ends_material(material)
    if film is None or film.end_resistance is None or ends is None:
        return 0.0
    ratio = float(ends.ratio(np.asarray([reference]), material.reference)[0])
    return 2.0 * film.end_resistance * ratio / width


def undrawable(material: Material, found: str, expected: str) -> Problem:
    """Return that a material can not be drawn, and what it lacks."""
    return Problem(
        where=f"material.{material.name}",
        found=found,
        expected=expected,
        todo="Complete the material, or leave its parts out.",
    )
