"""Curves of a fitted material over temperature: the mean law, how well it is known, and where devices lie.

At each temperature by itself the same statistics hold as for a coefficient: devices and lots, less point
noise, with the errors that all devices share added to the mean.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.measure.bands import ohms_band, ratio_band
from tcplan.measure.fit_gradients import law_gradient
from tcplan.measure.fitted import FittedMaterial
from tcplan.measure.model import Fit
from tcplan.measure.population import lot_positions
from tcplan.measure.spread_laws import is_stated
from tcplan.measure.tolerance import MeanSquares, mean_squares, tolerance_half_width

BAND = 0.95


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Curves:
    """R(T) or R(T)/R(reference) of the mean law, and half-widths about it relative to it.

    Parameters
    ----------
    value : array, shape (temperature,)
        Of the mean law.
    band : array, shape (temperature,)
        95 % interval of the mean.
    limits : array, shape (temperature,), optional
        What holds the stated part of devices at each temperature; None of one device.
    """

    value: FloatArray
    band: FloatArray
    limits: FloatArray | None


def ratio_curves(one: FittedMaterial, T: FloatArray) -> Curves:
    """Return R(T)/R(reference) of a material, each device at its own R; T in K, shape (temperature,)."""
    if len(one.fits) == 1:
        value, half = ratio_band(one.fits[0], T)
        return Curves(value=value, band=half / value, limits=None)
    return _of_all(one, T, with_R=False)


def ohms_curves(one: FittedMaterial, T: FloatArray) -> Curves:
    """Return R(T) [ohm] of a material, the value of each device included; T in K, shape (temperature,)."""
    if len(one.fits) == 1:
        value, half = ohms_band(one.fits[0], T)
        return Curves(value=value, band=half / value, limits=None)
    return _of_all(one, T, with_R=True)


def _of_all(one: FittedMaterial, T: FloatArray, *, with_R: bool) -> Curves:
    mean = one.found.law.ratio(T) * (one.found.ohms if with_R else 1.0)
    values = np.stack([fit.law.ratio(T) * (fit.ohms if with_R else 1.0) for fit in one.fits]) / mean
    found = [_variances(fit, T, with_R=with_R) for fit in one.fits]
    point = np.stack([noise for noise, _ in found]) / mean**2
    common = np.mean(np.stack([shared for _, shared in found]), axis=0) / mean**2
    measured = np.zeros((*point.shape, point.shape[1]))
    np.einsum("dtt->dt", measured)[:] = point
    taken = measured * np.array([is_stated(fit) for fit in one.fits], dtype=float)[:, None, None]
    squares = mean_squares(values, measured, lot_positions(one.lots), taken)
    band = np.array([_mean_half_width(squares, k, float(common[k])) for k in range(len(T))])
    return Curves(value=mean, band=band, limits=_limits(one, squares, common))


def _variances(fit: Fit, T: FloatArray, *, with_R: bool) -> tuple[FloatArray, FloatArray]:
    """Return the variances of R(T), or of R(T)/R(reference), by noise and by common errors."""
    ohms = fit.ohms if with_R else 1.0
    gradient = np.vstack([fit.law.ratio(T)[None, :] * with_R, ohms * law_gradient(fit.law, T)])
    noise, whole = (
        np.einsum("in,ij,jn->n", gradient, np.array(matrix), gradient)
        for matrix in (fit.point_covariance, fit.covariance)
    )
    return np.maximum(noise, 0.0), np.maximum(whole - noise, 0.0)


def _mean_half_width(squares: MeanSquares, k: int, common: float) -> float:
    """Return the half-width of the 95 % interval of the mean: Student's t for the scatter of lots."""
    from scipy.special import ndtri, stdtrit

    dof = squares.lots - 1 if squares.lots > 1 else squares.devices - 1
    upper = 0.5 + 0.5 * BAND
    return math.hypot(
        float(stdtrit(dof, upper)) * math.sqrt(squares.mean_variance(k)),
        float(ndtri(upper)) * math.sqrt(common),
    )


def _limits(one: FittedMaterial, squares: MeanSquares, common: FloatArray) -> FloatArray | None:
    totals = [squares.total(k) for k in range(len(common))]
    return np.array(
        [
            tolerance_half_width(
                total,
                squares.mean_variance(k),
                one.found.coverage,
                one.found.confidence,
                common=float(common[k]),
            )
            for k, total in enumerate(totals)
            if total is not None  # there is one of two devices or more
        ]
    )
