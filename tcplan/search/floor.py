"""Weights for the floor: the dual of the sandwich that holds every network of some materials."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.plan import FloorEvidence, Space
from tcplan.search.columns import Programme, vertex_weights
from tcplan.search.minimax import solve_fractional

NODES = 41


def floor_evidence(
    space: Space, need: Requirement, materials: Mapping[str, Material], figure: float
) -> FloorEvidence:
    """Return nodes and weights from which ``verify`` evaluates the sandwich bound.

    The least e such that some shares p have sum p r >= t + c - eL and (t + c + eL) sum p/r >= 1
    at all nodes, with the centre c of a band anywhere within what ``figure`` allows.

    Parameters
    ----------
    space : Space
        The materials and the fixed members; its arrangement and least share do not matter.
    need : Requirement
    materials : mapping of name to Material
    figure : float
        A figure that one of these networks reaches.
    """
    # The fixed members are one column held by the series ratio of their group: an upper side.
    series = replace(space, arrangement="series", min_share=0.0)
    names = tuple(sorted(space.materials))
    rows = Programme(series, need, materials, names).spread_rows(NODES, chebyshev=True)
    r = rows.n + need.wanted(rows.temperature)[:, None]
    weights = vertex_weights(series, range(len(names)), len(names))
    limit = next((p.weight * figure for p in need.pieces if p.centred), 0.0)
    sides = [_side(r, rows.d, need.wanted(rows.temperature)[:, None] + c * rows.b) for c in {-limit, limit}]
    numerator = np.hstack([n @ weights for n, _ in sides])
    denominator = np.hstack([d @ weights for _, d in sides])
    dual = solve_fractional(numerator, denominator).rows
    upper, lower = np.split(dual, 2)
    return FloorEvidence(
        materials=names,
        nodes=tuple((int(p), float(t)) for p, t in zip(rows.piece, rows.temperature, strict=True)),
        upper=tuple(upper.tolist()),
        lower=tuple(lower.tolist()),
        fixed=space.fixed,
        fixed_share=space.fixed_share,
    )


def _side(r: FloatArray, weight: FloatArray, t: FloatArray) -> tuple[FloatArray, FloatArray]:
    return np.vstack([t - r, 1.0 - t / r]), np.vstack([weight, weight / r])
