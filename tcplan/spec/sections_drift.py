"""The drift of a spec sheet, nominal, likely and worst, with temperatures; and the yield."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from math import ceil, floor

from tcplan.plan import Likely, Plan
from tcplan.spec import numbers, statements
from tcplan.spec.asked import figure_text, longer_arm_K
from tcplan.spec.sections_mix import NOT_STATED, chosen_path
from tcplan.spec.spec import Block, Cell, Picture, Section, Table, columns, plan_path, words

Row = tuple[Cell, Cell, Cell]
NOWHERE = Cell(text="-")


def drift_section(plan: Plan) -> Section:
    """Return the temperature drift of the chosen option."""
    option = plan.best
    movers = "; ".join(statements.movers(plan, option))
    worst = statements.worst_point(plan, option)
    return Section(
        key="drift",
        title="Temperature drift",
        blocks=(
            *words(figure_text(plan)),
            Table(
                caption="Temperature drift of the chosen option",
                head=columns("figure", "value", "at", numeric=" nn"),
                rows=(*_judged_rows(plan), *_nominal_rows(plan)),
            ),
            *words(
                f"Worst point: {worst}" if worst else "",
                f"What moves it most, each undone alone: {movers}." if movers else "",
                statements.centring(plan, option),
            ),
            *_pictures(plan),
        ),
    )


def _pictures(plan: Plan) -> Iterator[Block]:
    yield Picture(
        name="drift",
        alt="Curves of drift over temperature: each material alone, the chosen option and the best others; "
        "below, the chosen option at its own scale, with its limits and its worst case.",
        caption="Drift over temperature.",
    )
    if plan.best.likely is not None:
        yield Picture(
            name="spread",
            alt="Curves of drawn lots over temperature with the limits and the worst case; below, how many "
            "lots have which judged figure.",
            caption="Drawn lots over temperature, and how their judged figure is distributed.",
        )


def _judged_rows(plan: Plan) -> Iterator[Row]:
    """Yield the figure that the limit is set on: nominal, likely, worst, and at the corners."""
    option, worst, lots = plan.best, plan.best.worst_case, statements.fraction_text(plan)
    nominal = Cell(
        text=f"{statements.nominal_text(plan, option)} ppm",
        source=chosen_path(plan, "nominal", "figure_ppm"),
    )
    yield Cell(text="judged figure, nominal"), nominal, NOWHERE
    likely = Cell(text=NOT_STATED)
    if option.likely is not None:
        text = f"{statements.likely_text(plan, option)} ppm"
        likely = Cell(text=text, source=chosen_path(plan, "likely", "peak_ppm"))
    yield Cell(text=f"judged figure, {lots} of lots"), likely, NOWHERE
    if worst is None:
        yield Cell(text="judged figure, worst case"), Cell(text=NOT_STATED), NOWHERE
    else:
        how = "exact" if worst.method == "exact" else "found by search, with its bound"
        text = f"{statements.worst_text(plan, option)} ppm"
        found = Cell(text=text, source=chosen_path(plan, "worst_case", "peak_ppm"))
        yield (
            Cell(text=f"judged figure, worst case ({how})"),
            found,
            _at(plan, worst.at_degC, "worst_case", "at_degC"),
        )
    for name, ppm in option.corners.items():
        source = chosen_path(plan, "corners_ppm", name)
        yield (
            Cell(text=f"judged figure, corner {name}"),
            Cell(text=f"{numbers.worst(ppm)} ppm", source=source),
            NOWHERE,
        )


def _nominal_rows(plan: Plan) -> Iterator[Row]:
    """Yield the drift, band and TCR of the nominal network, no finer than the spread supports."""
    nominal, spread = plan.best.nominal, statements.spread_ppm(plan.best)
    per_K = None if spread is None else spread / longer_arm_K(plan)

    def row(name: str, key: str, figure: float, unit: str, at: Cell = NOWHERE) -> Row:
        text = f"{numbers.nominal(figure, spread if unit == 'ppm' else per_K)} {unit}"
        return Cell(text=f"{name}, nominal"), Cell(text=text, source=chosen_path(plan, "nominal", key)), at

    where = _at(plan, nominal.at_degC, "nominal", "at_degC")
    yield row("peak drift", "peak_ppm", nominal.peak_ppm, "ppm", where)
    yield row("band", "band_ppm", nominal.band_ppm, "ppm")
    yield row("box TCR", "box_tcr_ppm_per_K", nominal.box_tcr_ppm_per_K, "ppm/K")
    low, high = (_at(plan, getattr(plan.range, key), "", key) for key in ("low_degC", "high_degC"))
    if nominal.chord_cold_ppm_per_K is not None:
        yield row("chord TCR, cold", "chord_cold_ppm_per_K", nominal.chord_cold_ppm_per_K, "ppm/K", low)
    if nominal.chord_hot_ppm_per_K is not None:
        yield row("chord TCR, hot", "chord_hot_ppm_per_K", nominal.chord_hot_ppm_per_K, "ppm/K", high)


def _at(plan: Plan, degC: float, record: str, key: str) -> Cell:
    source = chosen_path(plan, record, key) if record else plan_path("range", key)
    return Cell(text=f"{numbers.number(degC)} degC", source=source)


# --- yield --------------------------------------------------------------------------------------------


def yield_section(plan: Plan) -> Section:
    """Return what drawn lots say: the quantile, and the part of the lots within the limit."""
    likely = plan.best.likely
    if likely is None:
        missing = ", ".join(statements.without_spread(plan, plan.best))
        blocks: tuple[Block, ...] = words(f"Not known: no spread is stated for {missing}.")
    else:
        table = Table(
            caption=f"Drawn lots: {likely.draws} draws, seed {likely.seed}",
            head=columns("figure", "value", numeric=" n"),
            rows=tuple(_yield_rows(plan, likely)),
        )
        told = "Of the spreads stated only; allowances are not drawn."
        blocks = (*words(f"{statements.likely_lots(plan, plan.best)} {told}"), table)
    return Section(key="yield", title="Yield", blocks=blocks)


def _yield_rows(plan: Plan, likely: Likely) -> Iterator[tuple[Cell, Cell]]:
    def row(name: str, text: str, key: str) -> tuple[Cell, Cell]:
        return Cell(text=name), Cell(text=text, source=chosen_path(plan, "likely", key))

    share = statements.fraction_text(plan)
    yield row(f"{share} of lots stay within", f"{statements.likely_text(plan, plan.best)} ppm", "peak_ppm")
    yield row("95 % interval of that, from", f"{numbers.bound(likely.low_ppm)} ppm", "low_ppm")
    if likely.high_ppm is not None:
        yield row("95 % interval of that, to", f"{numbers.worst(likely.high_ppm)} ppm", "high_ppm")
    if likely.inside is None or likely.inside_low is None or likely.inside_high is None:
        return
    yield row("drawn lots within the limit", _percent(likely.inside, floor), "inside")
    yield row("exact 95 % interval of that, from", _percent(likely.inside_low, floor), "inside_low")
    yield row("exact 95 % interval of that, to", _percent(likely.inside_high, ceil), "inside_high")


def _percent(fraction: float, towards: Callable[[float], int]) -> str:
    """Return a fraction in percent, to a thousandth, rounded one way."""
    return f"{numbers.number(towards(round(fraction * 1e5, 6)) / 1e3, 6)} %"
