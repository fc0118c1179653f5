"""Fits of invented devices, as the fitting of sweeps gives them, for tests of what follows it."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tcplan.material.law import Law, Polynomial
from tcplan.measure.model import Fit

REFERENCE = 298.15


def fit_of(
    ohms: float,
    tcs: Sequence[float],
    *,
    noise: np.ndarray | None = None,
    common: np.ndarray | None = None,
    reference: float = REFERENCE,
    low: float = 233.15,
    high: float = 398.15,
    stated: bool = True,
) -> Fit:
    """Return a polynomial fit; ``noise`` and ``common`` are covariances of R [ohm] and the TCs."""
    law = Polynomial(reference=reference, coefficients=tuple(tcs))
    names = ("R", *(f"tc{n}" for n in range(1, len(tcs) + 1)))
    return law_fit(law, ohms, names, tcs, noise=noise, common=common, low=low, high=high, stated=stated)


def law_fit(
    law: Law,
    ohms: float,
    names: Sequence[str],
    values: Sequence[float],
    *,
    noise: np.ndarray | None = None,
    common: np.ndarray | None = None,
    low: float = 233.15,
    high: float = 398.15,
    stated: bool = True,
) -> Fit:
    """Return a fit of any law; ``stated`` is whether u(R) was."""
    zero = np.zeros((len(names), len(names)))
    points = zero if noise is None else noise
    return Fit(
        law=law,
        ohms=ohms,
        names=tuple(names),
        values=(ohms, *values),
        covariance=matrix(points + (zero if common is None else common)),
        point_covariance=matrix(points),
        readings=20,
        dof=20 - len(names),
        sigma=1e-5,
        chi_squared=20.0 - len(names) if stated else None,
        residuals=(0.0,) * 20,
        low=low,
        high=high,
    )


def matrix(values: np.ndarray) -> tuple[tuple[float, ...], ...]:
    return tuple(tuple(float(value) for value in row) for row in values)


def lots_of(
    seed: int,
    counts: Sequence[int],
    lot: Sequence[float],
    device: Sequence[float],
    noise: Sequence[float] = (0.0, 0.0, 0.0),
    correlation: float = 0.0,
    middle: Sequence[float] = (1000.0, -120e-6, 0.55e-6),
) -> tuple[list[Fit], list[str], list[str]]:
    """Return fits, lots and devices: normal, with standard deviations of ln R, TC1 and TC2.

    The correlation is that of R with TC1, of lots and of devices alike.
    """
    rng = np.random.Generator(np.random.Philox(seed))
    shape = np.eye(3)
    shape[0, 1] = shape[1, 0] = correlation
    fits, lots, devices = [], [], []
    covariance = np.diag(np.array([noise[0] * middle[0], noise[1], noise[2]]) ** 2)
    for k, count in enumerate(counts):
        of_lot = rng.multivariate_normal(np.zeros(3), shape) * lot
        for n in range(count):
            off = of_lot + rng.multivariate_normal(np.zeros(3), shape) * device + rng.normal(0, 1, 3) * noise
            fits.append(
                fit_of(middle[0] * (1 + off[0]), (middle[1] + off[1], middle[2] + off[2]), noise=covariance)
            )
            lots.append(f"lot {k}")
            devices.append(f"d{n}")
    return fits, lots, devices
