"""``tcplan budget``: everything that moves the value, against the limit."""

from __future__ import annotations

import sys
import textwrap
from typing import TYPE_CHECKING

import click

from tcplan.cli.exits import DONE, NOT_MET
from tcplan.cli.paragraphs import COLOURS, labelled, wrapped
from tcplan.cli.talk import colourful, say, say_json, width

if TYPE_CHECKING:
    from collections.abc import Sequence

    from tcplan.brief import Brief
    from tcplan.budget import Account, Draws
    from tcplan.plan import Plan
    from tcplan.spec.budget_text import BudgetText

STDIN = "-"
LABEL = 9
MOST_PLAN_BYTES = 2_000_000

EXAMPLES = """\
\b
Examples:
  tcplan budget brief-plan/plan.json
  tcplan budget brief.toml --range automotive-1 --range=-40:85
  tcplan budget plan.json --materials revision-d.toml --all
  tcplan plan brief.toml --json | tcplan budget - --precision "1 %"
"""


@click.command(
    "budget", short_help="Show everything that moves the value, against the limit.", epilog=EXAMPLES
)
@click.argument("file")
@click.option(
    "--range", "ranges", metavar="RANGE", multiple=True, help="A named range, LOW:HIGH in degC, or all."
)
@click.option("--materials", metavar="FILE", help="New data for the plan's materials: old, new, change.")
@click.option("--as-made", is_flag=True, help="Of the parts of the plan, not of its options.")
@click.option("--all", "every", is_flag=True, help="Every option of the plan, not only the chosen one.")
@click.option("--draws", type=int, default=20_000, show_default=True, help="Lots to draw; 0 for none.")
@click.option("--seed", type=click.IntRange(0), default=1, show_default=True, help="Of the draws.")
@click.option("--precision", metavar="PERCENT", help="Draw until the quantile's interval is so narrow.")
@click.option("--json", "as_json", is_flag=True, help="Print JSON, at full precision.")
def command(
    file: str,
    ranges: tuple[str, ...],
    materials: str | None,
    as_made: bool,
    every: bool,
    draws: int,
    seed: int,
    precision: str | None,
    as_json: bool,
) -> int:
    """Show the budget of a plan: what each cause adds to the drift, the total and the limit.

    FILE is a plan.json, a brief (.toml, which is planned first), or - for a plan.json on stdin. Of a
    brief with [ratio] the account of the ratio is shown, over its own range or those asked for.

    Exit code 0: the limit is met in all that is shown, or none was given. 1: not met, not judged, or
    a range that the data do not cover.
    """
    from tcplan.errors import InputError, Problem
    from tcplan.workflow.as_made import plan_as_made
    from tcplan.workflow.budgeting import budget_of, plan_to_budget
    from tcplan.workflow.conversions import materials_of

    if file.casefold().endswith(".toml") and (brief := _ratio_brief(file)) is not None:
        return _ratio(
            brief, ranges, only_ranges=not (materials or as_made or every or precision), as_json=as_json
        )
    if as_made and (materials is not None or every):
        found = "--as-made with --materials or --all"
        raise InputError(Problem(where="command line", found=found, expected="--as-made alone"))
    asked = _draws(draws, seed, precision)
    new = None if materials is None else materials_of(materials)
    content = sys.stdin.buffer.read(MOST_PLAN_BYTES + 1) if file == STDIN else None
    plan = plan_to_budget("standard input" if file == STDIN else file, content)
    accounts = budget_of(
        plan,
        options=[option.id for option in plan.options] if every else None,
        ranges=ranges,
        materials=new,
        draws=asked,
        as_made=as_made,
    )
    _show(plan_as_made(plan) if as_made else plan, accounts, as_json=as_json)
    return _code(accounts)


def _ratio_brief(file: str) -> Brief | None:
    """Return the brief of a ratio, None when it is one of a resistor."""
    from pathlib import Path

    from tcplan.brief import read_brief

    brief = read_brief(Path(file))
    return brief if brief.ratio is not None else None


def _ratio(brief: Brief, ranges: tuple[str, ...], *, only_ranges: bool, as_json: bool) -> int:
    """Show the account of a ratio over each range."""
    from tcplan.cli.ratio_screen import ratio_screen
    from tcplan.errors import InputError, Problem
    from tcplan.workflow.budgeting import ratio_budgets

    if not only_ranges:
        found = "--materials, --as-made, --all or --precision with the brief of a ratio"
        raise InputError(Problem(where="command line", found=found, expected="--range and --json only"))
    checks = ratio_budgets(brief, ranges)
    if as_json:
        say_json({"title": brief.title, "ratios": [check.to_dict() for check in checks]})
    else:
        say("\n\n".join(ratio_screen(check, width(), colour=colourful()) for check in checks))
    good = all(
        check.pair.need.scale is None or (check.verdict == "MET" and check.total_met is not False)
        for check in checks
    )
    return DONE if good else NOT_MET


def _draws(count: int, seed: int, precision: str | None) -> Draws | None:
    """Return what to draw; None when no draws are asked for."""
    from tcplan.budget import Draws
    from tcplan.errors import InputError, Problem
    from tcplan.units import parse_quantity

    if precision is None:
        return Draws(count=count, seed=seed) if count != 0 else None
    narrow = parse_quantity(precision, "1", where="--precision")
    if not 1e-4 <= narrow <= 1.0:
        raise InputError(Problem(where="--precision", found=precision, expected="0.01 % to 100 %"))
    return Draws(seed=seed, precision=narrow)


def _code(accounts: Sequence[Account]) -> int:
    """Return 0 only when everything that is shown meets its limit, or there is none."""
    good = all(
        account.budget is not None and (account.budget.limit_ppm is None or account.budget.verdict == "MET")
        for account in accounts
    )
    return DONE if good and accounts else NOT_MET


def _show(plan: Plan, accounts: Sequence[Account], *, as_json: bool) -> None:
    from tcplan.spec.budget_text import budget_assumptions, budget_data, budget_text

    if as_json:
        say_json({"title": plan.brief["title"], "budgets": [budget_data(account) for account in accounts]})
        return
    across = width()
    blocks = [_block(budget_text(plan, account), across) for account in accounts]
    made = [account.budget for account in accounts if account.budget is not None]
    assumed = budget_assumptions(made[0]) if made else ()
    blocks.append(labelled("Assumed", assumed, across, LABEL))
    title = wrapped(str(plan.brief["title"]), across)
    nothing = [] if accounts else wrapped("No named range fits: the materials are valid for none.", across)
    say("\n\n".join("\n".join(block) for block in (title, nothing, *blocks) if block))


def _block(text: BudgetText, across: int) -> list[str]:
    lines = _coloured(wrapped(text.head, across), text.verdict)
    if text.rows:
        lines += ["", *_table(text, across)]
    if text.changes:
        lines += ["", *_change_table(text, across)]
    facts = [line for label, texts in text.facts for line in labelled(label, texts, across, LABEL)]
    return [*lines, "", *facts] if facts else lines


def _table(text: BudgetText, across: int) -> list[str]:
    """Return the rows in columns, as wide as they need to be; names are cut where they do not fit."""
    from tcplan.spec.budget_text import HEAD

    cells = [HEAD, *((row.name, row.kind, row.up, row.down) for row in text.rows)]
    lines = _columns(cells, across)
    return [*lines[:-1], "-" * max(len(line) for line in lines), lines[-1]]


def _change_table(text: BudgetText, across: int) -> list[str]:
    head = ("figure, in ppm", "old", "new", "change")
    rows = [head, *((row.name, row.old, row.new, row.change) for row in text.changes)]
    return _columns(rows, across, left=1)


def _columns(rows: Sequence[tuple[str, ...]], across: int, left: int = 2) -> list[str]:
    """Return rows in columns two apart: the first ``left`` flush left, the rest flush right."""
    widths = [max(len(row[n]) for row in rows) for n in range(len(rows[0]))]
    widths[0] = min(widths[0], max(12, across - sum(widths[1:]) - 2 * (len(widths) - 1)))
    lines = []
    for row in rows:
        name, *more = textwrap.wrap(row[0], widths[0]) or [""]
        cells = [name, *row[1:]]
        padded = [
            cell.ljust(wide) if n < left else cell.rjust(wide)
            for n, (cell, wide) in enumerate(zip(cells, widths, strict=True))
        ]
        lines += ["  ".join(padded).rstrip(), *more]
    return lines


def _coloured(lines: list[str], verdict: str) -> list[str]:
    """Return the head with its verdict, the last words, in colour on a terminal that wants it."""
    if not colourful() or verdict not in COLOURS or not lines[-1].endswith(verdict):
        return lines
    last = lines[-1].removesuffix(verdict)
    return [*lines[:-1], f"{last}{click.style(verdict, fg=COLOURS[verdict])}"]
