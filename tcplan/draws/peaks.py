"""The judged figure of every lot, as `tcplan.goal.judged` finds it for one: batched in numpy.

- A single or series mix of quadratic laws has R(T)/R(T_ref) = 1 + A x + B x^2, with x = T - T_ref and A
  and B from one matrix product: ends and vertex of every piece give the figure in closed form.
- Any other network is evaluated at Chebyshev nodes: 9 a panel, more or smaller panels where some lots
  show that these do not hold the curve; to better than 1e-6 of the figure.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.curves import Pool, curves_at
from tcplan.draws.layout import node_peaks
from tcplan.draws.nodes import NodePeaks, finite, stacked
from tcplan.draws.products import product
from tcplan.draws.sampling import Sampler
from tcplan.goal import Piece, Requirement
from tcplan.material.law import Law, Polynomial
from tcplan.material.model import Material
from tcplan.network import Network, arrangement, legs

TINY = 1e-290


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class QuadraticPeaks:
    """Figures in closed form: ``matrix`` (3, rows) takes the rows to R(T) = P0 + P1 x + P2 x^2."""

    matrix: FloatArray
    wanted: tuple[float, float]
    pieces: tuple[Piece, ...]
    reference: float

    def figures(self, rows: FloatArray, pool: Pool | None = None) -> FloatArray:
        """Return the figure of every lot, shape (lots,); a pool is of no use here."""
        whole, A, B = product(self.matrix, rows)
        np.divide(1.0, whole, out=whole)
        A *= whole
        B *= whole
        if any(self.wanted):
            A -= self.wanted[0]
            B -= self.wanted[1]
        vertex = _vertex(A, B)
        best: FloatArray | None = None
        for piece in self.pieces:
            figure = self._figure(A, B, vertex, piece)
            best = figure if best is None else np.maximum(best, figure, out=best)
        return finite(best)

    def _figure(self, A: FloatArray, B: FloatArray, vertex: FloatArray, piece: Piece) -> FloatArray:
        low, high = piece.low - self.reference, piece.high - self.reference
        points = [_drift(A, B, low)]
        if high > low:
            points += [_drift(A, B, high), _drift(A, B, np.clip(vertex, low, high))]
        if piece.centred:
            top, bottom = stacked(np.maximum, points), stacked(np.minimum, points)
            top -= bottom
            top *= 0.5 / piece.weight
            return top
        figure = stacked(np.maximum, [np.abs(point, out=point) for point in points])
        if piece.weight != 1.0:
            figure *= 1.0 / piece.weight
        return figure


def _vertex(A: FloatArray, B: FloatArray) -> FloatArray:
    """Return -A/(2 B), far away for a line and finite for 0/0."""
    with np.errstate(over="ignore", divide="ignore"):
        vertex: FloatArray = B + TINY
        np.divide(A, vertex, out=vertex)
    vertex *= -0.5
    return vertex


def _drift(A: FloatArray, B: FloatArray, x: FloatArray | float) -> FloatArray:
    drift: FloatArray = B * x
    drift += A
    drift *= x
    return drift


def peaks_of(
    network: Network, lots: Sampler, materials: Mapping[str, Material], need: Requirement
) -> QuadraticPeaks | NodePeaks:
    """Return what finds the figures of the lots of a network, in closed form where there is one.

    Parameters
    ----------
    network : Network
    lots : Sampler
        Of its materials.
    materials : mapping of name to Material
    need : Requirement
    """
    laws = [materials[name].law for name in lots.names]
    sided = any(row.slot in ("cold", "hot") for row in lots.rows)
    wanted = need.goal.wanted
    quadratic = all(map(_is_quadratic, laws)) and (wanted is None or _is_quadratic(wanted))
    if arrangement(network) in ("single", "series") and quadratic and not sided:
        return _quadratic_peaks(network, lots, materials, need)
    return node_peaks(network, lots, materials, need)


def _is_quadratic(law: Law) -> bool:
    return isinstance(law, Polynomial) and len(law.coefficients) <= 2


def _quadratic_peaks(
    network: Network, lots: Sampler, materials: Mapping[str, Material], need: Requirement
) -> QuadraticPeaks:
    ohms = {name: sum(leg.ohms for leg in legs(network) if leg.material == name) for name in lots.names}
    # A quadratic about the reference is fixed by its values at three temperatures.
    x = np.array([-100.0, 100.0])
    curves = curves_at(network, lots, materials, need, need.reference + x)
    to_powers = np.linalg.inv(np.vander([*x, 0.0], 3, increasing=True))
    columns = [ohms[name] * (to_powers @ m) for name, m in zip(curves.names, curves.matrices, strict=True)]
    matrix = np.concatenate(columns, axis=1)
    _, a, b = to_powers @ np.r_[curves.wanted, 1.0]
    asked = (float(a), float(b)) if need.goal.wanted is not None else (0.0, 0.0)
    return QuadraticPeaks(
        matrix=matrix, wanted=asked, pieces=tuple(dict.fromkeys(need.pieces)), reference=need.reference
    )
