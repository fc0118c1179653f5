"""Invented composites and their measured devices, for the tests of comparing: a scalar twin of its own."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from makers import by_name, film, leg, need_of, over

from tcplan.measure.comparison import Expected
from tcplan.measure.model import Sweep
from tcplan.network import Leg, Network, Parallel, Series
from tcplan.worst.box import Box, Device

REFERENCE = 298.15
FILMS = (  # name, TC1 ppm/K, TC2 ppm/K^2, then limits: value %, TC1 ppm/K, TC2 ppm/K^2
    ("pp", -120.0, 0.55, 12.0, 30.0, 0.1),
    ("np", 150.0, 0.40, 9.0, 24.0, 0.08),
    ("nd", 1500.0, 0.60, 15.0, 60.0, 0.2),
)
Deviations = Mapping[tuple[str, str], float]


def films(*, value: bool = True, laws: bool = True):
    return by_name(
        *(
            film(
                name,
                tc1,
                tc2,
                value_percent=v if value else 0.0,
                tc1_spread_ppm=a if laws else 0.0,
                tc2_spread_ppm=b if laws else 0.0,
            )
            for name, tc1, tc2, v, a, b in FILMS
        )
    )


def scalar_ohms(
    network: Network, materials, off: Deviations, t: float, reference: float = REFERENCE
) -> float:
    """Return R(T) of one device: one leg, one temperature at a time, polynomials written out."""
    if isinstance(network, Leg):
        law = materials[network.material].law
        a, b = law.coefficients
        x, at = t - law.reference, reference - law.reference
        shift = off.get((network.material, "tc1"), 0.0) * x + off.get((network.material, "tc2"), 0.0) * x * x
        body = (1.0 + a * x + b * x * x + shift) / (1.0 + a * at + b * at * at)
        return network.ohms * (1.0 + off.get((network.material, "value"), 0.0)) * body
    parts = [scalar_ohms(child, materials, off, t, reference) for child in network.children]
    return sum(parts) if isinstance(network, Series) else 1.0 / sum(1.0 / part for part in parts)


def device_ohms(network: Network, materials, off: Deviations, T) -> np.ndarray:
    return np.array([scalar_ohms(network, materials, off, float(t)) for t in T])


def sweep_of(T, R, u=None, u_T=None, names=("D1",), device=None, source="sweep.csv") -> Sweep:
    T, R = np.asarray(T, dtype=float), np.asarray(R, dtype=float)
    zeros = np.zeros(len(T), dtype=np.intp)

    def column(value):
        return None if value is None else np.broadcast_to(np.asarray(value, dtype=float), T.shape).copy()

    return Sweep(
        source=source,
        T=T,
        R=R,
        u_T=column(u_T),
        u_R=column(u),
        device=zeros if device is None else np.asarray(device, dtype=np.intp),
        lot=zeros,
        devices=names,
        lots=("",),
        line=np.arange(2, len(T) + 2),
    )


def expected_of(network: Network, materials, *limits, **more) -> Expected:
    """Return what a plan would say; the band is that of all corners of the box, for two or three films."""
    need = need_of(*limits)
    spreads = {name: m.spread for name, m in materials.items() if m.spread is not None}
    return Expected(
        name="given",
        network=network,
        materials=materials,
        spreads=spreads,
        need=need,
        over=over(),
        band=more.pop("band", None) or corner_band(network, materials, spreads, need),
        **more,
    )


def corner_band(network, materials, spreads, need):
    """Return the drift between which the corners of the spread box lie."""
    box = Box(network, materials, spreads, need)

    def band(T):
        every = []
        for signs in np.ndindex(*(2,) * (2 * len(box.names))):
            side = 2 * np.array(signs) - 1
            factors = dict(
                zip(box.names, (1.0 + box.half_widths() * side[: len(box.names)]).tolist(), strict=True)
            )
            shifts = {
                n: (s * (spreads[n].tc1 or 0.0), s * (spreads[n].tc2 or 0.0))
                for n, s in zip(box.names, side[len(box.names) :].tolist(), strict=True)
            }
            every.append(box.curve(Device(factors, shifts))(T) - need.wanted(T))
        return np.min(every, axis=0), np.max(every, axis=0)

    return band


SERIES = Series((leg("pp", 8000.0), leg("np", 7000.0), leg("nd", 500.0)))
PARALLEL = Parallel((leg("pp", 26000.0), leg("np", 52000.0)))
MIXED = Series((leg("pp", 6000.0), Parallel((leg("np", 9000.0), leg("nd", 30000.0)))))
