"""The content of a spec sheet: everything that a writer prints, already in words and rounded."""

from __future__ import annotations

from dataclasses import dataclass

from tcplan.network import network_text, value
from tcplan.plan import Plan
from tcplan.spec import assumed, statements
from tcplan.spec.asked import headline, mask_lines, range_text
from tcplan.spec.rows import (
    LegRow,
    MaterialRow,
    OptionRow,
    figure_rows,
    leg_rows,
    material_row,
    option_row,
)
from tcplan.units import format_ohms

CAUTIONS = (
    "Figures are design estimates from the data below, to be confirmed on silicon or hardware.",
    "Package stress, ageing, humidity and self-heating need their own allowance and check.",
    "Power parts can burn.",
    "Safety-related use follows the applicable standards, local codes and licensed practice.",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Spec:
    """A spec sheet in words; ``worst_at`` and ``likely`` are empty where no spread is stated."""

    title: str
    headline: str
    over: str
    outcome: tuple[str, ...]
    mask: tuple[str, ...]
    assumptions: tuple[str, ...]
    floor: str
    options: tuple[OptionRow, ...]
    chosen: str
    reason: str
    network: str
    total: str
    legs: tuple[LegRow, ...]
    figures: tuple[tuple[str, str], ...]
    worst_at: str
    movers: tuple[str, ...]
    likely: str
    corners: str
    fraction: str
    centring: str
    proof: str
    notes: tuple[str, ...]
    materials: tuple[MaterialRow, ...]
    cautions: tuple[str, ...]
    sha256: str
    version: str


def spec_of(plan: Plan) -> Spec:
    """Return the spec sheet of the chosen option of a plan.

    Parameters
    ----------
    plan : Plan

    Returns
    -------
    Spec
        Every number in it comes from the plan.
    """
    option, outside = plan.best, assumed.extrapolated(plan)
    return Spec(
        title=str(plan.brief["title"]),
        headline=headline(plan),
        over=range_text(plan),
        outcome=statements.outcome(plan),
        mask=mask_lines(plan),
        assumptions=assumed.assumptions(plan),
        floor=statements.floor_text(plan),
        options=tuple(option_row(plan, each) for each in plan.options),
        chosen=option.id,
        reason=statements.reason(plan),
        network=network_text(option.network, lambda leg: f"{leg.material} {format_ohms(leg.ohms)}"),
        total=format_ohms(value(option.network)),
        legs=leg_rows(plan, option),
        figures=figure_rows(plan, option),
        worst_at=statements.worst_point(plan, option),
        movers=statements.movers(plan, option),
        likely=statements.likely_lots(plan, option),
        corners=statements.corners_text(option),
        fraction=statements.fraction_text(plan),
        centring=statements.centring(plan, option),
        proof=statements.proof_text(plan, option),
        notes=plan.notes,
        materials=tuple(material_row(m, extrapolated=m.name in outside) for m in plan.materials),
        cautions=CAUTIONS,
        sha256=str(plan.brief["sha256"]),
        version=plan.tcplan,
    )
