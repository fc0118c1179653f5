"""What was measured and what was fitted: readings, the mean law, how well it is known, where devices lie."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.figure import Figure
from matplotlib.legend import Legend
from matplotlib.lines import Line2D

from tcplan.arrays import FloatArray
from tcplan.figures.fit_devices import devices_figure
from tcplan.figures.fit_groups import celsius, finish, groups_of, shown_rows, span_of
from tcplan.figures.fit_residuals import residuals_figure
from tcplan.figures.panel import put_legend
from tcplan.figures.pictures import picture_files
from tcplan.figures.style import (
    CHOSEN,
    OTHER,
    SPREAD_EDGE,
    SPREAD_FILL,
    WORST,
    figure_style,
    number_text,
    percent_text,
)
from tcplan.measure.fit_curves import ohms_curves, ratio_curves
from tcplan.measure.fitted import FittedMaterial
from tcplan.units import ZERO_CELSIUS

FIT_INCHES = (7.2, 5.6)
SAMPLES = 101
OHM_UNITS = ((1e9, "Gohm"), (1e6, "Mohm"), (1e3, "kohm"), (1.0, "ohm"), (1e-3, "mohm"), (1e-6, "uohm"))


@dataclass(frozen=True, slots=True, kw_only=True)
class FitArtists:
    """What was drawn: readings by group, the mean law, its band, and the limits of devices.

    ``ohms`` and ``drift`` are the panel of R and that of the departure from the mean law.
    """

    ohms_points: tuple[Line2D, ...]
    drift_points: tuple[Line2D, ...]
    law: Line2D
    zero: Line2D
    ohms_limits: PolyCollection | None
    drift_limits: PolyCollection | None
    drift_band: PolyCollection
    legends: tuple[Legend, ...]


def draw_fit(ax: Axes, drift_ax: Axes, one: FittedMaterial) -> FitArtists:
    """Draw the readings with the mean law, and below how far they depart from it.

    Parameters
    ----------
    ax : Axes
        For R(T) of all devices.
    drift_ax : Axes
        For R(T)/R(reference) of each device, relative to the mean law: its own R at the reference is what
        its fit says.
    one : FittedMaterial

    Returns
    -------
    FitArtists
    """
    T = np.linspace(*span_of(one), SAMPLES)
    ohms, ratio = ohms_curves(one, T), ratio_curves(one, T)
    factor, unit = _ohm_unit(float(np.max(one.sweep.R)))
    (law,) = ax.plot(celsius(T), ohms.value / factor, color=CHOSEN, lw=1.6, zorder=4)
    law.set_label("mean law" if len(one.fits) > 1 else "law")
    limits = _limits(ax, one, T, ohms.value / factor, _times(ohms.limits, ohms.value / factor))
    points = _points(ax, one, one.sweep.R / factor)
    finish(ax, one, f"{one.request.name}: readings and law", f"R ({unit})")
    nothing = np.zeros_like(T)
    drift_limits = _limits(drift_ax, one, T, nothing, _times(ratio.limits, nothing + 1e6))
    band = _band(drift_ax, T, ratio.band * 1e6)
    zero = drift_ax.axhline(0.0, color=CHOSEN, lw=1.2, zorder=4, label=law.get_label())
    drift_points = _points(drift_ax, one, _departures(one) * 1e6)
    finish(drift_ax, one, "R(T)/R(reference) of each device, less the law", "Departure (ppm)")
    for panel in (ax, drift_ax):
        _reference(panel, one)
    return FitArtists(
        ohms_points=points,
        drift_points=drift_points,
        law=law,
        zero=zero,
        ohms_limits=limits,
        drift_limits=drift_limits,
        drift_band=band,
        legends=(put_legend(ax), put_legend(drift_ax)),
    )


def _times(half: FloatArray | None, scale: FloatArray) -> FloatArray | None:
    return None if half is None else half * scale


def _departures(one: FittedMaterial) -> FloatArray:
    """Return R(T)/R(reference) over the mean law less 1, of each reading."""
    own = np.array([fit.ohms for fit in one.fits])[one.sweep.device]
    return np.asarray(one.sweep.R / own / one.found.law.ratio(one.sweep.T) - 1.0)


def _points(ax: Axes, one: FittedMaterial, values: FloatArray) -> tuple[Line2D, ...]:
    lines = []
    for group in groups_of(one):
        rows = shown_rows(one, group)
        (line,) = ax.plot(celsius(one.sweep.T[rows]), values[rows], linestyle="none", zorder=3)
        line.set(marker=group.marker, markersize=3.0, color=group.colour, markeredgewidth=0.0)
        line.set_label(group.label)
        lines.append(line)
    return tuple(lines)


def _limits(
    ax: Axes, one: FittedMaterial, T: FloatArray, middle: FloatArray, half: FloatArray | None
) -> PolyCollection | None:
    """Draw where the stated part of devices lies at each temperature; nothing for one device."""
    if half is None:
        return None
    part, sure = percent_text(one.found.coverage), percent_text(one.found.confidence)
    return ax.fill_between(
        celsius(T),
        middle - half,
        middle + half,
        facecolor=SPREAD_FILL,
        edgecolor=SPREAD_EDGE,
        lw=0.6,
        zorder=1.2,
        label=f"limits of {part} of devices\n({sure} confidence)",
    )


def _band(ax: Axes, T: FloatArray, half: FloatArray) -> PolyCollection:
    label = "95 % band of the law"
    return ax.fill_between(celsius(T), -half, half, facecolor=WORST, alpha=0.6, lw=0.0, zorder=2, label=label)


def _reference(ax: Axes, one: FittedMaterial) -> Line2D:
    at = one.request.reference - ZERO_CELSIUS
    label = f"reference {number_text(round(at, 9))} \N{DEGREE SIGN}C"
    return ax.axvline(at, color=OTHER, lw=0.8, linestyle=":", zorder=1.5, label=label)


def _ohm_unit(most: float) -> tuple[float, str]:
    """Return what R is divided by, and the unit that reads best up to this R [ohm]."""
    return next((pair for pair in OHM_UNITS if most >= pair[0]), OHM_UNITS[-1])


# --- files ----------------------------------------------------------------------------------------------


def fit_figure(one: FittedMaterial) -> Figure:
    """Return the figure of readings and law; draw and save it inside `figure_style`."""
    figure = Figure(figsize=FIT_INCHES)
    ax = figure.add_axes((0.11, 0.55, 0.6, 0.4))
    drift_ax = figure.add_axes((0.11, 0.08, 0.6, 0.36))
    draw_fit(ax, drift_ax, one)
    return figure


def fit_figure_files(one: FittedMaterial) -> dict[str, bytes]:
    """Return NAME-fit, NAME-residuals and NAME-devices, each as SVG and PNG; the same bytes every time."""
    name = one.request.name
    files: dict[str, bytes] = {}
    with figure_style():
        for kind, figure, title, words in (
            (
                "fit",
                fit_figure(one),
                "Readings and law",
                "R of all devices over temperature with the mean law and the limits of devices; below, how "
                "far each device departs from the mean law, with its 95 % band.",
            ),
            (
                "residuals",
                residuals_figure(one),
                "Residuals",
                "Residuals of all readings over temperature with 2 sigma lines; outliers with their line.",
            ),
            (
                "devices",
                devices_figure(one),
                "Devices",
                "TC1 against R of all devices with their uncertainties and an ellipse of 2 sigma; below, R "
                "and TC1 of each device, by lot.",
            ),
        ):
            files |= picture_files(f"{name}-{kind}", figure, f"{title}: {name}", words)
    return files
