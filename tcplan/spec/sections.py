"""From a checked plan and its budget to the spec sheet: the sections, in the order in which they are read."""

from __future__ import annotations

from tcplan.budget import Account
from tcplan.network import legs, network_text, value
from tcplan.plan import SCHEMA, Option, Plan
from tcplan.ranges import GRADES
from tcplan.spec import asked, numbers, statements
from tcplan.spec.assumed import assumptions
from tcplan.spec.budget_text import budget_text
from tcplan.spec.rows import leg_sizes, option_row
from tcplan.spec.sections_budget import budget_section
from tcplan.spec.sections_data import formula_section, materials_section
from tcplan.spec.sections_drift import drift_section, yield_section
from tcplan.spec.sections_mix import mix_section
from tcplan.spec.sections_tests import test_section
from tcplan.spec.spec import (
    CAUTIONS,
    Cell,
    Picture,
    Section,
    Spec,
    Table,
    Words,
    columns,
    plan_path,
    points,
    words,
)
from tcplan.spec.test_plan import Instruments
from tcplan.units import format_ohms


def spec_of(
    plan: Plan, account: Account, *, instruments: Instruments | None = None, date: str | None = None
) -> Spec:
    """Return the spec sheet of the chosen option of a plan.

    Parameters
    ----------
    plan : Plan
    account : Account
        The budget of its chosen option over its own range.
    instruments : Instruments, optional
        What it is tested with; usual ones when not given.
    date : str, optional
        Printed as it is; no date when not given, so that the same plan gives the same bytes.

    Returns
    -------
    Spec
        Every number in it comes from the plan, or from what is computed of it here.
    """
    sections = (
        _requirement(plan, account),
        _network(plan),
        mix_section(plan),
        drift_section(plan),
        _choice(plan),
        budget_section(plan, account),
        yield_section(plan),
        materials_section(plan),
        formula_section(plan),
        test_section(plan, instruments or Instruments()),
        Section(
            key="assumptions",
            title="Assumptions and cautions",
            blocks=points(*assumptions(plan), *CAUTIONS),
        ),
        _provenance(plan, date),
    )
    return Spec(
        title=str(plan.brief["title"]),
        headline=asked.headline(plan),
        verdict=asked.verdict(plan),
        sections=sections,
    )


# --- what is asked ------------------------------------------------------------------------------------


def _requirement(plan: Plan, account: Account) -> Section:
    """Return what is asked and whether it is met, the verdict first."""
    budget = budget_text(plan, account)
    return Section(
        key="requirement",
        title="Requirement and verdict",
        blocks=(
            Words(text=asked.headline(plan), strong=True),
            *words(*statements.outcome(plan), f"Budget of {budget.head}."),
            Table(caption="What is asked", head=columns("requirement", "asked"), rows=_asked_rows(plan)),
        ),
    )


def _asked_rows(plan: Plan) -> tuple[tuple[Cell, ...], ...]:
    rows = [
        ("value at the reference", _value(plan)),
        ("tolerance of the value", _tolerance(plan)),
        ("limit", Cell(text=asked.asked_limit(plan))),
        *(("line of the mask", Cell(text=line)) for line in asked.mask_lines(plan)),
        ("limit as a drift", _limit(plan)),
        ("judged on", Cell(text=_judge(plan))),
        *_range_rows(plan),
    ]
    if plan.brief["goal"]["wanted"] is not None:
        rows += [
            ("wanted TC1", _cell(plan.target.tc1_ppm_per_K, "ppm/K", "target", "tc1_ppm_per_K")),
            ("wanted TC2", _cell(plan.target.tc2_ppm_per_K2, "ppm/K^2", "target", "tc2_ppm_per_K2")),
        ]
    return tuple((Cell(text=name), cell) for name, cell in rows)


def _value(plan: Plan) -> Cell:
    source = plan_path("target", "ohms") if plan.target.ohms is not None else ""
    return Cell(text=asked.asked_value(plan), source=source)


def _tolerance(plan: Plan) -> Cell:
    tolerance = plan.brief["resistor"]["tolerance"]
    if tolerance is None:
        return Cell(text="not stated")
    source = plan_path("brief", "resistor", "tolerance")
    return Cell(text=f"+/-{numbers.percent(tolerance)}", source=source)


def _limit(plan: Plan) -> Cell:
    limit = plan.limit.drift_ppm
    if limit is None:
        return Cell(text="none")
    return Cell(text=f"{numbers.stated(limit)} ppm", source=plan_path("limit", "drift_ppm"))


def _judge(plan: Plan) -> str:
    words_of = {"worst-case": "the worst case", "quantile": f"{statements.fraction_text(plan)} of lots"}
    return words_of.get(plan.limit.judge, "the nominal figure")


def _range_rows(plan: Plan) -> list[tuple[str, Cell]]:
    over = plan.range
    rows = [
        ("lowest temperature", _cell(over.low_degC, "degC", "range", "low_degC")),
        ("highest temperature", _cell(over.high_degC, "degC", "range", "high_degC")),
        ("reference temperature", _cell(over.reference_degC, "degC", "range", "reference_degC")),
    ]
    if over.rise_K:
        rows.append(("rise, included at the high end", _cell(over.rise_K, "K", "range", "rise_K")))
    if over.name in GRADES:
        rows.append(("named range", Cell(text=f"{over.name}, {GRADES[over.name].standard}")))
    return rows


def _cell(number: float, unit: str, *path: str) -> Cell:
    return Cell(text=f"{numbers.stated(number)} {unit}", source=plan_path(*path))


# --- the network, and why it is chosen ----------------------------------------------------------------


def _network(plan: Plan) -> Section:
    option = plan.best
    text = network_text(option.network, lambda leg: f"{leg.material} {format_ohms(leg.ohms)}")
    one = len(legs(option.network)) == 1
    seen = f"Schematic: one leg, {text}." if one else f"Schematic of {text}, + is series, || is parallel."
    return Section(
        key="network",
        title="Network",
        blocks=(
            *words(f"{option.id}, {statements.reason(plan)}: {text}.", _total(plan)),
            Picture(name="network", alt=seen, caption="Network of the chosen option."),
        ),
    )


def _total(plan: Plan) -> str:
    at = f"{numbers.stated(plan.range.reference_degC)} degC"
    return f"Total {format_ohms(value(plan.best.network))} at {at}."


def _choice(plan: Plan) -> Section:
    return Section(
        key="choice",
        title="Why this option",
        blocks=(
            *words(
                f"{plan.chosen} is {statements.reason(plan)}.",
                statements.proof_text(plan, plan.best),
                statements.floor_text(plan),
            ),
            _options(plan),
            *points(*plan.notes),
            Picture(
                name="slope-curvature",
                alt="TC1 and TC2 of the materials and of the options, with contours of equal peak drift.",
                caption="Slope and curvature of the materials and of the mix.",
            ),
        ),
    )


def _options(plan: Plan) -> Table:
    titles = ("option", "network", "size", "nominal, ppm", f"{statements.fraction_text(plan)} of lots, ppm")
    return Table(
        caption="The options, best first, and what they cost",
        head=columns(*titles, "worst case, ppm", "verdict", numeric="   nnn"),
        rows=tuple(_option_cells(plan, n, option) for n, option in enumerate(plan.options)),
    )


def _option_cells(plan: Plan, n: int, option: Option) -> tuple[Cell, ...]:
    row = option_row(plan, option)
    worst = plan_path("options", n, "worst_case", "peak_ppm") if option.worst_case else ""
    likely = plan_path("options", n, "likely", "peak_ppm") if option.likely else ""
    sizes = row.sizes if any(leg_sizes(plan, option)) else "not stated"
    return (
        Cell(text=f"{row.id}{' (chosen)' if row.chosen else ''}", source=plan_path("options", n, "id")),
        Cell(text=row.network, code=True),
        Cell(text=sizes),
        Cell(text=row.nominal, source=plan_path("options", n, "nominal", "figure_ppm")),
        Cell(text=row.likely or "not stated", source=likely),
        Cell(text=row.worst_case, source=worst),
        Cell(text=row.verdict),
    )


# --- where it comes from ------------------------------------------------------------------------------


def _provenance(plan: Plan, date: str | None) -> Section:
    rows = [
        (Cell(text="brief, sha256"), _code(str(plan.brief["sha256"]), "brief", "sha256")),
        (Cell(text="tcplan, version"), _code(plan.tcplan, "tcplan")),
        (Cell(text="plan.json, schema"), Cell(text=str(SCHEMA), source=plan_path("schema"))),
        (Cell(text="option"), _code(plan.chosen, "chosen")),
        (Cell(text="drawn lots"), Cell(text=_drawn(plan.best))),
        *([(Cell(text="date"), Cell(text=date))] if date else []),
    ]
    return Section(
        key="provenance",
        title="Provenance",
        blocks=(Table(caption="What it was made of", head=columns("record", "content"), rows=tuple(rows)),),
    )


def _code(text: str, *path: str) -> Cell:
    return Cell(text=text, source=plan_path(*path), code=True)


def _drawn(option: Option) -> str:
    return f"{option.likely.draws}, seed {option.likely.seed}" if option.likely else "none"
