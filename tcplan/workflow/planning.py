"""From a brief to its plan: every proposal checked, ranked, and the floor of them all."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from tcplan import __version__
from tcplan.brief import Brief
from tcplan.effort import Effort
from tcplan.errors import InputError, NoAnswer, Problem, Stopped
from tcplan.goal import requirement
from tcplan.network import legs, network_text, used_materials, value
from tcplan.plan import LimitRecord, Option, Plan, Proposal, RangeRecord, TargetRecord
from tcplan.units import format_ohms, format_ppm, format_si, from_celsius, round_outward
from tcplan.verify.floor import floor
from tcplan.verify.option import Case, check, nominal_figure, proved, with_likely
from tcplan.verify.tree_bound import mixed_bound
from tcplan.workflow.proposals import (
    designed_for_worst_case,
    fixed_share,
    floor_evidence,
    left_out,
    proposals,
    spreads_of,
)

STOPPED = "Stopped early: the best of what was searched until then."
MOST_LEGS_FOR_MORE = 4  # mixed networks of more legs than that are long work
MOST_FOR_MORE = 20  # materials up to which one more is tried as well
EQUAL = 1.01  # an option that a simpler one equals within this factor is dropped


def judged_ppm(option: Option, judge: str) -> float:
    """Return the figure that the brief judges [ppm]; infinite where there is none."""
    if judge == "nominal":
        return option.nominal.figure_ppm
    if judge == "quantile":
        return option.likely.peak_ppm if option.likely else float("inf")
    return option.worst_case.peak_ppm if option.worst_case else float("inf")


def _mixed_ppm(checked: Sequence[tuple[Proposal, Option]], case: Case, gap: float) -> float:
    """Return the bound of the mixed networks that were searched [ppm]; 0 when there are none."""
    mixed = [(p, o) for p, o in checked if p.space is not None and p.space.arrangement == "mixed"]
    if not mixed or mixed[0][0].space is None:
        return 0.0
    near = [o for _, o in sorted(mixed, key=lambda pair: pair[1].proof.figure_ppm)[:4]]
    devices = [
        (from_celsius(o.worst_case.at_degC), {n: d.ohm_per_square for n, d in o.worst_case.point.items()})
        for o in near
        if o.worst_case is not None
    ]
    # The limits of mixed networks are the simple ones: the best of all is what can be proved.
    best = min(o.proof.figure_ppm for _, o in checked) * 1e-6
    space, networks = mixed[0][0].space, [o.network for o in near]
    return 1e6 * mixed_bound(
        space,
        case.need,
        case.materials,
        networks,
        best,
        gap,
        case.variation,
        devices if case.designed else (),
    )


def _nothing_fits(brief: Brief) -> str:
    """Return that nothing is left of the search, with the rules that can be the reason."""
    rules, kinds = brief.rules, {material.kind for material in brief.materials}
    low, high = (format_ohms(ohms) for ohms in rules.stock_values)
    candidates = (
        (
            "film" in kinds,
            f"min_squares = {rules.min_squares:g} and max_squares = {rules.max_squares:g} a leg",
        ),
        (rules.max_area is not None, f"max_area = {format_si(rules.max_area or 0.0, 'm^2')}"),
        (
            "wire" in kinds and rules.min_length > 0.0,
            f"min_length = {format_si(rules.min_length, 'm')} a leg",
        ),
        ("part" in kinds, f"stock_values from {low} to {high}"),
        (rules.min_share > 0.0, f"min_share = {100.0 * rules.min_share:g} %"),
        (bool(brief.fixed), "the fixed members"),
    )
    total = "" if brief.target.ohms is None else f" for {format_ohms(brief.target.ohms)}"
    stated = "; ".join(words for is_asked, words in candidates if is_asked)
    return (
        f"No network of these materials fits the brief{total}, in the arrangements "
        f"{', '.join(rules.arrangements)}. What it must keep: {stated or 'the number of legs'}. "
        "Change the value, or one of these in [search]."
    )


def _shortlist(options: Sequence[Option], judge: str) -> tuple[Option, ...]:
    """Return the options worth showing, best first.

    Dropped: a network that is there already with other values, one that a simpler one equals
    within 1 %, and one that another beats in all of judged figure, area, legs and materials. One that
    meets the limit never gives way to one that does not.
    """
    order = sorted(
        options, key=lambda o: (judged_ppm(o, judge), o.nominal.figure_ppm, len(legs(o.network)), o.id)
    )
    kept: list[Option] = []
    for option in sorted(order, key=lambda o: len(legs(o.network))):  # simpler ones first
        same = any(_structure(o) == _structure(option) for o in kept)
        if option.role or not (same or any(_makes_needless(o, option, judge) for o in kept)):
            kept.append(option)
    return tuple(option for option in order if option in kept)


def _structure(option: Option) -> tuple[str, str]:
    """Return what an option is without its values: two of one structure are two ways to size it."""
    return option.role, network_text(option.network, lambda leg: leg.material)


def _makes_needless(other: Option, option: Option, judge: str) -> bool:
    """Whether a kept option leaves no reason to show another one."""
    if option.verdict == "MET" and other.verdict != "MET":
        return False
    judged = judged_ppm(other, judge), judged_ppm(option, judge)
    nominal = other.nominal.figure_ppm, option.nominal.figure_ppm
    fewer = len(legs(other.network)) < len(legs(option.network))
    equals = judged[0] <= EQUAL * judged[1] and nominal[0] <= EQUAL * nominal[1]
    if fewer and equals:
        return True
    smaller = other.area is not None and option.area is not None and other.area < option.area
    fewer_materials = len(used_materials(other.network)) < len(used_materials(option.network))
    return fewer and smaller and fewer_materials and judged[0] < judged[1]


def _chosen(options: Sequence[Option], judge: str, *, free: bool) -> Option:
    """Return the simplest option that meets the limit, else the best one; of a free total the least."""
    met = [o for o in options if o.verdict == "MET"]
    totals = [o for o in met if o.role in ("least total", "greatest total")]
    if totals and free:
        return min(totals, key=lambda o: value(o.network) * (1 if o.role == "least total" else -1))
    if met:
        return min(met, key=lambda o: (len(legs(o.network)), judged_ppm(o, judge)))
    return options[0]


# --- the plan -------------------------------------------------------------------------------------


def make_plan(brief: Brief, *, gap: float = 0.01, effort: Effort | None = None) -> Plan:
    """Return the plan of a brief: searched, or given, and every option checked.

    Parameters
    ----------
    brief : Brief
    gap : float
        Relative gap within which mixed networks are to be proved; smaller takes longer.
    effort : Effort, optional
        Who does the work of the mixed search, and who is told of its progress.

    Raises
    ------
    NoAnswer
        When no network fits the brief at all.
    Stopped
        When the mixed search was interrupted; it carries the plan of the best so far.

    Examples
    --------
    >>> from pathlib import Path
    >>> from tcplan.brief import read_brief
    >>> plan = make_plan(read_brief(Path("examples/cabinet_reference_wire/brief.toml")))
    >>> plan.best.id, plan.best.verdict, round(plan.best.nominal.peak_ppm)
    ('series-1', 'MET', 159)
    """
    if brief.ratio is not None:
        raise InputError(
            Problem(
                where="ratio",
                found="a brief with [ratio]",
                expected="a resistor",
                todo="Check it as a ratio.",
            )
        )
    effort = effort or Effort()
    need = requirement(brief.goal, brief.over)
    case = Case(
        materials=brief.by_name,
        spreads=spreads_of(brief),
        over=brief.over,
        need=need,
        process=brief.process,
        designed=designed_for_worst_case(brief, need),
    )
    found = proposals(brief, need, case, effort=effort)
    if not found:
        raise NoAnswer(_nothing_fits(brief))
    best = min(nominal_figure(proposal.network, case) for proposal in found)
    evidence = floor_evidence(brief, need, best)
    names = {*evidence.space.materials, *(leg.material for leg in evidence.space.fixed)}
    stated = case.spreads if names <= case.spreads.keys() else None
    bottom = floor(evidence, need, case.materials, stated, best)
    case = replace(
        case,
        floor_ppm=(bottom.worst_case_ppm or 0.0) if case.designed else bottom.nominal_ppm,
        gap=gap,
    )
    checked = [(proposal, check(proposal, case, str(n))) for n, proposal in enumerate(found, 1)]
    case = replace(case, mixed_ppm=effort.unless_stopped(lambda: _mixed_ppm(checked, case, gap), 0.0))
    options = _shortlist([proved(option, p, case) for p, option in checked], brief.goal.judge)
    options = tuple(
        replace(with_likely(option, case), id=_option_id(options, n)) for n, option in enumerate(options)
    )
    none: tuple[str, ...] = ()
    more = effort.unless_stopped(lambda: _one_more(brief, case, options), none)
    plan = Plan(
        tcplan=__version__,
        brief=brief.to_dict(),
        range=_range_record(brief),
        target=_target_record(brief),
        limit=LimitRecord(
            kind=need.kind,
            drift_ppm=None if need.scale is None else need.scale * 1e6,
            judge=brief.goal.judge,
            quantile=brief.goal.quantile,
        ),
        materials=brief.materials,
        floor=bottom,
        chosen=_chosen(options, brief.goal.judge, free=_is_free(brief)).id,
        options=options,
        notes=(
            *([STOPPED] if effort.stopped else []),
            *left_out(brief, found),
            *more,
            *_largest_total(brief, options),
        ),
    )
    if effort.stopped:
        raise Stopped("the best so far is shown", best=plan)
    return plan


def _is_free(brief: Brief) -> bool:
    """Whether the total is what is looked for, beside fixed members."""
    return bool(brief.fixed) and brief.target.ohms is None and brief.target.at_most is None


def _largest_total(brief: Brief, options: Sequence[Option]) -> tuple[str, ...]:
    """Return how far a free total was searched, when none of them meets the limit."""
    low, high = fixed_share(brief)
    if low == high or brief.target.at_most is not None or any(o.verdict == "MET" for o in options):
        return ()
    if brief.fixed[0].place == "series":
        return (f"Totals up to {1.0 / low:.0f} times the fixed members were searched.",)
    return (f"Totals down to 1/{1.0 / low:.0f} of the fixed members were searched.",)


def _one_more(brief: Brief, case: Case, options: Sequence[Option]) -> tuple[str, ...]:
    """Return a line on what one more material would give; none where that is long work."""
    rules, judge = brief.rules, brief.goal.judge
    low, high = fixed_share(brief)
    if (
        brief.given is not None
        or low != high
        or not 0 < rules.max_materials < len(rules.use) <= MOST_FOR_MORE
    ):
        return ()
    most = rules.max_materials + 1
    quick = rules.max_legs < MOST_LEGS_FOR_MORE
    kinds = tuple(kind for kind in rules.arrangements if quick or kind != "mixed")
    wider = replace(
        brief,
        rules=replace(rules, max_materials=most, max_legs=max(rules.max_legs, most), arrangements=kinds),
    )
    if not kinds:
        return ()
    shown = {option.network for option in options}
    best = min(judged_ppm(option, judge) for option in options)
    found = [
        check(proposal, case, "more")
        for proposal in proposals(wider, case.need, case, 1)
        if proposal.network not in shown
    ]
    better = [option for option in found if judged_ppm(option, judge) * EQUAL < best]
    if not better:
        return (f"One more material ({most}) gives no better {judge} figure of those searched.",)
    option = min(better, key=lambda o: judged_ppm(o, judge))
    names = ", ".join(used_materials(option.network))
    size = f"{len(legs(option.network))} legs of {names}"
    return (f"With one more material ({most}): {option.arrangement}, {size}, {_both(option)}.",)


def _both(option: Option) -> str:
    """Return the nominal and the worst figure in words.

    The first is never said alone where both are known.
    """
    nominal = f"{format_ppm(round_outward(option.nominal.figure_ppm * 1e-6))} nominal"
    if option.worst_case is None:
        return f"{nominal}, its worst case not stated"
    return f"{nominal}, {format_ppm(round_outward(option.worst_case.peak_ppm * 1e-6))} worst case"


def _option_id(options: Sequence[Option], position: int) -> str:
    """Return an id such as parallel-2: the arrangement, and its rank among its own."""
    option = options[position]
    if option.role == "given":
        return "given"
    same = [o for o in options[: position + 1] if o.arrangement == option.arrangement]
    return f"{option.arrangement}-{len(same)}"


def _range_record(brief: Brief) -> RangeRecord:
    over = brief.over
    return RangeRecord(
        name=over.name,
        low_degC=over.low_degC,
        high_degC=over.high_degC,
        reference_degC=over.reference_degC,
        rise_K=over.rise,
    )


def _target_record(brief: Brief) -> TargetRecord:
    wanted = brief.goal.wanted
    tc1, tc2 = wanted.taylor(brief.over.reference, 2) if wanted else (0.0, 0.0)
    return TargetRecord(
        ohms=brief.target.ohms if brief.target.ohms is not None else _own_total(brief),
        tc1_ppm_per_K=tc1 * 1e6,
        tc2_ppm_per_K2=tc2 * 1e6,
    )


def _own_total(brief: Brief) -> float | None:
    return value(brief.given) if brief.given is not None else None
