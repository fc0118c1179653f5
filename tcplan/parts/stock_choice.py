"""Stock parts for all legs together: every combination of the nearest values, exactly.

Each leg tries its nearest values; all combinations are evaluated in one batch, and what none beats in
parts, drift and value error is returned.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.drift import breakpoints
from tcplan.errors import InputError, Problem
from tcplan.goal import Piece, Requirement
from tcplan.made import Refusal, StockLeg
from tcplan.material.model import Material
from tcplan.network import Leg, Network, Series, leg_names, legs, used_materials
from tcplan.parts.stock import Candidate, candidates, check_counts, rounded, stock_positions, stock_refusals

MOST_COMBINATIONS = 200_000
NODES = 17  # Chebyshev, a piece of the goal; its ends are added


@dataclass(frozen=True, slots=True, kw_only=True)
class StockChoice:
    """Stock parts for all legs together.

    Parameters
    ----------
    legs : tuple of StockLeg or None
        In the order of the network; None for a leg that keeps its ideal value.
    figure : float
        Of the nominal drift of the made network, in the measure of the goal.
    value_error : float
        Made value over target, less 1.
    """

    legs: tuple[StockLeg | None, ...]
    figure: float
    value_error: float

    @property
    def parts(self) -> int:
        """How many stock parts it needs."""
        return sum(len(leg.values) for leg in self.legs if leg is not None)


def stock_choices(
    network: Network,
    materials: Mapping[str, Material],
    need: Requirement,
    target_ohms: float,
    *,
    lowest: float,
    highest: float,
    pairs: bool = True,
    few: int = 5,
    keep: int = 12,
    given: Collection[int] = (),
) -> tuple[StockChoice, ...]:
    """Return stock parts for all legs together: the trade of parts, drift and value error.

    Parameters
    ----------
    network : Network
        The ideal one [ohm], at the reference of ``need``.
    materials : mapping of name to Material
        Legs of those with an E series become stock parts; the others keep their value.
    need : Requirement
        The goal over its range. Drift is nominal, at 17 Chebyshev nodes and the ends of every piece.
    target_ohms : float
        What the whole is to have [ohm].
    lowest, highest : float
        Of the single parts [ohm].
    pairs : bool
        Whether a leg may be two parts, in series or in parallel.
    few : int
        How many of the nearest single values, and of the nearest of all, each leg tries. Fewer
        when all combinations would be more than 200 000.
    keep : int
        How many choices are returned at most.
    given : collection of int
        Positions of legs that keep their value whatever their material: fixed members.

    Returns
    -------
    tuple of StockChoice
        The best figure first. No combination beats one of them in parts, figure or value error and
        is as good in the others. Of many: the best figure and the least value error, then these of
        each number of parts, then evenly over the figures.

    Raises
    ------
    InputError
        When a leg has a value that no part reaches, or a size or count is not above zero.
    """
    check_counts(few=few, keep=keep)
    refused = stock_refusals(network, materials, lowest=lowest, highest=highest, pairs=pairs, given=given)
    if refused:
        raise InputError(map(_unreached, refused))
    stock = {
        position: (
            candidates(legs(network)[position].ohms, series, lowest, highest, False, few),
            candidates(legs(network)[position].ohms, series, lowest, highest, pairs, few),
        )
        for position, series in stock_positions(network, materials, given).items()
    }
    return _chosen(network, materials, need, target_ohms, _neighbourhood(stock, few), keep)


def _neighbourhood(
    stock: Mapping[int, tuple[Sequence[Candidate], Sequence[Candidate]]], few: int
) -> dict[int, tuple[Candidate, ...]]:
    """Return what each leg tries: its nearest single values, and its nearest of all."""
    for count in range(few, 0, -1):
        tried = {k: tuple(dict.fromkeys((*one[:count], *any_[:count]))) for k, (one, any_) in stock.items()}
        if math.prod(map(len, tried.values())) <= MOST_COMBINATIONS:
            return tried
    return {k: tuple(any_[:1]) for k, (_, any_) in stock.items()}


def _chosen(
    network: Network,
    materials: Mapping[str, Material],
    need: Requirement,
    target: float,
    tried: Mapping[int, tuple[Candidate, ...]],
    keep: int,
) -> tuple[StockChoice, ...]:
    """Return the trade over all combinations of what the legs try."""
    own = legs(network)
    ohms = [[c.ohms for c in tried[k]] if k in tried else [leg.ohms] for k, leg in enumerate(own)]
    columns = _open_mesh(ohms)
    total = _resistance(network, iter(columns), dict.fromkeys(used_materials(network), 1.0))
    figures = _figures(network, materials, need, columns, total).ravel()
    errors = (total / target - 1.0).ravel()
    counts = _open_mesh([[len(c.values) for c in tried[k]] if k in tried else [0] for k in range(len(own))])
    parts = np.broadcast_to(np.asarray(sum(counts)), total.shape).ravel()
    picks = [np.arange(len(values)) for values in ohms]
    chosen = _thinned(_trade(parts, figures, errors), parts, figures, errors, keep)
    where = [np.broadcast_to(pick, total.shape).ravel()[chosen] for pick in _open_mesh(picks)]
    return tuple(
        StockChoice(
            legs=tuple(
                _stock_leg(network, k, tried[k][int(where[k][n])]) if k in tried else None
                for k in range(len(own))
            ),
            figure=float(figures[at]),
            value_error=float(errors[at]),
        )
        for n, at in enumerate(chosen)
    )


def _stock_leg(network: Network, position: int, candidate: Candidate) -> StockLeg:
    leg = legs(network)[position]
    return StockLeg(
        id=leg_names(position + 1)[position],
        material=leg.material,
        wanted_ohms=leg.ohms,
        values=candidate.values,
        joined=candidate.joined,
    )


def _open_mesh(columns: Sequence[Sequence[float] | IntArray]) -> list[FloatArray]:
    """Return the columns, each along an axis of its own; one that has a single entry needs no axis."""
    axes = [k for k, column in enumerate(columns) if len(column) > 1]
    return [
        np.asarray(column, dtype=np.float64).reshape([-1 if k == axis else 1 for axis in axes])
        for k, column in enumerate(columns)
    ]


def _resistance(node: Network, columns: Iterator[FloatArray], ratios: Mapping[str, float]) -> FloatArray:
    """Return R [ohm] at one temperature over the combinations of the legs' values.

    A node has the axes of its own legs only, so the full product is met at the root alone.
    """
    if isinstance(node, Leg):
        return next(columns) * ratios[node.material]
    members = [_resistance(child, columns, ratios) for child in node.children]
    if isinstance(node, Series):
        return np.asarray(sum(members[1:], members[0]))
    return np.asarray(1.0 / sum((1.0 / member for member in members[1:]), 1.0 / members[0]))


def _figures(
    network: Network,
    materials: Mapping[str, Material],
    need: Requirement,
    columns: Sequence[FloatArray],
    total: FloatArray,
) -> FloatArray:
    """Return the figure of the nominal drift of every combination."""
    used = used_materials(network)
    splits = (*need.breakpoints(), *breakpoints(materials, used))
    worst = np.zeros_like(total)
    for piece in need.pieces:
        nodes = _nodes(piece, splits)
        wanted = need.wanted(nodes)
        ratios = {name: materials[name].ratio(nodes, need.reference) for name in used}
        low, high = np.full_like(total, np.inf), np.full_like(total, -np.inf)
        for k in range(len(nodes)):  # one temperature at a time keeps the memory small
            at = {name: float(ratio[k]) for name, ratio in ratios.items()}
            drift = _resistance(network, iter(columns), at) / total - wanted[k]
            low, high = np.minimum(low, drift), np.maximum(high, drift)
        width = 0.5 * (high - low) if piece.centred else np.maximum(high, -low)
        worst = np.maximum(worst, width / piece.weight)
    return worst


def _nodes(piece: Piece, splits: Sequence[float]) -> FloatArray:
    """Return the temperatures [K] of a piece: Chebyshev nodes, its ends, and where a law is not smooth."""
    middle, half = 0.5 * (piece.low + piece.high), 0.5 * (piece.high - piece.low)
    inner = middle + half * np.cos(np.pi * (np.arange(NODES) + 0.5) / NODES)
    kinks = [split for split in splits if piece.low < split < piece.high]
    return np.unique(np.r_[piece.low, inner, kinks, piece.high])


def _trade(parts: FloatArray, figures: FloatArray, errors: FloatArray) -> IntArray:
    """Return the positions that no other beats in parts, figure and value error at once."""
    figures, errors = rounded(figures), rounded(np.abs(errors))
    best = np.empty(0, dtype=np.intp)  # of all with fewer parts, the front in figure and error
    kept = [best]
    for count in np.unique(parts):
        own = _front(np.flatnonzero(parts == count), figures, errors)
        place = np.searchsorted(figures[best], figures[own], side="right") - 1
        least = np.r_[errors[best], np.inf][place]  # -1, none before, meets the infinity
        kept.append(own[errors[own] < least])
        best = _front(np.concatenate([best, kept[-1]]), figures, errors)
    return np.concatenate(kept)


def _front(positions: IntArray, figures: FloatArray, errors: FloatArray) -> IntArray:
    """Return the positions that no other beats in figure and error, by rising figure and falling error."""
    order = positions[np.lexsort((errors[positions], figures[positions]))]
    before = np.r_[np.inf, np.minimum.accumulate(errors[order])[:-1]]
    smaller: BoolArray = errors[order] < before
    return order[smaller]


def _thinned(
    trade: IntArray, parts: FloatArray, figures: FloatArray, errors: FloatArray, keep: int
) -> IntArray:
    """Return at most ``keep`` of a trade, by rising figure: its ends first, then evenly over the rest."""
    figures, errors = rounded(figures), rounded(np.abs(errors))
    order = trade[np.lexsort((parts[trade], errors[trade], figures[trade]))]
    by_count = [order[parts[order] == count] for count in np.unique(parts[order])]
    ends = [group[np.argmin(measure[group])] for measure in (figures, errors) for group in (order, *by_count)]
    first = [order[0], order[np.argmin(errors[order])], *ends]
    wanted = list(dict.fromkeys(int(position) for position in first))[:keep]
    others = [int(position) for position in order if int(position) not in wanted]
    room = min(keep - len(wanted), len(others))
    wanted += [others[int((k + 0.5) * len(others) / room)] for k in range(room)]
    return order[np.isin(order, wanted)]


def _unreached(refusal: Refusal) -> Problem:
    return Problem(
        where=f"leg {refusal.leg}",
        found=refusal.found,
        expected="a value that a stock part or a pair reaches",
        todo=f"The nearest is {refusal.nearest}: widen the limits of the stock, or change the network.",
    )
