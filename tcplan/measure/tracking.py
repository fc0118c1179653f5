"""How closely the TC1 of two materials follow each other, from devices that carry both."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.errors import InputError, Problem
from tcplan.measure.model import CommonErrors, Fit
from tcplan.measure.population import CONFIDENCE, COVERAGE, correlation_of, estimate_of, lot_positions
from tcplan.measure.spread import Estimate, ValueCorrelation
from tcplan.measure.spread_laws import is_stated, local, tc1_moves
from tcplan.measure.tolerance import MeanSquares, check_fractions, mean_squares, tolerance_half_width
from tcplan.names import shown

_TC1 = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasuredTracking:
    """The difference of TC1 between two materials, over the devices that carry both.

    Parameters
    ----------
    difference, uncertainty : float
        Mean of first minus second, and its standard uncertainty, common errors included [1/K].
    total : Estimate
        Standard deviation of the difference over devices and lots [1/K].
    half_width : float
        Within which the difference stays about its mean: the tolerance interval [1/K].
    correlation : ValueCorrelation, optional
        Of the two TC1 over the devices, its interval at 95 %; None where the data cannot tell.
    counts : tuple of int
        Devices of each lot.
    unpaired : tuple of str
        Devices that carry one of the two materials only, and say nothing here.
    coverage, confidence : float
        Of the tolerance interval.
    """

    difference: float
    uncertainty: float
    total: Estimate
    half_width: float
    correlation: ValueCorrelation | None
    counts: tuple[int, ...]
    unpaired: tuple[str, ...]
    coverage: float
    confidence: float

    @property
    def devices(self) -> int:
        """How many devices carry both."""
        return sum(self.counts)

    @property
    def is_shown(self) -> bool:
        """Whether the data show that the two TC1 move together: their correlation is above 0 at 95 %."""
        return self.correlation is not None and self.correlation.low > 0.0

    def is_closer_than(self, limits: Sequence[float]) -> bool:
        """Whether it says more than the limits [1/K] of the two materials by themselves."""
        return self.half_width < sum(limits)


def tracking_of(
    first: Mapping[str, Fit],
    second: Mapping[str, Fit],
    lots: Mapping[str, str] | None = None,
    common: CommonErrors | None = None,
    *,
    coverage: float = COVERAGE,
    confidence: float = CONFIDENCE,
) -> MeasuredTracking:
    """Return within what the TC1 of two materials stay apart by a fixed difference.

    The difference of each device is one figure, and its scatter over devices and lots is found as that of
    any other, less the point noise of fits with u(R) stated. Errors common to the campaign do not cancel in
    the difference: what each of them moves it by is in the limits. TC1 are about the reference of each
    material's own fits.

    Parameters
    ----------
    first, second : mapping of str to Fit
        Fits of each material by device; a device name tells one device of one lot.
    lots : mapping of str to str, optional
        Lot of each device; all of one lot without it.
    common : CommonErrors, optional
        Of both materials together; none without it.
    coverage, confidence : float
        Of the tolerance interval.

    Returns
    -------
    MeasuredTracking

    Raises
    ------
    InputError
        When fewer than two devices carry both materials, a device has no lot, or the fits of one material
        have several references.
    """
    check_fractions(coverage, confidence)
    both = tuple(name for name in first if name in second)
    _check(first, second, both, lots)
    pairs = [(local(first[name], first[name].ohms), local(second[name], second[name].ohms)) for name in both]
    known = [(is_stated(first[name]), is_stated(second[name])) for name in both]
    at = lot_positions([lots[name] if lots is not None else "" for name in both])
    values = np.array([[one[0][_TC1] for one in pair] for pair in pairs])
    noise = np.array([np.diag([one[1][_TC1, _TC1] for one in pair]) for pair in pairs])
    taken = noise * np.array([np.diag(pair) for pair in known], dtype=float)
    squares = _of_difference(values, noise, at, taken)
    total, spread = squares.total(0), squares.mean_variance(0)
    shared = _shared([(first[name], second[name]) for name in both], common or CommonErrors())
    estimate = estimate_of(total, confidence)
    if total is None or estimate is None:  # of two devices or more there is one
        raise InputError(_too_few(both))
    return MeasuredTracking(
        difference=float(squares.mean[0]),
        uncertainty=math.sqrt(spread + shared),
        total=estimate,
        half_width=tolerance_half_width(total, spread, coverage, confidence, common=shared),
        correlation=correlation_of(mean_squares(values, noise, at, taken), CONFIDENCE),
        counts=squares.counts,
        unpaired=tuple(name for name in dict.fromkeys((*first, *second)) if name not in both),
        coverage=coverage,
        confidence=confidence,
    )


def _of_difference(values: FloatArray, noise: FloatArray, at: IntArray, taken: FloatArray) -> MeanSquares:
    """Return the mean squares of first minus second."""
    turn = np.array([[1.0, -1.0]])
    return mean_squares(values @ turn.T, turn @ noise @ turn.T, at, turn @ taken @ turn.T)


def _shared(pairs: Sequence[tuple[Fit, Fit]], common: CommonErrors) -> float:
    """Return the variance that common errors add to the mean difference [1/K^2].

    Laws other than polynomials move as their readings lie: there the difference is taken to move by the sum
    of what both move by, which is never too little.
    """
    moves = [(tc1_moves(a, common), tc1_moves(b, common)) for a, b in pairs]
    apart = [a - b for a, b in moves if a is not None and b is not None]
    if len(apart) == len(pairs):
        return float(np.sum(np.mean(apart, axis=0) ** 2))
    both = [[math.sqrt(local(fit, fit.ohms)[2][_TC1]) for fit in pair] for pair in pairs]
    return float(np.mean(np.sum(both, axis=1) ** 2))


def _check(
    first: Mapping[str, Fit], second: Mapping[str, Fit], both: Sequence[str], lots: Mapping[str, str] | None
) -> None:
    problems = [] if len(both) > 1 else [_too_few(both)]
    for word, fits in (("first", first), ("second", second)):
        references = sorted({round(fits[name].reference, 6) for name in both})
        if len(references) > 1:
            found = f"fits of the {word} material about " + ", ".join(f"{t:g} K" for t in references[:5])
            problems.append(Problem(where="tracking", found=found, expected="one reference for all devices"))
    for name in () if lots is None else [name for name in both if name not in lots]:
        where = f"device {shown(name)}"
        problems.append(Problem(where=where, found="no lot", expected="the lot of every device"))
    if problems:
        raise InputError(problems)


def _too_few(both: Sequence[str]) -> Problem:
    return Problem(
        where="tracking",
        found=f"{len(both)} devices that carry both materials" if len(both) != 1 else "one such device",
        expected="two or more devices with readings of both materials",
        todo="Name a device alike in the sweeps of both materials, or leave tracking out.",
    )
