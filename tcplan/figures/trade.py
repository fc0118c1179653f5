"""The trade of drawn parts: the area of each way against the drift that it is judged by."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.text import Annotation, Text
from matplotlib.ticker import FuncFormatter, LogLocator, MaxNLocator, NullLocator

from tcplan.figures.labels import Name, marker_box, page_box, place_names
from tcplan.figures.limits import FITS
from tcplan.figures.pictures import picture_files
from tcplan.figures.style import (
    CHOSEN,
    FAINT,
    LIMIT,
    LIMIT_DASHES,
    SMALL_SIZE,
    SPREAD_LINE,
    TEXT_SIZE,
    figure_style,
    number_text,
    shortened,
)

INCHES_WIDE = 7.2
PANEL, BELOW, ABOVE, LINE = 210.0, 36.0, 22.0, 10.0  # points
WIDE = 5.0  # greatest over least area from which the axis is logarithmic
FAR = 300.0  # from here on only powers of ten are marked
MM2 = 1e-7  # m^2; from this area on mm^2 reads better
MARGIN = 0.08

Way = tuple[float, float, str]
"""Area [m^2], judged figure (a fraction) and label of one way to draw all films."""


@dataclass(frozen=True, slots=True, kw_only=True)
class TradeArtists:
    """What was drawn; ``labels`` says what the numbers of the ways mean."""

    ways: Line2D
    taken: Line2D
    limit: Line2D | None
    numbers: tuple[Annotation, ...]
    labels: Text


def draw_trade(
    ax: Axes, points: Sequence[Way], taken: int | None = None, limit: float | None = None
) -> TradeArtists:
    """Draw area against judged drift of all ways, numbered in their order.

    Parameters
    ----------
    ax : Axes
        With its final position. The labels of the numbers go below it.
    points : sequence of (float, float, str)
        Area [m^2], judged figure (a fraction) and label of each way; one at least.
    taken : int, optional
        Position of the way that is taken.
    limit : float, optional
        On the judged figure (a fraction).

    Returns
    -------
    TradeArtists
    """
    unit, factor = ("mm^2", 1e6) if max(point[0] for point in points) >= MM2 else ("um^2", 1e12)
    areas = [area * factor for area, _, _ in points]
    drifts = [figure * 1e6 for _, figure, _ in points]
    order = sorted(range(len(points)), key=lambda k: (areas[k], -drifts[k]))
    near = limit is not None and limit * 1e6 <= FITS * max(drifts)
    _axis(ax, "x", areas)
    _axis(ax, "y", [*drifts, limit * 1e6] if near and limit is not None else drifts)
    (ways,) = ax.plot(
        [areas[k] for k in order], [drifts[k] for k in order], color=SPREAD_LINE, lw=0.8, zorder=3
    )
    ways.set(drawstyle="steps-post", marker="o", markersize=4.0, label="ways to draw all films")
    chosen = [] if taken is None else [taken]
    (mark,) = ax.plot([areas[k] for k in chosen], [drifts[k] for k in chosen], linestyle="none", zorder=4)
    mark.set(marker="s", markersize=7.0, color=CHOSEN, label="taken" if chosen else "_taken")
    line = None if limit is None else _limit(ax, limit * 1e6, near=near)
    ax.set_xlabel(f"Area ({unit})")
    ax.set_ylabel("Judged drift (ppm)")
    ax.set_title("Area and judged drift", loc="left", fontsize=TEXT_SIZE)
    ax.grid(color=FAINT, lw=0.5)
    ax.legend(loc="upper left", bbox_to_anchor=(1.015, 1.0), borderaxespad=0.0, frameon=False).set_zorder(5)
    return TradeArtists(
        ways=ways,
        taken=mark,
        limit=line,
        numbers=_numbers(ax, areas, drifts, taken),
        labels=_labels(ax, points, taken),
    )


def _axis(ax: Axes, which: str, values: Sequence[float]) -> None:
    """Set limits and ticks of one axis, logarithmic when the values lie far apart."""
    low, high = min(values), max(values)
    axis, limits, scale = (
        (ax.xaxis, ax.set_xlim, ax.set_xscale) if which == "x" else (ax.yaxis, ax.set_ylim, ax.set_yscale)
    )
    if low > 0.0 and high >= WIDE * low:
        scale("log")
        by = (high / low) ** MARGIN
        limits(low / by, high * by)
        axis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0) if high < FAR * low else (1.0,), numticks=30))
        axis.set_minor_locator(NullLocator())
    else:
        by = max(MARGIN * (high - low), 0.02 * high, 1e-9)
        limits(low - by, high + by)
        axis.set_major_locator(MaxNLocator(6))
    axis.set_major_formatter(FuncFormatter(lambda number, _: number_text(number)))


def _limit(ax: Axes, ppm: float, *, near: bool) -> Line2D:
    text = f"limit {number_text(ppm)} ppm" + ("" if near else ",\nbeyond this scale")
    return ax.axhline(ppm, color=LIMIT, linestyle=LIMIT_DASHES[0], lw=1.1, zorder=2, label=text)


def _numbers(
    ax: Axes, areas: Sequence[float], drifts: Sequence[float], taken: int | None
) -> tuple[Annotation, ...]:
    """Write the number of each way beside its mark."""
    names = [
        Name(x=x, y=y, text=str(n + 1), colour=CHOSEN, bold=n == taken)
        for n, (x, y) in enumerate(zip(areas, drifts, strict=True))
    ]
    boxes = [marker_box(ax, x, y) for x, y in zip(areas, drifts, strict=True)]
    return place_names(ax, names, boxes)[0]


def _labels(ax: Axes, points: Sequence[Way], taken: int | None) -> Text:
    """Write what the numbers mean below the axes, a line each."""
    page = page_box(ax)
    width = 72.0 * INCHES_WIDE - page.left - 30.0
    lines = [
        f"{n}{' (taken)' if n - 1 == taken else ''}  {label}"
        for n, (_, _, label) in enumerate(points, start=1)
    ]
    return ax.annotate(
        "\n".join(shortened(line, width, SMALL_SIZE) for line in lines),
        (0.0, 0.0),
        xycoords="axes fraction",
        xytext=(0.0, -BELOW),
        textcoords="offset points",
        va="top",
        fontsize=SMALL_SIZE,
        color=CHOSEN,
        parse_math=False,
    )


def trade_figure_files(
    points: Sequence[Way], taken: int | None = None, limit: float | None = None
) -> dict[str, bytes]:
    """Return trade.svg and trade.png, the same bytes every time; its parameters are those of `draw_trade`."""
    with figure_style():
        below = BELOW + LINE * len(points) + 8.0
        page = ABOVE + PANEL + below
        figure = Figure(figsize=(INCHES_WIDE, page / 72.0))
        draw_trade(figure.add_axes((0.115, below / page, 0.62, PANEL / page)), points, taken, limit)
        words = "Area of each way to draw all films against its judged drift, the taken one marked."
        return picture_files("trade", figure, "Area and judged drift", words)
