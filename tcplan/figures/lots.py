"""The lots of the chosen option: their curves, the band that holds most of them, and their figures."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection

from tcplan.arrays import FloatArray
from tcplan.budget.rebuilt import asked_of
from tcplan.draws import draw, draw_curves
from tcplan.figures.curves import celsius, ends, temperatures
from tcplan.figures.limits import Unit
from tcplan.figures.style import SPREAD_EDGE, SPREAD_FILL, number_text, percent_text
from tcplan.goal import Requirement, requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network, used_materials
from tcplan.plan import Likely, Plan
from tcplan.process import Process

LEAST_LOTS, MOST_LOTS = 2000, 20_000
BEYOND = 10.0  # lots outside each edge of a band: with fewer, the edge is that of one lot
SAMPLES = 49  # temperatures; the curves of lots are smooth


@dataclass(frozen=True, slots=True, kw_only=True)
class Lots:
    """What draws of the chosen option need; ``likely`` is what the plan says of them."""

    network: Network
    materials: Mapping[str, Material]
    spreads: Mapping[str, Spread]
    process: Process
    need: Requirement
    likely: Likely

    def curves(self, T: FloatArray, count: int) -> FloatArray:
        """Return the drift (fractions) of the first lots, shape (count, T)."""
        return draw_curves(
            self.network,
            self.materials,
            self.process,
            self.need,
            T,
            count,
            self.likely.seed,
            spreads=self.spreads,
        )

    def histogram(self) -> tuple[FloatArray, FloatArray]:
        """Return edges (fractions) and counts of the judged figure of the lots, 20 000 at most."""
        drawn = draw(
            self.network,
            self.materials,
            self.spreads,
            self.process,
            self.need,
            count=min(self.likely.draws, MOST_LOTS),
            seed=self.likely.seed,
            quantile=self.likely.fraction,
        )
        edges, counts = drawn.histogram
        return np.array(edges), np.array(counts, dtype=np.float64)


def lots_of(plan: Plan) -> Lots | None:
    """Return the lots of the chosen option; None where a material of it has no spread."""
    option, low, high = plan.best, *ends(plan)
    found = {name: plan.by_name[name].drawn_spread(low, high) for name in used_materials(option.network)}
    spreads = {name: spread for name, spread in found.items() if spread is not None}
    if option.likely is None or len(spreads) < len(found):
        return None
    asked = asked_of(plan)
    return Lots(
        network=option.network,
        materials=plan.by_name,
        spreads=spreads,
        process=asked.process,
        need=requirement(asked.goal, asked.over),
        likely=option.likely,
    )


# --- the band -----------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Band:
    """The drift (fractions) between which the central part of the lots lies at each temperature."""

    T: FloatArray
    lower: FloatArray
    upper: FloatArray
    label: str


def central_band(plan: Plan, lots: Lots) -> Band:
    """Return the band that holds the plan's fraction of lots at each temperature.

    So many lots are drawn that some lie outside each edge; where 20 000 are too few for that, the
    band holds them all, and its label says so.
    """
    fraction = plan.limit.quantile
    tail, T = 0.5 * (1.0 - fraction), temperatures(plan, SAMPLES)
    count = min(MOST_LOTS, max(LEAST_LOTS, math.ceil(BEYOND / tail)))
    drift = lots.curves(T, count)
    if count * tail < 1.0:
        lower, upper, label = drift.min(axis=0), drift.max(axis=0), f"all {number_text(count)} lots drawn"
    else:
        lower, upper = np.quantile(drift, [tail, 1.0 - tail], axis=0)
        label = f"{percent_text(fraction)} of lots,\nat each temperature"
    return Band(T=T, lower=lower, upper=upper, label=label)


def draw_band(ax: Axes, band: Band, unit: Unit) -> PolyCollection:
    """Shade the band, behind all curves."""
    return ax.fill_between(
        celsius(band.T),
        band.lower * unit.factor,
        band.upper * unit.factor,
        facecolor=SPREAD_FILL,
        edgecolor=SPREAD_EDGE,
        lw=0.6,
        zorder=1.2,
        label=band.label,
    )
