"""The [operating] table: one drive, one kind of thermal resistance, and voltage coefficients."""

import json

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.brief.model import Operating
from tcplan.brief.operating_table import operating_from_dict
from tcplan.errors import InputError
from tcplan.material.model import VoltageCoefficient, material_from_dict
from tcplan.units import parse_quantity

WHOLE = BRIEF + FILMS
COMMON = """
[operating]
voltage = "5 V"
thermal_resistance = "150 K/W"
"""
BY_LEG = """
[operating]
current = "2 mA"
[operating.leg_thermal_resistance]
pp = "400 K/W"
np = "0.2 K/mW"
"""


def only(text):
    with pytest.raises(InputError) as caught:
        brief(text)
    assert len(caught.value.problems) == 1, str(caught.value)
    return caught.value.problems[0]


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        (COMMON, Operating(voltage=5.0, thermal_resistance=150.0)),
        (BY_LEG, Operating(current=2e-3, leg_thermal_resistance=(("np", 200.0), ("pp", 400.0)))),
        ('[operating]\nvoltage = "5 V"\n', Operating(voltage=5.0)),
    ],
)
def test_it_is_read_and_comes_back_from_a_plan(text, wanted):
    made = brief(WHOLE + text)
    assert made.operating == wanted
    assert made.operating.heats == ("resistance" in text)
    data = json.loads(json.dumps(made.to_dict()["operating"]))
    assert operating_from_dict(data) == wanted


def test_none_stays_none():
    assert brief().operating is None
    assert brief().to_dict()["operating"] is None
    assert operating_from_dict(None) is None


@pytest.mark.parametrize(
    ("text", "change", "where", "says"),
    [
        (COMMON, ('"5 V"', '"5 V"\ncurrent = "1 mA"'), "operating.current", "one of the two"),
        (COMMON, ('voltage = "5 V"\n', ""), "operating.voltage", "found nothing"),
        (COMMON, ('"5 V"', '"0 V"'), "operating.voltage", "above zero"),
        (COMMON, ('"5 V"', '"-5 V"'), "operating.voltage", "above zero"),
        (COMMON, ('"5 V"', '"5 A"'), "operating.voltage", "a voltage"),
        (COMMON, ('"150 K/W"', '"150 K"'), "operating.thermal_resistance", "a thermal resistance"),
        (COMMON, ("thermal_resistance", "thermal_resistence"), "operating.thermal_resistence", "mean"),
        (BY_LEG, ("[operating.leg", 'thermal_resistance = "1 K/W"\n[operating.leg'),
         "operating.leg_thermal_resistance", "one of the two"),
        (BY_LEG, ("pp = ", "ppp = "), "operating.leg_thermal_resistance.ppp", "Did you mean pp"),
        (BY_LEG, ('"400 K/W"', '"0 K/W"'), "operating.leg_thermal_resistance.pp", "above zero"),
        (BY_LEG, ('pp = "400 K/W"\nnp = "0.2 K/mW"\n', ""), "operating.leg_thermal_resistance", "empty"),
    ],
)  # fmt: skip
def test_what_is_refused(text, change, where, says):
    assert change[0] in text
    found = only(WHOLE + text.replace(*change))
    assert found.where == f"brief.toml: {where}"
    assert says in str(found)


def test_a_rise_and_what_it_would_be_computed_from():
    hot = WHOLE.replace('high = "150 degC"', 'high = "140 degC"\nrise = "10 K"')
    assert only(hot + COMMON).where == "brief.toml: temperature.rise"
    assert brief(hot + '[operating]\nvoltage = "5 V"\n').over.rise == 10.0


def test_not_for_a_ratio():
    start = WHOLE.index("[resistor]")
    end = WHOLE.index("[temperature]")
    ratio = '[ratio]\nkind = "divider"\nfirst = "pp 9 kohm"\nsecond = "np 1 kohm"\n'
    found = only(WHOLE[:start] + ratio + WHOLE[end:] + COMMON)
    assert found.where == "brief.toml: operating"
    assert "not for a ratio" in str(found)


@pytest.mark.parametrize(
    "wrong",
    [
        [],
        {},
        {"voltage_V": 5.0},
        {"voltage_V": 5.0, "current_A": 1.0},
        {"voltage_V": None, "current_A": None},
        {"voltage_V": -5.0, "current_A": None},
        {"voltage_V": float("nan"), "current_A": None},
    ],
)
def test_damaged_plans_are_refused(wrong):
    rest = {"thermal_resistance_K_per_W": None, "leg_thermal_resistance_K_per_W": []}
    data = {**wrong, **rest} if "current_A" in wrong else wrong
    with pytest.raises((KeyError, TypeError, ValueError)):
        operating_from_dict(data)


# --- voltage coefficients -----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        ("20 ppm/V", VoltageCoefficient(per_volt=20e-6)),
        ("-20 ppm/V", VoltageCoefficient(per_volt=-20e-6)),
        ("0.02 ppm/mV", VoltageCoefficient(per_volt=20e-6)),
        ("0 ppm/V", VoltageCoefficient(per_volt=0.0)),
        ("30 ppm*um/V", VoltageCoefficient(metre_per_volt=30e-12)),
        ("30 ppm·µm/V", VoltageCoefficient(metre_per_volt=30e-12)),
        ("0.003 %*um/V", VoltageCoefficient(metre_per_volt=30e-12)),
        ("30 ppm*nm/mV", VoltageCoefficient(metre_per_volt=30e-12)),
    ],
)
def test_a_voltage_coefficient_is_read_and_comes_back(text, wanted):
    line = f'ohm_per_square = "320 ohm"\nvoltage_coefficient = "{text}"\n'
    material = brief(WHOLE.replace('ohm_per_square = "320 ohm"\n', line)).by_name["pp"]
    for size in ("per_volt", "metre_per_volt"):
        found, meant = getattr(material.voltage_coefficient, size), getattr(wanted, size)
        assert found == (None if meant is None else pytest.approx(meant, rel=1e-12))
    data = json.loads(json.dumps(material.to_dict()))
    assert material_from_dict(data) == material
    del data["voltage_coefficient"]  # a plan of an older version
    assert material_from_dict(data).voltage_coefficient is None


@pytest.mark.parametrize(
    ("size", "text", "says"),
    [
        ('ohm_per_square = "320 ohm"', "20 ppm", "a voltage coefficient"),
        ('ohm_per_square = "320 ohm"', "20 ppm/K", "a temperature coefficient"),
        ('ohm_per_square = "320 ohm"', "20", "The unit is missing"),
        ('series = "E96"', "30 ppm*um/V", "A coefficient per length is for films"),
    ],
)
def test_voltage_coefficients_that_are_refused(size, text, says):
    part = WHOLE.replace('ohm_per_square = "320 ohm"', f'{size}\nvoltage_coefficient = "{text}"')
    if "series" in size:
        part = part.replace('ohm_per_square = "20 %"', 'value = "20 %"')
    found = only(part)
    assert found.where == "brief.toml: material.pp.voltage_coefficient"
    assert says in str(found)


def test_one_of_the_two():
    for sizes in ({}, {"per_volt": 1e-6, "metre_per_volt": 1e-12}, {"per_volt": float("inf")}):
        with pytest.raises(InputError):
            VoltageCoefficient(**sizes)


@pytest.mark.parametrize("unit", ["V", "A", "K/W", "1/V", "m/V"])
def test_units_of_the_document_are_read(unit):
    """The units that docs/input.md names beside each example."""
    from pathlib import Path

    rows = {
        "V": "voltage",
        "A": "current",
        "K/W": "thermal resistance",
        "1/V": "voltage coefficient",
        "m/V": "voltage coefficient times length",
    }
    text = (Path(__file__).parents[2] / "docs" / "input.md").read_text(encoding="utf-8")
    [line] = [line for line in text.splitlines() if line.startswith(f"| {rows[unit]} |")]
    _, _, example, others, _ = (cell.strip() for cell in line.split("|"))
    for one in (example.strip('`"'), *(f"2 {other}" for other in others.split())):
        assert parse_quantity(one, unit) > 0.0
