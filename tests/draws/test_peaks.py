"""Figures of many lots against the judgement of one device at a time."""

from dataclasses import replace

import numpy as np
import pytest
from makers import REFERENCE, by_name, film, leg, need_of, random_films, random_tree

from tcplan.draws.blocks import engine_of
from tcplan.draws.nodes import NodePeaks
from tcplan.draws.peaks import QuadraticPeaks
from tcplan.goal import Limit, Window, judged
from tcplan.material.law import Polynomial, law_from_parameters
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Parallel, Series, resistance, used_materials
from tcplan.process import Process

DRIFT = Limit(kind="drift", value=0.01)
MASK = Limit(
    kind="mask",
    value=0.001,
    windows=(Window(low=273.15, high=343.15, limit=0.001), Window(low=233.15, high=398.15, limit=0.003)),
)


def device_curve(network, materials, need, draws, k):
    """Return T -> R(T)/R(T_ref) of lot k by the scalar twin, from the columns alone."""
    sample, z = draws

    def ohms(T):
        ratios = {}
        for place, name in enumerate(sample.names):
            law = materials[name].law
            x = T - law.reference
            device = law.ratio(T) / float(law.ratio(law.reference))
            factor = 1.0
            for term in (t for t in sample.terms if t.material == place):
                off = term.scale * z[term.column, k]
                if term.slot == "value":
                    factor *= 1.0 + off
                elif term.slot == "width":
                    factor /= 1.0 - off
                else:
                    side = {"cold": x < 0, "hot": x > 0}.get(term.slot, np.ones_like(x))
                    device = device + off * (x**2 if term.slot == "tc2" else x * side)
            ratios[name] = (
                factor * device / float(materials[name].ratio(np.array([need.reference]), law.reference)[0])
            )
        return resistance(network, ratios)

    return lambda T: ohms(T) / ohms(np.array([need.reference]))[0]


def check(network, materials, need, kind, count=24):
    spreads = {n: m.spread for n, m in materials.items()}
    engine = engine_of(network, materials, spreads, Process(), need, seed=5)
    assert isinstance(engine.peaks, kind)
    z = engine.lots.draw_columns(5, 0)
    figures = engine.peaks.figures(engine.lots.fill_rows(z))
    kinks = [b for n in used_materials(network) for b in materials[n].law.breakpoints]
    kinks += [materials[n].reference for n in used_materials(network)]
    for k in range(count):
        curve = device_curve(network, materials, need, (engine.lots, z), k)
        assert figures[k] == pytest.approx(judged(curve, need, kinks).figure, rel=1e-6)


def needs():
    wanted = Polynomial(reference=REFERENCE, coefficients=(200e-6, 0.1e-6))
    return [
        need_of(DRIFT),
        need_of(Limit(kind="band", value=0.01)),
        need_of(Limit(kind="box_tcr", value=50e-6)),
        need_of(Limit(kind="chord_tcr", value=50e-6)),
        need_of(MASK),
        need_of(DRIFT, Limit(kind="band", value=0.01), MASK),
        need_of(DRIFT, wanted=wanted),
    ]


@pytest.mark.parametrize("need", needs(), ids=lambda need: need.kind)
def test_series_mixes_in_closed_form(need):
    materials = random_films(3, 4)
    # One film has its data at another temperature than the brief, one no curvature at all.
    other = film("x", 300.0, 1.0, value_percent=20.0, tc1_spread_ppm=50.0, tc2_spread_ppm=0.2)
    law = Polynomial(reference=313.15, coefficients=other.law.coefficients)
    materials["m01"] = replace(other, name="m01", law=law)
    network = Series(tuple(leg(n, 1000.0 * (k + 1)) for k, n in enumerate(materials)))
    check(network, materials, need, QuadraticPeaks)
    check(leg("m01", 100.0), materials, need, QuadraticPeaks)


@pytest.mark.parametrize("need", needs(), ids=lambda need: need.kind)
def test_mixed_networks(need):
    materials = random_films(8, 4)
    for seed in (1, 2, 3):
        tree = random_tree(np.random.default_rng(seed), tuple(materials), 4)
        network = Parallel((tree, leg("m00", 3000.0)))
        check(network, materials, need, NodePeaks, count=8)


def test_an_inner_peak_of_a_cancelled_network():
    films = by_name(
        film("hi", -1400.0, 3.0, value_percent=1.0, tc1_spread_ppm=5.0),
        film("sp", 3100.0, 0.4, value_percent=1.0, tc1_spread_ppm=5.0),
        film("pp", -120.0, 0.55, value_percent=1.0, tc1_spread_ppm=5.0),
    )
    network = Series((Parallel((leg("hi", 4000.0), leg("sp", 9000.0))), leg("pp", 9000.0)))
    check(network, films, need_of(DRIFT), NodePeaks, count=64)


def test_strong_and_kinked_laws():
    thermistor = law_from_parameters({"law": "thermistor", "beta_K": 3435.0, "reference_degC": 25.0})
    platinum = law_from_parameters({"law": "platinum", "reference_degC": 0.0})
    spread = Spread(meaning="limits", value=0.1, tc1=30e-6, tc2=0.1e-6)
    extra = {
        name: Material(
            name=name,
            label=name,
            source="invented",
            law=law,
            valid=(223.15, 433.15),
            kind="plain",
            spread=spread,
        )
        for name, law in (("ntc", thermistor), ("pt", platinum))
    }
    part = film("part", 10.0)
    part = replace(
        part,
        kind="part",
        ohm_per_square=None,
        series="E96",
        spread=Spread(meaning="limits", value=0.01, tcr=50e-6, shape="rectangular"),
    )
    materials = {**extra, "part": part}
    network = Parallel((Series((leg("ntc", 100.0), leg("part", 400.0))), leg("pt", 3000.0)))
    check(network, materials, need_of(DRIFT), NodePeaks, count=12)
    check(Series((leg("part", 10.0), leg("pt", 1.0))), materials, need_of(MASK), NodePeaks, count=12)


def test_a_lot_that_is_no_number_counts_as_outside():
    films = random_films(3, 2)
    network = Parallel((leg("m00", 1.0), leg("m01", 1.0)))
    spreads = {n: m.spread for n, m in films.items()}
    engine = engine_of(network, films, spreads, Process(), need_of(DRIFT), seed=1)
    rows = np.full((len(engine.lots.rows), 3), np.nan)
    assert np.all(engine.peaks.figures(rows) > 1e5)
