"""The network of an option as a schematic: resistor rectangles with material and value, and wires."""

from __future__ import annotations

from dataclasses import dataclass

from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle
from matplotlib.text import Annotation, Text

from tcplan.figures.labels import page_box
from tcplan.figures.schematic import TERMINAL, Label, Point, Schematic, schematic
from tcplan.figures.style import CHOSEN, SMALL_SIZE, TEXT_SIZE, short_names, text_width
from tcplan.network import Leg, Network, leg_names, legs, used_materials
from tcplan.plan import Option
from tcplan.units import format_ohms

PAGE = (500.0, 640.0)  # points; a drawing up to this size has text of full size
LEAST_SCALE = 0.65  # of text that has to shrink; beyond it the labels are ids alone
NAME_WIDTHS = (None, 112.0, 66.0)  # points for a material: whole, else cut, else cut more
CUT_NOTE = "Names that are cut stand in full in mix.csv."
IDS_NOTE = "mix.csv lists the material and the value of every leg."


@dataclass(frozen=True, slots=True, kw_only=True)
class Sketch:
    """A schematic, the scale at which it goes on a page, and what has to be said of its labels."""

    schematic: Schematic
    scale: float
    note: str

    @property
    def size(self) -> tuple[float, float]:
        """Width and height on the page [points]."""
        return self.schematic.width * self.scale, self.schematic.height * self.scale


@dataclass(frozen=True, slots=True, kw_only=True)
class NetworkArtists:
    """What was drawn; boxes and words by the id of their leg."""

    boxes: dict[str, Rectangle]
    words: dict[str, tuple[Text, ...]]
    wires: LineCollection
    dots: Line2D
    terminals: Line2D
    note: Annotation | None


def sketch_of(network: Network) -> Sketch:
    """Return the drawing of a network that says most while its text stays legible.

    Whole names while they fit on the page at full size, else names cut in the middle, then smaller
    text, and below ``LEAST_SCALE`` ids alone; that drawing may be larger than the page.
    """
    trial = None
    for width in NAME_WIDTHS:
        labels, cut = _labels(network, width)
        trial = _sketch(network, labels, CUT_NOTE if cut else "")
        if trial.scale == 1.0:
            return trial
    if trial is not None and trial.scale >= LEAST_SCALE:
        return trial
    ids = tuple(Label(above=name, below="", width=text_width(name)) for name in leg_names(len(legs(network))))
    return _sketch(network, ids, IDS_NOTE)


def draw_network(ax: Axes, option: Option) -> NetworkArtists:
    """Draw the network of an option between two terminals.

    Parameters
    ----------
    ax : Axes
        With its final position: the drawing fills it as far as its text stays at most at full size.
        Its axes are switched off; a note, if there is one, goes below.
    option : Option

    Returns
    -------
    NetworkArtists

    References
    ----------
    IEC 60617: a resistor is a rectangle. IEC 61082-1: a dot where wires join.
    """
    sketch = sketch_of(option.network)
    plan, names = sketch.schematic, leg_names(len(sketch.schematic.legs))
    scale = _fit(ax, plan)
    wires = LineCollection(list(plan.wires), colors=CHOSEN, linewidths=1.0 * scale, zorder=2)
    wires.set_capstyle("projecting")
    ax.add_collection(wires, autolim=False)
    return NetworkArtists(
        boxes={
            name: _box(ax, leg.corner, leg.size, scale) for name, leg in zip(names, plan.legs, strict=True)
        },
        words={
            name: tuple(_word(ax, at, text, scale) for text, at in leg.lines)
            for name, leg in zip(names, plan.legs, strict=True)
        },
        wires=wires,
        dots=_circles(ax, plan.dots, 3.6 * scale, CHOSEN),
        terminals=_circles(ax, plan.terminals, 2.0 * TERMINAL * scale, "white"),
        note=_note(ax, sketch.note),
    )


# --- what the labels say ------------------------------------------------------------------------


def _labels(network: Network, name_width: float | None) -> tuple[tuple[Label, ...], bool]:
    """Return the labels of all legs, with names cut to a width [points], and whether one was cut."""
    whole = used_materials(network)
    short = short_names(whole, name_width) if name_width else {name: name for name in whole}
    ids = leg_names(len(legs(network)))
    labels = tuple(_label(name, leg, short) for name, leg in zip(ids, legs(network), strict=True))
    return labels, any(short[name] != name for name in whole)


def _label(name: str, leg: Leg, short: dict[str, str]) -> Label:
    above, below = f"{name}: {short[leg.material]}", format_ohms(leg.ohms)
    return Label(above=above, below=below, width=max(text_width(above), text_width(below)))


def _sketch(network: Network, labels: tuple[Label, ...], note: str) -> Sketch:
    drawing = schematic(network, labels)
    scale = min(1.0, PAGE[0] / drawing.width, PAGE[1] / drawing.height)
    if note == IDS_NOTE:
        scale = max(scale, LEAST_SCALE)
    return Sketch(schematic=drawing, scale=scale, note=note)


# --- drawing ------------------------------------------------------------------------------------


def _fit(ax: Axes, drawing: Schematic) -> float:
    """Put the drawing in the middle of the axes and return its scale."""
    page = page_box(ax)
    width, height = page.right - page.left, page.top - page.bottom
    scale = min(1.0, width / drawing.width, height / drawing.height)
    for limits, room, size in (
        (ax.set_xlim, width, drawing.width),
        (ax.set_ylim, height, drawing.height),
    ):
        spare = 0.5 * (room / scale - size)
        limits(-spare, size + spare)
    ax.set_axis_off()
    return scale


def _box(ax: Axes, corner: Point, size: tuple[float, float], scale: float) -> Rectangle:
    box = Rectangle(corner, *size, facecolor="white", edgecolor=CHOSEN, linewidth=1.0 * scale, zorder=3)
    box.set_clip_on(False)
    ax.add_artist(box)
    return box


def _word(ax: Axes, at: Point, text: str, scale: float) -> Text:
    return ax.text(
        *at,
        text,
        ha="center",
        va="center_baseline",
        fontsize=TEXT_SIZE * scale,
        color=CHOSEN,
        parse_math=False,
        zorder=4,
    )


def _circles(ax: Axes, points: tuple[Point, ...], size: float, colour: str) -> Line2D:
    (circles,) = ax.plot(*zip(*points, strict=True) if points else ([], []), linestyle="none", zorder=4)
    circles.set_clip_on(False)
    circles.set(marker="o", markersize=size, markerfacecolor=colour, markeredgecolor=CHOSEN)
    circles.set_markeredgewidth(size / 5.0)
    return circles


def _note(ax: Axes, note: str) -> Annotation | None:
    if not note:
        return None
    return ax.annotate(
        note,
        (0.0, 0.0),
        xycoords="axes fraction",
        xytext=(0.0, -5.0),
        textcoords="offset points",
        va="top",
        fontsize=SMALL_SIZE,
        color=CHOSEN,
        parse_math=False,
    )
