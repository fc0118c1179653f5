"""Models that are not linear in their parameters: thermistors, and formulas of the user."""

from __future__ import annotations

from abc import abstractmethod
from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.law import Expression, Law, SteinhartHart, Thermistor
from tcplan.measure.fit_curve import Curve, Named
from tcplan.measure.fit_gradients import law_gradient, steinhart_hart_log_gradient


@dataclass(frozen=True, slots=True, kw_only=True)
class Formula:
    """A model given by a formula in T, T0 and named parameters, with a value to start from for each.

    Parameters
    ----------
    text : str
        R(T) up to a constant factor: R at the reference is always fitted as well. T and T0 (the reference)
        in kelvin; see `tcplan.material.expression` for what a formula may hold.
    start : tuple of pairs (str, float)
        The name and the start value of each parameter; none for a formula that is known in full.
    """

    text: str
    start: tuple[tuple[str, float], ...] = ()


class _OfLaw(Curve):
    """R(T) = theta_0 times a law with the parameters theta_1, .."""

    linear: ClassVar[bool] = False

    def __init__(self, reference: float, names: tuple[str, ...]) -> None:
        self.reference, self.names = reference, names
        self.count = 1 + len(names)

    @abstractmethod
    def law(self, theta: FloatArray) -> Law:
        """Return the law; see `Curve.law`."""

    def value(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return R(T); see `Curve.value`."""
        try:
            return np.asarray(theta[0] * self.law(theta).ratio(T))
        except InputError:  # parameters outside what the law allows: the solver takes a shorter step
            return np.full_like(T, np.nan)

    def jacobian(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return dR/dtheta; see `Curve.jacobian`."""
        law = self.law(theta)
        return np.column_stack([law.ratio(T), *(theta[0] * law_gradient(law, T))])

    def slope(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return dR/dT; see `Curve.slope`."""
        law = self.law(theta)
        return np.asarray(theta[0] * law.ratio(T) * law.slope(T))

    def named(self, theta: FloatArray) -> Named:
        """Return the parameters as they are."""
        return Named(names=("R", *self.names), values=theta, jacobian=np.eye(self.count))


class ThermistorCurve(_OfLaw):
    """R(T) = R exp[beta (1/T - 1/reference)]; IEC 60539-1."""

    relative: ClassVar[bool] = True

    def __init__(self, reference: float) -> None:
        super().__init__(reference, ("beta",))

    def law(self, theta: FloatArray) -> Law:
        """Return the B law."""
        return Thermistor(reference=self.reference, beta=float(theta[1]))

    def start(self, T: FloatArray, R: FloatArray) -> FloatArray:
        """Return the line through ln R against 1/T."""
        beta, log_ohms = np.polyfit(1.0 / T - 1.0 / self.reference, np.log(R), 1)
        if not beta > 0.0:
            raise InputError(
                Problem(
                    where="law",
                    found=f"resistance that does not fall with temperature (B = {beta:.4g} K)",
                    expected="the readings of a thermistor whose resistance falls",
                    todo="Fit a polynomial or a formula.",
                )
            )
        return np.array([np.exp(log_ohms), beta])


class FormulaCurve(_OfLaw):
    """R(T) = R f(T)/f(reference) for the formula f of a user."""

    def __init__(self, reference: float, formula: Formula) -> None:
        super().__init__(reference, tuple(name for name, _ in formula.start))
        self.formula = formula

    def law(self, theta: FloatArray) -> Law:
        """Return the formula with these values of its parameters."""
        constants = tuple(zip(self.names, map(float, theta[1:]), strict=True))
        return Expression(reference=self.reference, text=self.formula.text, constants=constants)

    def start(self, T: FloatArray, R: FloatArray) -> FloatArray:
        """Return the start values of the user, and the R that suits them best."""
        values = np.array([value for _, value in self.formula.start])
        ratio = self.law(np.array([1.0, *values])).ratio(T)
        if not np.all(np.isfinite(ratio) & (ratio > 0.0)):
            raise InputError(
                Problem(
                    where="start values",
                    found="a formula without a finite value above zero at some of the temperatures",
                    expected="start values with which it is above zero at every reading",
                )
            )
        return np.array([float(np.exp(np.mean(np.log(R / ratio)))), *values])


class SteinhartHartCurve(Curve):
    """1/T = a + b ln R + c (ln R)^3, which gives R in ohm: R at the reference follows from a, b and c."""

    linear: ClassVar[bool] = False
    relative: ClassVar[bool] = True

    def __init__(self, reference: float) -> None:
        self.reference = reference
        self.count = 3

    def law(self, theta: FloatArray) -> SteinhartHart:
        """Return the law with these constants."""
        a, b, c = map(float, theta)
        return SteinhartHart(reference=self.reference, a=a, b=b, c=c)

    def value(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return R(T); see `Curve.value`."""
        try:
            return self.law(theta).ohms(T)
        except InputError:  # parameters outside what the law allows: the solver takes a shorter step
            return np.full_like(T, np.nan)

    def jacobian(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return dR/dtheta; see `Curve.jacobian`."""
        law = self.law(theta)
        return np.asarray((law.ohms(T) * steinhart_hart_log_gradient(law, T)).T)

    def slope(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return dR/dT; see `Curve.slope`."""
        law = self.law(theta)
        return np.asarray(law.ohms(T) * law.slope(T))

    def start(self, T: FloatArray, R: FloatArray) -> FloatArray:
        """Return the linear least squares of 1/T, refused where the constants are none of a thermistor."""
        log_ohms = np.log(R)
        columns = np.column_stack([np.ones_like(log_ohms), log_ohms, log_ohms**3])
        norms = np.linalg.norm(columns, axis=0)
        theta = np.linalg.lstsq(columns / norms, 1.0 / T, rcond=None)[0] / norms
        try:
            self.law(theta)
        except InputError as error:
            todo = "Fit the B law (thermistor) when the range is too narrow for three constants."
            raise InputError(
                Problem(where="law", found=p.found, expected=f"{p.where}: {p.expected}", todo=todo)
                for p in error.problems
            ) from None
        return np.asarray(theta)

    def named(self, theta: FloatArray) -> Named:
        """Return R at the reference and a, b, c."""
        at = np.array([self.reference])
        jacobian = np.vstack([self.jacobian(theta, at), np.eye(3)])
        values = np.array([float(self.value(theta, at)[0]), *theta])
        return Named(names=("R", "a", "b", "c"), values=values, jacobian=jacobian)
