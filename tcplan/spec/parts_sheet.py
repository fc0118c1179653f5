"""All that is said of a made plan beside its tables, in the order of a sheet: labels and sentences."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from tcplan.made import FilmLeg, PlainLeg, StockLeg, WireLeg
from tcplan.network import legs as legs_of
from tcplan.network import value
from tcplan.parts.record import MadePlan
from tcplan.spec import numbers
from tcplan.spec.parts_text import against_ideal, buying, cutting, load_text, units_text
from tcplan.spec.spec import CAUTIONS
from tcplan.spec.trim_text import trim_text
from tcplan.units import format_length, format_ohms, format_si, from_celsius

Fact = tuple[str, tuple[str, ...]]
"""A label, and the sentences after it."""


def facts(made: MadePlan) -> tuple[Fact, ...]:
    """Return the labels and sentences of a made plan; those that have nothing to say are left out."""
    several = len(made.parts.made) > 1
    reference = from_celsius(made.plan.range.reference_degC)
    reaches = [s for one in made.parts.made for s in against_ideal(made.ideal, one, several=several)]
    found: Sequence[Fact] = (
        ("Reaches", tuple(reaches)),
        ("Stops", (made.stops,)),
        ("Units", units_text(made.parts.made, made.plan.by_name, reference)),
        ("Buy", buying(made.parts.made, made.loads, made.plan.by_name)),
        ("Cut", cutting(made.parts.made, made.plan.by_name, made.plan.range.reference_degC)),
        ("Carries", tuple(_carries(made))),
        ("Trim", tuple(sentence for trim in made.trims for sentence in trim_text(trim))),
        ("Note", tuple(_notes(made))),
        ("Assumed", ("Figures are design estimates, to be confirmed on silicon or hardware.", *CAUTIONS[1:])),
    )
    return tuple((label, kept) for label, texts in found if (kept := tuple(t for t in texts if t)))


def _carries(made: MadePlan) -> Iterator[str]:
    """Yield the load of every leg, by value where there are several."""
    if not made.loads:
        return
    yield "Each leg at the operating point, the most over the range (voltage, current, power, temperature):"
    for one, loads in zip(made.parts.made, made.loads, strict=True):
        if len(made.loads) > 1:
            yield f"{format_ohms(one.target_ohms)}:"
        yield from load_text(loads)
        yield f"Together {format_si(sum(load.power for load in loads), 'W')} at most."
    asked = made.plan.brief.get("operating") or {}
    if not asked.get("thermal_resistance_K_per_W") and not asked.get("leg_thermal_resistance_K_per_W"):
        yield "No thermal resistance is stated: heating is not judged. Check it: power parts can burn."


def _notes(made: MadePlan) -> Iterator[str]:
    """Yield what is measured from where, and what is not in the figures."""
    legs = [leg for one in made.parts.made for leg in one.legs]
    plain = dict.fromkeys(leg.material for leg in legs if isinstance(leg, PlainLeg))
    given = {str(row["material"]) for row in made.plan.brief["fixed"]}
    for name in plain:
        if made.plan.by_name[name].kind == "film":
            yield f"No unit cell without [material.{name}.film]: {name} stays as it is."
        elif name not in given:
            yield f"No ohm_per_square, ohm_per_metre or series is stated for {name}: it stays as it is."
    if any(isinstance(leg, FilmLeg) for leg in legs):
        yield (
            "W is the drawn width, across the current; L is along it, between the inner edges of the ends. "
            "The area of a unit is its place in the array: with its ends and the spacing, without dummies; "
            "that of a way holds the dummies too."
        )
    if any(leg.wanted_ohms != ideal for leg, ideal in _wanted(made)):
        yield "The mix was found again with the ends in it: legs differ from those of the plan."
    yield _farther(made)
    if any(isinstance(leg, StockLeg) for leg in legs):
        yield "As made, every bought part varies on its own, within its tolerance and its TCR."
    if any(isinstance(leg, WireLeg) for leg in legs):
        cut = format_length(made.parts.details["rules"]["cut_error_m"])
        yield f"As made, the error of a cut, {cut}, is part of the tolerance of the wire."


def _farther(made: MadePlan) -> str:
    """Return that a free total was moved so that what is made keeps the limit."""
    by = made.parts.made[0].target_ohms / value(made.ideal.network) - 1.0
    if made.plan.target.ohms is not None or abs(by) < 1e-9:
        return ""
    return (
        f"The total is free: it was moved by {numbers.signed(float(f'{by * 100.0:.3g}'))} %, so that what is "
        "made keeps the limit with room for the parts."
    )


def _wanted(made: MadePlan) -> Iterator[tuple[FilmLeg, float]]:
    """Yield each film leg of the first value, and what it is in the plan."""
    for leg, ideal in zip(made.parts.made[0].legs, legs_of(made.ideal.network), strict=True):
        if isinstance(leg, FilmLeg):
            yield leg, ideal.ohms
