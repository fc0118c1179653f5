"""Budgets of a plan over ranges, options and new data."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.budget import Draws
from tcplan.errors import InputError
from tcplan.material.law import Polynomial
from tcplan.network import legs
from tcplan.plan import Plan, plan_json
from tcplan.ranges import GRADES
from tcplan.workflow.budgeting import budget_of, plan_to_budget
from tcplan.workflow.planning import make_plan

WORST = BRIEF.replace('drift = "6000 ppm"', 'drift = "9000 ppm"\njudge = "worst-case"')


@pytest.fixture(scope="module")
def plan() -> Plan:
    return make_plan(brief(WORST + FILMS))


def test_the_chosen_option_over_its_own_range(plan: Plan) -> None:
    """The worst case of the plan is made in `verify`, apart from the budget."""
    [account] = budget_of(plan)
    assert account.option == plan.chosen
    assert account.budget is not None
    assert account.lots is None
    assert account.before is None
    worst = plan.best.worst_case
    assert worst is not None
    assert account.budget.peak_ppm == pytest.approx(worst.peak_ppm, rel=2e-4)
    assert account.budget.verdict == plan.best.verdict


def test_every_option_and_range(plan: Plan) -> None:
    ids = [option.id for option in plan.options]
    found = budget_of(plan, options=ids, ranges=["automotive-1", "-20:60", "-20 degC:60 degC"])
    assert [(a.option, a.over.high_degC) for a in found] == [(i, top) for i in ids for top in (125.0, 60.0)]
    for wide, narrow in zip(found[::2], found[1::2], strict=True):
        assert wide.budget is not None
        assert narrow.budget is not None
        assert narrow.budget.peak_ppm < wide.budget.peak_ppm


def test_a_range_beyond_a_material_is_told_and_the_others_go_on(plan: Plan) -> None:
    beyond, inside = budget_of(plan, ranges=["-70:60", "industrial"])
    assert beyond.budget is None
    assert "valid from -60 degC to 160 degC" in beyond.not_covered
    assert inside.budget is not None


def test_all_is_every_named_range_that_the_materials_cover(plan: Plan) -> None:
    """The materials are valid from -60 to 160 degC: all grades fit, cut short only those below 130."""
    names = [account.over.name for account in budget_of(plan, ranges=["all"])]
    assert names == list(GRADES)
    short = {name: replace(m, valid=(223.15, 403.15)) for name, m in plan.by_name.items()}
    fewer = [account.over.name for account in budget_of(plan, ranges=["all"], materials=short)]
    assert fewer == [n for n, g in GRADES.items() if g.low_degC >= -50 and g.high_degC <= 130]


def test_new_data_against_old(plan: Plan) -> None:
    """A sheet resistance 10 % higher, drawn as it is: each leg of it 1.1 times, since no TC has changed."""
    film = plan.by_name["pp"]
    new = {"pp": replace(film, ohm_per_square=1.1 * (film.ohm_per_square or 0.0))}
    [account] = budget_of(plan, materials=new)
    assert account.before == budget_of(plan)[0].budget
    assert account.budget is not None
    planned = {leg.material: leg.ohms for leg in legs(plan.best.network)}
    assert f"pp {1.1 * planned['pp']:.9g}"[:9] in account.budget.network
    assert f"np {planned['np']!r} ohm" in account.budget.network
    assert any("1.1 times" in line for line in account.changed)
    assert any("np" in line for line in account.changed)


def test_new_coefficients_change_the_nominal(plan: Plan) -> None:
    film = plan.by_name["pp"]
    law = Polynomial(reference=film.reference, coefficients=(-100e-6, 0.55e-6))
    [account] = budget_of(plan, materials={"pp": replace(film, law=law)})
    assert account.before is not None
    assert account.budget is not None
    assert account.budget.nominal_ppm != account.before.nominal_ppm


def test_draws_come_beside(plan: Plan) -> None:
    [account] = budget_of(plan, draws=Draws(count=2000, seed=3))
    assert account.lots is not None
    assert account.budget is not None
    assert account.lots.drawn.draws == 2000
    assert account.lots.drawn.limit == pytest.approx(0.009)
    # the limits are 3 sigma: nearly all lots are within the worst case
    assert account.lots.drawn.quantile_figure * 1e6 < account.budget.worst_case_ppm
    assert account.lots.units is None  # no mismatch is stated
    assert budget_of(plan, draws=Draws(count=2000, seed=3)) == (account,)


def test_draws_until_precise(plan: Plan) -> None:
    [account] = budget_of(plan, draws=Draws(precision=0.1))
    assert account.lots is not None
    drawn = account.lots.drawn
    assert drawn.quantile_high is not None
    assert drawn.quantile_high - drawn.quantile_low <= 0.1 * drawn.quantile_figure


@pytest.mark.parametrize(
    ("asked", "told"),
    [
        ({"options": ["parallel-9"]}, "parallel-9"),
        ({"ranges": ["automotiv-1"]}, "automotive-1"),
        ({"ranges": ["60:-20"]}, "60:-20"),
        ({"ranges": ["x:20"]}, "'x:20'"),
        ({"ranges": ["30:80"]}, "reference"),
        ({"materials": {}}, "no material of the plan"),
    ],
)
def test_wrong_wishes_are_refused(plan: Plan, asked: dict, told: str) -> None:
    with pytest.raises(InputError) as caught:
        budget_of(plan, **asked)
    assert told in str(caught.value)


def test_another_kind_of_material_is_refused(plan: Plan) -> None:
    wire = replace(plan.by_name["pp"], kind="wire", ohm_per_square=None, ohm_per_metre=10.0)
    with pytest.raises(InputError, match="a film, as in the plan"):
        budget_of(plan, materials={"pp": wire})


def test_a_brief_or_a_plan_file(plan: Plan, tmp_path: Path) -> None:
    (tmp_path / "brief.toml").write_text(WORST + FILMS)
    (tmp_path / "plan.json").write_text(plan_json(plan))
    made = plan_to_budget(str(tmp_path / "brief.toml"))
    read = plan_to_budget(str(tmp_path / "plan.json"))
    assert made.chosen == read.chosen == plan.chosen
    assert plan_to_budget("standard input", plan_json(plan).encode()).chosen == plan.chosen
    with pytest.raises(InputError, match="UTF-8"):
        plan_to_budget("standard input", b"\xff")


def test_a_folder_with_a_plan_and_nothing_at_all(tmp_path):
    (tmp_path / "plan.json").write_text("{}", encoding="utf-8")
    with pytest.raises(InputError, match=r"found a folder; expected a plan.json. Did you mean .*plan.json"):
        plan_to_budget(str(tmp_path))
    with pytest.raises(InputError, match=r"standard input: found nothing; expected a plan\.json"):
        plan_to_budget("standard input", b" \n")
