"""The [trim] table: what is read, what is refused, and back again from plan.json."""

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.brief.model import Trim
from tcplan.brief.trim_table import trim_from_dict
from tcplan.budget.rebuilt import asked_of
from tcplan.errors import InputError
from tcplan.plan_file import plan_from_dict
from tcplan.workflow.planning import make_plan


def trim(text):
    return brief(f"{BRIEF}[trim]\n{text}\n{FILMS}").trim


def refused(text, head=BRIEF):
    with pytest.raises(InputError) as caught:
        brief(f"{head}[trim]\n{text}\n{FILMS}")
    return str(caught.value)


def test_defaults():
    assert brief().trim is None
    assert brief().to_dict()["trim"] is None
    assert trim('method = "one-temperature"') == Trim(
        method="one-temperature",
        step=1e-3,
        switch_resistance=0.0,
        switch_tc1=0.0,
        temperatures=None,
        largest_cut=0.5,
    )
    # The range of the brief ends at 150 degC.
    assert trim('method = "two-temperatures"').temperatures == pytest.approx((298.15, 423.15))
    assert trim('method = "cut"').largest_cut == 0.5


def test_all_keys():
    text = (
        'method = "two-temperatures"\nstep = "0.05 %"\nswitch_resistance = "150 ohm"\n'
        'switch_tc1 = "3500 ppm/K"\ntemperatures = ["25 degC", "-30 degC"]'
    )
    found = trim(text)
    assert (found.step, found.switch_resistance, found.switch_tc1) == pytest.approx((5e-4, 150.0, 3.5e-3))
    assert found.temperatures == pytest.approx((243.15, 298.15))
    assert trim('method = "cut"\nlargest_cut = "30 %"').largest_cut == pytest.approx(0.3)


def test_units_are_in_the_names():
    found = trim('method = "two-temperatures"\nswitch_resistance = "150 ohm"\nswitch_tc1 = "3500 ppm/K"')
    assert found.to_dict() == {
        "method": "two-temperatures",
        "step_ppm": pytest.approx(1000.0),
        "switch_ohms": 150.0,
        "switch_tc1_ppm_per_K": pytest.approx(3500.0),
        "temperatures_degC": pytest.approx([25.0, 150.0]),
        "largest_cut": 0.5,
    }


@pytest.mark.parametrize(
    "text",
    [
        'method = "one-temperature"\nstep = "0.05 %"\nswitch_resistance = "150 ohm"',
        'method = "two-temperatures"\ntemperatures = ["25 degC", "125 degC"]',
        'method = "cut"\nlargest_cut = "30 %"',
    ],
)
def test_there_and_back(text):
    found = trim(text)
    assert trim_from_dict(found.to_dict()) == found


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ('step = "0.1 %"', "method"),
        ('method = "laser"', "one-temperature"),
        ('method = "one-temperature"\ntemperatures = ["25 degC", "80 degC"]', "two-temperatures"),
        ('method = "one-temperature"\nlargest_cut = "30 %"', 'largest_cut with method = "cut" only'),
        ('method = "cut"\nstep = "0.1 %"', 'method = "one-temperature" or method = "two-temperatures" only'),
        ('method = "cut"\nswitch_resistance = "5 ohm"', "switch_resistance with method"),
        ('method = "one-temperature"\nstep = "0 %"', "above zero"),
        ('method = "one-temperature"\nstep = "120 %"', "less than 100 %"),
        ('method = "cut"\nlargest_cut = "100 %"', "less than 100 %"),
        ('method = "one-temperature"\nswitch_resistance = "-5 ohm"', "zero or more"),
        ('method = "one-temperature"\nswitch_tc1 = "3000 ppm/K"', "without a switch_resistance"),
        (
            'method = "one-temperature"\nswitch_resistance = "5 ohm"\nswitch_tc1 = "20000 ppm/K"',
            "a switch reaches zero",
        ),
        ('method = "two-temperatures"\ntemperatures = ["25 degC", "200 degC"]', "both inside"),
        ('method = "two-temperatures"\ntemperatures = ["25 degC", "25.2 degC"]', "1 K apart"),
        ('method = "two-temperatures"\ntemperatures = ["-40 degC", "125 degC"]', "the reference, 25 degC"),
        ('method = "two-temperatures"\ntemperatures = ["25 degC"]', "temperatures"),
        ('method = "one-temperature"\nsteps = "0.1 %"', "step"),
    ],
)
def test_what_is_refused(text, told):
    assert told in refused(text)


def test_not_beside_a_trim_step():
    head = BRIEF.replace('value = "18 kohm"', 'value = "18 kohm"\ntrim_step = "0.1 %"')
    assert "[trim] itself says what remains" in refused('method = "cut"', head)


def test_not_beside_a_ratio():
    head = BRIEF.replace(
        '[resistor]\nvalue = "18 kohm"',
        '[ratio]\nkind = "gain"\nfirst = "pp 9 kohm"\nsecond = "pp 1 kohm"',
    )
    assert "[trim] together with [ratio]" in refused('method = "cut"', head)


def test_a_plan_holds_it_and_an_older_one_has_none():
    made = make_plan(brief(f'{BRIEF}[trim]\nmethod = "cut"\n{FILMS}'))
    assert asked_of(made).trim == Trim(method="cut")
    data = made.to_dict()
    del data["brief"]["trim"]
    assert asked_of(plan_from_dict(data)).trim is None


@pytest.mark.parametrize(
    "change",
    [
        {"method": "laser"},
        {"step_ppm": -1.0},
        {"step_ppm": float("nan")},
        {"largest_cut": 1.0},
        {"temperatures_degC": [25.0, 125.0]},
    ],
)
def test_a_wrong_record_is_told(change):
    with pytest.raises(ValueError):  # noqa: PT011 - the reader of the plan says where
        trim_from_dict({**Trim(method="cut").to_dict(), **change})
