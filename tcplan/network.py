"""Networks of legs: immutable series/parallel trees, their shares, derivatives and text form.

Every quantity of a tree comes from one pass from the leaves to the root: series adds resistance,
parallel adds conductance, for all temperatures at once.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import reduce
from typing import TYPE_CHECKING, Any, Literal, TypeAlias

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.names import shown

if TYPE_CHECKING:
    import sympy

Arrangement: TypeAlias = Literal["single", "series", "parallel", "mixed"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Leg:
    """One leaf of a network: a material and its value [ohm] at the reference temperature.

    ``strings`` says of how many alike in parallel it is made: a film of the same value then takes more
    area, and is better matched. It changes nothing else.
    """

    material: str
    ohms: float
    strings: int = 1

    def __post_init__(self) -> None:
        if self.strings < 1:
            raise InputError(
                Problem(
                    where=f"leg of {self.material}",
                    found=f"{self.strings} strings",
                    expected="at least 1",
                )
            )
        if not (0 < self.ohms < float("inf")):
            raise InputError(
                Problem(
                    where=f"leg of {self.material}",
                    found=f"{self.ohms!r} ohm",
                    expected="a value above zero",
                )
            )


@dataclass(frozen=True, slots=True)
class Series:
    """Members that carry one current."""

    children: tuple[Network, ...]

    def __post_init__(self) -> None:
        _check_members(self.children, "series")


@dataclass(frozen=True, slots=True)
class Parallel:
    """Members that share one voltage."""

    children: tuple[Network, ...]

    def __post_init__(self) -> None:
        _check_members(self.children, "parallel")


Network: TypeAlias = Leg | Series | Parallel


def _check_members(children: tuple[Network, ...], kind: str) -> None:
    if len(children) < 2:
        raise InputError(
            Problem(where=f"{kind} node", found=f"{len(children)} members", expected="at least two")
        )


def legs(network: Network) -> tuple[Leg, ...]:
    """Return the legs from left to right."""
    if isinstance(network, Leg):
        return (network,)
    return tuple(leg for child in network.children for leg in legs(child))


def leg_names(count: int) -> tuple[str, ...]:
    """Return the ids of ``count`` legs: a, b, ... z, a1, b1, ..."""
    letters = "abcdefghijklmnopqrstuvwxyz"
    return tuple(letters[i % 26] + (str(i // 26) if i >= 26 else "") for i in range(count))


def used_materials(network: Network) -> tuple[str, ...]:
    """Return the names of the materials, each once, in order of first use."""
    return tuple(dict.fromkeys(leg.material for leg in legs(network)))


def arrangement(network: Network) -> Arrangement:
    """Return the kind of network."""
    if isinstance(network, Leg):
        return "single"
    if all(isinstance(child, Leg) for child in network.children):
        return "series" if isinstance(network, Series) else "parallel"
    return "mixed"


def resistance(network: Network, ratios: Mapping[str, FloatArray]) -> FloatArray:
    """Return R(T) [ohm], shape of the arrays in ``ratios`` (R_i(T)/R_i(T_ref) of each material)."""
    if isinstance(network, Leg):
        return np.asarray(network.ohms * ratios[network.material])
    parts = [resistance(child, ratios) for child in network.children]
    if isinstance(network, Series):
        return np.asarray(sum(parts[1:], parts[0]))
    return np.asarray(1.0 / sum((1.0 / part for part in parts[1:]), 1.0 / parts[0]))


def value(network: Network) -> float:
    """Return R(T_ref) [ohm]."""
    return float(resistance(network, dict.fromkeys(used_materials(network), np.ones(()))))


def leg_shares(network: Network, ratios: Mapping[str, FloatArray]) -> tuple[FloatArray, ...]:
    """Return d ln R / d ln R_k of every leg, each shaped like the arrays in ``ratios``.

    The shares are not negative and sum to 1 at every temperature (Cohn's theorem): a series
    child carries R_child/R of its parent's share, a parallel child G_child/G.
    """
    if isinstance(network, Leg):
        return (np.ones_like(ratios[network.material]),)
    parts = [resistance(child, ratios) for child in network.children]
    weights = parts if isinstance(network, Series) else [1.0 / part for part in parts]
    total = sum(weights[1:], weights[0])
    return tuple(
        np.asarray(share * weight / total)
        for child, weight in zip(network.children, weights, strict=True)
        for share in leg_shares(child, ratios)
    )


def shares(network: Network) -> tuple[float, ...]:
    """Return the share of every leg at the reference temperature.

    Examples
    --------
    >>> pair = Parallel((Leg(material="red_film", ohms=3000.0), Leg(material="blue_film", ohms=1000.0)))
    >>> shares(pair)
    (0.25, 0.75)
    """
    ones = dict.fromkeys(used_materials(network), np.ones(()))
    return tuple(float(share) for share in leg_shares(network, ones))


def slope(network: Network, ratios: Mapping[str, FloatArray], slopes: Mapping[str, FloatArray]) -> FloatArray:
    """Return d ln R / dT [1/K]: the mean of the legs' slopes weighted by their shares."""
    terms = [
        share * slopes[leg.material]
        for leg, share in zip(legs(network), leg_shares(network, ratios), strict=True)
    ]
    return np.asarray(sum(terms[1:], terms[0]))


def _reciprocal(series: FloatArray) -> FloatArray:
    """Return the power series of 1/s, truncated at the length of ``series``."""
    out = np.zeros_like(series)
    out[0] = 1.0 / series[0]
    for n in range(1, len(series)):
        out[n] = -np.dot(series[1 : n + 1], out[n - 1 :: -1][:n]) / series[0]
    return out


def taylor(network: Network, coefficients: Mapping[str, Sequence[float]]) -> tuple[float, ...]:
    """Return the Taylor coefficients (TC1, TC2, ...) [1/K^n] of R(T)/R(T_ref).

    Parameters
    ----------
    network : Network
    coefficients : mapping of material to (tc1, tc2, ...) [1/K^n], all about T_ref
    """

    def power_series(node: Network) -> FloatArray:
        if isinstance(node, Leg):
            return node.ohms * np.array([1.0, *coefficients[node.material]])
        parts = [power_series(child) for child in node.children]
        if isinstance(node, Series):
            return np.asarray(sum(parts[1:], parts[0]))
        inverse = [_reciprocal(part) for part in parts]
        return _reciprocal(np.asarray(sum(inverse[1:], inverse[0])))

    whole = power_series(network)
    return tuple(float(c) for c in whole[1:] / whole[0])


def mapped(network: Network, change: Callable[[Leg], Leg]) -> Network:
    """Return the same tree with every leg replaced by ``change(leg)``."""
    if isinstance(network, Leg):
        return change(network)
    return type(network)(tuple(mapped(child, change) for child in network.children))


def scaled(network: Network, factor: float) -> Network:
    """Return the network with every leg multiplied by ``factor``."""
    return mapped(network, lambda leg: replace(leg, ohms=leg.ohms * factor))


def deviated(network: Network, factors: Mapping[str, float]) -> Network:
    """Return the network with every leg multiplied by the value factor of its material."""
    return mapped(network, lambda leg: replace(leg, ohms=leg.ohms * factors.get(leg.material, 1.0)))


def tree(network: Network) -> dict[str, Any]:
    """Return the nesting as plain data: {"series": [...]}, {"parallel": [...]}, {"leg": "a"}."""
    names = iter(leg_names(len(legs(network))))

    def node(part: Network) -> dict[str, Any]:
        if isinstance(part, Leg):
            return {"leg": next(names)}
        kind = "series" if isinstance(part, Series) else "parallel"
        return {kind: [node(child) for child in part.children]}

    return node(network)


def network_from_tree(data: Mapping[str, Any], by_id: Mapping[str, Leg]) -> Network:
    """Return the network of a nesting made by :func:`tree` and its legs by id."""
    kind = next(iter(data), "") if isinstance(data, Mapping) and len(data) == 1 else ""
    content = data[kind] if kind else None
    if kind == "leg" and isinstance(content, str) and content in by_id:
        return by_id[content]
    if kind not in ("series", "parallel") or not isinstance(content, list):
        expected = "a table with one key: leg with the id of a leg, or series or parallel with a list"
        raise InputError(Problem(where="tree", found=shown(data), expected=expected))
    children = tuple(network_from_tree(child, by_id) for child in content)
    return Series(children) if kind == "series" else Parallel(children)


def network_text(network: Network, show: Callable[[Leg], str] | None = None) -> str:
    """Return the text form, ``a + (b || c)``; by default every value at full precision.

    ``parse_network(network_text(n))`` gives ``n`` back exactly.

    Examples
    --------
    >>> network_text(Series((Leg(material="red_film", ohms=5100.0), Leg(material="blue_film", ohms=3300.0))))
    'red_film 5100.0 ohm + blue_film 3300.0 ohm'
    """
    show = show or (lambda leg: f"{leg.material} {leg.ohms!r} ohm")
    if isinstance(network, Leg):
        return show(network)
    parts = [
        network_text(child, show) if isinstance(child, Leg) else f"({network_text(child, show)})"
        for child in network.children
    ]
    return (" + " if isinstance(network, Series) else " || ").join(parts)


def symbolic(
    network: Network, expressions: Mapping[str, sympy.Expr], values: Mapping[int, Any] | None = None
) -> sympy.Expr:
    """Return R(T) as a sympy expression of the materials' ratios.

    Parameters
    ----------
    network : Network
    expressions : mapping of material to R_i(T)/R_i(T_ref)
    values : mapping of a leg's position to what stands for its ohms; its number by default
    """
    import sympy as sp

    positions: Iterator[int] = iter(range(len(legs(network))))

    def node(part: Network) -> sympy.Expr:
        if isinstance(part, Leg):
            position = next(positions)
            ohms = (values or {}).get(position, sp.Float(part.ohms, 17))
            return ohms * expressions[part.material]
        children = [node(child) for child in part.children]
        if isinstance(part, Series):
            return sp.Add(*children)
        return 1 / sp.Add(*(1 / child for child in children))

    return node(network)


def simplified(network: Network) -> Network:
    """Return the same network with nested equal nodes opened and legs of one material merged."""
    if isinstance(network, Leg):
        return network
    kind = type(network)
    children: list[Network] = []
    for child in map(simplified, network.children):
        children.extend(child.children if isinstance(child, kind) else (child,))
    merged = _merge_legs(children, series=kind is Series)
    return merged[0] if len(merged) == 1 else kind(tuple(merged))


def _merge_legs(children: Sequence[Network], *, series: bool) -> list[Network]:
    """Join the legs of one material; the first keeps its place."""

    def joined(one: float, other: float) -> float:
        return one + other if series else 1.0 / (1.0 / one + 1.0 / other)

    by_material: dict[str, list[float]] = {}
    order: list[Network | str] = []
    for child in children:
        if isinstance(child, Leg):
            if child.material not in by_material:
                order.append(child.material)
            by_material.setdefault(child.material, []).append(child.ohms)
        else:
            order.append(child)
    return [
        Leg(material=item, ohms=reduce(joined, by_material[item])) if isinstance(item, str) else item
        for item in order
    ]
