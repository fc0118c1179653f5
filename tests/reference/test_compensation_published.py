"""The main job against published values: zero-TC pairs, swamped coils, minimax residuals, identities."""

from dataclasses import replace

import numpy as np
import pytest
from makers import brief, by_name, film, grid, leg, need_of, over

from tcplan.drift import extremes, panels
from tcplan.goal import Limit
from tcplan.material.files import published
from tcplan.network import Parallel, Series, legs, resistance, shares, value
from tcplan.plan import Space
from tcplan.search.linear import search_space
from tcplan.verify.option import Case, check
from tcplan.workflow.planning import make_plan


def test_nichrome_and_constantan_pair():
    """CRC Handbook wire tables: resistivities at 0, 20, 25, 100 degC (1e-8 ohm m) nichrome 107.3 107.5 107.6
    108.3, constantan 45.43 45.38 45.35 45.11. Mean TCR 20..100 degC +93.02 and -74.37 ppm/K; a
    nichrome share of
    .444290 makes R(20) = R(100); drift at 0 degC is then -214.3 ppm (shares computed)."""
    alloys = published("alloys")
    nichrome, constantan = alloys["nichrome"], alloys["constantan"]
    cold, high = (np.array([t + 273.15]) for t in (0.0, 100.0))
    rn, rc = ((m.ratio(high, 293.15)[0] - 1) for m in (nichrome, constantan))
    assert rn / 80 * 1e6 == pytest.approx(93.02, abs=0.005)
    assert rc / 80 * 1e6 == pytest.approx(-74.37, abs=0.005)
    share = -rc / (rn - rc)
    assert share == pytest.approx(0.444290, abs=5e-6)
    network = Series((leg("nichrome", share), leg("constantan", 1 - share)))
    ratios = {m.name: m.ratio(cold, 293.15) for m in (nichrome, constantan)}
    drift = resistance(network, ratios)[0] / value(network) - 1
    assert drift * 1e6 == pytest.approx(-214.3, abs=0.1)


def test_zero_tc_pair_of_a_physics_exercise():
    """General-physics exercise (Giancoli type), seen: 6.50 kohm at 0 degC from alpha -5.0e-4 and
    +4.0e-4 per K:
    2888.89 and 3611.11 ohm. Found by the search, not set."""
    films = by_name(film("carbon", -500, reference=273.15), film("wire", 400, reference=273.15))
    need = need_of()
    from tcplan.goal import Goal, requirement
    from tcplan.ranges import temperature_range

    room = temperature_range(263.15, 313.15, 273.15)
    need = requirement(Goal(), room)
    space = Space(arrangement="series", materials=("carbon", "wire"), most=2, min_share=0.0)
    network = search_space(replace(space, ohms=6500.0), need, films, 1)[0].network
    ohms = {one.material: one.ohms for one in legs(network)}
    assert ohms == pytest.approx({"carbon": 2888.89, "wire": 3611.11}, rel=1e-5)
    option = check(
        next(iter(search_space(replace(space, ohms=6500.0), need, films, 1))),
        Case(materials=films, spreads={}, over=room, need=need),
        "x",
    )
    assert option.nominal.peak_ppm < 1e-6


def test_parallel_identity():
    """Identity: equal values with laws 1 +/- a x in parallel give R/R_ref = 1 - (a x)^2 exactly."""
    films = by_name(film("up", 700), film("down", -700))
    T = grid(count=1001)
    ratios = {n: m.ratio(T, 298.15) for n, m in films.items()}
    got = resistance(Parallel((leg("up", 2.0), leg("down", 2.0))), ratios)
    np.testing.assert_allclose(got, 1 - (700e-6 * (T - 298.15)) ** 2, rtol=1e-14)


@pytest.mark.parametrize(("curvature", "low", "high"), [(0.5, -40.0, 125.0), (2.0, -55.0, 90.0)])
def test_least_band_of_a_quadratic_residual(curvature, low, high):
    """Chebyshev (Cheney; Rivlin): the least band of A x + B x^2 on [l, h] is B (h - l)^2/4, at A =
    -B (l + h).
    Reached by the search over two films of equal curvature and opposite slope."""
    films = by_name(film("up", 600, curvature), film("down", -600, curvature))
    need = need_of(Limit(kind="band", value=0.01), low=low, high=high)
    space = Space(arrangement="series", materials=("down", "up"), most=2, min_share=0.0)
    proposal = search_space(replace(space, ohms=1.0), need, films, 1)[0]
    option = check(proposal, Case(materials=films, spreads={}, over=over(low, high), need=need), "x")
    assert option.nominal.band_ppm == pytest.approx(curvature * (high - low) ** 2 / 4, rel=1e-9)
    slope = -curvature * ((low - 25) + (high - 25))
    assert option.nominal.tc1_ppm_per_K == pytest.approx(slope, abs=1e-6)
    assert option.proof.kind == "global"


def test_parabola_by_a_line():
    """Chebyshev: x^2 by a line on [a, b] errs by (b - a)^2/8, to 1e-12."""
    found = extremes(lambda x: x**2 - (4 * x - 4 + 4.5), panels(-1.0, 5.0))
    assert found.peak.value == pytest.approx(36 / 8, abs=1e-12)


def test_swamped_coil():
    """Electrical-measurement exercise, statement seen, result computed: 400 ohm copper (.004 per K)
    and 2600 ohm of
    an alloy (1e-5 per K) in series: 542.0 ppm/K."""
    films = by_name(film("copper", 4000), film("alloy", 10))
    network = Series((leg("copper", 400.0), leg("alloy", 2600.0)))
    case = Case(materials=films, spreads={}, over=over(0, 70), need=need_of(low=0, high=70))
    from tcplan.plan import Proposal

    option = check(Proposal(network=network), case, "x")
    assert option.nominal.tc1_ppm_per_K == pytest.approx(542.0, rel=1e-4)
    assert shares(network)[0] == pytest.approx(400 / 3000)


def test_shunted_ammeter():
    """Electrical-measurement exercise, statement seen, result computed: copper coil 25 ohm, 1 mA
    full scale, a
    manganin shunt for 100 mA, +10 K, alphas .004 and .00015: the reading changes by -3.66626 % alone and by
    -0.942481 % with 75 ohm of manganin in series with the coil."""
    films = by_name(film("copper", 4000), film("manganin", 150))

    def reading(series_ohms):
        branch = leg("copper", 25.0)
        coil = Series((branch, leg("manganin", series_ohms))) if series_ohms else branch
        own = value(coil)
        shunt = leg("manganin", own * 1e-3 / 99e-3)

        def current(T):
            ratios = {n: m.ratio(np.array([T]), 298.15) for n, m in films.items()}
            rc = resistance(coil, ratios)[0]
            rs = resistance(shunt, ratios)[0]
            return rs / (rs + rc)

        return (current(308.15) / current(298.15) - 1) * 100

    assert reading(0.0) == pytest.approx(-3.66626, rel=1e-4)
    assert reading(75.0) == pytest.approx(-0.942481, rel=1e-4)


COIL = """
schema = 1
title = "Coil"
[resistor]
value = "free"
[temperature]
low = "0 degC"
high = "70 degC"
[goal]
chord_tcr = "542 ppm/K"
[search]
use = ["alloy"]
[[fixed]]
material = "copper"
value = "400 ohm"
[material.copper]
source = "invented"
reference = "25 degC"
valid = ["-20 degC", "90 degC"]
tc1 = "4000 ppm/K"
[material.alloy]
source = "invented"
reference = "25 degC"
valid = ["-20 degC", "90 degC"]
tc1 = "10 ppm/K"
"""


def test_least_total_of_the_swamped_coil():
    """The same exercise turned round: 542.0 ppm/K is met with 2600 ohm of alloy, a total of 3000 ohm."""
    plan = make_plan(brief(COIL))
    assert plan.best.role == "least total"
    assert value(plan.best.network) == pytest.approx(3000.0, rel=1e-6)
    assert plan.best.verdict == "MET"
