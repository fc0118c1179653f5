"""Lower bounds, evaluated from dual vectors: what no network of a space can beat.

For signed weights y over the rows, and any mix of columns,
``e >= min over columns of (y n - c y b)/(|y| d)`` with

- series:   n = r - t,        d = L,        b = 1
- parallel: n = 1 - t Gamma,  d = L Gamma,  b = Gamma

and for the worst case, where a row is one device on one side s of the goal and y is not negative,

- series:   n = s m (r - t),       d = m L
- parallel: n = s (1 - t Gamma)/m, d = L Gamma/m   (m the value factors, r the law ratios at their limit)

A bound needs nothing of the solver that found y: any y gives a true one.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.errors import InternalError
from tcplan.goal import Requirement
from tcplan.material.bounds import LawBounds
from tcplan.material.model import Material
from tcplan.material.spread import value_half_width
from tcplan.mixes import (
    all_supports,
    fixed_ends,
    fixed_ratio,
    share_vertices,
    spread_columns,
    spread_names,
)
from tcplan.plan import Certificate, FloorEvidence, Scenario, Space
from tcplan.process import Variation, step_groups

NEAR = 1e-9  # K; rounding of the end of a piece
MARGIN = 1e-13  # floating point without directed rounding
CELLS = 400
CHUNK = 20_000
MOST_EXACT = 5_000  # supports of a chunk that are bounded one by one


@dataclass(frozen=True, slots=True)
class Line:
    """n, b and d of every material, and last of the fixed members together: of nodes, or summed by a y."""

    n: FloatArray
    b: FloatArray
    d: FloatArray


def _lines(
    space: Space,
    evidence: Certificate,
    need: Requirement,
    materials: Mapping[str, Material],
    variation: Variation | None,
) -> list[Line]:
    """Evaluate every dual vector of the evidence from the materials' laws."""
    evidence = _sound(evidence, need, devices=variation is not None)
    if not evidence.nodes or not evidence.weights:
        return []
    if variation is None:
        rows = _nominal_rows(space, evidence, need, materials)
        y = np.array(evidence.weights)
    else:
        rows = _device_rows(space, evidence, need, materials, variation)
        y = np.maximum(np.array(evidence.weights), 0.0)  # a device binds on its own side only
    n, b, d = y @ rows.n, y @ rows.b, np.abs(y) @ rows.d
    used = slice(None) if space.fixed else slice(-1)  # the last column is that of fixed members
    return [Line(n[k], b[k], d[k]) for k in range(len(y)) if np.all(d[k][used] > 0)]


def _sound(evidence: Certificate, need: Requirement, *, devices: bool) -> Certificate:
    """Return the evidence without what is none: nodes outside their piece or of no side, wild numbers."""

    def good(node: Scenario) -> bool:
        if not 0 <= node.piece < len(need.pieces) or (node.side in (1, -1)) is not devices:
            return False
        piece = need.pieces[node.piece]
        return piece.low - NEAR <= node.temperature <= piece.high + NEAR

    kept = [k for k, node in enumerate(evidence.nodes) if good(node)]
    weights = [
        tuple(row[k] for k in kept)
        for row in evidence.weights
        if np.isfinite(row).all() and len(row) > max(kept, default=0)
    ]
    return replace(evidence, nodes=tuple(evidence.nodes[k] for k in kept), weights=tuple(weights))


def _nominal_rows(
    space: Space, evidence: Certificate, need: Requirement, materials: Mapping[str, Material]
) -> Line:
    """Return n, b and d of every node, shape (nodes, columns), for nominal materials."""
    T = np.array([node.temperature for node in evidence.nodes])
    pieces = [need.pieces[node.piece] for node in evidence.nodes]
    weight, free = np.array([p.weight for p in pieces]), np.array([1.0 if p.centred else 0.0 for p in pieces])
    columns = [materials[name].ratio(T, need.reference) for name in space.materials]
    columns.append(fixed_ratio(space, materials, need.reference, T))
    r, t = np.stack(columns, axis=1), need.wanted(T)[:, None]
    if space.arrangement == "parallel":
        return Line(1.0 - t / r, free[:, None] / r, weight[:, None] / r)
    one = np.ones_like(r)
    return Line(r - t, free[:, None] * one, weight[:, None] * one)


def _device_rows(
    space: Space,
    evidence: Certificate,
    need: Requirement,
    materials: Mapping[str, Material],
    variation: Variation,
) -> Line:
    """Return n, b and d of every node, shape (nodes, columns), each for the device of its scenario.

    The factors are pressed into the box, and on what the materials share, so that whatever the
    evidence says, a true device is looked at.
    """
    names = spread_names(space)
    T = np.array([node.temperature for node in evidence.nodes])
    side = np.array([node.side for node in evidence.nodes])[:, None]
    weight = np.array([need.pieces[node.piece].weight for node in evidence.nodes])[:, None]
    laws, spreads = [materials[n].law for n in names], [variation.spreads[n] for n in names]
    low, high = LawBounds(laws, spreads, need.reference).at(T)
    r, t = np.where(side > 0, high.T, low.T), need.wanted(T)[:, None]
    m = _pressed(np.array([node.factors for node in evidence.nodes]), names, need, materials, variation)
    if space.arrangement == "parallel":
        n, d = side * (1.0 - t / r) / m, weight / (r * m)
    else:
        n, d = side * m * (r - t), weight * m
    columns = spread_columns(space)
    return Line(n @ columns, np.zeros((len(T), columns.shape[1])), d @ columns)


def _pressed(
    factors: FloatArray,
    names: Sequence[str],
    need: Requirement,
    materials: Mapping[str, Material],
    variation: Variation,
) -> FloatArray:
    """Return the factors at the nearest coordinates of the box, one for materials that move in full step."""
    half = np.array([value_half_width(materials[n].law, variation.spreads[n], need.reference) for n in names])
    with np.errstate(invalid="ignore", divide="ignore"):
        own = np.where(half > 0, np.clip((factors - 1.0) / half, -1.0, 1.0), 0.0)
    groups = step_groups(names, materials, variation.spreads, variation.process, need.reference)
    for g in set(groups):
        members = [k for k, group in enumerate(groups) if group == g]
        moving = [k for k in members if half[k] > 0]
        own[:, members] = own[:, moving[:1]] if moving else 0.0
    return np.asarray(1.0 + own * half)


def _value(line: Line, space: Space, support: IntArray, centre: float) -> FloatArray:
    """Return what a line proves at one centre for supports of one size, shape (supports,)."""
    size = support.shape[1]
    top = line.n - centre * line.b
    lowest = np.full(len(support), np.inf)
    for u in fixed_ends(space, size * space.min_share):
        rest = 1.0 - u - size * space.min_share
        above = space.min_share * top[support].sum(axis=1, keepdims=True) + rest * top[support] + u * top[-1]
        below = (
            space.min_share * line.d[support].sum(axis=1, keepdims=True)
            + rest * line.d[support]
            + u * line.d[-1]
        )
        lowest = np.minimum(lowest, (above / below).min(axis=1))
    return lowest


def _of_support(lines: Sequence[Line], vertices: FloatArray, limit: float) -> float:
    """Return the least over |c| <= limit of the best line, over the vertices of one support.

    A line is concave in c, hence at least the lesser of its ends on a cell; the loosest cell is
    halved until the bound no longer rises. Infinite for a support that can not be made.
    """
    if not len(vertices):
        return float("inf")
    n, b, d = (np.stack([getattr(line, part) for line in lines]) @ vertices.T for part in "nbd")

    def at(c: float) -> FloatArray:
        return np.asarray(np.min((n - c * b) / d, axis=1))

    if limit == 0:
        return float(np.max(at(0.0)))
    cells = [(-limit, at(-limit), limit, at(limit))]
    for _ in range(CELLS):
        bounds = [float(np.max(np.minimum(left, right))) for _, left, _, right in cells]
        k = int(np.argmin(bounds))
        low, left, high, right = cells[k]
        middle = 0.5 * (low + high)
        here = at(middle)
        if float(np.max(here)) - bounds[k] <= 1e-9 * abs(bounds[k]) + MARGIN:
            break
        cells[k : k + 1] = [(low, left, middle, here), (middle, here, high, right)]
    return min(float(np.max(np.minimum(left, right))) for _, left, _, right in cells)


def _chunks(space: Space) -> Iterator[IntArray]:
    """Yield all supports in chunks of one size."""
    for group in all_supports(space):
        for k in range(0, len(group), CHUNK):
            yield np.array(group[k : k + CHUNK])


def arrangement_bound(
    space: Space,
    evidence: Certificate,
    need: Requirement,
    materials: Mapping[str, Material],
    figure: float,
    variation: Variation | None = None,
) -> float:
    """Return a lower bound on the figure of every network of a space (a fraction, at least 0).

    Parameters
    ----------
    space : Space
    evidence : Certificate
    need : Requirement
    materials : mapping of name to Material
    figure : float
        A figure that some network of the space reaches: whatever beats it has its centre within
        weight * figure of the wanted value, since the drift is 0 at the reference.
    variation : Variation, optional
        With it the figures are those of the worst case, and the evidence is of devices.
    """
    lines = _lines(space, evidence, need, materials, variation)
    limit = next((p.weight * figure for p in need.pieces if p.centred), 0.0)
    if not lines:
        return 0.0
    tangents: dict[tuple[int, ...], list[tuple[float, ...]]] = {}
    for support, shares in evidence.tangents:
        if not np.isfinite(shares).all():
            continue
        tangents.setdefault(support, []).append(shares)
    lowest = np.inf
    for chunk in _chunks(space):
        best = np.full(len(chunk), -np.inf)
        for line in lines:
            ends = [_value(line, space, chunk, c) for c in {-limit, limit}]
            np.maximum(best, np.minimum.reduce(ends), out=best)
        # What the quick bound leaves open is bounded by the vertices of its own shares.
        for k in np.nonzero(best < figure * (1 - 1e-7))[0][:MOST_EXACT] if limit or space.sizes else []:
            support = tuple(int(i) for i in chunk[k])
            vertices = share_vertices(space, support, tangents.get(support, ()))
            best[k] = max(float(best[k]), _of_support(lines, vertices, limit))
        lowest = min(lowest, float(best.min()))
    if lowest > figure * (1.0 + 1e-9) + 1e-12:
        raise InternalError(f"a bound of {lowest} is above a figure of {figure} that was reached")
    return float(min(max(0.0, lowest - MARGIN), figure))


def sandwich_bound(
    evidence: FloorEvidence, need: Requirement, materials: Mapping[str, Material], figure: float
) -> float:
    """Return a lower bound on the figure of any network whatever of these materials.

    Every network obeys 1/sum(p/r) <= R(T)/R(T_ref) <= sum p r with p its shares at the reference,
    so a figure e needs sum p r >= t + c - eL and (t + c + eL) sum p/r >= 1 at every T.
    """
    T = np.array([t for _, t in evidence.nodes])
    weight = np.array([need.pieces[p].weight for p, _ in evidence.nodes])
    free = np.array([1.0 if need.pieces[p].centred else 0.0 for p, _ in evidence.nodes])
    up, low = np.array(evidence.upper), np.array(evidence.lower)
    limit = next((p.weight * figure for p in need.pieces if p.centred), 0.0)
    space = evidence.space
    columns = [materials[name].ratio(T, need.reference) for name in space.materials]
    last = fixed_ratio(space, materials, need.reference, T)

    def terms(r: FloatArray, c: float) -> tuple[float, float]:
        t = need.wanted(T) + c * free
        return float(up @ (t - r) + low @ (1.0 - t / r)), float(up @ weight + low @ (weight / r))

    lowest = np.inf
    for c in {-limit, limit}:
        fixed_n, fixed_d = terms(last, c)
        for r in columns:
            n, d = terms(r, c)
            for u in set(space.fixed_share):
                lowest = min(lowest, ((1 - u) * n + u * fixed_n) / ((1 - u) * d + u * fixed_d))
    return float(max(0.0, lowest - MARGIN))
