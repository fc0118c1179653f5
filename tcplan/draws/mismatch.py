"""Units within a lot: legs of equal drawing differ by their mismatch, kept apart from what a lot shares."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.blocks import ROUNDING
from tcplan.draws.face import check_draws
from tcplan.draws.layout import node_peaks
from tcplan.draws.nodes import NodePeaks
from tcplan.draws.sampling import BLOCK, Sampler, generator, leg_mismatch, sampler
from tcplan.draws.statistics import clopper_pearson
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network, leg_names, used_materials
from tcplan.process import Process


@dataclass(frozen=True, slots=True, kw_only=True)
class DrawnUnits:
    """What draws of units within lots say; fractions are of units that are within the limit.

    Parameters
    ----------
    lots, units, seed : int
        How many lots, and units in each.
    limit : float
        As a fraction.
    lots_inside : int
        Lots that are within the limit before any mismatch.
    lots_low, lots_high : float
        Exact 95 % binomial interval of lots_inside/lots.
    mean_within, median_within, least_within : float
        Of the fraction of units inside within a lot, over the lots.
    unstated : tuple of str
        Ids of the legs whose mismatch is not known; it counts as none.
    """

    lots: int
    units: int
    seed: int
    limit: float
    lots_inside: int
    lots_low: float
    lots_high: float
    mean_within: float
    median_within: float
    least_within: float
    unstated: tuple[str, ...]


def draw_units(
    network: Network,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
    need: Requirement,
    *,
    lots: int,
    units: int,
    seed: int = 1,
    limit: float,
    screened: bool = False,
) -> DrawnUnits | None:
    """Draw units within lots: each leg is off by its own mismatch, on top of what its lot shares.

    The lots are those that `tcplan.draws.draw` judges; mismatch has a stream of its own, normal, not cut.

    Parameters
    ----------
    network, materials, spreads, process, need
        As for `tcplan.draws.draw`.
    lots, units : int
        How many lots, and units in each.
    seed : int
    limit : float
        A figure, as a fraction.
    screened : bool
        Whether normals of the lot level are cut at their limits.

    Returns
    -------
    DrawnUnits or None
        None when the mismatch of no leg is known.

    Raises
    ------
    ValueError, InputError
        As for `tcplan.draws.draw`.
    """
    for count in (lots, units, lots * units):
        check_draws(count)
    sigmas = leg_mismatch(network, materials, need.reference)
    if all(sigma is None for sigma in sigmas):
        return None
    sample = sampler(used_materials(network), materials, spreads, process, screened=screened)
    peaks = node_peaks(network, sample, materials, need)
    most = limit * (1.0 + ROUNDING)
    before = sum(int(np.count_nonzero(peaks.figures(rows) <= most)) for rows in _lots(sample, seed, lots))
    within = np.zeros(lots, dtype=np.int64)
    known = np.array([sigma or 0.0 for sigma in sigmas])
    for block in range(-(-lots * units // BLOCK)):
        _count_block(within, peaks, sample, known, seed, block, units, most)
    low, high = clopper_pearson(before, lots)
    return DrawnUnits(
        lots=lots,
        units=units,
        seed=seed,
        limit=limit,
        lots_inside=before,
        lots_low=low,
        lots_high=high,
        mean_within=float(within.mean() / units),
        median_within=float(np.median(within) / units),
        least_within=float(within.min() / units),
        unstated=tuple(n for n, s in zip(leg_names(len(sigmas)), sigmas, strict=True) if s is None),
    )


def _lots(sample: Sampler, seed: int, lots: int) -> Iterator[FloatArray]:
    for block in range(-(-lots // BLOCK)):
        yield sample.fill_rows(sample.draw_columns(seed, block)[:, : lots - block * BLOCK])


def _count_block(
    within: np.ndarray[tuple[int, ...], np.dtype[np.int64]],
    peaks: NodePeaks,
    sample: Sampler,
    sigmas: FloatArray,
    seed: int,
    block: int,
    units: int,
    most: float,
) -> None:
    """Add the units of one block that are inside to their lots; unit k belongs to lot k // units."""
    first = block * BLOCK
    count = min(BLOCK, len(within) * units - first)
    lot = np.arange(first, first + count) // units
    start = int(lot[0]) // BLOCK
    columns = [sample.draw_columns(seed, k) for k in range(start, int(lot[-1]) // BLOCK + 1)]
    rows = sample.fill_rows(np.concatenate(columns, axis=1))[:, lot - start * BLOCK]
    factors = generator(seed, block, 1).standard_normal((len(sigmas), BLOCK))[:, :count]
    factors *= sigmas[:, None]
    factors += 1.0
    inside = peaks.figures(rows, factors=factors) <= most
    within += np.bincount(lot[inside], minlength=len(within))
