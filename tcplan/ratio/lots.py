"""What is likely: lots of a pair drawn over the spreads of its materials, with tracking on top.

A lot has one value and one law for each material, as `tcplan.draws.sampling` draws them. With tracking each
resistor is off that law on its own: half of the tracking is a limit, normal or rectangular as the spread of
the material is. These columns have a stream of their own, so tracking does not change the lots.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.curves import Curves, curves_at
from tcplan.draws.sampling import BLOCK, Sampler, generator, sampler
from tcplan.draws.statistics import clopper_pearson, quantile_ranks
from tcplan.goal import Piece
from tcplan.material.spread import SIGMAS_PER_LIMIT, Spread
from tcplan.network import resistance
from tcplan.ratio.pair import SIDES, Pair, alias

DRAWS, SEED = 20_000, 1
POINTS = 65  # of a piece; a peak between two of them is that of a parabola
TRACKING_STREAM = 2  # beside lots (none) and units (1)
ROUNDING = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True)
class RatioLots:
    """What draws say; figures are fractions.

    ``figure`` is what the ``fraction`` of lots does not exceed, ``low`` and ``high`` its 95 % interval by
    order statistics, ``high`` None where so few draws support none. ``inside`` is the part of the lots that
    are within the limit, with its exact 95 % interval; None without a limit.
    """

    fraction: float
    figure: float
    low: float
    high: float | None
    inside: float | None
    inside_low: float | None
    inside_high: float | None
    largest: float
    draws: int
    seed: int


def drawn_lots(
    pair: Pair, stated: Mapping[str, Spread], *, count: int = DRAWS, seed: int = SEED
) -> RatioLots:
    """Draw lots of a pair and judge each of them.

    Parameters
    ----------
    pair : Pair
    stated : mapping of name to Spread
        The spread of every material as it is stated.
    count, seed : int
    """
    figures = np.sort(lot_figures(pair, stated, count=count, seed=seed))
    limit, fraction = pair.need.scale, pair.need.goal.quantile
    rank, low, high = quantile_ranks(count, fraction)
    inside = None if limit is None else int(np.count_nonzero(figures <= limit * (1.0 + ROUNDING)))
    ends = (None, None) if inside is None else clopper_pearson(inside, count)
    return RatioLots(
        fraction=fraction,
        figure=float(figures[rank - 1]),
        low=float(figures[low - 1]) if low else 0.0,
        high=float(figures[high - 1]) if high <= count else None,
        inside=None if inside is None else inside / count,
        inside_low=ends[0],
        inside_high=ends[1],
        largest=float(figures[-1]),
        draws=count,
        seed=seed,
    )


def lot_figures(
    pair: Pair, stated: Mapping[str, Spread], *, count: int = DRAWS, seed: int = SEED
) -> FloatArray:
    """Return the judged figure of each lot, shape (count,)."""
    names, pieces = pair.names, pair.need.pieces
    lots = sampler(names, pair.materials, stated, pair.process)
    parts = [np.linspace(p.low, p.high, POINTS if p.high > p.low else 1) for p in pieces]
    curves = curves_at(pair.together, lots, pair.materials, pair.need, np.concatenate(parts))
    edges = np.cumsum([0, *map(len, parts)])
    found = []
    for block in range(-(-count // BLOCK)):
        taken = min(BLOCK, count - block * BLOCK)
        rows = lots.fill_rows(lots.draw_columns(seed, block)[:, :taken])
        apart = _apart(pair, stated, seed, block)[:, :, :taken]
        drift = _drift(pair, lots, curves, np.concatenate(parts), rows, apart)
        each = [_figures(drift[edges[k] : edges[k + 1]], piece) for k, piece in enumerate(pieces)]
        found.append(np.max(each, axis=0))
    return np.concatenate(found)


def _apart(pair: Pair, stated: Mapping[str, Spread], seed: int, block: int) -> FloatArray:
    """Return by how much the TC1 of each resistor is off the common one, shape (2, materials, lots)."""
    names = pair.names
    off = np.zeros((len(SIDES), len(names), BLOCK))
    if not pair.tracking or not pair.shared:
        return off
    rng = generator(seed, block, TRACKING_STREAM)
    for k, name in enumerate(names):
        if name in pair.shared:
            if stated[name].shape == "normal":
                own = rng.standard_normal((len(SIDES), BLOCK)) / SIGMAS_PER_LIMIT
            else:
                own = rng.uniform(-1.0, 1.0, (len(SIDES), BLOCK))
            off[:, k] = 0.5 * pair.tracking * own
    return off


def _drift(
    pair: Pair, lots: Sampler, curves: Curves, T: FloatArray, rows: FloatArray, apart: FloatArray
) -> FloatArray:
    """Return q(T)/q(T_ref) less the wanted law, shape (T, lots)."""
    x = np.r_[T - pair.need.reference, 0.0]
    ohms = {}
    for k, (name, own, matrix) in enumerate(zip(lots.names, curves.slices, curves.matrices, strict=True)):
        common = matrix @ rows[own]  # the last row is the reference
        for side in SIDES:
            ohms[alias(name, side)] = common + common[-1] * x[:, None] * apart[side - 1, k]
    top, bottom = (resistance(network, ohms) for network in pair.networks())
    ratio = top / bottom
    return np.asarray(ratio[:-1] / ratio[-1] - curves.wanted[:, None])


def _figures(drift: FloatArray, piece: Piece) -> FloatArray:
    """Return the figure of each lot on one piece, shape (lots,)."""
    if not piece.centred:
        return np.asarray(np.maximum(_highest(drift), _highest(-drift)) / piece.weight)
    return np.asarray(0.5 * (_highest(drift) + _highest(-drift)) / piece.weight)


def _highest(drift: FloatArray) -> FloatArray:
    """Return the highest value of each column: that of the parabola through the three highest points."""
    if len(drift) < 3:
        return np.asarray(drift.max(axis=0))
    at = np.clip(drift.argmax(axis=0), 1, len(drift) - 2)
    before, here, after = (np.take_along_axis(drift, (at + k)[None], axis=0)[0] for k in (-1, 0, 1))
    bend, lean = 2.0 * here - before - after, 0.5 * (after - before)
    inside = (here >= before) & (here >= after) & (bend > 0.0)
    above = here + np.where(inside, 0.5 * lean**2 / np.where(inside, bend, 1.0), 0.0)
    return np.asarray(np.maximum(above, drift.max(axis=0)))
