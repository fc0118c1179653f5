"""The nodes that hold the curves of a network: as few as some trial lots show to be enough."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np
from numpy.polynomial import chebyshev

from tcplan.arrays import FloatArray
from tcplan.draws.curves import curves_at
from tcplan.draws.nodes import POINTS, NodePeaks, Panel
from tcplan.draws.sampling import Sampler
from tcplan.drift import Curve, panels
from tcplan.goal import Piece, Requirement
from tcplan.material.model import Material
from tcplan.network import Network

NODES = (9, 13, 17)
CHECKS = 23
TOLERANCE = 1e-7  # of the median figure of the trial lots
TRIAL_LOTS = 64
SMALLEST_PANEL = 0.01  # K
LEAST_MISS = 1e-11  # of no account in any figure


def node_peaks(
    network: Network, lots: Sampler, materials: Mapping[str, Material], need: Requirement
) -> NodePeaks:
    """Return what finds the figures of any network, at nodes that some lots have shown to be enough."""
    centre = lots.fill_rows(np.zeros((len(lots.columns), 1)))
    trial = np.concatenate([centre, lots.fill_rows(lots.draw_columns(0, 0)[:, :TRIAL_LOTS])], axis=1)

    def drift(T: FloatArray) -> FloatArray:
        with np.errstate(all="ignore"):
            return curves_at(network, lots, materials, need, T).drift(trial)

    edges = {edge for piece in need.pieces for edge in (piece.low, piece.high)}
    splits = (*sorted(edges), *_kinks(lots, materials), *need.breakpoints())
    # A tight piece needs its panels as exactly as its limit is tight.
    allowed = TOLERANCE * _rough_figure(drift, need.pieces) * min(p.weight for p in need.pieces) + LEAST_MISS
    stretches: dict[tuple[float, float], list[int]] = {
        one: [] for p in need.pieces for one in panels(p.low, p.high, splits)
    }
    temperatures, made = _laid_out(drift, stretches, allowed)
    return NodePeaks(
        curves=curves_at(network, lots, materials, need, temperatures),
        pieces=need.pieces,
        parts=tuple(
            tuple(k for one in panels(p.low, p.high, splits) for k in stretches[one]) for p in need.pieces
        ),
        panels=made,
    )


def _laid_out(
    drift: Curve, stretches: dict[tuple[float, float], list[int]], allowed: float
) -> tuple[FloatArray, tuple[Panel, ...]]:
    """Return the temperatures of all nodes, and the panels; note in ``stretches`` which are whose."""
    temperatures: list[float] = []
    made: list[Panel] = []
    for (low, high), own in stretches.items():
        for start, end, count in _accepted(drift, low, high, allowed):
            nodes = slice(len(temperatures), len(temperatures) + count)
            temperatures += _nodes(start, end, count).tolist()
            own.append(len(made))
            made.append(_panel(start, end, nodes))
    return np.array(temperatures), tuple(made)


def _rough_figure(drift: Curve, pieces: Sequence[Piece]) -> float:
    """Return the median figure of the trial lots, on a grid and from a centre of 0."""
    reached = [
        np.abs(drift(np.linspace(p.low, p.high, POINTS if p.high > p.low else 1))).max(axis=0) / p.weight
        for p in pieces
    ]
    return float(np.nan_to_num(np.median(np.max(reached, axis=0)), posinf=0.0))


def _kinks(lots: Sampler, materials: Mapping[str, Material]) -> Iterator[float]:
    """Yield where a curve is not smooth: the breakpoints of laws, the references of TCR limits."""
    for name in lots.names:
        yield from materials[name].law.breakpoints
    for row in lots.rows:
        if row.slot == "hot":
            yield materials[lots.names[row.material]].reference


def _nodes(low: float, high: float, count: int) -> FloatArray:
    t = chebyshev.chebpts1(count) if count > 1 else np.zeros(1)
    return np.asarray(0.5 * (low + high) + 0.5 * (high - low) * t)


def _accepted(drift: Curve, low: float, high: float, allowed: float) -> Iterator[tuple[float, float, int]]:
    """Yield panels and their counts of nodes, from the fewest that hold the curves of the trial lots."""
    if high == low:
        yield low, high, 1
        return
    for count in NODES:
        if high - low <= SMALLEST_PANEL or _holds(drift, low, high, count, allowed):
            yield low, high, count
            return
    middle = 0.5 * (low + high)
    yield from _accepted(drift, low, middle, allowed)
    yield from _accepted(drift, middle, high, allowed)


def _holds(drift: Curve, low: float, high: float, count: int, allowed: float) -> bool:
    """Return whether the polynomial meets every trial curve at points off its nodes."""
    t = -1.0 + 2.0 * (np.arange(CHECKS) + 0.37) / CHECKS
    T = np.r_[_nodes(low, high, count), 0.5 * (low + high) + 0.5 * (high - low) * t]
    values = drift(T)
    vander = chebyshev.chebvander(np.r_[chebyshev.chebpts1(count), t], count - 1)
    guess = vander[count:] @ np.linalg.solve(vander[:count], values[:count])
    # A lot that is no number somewhere says nothing about the nodes.
    missed = np.nan_to_num(guess - values[count:], nan=0.0, posinf=0.0, neginf=0.0)
    return bool(np.abs(missed).max() <= allowed)


def _panel(low: float, high: float, nodes: slice) -> Panel:
    """Return the panel of some nodes; one node is a single temperature."""
    count = nodes.stop - nodes.start
    inverse = np.linalg.inv(chebyshev.chebvander(chebyshev.chebpts1(count), count - 1))
    monomials = np.zeros((count, count))
    for k in range(count):
        own = chebyshev.cheb2poly(np.eye(count)[k])
        monomials[: len(own), k] = own
    ends = np.array([-1.0, 1.0])
    slopes = np.stack([chebyshev.chebval(ends, chebyshev.chebder(one)) for one in np.eye(count)], axis=1)
    points = chebyshev.chebvander(np.linspace(-1.0, 1.0, POINTS), count - 1)
    return Panel(
        low=low,
        high=high,
        nodes=nodes,
        points=np.concatenate([points, slopes]) @ inverse,
        powers=monomials @ inverse,
    )
