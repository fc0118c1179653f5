"""What a fit found, as JSON data: the content of fit.json."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import asdict
from typing import Any

from tcplan.measure.fitted import FittedMaterial
from tcplan.measure.model import Fit, LackOfFit
from tcplan.measure.spread import Estimate, Scatter
from tcplan.units import to_celsius


def fit_data(one: FittedMaterial, refused: Mapping[str, int]) -> dict[str, Any]:
    """Return one material: its devices, and all of them together; SI units, in the names where not."""
    asked, found = one.request, one.found
    return {
        "source": asked.source,
        "file": asked.file.name,
        "law": found.law.parameters(),
        "reference_degC": to_celsius(asked.reference),
        "readings": len(one.sweep.T),
        "low_degC": to_celsius(found.low),
        "high_degC": to_celsius(found.high),
        "excluded_lines": list(asked.exclude),
        "refused_rows": refused.get(asked.name, 0),
        "refused": [asdict(row) for row in one.sweep.refused],
        "quadratic_probability": one.quadratic,
        "mean": {
            name: {"value": value, "standard_uncertainty": u}
            for name, value, u in zip(found.names, found.values, found.uncertainties, strict=True)
        },
        "lots_devices": list(found.counts),
        "coverage": found.coverage,
        "confidence": found.confidence,
        "scatter": {scatter.name: _scatter(scatter) for scatter in found.scatters},
        "correlation_value_tc1": None if found.correlation is None else asdict(found.correlation),
        "notes": [*one.notes, *found.notes],
        "devices": [
            {"device": name, "lot": lot, **_fit(fit)}
            for name, lot, fit in zip(one.sweep.devices, one.lots, one.fits, strict=True)
        ],
    }


def _scatter(scatter: Scatter) -> dict[str, Any]:
    return {
        "device": _estimate(scatter.device),
        "lot": _estimate(scatter.lot),
        "total": _estimate(scatter.total),
        "half_width": scatter.half_width,
        "measurement_noise": scatter.noise,
    }


def _estimate(estimate: Estimate | None) -> dict[str, Any] | None:
    return None if estimate is None else asdict(estimate)


def _fit(fit: Fit) -> dict[str, Any]:
    return {
        "parameters": dict(zip(fit.names, fit.values, strict=True)),
        "covariance": [list(row) for row in fit.covariance],
        "point_covariance": [list(row) for row in fit.point_covariance],
        "readings": fit.readings,
        "dof": fit.dof,
        "sigma": fit.sigma,
        "chi_squared": fit.chi_squared,
        "low_degC": to_celsius(fit.low),
        "high_degC": to_celsius(fit.high),
        "residuals": list(fit.residuals),
        "flags": [asdict(flag) for flag in fit.flags],
        "lack_of_fit": _lack_of_fit(fit.lack_of_fit),
        "last_term_probability": fit.last_term,
        "hysteresis": None if fit.hysteresis is None else asdict(fit.hysteresis),
    }


def _lack_of_fit(found: LackOfFit | None) -> dict[str, Any] | None:
    """Return the test as data; F is None where the repeats do not differ at all."""
    if found is None:
        return None
    return asdict(found) | {"f": found.f if math.isfinite(found.f) else None}
