"""From the sweep of one material to what is known of it: every device fitted, and all of them together."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from tcplan.errors import InputError, Problem
from tcplan.measure.fit import FREE_ORDER, fit, highest_order
from tcplan.measure.fit_checks import RISK
from tcplan.measure.fit_readings import device_place, excluded
from tcplan.measure.model import CommonErrors, Fit, Sweep
from tcplan.measure.population import population
from tcplan.measure.request import SpreadRules, SweepRequest
from tcplan.measure.spread import Population

MOST_NAMED = 5
"""Devices, and lines of each, that a message names."""
STEEP = 3.0
"""R that changes more times than this is too steep for a polynomial; common practice, no source."""
LOOSE = 0.01
"""Scatter about a law, relative to R, that says more of the law than of the meter; no source."""
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
        where an order was asked, or there are no such terms. It is reported, and decides nothing.
    notes : tuple of str
        What the reader of the file said, and what makes the law doubtful.
    hysteresis : float, optional
        Probability of a mean difference of the ways at least as large, all devices together, if there were
        none; None without both ways.
    """

    request: SweepRequest
    sweep: Sweep
    fits: tuple[Fit, ...]
    lots: tuple[str, ...]
    found: Population
    quadratic: float | None
    notes: tuple[str, ...] = ()
    hysteresis: float | None = None

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

    All devices are fitted with one order: where none is asked, the quadratic, or a line where no device has
    readings for more. A device whose readings are all left out is not there.

    Raises
    ------
    InputError
        Naming the devices that can not be fitted, and those that have too few readings for what others have.
    """
    kept, gone = _without_empty(excluded(sweep, request.exclude))
    if not kept.devices:
        raise InputError(Problem(where=sweep.source, found="no reading left", expected="readings to fit"))
    order = _order_for_all(request, kept)
    fits = _all(request, kept, common, order)
    moved = ways_apart(fits)
    if moved is not None and moved <= RISK:
        fits = _all(request, kept, common, order, ways_differ=True)
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
        quadratic=_quadratic(request, fits),
        hysteresis=moved,
        notes=(
            *notes,
            *(f"All readings of device {name or '1'} are left out." for name in gone),
            *_doubts(request, kept, fits),
        ),
    )


def _without_empty(sweep: Sweep) -> tuple[Sweep, tuple[str, ...]]:
    """Return the sweep without devices that have no reading, and their names."""
    there = np.unique(sweep.device)
    if len(there) == len(sweep.devices):
        return sweep, ()
    devices = tuple(sweep.devices[k] for k in there)
    gone = tuple(name for k, name in enumerate(sweep.devices) if k not in set(there.tolist()))
    return replace(sweep, devices=devices, device=np.searchsorted(there, sweep.device)), gone


def _order_for_all(request: SweepRequest, sweep: Sweep) -> int | None:
    """Return the order of the polynomial of all devices; None for another law."""
    if request.order is not None or request.model != "polynomial":
        return request.order
    orders = [highest_order(sweep.of_device(k)) for k in range(len(sweep.devices))]
    if max(orders) < FREE_ORDER:
        return 1
    if min(orders) < FREE_ORDER:
        raise InputError(_short_devices(sweep, orders))
    return FREE_ORDER


def _quadratic(request: SweepRequest, fits: Sequence[Fit]) -> float | None:
    """Return the probability of the quadratic terms of all devices, where they were not asked for."""
    if request.order is not None or request.model != "polynomial" or len(fits[0].values) <= FREE_ORDER:
        return None
    return combined([fit.last_term for fit in fits if fit.last_term is not None])


def ways_apart(fits: Sequence[Fit]) -> float | None:
    """Return the probability of a mean hysteresis of all devices at least as large, if there were none.

    Student's t of the mean of the devices, with the degrees of freedom of all; None without both ways.
    """
    from scipy.special import stdtr

    pairs = [(fit.hysteresis, fit.dof) for fit in fits]
    told = [(moved.mean, moved.uncertainty, dof) for moved, dof in pairs if moved is not None]
    if not told:
        return None
    u = math.hypot(*(each for _, each, _ in told))
    total, dof = abs(math.fsum(mean for mean, _, _ in told)), sum(dof - 1 for _, _, dof in told)
    if u == 0.0:
        return 0.0 if total else 1.0
    return float(2.0 * stdtr(max(dof, 1), -total / u))


def _short_devices(sweep: Sweep, orders: Sequence[int]) -> Problem:
    """Return what is said of devices with too few readings, beside others that have enough."""
    short = [k for k, order in enumerate(orders) if order < FREE_ORDER]
    told = [f"{sweep.devices[k]} ({_lines(sweep, k)})" for k in short]
    spare = "" if sweep.u_R is not None else f", and without u(R) {FREE_ORDER + 2} readings"
    line = "" if any(orders[k] < 1 for k in short) else ", or fit a line to all (--order 1, order = 1)"
    return Problem(
        where=sweep.source,
        found=f"too few readings for a quadratic term in {'device' if len(short) == 1 else 'devices'} "
        f"{_listed(told)}, and enough in others",
        expected=f"{FREE_ORDER + 1} temperatures of every device{spare}",
        todo=f"Leave these lines out (--exclude, or exclude in the campaign){line}.",
    )


def _lines(sweep: Sweep, device: int) -> str:
    lines = [str(line) for line in sweep.line[sweep.device == device]]
    return f"{'line' if len(lines) == 1 else 'lines'} {_listed(lines)}"


def _listed(words: Sequence[str]) -> str:
    more = f" and {len(words) - MOST_NAMED} more" if len(words) > MOST_NAMED else ""
    return ", ".join(words[:MOST_NAMED]) + more


def _doubts(request: SweepRequest, sweep: Sweep, fits: Sequence[Fit]) -> Iterator[str]:
    """Yield what speaks against the kind of the law: a steep R under a polynomial, a wide scatter."""
    if steep := max((_steep(request, sweep.of_device(k)) for k in range(len(fits))), key=len):
        yield steep
    scatter = max(math.sqrt(math.fsum(r * r for r in fit.residuals) / max(fit.dof, 1)) for fit in fits)
    if scatter > LOOSE:
        yield f"Readings scatter by {100.0 * scatter:.2g} % about the law: another law may follow them."


def _steep(request: SweepRequest, one: Sweep) -> str:
    """Return which law to try where the R of a device changes much for a polynomial, else an empty text."""
    times = float(one.R.max() / one.R.min())
    if request.model != "polynomial" or not times > STEEP:
        return ""
    falls = bool(one.R[np.argmin(one.T)] > one.R[np.argmax(one.T)])
    other = "thermistor or steinhart-hart" if falls else "platinum, or a formula as --law"
    told = f"{times:.0f}" if times >= 10.0 else f"{times:.1f}"
    return f"R changes {told} times over the sweep: try --model {other}."


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


def _all(
    request: SweepRequest,
    sweep: Sweep,
    common: CommonErrors,
    order: int | None,
    *,
    ways_differ: bool = False,
) -> tuple[Fit, ...]:
    """Return the fit of every device, or raise with all that can not be fitted."""
    found: list[Fit] = []
    refused: dict[Problem, list[str]] = {}
    many = len(sweep.devices)
    for k, name in enumerate(sweep.devices):
        one = sweep.of_device(k)
        try:
            law = fit(
                one,
                request.model,
                request.reference,
                order=order,
                common=common,
                devices=many,
                ways_differ=ways_differ,
            )
            found.append(law)
        except InputError as error:
            for problem in error.problems:
                told = _without_device(problem, device_place(one))
                if told.where == "law" and (other := _steep(request, one)):
                    told = replace(told, todo=other)
                refused.setdefault(told, []).append(name)
    if refused:
        raise InputError(_of_devices(problem, sweep.source, names) for problem, names in refused.items())
    return tuple(found)


def _without_device(problem: Problem, place: str) -> Problem:
    return replace(problem, where=problem.where.removeprefix(place).removeprefix(": "))


def _of_devices(problem: Problem, source: str, names: Sequence[str]) -> Problem:
    """Return the same mistake of several devices as one problem."""
    if len(names) > 1:
        return problem.inside(f"{source}: devices {_listed(names)}")
    return problem.inside(f"{source}: device {names[0]}" if names[0] else source)
