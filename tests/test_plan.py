"""plan.json: exact round trip, its schema of keys, and untrusted data."""

import json

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.errors import InputError
from tcplan.plan import plan_json
from tcplan.plan_file import plan_from_dict, read_plan
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
    assert set(option["legs"][0]) == {"id", "material", "ohms", "share", "squares", "area_m2"}
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
