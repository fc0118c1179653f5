"""What the residuals of a fit say: outliers, leverage, lack of fit, whether the last term is needed."""

from __future__ import annotations

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.measure.fit_repeats import group_sums
from tcplan.measure.fit_solve import Solved
from tcplan.measure.model import Flag, LackOfFit

RISK = 0.05
"""Probability of calling any reading an outlier, of keeping a last term, when there is no reason to."""

_WHOLE = 1.0 - 1e-9  # leverage of a reading that its fit passes through whatever its value
_FIT_ALONE = 0.9


def last_term(solved: Solved, stated: bool) -> float:
    """Return the probability of a last parameter at least as large if it were 0, two-sided.

    Student's t where the scatter sets the uncertainty, normal where it is stated. Errors common to a sweep
    are left out: they bend no line.
    """
    from scipy.special import ndtr, stdtr

    size = abs(float(solved.theta[-1])) / float(np.sqrt(solved.covariance[-1, -1]))
    return float(2.0 * (ndtr(-size) if stated else stdtr(solved.dof, -size)))


def flags(solved: Solved, lines: IntArray, stated: bool) -> tuple[Flag, ...]:
    """Return the readings that stand out, in the order of the sweep.

    An outlier has a studentised residual that one reading in any of 20 sweeps without outliers would reach
    (two-sided 5 % over the number of readings, after Bonferroni). Where the scatter sets the uncertainty the
    residual is studentised without the reading itself. A leverage is high above 0.9, and above twice that of
    the ends of an even sweep, parameters^2 / readings.

    Parameters
    ----------
    solved : Solved
        The answer.
    lines : array of int, shape (reading,)
        Lines of the readings.
    stated : bool
        Whether uncertainties are stated.
    """
    leverage, studentised = solved.leverage, _studentised(solved, stated)
    count, parameters = solved.q.shape
    outlier = np.abs(studentised) > _outlier_limit(count, solved.dof, stated)
    high = leverage > min(_FIT_ALONE, 2.0 * parameters**2 / count)
    return tuple(
        Flag(
            line=int(lines[k]),
            studentised=float(studentised[k]),
            leverage=float(leverage[k]),
            outlier=bool(outlier[k]),
        )
        for k in np.flatnonzero(outlier | high)
    )


def _studentised(solved: Solved, stated: bool) -> FloatArray:
    free = 1.0 - solved.leverage
    decided = solved.leverage > _WHOLE
    inner = solved.weighted / np.sqrt(np.where(decided, 1.0, free))
    inner = np.where(decided, 0.0, inner)
    if stated or solved.dof < 2:
        return inner
    # rest: what is left of the degrees of freedom times the variance once the reading is taken out
    rest = np.maximum(solved.dof - inner**2, 1e-12 * solved.dof)
    return np.asarray(inner * np.sqrt((solved.dof - 1) / rest))


def _outlier_limit(count: int, dof: int, stated: bool) -> float:
    from scipy.special import ndtri, stdtrit

    tail = RISK / (2.0 * count)
    if stated:
        return float(-ndtri(tail))
    return float(-stdtrit(dof - 1, tail)) if dof >= 2 else np.inf


def lack_of_fit(solved: Solved, groups: IntArray) -> LackOfFit | None:
    """Return the F test of the law against repeats, or None without repeats or without freedom for it.

    Pure error is the scatter of the residuals about the mean of their group (so that a small difference of
    temperature inside a group does not count), lack of fit is how far the means lie from the law.

    References
    ----------
    Draper and Smith, "Applied Regression Analysis", on lack of fit and pure error.
    """
    from scipy.special import fdtrc

    members = int(groups.max()) + 1
    pure_dof, lack_dof = len(groups) - members, members - solved.q.shape[1]
    if pure_dof < 1 or lack_dof < 1:
        return None
    pure, lack = _parts(solved, groups)
    if pure + lack == 0.0:
        return None
    f = (lack / lack_dof) / (pure / pure_dof) if pure > 0.0 else np.inf
    probability = float(fdtrc(lack_dof, pure_dof, f)) if np.isfinite(f) else 0.0
    return LackOfFit(f=float(f), lack_dof=lack_dof, pure_dof=pure_dof, probability=probability)


def _parts(solved: Solved, groups: IntArray) -> tuple[float, float]:
    """Return the weighted sums of squares of pure error and of lack of fit."""
    weights = (np.mean(solved.u) / solved.u) ** 2
    residuals = solved.weighted * solved.u / np.mean(solved.u)
    means = group_sums(groups, weights * residuals) / group_sums(groups, weights)
    pure = float(np.sum(weights * (residuals - means[groups]) ** 2))
    return pure, float(np.sum(weights * means[groups] ** 2))
