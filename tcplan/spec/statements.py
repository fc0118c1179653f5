"""What a plan says, in sentences: the same words on the screen and on every spec sheet."""

from __future__ import annotations

import math

from tcplan.network import used_materials, value
from tcplan.plan import Deviation, Likely, Option, Plan
from tcplan.spec import numbers
from tcplan.units import format_ohms

ROUNDING = 1e-9
SIZE_WORDS = {"film": "sheet resistance", "wire": "resistance per metre"}


# --- the outcome ------------------------------------------------------------------------------


def nominal_ppm(option: Option) -> float:
    """Return the nominal figure that the limit is set on [ppm]."""
    return option.nominal.figure_ppm


def spread_ppm(option: Option) -> float | None:
    """Return how far the worst case is from nominal [ppm]; None when it is not known."""
    return None if option.worst_case is None else option.worst_case.peak_ppm - nominal_ppm(option)


def nominal_text(plan: Plan, option: Option) -> str:
    """Return the nominal figure without its unit."""
    limit = plan.limit.drift_ppm if plan.limit.judge == "nominal" else None
    return numbers.nominal(nominal_ppm(option), spread_ppm(option), limit)


def worst_text(plan: Plan, option: Option) -> str:
    """Return the worst case without its unit; with its guaranteed bound where that differs."""
    worst = option.worst_case
    if worst is None:
        return "not stated"
    limit = plan.limit.drift_ppm if option.verdict == "MET" and plan.limit.judge == "worst-case" else None
    found, most = numbers.worst(worst.peak_ppm, limit), numbers.worst(worst.upper_bound_ppm, limit)
    return found if found == most else f"{found} (at most {most})"


def likely_text(plan: Plan, option: Option) -> str:
    """Return the quantile of the lots without its unit."""
    if option.likely is None:
        return "not stated"
    limit = plan.limit.drift_ppm if option.verdict == "MET" and plan.limit.judge == "quantile" else None
    return numbers.worst(option.likely.peak_ppm, limit)


def fraction_text(plan: Plan) -> str:
    """Return the fraction of lots that a quantile is of."""
    return f"{numbers.number(plan.limit.quantile * 100.0, 6)} %"


def likely_lots(plan: Plan, option: Option) -> str:
    """Return what draws of lots say, and no more than their number supports; empty without spreads."""
    likely = option.likely
    if likely is None:
        return ""
    high = "more" if likely.high_ppm is None else numbers.worst(likely.high_ppm)
    between = f"{numbers.bound(likely.low_ppm)} to {high} at 95 % confidence"
    found = f"{fraction_text(plan)} of lots stay within {likely_text(plan, option)} ppm ({between})"
    if likely.inside is not None and likely.inside_low is not None:
        found += f"; {_inside(likely)} of lots meet the limit"
    return f"{found}; {likely.draws} draws, seed {likely.seed}."


def _inside(likely: Likely) -> str:
    """Return how many lots are inside, as far as the draws tell."""
    if likely.inside_low:
        return f"at least {_at_least(likely.inside_low)}"
    return f"at most {math.ceil((likely.inside_high or 0.0) * 1e4) / 100:g} %"


def _at_least(fraction: float) -> str:
    """Return a fraction in percent, rounded down."""
    return f"{math.floor(fraction * 1e4) / 100:g} %"


def corners_text(option: Option) -> str:
    """Return the figure of every named process corner; empty without any."""
    return ", ".join(f"{name} {numbers.worst(ppm)} ppm" for name, ppm in option.corners.items())


def floor_ppm(plan: Plan) -> float:
    """Return the floor of the figure that the brief judges [ppm]; none is known of a quantile."""
    if plan.limit.judge == "quantile":
        return 0.0
    worst = plan.floor.worst_case_ppm
    return worst if plan.limit.judge == "worst-case" and worst is not None else plan.floor.nominal_ppm


def cannot_be_met(plan: Plan) -> bool:
    """Whether the floor proves that no network of these materials meets the limit."""
    limit = plan.limit.drift_ppm
    return limit is not None and floor_ppm(plan) > limit * (1.0 + ROUNDING)


def outcome(plan: Plan) -> tuple[str, ...]:
    """Return by how much the limit is met or not, and what else the verdict needs beside it."""
    limit, option = plan.limit.drift_ppm, plan.best
    found = []
    if limit is not None:
        found.append(_against_limit(plan, option, limit))
    if cannot_be_met(plan):
        bottom = numbers.bound(floor_ppm(plan), limit)
        found.append(f"No network of these materials can meet it: the floor is {bottom} ppm.")
    if option.verdict == "MET" and plan.limit.judge == "nominal":
        found.extend(_nominal_only(plan, option, limit))
    found.extend(_value_deviation(plan, option))
    return tuple(found)


def _against_limit(plan: Plan, option: Option, limit: float) -> str:
    if plan.limit.judge == "quantile":
        return _quantile_against(plan, option, limit)
    at_worst = plan.limit.judge == "worst-case"
    if at_worst and option.worst_case is None:
        missing = ", ".join(without_spread(plan, option))
        return f"{option.id} is not judged: no spread is stated for {missing}."
    stop = f"the limit of {numbers.stated(limit)} ppm"
    if option.verdict == "NOT JUDGED":
        return f"{option.id} is not judged: its worst case, {worst_text(plan, option)} ppm, may pass {stop}."
    if at_worst and option.worst_case:
        figure, reached = option.worst_case.peak_ppm, f"{worst_text(plan, option)} ppm in the worst case"
    else:
        figure, reached = nominal_ppm(option), f"{nominal_text(plan, option)} ppm at nominal"
        reached += f" and {worst_text(plan, option)} ppm in the worst case" if option.worst_case else ""
    if option.verdict == "MET":
        return f"{option.id} reaches {reached}; {stop} is met{'' if at_worst else ' at nominal'}."
    return f"{option.id} reaches {reached}, {numbers.worst(figure - limit)} ppm over {stop}."


def _quantile_against(plan: Plan, option: Option, limit: float) -> str:
    if option.likely is None:
        missing = ", ".join(without_spread(plan, option))
        return f"{option.id} is not judged: no spread is stated for {missing}."
    stop = f"the limit of {numbers.stated(limit)} ppm"
    reached = f"{fraction_text(plan)} of lots within {likely_text(plan, option)} ppm"
    if option.verdict == "MET":
        return f"{option.id} keeps {reached}; {stop} is met."
    if option.verdict == "NOT JUDGED":
        return f"{option.id} is not judged: it keeps {reached}, and {stop} is too near for {_draws(option)}."
    over = numbers.worst(option.likely.peak_ppm - limit)
    return f"{option.id} keeps {reached}, {over} ppm over {stop}."


def _draws(option: Option) -> str:
    return f"{option.likely.draws} draws" if option.likely else "draws"


def _nominal_only(plan: Plan, option: Option, limit: float | None) -> list[str]:
    if option.worst_case is None:
        missing = ", ".join(without_spread(plan, option))
        return [f"That is at nominal only: no spread is stated for {missing}."]
    if limit is None or option.worst_case.upper_bound_ppm <= limit:
        return []
    return ["That is at nominal only: the worst case is over the limit."]


def _value_deviation(plan: Plan, option: Option) -> list[str]:
    own, wanted = value(option.network), plan.target.ohms
    if wanted is None:
        return [f"The total is {format_ohms(own)}."]
    deviation = own / wanted - 1.0
    if abs(deviation) <= ROUNDING:
        return []
    side = "above" if deviation > 0 else "below"
    return [
        f"The network's own value is {format_ohms(own)}, {numbers.percent(abs(deviation))} "
        f"{side} the {format_ohms(wanted)} asked for."
    ]


def without_spread(plan: Plan, option: Option) -> tuple[str, ...]:
    """Return the materials of an option that have no spread."""
    return tuple(n for n in used_materials(option.network) if plan.by_name[n].spread is None)


# --- floor, choice, proof ---------------------------------------------------------------------


def floor_text(plan: Plan) -> str:
    """Return the floor and why."""
    floor = plan.floor
    bounds = {"nominal": floor.nominal_ppm, "worst case": floor.worst_case_ppm or 0.0}
    above = [f"{text} ppm {of}" for of, ppm in bounds.items() if (text := numbers.bound(ppm)) != "0"]
    if above:
        said = f"No network of these materials is below {' and '.join(above)}"
    else:
        said = "No floor above zero is proved for these materials"
    missing = "; worst case not stated" if floor.worst_case_ppm is None else ""
    return f"{said}{missing} ({floor.why})."


def reason(plan: Plan) -> str:
    """Return why the chosen option is chosen."""
    option = plan.best
    if option.role == "given":
        return "the network that was given"
    if option.role:
        # Not searched for what is judged, it is found by halving a nominal limit: not proved the least.
        found = "" if option.proof.of == plan.limit.judge else " of those found"
        return f"the {option.role}{found} that meets the limit"
    if plan.limit.drift_ppm is None:
        words = {"worst-case": "worst case", "quantile": "quantile of those found"}
        return f"the least {words.get(plan.limit.judge, 'nominal figure')}"
    if option.verdict == "MET":
        return "the simplest that meets the limit"
    if all(o.verdict == "NOT JUDGED" for o in plan.options):
        return "the best of those found; none could be judged"
    return "the best of those found; none meets the limit"


def proof_text(plan: Plan, option: Option) -> str:
    """Return what is proved about an option; "proved" is about the data."""
    proof = option.proof
    if proof.kind == "global":
        gap = numbers.nominal(proof.gap_ppm, None)
        within = f"on {proof.of} figures and within the rules of the brief ({_rules(plan)})"
        return f"{_proved(option)}, {within}; gap {gap} ppm."
    found = "Given, not searched" if option.role == "given" else "Best found"
    which = "no network of these materials" if option.role == "given" else "no such network"
    above = numbers.bound(proof.lower_bound_ppm)
    if above == "0":
        return f"{found}; no bound above zero is proved."
    return f"{found}; {which} is below {above} ppm {proof.of}."


def _proved(option: Option) -> str:
    """Return what is proved: with a free total, about the totals on its side only."""
    side = {"least total": "or less", "greatest total": "or more"}.get(option.role)
    if side is None:
        return f"Proved optimal among {option.arrangement} networks for these data"
    return f"Proved for these data: no {option.arrangement} network of this total {side} drifts less"


def _rules(plan: Plan) -> str:
    rules = plan.brief["search"]
    share = rules["min_share"]
    least = f", shares of {numbers.percent(share)} or more" if share else ""
    return f"at most {min(rules['max_materials'], rules['max_legs'])} chosen materials{least}"


# --- the worst point, and centring --------------------------------------------------------------


def worst_point(plan: Plan, option: Option) -> str:
    """Return where the worst case is reached, and with what device; empty without a worst case."""
    worst = option.worst_case
    if worst is None:
        return ""
    devices = [f"{name} {text}" for name, d in worst.point.items() if (text := _deviation(plan, name, d))]
    return f"{numbers.number(worst.at_degC)} degC, with {'; '.join(devices) or 'nominal materials'}."


def _deviation(plan: Plan, name: str, at: Deviation) -> str:
    size = SIZE_WORDS.get(plan.by_name[name].kind, "value")
    parts = [
        f"{size} {numbers.signed((at.ohm_per_square - 1.0) * 100.0)} %" if at.ohm_per_square != 1.0 else "",
        f"TC1 {numbers.signed(at.tc1)} ppm/K" if at.tc1 else "",
        f"TC2 {numbers.signed(at.tc2)} ppm/K^2" if at.tc2 else "",
    ]
    return ", ".join(part for part in parts if part)


def movers(plan: Plan, option: Option) -> tuple[str, ...]:
    """Return the deviations that matter most, and what each alone adds to the worst case."""
    if option.worst_case is None:
        return ()
    words = {"tc1": "TC1", "tc2": "TC2"}
    return tuple(
        f"{words.get(m.parameter, SIZE_WORDS.get(plan.by_name[m.material].kind, 'value'))} of {m.material} "
        f"({numbers.worst(m.ppm)} ppm)"
        for m in option.worst_case.movers
    )


def centring(plan: Plan, option: Option) -> str:
    """Return the offset of the value that centres the drift, and what remains."""
    spread = spread_ppm(option)
    offset = numbers.nominal(abs(option.nominal.centring_ppm), spread)
    at = f"R({numbers.stated(plan.range.reference_degC)} degC)"
    if offset.startswith("under"):
        return f"The offset of {at} that centres the nominal drift is {offset} ppm: nothing to gain."
    left = numbers.nominal(option.nominal.centred_peak_ppm, spread)
    side = "above" if option.nominal.centring_ppm > 0 else "below"
    beside = "; the spread adds to it" if spread else ""
    made = f"With {at} made {offset} ppm {side} its target"
    return f"{made}, R stays within +/-{left} ppm of it (nominal{beside})."
