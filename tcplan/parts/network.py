"""The network that parts make: the ideal one with real values, and the ends of films as members of it.

All units of a film are alike, so in a leg of strings of units the bodies together and the ends together
are two resistors in series, each with its own temperature coefficient.
"""

from __future__ import annotations

from collections.abc import Iterator

from tcplan.made import FilmLeg, Made, MadeLeg, StockLeg
from tcplan.material.law import Polynomial
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Leg, Network, Parallel, Series

ENDS = "_ends"


def ends_name(material: str) -> str:
    """Return the name of the ends of a film among the materials of what is made."""
    return f"{material[: 40 - len(ENDS)]}{ENDS}"


def ends_material(film: Material) -> Material | None:
    """Return the ends of a film as a material of their own, None where no end resistance is stated.

    An end whose coefficient is not stated has that of the body.
    """
    data = film.film
    if data is None or data.end_resistance is None:
        return None
    law = (
        film.law
        if data.end_tc1 is None
        else Polynomial(reference=film.reference, coefficients=(data.end_tc1,))
    )
    return Material(
        name=ends_name(film.name),
        label=f"Ends of {film.label}"[:120],
        source=film.source,
        law=law,
        valid=film.valid,
        kind="plain",
        spread=_ends_spread(film.spread),
        extrapolated=film.extrapolated,
        extrapolation=film.extrapolation,
    )


def _ends_spread(spread: Spread | None) -> Spread | None:
    """Return the spread of the ends: that of their resistance, and of their coefficient."""
    if spread is None:
        return None
    return Spread(
        meaning=spread.meaning,
        value=spread.end_resistance,
        tc1=spread.end_tc1,
        shape=spread.shape,
    )


def made_network(ideal: Network, made: Made) -> Network:
    """Return the network of the parts of an option.

    Parameters
    ----------
    ideal : Network
        Of the option.
    made : Made
        Its legs in the order of the network.
    """
    legs = iter(made.legs)
    return _opened(_made(ideal, legs))


def _made(node: Network, legs: Iterator[MadeLeg]) -> Network:
    if isinstance(node, Leg):
        return _of_leg(next(legs))
    return type(node)(tuple(_made(child, legs) for child in node.children))


def _of_leg(leg: MadeLeg) -> Network:
    if isinstance(leg, FilmLeg) and leg.unit.ends_ohms > 0:
        factor = leg.in_series / leg.in_parallel
        body = Leg(material=leg.material, ohms=leg.unit.body_ohms * factor)
        return Series((body, Leg(material=ends_name(leg.material), ohms=leg.unit.ends_ohms * factor)))
    if isinstance(leg, StockLeg) and len(leg.values) > 1:
        kind = Series if leg.joined == "series" else Parallel
        return kind(tuple(Leg(material=leg.material, ohms=value) for value in leg.values))
    return Leg(material=leg.material, ohms=leg.ohms)


def _opened(network: Network) -> Network:
    """Return the network with nested equal nodes opened; legs stay as they are."""
    if isinstance(network, Leg):
        return network
    children: list[Network] = []
    for child in map(_opened, network.children):
        children.extend(child.children if isinstance(child, type(network)) else (child,))
    return type(network)(tuple(children))
