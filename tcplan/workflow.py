"""The short compositions that users and the command line both call."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from tcplan import __version__
from tcplan.brief import Brief, parse_brief
from tcplan.errors import InputError, NoAnswer, Problem
from tcplan.goal import Requirement, requirement
from tcplan.material.files import published, read_materials
from tcplan.material.law import Law, chord_tcr
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import arrangement, legs, symbolic, used_materials, value
from tcplan.output import check_folder, write_files
from tcplan.plan import (
    FloorEvidence,
    LimitRecord,
    Option,
    Plan,
    Proposal,
    RangeRecord,
    Space,
    TargetRecord,
    plan_json,
)
from tcplan.search.floor import floor_evidence
from tcplan.search.linear import least_total, search_space
from tcplan.units import format_ppm, from_celsius, round_outward
from tcplan.verify.floor import floor
from tcplan.verify.option import Case, check, nominal_figure, spread_figures

FEW = 3
EQUAL = 1.01  # an option that a simpler one equals within this factor is dropped
TINY_SHARE = 1e-4  # of the fixed members, when the total is free


def spreads_of(brief: Brief) -> dict[str, Spread]:
    """Return the spread of each material that states one, over the range of the brief."""
    found = {m.name: m.effective_spread(brief.over.low, brief.over.high) for m in brief.materials}
    return {name: spread for name, spread in found.items() if spread is not None}


def spaces(brief: Brief) -> tuple[Space, ...]:
    """Return the sets of networks that the brief asks to search, one an arrangement."""
    rules, fixed = brief.rules, tuple(member.leg for member in brief.fixed)
    return tuple(
        Space(
            arrangement=kind,
            materials=rules.use,
            most=1 if kind == "single" else min(rules.max_materials, rules.max_legs),
            min_share=0.0 if kind == "single" else rules.min_share,
            fixed=fixed,
            fixed_share=_fixed_share(brief),
        )
        for kind in rules.arrangements
    )


def _fixed_share(brief: Brief) -> tuple[float, float]:
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


def _proposals(brief: Brief, need: Requirement, case: Case, few: int = FEW) -> list[Proposal]:
    """Return what the search, or the user, puts forward: the best few of each arrangement."""
    if brief.given is not None:
        return [Proposal(network=brief.given, role="given")]
    found: list[Proposal] = []
    for space in spaces(brief):
        low, high = space.fixed_share
        parallel = space.arrangement == "parallel"
        bounded = not brief.fixed or low == high or (brief.target.at_most is not None and not parallel)
        if bounded:
            mixes = search_space(space, need, case.materials, brief.target.ohms, few)
            # A mix that has shrunk to one leg is what the single arrangement is for.
            alone = "single" in brief.rules.arrangements and space.arrangement != "single"
            found.extend(m for m in mixes if not (alone and arrangement(m.network) == "single"))
        if brief.fixed and low != high and need.scale is not None:
            extreme = _least_total(space, need, case, need.scale)
            if extreme is not None:
                found.append(extreme)
            elif not bounded:  # no total meets the limit: show how near the best one comes
                found.extend(search_space(space, need, case.materials, None, 1))
    return found


def _least_total(space: Space, need: Requirement, case: Case, limit: float) -> Proposal | None:
    """Return the least (in parallel the greatest) total that meets the limit as it is judged.

    Judged on the worst case, the nominal limit that the search works to is lowered until the
    guaranteed worst case meets the limit; it is found by halving, so it is the best of these.
    """
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


def _floor_evidence(brief: Brief, need: Requirement, figure: float) -> FloorEvidence:
    names = used_materials(brief.given) if brief.given is not None else brief.rules.use
    space = Space(
        arrangement=brief.fixed[0].place if brief.fixed else "series",
        materials=tuple(names),
        most=len(names),
        min_share=0.0,
        fixed=tuple(member.leg for member in brief.fixed),
        fixed_share=_fixed_share(brief),
    )
    return floor_evidence(space, need, brief.by_name, figure)


# --- ranking --------------------------------------------------------------------------------------


def judged_ppm(option: Option, judge: str) -> float:
    """Return the figure that the brief judges [ppm]; infinite where there is no worst case."""
    if judge == "nominal":
        return option.proof.figure_ppm
    return option.worst_case.peak_ppm if option.worst_case else float("inf")


def _shortlist(options: Sequence[Option], judge: str) -> tuple[Option, ...]:
    """Return the options worth showing, best first.

    Dropped: a network that is there already, and one that a simpler one equals within 1 %.
    """
    order = sorted(
        options, key=lambda o: (judged_ppm(o, judge), o.proof.figure_ppm, len(legs(o.network)), o.id)
    )
    kept: list[Option] = []
    for option in order:
        figure = (judged_ppm(option, judge), option.proof.figure_ppm)
        simpler = [o for o in order if len(legs(o.network)) < len(legs(option.network)) and not o.role]
        beaten = any(
            judged_ppm(o, judge) <= EQUAL * figure[0] and o.proof.figure_ppm <= EQUAL * figure[1]
            for o in simpler
        )
        same = any(o.network == option.network for o in kept)
        if option.role or not (beaten or same):
            kept.append(option)
    return tuple(kept)


def _chosen(options: Sequence[Option], judge: str) -> Option:
    """Return the simplest option that meets the limit, else the best one."""
    met = [o for o in options if o.verdict == "MET"]
    totals = [o for o in met if o.role in ("least total", "greatest total")]
    if totals:
        return totals[0]
    if met:
        return min(met, key=lambda o: (len(legs(o.network)), judged_ppm(o, judge)))
    return options[0]


# --- the plan -------------------------------------------------------------------------------------


def make_plan(brief: Brief) -> Plan:
    """Return the plan of a brief: searched, or given, and every option checked.

    Raises
    ------
    NoAnswer
        When no network fits the brief at all.
    """
    need = requirement(brief.goal, brief.over)
    case = Case(materials=brief.by_name, spreads=spreads_of(brief), over=brief.over, need=need)
    proposals = _proposals(brief, need, case)
    if not proposals:
        raise NoAnswer(
            "No network of these materials fits the brief: what min_share and the fixed members ask "
            "for adds up to more than the whole."
        )
    best = min(nominal_figure(proposal.network, case) for proposal in proposals)
    evidence = _floor_evidence(brief, need, best)
    names = {*evidence.materials, *(leg.material for leg in evidence.fixed)}
    stated = case.spreads if names <= case.spreads.keys() else None
    bottom = floor(evidence, need, case.materials, stated, best)
    case = replace(case, floor_ppm=bottom.nominal_ppm)
    options = _shortlist(
        [check(proposal, case, str(n)) for n, proposal in enumerate(proposals, 1)], brief.goal.judge
    )
    options = tuple(replace(option, id=_option_id(options, n)) for n, option in enumerate(options))
    return Plan(
        tcplan=__version__,
        brief=brief.to_dict(),
        range=_range_record(brief),
        target=_target_record(brief),
        limit=LimitRecord(
            kind=need.kind,
            drift_ppm=None if need.scale is None else need.scale * 1e6,
            judge=brief.goal.judge,
        ),
        materials=brief.materials,
        floor=bottom,
        chosen=_chosen(options, brief.goal.judge).id,
        options=options,
        notes=_one_more(brief, case, options),
    )


def _one_more(brief: Brief, case: Case, options: Sequence[Option]) -> tuple[str, ...]:
    """Return a line on what one more material would give, when that is better by more than 1 %."""
    rules = brief.rules
    most = min(rules.max_materials, rules.max_legs) + 1
    low, high = _fixed_share(brief)
    if brief.given is not None or most > len(rules.use) or low != high:
        return ()
    wider = replace(brief, rules=replace(rules, max_materials=most, max_legs=most))
    judge = brief.goal.judge
    best = min(judged_ppm(option, judge) for option in options)
    found = [
        check(proposal, case, "more")
        for proposal in _proposals(wider, case.need, case, 1)
        if len(legs(proposal.network)) - len(brief.fixed) == most
    ]
    better = [option for option in found if judged_ppm(option, judge) * EQUAL < best]
    if not better:
        return (f"One more material ({most}) gives no better {judge} figure in the networks searched.",)
    option = min(better, key=lambda o: judged_ppm(o, judge))
    names = ", ".join(used_materials(option.network))
    figure = format_ppm(round_outward(judged_ppm(option, judge) * 1e-6))
    return (f"One more material ({most}): {option.arrangement} of {names} reaches {figure} ({judge}).",)


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


# --- files and the smaller commands ---------------------------------------------------------------

PLAN_FILES = (
    "plan.json",
    "mix.csv",
    "spec.md",
    "drift.svg",
    "drift.png",
    "slope-curvature.svg",
    "slope-curvature.png",
)


def write_plan(plan: Plan, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write plan.json, mix.csv, spec.md and the figures of a plan, all of them or none.

    Parameters
    ----------
    plan : Plan
    folder : Path
        Made when it does not exist.
    force : bool
        Whether files that exist may be replaced.

    Returns
    -------
    tuple of Path
        The files, in the order of ``PLAN_FILES``.

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written.
    """
    from tcplan.figures.files import figure_files
    from tcplan.spec.markdown import spec_markdown
    from tcplan.spec.mix_csv import mix_csv

    check_folder(folder, PLAN_FILES, force=force)
    texts = {"plan.json": plan_json(plan), "mix.csv": mix_csv(plan), "spec.md": spec_markdown(plan)}
    contents = {**{name: text.encode() for name, text in texts.items()}, **figure_files(plan)}
    return write_files(folder, {name: contents[name] for name in PLAN_FILES}, force=force)


def brief_from_bytes(content: bytes, folder: Path) -> Brief:
    """Return the checked brief that came in on standard input.

    Parameters
    ----------
    content : bytes
        TOML, UTF-8 with or without a byte order mark.
    folder : Path
        What the names of materials files are relative to.
    """
    name = "standard input"
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as fault:
        found = f"bytes that are not UTF-8 text (at byte {fault.start + 1})"
        raise InputError(Problem(where=name, found=found, expected="TOML text in UTF-8")) from fault
    return parse_brief(text, name, folder)


def materials_of(name: str) -> dict[str, Material]:
    """Return the materials of a file, or of a set that comes with tcplan: ``published:NAME``."""
    prefix = "published:"
    return published(name.removeprefix(prefix)) if name.startswith(prefix) else read_materials(Path(name))


@dataclass(frozen=True, slots=True, kw_only=True)
class Coefficients:
    """TC1 [1/K] and TC2 [1/K^2] about ``reference`` [K]; each chord is (temperature [K], TCR [1/K])."""

    reference: float
    tc1: float
    tc2: float
    chords: tuple[tuple[float, float], ...]


def coefficients_at(law: Law, reference: float, chords_to: Sequence[float] = ()) -> Coefficients:
    """Return the coefficients of a law about another reference, and its chord TCRs from there.

    Parameters
    ----------
    law : Law
    reference : float
        Where the coefficients are wanted [K].
    chords_to : sequence of float
        Temperatures to which the chord TCR is wanted [K].
    """
    moved = law.referred_to(reference)
    tc1, tc2 = moved.taylor(reference, 2)
    chords = tuple((at, chord_tcr(moved, at, reference)) for at in chords_to)
    return Coefficients(reference=reference, tc1=tc1, tc2=tc2, chords=chords)


def symbolic_formula(plan: Plan) -> str:
    """Return R(T) [ohm] of the chosen option as one formula of T [K], made by sympy."""
    option, reference = plan.best, from_celsius(plan.range.reference_degC)
    names = used_materials(option.network)
    ratios = {name: plan.by_name[name].law.referred_to(reference).symbolic() for name in names}
    return str(symbolic(option.network, ratios))
