"""plan.json: exact round trip, its schema of keys, and untrusted data."""

import json
import re

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.errors import InputError
from tcplan.plan import plan_json
from tcplan.plan_file import plan_from_dict, read_plan
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan

JUDGED = BRIEF.replace('drift = "6000 ppm"', 'drift = "6000 ppm"\njudge = "worst-case"')


@pytest.fixture(scope="module")
def plan():
    return make_plan(brief(JUDGED + FILMS))


def test_round_trip(plan):
    assert read_plan(plan_json(plan)) == plan
    assert plan_from_dict(plan.to_dict()) == plan


def test_the_keys_are_those_of_the_design(plan):
    data = json.loads(plan_json(plan))
    assert list(data) == [
        "schema",
        "tcplan",
        "brief",
        "range",
        "target",
        "limit",
        "materials",
        "floor",
        "chosen",
        "options",
        "notes",
        "parts",
    ]
    assert set(data["range"]) == {"name", "low_degC", "high_degC", "reference_degC", "rise_K"}
    assert set(data["target"]) == {"ohms", "tc1_ppm_per_K", "tc2_ppm_per_K2"}
    assert set(data["limit"]) == {"kind", "drift_ppm", "judge", "quantile"}
    assert set(data["floor"]) == {"nominal_ppm", "worst_case_ppm", "why"}
    option = data["options"][0]
    assert set(option) - {"role"} == {
        "id",
        "arrangement",
        "network",
        "tree",
        "legs",
        "nominal",
        "worst_case",
        "corners_ppm",
        "likely",
        "proof",
        "verdict",
    }
    assert set(option["legs"][0]) == {"id", "material", "ohms", "strings", "share", "squares", "area_m2"}
    assert set(option["nominal"]) == {
        "figure_ppm",
        "peak_ppm",
        "at_degC",
        "band_ppm",
        "box_tcr_ppm_per_K",
        "chord_cold_ppm_per_K",
        "chord_hot_ppm_per_K",
        "tc1_ppm_per_K",
        "tc2_ppm_per_K2",
        "centring_ppm",
        "centred_peak_ppm",
    }
    assert set(option["worst_case"]) - {"movers"} == {
        "peak_ppm",
        "at_degC",
        "point",
        "method",
        "upper_bound_ppm",
    }
    assert set(option["proof"]) == {"kind", "of", "lower_bound_ppm", "gap_ppm"}
    assert data["chosen"] in {o["id"] for o in data["options"]}


def test_values_combine_to_the_target(plan):
    from tcplan.network import value

    for option in plan.options:
        assert value(option.network) == pytest.approx(18000.0, rel=1e-12)


def test_order_in_the_brief_does_not_matter(plan):
    first, second = FILMS.split("[material.np]\n")
    turned = "[material.np]\n" + second + first
    other = make_plan(brief(JUDGED + turned))
    assert [o.to_dict() for o in other.options] == [o.to_dict() for o in plan.options]
    assert other.floor == plan.floor


@pytest.mark.parametrize(
    "damage",
    [
        lambda d: d.pop("floor"),
        lambda d: d.update(extra=1),
        lambda d: d.update(schema=9),
        lambda d: d.update(schema=True),
        lambda d: d["options"][0].update(verdict="PASS"),
        lambda d: d["options"][0]["nominal"].update(peak_ppm="much"),
        lambda d: d["options"][0]["proof"].pop("kind"),
        lambda d: d["options"][0]["tree"].update(bridge=[]),
        lambda d: d["options"][0]["legs"][0].update(ohms=-1.0),
        lambda d: d["options"][0]["legs"][0].update(ohms="12"),
        lambda d: d["options"][0].update(legs=3),
        lambda d: d["options"][0].update(tree={"leg": "zz"}),
        lambda d: d["materials"]["pp"].pop("law"),
        lambda d: d.update(options=None),
        lambda d: d.update(materials=[]),
        lambda d: d.update(chosen="nothing"),
        lambda d: d.update(options=[]),
        lambda d: d["options"][0]["legs"][0].update(material="unknown"),
    ],
)
def test_damaged_plans_are_refused(plan, damage):
    data = json.loads(plan_json(plan))
    damage(data)
    with pytest.raises(InputError):
        plan_from_dict(data)


@pytest.mark.parametrize("text", ["", "[]", "{", "null", '{"schema": 1}', "\x00"])
def test_what_is_not_a_plan(text):
    with pytest.raises(InputError):
        read_plan(text)


# ---- its parts

DRAWN = """
[material.{0}.film]
min_width = "1 um"
end_resistance = "35 ohm*um"
matching = "1.2 %*um"
"""
BOUGHT = """
[material.chip]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-30 ppm/K"
series = "E96"
[material.chip.spread]
meaning = "limits"
value = "0.1 %"
"""
GIVEN = '[given]\nnetwork = "pp 10k + (np 9k || chip 72k)"\n'


@pytest.fixture(scope="module")
def made():
    """Films with ends, bought parts, two values: every kind of entry but wire."""
    several = JUDGED.replace('"18 kohm"', '["18 kohm", "9 kohm"]')
    text = several + GIVEN + "scaled = true\n" + FILMS + DRAWN.format("pp") + DRAWN.format("np") + BOUGHT
    return make_parts(make_plan(brief(text)), PartsRules()).plan


def test_parts_come_back(made):
    assert read_plan(plan_json(made)) == made
    assert [leg["kind"] for leg in made.to_dict()["parts"]["made"][0]["legs"]] == ["film", "film", "stock"]
    assert len(made.parts.made) == 2


def test_the_keys_of_parts(made):
    parts = json.loads(plan_json(made))["parts"]
    assert list(parts) == ["option", "materials", "made", "details"]
    assert list(parts["made"][0]) == ["target_ohms", "value_error", "legs", "option"]
    assert set(parts["details"]) == {"rules", "ways", "loads", "placement", "trim"}
    assert {"pp", "pp_ends", "np", "np_ends", "chip_c1"} <= set(parts["materials"])


def rows(data):
    return data["parts"]["made"][0]["legs"]


@pytest.mark.parametrize(
    ("damage", "where"),
    [
        (lambda d: d.pop("parts"), "plan.parts"),
        (lambda d: d.update(parts=[]), "plan.parts"),
        (lambda d: d["parts"].pop("details"), "plan.parts.details"),
        (lambda d: d["parts"].update(extra=1), "plan.parts"),
        (lambda d: d["parts"].update(option="single-9"), "plan.parts.option"),
        (lambda d: d["parts"].update(made=None), "plan.parts.made"),
        (lambda d: d["parts"]["made"].clear(), "plan.parts.made"),
        (lambda d: d["parts"]["made"][1].update(target_ohms=0.0), "plan.parts.made[2].target_ohms"),
        (lambda d: d["parts"]["made"][1].update(value_error="small"), "plan.parts.made[2].value_error"),
        (lambda d: rows(d).clear(), "plan.parts.made[1].legs"),
        (lambda d: rows(d).pop(), "plan.parts.made[1].legs"),
        (lambda d: rows(d).reverse(), "plan.parts.made[1].legs"),
        (lambda d: rows(d).append(rows(d)[0]), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[0].update(kind="foil"), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[0].update(kind="wire"), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[0].update(kind=["film"]), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[0].update(material="unknown"), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[0].update(wanted_ohms=True), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[0].update(ohms=10**400), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[0].update(in_series=0), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[0].update(extra=1), "plan.parts.made[1].legs[1]"),
        (lambda d: rows(d)[0].pop("unit_area_m2"), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[2].update(values_ohms=[]), "plan.parts.made[1].legs"),
        (lambda d: rows(d)[2].update(values_ohms=[10**400]), "plan.parts.made[1].legs"),
        (lambda d: rows(d).__setitem__(0, None), "plan.parts.made[1].legs[1]"),
        (lambda d: d["parts"]["materials"].pop("pp_ends"), "plan.parts.made[1].option"),
        (lambda d: d["parts"]["made"][0]["option"].pop("proof"), "plan.parts.made[1].option.proof"),
        (lambda d: d["parts"]["details"].update(ways=float("nan")), "plan"),
        (lambda d: d["brief"].update(title=float("inf")), "plan"),
        (lambda d: d["options"][0]["nominal"].update(peak_ppm="much"), "plan.options[1].nominal.peak_ppm"),
    ],
)
def test_a_mistake_in_the_parts_is_told_with_its_place(made, damage, where):
    data = json.loads(plan_json(made))
    damage(data)
    with pytest.raises(InputError, match=rf"^{re.escape(where)}: found ") as caught:
        plan_from_dict(data)
    assert "Error" not in str(caught.value)
