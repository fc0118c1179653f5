"""Whether the intervals of fits hold the truth as often as they say."""

from __future__ import annotations

import numpy as np
import pytest
from fit_sweeps import ROOM, generator, quadratic, sweep_of

from tcplan.material.law import Platinum, SteinhartHart, Thermistor
from tcplan.measure.bands import interval, ohms_band, ratio_band
from tcplan.measure.fit import fit
from tcplan.measure.fit_laws import Formula
from tcplan.measure.model import CommonErrors
from tcplan.measure.referred import referred

ZERO = 273.15
SETS = 2000
TRUTH = {"R": 1e4, "tc1": -350e-6, "tc2": 0.8e-6}
T = np.linspace(-40.0, 125.0, 8) + ZERO
HOT = np.array([398.15])


def held(fits):
    """Return, for each parameter and for the bands at 125 degC, how often the interval holds the truth."""
    share = {n: np.mean([abs(f.value(n) - v) < interval(f, n) for f in fits]) for n, v in TRUTH.items()}
    for name, band, truth in (
        ("ratio", ratio_band, quadratic(HOT, ohms=1.0)[0]),
        ("ohms", ohms_band, quadratic(HOT)[0]),
    ):
        found = np.array([band(f, HOT) for f in fits])
        share[name] = np.mean(np.abs(found[:, 0, 0] - truth) < found[:, 1, 0])
    return share


def check(share):
    # binomial: 2 sigma of 2000 trials is 1 %
    for name, value in share.items():
        assert 0.94 <= value <= 0.96, (name, value)


def test_intervals_from_scatter_hold_the_truth():
    noise = generator(41).normal(0.0, 2.0, (SETS, len(T)))
    check(held([fit(sweep_of(T, quadratic(T) + e), "polynomial", ROOM, order=2) for e in noise]))


@pytest.mark.parametrize("times", [1.0, 2.0])
def test_intervals_without_an_order_hold_the_truth_where_the_quadratic_term_is_small(times):
    # a choice of the order by the same data held it in 42 to 70 %; binomial 3 sigma of 1000 is 2 %
    u = fit(sweep_of(T, quadratic(T), u_R=2.0), "polynomial", ROOM, order=2).uncertainty("tc2")
    truth = times * u
    noise, inside = generator(46).normal(0.0, 2.0, (1000, len(T))), []
    for e in noise:
        found = fit(sweep_of(T, quadratic(T, tc2=truth) + e, u_R=2.0), "polynomial", ROOM)
        ratio, half = ratio_band(found, HOT)
        inside.append(abs(ratio[0] - quadratic(HOT, ohms=1.0, tc2=truth)[0]) < half[0])
    assert np.mean(inside) == pytest.approx(0.95, abs=0.02)


def test_intervals_with_stated_and_common_errors_hold_the_truth():
    common = CommonErrors(
        chamber_offset=0.5, chamber_scale=0.003, lead=2.0, lead_tc1=3.9e-3, meter_scale=2e-4
    )
    random = generator(42)
    u_R, u_T = np.linspace(1.0, 4.0, len(T)), 0.2
    fits = []
    for _ in range(SETS):
        offset, scale, lead, gain = random.normal(0.0, [0.5, 0.003, 2.0, 2e-4])
        actual = T + offset + scale * (T - ROOM) + random.normal(0.0, u_T, len(T))
        R = quadratic(actual) * (1.0 + gain) + lead * (1.0 + 3.9e-3 * (T - ROOM))
        R = R + random.normal(0.0, u_R)
        fits.append(fit(sweep_of(T, R, u_R=u_R, u_T=u_T), "polynomial", ROOM, order=2, common=common))
    check(held(fits))


@pytest.mark.parametrize("model", ["polynomial", "platinum", "thermistor", "steinhart-hart", "formula"])
def test_the_band_is_the_uncertainty_of_the_value_at_that_reference(model):
    # two ways to one number: the band at T, and R after the fit is referred to T; both at 95 %
    laws = {
        "polynomial": lambda T: quadratic(T),
        "platinum": lambda T: 1e3 * Platinum(reference=ZERO).ratio(T),
        "thermistor": lambda T: 1e4 * Thermistor(reference=ROOM, beta=3435.0).ratio(T),
        "steinhart-hart": SteinhartHart(reference=ROOM, a=2.1085e-3, b=0.798e-4, c=6.535e-7).ohms,
        "formula": lambda T: 1e3 * np.exp(2e-3 * (T - ROOM)),
    }
    form = Formula(text="exp(k*(T - T0))", start=(("k", 1e-3),)) if model == "formula" else model
    points = np.linspace(-20.0, 100.0, 16) + ZERO
    R = laws[model](points) * (1.0 + generator(43).normal(0.0, 1e-6, 16))
    found = fit(sweep_of(points, R), form, ROOM, common=CommonErrors(chamber_offset=1e-4))
    at = np.array([258.15, ROOM, 340.0])
    ohms, half = ohms_band(found, at)
    for k, t in enumerate(at):
        moved = referred(found, float(t))
        assert ohms[k] == pytest.approx(moved.ohms, rel=1e-12)
        assert half[k] == pytest.approx(interval(moved, "R"), rel=1e-6)
    ratio, relative = ratio_band(found, at)
    assert ratio == pytest.approx(ohms / found.ohms, rel=1e-12)
    assert relative[1] == pytest.approx(0.0, abs=1e-15)
    assert relative[0] > 0.0


def test_degrees_of_freedom_are_those_of_welch_and_satterthwaite():
    # JCGM 100 G.4: u^4/dof of the scatter alone; with a large common error the factor goes to 1.96
    R = quadratic(T) + generator(44).normal(0.0, 2.0, len(T))
    plain = fit(sweep_of(T, R), "polynomial", ROOM, order=2)
    # Student's t of 5 degrees of freedom at 95 %, any table
    assert interval(plain, "R") / plain.uncertainty("R") == pytest.approx(2.5705818, rel=1e-6)
    common = fit(sweep_of(T, R), "polynomial", ROOM, order=2, common=CommonErrors(meter_scale=0.01))
    assert interval(common, "R") / common.uncertainty("R") == pytest.approx(1.9599640, rel=1e-4)
    stated = fit(sweep_of(T, R, u_R=2.0), "polynomial", ROOM, order=2)
    assert interval(stated, "R") / stated.uncertainty("R") == pytest.approx(1.9599640, rel=1e-6)
