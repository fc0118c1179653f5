"""The devices of a fit beside each other: TC1 against R with their correlation, and each of them by lot."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.container import ErrorbarContainer
from matplotlib.figure import Figure
from matplotlib.legend import Legend
from matplotlib.patches import Polygon

from tcplan.arrays import FloatArray
from tcplan.figures.fit_groups import dress, groups_of
from tcplan.figures.labels import page_box
from tcplan.figures.panel import put_legend
from tcplan.figures.style import CHOSEN, OTHER, SMALL_SIZE, SPREAD_EDGE, SPREAD_FILL, number_text, shortened
from tcplan.measure.fitted import FittedMaterial
from tcplan.measure.spread_laws import local

DEVICES_INCHES = (7.2, 6.6)
COVER = 2.0  # standard uncertainties of a bar, and standard deviations of the ellipse
TICK_ROOM = 26.0  # points that the name of a lot or a device needs at least
LEAST_SPAN = 1e-4  # of the values on an axis
GAP = 1.0  # between lots, in devices


@dataclass(frozen=True, slots=True, kw_only=True)
class DeviceArtists:
    """What was drawn: bars by group in the plane and in both rows, the ellipse and the limits."""

    plane: tuple[ErrorbarContainer, ...]
    ellipse: Polygon | None
    rows: tuple[tuple[ErrorbarContainer, ...], tuple[ErrorbarContainer, ...]]
    legend: Legend


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Figures:
    """R relative to its mean [%] and TC1 [ppm/K] of each device, with the half-lengths of their bars."""

    percent: FloatArray
    tc1: FloatArray
    percent_bar: FloatArray
    tc1_bar: FloatArray


def draw_devices(ax: Axes, rows: tuple[Axes, Axes], one: FittedMaterial) -> DeviceArtists:
    """Draw TC1 against R of all devices, and below each of the two by itself, lot after lot.

    Parameters
    ----------
    ax : Axes
        For the plane. The legend goes to the right of it.
    rows : (Axes, Axes)
        For R and for TC1, with their final positions.
    one : FittedMaterial

    Returns
    -------
    DeviceArtists
        Bars reach 2 standard uncertainties by point noise: what all devices share is not in them.
    """
    found = _figures(one)
    plane = []
    for group in groups_of(one):
        at = list(group.devices)
        bars = ax.errorbar(
            found.percent[at],
            found.tc1[at],
            xerr=found.percent_bar[at],
            yerr=found.tc1_bar[at],
            fmt=group.marker,
            ms=4.0,
            mew=0.0,
            color=group.colour,
            elinewidth=0.8,
            zorder=3,
            label=group.label,
        )
        plane.append(bars)
    ellipse = _ellipse(ax, one)
    (mean,) = ax.plot(
        [0.0], [_mean(one, "tc1")], marker="+", ms=9.0, color=CHOSEN, zorder=4, linestyle="none"
    )
    mean.set_label("mean" if len(one.fits) > 1 else "_mean")
    dress(ax, f"{one.request.name}: devices, bars of {COVER:g} standard uncertainties", "TC1 (ppm/K)")
    ax.set_xlabel("R less its mean (%)" if len(one.fits) > 1 else "R less its fit (%)")
    ax.margins(0.08)
    _widened(ax)
    legend = put_legend(ax)
    drawn = (
        _row(rows[0], one, found.percent, found.percent_bar, "value", "R less mean (%)"),
        _row(rows[1], one, found.tc1, found.tc1_bar, "tc1", "TC1 (ppm/K)"),
    )
    return DeviceArtists(plane=tuple(plane), ellipse=ellipse, rows=drawn, legend=legend)


def _figures(one: FittedMaterial) -> _Figures:
    found = [local(fit, one.found.ohms) for fit in one.fits]
    value, noise = np.array([f for f, _, _ in found]), np.array([np.diag(n) for _, n, _ in found])
    bars = COVER * np.sqrt(np.maximum(noise, 0.0))
    return _Figures(
        percent=(value[:, 0] - 1.0) * 1e2,
        tc1=value[:, 1] * 1e6,
        percent_bar=bars[:, 0] * 1e2,
        tc1_bar=bars[:, 1] * 1e6,
    )


def _mean(one: FittedMaterial, name: str) -> float:
    """Return the middle of a row in its unit: 0 for R, the mean TC1 else."""
    if name == "value":
        return 0.0
    return float(one.found.law.taylor(one.found.law.reference, 1)[0]) * 1e6


def _ellipse(ax: Axes, one: FittedMaterial) -> Polygon | None:
    """Draw the ellipse of 2 standard deviations of R and TC1 over devices and lots, less point noise."""
    value, tc1, correlation = one.found.scatter("value"), one.found.scatter("tc1"), one.found.correlation
    if value is None or tc1 is None or value.total is None or tc1.total is None:
        return None
    r = 0.0 if correlation is None else correlation.value
    turn = np.linspace(0.0, 2.0 * np.pi, 181)
    x = COVER * value.total.sigma * np.cos(turn) * 1e2
    y = COVER * tc1.total.sigma * (r * np.cos(turn) + np.sqrt(1.0 - r * r) * np.sin(turn)) * 1e6
    patch = Polygon(
        np.column_stack([x, y + _mean(one, "tc1")]),
        closed=True,
        facecolor=SPREAD_FILL,
        edgecolor=SPREAD_EDGE,
        lw=0.8,
        zorder=1.2,
        label=_ellipse_words(one),
    )
    ax.add_patch(patch)
    return patch


def _ellipse_words(one: FittedMaterial) -> str:
    found = one.found.correlation
    if found is None:
        return f"{COVER:g} sigma of devices"
    value, low, high = (number_text(float(f"{x:.2g}")) for x in (found.value, found.low, found.high))
    return f"{COVER:g} sigma of devices,\ncorrelation {value}\n({low} to {high})"


def _widened(ax: Axes) -> None:
    """Show no less than a part of the values: readings without noise would give ticks of one number."""
    for (low, high), limits in ((ax.get_xlim(), ax.set_xlim), (ax.get_ylim(), ax.set_ylim)):
        least = LEAST_SPAN * max(abs(low), abs(high), 1.0)
        if high - low < least:
            middle = 0.5 * (low + high)
            limits(middle - 0.5 * least, middle + 0.5 * least)


# --- one after the other --------------------------------------------------------------------------------


def _row(
    ax: Axes, one: FittedMaterial, values: FloatArray, bars: FloatArray, name: str, label: str
) -> tuple[ErrorbarContainer, ...]:
    """Draw one figure of each device, lot after lot, about its mean and within its limits."""
    at = positions(one.lots)
    drawn = []
    for group in groups_of(one):
        k = list(group.devices)
        look: dict[str, Any] = {"ms": 3.5, "mew": 0.0, "color": group.colour, "elinewidth": 0.8, "zorder": 3}
        drawn.append(ax.errorbar(at[k], values[k], yerr=bars[k], fmt=group.marker, **look))
    middle = _mean(one, name)
    ax.axhline(middle, color=CHOSEN, lw=0.8, zorder=2)
    scatter = one.found.scatter("value" if name == "value" else "tc1")
    if scatter is not None and scatter.half_width is not None:
        half = scatter.half_width * (1e2 if name == "value" else 1e6)
        ax.axhspan(
            middle - half, middle + half, facecolor=SPREAD_FILL, edgecolor=SPREAD_EDGE, lw=0.6, zorder=1
        )
    _widened(ax)
    dress(ax, "", label)
    ax.set_xlim(-GAP, float(at.max()) + GAP)
    _ticks(ax, one, at)
    return tuple(drawn)


def positions(lots: tuple[str, ...]) -> FloatArray:
    """Return where each device stands in a row: those of a lot together, lots a gap apart."""
    order = list(dict.fromkeys(lots))
    at, found = 0.0, np.zeros(len(lots))
    for lot in order:
        for k in (k for k, own in enumerate(lots) if own == lot):
            found[k] = at
            at += 1.0
        at += GAP
    return found


def _ticks(ax: Axes, one: FittedMaterial, at: FloatArray) -> None:
    """Name each lot in its middle, or each device where there is one lot; of many only every so many."""
    names = list(_tick_names(one, at))
    page = page_box(ax)
    low, high = ax.get_xlim()
    per_unit = (page.right - page.left) / (high - low)
    apart = per_unit * ((names[-1][0] - names[0][0]) / max(len(names) - 1, 1) or high - low)
    step = max(1, -(-int(TICK_ROOM) // max(int(apart), 1)))
    shown = names[::step]
    room = min(apart * step, 120.0) - 4.0
    ax.set_xticks([x for x, _ in shown], [shortened(text, room, SMALL_SIZE) for _, text in shown])
    for text in ax.get_xticklabels():
        text.set(fontsize=SMALL_SIZE, parse_math=False)
    ax.grid(visible=False, axis="x")
    for x in edges(one.lots, at):
        ax.axvline(x, color=OTHER, lw=0.4, zorder=0.5)


def _tick_names(one: FittedMaterial, at: FloatArray) -> Iterator[tuple[float, str]]:
    if len(set(one.lots)) == 1:
        yield from zip(at.tolist(), (name or "device" for name in one.sweep.devices), strict=True)
        return
    for lot in dict.fromkeys(one.lots):
        yield float(np.mean([x for x, own in zip(at, one.lots, strict=True) if own == lot])), lot


def edges(lots: tuple[str, ...], at: FloatArray) -> list[float]:
    """Return the middle between each lot and the next."""
    last = [
        max(x for x, own in zip(at.tolist(), lots, strict=True) if own == lot) for lot in dict.fromkeys(lots)
    ]
    return [x + 0.5 * (1.0 + GAP) for x in last[:-1]]


def devices_figure(one: FittedMaterial) -> Figure:
    """Return the figure of the devices; draw and save it inside `figure_style`."""
    figure = Figure(figsize=DEVICES_INCHES)
    ax = figure.add_axes((0.11, 0.5, 0.6, 0.455))
    rows = figure.add_axes((0.11, 0.27, 0.86, 0.15)), figure.add_axes((0.11, 0.05, 0.86, 0.15))
    draw_devices(ax, rows, one)
    return figure
