"""The budget of a spec sheet: everything that moves the value, against the limit, with its margin."""

from __future__ import annotations

from collections.abc import Iterator

from tcplan.budget import Account, Budget
from tcplan.plan import Plan
from tcplan.spec import numbers
from tcplan.spec.budget_text import HEAD, BudgetText, budget_assumptions, budget_text
from tcplan.spec.spec import CAUTIONS, Block, Cell, Section, Table, columns, pointer, points, words

ROOT = "budget#"
"""Stands for the entry ``budget`` of the first of ``budgets`` of ``tcplan budget plan.json --json``."""


def budget_section(plan: Plan, account: Account) -> Section:
    """Return the budget of the chosen option over its own range."""
    text, made = budget_text(plan, account), account.budget
    blocks: tuple[Block, ...] = words(f"{text.head}.")
    if made is not None:
        blocks = (*blocks, _table(text, made), *_summary(made), *points(*_facts(text, made)))
    return Section(key="budget", title="Budget", blocks=blocks)


def _table(text: BudgetText, made: Budget) -> Table:
    rows = []
    for row, (up, down) in zip(text.rows, _sources(made), strict=True):
        name = row.name or "where that side peaks"
        rows.append(
            (
                Cell(text=name),
                Cell(text=row.kind),
                Cell(text=row.up.removeprefix("at "), source=_traced(row.up, up)),
                Cell(text=row.down.removeprefix("at "), source=_traced(row.down, down)),
            )
        )
    return Table(
        caption="What each cause adds to the highest and to the lowest drift, in ppm",
        head=columns(*HEAD, numeric="  nn"),
        rows=tuple(rows),
    )


def _sources(made: Budget) -> Iterator[tuple[str, str]]:
    """Yield where both figures of each row come from, in the order of the rows."""
    yield pointer("at_up_degC"), pointer("at_down_degC")
    for n in range(len(made.rows)):
        yield pointer("rows", n, "up_ppm"), pointer("rows", n, "down_ppm")
    if sum(row.kind == "random" and row.up_ppm is not None for row in made.rows) > 1:
        yield pointer("random_up_ppm"), pointer("random_down_ppm")
    yield pointer("total_up_ppm"), pointer("total_down_ppm")


def _traced(text: str, path: str) -> str:
    """Return the source of a cell that holds a number; nothing for words such as "not known"."""
    return f"{ROOT}{path}" if any(character.isdigit() for character in text) else ""


def _summary(made: Budget) -> tuple[Block, ...]:
    """Return the total, the limit and the margin as a table; nothing without a limit."""
    if made.limit_ppm is None or made.margin_ppm is None:
        return ()
    margin = made.margin_ppm
    size = numbers.bound(margin) if margin >= 0.0 else f"-{numbers.worst(-margin)}"
    total = numbers.worst(made.peak_ppm, made.limit_ppm if made.verdict == "MET" else None)
    rows = (
        ("total", total, "peak_ppm"),
        ("limit", numbers.stated(made.limit_ppm), "limit_ppm"),
        ("margin", size, "margin_ppm"),
    )
    return (
        Table(
            caption="Total, limit and margin, in ppm",
            head=columns("figure", "value", numeric=" n"),
            rows=tuple((Cell(text=n), Cell(text=t, source=f"{ROOT}{pointer(k)}")) for n, t, k in rows),
        ),
    )


def _facts(text: BudgetText, made: Budget) -> Iterator[str]:
    """Yield what is said beside the table, and what the figures assume."""
    for label, lines in text.facts:
        yield from (f"{label}: {line}" for line in lines if line)
    for sentence in budget_assumptions(made):
        if sentence not in CAUTIONS and not sentence.startswith("Figures are design estimates"):
            yield sentence
