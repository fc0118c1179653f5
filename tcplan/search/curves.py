"""Many trees at once: ratios of one shape over arrays of materials and shares, with derivatives.

A node of several children is read as nested pairs, so that a tree of n legs has n - 1 shares, each
the part of the first of a pair: of the resistance in series, of the conductance in parallel. Share 0
is that of the outermost pair. Every subtree is 1 at the reference, so shares are all there is.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.network import Leg, Network, Parallel, Series
from tcplan.trees import Pair


def ratio(pair: Pair | int, legs: list[FloatArray], shares: list[FloatArray]) -> FloatArray:
    """Return R(T)/R(T_ref), broadcast over the arrays of the legs (.., T) and shares (.., 1)."""
    if isinstance(pair, int):
        return legs[pair]
    x = shares[pair.share]
    first, second = ratio(pair.first, legs, shares), ratio(pair.second, legs, shares)
    if pair.series:
        return np.asarray(x * first + (1.0 - x) * second)
    return np.asarray(1.0 / (x / first + (1.0 - x) / second))


def ratio_and_slopes(
    pair: Pair | int, legs: list[FloatArray], shares: FloatArray
) -> tuple[FloatArray, dict[int, FloatArray]]:
    """Return R(T)/R(T_ref), shape (T,), and its derivative with respect to each share."""
    if isinstance(pair, int):
        return legs[pair], {}
    x = float(shares[pair.share])
    first, by_first = ratio_and_slopes(pair.first, legs, shares)
    second, by_second = ratio_and_slopes(pair.second, legs, shares)
    if pair.series:
        whole = x * first + (1.0 - x) * second
        own, left, right = first - second, np.full_like(whole, x), np.full_like(whole, 1.0 - x)
    else:
        whole = 1.0 / (x / first + (1.0 - x) / second)
        square = whole * whole
        own = square * (1.0 / second - 1.0 / first)
        left, right = square * x / first**2, square * (1.0 - x) / second**2
    slopes = {pair.share: own}
    slopes.update({share: left * slope for share, slope in by_first.items()})
    slopes.update({share: right * slope for share, slope in by_second.items()})
    return whole, slopes


@dataclass(frozen=True, slots=True)
class Path:
    """How a leg hangs in its tree: its steps from the root, (share, whether the first, series)."""

    steps: tuple[tuple[int, bool, bool], ...]


@lru_cache(maxsize=4096)
def paths(pair: Pair | int) -> tuple[Path, ...]:
    """Return the path of every leg from left to right."""
    if isinstance(pair, int):
        return (Path(()),)
    found: list[Path] = []
    for member, first in ((pair.first, True), (pair.second, False)):
        found.extend(Path(((pair.share, first, pair.series), *path.steps)) for path in paths(member))
    return tuple(found)


def log_shares(path: Path, shares: FloatArray) -> FloatArray:
    """Return ln of the leg's share of the whole; ``shares`` has the shares on its first axis."""
    total = np.zeros(shares.shape[1:])
    for share, first, _ in path.steps:
        total = total + np.log(shares[share] if first else 1.0 - shares[share])
    return total


def log_ohms(path: Path, shares: FloatArray) -> FloatArray:
    """Return ln of the leg's value over the total: a series step multiplies, a parallel step divides."""
    total = np.zeros(shares.shape[1:])
    for share, first, series in path.steps:
        part = np.log(shares[share] if first else 1.0 - shares[share])
        total = total + (part if series else -part)
    return total


def path_slopes(path: Path, shares: FloatArray, *, of_ohms: bool) -> FloatArray:
    """Return the derivative of :func:`log_ohms` or :func:`log_shares` by every share."""
    out = np.zeros(len(shares))
    for share, first, series in path.steps:
        sign = 1.0 if series or not of_ohms else -1.0
        out[share] += sign / shares[share] if first else -sign / (1.0 - shares[share])
    return out


def network_at(pair: Pair | int, names: tuple[str, ...], shares: FloatArray, ohms: float) -> Network:
    """Return the network of pairs with these leg materials, shares and total [ohm]."""
    if isinstance(pair, int):
        return Leg(material=names[pair], ohms=ohms)
    x = float(shares[pair.share])
    if pair.series:
        parts = (ohms * x, ohms * (1.0 - x))
        kind: type[Series] | type[Parallel] = Series
    else:
        parts = (ohms / x, ohms / (1.0 - x))
        kind = Parallel
    return kind(
        (network_at(pair.first, names, shares, parts[0]), network_at(pair.second, names, shares, parts[1]))
    )
