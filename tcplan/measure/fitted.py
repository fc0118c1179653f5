"""From the sweep of one material to what is known of it: every device fitted, and all of them together."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from tcplan.errors import InputError, Problem
from tcplan.measure.fit import fit
from tcplan.measure.fit_checks import RISK
from tcplan.measure.fit_readings import excluded
from tcplan.measure.model import CommonErrors, Fit, Sweep
from tcplan.measure.population import population
from tcplan.measure.request import SpreadRules, SweepRequest
from tcplan.measure.spread import Population

_SMALLEST = 1e-300  # a probability that is 0 in double precision has a logarithm all the same


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FittedMaterial:
    """One material as measured.

    Parameters
    ----------
    request : SweepRequest
    sweep : Sweep
        Without the readings that are left out.
    fits : tuple of Fit
        Of each device, in the order of ``sweep.devices``.
    lots : tuple of str
        Of each device.
    found : Population
        All devices together.
    quadratic : float, optional
        Probability of quadratic terms at least as large, all devices together, if there were none; None
        where no choice was made.
    notes : tuple of str
        What the reader of the file said.
    """

    request: SweepRequest
    sweep: Sweep
    fits: tuple[Fit, ...]
    lots: tuple[str, ...]
    found: Population
    quadratic: float | None
    notes: tuple[str, ...] = ()

    @property
    def by_device(self) -> dict[str, Fit]:
        """The fits by the name of their device."""
        return dict(zip(self.sweep.devices, self.fits, strict=True))

    @property
    def lot_of(self) -> dict[str, str]:
        """The lot of each device."""
        return dict(zip(self.sweep.devices, self.lots, strict=True))


def fitted(
    request: SweepRequest,
    sweep: Sweep,
    common: CommonErrors,
    rules: SpreadRules,
    notes: tuple[str, ...] = (),
) -> FittedMaterial:
    """Return what the sweep of one material says.

    All devices are fitted with one order: where none is asked, the quadratic if the data of all devices
    together show it. A device whose readings are all left out is not there.

    Raises
    ------
    InputError
        Naming the devices that can not be fitted.
    """
    kept, gone = _without_empty(excluded(sweep, request.exclude))
    if not kept.devices:
        raise InputError(Problem(where=sweep.source, found="no reading left", expected="readings to fit"))
    fits, quadratic = _fits(request, kept, common)
    lots = tuple(kept.lots[int(kept.lot[kept.device == k][0])] for k in range(len(kept.devices)))
    try:
        found = population(fits, lots, kept.devices, coverage=rules.coverage, confidence=rules.confidence)
    except InputError as error:
        raise InputError(problem.inside(sweep.source) for problem in error.problems) from None
    return FittedMaterial(
        request=request,
        sweep=kept,
        fits=fits,
        lots=lots,
        found=found,
        quadratic=quadratic,
        notes=(*notes, *(f"All readings of device {name or '1'} are left out." for name in gone)),
    )


def _without_empty(sweep: Sweep) -> tuple[Sweep, tuple[str, ...]]:
    """Return the sweep without devices that have no reading, and their names."""
    there = np.unique(sweep.device)
    if len(there) == len(sweep.devices):
        return sweep, ()
    devices = tuple(sweep.devices[k] for k in there)
    gone = tuple(name for k, name in enumerate(sweep.devices) if k not in set(there.tolist()))
    return replace(sweep, devices=devices, device=np.searchsorted(there, sweep.device)), gone


def _fits(request: SweepRequest, sweep: Sweep, common: CommonErrors) -> tuple[tuple[Fit, ...], float | None]:
    """Return the fits of all devices, with one order, and the probability of the quadratic term."""
    if request.order is not None or request.model != "polynomial":
        return _all(request, sweep, common, request.order), None
    try:
        curved = _all(request, sweep, common, 2)
    except InputError:
        # too few readings for it in some device: a line, where that can be fitted to all
        return _all(request, sweep, common, 1), None
    together = combined([fit.last_term for fit in curved if fit.last_term is not None])
    return (curved if together <= RISK else _all(request, sweep, common, 1)), together


def combined(probabilities: Sequence[float]) -> float:
    """Return the probability of several tests together, by Fisher's sum of -2 ln p.

    References
    ----------
    R. A. Fisher, "Statistical Methods for Research Workers", on combining tests of significance.
    """
    from scipy.special import chdtrc

    total = -2.0 * sum(math.log(max(p, _SMALLEST)) for p in probabilities)
    return float(chdtrc(2 * len(probabilities), total))


def scatter_of(fits: Sequence[Fit]) -> tuple[float, float] | None:
    """Return the scatter of the readings over what is stated, and the probability of more by chance.

    None where no uncertainty is stated, or no reading is left over.
    """
    from scipy.special import chdtrc

    dof, squares = sum(fit.dof for fit in fits), [fit.chi_squared for fit in fits]
    total = math.fsum(square for square in squares if square is not None)
    if None in squares or not dof:
        return None
    return math.sqrt(total / dof), float(chdtrc(dof, total))


def _all(request: SweepRequest, sweep: Sweep, common: CommonErrors, order: int | None) -> tuple[Fit, ...]:
    """Return the fit of every device, or raise with all that can not be fitted."""
    found: list[Fit] = []
    problems: list[Problem] = []
    for k in range(len(sweep.devices)):
        try:
            found.append(
                fit(sweep.of_device(k), request.model, request.reference, order=order, common=common)
            )
        except InputError as error:
            problems.extend(error.problems)
    if problems:
        raise InputError(problems)
    return tuple(found)
