"""Lower bounds on all mixed networks of a space: the limits that are tried, and what proves them.

`none_within` answers whether any network is within a limit; here it is asked of the best figure known
less a gap, then of weaker limits, within an amount of work that does not depend on the machine.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from tcplan.arrays import FloatArray
from tcplan.drift import breakpoints, panels, ratio_curve, stationary_points
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.mixes import mixed_trees
from tcplan.network import Network, used_materials
from tcplan.plan import Space
from tcplan.process import Variation
from tcplan.verify.question import Question, device_question, question
from tcplan.verify.sieve import none_within

BASE_CELLS, CELLS_A_TREE = 20_000, 40
SMALL = 1e-4  # 100 ppm: of a smaller figure the gap is not taken, since no coefficient is known that well
WEAKER = (1.0, 0.98, 0.95, 0.9, 0.8, 0.65, 0.5)  # limits that are tried in turn, of the first
SIZED = (1.0, 0.9, 0.65)  # those at which sizes are looked at, which takes far more cells


def closing_gap(figure: float, gap: float) -> float:
    """Return how far below a figure a bound may lie that counts as its proof.

    The relative gap of the figure, or of 100 ppm where that is more.
    """
    return min(figure, gap * max(figure, SMALL))


@dataclass(slots=True)
class MixedBound:
    """Lower bounds on the figure of the mixed networks of one space; vectors are kept between them."""

    space: Space
    need: Requirement
    materials: Mapping[str, Material]
    more: tuple[float, ...] = ()
    variation: Variation | None = None
    devices: tuple[Mapping[str, float], ...] = ()
    bank: dict[str, list[FloatArray]] = field(default_factory=dict)

    def below(self, figure: float, gap: float) -> float:
        """Return a figure that no mixed network of the space is within, at most a gap below ``figure``.

        The limit itself is tried first, then with the sizes of legs looked at, and then weaker
        limits, some of them with sizes; 0 when none of them closes. The work is bounded by a count of
        cells, so that the answer does not depend on the machine.
        """
        first_limit = figure - closing_gap(figure, gap)
        if first_limit <= 0:
            return 0.0
        trees = mixed_trees(self.space)
        most = BASE_CELLS + CELLS_A_TREE * len(trees)
        for part in WEAKER:
            limit = first_limit * part
            ask = self._question(limit)
            if none_within(trees, ask, self.bank, most_cells=most).proved:
                return limit
            sized = ask.sized and part in SIZED
            if sized and none_within(trees, ask, self.bank, free_top=False, most_cells=4 * most).proved:
                return limit
        return 0.0

    def _question(self, limit: float) -> Question:
        space, need, materials, more = self.space, self.need, self.materials, self.more
        if self.variation is None:
            return question(space, need, materials, limit, more)
        return device_question(space, need, materials, self.variation, limit, more, self.devices)


def _extremes_of(network: Network, need: Requirement, materials: Mapping[str, Material]) -> list[float]:
    """Return the temperatures [K] where the drift of a network is stationary, and the ends."""
    ratio = ratio_curve(network, materials, need.reference)
    splits = (*breakpoints(materials, used_materials(network)), *need.breakpoints())

    def drift(T: FloatArray) -> FloatArray:
        return ratio(T) - need.wanted(T)

    return [
        at
        for piece in need.pieces
        for low, high in panels(piece.low, piece.high, splits)
        for at in stationary_points(drift, low, high)
    ]


def mixed_bound(
    space: Space,
    need: Requirement,
    materials: Mapping[str, Material],
    networks: Sequence[Network],
    figure: float,
    gap: float,
    variation: Variation | None = None,
    devices: Sequence[tuple[float, Mapping[str, float]]] = (),
) -> float:
    """Return a figure that no mixed network of a space is within (a fraction).

    Parameters
    ----------
    space : Space
        With its materials in the order of its sizes.
    need : Requirement
    materials : mapping of name to Material
    networks : sequence of Network
        The best ones known: the temperatures of their extremes join the nodes.
    figure : float
        The best figure known.
    gap : float
        Relative gap that is tried first.
    variation : Variation, optional
        With it the figures are those of the worst case.
    devices : sequence of (float, mapping of name to float)
        The temperatures [K] and the value factors of the worst devices of the best networks.
    """
    if variation is None:
        more = {at for network in networks for at in _extremes_of(network, need, materials)}
        return MixedBound(space, need, materials, tuple(sorted(more))).below(figure, gap)
    temperatures = tuple(sorted({at for at, _ in devices}))
    factors = tuple(one for _, one in devices)
    return MixedBound(space, need, materials, temperatures, variation, factors).below(figure, gap)
