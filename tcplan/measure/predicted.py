"""What a plan predicts of the drift at any temperature: one device, the worst case, the likely lots."""

from __future__ import annotations

import math

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws import draw_curves
from tcplan.errors import InputError, Problem
from tcplan.measure.comparison import Band, Curves, Expected
from tcplan.measure.composite import Composite, Response
from tcplan.network import used_materials

SAMPLES = 41  # temperatures of the curves
EXACT = 200  # temperatures at which the band is found one by one; of more it is interpolated
LEAST_LOTS, MOST_LOTS, BEYOND = 2000, 20_000, 10.0


def response_of(composite: Composite, deviations: FloatArray, T: FloatArray) -> Response:
    """Return one device over temperature; refuse one of which a leg would reach zero."""
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


def drift_of(composite: Composite, deviations: FloatArray, expected: Expected, T: FloatArray) -> FloatArray:
    """Return the drift (fractions) of one device."""
    found = response_of(composite, deviations, np.r_[T, composite.reference])
    return np.asarray(found.ohms[:-1] / found.ohms[-1] - expected.need.wanted(T))


def band_at(band: Band, T: FloatArray, expected: Expected) -> tuple[FloatArray, FloatArray]:
    """Return the band at each temperature; at many of them from a grid, on which it is smooth."""
    own, place = np.unique(T, return_inverse=True)
    if len(own) <= EXACT:
        lowest, highest = band(own)
        return lowest[place], highest[place]
    grid = np.unique(np.r_[np.linspace(own[0], own[-1], EXACT), expected.need.reference])
    low, high = band(grid)
    return np.interp(T, grid, low), np.interp(T, grid, high)


def unspread(expected: Expected) -> tuple[str, ...]:
    """Return the materials without a spread."""
    return tuple(name for name in used_materials(expected.network) if name not in expected.spreads)


def predicted_curves(expected: Expected, composite: Composite) -> Curves:
    """Return the predicted drift over the range: nominal, worst case, and the band of likely lots."""
    over = expected.over
    T = np.unique(np.r_[np.linspace(over.low, over.high, SAMPLES), expected.need.reference])
    lowest, highest = expected.band(T)
    likely = _likely(expected, T)
    return Curves(
        T=tuple(T.tolist()),
        nominal=tuple(drift_of(composite, composite.nominal(), expected, T).tolist()),
        lowest=tuple(lowest.tolist()),
        highest=tuple(highest.tolist()),
        likely_low=None if likely is None else tuple(likely[0].tolist()),
        likely_high=None if likely is None else tuple(likely[1].tolist()),
    )


def _likely(expected: Expected, T: FloatArray) -> tuple[FloatArray, FloatArray] | None:
    """Return between what the central part of the lots lies at each temperature; None without spreads."""
    if unspread(expected):
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
