"""Drift against temperature: materials alone, the chosen option and the best others; then its residue."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.legend import Legend
from matplotlib.lines import Line2D

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
from tcplan.figures.limits import Unit, draw_limits, unit_of, view_of
from tcplan.figures.lots import central_band, draw_band, lots_of
from tcplan.figures.panel import draw_reference, finish, put_legend
from tcplan.figures.style import (
    CHOSEN,
    OTHER,
    WORST,
    WORST_DASH,
    Look,
    looks,
    short_names,
)
from tcplan.network import used_materials
from tcplan.plan import Plan
from tcplan.units import from_celsius


@dataclass(frozen=True, slots=True, kw_only=True)
class DriftArtists:
    """What was drawn; ``others`` are the materials beyond those that have a colour.

    ``options`` are the best of each arrangement by kind; ``residual_options`` those drawn below too.
    ``spread`` is the band of the lots, None where a material of the option has no spread.
    """

    materials: dict[str, Line2D]
    others: tuple[Line2D, ...]
    options: dict[str, Line2D]
    chosen: Line2D
    limits: tuple[Line2D | PolyCollection, ...]
    residual: Line2D
    residual_options: dict[str, Line2D]
    worst: Line2D | None
    spread: PolyCollection | None
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
        For the chosen option at its own scale, with its verified peak, its worst case and the spread of
        its lots; and for the options that cannot be told from it above, as far as they fit.
    plan : Plan

    Returns
    -------
    DriftArtists
    """
    # Long: one panel after the other, on curves, limits and units that both of them need.
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
    finish(ax, plan, unit, view, f"Each material alone, {title}")
    ax.set_xlabel("")
    ax.tick_params(labelbottom=False)

    judged = worst if worst and plan.limit.judge == "worst-case" else own
    limits = bounds(plan, judged)
    lots = lots_of(plan)
    band = central_band(plan, lots) if lots else None
    shown = [own(T), *([worst(T)] if worst else []), *([band.lower, band.upper] if band else [])]
    near = worth_enlarging(drifts, own(T), view, view_of(shown, limits))
    view = view_of([*shown, *near.values()], limits)
    unit = unit_of(view)
    spread = draw_band(residual_ax, band, unit) if band else None
    residual, worst_line, peaks = _draw_residual(residual_ax, plan, T, (own, worst), unit)
    near_lines = draw_alternatives(residual_ax, best, celsius(T), near, unit)
    lower_limits = draw_limits(
        residual_ax, limits, unit, view, "around the worst case" if judged is worst else ""
    )
    finish(residual_ax, plan, unit, view, f"The chosen option at its own scale: {plan.chosen}")
    references = tuple(draw_reference(part, plan) for part in (ax, residual_ax))
    return DriftArtists(
        materials=material_lines,
        others=others,
        options=option_lines,
        chosen=chosen,
        limits=upper_limits,
        residual=residual,
        residual_options=near_lines,
        worst=worst_line,
        spread=spread,
        residual_limits=lower_limits,
        peaks=peaks,
        references=references,
        legends=tuple(put_legend(part) for part in (ax, residual_ax)),
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
        label="nominal peak, verified" if filled else "worst peak, verified",
    )
    return mark
