"""What is likely: lots of the network drawn over its spreads, beside the worst case of the budget."""

from __future__ import annotations

from dataclasses import replace

from tcplan.budget.case import Case
from tcplan.budget.model import Draws, LotFigures
from tcplan.draws import draw, draw_units, draw_until
from tcplan.material.spread import Spread
from tcplan.network import Network, deviated, leg_names, used_materials
from tcplan.plan import Option

UNITS = 100  # a lot, where mismatch is known


def lot_figures(option: Option, case: Case, draws: Draws) -> LotFigures | None:
    """Return what draws find of an option; None when one of its materials states no spread.

    Drawn are the spreads of the materials, without ends and allowances.
    """
    if case.without_spread(option.network):
        return None
    network, need = deviated(option.network, case.redrawn), case.need
    over, none = case.over, Spread(meaning="limits")
    spreads = {
        name: case.materials[name].drawn_spread(over.low, over.high) or none
        for name in used_materials(network)
    }
    common = {"seed": draws.seed, "quantile": need.goal.quantile, "limit": need.scale}
    data = (network, case.materials, spreads, case.process, need)
    if draws.precision is None:
        drawn = draw(*data, count=draws.count, **common)  # type: ignore[arg-type]
    else:
        drawn = draw_until(*data, precision=draws.precision, **common)  # type: ignore[arg-type]
    units = None
    if need.scale is not None:
        lots = max(1, drawn.draws // UNITS)
        units = draw_units(*data, lots=lots, units=UNITS, seed=draws.seed, limit=need.scale)
        if units is not None:
            units = replace(units, unstated=_legs_of(units.unstated, network, case))
    return LotFigures(drawn=drawn, units=units)


def _legs_of(leaves: tuple[str, ...], network: Network, case: Case) -> tuple[str, ...]:
    """Return the legs whose mismatch is not known, once each; the ends of units have none of their own."""
    elements = case.made_of(network)
    by_name = dict(zip(leg_names(len(elements)), elements, strict=True))
    return tuple(dict.fromkeys(by_name[name].leg for name in leaves if not by_name[name].ends))
