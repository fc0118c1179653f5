"""The checked request, as plain frozen values."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any, Literal, TypeAlias

from tcplan.goal import Goal, Limit
from tcplan.material.model import Material
from tcplan.network import Leg, Network, network_text
from tcplan.process import Process
from tcplan.ranges import TemperatureRange
from tcplan.units import to_celsius

Searched: TypeAlias = Literal["single", "series", "parallel", "mixed"]
SEARCHED: tuple[Searched, ...] = ("single", "series", "parallel", "mixed")
Place: TypeAlias = Literal["series", "parallel"]
Sides: TypeAlias = Literal["both", "up", "down"]
Nature: TypeAlias = Literal["systematic", "random"]
RatioKind: TypeAlias = Literal["divider", "gain"]
TrimMethod: TypeAlias = Literal["one-temperature", "two-temperatures", "cut"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Target:
    """The wanted total [ohm]: a number, at most a number, or free (both None).

    ``also`` are further values of the same mix: the plan is for ``ohms``, its parts are for all of them.

    How well it is met at the reference, as fractions: ``tolerance`` is that of the value as bought or
    made; ``trim_step`` one step of a trim, of which half remains. At most one of the two.
    """

    ohms: float | None = None
    at_most: float | None = None
    tolerance: float | None = None
    trim_step: float | None = None
    also: tuple[float, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Fixed:
    """A member that is given, not chosen."""

    leg: Leg
    place: Place = "series"


@dataclass(frozen=True, slots=True, kw_only=True)
class SearchRules:
    """What the search may use. ``max_materials`` and ``max_legs`` count chosen ones only.

    Sizes: squares of a film leg, length [m] of a wire leg, values [ohm] of a stock part, and the area
    [m^2] of all film legs together.
    """

    arrangements: tuple[Searched, ...] = SEARCHED
    use: tuple[str, ...] = ()
    max_materials: int = 2
    max_legs: int = 3
    min_share: float = 0.0
    min_squares: float = 5.0
    max_squares: float = 3000.0
    min_length: float = 0.0
    stock_values: tuple[float, float] = (1.0, 10e6)
    max_area: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Allowance:
    """What else moves the value and is not computed: ageing, package stress, humidity.

    ``size`` is a fraction, or with ``per_kelvin`` [1/K] times the distance from the reference. A random
    one is stated at 3 sigma.
    """

    name: str
    size: float
    per_kelvin: bool = False
    sides: Sides = "both"
    kind: Nature
    source: str

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data, units in the names."""
        return {
            "name": self.name,
            "size_ppm_per_K" if self.per_kelvin else "size_ppm": self.size * 1e6,
            "sides": self.sides,
            "kind": self.kind,
            "source": self.source,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Operating:
    """What the resistor works at: a voltage [V] or a current [A], one of the two, and what heats it.

    ``thermal_resistance`` [K/W] is common to the whole resistor; ``leg_thermal_resistance`` holds those of
    each leg of a material, by its name, and the others do not heat. At most one of the two; with neither
    nothing heats.
    """

    voltage: float | None = None
    current: float | None = None
    thermal_resistance: float | None = None
    leg_thermal_resistance: tuple[tuple[str, float], ...] = ()

    @property
    def heats(self) -> bool:
        """Whether a thermal resistance is stated."""
        return self.thermal_resistance is not None or bool(self.leg_thermal_resistance)

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data, units in the names."""
        return {
            "voltage_V": self.voltage,
            "current_A": self.current,
            "thermal_resistance_K_per_W": self.thermal_resistance,
            "leg_thermal_resistance_K_per_W": [
                {"material": name, "K_per_W": size} for name, size in self.leg_thermal_resistance
            ],
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Ratio:
    """Two resistors whose ratio counts: second/(first + second) of a divider, first/second of a gain.

    ``tracking`` [1/K] is by how much the TC1 of two resistors of one material may differ; None when it is
    not stated, and then counted as 0.
    """

    kind: RatioKind
    first: Network
    second: Network
    tracking: float | None = None

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data, units in the names."""
        return {
            "kind": self.kind,
            "first": network_text(self.first),
            "second": network_text(self.second),
            "tracking_ppm_per_K": None if self.tracking is None else self.tracking * 1e6,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Trim:
    """How the value is set after the part is made.

    ``step`` is the largest step of the whole value, ``largest_cut`` how much of the value of a leg a cut
    may add; both fractions. ``switch_resistance`` [ohm] and ``switch_tc1`` [1/K] are those of the switch
    of one bit when it is on. ``temperatures`` [K] are those of two measurements, lower one first.
    """

    method: TrimMethod
    step: float = 1e-3
    switch_resistance: float = 0.0
    switch_tc1: float = 0.0
    temperatures: tuple[float, float] | None = None
    largest_cut: float = 0.5

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data, units in the names."""
        both = self.temperatures
        return {
            "method": self.method,
            "step_ppm": self.step * 1e6,
            "switch_ohms": self.switch_resistance,
            "switch_tc1_ppm_per_K": self.switch_tc1 * 1e6,
            "temperatures_degC": None if both is None else [to_celsius(t) for t in both],
            "largest_cut": self.largest_cut,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Brief:
    """A checked request. ``materials`` are those in use, sorted by name."""

    title: str
    sha256: str
    materials: tuple[Material, ...]
    target: Target
    over: TemperatureRange
    goal: Goal
    rules: SearchRules
    fixed: tuple[Fixed, ...] = ()
    given: Network | None = None
    process: Process = field(default_factory=Process)
    allowances: tuple[Allowance, ...] = ()
    ratio: Ratio | None = None
    trim: Trim | None = None
    operating: Operating | None = None

    @property
    def by_name(self) -> dict[str, Material]:
        """The materials by name."""
        return {material.name: material for material in self.materials}

    def to_dict(self) -> dict[str, Any]:
        """Return the brief as plan.json holds it, units in the names."""
        rules = self.rules
        return {
            "title": self.title,
            "sha256": self.sha256,
            "resistor": {
                "value_ohms": self.target.ohms,
                "also_ohms": list(self.target.also),
                "at_most_ohms": self.target.at_most,
                "tolerance": self.target.tolerance,
                "trim_step": self.target.trim_step,
            },
            "goal": {
                "judge": self.goal.judge,
                "quantile": self.goal.quantile,
                "limits": [_limit_dict(limit) for limit in self.goal.limits],
                "wanted": self.goal.wanted.parameters() if self.goal.wanted else None,
            },
            "search": {
                "arrangements": list(rules.arrangements),
                "use": list(rules.use),
                "max_materials": rules.max_materials,
                "max_legs": rules.max_legs,
                "min_share": rules.min_share,
                "min_squares": rules.min_squares,
                "max_squares": rules.max_squares,
                "min_length_m": rules.min_length,
                "stock_values_ohms": list(rules.stock_values),
                "max_area_m2": rules.max_area,
            },
            "fixed": [{"material": f.leg.material, "ohms": f.leg.ohms, "place": f.place} for f in self.fixed],
            "given": network_text(self.given) if self.given else None,
            "process": self.process.to_dict(),
            "allowances": [allowance.to_dict() for allowance in self.allowances],
            "operating": None if self.operating is None else self.operating.to_dict(),
            "trim": None if self.trim is None else self.trim.to_dict(),
            **({"ratio": self.ratio.to_dict()} if self.ratio else {}),
        }


def _limit_dict(limit: Limit) -> dict[str, Any]:
    unit = "ppm_per_K" if limit.kind in ("chord_tcr", "box_tcr") else "ppm"
    windows = [
        {"low_degC": to_celsius(w.low), "high_degC": to_celsius(w.high), "limit_ppm": w.limit * 1e6}
        for w in limit.windows
    ]
    return {"kind": limit.kind, unit: limit.value * 1e6, "windows": windows}
