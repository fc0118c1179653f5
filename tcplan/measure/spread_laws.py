"""A fitted law of any kind as TC1 and TC2 about its reference, with what is known of them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import fields, replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InternalError
from tcplan.material.law import Expression, Law, Polynomial
from tcplan.measure.model import CommonErrors, Fit
from tcplan.measure.spread import COMPONENTS, Component

_STEP = 1e-4  # of a parameter, for a derivative


def law_with(law: Law, names: Sequence[str], values: Sequence[float]) -> Law:
    """Return a law of the same kind with other parameters, R (the first) left out."""
    given = {name: float(value) for name, value in zip(names[1:], values[1:], strict=True)}
    if isinstance(law, Polynomial):
        return replace(law, coefficients=tuple(given.values()))
    if isinstance(law, Expression):
        return replace(law, constants=tuple((name, given.get(name, was)) for name, was in law.constants))
    if unknown := set(given) - {field.name for field in fields(law)}:
        raise InternalError(f"a law {law.kind} has no parameter {', '.join(sorted(unknown))}")
    return replace(law, **given)


def local(fit: Fit, ohms: float) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the value over ``ohms``, TC1 and TC2 of a fit, about its reference, and their covariances.

    Returns
    -------
    figures : array, shape (3,)
    noise : array, shape (3, 3)
        Covariance by point noise.
    common : array, shape (3,)
        Variance by errors that all devices share.
    """
    figures = np.array([fit.values[0] / ohms, *_taylor(fit.law)])
    jacobian = np.zeros((3, len(fit.values)))
    jacobian[0, 0] = 1.0 / ohms
    for k in range(1, len(fit.values)):
        jacobian[1:, k] = _derivative(fit, k)
    noise = jacobian @ np.array(fit.point_covariance) @ jacobian.T
    whole = jacobian @ np.array(fit.covariance) @ jacobian.T
    return figures, noise, np.maximum(np.diag(whole) - np.diag(noise), 0.0)


def is_stated(fit: Fit) -> bool:
    """Whether the readings state their uncertainty, so that their noise is known apart from misfit."""
    return fit.chi_squared is not None


def tc1_moves(fit: Fit, common: CommonErrors) -> FloatArray | None:
    """Return how one standard uncertainty of each common error moves TC1; None where readings decide it.

    A polynomial that is moved stays a polynomial to first order, wherever the readings are. With its TC1 a
    and TC2 b an offset d moves a by (2b - a^2) d, a scale g by a g, a lead r by (lead_tc1 - a) r/R; a gain
    of the meter does not move it.

    Returns
    -------
    array, shape (3,), or None
        By chamber offset, chamber scale and lead [1/K].
    """
    if not isinstance(fit.law, Polynomial):
        return None
    a, b = (float(c) for c in _taylor(fit.law))
    return np.array(
        [
            common.chamber_offset * (2.0 * b - a * a),
            common.chamber_scale * a,
            common.lead / fit.ohms * (common.lead_tc1 - a),
        ]
    )


def _taylor(law: Law) -> FloatArray:
    return np.array((*law.taylor(law.reference, 2), 0.0)[:2])


def _derivative(fit: Fit, k: int) -> FloatArray:
    """Return the derivative of TC1 and TC2 by a parameter."""
    if isinstance(fit.law, Polynomial):
        return np.array([float(k == 1), float(k == 2)])
    step = _STEP * abs(fit.values[k]) or math.sqrt(fit.covariance[k][k]) or _STEP
    sides = []
    for sign in (1.0, -1.0):
        moved = [value + sign * step * (k == n) for n, value in enumerate(fit.values)]
        sides.append(_taylor(law_with(fit.law, fit.names, moved)))
    return np.asarray((sides[0] - sides[1]) / (2.0 * step))


def components_of(fit: Fit) -> tuple[Component, ...]:
    """Return what of a law can scatter: a law without parameters is the same for all devices."""
    free = len(fit.names) - 1
    if isinstance(fit.law, Polynomial):
        return COMPONENTS[: 1 + min(free, 2)]
    return COMPONENTS if free else COMPONENTS[:1]
