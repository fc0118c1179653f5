"""Errors common to a whole sweep: how each moves all readings together."""

from __future__ import annotations

import math
from dataclasses import fields

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.measure.model import CommonErrors


def common_changes(
    common: CommonErrors, T: FloatArray, ohms: FloatArray, slope: FloatArray, reference: float
) -> FloatArray:
    """Return how one standard uncertainty of each common error moves the readings.

    They are parameters of the sweep with best values of 0: nothing is corrected, and their covariance is
    added to that of the fit as J C J^T.

    Parameters
    ----------
    common : CommonErrors
        Standard uncertainties.
    T, ohms, slope : array, shape (reading,)
        Temperatures [K], the fitted R [ohm] and dR/dT [ohm/K].
    reference : float
        Where the scale of the chamber and the lead have their zero [K].

    Returns
    -------
    array, shape (reading, 4)
        Changes [ohm]: chamber offset, chamber scale, lead, meter scale.

    References
    ----------
    JCGM 100 (GUM), 5.2 and F.1.2.3, on inputs that share an error; JCGM 102.
    """
    x = T - reference
    return np.column_stack(
        [
            common.chamber_offset * slope,
            common.chamber_scale * slope * x,
            common.lead * (1.0 + common.lead_tc1 * x),
            common.meter_scale * ohms,
        ]
    )


def check_common(common: CommonErrors) -> None:
    """Raise when a common error is not a finite number, or an uncertainty is below zero."""
    problems = []
    for field in fields(common):
        value = getattr(common, field.name)
        signed = field.name == "lead_tc1"
        if not math.isfinite(value) or (value < 0.0 and not signed):
            expected = "a finite number" if signed else "a standard uncertainty, 0 or more"
            problems.append(
                Problem(where=f"common errors: {field.name}", found=f"{value:g}", expected=expected)
            )
    if problems:
        raise InputError(problems)
