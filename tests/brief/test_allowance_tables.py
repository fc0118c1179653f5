"""Allowances: size, sides, kind and source, nothing assumed but both sides."""

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.brief import Allowance
from tcplan.errors import InputError

WHOLE = BRIEF + FILMS
AGEING = """
[[allowance]]
name = "ageing"
size = "200 ppm"
kind = "systematic"
source = "life test, 1000 h"
"""
STRESS = """
[[allowance]]
name = "package stress"
size = "2 ppm/K"
sides = "up"
kind = "random"
source = "invented report"
"""


def only(text):
    with pytest.raises(InputError) as caught:
        brief(text)
    assert len(caught.value.problems) == 1, str(caught.value)
    return caught.value.problems[0]


def test_a_fraction_and_one_per_kelvin():
    made = brief(WHOLE + AGEING + STRESS)
    assert made.allowances == (
        Allowance(name="ageing", size=200e-6, kind="systematic", source="life test, 1000 h"),
        Allowance(
            name="package stress",
            size=2e-6,
            per_kelvin=True,
            sides="up",
            kind="random",
            source="invented report",
        ),
    )
    assert made.to_dict()["allowances"] == [
        {
            "name": "ageing",
            "size_ppm": pytest.approx(200),
            "sides": "both",
            "kind": "systematic",
            "source": "life test, 1000 h",
        },
        {
            "name": "package stress",
            "size_ppm_per_K": pytest.approx(2),
            "sides": "up",
            "kind": "random",
            "source": "invented report",
        },
    ]
    assert brief().allowances == ()


@pytest.mark.parametrize("size", ["2 ppm/K", "2 ppm/degC", "2 ppm/°C", "2 ppm K^-1"])
def test_per_kelvin_however_it_is_written(size):
    [allowance] = brief(WHOLE + STRESS.replace("2 ppm/K", size)).allowances
    assert (allowance.size, allowance.per_kelvin) == (2e-6, True)


@pytest.mark.parametrize(
    ("change", "where", "says"),
    [
        (('"200 ppm"', '"0 ppm"'), "size", "above zero"),
        (('"200 ppm"', '"-200 ppm"'), "size", "above zero"),
        (('"200 ppm"', '"100 %"'), "size", "less than 100 %"),
        (('"200 ppm"', '"1 %/K"'), "size", "less than 100 %"),  # by hand: 125 K times 1 %
        (('"200 ppm"', '"200"'), "size", "The unit is missing"),
        (('"200 ppm"', '"2 ppm/K^2"'), "size", "a temperature coefficient"),
        (('"200 ppm"', "200"), "size", "text in quotes"),
        (('kind = "systematic"\n', ""), "kind", "found nothing"),
        (('"systematic"', '"sytematic"'), "kind", "Did you mean systematic"),
        (('source = "life test, 1000 h"\n', ""), "source", "found nothing"),
        (('"life test, 1000 h"', '" "'), "source", "one line of printable text"),
        (('"ageing"', '"a\\nb"'), "name", "one line of printable text"),
        (('kind = "systematic"', 'kind = "random"\nsides = "left"'), "sides", "both"),
    ],
)
def test_allowances_that_are_refused(change, where, says):
    assert change[0] in AGEING
    found = only(WHOLE + AGEING.replace(*change))
    assert found.where == f"brief.toml: allowance[1].{where}"
    assert says in str(found)


def test_a_name_twice():
    found = only(WHOLE + AGEING + AGEING)
    assert found.where == "brief.toml: allowance[2].name"
    assert "a second time" in str(found)
