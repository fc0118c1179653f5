"""A budget in words and numbers: the same on the screen, in Markdown and as JSON.

Long, since it is all the words of a budget, each function a sentence or a row.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import asdict, dataclass
from math import ceil, floor
from typing import Any

from tcplan.budget import Account, Budget, Contribution, LotFigures, Sensitivity
from tcplan.budget.extras import ENDS, HEATING, NO_FILMS
from tcplan.material.model import Material
from tcplan.plan import Plan
from tcplan.spec import numbers
from tcplan.spec.markdown import escaped
from tcplan.spec.spec import CAUTIONS
from tcplan.spec.statements import SIZE_WORDS, fraction_text, without_spread
from tcplan.units import round_outward, to_celsius

MOST_MOVERS = 6
LEAST_STEP_PPM = 0.05  # a step that moves the figure by less is not told
SAME = 0.005  # two ways that differ by less, relative, are told as one
NOT_KNOWN = "not known"
HEAD = ("contribution", "kind", "highest", "lowest")


@dataclass(frozen=True, slots=True, kw_only=True)
class BudgetRow:
    """One printed row: texts, the figures in ppm with their sign."""

    name: str
    kind: str
    up: str
    down: str


@dataclass(frozen=True, slots=True, kw_only=True)
class ChangeRow:
    """One figure with the plan's data, with new ones, and its change, in ppm as text."""

    name: str
    old: str
    new: str
    change: str


@dataclass(frozen=True, slots=True, kw_only=True)
class BudgetText:
    """Everything that is printed of one option over one range, in words; ``verdict`` may be coloured."""

    head: str
    verdict: str
    rows: tuple[BudgetRow, ...]
    facts: tuple[tuple[str, tuple[str, ...]], ...]
    changes: tuple[ChangeRow, ...]


def budget_text(plan: Plan, account: Account) -> BudgetText:
    """Return what is printed of one option over one range."""
    over = account.over
    where = f"{numbers.stated(over.low_degC)} to {numbers.stated(over.high_degC)} degC"
    named = f"{where} ({over.name})" if over.name else where
    made = account.budget
    if made is None:
        told = f"{account.option}, {named}: NOT COVERED by the data: {account.not_covered}."
        return BudgetText(head=told, verdict="", rows=(), facts=(), changes=())
    reference = numbers.stated(over.reference_degC)
    whole = "" if plan.limit.judge == "worst-case" else _judged_otherwise(plan, account)
    return BudgetText(
        head=f"{account.option}, {named}, reference {reference} degC: {_against(made)}: "
        f"{verdict_word(made)}{whole}",
        verdict=verdict_word(made),
        rows=tuple(_rows(made)),
        facts=tuple((label, texts) for label, texts in _facts(plan, account, made) if texts),
        changes=tuple(_changes(account.before, made)) if account.before is not None else (),
    )


def _judged_otherwise(plan: Plan, account: Account) -> str:
    """Return that the total holds the whole spread, where the brief judges less than that."""
    option = next(o for o in plan.options if o.id == account.option)
    judge = {"quantile": f"{fraction_text(plan)} of lots"}.get(plan.limit.judge, "the nominal figure")
    return f" (with the whole spread and all allowances; the brief judges {judge}: {option.verdict})"


def verdict_word(made: Budget) -> str:
    """Return MET, NOT MET or NOT JUDGED, or that there is no limit to judge by."""
    return made.verdict if made.limit_ppm is not None else "no limit given"


def _against(made: Budget) -> str:
    limit = made.limit_ppm
    total = numbers.worst(made.peak_ppm, limit if made.verdict == "MET" else None)
    if limit is None or made.margin_ppm is None:
        return f"total {total} ppm"
    if made.margin_ppm >= 0.0:
        left = f"margin {numbers.bound(made.margin_ppm)} ppm"
    else:
        left = f"{numbers.worst(-made.margin_ppm)} ppm over"
    return f"total {total} of {numbers.stated(limit)} ppm, {left}"


# --- the table ----------------------------------------------------------------------------------------


def _rows(made: Budget) -> Iterator[BudgetRow]:
    """Yield the rows: what adds linearly, then the random ones together, then the total."""
    above, below = _step(made.total_up_ppm), _step(made.total_down_ppm)
    yield BudgetRow(
        name="", kind="", up=f"at {_degrees(made.at_up_degC)}", down=f"at {_degrees(made.at_down_degC)}"
    )
    for row in made.rows:
        up, down = _part(row.up_ppm, above), _part(row.down_ppm, below)
        if row.note == NO_FILMS:
            up = down = "none"
        yield BudgetRow(name=row.name, kind=_kind(row), up=up, down=down)
    if sum(row.kind == "random" and row.up_ppm is not None for row in made.rows) > 1:
        yield BudgetRow(
            name="random ones together",
            kind="root-sum-square",
            up=_part(made.random_up_ppm, above),
            down=_part(made.random_down_ppm, below),
        )
    yield BudgetRow(
        name="total", kind="", up=_total(made, made.total_up_ppm), down=_total(made, made.total_down_ppm)
    )


def _step(total_ppm: float) -> float:
    """Return the place of the third digit of a total [ppm]: the rows of its side are rounded to it."""
    size = abs(total_ppm)
    return 10.0 ** (len(f"{int(size)}") - 3) if size >= 1.0 else numbers.SMALLEST_PPM


def _degrees(at: float) -> str:
    return f"{numbers.number(round(at, 1))} degC"


def _kind(row: Contribution) -> str:
    return "3 sigma" if row.kind == "random" else row.kind


def _part(ppm: float | None, step: float) -> str:
    if ppm is None:
        return NOT_KNOWN
    rounded = round(ppm / step) * step
    if rounded == 0.0:
        return "0" if abs(ppm) < numbers.SMALLEST_PPM else f"under {numbers.number(step)}"
    return numbers.signed(rounded, numbers.MOST_DIGITS)


def _total(made: Budget, ppm: float) -> str:
    if abs(ppm) < numbers.SMALLEST_PPM:
        return "0"
    limit = made.limit_ppm if made.verdict == "MET" else None
    size = numbers.worst(abs(ppm), limit)
    return f"+{size}" if ppm > 0 else f"-{size}"


# --- what is said beside the table ----------------------------------------------------------------------


def _facts(plan: Plan, account: Account, made: Budget) -> Iterator[tuple[str, tuple[str, ...]]]:
    yield "Change", account.changed
    yield "Beside", (_beside(plan, made),)
    yield "Value", (_value(made),)
    yield "Costs", tuple(movers(made, plan.by_name))
    yield "Floor", (_floor(plan, made),)
    yield "Lots", tuple(_lots(account.lots)) if account.lots is not None else ()
    yield "Sources", tuple(_sources(made))
    yield "Note", made.notes


def _beside(plan: Plan, made: Budget) -> str:
    """Return the nominal figure and the worst case, the limit's own figures without anything else."""
    option = next(o for o in plan.options if o.id == made.option)
    if missing := without_spread(plan, option):
        nominal = numbers.nominal(made.nominal_ppm, None)
        return f"The network alone: {nominal} ppm nominal; no spread is stated for {', '.join(missing)}."
    spread = made.worst_case_ppm - made.nominal_ppm
    nominal = numbers.nominal(made.nominal_ppm, spread if spread > 0 else None)
    found, most = numbers.worst(made.worst_case_ppm), numbers.worst(made.worst_case_bound_ppm)
    bound = "" if found == most else f" (at most {most})"
    at = _degrees(made.worst_case_at_degC)
    return f"The network alone: {nominal} ppm nominal, {found}{bound} ppm in its worst case, at {at}."


def _value(made: Budget) -> str:
    error = made.total_error
    if error is None:
        return (
            "Total error of the value: not known, since no value spread is stated for some material, "
            "nor a tolerance or a trim step."
        )
    first = error.reference
    words = {
        "value spread": "all value spreads at their limits",
        "tolerance": "the tolerance of the brief",
        "trim step": "half a trim step",
    }[first.source]
    up, down = _percent(error.up_ppm), _percent(error.down_ppm)
    own = f"{_percent(first.up_ppm)} and {_percent(first.down_ppm)}"
    at = f"{_degrees(error.at_up_degC)} and {_degrees(error.at_down_degC)}"
    return f"Total error of the value: {up} and {down} at {at}; at the reference {own} ({words})."


def _percent(ppm: float) -> str:
    rounded = round_outward(ppm * 1e-4)
    return f"{numbers.signed(rounded, numbers.MOST_DIGITS)} %"


def movers(made: Budget, materials: Mapping[str, Material]) -> Iterator[str]:
    """Yield what a step of each parameter costs at nominal, the dearest first."""
    for one in made.sensitivities[:MOST_MOVERS]:
        if max(abs(one.more_ppm), abs(one.less_ppm)) >= LEAST_STEP_PPM:
            yield f"{step_text(one, materials)}."


def step_text(one: Sensitivity, materials: Mapping[str, Material]) -> str:
    """Return what a step of one parameter costs or saves, such as "1 % more ... costs 43 ppm"."""
    kind = materials[one.material].kind if one.material in materials else "plain"
    size = SIZE_WORDS.get(kind, "value")
    words = {
        "value": f"{one.material} {size}",
        "tc1": f"TC1 of {one.material}",
        "tc2": f"TC2 of {one.material}",
    }
    first = f"{one.step} more {words[one.parameter]} {_cost(one.more_ppm)}"
    largest = max(abs(one.more_ppm), abs(one.less_ppm))
    if abs(one.more_ppm + one.less_ppm) <= SAME * largest:
        return first
    return f"{first}, {one.step} less {_cost(one.less_ppm)}"


def _cost(ppm: float) -> str:
    return f"{'costs' if ppm >= 0 else 'saves'} {numbers.number(abs(ppm), 3)} ppm"


def _floor(plan: Plan, made: Budget) -> str:
    known = made.knowledge
    nominal = plan.floor.nominal_ppm
    if known is not None and known.material and made.limit_ppm is not None and nominal > made.limit_ppm:
        floor_ = numbers.bound(nominal, made.limit_ppm)
        return f"No network of these materials is below {floor_} ppm at nominal: no better TC1 is enough."
    if known is None or numbers.bound(known.floor_ppm) == "0":
        return ""
    at, least = _degrees(known.at_degC), numbers.bound(known.floor_ppm, made.limit_ppm)
    first = f"The TC spreads alone leave {least} ppm or more of any network of these materials, at {at}"
    if not known.material:
        return f"{first}."
    if known.tc1_needed_ppm_per_K is None:
        return f"{first}: more than the limit, and no better known TC1 alone would change that."
    now, needed = numbers.number(known.tc1_now_ppm_per_K or 0.0), numbers.bound(known.tc1_needed_ppm_per_K)
    return (
        f"{first}: more than the limit. It could be met only with a TC1 known better: for one, that of "
        f"{known.material} within {needed} ppm/K instead of {now} ppm/K."
    )


def _lots(lots: LotFigures) -> Iterator[str]:
    drawn = lots.drawn
    lowest, highest = _interval(lots)
    low = numbers.bound(lowest * 1e6)
    high = None if highest is None else numbers.worst(highest * 1e6)
    upper = f"to {high}" if high is not None else "up, no upper end from so few draws"
    stated = numbers.percent(drawn.quantile)
    figure = numbers.worst(drawn.quantile_figure * 1e6)
    yield (
        f"{stated} of lots are within {figure} ppm (95 % interval {low} {upper}); {drawn.draws} draws, seed "
        f"{drawn.seed}, spreads only."
    )
    if drawn.yield_fraction is not None and drawn.yield_low is not None and drawn.yield_high is not None:
        cpk = f" Cpk {numbers.number(drawn.cpk, 3)} where it is least." if drawn.cpk is not None else ""
        yield (
            f"{drawn.inside} of {drawn.draws} lots are inside the limit: {_yield(drawn.yield_low, floor)} to "
            f"{_yield(drawn.yield_high, ceil)} (exact 95 % interval).{cpk}"
        )
    if lots.units is not None:
        units = lots.units
        missing = f"; no mismatch known for leg {', '.join(units.unstated)}" if units.unstated else ""
        yield (
            f"Within a lot {_yield(units.mean_within)} of units are inside in the mean, "
            f"{_yield(units.least_within)} in the worst lot ({units.lots} lots of {units.units}{missing})."
        )
    words = {"value": "value", "tc1": "TC1", "tc2": "TC2"}
    shares = [
        f"{words.get(p.component, p.component)} of {p.material} {numbers.number(share * 100, 2)} %"
        for p, share in drawn.shares[:3]
    ]
    if shares:
        at = _degrees(to_celsius(drawn.shares_at))
        yield f"Variance of the drift at {at}, by squared standardised regression: {', '.join(shares)}."


def _interval(lots: LotFigures) -> tuple[float, float | None]:
    return lots.drawn.quantile_low, lots.drawn.quantile_high


def _yield(fraction: float, towards: Callable[[float], int] = floor) -> str:
    """Return a fraction in percent, to a thousandth, rounded to the safe side."""
    return f"{numbers.number(towards(round(fraction * 1e5, 6)) / 1e3, 6)} %"


def _sources(made: Budget) -> Iterator[str]:
    for row in made.rows:
        if row.note:
            yield f"{row.name}: {row.note}."


def budget_assumptions(made: Budget) -> tuple[str, ...]:
    """Return what the figures assume, a sentence each, and the usual cautions."""
    scale = "" if made.limit_kind in ("none", "drift") else " They are on the scale of the limit."
    return (
        f"Figures in ppm, signed, each side where its own sum peaks.{scale}",
        "Rows add linearly at each temperature, each class of spread by what it adds to those above it; "
        "only those marked 3 sigma (99.73 %) add in root-sum-square.",
        "Spreads count as limits; a stated sigma counts 3 times. Costs are of the nominal figure, for small "
        "steps.",
        f"{_ends(made)}Not included: what is marked not known, {_heating(made)}and what no allowance is "
        "given for.",
        "Figures are design estimates, to be confirmed on silicon or hardware.",
        *CAUTIONS[1:],
    )


def _ends(made: Budget) -> str:
    known = any(row.name == ENDS for row in made.rows)
    return "Ends are an estimate, each leg drawn as one body. " if known else ""


def _heating(made: Budget) -> str:
    known = any(row.name == HEATING for row in made.rows)
    return "" if known else "self-heating beyond the stated rise, "


# --- new data -----------------------------------------------------------------------------------------


def _changes(old: Budget | None, new: Budget) -> Iterator[ChangeRow]:
    """Yield the main figures with the plan's data, with the new ones, and the change."""
    if old is None:
        return
    pairs = [
        ("total", old.peak_ppm, new.peak_ppm),
        ("highest drift", old.total_up_ppm, new.total_up_ppm),
        ("lowest drift", old.total_down_ppm, new.total_down_ppm),
        ("nominal", old.nominal_ppm, new.nominal_ppm),
        ("worst case", old.worst_case_ppm, new.worst_case_ppm),
        *(
            (f"{before.name}, at most", before.most_ppm, after.most_ppm)
            for before, after in zip(old.rows, new.rows, strict=True)
        ),
    ]
    for name, before, after in pairs:
        if before is not None and after is not None:
            change = numbers.signed(after - before, 3) if abs(after - before) >= LEAST_STEP_PPM else "0"
            yield ChangeRow(name=name, old=numbers.number(before), new=numbers.number(after), change=change)
    yield ChangeRow(name="verdict", old=verdict_word(old), new=verdict_word(new), change="")


# --- files --------------------------------------------------------------------------------------------


def budget_data(account: Account) -> dict[str, Any]:
    """Return one account as JSON data, at full precision; ``null`` is not known or not asked."""
    over, lots = account.over, account.lots
    return {
        "option": account.option,
        "range": {
            "name": over.name,
            "low_degC": over.low_degC,
            "high_degC": over.high_degC,
            "reference_degC": over.reference_degC,
            "rise_K": over.rise,
        },
        "not_covered": account.not_covered or None,
        "budget": _budget_data(account.budget),
        "before": _budget_data(account.before),
        "lots": None if lots is None else _lots_data(lots),
        "changed": list(account.changed),
    }


def _budget_data(made: Budget | None) -> dict[str, Any] | None:
    if made is None:
        return None
    return {**asdict(made), "at_degC": made.at_degC, "margin_ppm": made.margin_ppm}


def _lots_data(lots: LotFigures) -> dict[str, Any]:
    data = asdict(lots.drawn)
    edges, counts = data.pop("histogram")
    shares, at = data.pop("shares"), data.pop("shares_at")
    inside = (
        "yield_fraction",
        "yield_low",
        "yield_high",
        "cpk",
        "inside",
        "draws",
        "seed",
        "screened",
        "quantile",
    )
    figures = {
        f"{key}_ppm": None if data[key] is None else data[key] * 1e6 for key in data if key not in inside
    }
    return {
        **{key: data[key] for key in inside},
        **figures,
        "histogram": {"edges_ppm": [edge * 1e6 for edge in edges], "counts": list(counts)},
        "shares_at_degC": to_celsius(at),
        "shares": [
            {"material": p["material"], "parameter": p["component"], "share": share} for p, share in shares
        ],
        "units": None if lots.units is None else _units_data(asdict(lots.units)),
    }


def _units_data(data: dict[str, Any]) -> dict[str, Any]:
    limit = data.pop("limit")
    return {**data, "limit_ppm": limit * 1e6}


def budget_markdown(plan: Plan, accounts: Iterable[Account]) -> str:
    """Return the budgets as Markdown, a section each."""
    parts = []
    assumed: tuple[str, ...] = ()
    for account in accounts:
        text = budget_text(plan, account)
        parts.append(f"## {escaped(text.head)}")
        if text.rows:
            parts.append(_table(HEAD, [(r.name, r.kind, r.up, r.down) for r in text.rows]))
        if text.changes:
            rows = [(r.name, r.old, r.new, r.change) for r in text.changes]
            parts.append(_table(("figure", "old", "new", "change"), rows))
        parts += [f"**{escaped(label)}** {escaped(line)}" for label, lines in text.facts for line in lines]
        if account.budget is not None:
            assumed = budget_assumptions(account.budget)
    return "\n\n".join([*parts, *(str(escaped(sentence)) for sentence in assumed)]) + "\n"


def _table(head: tuple[str, ...], rows: Iterable[tuple[str, ...]]) -> str:
    rule = tuple("---" if n < 2 else "---:" for n in range(len(head)))
    lines = [head, rule, *(tuple(str(escaped(cell)) for cell in row) for row in rows)]
    return "\n".join(f"| {' | '.join(line)} |" for line in lines)
