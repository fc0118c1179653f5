"""The [ratio] table: what is read, and what is refused with its place."""

import pytest
from makers import FILMS, brief

from tcplan.errors import InputError

BRIEF = """
schema = 1
title = "Test ratio"
[temperature]
low = "-40 degC"
high = "150 degC"
[goal]
drift = "600 ppm"
[ratio]
kind = "divider"
first = "pp 9 kohm + np 4k7"
second = "pp 1 kohm"
tracking = "3 ppm/K"
"""


def refused(text):
    with pytest.raises(InputError) as caught:
        brief(text)
    return caught.value.problems


def test_a_ratio_is_read():
    read = brief(BRIEF + FILMS)
    assert read.ratio.kind == "divider"
    assert read.ratio.tracking == pytest.approx(3e-6)
    assert [m.name for m in read.materials] == ["np", "pp"]
    assert read.to_dict()["ratio"]["first"] == "pp 9000.0 ohm + np 4700.0 ohm"
    assert read.given is None


def test_materials_that_are_not_in_use_are_left_out():
    read = brief(BRIEF.replace(" + np 4k7", "") + FILMS)
    assert [m.name for m in read.materials] == ["pp"]


def test_tracking_may_be_left_out_or_zero():
    assert brief(BRIEF.replace('tracking = "3 ppm/K"', "") + FILMS).ratio.tracking is None
    assert brief(BRIEF.replace('"3 ppm/K"', '"0 ppm/K"') + FILMS).ratio.tracking == 0.0


@pytest.mark.parametrize(
    ("other", "table"),
    [
        ("resistor", '[resistor]\nvalue = "1 kohm"\n'),
        ("search", "[search]\nmax_legs = 2\n"),
        ("given", '[given]\nnetwork = "pp 1k"\n'),
        ("fixed", '[[fixed]]\nmaterial = "pp"\nvalue = "1 kohm"\n'),
    ],
)
def test_a_ratio_stands_alone(other, table):
    [problem] = [p for p in refused(BRIEF + table + FILMS) if "together" in p.found]
    assert problem.where == f"brief.toml: {other}"


@pytest.mark.parametrize(
    ("old", "new", "where", "word"),
    [
        ('"divider"', '"half"', "ratio.kind", "divider"),
        ('first = "pp 9 kohm + np 4k7"', "", "ratio.first", "nothing"),
        ("pp 1 kohm", "qq 1 kohm", "ratio.second", "one of np, pp"),
        ("pp 1 kohm", "pp 1 kohm +", "ratio.second", "network"),
        ("pp 1 kohm", "pp 0 kohm", "ratio.second", "above zero"),
        ('"3 ppm/K"', '"-3 ppm/K"', "ratio.tracking", "zero or more"),
        ('"3 ppm/K"', '"3 ppm"', "ratio.tracking", "ppm/K"),
        ('"3 ppm/K"', '"20000 ppm/K"', "ratio.tracking", "above zero"),
        ("tracking =", "trackin =", "ratio.trackin", "tracking"),
    ],
)
def test_mistakes_are_told_at_their_place(old, new, where, word):
    problems = refused(BRIEF.replace(old, new) + FILMS)
    assert any(where in p.where and word in str(p) for p in problems), [str(p) for p in problems]


def test_more_materials_than_can_be_searched_are_refused():
    names = [f"m{k}" for k in range(5)]
    films = "".join(
        f'[material.{n}]\nsource = "invented"\nreference = "25 degC"\nvalid = ["-60 degC", "160 degC"]\n'
        'tc1 = "10 ppm/K"\n'
        for n in names
    )
    text = BRIEF.replace("pp 9 kohm + np 4k7", " + ".join(f"{n} 1k" for n in names)).replace("pp 1", "m0 1")
    [problem] = refused(text + films)
    assert "5 materials" in problem.found
