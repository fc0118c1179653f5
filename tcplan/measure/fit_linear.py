"""Models that are linear in what is solved for: polynomials, and the law of platinum with free constants."""

from __future__ import annotations

from abc import abstractmethod
from typing import ClassVar

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.law import Expression, Law, Polynomial
from tcplan.measure.fit_curve import Curve, Named
from tcplan.units import ZERO_CELSIUS

_WARM = "1 + a*(T - 273.15) + b*(T - 273.15)**2"
# C acts below 0 degC only: [t - |t|]/2 is t there and 0 above. |t| is rounded over 1e-6 K, which changes the
# law by less than its last digit and keeps its slope defined at 0 degC.
_COLD = " + c*(T - 373.15)*(T - 273.15)**2*((T - 273.15) - sqrt((T - 273.15)**2 + 1e-12))/2"


class _Linear(Curve):
    """R(T) = sum of theta_k times basis function k."""

    linear: ClassVar[bool] = True
    last: ClassVar[bool] = True
    count: int

    @abstractmethod
    def basis(self, T: FloatArray) -> FloatArray:
        """Return the basis functions, shape (reading, function)."""

    def value(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return R(T); see `Curve.value`."""
        return np.asarray(self.basis(T) @ theta)

    def jacobian(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return the basis functions; see `Curve.jacobian`."""
        return self.basis(T)

    def start(self, T: FloatArray, R: FloatArray) -> FloatArray:
        """Return zeros; see `Curve.start`."""
        return np.zeros(self.count)


class PolynomialCurve(_Linear):
    """R(T) = theta_0 + theta_1 z + .., z = (T - reference)/size, so that every power is near 1.

    Parameters
    ----------
    reference : float
        Reference temperature [K].
    order : int
        Highest power.
    T : array
        The temperatures of the readings [K], of which the farthest from the reference gives the size.
    """

    def __init__(self, reference: float, order: int, T: FloatArray) -> None:
        self.reference, self.order = reference, order
        self.size = float(np.max(np.abs(T - reference)))
        self.count = order + 1

    def basis(self, T: FloatArray) -> FloatArray:
        """Return the powers of z."""
        z = (T - self.reference) / self.size
        columns = np.ones((len(T), self.count))
        for n in range(1, self.count):
            columns[:, n] = columns[:, n - 1] * z
        return columns

    def slope(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return dR/dT; see `Curve.slope`."""
        derivative = theta[1:] * np.arange(1, self.count) / self.size
        return np.asarray(self.basis(T)[:, :-1] @ derivative)

    def named(self, theta: FloatArray) -> Named:
        """Return R, tc1, tc2, ..; tc_n = theta_n/(theta_0 size^n)."""
        sizes = self.size ** np.arange(1, self.count)
        tcs, jacobian = theta[1:] / theta[0] / sizes, np.zeros((self.count, self.count))
        jacobian[0, 0] = 1.0
        jacobian[1:, 0] = -tcs / theta[0]
        jacobian[1:, 1:] = np.diag(1.0 / (theta[0] * sizes))
        names = ("R", *(f"tc{n}" for n in range(1, self.count)))
        return Named(names=names, values=np.array([theta[0], *tcs]), jacobian=jacobian)

    def law(self, theta: FloatArray) -> Law:
        """Return the polynomial about the reference."""
        _check_above_zero(theta[0], "at the reference")
        return Polynomial(
            reference=self.reference, coefficients=tuple(map(float, self.named(theta).values[1:]))
        )


class PlatinumCurve(_Linear):
    """R(t) = R0 [1 + a t + b t^2 + c (t - 100) t^3], t in degC, c only below 0 degC: Callendar-Van Dusen.

    Parameters
    ----------
    reference : float
        Reference temperature [K].
    cold : bool
        Whether c is solved for too.
    T : array
        The temperatures of the readings [K].

    References
    ----------
    IEC 60751.
    """

    def __init__(self, reference: float, cold: bool, T: FloatArray) -> None:
        self.reference, self.cold = reference, cold
        self.size = float(np.max(np.abs(T - ZERO_CELSIUS)))
        self.count = 4 if cold else 3

    def basis(self, T: FloatArray) -> FloatArray:
        """Return 1, t, t^2 and (t - 100) t^3 below 0 degC, over powers of the size."""
        t = T - ZERO_CELSIUS
        z = t / self.size
        columns = [np.ones_like(z), z, z**2]
        if self.cold:
            columns.append(np.where(t < 0.0, (t - 100.0) / self.size * z**3, 0.0))
        return np.column_stack(columns)

    def slope(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return dR/dT; see `Curve.slope`."""
        t, s = T - ZERO_CELSIUS, self.size
        rise = theta[1] / s + 2.0 * theta[2] * t / s**2
        if self.cold:
            rise = rise + np.where(t < 0.0, theta[3] * (4.0 * t - 300.0) * t**2 / s**4, 0.0)
        return np.asarray(rise)

    def named(self, theta: FloatArray) -> Named:
        """Return R at the reference, a [1/K], b [1/K^2], c [1/K^4]."""
        at_reference = self.basis(np.array([self.reference]))[0]
        powers = self.size ** np.array([1.0, 2.0, 4.0][: self.count - 1])
        constants, jacobian = theta[1:] / theta[0] / powers, np.zeros((self.count, self.count))
        jacobian[0] = at_reference
        jacobian[1:, 0] = -constants / theta[0]
        jacobian[1:, 1:] = np.diag(1.0 / (theta[0] * powers))
        values = np.array([at_reference @ theta, *constants])
        return Named(names=("R", "a", "b", "c")[: self.count], values=values, jacobian=jacobian)

    def law(self, theta: FloatArray) -> Law:
        """Return the law as a formula with its own a, b and c."""
        _check_above_zero(theta[0], "at 0 degC")
        named = self.named(theta)
        pairs = zip(named.names[1:], named.values[1:], strict=True)
        constants = tuple((name, float(value)) for name, value in pairs)
        text = _WARM + _COLD if self.cold else _WARM
        return Expression(reference=self.reference, text=text, constants=constants)


def _check_above_zero(ohms: float, place: str) -> None:
    if not ohms > 0.0:
        raise InputError(
            Problem(
                where="law",
                found=f"R = {ohms:.4g} ohm {place}",
                expected="a fitted law above zero",
                todo="Check the readings, or take a reference among them.",
            )
        )
