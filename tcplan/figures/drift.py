"""Drift against temperature: materials alone, the chosen option and the best others; then its residue."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.legend import Legend
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter

from tcplan.arrays import FloatArray
from tcplan.drift import Curve
from tcplan.figures.alternatives import best_of_each, draw_alternatives, worth_enlarging
from tcplan.figures.curves import (
    bounds,
    celsius,
    material_drift,
    option_drift,
    temperatures,
    worst_drift,
)
from tcplan.figures.labels import page_box
from tcplan.figures.limits import Unit, draw_limits, unit_of, view_of
from tcplan.figures.style import (
    CHOSEN,
    FAINT,
    OTHER,
    SMALL_SIZE,
    TEXT_SIZE,
    WORST,
    WORST_DASH,
    Look,
    looks,
    number_text,
    short_names,
)
from tcplan.network import used_materials
from tcplan.plan import Plan
from tcplan.units import from_celsius

LEGEND_LINE = 1.1  # height of a line of a legend, in sizes of its text


@dataclass(frozen=True, slots=True, kw_only=True)
class DriftArtists:
    """What was drawn; ``others`` are the materials beyond those that have a colour.

    ``options`` are the best of each arrangement by kind; ``residual_options`` those drawn below too.
    """

    materials: dict[str, Line2D]
    others: tuple[Line2D, ...]
    options: dict[str, Line2D]
    chosen: Line2D
    limits: tuple[Line2D | PolyCollection, ...]
    residual: Line2D
    residual_options: dict[str, Line2D]
    worst: Line2D | None
    residual_limits: tuple[Line2D | PolyCollection, ...]
    peaks: tuple[Line2D, ...]
    references: tuple[Line2D, ...]
    legends: tuple[Legend, ...]


def draw_drift(ax: Axes, residual_ax: Axes, plan: Plan) -> DriftArtists:
    """Draw the drift of every material alone and of the options, and below it the chosen option.

    Parameters
    ----------
    ax : Axes
        For all curves on one scale. Legends go to the right of the axes, outside.
    residual_ax : Axes
        For the chosen option at its own scale, with its verified peak and its worst case; and for
        the options that cannot be told from it above, as far as they fit.
    plan : Plan

    Returns
    -------
    DriftArtists
    """
    T = temperatures(plan)
    own, worst, best = option_drift(plan, plan.best), worst_drift(plan), best_of_each(plan)
    singles = {material.name: material_drift(plan, material.name)(T) for material in plan.materials}
    drifts = {kind: option_drift(plan, option)(T) for kind, option in best.items()}
    limits = bounds(plan, own)
    view = view_of([*singles.values(), *drifts.values(), own(T)], limits)
    unit = unit_of(view)
    material_lines, others = _draw_singles(ax, plan, celsius(T), singles, unit)
    option_lines = draw_alternatives(ax, best, celsius(T), drifts, unit)
    (chosen,) = ax.plot(celsius(T), own(T) * unit.factor, color=CHOSEN, lw=2.8, zorder=5)
    chosen.set_label(f"{plan.chosen} (chosen)")
    upper_limits = draw_limits(ax, limits, unit, view)
    title = "the chosen option and the best others" if best else "and the chosen option"
    _finish(ax, plan, unit, view, f"Each material alone, {title}")
    ax.set_xlabel("")
    ax.tick_params(labelbottom=False)

    judged = worst if worst and plan.limit.judge == "worst-case" else own
    limits = bounds(plan, judged)
    shown = [own(T), *([worst(T)] if worst else [])]
    near = worth_enlarging(drifts, own(T), view, view_of(shown, limits))
    view = view_of([*shown, *near.values()], limits)
    unit = unit_of(view)
    residual, worst_line, peaks = _draw_residual(residual_ax, plan, T, (own, worst), unit)
    near_lines = draw_alternatives(residual_ax, best, celsius(T), near, unit)
    lower_limits = draw_limits(
        residual_ax, limits, unit, view, "around the worst case" if judged is worst else ""
    )
    _finish(residual_ax, plan, unit, view, f"The chosen option at its own scale: {plan.chosen}")
    references = tuple(_draw_reference(part, plan) for part in (ax, residual_ax))
    return DriftArtists(
        materials=material_lines,
        others=others,
        options=option_lines,
        chosen=chosen,
        limits=upper_limits,
        residual=residual,
        residual_options=near_lines,
        worst=worst_line,
        residual_limits=lower_limits,
        peaks=peaks,
        references=references,
        legends=tuple(_legend(part) for part in (ax, residual_ax)),
    )


def _draw_singles(
    ax: Axes, plan: Plan, degC: FloatArray, drifts: dict[str, FloatArray], unit: Unit
) -> tuple[dict[str, Line2D], tuple[Line2D, ...]]:
    """Draw each material alone: coloured as far as colours go, the rest in thin grey."""
    look = looks(list(drifts), used_materials(plan.best.network))
    names = short_names(list(look))
    lines: dict[str, Line2D] = {}
    others: list[Line2D] = []
    for name in (*look, *(n for n in drifts if n not in look)):
        (line,) = ax.plot(degC, drifts[name] * unit.factor, color=OTHER, lw=0.7, zorder=2)
        if name in look:
            _wear(line, look[name], len(lines), names[name])
            lines[name] = line
        else:
            line.set_label("_other" if others else f"{len(drifts) - len(look)} other materials")
            others.append(line)
    return lines, tuple(others)


def _wear(line: Line2D, look: Look, position: int, name: str) -> None:
    """Give a line its colour, dash and markers; these start apart so that they do not coincide."""
    line.set(color=look.colour, linestyle=look.dash, linewidth=1.3, zorder=3, label=name)
    line.set(marker=look.marker, markersize=4.5, markeredgecolor="white", markeredgewidth=0.5)
    line.set_markevery((0.02 + 0.013 * position, 0.14))


def _draw_residual(
    ax: Axes, plan: Plan, T: FloatArray, curves: tuple[Curve, Curve | None], unit: Unit
) -> tuple[Line2D, Line2D | None, tuple[Line2D, ...]]:
    """Draw the chosen option, its worst device, and a mark at the peak of each."""
    own, worst = curves
    (residual,) = ax.plot(
        celsius(T), own(T) * unit.factor, color=CHOSEN, lw=2.4, zorder=5, label="materials nominal"
    )
    peaks = [_mark(ax, own, plan.best.nominal.at_degC, unit, filled=True)]
    line = None
    if worst is not None and plan.best.worst_case is not None:
        (line,) = ax.plot(
            celsius(T),
            worst(T) * unit.factor,
            color=WORST,
            linestyle=WORST_DASH,
            lw=1.4,
            zorder=4,
            label="worst case of the spread",
        )
        peaks.append(_mark(ax, worst, plan.best.worst_case.at_degC, unit, filled=False))
    return residual, line, tuple(peaks)


def _mark(ax: Axes, curve: Curve, at_degC: float, unit: Unit, *, filled: bool) -> Line2D:
    """Mark the peak of a curve where verify found it."""
    height = float(curve(np.array([from_celsius(at_degC)]))[0]) * unit.factor
    colour = CHOSEN if filled else WORST
    (mark,) = ax.plot(
        [at_degC],
        [height],
        linestyle="none",
        marker="o",
        markersize=6.0,
        markerfacecolor=colour if filled else "white",
        markeredgecolor=colour,
        markeredgewidth=1.3,
        zorder=6,
        clip_on=False,
        label="its verified peak" if filled else "where it is judged",
    )
    return mark


def _draw_reference(ax: Axes, plan: Plan) -> Line2D:
    at = plan.range.reference_degC
    label = f"reference {number_text(at)} \N{DEGREE SIGN}C"
    return ax.axvline(at, color=OTHER, lw=0.8, linestyle=":", zorder=1, label=label)


def _finish(ax: Axes, plan: Plan, unit: Unit, view: tuple[float, float], title: str) -> None:
    """Set limits, labels and grid."""
    ax.set_xlim(plan.range.low_degC, plan.range.high_degC)
    ax.set_ylim(view[0] * unit.factor, view[1] * unit.factor)
    ax.set_xlabel("Temperature (\N{DEGREE SIGN}C)")
    ax.set_ylabel(f"Drift ({unit.name})")
    ax.yaxis.set_label_coords(-0.13, 0.5)
    ax.set_title(title, loc="left", fontsize=TEXT_SIZE, parse_math=False)
    for axis in (ax.xaxis, ax.yaxis):
        axis.set_major_formatter(FuncFormatter(lambda number, _: number_text(number)))
    ax.grid(color=FAINT, lw=0.5)
    ax.axhline(0.0, color=OTHER, lw=0.6, zorder=1, label="_zero")


def _legend(ax: Axes) -> Legend:
    """Put the legend to the right of the axes, where it covers no curve; a long one is set closer."""
    lines, page = sum(1 + label.count("\n") for label in ax.get_legend_handles_labels()[1]), page_box(ax)
    room = (page.top - page.bottom) / (lines * SMALL_SIZE) - LEGEND_LINE
    legend = ax.legend(
        loc="upper left",
        bbox_to_anchor=(1.015, 1.0),
        borderaxespad=0.0,
        frameon=False,
        fontsize=SMALL_SIZE,
        handlelength=2.8,
        labelspacing=min(0.5, max(0.0, room)),
    )
    for text in legend.get_texts():
        text.set_parse_math(False)
    return legend
