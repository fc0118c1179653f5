"""What a plan says at a glance, in words and rounded: the first screen."""

from __future__ import annotations

from dataclasses import dataclass

from tcplan.plan import Plan
from tcplan.spec import assumed, statements
from tcplan.spec.asked import headline, mask_lines, range_text
from tcplan.spec.rows import OptionRow, option_row


@dataclass(frozen=True, slots=True, kw_only=True)
class Summary:
    """A plan in words; ``worst_at`` and ``likely`` are empty where no spread is stated."""

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
    worst_at: str
    movers: tuple[str, ...]
    likely: str
    corners: str
    fraction: str
    centring: str
    proof: str
    notes: tuple[str, ...]


def summary_of(plan: Plan) -> Summary:
    """Return what a plan says of its chosen option.

    Parameters
    ----------
    plan : Plan

    Returns
    -------
    Summary
        Every number in it comes from the plan.
    """
    option = plan.best
    return Summary(
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
        worst_at=statements.worst_point(plan, option),
        movers=statements.movers(plan, option),
        likely=statements.likely_lots(plan, option),
        corners=statements.corners_text(option),
        fraction=statements.fraction_text(plan),
        centring=statements.centring(plan, option),
        proof=statements.proof_text(plan, option),
        notes=plan.notes,
    )
