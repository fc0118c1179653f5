"""A measured composite against its plan: value, drift, band, what explains it, what would centre it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.goal import Piece
from tcplan.measure.anchor import Anchor, anchor_of
from tcplan.measure.centred import centred, why_not_centred, why_not_trusted
from tcplan.measure.common import check_common, common_changes
from tcplan.measure.compare_readings import EDGE, readings_by_device
from tcplan.measure.comparison import (
    Compared,
    Comparison,
    Expected,
    Explanation,
    MeasuredFigure,
    Place,
    Point,
)
from tcplan.measure.composite import Composite, composite_of
from tcplan.measure.enough import with_enough
from tcplan.measure.explained import Measured, explain
from tcplan.measure.fit_repeats import NEARNESS
from tcplan.measure.model import CommonErrors, Sweep
from tcplan.measure.predicted import band_at, drift_of, predicted_curves, response_of, unspread
from tcplan.network import value

RISK = 0.05
ROUNDING = 1e-12

_NO_COMMON_ERRORS = CommonErrors()


def compare(sweep: Sweep, expected: Expected, common: CommonErrors = _NO_COMMON_ERRORS) -> Comparison:
    """Return what a sweep says of a plan.

    Parameters
    ----------
    sweep : Sweep
        Readings of one or several devices; those outside of the range of the plan are left out and counted,
        devices with too few of them are left out and named.
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
        When no device has readings enough in the range, or one is no such resistor.
    """
    check_common(common)
    composite = composite_of(
        expected.network, expected.materials, expected.spreads, expected.need.reference, expected.process
    )
    enough, skipped = with_enough(sweep, expected)
    taken = list(readings_by_device(enough, expected))
    curves = predicted_curves(expected, composite)
    devices = tuple(
        _compared(own, left_out, expected, composite, common, (np.array(curves.T), *edges))
        for (own, left_out), edges in zip(taken, _edges([own for own, _ in taken], expected), strict=True)
    )
    explanations = [one.explanation for one in devices]
    why_not = why_not_centred(expected) or why_not_trusted(explanations)
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
        unspread=unspread(expected),
        skipped=skipped,
    )


def _edges(sweeps: Sequence[Sweep], expected: Expected) -> list[tuple[FloatArray, FloatArray]]:
    """Return the band at the readings of each device: found once for all, as it is slow to find."""
    lowest, highest = band_at(expected.band, np.concatenate([own.T for own in sweeps]), expected)
    ends = np.cumsum([len(own.T) for own in sweeps])[:-1]
    return list(zip(np.split(lowest, ends), np.split(highest, ends), strict=True))


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
    predicted: tuple[FloatArray, FloatArray, FloatArray],
) -> Compared:
    """Return one device; ``predicted`` are T of the curves, and the band at its readings."""
    T, *edges = predicted
    nominal = response_of(composite, composite.nominal(), sweep.T)
    scale = float(np.median(sweep.R / nominal.ohms))
    anchor = anchor_of(sweep, expected.need.reference, scale * nominal.slope)
    measured = Measured(T=sweep.T, ohms=sweep.R, sigma=anchor.sigma)
    explanation = explain(composite, measured, common, level_known=expected.level_known)
    drifts = _drifts(sweep, anchor, expected, composite, explanation, common)
    points = _points(sweep, drifts, edges, expected, composite, explanation)
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
        curve=tuple(drift_of(composite, np.array(explanation.values), expected, T).tolist()),
        left_out=left_out,
    )


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
    found = response_of(composite, np.array(explanation.values), np.r_[sweep.T, composite.reference])
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
    sweep: Sweep,
    drifts: _Drifts,
    edges: Sequence[FloatArray],
    expected: Expected,
    composite: Composite,
    explanation: Explanation,
) -> tuple[Point, ...]:
    lowest, highest = edges
    excess = np.maximum(drifts.drift - highest, lowest - drifts.drift)
    sure = np.maximum(drifts.uncertainty, ROUNDING)
    columns = (
        sweep.line,
        sweep.T,
        sweep.R,
        drifts.drift,
        drifts.uncertainty,
        drift_of(composite, composite.nominal(), expected, sweep.T),
        lowest,
        highest,
        drift_of(composite, np.array(explanation.values), expected, sweep.T),
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
