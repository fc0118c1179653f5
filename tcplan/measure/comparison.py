"""What comparing a measured composite with its plan finds, as plain frozen records.

Long, since it is a list of records, each of them short.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Literal, TypeAlias

from tcplan.arrays import FloatArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network
from tcplan.process import INDEPENDENT, Process
from tcplan.ranges import TemperatureRange

Place: TypeAlias = Literal["inside", "not clear", "outside"]
"""Where a figure lies by its limits: not clear when it is beyond them by less than its uncertainty."""

IMPLAUSIBLE = 1e-3
"""Probability under which deviations do not belong to the spread, and what is left is not noise."""

Band: TypeAlias = Callable[[FloatArray], tuple[FloatArray, FloatArray]]
"""T [K] to the lowest and the highest drift (fractions) over the spread."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Expected:
    """What a plan says of the resistor that was measured.

    Parameters
    ----------
    name : str
        Of the option, or of what is made.
    network : Network
        With its values as planned.
    materials, spreads : mapping of name to Material, Spread
        Spreads as stated; a material without one is taken as exact.
    need : Requirement
    over : TemperatureRange
    band : callable
        The worst case at each temperature.
    process : Process
    tolerance : float, optional
        Of the value at the reference, a fraction.
    quantile : float
        The part of lots that the band of likely lots holds at each temperature.
    changed : tuple of int
        For each leaf of the network which leg it belongs to: leaves of one leg change together.
    fixed : frozenset of int
        Legs that cannot change.
    level_known : bool
        Whether R at the reference says something of the materials: not when it was trimmed.
    seed : int
        Of the lots.
    """

    name: str
    network: Network
    materials: Mapping[str, Material]
    spreads: Mapping[str, Spread]
    need: Requirement
    over: TemperatureRange
    band: Band
    process: Process = INDEPENDENT
    tolerance: float | None = None
    quantile: float = 0.9973
    changed: tuple[int, ...] = ()
    fixed: frozenset[int] = frozenset()
    level_known: bool = True
    seed: int = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Point:
    """One reading beside what is predicted at its temperature; drifts are fractions.

    Parameters
    ----------
    line : int
        In the file.
    T, ohms : float
        [K], [ohm].
    drift, uncertainty : float
        R(T)/R(reference) less the wanted law, and its standard uncertainty.
    nominal, lowest, highest : float
        Predicted: of nominal materials, and over the spread.
    explained : float
        Drift of the device with the deviations that explain it best.
    beyond : float
        How far it is outside of lowest..highest, below 0 inside, in units of its uncertainty.
    """

    line: int
    T: float
    ohms: float
    drift: float
    uncertainty: float
    nominal: float
    lowest: float
    highest: float
    explained: float
    beyond: float


@dataclass(frozen=True, slots=True, kw_only=True)
class FoundDeviation:
    """How far one parameter is off by the readings: a fraction, 1/K, 1/K^2, or what a common error has.

    ``sigma`` is the standard deviation that the plan states, ``uncertainty`` what is left of it.
    """

    material: str
    slot: str
    value: float
    uncertainty: float
    sigma: float

    @property
    def sigmas(self) -> float:
        """The deviation in units of its stated standard deviation."""
        return self.value / self.sigma

    @property
    def left(self) -> float:
        """The part of the stated standard deviation that the readings leave."""
        return self.uncertainty / self.sigma


@dataclass(frozen=True, slots=True, kw_only=True)
class Check:
    """A sum of squares against its chi-square: degrees of freedom, and the probability of more."""

    squares: float
    dof: int
    probability: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Explanation:
    """The deviations that explain a device best, of least norm in units of their spread.

    Parameters
    ----------
    deviations, common : tuple of FoundDeviation
        Of the materials, and of the errors common to the sweep.
    covariance : tuple of tuple of float
        Of the deviations of the materials, after the readings.
    twins : tuple of (int, int, float)
        Pairs of deviations that the readings hardly tell apart, and their correlation.
    norm : float
        Root of the sum of squares of the independent deviations, in sigmas.
    spread : Check
        Whether deviations of this size belong to the stated spread.
    misfit : Check
        Whether what is left of the readings is noise.
    residual, largest : float
        Root mean square and largest of what is left, relative to R.
    """

    deviations: tuple[FoundDeviation, ...]
    common: tuple[FoundDeviation, ...]
    covariance: tuple[tuple[float, ...], ...]
    twins: tuple[tuple[int, int, float], ...]
    norm: float
    spread: Check
    misfit: Check
    residual: float
    largest: float

    @property
    def values(self) -> tuple[float, ...]:
        """The deviations of the materials."""
        return tuple(one.value for one in self.deviations)

    @property
    def trusted(self) -> bool:
        """Whether the deviations belong to the stated spreads, and what is left can be noise."""
        return min(self.spread.probability, self.misfit.probability) >= IMPLAUSIBLE


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasuredFigure:
    """The judged figure over the measured temperatures (a fraction), where, and its standard uncertainty."""

    figure: float
    at: float
    uncertainty: float
    place: Place | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Compared:
    """One measured device beside its plan.

    Parameters
    ----------
    device : str
        Empty where the sweep names none.
    ohms, ohms_uncertainty : float
        R at the reference [ohm], common errors included.
    by : str
        "readings" there, or "fit" of a polynomial of ``order``.
    order : int
    stated : bool
        Whether the uncertainty of the readings is stated; else their scatter sets it.
    value_place : Place, optional
        By the tolerance; None without one.
    points : tuple of Point
        In the order of temperature.
    farthest : int
        The point that is farthest outside of the band, or nearest to its edge.
    factor : float
        A point this many uncertainties beyond the band is outside: 95 % for all points together.
    place : Place
    figure : MeasuredFigure, optional
        None where no piece of the goal has a reading.
    explanation : Explanation
    curve : tuple of float
        Drift of the explained device at the temperatures of the `Curves`.
    left_out : int
        Readings outside of the range of the plan.
    """

    device: str
    ohms: float
    ohms_uncertainty: float
    by: Literal["readings", "fit"]
    order: int
    stated: bool
    value_place: Place | None
    points: tuple[Point, ...]
    farthest: int
    factor: float
    place: Place
    figure: MeasuredFigure | None
    explanation: Explanation
    curve: tuple[float, ...]
    left_out: int

    @property
    def good(self) -> bool:
        """Whether it is not outside of its band, its limit or its tolerance."""
        return "outside" not in (self.place, self.value_place, self.figure.place if self.figure else None)


@dataclass(frozen=True, slots=True, kw_only=True)
class Curves:
    """Predicted drift (fractions) over the range; the likely ones are None where a spread is not stated."""

    T: tuple[float, ...]
    nominal: tuple[float, ...]
    lowest: tuple[float, ...]
    highest: tuple[float, ...]
    likely_low: tuple[float, ...] | None = None
    likely_high: tuple[float, ...] | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Centred:
    """The judged figure of one explained device before and after, and the uncertainty of its drift after."""

    device: str
    before: float
    after: float
    uncertainty: float

    @property
    def clear(self) -> bool:
        """Whether the gain is more than what the readings leave open."""
        return self.before - self.after > self.uncertainty


@dataclass(frozen=True, slots=True, kw_only=True)
class Centring:
    """The change of leg values that makes the drift of the measured devices least.

    Parameters
    ----------
    factors : tuple of float
        Of every leaf of the network.
    ohms : tuple of float
        The new values of the leaves, as planned ones [ohm].
    value : float
        R at the reference of the mean device after [ohm].
    level : {"planned", "kept"}
        Whether that is the planned value, or what it was measured to be.
    devices : tuple of Centred
    limited : bool
        Whether a leg stopped at the largest change that is looked at, or within a tenth of it.
    left_out : tuple of str
        Devices whose explanation is not trusted: the mean is without them.
    """

    factors: tuple[float, ...]
    ohms: tuple[float, ...]
    value: float
    level: Literal["planned", "kept"]
    devices: tuple[Centred, ...]
    limited: bool
    left_out: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Skipped:
    """A device that is not compared: what there is of it, what was expected, and what to do."""

    device: str
    found: str
    expected: str
    todo: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """Measured devices beside their plan; ``why_not`` says why no change of values is worked out.

    ``skipped`` are the devices with too few readings.
    """

    name: str
    source: str
    planned: float
    tolerance: float | None
    reference: float
    devices: tuple[Compared, ...]
    curves: Curves
    centring: Centring | None
    level_known: bool
    why_not: str = ""
    unspread: tuple[str, ...] = field(default=())
    skipped: tuple[Skipped, ...] = field(default=())

    @property
    def good(self) -> bool:
        """Whether every device was compared, and none is outside of its band, limit or tolerance."""
        return not self.skipped and all(one.good for one in self.devices)
