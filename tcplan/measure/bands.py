"""Intervals of 95 %: of the parameters of a fit, and of its R(T)/R(reference) and R(T) at any temperature.

Where the scatter of the readings sets their uncertainty the factor is Student's t, else 1.96. Common errors
have no scatter of their own: with both, the degrees of freedom are those of Welch and Satterthwaite.
"""

from __future__ import annotations

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.measure.fit_gradients import law_gradient
from tcplan.measure.model import Fit

CONFIDENCE = 0.95
_AS_GOOD_AS_NORMAL = 1e9  # degrees of freedom


def interval(fit: Fit, name: str) -> float:
    """Return the half-width of the 95 % interval of a parameter, common errors included, in its SI unit."""
    k = fit.names.index(name)
    return float(
        _half_width(fit, np.array([fit.covariance[k][k]]), np.array([fit.point_covariance[k][k]]))[0]
    )


def ratio_band(fit: Fit, T: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return R(T)/R(reference) by the fit and the half-width of its 95 % interval.

    Parameters
    ----------
    fit : Fit
        A fit.
    T : array, shape (temperature,)
        Temperatures [K]; outside of the readings it is an extrapolation.

    Returns
    -------
    value, half_width : array, shape (temperature,)
        The half-width is 0 at the reference.

    References
    ----------
    JCGM 100 (GUM), 5.2, G.3 and G.4.
    """
    ratio = fit.law.ratio(T)
    gradient = np.vstack([np.zeros((1, len(T))), law_gradient(fit.law, T)])
    return ratio, _band(fit, gradient)


def ohms_band(fit: Fit, T: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return R(T) [ohm] by the fit and the half-width of its 95 % interval; see `ratio_band`."""
    ratio = fit.law.ratio(T)
    gradient = np.vstack([ratio[None, :], fit.ohms * law_gradient(fit.law, T)])
    return fit.ohms * ratio, _band(fit, gradient)


def _band(fit: Fit, gradient: FloatArray) -> FloatArray:
    variances = (
        np.einsum("in,ij,jn->n", gradient, np.array(covariance), gradient)
        for covariance in (fit.covariance, fit.point_covariance)
    )
    return _half_width(fit, *(np.maximum(v, 0.0) for v in variances))


def _half_width(fit: Fit, variance: FloatArray, point_variance: FloatArray) -> FloatArray:
    from scipy.special import ndtri, stdtrit

    upper = 0.5 + CONFIDENCE / 2.0
    if fit.chi_squared is not None:
        return np.asarray(ndtri(upper) * np.sqrt(variance))
    with np.errstate(divide="ignore", invalid="ignore"):
        dof = fit.dof * np.where(point_variance > 0.0, variance / point_variance, np.inf) ** 2
    factor = stdtrit(np.clip(dof, fit.dof, _AS_GOOD_AS_NORMAL), upper)
    return np.asarray(factor * np.sqrt(variance))
