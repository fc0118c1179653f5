"""Lower bounds, evaluated from dual vectors: what no network of a space can beat.

For signed weights y over the rows, and any mix of columns,
``e >= min over columns of (y n - c y b)/(|y| d)`` with

- series:   n = r - t,        d = L,        b = 1
- parallel: n = 1 - t Gamma,  d = L Gamma,  b = Gamma

A bound needs nothing of the solver that found y: any y gives a true one.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.errors import InternalError
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.mixes import all_supports, fixed_ends, fixed_ratio, share_vertices
from tcplan.plan import Certificate, FloorEvidence, Space

MARGIN = 1e-13  # floating point without directed rounding
CELLS = 400
CHUNK = 20_000
MOST_EXACT = 5_000  # supports of a chunk that are bounded one by one


@dataclass(frozen=True, slots=True)
class Line:
    """For one y: y n, y b and |y| d of every material, and last of the fixed members together."""

    n: FloatArray
    b: FloatArray
    d: FloatArray


def _lines(
    space: Space, evidence: Certificate, need: Requirement, materials: Mapping[str, Material]
) -> list[Line]:
    """Evaluate every dual vector of the evidence from the materials' laws."""
    T = np.array([t for _, t in evidence.nodes])
    weight = np.array([need.pieces[p].weight for p, _ in evidence.nodes])
    free = np.array([1.0 if need.pieces[p].centred else 0.0 for p, _ in evidence.nodes])
    parallel = space.arrangement == "parallel"
    columns = [materials[name].ratio(T, need.reference) for name in space.materials]
    columns.append(fixed_ratio(space, materials, need.reference, T))
    t = need.wanted(T)
    y = np.array(evidence.weights)
    n = np.empty((len(y), len(columns)))
    b, d = np.empty_like(n), np.empty_like(n)
    for j, r in enumerate(columns):
        base = 1.0 / r if parallel else np.ones_like(r)
        n[:, j] = y @ (1.0 - t * base if parallel else r - t)
        b[:, j] = y @ (free * base)
        d[:, j] = np.abs(y) @ (weight * base)
    return [Line(n[k], b[k], d[k]) for k in range(len(y)) if np.all(d[k] > 0)]


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
    """
    lines = _lines(space, evidence, need, materials)
    limit = next((p.weight * figure for p in need.pieces if p.centred), 0.0)
    if not lines:
        return 0.0
    tangents: dict[tuple[int, ...], list[tuple[float, ...]]] = {}
    for support, shares in evidence.tangents:
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
