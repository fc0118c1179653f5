"""Curves of many lots at once: the drift of a network at given temperatures, from the rows of its lots."""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.products import product
from tcplan.draws.sampling import Row, Sampler
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.network import Leg, Network, Series


@dataclass(slots=True, eq=False)
class Pool:
    """Arrays to use again: the system takes large ones back and clears them anew each time."""

    free: dict[tuple[int, int], list[FloatArray]] = field(default_factory=dict)
    lent: list[FloatArray] = field(default_factory=list)

    def take(self, shape: tuple[int, int]) -> FloatArray:
        """Return an array with anything in it."""
        free = self.free.setdefault(shape, [])
        array = free.pop() if free else np.empty(shape)
        self.lent.append(array)
        return array

    def give(self, array: FloatArray) -> None:
        """Take one array back."""
        self.lent = [one for one in self.lent if one is not array]
        self._keep(array)

    def reset(self) -> None:
        """Take all arrays back."""
        for array in self.lent:
            self._keep(array)
        self.lent = []

    def _keep(self, array: FloatArray) -> None:
        rows, columns = array.shape
        self.free[rows, columns].append(array)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Curves:
    """The drift of a network at some temperatures.

    ``slices`` are the rows of each material, ``matrices`` take them to R(T)/R(nominal, T_ref) at the
    temperatures and, last, at the reference; ``wanted`` is the law that is asked for there.
    """

    network: Network
    names: tuple[str, ...]
    slices: tuple[slice, ...]
    matrices: tuple[FloatArray, ...]
    wanted: FloatArray

    def drift(
        self, rows: FloatArray, factors: FloatArray | None = None, pool: Pool | None = None
    ) -> FloatArray:
        """Return R(T)/R(T_ref) less the wanted law, shape (T, lots).

        Parameters
        ----------
        rows : array, shape (rows, lots)
        factors : array, shape (legs, lots), optional
            What each leg is multiplied with on its own.
        pool : Pool, optional
            Where the arrays come from; the result is good until its reset.
        """
        pool = pool or Pool()
        ratios = {}
        for name, own, matrix in zip(self.names, self.slices, self.matrices, strict=True):
            ratios[name] = pool.take((len(matrix), rows.shape[1]))
            product(matrix, rows[own], out=ratios[name])
        ohms = _resistance(self.network, ratios, None if factors is None else iter(factors), pool)
        for ratio in ratios.values():
            pool.give(ratio)
        drift = ohms[:-1]
        drift *= 1.0 / ohms[-1]
        drift -= self.wanted[:, None]
        return drift


def curves_at(
    network: Network,
    lots: Sampler,
    materials: Mapping[str, Material],
    need: Requirement,
    T: FloatArray,
) -> Curves:
    """Return the curves of a network at temperatures [K], shape (T,)."""
    temperatures = np.r_[T, need.reference]
    rows = lots.rows
    starts = [k for k, row in enumerate(rows) if row.slot == "value"] + [len(rows)]
    slices = tuple(slice(a, b) for a, b in itertools.pairwise(starts))
    matrices = tuple(
        _basis(materials[name], rows[own], temperatures) for name, own in zip(lots.names, slices, strict=True)
    )
    return Curves(network=network, names=lots.names, slices=slices, matrices=matrices, wanted=need.wanted(T))


def _basis(material: Material, rows: tuple[Row, ...], temperatures: FloatArray) -> FloatArray:
    """Return what each row of one material adds at the temperatures; the last is the reference.

    R(T)/R(nominal, T_ref) = m device(T)/law(T_ref), so a shift moves the value at the reference too when
    the material has another reference of its own.
    """
    at_reference = float(material.ratio(temperatures[-1:], material.reference)[0])
    x = temperatures - material.reference
    shapes = {
        "value": material.ratio(temperatures, material.reference),
        "tc1": x,
        "cold": np.minimum(x, 0.0),
        "hot": np.maximum(x, 0.0),
        "tc2": x**2,
    }
    return np.stack([row.scale * shapes[row.slot] for row in rows], axis=1) / at_reference


def _resistance(
    network: Network,
    ratios: Mapping[str, FloatArray],
    factors: Iterator[FloatArray] | None,
    pool: Pool,
) -> FloatArray:
    """Return R [ohm], in an array of the pool, of the shape of the ratios."""
    if isinstance(network, Leg):
        ratio = ratios[network.material]
        ohms = pool.take((len(ratio), ratio.shape[1]))
        np.multiply(ratio, network.ohms, out=ohms)
        if factors is not None:
            ohms *= next(factors)
        return ohms
    total = _resistance(network.children[0], ratios, factors, pool)
    for child in network.children[1:]:
        other = _resistance(child, ratios, factors, pool)
        if isinstance(network, Series):
            total += other
        else:
            # R S/(R + S) takes one division for each child; reciprocals would need two.
            product = pool.take((len(total), total.shape[1]))
            np.multiply(total, other, out=product)
            total += other
            np.divide(product, total, out=total)
            pool.give(product)
        pool.give(other)
    return total
