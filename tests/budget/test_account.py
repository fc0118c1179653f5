"""The budget of an option: peaks, limit, verdict, and the error of the value."""

from __future__ import annotations

from dataclasses import replace
from itertools import product

import numpy as np
import pytest
from makers import BRIEF, FILMS, brief, by_name, film, leg, over, random_films, random_tree

from tcplan.brief import Allowance
from tcplan.budget import Budget, Case, budget
from tcplan.goal import Goal, Limit, Window, requirement
from tcplan.network import Network, Parallel, Series, deviated, resistance, used_materials, value
from tcplan.plan import Option
from tcplan.workflow.planning import make_plan


def option_of(network: Network) -> Option:
    """Return a checked option with another network: the rest of it is not looked at."""
    return replace(PLAN.best, network=network)


PLAN = make_plan(brief(BRIEF.replace('drift = "6000 ppm"', 'drift = "13000 ppm"') + FILMS))


def case_of(materials: dict, *limits: Limit, judge: str = "worst-case", **more: object) -> Case:
    goal = Goal(limits=limits, judge=judge)  # type: ignore[arg-type]
    return Case(materials=materials, over=over(), need=requirement(goal, over()), **more)  # type: ignore[arg-type]


def drift(value_: float) -> Limit:
    return Limit(kind="drift", value=value_)


NETWORKS = [
    Series((leg("m00", 700.0), leg("m01", 300.0))),
    Parallel((leg("m00", 700.0), leg("m02", 4000.0))),
    Series((Parallel((leg("m00", 700.0), leg("m01", 900.0))), leg("m02", 500.0))),
]


@pytest.mark.parametrize("network", NETWORKS)
def test_the_peak_is_that_of_the_worst_case(network: Network) -> None:
    """`tcplan.worst` finds the peak over a continuous range by other means."""
    made = budget(option_of(network), case_of(random_films(5, 3), drift(0.01)))
    assert made.worst_case_ppm * (1 - 1e-9) <= made.peak_ppm <= made.worst_case_bound_ppm * (1 + 1e-4)
    assert made.at_degC == pytest.approx(made.worst_case_at_degC, abs=0.2)
    for up in (True, False):
        parts = [row.up_ppm if up else row.down_ppm for row in made.rows]
        total = made.total_up_ppm if up else made.total_down_ppm
        assert sum(part for part in parts if part is not None) == pytest.approx(total, rel=1e-9)


@pytest.mark.parametrize("network", NETWORKS)
def test_each_side_peaks_over_a_dense_grid(network: Network) -> None:
    """Corners at 4001 temperatures: none beyond the totals; for one node they are attained."""
    films = random_films(5, 3)
    made = budget(option_of(network), case_of(films, drift(0.01)))
    T = np.linspace(233.15, 423.15, 4001)
    drifts = [ratio - 1.0 for ratio, _ in devices(network, films, T)]
    high, low = (max(d.max() for d in drifts), min(d.min() for d in drifts))
    assert high * 1e6 <= made.total_up_ppm * (1 + 1e-6)
    assert low * 1e6 >= made.total_down_ppm * (1 + 1e-6)
    assert high * 1e6 == pytest.approx(made.total_up_ppm, rel=1e-3)
    assert low * 1e6 == pytest.approx(made.total_down_ppm, rel=1e-3)


@pytest.mark.parametrize("network", NETWORKS)
def test_the_total_error_by_brute_force(network: Network) -> None:
    """Every corner of values and TC1: R(T) against the planned value, at 2001 temperatures."""
    films = random_films(5, 3)
    made = budget(option_of(network), case_of(films, drift(0.01)))
    T = np.linspace(233.15, 423.15, 2001)
    errors = [ratio * first - 1.0 for ratio, first in devices(network, films, T)]
    assert made.total_error.reference.source == "value spread"
    assert made.total_error.up_ppm == pytest.approx(max(e.max() for e in errors) * 1e6, rel=1e-6)
    assert made.total_error.down_ppm == pytest.approx(min(e.min() for e in errors) * 1e6, rel=1e-6)


def devices(network: Network, films: dict, T: np.ndarray):
    """Yield R(T)/R(T_ref) and R(T_ref)/planned of every corner."""
    names = used_materials(network)
    for signs in product((-1, 1), repeat=2 * len(names)):
        ratios, factors = {}, {}
        for k, name in enumerate(names):
            spread, x = films[name].spread, T - films[name].reference
            tc1, tc2 = films[name].law.coefficients
            ratios[name] = 1 + (tc1 + signs[k] * spread.tc1) * x + tc2 * x**2
            factors[name] = 1 + signs[len(names) + k] * spread.value
        device = deviated(network, factors)
        yield resistance(device, ratios) / value(device), value(device) / value(network)


@pytest.mark.parametrize(
    ("stated", "first", "source"),
    [({"tolerance": 0.01}, 0.01, "tolerance"), ({"trim_step": 0.002}, 0.001, "trim step")],
)
def test_the_total_error_with_a_stated_error(stated: dict, first: float, source: str) -> None:
    """(1 + e)(1 + d) - 1 by hand, d the totals of the drift; a trim leaves half a step."""
    made = budget(option_of(NETWORKS[0]), case_of(random_films(5, 3), drift(0.01), **stated))
    assert made.total_error.reference.source == source
    up = ((1 + first) * (1 + made.total_up_ppm * 1e-6) - 1) * 1e6
    down = ((1 - first) * (1 + made.total_down_ppm * 1e-6) - 1) * 1e6
    assert made.total_error.up_ppm == pytest.approx(up, rel=1e-9)
    assert made.total_error.down_ppm == pytest.approx(down, rel=1e-9)


def test_the_total_error_is_not_known_without_a_value_spread() -> None:
    films = random_films(5, 2)
    films["m00"] = replace(films["m00"], spread=replace(films["m00"].spread, value=None))
    made = budget(option_of(NETWORKS[0]), case_of(films, drift(0.01)))
    assert made.total_error is None
    assert any("value of m00" in note for note in made.notes)


def test_new_drawings_move_the_value() -> None:
    """One leg drawn as it is, its film 10 % higher: R is 10 % higher, with a tight spread of 0."""
    one = by_name(film("a", 0.0, value_percent=0.0))
    made = budget(option_of(leg("a", 1e3)), case_of(one, drift(0.01), redrawn={"a": 1.1}))
    assert made.total_error.up_ppm == pytest.approx(1e5)
    assert made.network == "a 1100.0 ohm"


# --- the limit ------------------------------------------------------------------------------------------


def flat(tc1_ppm: float, spread_ppm: float | None = 10.0) -> dict:
    percent = None if spread_ppm is None else 10.0
    return by_name(film("a", tc1_ppm, value_percent=percent, tc1_spread_ppm=spread_ppm or 0.0))


def verdict(materials: dict, limit: float | None, **more: object) -> Budget:
    limits = () if limit is None else (drift(limit),)
    return budget(option_of(leg("a", 1e3)), case_of(materials, *limits, **more))


def test_margin_and_verdict_by_hand() -> None:
    """50 +/- 10 ppm/K over 125 K at the hot end: 60 * 125 = 7500 ppm."""
    made = verdict(flat(50.0), 0.008)
    assert made.peak_ppm == pytest.approx(7500.0)
    assert made.margin_ppm == pytest.approx(500.0)
    assert made.verdict == "MET"
    assert made.at_degC == pytest.approx(150.0)
    assert verdict(flat(50.0), 0.0074).verdict == "NOT MET"
    assert verdict(flat(50.0), 0.0075).verdict == "MET"  # the limit itself is kept
    assert verdict(flat(50.0), None).verdict == "NOT JUDGED"
    assert verdict(flat(50.0), None).margin_ppm is None


def test_an_allowance_can_pass_the_limit() -> None:
    more = Allowance(name="ageing", size=600e-6, kind="systematic", source="invented")
    made = verdict(flat(50.0), 0.008, allowances=(more,))
    assert made.peak_ppm == pytest.approx(8100.0)
    assert made.verdict == "NOT MET"
    assert made.worst_case_ppm == pytest.approx(7500.0)


def test_without_a_spread_nothing_is_met() -> None:
    made = verdict(flat(50.0, None), 0.008)
    assert made.verdict == "NOT JUDGED"
    assert made.without_spread == ("a",)
    assert made.knowledge is None
    assert verdict(flat(50.0, None), 0.006).verdict == "NOT MET"  # 6250 ppm at nominal already


def test_signs_are_kept_before_the_peak_is_taken() -> None:
    """A nominal drift of -6250 ppm at 150 degC and an allowance of 500 ppm upwards only: -6250 stays."""
    more = Allowance(name="ageing", size=500e-6, sides="up", kind="systematic", source="invented")
    made = verdict(flat(-50.0, 0.0), 0.01, allowances=(more,))
    assert made.peak_ppm == pytest.approx(6250.0)
    # at -40 degC: 50 * 65 + 500
    assert made.total_up_ppm == pytest.approx(3750.0)


def test_a_mask_is_judged_on_its_scale() -> None:
    """60 ppm/K: inside 0..70 degC 60 * 45 = 2700 of 3000; outside 7500 of 9000, on the scale 2500."""
    mask = Limit(
        kind="mask",
        value=0.003,
        windows=(Window(low=273.15, high=343.15, limit=0.003), Window(low=233.15, high=423.15, limit=0.009)),
    )
    made = budget(option_of(leg("a", 1e3)), case_of(flat(50.0), mask))
    assert made.peak_ppm == pytest.approx(2700.0)
    assert made.limit_ppm == pytest.approx(3000.0)
    assert made.at_degC == pytest.approx(70.0)
    assert made.total_error.at_up_degC == pytest.approx(150.0)  # the value has no mask


def test_a_band_is_bounded() -> None:
    """50 +/- 10 ppm/K over 190 K: the worst device has a band of 60 * 190 = 11400 ppm.

    Highest 7500 and lowest -3900 of all devices together are 11400 as well.
    """
    made = budget(option_of(leg("a", 1e3)), case_of(flat(50.0), Limit(kind="band", value=0.0115)))
    assert made.peak_ppm == pytest.approx(11400.0)
    assert made.verdict == "MET"
    assert any("band" in note for note in made.notes)


def test_a_chord_is_judged_at_the_ends_only() -> None:
    """TC2 alone: 1 ppm/K^2 at 125 K is a chord TCR of 125 ppm/K (by hand)."""
    hump = by_name(film("a", 0.0, 1.0, value_percent=0.0))
    made = budget(option_of(leg("a", 1e3)), case_of(hump, Limit(kind="chord_tcr", value=130e-6)))
    assert made.limit_ppm == pytest.approx(130 * 125.0)
    assert made.peak_ppm == pytest.approx(125.0 * 125)
    assert made.verdict == "MET"


def test_random_trees_are_never_below_their_worst_case() -> None:
    rng = np.random.default_rng(11)
    films = random_films(7, 3)
    for size in (1, 2, 3, 4):
        network = random_tree(rng, tuple(films), size)
        made = budget(option_of(network), case_of(films, drift(0.02)))
        assert made.peak_ppm >= made.worst_case_ppm * (1 - 1e-9)
