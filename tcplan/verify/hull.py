"""Hulls: every member of a cell of networks, held between mixes of a few vertex curves.

A cell is a box of the inner shares of one tree. Over it a subtree is held as ``conv(V) + [-below,
+above]``: for every choice of shares there are weights, the same at all temperatures, whose mix of the
vertex curves V differs from the subtree's curve by no more than that. A series pair is affine in each
share, so its vertices are those of its members. An inversion, for a parallel pair, maps V to 1/V; by
how much a mix of 1/V can differ from 1/mix of V is known in closed form.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.trees import Pair


@dataclass(frozen=True, slots=True)
class Hull:
    """Vertex curves, shape (cells, vertices, T), and how far a member can leave their mixes."""

    vertices: FloatArray
    below: FloatArray
    above: FloatArray


def exact(curve: FloatArray) -> Hull:
    """Return the hull of single curves, shape (cells, T)."""
    zero = np.zeros_like(curve)
    return Hull(curve[:, None, :], zero, zero)


def inverted(hull: Hull) -> Hull:
    """Return a hull of 1/curve.

    With m and M the least and largest vertex at a temperature: a mix of 1/V is above 1/(mix of V) by at
    most (1/sqrt(m) - 1/sqrt(M))^2, and moving the mix by ``above`` or ``below`` moves its inverse by at
    most above/(m (m + above)) down or below/(m (m - below)) up. Where m - below is not above zero,
    nothing is known and the hull is infinite.
    """
    least, most = hull.vertices.min(axis=1), hull.vertices.max(axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        bend = (1.0 / np.sqrt(least) - 1.0 / np.sqrt(most)) ** 2
        moved = np.where(np.isfinite(hull.above), hull.above / (least * (least + hull.above)), 1.0 / least)
        below = bend + moved
        above = hull.below / (least * (least - hull.below))
    known = (least > 0) & (least > hull.below)
    return Hull(1.0 / hull.vertices, np.where(known, below, np.inf), np.where(known, above, np.inf))


def mixed(low: FloatArray, high: FloatArray, first: Hull, second: Hull) -> Hull:
    """Return a hull of x first + (1 - x) second for x anywhere in [low, high], shape (cells,)."""
    parts = []
    for x in (low, high):
        one = x[:, None, None, None] * first.vertices[:, :, None, :]
        other = (1.0 - x)[:, None, None, None] * second.vertices[:, None, :, :]
        both = one + other
        parts.append(both.reshape(len(x), -1, both.shape[-1]))
    ends = [(x[:, None], 1.0 - x[:, None]) for x in (low, high)]
    below = np.maximum(*(_part(x, first.below) + _part(y, second.below) for x, y in ends))
    above = np.maximum(*(_part(x, first.above) + _part(y, second.above) for x, y in ends))
    return Hull(np.concatenate(parts, axis=1), below, above)


def _part(share: FloatArray, margin: FloatArray) -> FloatArray:
    """Return a share of a margin; none of an infinite one is nothing."""
    return np.asarray(share * np.where(share > 0, margin, 0.0))


@dataclass(frozen=True, slots=True)
class Cells:
    """Cells of one shape: the leg curves of each, and its box of shares, shape (cells, shares)."""

    legs: tuple[FloatArray, ...]
    low: FloatArray
    high: FloatArray


def hull_of(pair: Pair | int, cells: Cells, *, conductance: bool) -> Hull:
    """Return the hull of a subtree's R(T)/R(T_ref), or of its inverse when ``conductance``."""
    if isinstance(pair, int):
        curve = cells.legs[pair]
        return exact(1.0 / curve if conductance else curve)
    members = [hull_of(m, cells, conductance=not pair.series) for m in (pair.first, pair.second)]
    hull = mixed(cells.low[:, pair.share], cells.high[:, pair.share], *members)
    return hull if conductance is not pair.series else inverted(hull)


def top_members(pair: Pair) -> tuple[Pair | int, ...]:
    """Return the children of the top node: its pairs of its own kind, opened."""
    found: list[Pair | int] = []
    for member in (pair.first, pair.second):
        if isinstance(member, Pair) and member.series == pair.series:
            found.extend(top_members(member))
        else:
            found.append(member)
    return tuple(found)


def shares_in(pair: Pair | int) -> tuple[int, ...]:
    """Return the positions of the shares inside a subtree."""
    if isinstance(pair, int):
        return ()
    return (pair.share, *shares_in(pair.first), *shares_in(pair.second))
