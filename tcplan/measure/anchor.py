"""R of one device at the reference of its plan: from the readings there, else from a fit of them all."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from tcplan.arrays import BoolArray, FloatArray
from tcplan.errors import InputError, Problem
from tcplan.measure.fit import HIGHEST_ORDER, fit
from tcplan.measure.fit_gradients import law_gradient
from tcplan.measure.fit_readings import device_place
from tcplan.measure.fit_repeats import NEARNESS, temperature_groups
from tcplan.measure.model import CommonErrors, Fit, Sweep
from tcplan.units import format_celsius

LEAST_SIGMA = 1e-9  # of R; readings that scatter by less are rounded numbers, not better ones


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Anchor:
    """R at the reference [ohm], the variance of its point noise, and its covariance with each reading.

    ``sigma`` is the standard uncertainty of each reading [ohm] as stated, or as the scatter about the fit
    says; ``stated`` tells which. ``order`` is that of the fit, 0 where none was needed for R.
    """

    ohms: float
    variance: float
    covariance: FloatArray
    sigma: FloatArray
    by: Literal["readings", "fit"]
    order: int
    stated: bool


def anchor_of(sweep: Sweep, reference: float, slope: FloatArray) -> Anchor:
    """Return R at the reference of one device.

    Parameters
    ----------
    sweep : Sweep
        Of one device.
    reference : float
        [K]
    slope : array, shape (reading,)
        Predicted dR/dT [ohm/K], by which an uncertain T moves R.

    Returns
    -------
    Anchor
        The weighted mean of the readings within 0.1 K, carried to the reference by the slope; without any,
        a polynomial of order 3, or of less where the readings are few.

    Raises
    ------
    InputError
        When the readings are of one temperature, or too few to show their scatter and no u(R) is stated.
    """
    _check(sweep)
    fitted = None if sweep.u_R is not None else _fit(sweep, reference)
    sigma = _sigma(sweep, fitted, slope)
    near = np.abs(sweep.T - reference) <= NEARNESS
    if np.any(near):
        return _of_readings(sweep, reference, slope, sigma, near)
    fitted = fitted or _fit(sweep, reference)
    gradient = np.vstack([fitted.law.ratio(sweep.T), fitted.ohms * law_gradient(fitted.law, sweep.T)])
    own = np.array(fitted.point_covariance)
    return Anchor(
        ohms=fitted.ohms,
        variance=float(own[0, 0]),
        covariance=own[0] @ gradient,  # of a weighted fit with each reading it is made of
        sigma=sigma,
        by="fit",
        order=len(fitted.values) - 1,
        stated=sweep.u_R is not None,
    )


def _of_readings(
    sweep: Sweep, reference: float, slope: FloatArray, sigma: FloatArray, near: BoolArray
) -> Anchor:
    weights = np.where(near, 1.0 / sigma**2, 0.0)
    total = float(np.sum(weights))
    carried = sweep.R - slope * (sweep.T - reference)
    return Anchor(
        ohms=float(weights @ carried) / total,
        variance=1.0 / total,
        covariance=np.where(near, 1.0 / total, 0.0),
        sigma=sigma,
        by="readings",
        order=0,
        stated=sweep.u_R is not None,
    )


def _sigma(sweep: Sweep, fitted: Fit | None, slope: FloatArray) -> FloatArray:
    own = sweep.u_R if sweep.u_R is not None else (fitted.sigma if fitted is not None else 0.0) * sweep.R
    of_T = np.zeros_like(slope) if sweep.u_T is None else sweep.u_T * slope
    return np.maximum(np.hypot(own, of_T), LEAST_SIGMA * sweep.R)


def _fit(sweep: Sweep, reference: float) -> Fit:
    """Return a polynomial of order 3, or of less where the temperatures or the readings are few."""
    distinct = int(temperature_groups(sweep.T, NEARNESS).max()) + 1
    spare = len(sweep.T) if sweep.u_R is not None else len(sweep.T) - 1  # one more shows the scatter
    order = min(HIGHEST_ORDER, distinct - 1, spare - 1)
    if order < 1:
        raise InputError(
            Problem(
                where=device_place(sweep),
                found=f"{len(sweep.T)} readings in the range of the plan, without u(R)",
                expected="u(R), or three readings or more at two temperatures, so that their scatter shows",
                todo="Add a column u(R) [ohm], or measure at more temperatures.",
            )
        )
    plain = sweep if sweep.u_R is not None else replace(sweep, u_T=None)
    return fit(plain, "polynomial", reference, order=order, common=CommonErrors())


def _check(sweep: Sweep) -> None:
    problems = []
    if sweep.u_T is not None and sweep.u_R is None:
        problems.append(
            Problem(
                where=device_place(sweep),
                found="an uncertainty of the temperatures alone",
                expected="u(R) beside it",
                todo="Add u(R), or take u(T) out: then the scatter of the readings is used.",
            )
        )
    if sweep.u_R is not None and not np.all(sweep.u_R > 0.0):
        line = int(sweep.line[int(np.argmin(sweep.u_R))])
        problems.append(
            Problem(where=f"{device_place(sweep)}, line {line}", found="u(R) of 0", expected="above zero")
        )
    if float(np.ptp(sweep.T)) <= NEARNESS:
        problems.append(
            Problem(
                where=device_place(sweep),
                found=f"readings at one temperature, {format_celsius(float(sweep.T[0]))}",
                expected="two temperatures or more in the range of the plan: one says nothing of the drift",
            )
        )
    if problems:
        raise InputError(problems)
