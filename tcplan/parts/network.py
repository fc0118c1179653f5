"""The network that parts make: the ideal one with real values, and the ends of films as members of it.

All units of a film are alike, so in a leg of strings of units the bodies together and the ends together
are two resistors in series, each with its own temperature coefficient. Every bought part has its own
tolerance and its own TCR: it is a material of its own, and so is a given member beside units or cuts of
its material. The cuts of one wire are of one spool, off together, the shortest cut the most.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

from tcplan.brief.model import Operating
from tcplan.errors import InputError, Problem
from tcplan.made import FilmLeg, MadeLeg, PlainLeg, StockLeg, WireLeg
from tcplan.material.law import Polynomial
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Leg, Network, Parallel, Series
from tcplan.operating import Element
from tcplan.process import Corner, Correlation, Parameter, Process

ENDS = "_ends"
_LONGEST = 40


@dataclass(frozen=True, slots=True, kw_only=True)
class Assembly:
    """The network of the parts of an option, and what stands for each leaf of it.

    ``elements`` follow the leaves: how many units share the voltage and the current of each. ``origin``
    says for each material of the network which one of the plan it is made of.
    """

    network: Network
    elements: tuple[Element, ...]
    materials: tuple[Material, ...]
    origin: tuple[tuple[str, str], ...]

    @property
    def by_name(self) -> dict[str, Material]:
        """The materials by name."""
        return {material.name: material for material in self.materials}


def ends_name(material: str) -> str:
    """Return the name of the ends of a film among the materials of what is made."""
    return _suffixed(material, ENDS)


def _suffixed(material: str, suffix: str) -> str:
    return f"{material[: _LONGEST - len(suffix)]}{suffix}"


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


# --- the network ----------------------------------------------------------------------------------------


def assembled(
    ideal: Network, legs: Iterable[MadeLeg], materials: Mapping[str, Material], *, cut_error: float = 0.0
) -> Assembly:
    """Return the network of the parts of an option, with its materials.

    Parameters
    ----------
    ideal : Network
        Of the option.
    legs : iterable of MadeLeg
        In the order of the network.
    materials : mapping of name to Material
        Those of the plan.
    cut_error : float
        By how much a length of wire may be off [m].

    Raises
    ------
    InputError
        When the name of a part is that of another material.
    """
    own = tuple(legs)
    leaves: list[_Leaf] = []
    rest = iter(own)
    network = _opened(_made(ideal, rest, leaves, _apart(own)))
    cut = _cut_errors(own, cut_error)
    found: dict[str, tuple[Material, str]] = {}
    for leaf in leaves:
        made = (_material(leaf, materials, cut), leaf.of)
        name = made[0].name
        if found.setdefault(name, made) != made or (name != leaf.of and name in materials):
            raise InputError(_taken(name, leaf.of))
    return Assembly(
        network=network,
        elements=tuple(leaf.element for leaf in leaves),
        materials=tuple(material for material, _ in found.values()),
        origin=tuple(dict.fromkeys((leaf.leg.material, leaf.of) for leaf in leaves)),
    )


@dataclass(frozen=True, slots=True)
class _Leaf:
    """A leaf, the material of the plan that it is of, and the leg that it belongs to."""

    leg: Leg
    of: str
    element: Element
    part: MadeLeg
    ends: bool = False


def alike(assemblies: Sequence[Assembly]) -> tuple[Assembly, ...]:
    """Return the networks of several values with one material for each name.

    The cut of a wire is off by another part of its length at each value: the one that is off most counts.
    """
    widest: dict[str, Material] = {}
    for material in (m for assembly in assemblies for m in assembly.materials):
        if _value_spread(material) >= _value_spread(widest.get(material.name, material)):
            widest[material.name] = material
    return tuple(replace(a, materials=tuple(widest[m.name] for m in a.materials)) for a in assemblies)


def _value_spread(material: Material) -> float:
    return 0.0 if material.spread is None else material.spread.limits().value or 0.0


def _apart(own: tuple[MadeLeg, ...]) -> set[str]:
    """Return the ids of the legs that take a name of their own: what they share with the others is not known.

    Given members beside what is made of their material.
    """
    made = {leg.material for leg in own if isinstance(leg, FilmLeg | WireLeg)}
    return {leg.id for leg in own if isinstance(leg, PlainLeg) and leg.material in made}


def _cut_errors(own: tuple[MadeLeg, ...], cut_error: float) -> dict[str, float]:
    """Return by what part of its length the shortest cut of each wire may be off."""
    found: dict[str, float] = {}
    for leg in own:
        if isinstance(leg, WireLeg):
            found[leg.material] = max(found.get(leg.material, 0.0), cut_error / leg.length)
    return found


def _made(node: Network, legs: Iterator[MadeLeg], leaves: list[_Leaf], apart: set[str]) -> Network:
    if isinstance(node, Leg):
        part = next(legs)
        mine = _leaves(part, apart)
        leaves.extend(mine)
        members = tuple(leaf.leg for leaf in mine)
        if len(members) == 1:
            return members[0]
        parallel = isinstance(part, StockLeg) and part.joined == "parallel"
        return Parallel(members) if parallel else Series(members)
    return type(node)(tuple(_made(child, legs, leaves, apart) for child in node.children))


def _leaves(part: MadeLeg, apart: set[str]) -> tuple[_Leaf, ...]:
    """Return what one leg is in the network."""
    if isinstance(part, FilmLeg):
        return tuple(_film_leaves(part))
    if isinstance(part, StockLeg):
        return tuple(
            _Leaf(
                Leg(material=_suffixed(part.material, f"_{part.id}{n}"), ohms=ohms),
                part.material,
                Element(leg=part.id),
                part,
            )
            for n, ohms in enumerate(part.values, 1)
        )
    name = _suffixed(part.material, f"_{part.id}") if part.id in apart else part.material
    return (_Leaf(Leg(material=name, ohms=part.ohms), part.material, Element(leg=part.id), part),)


def _film_leaves(part: FilmLeg) -> Iterator[_Leaf]:
    factor, strings = part.in_series / part.in_parallel, part.in_parallel
    unit = part.unit
    element = Element(leg=part.id, units=part.in_series, strings=strings, length=unit.length)
    body = Leg(material=part.material, ohms=unit.body_ohms * factor, strings=strings)
    yield _Leaf(body, part.material, element, part)
    if unit.ends_ohms > 0:
        ends = Leg(material=ends_name(part.material), ohms=unit.ends_ohms * factor, strings=strings)
        yield _Leaf(ends, part.material, replace(element, length=None, ends=True), part, ends=True)


def _opened(network: Network) -> Network:
    """Return the network with nested equal nodes opened; legs stay as they are."""
    if isinstance(network, Leg):
        return network
    children: list[Network] = []
    for child in map(_opened, network.children):
        children.extend(child.children if isinstance(child, type(network)) else (child,))
    return type(network)(tuple(children))


# --- its materials --------------------------------------------------------------------------------------


def _material(leaf: _Leaf, materials: Mapping[str, Material], cut: Mapping[str, float]) -> Material:
    """Return the material of a leaf: at the width as drawn, with the tolerance of its cut."""
    plain = materials[leaf.of]
    if leaf.ends:
        ends = ends_material(plain)
        return plain if ends is None else ends
    own = replace(plain, name=leaf.leg.material)
    if isinstance(leaf.part, FilmLeg) and plain.film is not None:
        film = replace(plain.film, preferred_width=leaf.part.unit.width)
        return replace(own, film=film)
    if isinstance(leaf.part, WireLeg) and own.spread is not None and cut[leaf.of] > 0.0:
        return replace(own, spread=own.spread.widened(Spread(meaning="limits", value=cut[leaf.of])))
    return own


def _taken(name: str, material: str) -> Problem:
    return Problem(
        where=f"material.{material}",
        found=f"the name {name}, which its parts take, twice",
        expected="a name of its own for every material and every part",
        todo="Give the materials shorter or other names.",
    )


def made_process(process: Process, assembly: Assembly) -> Process:
    """Return what the materials of a made network share.

    A corner moves every part of its material. Bought parts share nothing else; the ends of a film keep
    their correlations.
    """
    kept = {name for name, of in assembly.origin if name == of}
    return replace(
        process,
        correlations=tuple(_correlations(process.correlations, kept, assembly)),
        trackings=tuple(t for t in process.trackings if set(t.materials) <= kept),
        corners=tuple(_corner(corner, assembly) for corner in process.corners),
    )


def made_operating(operating: Operating | None, assembly: Assembly) -> Operating | None:
    """Return the operating point for a made network: every part heats itself as its material does."""
    if operating is None or not operating.leg_thermal_resistance:
        return operating
    stated = dict(operating.leg_thermal_resistance)
    own = tuple((name, stated[of]) for name, of in assembly.origin if of in stated)
    return replace(operating, leg_thermal_resistance=own)


def _correlations(
    correlations: Iterable[Correlation], kept: set[str], assembly: Assembly
) -> Iterator[Correlation]:
    known = assembly.by_name
    for one in correlations:
        both = tuple(_renamed(p) for p in (one.first, one.second))
        if all(p.material in known and (p.material in kept or p.material.endswith(ENDS)) for p in both):
            yield replace(one, first=both[0], second=both[1])


def _renamed(parameter: Parameter) -> Parameter:
    """Return the parameter of the ends of a film as that of a material of their own."""
    if parameter.component == "end_resistance":
        return Parameter(material=ends_name(parameter.material), component="value")
    if parameter.component == "end_tc1":
        return Parameter(material=ends_name(parameter.material), component="tc1")
    return parameter


def _corner(corner: Corner, assembly: Assembly) -> Corner:
    shifts = []
    for parameter, shift in corner.shifts:
        renamed = _renamed(parameter)
        if renamed != parameter:
            shifts.append((renamed, shift))
            continue
        for name, of in assembly.origin:
            if of == parameter.material and name != ends_name(of):
                shifts.append((replace(parameter, material=name), shift))
    return Corner(name=corner.name, shifts=tuple(shifts))
