"""The drift of a ratio over temperature: nominal, its worst device, and the limits."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter

from tcplan.arrays import FloatArray
from tcplan.figures.curves import celsius
from tcplan.figures.limits import unit_of
from tcplan.figures.pictures import picture_files
from tcplan.figures.style import (
    CHOSEN,
    FAINT,
    LIMIT,
    LIMIT_DASHES,
    LIMIT_FILL,
    OTHER,
    SMALL_SIZE,
    TEXT_SIZE,
    WORST,
    WORST_DASH,
    figure_style,
    number_text,
)
from tcplan.goal import Piece
from tcplan.ratio.check import RatioCheck

INCHES = (7.2, 3.4)
SAMPLES = 241
MARGIN = 0.07  # of the height, above and below


@dataclass(frozen=True, slots=True, kw_only=True)
class RatioArtists:
    """What was drawn."""

    nominal: Line2D
    worst: Line2D | None
    limits: tuple[Line2D | PolyCollection, ...]


def draw_ratio(ax: Axes, check: RatioCheck) -> RatioArtists:
    """Draw the drift of a ratio: nominal, the worst device where it is known, and the limits."""
    over, need, pair = check.brief.over, check.pair.need, check.pair
    T = np.unique(np.r_[np.linspace(over.low, over.high, SAMPLES), over.reference])
    curves = [pair.curve(pair.nominal()), *([pair.curve(check.worst.device)] if check.worst else [])]
    drifts = [curve(T) - need.wanted(T) for curve in curves]
    scale = need.scale or 0.0
    reach = max(max(float(np.abs(drift).max()) for drift in drifts), scale, 1e-8)
    unit = unit_of((-reach, reach))
    (nominal,) = ax.plot(celsius(T), drifts[0] * unit.factor, color=CHOSEN, lw=2.4, label="nominal", zorder=5)
    worst = None
    if len(drifts) > 1:
        (worst,) = ax.plot(celsius(T), drifts[1] * unit.factor, color=WORST, linestyle=WORST_DASH, lw=1.6)
        worst.set(label="worst device found", zorder=4)
    held = drifts[-1]
    limits = tuple(
        artist
        for n, piece in enumerate(need.pieces if need.scale else ())
        for artist in _limit(ax, piece, scale, held, unit.factor, named=n == 0)
    )
    ax.axvline(over.reference_degC, color=OTHER, lw=0.8, linestyle=":", label="reference")
    ax.axhline(0.0, color=OTHER, lw=0.6, label="_zero")
    ax.set_xlim(over.low_degC, over.high_degC)
    top = (1.0 + 2.0 * MARGIN) * reach * unit.factor
    ax.set_ylim(-top, top)
    ax.set_xlabel("Temperature (\N{DEGREE SIGN}C)")
    ax.set_ylabel(f"Drift of the ratio ({unit.name})")
    title = f"{pair.ratio.kind.capitalize()} of {number_text(check.value)} at the reference"
    ax.set_title(title, loc="left", fontsize=TEXT_SIZE, parse_math=False)
    for axis in (ax.xaxis, ax.yaxis):
        axis.set_major_formatter(FuncFormatter(lambda number, _: number_text(number)))
    ax.grid(color=FAINT, lw=0.5)
    ax.legend(loc="upper left", bbox_to_anchor=(1.015, 1.0), frameon=False, fontsize=SMALL_SIZE)
    return RatioArtists(nominal=nominal, worst=worst, limits=limits)


def _limit(
    ax: Axes, piece: Piece, scale: float, held: FloatArray, factor: float, *, named: bool
) -> list[Line2D | PolyCollection]:
    """Draw one piece of the goal: a line on either side, or for a band an area around what is held."""
    at, half = celsius(np.array([piece.low, piece.high])), scale * piece.weight * factor
    label = "limit" if named else "_limit"
    if piece.centred:
        middle = 0.5 * (float(held.max()) + float(held.min())) * factor
        low, high = np.full(2, middle - half), np.full(2, middle + half)
        area = ax.fill_between(at, low, high, facecolor=LIMIT_FILL, edgecolor=LIMIT, lw=0.8, label=label)
        area.set_zorder(1)
        return [area]
    mark = "_" if piece.low == piece.high else None  # a chord is judged at the ends only
    drawn: list[Line2D | PolyCollection] = []
    for height, text in ((half, label), (-half, "_lower")):
        (line,) = ax.plot(at, np.full(2, height), color=LIMIT, linestyle=LIMIT_DASHES[0], lw=1.1, label=text)
        line.set(marker=mark or "none", markersize=14.0, zorder=3)
        drawn.append(line)
    return drawn


def ratio_figure_files(check: RatioCheck) -> dict[str, bytes]:
    """Return the drift figure of a ratio as drift.svg and drift.png, the same bytes every time."""
    with figure_style():
        figure = Figure(figsize=INCHES)
        draw_ratio(figure.add_axes((0.115, 0.15, 0.64, 0.75)), check)
        words = "Nominal drift, the worst device found, and the limits."
        return picture_files("drift", figure, "Drift of the ratio over temperature", words)
