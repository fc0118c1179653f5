"""The test plan of a spec sheet: temperatures, uncertainty and what is accepted, in words and tables."""

from __future__ import annotations

from collections.abc import Iterator

from tcplan.plan import Plan
from tcplan.spec import numbers
from tcplan.spec.spec import Cell, Section, Table, columns, plan_path, points, words
from tcplan.spec.statements import spread_ppm
from tcplan.spec.test_plan import COVERAGE, SAME, Instruments, Step, TestPlan, test_plan

NONE = "none: the test is not sure enough"


def test_section(plan: Plan, instruments: Instruments) -> Section:
    """Return where the composite is measured and what is accepted there."""
    made = test_plan(plan, instruments)
    at = f"{numbers.stated(plan.range.reference_degC)} degC"
    return Section(
        key="test",
        title="Test plan",
        blocks=(
            *words(
                f"Each device is read at {at} and at every temperature below; drift there is R(T)/R({at}) - 1"
                f"{' less the wanted law' if plan.brief['goal']['wanted'] is not None else ''}. A device is "
                "accepted where its reading is within the limit less the uncertainty of the test."
            ),
            _table(plan, made),
            *points(*_notes(plan, made, instruments)),
        ),
    )


test_section.__test__ = False  # type: ignore[attr-defined]


def _table(plan: Plan, made: TestPlan) -> Table:
    titles = ("temperature", "why there", "nominal, ppm", "worst device, ppm", "slope, ppm/K")
    more = ("limit, ppm", "uncertainty, ppm", "accepted, ppm")
    rows = [_row(plan, step) for step in made.steps]
    if made.band is not None:
        limit, sure = numbers.stated(made.band.limit_ppm), numbers.worst(made.band.uncertainty_ppm)
        cells = ("all", "highest less lowest reading", "-", "-", "-", limit, sure)
        accepted = Cell(text=_accepted(made.band.accepted_ppm, ""))
        rows.append((*(Cell(text=text) for text in cells), accepted))
    return Table(
        caption="Temperatures of the test, and what is accepted",
        head=columns(*titles, *more, numeric="n nnnnnn"),
        rows=tuple(rows),
    )


def _row(plan: Plan, step: Step) -> tuple[Cell, ...]:
    reference, spread = step.is_reference, spread_ppm(plan.best)
    worst = Cell(text="-" if step.worst_ppm is None else _signed(step.worst_ppm, outward=True))
    limit = Cell(text="none") if step.limit_ppm is None else Cell(text=numbers.stated(step.limit_ppm))
    return (
        Cell(text=f"{numbers.number(step.at_degC)} degC", source=_at(plan, step)),
        Cell(text=step.why),
        Cell(text="0" if reference else _signed(step.nominal_ppm, spread)),
        Cell(text="0") if reference and step.worst_ppm is not None else worst,
        Cell(text=numbers.number(step.slope_ppm_per_K, 3)),
        Cell(text="-") if reference else limit,
        Cell(text="-" if reference else numbers.worst(step.uncertainty_ppm)),
        Cell(text="-" if reference or step.accepted_ppm is None else _accepted(step.accepted_ppm, "+/-")),
    )


def _at(plan: Plan, step: Step) -> str:
    """Return where a temperature comes from, when it is one of the range."""
    for key in ("low_degC", "reference_degC", "high_degC"):
        if abs(getattr(plan.range, key) - step.at_degC) < SAME:
            return plan_path("range", key)
    return ""


def _signed(drift_ppm: float, spread: float | None = None, *, outward: bool = False) -> str:
    """Return a drift with its sign: of the nominal device no finer than its spread, else outward."""
    size = abs(drift_ppm)
    text = numbers.worst(size) if outward else numbers.nominal(size, spread)
    if text.startswith("under") or text == "0":
        return text
    return f"-{text}" if drift_ppm < 0 else f"+{text}"


def _accepted(ppm: float, sides: str) -> str:
    text = numbers.bound(ppm)
    return NONE if text == "0" else f"{sides}{text}"


# --- what is said beside it ---------------------------------------------------------------------------


def _notes(plan: Plan, made: TestPlan, instruments: Instruments) -> Iterator[str]:
    meter, kelvin = numbers.stated(instruments.meter_ppm), numbers.stated(instruments.thermometer_K)
    own = (numbers.number(instruments.meter * 1e6, 3), numbers.number(instruments.thermometer, 3))
    yield (
        f"Taken for the test: a meter within {meter} ppm, and the temperature of the element known within "
        f"{kelvin} K: limits of error, as of a rectangle, so {own[0]} ppm and {own[1]} K standard. With "
        "other instruments the accepted figures have to be found again."
    )
    yield (
        "Uncertainty: root-sum-square of two readings of the meter, and of the temperature times the slope "
        f"there and at the reference; coverage {numbers.number(COVERAGE)}. The slope is the larger one of "
        "the nominal and the worst device."
    )
    yield from _value_notes(plan, made)
    yield from _refused(made)
    yield "Read the reference again at the end: a change beyond the uncertainty is not temperature drift."
    if plan.range.rise_K:
        rise = numbers.stated(plan.range.rise_K)
        yield f"Temperatures are those of the element: the high end holds {rise} K of rise above the ambient."


def _refused(made: TestPlan) -> Iterator[str]:
    """Yield where the worst device is within the limit and is refused all the same."""
    found = [
        f"{numbers.number(step.at_degC)} degC"
        for step in made.steps
        if step.worst_ppm is not None
        and step.limit_ppm is not None
        and step.limit_ppm - step.uncertainty_ppm < abs(step.worst_ppm) <= step.limit_ppm
    ]
    if found:
        yield (
            f"At {', '.join(found)} the worst device keeps the limit, but reads beyond what is accepted: a "
            "more certain test, or a wider margin, would pass it."
        )


def _value_notes(plan: Plan, made: TestPlan) -> Iterator[str]:
    sure = numbers.worst(made.value_uncertainty_ppm)
    tolerance = plan.brief["resistor"]["tolerance"]
    if tolerance is None:
        yield f"The value at the reference is recorded; its uncertainty is {sure} ppm."
        return
    accepted = _accepted(tolerance * 1e6 - made.value_uncertainty_ppm, "+/-")
    unit = "" if accepted == NONE else " ppm of the wanted value"
    yield f"The value at the reference: uncertainty {sure} ppm, accepted {accepted}{unit}."
