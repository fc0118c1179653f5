"""Whether a law stays finite and above zero over a range."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.law_base import Law, to_degC
from tcplan.material.polynomial import Polynomial

_NODES = 1025
_ZOOM_NODES = 33
_ZOOMS = 4
_HALVINGS = 60


def check_positive(law: Law, low: float, high: float, where: str) -> None:
    """Raise when a law is not finite and above zero over the whole of a range.

    Polynomials are checked at all their extremes; other laws on 1025 nodes, at their breakpoints, and closely
    around the lowest of these.

    Parameters
    ----------
    law : Law
        Any law.
    low, high : float
        The range [K], low < high.
    where : str
        The place of the law, for the message.

    Raises
    ------
    InputError
        Naming the temperature, nearest to the reference, at which the law stops being finite and above zero.
    """
    nodes = _polynomial_nodes(law, low, high) if isinstance(law, Polynomial) else _nodes(law, low, high)
    bad = nodes[np.logical_not(_good(law, nodes))]
    if not bad.size:
        return
    limit, worst = _limit(law, bad[np.argmin(np.abs(bad - law.reference))])
    what = "zero" if np.isfinite(worst) else "a value that is not finite"
    raise InputError(
        Problem(
            where=where,
            found=f"a law that reaches {what} at {to_degC(limit):.5g} degC",
            expected=f"R(T) finite and above zero from {to_degC(low):g} to {to_degC(high):g} degC",
            todo="Check the signs and units of its coefficients, or narrow the range.",
        )
    )


def _good(law: Law, temperature: FloatArray) -> npt.NDArray[np.bool_]:
    ratio = law.ratio(temperature)
    return np.asarray(np.isfinite(ratio) & (ratio > 0.0))


def _polynomial_nodes(law: Polynomial, low: float, high: float) -> FloatArray:
    """Return the ends and every temperature inside at which the derivative vanishes."""
    span = high - low
    derivative = np.array([n * c * span ** (n - 1) for n, c in enumerate(law.coefficients, start=1)])
    largest = np.max(np.abs(derivative))
    if not np.isfinite(largest):
        return _nodes(law, low, high)
    # a term below the last digit of the others only sends roots out of the range of floats
    derivative[np.abs(derivative) < 1e-20 * largest] = 0.0
    # the real part also of complex roots: a double root is found as a close pair, and more nodes do no harm
    inside = law.reference + span * np.roots(derivative[::-1]).real
    return np.array([low, high, *inside[(inside > low) & (inside < high)]])


def _nodes(law: Law, low: float, high: float) -> FloatArray:
    """Return a grid, the breakpoints, and closer and closer nodes around the lowest."""
    inside = [t for t in (*law.breakpoints, law.reference) if low < t < high]
    nodes = np.unique([*np.linspace(low, high, _NODES), *inside])
    step = (high - low) / (_NODES - 1)
    for _ in range(_ZOOMS):
        ratio = law.ratio(nodes)
        lowest = nodes[np.argmin(np.where(np.isfinite(ratio), ratio, -np.inf))]
        around = np.linspace(max(low, lowest - step), min(high, lowest + step), _ZOOM_NODES)
        nodes = np.unique([*nodes, *around])
        step *= 2.0 / (_ZOOM_NODES - 1)
    return nodes


def _limit(law: Law, bad: float) -> tuple[float, float]:
    """Return where the law stops being good on the way from the reference to ``bad``, and its value there."""
    good = law.reference
    for _ in range(_HALVINGS):
        middle = 0.5 * (good + bad)
        if _good(law, np.asarray(middle)):
            good = middle
        else:
            bad = middle
    return bad, float(law.ratio(bad))
