"""Statistics of many figures in memory that does not grow with them.

Figures go into bins of equal width inside each power of two, 8192 of them, so that the middle of a bin
is within 1 part in 16384 of everything in it: an order statistic read from the bins is right to 1e-4.
Counts add, and moments are joined block by block in order, so a result does not depend on who counts.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from tcplan.arrays import FloatArray

CONFIDENCE = 0.95
BITS = 13  # of the mantissa that tell bins apart
LOWEST, HIGHEST = -40, 21  # powers of two; what is below counts as 0, what is above as the top
COARSE_BINS = 60
NEXT_TO_NOTHING = 1e-9  # of a limit: at the reference nothing scatters
_DROPPED = 52 - BITS
_FIRST = (1023 + LOWEST) << BITS
_BINS = (HIGHEST - LOWEST) << BITS

Counts = npt.NDArray[np.int64]


def bin_of(figures: FloatArray) -> Counts:
    """Return the bin of every figure; the leading bits of a float64 are its bin."""
    bins: Counts = figures.view(np.int64) >> _DROPPED
    bins -= _FIRST
    return np.asarray(np.clip(bins, 0, _BINS - 1, out=bins))


def middle_of(bins: Counts) -> FloatArray:
    """Return the middle of each bin; the inverse of `bin_of` to 1 part in 16384."""
    bits = ((np.asarray(bins, dtype=np.int64) + _FIRST) << _DROPPED) + (1 << (_DROPPED - 1))
    return np.where(np.asarray(bins) == 0, 0.0, bits.view(np.float64))


@dataclass(frozen=True, slots=True, eq=False)
class Moments:
    """Count, mean and sum of squared deviations."""

    count: int
    mean: float
    squares: float

    def joined(self, other: Moments) -> Moments:
        """Return the moments of both together (Chan, Golub, LeVeque, 1979)."""
        count = self.count + other.count
        step = other.mean - self.mean
        mean = self.mean + step * other.count / count
        squares = self.squares + other.squares + step * step * self.count * other.count / count
        return Moments(count, mean, squares)

    @property
    def sigma(self) -> float:
        """The standard deviation; 0 of one figure."""
        return float(np.sqrt(self.squares / (self.count - 1))) if self.count > 1 else 0.0


def moments_of(figures: FloatArray) -> Moments:
    """Return the moments of the figures of one block."""
    mean = float(figures.mean())
    off = figures - mean
    return Moments(len(figures), mean, float(off @ off))


@dataclass(slots=True)
class Tally:
    """The bins of all figures so far, their moments, the least and the largest."""

    bins: Counts = field(default_factory=lambda: np.zeros(_BINS, dtype=np.int64))
    moments: Moments = Moments(0, 0.0, 0.0)
    least: float = np.inf
    largest: float = 0.0

    def add(self, first: int, counts: Counts) -> None:
        """Add counts of neighbouring bins, the first of them at ``first``."""
        self.bins[first : first + len(counts)] += counts

    def add_moments(self, blocks: Iterable[Moments]) -> None:
        """Join the moments of further blocks, in their order."""
        for block in blocks:
            self.moments = self.moments.joined(block)

    def order_statistics(self, ranks: Sequence[int]) -> FloatArray:
        """Return the figures at some ranks, 1 for the least, right to 1e-4; the first and last exactly."""
        first, last = bin_of(np.array([self.least, self.largest]))
        at = first + np.searchsorted(np.cumsum(self.bins[first : last + 1]), ranks)
        found = np.clip(middle_of(at), self.least, self.largest)
        found = np.where(np.asarray(ranks) <= 1, self.least, found)
        return np.where(np.asarray(ranks) >= self.moments.count, self.largest, found)

    def coarse(self) -> tuple[tuple[float, ...], tuple[int, ...]]:
        """Return edges and counts of a histogram to look at, from the least to the largest."""
        first, last = bin_of(np.array([self.least, self.largest]))
        used = first + np.flatnonzero(self.bins[first : last + 1])
        top = self.largest if self.largest > self.least else self.least + max(1e-9, 1e-3 * self.least)
        edges = np.linspace(self.least, top, COARSE_BINS + 1)
        at = np.clip(np.searchsorted(edges, middle_of(used), side="right") - 1, 0, COARSE_BINS - 1)
        counts = np.bincount(at, weights=self.bins[used], minlength=COARSE_BINS)
        return tuple(edges.tolist()), tuple(int(c) for c in counts)


def clopper_pearson(inside: int, count: int, confidence: float = CONFIDENCE) -> tuple[float, float]:
    """Return the exact binomial interval of a fraction.

    Two-sided; with all (or none) inside one end is 1 (or 0), and the other is what so many draws support.

    Parameters
    ----------
    inside, count : int
        How many of how many.
    confidence : float

    Returns
    -------
    low, high : float

    References
    ----------
    Clopper and Pearson, Biometrika 26 (1934) 404.
    """
    from scipy.special import betaincinv

    tail = 0.5 * (1.0 - confidence)
    low = betaincinv(inside, count - inside + 1, tail) if inside else 0.0
    high = betaincinv(inside + 1, count - inside, 1.0 - tail) if inside < count else 1.0
    return float(low), float(high)


def quantile_ranks(count: int, quantile: float, confidence: float = CONFIDENCE) -> tuple[int, int, int]:
    """Return the ranks of a quantile and of its interval, whatever the distribution.

    The rank of the true quantile among ``count`` figures is binomial, so the figures at ``low`` and
    ``high`` enclose it with at least the confidence. ``low`` 0 and ``high`` above ``count`` mean that
    so few draws support no bound on that side.

    Returns
    -------
    rank, low, high : int
        1 for the least figure.
    """
    tail = 0.5 * (1.0 - confidence)
    rank = min(count, max(1, int(np.ceil(quantile * count - 1e-9))))
    low = _binomial_point(tail, count, quantile)
    return rank, low, _binomial_point(1.0 - tail, count, quantile) + 1


def _binomial_point(probability: float, count: int, chance: float) -> int:
    """Return the least k with P(B <= k) >= probability, by halving."""
    from scipy.special import betaincc

    low, high = -1, count
    while high - low > 1:
        middle = (low + high) // 2
        below = betaincc(middle + 1, count - middle, chance)
        low, high = (low, middle) if below >= probability else (middle, high)
    return high


def capability(limit: FloatArray, drift: FloatArray) -> float | None:
    """Return the least Cpk over temperature: (limit - |mean|)/(3 sigma) of the signed drift.

    Parameters
    ----------
    limit : array, shape (T,)
        On either side of zero.
    drift : array, shape (T, lots)

    Returns
    -------
    float or None
        None where nothing scatters.
    """
    if drift.shape[1] < 2:
        return None
    mean, sigma = drift.mean(axis=1), drift.std(axis=1, ddof=1)
    moving = sigma > NEXT_TO_NOTHING * limit
    if not moving.any():
        return None
    return float(np.min((limit - np.abs(mean))[moving] / (3.0 * sigma[moving])))


def variance_shares(products: FloatArray) -> FloatArray:
    """Return the share of the variance of y that each x explains, shape (x,).

    Squared standardised regression coefficients: b_k^2 var(x_k)/var(y) of the linear fit of y on all x.
    They add up to the R^2 of the fit when the x are not correlated; correlated ones need not.

    Parameters
    ----------
    products : array, shape (1 + x + 1, 1 + x + 1)
        Sums of products of the columns 1, x.., y over all draws.

    References
    ----------
    Saltelli et al., Global Sensitivity Analysis: The Primer, 2008, section 1.2.5 (from memory).
    """
    count = products[0, 0]
    mean = products[0] / count
    covariance = products[1:, 1:] / count - np.outer(mean[1:], mean[1:])
    variance = covariance[-1, -1]
    if not variance > 1e-24 * products[-1, -1] / count:
        return np.zeros(len(covariance) - 1)
    slopes = np.linalg.lstsq(covariance[:-1, :-1], covariance[:-1, -1], rcond=1e-12)[0]
    return np.asarray(slopes**2 * np.diag(covariance)[:-1] / variance)


def tolerance_factor(count: int, coverage: float, confidence: float) -> float:
    """Return k such that mean +/- k s of ``count`` normal values holds ``coverage`` with ``confidence``.

    k = z sqrt((n - 1)(1 + 1/n)/chi2), Howe's approximation of the two-sided factor.

    Parameters
    ----------
    count : int
        2 or more values.
    coverage, confidence : float
        Above 0 and below 1.

    Returns
    -------
    float

    References
    ----------
    W. G. Howe, J. Amer. Stat. Assoc. 64 (1969); NIST/SEMATECH e-Handbook 7.2.6.3.
    """
    from scipy.special import chdtri, ndtri

    if count < 2 or not (0.0 < coverage < 1.0 and 0.0 < confidence < 1.0):
        raise ValueError("a tolerance factor needs two values and fractions between 0 and 1")
    z, low = float(ndtri(0.5 * (1.0 + coverage))), float(chdtri(count - 1, confidence))
    return z * math.sqrt((count - 1) * (1.0 + 1.0 / count) / low)
