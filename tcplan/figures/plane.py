"""What the TC1-TC2 plane shows: the points, the views of them, and which view is enlarged."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.figures.contours import PeakDrift
from tcplan.figures.curves import reference
from tcplan.figures.style import Look, looks
from tcplan.network import used_materials
from tcplan.plan import Option, Plan

Point = tuple[float, float]
"""(TC1 [ppm/K], TC2 [ppm/K^2])."""
View = tuple[Point, Point]
"""Two opposite corners."""

CROWDED = 0.33  # of the view: options closer together than this get a view of their own
NEARBY = 5.0  # options up to this many times the peak drift of the chosen one are shown there
LEAST = 1.0  # ppm: what is nearer to the target than this lies on it
LEAST_VIEW = 5.0  # ppm: no view shows less to either side of its middle


@dataclass(frozen=True, slots=True, kw_only=True)
class Scene:
    """All that the plane shows, in its own units."""

    materials: Mapping[str, Point]
    look: Mapping[str, Look]
    options: Mapping[str, tuple[str, Point]]
    chosen: str
    target: Point
    peak: PeakDrift

    def distance(self, point: Point) -> float:
        """Return the peak drift [ppm] of a quadratic law at a point, less the wanted one."""
        away = np.array([point[0] - self.target[0]]), np.array([point[1] - self.target[1]])
        return float(self.peak.of(*away)[0])


def scene_of(plan: Plan) -> Scene:
    """Return what a plan has to show in the plane."""

    def point(name: str) -> Point:
        tc1, tc2 = plan.by_name[name].referred_taylor(reference(plan), 2)
        return tc1 * 1e6, tc2 * 1e6

    def of(option: Option) -> Point:
        return option.nominal.tc1_ppm_per_K, option.nominal.tc2_ppm_per_K2

    over = plan.range
    return Scene(
        materials={material.name: point(material.name) for material in plan.materials},
        look=looks([material.name for material in plan.materials], used_materials(plan.best.network)),
        options={option.id: (option.arrangement, of(option)) for option in plan.options},
        chosen=plan.chosen,
        target=(plan.target.tc1_ppm_per_K, plan.target.tc2_ppm_per_K2),
        peak=PeakDrift(cold=over.low_degC - over.reference_degC, hot=over.high_degC - over.reference_degC),
    )


def whole_view(scene: Scene) -> View:
    """Return the view of everything, the origin included."""
    options = [point for _, point in scene.options.values()]
    return _view([*scene.materials.values(), *options, scene.target, (0.0, 0.0)], scene.peak)


def near_view(scene: Scene) -> View | None:
    """Return the view of the composite options near the target; None when the whole shows them well."""
    composite = [p for name, (kind, p) in scene.options.items() if kind != "single" or name == scene.chosen]
    reach = NEARBY * max(scene.distance(scene.options[scene.chosen][1]), LEAST)
    near = [point for point in composite if scene.distance(point) <= reach]
    if max((scene.distance(point) for point in near), default=0.0) < LEAST:
        return None
    view, whole = _view([*near, scene.target], scene.peak), whole_view(scene)
    parts = [(view[1][n] - view[0][n]) / (whole[1][n] - whole[0][n]) for n in (0, 1)]
    return view if max(parts) < CROWDED else None


def _view(points: Sequence[Point], peak: PeakDrift) -> View:
    """Return a view of points with a margin; neither side is tiny in terms of the drift it stands for."""
    low, high = np.min(points, axis=0), np.max(points, axis=0)
    middle, half = 0.5 * (low + high), 0.5 * (high - low)
    per_unit = peak.of(np.array([1.0, 0.0]), np.array([0.0, 1.0]))
    least = max(0.12 * float(np.max(half * per_unit)), LEAST_VIEW) / per_unit
    half = 1.3 * np.maximum(half, least)
    (left, bottom), (right, top) = (middle - half).tolist(), (middle + half).tolist()
    return (left, bottom), (right, top)


def within(point: Point, view: View | None) -> bool:
    """Return whether a point lies in a view; nothing lies in none."""
    return view is not None and all(view[0][n] <= point[n] <= view[1][n] for n in (0, 1))
