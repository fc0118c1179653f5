"""The legs of a made network as a trim sees them: which leaves they are, how far they can be off."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass

from tcplan.errors import InputError, Problem
from tcplan.made import FilmLeg, MadeLeg, PlainLeg, StockLeg
from tcplan.material.model import Material
from tcplan.material.spread import SIGMAS_PER_LIMIT, Spread, value_half_width
from tcplan.network import Network, legs, shares
from tcplan.parts.trim.drawing import Limit, Strip, strip_of

LEAST_FACTOR = 0.01  # of a film at its lowest: wide limits of its ends would make them negative


@dataclass(frozen=True, slots=True, kw_only=True)
class Member:
    """One made leg.

    Parameters
    ----------
    id, material : str
    leaves : tuple of int
        Its positions among the leaves of the network; the body of a film first, then its ends.
    ohms : float
        As made, at the reference [ohm]; of a pair in parallel the sum, which is then of no use.
    share : float
        Of the whole.
    mismatch : float
        Sigma of dR/R; 0 where it is not known.
    half_width : float
        Of its value as limits, mismatch included, as a fraction.
    film : bool
        Whether it can be trimmed.
    parts : tuple of float
        Of its leaves [ohm].
    limits : tuple of (float, float)
        What its body and its ends are multiplied with in the lowest device, the nominal and the highest.
    strip : Strip, optional
        What its pieces are drawn from; None where it has no unit.
    """

    id: str
    material: str
    leaves: tuple[int, ...]
    ohms: float
    share: float
    mismatch: float
    half_width: float
    film: bool
    parts: tuple[float, ...]
    limits: tuple[Limit, ...]
    strip: Strip | None = None


def members_of(
    network: Network,
    made: Sequence[MadeLeg],
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    reference: float,
    held: Collection[str] = (),
) -> tuple[Member, ...]:
    """Return the made legs, in their order; those whose id is in ``held`` are not trimmed.

    Raises
    ------
    InputError
        When a material of the network has no spread, or a film states none of its value.
    ValueError
        When the legs are not those of the network.
    """
    leaves, parts = legs(network), shares(network)
    if sum(map(_leaf_count, made)) != len(leaves):
        raise ValueError(f"legs of {sum(map(_leaf_count, made))} leaves in a network of {len(leaves)}")
    widths = leaf_half_widths(network, materials, spreads, reference)
    found, at = [], 0
    for leg in made:
        own = tuple(range(at, at + _leaf_count(leg)))
        at += len(own)
        ohms = sum(leaves[k].ohms for k in own)
        mismatch = (leg.mismatch or 0.0) if isinstance(leg, FilmLeg) else 0.0
        # Body and ends are in series, so each counts by its part of the value.
        half_width = sum(leaves[k].ohms * widths[k] for k in own) / ohms
        found.append(
            Member(
                id=leg.id,
                material=leaves[own[0]].material,
                leaves=own,
                ohms=ohms,
                share=sum(parts[k] for k in own),
                mismatch=mismatch,
                half_width=(1.0 + half_width) * (1.0 + SIGMAS_PER_LIMIT * mismatch) - 1.0,
                film=leg.id not in held
                and isinstance(leg, FilmLeg | PlainLeg)
                and materials[leaves[own[0]].material].kind == "film",
                parts=tuple(leaves[k].ohms for k in own),
                limits=_limits([widths[k] for k in own], mismatch),
                strip=strip_of(leg, materials[leg.material]) if isinstance(leg, FilmLeg) else None,
            )
        )
    return tuple(found)


def _limits(widths: Sequence[float], mismatch: float) -> tuple[Limit, ...]:
    """Return the factors of the body and the ends of a leg at its limits, and nominal."""
    most = [(1.0 + width) * (1.0 + SIGMAS_PER_LIMIT * mismatch) for width in widths]
    low = [max(2.0 - own, LEAST_FACTOR) for own in most]
    return (low[0], low[-1]), (1.0, 1.0), (most[0], most[-1])


def leaf_half_widths(
    network: Network, materials: Mapping[str, Material], spreads: Mapping[str, Spread], reference: float
) -> tuple[float, ...]:
    """Return the half-width of the value of every leaf at the reference [K], as limits.

    Raises
    ------
    InputError
        When a material has no spread, or a film states none of its value.
    """
    names = tuple(dict.fromkeys(leaf.material for leaf in legs(network)))
    problems = [problem for name in names if (problem := _unknown(name, materials[name], spreads.get(name)))]
    if problems:
        raise InputError(problems)
    known = {name: _half_width(materials[name], spreads[name], reference) for name in names}
    return tuple(known[leaf.material] for leaf in legs(network))


def _half_width(material: Material, spread: Spread, reference: float) -> float:
    return value_half_width(material.law, spread.with_width(material.effective_width), reference)


def _unknown(name: str, material: Material, spread: Spread | None) -> Problem | None:
    """Return why the range of a trim is not known, if so."""
    unstated = material.kind == "film" and (
        spread is None or (spread.value is None and not spread.width_bias)
    )
    if spread is not None and not unstated:
        return None
    what = "without a spread" if spread is None else "without a spread of its value"
    return Problem(
        where=f"material.{name}.spread",
        found=f"{name} {what}: the range of the trim is not known",
        expected="how far the value can be off",
        todo=f"Add [material.{name}.spread] with the half-width of its value.",
    )


def _leaf_count(leg: MadeLeg) -> int:
    if isinstance(leg, FilmLeg) and leg.unit.ends_ohms > 0.0:
        return 2
    return len(leg.values) if isinstance(leg, StockLeg) else 1


def trimmed(members: Sequence[Member]) -> tuple[Member, ...]:
    """Return the legs that carry bits: of every film the one of the largest share.

    Raises
    ------
    InputError
        When there is no film, or the value of none of them can be off.
    """
    best: dict[str, Member] = {}
    for member in members:
        if member.film and (member.material not in best or member.share > best[member.material].share):
            best[member.material] = member
    found = tuple(member for member in members if member is best.get(member.material))
    if not found:
        raise InputError(
            Problem(
                where="trim",
                found="a network without a film that is not a fixed member",
                expected="a film, of which units can be bypassed or cut",
                todo="Remove [trim], or use a film.",
            )
        )
    return found
