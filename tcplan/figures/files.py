"""The figures of a plan as files: SVG to print and PNG to paste, the same bytes every time."""

from __future__ import annotations

import io

from matplotlib.figure import Figure

from tcplan.figures.drift import draw_drift
from tcplan.figures.slope_curvature import draw_slope_curvature, is_crowded
from tcplan.figures.style import DRIFT_INCHES, PLANE_INCHES, PNG_DPI, figure_style
from tcplan.plan import Plan


def figure_files(plan: Plan) -> dict[str, bytes]:
    """Return the content of every figure file of a plan, by file name.

    Parameters
    ----------
    plan : Plan

    Returns
    -------
    dict of str to bytes
        drift.svg, drift.png, slope-curvature.svg and slope-curvature.png.
    """
    found: dict[str, bytes] = {}
    with figure_style():
        for name, figure in (
            ("drift", drift_figure(plan)),
            ("slope-curvature", slope_curvature_figure(plan)),
        ):
            found[f"{name}.svg"] = _svg(figure)
            found[f"{name}.png"] = _png(figure)
    return found


def drift_figure(plan: Plan) -> Figure:
    """Return the drift figure, its two panels one above the other."""
    figure = Figure(figsize=DRIFT_INCHES)
    ax = figure.add_axes((0.11, 0.475, 0.6, 0.485))
    residual_ax = figure.add_axes((0.11, 0.08, 0.6, 0.325))
    draw_drift(ax, residual_ax, plan)
    return figure


def slope_curvature_figure(plan: Plan) -> Figure:
    """Return the TC1-TC2 figure; its axes leave room at the right when an enlarged part goes there."""
    figure = Figure(figsize=PLANE_INCHES)
    ax = figure.add_axes((0.115, 0.285, 0.38 if is_crowded(plan) else 0.865, 0.66))
    draw_slope_curvature(ax, plan)
    return figure


def _png(figure: Figure) -> bytes:
    content = io.BytesIO()
    figure.savefig(content, format="png", dpi=PNG_DPI, metadata={"Software": None})
    return content.getvalue()


def _svg(figure: Figure) -> bytes:
    """Return SVG without date, writer's version, or a document type that points to a web address."""
    content = io.StringIO()
    nothing = dict.fromkeys(("Date", "Creator", "Format", "Type"))
    figure.savefig(content, format="svg", metadata=nothing)
    text = content.getvalue()
    return ('<?xml version="1.0" encoding="utf-8"?>\n' + text[text.index("<svg") :]).encode()
