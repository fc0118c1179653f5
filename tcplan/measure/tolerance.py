"""Devices in lots: their mean squares, the variances these estimate, bounds, and limits for few devices.

The model is one-way and random: y = mean + lot + device + measurement, all normal, the measurement with a
known variance of its own for each device. Mean squares are of the lot means and of devices about their lot
means, so that they fit a mean law which is the mean of lot means, also where lots differ in size.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.errors import InputError, Problem

Term = tuple[float, float, int]
"""(coefficient, mean square, degrees of freedom)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Variance:
    """A variance estimated by one or two mean squares: the sum of the terms less what measurement adds.

    Parameters
    ----------
    terms : tuple of (float, float, int)
        Coefficient, mean square and degrees of freedom; the first coefficient is above zero.
    measured : float
        What measurement adds to the sum, taken as known.
    doubtful : float
        What measurement may add beside: taken off the lower bound alone.
    """

    terms: tuple[Term, ...]
    measured: float = 0.0
    doubtful: float = 0.0

    @property
    def raw(self) -> float:
        """The sum of the terms, with what measurement adds."""
        return sum(c * square for c, square, _ in self.terms)

    @property
    def value(self) -> float:
        """The estimate; it can be below zero, which says that nothing of it is seen."""
        return self.raw - self.measured

    @property
    def dof(self) -> float:
        """Effective degrees of freedom of the estimate (Satterthwaite, Biometrics Bull. 2 (1946) 110)."""
        below = sum((c * square) ** 2 / dof for c, square, dof in self.terms)
        return max(self.value, 0.0) ** 2 / below if below else float(sum(dof for *_, dof in self.terms))

    def bounds(self, confidence: float) -> tuple[float, float]:
        """Return a two-sided interval of the variance, its ends not below zero.

        Of one mean square it is the chi-square interval. Of two it is the modified large-sample interval,
        which holds its confidence where Satterthwaite's fails: few lots, and differences.

        References
        ----------
        Graybill and Wang, J. Amer. Stat. Assoc. 75 (1980) 869; Ting et al., J. Stat. Comput. Simul. 35
        (1990) 135; both as in Burdick and Graybill, Confidence Intervals on Variance Components, 1992
        (from memory).
        """
        tail = 0.5 * (1.0 - confidence)
        return self._lower(tail), self.upper(1.0 - tail)

    def upper(self, confidence: float) -> float:
        """Return the upper bound of the variance alone, not below zero; see `bounds`."""
        off = _distance(self.terms, 1.0 - confidence, upper=True)
        return max(self.raw + off - self.measured, 0.0)

    def _lower(self, tail: float) -> float:
        off = _distance(self.terms, tail, upper=False)
        return max(self.raw - off - self.measured - self.doubtful, 0.0)


def _distance(terms: Sequence[Term], tail: float, *, upper: bool) -> float:
    """Return how far a bound is from the sum of the terms."""
    squares = 0.0
    for c, square, dof in terms:
        grows = upper == (c > 0.0)
        squares += ((_rise(dof, tail) if grows else _fall(dof, tail)) * c * square) ** 2
    if len(terms) == 2 and terms[1][0] < 0.0:
        (c1, square1, dof1), (c2, square2, dof2) = terms
        squares += _cross(dof1, dof2, tail, upper=upper) * c1 * square1 * -c2 * square2
    return math.sqrt(max(squares, 0.0))


def _rise(dof: int, tail: float) -> float:
    """Return how far above a mean square its upper chi-square bound is, as a part of it."""
    from scipy.special import chdtri

    return float(dof / chdtri(dof, 1.0 - tail)) - 1.0


def _fall(dof: int, tail: float) -> float:
    """Return how far below a mean square its lower chi-square bound is, as a part of it."""
    from scipy.special import chdtri

    return 1.0 - float(dof / chdtri(dof, tail))


def _cross(dof1: int, dof2: int, tail: float, *, upper: bool) -> float:
    """Return what makes the bound of a difference exact where it is zero."""
    from scipy.special import fdtri

    f = float(fdtri(dof1, dof2, tail if upper else 1.0 - tail))
    first = _rise(dof1, tail) if upper else _fall(dof1, tail)
    second = _fall(dof2, tail) if upper else _rise(dof2, tail)
    return ((f - 1.0) ** 2 - (first * f) ** 2 - second**2) / f


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class MeanSquares:
    """Mean squares and products of several parameters over devices and lots.

    Parameters
    ----------
    mean : array, shape (parameter,)
        Mean of the lot means.
    counts : tuple of int
        Devices of each lot.
    between, within : array, shape (parameter, parameter)
        Of the lot means about their mean, and of devices about their lot means; zero without freedom.
    measured_between, measured_within : array, shape (parameter, parameter)
        What measurement adds to each.
    taken_between, taken_within : array, shape (parameter, parameter)
        What of it is known well enough to be taken off.
    """

    mean: FloatArray
    counts: tuple[int, ...]
    between: FloatArray
    within: FloatArray
    measured_between: FloatArray
    measured_within: FloatArray
    taken_between: FloatArray
    taken_within: FloatArray

    @property
    def devices(self) -> int:
        """How many devices."""
        return sum(self.counts)

    @property
    def lots(self) -> int:
        """How many lots."""
        return len(self.counts)

    @property
    def inverse_size(self) -> float:
        """The mean of 1/devices over the lots."""
        return sum(1.0 / count for count in self.counts) / self.lots

    def device(self, k: int) -> Variance | None:
        """Return the variance from device to device in a lot; None when no lot has two devices."""
        return self._sum(k, 0.0, 1.0) if self.devices > self.lots else None

    def lot(self, k: int) -> Variance | None:
        """Return the variance from lot to lot; None of one lot, and when no lot has two devices."""
        apart = self.lots > 1 and self.devices > self.lots
        return self._sum(k, 1.0, -self.inverse_size) if apart else None

    def total(self, k: int) -> Variance | None:
        """Return the variance of any device of any lot seen; None of one device."""
        return self._sum(k, *self._total_parts) if self.devices > 1 else None

    def total_products(self) -> tuple[FloatArray, FloatArray]:
        """Return the covariance of any device of any lot, raw, and what is taken off it."""
        c1, c2 = self._total_parts
        raw = c1 * self.between + c2 * self.within
        return raw, c1 * self.taken_between + c2 * self.taken_within

    def mean_variance(self, k: int) -> float:
        """Return the variance of the mean; not below what measurement alone makes of it."""
        measured = float(self.measured_between[k, k])
        if self.lots > 1:
            return max(float(self.between[k, k]), measured) / self.lots
        return max(float(self.within[k, k]) / self.devices, measured)

    @property
    def _total_parts(self) -> tuple[float, float]:
        return (1.0, 1.0 - self.inverse_size) if self.lots > 1 else (0.0, 1.0)

    def _sum(self, k: int, c1: float, c2: float) -> Variance:
        parts = (
            (c1, float(self.between[k, k]), self.lots - 1),
            (c2, float(self.within[k, k]), self.devices - self.lots),
        )
        taken = float(c1 * self.taken_between[k, k] + c2 * self.taken_within[k, k])
        measured = float(c1 * self.measured_between[k, k] + c2 * self.measured_within[k, k])
        terms = tuple(part for part in parts if part[0] and part[2])
        return Variance(terms=terms, measured=taken, doubtful=max(measured - taken, 0.0))


def mean_squares(
    values: FloatArray, measured: FloatArray, lots: IntArray, taken: FloatArray | None = None
) -> MeanSquares:
    """Return the mean squares of devices in lots.

    Parameters
    ----------
    values : array, shape (device, parameter)
        One row a device.
    measured : array, shape (device, parameter, parameter)
        Covariance of the measurement of each, independent from device to device.
    lots : array of int, shape (device,)
        The lot of each device: 0, 1, ..
    taken : array, shape (device, parameter, parameter), optional
        What of ``measured`` is taken off the scatter; all of it by default.

    References
    ----------
    Thomas and Hultquist, Ann. Statist. 6 (1978) 582, for lots of different sizes (from memory); with equal
    sizes it is the one-way analysis of variance, its mean square between lots divided by that size.
    """
    counts = np.bincount(lots)
    groups = [np.flatnonzero(lots == k) for k in range(len(counts))]
    means = np.stack([values[rows].mean(axis=0) for rows in groups])
    mean = means.mean(axis=0)
    apart, off = values - means[lots], means - mean
    share = 1.0 / counts[lots]
    off_scatter = measured if taken is None else taken
    inside, between = max(len(values) - len(counts), 1), max(len(counts) - 1, 1)
    return MeanSquares(
        mean=mean,
        counts=tuple(int(count) for count in counts),
        between=off.T @ off / between,
        within=apart.T @ apart / inside,
        measured_between=np.tensordot(share**2, measured, axes=1) / len(counts),
        measured_within=np.tensordot(1.0 - share, measured, axes=1) / inside,
        taken_between=np.tensordot(share**2, off_scatter, axes=1) / len(counts),
        taken_within=np.tensordot(1.0 - share, off_scatter, axes=1) / inside,
    )


def tolerance_half_width(
    total: Variance, mean_variance: float, coverage: float, confidence: float, *, common: float = 0.0
) -> float:
    """Return k such that mean -/+ k holds a part of all devices with a confidence.

    k^2 = z^2 [upper(total) + V upper(raw total)/(raw total) + common], z of the two-sided normal coverage. Of
    one lot without measurement it is Howe's factor times the standard deviation.

    Parameters
    ----------
    total : Variance
        Of any device.
    mean_variance : float
        V, of the mean.
    coverage, confidence : float
        Above 0 and below 1.
    common : float
        Variance that an error common to all devices adds to the mean.

    Returns
    -------
    float

    References
    ----------
    W. G. Howe, J. Amer. Stat. Assoc. 64 (1969) 610; NIST/SEMATECH e-Handbook 7.2.6.3; for lots, Hoffman and
    Kringle, J. Biopharm. Stat. 15 (2005) 283 (from memory).
    """
    from scipy.special import ndtri

    raw = Variance(terms=total.terms)
    growth = raw.upper(confidence) / raw.raw if raw.raw > 0.0 else 1.0
    z = float(ndtri(0.5 * (1.0 + coverage)))
    return z * math.sqrt(total.upper(confidence) + mean_variance * growth + common)


def check_fractions(coverage: float, confidence: float) -> None:
    """Refuse a coverage or a confidence that is not above 0 and below 1.

    Raises
    ------
    InputError
        With each of the two that is wrong.
    """
    problems = [
        Problem(where=name, found=f"{value:g}", expected="a part above 0 and below 1, such as 0.95")
        for name, value in (("coverage", coverage), ("confidence", confidence))
        if not 0.0 < value < 1.0
    ]
    if problems:
        raise InputError(problems)
