"""The first screen of a plan, at most as wide as asked."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Sequence

import click

from tcplan.spec.rows import OptionRow
from tcplan.spec.spec import Spec

LABEL = 10
LEAST_NETWORK = 22  # columns; where fewer are left each option gets lines of its own
MOST_LINES = 6  # of one network; longer ones are shortened in the middle
MOST_OPTIONS = 12
NO_BREAK = "\u00a0"
COLOURS = {"MET": "green", "NOT MET": "red", "NOT JUDGED": "yellow"}


def screen(spec: Spec, width: int, *, colour: bool = False) -> str:
    """Return the first screen of a plan.

    Parameters
    ----------
    spec : Spec
    width : int
        Columns.
    colour : bool
        Whether to colour verdicts.

    Returns
    -------
    str
        Lines of at most ``width`` columns.
    """
    blocks = (
        _asked(spec, width, colour=colour),
        [*_labelled("Assumed", spec.assumptions, width), *_labelled("Floor", [spec.floor], width)],
        _options(spec.options, width, colour=colour),
        _chosen(spec, width),
    )
    return "\n\n".join("\n".join(block) for block in blocks)


def _asked(spec: Spec, width: int, *, colour: bool) -> list[str]:
    lines = _wrapped(spec.headline, width)
    if colour:
        lines = [click.style(line, bold=True) for line in lines]
    rest = [f"{spec.title}: {spec.over}.", *(f"Mask, {line}." for line in spec.mask), *spec.outcome]
    return [*lines, *(line for text in rest for line in _wrapped(text, width))]


def _chosen(spec: Spec, width: int) -> list[str]:
    """Return what is said about the chosen option, a label a fact."""
    facts: tuple[tuple[str, Sequence[str]], ...] = (
        ("Chosen", [f"{spec.chosen}: {spec.reason}."]),
        ("Worst at", [spec.worst_at] if spec.worst_at else []),
        ("Moved by", [f"{', '.join(spec.movers)}, each undone alone."] if spec.movers else []),
        ("Centring", [spec.centring]),
        ("Note", spec.notes),
        ("Proof", [spec.proof]),
    )
    return [line for label, texts in facts for line in _labelled(label, texts, width)]


def _wrapped(text: str, width: int, first: str = "", rest: str = "") -> list[str]:
    return textwrap.wrap(
        text, width, initial_indent=first, subsequent_indent=rest, break_on_hyphens=False
    ) or [first.rstrip()]


def _labelled(label: str, texts: Iterable[str], width: int) -> list[str]:
    """Return texts after a label in a column of its own; nothing when there are none."""
    lines: list[str] = []
    for text in texts:
        first = label if not lines else ""
        lines.extend(_wrapped(text, width, first.ljust(LABEL), " " * LABEL))
    return lines


# --- the table of options -----------------------------------------------------------------------


def _options(rows: Sequence[OptionRow], width: int, *, colour: bool) -> list[str]:
    shown = [row for n, row in enumerate(rows) if n < MOST_OPTIONS or row.chosen]
    left = len(rows) - len(shown)
    more = _wrapped(f"{left} more in plan.json.", width, "  ", "  ") if left else []
    columns = _column_widths(shown, width)
    if columns[1] < LEAST_NETWORK:
        lines = [line for row in shown for line in _stacked(row, width, colour=colour)]
        return [*_wrapped("Options, figures in ppm, * the chosen one", width), *lines, *more]
    head = ("option", "network", "nominal", "worst case", "verdict")
    title = _row("  ", head, columns)
    lines = [line for row in shown for line in _tabled(row, columns, colour=colour)]
    units = _row("  ", ("", "", "ppm", "ppm", ""), columns)
    return [title, units, *lines, *more]


def _column_widths(rows: Sequence[OptionRow], width: int) -> tuple[int, int, int, int, int]:
    option = max(len("option"), *(len(row.id) for row in rows))
    nominal = max(len("nominal"), *(len(row.nominal) for row in rows))
    worst = max(len("worst case"), *(len(part) for row in rows for part in _worst_lines(row)))
    verdict = max(len("verdict"), *(len(row.verdict) for row in rows))
    network = width - 2 - option - nominal - worst - verdict - 2 * 4
    return option, network, nominal, worst, verdict


def _row(mark: str, cells: Sequence[str], columns: Sequence[int]) -> str:
    option, network, nominal, worst, verdict = cells
    a, b, c, d, _ = columns
    return f"{mark}{option:<{a}}  {network:<{b}}  {nominal:>{c}}  {worst:>{d}}  {verdict}".rstrip()


def _tabled(row: OptionRow, columns: Sequence[int], *, colour: bool) -> list[str]:
    """Return the lines of one option: its network, below it the sizes of its legs."""
    network = _network_lines(row, columns[1])
    worst = _worst_lines(row)
    height = max(len(network), len(worst))
    network += [""] * (height - len(network))
    worst += [""] * (height - len(worst))
    verdict = _coloured(row.verdict, colour=colour)
    first = _row("* " if row.chosen else "  ", (row.id, network[0], row.nominal, worst[0], verdict), columns)
    rest = zip(network[1:], worst[1:], strict=True)
    return [first, *(_row("  ", ("", text, "", below, ""), columns) for text, below in rest)]


def _stacked(row: OptionRow, width: int, *, colour: bool) -> list[str]:
    head = f"{'* ' if row.chosen else '  '}{row.id}  {_coloured(row.verdict, colour=colour)}"
    figures = f"nominal {row.nominal}, worst case {row.worst_case}"
    below = [*_network_lines(row, width - 4), *_wrapped(figures, width - 4)]
    return [head, *(f"    {line}" for line in below)]


def _network_lines(row: OptionRow, width: int) -> list[str]:
    """Return the network, broken between legs, and the sizes of its legs."""
    lines = _wrapped(_glued(row.network, (" + ", " || ")), width)
    sizes = _wrapped(_glued(row.sizes, (", ",)), width, "  ", "  ") if row.sizes else []
    half = MOST_LINES // 2
    if len(lines) > MOST_LINES:
        lines = [*lines[:half], "...", *lines[-half + 1 :]]
    if len(sizes) > half:
        sizes = [*sizes[: half - 1], "  ..."]
    return [line.replace(NO_BREAK, " ") for line in (*lines, *sizes)]


def _glued(text: str, breaks: Sequence[str]) -> str:
    """Return text that can be broken only at the given places, a sign staying with what precedes it."""
    glued = text.replace(" ", NO_BREAK)
    for mark in breaks:
        before = mark.rstrip().replace(" ", NO_BREAK)
        glued = glued.replace(before + NO_BREAK, f"{before} ")
    return glued


def _worst_lines(row: OptionRow) -> list[str]:
    """Return a worst case; its guaranteed bound, where it differs, goes below."""
    found, _, most = row.worst_case.partition(" (")
    return [found, f"({most}"] if most else [found]


def _coloured(verdict: str, *, colour: bool) -> str:
    return click.style(verdict, fg=COLOURS[verdict]) if colour and verdict in COLOURS else verdict
