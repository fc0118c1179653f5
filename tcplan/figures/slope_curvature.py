"""The TC1-TC2 plane: materials, what series mixes reach, the options, and contours of peak drift."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from matplotlib.axes import Axes
from matplotlib.legend import Legend
from matplotlib.lines import Line2D
from matplotlib.patches import Polygon, Rectangle
from matplotlib.text import Annotation, Text
from matplotlib.ticker import FuncFormatter, MaxNLocator

from tcplan.figures.contours import convex_hull, round_levels
from tcplan.figures.labels import (
    Box,
    Name,
    centred_box,
    covered,
    marker_box,
    page_box,
    place_names,
)
from tcplan.figures.plane import Point, Scene, View, near_view, scene_of, whole_view, within
from tcplan.figures.style import (
    CHOSEN,
    FAINT,
    OTHER,
    SMALL_SIZE,
    TEXT_SIZE,
    Dash,
    number_text,
    short_names,
    text_width,
)
from tcplan.plan import Plan

MOST_CONTOURS = 4
SHORT = 72.0  # points for a name inside the axes
INSET = (1.316, 0.0, 0.96, 1.0)  # beside the axes, where it covers nothing
OPTION_MARKERS = {"single": "o", "series": "s", "parallel": "D", "mixed": "h"}
CONTOUR = "#7a7a7a"
CONTOUR_DASH: Dash = (0.0, (4.0, 2.0))
NAME_COLOUR = "#333333"
LEVEL_COLOUR = "#555555"
HULL = "#e6ecf2"


@dataclass(slots=True)
class PlaneArtists:
    """What was drawn on one pair of axes."""

    materials: dict[str, Line2D] = field(default_factory=dict)
    names: tuple[Annotation, ...] = ()
    hull: Polygon | None = None
    options: dict[str, Line2D] = field(default_factory=dict)
    target: Line2D | None = None
    contours: dict[float, Line2D] = field(default_factory=dict)
    contour_labels: tuple[Text, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class SlopeCurvatureArtists:
    """What was drawn; ``near`` and its axes are None when nothing had to be enlarged."""

    whole: PlaneArtists
    near: PlaneArtists | None
    inset: Axes | None
    frame: Rectangle | None
    legend: Legend


def is_crowded(plan: Plan) -> bool:
    """Return whether the options are so close together that they are drawn once more, enlarged."""
    return near_view(scene_of(plan)) is not None


def draw_slope_curvature(ax: Axes, plan: Plan) -> SlopeCurvatureArtists:
    """Draw TC1 against TC2 at the brief's reference: materials, series mixes, options, contours.

    Parameters
    ----------
    ax : Axes
        With its final position, as names are placed on it. When `is_crowded`, an enlarged part
        goes to its right, 1.3 times as wide in all; the legend goes below.
    plan : Plan

    Returns
    -------
    SlopeCurvatureArtists

    Notes
    -----
    The hull holds all series mixes to second order: their TC1 and TC2 are means of those of the
    materials. A contour joins the laws 1 + TC1 x + TC2 x^2 of one peak drift from the wanted law.
    """
    scene = scene_of(plan)
    enlarged = near_view(scene)
    whole = _draw_plane(ax, scene, whole_view(scene), enlarged)
    near, inset, frame = None, None, None
    if enlarged is not None:
        inset = ax.inset_axes(INSET)
        near = _draw_plane(inset, scene, enlarged, None)
        frame = _draw_frame(ax, enlarged)
        ax.set_title("All materials", loc="left", fontsize=TEXT_SIZE)
        inset.set_title("Options near the target", loc="left", fontsize=TEXT_SIZE)
    for part in (ax, *([inset] if inset else [])):
        part.set_xlabel(f"TC1 at {number_text(plan.range.reference_degC)} \N{DEGREE SIGN}C (ppm/K)")
        part.set_ylabel("TC2 (ppm/K\N{SUPERSCRIPT TWO})")
    legend = _draw_legend(ax, scene, plan, near or whole)
    return SlopeCurvatureArtists(whole=whole, near=near, inset=inset, frame=frame, legend=legend)


# --- drawing ------------------------------------------------------------------------------------------


def _draw_plane(ax: Axes, scene: Scene, view: View, elsewhere: View | None) -> PlaneArtists:
    """Draw the plane as far as a view goes; options that lie ``elsewhere`` are drawn there, not here."""
    ax.set_xlim(view[0][0], view[1][0])
    ax.set_ylim(view[0][1], view[1][1])
    for axis in (ax.xaxis, ax.yaxis):
        axis.set_major_locator(MaxNLocator(5, steps=[1, 2, 2.5, 5, 10]))
        axis.set_major_formatter(FuncFormatter(lambda number, _: number_text(number)))
    for line in (ax.axhline, ax.axvline):
        line(0.0, color=FAINT, lw=0.8, zorder=0)
    drawn = PlaneArtists(hull=_draw_hull(ax, scene))
    drawn.materials = {name: _draw_material(ax, scene, name) for name in scene.materials}
    drawn.options = {
        name: _draw_option(ax, scene, name)
        for name, (_, point) in scene.options.items()
        if not within(point, elsewhere)
    }
    if elsewhere is None:
        (drawn.target,) = ax.plot(*([v] for v in scene.target), color=CHOSEN, zorder=4)
        drawn.target.set(marker="+", markersize=11, markeredgewidth=1.4)
    drawn.names, taken = place_names(ax, _names(scene, view, elsewhere), _markers(ax, scene, view))
    _draw_contours(ax, scene, drawn, taken)
    return drawn


def _draw_frame(ax: Axes, view: View) -> Rectangle:
    """Draw the outline of the part that is enlarged."""
    (left, bottom), (right, top) = view
    frame = Rectangle(
        (left, bottom), right - left, top - bottom, facecolor="none", edgecolor=CHOSEN, zorder=6
    )
    frame.set_linewidth(0.9)
    ax.add_patch(frame)
    return frame


def _draw_hull(ax: Axes, scene: Scene) -> Polygon:
    corners = convex_hull(list(scene.materials.values()))
    hull = Polygon(np.array(corners), closed=True, facecolor=HULL, edgecolor=OTHER, lw=0.7, zorder=0.5)
    ax.add_patch(hull)
    return hull


def _draw_material(ax: Axes, scene: Scene, name: str) -> Line2D:
    look = scene.look.get(name)
    (line,) = ax.plot(*([v] for v in scene.materials[name]), linestyle="none", zorder=3)
    line.set(marker=look.marker if look else ".", color=look.colour if look else OTHER, markersize=6.0)
    return line


def _draw_option(ax: Axes, scene: Scene, name: str) -> Line2D:
    kind, point = scene.options[name]
    # A chosen single material is a disc behind the marker of that material.
    over = 2.5 if kind == "single" else 6 if name == scene.chosen else 5
    (line,) = ax.plot(*([v] for v in point), zorder=over)
    line.set(**_option_style(kind, chosen=name == scene.chosen))
    return line


def _option_style(kind: str, *, chosen: bool) -> dict[str, object]:
    """Return the marker of an option: its shape is the arrangement, and the chosen one is filled."""
    size = (12.0 if chosen else 11.0) if kind == "single" else (8.5 if chosen else 7.0)
    return {
        "linestyle": "none",
        "marker": OPTION_MARKERS[kind],
        "markersize": size,
        "markerfacecolor": CHOSEN if chosen else "none",
        "markeredgecolor": "white" if chosen else CHOSEN,
        "markeredgewidth": 0.8 if chosen else 1.1,
    }


def _names(scene: Scene, view: View, elsewhere: View | None) -> list[Name]:
    """Return the names to write: the chosen option, its materials, then the others."""
    short = short_names(list(scene.materials), SHORT, SMALL_SIZE)
    order = [*scene.look, *(name for name in scene.materials if name not in scene.look)]
    options = sorted(scene.options.items(), key=lambda item: item[0] != scene.chosen)
    wanted = [
        Name(x=x, y=y, text=name, colour=CHOSEN, bold=name == scene.chosen)
        for name, (kind, (x, y)) in options
        if kind != "single"
    ]
    for name in order:
        x, y = scene.materials[name]
        wanted.append(Name(x=x, y=y, text=short[name], colour=NAME_COLOUR, needed=name in scene.look))
    shown = [n for n in wanted if within((n.x, n.y), view) and not within((n.x, n.y), elsewhere)]
    if elsewhere is not None:
        (left, bottom), (right, top) = elsewhere
        text = "enlarged at the right"
        shown.append(Name(x=0.5 * (left + right), y=0.5 * (bottom + top), text=text, colour=CHOSEN))
    return shown


def _markers(ax: Axes, scene: Scene, view: View) -> list[Box]:
    """Return the rectangles of all markers in view."""
    points = [*scene.materials.values(), *(point for _, point in scene.options.values()), scene.target]
    return [marker_box(ax, *point) for point in points if within(point, view)]


def _draw_contours(ax: Axes, scene: Scene, drawn: PlaneArtists, taken: list[Box]) -> None:
    """Draw the contours that find room for their label."""
    corners = [(x, y) for x in ax.get_xlim() for y in ax.get_ylim()]
    labels = []
    for level in round_levels(max(scene.distance(corner) for corner in corners), MOST_CONTOURS):
        across, up = scene.peak.contour(level)
        x, y = across + scene.target[0], up + scene.target[1]
        text = f"{number_text(level)} ppm"
        width = text_width(text, SMALL_SIZE)
        at = _room(ax, list(zip(x.tolist(), y.tolist(), strict=True)), width, taken)
        if at is None:
            continue
        (drawn.contours[level],) = ax.plot(x, y, color=CONTOUR, lw=0.8, linestyle=CONTOUR_DASH, zorder=1)
        taken.append(centred_box(ax, *at, width))
        labels.append(_write_level(ax, at, text))
    drawn.contour_labels = tuple(labels)


def _room(ax: Axes, points: Sequence[Point], width: float, taken: Sequence[Box]) -> Point | None:
    """Return the point of a contour, nearest to its top, where a text of a width covers nothing."""
    quarter, page = len(points) // 4, page_box(ax)
    for step in sorted(range(0, len(points), 6), key=lambda n: min(abs(n - quarter), abs(n - 3 * quarter))):
        box = centred_box(ax, *points[step], width)
        if box.inside(page) and covered(box, taken) == 0.0:
            return points[step]
    return None


def _write_level(ax: Axes, at: Point, text: str) -> Text:
    return ax.text(
        *at,
        text,
        ha="center",
        va="center",
        fontsize=SMALL_SIZE,
        color=LEVEL_COLOUR,
        zorder=2,
        parse_math=False,
        bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.8, "alpha": 0.85},
    )


def _draw_legend(ax: Axes, scene: Scene, plan: Plan, shown: PlaneArtists) -> Legend:
    """Put the legend below the axes."""
    handles: list[Line2D | Polygon] = [*_option_handles(scene), *_point_handles(scene)]
    if len(scene.materials) > 1:
        hull = Polygon(np.zeros((3, 2)), facecolor=HULL, edgecolor=OTHER, lw=0.7, label="all series mixes")
        handles.append(hull)
    if shown.contours:
        low, high = number_text(plan.range.low_degC), number_text(plan.range.high_degC)
        text = f"peak drift of a quadratic law,\n{low} to {high} \N{DEGREE SIGN}C"
        handles.append(Line2D([], [], color=CONTOUR, lw=0.8, linestyle=CONTOUR_DASH, label=text))
    legend = ax.legend(
        handles=handles,
        loc="upper left",
        bbox_to_anchor=(0.0, -0.16),
        borderaxespad=0.0,
        ncols=3,
        frameon=False,
        fontsize=SMALL_SIZE,
    )
    for entry in legend.get_texts():
        entry.set_parse_math(False)
    return legend


def _option_handles(scene: Scene) -> list[Line2D]:
    """Return a sample of the chosen option's marker, and of each other arrangement that is there."""
    others = {kind for name, (kind, _) in scene.options.items() if name != scene.chosen}
    chosen = Line2D([], [], label=f"{scene.chosen} (chosen)")
    chosen.set(**_option_style(scene.options[scene.chosen][0], chosen=True))
    handles = [chosen]
    for kind in (kind for kind in OPTION_MARKERS if kind in others):
        handle = Line2D([], [], label=f"{kind} option")
        handle.set(**_option_style(kind, chosen=False))
        handles.append(handle)
    return handles


def _point_handles(scene: Scene) -> list[Line2D]:
    """Return a sample of the markers of materials and of the target."""
    tc1, tc2 = map(number_text, scene.target)
    wanted = f"wanted: TC1 {tc1} ppm/K,\nTC2 {tc2} ppm/K\N{SUPERSCRIPT TWO}"
    label = "wanted: no drift" if scene.target == (0.0, 0.0) else wanted
    return [
        Line2D([], [], linestyle="none", marker="o", color=OTHER, ms=6, label="material (named)"),
        Line2D([], [], linestyle="none", marker="+", ms=11, mew=1.4, color=CHOSEN, label=label),
    ]
