"""The worst case of a network over the spread box, with the device that reaches it and a bound.

A device is one point of the box: a value factor for each material, and a shift of its TC1 and TC2
(legs of one material share them). R(T) rises with every law ratio and R(T_ref) holds none, so at one
temperature all laws sit at their highest or all at their lowest; only value factors need a search:

- one node (series or parallel): exact, each factor sits at a limit that one comparison decides;
- mixed: the worst factor can lie inside; cells of the factor box are bounded by tangents of the
  concave R and halved until nothing can be worse by more than 1 part in 10^4.

What is reported is reached by a device that is named; the bound holds for all of them.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace

import numpy as np

from tcplan.arrays import BoolArray, FloatArray
from tcplan.drift import panels, stationary_points
from tcplan.errors import InternalError
from tcplan.goal import Judged, Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread, law_vertices
from tcplan.network import Network, arrangement
from tcplan.process import INDEPENDENT, Process
from tcplan.worst.box import Box, Device, Worst
from tcplan.worst.cells import Found, cell_search, excursions, grid_of, halved, start_cells
from tcplan.worst.factors import one_node_factors

GRID = 193
CELL_GRID = 33
STARTS = 3
NEAR = 0.97
BAND_CELLS = 512


def _nominal(box: Box) -> Device:
    return Device(dict.fromkeys(box.names, 1.0), dict.fromkeys(box.names, (0.0, 0.0)))


def _examined(box: Box, count: int) -> tuple[FloatArray, FloatArray, BoolArray]:
    """Return temperatures [K] over all pieces, their weights, and whether their centre is free.

    They are evenly spaced, and where the nominal drift is stationary: what is narrow in a law is so in
    the nominal drift as well, which is followed over the continuous range.
    """
    curve = box.curve(_nominal(box))
    splits = [*box.need.breakpoints(), *(b for n in box.names for b in box.materials[n].law.breakpoints)]

    def drift(at: FloatArray) -> FloatArray:
        return curve(at) - box.need.wanted(at)

    T, weight, free = [], [], []
    for piece in box.need.pieces:
        wide = piece.high > piece.low
        own = np.linspace(piece.low, piece.high, count if wide else 1).tolist()
        for low, high in panels(piece.low, piece.high, splits) if wide else ():
            own.extend(stationary_points(drift, low, high))
        T.extend(own)
        weight.extend([piece.weight] * len(own))
        free.extend([piece.centred] * len(own))
    return np.array(T), np.array(weight), np.array(free)


def _settled(box: Box, device: Device) -> tuple[Device, Judged]:
    """Move a device and its worst temperature in turn until neither makes it worse."""
    best = box.judge(device)
    for _ in range(8):
        T = np.array([best.at])
        sign = 1 if box.curve(device)(T)[0] > box.need.wanted(T)[0] else -1
        factors = device.factors
        if _one_comparison(box):
            lo, hi = box.bounds(T)
            _, table = one_node_factors(box, hi if sign > 0 else lo, sign)
            factors = dict(zip(box.names, table[:, 0].tolist(), strict=True))
        other = Device(factors, box.shifts_at(best.at, sign))
        reached = box.judge(other)
        if reached.figure <= best.figure * (1 + 1e-12):
            break
        device, best = other, reached
    return device, best


def _one_node(box: Box) -> Worst:
    """Return the worst case of a single, series or parallel network: exact."""
    T, weight, _ = _examined(box, GRID)
    grid = grid_of(box, T, weight)
    order = np.argsort(grid.T, kind="stable")
    starts: list[tuple[float, Device]] = []
    for sign, ratios in ((1, grid.hi), (-1, grid.lo)):
        rho, factors = one_node_factors(box, ratios, sign)
        figure = sign * (rho - grid.wanted) / grid.weight
        for k in [int(order[j]) for j in _local_maxima(figure[order])[:STARTS]]:
            chosen = dict(zip(box.names, factors[:, k].tolist(), strict=True))
            starts.append((float(figure[k]), Device(chosen, box.shifts_at(float(grid.T[k]), sign))))
    highest = max(figure for figure, _ in starts)
    # Between two grid points a figure rises by far less than what is left out here.
    near = [device for figure, device in starts if figure >= NEAR * highest]
    device, reached = max((_settled(box, device) for device in near), key=lambda pair: pair[1].figure)
    # The margin is rounding: the worst device at each temperature is exact.
    return Worst(device, reached, max(reached.figure, highest) * (1 + 1e-10), "exact")


def _local_maxima(values: FloatArray) -> list[int]:
    padded = np.r_[-np.inf, values, -np.inf]
    peaks = np.nonzero((values >= padded[:-2]) & (values >= padded[2:]))[0]
    return sorted((int(k) for k in peaks), key=lambda k: -values[k])


def _mixed(box: Box) -> Worst:
    """Return the worst case of a mixed network: cells over the factors, then the temperatures.

    Every temperature near the worst is followed to where its device is worst; these join the grid,
    until none of them moves the figure.
    """
    T, weight, _ = _examined(box, CELL_GRID)
    best: tuple[Device, Judged] | None = None
    upper = 0.0
    for _ in range(4):
        found = cell_search(box, grid_of(box, T, weight))
        upper = max(upper, found.upper)
        ends = [_settled(box, device) for device in _suspects(box, found, T)]
        worst = max(ends, key=lambda pair: pair[1].figure)
        if best is not None and worst[1].figure <= best[1].figure * (1 + 1e-6):
            break
        best = worst
        fresh = [at for at in {judged.at for _, judged in ends} if np.abs(T - at).min() > 1e-6]
        tightest = [min(p.weight for p in box.need.pieces if p.low <= at <= p.high) for at in fresh]
        T, weight = np.r_[T, fresh], np.r_[weight, tightest]
    if best is None:
        raise InternalError("a worst case without a device")
    return Worst(best[0], best[1], max(upper, best[1].figure), "cells")


def _suspects(box: Box, found: Found, T: FloatArray) -> list[Device]:
    """Return the worst device of the cells, and those of the other temperatures that come near it."""

    def device(point: FloatArray, at: int, sign: int) -> Device:
        return Device(_named(box, point), box.shifts_at(float(T[at]), sign))

    order = np.argsort(T, kind="stable")
    devices = [device(found.point, found.at, found.sign)]
    for row, sign in ((0, 1), (1, -1)):
        for k in _local_maxima(found.reach[row][order])[:STARTS]:
            at = int(order[k])
            if found.reach[row, at] >= NEAR * found.figure:
                devices.append(device(found.by_temperature[row, at], at, sign))
    return devices


# --- bands ------------------------------------------------------------------------------------------


def _banded(box: Box) -> Worst:
    """Return the worst band: two temperatures of one device, so the box itself is searched.

    Limits and middles of one material after another, from several starts; the bound adds the worst
    excursions up and down, which need not belong to one device.
    """
    count = int(box.coordinate_of().max()) + 1
    signs = np.where(np.arange(count) % 2, 1.0, -1.0)
    ends = (box.need.pieces[0].low, box.need.pieces[0].high)
    starts = [
        _nominal(box),
        *(
            Device(_named(box, f * signs), box.shifts_at(T, sign))
            for T in ends
            for sign in (1, -1)
            for f in (0.0, 1.0, -1.0)
        ),
    ]
    best = max(((d, box.judge(d)) for d in starts), key=lambda pair: pair[1].figure)
    for _ in range(12):
        tried = [(d, box.judge(d)) for d in _neighbours(box, best[0])]
        better = max(tried, key=lambda pair: pair[1].figure)
        if better[1].figure <= best[1].figure * (1 + 1e-9):
            break
        best = better
    return Worst(best[0], best[1], max(_band_bound(box), best[1].figure), "searched")


def _named(box: Box, point: FloatArray) -> dict[str, float]:
    """Return the value factors at a point of the coordinates, by material."""
    return dict(zip(box.names, box.factors_at(point).tolist(), strict=True))


def _neighbours(box: Box, device: Device) -> Iterator[Device]:
    """Yield devices that differ in one coordinate, and in the law of one of its materials."""
    own = box.coordinate_of()
    for k in range(int(own.max()) + 1):
        members = [n for n, at in zip(box.names, own, strict=True) if at == k]
        levels = [_named(box, np.full(int(own.max()) + 1, s)) for s in (-1.0, 0.0, 1.0)]
        for level in (device.factors, *levels):
            moved = replace(device, factors={**device.factors, **{n: level[n] for n in members}})
            for n in members:
                for corner in sorted({*law_vertices(box.spreads[n]), device.shifts[n]}):
                    yield moved.with_shift(n, corner)


def _band_bound(box: Box) -> float:
    """Return a bound on the figure where a band is asked, other limits judged by themselves.

    A band is at most the worst excursions of all devices, up and down, together.
    """
    T, weight, free = _examined(box, CELL_GRID)
    grid = grid_of(box, T, weight)
    if _one_comparison(box):
        up = one_node_factors(box, grid.hi, 1)[0] - grid.wanted
        down = grid.wanted - one_node_factors(box, grid.lo, -1)[0]
    else:
        centre, width = start_cells(box)
        while len(centre) < BAND_CELLS and width.max() > 0:
            centre, width = halved(centre, width)
        up, down = excursions(box, centre, width, grid)
    band = 0.5 * (up[free].max() + down[free].max()) / weight[free][0]
    plain = np.maximum(up, down)[~free] / weight[~free]
    return float(max(band, plain.max(initial=0.0)))


def worst_case(
    network: Network,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    need: Requirement,
    process: Process = INDEPENDENT,
) -> Worst:
    """Return the worst judged figure over the spread box.

    Parameters
    ----------
    network : Network
    materials, spreads : mapping of name to Material, Spread
        Every material of the network has a spread.
    need : Requirement
    process : Process
        What the materials share: values that move in full step have one factor.

    Returns
    -------
    Worst
        ``judged.figure`` is reached by ``device``; no device is above ``upper``.
    """
    box = Box(network, materials, spreads, need, process)
    if need.centred:
        return _banded(box)
    return _one_node(box) if _one_comparison(box) else _mixed(box)


def _one_comparison(box: Box) -> bool:
    """Whether one comparison decides each value factor: in one node, factors of a coordinate alike."""
    kind = arrangement(box.network)
    return kind != "mixed" and (kind != "parallel" or box.in_step())
