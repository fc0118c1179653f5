"""All rows of a budget over temperature, and where each side of their sum peaks."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.budget.case import Case
from tcplan.budget.contributions import CLASSES, class_extremes
from tcplan.budget.extras import Extra, extras
from tcplan.goal import Requirement
from tcplan.network import Network

POINTS = 129  # temperatures a piece
ZOOM, ROUNDS, HILLS = 9, 2, 3  # points between neighbours of a hill, how often, and of how many hills


@dataclass(frozen=True, slots=True)
class Sheet:
    """The rows at some temperatures [K], each with both sides, and the sums, as fractions.

    ``weight`` is that of the limit, infinite where it asks nothing. ``worst_up`` and ``worst_down`` are
    the drift of the network over its spreads; the totals hold everything.
    """

    T: FloatArray
    weight: FloatArray
    rows: tuple[Extra, ...]
    worst_up: FloatArray
    worst_down: FloatArray
    random_up: FloatArray
    random_down: FloatArray
    total_up: FloatArray
    total_down: FloatArray


def sheet(network: Network, case: Case, T: FloatArray, weight: FloatArray, *, exact: bool = True) -> Sheet:
    """Return the rows and sums of a network, as planned, at temperatures [K]."""
    box = case.box(network)
    up, down = class_extremes(box, T, exact=exact)
    added = (np.diff(up, axis=0, prepend=0.0), np.diff(down, axis=0, prepend=0.0))
    classes = [
        Extra(name, "spread" if k else "nominal", added[0][k], added[1][k]) for k, name in enumerate(CLASSES)
    ]
    beside = extras(box.network, case, T)
    known = [row for row in beside if row.up is not None and row.down is not None]
    random_up, random_down = (_together([row for row in known if row.kind == "random"], k, T) for k in (0, 1))
    linear = [row for row in known if row.kind != "random"]
    return Sheet(
        T,
        weight,
        (*classes, *beside),
        up[-1],
        down[-1],
        random_up,
        -random_down,
        up[-1] + sum((row.up for row in linear if row.up is not None), np.zeros_like(T)) + random_up,
        down[-1] + sum((row.down for row in linear if row.down is not None), np.zeros_like(T)) - random_down,
    )


def _together(rows: list[Extra], side: int, T: FloatArray) -> FloatArray:
    """Return independent rows in root-sum-square, all of them at 3 sigma."""
    sizes = [row.up if side == 0 else row.down for row in rows]
    squares = [np.square(size) for size in sizes if size is not None]
    return np.asarray(np.sqrt(sum(squares, np.zeros_like(T))))


def temperatures(need: Requirement, low: float, high: float, more: float) -> tuple[FloatArray, FloatArray]:
    """Return temperatures [K] over the range and all pieces, and the weight of the limit there.

    A free centre has its weight doubled, so that a drift is on the scale of the band. ``more`` is one
    temperature to look at as well.
    """
    T, weight = [np.linspace(low, high, POINTS)], [np.full(POINTS, np.inf)]
    for piece in need.pieces:
        own = np.linspace(piece.low, piece.high, POINTS if piece.high > piece.low else 1)
        if piece.low <= more <= piece.high:
            own = np.append(own, more)
        T.append(own)
        weight.append(np.full(len(own), piece.weight * (2.0 if piece.centred else 1.0)))
    return np.concatenate(T), np.concatenate(weight)


Figure = Callable[[Sheet], FloatArray]
"""What is to peak: one number a temperature of a sheet."""


def peak(network: Network, case: Case, whole: Sheet, figure: Figure) -> Sheet:
    """Return the sheet of the one temperature where a figure is highest.

    The hills of the whole sheet are looked at more closely. For a mixed network the whole sheet holds
    quick bounds: the highest are made exact one after another, until none of the rest can be higher.
    """
    near = whole
    T, weight, height = whole.T, whole.weight, figure(whole)
    for _ in range(ROUNDS):
        points, weights = _closer(T, weight, height)
        if not len(points):
            break
        near = sheet(network, case, points, weights, exact=False)
        T, weight = np.concatenate([T, near.T]), np.concatenate([weight, near.weight])
        height = np.concatenate([height, figure(near)])
    best, highest = None, -np.inf
    for k in np.argsort(-height, kind="stable"):
        if best is not None and height[k] <= highest:
            break
        one = sheet(network, case, T[k : k + 1], weight[k : k + 1])
        if best is None or figure(one)[0] > highest:
            best, highest = one, float(figure(one)[0])
    return best if best is not None else whole


def _closer(T: FloatArray, weight: FloatArray, height: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return temperatures around the highest hills, between their neighbours of the same weight."""
    points: list[FloatArray] = []
    weights: list[FloatArray] = []
    hills = 0
    for k in np.argsort(-height, kind="stable"):
        alike = np.sort(T[weight == weight[k]])
        place = int(np.searchsorted(alike, T[k]))
        near = alike[max(0, place - 1) : place + 2]
        if len(near) < 2 or any(near[0] <= done[0] <= near[-1] for done in points):
            continue
        points.append(np.array([T[k], *np.linspace(near[0], near[-1], ZOOM)[1:-1]]))
        weights.append(np.full(len(points[-1]), weight[k]))
        hills += 1
        if hills == HILLS:
            break
    if not points:
        return np.empty(0), np.empty(0)
    return np.concatenate(points), np.concatenate(weights)
