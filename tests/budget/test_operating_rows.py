"""The rows of self-heating and voltage coefficient, worked by hand."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest
from makers import BRIEF, FILMS, brief, by_name, film, leg, need_of, over

from tcplan.brief.model import Operating
from tcplan.budget.case import Case
from tcplan.budget.extras import operating_rows
from tcplan.budget.sheet import sheet
from tcplan.errors import InputError
from tcplan.goal import Limit
from tcplan.material.model import Film, VoltageCoefficient
from tcplan.network import Series
from tcplan.operating import Element
from tcplan.plan_file import plan_from_dict
from tcplan.workflow.budgeting import budget_of
from tcplan.workflow.planning import make_plan

NEED = need_of(Limit(kind="drift", value=0.01), judge="worst-case")
HOT = np.array([398.15])  # 100 K above the reference
NETWORK = Series((leg("a", 1000.0), leg("b", 3000.0)))


def materials(**stated: float) -> dict:
    """Return a (100 ppm/K) and b (flat), with voltage coefficients [ppm/V] as stated."""
    found = by_name(film("a", 100.0, value_percent=0.0), film("b", 0.0, value_percent=0.0))
    for name, ppm in stated.items():
        k = VoltageCoefficient(per_volt=ppm * 1e-6)
        found[name] = replace(found[name], voltage_coefficient=k)
    return found


def case_of(data: dict, **more: object) -> Case:
    return Case(materials=data, over=over(), need=NEED, **more)  # type: ignore[arg-type]


def test_both_rows_by_hand() -> None:
    """10 mA; a is 1010 ohm at 100 K, b 3000: 0.401 W, at 20 K/W 8.02 K and a little more.

    rise = Rth I^2 R/(1 - Rth I^2 R0 a) of the whole, 4010 ohm with dR/dT 0.1 ohm/K (textbook, from
    memory): 8.02/(1 - 20e-4 * 0.1). Voltage over b: V = I R0/(1 - k I R0) with I R0 = 30 V, k = 10 ppm/V.
    What b takes more heats a more: rise = Rth I (I R_a + V).
    """
    data = materials(a=0.0, b=10.0)
    operating = Operating(current=0.01, thermal_resistance=20.0)
    heating, voltage = operating_rows(NETWORK, case_of(data, operating=operating), HOT)
    rise = 8.02 / (1.0 - 20.0 * 1e-4 * 0.1)
    assert heating.up[0] == pytest.approx(0.1 * rise / 4000.0, rel=1e-9)
    volts = 30.0 / (1.0 - 10e-6 * 30.0)
    whole_rise = 20.0 * 0.01 * (10.1 + volts) / (1.0 - 20.0 * 1e-4 * 0.1)
    both = (0.1 * whole_rise + volts / 0.01 - 3000.0) / 4000.0
    assert heating.up[0] + voltage.up[0] == pytest.approx(both, rel=1e-9)
    for row in (heating, voltage):
        assert row.kind == "systematic"
        assert row.down[0] == row.up[0]
    assert (heating.name, voltage.name) == ("self-heating", "voltage coefficient")
    assert "without power" in heating.note
    assert "R(V) = R(0) (1 + k |V|)" in voltage.note


def test_the_rows_are_in_the_total() -> None:
    """a alone at 100 K has 10000 ppm; its coefficient adds 50 ppm/V * 10 V * 1.01 (of R at the reference)."""
    data = materials(a=50.0)
    case = case_of(data, operating=Operating(voltage=10.0))
    made = sheet(leg("a", 1e3), case, HOT, np.ones(1))
    assert made.total_up[0] * 1e6 == pytest.approx(10000.0 + 505.0)
    assert made.total_down[0] * 1e6 == pytest.approx(10000.0 + 505.0)
    assert [row.name for row in made.rows][-2:] == ["self-heating", "voltage coefficient"]


def test_no_operating_point_no_rows() -> None:
    assert operating_rows(NETWORK, case_of(materials(a=1.0)), HOT) == ()


def test_what_is_not_stated_is_never_zero() -> None:
    heating, voltage = operating_rows(NETWORK, case_of(materials(), operating=Operating(voltage=5.0)), HOT)
    assert heating.up is None
    assert heating.note == "thermal_resistance not stated"
    assert voltage.up is None
    assert voltage.note == "voltage_coefficient not stated: a, b"
    by_leg = Operating(voltage=5.0, leg_thermal_resistance=(("a", 100.0),))
    heating, voltage = operating_rows(NETWORK, case_of(materials(a=10.0), operating=by_leg), HOT)
    assert "not heated: b" in heating.note
    assert "voltage_coefficient not stated: b" in voltage.note
    assert voltage.up[0] > 0.0


def test_a_length_that_is_not_known() -> None:
    """1000 ohm of 100 ohm per square on 2 um: 20 um. 30 ppm*um/V * 1.25 V/20 um on a quarter of the whole."""
    data = materials()
    per_length = VoltageCoefficient(metre_per_volt=30e-12)
    data["a"] = replace(data["a"], voltage_coefficient=per_length)
    at = np.array([298.15])
    operating = Operating(voltage=5.0)
    _, unknown = operating_rows(NETWORK, case_of(data, operating=operating), at)
    assert unknown.up is None
    assert "length of a unit not known: a" in unknown.note
    data["a"] = replace(data["a"], film=Film(min_width=2e-6))
    _, known = operating_rows(NETWORK, case_of(data, operating=operating), at)
    by_hand = 0.25 * 30.0 * 1.25 / 20.0
    assert known.up[0] * 1e6 == pytest.approx(by_hand, rel=1e-5)
    two = (Element(leg="a", units=2, length=10e-6), Element(leg="b"))  # half the voltage on half the length
    _, same = operating_rows(NETWORK, case_of(data, operating=operating, elements=two), at)
    assert same.up[0] == pytest.approx(known.up[0], rel=1e-9)


OPERATING = """
[operating]
voltage = "12 V"
thermal_resistance = "300 K/W"
"""
LONG = FILMS.replace(
    'ohm_per_square = "320 ohm"\n', 'ohm_per_square = "320 ohm"\nvoltage_coefficient = "5 ppm/V"\n'
)


def test_from_a_brief_to_the_budget_and_from_its_plan_alone() -> None:
    plan = make_plan(brief(BRIEF + LONG + OPERATING))
    [account] = budget_of(plan)
    rows = {row.name: row for row in account.budget.rows}
    assert rows["self-heating"].most_ppm > 0.0
    assert "not stated: np" in rows["voltage coefficient"].note
    again = plan_from_dict(json.loads(json.dumps(plan.to_dict())))
    assert budget_of(again)[0].budget == account.budget
    old = plan.to_dict()
    del old["brief"]["operating"]
    names = [row.name for row in budget_of(plan_from_dict(old))[0].budget.rows]
    assert "self-heating" not in names


def test_runaway_is_an_error_of_the_input() -> None:
    hot = OPERATING.replace("300 K/W", "300 K/mW")
    with pytest.raises(InputError) as caught:
        budget_of(make_plan(brief(BRIEF + LONG + hot)))
    assert caught.value.problems[0].where == "operating"
    assert "at most" in caught.value.problems[0].expected
