"""The same fit at another reference temperature, with its covariance carried over exactly."""

from __future__ import annotations

from dataclasses import replace
from math import comb

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.material.law import Polynomial
from tcplan.measure.fit_gradients import law_gradient
from tcplan.measure.model import Fit


def referred(fit: Fit, reference: float) -> Fit:
    """Return a fit with its parameters at another reference temperature.

    Values are those of the same law; the covariances (with and without common errors) are J C J^T with
    the exact derivatives J of the new parameters for the old. What was found from the readings stays.

    Parameters
    ----------
    fit : Fit
        A fit.
    reference : float
        New reference temperature [K]; far from the readings the uncertainties grow accordingly.

    Raises
    ------
    InputError
        When the law is not above zero there.
    """
    if reference == fit.reference:
        return fit
    jacobian = referral_jacobian(fit, reference)
    law = fit.law.referred_to(reference)
    ohms = fit.ohms * float(fit.law.ratio(reference))
    kept = law.coefficients if isinstance(law, Polynomial) else fit.values[1:]
    return replace(
        fit,
        law=law,
        ohms=ohms,
        values=(ohms, *kept),
        covariance=rows(jacobian @ np.array(fit.covariance) @ jacobian.T),
        point_covariance=rows(jacobian @ np.array(fit.point_covariance) @ jacobian.T),
    )


def referral_jacobian(fit: Fit, reference: float) -> FloatArray:
    """Return d(parameters at the new reference)/d(parameters), shape (parameter, parameter).

    With d the shift and S_j = sum over k of binom(k, j) c_k d^(k - j), c_0 = 1: R' = R S_0 and
    tc_j' = S_j/S_0 for a polynomial. Other laws keep their parameters: only R changes.
    """
    jacobian = np.eye(len(fit.names))
    at = np.array([reference])
    jacobian[0] = [float(fit.law.ratio(reference)), *(fit.ohms * law_gradient(fit.law, at)[:, 0])]
    if isinstance(fit.law, Polynomial):
        jacobian[1:, 1:] = _coefficients_jacobian(fit.law.coefficients, reference - fit.reference)
    return jacobian


def _coefficients_jacobian(coefficients: tuple[float, ...], d: float) -> FloatArray:
    count = len(coefficients) + 1
    powers = range(count)
    shift = np.array([[comb(k, j) * d ** max(k - j, 0) for k in powers] for j in powers])
    sums = shift @ np.array([1.0, *coefficients])
    moved = sums[1:, None] / sums[0]
    return np.asarray((shift[1:, 1:] - moved * shift[0, 1:]) / sums[0])


def rows(matrix: FloatArray) -> tuple[tuple[float, ...], ...]:
    """Return a covariance as it is kept: symmetric to the last digit, as tuples."""
    return tuple(tuple(row) for row in (0.5 * (matrix + matrix.T)).tolist())
