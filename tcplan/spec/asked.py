"""What was asked, in sentences: value, limit, range, and what the figures are."""

from __future__ import annotations

from tcplan.plan import Plan
from tcplan.ranges import GRADES
from tcplan.spec import numbers
from tcplan.units import format_ohms


def headline(plan: Plan) -> str:
    """Return what was asked and the verdict, in one line."""
    low, high = (numbers.stated(t) for t in (plan.range.low_degC, plan.range.high_degC))
    lots = f"{numbers.number(plan.limit.quantile * 100.0, 6)} % of lots"
    judge = {"worst-case": "worst case", "quantile": lots}.get(plan.limit.judge, "nominal")
    return f"{asked_value(plan)}, {asked_limit(plan)} ({judge}), {low} to {high} degC: {verdict(plan)}"


def verdict(plan: Plan) -> str:
    """Return the verdict of the chosen option, or that there is no limit to judge by."""
    return plan.best.verdict if plan.limit.drift_ppm is not None else "no limit given"


def asked_value(plan: Plan) -> str:
    """Return the wanted total."""
    if plan.target.ohms is not None:
        return format_ohms(plan.target.ohms)
    most = plan.brief["resistor"]["at_most_ohms"]
    return "free total" if most is None else f"at most {format_ohms(most)}"


def asked_limit(plan: Plan) -> str:
    """Return the limits as they were stated."""
    limits = plan.brief["goal"]["limits"]
    return " and ".join(_limit(limit) for limit in limits) if limits else "least drift"


def _limit(limit: dict[str, object]) -> str:
    kind = str(limit["kind"])
    words = {"chord_tcr": "chord TCR", "box_tcr": "box TCR"}.get(kind, kind)
    if kind == "mask":
        return "drift inside its mask"
    unit = "ppm/K" if "ppm_per_K" in limit else "ppm"
    amount = numbers.stated(float(str(limit.get("ppm_per_K", limit.get("ppm")))))
    return f"{words} within {amount} {unit}"


def mask_lines(plan: Plan) -> tuple[str, ...]:
    """Return the lines of a mask; empty without one."""
    return tuple(
        f"{numbers.stated(w['low_degC'])} to {numbers.stated(w['high_degC'])} degC: "
        f"{numbers.stated(w['limit_ppm'])} ppm"
        for limit in plan.brief["goal"]["limits"]
        for w in limit["windows"]
    )


def range_text(plan: Plan) -> str:
    """Return the range with its numbers, its name, its standard and the reference."""
    over = plan.range
    low, high, reference = (numbers.stated(t) for t in (over.low_degC, over.high_degC, over.reference_degC))
    grade = GRADES.get(over.name)
    origin = f" ({over.name}, {grade.standard})" if grade else ""
    rise = f", {numbers.stated(over.rise_K)} K of rise included at the high end" if over.rise_K else ""
    return f"{low} to {high} degC{origin}{rise}, reference {reference} degC"


def wanted_text(plan: Plan) -> str:
    """Return the wanted law; empty when it is flat."""
    if plan.brief["goal"]["wanted"] is None:
        return ""
    tc1, tc2 = numbers.number(plan.target.tc1_ppm_per_K), numbers.number(plan.target.tc2_ppm_per_K2)
    return f"Drift is counted from the wanted law, TC1 {tc1} ppm/K and TC2 {tc2} ppm/K^2 at the reference."


def figure_text(plan: Plan) -> str:
    """Return what the figures in ppm are, for the kind of limit that was given."""
    span, arm = plan.range.high_degC - plan.range.low_degC, longer_arm_K(plan)
    words = {
        "none": "the peak drift over the whole range",
        "drift": "the peak drift over the whole range",
        "band": "the band, highest minus lowest drift",
        "box_tcr": f"the band; divided by {numbers.stated(span)} K it is the box TCR",
        "chord_tcr": f"the larger chord TCR times {numbers.stated(arm)} K, the longer arm",
        "mask": "the drift, scaled to the tightest line of the mask",
    }
    first = plan.limit.kind.split(" and ")[0]
    several = (
        "; of several limits, each on the scale of this one, the largest" if first != plan.limit.kind else ""
    )
    scale = plan.limit.drift_ppm
    against = (
        f", against {numbers.stated(scale)} ppm" if scale is not None and plan.limit.kind != "drift" else ""
    )
    return f"Figures are {words[first]}{several}{against}."


def longer_arm_K(plan: Plan) -> float:  # noqa: N802 - K is the unit
    """Return the distance from the reference to the further end of the range [K]."""
    over = plan.range
    return max(over.high_degC - over.reference_degC, over.reference_degC - over.low_degC)
