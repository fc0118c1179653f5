"""Ends, mismatch and allowances, worked by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from makers import by_name, film, leg, need_of, over

from tcplan.brief import Allowance
from tcplan.budget.case import Case
from tcplan.budget.extras import allowance_row, end_row, mismatch_row
from tcplan.budget.sheet import sheet
from tcplan.goal import Limit
from tcplan.material.model import Film
from tcplan.material.spread import Spread
from tcplan.network import Series

NEED = need_of(Limit(kind="drift", value=0.01), judge="worst-case")
HOT = np.array([398.15])  # 100 K above the reference


def drawn(**more: object) -> dict:
    """Return a drawn film a (100 ppm/K) and a plain film b (flat)."""
    shape = Film(min_width=1e-6, **more)  # type: ignore[arg-type]
    a = replace(film("a", 100.0, value_percent=0.0), film=shape)
    return by_name(a, film("b", 0.0, value_percent=0.0))


def case_of(materials: dict, **more: object) -> Case:
    return Case(materials=materials, over=over(), need=NEED, **more)  # type: ignore[arg-type]


NETWORK = Series((leg("a", 1000.0), leg("b", 3000.0)))


def test_ends_by_hand() -> None:
    """Ends of 10 ohm um on 1 um: 2 * 10 ohm of 1000, s = 0.02; share 1/4; TC1 -900 against 100.

    At x = 100 K: 0.25 * 0.02 * (-1000 ppm/K) * 100 K = -500 ppm. With the resistance known to 40 % and
    its TC1 to 50 ppm/K: 0.25 * 0.02 * (0.4 * 1000 + 1.4 * 50) * 100 = 235 ppm either way.
    """
    materials = drawn(end_resistance=10e-6, end_tc1=-900e-6)
    row = end_row(NETWORK, case_of(materials), HOT)
    assert row.up[0] * 1e6 == pytest.approx(-500.0)
    assert row.down[0] * 1e6 == pytest.approx(-500.0)
    known = Spread(meaning="limits", value=0.0, tc1=0.0, end_resistance=0.4, end_tc1=50e-6)
    materials["a"] = replace(materials["a"], spread=known)
    row = end_row(NETWORK, case_of(materials), HOT)
    assert row.up[0] * 1e6 == pytest.approx(-500.0 + 235.0)
    assert row.down[0] * 1e6 == pytest.approx(-500.0 - 235.0)
    assert "not stated: b" in row.note


@pytest.mark.parametrize("known", [{}, {"end_resistance": 1e-5}, {"end_tc1": -9e-4}])
def test_ends_that_are_not_known_are_never_zero(known: dict) -> None:
    row = end_row(NETWORK, case_of(drawn(**known)), HOT)
    assert row.up is None
    assert row.down is None
    assert "a, b" in row.note


def test_mismatch_by_hand() -> None:
    """1000 ohm of 100 ohm per square, 1 um wide: 10 squares, 10 um^2. A pair has 1 %um/sqrt(10) = 0.316 %,
    a leg 1/sqrt(2) of it, 0.2236 %. The share of a is 1/4 at the reference and 1.01/(1.01 + 3) at 100 K;
    R/R_ref = 1.0025. So 3 * 0.2236 % * (0.251870 - 0.25) * 1.0025 = 12.58 ppm.

    sigma of a pair over sqrt(area): Pelgrom 1989 (from memory).
    """
    row = mismatch_row(NETWORK, case_of(drawn(matching=1e-8)), HOT)
    moved = (1.01 / 4.01 - 0.25) * 1.0025
    by_hand = 3 * 0.01 / np.sqrt(10) / np.sqrt(2) * moved * 1e6
    assert by_hand == pytest.approx(12.58, abs=0.01)
    assert row.up[0] * 1e6 == pytest.approx(by_hand, rel=1e-9)
    assert row.down[0] == -row.up[0]
    assert row.kind == "random"


def test_mismatch_that_is_not_known() -> None:
    row = mismatch_row(NETWORK, case_of(drawn()), HOT)
    assert row.up is None
    assert "a, b" in row.note


def given(name: str, ppm: float, kind: str, *, sides: str = "both", per_kelvin: bool = False) -> Allowance:
    return Allowance(  # type: ignore[arg-type]
        name=name, size=ppm * 1e-6, kind=kind, sides=sides, per_kelvin=per_kelvin, source="invented"
    )


@pytest.mark.parametrize(
    ("sides", "up", "down"), [("both", 200.0, -200.0), ("up", 200.0, 0.0), ("down", 0.0, -200.0)]
)
@pytest.mark.parametrize("per_kelvin", [False, True])
def test_an_allowance_is_for_its_sides(sides: str, up: float, down: float, per_kelvin: bool) -> None:
    size = 2.0 if per_kelvin else 200.0  # 100 K from the reference
    row = allowance_row(given("x", size, "systematic", sides=sides, per_kelvin=per_kelvin), HOT, 298.15)
    assert row.up[0] * 1e6 == pytest.approx(up)
    assert row.down[0] * 1e6 == pytest.approx(down)


def test_allowances_together_by_hand() -> None:
    """a alone, 100 ppm/K at 100 K: 10000 ppm. Systematic: 500 up only, 200 both. Random: 300 and
    4 ppm/K * 100 K = 400, together 500. Up 10000 + 500 + 200 + 500 = 11200, down 10000 - 200 - 500 = 9300.
    """
    stated = (
        given("ageing", 500.0, "systematic", sides="up"),
        given("stress", 200.0, "systematic"),
        given("humidity", 300.0, "random"),
        given("assembly", 4.0, "random", per_kelvin=True),
    )
    made = sheet(leg("a", 1e3), case_of(drawn(), allowances=stated), HOT, np.ones(1))
    assert made.total_up[0] * 1e6 == pytest.approx(11200.0)
    assert made.total_down[0] * 1e6 == pytest.approx(9300.0)
    assert made.random_up[0] * 1e6 == pytest.approx(500.0)
    assert made.worst_up[0] * 1e6 == pytest.approx(10000.0)
