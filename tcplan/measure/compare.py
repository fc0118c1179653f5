"""A measured composite against its plan: value, drift, band, what explains it, what would centre it."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws import draw_curves
from tcplan.errors import InputError, Problem
from tcplan.goal import Piece
from tcplan.measure.anchor import Anchor, anchor_of
from tcplan.measure.centred import centred, why_not_centred
from tcplan.measure.common import check_common, common_changes
from tcplan.measure.comparison import (
    Band,
    Compared,
    Comparison,
    Curves,
    Expected,
    Explanation,
    MeasuredFigure,
    Place,
    Point,
)
from tcplan.measure.composite import Composite, Response, composite_of
from tcplan.measure.explained import Measured, explain
from tcplan.measure.fit_readings import device_place
from tcplan.measure.fit_repeats import NEARNESS
from tcplan.measure.model import CommonErrors, Sweep
from tcplan.network import used_materials, value
from tcplan.units import format_celsius, format_ohms

EDGE = 1.0  # K; a chamber that overshoots the ends of a range by so much is meant to be at them
RISK = 0.05
ANOTHER_KIND = 3.0  # times the planned value, up or down: no spread reaches so far
MOST_READINGS = 100_000
SAMPLES = 41  # temperatures of the curves
EXACT = 200  # temperatures at which the band is found one by one; of more it is interpolated
LEAST_LOTS, MOST_LOTS, BEYOND = 2000, 20_000, 10.0
ROUNDING = 1e-12

_NO_COMMON_ERRORS = CommonErrors()


def compare(sweep: Sweep, expected: Expected, common: CommonErrors = _NO_COMMON_ERRORS) -> Comparison:
    """Return what a sweep says of a plan.

    Parameters
    ----------
    sweep : Sweep
        Readings of one or several devices; those outside of the range of the plan are left out and counted.
    expected : Expected
        What the plan says.
    common : CommonErrors
        Standard uncertainties of what is common to the sweep.

    Returns
    -------
    Comparison

    Raises
    ------
    InputError
        When a device has no readings in the range, readings at one temperature, or is no such resistor.
    """
    check_common(common)
    composite = composite_of(
        expected.network, expected.materials, expected.spreads, expected.need.reference, expected.process
    )
    taken = list(_taken(sweep, expected))
    curves = _curves(expected, composite)
    devices = tuple(
        _compared(own, left_out, expected, composite, common, np.array(curves.T)) for own, left_out in taken
    )
    why_not = why_not_centred(expected)
    explanations = [one.explanation for one in devices]
    names = [one.device for one in devices]
    return Comparison(
        name=expected.name,
        source=sweep.source,
        planned=value(expected.network),
        tolerance=expected.tolerance,
        reference=expected.need.reference,
        devices=devices,
        curves=curves,
        centring=None if why_not else centred(expected, composite, names, explanations),
        level_known=expected.level_known,
        why_not=why_not,
        unspread=_unspread(expected),
    )


def _unspread(expected: Expected) -> tuple[str, ...]:
    return tuple(name for name in used_materials(expected.network) if name not in expected.spreads)


# --- the readings ---------------------------------------------------------------------------------------


def _taken(sweep: Sweep, expected: Expected) -> Iterator[tuple[Sweep, int]]:
    """Yield the readings of each device in the range of the plan, and how many are outside of it."""
    low, high = _ends(expected)
    if len(sweep.T) > MOST_READINGS:
        found = f"{len(sweep.T)} readings"
        raise InputError(Problem(where=sweep.source, found=found, expected=f"{MOST_READINGS} at most"))
    problems, taken = [], []
    for position in np.unique(sweep.device).tolist():
        own = sweep.of_device(position)
        inside = own.taken(np.flatnonzero((low <= own.T) & (high >= own.T)))
        if not len(inside.T):
            problems.append(_none_inside(own, expected))
        elif (problem := _another_kind(inside, expected)) is not None:
            problems.append(problem)
        else:
            order = np.argsort(inside.T, kind="stable")
            taken.append((inside.taken(order), len(own.T) - len(inside.T)))
    if problems:
        raise InputError(problems)
    yield from taken


def _ends(expected: Expected) -> tuple[float, float]:
    """Return the range of the plan and a little beyond it, as far as the materials have laws."""
    usable = [expected.materials[name].usable for name in used_materials(expected.network)]
    low, high = max(low for low, _ in usable), min(high for _, high in usable)
    over = expected.over
    return min(over.low, max(over.low - EDGE, low)), max(over.high, min(over.high + EDGE, high))


def _none_inside(own: Sweep, expected: Expected) -> Problem:
    over = expected.over
    measured = f"{format_celsius(float(own.T.min()))} to {format_celsius(float(own.T.max()))}"
    planned = f"{format_celsius(over.low)} to {format_celsius(over.high)}"
    return Problem(
        where=device_place(own),
        found=f"readings from {measured}",
        expected=f"readings in the range of the plan, {planned}",
        todo="Check the unit of T: degC, K and degF are told apart by the header.",
    )


def _another_kind(own: Sweep, expected: Expected) -> Problem | None:
    planned, median = value(expected.network), float(np.median(own.R))
    times = median / planned
    if 1.0 / ANOTHER_KIND < times < ANOTHER_KIND:
        return None
    thousand = abs(abs(math.log10(times)) / 3.0 - round(abs(math.log10(times)) / 3.0)) < 0.1
    unit = "Check the unit of R in the header: it looks like ohm for kohm." if thousand else ""
    return Problem(
        where=device_place(own),
        found=f"readings of about {format_ohms(median)}, {times:.3g} times the plan",
        expected=f"readings of a resistor planned for {format_ohms(planned)}",
        todo=unit or "Check which option was measured (--option), and the connections.",
    )


# --- one device -----------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True, eq=False)
class _Drifts:
    """Measured drift and its standard uncertainty at each reading, and that of R at the reference [ohm]."""

    drift: FloatArray
    uncertainty: FloatArray
    ohms_uncertainty: float


def _compared(
    sweep: Sweep,
    left_out: int,
    expected: Expected,
    composite: Composite,
    common: CommonErrors,
    T: FloatArray,
) -> Compared:
    nominal = _response(composite, composite.nominal(), sweep.T)
    scale = float(np.median(sweep.R / nominal.ohms))
    anchor = anchor_of(sweep, expected.need.reference, scale * nominal.slope)
    measured = Measured(T=sweep.T, ohms=sweep.R, sigma=anchor.sigma)
    explanation = explain(
        composite, measured, common, level_known=expected.level_known, where=device_place(sweep)
    )
    drifts = _drifts(sweep, anchor, expected, composite, explanation, common)
    points = _points(sweep, drifts, expected, composite, explanation)
    away = np.abs(sweep.T - composite.reference) > NEARNESS  # at the reference there is no drift to judge
    beyond = np.where(away, [point.beyond for point in points], -np.inf)
    factor = _factor(len(points))
    return Compared(
        device=sweep.devices[int(sweep.device[0])],
        ohms=anchor.ohms,
        ohms_uncertainty=drifts.ohms_uncertainty,
        by=anchor.by,
        order=anchor.order,
        stated=anchor.stated,
        value_place=_value_place(anchor.ohms, drifts.ohms_uncertainty, expected),
        points=points,
        farthest=int(np.argmax(beyond)),
        factor=factor,
        place=_place(float(beyond.max()), factor),
        figure=_figure(sweep, drifts, expected, factor),
        explanation=explanation,
        curve=tuple(_drift(composite, np.array(explanation.values), expected, T).tolist()),
        left_out=left_out,
    )


def _response(composite: Composite, deviations: FloatArray, T: FloatArray) -> Response:
    found = composite.response(deviations, T)
    if found is None:  # deviations come from the readings; far ones can reach zero elsewhere in the range
        raise InputError(
            Problem(
                where="sweep",
                found="readings that only a leg of no resistance would explain",
                expected="readings of the resistor that was planned",
                todo="Check the unit of R, and which option was measured (--option).",
            )
        )
    return found


def _drift(composite: Composite, deviations: FloatArray, expected: Expected, T: FloatArray) -> FloatArray:
    found = _response(composite, deviations, np.r_[T, composite.reference])
    return np.asarray(found.ohms[:-1] / found.ohms[-1] - expected.need.wanted(T))


def _drifts(
    sweep: Sweep,
    anchor: Anchor,
    expected: Expected,
    composite: Composite,
    explanation: Explanation,
    common: CommonErrors,
) -> _Drifts:
    """Return the measured drift: point noise of R and of R at the reference, and common errors, each in full.

    A common error moves R(T) and R(reference) together, so what counts is the difference.
    """
    ratio = sweep.R / anchor.ohms
    noise = anchor.sigma**2 + ratio**2 * anchor.variance - 2.0 * ratio * anchor.covariance
    found = _response(composite, np.array(explanation.values), np.r_[sweep.T, composite.reference])
    changes = common_changes(
        common, np.r_[sweep.T, composite.reference], found.ohms, found.slope, composite.reference
    )
    moved = changes[:-1] - ratio[:, None] * changes[-1]
    variance = (np.maximum(noise, 0.0) + np.sum(moved**2, axis=1)) / anchor.ohms**2
    return _Drifts(
        ratio - expected.need.wanted(sweep.T),
        np.sqrt(variance),
        float(np.sqrt(anchor.variance + np.sum(changes[-1] ** 2))),
    )


def _points(
    sweep: Sweep, drifts: _Drifts, expected: Expected, composite: Composite, explanation: Explanation
) -> tuple[Point, ...]:
    lowest, highest = _band(expected.band, sweep.T, expected)
    excess = np.maximum(drifts.drift - highest, lowest - drifts.drift)
    sure = np.maximum(drifts.uncertainty, ROUNDING)
    columns = (
        sweep.line,
        sweep.T,
        sweep.R,
        drifts.drift,
        drifts.uncertainty,
        _drift(composite, composite.nominal(), expected, sweep.T),
        lowest,
        highest,
        _drift(composite, np.array(explanation.values), expected, sweep.T),
        excess / sure,
    )
    names = (
        "line",
        "T",
        "ohms",
        "drift",
        "uncertainty",
        "nominal",
        "lowest",
        "highest",
        "explained",
        "beyond",
    )
    rows = zip(*(column.tolist() for column in columns), strict=True)
    return tuple(Point(**dict(zip(names, row, strict=True))) for row in rows)


def _band(band: Band, T: FloatArray, expected: Expected) -> tuple[FloatArray, FloatArray]:
    """Return the band at each temperature; at many of them from a grid, on which it is smooth."""
    own, place = np.unique(T, return_inverse=True)
    if len(own) <= EXACT:
        lowest, highest = band(own)
        return lowest[place], highest[place]
    grid = np.unique(np.r_[np.linspace(own[0], own[-1], EXACT), expected.need.reference])
    low, high = band(grid)
    return np.interp(T, grid, low), np.interp(T, grid, high)


def _factor(count: int) -> float:
    """Return beyond how many uncertainties one point of so many is outside, with 95 % for all together."""
    from scipy.special import ndtri

    return float(ndtri(1.0 - 0.5 * RISK / count))


def _place(beyond: float, factor: float) -> Place:
    return "inside" if beyond <= 1e-6 else "not clear" if beyond <= factor else "outside"


def _value_place(ohms: float, uncertainty: float, expected: Expected) -> Place | None:
    if expected.tolerance is None:
        return None
    planned = value(expected.network)
    excess = abs(ohms - planned) - expected.tolerance * planned
    return _place(excess / max(uncertainty, ROUNDING * ohms), _factor(1))


def _figure(sweep: Sweep, drifts: _Drifts, expected: Expected, factor: float) -> MeasuredFigure | None:
    """Return the judged figure over the measured temperatures: a lower bound of that over the range."""
    found = [one for piece in expected.need.pieces if (one := _of_piece(piece, sweep.T, drifts))]
    if not found:
        return None
    figure, at, uncertainty = max(found)
    scale, place = expected.need.scale, None
    if scale is not None:
        excess = figure - scale * (1.0 + 1e-9)
        place = _place(excess / max(uncertainty, ROUNDING), factor)
    return MeasuredFigure(figure=figure, at=at, uncertainty=uncertainty, place=place)


def _of_piece(piece: Piece, T: FloatArray, drifts: _Drifts) -> tuple[float, float, float] | None:
    """Return the figure, where it is [K], and its uncertainty; None without a reading."""
    slack = EDGE if piece.high > piece.low else NEARNESS
    own = np.flatnonzero((piece.low - slack <= T) & (piece.high + slack >= T))
    if not len(own):
        return None
    drift, sure = drifts.drift[own], drifts.uncertainty[own]
    top, bottom = int(np.argmax(drift)), int(np.argmin(drift))
    if piece.centred:
        both = math.hypot(sure[top], sure[bottom]) if top != bottom else 0.0
        return 0.5 * float(np.ptp(drift)) / piece.weight, float(T[own[top]]), 0.5 * both / piece.weight
    k = top if drift[top] >= -drift[bottom] else bottom
    return abs(float(drift[k])) / piece.weight, float(T[own[k]]), float(sure[k]) / piece.weight


# --- what is predicted ----------------------------------------------------------------------------------


def _curves(expected: Expected, composite: Composite) -> Curves:
    """Return the predicted drift over the range: nominal, worst case, and the band of likely lots."""
    over = expected.over
    T = np.unique(np.r_[np.linspace(over.low, over.high, SAMPLES), expected.need.reference])
    lowest, highest = expected.band(T)
    likely = _likely(expected, T)
    return Curves(
        T=tuple(T.tolist()),
        nominal=tuple(_drift(composite, composite.nominal(), expected, T).tolist()),
        lowest=tuple(lowest.tolist()),
        highest=tuple(highest.tolist()),
        likely_low=None if likely is None else tuple(likely[0].tolist()),
        likely_high=None if likely is None else tuple(likely[1].tolist()),
    )


def _likely(expected: Expected, T: FloatArray) -> tuple[FloatArray, FloatArray] | None:
    """Return between what the central part of the lots lies at each temperature; None without spreads."""
    if _unspread(expected):
        return None
    tail = 0.5 * (1.0 - expected.quantile)
    count = min(MOST_LOTS, max(LEAST_LOTS, math.ceil(BEYOND / max(tail, BEYOND / MOST_LOTS))))
    drift = draw_curves(
        expected.network,
        expected.materials,
        expected.process,
        expected.need,
        T,
        count,
        expected.seed,
        spreads=expected.spreads,
    )
    low, high = np.quantile(drift, [tail, 1.0 - tail], axis=0)
    return low, high
