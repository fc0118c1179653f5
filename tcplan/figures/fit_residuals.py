"""The residuals of a fit over temperature, by lot or device, with those that stand out named by line."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.legend import Legend
from matplotlib.lines import Line2D
from matplotlib.text import Annotation

from tcplan.arrays import FloatArray
from tcplan.figures.fit_groups import celsius, finish, groups_of, shown_rows
from tcplan.figures.labels import Name, marker_box, place_names
from tcplan.figures.panel import put_legend
from tcplan.figures.style import CHOSEN, LIMIT, LIMIT_DASHES, OTHER, number_text
from tcplan.measure.fitted import FittedMaterial

RESIDUAL_INCHES = (7.2, 3.6)
MOST_LINES = 12  # outliers that are named
ROOM = 1.2  # of the farthest residual, so that names find room


@dataclass(frozen=True, slots=True, kw_only=True)
class ResidualArtists:
    """What was drawn; ``lines`` are the names of outliers, the farthest first."""

    points: tuple[Line2D, ...]
    sigma: tuple[Line2D, Line2D]
    outliers: Line2D
    lines: tuple[Annotation, ...]
    legend: Legend


def draw_residuals(ax: Axes, one: FittedMaterial) -> ResidualArtists:
    """Draw (R - fit)/fit of every reading, each about the law of its own device.

    Parameters
    ----------
    ax : Axes
        With its final position; the legend goes to the right of it.
    one : FittedMaterial

    Returns
    -------
    ResidualArtists
        The lines of 2 sigma are of the root mean square over the devices.
    """
    residuals = residuals_of(one) * 1e6
    sigma = 1e6 * math.sqrt(float(np.mean([fit.sigma**2 for fit in one.fits])))
    reach = ROOM * max(float(np.max(np.abs(residuals))), 2.0 * sigma, 1e-6)
    ax.set_ylim(-reach, reach)
    finish(ax, one, f"{one.request.name}: residuals about the law of each device", "Residual (ppm)")
    ax.axhline(0.0, color=OTHER, lw=0.6, zorder=1.5, label="_zero")
    points = []
    for group in groups_of(one):
        rows = shown_rows(one, group)
        (line,) = ax.plot(celsius(one.sweep.T[rows]), residuals[rows], linestyle="none", zorder=3)
        line.set(marker=group.marker, markersize=3.2, color=group.colour, markeredgewidth=0.0)
        line.set_label(group.label)
        points.append(line)
    lines = [
        ax.axhline(sign * 2.0 * sigma, color=LIMIT, linestyle=LIMIT_DASHES[2], lw=0.9, zorder=2)
        for sign in (1.0, -1.0)
    ]
    shown = number_text(float(f"{2.0 * sigma:.3g}"))
    lines[0].set_label(f"2 sigma, \N{PLUS-MINUS SIGN}{shown} ppm")
    lines[1].set_label("_lower")
    outliers, names = _outliers(ax, one, residuals)
    return ResidualArtists(
        points=tuple(points),
        sigma=(lines[0], lines[1]),
        outliers=outliers,
        lines=names,
        legend=put_legend(ax),
    )


def residuals_of(one: FittedMaterial) -> FloatArray:
    """Return (R - fit)/fit of every reading, in the order of the sweep."""
    found = np.empty_like(one.sweep.R)
    for k, fit in enumerate(one.fits):
        found[one.sweep.device == k] = fit.residuals
    return found


def _outliers(ax: Axes, one: FittedMaterial, residuals: FloatArray) -> tuple[Line2D, tuple[Annotation, ...]]:
    """Draw a ring around each outlier, and the number of its line beside the farthest of them."""
    flagged = [flag.line for fit in one.fits for flag in fit.flags if flag.outlier]
    rows = np.flatnonzero(np.isin(one.sweep.line, flagged))
    rows = rows[np.argsort(-np.abs(residuals[rows]), kind="stable")]
    degC = celsius(one.sweep.T)
    (rings,) = ax.plot(degC[rows], residuals[rows], linestyle="none", zorder=5)
    rings.set(marker="o", markersize=7.5, markerfacecolor="none", markeredgecolor=CHOSEN, markeredgewidth=0.9)
    rings.set_label(f"outliers: {len(rows)}, by line" if len(rows) else "_no outliers")
    named = rows[:MOST_LINES].tolist()
    names = [
        Name(x=float(degC[k]), y=float(residuals[k]), text=str(one.sweep.line[k]), colour=CHOSEN)
        for k in named
    ]
    boxes = [marker_box(ax, name.x, name.y) for name in names]
    return rings, place_names(ax, names, boxes)[0]


def residuals_figure(one: FittedMaterial) -> Figure:
    """Return the figure of the residuals; draw and save it inside `figure_style`."""
    figure = Figure(figsize=RESIDUAL_INCHES)
    draw_residuals(figure.add_axes((0.11, 0.125, 0.6, 0.8)), one)
    return figure
