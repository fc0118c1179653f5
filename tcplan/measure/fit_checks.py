"""What the residuals of a fit say: outliers, leverage, lack of fit, whether the last term is needed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.measure.fit_repeats import group_sums
from tcplan.measure.fit_solve import Solved
from tcplan.measure.model import Flag, LackOfFit

RISK = 0.05
"""Probability of calling any reading an outlier, or a last term significant, when there is no reason to."""

_WHOLE = 1.0 - 1e-9  # leverage of a reading that its fit passes through whatever its value
_FIT_ALONE = 0.9
_NOTHING = 1e-7  # of a column: what is left is rounding


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


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BothWays:
    """A sweep up and down: the side of each reading (`hysteresis.sides`), and whether the ways differ."""

    sides: IntArray
    differ: bool

    @property
    def columns(self) -> FloatArray:
        """What may shift readings beside the law: the way, and turns where the ways differ."""
        way = np.where(np.abs(self.sides) == 1, self.sides, 0)
        turns = [self.sides == 2, self.sides == -2] if self.differ else []
        return np.column_stack([way, *turns]).astype(np.float64)


def lack_of_fit(solved: Solved, groups: IntArray, both: BothWays | None = None) -> LackOfFit | None:
    """Return the F test of the law against repeats, or None without repeats or without freedom for it.

    Pure error is the scatter of the residuals about the mean of their group (so that a small difference of
    temperature inside a group does not count), lack of fit is how far the means lie from the law. The mean
    difference of the ways of a sweep up and down is a parameter of its own on both sides of the test, so that
    hysteresis is neither. Where the ways differ, only repeats within a way are pure error, and the turns,
    which may be of either way, are left free.

    Parameters
    ----------
    solved : Solved
        The answer.
    groups : array of int, shape (reading,)
        Which temperature each reading has, from 0.
    both : BothWays, optional
        For a sweep that goes up and down.

    References
    ----------
    Draper and Smith, "Applied Regression Analysis", on lack of fit and pure error.
    """
    from scipy.special import fdtrc

    beside = np.zeros((len(groups), 0)) if both is None else both.columns
    left, left_dof, pure, pure_dof = _about(solved, groups, beside)
    lack, lack_dof = max(left - pure, 0.0), left_dof - pure_dof
    if both is not None and both.differ:
        # a difference that changes with temperature is in the repeats of both ways together
        _, _, pure, pure_dof = _about(solved, _cells(groups, both.sides), beside[:, :0])
    if pure_dof < 1 or lack_dof < 1 or pure + lack == 0.0:
        return None
    f = (lack / lack_dof) / (pure / pure_dof) if pure > 0.0 else np.inf
    probability = float(fdtrc(lack_dof, pure_dof, f)) if np.isfinite(f) else 0.0
    return LackOfFit(f=float(f), lack_dof=lack_dof, pure_dof=pure_dof, probability=probability)


def _cells(groups: IntArray, sides: IntArray) -> IntArray:
    """Return the number of the temperature and way of each reading; at a turn each is by itself."""
    cells = 3 * groups + sides
    alone = np.abs(sides) == 2
    cells[alone] = 3 * len(groups) + np.flatnonzero(alone)
    return np.asarray(np.unique(cells, return_inverse=True)[1], dtype=np.intp)


def _about(solved: Solved, groups: IntArray, beside: FloatArray) -> tuple[float, int, float, int]:
    """Return weighted squares and their degrees of freedom, about the law and about the means of groups.

    Both with further columns ``beside`` the law and the means, shape (reading, k).
    """
    count, parameters = solved.q.shape
    weights = (np.mean(solved.u) / solved.u) ** 2
    root = np.sqrt(weights)
    residuals = solved.weighted * solved.u / np.mean(solved.u)
    inside = residuals - _means(residuals, groups, weights)
    pure = float(np.sum(weights * inside**2))
    left = pure + float(np.sum(weights * (residuals - inside) ** 2))
    pure_dof, left_dof = count - int(groups.max()) - 1, count - parameters
    if not beside.shape[1]:
        return left, left_dof, pure, pure_dof
    free = root[:, None] * beside
    taken, rank = _explained(free - solved.q @ (solved.q.T @ free), root * residuals)
    within = np.column_stack([column - _means(column, groups, weights) for column in beside.T])
    of_pure, pure_rank = _explained(root[:, None] * within, root * inside)
    return left - taken, left_dof - rank, max(pure - of_pure, 0.0), pure_dof - pure_rank


def _means(values: FloatArray, groups: IntArray, weights: FloatArray) -> FloatArray:
    """Return the weighted mean of the group of each value."""
    return np.asarray((group_sums(groups, weights * values) / group_sums(groups, weights))[groups])


def _explained(columns: FloatArray, values: FloatArray) -> tuple[float, int]:
    """Return the sum of squares of values along columns, and how many of these there are."""
    long = np.linalg.norm(columns, axis=0) > _NOTHING * np.sqrt(len(values))
    if not np.any(long):
        return 0.0, 0
    factors, _, rank, _ = np.linalg.lstsq(columns[:, long], values, rcond=_NOTHING)
    return float(np.sum((columns[:, long] @ factors) ** 2)), int(rank)
