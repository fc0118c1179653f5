"""Fitting a law to the sweep of one device, with all that is known of its parameters."""

from __future__ import annotations

from typing import Literal, TypeAlias

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.law import check_positive
from tcplan.material.law_base import checked_reference
from tcplan.measure.common import check_common, common_changes
from tcplan.measure.fit_checks import BothWays, flags, lack_of_fit, last_term
from tcplan.measure.fit_curve import Curve
from tcplan.measure.fit_laws import Formula, FormulaCurve, SteinhartHartCurve, ThermistorCurve
from tcplan.measure.fit_linear import PlatinumCurve, PolynomialCurve
from tcplan.measure.fit_readings import check_temperatures, checked_readings, device_place, excluded
from tcplan.measure.fit_repeats import NEARNESS, temperature_groups
from tcplan.measure.fit_solve import Readings, Solved, solve
from tcplan.measure.hysteresis import hysteresis, sides
from tcplan.measure.model import CommonErrors, Fit, Hysteresis, LackOfFit, Sweep
from tcplan.measure.referred import rows
from tcplan.names import nearest_name, shown
from tcplan.units import ZERO_CELSIUS

ModelName: TypeAlias = Literal["polynomial", "platinum", "thermistor", "steinhart-hart"]
MODELS: tuple[ModelName, ...] = ("polynomial", "platinum", "thermistor", "steinhart-hart")
HIGHEST_ORDER = 3
FREE_ORDER = 2
"""Order of a polynomial where none is asked and the readings are enough for it."""

_NO_COMMON_ERRORS = CommonErrors()


def fit(
    sweep: Sweep,
    model: ModelName | Formula,
    reference: float,
    *,
    order: int | None = None,
    common: CommonErrors = _NO_COMMON_ERRORS,
    exclude: tuple[int, ...] = (),
    nearness: float = NEARNESS,
    devices: int = 1,
    ways_differ: bool = False,
) -> Fit:
    """Return the weighted least squares of a law to the readings of one device.

    Stated uncertainties u(R) and u(T) weigh the readings, u(T) through the slope. Where none is stated, the
    scatter about the law sets sigma: alike in ohm at all temperatures, or, for the thermistor and
    Steinhart-Hart laws, alike relative to R. Common errors are added to the covariance as common parameters
    and correct nothing.

    Parameters
    ----------
    sweep : Sweep
        Readings of one device.
    model : str or Formula
        "polynomial" gives R, tc1, tc2, ..; "platinum" R, a, b, and c when there are readings below 0 degC;
        "thermistor" R, beta; "steinhart-hart" R, a, b, c; a `Formula` R and its own parameters.
    reference : float
        Reference temperature [K], among the readings or outside by at most half their span.
    order : int, optional
        Of a polynomial, 1 to 3. None takes 2 where the readings are enough for it, else 1: a choice by the
        data would leave intervals that do not hold what they say.
    common : CommonErrors, optional
        Standard uncertainties of what is common to the sweep.
    exclude : tuple of int, optional
        Lines of readings to leave out; nothing else is ever left out.
    nearness : float, optional
        Readings within this [K] are repeats of one temperature.
    devices : int, optional
        How many are looked at together: hysteresis is significant at 5 % over their number.
    ways_differ : bool, optional
        Whether other devices show hysteresis: then readings of two ways are no repeats of each other.

    Returns
    -------
    Fit
        The law and its parameters, with residuals, flags, lack of fit and hysteresis.

    Raises
    ------
    InputError
        Naming the device: too few temperatures, a reference far from them, no answer of the solver, or a
        law that reaches zero.

    References
    ----------
    JCGM 100 (GUM), 5.2, on common errors, and its example H.3 on a fitted line; Orear, Am. J. Phys. 50 (1982)
    912, on the effective variance.
    """
    kept = excluded(sweep, exclude)
    try:
        check_common(common)
        readings = checked_readings(kept)
        at = checked_reference(reference)
        groups = temperature_groups(readings.T, nearness)
        distinct = int(groups.max()) + 1
        curve = _curve(readings.T, model, at, _order(model, order, kept, nearness))
        solved = _solved(readings, curve, at, distinct)
        off = (readings.R - solved.fitted) / solved.fitted
        moved = hysteresis(readings.T, off, curve.count, nearness, devices)
        both = None
        if moved is not None:
            both = BothWays(sides=sides(readings.T, nearness), differ=ways_differ or moved.significant)
        tests = lack_of_fit(solved, groups, both), moved
        return _reported(kept, curve, solved, at, common, tests)
    except InputError as error:
        where = device_place(sweep)
        raise InputError(problem.inside(where) for problem in error.problems) from None


def highest_order(sweep: Sweep, nearness: float = NEARNESS) -> int:
    """Return the highest order of a polynomial that the readings of a device are enough for; 0 for none.

    One temperature more than the order; without u(R) also one reading more than coefficients, which shows the
    scatter.

    Parameters
    ----------
    sweep : Sweep
        Readings of one device, at least one.
    nearness : float, optional
        Readings within this [K] are repeats of one temperature.
    """
    distinct = int(temperature_groups(sweep.T, nearness).max()) + 1
    spare = len(sweep.T) - (1 if sweep.u_R is not None else 2)
    return max(0, min(distinct - 1, spare))


def _order(model: ModelName | Formula, order: int | None, sweep: Sweep, nearness: float) -> int:
    """Return the order of a polynomial: as asked, else the quadratic where there are readings for it."""
    if order is None:
        return min(FREE_ORDER, max(1, highest_order(sweep, nearness)))
    if model != "polynomial" or not 1 <= order <= HIGHEST_ORDER:
        expected = f"1 to {HIGHEST_ORDER} for a polynomial, and none for another law"
        raise InputError(Problem(where="order", found=f"{order}", expected=expected))
    return order


def _curve(T: FloatArray, model: ModelName | Formula, reference: float, order: int) -> Curve:
    if isinstance(model, Formula):
        return FormulaCurve(reference, model)
    if model == "polynomial":
        return PolynomialCurve(reference, order, T)
    if model == "platinum":
        return PlatinumCurve(reference, bool(np.any(T < ZERO_CELSIUS)), T)
    if model == "thermistor":
        return ThermistorCurve(reference)
    if model == "steinhart-hart":
        return SteinhartHartCurve(reference)
    near = nearest_name(str(model), MODELS)
    todo = f"Did you mean {near}?" if near else ""
    expected = f"one of {', '.join(MODELS)}, or a formula"
    raise InputError(Problem(where="model", found=shown(model), expected=expected, todo=todo))


def _solved(readings: Readings, curve: Curve, reference: float, distinct: int) -> Solved:
    check_temperatures(readings.T, reference, curve.count, distinct)
    if not readings.stated and len(readings.T) <= curve.count:
        raise InputError(
            Problem(
                where="readings",
                found=f"{len(readings.T)} of them for {curve.count} coefficients, without u(R)",
                expected="more readings than coefficients, so that their scatter shows",
                todo="State u(R), measure more, or fit a law with fewer coefficients.",
            )
        )
    return solve(curve, readings)


def _reported(
    sweep: Sweep,
    curve: Curve,
    solved: Solved,
    reference: float,
    common: CommonErrors,
    tests: tuple[LackOfFit | None, Hysteresis | None],
) -> Fit:
    stated, law = sweep.u_R is not None, curve.law(solved.theta)
    low, high = float(sweep.T.min()), float(sweep.T.max())
    check_positive(law, min(low, reference), max(high, reference), "law")
    named = curve.named(solved.theta)
    point, whole = _covariances(sweep.T, curve, solved, reference, common)
    residuals = (sweep.R - solved.fitted) / solved.fitted
    return Fit(
        law=law,
        ohms=float(named.values[0]),
        names=named.names,
        values=tuple(named.values.tolist()),
        covariance=rows(whole),
        point_covariance=rows(point),
        readings=len(sweep.T),
        dof=solved.dof,
        sigma=float(np.sqrt(np.mean((solved.u / solved.fitted) ** 2))),
        chi_squared=float(np.sum(solved.weighted**2)) if stated else None,
        residuals=tuple(residuals.tolist()),
        low=low,
        high=high,
        flags=flags(solved, sweep.line, stated),
        lack_of_fit=tests[0],
        last_term=last_term(solved, stated) if curve.last else None,
        hysteresis=tests[1],
    )


def _covariances(
    T: FloatArray, curve: Curve, solved: Solved, reference: float, common: CommonErrors
) -> tuple[FloatArray, FloatArray]:
    """Return the covariance of the named parameters without and with the common errors."""
    jacobian = curve.named(solved.theta).jacobian
    point = jacobian @ solved.covariance @ jacobian.T
    if common == _NO_COMMON_ERRORS:
        return point, point
    changes = common_changes(common, T, solved.fitted, curve.slope(solved.theta, T), reference)
    moved = jacobian @ solved.moved(changes)
    return point, point + moved @ moved.T
