"""Weighted least squares: the one place that solves, linear and not, with the noise of temperature.

The uncertainty of a temperature enters through the slope: u^2 = u_R^2 + (dR/dT u_T)^2, the effective
variance, iterated until it settles. Solving is by QR of the weighted derivatives with columns of unit length,
so that no normal equations lose digits.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.measure.fit_curve import Curve

_MAX_ROUNDS = 60
_PATIENCE = 10
_SETTLED = 1e-7  # of u: weights that far off change the answer by that share of its own noise
_MAX_EVALUATIONS = 500
_TOLERANCE = 1e-15
_ALIKE = 1e-11  # smallest over largest singular value of the derivatives, columns of unit length
_OFFSET = 1e-3
_ROUNDING = 1e-9  # of the readings
_LAST_DIGITS = 64.0 * float(np.finfo(np.float64).eps)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Readings:
    """What is fitted, of one device: temperatures [K], resistances [ohm], their standard uncertainties."""

    T: FloatArray
    R: FloatArray
    u_R: FloatArray | None = None
    u_T: FloatArray | None = None

    @property
    def stated(self) -> bool:
        """Whether the readings state how uncertain they are."""
        return self.u_R is not None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Solved:
    """Parameters with all that follows from the last derivatives.

    Parameters
    ----------
    theta : array, shape (parameter,)
        The parameters.
    fitted, u : array, shape (reading,)
        R by the curve [ohm], and the standard uncertainty of each reading [ohm]: as stated, or as found.
    weighted : array, shape (reading,)
        (R - fitted)/u.
    q : array, shape (reading, parameter)
        Orthonormal columns that span the weighted derivatives.
    inverse : array, shape (parameter, parameter)
        What turns q^T (change/u) into the change of theta.
    dof : int
        Readings less parameters.
    """

    theta: FloatArray
    fitted: FloatArray
    u: FloatArray
    weighted: FloatArray
    q: FloatArray
    inverse: FloatArray
    dof: int

    @property
    def covariance(self) -> FloatArray:
        """Of theta, from the readings alone, shape (parameter, parameter)."""
        return np.asarray(self.inverse @ self.inverse.T)

    @property
    def leverage(self) -> FloatArray:
        """How far each reading decides its own fit, 0 to 1, shape (reading,)."""
        return np.asarray(np.einsum("ij,ij->i", self.q, self.q))

    def moved(self, changes: FloatArray) -> FloatArray:
        """Return how theta moves with changes of the readings [ohm], (reading, k) to (parameter, k)."""
        return np.asarray(self.inverse @ (self.q.T @ (changes / self.u[:, None])))


def solve(curve: Curve, readings: Readings) -> Solved:
    """Return the weighted least squares of a curve.

    Parameters
    ----------
    curve : Curve
        The model.
    readings : Readings
        At least as many as parameters; more where no uncertainty is stated.

    Raises
    ------
    InputError
        When the solver finds no answer, or the readings cannot tell two parameters apart.
    """
    theta, u = curve.start(readings.T, readings.R), _first_noise(curve, readings)
    for done in range(_MAX_ROUNDS):
        theta, q, inverse = _one_round(curve, readings, theta, u)
        newer = _noise(curve, readings, theta, u)
        if np.all(np.abs(newer - u) <= _SETTLED * u):
            return _solved(curve, readings, theta, u, q, inverse)
        # half steps when whole ones swing to and fro
        u = newer if done < _PATIENCE else np.sqrt(u * newer)
    raise InputError(
        Problem(
            where="fit",
            found=f"weights that do not settle within {_MAX_ROUNDS} rounds",
            expected="uncertainties small beside the change of R over the sweep",
            todo="Check the unit of u(T) and u(R).",
        )
    )


def _first_noise(curve: Curve, readings: Readings) -> FloatArray:
    if readings.u_R is not None:
        return readings.u_R
    return readings.R if curve.relative else np.ones_like(readings.R)


def _noise(curve: Curve, readings: Readings, theta: FloatArray, u: FloatArray) -> FloatArray:
    """Return the noise of each reading for these parameters, up to a common factor where none is stated."""
    if readings.u_R is not None:
        if readings.u_T is None:
            return u
        return np.hypot(readings.u_R, curve.slope(theta, readings.T) * readings.u_T)
    return np.abs(curve.value(theta, readings.T)) if curve.relative else u


def _one_round(
    curve: Curve, readings: Readings, theta: FloatArray, u: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return theta, q and inverse for these weights."""
    if not curve.linear:
        theta = _minimised(curve, readings, theta, u)
    q, inverse = _factors(curve, curve.jacobian(theta, readings.T) / u[:, None])
    if curve.linear:
        theta = inverse @ (q.T @ (readings.R / u))
    return theta, q, inverse


def _factors(curve: Curve, weighted: FloatArray) -> tuple[FloatArray, FloatArray]:
    lengths = np.sqrt(np.einsum("ij,ij->j", weighted, weighted))
    if not np.all(np.isfinite(lengths)) or not np.all(lengths > 0.0):
        raise _not_told_apart(curve)
    q, r = np.linalg.qr(weighted / lengths)
    sizes = np.linalg.svd(r, compute_uv=False)
    if not sizes[-1] > _ALIKE * sizes[0]:
        raise _not_told_apart(curve)
    return q, np.linalg.inv(r) / lengths[:, None]


def _not_told_apart(curve: Curve) -> InputError:
    return InputError(
        Problem(
            where="fit",
            found=f"{curve.count} parameters, some of which the readings cannot tell apart",
            expected="parameters that each change R(T) in a way of their own",
            todo="Take out one (R at the reference is fitted always: a formula needs no factor for it), or "
            "measure over more temperatures.",
        )
    )


def _minimised(curve: Curve, readings: Readings, theta: FloatArray, u: FloatArray) -> FloatArray:
    """Return the least squares from theta, or, where that leads nowhere, by way of those of ln R."""
    direct = _attempt(curve, readings.T, readings.R, theta, u)
    if direct is None:
        # laws that change R many times are nearly straight in ln R: it can be solved from far away
        by_logarithm = _attempt(_Logarithm(curve), readings.T, np.log(readings.R), theta, np.ones_like(u))
        if by_logarithm is not None:
            direct = _attempt(curve, readings.T, readings.R, by_logarithm, u)
    if direct is None:
        raise _no_answer()
    return direct


class _Logarithm:
    """ln R(T) of a curve."""

    def __init__(self, curve: Curve) -> None:
        self.curve = curve

    def value(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        return np.log(self.curve.value(theta, T))

    def jacobian(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        return np.asarray(self.curve.jacobian(theta, T) / self.curve.value(theta, T)[:, None])


def _attempt(
    curve: Curve | _Logarithm, T: FloatArray, target: FloatArray, theta: FloatArray, u: FloatArray
) -> FloatArray | None:
    """Return the least squares of one start, or None when the solver ends anywhere else."""
    from scipy.optimize import least_squares

    size = np.where(theta != 0.0, np.abs(theta), 1.0)
    with np.errstate(all="ignore"):
        try:
            result = least_squares(
                lambda s: (curve.value(s * size, T) - target) / u,
                theta / size,
                jac=lambda s: curve.jacobian(s * size, T) * size / u[:, None],
                x_scale="jac",
                ftol=_TOLERANCE,
                xtol=_TOLERANCE,
                gtol=_TOLERANCE,
                max_nfev=_MAX_EVALUATIONS,
            )
        except (ValueError, np.linalg.LinAlgError):  # values or derivatives that are not finite
            return None
    if result.status <= 0 or not _at_minimum(result.jac, result.fun, target / u):
        return None
    return np.asarray(result.x * size)


def _at_minimum(jacobian: FloatArray, residuals: FloatArray, whole: FloatArray) -> bool:
    """Return whether the residuals are at right angles to the derivatives, as they are at a minimum only.

    A solver also ends where its steps become small. The measure is the relative offset of Bates and Watts,
    Technometrics 23 (1981) 179; residuals of the size of rounding have no direction and are good.
    """
    if not (np.all(np.isfinite(jacobian)) and np.all(np.isfinite(residuals))):
        return False
    size, (count, parameters) = float(np.linalg.norm(residuals)), jacobian.shape
    if size <= _ROUNDING * float(np.linalg.norm(whole)):
        return True
    lengths = np.linalg.norm(jacobian, axis=0)
    left, sizes, _ = np.linalg.svd(jacobian / np.where(lengths > 0.0, lengths, 1.0), full_matrices=False)
    # directions that the readings do not tell apart are refused later, with their own reason
    along = left[:, sizes > _ALIKE * sizes[0]].T @ residuals
    freedom = max(count - parameters, 1)
    return float(np.linalg.norm(along)) / size <= _OFFSET * float(np.sqrt(parameters / freedom))


def _no_answer() -> InputError:
    return InputError(
        Problem(
            where="fit",
            found=f"no least squares within {_MAX_EVALUATIONS} evaluations",
            expected="start values near enough, and a law that suits the readings",
            todo="Give other start values, or a law with fewer parameters.",
        )
    )


def _solved(
    curve: Curve, readings: Readings, theta: FloatArray, u: FloatArray, q: FloatArray, inverse: FloatArray
) -> Solved:
    """Return the answer; where no uncertainty is stated the scatter about the law sets it."""
    fitted, dof = curve.value(theta, readings.T), len(readings.T) - curve.count
    residuals = readings.R - fitted
    factor = 1.0 if readings.stated else _scatter(residuals / u, readings.R / u, dof)
    return Solved(
        theta=theta,
        fitted=fitted,
        u=u * factor,
        weighted=residuals / (u * factor),
        q=q,
        inverse=inverse * factor,
        dof=dof,
    )


def _scatter(residuals: FloatArray, whole: FloatArray, dof: int) -> float:
    """Return the standard deviation about the law, at least that of the last digits of the readings.

    Readings that lie on the law exactly differ from it by rounding, which must not pass for information.
    """
    found = float(np.sqrt(np.sum(residuals**2) / dof))
    return max(found, _LAST_DIGITS * float(np.sqrt(np.mean(whole**2))))
