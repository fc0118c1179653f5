"""What a trim of made parts needs, and what it reaches."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

from tcplan.brief.model import TrimMethod
from tcplan.parts.trim.drawing import Drawn
from tcplan.units import to_celsius

QUANTILE = 0.9973


@dataclass(frozen=True, slots=True, kw_only=True)
class Stat:
    """Magnitudes over the devices drawn: the median, the 99.73 % quantile and the worst."""

    median: float
    quantile: float
    worst: float

    def scaled(self, factor: float) -> dict[str, float]:
        """Return JSON data, each figure times ``factor``."""
        return {
            "median": self.median * factor,
            "quantile": self.quantile * factor,
            "worst": self.worst * factor,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Swing:
    """Signed figures over the devices drawn: the median, and the one that is largest in magnitude."""

    median: float
    worst: float

    def scaled(self, factor: float) -> dict[str, float]:
        """Return JSON data, each figure times ``factor``."""
        return {"median": self.median * factor, "worst": self.worst * factor}


@dataclass(frozen=True, slots=True, kw_only=True)
class Reached:
    """What the devices reach; all but ``chord`` are fractions.

    Parameters
    ----------
    drift : Stat
        Of the judged drift.
    value : Stat
        Of the error of the whole value at the reference.
    mix : Stat
        Of the trimmed leg that is farthest from its part of the whole.
    chord : Stat, optional
        Of what is left of the slope between the two temperatures of a trim [1/K].
    """

    drift: Stat
    value: Stat
    mix: Stat
    chord: Stat | None = None

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data, units in the names."""
        return {
            "drift_ppm": self.drift.scaled(1e6),
            "value_error_ppm": self.value.scaled(1e6),
            "mix_error_ppm": self.mix.scaled(1e6),
            "slope_left_ppm_per_K": None if self.chord is None else self.chord.scaled(1e6),
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """The bits of one leg, least first: units in series with the rest of it, each with its switch across.

    A bit that is set is in the leg; one that is cleared is bypassed, and what remains in its place is the
    unit parallel to the switch. All values are those of what is drawn, where it is drawn.

    Parameters
    ----------
    leg, material : str
    wanted_ohms : float
        That the codes restore [ohm].
    base_ohms : float
        Of the leg without its bits, nominal [ohm].
    bit_ohms : tuple of float
        Of the units, nominal [ohm].
    switch_ohms : float
        Of a switch that is on [ohm].
    step_ohms : float
        That clearing the least bit takes from the leg [ohm], nominal.
    step : float
        That it takes from the whole, as a fraction.
    half_width : float
        Of the leg, which the codes cover, as a fraction.
    gaps : (float, float, float)
        Largest gap between neighbouring values of codes in the lowest, the nominal and the highest device,
        of the whole, as fractions.
    base : Drawn, optional
        The leg without its bits as it is drawn; None where the film has no unit.
    bits : tuple of Drawn
        The units as they are drawn; empty where the film has no unit.
    """

    leg: str
    material: str
    wanted_ohms: float
    base_ohms: float
    bit_ohms: tuple[float, ...]
    switch_ohms: float
    step_ohms: float
    step: float
    half_width: float
    gaps: tuple[float, ...] = ()
    base: Drawn | None = None
    bits: tuple[Drawn, ...] = ()

    @property
    def gap(self) -> float:
        """The largest gap between codes over the devices, of the whole, as a fraction."""
        return max(self.gaps, default=self.step)

    @property
    def pieces(self) -> tuple[tuple[float, float], ...]:
        """Body and ends [ohm] of the leg without its bits, then of each bit; all body where not drawn."""
        if self.base is None:
            return tuple((ohms, 0.0) for ohms in (self.base_ohms, *self.bit_ohms))
        return tuple((one.body_ohms, one.ends_ohms) for one in (self.base, *self.bits))

    @property
    def area(self) -> float | None:
        """Of the leg with its bits, spacing and ends included [m^2]; None where it is not drawn."""
        return None if self.base is None else sum(one.area for one in (self.base, *self.bits))

    def with_gaps(self, gaps: tuple[float, ...]) -> Row:
        """Return the row with its gaps."""
        return replace(self, gaps=gaps)

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data, units in the names."""
        return {
            "leg": self.leg,
            "material": self.material,
            "wanted_ohms": self.wanted_ohms,
            "base_ohms": self.base_ohms,
            "bits_ohms": list(self.bit_ohms),
            "switch_ohms": self.switch_ohms,
            "step_ohms": self.step_ohms,
            "step_ppm_of_whole": self.step * 1e6,
            "half_width": self.half_width,
            "largest_gap_ppm_of_whole": [gap * 1e6 for gap in self.gaps],
            "base": None if self.base is None else self.base.to_dict(),
            "bits": [bit.to_dict() for bit in self.bits],
            "area_m2": self.area,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Cut:
    """Some legs as candidates of a cut, and what they reach.

    Parameters
    ----------
    legs : tuple of str
    aims : tuple of float
        What each is drawn to, over its nominal value.
    gains : tuple of (float or None)
        By how much each may have to rise; None where no gain is enough.
    feasible : bool
        Whether all gains are within what a cut may add.
    reached : Reached, optional
        None where no gain is enough.
    share, tc1, cold_chord, hot_chord : Swing, optional
        After the cut: the share of the first leg in the whole, TC1 at the reference [1/K], and the chords
        to the ends of the range [1/K].
    above, short : float
        Parts of the devices that are above target before the cut, or that it can not bring there.
    """

    legs: tuple[str, ...]
    aims: tuple[float, ...]
    gains: tuple[float | None, ...]
    feasible: bool
    reached: Reached | None = None
    share: Swing | None = None
    tc1: Swing | None = None
    cold_chord: Swing | None = None
    hot_chord: Swing | None = None
    above: float = 0.0
    short: float = 0.0

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data, units in the names."""
        return {
            "legs": list(self.legs),
            "aims": list(self.aims),
            "gains": list(self.gains),
            "feasible": self.feasible,
            "reached": None if self.reached is None else self.reached.to_dict(),
            "share": _scaled(self.share, 1.0),
            "tc1_ppm_per_K": _scaled(self.tc1, 1e6),
            "cold_chord_ppm_per_K": _scaled(self.cold_chord, 1e6),
            "hot_chord_ppm_per_K": _scaled(self.hot_chord, 1e6),
            "above_target": self.above,
            "short_of_target": self.short,
        }


def _scaled(swing: Swing | Stat | None, factor: float) -> dict[str, float] | None:
    return None if swing is None else swing.scaled(factor)


@dataclass(frozen=True, slots=True, kw_only=True)
class TrimPlan:
    """A trim of made parts, and what it does to the devices drawn.

    Parameters
    ----------
    method : str
    target_ohms : float
        Of the whole at the reference.
    draws, seed : int
        How many devices, and the seed that gives them again.
    before, after : Reached
        Without the trim, as drawn, and with it.
    perfect : Reached, optional
        With codes as fine as one likes and no switches; None of a cut.
    rows : tuple of Row
        The bits; none of a cut.
    out_of_codes : float
        The part of the devices whose bits do not reach far enough.
    temperatures : (float, float), optional
        At which a device is measured, where there are two [K].
    cuts : tuple of Cut
        All candidates, the chosen one first; none of codes.
    whole_aim, whole_gain : float, optional
        Of a cut, for the whole: 1/(1 + D) of target, and (1 + D)/(1 - D).
    ideal_switches : Stat, optional
        Judged drift of the same devices with the same codes and switches of 0 ohm; None without switches.
    label : str
        Of which resistor, where there are several.
    """

    method: TrimMethod
    target_ohms: float
    draws: int
    seed: int
    before: Reached
    after: Reached
    perfect: Reached | None = None
    rows: tuple[Row, ...] = ()
    out_of_codes: float = 0.0
    temperatures: tuple[float, float] | None = None
    cuts: tuple[Cut, ...] = ()
    whole_aim: float | None = None
    whole_gain: float | None = None
    ideal_switches: Stat | None = None
    label: str = ""

    def to_dict(self) -> dict[str, Any]:
        """Return the trim as plan.json holds it; see docs/trim.md."""
        both = self.temperatures
        return {
            "label": self.label,
            "method": self.method,
            "target_ohms": self.target_ohms,
            "draws": self.draws,
            "seed": self.seed,
            "quantile": QUANTILE,
            "before": self.before.to_dict(),
            "after": self.after.to_dict(),
            "perfect": None if self.perfect is None else self.perfect.to_dict(),
            "rows": [row.to_dict() for row in self.rows],
            "out_of_codes": self.out_of_codes,
            "temperatures_degC": None if both is None else [to_celsius(t) for t in both],
            "cuts": [cut.to_dict() for cut in self.cuts],
            "whole_aim": self.whole_aim,
            "whole_gain": self.whole_gain,
            "ideal_switches_drift_ppm": _scaled(self.ideal_switches, 1e6),
        }
