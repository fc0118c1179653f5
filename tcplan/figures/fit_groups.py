"""How the devices of a fit are told apart in its figures: by lot, or by device where there is one lot."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.ticker import FuncFormatter

from tcplan.arrays import FloatArray, IntArray
from tcplan.figures.labels import page_box
from tcplan.figures.style import (
    FAINT,
    MARKERS,
    MATERIAL_COLOURS,
    NAME_WIDTH,
    OTHER,
    SMALL_SIZE,
    TEXT_SIZE,
    number_text,
    short_names,
    shortened,
)
from tcplan.measure.fitted import FittedMaterial
from tcplan.units import ZERO_CELSIUS

MOST_NAMED = 8  # groups with a look of their own
MOST_POINTS = 4000  # of more readings only so many are drawn, and those with a flag
TITLE_WIDTH = 440.0  # points
LABEL_OFF = 40.0  # points from the axes to its vertical label
MARGIN = 0.04  # of the span of temperature


@dataclass(frozen=True, slots=True, kw_only=True)
class Group:
    """Devices that are drawn alike: positions in ``sweep.devices``."""

    label: str
    colour: str
    marker: str
    devices: tuple[int, ...]


def groups_of(one: FittedMaterial) -> tuple[Group, ...]:
    """Return the devices by lot, or each by itself where there is one lot; those beyond eight together."""
    by_lot = len(set(one.lots)) > 1
    word = "lot" if by_lot else "device"
    keys = one.lots if by_lot else one.sweep.devices
    members: dict[str, list[int]] = {}
    for k, key in enumerate(keys):
        members.setdefault(key, []).append(k)
    named = list(members)[: len(members) if len(members) <= MOST_NAMED + 1 else MOST_NAMED]
    short = short_names(named, NAME_WIDTH - 20.0, SMALL_SIZE)
    groups = [
        Group(
            label=f"{word} {short[key]}" if key else "readings",
            colour=MATERIAL_COLOURS[n % len(MATERIAL_COLOURS)],
            marker=MARKERS[n % len(MARKERS)],
            devices=tuple(members[key]),
        )
        for n, key in enumerate(named)
    ]
    rest = [key for key in members if key not in named]
    if rest:
        devices = tuple(k for key in rest for k in members[key])
        label = f"{len(rest)} more {word}s"
        groups.append(Group(label=label, colour=OTHER, marker=".", devices=devices))
    return tuple(groups)


def shown_rows(one: FittedMaterial, group: Group) -> IntArray:
    """Return the positions of the readings of a group that are drawn."""
    rows = np.flatnonzero(np.isin(one.sweep.device, np.array(group.devices)))
    step = -(-len(one.sweep.T) // MOST_POINTS)
    if step == 1:
        return rows
    flagged = np.isin(one.sweep.line[rows], [flag.line for fit in one.fits for flag in fit.flags])
    return np.asarray(rows[flagged | (np.arange(len(rows)) % step == 0)])


def span_of(one: FittedMaterial) -> tuple[float, float]:
    """Return the lowest and the highest temperature to show [K]: all readings and the reference."""
    at = one.request.reference
    return min(float(one.sweep.T.min()), at), max(float(one.sweep.T.max()), at)


def celsius(T: FloatArray) -> FloatArray:
    """Return temperatures in degC."""
    return T - ZERO_CELSIUS


def finish(ax: Axes, one: FittedMaterial, title: str, y_label: str) -> None:
    """Set the temperature axis, labels, title and grid of a panel over temperature."""
    low, high = span_of(one)
    off = MARGIN * (high - low)
    ax.set_xlim(low - off - ZERO_CELSIUS, high + off - ZERO_CELSIUS)
    ax.set_xlabel("Temperature (\N{DEGREE SIGN}C)")
    dress(ax, title, y_label)


def dress(ax: Axes, title: str, y_label: str) -> None:
    """Set the vertical label, title, grid and the look of numbers of a panel."""
    page = page_box(ax)
    ax.set_ylabel(y_label)
    ax.yaxis.set_label_coords(-LABEL_OFF / (page.right - page.left), 0.5)
    title = shortened(title, TITLE_WIDTH)
    ax.set_title(title, loc="left", fontsize=TEXT_SIZE, parse_math=False)
    for axis in (ax.xaxis, ax.yaxis):
        axis.set_major_formatter(FuncFormatter(lambda number, _: number_text(number)))
    ax.grid(color=FAINT, lw=0.5)
