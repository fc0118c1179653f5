"""Sweeps of one device for the tests of fits: all invented, all from a seed."""

from __future__ import annotations

import numpy as np

from tcplan.measure.model import Fit, Sweep

ROOM = 298.15


def sweep_of(T, R, u_R=None, u_T=None, device="D7"):
    """Return a sweep of one device; uncertainties may be one number for all readings."""
    T, R = np.asarray(T, dtype=float), np.asarray(R, dtype=float)
    zeros = np.zeros(len(T), dtype=np.intp)

    def column(u):
        return None if u is None else np.broadcast_to(np.asarray(u, dtype=float), T.shape).copy()

    return Sweep(
        source="sweep.csv",
        T=T,
        R=R,
        u_T=column(u_T),
        u_R=column(u_R),
        device=zeros,
        lot=zeros,
        devices=(device,),
        lots=("",),
        line=np.arange(2, len(T) + 2),
    )


def quadratic(T, ohms=1e4, tc1=-350e-6, tc2=0.8e-6, tc3=0.0, reference=ROOM):
    x = np.asarray(T) - reference
    return ohms * (1.0 + tc1 * x + tc2 * x**2 + tc3 * x**3)


def generator(seed):
    return np.random.Generator(np.random.Philox(seed))


def noisy(seed, count=21, noise=2.0, low=-40.0, high=125.0, **law):
    T = np.linspace(low, high, count) + 273.15
    return T, quadratic(T, **law) + generator(seed).normal(0.0, noise, count)


def covariance_of_products(fit: Fit) -> tuple[np.ndarray, np.ndarray]:
    """Return R, R tc1, R tc2, .. and their covariance: the plain coefficients in T - reference."""
    values = np.array(fit.values)
    jacobian = np.eye(len(values)) * fit.ohms
    jacobian[:, 0] = [1.0, *values[1:]]
    return values * np.array([1.0, *[fit.ohms] * (len(values) - 1)]), jacobian @ fit.covariance @ jacobian.T
