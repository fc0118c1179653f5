"""The mix of a spec sheet: its legs, and what they are made of where there are parts."""

from __future__ import annotations

from collections.abc import Iterator

from tcplan.made import FilmLeg, MadeLeg
from tcplan.material.model import Material
from tcplan.network import leg_names, legs, shares, value
from tcplan.plan import MadeValue, Plan
from tcplan.spec import numbers
from tcplan.spec.parts_text import against_ideal, made_of
from tcplan.spec.rows import leg_sizes
from tcplan.spec.spec import Block, Cell, Section, Table, columns, plan_path, words
from tcplan.units import format_length, format_ohms

NOT_STATED = "not stated"


def mix_section(plan: Plan) -> Section:
    """Return the legs of the chosen option, with their parts where the plan has them."""
    total = format_ohms(value(plan.best.network))
    at = f"{numbers.stated(plan.range.reference_degC)} degC"
    return Section(
        key="mix",
        title="Mix",
        blocks=(
            Table(
                caption=f"The legs; values at {at}, total {total}",
                head=columns("leg", "material", "value", "share", "tolerance", "size", numeric="  nn"),
                rows=tuple(_leg_rows(plan)),
            ),
            *words(
                "Values here have 4 digits; mix.csv and plan.json have all of them. The tolerance is the "
                "spread of the value of the material.",
            ),
            *_parts(plan),
        ),
    )


def chosen_path(plan: Plan, *keys: str | int) -> str:
    """Return where a number of the chosen option comes from."""
    n = [option.id for option in plan.options].index(plan.chosen)
    return plan_path("options", n, *keys)


def _leg_rows(plan: Plan) -> Iterator[tuple[Cell, ...]]:
    option = plan.best
    own = legs(option.network)
    rows = zip(leg_names(len(own)), own, shares(option.network), leg_sizes(plan, option), strict=True)
    for n, (name, leg, share, size) in enumerate(rows):
        squares = chosen_path(plan, "legs", n, "squares") if option.squares[n] is not None else ""
        yield (
            Cell(text=name),
            Cell(text=leg.material, source=chosen_path(plan, "legs", n, "material"), code=True),
            Cell(text=format_ohms(leg.ohms), source=chosen_path(plan, "legs", n, "ohms")),
            Cell(text=numbers.percent(share), source=chosen_path(plan, "legs", n, "share")),
            tolerance(plan.by_name[leg.material]),
            Cell(text=size or NOT_STATED, source=squares),
        )


def tolerance(material: Material) -> Cell:
    """Return the spread of the value of a material, with its meaning."""
    spread = material.spread
    if spread is None or spread.value is None:
        return Cell(text=NOT_STATED)
    half = numbers.percent(spread.value)
    text = f"sigma {half}" if spread.meaning == "sigma" else f"+/-{half}"
    return Cell(text=text, source=plan_path("materials", material.name, "spread", "value"))


# --- parts --------------------------------------------------------------------------------------------


def _parts(plan: Plan) -> Iterator[Block]:
    """Yield what the legs are made of, a table for each value; nothing when it is not made yet."""
    parts = plan.parts
    if parts is None:
        return
    if parts.option != plan.chosen:
        yield from words(f"The parts of the plan are those of {parts.option}, so they are not shown here.")
        return
    for n, made in enumerate(parts.made):
        yield Table(
            caption=f"What is made of it, for {format_ohms(made.target_ohms)}",
            head=columns(
                "leg", "material", "wanted", "made", "of", "W of a unit", "L of a unit", numeric="  nn nn"
            ),
            rows=tuple(_made_row(leg, n, k) for k, leg in enumerate(made.legs)),
        )
        yield from words(*_reached(plan, made))


def _made_row(leg: MadeLeg, n: int, k: int) -> tuple[Cell, ...]:
    def at(key: str) -> str:
        return plan_path("parts", "made", n, "legs", k, key)

    none = Cell(text="-")
    width, length = none, none
    if isinstance(leg, FilmLeg):
        width = Cell(text=format_length(leg.unit.width), source=at("width_m"))
        length = Cell(text=format_length(leg.unit.length), source=at("length_m"))
    return (
        Cell(text=leg.id),
        Cell(text=leg.material, source=at("material"), code=True),
        Cell(text=format_ohms(leg.wanted_ohms), source=at("wanted_ohms")),
        Cell(text=format_ohms(leg.ohms), source=at("ohms")),
        Cell(text=made_of(leg)),
        width,
        length,
    )


def _reached(plan: Plan, made: MadeValue) -> tuple[str, ...]:
    """Return what is made beside the ideal one, with its own verdict."""
    verdict = (
        f"As made: {made.option.verdict}." if plan.limit.drift_ppm is not None else "As made: no limit given."
    )
    return (" ".join([verdict, *against_ideal(plan.best, made)]),)
