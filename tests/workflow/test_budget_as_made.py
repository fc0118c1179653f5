"""The budget of what is made: its rows worked by hand from the units that plan.json holds."""

from __future__ import annotations

import copy
import json
from collections.abc import Callable
from math import sqrt
from pathlib import Path
from typing import Any

import pytest

from tcplan.brief import parse_brief
from tcplan.budget import Account
from tcplan.errors import InputError
from tcplan.made import FilmLeg
from tcplan.plan import Plan, plan_json
from tcplan.plan_file import plan_from_dict, read_plan
from tcplan.workflow.as_made import plan_as_made
from tcplan.workflow.budgeting import budget_of
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan

BODY, ENDS = 200e-6, -900e-6  # TC1 [1/K], both at 25 degC
COEFFICIENT = -40e-12  # R(V) = R (1 + k |V|/L) [m/V]
VOLTS, RISE = 6.0, 400.0  # V, K/W

HEAD = """
schema = 1
title = "One leg"
[resistor]
value = {value}
[temperature]
low = "-40 degC"
high = "125 degC"
reference = "25 degC"
[goal]
drift = "30000 ppm"
judge = "worst-case"
[given]
scaled = true
network = "slate {ohms}"
"""
SLATE = """
[material.slate]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "200 degC"]
tc1 = "200 ppm/K"
ohm_per_square = "300 ohm"
voltage_coefficient = "-40 ppm*um/V"
[material.slate.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "20 ppm/K"
end_resistance = "30 %"
[material.slate.film]
min_width = "2 um"
end_resistance = "60 ohm*um"
end_tc1 = "-900 ppm/K"
matching = "1 %*um"
spacing = "0.6 um"
"""
HEATED = '[operating]\nvoltage = "6 V"\nthermal_resistance = "400 K/W"\n'
COLD = '[operating]\nvoltage = "6 V"\n'
WIRES = """
[material.up]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "93 ppm/K"
ohm_per_metre = "13.8 ohm/m"
[material.up.spread]
meaning = "limits"
ohm_per_metre = "2 %"
tc1 = "10 ppm/K"
"""


def made_of(more: str, value: str = '"12 kohm"', ohms: str = "12 kohm") -> Plan:
    """Return the plan with its parts, as it is read from its file."""
    text = HEAD.format(value=value, ohms=ohms) + more + SLATE
    made = make_parts(make_plan(parse_brief(text, "brief.toml", Path())), PartsRules())
    return read_plan(plan_json(made.plan))


@pytest.fixture(scope="module")
def heated() -> Plan:
    return made_of(HEATED)


def film_of(plan: Plan, k: int = 0) -> FilmLeg:
    assert plan.parts is not None
    [leg] = plan.parts.made[k].legs
    assert isinstance(leg, FilmLeg)
    return leg


def rows_of(account: Account) -> dict[str, Any]:
    assert account.budget is not None
    return {row.name: row for row in account.budget.rows}


def slope_of(leg: FilmLeg) -> float:
    """Return the TC1 of a unit: of its body and its ends by what each is of the whole."""
    unit = leg.unit
    return (unit.body_ohms * BODY + unit.ends_ohms * ENDS) / (unit.body_ohms + unit.ends_ohms)


# --- the rows --------------------------------------------------------------------------------------------


def test_ends_are_in_the_network_and_in_no_row_beside_it(heated: Plan) -> None:
    """Ideal: one body of 200 ppm/K, 20000 ppm at 125 degC, its ends estimated. As made: both in one."""
    [ideal], [made] = budget_of(heated), budget_of(heated, as_made=True)
    assert [name for name in rows_of(ideal) if name.startswith("ends")] == ["ends (not in the plan)"]
    assert not [name for name in rows_of(made) if name.startswith("ends")]
    assert rows_of(ideal)["residual curvature"].most_ppm == pytest.approx(20_000.0, rel=1e-9)
    slope = slope_of(film_of(heated))
    assert abs(slope - BODY) > 1e-7  # the ends do count
    by_hand = abs(slope) * 100.0 * 1e6
    assert rows_of(made)["residual curvature"].most_ppm == pytest.approx(by_hand, rel=1e-9)
    assert made.budget.nominal_ppm == pytest.approx(by_hand, rel=1e-9)  # type: ignore[union-attr]


def test_self_heating_of_one_leg_is_the_closed_form(heated: Plan) -> None:
    """Rth V^2 = rise R0 (1 + a (x + rise)): a quadratic in the rise; the drift moves by a rise (textbook).

    Body and ends are at one temperature, so that a is the slope of the whole unit.
    """
    leg = film_of(heated)
    [account] = budget_of(heated, as_made=True)
    row, made = rows_of(account)["self-heating"], account.budget
    assert made is not None
    a = slope_of(leg)
    for told, at in ((row.up_ppm, made.at_up_degC), (row.down_ppm, made.at_down_degC)):
        cold = 1 + a * (at - 25.0)
        heat = RISE * VOLTS**2 / leg.ohms
        rise = (-cold + sqrt(cold**2 + 4 * a * heat)) / (2 * a)
        assert rise == pytest.approx(heat / cold, rel=0.01)
        assert told == pytest.approx(a * rise * 1e6, rel=1e-6)
    assert row.kind == "systematic"
    assert row.up_ppm > 1.0


@pytest.mark.parametrize(("value", "strings"), [('"12 kohm"', False), ('"45 ohm"', True)])
def test_the_voltage_coefficient_is_of_each_unit_by_its_own_voltage(value: str, strings: bool) -> None:
    """V/n across one of n units in series, whatever the strings; of it the body has its part.

    R moves by n body k V_body/L over m strings, with V_body = V/n body/unit; the slope of R with V is of
    the second order.
    """
    plan = made_of(COLD, value, value.strip('"'))
    leg = film_of(plan)
    assert (leg.in_parallel > 1) is strings
    [account] = budget_of(plan, as_made=True)
    row, made = rows_of(account)["voltage coefficient"], account.budget
    assert made is not None
    unit = leg.unit
    for told, at in ((row.up_ppm, made.at_up_degC), (row.down_ppm, made.at_down_degC)):
        body, ends = unit.body_ohms * (1 + BODY * (at - 25)), unit.ends_ohms * (1 + ENDS * (at - 25))
        across = VOLTS / leg.in_series * body / (body + ends)
        moved = leg.in_series / leg.in_parallel * body * COEFFICIENT * across / unit.length
        assert told == pytest.approx(moved / leg.ohms * 1e6, rel=1e-3)
    assert rows_of(account)["self-heating"].up_ppm is None
    assert rows_of(account)["self-heating"].note == "thermal_resistance not stated"


def test_each_value_has_a_budget_of_its_own_units() -> None:
    """Twice the units of one cell: half the voltage across each, so half the row; heat is half as well."""
    plan = made_of(HEATED, '["12 kohm", "24 kohm"]')
    one, two = film_of(plan, 0), film_of(plan, 1)
    assert one.unit == two.unit
    first, second = budget_of(plan, as_made=True)
    assert [first.option, second.option] == ["given-made-1", "given-made-2"]
    counts = one.in_series / two.in_series
    for name, by in (("voltage coefficient", counts), ("self-heating", one.ohms / two.ohms)):
        ratio = rows_of(second)[name].up_ppm / rows_of(first)[name].up_ppm
        assert ratio == pytest.approx(by, rel=5e-3), name
    assert rows_of(first)["residual curvature"].up_ppm == pytest.approx(
        rows_of(second)["residual curvature"].up_ppm, rel=1e-9
    )


def test_the_total_is_that_of_its_rows(heated: Plan) -> None:
    [account] = budget_of(heated, as_made=True)
    made = account.budget
    assert made is not None
    linear = sum(row.up_ppm for row in made.rows if row.kind != "random")
    random = sqrt(sum(row.up_ppm**2 for row in made.rows if row.kind == "random"))
    assert made.total_up_ppm == pytest.approx(linear + random, rel=1e-9)
    assert made.worst_case_ppm == pytest.approx(heated.parts.made[0].option.worst_case.peak_ppm, rel=1e-3)  # type: ignore[union-attr]


def test_another_range_is_that_of_what_is_made(heated: Plan) -> None:
    """A linear law: from 0 to 75 degC the peak is half of that at 125."""
    wide, narrow = budget_of(heated, ranges=["-40:125", "0:75"], as_made=True)
    nominal = [account.budget.nominal_ppm for account in (wide, narrow)]  # type: ignore[union-attr]
    assert nominal[1] == pytest.approx(0.5 * nominal[0], rel=1e-9)


def test_the_plan_as_made_has_what_is_made_as_its_options(heated: Plan) -> None:
    plan = plan_as_made(heated)
    assert [option.id for option in plan.options] == ["given-made"]
    assert plan.chosen == "given-made"
    assert sorted(plan.by_name) == ["slate", "slate_ends"]
    assert plan.parts is None


def test_without_parts_it_is_refused() -> None:
    text = HEAD.format(value='"12 kohm"', ohms="12 kohm") + SLATE
    plan = make_plan(parse_brief(text, "brief.toml", Path()))
    with pytest.raises(InputError) as caught:
        budget_of(plan, as_made=True)
    [problem] = caught.value.problems
    assert (problem.where, problem.found) == ("plan.parts", "a plan without parts")
    assert "tcplan parts" in problem.todo


# --- a plan.json whose parts contradict themselves -------------------------------------------------------


def edited(plan: Plan, change: Callable[[dict[str, Any], dict[str, Any]], Any]) -> dict[str, Any]:
    """Return the data of a plan after a change of its parts, given as (parts, the first leg)."""
    data = copy.deepcopy(json.loads(plan_json(plan)))
    change(data["parts"], data["parts"]["made"][0]["legs"][0])
    return data


@pytest.mark.parametrize(
    ("change", "where"),
    [
        (lambda parts, leg: leg.update(in_series=leg["in_series"] + 1), "made[1].legs"),
        (lambda parts, leg: leg.update(ohms=leg["ohms"] * 1.01), "made[1].legs"),
        (lambda parts, leg: leg.update(ohms="many"), "made[1].legs"),
        (lambda parts, leg: leg.update(unit_body_ohms=leg["unit_body_ohms"] * 2), "made[1].legs"),
        (lambda parts, leg: leg.update(id="b"), "made[1].legs"),
        (lambda parts, leg: leg.update(material="slate_ends"), "made[1].legs"),
        (lambda parts, leg: leg.update(material="nothing"), "made[1].legs"),
        (lambda parts, leg: leg.update(kind="cable"), "made[1].legs"),
        (lambda parts, leg: leg.update(in_parallel=True), "made[1].legs"),
        (lambda parts, leg: leg.pop("width_m"), "made[1].legs"),
        (lambda parts, leg: leg.update(price=3), "made[1].legs[1]"),
        (lambda parts, leg: parts["made"][0].update(legs=[]), "plan"),
        (lambda parts, leg: parts["made"][0]["legs"].append({**leg, "id": "b"}), "made[1].legs"),
        (lambda parts, leg: parts["made"][0].update(value_error=0.5), "made[1].value_error"),
        (lambda parts, leg: parts["made"][0].update(target_ohms=5.0), "made[1].value_error"),
        (lambda parts, leg: parts["made"][0].update(target_ohms=-5.0), "made[1].target_ohms"),
        (lambda parts, leg: parts.update(option="series-1"), "plan.parts.option"),
        (lambda parts, leg: parts["materials"].pop("slate_ends"), "made[1].option"),
        (lambda parts, leg: parts.update(made=[]), "plan"),
    ],
)
def test_parts_that_contradict_themselves_are_refused(
    heated: Plan, change: Callable[[dict[str, Any], dict[str, Any]], Any], where: str
) -> None:
    with pytest.raises(InputError) as caught:
        plan_from_dict(edited(heated, change))
    assert any(where in problem.where for problem in caught.value.problems), str(caught.value)


def test_a_network_that_is_not_that_of_its_legs_is_refused(heated: Plan) -> None:
    """Counts and values of the leg changed alike: only the network still tells what was checked."""

    def longer(parts: dict[str, Any], leg: dict[str, Any]) -> None:
        leg["ohms"] *= 2
        leg["in_series"] *= 2

    plan = plan_from_dict(edited(heated, longer))
    with pytest.raises(InputError, match="a network that is not the one of its legs"):
        budget_of(plan, as_made=True)


def test_legs_of_fewer_than_the_option_has_are_refused() -> None:
    text = HEAD.format(value='"500 ohm"', ohms="300 ohm + up 200 ohm") + SLATE + WIRES
    made = make_parts(make_plan(parse_brief(text, "brief.toml", Path())), PartsRules())
    data = json.loads(plan_json(made.plan))
    assert len(budget_of(plan_from_dict(data), as_made=True)) == 1
    del data["parts"]["made"][0]["legs"][1]
    with pytest.raises(InputError, match="one for each leg of option given: slate, up"):
        plan_from_dict(data)
