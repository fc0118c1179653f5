"""The test plan: where it measures, its uncertainty against drawn tests, and what it accepts."""

from __future__ import annotations

import math

import numpy as np
import pytest
from makers import BRIEF, FILMS, brief, brute_ratio

from tcplan.plan import Plan
from tcplan.spec.sections_tests import test_section as section_of
from tcplan.spec.test_plan import Instruments
from tcplan.spec.test_plan import test_plan as plan_of_test
from tcplan.workflow.planning import make_plan

GIVEN = '\n[given]\nnetwork = "(pp 12 kohm || np 30 kohm) + np 4 kohm"\n'
WORST = BRIEF.replace('drift = "6000 ppm"', 'drift = "17000 ppm"\njudge = "worst-case"')
ONE = Instruments()


def planned(text: str) -> Plan:
    return make_plan(brief(text + FILMS + GIVEN))


@pytest.fixture(scope="module")
def plan() -> Plan:
    return planned(WORST)


def test_it_measures_at_the_ends_the_reference_and_the_extremes(plan: Plan) -> None:
    steps = plan_of_test(plan, ONE).steps
    at = [step.at_degC for step in steps]
    assert at == sorted(at)
    assert {-40.0, 25.0, 150.0} <= set(at)
    T = np.linspace(233.15, 423.15, 3801)
    drift = brute_ratio(plan.best.network, plan.by_name, T) - 1.0  # the scalar twin, on a grid of 0.05 K
    for extreme in (T[np.argmax(drift)], T[np.argmin(drift)]):
        assert min(abs(extreme - 273.15 - degC) for degC in at) <= 1.55
    worst = plan.best.worst_case
    assert worst is not None
    assert any("worst case" in step.why and abs(step.at_degC - worst.at_degC) <= 1.5 for step in steps)


def test_the_drifts_are_those_of_the_nominal_and_of_the_worst_device(plan: Plan) -> None:
    steps = plan_of_test(plan, ONE).steps
    T = np.array([step.at_degC + 273.15 for step in steps])
    brute = (brute_ratio(plan.best.network, plan.by_name, T) - 1.0) * 1e6
    assert [step.nominal_ppm for step in steps] == pytest.approx(list(brute), abs=1e-3)
    worst = plan.best.worst_case
    assert worst is not None
    assert max(abs(step.worst_ppm or 0.0) for step in steps) == pytest.approx(worst.peak_ppm, rel=1e-6)


def test_the_uncertainty_is_that_of_drawn_tests(plan: Plan) -> None:
    """20000 tests with errors drawn from rectangles; two standard deviations of the readings are U.

    JCGM 101:2008, propagation of distributions by a Monte Carlo method. The slope of the nominal device alone
    is drawn, so the uncertainty, of the larger slope of two devices, may only be above it.
    """
    made = plan_of_test(plan, ONE)
    rng = np.random.default_rng(7)
    network, materials = plan.best.network, plan.by_name
    own = np.linspace(220.0, 440.0, 2201)
    ratio = brute_ratio(network, materials, own)

    def read(kelvin: float) -> np.ndarray:
        T = kelvin + rng.uniform(-0.5, 0.5, 20_000)
        return np.interp(T, own, ratio) * (1.0 + rng.uniform(-50e-6, 50e-6, 20_000))

    for step in made.steps:
        if step.limit_ppm is None:
            continue
        drift = read(step.at_degC + 273.15) / read(298.15) - 1.0
        drawn = 2.0 * float(np.std(drift)) * 1e6
        assert 0.99 * drawn <= step.uncertainty_ppm <= 2.5 * drawn
        assert step.accepted_ppm == pytest.approx(17000.0 - step.uncertainty_ppm)


def test_without_a_spread_the_uncertainty_is_that_of_the_formula() -> None:
    bare = make_plan(
        brief(
            BRIEF
            + """
[material.line]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "100 ppm/K"
"""
        )
    )
    made = plan_of_test(bare, Instruments(meter_ppm=30.0, thermometer_K=0.2))
    hot = made.steps[-1]
    assert hot.worst_ppm is None
    # By hand for R = 1 + 1e-4 (T - 25 degC): r = 1.0125 at 150 degC; slopes over the half degree inside the
    # range, 1e-4/1.012475 and 1e-4; limits of a rectangle over the root of 3; coverage 2.
    meter, kelvin = 30.0 / math.sqrt(3.0), 0.2 / math.sqrt(3.0)
    thermal = math.hypot(100.0 / 1.012475, 100.0) * kelvin
    by_hand = 2.0 * 1.0125 * math.sqrt(2.0 * meter**2 + thermal**2)
    assert hot.uncertainty_ppm == pytest.approx(by_hand, rel=1e-6)
    assert made.value_uncertainty_ppm == pytest.approx(2.0 * math.hypot(meter, 100.0 * kelvin), rel=1e-6)


def test_better_instruments_accept_more(plan: Plan) -> None:
    good = plan_of_test(plan, Instruments(meter_ppm=5.0, thermometer_K=0.05))
    for coarse, fine in zip(plan_of_test(plan, ONE).steps, good.steps, strict=True):
        if coarse.accepted_ppm is not None and fine.accepted_ppm is not None:
            assert coarse.accepted_ppm < fine.accepted_ppm < 17000.0


def test_a_mask_has_its_own_limit_at_each_temperature() -> None:
    mask = '[["0 degC", "70 degC", "1 %"], ["-40 degC", "150 degC", "2 %"]]'
    made = plan_of_test(planned(BRIEF.replace('drift = "6000 ppm"', f"mask = {mask}")), ONE)
    limits = {step.at_degC: step.limit_ppm for step in made.steps}
    assert limits[-40.0] == pytest.approx(20_000.0)
    assert limits[150.0] == pytest.approx(20_000.0)
    inner = [limit for at, limit in limits.items() if 0.0 <= at <= 70.0 and at != 25.0]
    assert inner == pytest.approx([10_000.0] * len(inner))


def test_a_chord_limit_holds_at_the_ends_only() -> None:
    made = plan_of_test(planned(BRIEF.replace('drift = "6000 ppm"', 'chord_tcr = "100 ppm/K"')), ONE)
    limits = {step.at_degC: step.limit_ppm for step in made.steps}
    # a chord of 100 ppm/K over 65 K and over 125 K
    assert limits.pop(-40.0) == pytest.approx(6500.0)
    assert limits.pop(150.0) == pytest.approx(12_500.0)
    assert set(limits.values()) == {None}


def test_a_band_is_judged_by_all_readings_together() -> None:
    plan = planned(BRIEF.replace('drift = "6000 ppm"', 'box_tcr = "100 ppm/K"'))
    made = plan_of_test(plan, ONE)
    assert made.band is not None
    assert made.band.limit_ppm == pytest.approx(19_000.0)  # 100 ppm/K over 190 K
    assert made.band.accepted_ppm < 19_000.0 - max(step.uncertainty_ppm for step in made.steps)
    assert all(step.limit_ppm is None for step in made.steps)
    assert section_of(plan, ONE).tables[0].rows[-1][1].text == "highest less lowest reading"


def test_a_test_that_is_not_sure_enough_accepts_nothing() -> None:
    plan = planned(BRIEF.replace("6000 ppm", "60 ppm"))
    accepted = [row[-1].text for row in section_of(plan, ONE).tables[0].rows]
    assert accepted.count("none: the test is not sure enough") >= 2


def test_a_tolerance_is_accepted_less_the_uncertainty_of_one_reading() -> None:
    plan = planned(BRIEF.replace('value = "18 kohm"', 'value = "18 kohm"\ntolerance = "1 %"'))
    own = plan_of_test(plan, ONE).value_uncertainty_ppm
    note = next(
        item
        for block in section_of(plan, ONE).blocks
        if block.kind == "points"
        for item in block.items
        if "value at" in item
    )
    accepted = float(note.split("+/-")[1].split()[0])
    assert 10_000.0 - own - 100.0 <= accepted <= 10_000.0 - own


def test_the_instruments_are_told(plan: Plan) -> None:
    blocks = section_of(plan, Instruments(meter_ppm=20.0, thermometer_K=0.1)).blocks
    told = " ".join(item for block in blocks if block.kind == "points" for item in block.items)
    assert "a meter within 20 ppm" in told
    assert "0.1 K: limits of error" in told
