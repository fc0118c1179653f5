"""The array of a film as a grid of letters, with its legend and its outline."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence

from tcplan.parts.placement import DUMMY, Placement
from tcplan.spec import numbers
from tcplan.units import format_length

MOST_ROWS = 40
"""A grid of more rows is shortened."""
_MIDDLE = "..."


def grid_text(placement: Placement, width: int = 80) -> tuple[str, ...]:
    """Return the array of a film as lines of text, no line wider than ``width``.

    Parameters
    ----------
    placement : Placement
    width : int
        Of a line, in characters; 40 at least.

    Returns
    -------
    tuple of str
        The grid, each cell the id of its leg or ``.`` for a dummy; then what the letters mean, the outline,
        the common centroid, and how the grid was shortened, if it was. The outline is always that of all.
    """
    lines = [*_grid(placement, width)]
    for sentence in (*_shortened(placement, width), *_words(placement)):
        lines += textwrap.wrap(sentence, width, break_on_hyphens=False)
    return tuple(lines)


def _grid(placement: Placement, width: int) -> Iterator[str]:
    rows = placement.rows
    size, gap, kept = _fit(placement, width)
    first, last = _ends(len(rows), MOST_ROWS)
    for at in (*first, None, *last) if last else first:
        if at is None:
            yield _MIDDLE
            continue
        yield _row([name.ljust(size) for name in rows[at]], gap, kept).rstrip()


def _row(cells: Sequence[str], gap: str, kept: int) -> str:
    first, last = _ends(len(cells), kept)
    whole = gap.join(cells[at] for at in first)
    return f"{whole} {_MIDDLE} {gap.join(cells[at] for at in last)}" if last else whole


def _fit(placement: Placement, width: int) -> tuple[int, str, int]:
    """Return the width of a cell, what is between cells, and how many of a row are shown."""
    size = max(len(name) for name, _ in placement.legs)
    columns = placement.columns
    if columns * (size + 1) - 1 <= width:
        return size, " ", columns
    if size == 1 and columns <= width:
        return size, "", columns
    gap = "" if size == 1 else " "
    return size, gap, max(2, (width - len(_MIDDLE) - 2 + 2 * len(gap)) // (size + len(gap)))


def _ends(count: int, most: int) -> tuple[range, range]:
    """Return the positions that are shown: all, or as many at the beginning as at the end."""
    if count <= most:
        return range(count), range(0)
    half = most // 2
    return range(half), range(count - half, count)


def _shortened(placement: Placement, width: int) -> Iterator[str]:
    """Yield what of the grid is left out."""
    rows, columns = len(placement.rows), placement.columns
    kept = _fit(placement, width)[2]
    for what, count, most in (("columns", columns, kept), ("rows", rows, MOST_ROWS)):
        if count > most:
            half = most // 2
            yield f"Shown are the first {half} and the last {half} of {count} {what}."


def _words(placement: Placement) -> Iterator[str]:
    units = ", ".join(f"{name} {count}" for name, count in placement.legs)
    yield f"Units of {placement.title} by leg: {units}; {placement.dummies} dummies ({DUMMY})."
    yield outline_text(placement)
    if placement.why_not:
        yield placement.why_not
    elif placement.distance is not None:
        yield "Both sides of the ratio have one centroid."
    yield from placement.notes


def outline_text(placement: Placement) -> str:
    """Return the outline of an array in words."""
    size = f"{format_length(placement.width)} wide, {format_length(placement.height)} high"
    cell = f"{format_length(placement.pitch_x)} x {format_length(placement.pitch_y)}"
    return (
        f"Outline {size}, {numbers.number(placement.area * 1e12)} um^2: {len(placement.rows)} x "
        f"{placement.columns} cells of {cell}."
    )
