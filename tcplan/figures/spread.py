"""The spread of the chosen option: curves of lots over temperature, and how their judged figure lies."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection, PolyCollection
from matplotlib.legend import Legend
from matplotlib.lines import Line2D
from matplotlib.patches import StepPatch
from matplotlib.text import Text

from tcplan.arrays import FloatArray
from tcplan.figures.curves import bounds, celsius, corner_drift, option_drift, temperatures, worst_drift
from tcplan.figures.histogram import draw_histogram
from tcplan.figures.limits import Unit, draw_limits, unit_of, view_of
from tcplan.figures.lots import SAMPLES, Lots
from tcplan.figures.panel import draw_reference, finish, put_legend
from tcplan.figures.style import (
    CHOSEN,
    MARKERS,
    NAME_WIDTH,
    SMALL_SIZE,
    SPREAD_LINE,
    WORST,
    WORST_DASH,
    number_text,
    short_names,
    text_width,
)
from tcplan.plan import Plan

CURVES = 80
CORNER = "corner "


@dataclass(frozen=True, slots=True, kw_only=True)
class SpreadArtists:
    """What was drawn; ``others`` are the corners beyond those that have a marker.

    ``marks`` are lines at the figures of nominal materials, the quantile, the worst case and the limit,
    by these names, as far as they are known; ``words`` says how many lots are inside the limit.
    """

    lots: LineCollection
    nominal: Line2D
    worst: Line2D | None
    corners: dict[str, Line2D]
    others: tuple[Line2D, ...]
    limits: tuple[Line2D | PolyCollection, ...]
    reference: Line2D
    histogram: StepPatch
    marks: dict[str, Line2D]
    words: Text
    legends: tuple[Legend, ...]


def draw_spread(ax: Axes, histogram_ax: Axes, plan: Plan, lots: Lots) -> SpreadArtists:
    """Draw curves of drawn lots of the chosen option, and below them the histogram of their figures.

    Parameters
    ----------
    ax : Axes
        For the curves: lots, nominal materials, the worst device and the process corners. Legends go to
        the right of the axes, outside.
    histogram_ax : Axes
        For the judged figure of the lots.
    plan : Plan
    lots : Lots
        Of the chosen option.

    Returns
    -------
    SpreadArtists
    """
    T, coarse = temperatures(plan), temperatures(plan, SAMPLES)
    own, worst = option_drift(plan, plan.best), worst_drift(plan)
    drawn = lots.curves(coarse, CURVES)
    known = [corner for corner in lots.process.corners if corner.name in plan.best.corners]
    corners = {corner.name: corner_drift(plan, corner)(T) for corner in known}
    held = worst if worst and plan.limit.judge == "worst-case" else own
    limits = bounds(plan, held)
    view = view_of([own(T), *([worst(T)] if worst else []), *corners.values(), drawn.ravel()], limits)
    unit = unit_of(view)
    collection = _draw_lots(ax, celsius(coarse), drawn * unit.factor, lots.likely.draws)
    (nominal,) = ax.plot(celsius(T), own(T) * unit.factor, color=CHOSEN, lw=2.4, zorder=5)
    nominal.set_label("materials nominal")
    worst_line = _draw_worst(ax, celsius(T), worst(T) * unit.factor) if worst else None
    named, others = _draw_corners(ax, celsius(T), corners, unit)
    limit_lines = draw_limits(ax, limits, unit, view, "around the worst case" if held is worst else "")
    finish(ax, plan, unit, view, f"Drawn lots of the chosen option: {plan.chosen}")
    reference = draw_reference(ax, plan)
    histogram, marks, words = draw_histogram(histogram_ax, plan, lots)
    legends = tuple(put_legend(part) for part in (ax, histogram_ax))
    for sample in legends[0].get_lines()[:1]:
        sample.set_alpha(1.0)  # one line alone would hardly be seen
    return SpreadArtists(
        lots=collection,
        nominal=nominal,
        worst=worst_line,
        corners=named,
        others=others,
        limits=limit_lines,
        reference=reference,
        histogram=histogram,
        marks=marks,
        words=words,
        legends=legends,
    )


def _draw_lots(ax: Axes, degC: FloatArray, drifts: FloatArray, count: int) -> LineCollection:
    """Draw the curves of lots, so thin and clear that many of them show where most are."""
    curves = [np.column_stack([degC, drift]) for drift in drifts]
    lines = LineCollection(curves, colors=SPREAD_LINE, linewidths=0.6, alpha=0.4, zorder=1.8)
    lines.set_label(f"{len(curves)} of {number_text(count)} drawn lots")
    ax.add_collection(lines, autolim=False)
    return lines


def _draw_worst(ax: Axes, degC: FloatArray, drift: FloatArray) -> Line2D:
    (line,) = ax.plot(degC, drift, color=WORST, linestyle=WORST_DASH, lw=1.6, zorder=4)
    line.set_label("worst case of the spread")
    return line


def _draw_corners(
    ax: Axes, degC: FloatArray, corners: dict[str, FloatArray], unit: Unit
) -> tuple[dict[str, Line2D], tuple[Line2D, ...]]:
    """Draw each named corner in thin black: with a marker of its own as far as these go."""
    marked = list(corners)[: len(MARKERS)]
    names = short_names(marked, NAME_WIDTH - text_width(CORNER, SMALL_SIZE), SMALL_SIZE)
    lines: dict[str, Line2D] = {}
    others: list[Line2D] = []
    for position, (name, drift) in enumerate(corners.items()):
        (line,) = ax.plot(degC, drift * unit.factor, color=CHOSEN, lw=0.8, zorder=4.5)
        if name in marked:
            line.set(marker=MARKERS[position], markersize=4.5, markerfacecolor="white", markeredgewidth=0.8)
            line.set_markevery((0.03 + 0.017 * position, 0.19))
            line.set_label(f"{CORNER}{names[name]}")
            lines[name] = line
        else:
            line.set_label("_other" if others else f"{len(corners) - len(marked)} other corners")
            others.append(line)
    return lines, tuple(others)
