"""From the sweep of one material to what is known of it: every device fitted, and all of them together."""

from __future__ import annotations

from dataclasses import dataclass

from tcplan.errors import InputError, Problem
from tcplan.measure.fit import fit
from tcplan.measure.fit_checks import RISK
from tcplan.measure.fit_readings import excluded
from tcplan.measure.model import CommonErrors, Fit, Sweep
from tcplan.measure.population import population
from tcplan.measure.request import SpreadRules, SweepRequest
from tcplan.measure.spread import Population


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
        The largest probability, over the devices, of such a quadratic term if there were none; None for
        laws without one.
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

    All devices are fitted with one order: where none is asked, the quadratic if any device needs it.

    Raises
    ------
    InputError
        Naming the devices that can not be fitted.
    """
    kept = excluded(sweep, request.exclude)
    orders = [request.order] if request.order is not None or request.model != "polynomial" else [2, 1]
    fits = _all(request, kept, common, orders[0])
    quadratic = None
    if len(orders) > 1:
        quadratic = min(f.last_term if f.last_term is not None else 1.0 for f in fits)
        if quadratic > RISK:
            fits = _all(request, kept, common, 1)
    lots = tuple(kept.lots[int(kept.lot[kept.device == k][0])] for k in range(len(kept.devices)))
    found = population(fits, lots, kept.devices, coverage=rules.coverage, confidence=rules.confidence)
    return FittedMaterial(
        request=request, sweep=kept, fits=fits, lots=lots, found=found, quadratic=quadratic, notes=notes
    )


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
