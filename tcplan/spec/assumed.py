"""What the figures of a plan assume, in sentences: nothing is assumed in silence."""

from __future__ import annotations

from collections.abc import Sequence

from tcplan.plan import Plan
from tcplan.process import process_from_dict, step_groups
from tcplan.spec import numbers
from tcplan.spec.asked import figure_text, wanted_text
from tcplan.units import from_celsius

NOT_INCLUDED = "package stress, ageing, humidity, self-heating, mismatch"

MOST_NAMES = 12


def assumptions(plan: Plan) -> tuple[str, ...]:
    """Return what the figures assume, a sentence each."""
    rise = f" beyond the {numbers.stated(plan.range.rise_K)} K of rise" if plan.range.rise_K else ""
    left_out = NOT_INCLUDED.replace("self-heating", f"self-heating{rise}")
    sentences = (
        figure_text(plan),
        _rounding(plan),
        wanted_text(plan),
        *_spreads(plan),
        f"Not included: {left_out}.",
        _allowances(plan),
        _designed(plan),
    )
    return tuple(sentence for sentence in (*sentences, _extrapolated(plan)) if sentence)


def _rounding(plan: Plan) -> str:
    """Return how coarse the nominal figures are printed."""
    if plan.best.worst_case is None:
        return ""
    return (
        "Nominal ones are rounded to a tenth of their distance to the worst case; plan.json has all digits."
    )


def _allowances(plan: Plan) -> str:
    """Return that the allowances of the brief count in a budget, when there are any."""
    names = [str(row["name"]) for row in plan.brief.get("allowances", ())]
    return f"Allowances count in tcplan budget only: {named(names)}." if names else ""


def _spreads(plan: Plan) -> list[str]:
    """Return the meaning of the spreads: nothing is assumed in silence."""
    stated = {m.name: m.spread for m in plan.materials if m.spread is not None}
    limits = [name for name, spread in stated.items() if spread.meaning == "limits"]
    sigma = [name for name, spread in stated.items() if spread.meaning == "sigma"]
    none = [m.name for m in plan.materials if m.spread is None]
    parts = [
        f"{named(limits)} as stated limits" if limits else "",
        f"{named(sigma)} at 3 times the stated sigma" if sigma else "",
    ]
    found = []
    if stated:
        box = "; ".join(part for part in parts if part)
        found.append(f"The worst case takes every deviation at once: {box}.")
    if none:
        found.append(f"No spread is stated for {named(none)}.")
    found.extend(_counted_as_zero(plan))
    reference = from_celsius(plan.range.reference_degC)
    if any(m.spread is not None and m.spread.value and m.reference != reference for m in plan.materials):
        found.append("Value spreads are carried to the reference of the brief, which widens them a little.")
    found.append(_on_their_own(plan))
    return found


def _on_their_own(plan: Plan) -> str:
    """Return which values are stated to move in full step and count as independent all the same."""
    asked = plan.brief.get("process")
    spreads = {m.name: m.spread for m in plan.materials if m.spread is not None}
    names = tuple(spreads)
    if not asked or len(names) < 2:
        return ""
    process, reference = process_from_dict(asked), from_celsius(plan.range.reference_degC)
    stated = process.value_groups(names)
    counted = step_groups(names, plan.by_name, spreads, process, reference)
    apart = [
        name
        for name, group, own in zip(names, stated, counted, strict=True)
        if stated.count(group) > 1 and counted.count(own) == 1
    ]
    if not apart:
        return ""
    return (
        f"In the worst case the values of {named(apart)} count as independent, though stated to move in full "
        "step: another reference, a width error or an extrapolation is each material's own. That is on the "
        "safe side; draws hold the full step."
    )


def named(names: Sequence[str]) -> str:
    """Return names in words; of many only how many they are."""
    return ", ".join(names) if len(names) <= MOST_NAMES else f"{len(names)} materials"


def _counted_as_zero(plan: Plan) -> list[str]:
    found = []
    for part, words in (("value", "value"), ("tc1", "TC1"), ("tc2", "TC2")):
        names = [m.name for m in plan.materials if m.spread is not None and part in m.spread.unstated]
        if names:
            found.append(f"{words} of {named(names)}")
    return [f"No half-width stated, so counted as 0: {'; '.join(found)}."] if found else []


def _designed(plan: Plan) -> str:
    """Return that the search worked on another figure than the judge, when it did."""
    option = plan.best
    if option.proof.of == plan.limit.judge or option.role == "given":
        return ""
    if plan.limit.judge == "quantile":
        return (
            "Designed for nominal drift and for the worst case of parts of the spread, judged on lots: "
            "another mix may be better there."
        )
    return (
        "Designed for nominal drift, judged on the worst case: a mix that is worse at nominal may be "
        "better there."
    )


def extrapolated(plan: Plan) -> tuple[str, ...]:
    """Return the materials used outside the range in which their law was established."""
    low, high = from_celsius(plan.range.low_degC), from_celsius(plan.range.high_degC)
    return tuple(m.name for m in plan.materials if m.is_extrapolated(low, high))


def _extrapolated(plan: Plan) -> str:
    names = ", ".join(extrapolated(plan))
    return f"EXTRAPOLATED beyond its valid range: {names}." if names else ""
