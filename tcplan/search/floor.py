"""Weights for the floor: the dual of the sandwich that holds every network of some materials."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.minimax import solve_fractional
from tcplan.mixes import simplex_vertices
from tcplan.plan import FloorEvidence, Space
from tcplan.search.columns import Programme, Rows, spread_points

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
        The materials and the fixed members; its arrangement says where these are, and its least
        share does not matter.
    need : Requirement
    materials : mapping of name to Material
    figure : float
        A figure that one of these networks reaches.
    """
    names = space.materials
    programme = Programme(space, need, materials, names)
    rows = programme.rows(*spread_points(need, NODES, chebyshev=True))
    r = programme.ratios(rows.temperature)
    weights = simplex_vertices(space, range(len(names)), least_share=False).T
    limit = next((p.weight * figure for p in need.pieces if p.centred), 0.0)
    sides = [_side(r, need, rows, c) for c in {-limit, limit}]
    numerator = np.hstack([n @ weights for n, _ in sides])
    denominator = np.hstack([d @ weights for _, d in sides])
    dual = solve_fractional(numerator, denominator).rows
    upper, lower = np.split(dual, 2)
    return FloorEvidence(
        space=space,
        nodes=tuple((int(p), float(t)) for p, t in zip(rows.piece, rows.temperature, strict=True)),
        upper=tuple(upper.tolist()),
        lower=tuple(lower.tolist()),
    )


def _side(r: FloatArray, need: Requirement, rows: Rows, centre: float) -> tuple[FloatArray, FloatArray]:
    """Return numerator and denominator of both sides of the sandwich at one centre."""
    weight = np.array([piece.weight for piece in need.pieces])[rows.piece][:, None] * np.ones_like(r)
    free = np.array([1.0 if piece.centred else 0.0 for piece in need.pieces])[rows.piece][:, None]
    t = need.wanted(rows.temperature)[:, None] + centre * free
    return np.vstack([t - r, 1.0 - t / r]), np.vstack([weight, weight / r])
