"""Names beside points, placed one after the other where they cover nothing."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

from matplotlib.axes import Axes
from matplotlib.text import Annotation

from tcplan.figures.style import SMALL_SIZE, text_width

HEIGHT = 1.25  # of a line of text, in sizes
MARKER = 4.0  # points from the middle of a marker to its edge
DISTANCES = (8.0, 13.0, 21.0, 31.0, 43.0)  # points; far names get a line to their point
NEAR = 9.0
CLEAR = 6.0  # points between a name and the marker of another
OUTSIDE = 1e6  # what it costs to leave the axes [points^2]
DIRECTIONS = tuple(math.radians(45.0 * step) for step in (0, 4, 1, 3, 7, 5, 2, 6))


@dataclass(frozen=True, slots=True)
class Box:
    """A rectangle on the page [points]."""

    left: float
    bottom: float
    right: float
    top: float

    def overlap(self, other: Box) -> float:
        """Return the area that both cover."""
        width = min(self.right, other.right) - max(self.left, other.left)
        height = min(self.top, other.top) - max(self.bottom, other.bottom)
        return width * height if width > 0.0 and height > 0.0 else 0.0

    def grown(self, by: float) -> Box:
        """Return the rectangle with a margin around it."""
        return Box(self.left - by, self.bottom - by, self.right + by, self.top + by)

    def inside(self, other: Box) -> bool:
        """Whether this rectangle lies wholly in the other."""
        return (
            self.left >= other.left
            and self.bottom >= other.bottom
            and self.right <= other.right
            and self.top <= other.top
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Name:
    """A text wanted at a point of the data; one that is not ``needed`` gives way."""

    x: float
    y: float
    text: str
    colour: str
    needed: bool = True
    bold: bool = False


def page_point(ax: Axes, x: float, y: float) -> tuple[float, float]:
    """Return where a point of the data is on the page [points]."""
    column, row = ax.transData.transform((x, y))
    scale = 72.0 / ax.figure.dpi
    return float(column) * scale, float(row) * scale


def page_box(ax: Axes) -> Box:
    """Return the rectangle of the axes on the page."""
    (x0, x1), (y0, y1) = ax.get_xlim(), ax.get_ylim()
    return Box(*page_point(ax, x0, y0), *page_point(ax, x1, y1))


def marker_box(ax: Axes, x: float, y: float, radius: float = MARKER) -> Box:
    """Return the rectangle of a marker at a point of the data."""
    column, row = page_point(ax, x, y)
    return Box(column - radius, row - radius, column + radius, row + radius)


def centred_box(ax: Axes, x: float, y: float, width: float) -> Box:
    """Return the rectangle of a text of a width [points] whose middle is at a point of the data."""
    column, row = page_point(ax, x, y)
    half, rise = 0.5 * width + 1.5, 0.5 * HEIGHT * SMALL_SIZE
    return Box(column - half, row - rise, column + half, row + rise)


def covered(box: Box, others: Iterable[Box]) -> float:
    """Return the area of a rectangle that others cover."""
    return sum(box.overlap(other) for other in others)


def place_names(
    ax: Axes, names: Sequence[Name], taken: Sequence[Box]
) -> tuple[tuple[Annotation, ...], list[Box]]:
    """Write names beside their points, the first ones first.

    Parameters
    ----------
    ax : Axes
        With its position and its limits final.
    names : sequence of Name
    taken : sequence of Box
        What no name may cover.

    Returns
    -------
    tuple of Annotation
        One for each name that was written.
    list of Box
        ``taken`` and the rectangles of the names.
    """
    boxes, written = list(taken), []
    for name in names:
        at = marker_box(ax, name.x, name.y)
        # First where no other marker is near, as a name there could be taken for its own.
        apart = [box.grown(CLEAR) for box in taken if box != at]
        offset, box, free = _best(ax, name, [*boxes, *apart])
        if not free:
            offset, box, free = _best(ax, name, boxes)
        if name.needed or free:
            boxes.append(box)
            written.append(_write(ax, name, offset))
    return tuple(written), boxes


def _best(ax: Axes, name: Name, boxes: Sequence[Box]) -> tuple[tuple[float, float], Box, bool]:
    """Return the first place that covers nothing, else the one that covers least, and which it is."""
    page = page_box(ax)
    tried: list[tuple[float, tuple[float, float], Box]] = []
    for offset, box in _places(ax, name):
        cost = covered(box, boxes) + (0.0 if box.inside(page) else OUTSIDE)
        if cost == 0.0:
            return offset, box, True
        tried.append((cost, offset, box))
    _, offset, box = min(tried, key=lambda trial: trial[0])
    return offset, box, False


def _places(ax: Axes, name: Name) -> Iterator[tuple[tuple[float, float], Box]]:
    """Yield offsets from the point, nearest first, each with the rectangle of the text there."""
    column, row = page_point(ax, name.x, name.y)
    width, height = text_width(name.text, SMALL_SIZE) * (1.1 if name.bold else 1.0), HEIGHT * SMALL_SIZE
    for distance in DISTANCES:
        for direction in DIRECTIONS:
            across, up = distance * math.cos(direction), distance * math.sin(direction)
            left = column + across - width * _side(across)
            bottom = row + up - height * _side(up)
            yield (across, up), Box(left, bottom, left + width, bottom + height)


def _side(offset: float) -> float:
    """Return which part of a text lies before its offset point: none, half or all of it."""
    return 0.5 if abs(offset) < 1.0 else (0.0 if offset > 0.0 else 1.0)


def _write(ax: Axes, name: Name, offset: tuple[float, float]) -> Annotation:
    words = {0.0: "left", 0.5: "center", 1.0: "right"}
    heights = {0.0: "bottom", 0.5: "center", 1.0: "top"}
    far = math.hypot(*offset) > NEAR
    return ax.annotate(
        name.text,
        (name.x, name.y),
        xytext=offset,
        textcoords="offset points",
        ha=words[_side(offset[0])],
        va=heights[_side(offset[1])],
        fontsize=SMALL_SIZE,
        fontweight="bold" if name.bold else "normal",
        color=name.colour,
        zorder=7,
        parse_math=False,
        bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.5, "alpha": 0.7},
        arrowprops={"arrowstyle": "-", "lw": 0.5, "color": name.colour, "shrinkA": 0, "shrinkB": 3}
        if far
        else None,
    )
