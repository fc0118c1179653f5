"""The first screen of a plan, at most as wide as asked."""

from __future__ import annotations

from collections.abc import Sequence

import click

from tcplan.cli.paragraphs import coloured, labelled, wrapped
from tcplan.spec.rows import OptionRow
from tcplan.spec.summary import Summary

LABEL = 10
LEAST_NETWORK = 22  # columns; where fewer are left each option gets lines of its own
LONGEST_PIECE = 34  # longer pieces are broken in any case
MOST_LINES = 6  # of one network; longer ones are shortened in the middle
MOST_OPTIONS = 12
NO_BREAK = "\u00a0"


def screen(spec: Summary, width: int, *, colour: bool = False) -> str:
    """Return the first screen of a plan.

    Parameters
    ----------
    spec : Summary
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
        [
            *labelled("Assumed", spec.assumptions, width, LABEL),
            *labelled("Floor", [spec.floor], width, LABEL),
        ],
        _options(spec.options, spec.fraction, width, colour=colour),
        _chosen(spec, width),
    )
    return "\n\n".join("\n".join(block) for block in blocks)


def _asked(spec: Summary, width: int, *, colour: bool) -> list[str]:
    lines = wrapped(spec.headline, width)
    if colour:
        lines = [click.style(line, bold=True) for line in lines]
    rest = [f"{spec.title}: {spec.over}.", *(f"Mask, {line}." for line in spec.mask), *spec.outcome]
    return [*lines, *(line for text in rest for line in wrapped(text, width))]


def _chosen(spec: Summary, width: int) -> list[str]:
    """Return what is said about the chosen option, a label a fact."""
    facts: tuple[tuple[str, Sequence[str]], ...] = (
        ("Chosen", [f"{spec.chosen}: {spec.reason}."]),
        ("Worst at", [spec.worst_at] if spec.worst_at else []),
        ("Moved by", [f"{', '.join(spec.movers)}, each undone alone."] if spec.movers else []),
        ("Lots", [spec.likely] if spec.likely else []),
        ("Corners", [f"{spec.corners}."] if spec.corners else []),
        ("Centring", [spec.centring]),
        ("Note", spec.notes),
        ("Proof", [spec.proof]),
    )
    return [line for label, texts in facts for line in labelled(label, texts, width, LABEL)]


# --- the table of options -----------------------------------------------------------------------


def _options(rows: Sequence[OptionRow], fraction: str, width: int, *, colour: bool) -> list[str]:
    shown = [row for n, row in enumerate(rows) if n < MOST_OPTIONS or row.chosen]
    left = len(rows) - len(shown)
    more = wrapped(f"{left} more in plan.json.", width, "  ", "  ") if left else []
    heads = _heads(shown, fraction)
    columns = _column_widths(shown, heads, width)
    if columns[1] < max(LEAST_NETWORK, *(_longest_piece(row.network) for row in shown)):
        lines = [line for row in shown for line in _stacked(row, fraction, width, colour=colour)]
        return [*wrapped("Options, figures in ppm, * the chosen one", width), *lines, *more]
    title = _row("  ", heads, columns)
    lines = [line for row in shown for line in _tabled(row, heads, columns, colour=colour)]
    units = _row("  ", ("", "", *("ppm" for _ in heads[2:-1]), ""), columns)
    return [title, units, *lines, *more]


def _heads(rows: Sequence[OptionRow], fraction: str) -> tuple[str, ...]:
    """Return the heads of the table; the quantile has a column where it is known."""
    likely = (fraction,) if any(row.likely for row in rows) else ()
    return "option", "network", "nominal", *likely, "worst case", "verdict"


def _figures(row: OptionRow, heads: Sequence[str], worst: str) -> tuple[str, ...]:
    likely = (row.likely or "-",) if len(heads) == 6 else ()
    return row.nominal, *likely, worst


def _column_widths(rows: Sequence[OptionRow], heads: Sequence[str], width: int) -> tuple[int, ...]:
    option = max(len("option"), *(len(row.id) for row in rows))
    bodies = [(*_figures(row, heads, part), row.verdict) for row in rows for part in _worst_lines(row)]
    rest = [max(len(head), *(len(body[k]) for body in bodies)) for k, head in enumerate(heads[2:])]
    return option, width - 2 - option - sum(rest) - 2 * (len(rest) + 1), *rest


def _row(mark: str, cells: Sequence[str], columns: Sequence[int]) -> str:
    words = [f"{cells[k]:<{columns[k]}}" for k in (0, 1)]
    figures = [f"{cell:>{width}}" for cell, width in zip(cells[2:-1], columns[2:-1], strict=True)]
    return (mark + "  ".join([*words, *figures, cells[-1]])).rstrip()


def _tabled(row: OptionRow, heads: Sequence[str], columns: Sequence[int], *, colour: bool) -> list[str]:
    """Return the lines of one option: its network, below it the sizes of its legs."""
    network = _network_lines(row, columns[1])
    worst = _worst_lines(row)
    height = max(len(network), len(worst))
    network += [""] * (height - len(network))
    worst += [""] * (height - len(worst))
    verdict = coloured(row.verdict, colour=colour)
    mark = "* " if row.chosen else "  "
    first = _row(mark, (row.id, network[0], *_figures(row, heads, worst[0]), verdict), columns)
    blank = [""] * (len(heads) - 4)
    rest = zip(network[1:], worst[1:], strict=True)
    return [first, *(_row("  ", ("", text, *blank, below, ""), columns) for text, below in rest)]


def _stacked(row: OptionRow, fraction: str, width: int, *, colour: bool) -> list[str]:
    head = f"{'* ' if row.chosen else '  '}{row.id}  {coloured(row.verdict, colour=colour)}"
    likely = f"{fraction} of lots {row.likely}, " if row.likely else ""
    figures = f"nominal {row.nominal}, {likely}worst case {row.worst_case}"
    below = [*_network_lines(row, width - 4), *wrapped(figures, width - 4)]
    return [head, *(f"    {line}" for line in below)]


def _network_lines(row: OptionRow, width: int) -> list[str]:
    """Return the network, broken between legs, and the sizes of its legs."""
    lines = wrapped(_glued(row.network, (" + ", " || ")), width)
    sizes = wrapped(_glued(row.sizes, (", ",)), width, "  ", "  ") if row.sizes else []
    half = MOST_LINES // 2
    if len(lines) > MOST_LINES:
        lines = [*lines[:half], "...", *lines[-half + 1 :]]
    if len(sizes) > half:
        sizes = [*sizes[: half - 1], "  ..."]
    return [line.replace(NO_BREAK, " ") for line in (*lines, *sizes)]


def _longest_piece(network: str) -> int:
    """Return the width of the longest part of a network that is not broken; very long ones are."""
    return min(LONGEST_PIECE, max(map(len, _glued(network, (" + ", " || ")).split(" "))))


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
