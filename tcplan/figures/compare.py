"""Measured drift beside what the plan predicts: points, nominal curve, worst case and likely lots."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.container import ErrorbarContainer
from matplotlib.figure import Figure
from matplotlib.legend import Legend
from matplotlib.lines import Line2D

from tcplan.arrays import FloatArray
from tcplan.figures.curves import bounds, celsius
from tcplan.figures.limits import Unit, draw_limits, unit_of, view_of
from tcplan.figures.panel import draw_reference, finish, put_legend
from tcplan.figures.pictures import picture_files
from tcplan.figures.style import (
    CHOSEN,
    MARKERS,
    MATERIAL_COLOURS,
    NAME_WIDTH,
    SMALL_SIZE,
    SPREAD_EDGE,
    SPREAD_FILL,
    WORST,
    WORST_DASH,
    figure_style,
    percent_text,
    short_names,
)
from tcplan.measure.comparison import Compared, Comparison
from tcplan.plan import Plan

COMPARE_INCHES = (7.2, 4.2)
COVER = 2.0  # standard uncertainties that an error bar reaches
MOST_NAMED = 8  # devices with a look of their own
MOST_MARKS = 60  # of more readings only so many have a marker


@dataclass(frozen=True, slots=True, kw_only=True)
class CompareArtists:
    """What was drawn; ``points`` and ``explained`` follow the devices."""

    points: tuple[ErrorbarContainer, ...]
    explained: tuple[Line2D, ...]
    nominal: Line2D
    worst: tuple[Line2D, Line2D]
    likely: PolyCollection | None
    limits: tuple[Line2D | PolyCollection, ...]
    legend: Legend


def draw_compare(ax: Axes, plan: Plan, comparison: Comparison) -> CompareArtists:
    """Draw the measured points over what is predicted.

    Parameters
    ----------
    ax : Axes
        The legend goes to the right of it.
    plan : Plan
        Whose chosen option is the one that was measured.
    comparison : Comparison

    Returns
    -------
    CompareArtists
        Error bars reach 2 standard uncertainties.
    """
    curves = comparison.curves
    T, nominal = celsius(np.array(curves.T)), np.array(curves.nominal)
    lowest, highest = np.array(curves.lowest), np.array(curves.highest)
    limits = bounds(plan, lambda at: np.interp(at, np.array(curves.T), nominal))
    measured = [np.array([point.drift for point in one.points]) for one in comparison.devices]
    view = view_of([nominal, lowest, highest, *measured], limits)
    unit = unit_of(view)
    likely = _draw_likely(ax, plan, comparison, T, unit)
    worst = _draw_worst(ax, T, lowest * unit.factor, highest * unit.factor)
    (nominal_line,) = ax.plot(
        T, nominal * unit.factor, color=CHOSEN, lw=2.0, zorder=3, label="predicted, nominal"
    )
    names = _names(comparison)
    points, explained = [], []
    for position, one in enumerate(comparison.devices):
        points.append(_draw_points(ax, one, position, names[position], unit))
        explained.append(_draw_explained(ax, one, position, T, unit))
    limit_lines = draw_limits(ax, limits, unit, view, "around nominal")
    draw_reference(ax, plan)
    finish(ax, plan, unit, view, f"Measured drift and the plan: {plan.chosen}")
    return CompareArtists(
        points=tuple(points),
        explained=tuple(explained),
        nominal=nominal_line,
        worst=worst,
        likely=likely,
        limits=limit_lines,
        legend=put_legend(ax),
    )


def _draw_likely(
    ax: Axes, plan: Plan, comparison: Comparison, T: FloatArray, unit: Unit
) -> PolyCollection | None:
    low, high = comparison.curves.likely_low, comparison.curves.likely_high
    if low is None or high is None:
        return None
    return ax.fill_between(
        T,
        np.array(low) * unit.factor,
        np.array(high) * unit.factor,
        facecolor=SPREAD_FILL,
        edgecolor=SPREAD_EDGE,
        lw=0.6,
        zorder=1.2,
        label=f"{percent_text(plan.limit.quantile)} of lots,\nat each temperature",
    )


def _draw_worst(ax: Axes, T: FloatArray, lowest: FloatArray, highest: FloatArray) -> tuple[Line2D, Line2D]:
    (top,) = ax.plot(T, highest, color=WORST, linestyle=WORST_DASH, lw=1.2, zorder=2.5, label="worst case")
    (bottom,) = ax.plot(T, lowest, color=WORST, linestyle=WORST_DASH, lw=1.2, zorder=2.5, label="_lowest")
    return top, bottom


def _names(comparison: Comparison) -> list[str]:
    """Return the name of each device in the legend; those beyond the first few have none."""
    count = len(comparison.devices)
    named = [one.device or "measured" for one in comparison.devices][:MOST_NAMED]
    short = short_names(named, NAME_WIDTH, SMALL_SIZE)
    labels = [f"{short[name]}, {COVER:g} u" for name in named]
    if count > MOST_NAMED:
        labels.append(f"{count - MOST_NAMED} more devices")
    return labels + ["_more"] * max(0, count - MOST_NAMED - 1)


def _look(position: int) -> tuple[str, str]:
    own = min(position, MOST_NAMED)
    return MATERIAL_COLOURS[own % len(MATERIAL_COLOURS)], MARKERS[own % len(MARKERS)]


def _draw_points(ax: Axes, one: Compared, position: int, name: str, unit: Unit) -> ErrorbarContainer:
    """Draw the readings with bars of 2 standard uncertainties; of very many every so many."""
    colour, marker = _look(position)
    step = -(-len(one.points) // MOST_MARKS)
    shown = [point for k, point in enumerate(one.points) if k % step == 0 or k == one.farthest]
    return ax.errorbar(
        celsius(np.array([point.T for point in shown])),
        np.array([point.drift for point in shown]) * unit.factor,
        yerr=COVER * np.array([point.uncertainty for point in shown]) * unit.factor,
        fmt=marker,
        ms=3.5,
        color=colour,
        lw=0.0,
        elinewidth=0.8,
        capsize=1.5,
        zorder=5,
        label=name,
    )


def _draw_explained(ax: Axes, one: Compared, position: int, T: FloatArray, unit: Unit) -> Line2D:
    colour, _ = _look(position)
    (line,) = ax.plot(
        T,
        np.array(one.curve) * unit.factor,
        color=colour,
        lw=0.9,
        zorder=4,
        label="as explained" if position == 0 else "_explained",
    )
    return line


def compare_figure(plan: Plan, comparison: Comparison) -> Figure:
    """Return the figure of a comparison; draw and save it inside `figure_style`."""
    figure = Figure(figsize=COMPARE_INCHES)
    draw_compare(figure.add_axes((0.11, 0.11, 0.6, 0.81)), plan, comparison)
    return figure


def compare_figure_files(plan: Plan, comparison: Comparison) -> dict[str, bytes]:
    """Return compare.svg and compare.png, the same bytes every time."""
    with figure_style():
        figure = compare_figure(plan, comparison)
        words = (
            "Measured drift and the plan",
            "Drift of the measured devices with error bars of 2 standard uncertainties, the nominal "
            "prediction, the worst case at each temperature, the band of likely lots, and the limits.",
        )
        return picture_files("compare", figure, *words)
