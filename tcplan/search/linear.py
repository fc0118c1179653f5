"""Series and parallel mixes of a space, as proposals with the evidence for all of them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.mixes import fixed_group
from tcplan.network import Leg, Network, Parallel, Series, value
from tcplan.plan import Certificate, Proposal, Scenario, Space
from tcplan.process import Variation
from tcplan.search.columns import Programme
from tcplan.search.solver import VANISHED, Mix, Solver
from tcplan.search.spread_columns import SpreadProgramme
from tcplan.search.supports import best_mixes

NEEDLESS = 1e-8  # share of a leg that is left out where the total is free


def programme_of(
    space: Space, need: Requirement, materials: Mapping[str, Material], variation: Variation | None
) -> Programme | SpreadProgramme:
    """Return the programme of nominal materials, or with a variation that of the worst device."""
    if variation is None:
        return Programme(space, need, materials, space.materials)
    return SpreadProgramme(space, need, materials, space.materials, variation)


def network_of(programme: Programme | SpreadProgramme, shares: FloatArray) -> Network:
    """Return the network that has these shares; the fixed members keep their own values."""
    space, ohms = programme.space, programme.space.ohms
    parallel = space.arrangement == "parallel"
    group = fixed_group(space)
    if group is not None:
        own, u = value(group), float(shares[-1])
        ohms = own * u if parallel else own / u
    if ohms is None:
        raise ValueError("a total is needed when nothing is fixed")
    chosen = [
        Leg(material=name, ohms=float(ohms / share if parallel else ohms * share))
        for share, name in sorted(
            ((share, name) for share, name in zip(shares[:-1], programme.names, strict=True)),
            key=lambda pair: (-pair[0], pair[1]),
        )
        if share > (NEEDLESS if space.ohms is None else VANISHED)
    ]
    members = (*space.fixed, *chosen)
    if len(members) == 1:
        return members[0]
    return Parallel(members) if parallel else Series(members)


def certificate(solver: Solver) -> Certificate:
    """Return the bank of duals as evidence."""
    rows = solver.nodes
    size = len(rows.temperature)
    nodes = tuple(
        Scenario(piece=int(p), temperature=float(t), side=int(side), factors=tuple(map(float, factors)))
        for p, t, side, factors in zip(rows.piece, rows.temperature, rows.side, rows.factors, strict=True)
    )
    weights = tuple(tuple(np.pad(y, (0, size - len(y))).tolist()) for y in solver.bank)
    tangents = tuple((support, at) for support, points in solver.tangents.items() for at in points)
    return Certificate(nodes=nodes, weights=weights, tangents=tangents)


def in_order(space: Space) -> Space:
    """Return the space with its materials sorted by name, so that their order does not matter."""
    return space.taken(sorted(range(len(space.materials)), key=lambda i: space.materials[i]))


def search_space(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    few: int = 3,
    variation: Variation | None = None,
) -> tuple[Proposal, ...]:
    """Return the best few networks of a space, best first, with the evidence for all of them.

    Parameters
    ----------
    space : Space
    need : Requirement
    materials : mapping of name to Material
    few : int
        How many are wanted.
    variation : Variation, optional
        With it, the networks that are best in their worst case; else the nominally best ones. Every
        material of the space and of its fixed members has a spread, and no piece has a free centre.
    """
    space = in_order(space)
    solver = Solver(programme_of(space, need, materials, variation))
    mixes, complete = best_mixes(solver, few)
    covered = space if complete else replace(space, most=len(space.materials), min_share=0.0, sizes=None)
    evidence = certificate(solver)
    return tuple(
        Proposal(network=network_of(solver.programme, mix.shares), space=covered, certificate=evidence)
        for mix in mixes
    )


def least_total(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    limit: float,
    variation: Variation | None = None,
) -> Proposal | None:
    """Return the network in which the fixed members hold the largest share within ``limit``.

    In series that is the least total, in parallel the greatest. The least figure over shares
    of at least u never falls as u rises, so u is found by bisection. None when no share does.
    """
    space = in_order(space)
    low, high = space.fixed_share

    def best(u: float) -> tuple[Solver, Mix | None]:
        tight = replace(space, fixed_share=(u, high))
        solver = Solver(programme_of(tight, need, materials, variation))
        mixes, _ = best_mixes(solver, 1)
        return solver, (mixes[0] if mixes else None)

    solver, mix = best(low)
    if mix is None or mix.figure > limit:
        return None
    fits, above = (solver, mix), high
    last_low, last_above = mix.figure - limit, None
    for step in range(60):
        if above - low <= 1e-9 * above:
            break
        guess = 0.5 * (low + above)
        if last_above is not None and step % 3:  # two secant steps, then a halving
            guess = low - last_low * (above - low) / (last_above - last_low)
            guess = min(max(guess, low + 1e-10 * above), above - 1e-10 * above)
        solver, mix = best(guess)
        if mix is not None and mix.figure <= limit:
            fits, low, last_low = (solver, mix), guess, mix.figure - limit
        else:
            above, last_above = guess, (mix.figure - limit if mix else None)
    solver, mix = fits
    return Proposal(
        network=network_of(solver.programme, mix.shares),
        space=solver.programme.space,
        certificate=certificate(solver),
        role="least total" if space.arrangement == "series" else "greatest total",
    )
