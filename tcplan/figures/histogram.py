"""The judged figure of drawn lots as a histogram, with what it is compared with and how many are inside."""

from __future__ import annotations

import math
from typing import Any

from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import StepPatch
from matplotlib.text import Text
from matplotlib.ticker import FuncFormatter, MaxNLocator

from tcplan.figures.limits import Unit, unit_of
from tcplan.figures.lots import Lots
from tcplan.figures.style import (
    CHOSEN,
    FAINT,
    LIMIT,
    LIMIT_DASHES,
    NAME_WIDTH,
    QUANTILE_DASH,
    SMALL_SIZE,
    SPREAD_FILL,
    SPREAD_LINE,
    TEXT_SIZE,
    WORST,
    WORST_DASH,
    number_text,
    percent_text,
    text_width,
)
from tcplan.plan import Likely, Plan
from tcplan.units import round_outward

FIGURES = {
    "none": "Peak drift",
    "drift": "Peak drift",
    "band": "Band of the drift",
    "box_tcr": "Band of the drift",
    "chord_tcr": "Chord TCR times the longer arm",
    "mask": "Drift against the mask, at its tightest line",
}
LEAST_WIDTH = 0.02  # of the highest figure; lots that hardly differ are no more than a line
REACH = 1.5  # a limit so many widths of all else away is still brought into view
LOOKS: dict[str, dict[str, Any]] = {
    "nominal": {"color": CHOSEN, "lw": 2.4, "zorder": 3.0},
    "quantile": {"color": CHOSEN, "lw": 1.4, "linestyle": QUANTILE_DASH, "zorder": 4.0},
    "worst": {"color": WORST, "lw": 1.6, "linestyle": WORST_DASH, "zorder": 4.0},
    "limit": {"color": LIMIT, "lw": 1.1, "linestyle": LIMIT_DASHES[0], "zorder": 4.0},
}


def draw_histogram(ax: Axes, plan: Plan, lots: Lots) -> tuple[StepPatch, dict[str, Line2D], Text]:
    """Draw the histogram of the judged figure of the lots, and lines at what it is compared with.

    Parameters
    ----------
    ax : Axes
    plan : Plan
    lots : Lots
        Of the chosen option.

    Returns
    -------
    histogram : StepPatch
    marks : dict of str to Line2D
        Of LOOKS, those that are known.
    words : Text
        How many of the lots are inside the limit.
    """
    edges, counts = lots.histogram()
    figures = _figures(plan, lots.likely)
    shown = [*edges[[0, -1]].tolist(), *(figures[name] for name in figures if name != "limit")]
    view = _view(min(shown), max(shown), figures.get("limit"))
    unit = unit_of(view)
    histogram = ax.stairs(counts, edges * unit.factor, fill=True, facecolor=SPREAD_FILL, zorder=2.0)
    histogram.set(edgecolor=SPREAD_LINE, linewidth=0.7, label="drawn lots")
    labels = _labels(plan, lots.likely, unit)
    marks: dict[str, Line2D] = {}
    for name, figure in figures.items():
        beyond = "" if view[0] <= figure <= view[1] else ",\nbeyond this scale"
        marks[name] = ax.axvline(figure * unit.factor, label=labels[name] + beyond, **LOOKS[name])
    ax.set_xlim(view[0] * unit.factor, view[1] * unit.factor)
    _finish(ax, f"{FIGURES.get(plan.limit.kind, 'Judged figure')} ({unit.name})")
    words = ax.set_title(_words(lots.likely), loc="left", fontsize=TEXT_SIZE, parse_math=False)
    return histogram, marks, words


def _figures(plan: Plan, likely: Likely) -> dict[str, float]:
    """Return the figures to mark, as fractions."""
    option, limit = plan.best, plan.limit.drift_ppm
    found = {"nominal": option.nominal.figure_ppm, "quantile": likely.peak_ppm}
    if option.worst_case is not None:
        found["worst"] = option.worst_case.peak_ppm
    if limit is not None:
        found["limit"] = limit
    return {name: ppm * 1e-6 for name, ppm in found.items()}


def _view(low: float, high: float, limit: float | None) -> tuple[float, float]:
    """Return the lowest and highest figure to show, with a margin; the limit if it is near enough."""
    width = max(high - low, LEAST_WIDTH * high, 1e-9)
    if limit is not None and low - REACH * width <= limit <= high + REACH * width:
        low, high = min(low, limit), max(high, limit)
    margin = 0.04 * max(high - low, width)
    return low - margin, high + margin


def _labels(plan: Plan, likely: Likely, unit: Unit) -> dict[str, str]:
    """Return what the legend says of each mark."""

    def amount(ppm: float) -> str:
        return f"{number_text(ppm * 1e-6 * unit.factor)} {unit.name}"

    worst, limit = plan.best.worst_case, plan.limit.drift_ppm
    few = likely.high_ppm is None
    found = {
        # Without its figure: that may be known less well than a place on the axis says.
        "nominal": ("materials nominal", ""),
        "quantile": (
            f"{percent_text(likely.fraction)} of lots",
            "too few drawn to tell" if few else f"within {amount(_outward(likely.peak_ppm, limit))}",
        ),
    }
    if worst is not None:
        found["worst"] = "worst case", amount(_outward(worst.peak_ppm, limit))
    if limit is not None:
        found["limit"] = "limit", amount(limit)
    judged = {"nominal": "nominal", "worst-case": "worst", "quantile": "quantile"}[plan.limit.judge]
    return {
        name: _label(f"{what}, judged" if name == judged else what, figure)
        for name, (what, figure) in found.items()
    }


def _label(what: str, figure: str) -> str:
    """Return a label; a figure that would make it too long for the page gets a line of its own."""
    if not figure:
        return what
    short = f"{what}: {figure}"
    return short if text_width(short, SMALL_SIZE) <= NAME_WIDTH else f"{what}:\n{figure}"


def _outward(ppm: float, limit: float | None) -> float:
    """Return a figure rounded up to 3 digits, or to so many that it stays on its side of the limit."""
    for digits in range(3, 12):
        rounded = round_outward(ppm, digits)
        if limit is None or not ppm <= limit < rounded:
            return rounded
    return ppm


def _words(likely: Likely) -> str:
    """Return how many lots are inside the limit, and no more of all lots than they tell."""
    drawn = f"{number_text(likely.draws)} drawn lots"
    if likely.inside is None or likely.inside_low is None or likely.inside_high is None:
        return f"The judged figure of {drawn}; no limit was given"
    inside = round(likely.inside * likely.draws)
    found = f"{number_text(inside)} of {drawn} are"
    if inside in (0, likely.draws):
        found = f"all {drawn} are" if inside else f"none of {drawn} is"
    low, high = math.floor(likely.inside_low * 1e4) / 100.0, math.ceil(likely.inside_high * 1e4) / 100.0
    return (
        f"The judged figure: {found} inside the limit,\n"
        f"so {low:g} % to {high:g} % of all lots are (exact 95 % interval)"
    )


def _finish(ax: Axes, label: str) -> None:
    """Set labels and grid."""
    ax.set_xlabel(label)
    ax.set_ylabel("Lots")
    ax.yaxis.set_label_coords(-0.13, 0.5)
    ax.yaxis.set_major_locator(MaxNLocator(5, integer=True))
    for axis in (ax.xaxis, ax.yaxis):
        axis.set_major_formatter(FuncFormatter(lambda number, _: number_text(number)))
    ax.grid(color=FAINT, lw=0.5)
