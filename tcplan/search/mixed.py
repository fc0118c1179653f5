"""Mixed networks: a grid over the inner shares with the outer share exact, then a polish.

Every tree of a shape is searched at once: the inner shares on a grid that is dense at its ends, the
outermost share by golden section (the figure is quasi-convex in it). The best grid minima of each
shape are polished by linear programmes with a trust region and node exchange. No random starts.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import groupby, product
from typing import Protocol

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.mixes import fixed_ratio
from tcplan.plan import Space
from tcplan.search.curves import Path, paths, ratio
from tcplan.search.limits import LegLimits
from tcplan.trees import Pair, Tree, leaves, paired, shape_of

NODES = 9  # Chebyshev nodes a piece in the grid stage
POINTS = {0: 1, 1: 16, 2: 12, 3: 6, 4: 4}  # grid points a share, by the number of inner shares
GOLDEN = 0.5 * (5**0.5 - 1.0)
SECTIONS = 11
KEPT = 8  # grid minima that are polished, a shape
CHUNK = 60_000  # numbers in one array of a chunk, about
WHOLE = (0.0, 1.0)  # where a share may lie
STEEP = 10.0  # of a violated limit (in ln) against the figure


@dataclass(frozen=True, slots=True)
class Field:
    """The goal at some temperatures, and the ratio of every material there."""

    piece: IntArray
    T: FloatArray
    weight: FloatArray
    free: FloatArray
    wanted: FloatArray
    ratios: FloatArray

    @property
    def count(self) -> int:
        """The number of rows of a tree."""
        return len(self.T)

    def legs(self, kinds: IntArray) -> tuple[list[FloatArray], None]:
        """Return the ratios of every leg of trees, each of the shape (trees, 1, T); they are 1 at T_ref."""
        return [self.ratios[kinds[:, leg]][:, None, :] for leg in range(kinds.shape[1])], None

    @property
    def banded(self) -> bool:
        """Whether part of the goal is a band, which has a free centre."""
        return bool(self.free.any())

    def figures(self, curve: FloatArray) -> FloatArray:
        """Return the figure of ratios R(T)/R(T_ref), temperature last."""
        drift = curve - self.wanted
        if not self.banded:
            np.abs(drift, out=drift)
            drift /= self.weight
            return np.asarray(np.max(drift, axis=-1))
        plain = self.free == 0
        out = np.zeros(curve.shape[:-1])
        if plain.any():
            out = np.max(np.abs(drift[..., plain]) / self.weight[plain], axis=-1)
        band = np.ptp(drift[..., ~plain], axis=-1) / (2.0 * self.weight[~plain][0])
        return np.asarray(np.maximum(out, band))


class Surface(Protocol):
    """What a figure is taken over: temperatures of nominal materials, or of devices."""

    @property
    def count(self) -> int:
        """About how many rows a tree has."""

    def legs(self, kinds: IntArray) -> tuple[list[FloatArray], list[FloatArray] | None]:
        """Return R(T) and R(T_ref) of every leg by tree and row; None for R(T_ref) that is 1 everywhere."""

    def figures(self, curve: FloatArray) -> FloatArray:
        """Return the figure of ratios R(T)/R(T_ref), rows last."""


@dataclass(frozen=True, slots=True)
class Source:
    """Where curves come from: the goal, the materials on offer, and the fixed members if there are any."""

    need: Requirement
    materials: Mapping[str, Material]
    space: Space

    def ratios(self, T: FloatArray, kinds: Sequence[int] | None = None) -> FloatArray:
        """Return R(T)/R(T_ref) of every material and last of the fixed members, shape (.., T).

        With ``kinds`` only these rows are worked out; the others are 1.
        """
        names, reference = self.space.materials, self.need.reference
        out = np.ones((len(names) + 1, len(T)))
        for k in range(len(names)) if kinds is None else kinds:
            if k < len(names):
                out[k] = self.materials[names[k]].ratio(T, reference)
        out[-1] = fixed_ratio(self.space, self.materials, reference, T)
        return out


def field_at(source: Source, piece: IntArray, T: FloatArray, kinds: Sequence[int] | None = None) -> Field:
    """Return the field at these pieces and temperatures [K], of all materials or some."""
    pieces = source.need.pieces
    return Field(
        piece,
        T,
        np.array([p.weight for p in pieces])[piece],
        np.array([1.0 if p.centred else 0.0 for p in pieces])[piece],
        source.need.wanted(T),
        source.ratios(T, kinds),
    )


@dataclass(frozen=True, slots=True)
class Start:
    """One grid minimum: its tree, the materials of its legs, its shares and its figure."""

    tree: Tree
    shares: tuple[float, ...]
    figure: float


def inner_grid(count: int) -> FloatArray:
    """Return points of ``count`` inner shares, shape (count, points), dense near 0 and 1."""
    points = POINTS[count]
    axis = np.sin(0.5 * np.pi * (np.arange(points) + 0.5) / points) ** 2
    return np.array(list(product(axis, repeat=count))).T.reshape(count, -1)


def by_shape(trees: Sequence[Tree]) -> Iterator[tuple[Tree, list[Tree]]]:
    """Yield each shape and its trees, in a fixed order."""
    ordered = sorted(trees, key=lambda tree: (repr(shape_of(tree)), repr(tree)))
    for shape, group in groupby(ordered, key=shape_of):
        yield shape, list(group)


def _outer_exact(
    pair: Pair,
    kinds: IntArray,
    inner: FloatArray,
    field: Surface,
    excess: _Excess,
    outermost: tuple[float, float],
) -> tuple[FloatArray, FloatArray]:
    """Return the best outermost share and its figure, both of shape (trees, points).

    That share lies inside ``outermost``; a fixed member of a given total has both ends equal.
    """
    shares = [np.zeros((1, 1, 1)), *(row[None, :, None] for row in inner)]
    hot, cold = field.legs(kinds)

    def members(legs: list[FloatArray]) -> tuple[FloatArray, FloatArray]:
        pairs = ratio(pair.first, legs, shares), ratio(pair.second, legs, shares)
        return pairs if pair.series else (1.0 / pairs[0], 1.0 / pairs[1])

    first, second = members(hot)
    at_reference = members(cold) if cold is not None else None

    def figure(x: FloatArray) -> FloatArray:
        mixed = x[..., None] * first + (1.0 - x[..., None]) * second
        if at_reference is None:
            value = field.figures(mixed if pair.series else 1.0 / mixed)
        else:
            own = x[..., None] * at_reference[0] + (1.0 - x[..., None]) * at_reference[1]
            value = field.figures(mixed / own if pair.series else own / mixed)
        return value + STEEP * np.maximum(excess.at(x), 0.0)

    shape = np.broadcast_shapes(first.shape[:-1], second.shape[:-1])
    if outermost[0] == outermost[1]:
        given = np.full(shape, outermost[0])
        return given, figure(given)
    low = np.full(shape, max(outermost[0], 1e-6))
    high = np.full(shape, min(outermost[1], 1.0 - 1e-6))
    a, b = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
    fa, fb = figure(a), figure(b)
    for _ in range(SECTIONS):
        left = fa < fb
        high, low = np.where(left, b, high), np.where(left, low, a)
        new = np.where(left, high - GOLDEN * (high - low), low + GOLDEN * (high - low))
        f_new = figure(new)
        a, b = np.where(left, new, b), np.where(left, a, new)
        fa, fb = np.where(left, f_new, fb), np.where(left, fa, f_new)
    best = np.where(fa < fb, a, b)
    return best, np.minimum(fa, fb)


@dataclass(frozen=True, slots=True)
class _Excess:
    """How far many trees break their limits, as a function of the outermost share."""

    routes: tuple[Path, ...]
    materials: IntArray
    inner: FloatArray
    limits: LegLimits

    def at(self, x: FloatArray) -> FloatArray:
        """Return the excess (in ln), shape of ``x`` (trees, points)."""
        if not self.limits.any:
            return np.full(x.shape, -np.inf)
        shares = np.empty((len(self.inner) + 1, *x.shape))
        shares[0] = x
        shares[1:] = self.inner[:, None, :]
        return self.limits.excess(self.routes, self.materials, shares)


def _grid_minima(values: FloatArray, count: int) -> FloatArray:
    """Return which points of a grid over ``count`` shares are not above any neighbour."""
    if count == 0:
        return np.ones_like(values, dtype=bool)
    points = POINTS[count]
    cube = values.reshape(-1, *([points] * count))
    least = np.ones_like(cube, dtype=bool)
    for axis in range(1, count + 1):
        pad = [(0, 0)] * cube.ndim
        pad[axis] = (1, 1)
        wide = np.pad(cube, pad, constant_values=np.inf)
        before = np.take(wide, range(points), axis=axis)
        after = np.take(wide, range(2, points + 2), axis=axis)
        least &= (cube <= before) & (cube <= after)
    return least.reshape(values.shape)


def grid_starts(
    trees: Sequence[Tree],
    field: Surface,
    limits: LegLimits,
    kept: int = KEPT,
    outermost: tuple[float, float] = WHOLE,
) -> list[Start]:
    """Return the best grid minima of every shape, best first.

    Parameters
    ----------
    trees : sequence of Tree
        Of two legs at least.
    field : Surface
        The goal at a few temperatures, of nominal materials or of devices.
    limits : LegLimits
    kept : int
        How many a shape.
    outermost : (float, float)
        Bounds of the share of the first member of every tree.
    """
    found: list[Start] = []
    for shape, group in by_shape(trees):
        pair = paired(shape)
        if isinstance(pair, int):
            continue
        inner = inner_grid(len(leaves(shape)) - 2)
        own: list[Start] = []
        step = max(1, CHUNK // (inner.shape[1] * field.count))
        for k in range(0, len(group), step):
            own.extend(_chunk_starts(pair, group[k : k + step], inner, field, limits, kept, outermost))
        found.extend(sorted(own, key=lambda start: (start.figure, repr(start.tree)))[:kept])
    return sorted(found, key=lambda start: (start.figure, repr(start.tree)))


def _chunk_starts(
    pair: Pair,
    group: list[Tree],
    inner: FloatArray,
    field: Surface,
    limits: LegLimits,
    kept: int,
    outermost: tuple[float, float],
) -> list[Start]:
    materials = np.array([leaves(tree) for tree in group])
    excess = _Excess(paths(pair), materials, inner, limits)
    outer, figure = _outer_exact(pair, materials, inner, field, excess, outermost)
    outer, figure = np.broadcast_arrays(outer, figure)
    candidates = np.where(_grid_minima(figure, len(inner)), figure, np.inf).ravel()
    order = np.argsort(candidates, kind="stable")[: 2 * kept]
    starts = []
    for at in order:
        if not np.isfinite(candidates[at]):
            break
        tree, point = divmod(int(at), figure.shape[1])
        shares = (float(outer[tree, point]), *inner[:, point].tolist())
        starts.append(Start(group[tree], shares, float(figure[tree, point])))
    return starts
