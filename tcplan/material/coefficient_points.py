"""Coefficients from R at a few temperatures: the quadratic through three points, or nearest to more."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.coefficient_forms import Quadratic, Uncertain
from tcplan.units import format_celsius

MOST_POINTS = 10_000


@dataclass(frozen=True, slots=True, kw_only=True)
class PointFit:
    """The quadratic through three points, or nearest to more.

    Parameters
    ----------
    quadratic : Quadratic
        About the reference, covariance included where it is known.
    ohms : Uncertain
        R at the reference [ohm].
    residuals : tuple of float
        R of each point over the quadratic, less 1.
    dof : int
        Points more than three.
    sigma : float, optional
        Standard deviation of the points about the quadratic [ohm]; None without a point to spare.
    """

    quadratic: Quadratic
    ohms: Uncertain
    residuals: tuple[float, ...]
    dof: int
    sigma: float | None


def from_points(
    T: Sequence[float], R: Sequence[float], reference: float, u_R: Sequence[float] | None = None
) -> PointFit:
    """Return the quadratic through three points, or of least squares for more.

    R = c0 + c1 x + c2 x^2 with x = T - reference, tc1 = c1/c0, tc2 = c2/c0. With uncertainties each point
    weighs 1/u^2, and the covariance follows from them; without, all points weigh the same, and the
    covariance follows from the residuals (none for three points).

    Parameters
    ----------
    T, R : sequence of float, shape (point,)
        Temperatures [K] and resistances [ohm].
    reference : float
        Where the coefficients are wanted [K].
    u_R : sequence of float, optional
        Standard uncertainty of each resistance [ohm], above zero, independent of each other.

    Raises
    ------
    InputError
        When there are fewer than three different temperatures, a resistance is not above zero, or the
        quadratic is not above zero at the reference.

    References
    ----------
    JCGM 100:2008 (GUM), section 5: propagation of uncertainty.
    """
    _check_points(T, R, u_R)
    at, ohms = np.asarray(T, dtype=np.float64), np.asarray(R, dtype=np.float64)
    u: FloatArray = np.ones_like(ohms) if u_R is None else np.asarray(u_R, dtype=np.float64)
    middle, scale = float(np.mean(at)), float(np.ptp(at))
    z = (at - middle) / scale
    columns = np.stack([np.ones_like(z), z, z * z], axis=1)
    q, r = np.linalg.qr(columns / u[:, None])
    inverse = np.linalg.inv(r)
    solved = inverse @ (q.T @ (ohms / u))
    fitted = columns @ solved
    dof = len(at) - 3
    sigma = math.sqrt(float(np.sum((ohms - fitted) ** 2)) / dof) if dof else None
    known = inverse @ inverse.T
    covariance = known if u_R is not None else None if sigma is None else known * sigma**2
    shift = _to_reference((reference - middle) / scale, scale)
    form, value = _relative(
        shift @ solved, None if covariance is None else shift @ covariance @ shift.T, reference
    )
    residuals = tuple((ohms / fitted - 1.0).tolist())
    return PointFit(quadratic=form, ohms=value, residuals=residuals, dof=dof, sigma=sigma)


def _to_reference(z: float, scale: float) -> FloatArray:
    """Return the matrix from coefficients in (T - middle)/scale to those in T - reference."""
    return np.array(
        [[1.0, z, z * z], [0.0, 1.0 / scale, 2.0 * z / scale], [0.0, 0.0, 1.0 / scale**2]], dtype=np.float64
    )


def _relative(
    absolute: FloatArray, covariance: FloatArray | None, reference: float
) -> tuple[Quadratic, Uncertain]:
    """Return the coefficients relative to R(reference), and R(reference)."""
    c0, c1, c2 = (float(c) for c in absolute)
    if not c0 > 0.0:
        where, found = "table", f"a quadratic that is {c0:.4g} ohm at {format_celsius(reference)}"
        raise InputError(Problem(where=where, found=found, expected="a resistance above zero there"))
    tc1, tc2 = c1 / c0, c2 / c0
    if covariance is None:
        return Quadratic(reference=reference, tc1=tc1, tc2=tc2), Uncertain(value=c0)
    jacobian = np.array([[-tc1, 1.0, 0.0], [-tc2, 0.0, 1.0]]) / c0
    (a, b), (_, d) = (jacobian @ covariance @ jacobian.T).tolist()
    form = Quadratic(reference=reference, tc1=tc1, tc2=tc2, covariance=((a, b), (b, d)))
    return form, Uncertain(value=c0, uncertainty=math.sqrt(max(float(covariance[0, 0]), 0.0)))


def _check_points(T: Sequence[float], R: Sequence[float], u_R: Sequence[float] | None) -> None:
    problems = []
    if len(set(T)) < 3:
        found, need = f"{len(set(T))} different temperatures", "three or more"
        problems.append(Problem(where="table", found=found, expected=need))
    if len(T) > MOST_POINTS:
        found, need = f"{len(T)} points", f"{MOST_POINTS} at most"
        problems.append(Problem(where="table", found=found, expected=need, todo="tcplan fit takes more."))
    for n, (t, r) in enumerate(zip(T, R, strict=True), 1):
        if not r > 0.0:
            found = f"{r:g} ohm at {format_celsius(t)}"
            problems.append(Problem(where=f"point {n}", found=found, expected="a resistance above zero"))
    for n, u in enumerate(() if u_R is None else u_R, 1):
        if not u > 0.0:
            found, need = f"an uncertainty of {u:g} ohm", "an uncertainty above zero, or none at any point"
            problems.append(Problem(where=f"point {n}", found=found, expected=need))
    if problems:
        raise InputError(problems)
