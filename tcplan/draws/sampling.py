"""Lots at random: value factor, TC1 and TC2 of every material, from their spreads and the process.

Distributions, by the shape of each spread (limits of standard deviations are 3 of them):

- normal: sigma is a third of the limits, and nothing is cut off; ``screened`` cuts at the limits, as
  an inspection does, by the inverse of the truncated distribution function;
- rectangular: anything within the limits alike. A correlated one is made by a Gaussian copula, so
  the correlation stated is that of the underlying normals; that of the parameter is a little less;
- a TCR limit is rectangular on each side of the material's reference, and the sides are independent;
- tracked TC1: TC1_i = c + d_i, with d_i within half of ``within`` and c within the least limit of the
  materials less that, each by its shape. So abs(TC1_i) <= K and abs(TC1_i - TC1_j) <= within hold for
  rectangular and screened ones, and at 3 sigma of the two parts for normals;
- a width error e z of a film moves its value: factor = (1 + D z_value)/(1 - e z_width/W), with W the
  effective width.

A normal value that would come near zero in its far tail is held at 1 % of nominal.

The stream of a block depends on the seed and the number of the block alone (Philox, `BLOCK` lots), so
neither chunks nor workers can change a result.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.columns import Column, Slot, Term, columns_of
from tcplan.draws.products import product
from tcplan.material.model import Material
from tcplan.material.spread import SIGMAS_PER_LIMIT, Spread
from tcplan.network import Leg, Network, legs
from tcplan.process import Parameter, Process

BLOCK = 8192
"""Lots of one stream; part of the format: another number gives other lots for a seed."""

LEAST_FACTOR = 0.01
_FAR_TAIL = 9.0  # sigmas; no block will ever reach beyond
_SHIFTS: tuple[Slot, ...] = ("tc1", "cold", "hot", "tc2")


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One row of a lot: the value factor of a material, or that times a column that shifts its law.

    ``scale`` times the column is the shift [1/K, TC2 1/K^2]; 1 for a value factor.
    """

    material: int
    slot: Slot
    scale: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Sampler:
    """Draws of the lots of some materials.

    R_i(T)/R_i(nominal, at a reference) is linear in the rows of one material: its value factor m and
    m times each column that shifts its law. Networks are evaluated from these rows.
    """

    names: tuple[str, ...]
    columns: tuple[Column, ...]
    terms: tuple[Term, ...]
    root: FloatArray | None
    screened: bool = False

    @property
    def rows(self) -> tuple[Row, ...]:
        """The rows, material by material, the value factor first."""
        return tuple(
            row
            for k in range(len(self.names))
            for row in (
                Row(material=k, slot="value", scale=1.0),
                *(Row(material=k, slot=t.slot, scale=t.scale) for t in self._shifts(k)),
            )
        )

    @property
    def normals(self) -> int:
        """How many columns are drawn as normals: the first ones."""
        return sum(column.rank < 2 for column in self.columns)

    def draw_columns(self, seed: int, block: int, out: FloatArray | None = None) -> FloatArray:
        """Return the columns of one block, shape (columns, BLOCK): standard normals or in -1..1."""
        z = np.empty((len(self.columns), BLOCK)) if out is None else out
        rng = generator(seed, block)
        free = self.normals
        rng.standard_normal(out=z[:free])
        rng.random(out=z[free:])
        z[free:] *= 2.0
        z[free:] -= 1.0
        if self.root is not None:
            z[: len(self.root)] = product(self.root, z[: len(self.root)])
        if self.screened or self.root is not None:
            self._shape(z)
        return z

    def fill_rows(self, z: FloatArray, out: FloatArray | None = None) -> FloatArray:
        """Return the rows of lots, shape (rows, lots), from their columns."""
        lots = np.empty((len(self.rows), z.shape[1])) if out is None else out
        at = 0
        for k in range(len(self.names)):
            factor = lots[at]
            self._fill_factor(k, z, factor)
            shifts = self._shifts(k)
            for offset, term in enumerate(shifts, start=1):
                np.multiply(z[term.column], factor, out=lots[at + offset])
            at += 1 + len(shifts)
        return lots

    def deviations(self, z: FloatArray) -> dict[Parameter, FloatArray]:
        """Return how far each parameter is off, shape (lots,): a fraction, 1/K, 1/K^2.

        The sides of a TCR limit are left out; they are no single TC1. A width error is here a fraction
        of the effective width.
        """
        component = {"value": "value", "width": "width_bias", "tc1": "tc1", "tc2": "tc2"}
        found: dict[Parameter, FloatArray] = {}
        for term in self.terms:
            if term.slot in component:
                key = Parameter(
                    material=self.names[term.material],
                    component=component[term.slot],  # type: ignore[arg-type]
                )
                part = term.scale * z[term.column]
                found[key] = found[key] + part if key in found else part
        return found

    def _shifts(self, k: int) -> tuple[Term, ...]:
        return tuple(t for slot in _SHIFTS for t in self.terms if t.material == k and t.slot == slot)

    def _fill_factor(self, k: int, z: FloatArray, factor: FloatArray) -> None:
        own = [t for t in self.terms if t.material == k and t.slot in ("value", "width")]
        factor.fill(1.0)
        for term in own:
            if term.slot == "value":
                self._one_plus(z[term.column], term.scale, factor)
            else:
                wide = np.empty_like(factor)
                self._one_plus(z[term.column], -term.scale, wide)
                factor /= wide

    @staticmethod
    def _one_plus(column: FloatArray, scale: float, out: FloatArray) -> None:
        np.multiply(column, scale, out=out)
        out += 1.0
        if abs(scale) * _FAR_TAIL >= 1.0:
            np.maximum(out, LEAST_FACTOR, out=out)

    def _shape(self, z: FloatArray) -> None:
        """Turn correlated normals into rectangulars where asked, and cut normals at their limits."""
        from scipy.special import erf, erfinv

        most = erf(SIGMAS_PER_LIMIT / np.sqrt(2.0))
        for k, column in enumerate(self.columns[: self.normals]):
            # erf is odd, so full correlation, of either sign, stays exact.
            if column.shape == "rectangular":
                z[k] = erf(z[k] / np.sqrt(2.0))
            elif self.screened:
                z[k] = np.sqrt(2.0) * erfinv(most * erf(z[k] / np.sqrt(2.0)))


def sampler(
    names: Sequence[str],
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
    *,
    screened: bool = False,
) -> Sampler:
    """Return the draws of some materials.

    Parameters
    ----------
    names : sequence of str
        The materials in use; their order is part of what a seed means.
    materials, spreads : mapping of name to Material, Spread
        Spreads as they are stated, of either meaning.
    process : Process
        Correlations and tracking.
    screened : bool
        Whether normals are cut at their limits.

    Returns
    -------
    Sampler

    Raises
    ------
    ValueError
        When a material has no spread.
    InputError
        When correlations contradict each other.
    """
    for name in names:
        if spreads.get(name) is None:
            raise ValueError(f"{name} has no spread")
    columns, terms, root = columns_of(names, materials, spreads, process)
    return Sampler(names=tuple(names), columns=columns, terms=terms, root=root, screened=screened)


def generator(seed: int, *key: int) -> np.random.Generator:
    """Return the generator of one block: (block,) for lots, (block, 1) for units."""
    return np.random.Generator(np.random.Philox(np.random.SeedSequence(seed, spawn_key=key)))


def leg_mismatch(
    network: Network, materials: Mapping[str, Material], reference: float
) -> tuple[float | None, ...]:
    """Return sigma(dR/R) of every leg by its own area, None where it is not known.

    ``matching`` is that of a pair times sqrt(W L), so a single leg has matching/sqrt(2)/sqrt(W L), with
    W L the area of the body: squares times the width squared.

    Parameters
    ----------
    network : Network
    materials : mapping of name to Material
    reference : float
        Of the values of the legs [K].

    References
    ----------
    Pelgrom, Duinmaijer, Welbers, IEEE J. Solid-State Circuits 24 (1989) 1433.
    """
    return tuple(_own_mismatch(materials[leg.material], leg, reference) for leg in legs(network))


def _own_mismatch(material: Material, leg: Leg, reference: float) -> float | None:
    squares = material.squares(leg.ohms * leg.strings, reference)  # of one of its strings
    width, film = material.width, material.film
    if squares is None or width is None or film is None or film.matching is None:
        return None
    return float(film.matching / np.sqrt(2.0) / (width * np.sqrt(squares * leg.strings)))
