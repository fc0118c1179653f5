"""The best mixed networks of a space, as proposals: grid, polish, and what is left of each tree."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from tcplan.effort import Effort
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.mixes import KindBounds, fixed_group, mixed_trees, total_of
from tcplan.network import Leg, Network, Series, arrangement, legs, scaled, shares, simplified, value
from tcplan.plan import Proposal, Space
from tcplan.process import Variation
from tcplan.search.columns import spread_points
from tcplan.search.curves import network_at
from tcplan.search.devices import devices_at
from tcplan.search.limits import LegLimits, limits_of
from tcplan.search.linear import in_order
from tcplan.search.mixed import (
    KEPT,
    NODES,
    WHOLE,
    Source,
    Start,
    Surface,
    by_shape,
    field_at,
    grid_starts,
)
from tcplan.search.polish import NominalPolisher, Polished, polish, polishing_grid
from tcplan.search.spread_polish import GRID, SpreadPolisher
from tcplan.trees import Pair, Tree, leaves, paired, shape_of

DEVICE_NODES = 5  # Chebyshev nodes a piece in the grid stage of a worst-case search
VANISHED = 1e-7  # share of a leg that is left out
HALVINGS = 16
INSIDE = 1.0 - 1e-4  # of a limit: what the search ends at is that near to what verify finds
SAME = 1e-5  # relative difference of the figures of two forms of one resistor


@dataclass(frozen=True, slots=True)
class Task:
    """The trees of one shape, searched and polished together, here or in another process."""

    source: Source
    limits: LegLimits
    trees: tuple[Tree, ...]
    outermost: tuple[float, float]
    variation: Variation | None = None

    @property
    def name(self) -> str:
        """What the task is called when it fails."""
        return f"{len(self.trees)} trees of {len(leaves(self.trees[0]))} legs"

    def run(self) -> tuple[tuple[Start, Polished], ...]:
        """Return the best starts of the shape, and what polishing made of them."""
        # A limit of area is curved, and may part what is allowed: more minima are worth a polish.
        kept = 3 * KEPT if self.limits.max_area < np.inf else KEPT
        starts = grid_starts(self.trees, self._surface(), self.limits, kept, self.outermost)
        pair = paired(shape_of(self.trees[0]))
        if not isinstance(pair, Pair):
            return ()
        polishers = self._polishers(pair, starts)
        polished = polish(polishers, [np.array(start.shares) for start in starts])
        return tuple((starts[k], end) for k, end in polished)

    def _surface(self) -> Surface:
        """Return what the grid stage takes its figures over."""
        if self.variation is None:
            return field_at(self.source, *spread_points(self.source.need, NODES, chebyshev=True))
        points = spread_points(self.source.need, DEVICE_NODES, chebyshev=True)
        return devices_at(self.source, self.variation, *points)

    def _polishers(self, pair: Pair, starts: Sequence[Start]) -> list[NominalPolisher] | list[SpreadPolisher]:
        source, limits, outermost = self.source, self.limits, self.outermost
        if self.variation is None:
            grid = polishing_grid(source)
            return [NominalPolisher(pair, leaves(s.tree), limits, outermost, source, grid) for s in starts]
        points = spread_points(source.need, GRID, chebyshev=False)
        bounds = KindBounds(source.space, source.materials, self.variation, source.need.reference)
        devices = devices_at(source, self.variation, *points, bounds)
        return [
            SpreadPolisher(pair, leaves(s.tree), limits, outermost, source, self.variation, devices, bounds)
            for s in starts
        ]


def _network(space: Space, tree: Tree, polished: Polished) -> Network | None:
    """Return the network of a polished tree, without legs that have vanished; None if it is not mixed."""
    names = tuple((*space.materials, "")[leaf] for leaf in leaves(tree))
    own, sign = total_of(space)
    ohms = own * float(polished.shares[0]) ** sign
    whole = network_at(paired(shape_of(tree)), names, polished.shares, ohms)
    left = _without_vanished(whole)
    if left is None:
        return None
    group = fixed_group(space)
    if group is None:
        simple = simplified(left)
        simple = scaled(simple, ohms / value(simple))
    else:
        simple = _opened(_put_fixed(_rest_exact(left, group, ohms), group))
    return simple if arrangement(simple) == "mixed" else None


def _without_vanished(network: Network) -> Network | None:
    """Return the network without the legs whose share is next to nothing."""
    keep = iter([share > VANISHED for share in shares(network)])

    def node(part: Network) -> Network | None:
        if isinstance(part, Leg):
            return part if next(keep) else None
        left = tuple(child for child in map(node, part.children) if child is not None)
        if len(left) < 2:
            return left[0] if left else None
        return type(part)(left)

    return node(network)


def _rest_exact(network: Network, group: Network, ohms: float) -> Network:
    """Return the network with its chosen legs scaled so that, beside the fixed ones, the total is exact.

    What has vanished was next to nothing, but a total is a promise.
    """
    if isinstance(network, Leg):
        return network
    rest = [value(child) for child in network.children if not _is_fixed(child)]
    if isinstance(network, Series):
        factor = (ohms - value(group)) / sum(rest)
    else:
        factor = sum(1.0 / ohm for ohm in rest) / (1.0 / ohms - 1.0 / value(group))
    return type(network)(
        tuple(child if _is_fixed(child) else scaled(child, factor) for child in network.children)
    )


def _is_fixed(network: Network) -> bool:
    return isinstance(network, Leg) and network.material == ""


def _put_fixed(network: Network, group: Network) -> Network:
    """Return the network with the fixed members, at their own values, in place of the unnamed leg."""
    if isinstance(network, Leg):
        return group if _is_fixed(network) else network
    return type(network)(tuple(_put_fixed(child, group) for child in network.children))


def _opened(network: Network) -> Network:
    """Return the network with nested equal nodes opened; legs stay as they are."""
    if isinstance(network, Leg):
        return network
    kind = type(network)
    children: list[Network] = []
    for child in map(_opened, network.children):
        children.extend(child.children if isinstance(child, kind) else (child,))
    return kind(tuple(children))


def tasks_of(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    variation: Variation | None = None,
) -> tuple[Task, ...]:
    """Return the tasks of a space, one a shape of tree; those with most legs first."""
    source, limits = Source(need, materials, space), limits_of(space)
    outermost = space.fixed_share if space.fixed else WHOLE
    groups = [tuple(group) for _, group in by_shape(mixed_trees(space))]
    groups.sort(key=lambda group: -len(leaves(group[0])))
    return tuple(Task(source, limits, group, outermost, variation) for group in groups)


def mixed_proposals(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    few: int = 3,
    effort: Effort | None = None,
    variation: Variation | None = None,
) -> tuple[Proposal, ...]:
    """Return the best few mixed networks of each number of legs, best first.

    Parameters
    ----------
    space : Space
        Of given total, or with fixed members whose share sets it.
    need : Requirement
    materials : mapping of name to Material
    few : int
        How many are wanted of each number of legs.
    effort : Effort, optional
        Who does the work; when it is stopped, the best of what was done is returned.
    variation : Variation, optional
        With it, the networks that are best in their worst case; else the nominally best ones.
    """
    space = in_order(space)
    found: dict[int, list[Network]] = {}
    seen: list[tuple[tuple[str, ...], float]] = []
    for figure, network in _ranked(space, need, materials, effort, variation):
        group = found.setdefault(len(legs(network)), [])
        # Two trees of the same legs often are the same resistor: they reach the same figure.
        used = tuple(sorted(leg.material for leg in legs(network)))
        if len(group) < few and not any(used == u and abs(figure - f) <= SAME * f for u, f in seen):
            group.append(network)
            seen.append((used, figure))
    return tuple(Proposal(network=network, space=space) for size in sorted(found) for network in found[size])


def _ranked(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    effort: Effort | None,
    variation: Variation | None,
) -> Iterator[tuple[float, Network]]:
    """Yield the mixed networks of a space that the search ends at, best first, each with its figure."""
    done = (effort or Effort()).results(tasks_of(space, need, materials, variation))
    ends = [end for results in done for end in results if end[1].excess <= 0]
    for start, polished in sorted(ends, key=lambda end: (end[1].figure, repr(end[0].tree))):
        network = _network(space, start.tree, polished)
        if network is not None:
            yield polished.figure, network


def least_mixed_total(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    limit: float,
    effort: Effort | None = None,
    variation: Variation | None = None,
) -> Proposal | None:
    """Return a mixed network in which the fixed members hold a large share, within ``limit``.

    The largest that halving finds, by the search for at least a share; None when there is none at the
    least share of the space. Searched, not proved.
    """
    space = in_order(space)
    low, high = space.fixed_share
    best, at, above = None, low, high
    for step in range(HALVINGS):
        guess = low if step == 0 else math.sqrt(at * above)
        tight = replace(space, fixed_share=(guess, high))
        figure, network = next(_ranked(tight, need, materials, effort, variation), (math.inf, None))
        if network is not None and figure <= limit * INSIDE:
            at = guess
            best = network
        elif step == 0:
            return None
        else:
            above = guess
        if above <= at * (1.0 + 1e-4):
            break
    role = "greatest total" if space.fixed_in_parallel else "least total"
    return None if best is None else Proposal(network=best, role=role)
