"""The content of the spec sheet: its order, and every number traced to plan.json or to the budget of it."""

from __future__ import annotations

import json
import re
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.brief import read_brief
from tcplan.plan import Plan, plan_json
from tcplan.plan_file import read_plan
from tcplan.spec.budget_text import budget_data
from tcplan.spec.spec import Cell, Column, Picture, Table, plan_path
from tcplan.spec.spec_json import spec_json
from tcplan.workflow.budgeting import budget_of
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan
from tcplan.workflow.specs import make_spec

EXAMPLES = Path(__file__).parents[2] / "examples"
ORDER = [  # that of the task: what a reviewer reads first comes first
    "requirement",
    "network",
    "mix",
    "drift",
    "choice",
    "budget",
    "yield",
    "materials",
    "formula",
    "test",
    "assumptions",
    "provenance",
]
UNITS = {  # SI prefixes and units as they are printed, over the unit of plan.json
    "": 1.0,
    "ohm": 1.0,
    "kohm": 1e3,
    "Mohm": 1e6,
    "%": 1e-2,
    "um": 1e-6,
    "mm": 1e-3,
    "m": 1.0,
    **dict.fromkeys(("ppm", "ppm/K", "ppm/K^2", "degC", "K", "squares", "Cohm"), 1.0),
}
NUMBER = re.compile(r"^(?:\+/-|sigma )?([-+]?[0-9.]+(?:e-?[0-9]+)?) ?([^ ]*)")


@pytest.fixture(scope="module", params=["brake_sensor_films", "cabinet_reference_wire", "gain_films"])
def plan(request: pytest.FixtureRequest) -> Plan:
    made = make_plan(read_brief(EXAMPLES / request.param / "brief.toml"))
    return make_parts(made, PartsRules()).plan if request.param == "gain_films" else made


@pytest.fixture(scope="module")
def films() -> Plan:
    return make_plan(brief(BRIEF + FILMS))


def found(data: Any, path: str) -> Any:
    """Return what a JSON Pointer points at (RFC 6901)."""
    for key in path.split("/")[1:]:
        name = key.replace("~1", "/").replace("~0", "~")
        data = data[int(name)] if isinstance(data, list) else data[name]
    return data


def step_of(text: str) -> float:
    """Return one unit of the last digit of a printed number that is not 0."""
    mantissa, _, power = text.lstrip("+-").partition("e")
    whole, _, fraction = mantissa.partition(".")
    last = -len(fraction) if fraction else len(whole) - len(whole.rstrip("0"))
    return 10.0 ** (last + int(power or 0))


def coarse(data: Any, path: str) -> float:
    """Return how far a nominal figure may be from what it stands for: it is no finer than its spread.

    The step is the next of 1, 2, 5 above a tenth of the spread, so half of it is 0.125 of the spread at most.
    """
    if "/nominal/" not in path or not path.startswith("/options/"):
        return 0.0
    option, over = found(data, path.split("/nominal/")[0]), data["range"]
    if option["worst_case"] is None or path.endswith("degC") or "/tc" in path:
        return 0.0
    arm = max(over["high_degC"] - over["reference_degC"], over["reference_degC"] - over["low_degC"])
    spread = option["worst_case"]["peak_ppm"] - option["nominal"]["figure_ppm"]
    return 0.1251 * spread / (arm if path.endswith("ppm_per_K") else 1.0)


def check(text: str, true: float, by: float = 0.0) -> None:
    """Check a printed number against the one that it stands for: within one unit of its last digit."""
    if text.startswith("under "):
        assert abs(true) <= float(text.split()[1])
        return
    match = NUMBER.match(text)
    assert match is not None, text
    scale = UNITS[match[2]]
    assert abs(float(match[1]) * scale - true) <= max(step_of(match[1]) * scale * 1.0001, by), (text, true)


def test_the_sections_are_in_the_order_in_which_they_are_read(plan: Plan) -> None:
    spec = make_spec(plan)
    assert [section.key for section in spec.sections] == ORDER
    assert spec.sections[0].blocks[0].text == spec.headline  # type: ignore[union-attr]
    assert spec.headline.endswith(f": {spec.verdict}")


def test_every_source_leads_to_the_number_that_is_printed(plan: Plan) -> None:
    """The number is read back from plan.json as text, by a reader of JSON and pointers of this test's own."""
    text = plan_json(plan)
    data = json.loads(text)
    again = read_plan(text)
    budget = json.loads(json.dumps(budget_data(budget_of(again)[0])))["budget"]
    traced = 0
    for section in make_spec(plan).sections:
        for table in section.tables:
            for row in table.rows:
                for cell in row:
                    if not cell.source:
                        continue
                    where, path = cell.source.split("#")
                    true = found({"plan.json": data, "budget": budget}[where], path)
                    if isinstance(true, str):
                        assert cell.text.removesuffix(" (chosen)") == true
                    else:
                        check(cell.text, true, coarse(data, path))
                    traced += 1
    assert traced > 60


@pytest.mark.parametrize("key", ["mix", "drift", "budget", "yield"])
def test_no_number_of_these_tables_is_without_a_source(plan: Plan, key: str) -> None:
    for table in make_spec(plan).section(key).tables:
        for column, cells in zip(table.head, zip(*table.rows, strict=True), strict=True):
            for cell in cells:
                counted = column.title in ("of", "size") and not cell.text.endswith("squares")
                if column.numeric and re.search("[0-9]", cell.text) and not counted:
                    assert cell.source, (table.caption, cell.text)


def test_the_margin_is_the_limit_less_the_total(films: Plan) -> None:
    """Nothing but the plan's file is known to the budget, and its margin may be negative."""
    table = make_spec(films).section("budget").tables[1]
    total, limit, margin = (float(row[1].text) for row in table.rows)
    assert limit == 6000.0
    assert margin == pytest.approx(limit - total, abs=0.01 * total)


def test_parts_of_another_option_are_not_shown_as_those_of_the_chosen(films: Plan) -> None:
    other = next(option.id for option in films.options if option.id != films.chosen)
    made = make_parts(films, PartsRules(), other).plan
    section = make_spec(made).section("mix")
    assert len(section.tables) == 1
    assert any(other in block.text for block in section.blocks if block.kind == "words")


def test_a_date_is_there_only_when_it_is_asked_for(films: Plan) -> None:
    dated = make_spec(films, date="1 May 2031").section("provenance").tables[0]
    assert dated.rows[-1][1].text == "1 May 2031"
    assert all(row[0].text != "date" for row in make_spec(films).section("provenance").tables[0].rows)


def test_a_plan_that_meets_nothing_says_so_first(films: Plan) -> None:
    tight = make_plan(brief(BRIEF.replace("6000 ppm", "60 ppm") + FILMS))
    assert make_spec(tight).verdict == "NOT MET"
    assert "NOT MET" in make_spec(tight).sections[0].blocks[0].text  # type: ignore[union-attr]
    none = replace(films, limit=replace(films.limit, kind="none", drift_ppm=None))
    free = brief(BRIEF.replace('drift = "6000 ppm"', "") + FILMS)
    assert make_spec(make_plan(free)).verdict == "no limit given"
    assert none.limit.drift_ppm is None


def test_every_picture_has_words_for_those_who_do_not_see_it(plan: Plan) -> None:
    pictures = [b for s in make_spec(plan).sections for b in s.blocks if isinstance(b, Picture)]
    names = ["network", "drift", *(["spread"] if plan.best.likely else []), "slope-curvature"]
    assert [picture.name for picture in pictures] == names
    assert all(len(picture.alt) > 20 and picture.caption for picture in pictures)


def test_spec_json_holds_the_texts_and_the_sources(films: Plan) -> None:
    spec = make_spec(films)
    data = json.loads(spec_json(spec))
    assert data["schema"] == 1
    assert data["verdict"] == spec.verdict
    first = data["sections"][2]["blocks"][0]
    assert (first["kind"], first["rows"][0][2]["source"]) == (
        "table",
        spec.section("mix").tables[0].rows[0][2].source,
    )


def test_a_row_is_as_long_as_its_head() -> None:
    with pytest.raises(ValueError, match="not as long"):
        Table(caption="x", head=(Column(title="a"),), rows=((Cell(text="1"), Cell(text="2")),))


def test_a_path_is_a_json_pointer() -> None:
    # RFC 6901, section 5: "~" is ~0 and "/" is ~1.
    assert plan_path("corners_ppm", "a/b~c", 0) == "plan.json#/corners_ppm/a~1b~0c/0"
