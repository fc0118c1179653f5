"""The worst case of a network over the spread box, with the device that reaches it and a bound.

A device is one point of the box: a value factor for each material, and a shift of its TC1 and TC2
(legs of one material share them). R(T) rises with every law ratio and R(T_ref) holds none, so at one
temperature all laws sit at their highest or all at their lowest; only value factors need a search:

- one node (series or parallel): exact, each factor sits at a limit that one comparison decides;
- mixed: the worst factor can lie inside; cells of the factor box are bounded by tangents of the
  concave R and halved until nothing can be worse by more than 1 part in 10^4 (METHODS 6).

What is reported is reached by a device that is named; the bound holds for all of them.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import product

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.drift import Curve
from tcplan.goal import Judged, Requirement, judged
from tcplan.material.model import Material
from tcplan.material.spread import Spread, law_bounds, law_vertices, shifted_ratio, value_half_width
from tcplan.network import (
    Network,
    Series,
    arrangement,
    deviated,
    leg_shares,
    legs,
    resistance,
    used_materials,
    value,
)

GAP = 1e-4
GRID = 65
CELL_GRID = 33
MOST_CELLS = 60_000
BATCH = 512
STARTS = 3


@dataclass(frozen=True, slots=True)
class Device:
    """One point of the spread box: factor, TC1 shift and TC2 shift by material."""

    factors: dict[str, float]
    shifts: dict[str, tuple[float, float]]

    def with_factor(self, name: str, factor: float) -> Device:
        """Return this device with another value factor of one material."""
        return Device({**self.factors, name: factor}, self.shifts)

    def with_shift(self, name: str, shift: tuple[float, float]) -> Device:
        """Return this device with other shifts of one material."""
        return Device(self.factors, {**self.shifts, name: shift})


@dataclass(frozen=True, slots=True)
class Worst:
    """The worst device found, what it reaches, how, and a bound on every device."""

    device: Device
    judged: Judged
    upper: float
    method: str


@dataclass(frozen=True, slots=True)
class Box:
    """A network with the limits of its materials."""

    network: Network
    materials: Mapping[str, Material]
    spreads: Mapping[str, Spread]
    need: Requirement

    @property
    def names(self) -> tuple[str, ...]:
        """The materials of the network."""
        return used_materials(self.network)

    def half_widths(self) -> FloatArray:
        """Return the half-width of each value factor at the brief's reference."""
        return np.array(
            [
                value_half_width(self.materials[n].law, self.spreads[n], self.need.reference)
                for n in self.names
            ]
        )

    def bounds(self, T: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the lowest and highest law ratios, shape (materials, T)."""
        pairs = [
            law_bounds(self.materials[n].law, self.spreads[n], self.need.reference, T) for n in self.names
        ]
        return np.stack([lo for lo, _ in pairs]), np.stack([hi for _, hi in pairs])

    def shifts_at(self, T: float, sign: int) -> dict[str, tuple[float, float]]:
        """Return the corner of (TC1, TC2) of each material that is highest (or lowest) at T."""
        at = np.array([T])
        chosen = {}
        for n in self.names:
            law = self.materials[n].law
            corners = law_vertices(self.spreads[n])
            ratios = [sign * shifted_ratio(law, c, self.need.reference, at)[0] for c in corners]
            chosen[n] = corners[int(np.argmax(ratios))]
        return chosen

    def curve(self, device: Device) -> Curve:
        """Return T -> R(T)/R(T_ref) of one device."""
        network = deviated(self.network, device.factors)
        own = value(network)

        def ratio(T: FloatArray) -> FloatArray:
            ratios = {
                n: shifted_ratio(self.materials[n].law, device.shifts[n], self.need.reference, T)
                for n in self.names
            }
            return resistance(network, ratios) / own

        return ratio

    def judge(self, device: Device) -> Judged:
        """Return the figure of one device over the continuous range."""
        splits = [b for n in self.names for b in self.materials[n].law.breakpoints]
        return judged(self.curve(device), self.need, splits)


# --- one node: exact ------------------------------------------------------------------------------


def one_node_factors(box: Box, ratios: FloatArray, sign: int) -> tuple[FloatArray, FloatArray]:
    """Return the extreme of R(T)/R(T_ref) over the value factors, and the factors.

    Parameters
    ----------
    box : Box
        Of a single leg, or of a series or parallel node of legs.
    ratios : array, shape (materials, T)
        The law ratios, all at one side.
    sign : int
        1 for the highest, -1 for the lowest.

    Returns
    -------
    array, shape (T,)
        The extreme ratio.
    array, shape (materials, T)
        The factors that reach it.

    Notes
    -----
    In series rho = sum w m r / sum w m: a factor is at its upper limit exactly when its r is
    above rho. Starting from the nominal factors the ratio moves monotonically and ends after at
    most one step a material. In parallel the same holds for 1/rho with g/m and 1/r.
    """
    weights = np.array([_weight(box.network, n) for n in box.names])[:, None]
    half = box.half_widths()[:, None]
    series = isinstance(box.network, Series)
    column, side = (ratios, sign) if series else (1.0 / ratios, -sign)
    high, low = (1.0 + half, 1.0 - half) if series else (1.0 / (1.0 - half), 1.0 / (1.0 + half))
    factor = np.ones_like(ratios)
    rho = (weights * factor * column).sum(axis=0) / (weights * factor).sum(axis=0)
    for _ in range(len(weights) + 2):
        factor = np.where(side * (column - rho) > 0, high, low)
        rho = (weights * factor * column).sum(axis=0) / (weights * factor).sum(axis=0)
    return (rho, factor) if series else (1.0 / rho, 1.0 / factor)


def _weight(network: Network, name: str) -> float:
    """Return the resistance (series) or conductance (parallel) of one material in one node."""
    own = [leg.ohms for leg in legs(network) if leg.material == name]
    return sum(own) if isinstance(network, Series) else sum(1.0 / ohms for ohms in own)


# --- mixed: cells of the factor box ---------------------------------------------------------------


def _faces(half: FloatArray) -> Iterator[tuple[FloatArray, FloatArray]]:
    """Yield (centre, half-width) of the faces on which one factor is at its upper limit.

    The ratio does not change when all factors are scaled together, and any point scales up until
    its first factor reaches its limit: these faces hold every ratio of the box.
    """
    for k in np.nonzero(half > 0)[0]:
        centre, width = np.ones_like(half), half.copy()
        centre[k], width[k] = 1.0 + half[k], 0.0
        yield centre, width
    if not (half > 0).any():
        yield np.ones_like(half), half


def _cell_values(
    box: Box, centre: FloatArray, width: FloatArray, lo: FloatArray, hi: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Return bounds on the ratio over cells, and its values at their centres.

    Parameters
    ----------
    centre, width : array, shape (cells, materials)
    lo, hi : array, shape (materials, T)

    Returns
    -------
    top, bottom : array, shape (cells, T)
        No device of the cell is above or below.
    high, low : array, shape (cells, T)
        What the centre reaches with all laws high, and all low.
    """
    flat = np.ones_like(lo[:, :1])
    grad_hi, high_c = _gradient(box, centre, hi)
    grad_ref, ref_c = _gradient(box, centre, flat)
    _, low_c = _gradient(box, centre, lo)
    top = np.full(high_c.shape, -np.inf)
    bottom = np.full(low_c.shape, np.inf)
    moving = np.nonzero(width.max(axis=0) > 0)[0]
    for signs in product((-1.0, 1.0), repeat=len(moving)):
        vertex = centre.copy()
        vertex[:, moving] += width[:, moving] * np.array(signs)
        own_ref = _values(box, vertex, flat)
        own_low = _values(box, vertex, lo)
        tangent_hi = np.einsum("cm,mct->ct", vertex, grad_hi)
        tangent_ref = np.einsum("cm,mct->ct", vertex, grad_ref)
        np.maximum(top, tangent_hi / own_ref, out=top)
        np.minimum(bottom, own_low / tangent_ref, out=bottom)
    return top, bottom, high_c / ref_c, low_c / ref_c


def _scaled_ratios(box: Box, factors: FloatArray, ratios: FloatArray) -> dict[str, FloatArray]:
    return {n: factors[:, k, None] * ratios[k][None, :] for k, n in enumerate(box.names)}


def _values(box: Box, factors: FloatArray, ratios: FloatArray) -> FloatArray:
    """Return R, shape (cells, T)."""
    return resistance(box.network, _scaled_ratios(box, factors, ratios))


def _gradient(box: Box, factors: FloatArray, ratios: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return dR/dm, shape (materials, cells, T), and R."""
    scaled = _scaled_ratios(box, factors, ratios)
    whole = resistance(box.network, scaled)
    gradient = np.zeros((len(box.names), *whole.shape))
    for leg, share in zip(legs(box.network), leg_shares(box.network, scaled), strict=True):
        k = box.names.index(leg.material)
        gradient[k] += share * whole / factors[:, k, None]
    return gradient, whole


def _cell_search(
    box: Box, T: FloatArray, weight: FloatArray, start: float
) -> tuple[float, float, FloatArray, int, float]:
    """Return the best figure, the bound, and the factors, sign and T of the best, over all cells."""
    lo, hi = box.bounds(T)
    t = box.need.wanted(T)
    faces = list(_faces(box.half_widths()))
    centre, width = np.stack([c for c, _ in faces]), np.stack([w for _, w in faces])
    best = (start, np.ones(len(box.names)), 1, float(T[0]))
    done = 0.0
    count = 0
    while len(centre) and count < MOST_CELLS:
        count += len(centre)
        keep_c, keep_w = [], []
        for k in range(0, len(centre), BATCH):
            c, w = centre[k : k + BATCH], width[k : k + BATCH]
            top, bottom, high, low = _cell_values(box, c, w, lo, hi)
            reach = np.stack([(high - t) / weight, (t - low) / weight])
            side, cell, at = np.unravel_index(int(np.argmax(reach)), reach.shape)
            if reach[side, cell, at] > best[0]:
                best = (float(reach[side, cell, at]), c[cell].copy(), 1 if side == 0 else -1, float(T[at]))
            bound = np.maximum(((top - t) / weight).max(axis=1), ((t - bottom) / weight).max(axis=1))
            open_cells = bound > best[0] * (1.0 + GAP)
            if (~open_cells).any():
                done = max(done, float(bound[~open_cells].max()))
            keep_c.append(c[open_cells])
            keep_w.append(w[open_cells])
        centre, width = _halved(np.concatenate(keep_c), np.concatenate(keep_w))
    if len(centre):  # stopped by the count: what is left is bounded by its own cells
        top, bottom, _, _ = _cell_values(box, centre, width, lo, hi)
        done = max(done, float(((top - t) / weight).max()), float(((t - bottom) / weight).max()))
    return best[0], max(done, best[0]), best[1], best[2], best[3]


def _halved(centre: FloatArray, width: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Cut every cell in two along its widest side."""
    if not len(centre):
        return centre, width
    rows = np.arange(len(centre))
    widest = np.argmax(width, axis=1)
    half = 0.5 * width[rows, widest]
    new_width = width.copy()
    new_width[rows, widest] = half
    left, right = centre.copy(), centre.copy()
    left[rows, widest] -= half
    right[rows, widest] += half
    return np.concatenate([left, right]), np.concatenate([new_width, new_width])


# --- the worst case ---------------------------------------------------------------------------------


def _grid(need: Requirement, count: int) -> tuple[FloatArray, FloatArray]:
    """Return temperatures [K] over the uncentred pieces and the weights there."""
    T, weight = [], []
    for piece in need.pieces:
        points = np.linspace(piece.low, piece.high, count if piece.high > piece.low else 1)
        T.append(points)
        weight.append(np.full(len(points), piece.weight))
    return np.concatenate(T), np.concatenate(weight)


def _settled(box: Box, device: Device) -> tuple[Device, Judged]:
    """Move a device and its worst temperature in turn until neither makes it worse."""
    best = box.judge(device)
    for _ in range(8):
        T = np.array([best.at])
        sign = 1 if box.curve(device)(T)[0] > box.need.wanted(T)[0] else -1
        shifts = box.shifts_at(best.at, sign)
        factors = device.factors
        if arrangement(box.network) != "mixed":
            lo, hi = box.bounds(T)
            _, table = one_node_factors(box, hi if sign > 0 else lo, sign)
            factors = {n: float(table[k, 0]) for k, n in enumerate(box.names)}
        other = Device(factors, shifts)
        reached = box.judge(other)
        if reached.figure <= best.figure * (1 + 1e-12):
            return device, best
        device, best = other, reached
    return device, best


def _one_node(box: Box) -> Worst:
    """Return the worst case of a single, series or parallel network: exact."""
    T, weight = _grid(box.need, GRID)
    lo, hi = box.bounds(T)
    t = box.need.wanted(T)
    starts: list[tuple[float, Device]] = []
    highest = 0.0
    for sign, ratios in ((1, hi), (-1, lo)):
        rho, factors = one_node_factors(box, ratios, sign)
        figure = sign * (rho - t) / weight
        highest = max(highest, float(figure.max()))
        for k in _local_maxima(figure)[:STARTS]:
            chosen = {n: float(factors[i, k]) for i, n in enumerate(box.names)}
            starts.append((float(figure[k]), Device(chosen, box.shifts_at(float(T[k]), sign))))
    ends = [_settled(box, device) for _, device in sorted(starts, key=lambda pair: -pair[0])[: 2 * STARTS]]
    device, reached = max(ends, key=lambda pair: pair[1].figure)
    upper = max(reached.figure, highest)
    return Worst(device, reached, upper * (1 + 1e-9), "exact")


def _local_maxima(values: FloatArray) -> list[int]:
    padded = np.r_[-np.inf, values, -np.inf]
    peaks = np.nonzero((values >= padded[:-2]) & (values >= padded[2:]))[0]
    return sorted((int(k) for k in peaks), key=lambda k: -values[k])


def _mixed(box: Box) -> Worst:
    """Return the worst case of a mixed network: cells over the factors, then the temperature."""
    T, weight = _grid(box.need, CELL_GRID)
    best: tuple[Device, Judged] | None = None
    upper = 0.0
    for _ in range(4):
        start = best[1].figure if best else 0.0
        found, bound, factors, sign, at = _cell_search(box, T, weight, start * (1 - 1e-9))
        upper = max(upper, bound)
        device = Device(
            {n: float(factors[k]) for k, n in enumerate(box.names)}, box.shifts_at(at, sign)
        )
        settled = _settled(box, device)
        if best is not None and settled[1].figure <= best[1].figure * (1 + 1e-6):
            break
        best = settled if best is None or settled[1].figure > best[1].figure else best
        piece = min(
            (p for p in box.need.pieces if p.low <= best[1].at <= p.high), key=lambda p: p.weight
        )
        T, weight = np.r_[T, best[1].at], np.r_[weight, piece.weight]
    if best is None:
        raise ValueError("no device was judged")
    return Worst(best[0], best[1], max(upper, best[1].figure), "cells")


def _banded(box: Box) -> Worst:
    """Return the worst band: two temperatures of one device, so the box itself is searched.

    Corners and mid-points of one coordinate after another from several starts; the bound adds the
    worst excursions up and down, which need not belong to one device.
    """
    half = dict(zip(box.names, box.half_widths().tolist(), strict=True))
    ends = (box.need.pieces[0].low, box.need.pieces[0].high)
    starts = [
        Device(
            {n: 1.0 + f * half[n] * (1 if k % 2 else -1) for k, n in enumerate(box.names)},
            box.shifts_at(T, sign),
        )
        for T in ends
        for sign in (1, -1)
        for f in (0.0, 1.0, -1.0)
    ]
    best = max(((d, box.judge(d)) for d in starts), key=lambda pair: pair[1].figure)
    for _ in range(6):
        tried = [(d, box.judge(d)) for d in _neighbours(box, best[0], half)]
        better = max(tried, key=lambda pair: pair[1].figure)
        if better[1].figure <= best[1].figure * (1 + 1e-9):
            break
        best = better
    return Worst(best[0], best[1], max(_band_bound(box), best[1].figure), "searched")


def _neighbours(box: Box, device: Device, half: Mapping[str, float]) -> Iterator[Device]:
    """Yield devices that differ in one material."""
    for n in box.names:
        corners = set(law_vertices(box.spreads[n])) | {device.shifts[n]}
        factors = {1.0 - half[n], 1.0, 1.0 + half[n], device.factors[n]}
        for factor, corner in product(sorted(factors), sorted(corners)):
            yield device.with_factor(n, factor).with_shift(n, corner)


def _band_bound(box: Box) -> float:
    """Return a bound on the figure: the worst excursions of all devices, up and down, together."""
    T, weight = _grid(box.need, CELL_GRID)
    lo, hi = box.bounds(T)
    t = box.need.wanted(T)
    if arrangement(box.network) != "mixed":
        up = float((one_node_factors(box, hi, 1)[0] - t).max())
        down = float((t - one_node_factors(box, lo, -1)[0]).max())
    else:
        faces = list(_faces(box.half_widths()))
        centre, width = np.stack([c for c, _ in faces]), np.stack([w for _, w in faces])
        for _ in range(2 * len(box.names)):
            centre, width = _halved(centre, width)
        top, bottom, _, _ = _cell_values(box, centre, width, lo, hi)
        up, down = float((top - t).max()), float((t - bottom).max())
    tightest = min(p.weight for p in box.need.pieces)
    band = min(p.weight for p in box.need.pieces if p.centred)
    return max(0.5 * (up + down) / band, max(up, down) / tightest if tightest != band else 0.0)


def worst_case(
    network: Network,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    need: Requirement,
) -> Worst:
    """Return the worst judged figure over the spread box.

    Parameters
    ----------
    network : Network
    materials, spreads : mapping of name to Material, Spread
        Every material of the network has a spread.
    need : Requirement

    Returns
    -------
    Worst
        ``judged.figure`` is reached by ``device``; no device is above ``upper``.
    """
    box = Box(network, materials, spreads, need)
    if need.centred:
        return _banded(box)
    return _mixed(box) if arrangement(network) == "mixed" else _one_node(box)

