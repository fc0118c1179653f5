"""What each leaf of a network is made of, as far as its voltage and its heat depend on it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from tcplan.errors import InputError, Problem
from tcplan.material.model import Material
from tcplan.network import Leg, Network, leg_names, legs


@dataclass(frozen=True, slots=True, kw_only=True)
class Element:
    """One leaf of a network.

    Parameters
    ----------
    leg : str
        Id of the leg that it belongs to; leaves of one leg share one temperature when legs heat
        themselves.
    units : int
        How many units in series share the voltage of the leaf.
    strings : int
        How many strings in parallel share its current.
    length : float, optional
        Of one unit [m]; None where it is not known.
    ends : bool
        Whether it is the ends of the units of a film, which have no voltage coefficient of their own.
    """

    leg: str
    units: int = 1
    strings: int = 1
    length: float | None = None
    ends: bool = False

    def __post_init__(self) -> None:
        for what, count in (("units", self.units), ("strings", self.strings)):
            if count < 1:
                raise InputError(
                    Problem(where=f"leg {self.leg}", found=f"{count} {what}", expected="at least 1")
                )
        if self.length is not None and not 0.0 < self.length < float("inf"):
            found = f"a unit {self.length:g} m long"
            raise InputError(Problem(where=f"leg {self.leg}", found=found, expected="a length above zero"))


def plain_elements(
    network: Network, materials: Mapping[str, Material], reference: float
) -> tuple[Element, ...]:
    """Return the elements of an ideal network: every leg one unit, or one in each of its strings.

    Parameters
    ----------
    network : Network
    materials : mapping of name to Material
    reference : float
        Where the values of the legs hold [K].

    Returns
    -------
    tuple of Element
        One a leg, in the order of the network. The length of a film is its squares times its effective
        width; None where the width is not stated.
    """
    found = legs(network)
    return tuple(
        Element(leg=name, strings=leg.strings, length=_length(leg, materials[leg.material], reference))
        for name, leg in zip(leg_names(len(found)), found, strict=True)
    )


def _length(leg: Leg, material: Material, reference: float) -> float | None:
    squares, width = material.squares(leg.ohms * leg.strings, reference), material.effective_width
    return None if squares is None or width is None else squares * width
