"""The vertical axis of a drift panel: its unit, how far it goes, and the limits drawn on it."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.lines import Line2D

from tcplan.arrays import FloatArray
from tcplan.figures.curves import Bound
from tcplan.figures.style import LIMIT, LIMIT_DASHES, LIMIT_FILL, number_text

PERCENT_FROM = 20_000.0  # ppm; from here on per cent reads better
LEAST_HEIGHT = 0.01  # ppm; below this the curve is rounding, and is drawn flat
FITS = 4.0  # a limit up to this many times the curve is brought into view


@dataclass(frozen=True, slots=True, kw_only=True)
class Unit:
    """The unit of a drift axis and what a fraction is multiplied by."""

    name: str
    factor: float


def unit_of(view: tuple[float, float]) -> Unit:
    """Return the unit that reads best for the drifts in view."""
    percent = max(abs(drift) for drift in view) * 1e6 >= PERCENT_FROM
    return Unit(name="%", factor=1e2) if percent else Unit(name="ppm", factor=1e6)


def view_of(drifts: Sequence[FloatArray], limits: Iterable[Bound]) -> tuple[float, float]:
    """Return the lowest and highest drift to show, with a margin; limits as far as they fit."""
    values = np.concatenate([np.zeros(1), *drifts])
    reach = FITS * float(np.max(np.abs(values)))
    if reach < LEAST_HEIGHT * 1e-6:  # rounding: only a limit can set the scale
        reach = np.inf
    corners = np.concatenate([np.zeros(1), *(np.concatenate([b.lower, b.upper]) for b in limits)])
    values = np.concatenate([values, corners[np.abs(corners) <= reach]])
    low, high = float(values.min()), float(values.max())
    margin = max(0.07 * (high - low), LEAST_HEIGHT * 1e-6)
    return low - margin, high + margin


def draw_limits(
    ax: Axes, limits: Iterable[Bound], unit: Unit, view: tuple[float, float], held: str = ""
) -> tuple[Line2D | PolyCollection, ...]:
    """Draw each limit: two lines, or a shaded band for one that may lie at any height.

    Parameters
    ----------
    ax : Axes
    limits : iterable of Bound
    unit : Unit
        Of the axis.
    view : (float, float)
        The lowest and the highest drift in view (fractions).
    held : str
        What the legend says of the height of a band.
    """
    drawn: list[Line2D | PolyCollection] = []
    for n, limit in enumerate(limits):
        lower, upper = limit.lower * unit.factor, limit.upper * unit.factor
        label = _limit_text(limit, unit)
        if held and limit.kind in ("band", "box_tcr"):
            label += f",\n{held}"
        if not _visible(limit, view):
            label += ",\nbeyond this scale"
        if limit.kind in ("band", "box_tcr"):
            drawn.append(
                ax.fill_between(
                    limit.degC,
                    lower,
                    upper,
                    facecolor=LIMIT_FILL,
                    edgecolor=LIMIT,
                    lw=0.8,
                    zorder=1,
                    label=label,
                )
            )
            continue
        dash = LIMIT_DASHES[n % len(LIMIT_DASHES)]
        for corners, text in ((upper, label), (lower, "_lower")):
            drawn += ax.plot(limit.degC, corners, color=LIMIT, linestyle=dash, lw=1.1, zorder=4, label=text)
    return tuple(drawn)


def _visible(limit: Bound, view: tuple[float, float]) -> bool:
    corners = np.concatenate([limit.lower, limit.upper])
    return bool(np.any((corners >= view[0]) & (corners <= view[1])))


def _limit_text(limit: Bound, unit: Unit) -> str:
    """Return what the legend says of a limit, in the unit of the axis."""
    as_drift = f"{number_text(limit.amount * unit.factor)} {unit.name}"
    as_slope = f"{number_text(limit.amount * 1e6)} ppm/K"
    return {
        "drift": f"limit \N{PLUS-MINUS SIGN}{as_drift}",
        "band": f"limit, a band of {as_drift}",
        "box_tcr": f"limit, box TCR {as_slope}",
        "chord_tcr": f"limit, chord TCR of the ends\n\N{PLUS-MINUS SIGN}{as_slope}",
        "mask": "limit, mask",
    }[limit.kind]
