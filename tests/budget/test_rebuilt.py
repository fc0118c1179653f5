"""What a plan was made for comes back from its record, and wrong records are refused."""

from __future__ import annotations

import json
from collections.abc import Callable
from typing import Any

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.budget.rebuilt import asked_of
from tcplan.errors import InputError
from tcplan.goal import requirement
from tcplan.plan import Plan, plan_json
from tcplan.plan_file import plan_from_dict, read_plan
from tcplan.workflow.planning import make_plan

MORE = """
[[correlation]]
between = ["pp.ohm_per_square", "np.ohm_per_square"]
value = 0.5
[[allowance]]
name = "ageing"
size = "500 ppm"
sides = "up"
kind = "systematic"
source = "invented"
[[allowance]]
name = "stress"
size = "2 ppm/K"
kind = "random"
source = "invented"
"""
GOALS = {
    "drift": 'drift = "6000 ppm"',
    "several": 'drift = "6000 ppm"\nband = "9000 ppm"\nchord_tcr = "80 ppm/K"\nbox_tcr = "60 ppm/K"',
    "mask": 'mask = [["0 degC", "70 degC", "0.3 %"], ["-40 degC", "150 degC", "0.9 %"]]',
    "wanted": 'drift = "6000 ppm"\ntc1 = "20 ppm/K"\ntc2 = "0.1 ppm/K^2"',
    "law": 'drift = "9000 ppm"\nlaw = "exp(a*(T - T0))"\n[goal.law_parameters]\na = 2e-5',
    "none": "",
}


def text(goal: str, *, worst: bool = True) -> str:
    judge = 'judge = "worst-case"\n' if worst else ""
    limited = BRIEF.replace('[goal]\ndrift = "6000 ppm"', f"[goal]\n{judge}{goal}")
    return limited.replace('value = "18 kohm"', 'value = "18 kohm"\ntolerance = "2 %"') + FILMS + MORE


@pytest.mark.parametrize("name", GOALS)
def test_a_plan_file_holds_all_that_was_asked(name: str) -> None:
    asked = brief(text(GOALS[name]))
    found = asked_of(read_plan(plan_json(make_plan(asked))))
    assert found.process == asked.process
    assert len(found.process.correlations) == 1
    assert found.over == asked.over
    assert found.tolerance == asked.target.tolerance
    assert found.trim_step is None
    assert found.goal.judge == "worst-case"
    need, own = requirement(found.goal, found.over), requirement(asked.goal, asked.over)
    assert need.kind == own.kind
    assert (need.scale or 0.0) == pytest.approx(own.scale or 0.0, rel=1e-12)
    for piece, other in zip(need.pieces, own.pieces, strict=True):
        assert (piece.low, piece.high, piece.centred) == (other.low, other.high, other.centred)
        assert piece.weight == pytest.approx(other.weight, rel=1e-12)
    for mine, theirs in zip(found.allowances, asked.allowances, strict=True):
        assert mine.size == pytest.approx(theirs.size, rel=1e-12)
        assert (mine.name, mine.per_kelvin, mine.sides, mine.kind, mine.source) == (
            theirs.name,
            theirs.per_kelvin,
            theirs.sides,
            theirs.kind,
            theirs.source,
        )


def test_a_named_range_keeps_its_standard() -> None:
    named = text(GOALS["drift"]).replace(
        'low = "-40 degC"\nhigh = "150 degC"', 'range = "automotive-1"\nrise = "10 K"'
    )
    found = asked_of(make_plan(brief(named)))
    assert found.over.standard == "AEC-Q100 grade 1"
    assert found.over.high_degC == 135.0


@pytest.fixture(scope="module")
def plan() -> Plan:
    return make_plan(brief(text(GOALS["drift"])))


SPOILT: dict[str, Callable[[dict[str, Any]], Any]] = {
    "brief.process": lambda b: b.pop("process"),
    "brief.allowances": lambda b: b["allowances"][0].update(size_ppm=-1.0),
    "brief.goal": lambda b: b["goal"].update(judge="always"),
    "brief.resistor.tolerance": lambda b: b["resistor"].update(tolerance=2.0),
}


@pytest.mark.parametrize("where", SPOILT)
def test_a_wrong_record_is_refused_with_its_place(plan: Plan, where: str) -> None:
    data = json.loads(plan_json(plan))
    SPOILT[where](data["brief"])
    with pytest.raises(InputError) as caught:
        asked_of(plan_from_dict(data))
    assert [problem.where for problem in caught.value.problems] == [f"plan.{where}"]
    assert "Make the plan again" in caught.value.problems[0].todo
