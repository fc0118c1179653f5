"""What the panels of drift over temperature share: axes, reference line, and a legend beside them."""

from __future__ import annotations

from matplotlib.axes import Axes
from matplotlib.legend import Legend
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter

from tcplan.figures.labels import page_box
from tcplan.figures.limits import Unit
from tcplan.figures.style import FAINT, OTHER, SMALL_SIZE, TEXT_SIZE, number_text
from tcplan.plan import Plan

LEGEND_LINE = 1.1  # height of a line of a legend, in sizes of its text


def draw_reference(ax: Axes, plan: Plan) -> Line2D:
    """Draw a line at the reference temperature."""
    at = plan.range.reference_degC
    label = f"reference {number_text(at)} \N{DEGREE SIGN}C"
    return ax.axvline(at, color=OTHER, lw=0.8, linestyle=":", zorder=1.5, label=label)


def finish(ax: Axes, plan: Plan, unit: Unit, view: tuple[float, float], title: str) -> None:
    """Set limits, labels and grid of a panel of drift over temperature."""
    ax.set_xlim(plan.range.low_degC, plan.range.high_degC)
    ax.set_ylim(view[0] * unit.factor, view[1] * unit.factor)
    ax.set_xlabel("Temperature (\N{DEGREE SIGN}C)")
    ax.set_ylabel(f"Drift ({unit.name})")
    ax.yaxis.set_label_coords(-0.13, 0.5)
    ax.set_title(title, loc="left", fontsize=TEXT_SIZE, parse_math=False)
    for axis in (ax.xaxis, ax.yaxis):
        axis.set_major_formatter(FuncFormatter(lambda number, _: number_text(number)))
    ax.grid(color=FAINT, lw=0.5)
    ax.axhline(0.0, color=OTHER, lw=0.6, zorder=1.5, label="_zero")


def put_legend(ax: Axes) -> Legend:
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
