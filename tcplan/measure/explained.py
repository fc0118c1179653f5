"""Which deviations of the materials explain a measured device best: least norm in units of their spread.

With u independent standard deviations of all that may be off, materials and errors common to the sweep
alike, the sum |u|^2 + sum of ((R - R(T; u))/sigma)^2 is made least (Tikhonov). Read as probabilities this is
the most likely device after the readings, its covariance (1 + J^T J)^-1 (a Bayesian linear model about it).

References
----------
Tarantola, Inverse Problem Theory, SIAM 2005, 3.2; JCGM 102 on several quantities with their covariance (both
from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InternalError
from tcplan.measure.common import common_changes
from tcplan.measure.comparison import Check, Explanation, FoundDeviation
from tcplan.measure.composite import Composite, Response
from tcplan.measure.model import CommonErrors

MOST_STEPS = 100
SETTLED = 1e-10  # what a step can gain, of the sum
LEAST_PART = 1e-6  # of a step; of less the sum falls by rounding only
SEEN = 1e-2  # squared singular value from which the readings say something of a direction
TWINS = 0.9  # correlation from which two deviations are hardly told apart
FREE_LEVEL = 10.0  # standard deviation of a level that is not known, a fraction
COMMON = ("chamber_offset", "chamber_scale", "lead", "meter_scale")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Measured:
    """Readings of one device with the standard uncertainty of each [ohm], that of T included."""

    T: FloatArray
    ohms: FloatArray
    sigma: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Model:
    """R of the readings as a function of independent numbers: materials, common errors, free level."""

    composite: Composite
    measured: Measured
    common: CommonErrors
    level_known: bool

    @property
    def active(self) -> tuple[int, ...]:
        """Which of the common errors are there."""
        return tuple(k for k, name in enumerate(COMMON) if getattr(self.common, name) > 0.0)

    @property
    def count(self) -> int:
        """How many independent numbers there are."""
        return int(self.composite.root.shape[1]) + len(self.active) + (0 if self.level_known else 1)

    def at(self, u: FloatArray) -> tuple[FloatArray, FloatArray] | None:
        """Return R [ohm] and dR/du at u; None when a leg would reach zero."""
        own = self.composite.root.shape[1]
        response = self.composite.response(self.composite.root @ u[:own], self.measured.T)
        if response is None:
            return None
        changes = self._changes(response)
        ohms = response.ohms + changes @ u[own:]
        return ohms, np.column_stack([response.jacobian @ self.composite.root, changes])

    def _changes(self, response: Response) -> FloatArray:
        reference = self.composite.reference
        every = common_changes(self.common, self.measured.T, response.ohms, response.slope, reference)
        level = [] if self.level_known else [FREE_LEVEL * response.ohms]
        return np.column_stack([every[:, list(self.active)], *level])


def explain(
    composite: Composite,
    measured: Measured,
    common: CommonErrors,
    *,
    level_known: bool = True,
) -> Explanation:
    """Return the deviations that explain a device best, with what the readings leave open.

    Parameters
    ----------
    composite : Composite
        As planned, with its spreads.
    measured : Measured
        One device.
    common : CommonErrors
        Standard uncertainties of what is common to the sweep; they take part as deviations.
    level_known : bool
        Whether the level of R says something; else it is free, and the drift alone explains.

    Returns
    -------
    Explanation
        Of readings that no device of these materials comes near, one with a misfit that says so.
    """
    model = _Model(composite=composite, measured=measured, common=common, level_known=level_known)
    u = _least(model)
    found = model.at(u)
    if found is None:
        raise InternalError("an explanation that reaches zero")
    return _told(model, u, found[0], found[1] / measured.sigma[:, None])


def _least(model: _Model) -> FloatArray:
    """Return u of the least sum: Gauss-Newton, steps halved until the sum falls.

    It ends where the next step can gain nothing, or after many steps: readings that the materials do not
    explain make the steps slow, and their misfit is told.
    """
    u: FloatArray = np.zeros(model.count)
    found = model.at(u)
    if found is None:
        raise InternalError("a nominal device that reaches zero")
    best = _sum(model, u, found[0])
    for _ in range(MOST_STEPS):
        jacobian = found[1] / model.measured.sigma[:, None]
        rest = np.concatenate([(model.measured.ohms - found[0]) / model.measured.sigma, -u])
        stacked = np.vstack([jacobian, np.eye(model.count)])
        step = np.linalg.lstsq(stacked, rest, rcond=None)[0]
        gain = float(rest @ (stacked @ step))
        part = 1.0
        while (trial := model.at(u + part * step)) is None or _sum(model, u + part * step, trial[0]) > best:
            part *= 0.5
            if part < LEAST_PART:
                return u
        u, found = u + part * step, trial
        best = _sum(model, u, found[0])
        if gain <= SETTLED * (1.0 + best):
            return u
    return u


def _sum(model: _Model, u: FloatArray, ohms: FloatArray) -> float:
    return float(u @ u + np.sum(((model.measured.ohms - ohms) / model.measured.sigma) ** 2))


# --- what is told of it -----------------------------------------------------------------------------------


def _told(model: _Model, u: FloatArray, ohms: FloatArray, jacobian: FloatArray) -> Explanation:
    own, common = model.composite.root.shape[1], len(model.active)
    _, singular, vectors = np.linalg.svd(np.linalg.qr(jacobian, mode="r"), full_matrices=True)
    squared = np.zeros(model.count)
    squared[: len(singular)] = singular**2
    left = vectors.T @ (vectors / (1.0 + squared)[:, None])
    root = model.composite.root
    covariance = root @ left[:own, :own] @ root.T
    spread, misfit = _checks(model, u, ohms, squared, vectors)
    residuals = (model.measured.ohms - ohms) / ohms
    return Explanation(
        deviations=_deviations(model.composite, root @ u[:own], covariance),
        common=_common(model, u[own : own + common], left[own : own + common, own : own + common]),
        covariance=tuple(tuple(row) for row in covariance.tolist()),
        twins=_twins(covariance),
        norm=float(np.linalg.norm(u[:own])),
        spread=spread,
        misfit=misfit,
        residual=float(np.sqrt(np.mean(residuals**2))),
        largest=float(np.max(np.abs(residuals))),
    )


def _checks(
    model: _Model, u: FloatArray, ohms: FloatArray, squared: FloatArray, vectors: FloatArray
) -> tuple[Check, Check]:
    """Return the least sum in its two independent parts, each with its chi-square.

    Along a direction of squared singular value l the deviation found has the variance l/(1 + l), so its
    square times (1 + l)/l is chi-square of one degree; the readings are the rest. Exact for a linear model.
    """
    along, seen = vectors @ u, squared >= SEEN
    whole = _sum(model, u, ohms)
    part = float(np.sum(along[seen] ** 2 * (1.0 + squared[seen]) / squared[seen]))
    count = int(np.count_nonzero(seen))
    freedom = count - (0 if model.level_known else 1)  # a free level is no deviation
    return _check(part, freedom), _check(max(whole - part, 0.0), len(ohms) - count)


def _check(squares: float, dof: int) -> Check:
    from scipy.special import chdtrc

    probability = float(chdtrc(dof, squares)) if dof > 0 else 1.0
    return Check(squares=squares, dof=max(dof, 0), probability=probability)


def _deviations(
    composite: Composite, values: FloatArray, covariance: FloatArray
) -> tuple[FoundDeviation, ...]:
    uncertainties = np.sqrt(np.maximum(np.diag(covariance), 0.0))
    return tuple(
        FoundDeviation(material=q.material, slot=q.slot, value=value, uncertainty=left, sigma=q.sigma)
        for q, value, left in zip(composite.quantities, values.tolist(), uncertainties.tolist(), strict=True)
    )


def _common(model: _Model, u: FloatArray, left: FloatArray) -> tuple[FoundDeviation, ...]:
    found = []
    for k, position in enumerate(model.active):
        sigma = float(getattr(model.common, COMMON[position]))
        found.append(
            FoundDeviation(
                material="",
                slot=COMMON[position],
                value=float(u[k]) * sigma,
                uncertainty=float(np.sqrt(max(left[k, k], 0.0))) * sigma,
                sigma=sigma,
            )
        )
    return tuple(found)


def _twins(covariance: FloatArray) -> tuple[tuple[int, int, float], ...]:
    """Return the pairs whose correlation after the readings is near -1 or 1."""
    size = np.sqrt(np.maximum(np.diag(covariance), 0.0))
    found = []
    for i in range(len(size)):
        for k in range(i + 1, len(size)):
            if size[i] > 0.0 and size[k] > 0.0:
                together = float(covariance[i, k] / (size[i] * size[k]))
                if abs(together) >= TWINS:
                    found.append((i, k, together))
    return tuple(found)


def values_of(explanations: Sequence[Explanation]) -> FloatArray:
    """Return the mean of the deviations of several devices."""
    return np.asarray(np.mean([one.values for one in explanations], axis=0))
