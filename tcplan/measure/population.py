"""Several devices and lots: the mean law, and how far devices and lots scatter about it.

What is common to a campaign (chamber, leads, meter) moves all devices alike: it adds to the uncertainty of
the mean and takes nothing off the scatter. Only the point noise of each fit is taken off, and only where
u(R) is stated: without it the scatter about the law is noise and misfit, and misfit is alike in all devices.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from tcplan.arrays import IntArray
from tcplan.errors import InputError, InternalError, Problem
from tcplan.material.law import Expression, Law, Polynomial
from tcplan.measure.model import Fit
from tcplan.measure.spread import COMPONENTS, Estimate, Population, Scatter, ValueCorrelation
from tcplan.measure.spread_laws import components_of, is_stated, law_with, local
from tcplan.measure.tolerance import (
    MeanSquares,
    Variance,
    check_fractions,
    mean_squares,
    tolerance_half_width,
)
from tcplan.names import shown

COVERAGE = 0.9973
CONFIDENCE = 0.95
UNSTATED = (
    "No u(R) is stated: point noise is not taken off the spreads, since misfit of the law would pass for it."
)
MOST_CORRELATED = 0.99  # scatter less noise can give more than 1, and says no more than "nearly 1"
_SAME_REFERENCE = 1e-6  # K


def population(
    fits: Sequence[Fit],
    lots: Sequence[str],
    devices: Sequence[str],
    *,
    coverage: float = COVERAGE,
    confidence: float = CONFIDENCE,
) -> Population:
    """Return the mean law of several devices and how far devices and lots scatter about it.

    The mean is that of the lot means. Variances are by moments (one-way, random), less the point noise of
    each fit where u(R) is stated, and zero where that leaves less than zero.

    Parameters
    ----------
    fits : sequence of Fit
        One a device, all of one model and reference.
    lots, devices : sequence of str
        Of each fit; one lot name for all, such as "", is one lot.
    coverage : float
        Part of all devices that the tolerance intervals hold.
    confidence : float
        Of the tolerance intervals, and of the two-sided intervals of standard deviations.

    Returns
    -------
    Population

    Raises
    ------
    InputError
        Without fits, for a device given twice, for fits of different models or references, and for devices
        whose readings share no range.

    References
    ----------
    See `tcplan.measure.tolerance`.
    """
    check_fractions(coverage, confidence)
    _check_fits(fits, lots, devices)
    at = lot_positions(lots)
    values = np.array([fit.values for fit in fits])
    parameters = mean_squares(values, np.array([fit.point_covariance for fit in fits]), at)
    law = law_with(fits[0].law, fits[0].names, tuple(parameters.mean))
    names = components_of(fits[0])
    found = [local(fit, float(parameters.mean[0])) for fit in fits]
    measured = np.stack([one[1] for one in found])
    known = np.array([is_stated(fit) for fit in fits], dtype=float)[:, None, None]
    squares = mean_squares(np.stack([one[0] for one in found]), measured, at, measured * known)
    common = np.mean([one[2] for one in found], axis=0)
    noise = np.sqrt(np.mean([np.diag(one[1]) for one in found], axis=0))
    scatters = tuple(
        _scatter(squares, k, float(common[k]), float(noise[k]), coverage, confidence)
        for k, name in enumerate(COMPONENTS)
        if name in names
    )
    return Population(
        law=law,
        names=fits[0].names,
        values=tuple(float(mean) for mean in parameters.mean),
        uncertainties=_uncertainties(fits, parameters),
        scatters=scatters,
        correlation=correlation_of(squares, confidence) if "tc1" in names else None,
        counts=squares.counts,
        low=max(fit.low for fit in fits),
        high=min(fit.high for fit in fits),
        coverage=coverage,
        confidence=confidence,
        notes=tuple(_notes(fits, law, squares, scatters)),
    )


def lot_positions(lots: Sequence[str]) -> IntArray:
    """Return the lot of each device as a number: 0 for the first lot named, 1 for the next, .."""
    order = {name: k for k, name in enumerate(dict.fromkeys(lots))}
    return np.array([order[name] for name in lots], dtype=np.intp)


def _scatter(
    squares: MeanSquares, k: int, common: float, noise: float, coverage: float, confidence: float
) -> Scatter:
    total, spread = squares.total(k), squares.mean_variance(k)
    half = None
    if total is not None:
        half = tolerance_half_width(total, spread, coverage, confidence, common=common)
    return Scatter(
        name=COMPONENTS[k],
        mean=float(squares.mean[k]),
        uncertainty=math.sqrt(spread + common),
        noise=noise,
        device=estimate_of(squares.device(k), confidence),
        lot=estimate_of(squares.lot(k), confidence),
        total=estimate_of(total, confidence),
        half_width=half,
    )


def estimate_of(variance: Variance | None, confidence: float) -> Estimate | None:
    """Return the standard deviation of an estimated variance, with its interval."""
    if variance is None:
        return None
    low, high = variance.bounds(confidence)
    sigma = math.sqrt(max(variance.value, 0.0))
    return Estimate(
        sigma=sigma,
        low=min(math.sqrt(low), sigma),
        high=max(math.sqrt(high), sigma),
        dof=variance.dof,
        floored=variance.value <= 0.0,
    )


def _uncertainties(fits: Sequence[Fit], squares: MeanSquares) -> tuple[float, ...]:
    """Return the standard uncertainty of the mean of each parameter, common errors in full."""
    whole = np.mean([np.diag(np.array(fit.covariance)) for fit in fits], axis=0)
    points = np.mean([np.diag(np.array(fit.point_covariance)) for fit in fits], axis=0)
    common = np.maximum(whole - points, 0.0)
    return tuple(math.sqrt(squares.mean_variance(k) + float(common[k])) for k in range(len(common)))


def correlation_of(squares: MeanSquares, confidence: float) -> ValueCorrelation | None:
    """Return the correlation of the first two figures, less what noise makes of it; None where none shows.

    Fisher's interval, atanh r -/+ z/sqrt(dof - 2), is that of r as measured. Noise is then taken off r and
    both ends, which divides them by the reliability: an interval about the larger value would be too narrow.
    """
    from scipy.special import ndtri

    totals = [squares.total(k) for k in (0, 1)]
    raw, taken = squares.total_products()
    seen = raw - taken
    dof = min((Variance(terms=total.terms).dof for total in totals if total is not None), default=0.0)
    if dof <= 2.0 or min(seen[0, 0], seen[1, 1]) <= 0.0:
        return None
    whole, size = math.sqrt(raw[0, 0] * raw[1, 1]), math.sqrt(seen[0, 0] * seen[1, 1])
    middle = math.atanh(_within(float(raw[0, 1]) / whole, MOST_CORRELATED))
    off = float(ndtri(0.5 * (1.0 + confidence))) / math.sqrt(dof - 2.0)
    low, high = (
        _within((math.tanh(middle + side) * whole - float(taken[0, 1])) / size, 1.0) for side in (-off, off)
    )
    value = _within(float(seen[0, 1]) / size, MOST_CORRELATED)
    return ValueCorrelation(value=value, low=min(low, value), high=max(high, value), dof=dof)


def _within(value: float, most: float) -> float:
    return min(max(value, -most), most)


# ---- what is said and refused


def _notes(fits: Sequence[Fit], law: Law, squares: MeanSquares, scatters: Sequence[Scatter]) -> list[str]:
    notes = []
    if squares.devices == 1:
        notes.append("One device: nothing is known of how devices and lots differ.")
    elif squares.lots == 1:
        notes.append("One lot: nothing is known of how lots differ, and no spread here covers it.")
    elif squares.devices == squares.lots:
        notes.append("One device of each lot: the spread of devices and that of lots cannot be told apart.")
    if squares.devices > 1 and not all(is_stated(fit) for fit in fits):
        notes.append(UNSTATED)
    for one in scatters:
        for word, estimate in (("devices", one.device), ("lots", one.lot)):
            if estimate is not None and estimate.floored:
                notes.append(f"{one.name}: no spread of {word} is seen beyond the rest; it counts as 0.")
    if isinstance(law, Polynomial) and len(law.coefficients) > 2:
        notes.append("A spread holds TC1 and TC2: the scatter of higher coefficients is not in it.")
    return notes


def _check_fits(fits: Sequence[Fit], lots: Sequence[str], devices: Sequence[str]) -> None:
    if len(fits) != len(lots) or len(fits) != len(devices):
        raise InternalError("each fit needs a lot and a device")
    if not fits:
        raise InputError(Problem(where="devices", found="no device", expected="one fitted device or more"))
    named = list(zip(lots, devices, strict=True))
    problems = [
        Problem(
            where=_called(*name),
            found="two fits of one device",
            expected="one fit of each device, since a device measured twice is one device",
            todo="Fit its readings together, or give the second device a name of its own.",
        )
        for name in dict.fromkeys(named)
        if named.count(name) > 1
    ]
    problems += [
        _other_model(_called(*name), fits[0], fit)
        for name, fit in zip(named, fits, strict=True)
        if not _is_one_model(fits[0], fit)
    ]
    low, high = max(fit.low for fit in fits), min(fit.high for fit in fits)
    if not low < high:
        problems.append(_no_range(low, high))
    if problems:
        raise InputError(problems)


def _is_one_model(first: Fit, other: Fit) -> bool:
    same = type(first.law) is type(other.law) and first.names == other.names
    if isinstance(first.law, Expression) and isinstance(other.law, Expression):
        same = same and (first.law.text, first.law.origin) == (other.law.text, other.law.origin)
    return same and abs(first.reference - other.reference) <= _SAME_REFERENCE


def _other_model(where: str, first: Fit, other: Fit) -> Problem:
    def words(fit: Fit) -> str:
        return f"{fit.law.kind} ({', '.join(fit.names)}) about {fit.reference:g} K"

    todo = "Fit all devices with one model, order and reference."
    return Problem(where=where, found=words(other), expected=f"{words(first)}, as the first", todo=todo)


def _no_range(low: float, high: float) -> Problem:
    found = f"readings that all start at {low:g} K at the latest and end at {high:g} K at the earliest"
    return Problem(where="devices", found=found, expected="a range that all devices share")


def _called(lot: str, device: str) -> str:
    """Return what messages call a device."""
    words = [f"lot {shown(lot)}"] if lot else []
    return ", ".join([*words, f"device {shown(device)}"] if device else words or ["device"])
