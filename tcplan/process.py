"""How the parameters of several materials move together: correlations, tracking, and process corners.

The spread of one material stands in its own `tcplan.material.spread.Spread`. What several of them share
is here: it decides which devices a worst case may combine, and how draws are made. Partial correlations
act in draws only; films whose values move in full step share one factor everywhere.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Literal, TypeAlias

from tcplan.material.model import Material
from tcplan.material.spread import Spread

Component: TypeAlias = Literal["value", "tc1", "tc2", "end_resistance", "end_tc1", "width_bias"]
COMPONENTS: tuple[Component, ...] = ("value", "tc1", "tc2", "end_resistance", "end_tc1", "width_bias")
FULL_STEP = 1.0 - 1e-12  # correlation from which two parameters are one


@dataclass(frozen=True, slots=True, kw_only=True, order=True)
class Parameter:
    """One parameter of one material; ``value`` is its ohm per square, ohm per metre or value."""

    material: str
    component: Component


@dataclass(frozen=True, slots=True, kw_only=True)
class Correlation:
    """The correlation coefficient of two parameters."""

    first: Parameter
    second: Parameter
    value: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Tracking:
    """Materials whose TC1 differ by at most ``within`` [1/K], wherever their common part lies."""

    materials: tuple[str, ...]
    within: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Corner:
    """A named process corner: by how much some parameters are off.

    A shift of a value is a fraction, one of TC1 in 1/K, of TC2 in 1/K^2.
    """

    name: str
    shifts: tuple[tuple[Parameter, float], ...]

    def shift(self, material: str, component: Component) -> float:
        """Return by how much a parameter is off; 0 when the corner does not name it."""
        wanted = Parameter(material=material, component=component)
        return next((value for parameter, value in self.shifts if parameter == wanted), 0.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Process:
    """What the materials of a brief share."""

    correlations: tuple[Correlation, ...] = ()
    trackings: tuple[Tracking, ...] = ()
    corners: tuple[Corner, ...] = ()

    def value_groups(self, names: Sequence[str]) -> tuple[int, ...]:
        """Return a group for each material: values of one group move in full step.

        Groups are numbered by the first of their materials in ``names``. A step through a material that
        is not among them counts as well.
        """
        joined: dict[str, str] = {}

        def root(name: str) -> str:
            while joined.get(name, name) != name:
                name = joined[name]
            return name

        for one in self.correlations:
            if one.first.component == one.second.component == "value" and one.value >= FULL_STEP:
                joined[root(one.first.material)] = root(one.second.material)
        roots = [root(name) for name in names]
        return tuple(roots.index(own) for own in roots)

    def to_dict(self) -> dict[str, Any]:
        """Return plain JSON data; the inverse of :func:`process_from_dict`."""
        return {
            "correlations": [
                {"between": [_text(c.first), _text(c.second)], "value": c.value} for c in self.correlations
            ],
            "trackings": [{"materials": list(t.materials), "within_per_K": t.within} for t in self.trackings],
            "corners": {
                corner.name: {_text(parameter): value for parameter, value in corner.shifts}
                for corner in self.corners
            },
        }


INDEPENDENT = Process()
"""Nothing shared: every parameter moves on its own."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Variation:
    """What may be off: the spread of each material, and what the materials share."""

    spreads: Mapping[str, Spread]
    process: Process = INDEPENDENT

    def scaled(self, part: float) -> Variation:
        """Return the variation whose limits are this part of these."""
        return replace(self, spreads={name: _scaled(spread, part) for name, spread in self.spreads.items()})


def _scaled(spread: Spread, part: float) -> Spread:
    limits = spread.limits()
    halves = {name: getattr(limits, name) for name in ("value", "tc1", "tc2", "tcr")}
    return replace(limits, **{name: part * half for name, half in halves.items() if half is not None})


def step_groups(
    names: Sequence[str],
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
    reference: float,
) -> tuple[int, ...]:
    """Return a group for each material: in a worst case, value factors of one group move in full step.

    Only those whose factor at the reference [K] is the stated value and nothing else: a width error, the
    TC shift of another reference, or what an extrapolation adds, is each material's own, so such a one
    counts as independent, which is on the safe side.
    """
    groups = process.value_groups(names)
    plain = [_is_plain(materials[name], spreads[name], reference) for name in names]
    return tuple(
        group if own and plain[group] else _first_plain(groups, plain, k)
        for k, (group, own) in enumerate(zip(groups, plain, strict=True))
    )


def _first_plain(groups: Sequence[int], plain: Sequence[bool], k: int) -> int:
    """Return the group of a material when that of its first partner does not count."""
    if not plain[k]:
        return k
    return next(j for j, group in enumerate(groups) if group == groups[k] and plain[j])


def _is_plain(material: Material, spread: Spread, reference: float) -> bool:
    added = material.extrapolation.limits().value if material.extrapolation is not None else None
    return spread.width_bias is None and not added and material.law.reference == reference


def process_from_dict(data: dict[str, Any]) -> Process:
    """Return the process that :meth:`Process.to_dict` wrote."""
    return Process(
        correlations=tuple(
            Correlation(
                first=_parameter(c["between"][0]), second=_parameter(c["between"][1]), value=c["value"]
            )
            for c in data["correlations"]
        ),
        trackings=tuple(
            Tracking(materials=tuple(t["materials"]), within=t["within_per_K"]) for t in data["trackings"]
        ),
        corners=tuple(
            Corner(name=name, shifts=tuple((_parameter(text), value) for text, value in shifts.items()))
            for name, shifts in data["corners"].items()
        ),
    )


def _text(parameter: Parameter) -> str:
    return f"{parameter.material}.{parameter.component}"


def _parameter(text: str) -> Parameter:
    material, _, component = text.partition(".")
    return Parameter(material=material, component=component)  # type: ignore[arg-type]
