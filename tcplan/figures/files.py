"""The figures of a plan as files: SVG to print and PNG to paste, the same bytes every time."""

from __future__ import annotations

from matplotlib.figure import Figure

from tcplan.figures.drift import draw_drift
from tcplan.figures.lots import Lots, lots_of
from tcplan.figures.network import draw_network, sketch_of
from tcplan.figures.pictures import picture_files
from tcplan.figures.slope_curvature import draw_slope_curvature, is_crowded
from tcplan.figures.spread import draw_spread
from tcplan.figures.style import (
    DRIFT_INCHES,
    PLANE_INCHES,
    SMALL_SIZE,
    TEXT_SIZE,
    figure_style,
    number_text,
    shortened,
    text_width,
)
from tcplan.network import network_text, value
from tcplan.plan import Plan
from tcplan.units import format_ohms

NETWORK_TITLE = 380.0  # points that the title of the network may take


def figure_files(plan: Plan) -> dict[str, bytes]:
    """Return the content of every figure file of a plan, by file name.

    Parameters
    ----------
    plan : Plan

    Returns
    -------
    dict of str to bytes
        network, drift, spread and slope-curvature, each as .svg and .png; no spread where a material
        of the chosen option does not state one.
    """
    found: dict[str, bytes] = {}
    words, lots = _words(plan), lots_of(plan)
    with figure_style():
        for name, figure in (
            ("network", network_figure(plan)),
            ("drift", drift_figure(plan)),
            *([("spread", spread_figure(plan, lots))] if lots else []),
            ("slope-curvature", slope_curvature_figure(plan)),
        ):
            found |= picture_files(name, figure, *words[name])
    return found


def network_figure(plan: Plan) -> Figure:
    """Return the schematic of the chosen option, on a page no larger than it needs."""
    option, reference = plan.best, number_text(plan.range.reference_degC)
    sketch = sketch_of(option.network)
    title = f"{option.id}: {format_ohms(value(option.network))} at {reference} \N{DEGREE SIGN}C"
    title = shortened(title, NETWORK_TITLE)
    below, above, side = (24.0 if sketch.note else 8.0), 28.0, 9.0  # points
    words = max(text_width(title), text_width(sketch.note, SMALL_SIZE)) + 8.0
    across, up = max(sketch.size[0], words), sketch.size[1]
    width, height = across + 2.0 * side, below + up + above
    figure = Figure(figsize=(width / 72.0, height / 72.0))
    ax = figure.add_axes((side / width, below / height, across / width, up / height))
    draw_network(ax, option)
    ax.set_title(title, loc="left", fontsize=TEXT_SIZE, pad=9.0, parse_math=False)
    return figure


def drift_figure(plan: Plan) -> Figure:
    """Return the drift figure, its two panels one above the other."""
    figure = Figure(figsize=DRIFT_INCHES)
    ax = figure.add_axes((0.11, 0.475, 0.6, 0.485))
    residual_ax = figure.add_axes((0.11, 0.08, 0.6, 0.325))
    draw_drift(ax, residual_ax, plan)
    return figure


def spread_figure(plan: Plan, lots: Lots) -> Figure:
    """Return the figure of the spread: curves of lots above, the histogram of what is judged below."""
    figure = Figure(figsize=DRIFT_INCHES)
    ax = figure.add_axes((0.11, 0.51, 0.6, 0.45))
    histogram_ax = figure.add_axes((0.11, 0.08, 0.6, 0.29))
    draw_spread(ax, histogram_ax, plan, lots)
    return figure


def slope_curvature_figure(plan: Plan) -> Figure:
    """Return the TC1-TC2 figure; its axes leave room at the right when an enlarged part goes there."""
    figure = Figure(figsize=PLANE_INCHES)
    ax = figure.add_axes((0.115, 0.285, 0.38 if is_crowded(plan) else 0.865, 0.66))
    draw_slope_curvature(ax, plan)
    return figure


def _words(plan: Plan) -> dict[str, tuple[str, str]]:
    """Return the title and the description of each figure."""
    network = network_text(plan.best.network, lambda leg: f"{leg.material} {format_ohms(leg.ohms)}")
    return {
        "network": (
            "Network of the chosen option",
            f"Schematic of {network}, where + is series and || is parallel.",
        ),
        "drift": (
            "Drift over temperature",
            "Each material alone, the chosen option and the best others; below, the chosen option at its "
            "own scale, with its limits, its worst case and the spread of its lots.",
        ),
        "spread": (
            "Spread of the lots",
            "Curves of drawn lots of the chosen option over temperature, with nominal materials, the worst "
            "case, the process corners and the limits; below, how many lots have which judged figure.",
        ),
        "slope-curvature": (
            "Slope and curvature",
            "TC1 and TC2 of the materials and the options, with contours of equal peak drift.",
        ),
    }
