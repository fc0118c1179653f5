"""What is known of several devices and lots: standard deviations, limits, correlation, in plain records."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from tcplan.errors import InputError, Problem
from tcplan.material.law import Law
from tcplan.material.spread import SIGMAS_PER_LIMIT, Meaning, Spread

Component = Literal["value", "tc1", "tc2"]
COMPONENTS: tuple[Component, ...] = ("value", "tc1", "tc2")


@dataclass(frozen=True, slots=True, kw_only=True)
class Estimate:
    """A standard deviation, its two-sided interval, and its effective degrees of freedom.

    ``floored`` is whether the estimate of the variance was not above zero, and is given as 0.
    """

    sigma: float
    low: float
    high: float
    dof: float
    floored: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Scatter:
    """What is known of one component: its mean, and how far devices and lots are from it.

    Parameters
    ----------
    name : {"value", "tc1", "tc2"}
        R relative to its mean, TC1 [1/K] or TC2 [1/K^2], about the reference.
    mean : float
        1 for the value.
    uncertainty : float
        Standard uncertainty of the mean, common errors included.
    noise : float
        Standard uncertainty of one device by point noise alone, root mean square over the devices.
    device, lot, total : Estimate, optional
        From device to device in a lot, from lot to lot, and of any device of any lot seen; None where the
        data cannot tell.
    half_width : float, optional
        Of the tolerance interval about the mean; None of one device.
    """

    name: Component
    mean: float
    uncertainty: float
    noise: float
    device: Estimate | None
    lot: Estimate | None
    total: Estimate | None
    half_width: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ValueCorrelation:
    """Correlation of the value with TC1 over devices and lots, with its interval.

    ``dof`` are the effective degrees of freedom it rests on.
    """

    value: float
    low: float
    high: float
    dof: float

    @property
    def is_shown(self) -> bool:
        """Whether the data show it: the interval excludes 0."""
        return self.low > 0.0 or self.high < 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Population:
    """Devices of one material: the mean law and its scatter.

    Parameters
    ----------
    law : Law
        Of the mean parameters.
    names, values, uncertainties : tuple
        Of the parameters, R [ohm] first: the mean of the lot means, and its standard uncertainty.
    scatters : tuple of Scatter
        Of the value, TC1 and TC2, as far as the law has them.
    correlation : ValueCorrelation, optional
        None where the data cannot tell.
    counts : tuple of int
        Devices of each lot.
    low, high : float
        Temperatures between which every device has readings [K].
    coverage, confidence : float
        Of the tolerance intervals; the confidence is that of all intervals.
    notes : tuple of str
        What the data do not tell, in sentences.
    """

    law: Law
    names: tuple[str, ...]
    values: tuple[float, ...]
    uncertainties: tuple[float, ...]
    scatters: tuple[Scatter, ...]
    correlation: ValueCorrelation | None
    counts: tuple[int, ...]
    low: float
    high: float
    coverage: float
    confidence: float
    notes: tuple[str, ...]

    @property
    def ohms(self) -> float:
        """Mean R at the reference [ohm]."""
        return self.values[0]

    @property
    def devices(self) -> int:
        """How many devices."""
        return sum(self.counts)

    @property
    def lots(self) -> int:
        """How many lots."""
        return len(self.counts)

    def scatter(self, name: Component) -> Scatter | None:
        """Return what is known of a component; None when the law has none."""
        return next((one for one in self.scatters if one.name == name), None)

    def lot_spread(self, name: Component) -> Estimate:
        """Return the standard deviation from lot to lot.

        Raises
        ------
        InputError
            When the data cannot tell it: one lot, or one device of each lot.
        """
        one = self.scatter(name)
        if one is not None and one.lot is not None:
            return one.lot
        todo = "Measure devices of a second lot."
        if one is None:
            found, expected, todo = f"a law without {name}", "a law with it", ""
        elif self.lots == 1:
            found, expected = "devices of one lot", "devices of two or more lots, to see how lots differ"
        else:
            found, expected = (
                "one device of each lot",
                "two devices or more of a lot, to tell lots from devices",
            )
            todo = "Measure a second device of a lot."
        raise InputError(Problem(where="lot", found=found, expected=expected, todo=todo))

    def device_spread(self, name: Component) -> Estimate:
        """Return the standard deviation from device to device in a lot.

        Raises
        ------
        InputError
            When the data cannot tell it: no lot has two devices.
        """
        one = self.scatter(name)
        if one is not None and one.device is not None:
            return one.device
        if one is None:
            problem = Problem(where="device", found=f"a law without {name}", expected="a law with it")
        else:
            problem = Problem(
                where="device",
                found="one device" if self.devices == 1 else "one device of each lot",
                expected="two devices or more of a lot, to see how devices differ",
                todo="Measure a second device of a lot.",
            )
        raise InputError(problem)

    def spread(self, meaning: Meaning = "limits") -> Spread | None:
        """Return the spread of any device for a materials file; None of one device.

        Parameters
        ----------
        meaning : {"limits", "sigma"}
            Limits are the tolerance intervals; a sigma is the estimate itself, without a margin for few
            devices, and counts three times as a limit.

        Raises
        ------
        InputError
            When so few devices leave the value open to 100 % and more.
        """
        if self.devices < 2:
            return None
        halves = {
            one.name: one.half_width if meaning == "limits" else one.total.sigma
            for one in self.scatters
            if one.half_width is not None and one.total is not None
        }
        reach = (halves.get("value") or 0.0) * (1.0 if meaning == "limits" else SIGMAS_PER_LIMIT)
        if reach >= 1.0:
            raise InputError(_too_few(self, reach))
        return Spread(
            meaning=meaning, value=halves.get("value"), tc1=halves.get("tc1"), tc2=halves.get("tc2")
        )


def _too_few(found: Population, reach: float) -> Problem:
    return Problem(
        where="spread.value",
        found=f"a limit of {100 * reach:.3g} % from {found.devices} devices of {found.lots} lots",
        expected="a limit below 100 %",
        todo="Measure more devices or lots: so few leave the value open. Or accept less confidence.",
    )
