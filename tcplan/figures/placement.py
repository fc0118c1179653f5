"""The arrays of films to scale: units with the letter of their leg, dummies hatched, and the outline.

Long, since what is drawn of a large array, what fits and what is said below it depend on each other.
"""

from __future__ import annotations

import math
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure
from matplotlib.legend import Legend
from matplotlib.patches import Patch
from matplotlib.text import Annotation, Text

from tcplan.figures.labels import page_box
from tcplan.figures.pictures import picture_files
from tcplan.figures.style import (
    CHOSEN,
    MATERIAL_COLOURS,
    OTHER,
    SMALL_SIZE,
    TEXT_SIZE,
    figure_style,
    shortened,
    text_width,
)
from tcplan.parts.placement import DUMMY, Placement
from tcplan.units import format_length, format_si

MOST_CELLS = 800
"""Of a larger array the upper left part is drawn."""
LEAST_TEXT = 4.5  # points; letters that would be smaller are left out
LEAST_SIDE = 26.0  # points; an array narrower than this is stretched, and said to be
MARGIN = 22.0  # points at the left and below, for the dimensions
PAGE_WIDTH, AXES_WIDTH, AXES_HEIGHT, LEGEND_WIDTH = 518.0, 350.0, 250.0, 140.0  # points
SIDE, GAP, ABOVE, LINE = 9.0, 8.0, 17.0, 10.0  # points
NOTE_LETTERS = 115  # of a line of the note
LONG_LEGEND = 14  # entries; more go in two columns
TINT = 0.55  # of white in the colour of a leg
_Corners = list[tuple[float, float]]


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacementArtists:
    """What was drawn; ``dimensions`` is empty where only a part of the array is shown."""

    units: PolyCollection
    dummies: PolyCollection
    letters: tuple[Text, ...]
    dimensions: tuple[Annotation | Text, ...]
    legend: Legend
    title: Text
    note: Annotation | None


@dataclass(frozen=True, slots=True, kw_only=True)
class View:
    """What of an array is shown, and at which scale [points per metre]."""

    rows: int
    columns: int
    across: float
    up: float

    @property
    def to_scale(self) -> bool:
        """Whether widths and heights have one scale."""
        return self.across == self.up


def view_of(placement: Placement, width: float = AXES_WIDTH, height: float = AXES_HEIGHT) -> View:
    """Return what of an array is shown on a page of a size [points], dimensions included."""
    rows, columns = len(placement.rows), placement.columns
    if rows * columns > MOST_CELLS:
        rows = max(1, min(rows, round(rows * math.sqrt(MOST_CELLS / (rows * columns)))))
        columns = min(columns, MOST_CELLS // rows)
    wide, high = columns * placement.pitch_x, rows * placement.pitch_y
    scale = min((width - MARGIN) / wide, (height - MARGIN) / high)
    return View(
        rows=rows,
        columns=columns,
        across=max(scale, LEAST_SIDE / wide),
        up=max(scale, LEAST_SIDE / high),
    )


def draw_placement(ax: Axes, placement: Placement) -> PlacementArtists:
    """Draw the array of one film, its dimensions, and which leg has which colour.

    Parameters
    ----------
    ax : Axes
        With its final position: the array fills it as far as it can to scale. Its axes are switched off; the
        legend goes to the right, the title above, the note below.
    placement : Placement

    Returns
    -------
    PlacementArtists
    """
    page = page_box(ax)
    view = view_of(placement, page.right - page.left, page.top - page.bottom)
    colours = leg_colours(placement)
    _fit(ax, placement, view)
    shown = [
        (name, _corners(placement, row, column))
        for row, cells in enumerate(placement.rows[: view.rows])
        for column, name in enumerate(cells[: view.columns])
    ]
    units = [(colours[name], corners) for name, corners in shown if name != DUMMY]
    spare = [corners for name, corners in shown if name == DUMMY]
    letters = _letters(ax, placement, view, shown)
    return PlacementArtists(
        units=_cells(ax, [c for _, c in units], view, facecolor=[c for c, _ in units], edgecolor=CHOSEN),
        dummies=_cells(ax, spare, view, facecolor="white", edgecolor=OTHER, hatch="/////"),
        letters=letters,
        dimensions=_dimensions(ax, placement, view),
        legend=_legend(ax, placement, view, colours),
        title=_title(ax, placement),
        note=_note(ax, "\n".join(note_lines(placement, view, lettered=bool(letters)))),
    )


def leg_colours(placement: Placement) -> dict[str, tuple[float, float, float]]:
    """Return a light colour for each leg; after nine they begin again."""
    found = {}
    for n, (name, _) in enumerate(placement.legs):
        red, green, blue = to_rgb(MATERIAL_COLOURS[n % len(MATERIAL_COLOURS)])
        light = [part + TINT * (1.0 - part) for part in (red, green, blue)]
        found[name] = (light[0], light[1], light[2])
    return found


def note_lines(placement: Placement, view: View, *, lettered: bool) -> tuple[str, ...]:
    """Return what is said below an array, in lines."""
    rows, columns = len(placement.rows), placement.columns
    unit = f"{format_length(placement.unit_width)}, L {format_length(placement.unit_length)}"
    said = [f"Unit: W {unit}."]
    if placement.why_not:
        said.append(placement.why_not)
    elif placement.distance is not None:
        said.append("Both sides of the ratio have one centroid.")
    if (view.rows, view.columns) != (rows, columns):
        said.append(
            f"Shown is the upper left: {view.rows} of {rows} rows, {view.columns} of {columns} columns."
        )
    if not view.to_scale:
        said.append("Not to scale: the shorter side is stretched.")
    if not lettered and len(placement.legs) > len(MATERIAL_COLOURS):
        said.append("Colours repeat, letters do not fit: the grid of the text tells the legs apart.")
    return tuple(textwrap.wrap(" ".join([*said, *placement.notes]), NOTE_LETTERS))


# --- drawing --------------------------------------------------------------------------------------------


def _fit(ax: Axes, placement: Placement, view: View) -> None:
    """Put the array in the upper left of the axes, the origin at its lower left corner."""
    page = page_box(ax)
    left, high = -MARGIN / view.across, view.rows * placement.pitch_y
    ax.set_xlim(left, left + (page.right - page.left) / view.across)
    ax.set_ylim(high - (page.top - page.bottom) / view.up, high)
    ax.set_axis_off()
    ax.set_clip_on(False)


def _corners(placement: Placement, row: int, column: int) -> _Corners:
    """Return the rectangle of a unit with its ends, from the upper left corner of the array."""
    x = (column + 0.5) * placement.pitch_x
    y = -(row + 0.5) * placement.pitch_y
    across = 0.5 * placement.unit_width
    up = 0.5 * placement.unit_length + placement.end_length
    return [(x - across, y - up), (x + across, y - up), (x + across, y + up), (x - across, y + up)]


def _cells(ax: Axes, corners: Sequence[_Corners], view: View, **look: Any) -> PolyCollection:
    top = ax.get_ylim()[1]
    wide = (corners[0][1][0] - corners[0][0][0]) * view.across
    line = min(0.4, 0.06 * wide)
    moved = [[(x, y + top) for x, y in cell] for cell in corners]
    cells = PolyCollection(moved, linewidths=line, zorder=2, clip_on=False, **look)
    ax.add_collection(cells, autolim=False)
    return cells


def _letters(
    ax: Axes, placement: Placement, view: View, shown: Sequence[tuple[str, _Corners]]
) -> tuple[Text, ...]:
    """Write the letter of its leg on each unit, where that can be read."""
    longest = max((name for name, _ in placement.legs), key=text_width)
    wide, high = placement.unit_width * view.across, placement.unit_length * view.up
    size = min(TEXT_SIZE, 0.85 * wide / text_width(longest, 1.0), 0.85 * high)
    if size < LEAST_TEXT:
        return ()
    top = ax.get_ylim()[1]
    return tuple(
        ax.text(
            0.5 * (corners[0][0] + corners[2][0]),
            0.5 * (corners[0][1] + corners[2][1]) + top,
            name,
            ha="center",
            va="center_baseline",
            fontsize=size,
            color=CHOSEN,
            parse_math=False,
            zorder=4,
        )
        for name, corners in shown
        if name != DUMMY
    )


def _dimensions(ax: Axes, placement: Placement, view: View) -> tuple[Annotation | Text, ...]:
    """Draw width and height of the whole array below and at the left of it."""
    if (view.rows, view.columns) != (len(placement.rows), placement.columns):
        return ()
    wide, high = placement.width, placement.height
    x, y = -0.3 * MARGIN / view.across, -0.3 * MARGIN / view.up
    look: dict[str, Any] = {
        "arrowstyle": "<->",
        "lw": 0.6,
        "color": CHOSEN,
        "shrinkA": 0,
        "shrinkB": 0,
        "mutation_scale": 6,
    }
    arrows = [
        ax.annotate("", (0.0, y), (wide, y), arrowprops=look, annotation_clip=False),
        ax.annotate("", (x, 0.0), (x, high), arrowprops=look, annotation_clip=False),
    ]
    words = format_si(wide, "m"), format_si(high, "m")
    narrow = [
        text_width(text, SMALL_SIZE) > side
        for text, side in zip(words, (wide * view.across, high * view.up), strict=True)
    ]
    style: dict[str, Any] = {"fontsize": SMALL_SIZE, "color": CHOSEN, "parse_math": False}
    below = ax.text(0.0 if narrow[0] else 0.5 * wide, 1.3 * y, words[0], va="top", **style)
    below.set_horizontalalignment("left" if narrow[0] else "center")
    beside = ax.text(1.3 * x, high if narrow[1] else 0.5 * high, words[1], ha="right", rotation=90.0, **style)
    beside.set_verticalalignment("top" if narrow[1] else "center")
    return (*arrows, below, beside)


def _legend(
    ax: Axes, placement: Placement, view: View, colours: dict[str, tuple[float, float, float]]
) -> Legend:
    page = page_box(ax)
    beside = (MARGIN + view.columns * placement.pitch_x * view.across) / (page.right - page.left)
    columns = _legend_columns(placement)
    room = LEGEND_WIDTH / columns - 28.0
    entries = [
        Patch(facecolor=colours[name], edgecolor=CHOSEN, lw=0.4, label=_entry(name, count, room))
        for name, count in placement.legs
    ]
    label = f"dummies: {placement.dummies}"
    entries.append(Patch(facecolor="white", edgecolor=OTHER, lw=0.4, hatch="/////", label=label))
    legend = ax.legend(
        handles=entries,
        loc="upper left",
        bbox_to_anchor=(beside, 1.0),
        borderaxespad=0.0,
        frameon=False,
        fontsize=SMALL_SIZE,
        handlelength=1.4,
        labelspacing=0.3,
        columnspacing=0.8,
        ncols=columns,
    )
    for text in legend.get_texts():
        text.set_parse_math(False)
    return legend


def _entry(name: str, count: int, room: float) -> str:
    after = f": {count}"
    return shortened(name, room - text_width(after, SMALL_SIZE), SMALL_SIZE) + after


def _legend_columns(placement: Placement) -> int:
    return 2 if len(placement.legs) >= LONG_LEGEND else 1


def _title(ax: Axes, placement: Placement) -> Text:
    size = f"{format_length(placement.width)} x {format_length(placement.height)}"
    units = f"{placement.units} unit{'' if placement.units == 1 else 's'}"
    after = f": {units}, {len(placement.rows)} x {placement.columns} cells, {size}"
    room = PAGE_WIDTH - 2.0 * SIDE - text_width(after)
    text = shortened(placement.title, room) + after
    return ax.set_title(text, loc="left", fontsize=TEXT_SIZE, pad=4.0, parse_math=False)


def _note(ax: Axes, note: str) -> Annotation | None:
    if not note:
        return None
    return ax.annotate(
        note,
        (0.0, 0.0),
        xycoords="axes fraction",
        xytext=(0.0, -2.0),
        textcoords="offset points",
        va="top",
        fontsize=SMALL_SIZE,
        color=CHOSEN,
        parse_math=False,
    )


# --- files ----------------------------------------------------------------------------------------------


def placement_figure(placements: Sequence[Placement]) -> Figure:
    """Return one panel a film, below each other, on a page no higher than they need."""
    heights = [_panel_height(placement) for placement in placements]
    notes = [LINE * len(note_lines(p, view_of(p), lettered=False)) + 4.0 for p in placements]
    page = sum(heights) + sum(notes) + len(placements) * (ABOVE + GAP)
    figure = Figure(figsize=(PAGE_WIDTH / 72.0, page / 72.0))
    top = page
    for placement, height, note in zip(placements, heights, notes, strict=True):
        bottom = top - ABOVE - height
        box = (SIDE / PAGE_WIDTH, bottom / page, AXES_WIDTH / PAGE_WIDTH, height / page)
        draw_placement(figure.add_axes(box), placement)
        top = bottom - note - GAP
    return figure


def _panel_height(placement: Placement) -> float:
    """Return the height of the axes [points]: of the array at its scale, or of a longer legend."""
    view = view_of(placement)
    lines = math.ceil((len(placement.legs) + 1) / _legend_columns(placement))
    return max(view.rows * placement.pitch_y * view.up + MARGIN, lines * LINE)


def placement_figure_files(placements: Sequence[Placement]) -> dict[str, bytes]:
    """Return placement.svg and placement.png, one panel a film; the same bytes every time.

    Parameters
    ----------
    placements : sequence of Placement
        One at least.
    """
    with figure_style():
        title = "Placement of the units"
        films = ", ".join(placement.title for placement in placements)
        words = f"The arrays of {films} to scale, each unit with the letter of its leg, dummies hatched."
        return picture_files("placement", placement_figure(placements), title, words)
