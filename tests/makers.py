"""The one place that makes materials, trees and briefs for tests: all invented, all from a seed."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from tcplan.brief import Brief, parse_brief
from tcplan.goal import Goal, Limit, Requirement, requirement
from tcplan.material.law import Polynomial
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Leg, Network, Parallel, Series
from tcplan.ranges import TemperatureRange, temperature_range

REFERENCE = 298.15
SIX_FILMS = (  # Independent prototype: name, TC1 ppm/K, TC2 ppm/K^2, sheet %, TC1 spread ppm/K
    ("hi", -1400.0, 3.0, 15.0, 80.0),
    ("pp", -120.0, 0.55, 20.0, 40.0),
    ("np", 150.0, 0.4, 10.0, 40.0),
    ("nd", 1500.0, 0.6, 15.0, 60.0),
    ("nw", 2900.0, 8.5, 25.0, 150.0),
    ("sp", 3100.0, 0.4, 10.0, 60.0),
)


def film(
    name: str,
    tc1_ppm: float,
    tc2_ppm: float = 0.0,
    *,
    value_percent: float | None = None,
    tc1_spread_ppm: float = 0.0,
    tc2_spread_ppm: float = 0.0,
    reference: float = REFERENCE,
    ohm_per_square: float = 100.0,
) -> Material:
    """Return a film with a quadratic law; without a spread when ``value_percent`` is None."""
    spread = None
    if value_percent is not None:
        spread = Spread(
            meaning="limits",
            value=value_percent / 100,
            tc1=tc1_spread_ppm * 1e-6,
            tc2=tc2_spread_ppm * 1e-6,
        )
    return Material(
        name=name,
        label=name,
        source="invented",
        law=Polynomial(reference=reference, coefficients=(tc1_ppm * 1e-6, tc2_ppm * 1e-6)),
        valid=(213.15, 433.15),
        kind="film",
        ohm_per_square=ohm_per_square,
        spread=spread,
    )


def by_name(*materials: Material) -> dict[str, Material]:
    return {material.name: material for material in materials}


def six_films() -> dict[str, Material]:
    return by_name(*(film(n, a, b, value_percent=s, tc1_spread_ppm=u) for n, a, b, s, u in SIX_FILMS))


def curved_films(seed: int, count: int) -> dict[str, Material]:
    """Return films that all curve upwards, as those of one process mostly do."""
    rng = np.random.default_rng(seed)
    tc1, tc2 = rng.uniform(-1500, 3000, count), rng.uniform(0.3, 8.0, count)
    return by_name(
        *(
            film(f"m{k:02d}", float(tc1[k]), float(tc2[k]), value_percent=10.0, tc1_spread_ppm=30.0)
            for k in range(count)
        )
    )


def random_films(seed: int, count: int) -> dict[str, Material]:
    """Return films with slopes of both signs and mostly positive curvature."""
    rng = np.random.default_rng(seed)
    tc1 = rng.uniform(-1500, 2500, count)
    tc2 = rng.uniform(-0.5, 3.0, count)
    return by_name(
        *(
            film(f"m{k:02d}", float(tc1[k]), float(tc2[k]), value_percent=10.0, tc1_spread_ppm=30.0)
            for k in range(count)
        )
    )


def leg(material: str, ohms: float) -> Leg:
    return Leg(material=material, ohms=ohms)


def random_tree(rng: np.random.Generator, names: tuple[str, ...], size: int) -> Network:
    """Return a random series/parallel tree with ``size`` legs."""
    if size == 1:
        return leg(str(rng.choice(names)), float(10 ** rng.uniform(2, 4)))
    cut = int(rng.integers(1, size))
    kind = Series if rng.random() < 0.5 else Parallel
    return kind((random_tree(rng, names, cut), random_tree(rng, names, size - cut)))


def over(low: float = -40.0, high: float = 150.0, reference: float = 25.0) -> TemperatureRange:
    return temperature_range(low + 273.15, high + 273.15, reference + 273.15)


def need_of(
    *limits: Limit, low: float = -40.0, high: float = 150.0, judge: str = "nominal", wanted: object = None
) -> Requirement:
    goal = Goal(limits=limits, judge=judge, wanted=wanted)  # type: ignore[arg-type]
    return requirement(goal, over(low, high))


def grid(low: float = -40.0, high: float = 150.0, count: int = 4001) -> np.ndarray:
    return np.linspace(low, high, count) + 273.15


def brute_ratio(network: Network, materials: Mapping[str, Material], T: np.ndarray) -> np.ndarray:
    """Return R(T)/R(T_ref) by the scalar twin: one temperature, one leg at a time."""

    def ohms(node: Network, t: float | None) -> float:
        if isinstance(node, Leg):
            law = materials[node.material].law
            if t is None:
                return node.ohms
            return node.ohms * float(law.ratio(np.array([t]))[0] / law.ratio(np.array([REFERENCE]))[0])
        parts = [ohms(child, t) for child in node.children]
        if isinstance(node, Series):
            return sum(parts)
        return 1.0 / sum(1.0 / part for part in parts)

    return np.array([ohms(network, float(t)) / ohms(network, None) for t in T])


BRIEF = """
schema = 1
title = "Test resistor"
[resistor]
value = "18 kohm"
[temperature]
low = "-40 degC"
high = "150 degC"
[goal]
drift = "6000 ppm"
"""

FILMS = """
[material.pp]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-120 ppm/K"
tc2 = "0.55 ppm/K^2"
ohm_per_square = "320 ohm"
[material.pp.spread]
meaning = "limits"
ohm_per_square = "20 %"
tc1 = "40 ppm/K"
[material.np]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "150 ppm/K"
tc2 = "0.4 ppm/K^2"
ohm_per_square = "120 ohm"
[material.np.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "40 ppm/K"
"""


def brief(text: str = BRIEF + FILMS, folder: Path = Path()) -> Brief:
    return parse_brief(text, "brief.toml", folder)
