"""Correlations: what may be named, each pair once, and the pair that makes them impossible."""

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from makers import BRIEF, FILMS, brief

from tcplan.brief import parse_brief
from tcplan.errors import InputError
from tcplan.process import Correlation, Parameter

WHOLE = BRIEF + FILMS
ENDS = """end_resistance = "40 %"
end_tc1 = "200 ppm/K"
width_bias = "0.02 um"
[material.{0}.film]
min_width = "1 um"
end_resistance = "35 ohm*um"
etch = "{1}"
"""


def correlation(first, second, value=0.5):
    return f'[[correlation]]\nbetween = ["{first}", "{second}"]\nvalue = {value}\n'


def problems(text):
    with pytest.raises(InputError) as caught:
        brief(text)
    return caught.value.problems


def only(text):
    found = problems(text)
    assert len(found) == 1, [str(problem) for problem in found]
    return found[0]


def films(*names, etch="poly"):
    """Return films that state every half-width but that of TC2."""
    return "".join(
        f'[material.{name}]\nsource = "invented"\nreference = "25 degC"\nvalid = ["-60 degC", "160 degC"]\n'
        f'tc1 = "10 ppm/K"\nohm_per_square = "100 ohm"\n[material.{name}.spread]\nmeaning = "limits"\n'
        f'ohm_per_square = "10 %"\ntc1 = "9 ppm/K"\n' + ENDS.format(name, etch)
        for name in names
    )


@pytest.mark.parametrize(
    ("word", "component"),
    [
        ("ohm_per_square", "value"),
        ("ohm_per_metre", "value"),
        ("value", "value"),
        ("tc1", "tc1"),
        ("end_resistance", "end_resistance"),
        ("end_tc1", "end_tc1"),
        ("width_bias", "width_bias"),
    ],
)
def test_every_component_by_its_name(word, component):
    made = brief(BRIEF + films("a") + FILMS + correlation(f"a.{word}", "pp.tc1", -0.6))
    expected = Correlation(
        first=Parameter(material="a", component=component),
        second=Parameter(material="pp", component="tc1"),
        value=-0.6,
    )
    assert made.process.correlations == (expected,)


def test_a_correlation_of_one_puts_values_in_one_group():
    made = brief(WHOLE + correlation("pp.ohm_per_square", "np.ohm_per_square", 1))
    assert made.process.value_groups(("np", "pp")) == (0, 0)
    assert made.process.correlations[0].value == 1.0


def test_those_of_materials_not_in_use_are_left_out():
    shared = correlation("pp.value", "pp.tc1") + correlation("pp.tc1", "np.tc1")
    made = brief(WHOLE + shared + '[search]\nuse = ["pp"]\n')
    assert [one.second.material for one in made.process.correlations] == ["pp"]


@pytest.mark.parametrize(
    ("first", "second", "says"),
    [
        ("pp.tc1", "pp.tc1", "with itself"),
        ("pp.value", "pp.ohm_per_square", "with itself"),
        ("pp.tc2", "np.tc1", "pp.tc2, which has no spread"),
        ("pp.tc_1", "np.tc1", "Did you mean pp.tc1"),
        ("pp", "np.tc1", "the parameter 'pp'"),
        ("pp.tc1.x", "np.tc1", "the parameter 'pp.tc1.x'"),
        ("bere.tc1", "pp.tc1", "Did you mean bare"),
        ("bare.tc1", "pp.tc1", "bare.tc1, which has no spread"),
    ],
)
def test_parameters_that_are_refused(first, second, says):
    bare = films("bare").split("[material.bare.spread]")[0]
    found = only(WHOLE + bare + correlation(first, second))
    assert found.where == "brief.toml: correlation[1].between"
    assert says in str(found)


@pytest.mark.parametrize("value", ["1.1", "-1.1", "nan", "inf", '"0.5"'])
def test_values_that_are_refused(value):
    found = problems(WHOLE + correlation("pp.tc1", "np.tc1", value))
    assert {problem.where for problem in found} == {"brief.toml: correlation[1].value"}


def test_a_pair_twice_whatever_its_order_and_names():
    shared = correlation("pp.value", "np.tc1") + correlation("np.tc1", "pp.ohm_per_square")
    found = only(WHOLE + shared)
    assert found.where == "brief.toml: correlation[2].between"
    assert "a second time" in str(found)


def test_a_pair_in_two_files(tmp_path):
    shared = correlation("pp.tc1", "np.tc1")
    (tmp_path / "films.toml").write_text("schema = 1\n" + FILMS + shared)
    text = BRIEF.replace("[resistor]", 'materials = ["films.toml"]\n[resistor]') + shared
    with pytest.raises(InputError, match="a second time") as caught:
        parse_brief(text, "brief.toml", tmp_path)
    assert caught.value.problems[0].where == "brief.toml: correlation[1].between"


def test_films_of_one_etch_have_one_width_error_unless_their_correlation_is_stated():
    text = BRIEF + films("a", "b") + FILMS
    both = correlation("a.width_bias", "pp.tc1", 0.7) + correlation("b.width_bias", "pp.tc1", 0.7)
    assert "a second time" in str(only(text + both))
    stated = correlation("a.width_bias", "b.width_bias", 0.1)
    assert len(brief(text + both + stated).process.correlations) == 3
    apart = BRIEF + films("a") + films("b", etch="metal") + FILMS
    assert len(brief(apart + both).process.correlations) == 2


def test_tc1_that_tracks_is_not_correlated_as_well():
    tracking = '[[tracking]]\nmaterials = ["pp", "np"]\nwithin = "3 ppm/K"\n'
    for other in ("np.tc1", "np.value"):
        found = only(WHOLE + tracking + correlation("pp.tc1", other))
        assert "one of correlation and tracking" in str(found)
    assert brief(WHOLE + tracking + correlation("pp.value", "np.value")).process.trackings


def test_the_pair_that_makes_them_impossible_is_named():
    """By hand: a with b and b with c at 0.9 force a with c above 0.9^2 - 0.19 = 0.62; -0.9 is not.

    The eigenvalues of [[1, u, u], [u, 1, v], [u, v, 1]] are 1 - v and 1 + v/2 -/+ sqrt(v^2/4 + 2 u^2);
    with u = 0.9 and v = -0.9 the least is 1 - 0.45 - sqrt(0.2025 + 1.62) = -0.8.
    """
    names = ("a", "b", "c")
    pairs = correlation("a.tc1", "b.tc1", 0.9) + correlation("a.tc1", "c.tc1", 0.9)
    text = BRIEF + films(*names)
    found = only(text + pairs + correlation("b.tc1", "c.tc1", -0.9))
    assert "-0.8)" in found.expected
    assert found.where.startswith("brief.toml: correlation[")
    assert brief(text + pairs + correlation("b.tc1", "c.tc1", 0.62)).process.correlations
    assert only(text + pairs + correlation("b.tc1", "c.tc1", 0.619)).where.endswith(".value")


def test_the_one_bad_pair_of_many_is_the_one_that_is_named():
    """Four that go together at 0.9, one pair said to be opposite: without it the rest can hold."""
    names = ("a", "b", "c", "d")
    pairs = list(itertools.combinations(names, 2))
    shared = "".join(
        correlation(f"{x}.tc1", f"{y}.tc1", -0.9 if (x, y) == ("b", "d") else 0.9) for x, y in pairs
    )
    found = only(BRIEF + films(*names) + shared)
    assert found.where == f"brief.toml: correlation[{pairs.index(('b', 'd')) + 1}].value"
    assert found.found.startswith("-0.9 between b.tc1 and d.tc1")


def test_each_group_that_cannot_hold_is_told():
    text = BRIEF + films("a", "b", "c")
    shared = "".join(
        correlation(f"a.{part}", f"b.{part}", 0.9)
        + correlation(f"b.{part}", f"c.{part}", 0.9)
        + correlation(f"a.{part}", f"c.{part}", -0.9)
        for part in ("tc1", "value")
    )
    assert len(problems(text + shared)) == 2


NAMES = ("a", "b", "c", "d", "e")
PAIRS = list(itertools.combinations(range(5), 2))
FIVE = BRIEF + films(*NAMES)


def written(values):
    return "".join(
        correlation(f"{NAMES[i]}.tc1", f"{NAMES[j]}.tc1", value)
        for (i, j), value in zip(PAIRS, values, strict=True)
    )


def least(values, without=None):
    """The smallest eigenvalue, put together anew: all five in one matrix."""
    matrix = np.eye(5)
    for n, ((i, j), value) in enumerate(zip(PAIRS, values, strict=True)):
        matrix[i, j] = matrix[j, i] = 0.0 if n == without else value
    return np.linalg.eigvalsh(matrix)[0]


@settings(max_examples=40, derandomize=True, deadline=None)
@given(st.lists(st.integers(-19, 19).map(lambda k: k / 20), min_size=10, max_size=10))
def test_refused_exactly_when_an_eigenvalue_is_below_zero_and_the_worst_pair_is_named(values):
    if least(values) >= -1e-9:
        assert len(brief(FIVE + written(values)).process.correlations) == 10
        return
    found = problems(FIVE + written(values))
    named = [int(problem.where.split("[")[1].split("]")[0]) - 1 for problem in found]
    # values of 0 leave the five in one group all the same: every pair is stated
    assert len(named) == 1
    raised = [least(values, without=n) for n in range(10)]
    assert raised[named[0]] == pytest.approx(max(raised), abs=1e-12)


@settings(max_examples=30, derandomize=True, deadline=None)
@given(st.integers(0, 10_000), st.integers(1, 6))
def test_what_real_random_values_have_is_never_refused(seed, rank):
    """Correlations of unit vectors: a Gram matrix, singular where there are fewer dimensions than films."""
    vectors = np.random.default_rng(seed).standard_normal((5, rank))
    vectors /= np.linalg.norm(vectors, axis=1, keepdims=True)
    values = [float(np.clip(vectors[i] @ vectors[j], -1.0, 1.0)) for i, j in PAIRS]
    assert len(brief(FIVE + written(values)).process.correlations) == 10


def test_two_hundred_correlations_and_no_more():
    many = FILMS + "".join(films(f"m{n}", etch=f"e{n}") for n in range(3))
    row = correlation("m0.tc1", "m1.tc1")
    found = problems(BRIEF + many + row * 201)
    assert any("200 entries at most" in str(problem) for problem in found)
