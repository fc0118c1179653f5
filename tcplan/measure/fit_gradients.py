"""How a law moves with its parameters: exact derivatives of R(T)/R(reference)."""

from __future__ import annotations

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.material import series
from tcplan.material.law import Expression, Law, Polynomial, SteinhartHart, Thermistor

_ROUNDING = 1e-13


def law_gradient(law: Law, T: FloatArray) -> FloatArray:
    """Return d[R(T)/R(reference)]/d(parameter), the parameters of a fit after "R", in their order.

    Parameters
    ----------
    law : Law
        A polynomial, a thermistor, a Steinhart-Hart law or a formula.
    T : array, shape (temperature,)
        Temperatures [K].

    Returns
    -------
    array, shape (parameter, temperature)
        The derivatives; no row for a formula without parameters.
    """
    if isinstance(law, Polynomial):
        x = T - law.reference
        return np.array([x**n for n in range(1, len(law.coefficients) + 1)])
    if isinstance(law, Thermistor):
        return np.array([law.ratio(T) * (1.0 / T - 1.0 / law.reference)])
    if isinstance(law, SteinhartHart):
        at_reference = steinhart_hart_log_gradient(law, np.array([law.reference]))
        return np.asarray(law.ratio(T) * (steinhart_hart_log_gradient(law, T) - at_reference))
    if isinstance(law, Expression):
        return _formula_gradient(law, T)
    raise TypeError(f"no fit gives a law of the kind {law.kind}")


def steinhart_hart_log_gradient(law: SteinhartHart, T: FloatArray) -> FloatArray:
    """Return d ln R/d(a, b, c), shape (3, temperature), from 1/T = a + b l + c l^3 at fixed T."""
    log_ohms = np.log(law.ohms(T))
    rise = law.b + 3.0 * law.c * log_ohms**2
    return np.asarray(-np.array([np.ones_like(log_ohms), log_ohms, log_ohms**3]) / rise)


def _formula_gradient(law: Expression, T: FloatArray) -> FloatArray:
    """Return the derivatives of f(T)/f(reference) for each constant of the formula f."""
    ratio, rows = law.ratio(T), np.zeros((len(law.constants), len(T)))
    for k, (name, _) in enumerate(law.constants):
        own = _formula_derivative(law, name, T)
        carried = ratio * _formula_derivative(law, name, np.array([law.reference]))
        # a constant that is only a factor leaves rounding, which must not pass for a derivative
        told = np.abs(own - carried) > _ROUNDING * (np.abs(own) + np.abs(carried))
        rows[k] = np.where(told, own - carried, 0.0) / law.scale
    return rows


def _formula_derivative(law: Expression, name: str, T: FloatArray) -> FloatArray:
    """Return df/d(one constant): the formula as a power series in that constant, cut after its first term."""
    values = {key: series.constant(value, 1) for key, value in law.constants}
    values |= {"T": series.constant(T, 1), "T0": series.constant(law.origin or law.reference, 1)}
    values[name] = series.variable(dict(law.constants)[name], 1)
    return np.asarray(law.tree.series(values)[1] + np.zeros_like(T))
