"""Pairs for tests of ratios, and their drift computed again by other means: scalars, no shared code."""

import numpy as np
from makers import film, need_of

from tcplan.brief.model import Ratio
from tcplan.goal import Limit
from tcplan.network import Leg, Series
from tcplan.network_reading import parse_network
from tcplan.process import INDEPENDENT
from tcplan.ratio.pair import Pair

DRIFT = need_of(Limit(kind="drift", value=1e-3))


def pair(kind, first, second, materials, tracking=0.0, process=INDEPENDENT, need=DRIFT):
    """Return a pair of two networks, as text or as networks."""
    networks = [parse_network(one) if isinstance(one, str) else one for one in (first, second)]
    return Pair(
        ratio=Ratio(kind=kind, first=networks[0], second=networks[1], tracking=tracking),
        materials=materials,
        spreads={name: m.spread for name, m in materials.items() if m.spread is not None},
        need=need,
        process=process,
        tracking=tracking,
    )


def films(rng, names, references=(298.15,)):
    """Return random films by name, with spreads of value, TC1 and TC2."""
    return {
        name: film(
            name,
            float(rng.uniform(-1200, 1500)),
            float(rng.uniform(-0.5, 3.0)),
            value_percent=float(rng.uniform(5, 20)),
            tc1_spread_ppm=float(rng.uniform(10, 90)),
            tc2_spread_ppm=float(rng.uniform(0.0, 0.2)),
            reference=float(rng.choice(references)),
        )
        for name in names
    }


def ohms(node, laws, factors):
    """Return the resistance of a tree of legs."""
    if isinstance(node, Leg):
        return node.ohms * factors[node.material] * laws[node.material]
    parts = [ohms(child, laws, factors) for child in node.children]
    return sum(parts) if isinstance(node, Series) else 1 / sum(1 / part for part in parts)


def drift_of(one, factors, shifts, apart, T):
    """Return q(T)/q(T_ref) - 1 of a device, from the definition."""
    reference = one.need.reference

    def ratio(t):
        laws = ({}, {})
        for name, material in one.materials.items():
            a, b = (c * 1e-6 for c in COEFFICIENTS(material))
            da, db = shifts[name]

            def device(x, a=a, b=b, da=da, db=db):
                return 1 + (a + da) * x + (b + db) * x * x

            own = device(t - material.reference) / device(reference - material.reference)
            for side in (0, 1):
                laws[side][name] = own + apart[name][side] * (t - reference)
        first, second = (
            ohms(n, law, factors) for n, law in zip((one.ratio.first, one.ratio.second), laws, strict=True)
        )
        return first / second if one.ratio.kind == "gain" else second / (first + second)

    return ratio(T) / ratio(reference) - 1


def COEFFICIENTS(material):  # noqa: N802
    """Return TC1 and TC2 of a film [ppm/K, ppm/K^2]."""
    stated = material.law.parameters()
    return stated["tc1_ppm_per_K"], stated.get("tc2_ppm_per_K2", 0.0)


def devices(one, rng, count):
    """Yield random devices of the box of a pair, half of them at its corners."""
    limits = {n: s.limits() for n, s in one.spreads.items()}
    for k in range(count):

        def part(k=k):
            z = rng.uniform(-1, 1)
            return float(np.sign(z)) if k % 2 else float(z)

        groups = dict(enumerate(part() for _ in one.names))
        own = dict(zip(one.names, one.process.value_groups(one.names), strict=True))
        tc1 = {n: part() * (limits[n].tc1 or 0.0) for n in one.names}
        for tracking in one.process.trackings:
            names = [n for n in tracking.materials if n in tc1]
            most = {n: limits[n].tc1 for n in names}
            least = min(most.values())
            low = -0.5 * tracking.within + part() * (least + 0.5 * tracking.within)  # of the least of them
            for n in names:
                a, b = max(-most[n], low), min(most[n], low + tracking.within)
                tc1[n] = 0.5 * (a + b) + part() * 0.5 * (b - a)
        half = 0.5 * one.tracking
        yield (
            {n: 1 + groups[own[n]] * limits[n].value for n in one.names},
            {n: (tc1[n], part() * (limits[n].tc2 or 0.0)) for n in one.names},
            {n: (part() * half, part() * half) if n in one.shared else (0.0, 0.0) for n in one.names},
        )
