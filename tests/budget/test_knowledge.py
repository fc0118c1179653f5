"""The floor of the TC spreads, and how well TC1 must be known, by hand."""

from __future__ import annotations

from dataclasses import replace

import pytest
from makers import by_name, film, need_of, over

from tcplan.budget.case import Case
from tcplan.budget.knowledge import knowledge
from tcplan.budget.model import Knowledge
from tcplan.goal import Limit
from tcplan.verify.floor import spread_bound


def case_of(limit: float, *spreads_ppm: float, tc2_ppm: float = 0.0) -> Case:
    films = [
        film(f"m{k}", 0.0, value_percent=10.0, tc1_spread_ppm=ppm, tc2_spread_ppm=tc2_ppm)
        for k, ppm in enumerate(spreads_ppm)
    ]
    need = need_of(Limit(kind="drift", value=limit), judge="worst-case")
    return Case(materials=by_name(*films), over=over(), need=need)


def known(limit: float, *spreads_ppm: float, tc2_ppm: float = 0.0) -> Knowledge:
    found = knowledge(case_of(limit, *spreads_ppm, tc2_ppm=tc2_ppm))
    assert found is not None
    return found


def test_the_floor_is_that_of_the_proof() -> None:
    """`tcplan.verify` proves the same floor by its own code. By hand: (rho - 1)/(rho + 1) of
    rho = (1 + u)/(1 - u) is u itself, 40 ppm/K * 125 K = 5000 ppm."""
    case = case_of(0.01, 40.0, 60.0)
    bound, at, name = spread_bound(case.need, list(case.materials.values()), case.spreads())
    found = knowledge(case)
    assert found is not None
    assert found.floor_ppm == pytest.approx(bound * 1e6, abs=1e-5)
    assert found.floor_ppm == pytest.approx(5000.0)
    assert found.at_degC + 273.15 == pytest.approx(at)
    assert (name, found.material) == ("m0", "")


def test_the_least_uncertain_one_has_to_be_known_better() -> None:
    """3000 ppm at 125 K are 24 ppm/K: 40 has to shrink to 0.6 of itself, 60 to 0.4."""
    found = known(0.003, 60.0, 40.0)
    assert found.material == "m1"
    assert found.tc1_now_ppm_per_K == pytest.approx(40.0)
    assert found.tc1_needed_ppm_per_K == pytest.approx(24.0, rel=1e-6)


def test_what_is_found_is_enough_and_no_more_than_needed() -> None:
    first = known(0.003, 60.0, 40.0).tc1_needed_ppm_per_K
    assert first is not None
    assert known(0.003, 60.0, first * (1 - 1e-8)).floor_ppm <= 3000.0
    assert known(0.003, 60.0, first * (1 + 1e-6)).floor_ppm > 3000.0


def test_tc2_alone_can_be_too_uncertain() -> None:
    """0.5 ppm/K^2 * 125^2 = 7812 ppm by itself: no TC1 helps a limit of 3000."""
    found = known(0.003, 60.0, 40.0, tc2_ppm=0.5)
    assert found.material == "m1"
    assert found.tc1_needed_ppm_per_K is None


def test_a_material_that_ends_earlier_is_left_out() -> None:
    case = case_of(0.003, 60.0, 40.0)
    short = replace(case.materials["m1"], valid=(253.15, 373.15))
    found = knowledge(replace(case, materials={**case.materials, "m1": short}))
    assert found is not None
    assert found.material == "m0"


def test_bands_ask_nothing_of_the_floor() -> None:
    case = case_of(0.003, 60.0)
    need = need_of(Limit(kind="band", value=0.003), judge="worst-case")
    assert knowledge(replace(case, need=need)) is None
