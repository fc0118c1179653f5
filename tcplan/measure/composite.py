"""A network as a function of what its materials may be off by: R(T), its slope and its derivatives."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.columns import columns_of
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network, leg_shares, legs, resistance, used_materials
from tcplan.process import INDEPENDENT, Process

Slot: TypeAlias = Literal["value", "tc1", "cold", "hot", "tc2"]
UNIFORM = 1.0 / np.sqrt(3.0)
"""Standard deviation of what lies anywhere in -1..1 alike."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Quantity:
    """One parameter of one material that may be off, and its standard deviation.

    Parameters
    ----------
    material : str
    slot : {"value", "tc1", "cold", "hot", "tc2"}
        The value factor, TC1, the TCR below and above the material's reference, TC2; all about that
        reference.
    sigma : float
        A fraction, 1/K or 1/K^2: a third of normal limits, a rectangular limit over the root of 3.
    """

    material: str
    slot: Slot
    sigma: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Response:
    """A device over temperature: R [ohm], dR/dT [ohm/K], dR/d(quantity), shape (T, quantities)."""

    ohms: FloatArray
    slope: FloatArray
    jacobian: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Composite:
    """A network with all that its materials may be off by.

    Parameters
    ----------
    network : Network
        With its values as planned.
    materials : mapping of name to Material
    reference : float
        Of the values of the legs [K].
    quantities : tuple of Quantity
    root : array, shape (quantities, independent)
        Deviations are this times independent random numbers of mean 0 and variance 1, so that
        root root^T is the covariance of the quantities, correlations and tracking included.
    """

    network: Network
    materials: Mapping[str, Material]
    reference: float
    quantities: tuple[Quantity, ...]
    root: FloatArray

    def response(self, deviations: FloatArray, T: FloatArray) -> Response | None:
        """Return R(T) of one device; None when a leg would reach zero.

        Each leg is its value times (1 + v) [law(T) + a x + b x^2]/law(T_ref), with x from the material's
        own reference, v, a and b its deviations.
        """
        found = self.ratios(deviations, T)
        if found is None:
            return None
        parts = leg_shares(self.network, found)
        ohms = resistance(self.network, found)
        share = dict.fromkeys(found, np.zeros_like(T))
        for leg, part in zip(legs(self.network), parts, strict=True):
            share[leg.material] = share[leg.material] + part
        jacobian = np.empty((len(T), len(self.quantities)))
        slope = np.zeros_like(T)
        for name in found:
            material, own = self.materials[name], self._shifts(name, deviations)
            x = T - material.reference
            law, body = material.law.ratio(T), self._body(name, own, T)
            slope += share[name] * (law * material.slope(T) + _rise(own, x)) / body
            for k, quantity in enumerate(self.quantities):
                if quantity.material == name:
                    shape = (
                        1.0 / (1.0 + own["value"])
                        if quantity.slot == "value"
                        else _shape(quantity.slot, x) / body
                    )
                    jacobian[:, k] = ohms * share[name] * shape
        return Response(ohms=ohms, slope=ohms * slope, jacobian=jacobian)

    def ratios(self, deviations: FloatArray, T: FloatArray) -> dict[str, FloatArray] | None:
        """Return R_i(T)/R_i(nominal, T_ref) by material; None when one would reach zero."""
        found = {}
        for name in used_materials(self.network):
            own = self._shifts(name, deviations)
            ratio = (1.0 + own["value"]) * self._body(name, own, T)
            if not np.all(ratio > 0.0):
                return None
            found[name] = ratio / float(self.materials[name].law.ratio(self.reference))
        return found

    def nominal(self) -> FloatArray:
        """Return the deviations of the nominal device: none."""
        return np.zeros(len(self.quantities))

    def _shifts(self, name: str, deviations: FloatArray) -> dict[str, float]:
        own = dict.fromkeys(("value", "tc1", "cold", "hot", "tc2"), 0.0)
        for quantity, deviation in zip(self.quantities, deviations.tolist(), strict=True):
            if quantity.material == name:
                own[quantity.slot] = deviation
        return own

    def _body(self, name: str, own: Mapping[str, float], T: FloatArray) -> FloatArray:
        material = self.materials[name]
        x = T - material.reference
        shifted = sum(own[slot] * _shape(slot, x) for slot in own if slot != "value" and own[slot])
        return np.asarray(material.law.ratio(T) + shifted)


def _shape(slot: str, x: FloatArray) -> FloatArray:
    """Return what one unit of a deviation of the law adds at x from the material's reference."""
    if slot == "tc2":
        return np.asarray(x**2)
    if slot == "cold":
        return np.minimum(x, 0.0)
    return np.maximum(x, 0.0) if slot == "hot" else x


def _rise(own: Mapping[str, float], x: FloatArray) -> FloatArray:
    """Return d/dT of what the deviations add to a law."""
    side = np.where(x < 0.0, own["cold"], own["hot"])
    return np.asarray(own["tc1"] + side + 2.0 * own["tc2"] * x)


def composite_of(
    network: Network,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    reference: float,
    process: Process = INDEPENDENT,
) -> Composite:
    """Return a network with what its materials may be off by, as draws of lots take it.

    Parameters
    ----------
    network : Network
    materials : mapping of name to Material
    spreads : mapping of name to Spread
        As stated, of either meaning; a material without one is taken as exact.
    reference : float
        Of the values of the legs [K].
    process : Process
        Correlations and tracking.

    Returns
    -------
    Composite
        A width error counts in the value of its film.

    Raises
    ------
    InputError
        When correlations contradict each other.
    """
    names = used_materials(network)
    exact = Spread(meaning="limits")
    stated = {name: spreads.get(name, exact) for name in names}
    columns, terms, tied = columns_of(names, materials, stated, process)
    mixing = np.diag([1.0 if column.shape == "normal" else UNIFORM for column in columns])
    if tied is not None:
        mixing[: len(tied), : len(tied)] = mixing[: len(tied), : len(tied)] @ tied
    rows: dict[tuple[str, Slot], FloatArray] = {}
    for term in terms:
        slot: Slot = "value" if term.slot == "width" else term.slot
        key = (names[term.material], slot)
        rows[key] = rows.get(key, np.zeros(len(columns))) + term.scale * mixing[term.column]
    order = _ordered(names, rows)
    return Composite(
        network=network,
        materials=materials,
        reference=reference,
        quantities=tuple(
            Quantity(material=name, slot=slot, sigma=float(np.linalg.norm(rows[name, slot])))
            for name, slot in order
        ),
        root=np.array([rows[key] for key in order]).reshape(len(order), len(columns)),
    )


def _ordered(
    names: Sequence[str], rows: Mapping[tuple[str, Slot], FloatArray]
) -> tuple[tuple[str, Slot], ...]:
    slots: tuple[Slot, ...] = ("value", "tc1", "cold", "hot", "tc2")
    return tuple((name, slot) for name in names for slot in slots if (name, slot) in rows)
