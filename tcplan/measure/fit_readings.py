"""The readings of one device, checked before they are fitted."""

from __future__ import annotations

import numpy as np

from tcplan.arrays import BoolArray, FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.law_base import to_degC
from tcplan.measure.fit_solve import Readings
from tcplan.measure.model import Sweep

FARTHEST = 0.5
"""How far the reference may lie outside of the readings, as a share of their span."""

_SHOWN = 5


def device_place(sweep: Sweep) -> str:
    """Return what messages call the device of a sweep: the file, and its name where it is one with a name."""
    one = len(sweep.device) > 0 and bool(np.all(sweep.device == sweep.device[0]))
    name = sweep.devices[int(sweep.device[0])] if one else ""
    return f"{sweep.source}: device {name}" if name else sweep.source


def excluded(sweep: Sweep, lines: tuple[int, ...]) -> Sweep:
    """Return a sweep without the readings on these lines of its file.

    Raises
    ------
    InputError
        When a line holds no reading: a wrong number must not pass for an exclusion.
    """
    strange = sorted(set(lines) - set(sweep.line.tolist()))
    if strange:
        raise InputError(
            Problem(
                where=sweep.source,
                found=f"line {_listed(strange)} to exclude, without a reading",
                expected="lines of readings, counted from 1 with the header",
            )
        )
    return sweep.taken(np.flatnonzero(~np.isin(sweep.line, np.array(lines, dtype=np.intp))))


def checked_readings(sweep: Sweep) -> Readings:
    """Return the readings of a sweep of one device.

    Raises
    ------
    InputError
        When there are none, they are of several devices, a value is no resistance, temperature or
        uncertainty, or an uncertainty of T stands without one of R.
    """
    problems = list(_whole_problems(sweep))
    if not problems:
        problems = _value_problems(sweep)
    if problems:
        raise InputError(problems)
    return Readings(T=sweep.T, R=sweep.R, u_R=sweep.u_R, u_T=sweep.u_T)


def check_temperatures(T: FloatArray, reference: float, needed: int, distinct: int) -> None:
    """Raise when there are too few temperatures, or the reference is far from all of them.

    The reference may lie outside of the readings by at most half their span: farther out, the fitted R there
    says more about the model than about the device.
    """
    low, high = float(T.min()), float(T.max())
    if distinct < max(needed, 2):
        raise InputError(_too_few(distinct, max(needed, 2), low))
    if max(low - reference, reference - high) > FARTHEST * (high - low):
        span = f"{to_degC(low):g} to {to_degC(high):g} degC"
        raise InputError(
            Problem(
                where="reference",
                found=f"{to_degC(reference):g} degC, and readings from {span}",
                expected="a reference among the readings, or outside by at most half their span",
                todo="Fit at a reference near the readings, and refer the fit to this one.",
            )
        )


def outside(low: float, high: float, reference: float) -> float:
    """Return how far a reference lies outside of the readings, as a share of their span; 0 inside."""
    return max(low - reference, reference - high, 0.0) / (high - low)


def _too_few(distinct: int, needed: int, low: float) -> Problem:
    if distinct == 1:
        found = f"all readings at one temperature, {to_degC(low):g} degC"
    else:
        found = f"readings at {distinct} distinct temperatures"
    return Problem(
        where="temperatures",
        found=found,
        expected=f"at least {needed} distinct temperatures, as many as coefficients",
        todo="Measure at more temperatures, or fit a law with fewer coefficients.",
    )


def _whole_problems(sweep: Sweep) -> list[Problem]:
    if not len(sweep.T):
        return [Problem(where="", found="no reading", expected="the readings of a device")]
    devices = np.unique(sweep.device)
    if len(devices) > 1:
        names = ", ".join(sweep.devices[k] for k in devices[:_SHOWN])
        found = f"readings of {len(devices)} devices ({names}{', ..' if len(devices) > _SHOWN else ''})"
        return [Problem(where="", found=found, expected="readings of one device for one fit")]
    if sweep.u_T is not None and sweep.u_R is None:
        return [
            Problem(
                where="u(T)",
                found="an uncertainty of the temperatures alone",
                expected="u(R) beside it: where a law is flat, u(T) says nothing of R",
                todo="Add u(R), or take u(T) out: then the scatter of the readings is used.",
            )
        ]
    return []


def _value_problems(sweep: Sweep) -> list[Problem]:
    columns = (
        ("T", sweep.T, "temperatures above absolute zero", sweep.T > 0.0),
        ("R", sweep.R, "resistances above zero", sweep.R > 0.0),
        ("u(T)", sweep.u_T, "uncertainties, 0 or more", None if sweep.u_T is None else sweep.u_T >= 0.0),
        ("u(R)", sweep.u_R, "uncertainties above zero", None if sweep.u_R is None else sweep.u_R > 0.0),
    )
    problems = []
    for name, values, expected, good in columns:
        if values is not None and good is not None:
            problems += _bad_lines(sweep, name, expected, ~(good & np.isfinite(values)))
    return problems


def _bad_lines(sweep: Sweep, name: str, expected: str, bad: BoolArray) -> list[Problem]:
    if not np.any(bad):
        return []
    found = f"no such value on line {_listed(sweep.line[bad].tolist())}"
    return [Problem(where=name, found=found, expected=f"finite {expected}")]


def _listed(lines: list[int]) -> str:
    more = f" and {len(lines) - _SHOWN} more" if len(lines) > _SHOWN else ""
    return ", ".join(str(line) for line in lines[:_SHOWN]) + more
