"""Devices at random: the value of every leaf of each, and their judged drift with what a trim does."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.curves import curves_at
from tcplan.draws.layout import node_peaks
from tcplan.draws.products import product
from tcplan.draws.sampling import BLOCK, Sampler, generator, sampler
from tcplan.errors import InputError, Problem
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Leg, Network, Series, legs, used_materials
from tcplan.parts.trim.members import Member
from tcplan.parts.trim.model import QUANTILE, Stat, Swing
from tcplan.process import Process

MOST_DEVICES = 100_000
_MISMATCH = 2  # the stream of a block that mismatch is drawn from


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Devices:
    """Devices of a made network: lots of the spread, and the mismatch of every leg.

    ``rows`` (rows, devices) are those of the sampler, ``mismatch`` (leaves, devices) what each leaf is
    multiplied with on its own.
    """

    network: Network
    materials: Mapping[str, Material]
    need: Requirement
    lots: Sampler
    rows: FloatArray
    mismatch: FloatArray

    def ohms(self, temperatures: Sequence[float]) -> FloatArray:
        """Return the value of every leaf [ohm], shape (temperatures, leaves, devices)."""
        T = np.asarray(temperatures, dtype=np.float64)
        curves = curves_at(self.network, self.lots, self.materials, self.need, T)
        ratios = {
            name: product(matrix, self.rows[own])[:-1]
            for name, own, matrix in zip(curves.names, curves.slices, curves.matrices, strict=True)
        }
        leaves = [leaf.ohms * ratios[leaf.material] for leaf in legs(self.network)]
        return np.stack(leaves, axis=1) * self.mismatch

    def drift(self, factors: FloatArray) -> FloatArray:
        """Return the judged drift, shape (devices,), with each leaf times ``factors`` (leaves, devices)."""
        peaks = node_peaks(self.network, self.lots, self.materials, self.need)
        return peaks.figures(self.rows, factors=factors * self.mismatch)


def draw_devices(
    network: Network,
    members: Sequence[Member],
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
    need: Requirement,
    draws: int,
    seed: int,
) -> Devices:
    """Return devices that depend on the seed alone: the lots that `tcplan.draws.draw` judges.

    Raises
    ------
    InputError
        For a number of devices that makes no sense.
    """
    if not 1 <= draws <= MOST_DEVICES:
        raise InputError(Problem(where="draws", found=f"{draws}", expected=f"1 to {MOST_DEVICES}"))
    lots = sampler(used_materials(network), materials, spreads, process)
    blocks, units = [], []
    for block in range(-(-draws // BLOCK)):
        blocks.append(lots.fill_rows(lots.draw_columns(seed, block)))
        units.append(generator(seed, block, _MISMATCH).standard_normal((BLOCK, len(members))).T)
    z = np.concatenate(units, axis=1)[:, :draws]
    mismatch = np.ones((len(legs(network)), draws))
    for member, own in zip(members, z, strict=True):
        mismatch[list(member.leaves)] = 1.0 + member.mismatch * own
    return Devices(
        network=network,
        materials=materials,
        need=need,
        lots=lots,
        rows=np.concatenate(blocks, axis=1)[:, :draws],
        mismatch=mismatch,
    )


def whole(network: Network, leaves: Sequence[FloatArray]) -> FloatArray:
    """Return R [ohm] of a network from the values of its leaves, of any shapes that go together."""
    return _whole(network, iter(leaves))


def _whole(network: Network, leaves: Iterator[FloatArray]) -> FloatArray:
    if isinstance(network, Leg):
        return next(leaves)
    parts = [_whole(child, leaves) for child in network.children]
    if isinstance(network, Series):
        return np.asarray(sum(parts[1:], parts[0]))
    return np.asarray(1.0 / sum((1.0 / part for part in parts[1:]), 1.0 / parts[0]))


def needed(
    network: Network, leaves: Sequence[FloatArray], leaf: int, total: FloatArray | float
) -> FloatArray:
    """Return the value of one leaf [ohm] at which the whole is ``total``.

    Zero or below where the others alone are too much; infinite where no value is enough.
    """
    total = np.asarray(total, dtype=np.float64)
    if isinstance(network, Leg):
        return np.asarray(total + np.zeros(leaves[leaf].shape))
    at = 0
    inside: tuple[Network, int, int] | None = None
    others: list[FloatArray] = []
    for child in network.children:
        count = len(legs(child))
        if at <= leaf < at + count:
            inside = child, at, at + count
        else:
            others.append(whole(child, leaves[at : at + count]))
        at += count
    if inside is None:
        raise IndexError(f"leaf {leaf} of {at}")
    child, start, stop = inside
    own = _left(total, others, series=isinstance(network, Series))
    return needed(child, leaves[start:stop], leaf - start, own)


def _left(total: FloatArray, others: Sequence[FloatArray], *, series: bool) -> FloatArray:
    """Return what is left of a total for one member."""
    if series:
        return np.asarray(total - sum(others))
    with np.errstate(divide="ignore"):
        conductance = 1.0 / total - sum(1.0 / other for other in others)
        return np.asarray(
            np.where(total <= 0.0, total, np.where(conductance <= 0.0, np.inf, 1.0 / conductance))
        )


def stat(figures: FloatArray) -> Stat:
    """Return median, 99.73 % quantile and worst of magnitudes."""
    ordered = np.sort(np.abs(figures))
    rank = math.ceil(QUANTILE * len(ordered) - 1e-9)
    return Stat(median=float(np.median(ordered)), quantile=float(ordered[rank - 1]), worst=float(ordered[-1]))


def swing(figures: FloatArray) -> Swing:
    """Return the median and the figure of the largest magnitude."""
    return Swing(median=float(np.median(figures)), worst=float(figures[np.argmax(np.abs(figures))]))
