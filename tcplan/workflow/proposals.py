"""What is put forward for a brief: the searches it asks for, or the network that it gives."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from math import comb

from tcplan.brief import Brief, SearchRules
from tcplan.brief.model import Searched
from tcplan.effort import Effort
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.mixes import total_of as total_of_space
from tcplan.network import arrangement, used_materials, value
from tcplan.plan import FloorEvidence, Proposal, Sizes, Space
from tcplan.process import Variation
from tcplan.search.floor import floor_evidence as sandwich_evidence
from tcplan.search.linear import least_total, search_space
from tcplan.search.mixed_search import least_mixed_total, mixed_proposals
from tcplan.search.supports import MOST_SUPPORTS
from tcplan.trees import tree_count
from tcplan.verify.option import Case, spread_figures

FEW = 3
MOST_MIXED_LEGS = 6
MOST_TREES = 15_000  # more would take minutes
BOX_PARTS = (0.2, 0.4, 0.6, 0.8)  # of the limits, in a search for a quantile
KEPT_INSIDE = 1.0 - 1e-6  # of a limit: two ways to find a worst case differ by rounding
WORTH = 1e-2  # by how much a mixed network has to beat the total of one node
TINY_SHARE = 1e-4  # of the fixed members, when the total is free


def spreads_of(brief: Brief) -> dict[str, Spread]:
    """Return the spread of each material that states one, over the range of the brief."""
    found = {m.name: m.effective_spread(brief.over.low, brief.over.high) for m in brief.materials}
    return {name: spread for name, spread in found.items() if spread is not None}


def designed_for_worst_case(brief: Brief, need: Requirement) -> bool:
    """Whether the search is for the worst case: when it is judged, and can be searched for.

    Every material that may be used needs a spread; and the two ends of a band belong to one device, so
    that a band is searched for at nominal.
    """
    judged = brief.goal.judge == "worst-case" and brief.given is None
    return judged and not need.centred and _all_stated(brief)


def spaces(brief: Brief) -> tuple[Space, ...]:
    """Return the sets of networks that the brief asks to search, one an arrangement."""
    rules, fixed = brief.rules, tuple(member.leg for member in brief.fixed)
    few = min(rules.max_materials, rules.max_legs)
    most = {"single": 1, "mixed": rules.max_materials}
    return tuple(
        Space(
            arrangement=kind,
            materials=rules.use,
            most=most.get(kind, few),
            min_share=0.0 if kind == "single" else rules.min_share,
            legs=min(rules.max_legs, MOST_MIXED_LEGS) if kind == "mixed" else few,
            fixed_in_parallel=bool(brief.fixed) and brief.fixed[0].place == "parallel",
            fixed=fixed,
            fixed_share=fixed_share(brief),
            ohms=total_of(brief),
            sizes=sizes_of(brief),
        )
        for kind in rules.arrangements
    )


def searchable(space: Space, found: Sequence[Proposal]) -> Space:
    """Return a mixed space that is not too large to be searched.

    Legs are given up first, down to three; then materials, those of the best one-node mixes kept
    first. Of what is left out nothing is proved; the notes of the plan say so.
    """
    legs_, names = space.legs, space.materials
    while legs_ > 3 and tree_count(legs_, len(names), space.most) > MOST_TREES:
        legs_ -= 1
    order = list(dict.fromkeys(n for p in found for n in used_materials(p.network) if n in names))
    order += [name for name in names if name not in order]
    keep = len(names)
    if tree_count(legs_, keep, space.most) > MOST_TREES:
        keep = min(keep, 40)
    while keep > 2 and tree_count(legs_, keep, space.most) > MOST_TREES:
        keep -= 1
    kept = set(order[:keep])
    return replace(space.taken([i for i, name in enumerate(names) if name in kept]), legs=legs_)


def left_out(brief: Brief, found: Sequence[Proposal]) -> tuple[str, ...]:
    """Return what was not searched because there is too much of it, a sentence each."""
    notes = []
    for space in spaces(brief) if brief.given is None else ():
        count, most = len(space.materials), min(space.most, len(space.materials))
        if space.arrangement == "mixed":
            part = searchable(space, found)
            if part != space:
                size = f"{part.legs} legs, {len(part.materials)} of {count} materials"
                notes.append(f"Too many mixed networks to search them all: at most {size} were.")
        elif comb(count, most) > MOST_SUPPORTS:
            notes.append(
                f"Too many {space.arrangement} mixes of {most} of {count} materials to search them all: "
                "they were grown from pairs."
            )
    return tuple(notes)


def total_of(brief: Brief) -> float | None:
    """Return the total [ohm]; None when the share of the fixed members sets it."""
    low, high = fixed_share(brief)
    return brief.target.ohms if not brief.fixed or low == high else None


def sizes_of(brief: Brief) -> Sizes:
    """Return what can be made of each material that may be chosen, in the order of ``rules.use``."""
    rules, reference = brief.rules, brief.over.reference
    limits = [_leg_limits(brief.by_name[name], rules, reference) for name in rules.use]
    areas = [brief.by_name[name].area(1.0, reference) or 0.0 for name in rules.use]
    return Sizes(
        least_ohms=tuple(least for least, _ in limits),
        most_ohms=tuple(most for _, most in limits),
        area_per_ohm=tuple(areas),
        max_area=rules.max_area if rules.max_area is not None else float("inf"),
    )


def _leg_limits(material: Material, rules: SearchRules, reference: float) -> tuple[float, float]:
    """Return the least and the largest value [ohm] of a leg of a material at ``reference`` [K]."""
    squares, length = material.squares(1.0, reference), material.length(1.0, reference)
    if squares is not None:
        return rules.min_squares / squares, rules.max_squares / squares
    if length is not None:
        return rules.min_length / length, float("inf")
    if material.series is not None:
        return rules.stock_values
    return 0.0, float("inf")


def fixed_share(brief: Brief) -> tuple[float, float]:
    """Return the least and the greatest share of the fixed members together."""
    if not brief.fixed:
        return 0.0, 0.0
    total, bound = brief.target.ohms, brief.target.at_most
    if brief.fixed[0].place == "series":
        own = sum(member.leg.ohms for member in brief.fixed)
        if total is not None:
            return own / total, own / total
        return (own / bound if bound is not None else TINY_SHARE), 1.0
    own = 1.0 / sum(1.0 / member.leg.ohms for member in brief.fixed)
    if total is not None:
        return total / own, total / own
    return TINY_SHARE, min(1.0, bound / own) if bound is not None else 1.0


# --- proposals ------------------------------------------------------------------------------------


def proposals(
    brief: Brief, need: Requirement, case: Case, few: int = FEW, effort: Effort | None = None
) -> list[Proposal]:
    """Return what the search, or the user, puts forward: the best few of each arrangement."""
    if brief.given is not None:
        return [Proposal(network=brief.given, role="given")]
    if need.goal.judge == "quantile" and not case.designed:
        return _for_quantile(brief, need, case, few, effort)
    found: list[Proposal] = []
    for space in spaces(brief):
        low, high = space.fixed_share
        if space.arrangement == "mixed":
            if space.legs + len(space.fixed) >= 3:
                found.extend(_mixed(brief, space, need, case, few, effort, found))
            continue
        parallel = space.arrangement == "parallel"
        bounded = not brief.fixed or low == high or (brief.target.at_most is not None and not parallel)
        if bounded:
            mixes = search_space(space, need, case.materials, few, case.variation)
            # A mix that has shrunk to one leg is what the single arrangement is for.
            alone = "single" in brief.rules.arrangements and space.arrangement != "single"
            found.extend(m for m in mixes if not (alone and arrangement(m.network) == "single"))
        if brief.fixed and low != high and need.scale is not None:
            extreme = _least_total(space, need, case, need.scale)
            if extreme is not None:
                found.append(extreme)
            elif not bounded:  # no total meets the limit: show how near the best one comes
                found.extend(search_space(space, need, case.materials, 1, case.variation))
    if not found and brief.rules.arrangements == ("mixed",):
        # Every mixed network was best without its inner nodes: the simpler ones are the answer.
        simple: tuple[Searched, ...] = ("single", "series", "parallel")
        if brief.fixed:
            simple = (brief.fixed[0].place,)
        return proposals(
            replace(brief, rules=replace(brief.rules, arrangements=simple)), need, case, few, effort
        )
    return found


def _mixed(
    brief: Brief,
    space: Space,
    need: Requirement,
    case: Case,
    few: int,
    effort: Effort | None,
    found: Sequence[Proposal],
) -> list[Proposal]:
    """Return the mixed networks that are put forward, beside what was found in one node."""
    part, variation = searchable(space, found), case.variation
    low, high = space.fixed_share
    mixes: list[Proposal] = []
    if not brief.fixed or low == high or (brief.target.at_most is not None and not space.fixed_in_parallel):
        best = mixed_proposals(part, need, case.materials, few, effort, variation)
        # Of a part of the space nothing is proved about the whole.
        mixes = list(best) if part == space else [replace(p, space=None) for p in best]
    if brief.fixed and low != high and need.scale is not None:
        # A mixed network is of interest where it beats the total of one node.
        shares = [_fixed_part(p, space) for p in found if p.role in ("least total", "greatest total")]
        start = min(max([low, *shares]) * (1.0 + WORTH), high)
        better = replace(part, fixed_share=(start, high))
        extreme = least_mixed_total(better, need, case.materials, need.scale, effort, variation)
        mixes.extend([] if extreme is None else [extreme])
    return mixes


def _fixed_part(proposal: Proposal, space: Space) -> float:
    """Return the share of the fixed members of a network of one node."""
    own, sign = total_of_space(space)
    ratio: float = value(proposal.network) / own
    return ratio if sign > 0 else 1.0 / ratio


def _for_quantile(
    brief: Brief, need: Requirement, case: Case, few: int, effort: Effort | None
) -> list[Proposal]:
    """Return what is put forward for a quantile: nominal designs, and worst-case ones of smaller boxes.

    A quantile of lots lies between nominal and the worst case: in a box whose sides are a part of the
    limits, the worst case comes near it. Of these the one with the best quantile is taken.
    """
    nominal = replace(brief, goal=replace(brief.goal, judge="nominal"))
    found = proposals(nominal, replace(need, goal=nominal.goal), case, few, effort)
    if not _all_stated(brief) or need.centred:
        return found
    for part in BOX_PARTS:
        variation = Variation(spreads=case.spreads, process=case.process).scaled(part)
        smaller = replace(case, designed=True, spreads=variation.spreads)
        more = proposals(brief, need, smaller, few, effort)
        found.extend(Proposal(network=p.network, role=p.role) for p in more)
    return found


def _all_stated(brief: Brief) -> bool:
    """Whether every material that may be used has a spread."""
    names = {*brief.rules.use, *(member.leg.material for member in brief.fixed)}
    return names <= spreads_of(brief).keys()


def _least_total(space: Space, need: Requirement, case: Case, limit: float) -> Proposal | None:
    """Return the least (in parallel the greatest) total that meets the limit as it is judged.

    Judged on the worst case, the nominal limit that the search works to is lowered until the
    guaranteed worst case meets the limit; it is found by halving, so it is the best of these.
    """
    if case.designed:
        return least_total(space, need, case.materials, limit * KEPT_INSIDE, case.variation)
    first = least_total(space, need, case.materials, limit)
    if first is None or need.goal.judge == "nominal" or _worst(first, case) <= limit:
        return first
    best, low, high = None, 0.0, limit
    for _ in range(14):
        middle = 0.5 * (low + high)
        proposal = least_total(space, need, case.materials, middle)
        if proposal is not None and _worst(proposal, case) > limit:
            high = middle
        else:  # none at all: the limit is below what any total reaches
            best, low = proposal or best, middle
        if high - low <= 1e-3 * limit:
            break
    return best


def _worst(proposal: Proposal, case: Case) -> float:
    worst = spread_figures(proposal.network, case)
    return float("inf") if worst is None else worst.upper_bound_ppm * 1e-6


def floor_evidence(brief: Brief, need: Requirement, figure: float) -> FloorEvidence:
    """Return the evidence for the floor of every network of the brief's materials.

    Parameters
    ----------
    brief : Brief
    need : Requirement
    figure : float
        A figure that one of these networks reaches (a fraction).
    """
    names = used_materials(brief.given) if brief.given is not None else brief.rules.use
    low, high = fixed_share(brief)
    space = Space(
        arrangement=brief.fixed[0].place if brief.fixed else "series",
        materials=tuple(names),
        most=len(names),
        min_share=0.0,
        fixed=tuple(member.leg for member in brief.fixed),
        fixed_share=(low if low == high or brief.target.at_most is not None else 0.0, high),
        fixed_in_parallel=bool(brief.fixed) and brief.fixed[0].place == "parallel",
    )
    return sandwich_evidence(space, need, brief.by_name, figure)
