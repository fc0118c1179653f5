"""A comparison of measured devices with their plan in words and numbers, for the screen.

Long, since it is all the words of a comparison, each function a sentence or a row.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from math import ceil, floor, log10
from typing import Any

from tcplan.measure.comparison import (
    IMPLAUSIBLE,
    Centred,
    Centring,
    Compared,
    Comparison,
    Explanation,
    FoundDeviation,
    Point,
)
from tcplan.network import leg_names, legs
from tcplan.plan import Plan
from tcplan.spec import numbers
from tcplan.spec.compare_data import compared_option
from tcplan.spec.compare_table import compare_table, deviation_name, shown_devices
from tcplan.units import format_celsius, format_ohms, to_celsius

HEAD = ("degC", "drift", "u", "nominal", "lowest", "highest", "band")
DEVIATION_HEAD = ("deviation", "found", "u after", "sigma stated", "sigmas")
LEG_HEAD = ("leg", "material", "planned", "new", "factor")
MOST_ROWS = 16
MOST_PAIRS = 4
NOT_SEEN = 0.9  # of the stated standard deviation left: the readings say nothing of it
PLAUSIBLE, UNUSUAL = 0.05, IMPLAUSIBLE
MOST_CENTRED = 10  # devices with a line of their own about centring
UNITS = {
    "value": (1e2, "%"),
    "tc1": (1e6, "ppm/K"),
    "cold": (1e6, "ppm/K"),
    "hot": (1e6, "ppm/K"),
    "tc2": (1e6, "ppm/K^2"),
    "chamber_offset": (1.0, "K"),
    "chamber_scale": (1e2, "%"),
    "lead": (1.0, "ohm"),
    "meter_scale": (1e6, "ppm"),
}
CAUTION = (
    "Self-heating, ageing, stress and the mismatch of units are not among the deviations: what they do is "
    "explained by the materials, or left over."
)


@dataclass(frozen=True, slots=True, kw_only=True)
class DeviceText:
    """What is printed of one device: a head, the points, the deviations, and what is said of them."""

    head: str
    good: bool
    points: tuple[tuple[str, ...], ...]
    deviations: tuple[tuple[str, ...], ...]
    facts: tuple[tuple[str, tuple[str, ...]], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class CompareText:
    """Everything that is printed of a comparison: of one device all, of several a table and the worst."""

    title: str
    table: tuple[tuple[str, ...], ...]
    count: str
    devices: tuple[DeviceText, ...]
    legs: tuple[tuple[str, ...], ...]
    facts: tuple[tuple[str, tuple[str, ...]], ...]


def compare_text(plan: Plan, comparison: Comparison) -> CompareText:
    """Return what is printed of a comparison; the plan is the one whose options hold what was measured."""
    return CompareText(
        title=f"{plan.brief['title']}, {comparison.name}, measured in {comparison.source}",
        table=compare_table(comparison.devices, comparison.planned) if len(comparison.devices) > 1 else (),
        count=_count(comparison),
        devices=tuple(_device(plan, comparison, one) for one in shown_devices(comparison.devices)),
        legs=tuple(_legs(plan, comparison, comparison.centring)) if comparison.centring else (),
        facts=(("Centring", tuple(_centring(comparison))), ("Assumed", tuple(_assumed(comparison)))),
    )


def _count(comparison: Comparison) -> str:
    """Return how many devices are outside, and of how many the details follow; empty for one device."""
    count = len(comparison.devices)
    if count == 1:
        return ""
    outside = sum(not one.good for one in comparison.devices)
    shown = len(shown_devices(comparison.devices))
    if not outside:
        return f"None of {count} devices is outside. --json holds the details of each."
    which = f"the worst {shown}" if shown < outside else "it" if outside == 1 else "they"
    return f"{outside} of {count} devices outside; in detail {which} below, and each with --json."


# --- one device -----------------------------------------------------------------------------------------


def _device(plan: Plan, comparison: Comparison, one: Compared) -> DeviceText:
    words = {
        "inside": "inside the predicted band",
        "not clear": "outside the predicted band by less than the readings tell",
        "outside": "OUTSIDE the predicted band",
    }
    return DeviceText(
        head=f"{one.device or 'The device'}: {words[one.place]}",
        good=one.good,
        points=tuple(_point(point) for point in _chosen(one)),
        deviations=tuple(_deviation(d) for d in (*one.explanation.deviations, *one.explanation.common)),
        facts=(
            ("Value", (_value(comparison, one),)),
            ("Drift", tuple(_drift(plan, one))),
            ("Explained", tuple(_explained(comparison, one))),
            ("Open", tuple(_open(one.explanation))),
            ("Readings", tuple(_readings(one))),
        ),
    )


def _value(comparison: Comparison, one: Compared) -> str:
    off = one.ohms / comparison.planned - 1.0
    sure = one.ohms_uncertainty / comparison.planned
    at, ohms = format_celsius(comparison.reference), format_ohms(one.ohms, 6)
    told = f"{ohms} at {at}, {_near(1e2 * off, 1e2 * sure, sign=True)} % of the planned "
    told += f"{format_ohms(comparison.planned)}, standard uncertainty {numbers.number(1e6 * sure, 2)} ppm"
    if comparison.tolerance is None:
        return f"{told}; no tolerance is given."
    words = {"inside": "inside", "not clear": "not clearly outside", "outside": "OUTSIDE"}
    return f"{told}: {words[str(one.value_place)]} the tolerance of {numbers.percent(comparison.tolerance)}."


def _drift(plan: Plan, one: Compared) -> Iterator[str]:
    far = one.points[one.farthest]
    at = format_celsius(far.T)
    if one.place == "inside":
        yield f"Nearest to the edge of the band at {at}."
    else:
        edge = far.highest if far.drift > far.highest else far.lowest
        yield (
            f"Farthest outside at {at}, by {numbers.number(1e6 * abs(far.drift - edge), 3)} ppm: "
            f"{numbers.number(far.beyond, 3)} times its uncertainty; from {numbers.number(one.factor, 2)} on "
            "it is outside with 95 % for all points together."
        )
    figure = one.figure
    if figure is None:
        yield "No reading is where the goal asks for something."
        return
    told = f"Judged figure at the readings {_near(1e6 * figure.figure, 1e6 * figure.uncertainty)} ppm, "
    told += f"at {format_celsius(figure.at)}"
    limit = plan.limit.drift_ppm
    if limit is None or figure.place is None:
        yield f"{told}; no limit is given."
        return
    words = {"inside": "within", "not clear": "not clearly over", "outside": "OVER"}
    yield f"{told}: {words[figure.place]} the limit of {numbers.stated(limit)} ppm."


def _explained(comparison: Comparison, one: Compared) -> Iterator[str]:
    explanation = one.explanation
    if not explanation.deviations:
        yield "No material states a spread: there is nothing to explain with."
        return
    spread, misfit = explanation.spread, explanation.misfit
    told = f"Least deviations: {numbers.number(explanation.norm, 3)} sigma together"
    yield (
        f"{told}. {_plausible(spread.probability)} by the stated spreads (chi-square "
        f"{numbers.number(spread.squares, 3)} of {spread.dof}, probability "
        f"{_probability(spread.probability)})."
    )
    left = numbers.number(1e6 * explanation.residual, 2)
    most = numbers.number(1e6 * explanation.largest, 2)
    told = f"Left over: {left} ppm rms, {most} ppm at most"
    if misfit.dof == 0:
        yield f"{told}."
    elif misfit.probability >= UNUSUAL:
        yield f"{told}; that can be noise (probability {_probability(misfit.probability)})."
    else:
        yield (
            f"{told}; MORE than the noise of the readings (probability {_probability(misfit.probability)}): "
            "no deviation of these materials explains it."
        )
    if not comparison.level_known:
        yield "R at the reference was left out: the drift alone explains."


def _plausible(probability: float) -> str:
    if probability >= PLAUSIBLE:
        return "Plausible"
    return "Unusual" if probability >= UNUSUAL else "NOT PLAUSIBLE"


def _probability(probability: float) -> str:
    return "under 0.0001" if probability < 1e-4 else numbers.number(probability, 2)


def _open(explanation: Explanation) -> Iterator[str]:
    unseen = [deviation_name(d) for d in explanation.deviations if d.left >= NOT_SEEN]
    if unseen:
        yield f"The readings say nothing of {_listed(unseen)}."
    for first, second, together in explanation.twins[:MOST_PAIRS]:
        pair = [explanation.deviations[k] for k in (first, second)]
        known = "difference" if together > 0 else "sum"
        yield (
            f"{deviation_name(pair[0])} and {deviation_name(pair[1])} are hardly told apart (correlation "
            f"{together:.3f}): their weighted {known} is known."
        )
    if len(explanation.twins) > MOST_PAIRS:
        yield f"{len(explanation.twins) - MOST_PAIRS} more such pairs; --json lists them."


def _listed(names: Sequence[str]) -> str:
    more = f" and {len(names) - 6} more" if len(names) > 6 else ""
    return ", ".join(names[:6]) + more


def _readings(one: Compared) -> Iterator[str]:
    count = len(one.points)
    if one.by == "fit":
        yield f"R at the reference is from a polynomial of order {one.order}: no reading is there."
    if not one.stated:
        yield "No u(R) is stated: the scatter about a polynomial sets the noise."
    if count > MOST_ROWS:
        yield f"{MOST_ROWS} of {count} are shown; compare.json holds them all."
    if one.left_out:
        yield f"{one.left_out} outside of the range of the plan are left out."


def _chosen(one: Compared) -> list[Point]:
    """Return the points to print: all, or so many evenly, the ends and the farthest among them."""
    count = len(one.points)
    if count <= MOST_ROWS:
        return list(one.points)
    places = {round(k * (count - 1) / (MOST_ROWS - 2)) for k in range(MOST_ROWS - 1)} | {one.farthest}
    return [one.points[k] for k in sorted(places)]


def _point(point: Point) -> tuple[str, ...]:
    sure = 1e6 * point.uncertainty
    digits = _digits(sure)
    place = "inside" if point.beyond <= 0.0 else f"{numbers.number(point.beyond, 2)} u out"
    return (
        numbers.number(round(to_celsius(point.T), 2), 6),
        _fixed(1e6 * point.drift, digits),
        _fixed(sure, digits),
        _fixed(1e6 * point.nominal, digits),
        _fixed(_outward(1e6 * point.lowest, digits, floor), digits),
        _fixed(_outward(1e6 * point.highest, digits, ceil), digits),
        place,
    )


def _deviation(one: FoundDeviation) -> tuple[str, ...]:
    factor, unit = UNITS[one.slot]
    return (
        deviation_name(one),
        f"{_near(factor * one.value, factor * one.uncertainty, sign=True)} {unit}",
        numbers.number(factor * one.uncertainty, 2),
        numbers.number(factor * one.sigma, 3),
        f"{one.sigmas:+.2f}",
    )


# --- rounding -------------------------------------------------------------------------------------------


def _digits(uncertainty: float) -> int:
    """Return the decimals to print a figure with: to the second digit of its uncertainty, 6 at most."""
    return min(6, max(0, 1 - floor(log10(uncertainty)))) if uncertainty > 1e-9 else 2


def _fixed(value: float, digits: int) -> str:
    return f"{round(value, digits) + 0.0:.{digits}f}"


def _near(value: float, uncertainty: float, *, sign: bool = False) -> str:
    text = _fixed(value, _digits(uncertainty))
    return f"+{text}" if sign and value > 0.0 else text


def _outward(value: float, digits: int, to: Any) -> float:
    """Return an edge of the band rounded outward, what is rounding of arithmetic left aside."""
    scale = 10.0**digits
    return float(to(round(value * scale, 6))) / scale


# --- what would centre it -------------------------------------------------------------------------------


def _legs(plan: Plan, comparison: Comparison, centring: Centring) -> Iterator[tuple[str, ...]]:
    own = legs(compared_option(plan, comparison).network)
    for name, leg, ohms, factor in zip(
        leg_names(len(own)), own, centring.ohms, centring.factors, strict=True
    ):
        yield name, leg.material, format_ohms(leg.ohms, 5), format_ohms(ohms, 5), f"{factor:.5f}"


def _centring(comparison: Comparison) -> Iterator[str]:
    centring = comparison.centring
    if centring is None:
        yield comparison.why_not
        return
    worst = sorted(centring.devices, key=lambda one: -one.after)
    if len(worst) == 1:
        yield _centred(worst[0])
    else:
        yield from _centred_devices(worst)
    if centring.left_out:
        yield f"The mean is without {_listed(centring.left_out)}: the materials do not explain it."
    whose = "of the mean device " if len(worst) > 1 else ""
    levels = {
        "planned": f"becomes the planned {format_ohms(centring.value)}",
        "kept": f"stays at {format_ohms(centring.value)}",
    }
    yield f"R {whose}at the reference {levels[centring.level]}."
    yield "Of all values within 1 % of the least figure these change least."
    yield "Counts and stock are not made again."
    if centring.limited:
        yield (
            "A leg stops at the largest change looked at, a factor of 4, or near it: another network may be "
            "better."
        )


def _centred_devices(worst: Sequence[Centred]) -> Iterator[str]:
    """Yield a line for each of the first, and what is true of all; the largest after comes first."""
    for one in worst[:MOST_CENTRED]:
        yield (
            f"{one.device}: {numbers.number(1e6 * one.before, 4)} ppm as planned, "
            f"{numbers.number(1e6 * one.after, 4)} new, {numbers.number(1e6 * one.uncertainty, 2)} open"
            f"{'' if one.clear else ': no clear gain'}."
        )
    if len(worst) > MOST_CENTRED:
        yield f"{len(worst) - MOST_CENTRED} more devices have less with the new values; --json lists them."
    if unclear := sum(not one.clear for one in worst):
        yield f"{unclear} of {len(worst)} devices have no clear gain."
    if worst[0].after >= max(one.before for one in worst):
        yield "The largest figure of all devices is not smaller: only that of the mean device is."


def _centred(one: Centred) -> str:
    left = numbers.number(1e6 * one.uncertainty, 2)
    told = (
        f"{one.device or 'The device'} as explained: {numbers.number(1e6 * one.before, 4)} ppm as "
        f"planned, {numbers.number(1e6 * one.after, 4)} ppm with the new values; the readings leave "
        f"{left} ppm open"
    )
    return f"{told}." if one.clear else f"{told}: no clear gain."


def _assumed(comparison: Comparison) -> Iterator[str]:
    yield "Sigma is the stated one, a third of normal limits, or a rectangular limit over the root of 3."
    if comparison.unspread:
        yield f"No spread is stated for {', '.join(comparison.unspread)}: taken as exact."
    yield CAUTION
