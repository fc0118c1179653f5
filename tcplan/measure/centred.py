"""The change of leg values that makes the drift of measured devices least.

Two steps, both by sequential quadratic programming on the explained mean device: first the least judged
figure over the range, then of all values within 1 % of it the least change, as the sum of squared
logarithms. In one series or parallel node the first has no false end; in a mixed network it is the one that
the search meets first from the plan.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from math import exp, log
from typing import Any

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.drift import Curve
from tcplan.errors import InternalError
from tcplan.goal import judged
from tcplan.measure.centring_task import POINTS, ROUNDING, Task, changed, task_of
from tcplan.measure.comparison import Centred, Centring, Expected, Explanation
from tcplan.measure.composite import Composite
from tcplan.measure.explained import values_of
from tcplan.network import Network, legs, resistance, used_materials

MOST_CHANGE = 4.0  # of a leg, as a factor either way
NEAR_MOST = 1.1  # a factor this near to the largest is told like one that stopped there
MOST_LEFT_OUT = 0.5  # of the devices; the mean of fewer than the rest is not that of the file
NO_WORSE = 1e-2  # of the least figure: what the least change may give away
MOST_STEPS = 200


def why_not_centred(expected: Expected) -> str:
    """Return why no change of values is worked out; empty when one is."""
    groups = expected.changed or tuple(range(len(legs(expected.network))))
    free = set(groups) - expected.fixed
    if not free:
        return "All members are given: there is no value to change."
    if len(set(groups)) == 1:
        return "Of one leg the value moves R and not the drift."
    if len(free) == 1:
        return "With one value to change, R at the reference sets it, and not the drift."
    return ""


def why_not_trusted(explanations: Sequence[Explanation]) -> str:
    """Return why what was measured is no ground for new values; empty when it is."""
    doubted = sum(not one.trusted for one in explanations)
    if not doubted or doubted < MOST_LEFT_OUT * len(explanations):
        return ""
    whose = "The device is" if len(explanations) == 1 else f"{doubted} of {len(explanations)} devices are"
    return (
        f"{whose} not explained by these materials (a probability under 0.1 %): values centred on deviations "
        "that are not there would be wrong. Check the stated spreads, the unit of R and the network."
    )


def centred(
    expected: Expected, composite: Composite, names: Sequence[str], explanations: Sequence[Explanation]
) -> Centring:
    """Return the least change of leg values that makes the judged figure of the mean device least.

    Parameters
    ----------
    expected : Expected
        Two legs or more that can change.
    composite : Composite
        The same network, as planned.
    names : sequence of str
        Of the devices.
    explanations : sequence of Explanation
        Of each device; the mean of the deviations of those that are trusted is centred.

    Returns
    -------
    Centring
        R at the reference becomes the planned value, or, where its level says nothing, stays.
    """
    mean = values_of([one for one in explanations if one.trusted])
    task = task_of(expected, composite, mean)
    x = _least_change(task)
    factors = task.factors(x)
    network = changed(expected.network, factors)
    devices = tuple(
        _device(expected, composite, network, name, one)
        for name, one in zip(names, explanations, strict=True)
        if one.trusted
    )
    return Centring(
        factors=factors,
        ohms=tuple(leg.ohms for leg in legs(network)),
        value=task.ohms * exp(task.level(x)),
        level="planned" if expected.level_known else "kept",
        devices=devices,
        limited=bool(np.max(np.abs(x)) >= log(MOST_CHANGE / NEAR_MOST)),
        left_out=tuple(n for n, one in zip(names, explanations, strict=True) if not one.trusted),
    )


def _least_change(task: Task) -> FloatArray:
    """Return x: of all that give the least figure, the one of least norm."""
    start = _start(task)
    limits = _margins(task, None)
    first = _solved(task, start, lambda y: float(y[-2]), lambda y: _unit(len(y), len(y) - 2), limits)
    least = float(first[-2])
    bound = least * (1.0 + NO_WORSE) + ROUNDING / task.scale
    second = _solved(
        task,
        first,
        lambda y: 0.5 * float(y[:-2] @ y[:-2]),
        lambda y: np.r_[y[:-2], 0.0, 0.0],
        _margins(task, bound),
    )
    return np.asarray(second[: task.free])


def _start(task: Task) -> FloatArray:
    """Return (x, figure, centre) with all free legs changed alike, so far that the level is right."""
    x = np.zeros(task.free)
    for _ in range(20):  # Newton on one number
        x = x - task.level(x) / max(float(task.level_slopes(x).sum()), 1e-3)
    x = np.clip(x, -log(MOST_CHANGE), log(MOST_CHANGE))
    return np.asarray(np.r_[x, np.max(np.abs(task.drift(x)) / task.weight), 0.0])


Margins = tuple[Callable[[FloatArray], FloatArray], Callable[[FloatArray], FloatArray]]


def _margins(task: Task, bound: float | None) -> Margins:
    """Return what must not be below zero at y = (x, figure, centre), and its derivatives."""

    def margins(y: FloatArray) -> FloatArray:
        drift = task.drift(y[:-2]) - task.centred * y[-1]
        room = task.weight * (y[-2] if bound is None else bound)
        return np.concatenate([room - drift, room + drift])

    def slopes(y: FloatArray) -> FloatArray:
        own = np.column_stack([task.drift_slopes(y[:-2]), np.zeros(len(task.weight)), -task.centred])
        room = np.zeros_like(own)
        room[:, -2] = task.weight if bound is None else 0.0
        return np.vstack([room - own, room + own])

    return margins, slopes


def _solved(
    task: Task,
    start: FloatArray,
    aim: Callable[[FloatArray], float],
    slope: Callable[[FloatArray], FloatArray],
    margins: Margins,
) -> FloatArray:
    """Return where the solver ends; the start where it ends at something worse or outside of the limits."""
    from scipy.optimize import minimize

    far = log(MOST_CHANGE)
    constraints: list[dict[str, Any]] = [
        {"type": "ineq", "fun": margins[0], "jac": margins[1]},
        {
            "type": "eq",
            "fun": lambda y: np.array([task.level(y[:-2])]),
            "jac": lambda y: np.r_[task.level_slopes(y[:-2]), 0.0, 0.0][None, :],
        },
    ]
    found = minimize(
        aim,
        start,
        jac=slope,
        bounds=[(-far, far)] * task.free + [(0.0, None), (None, None)],
        constraints=constraints,
        method="SLSQP",
        options={"maxiter": MOST_STEPS, "ftol": 1e-14},
    )
    y = np.asarray(found.x)
    level = abs(task.level(y[:-2]))
    kept = level <= 1e-9 and bool(np.all(margins[0](y) >= -1e-7))
    return y if kept and aim(y) <= aim(start) else start


def _unit(count: int, position: int) -> FloatArray:
    row = np.zeros(count)
    row[position] = 1.0
    return row


# --- before and after -----------------------------------------------------------------------------------


def _device(
    expected: Expected, composite: Composite, network: Network, name: str, explanation: Explanation
) -> Centred:
    deviations = np.array(explanation.values)
    splits = [b for n in used_materials(network) for b in expected.materials[n].law.breakpoints]
    before, after = (
        judged(_curve(composite, own, deviations), expected.need, splits).figure
        for own in (expected.network, network)
    )
    return Centred(
        device=name,
        before=before,
        after=after,
        uncertainty=_uncertainty(expected, composite, network, explanation),
    )


def _of(composite: Composite, network: Network) -> Composite:
    return Composite(
        network=network,
        materials=composite.materials,
        reference=composite.reference,
        quantities=composite.quantities,
        root=composite.root,
    )


def _curve(composite: Composite, network: Network, deviations: FloatArray) -> Curve:
    own = _of(composite, network)

    def ratio(T: FloatArray) -> FloatArray:
        found = own.ratios(deviations, np.r_[T, own.reference])
        if found is None:
            raise InternalError("an explained device reaches zero inside the range")
        ohms = resistance(network, found)
        return np.asarray(ohms[:-1] / ohms[-1])

    return ratio


def _uncertainty(
    expected: Expected, composite: Composite, network: Network, explanation: Explanation
) -> float:
    """Return the largest standard uncertainty of the drift over the range that the explanation leaves."""
    over = expected.over
    T = np.r_[np.linspace(over.low, over.high, POINTS), composite.reference]
    found = _of(composite, network).response(np.array(explanation.values), T)
    if found is None:
        raise InternalError("an explained device reaches zero inside the range")
    ratio = found.ohms[:-1] / found.ohms[-1]
    jacobian = (found.jacobian[:-1] - ratio[:, None] * found.jacobian[-1]) / found.ohms[-1]
    covariance = np.array(explanation.covariance).reshape(jacobian.shape[1], jacobian.shape[1])
    variance = np.einsum("ti,ij,tj->t", jacobian, covariance, jacobian)
    return float(np.sqrt(max(float(variance.max(initial=0.0)), 0.0)))
