"""What a sweep holds and what a fit finds, as plain frozen records in SI units."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.material.law import Law

Direction: TypeAlias = Literal["up", "down"]


@dataclass(frozen=True, slots=True, kw_only=True)
class RefusedRow:
    """One row of a file that is no reading: its line, what was found, and what was expected."""

    line: int
    found: str
    expected: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Sweep:
    """Readings of resistance over temperature, of one or several devices and lots, in the order of the file.

    Parameters
    ----------
    source : str
        What messages call it: a path, or "standard input".
    T, R : array, shape (reading,)
        Temperature [K] and resistance [ohm].
    u_T, u_R : array, shape (reading,), or None
        Standard uncertainty of each reading [K], [ohm]; None where the file states none.
    device, lot : array of int, shape (reading,)
        Position in ``devices`` and in ``lots``.
    devices, lots : tuple of str
        Names in order of appearance; one empty name where the file has no such column. The same device
        name in two lots is two devices, called "lot/device".
    line : array of int, shape (reading,)
        Where each reading stands in its file, from 1.
    refused : tuple of RefusedRow
        Rows that are no readings.
    """

    source: str
    T: FloatArray
    R: FloatArray
    u_T: FloatArray | None = None
    u_R: FloatArray | None = None
    device: IntArray
    lot: IntArray
    devices: tuple[str, ...]
    lots: tuple[str, ...]
    line: IntArray
    refused: tuple[RefusedRow, ...] = ()

    def taken(self, rows: IntArray) -> Sweep:
        """Return the readings at these positions, names and refused rows as they are."""
        return Sweep(
            source=self.source,
            T=self.T[rows],
            R=self.R[rows],
            u_T=None if self.u_T is None else self.u_T[rows],
            u_R=None if self.u_R is None else self.u_R[rows],
            device=self.device[rows],
            lot=self.lot[rows],
            devices=self.devices,
            lots=self.lots,
            line=self.line[rows],
            refused=self.refused,
        )

    def of_device(self, position: int) -> Sweep:
        """Return the readings of one device, in the order of the file."""
        return self.taken(np.flatnonzero(self.device == position))


@dataclass(frozen=True, slots=True, kw_only=True)
class CommonErrors:
    """Standard uncertainties of what is common to a whole sweep; 0 where nothing is stated.

    Parameters
    ----------
    chamber_offset : float
        Of all temperatures together [K].
    chamber_scale : float
        Of temperature differences from the reference, a fraction.
    lead : float
        Of a resistance in series with every reading [ohm].
    lead_tc1 : float
        First temperature coefficient of that resistance [1/K]; it is known, not an uncertainty.
    meter_scale : float
        Of the gain of the meter, a fraction.
    """

    chamber_offset: float = 0.0
    chamber_scale: float = 0.0
    lead: float = 0.0
    lead_tc1: float = 0.0
    meter_scale: float = 0.0


COMMON_ERROR_UNITS = {
    "chamber_offset": "delta_K",
    "chamber_scale": "1",
    "lead": "ohm",
    "lead_tc1": "1/K",
    "meter_scale": "1",
}
"""What each of `CommonErrors` is read in; 0.15 degC of an offset is 0.15 K."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Flag:
    """A reading that stands out: its line, its studentised residual and its leverage."""

    line: int
    studentised: float
    leverage: float
    outlier: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class LackOfFit:
    """Whether repeats say that the law does not fit: F, its degrees of freedom, the probability of more."""

    f: float
    lack_dof: int
    pure_dof: int
    probability: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Hysteresis:
    """How far the way down lies above the way up, relative to R: mean, standard uncertainty, the most.

    ``significant`` is whether the mean differs from 0 at 5 % over all devices together.
    """

    mean: float
    uncertainty: float
    most: float
    at: float
    significant: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Fit:
    """A law fitted to the readings of one device, with all that is known of its parameters.

    Parameters
    ----------
    law : Law
        R(T)/R(reference).
    ohms : float
        R at the reference [ohm].
    names : tuple of str
        Of the parameters, the first of them "R": then tc1, tc2, tc3, or those of the law.
    values : tuple of float
        SI units.
    covariance : tuple of tuple of float
        Of all parameters, common errors included.
    point_covariance : tuple of tuple of float
        The same without the common errors.
    readings, dof : int
        How many there are, and how many more than parameters.
    sigma : float
        Standard deviation of a reading about the law, relative to R: as stated, or as found where no
        uncertainty is stated.
    chi_squared : float, optional
        Sum of squared weighted residuals, where uncertainties are stated.
    residuals : tuple of float
        (R - fit)/fit of every reading, in the order of the sweep.
    low, high : float
        Temperatures between which there are readings [K].
    flags : tuple of Flag
        Outliers and readings of high leverage, by line.
    lack_of_fit : LackOfFit, optional
        None without repeats.
    last_term : float, optional
        Probability of a last coefficient at least as large if it were 0; None for laws without one.
    hysteresis : Hysteresis, optional
        None without both ways.
    """

    law: Law
    ohms: float
    names: tuple[str, ...]
    values: tuple[float, ...]
    covariance: tuple[tuple[float, ...], ...]
    point_covariance: tuple[tuple[float, ...], ...]
    readings: int
    dof: int
    sigma: float
    chi_squared: float | None
    residuals: tuple[float, ...]
    low: float
    high: float
    flags: tuple[Flag, ...] = ()
    lack_of_fit: LackOfFit | None = None
    last_term: float | None = None
    hysteresis: Hysteresis | None = None

    @property
    def reference(self) -> float:
        """Where the law is 1 [K]."""
        return self.law.reference

    def uncertainty(self, name: str) -> float:
        """Return the standard uncertainty of a parameter, common errors included."""
        k = self.names.index(name)
        return float(np.sqrt(self.covariance[k][k]))

    def value(self, name: str) -> float:
        """Return a parameter."""
        return self.values[self.names.index(name)]
