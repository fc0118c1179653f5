"""Parameter lines: what is read, what is listed, and that no text does more than that.

The form (suffixes, continuation and comment marks, tc1, tc2, tnom and its 27 degC) is that of published
simulator manuals, from memory; the files are invented.
"""

from __future__ import annotations

import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from makers import by_name, film, leg, random_films, random_tree

from tcplan.errors import InputError
from tcplan.material.files import parse_materials
from tcplan.measure.parameter_block import parameter_block
from tcplan.measure.parameter_lines import read_parameter_lines
from tcplan.measure.parameter_names import Names
from tcplan.measure.parameter_text import MOST_STATEMENTS, statements, words
from tcplan.measure.parameter_values import NotUnderstood, Values, is_milli, number
from tcplan.network import Series, legs
from tcplan.spec.resistor_list import resistor_list
from tcplan.toml_input import read_toml_text

LIBRARY = """\
* Invented films, for tests
.options TNOM=25 reltol=1e-4
.param rsh0 = 320
+ wide='rsh0*1.2'   ; a comment, with = and 'quotes
.MODEL rpp R (RSH='rsh0*1.2' TC1=-1.2e-4
* a comment between the lines

+ tc2=5.5e-7 narrow=0.05u) $ another
.model rnp RES tc1r=150u tc2r=0.4u tref=20 rsh={wide/2}
R1 a b 12k tc1=-1.2m tc2=3u
R2 b 0 3.3MEG rpp
r3 b 0 {rsh0*10} TC=-1.2m, 3u
R4 b 0 r='1k + 2k' tc1=1e-3 tnom=0
"""


def read(text, name="films.lib"):
    return read_parameter_lines(text, name)


def law(found, name):
    material = found.by_name[name]
    return (*material.law.coefficients, material.reference)


def why(found, line):
    return "; ".join(unread.why for unread in found.unread if unread.line == line)


# --- a file as it should be -----------------------------------------------------------------------


def test_models_and_resistors_become_materials():
    found = read(LIBRARY)
    assert list(found.by_name) == ["rpp", "rnp", "R1", "R4"]
    assert law(found, "rpp") == (-1.2e-4, 5.5e-7, 298.15)
    assert law(found, "rnp") == (1.5e-4, 4e-7, 293.15)
    assert law(found, "R1") == (-1.2e-3, 3e-6, 298.15)
    assert law(found, "R4") == (1e-3, 0.0, 273.15)
    assert [found.by_name[n].ohm_per_square for n in ("rpp", "rnp")] == [384.0, 192.0]
    assert [found.by_name[n].kind for n in found.by_name] == ["film", "film", "plain", "plain"]
    assert found.by_name["rpp"].source == "films.lib, line 5"
    assert (found.tnom, found.tnom_assumed) == (298.15, False)


def test_each_resistor_has_its_value_and_material():
    found = read(LIBRARY)
    assert [(r.name, r.line, r.ohms, r.material) for r in found.resistors] == [
        ("R1", 10, 12e3, "R1"),
        ("R2", 11, 3.3e6, "rpp"),
        ("r3", 12, 3200.0, "R1"),
        ("R4", 13, 3000.0, "R4"),
    ]
    assert [(u.line, u.why) for u in found.unread] == [(2, "the option 'reltol'"), (5, "the key 'narrow'")]


def test_the_nominal_temperature_of_the_form_is_assumed_where_none_is_stated():
    found = read("R1 a b 1k tc1=1m")
    assert (found.tnom, found.tnom_assumed) == (300.15, True)
    assert law(found, "R1") == (1e-3, 0.0, 300.15)


def test_a_resistor_may_change_what_its_model_says():
    found = read(".model m r (tc1=1m tc2=2u tnom=20 rsh=100)\nR1 a b m tc2=5u\nR2 a b 2k m")
    assert law(found, "R1") == (1e-3, 5e-6, 293.15)
    assert [r.material for r in found.resistors] == ["R1", "m"]


def test_blocks_have_parameters_and_models_of_their_own():
    text = (
        ".param k=1m\n.subckt one a b\n.param k=2m\n.model m r (tc1=k)\nR1 a b m\n.ends\n"
        ".subckt two a b\n.model m r (tc1=k tc2=1u)\nR1 a b m\n.ends two\nR3 a b m"
    )
    found = read(text)
    assert law(found, "m")[:2] == (2e-3, 0.0)
    assert law(found, "m_2")[:2] == (1e-3, 1e-6)
    assert [r.material for r in found.resistors] == ["m", "m_2"]
    assert found.notes == ("'m' is called m_2: that name is taken",)
    assert "no model of this file" in why(found, 11)


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_any_line_end_and_a_byte_order_mark(end):
    found = read("\ufeff" + LIBRARY.replace("\n", end))
    assert found.materials == read(LIBRARY).materials
    assert found.unread == read(LIBRARY).unread


# --- numbers and words -----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("12", 12.0),
        ("-1.5e-3", -1.5e-3),
        ("1f", 1e-15),
        ("1P", 1e-12),
        ("1n", 1e-9),
        ("1u", 1e-6),
        ("1\u00b5", 1e-6),
        ("1m", 1e-3),
        ("1M", 1e-3),
        ("1k", 1e3),
        ("1meg", 1e6),
        ("1MEGohm", 1e6),
        ("1g", 1e9),
        ("1t", 1e12),
        ("2mil", 50.8e-6),
        ("1mils", 25.4e-6),
        ("12kohm", 12e3),
        ("5ohm", 5.0),
        ("5\u03a9", 5.0),
        (".5k", 500.0),
        ("1.e3k", 1e6),
        ("0.55u", 5.5e-7),
    ],
)
def test_suffixes(text, value):
    assert number(text) == value


@pytest.mark.parametrize(
    "text",
    ["", "k", "4k7", "1x", "1a", "1e", "1_000", "1e999", "nan", "inf", "1.2.3", "1,5", "--1", "9" * 99],
)
def test_what_is_no_number(text):
    assert number(text) is None


def test_a_capital_m_is_said_to_be_milli():
    assert [is_milli(t) for t in ("1M", "1Mohm", "1m", "1MEG", "1Meg", "2MIL", "1k")] == [True] * 2 + [
        False
    ] * 5
    found = read("R1 a b 1M tc1=1u")
    assert found.resistors[0].ohms == 1e-3
    assert found.notes == ("1M is milli in this form; mega is written meg",)


def test_statements_and_words():
    text = "* c\n r1 a b ; x\n+ 1k $ y\n\n+ tc1 = 1 $z\nr$2 c 'a;b'\n+\n"
    assert [(s.line, s.text) for s in statements(text, "t")] == [
        (2, "r1 a b  1k  tc1 = 1"),
        (6, "r$2 c 'a;b' "),
    ]
    cut = words("m R(a=1,b = {x y} c='(1)' d=f(1, 2)) e,g")
    assert [(w.key, w.value, w.formula) for w in cut] == [
        ("", "m", False),
        ("", "R", False),
        ("a", "1", False),
        ("b", "x y", True),
        ("c", "(1)", True),
        ("d", "f(1, 2)", False),
        ("", "e", False),
        ("", "g", False),
    ]


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("2*3+4", 10.0),
        ("-2**2", -4.0),
        ("(1k+1k)/4u", 5e8),
        ("sqrt(16)*exp(0)", 4.0),
        ("rsh*1.2", 120.0),
        ("RSH/3", 100 / 3),
        ("1.5e-3*2e3", 3.0),
        ("2*pi", 2 * np.pi),
    ],
)
def test_arithmetic(formula, value):
    assert Values(known={((), "rsh"): 100.0}).of(formula, ()) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize(
    ("formula", "told"),
    [
        ("agauss(0,1,3)", "a function of chance"),
        ("1+AUNIF(0,1)", "a function of chance"),
        ("2^3", "differs between simulators"),
        ("x+1", "does not define"),
        ("a?1:2", "does not define"),
        ("1/0", "gives inf"),
        ("2k5*2", "not one"),
        ("__import__('os')", "does not define"),
        ("1;2", "at character"),
        ("9**9**9", "power"),
        ("(" * 60 + "1" + ")" * 60, "deep"),
        ("1+" * 300 + "1", "characters"),
        ("", "no formula"),
    ],
)
def test_what_is_no_arithmetic(formula, told):
    with pytest.raises(NotUnderstood, match=told.replace("(", r"\(")):
        Values().of(formula, ())


# --- what is not understood is listed ------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "line", "told", "materials"),
    [
        (".param a=b b=a\nR1 x y 1k tc1=a", 2, "leads back to itself", 0),
        (".param a=1m\n.param a=2m\nR1 x y 1k tc1=a", 3, "two values, on lines 1 and 2", 0),
        (".param a=1m\n.param a=1m\nR1 x y 1k tc1=a", 3, "", 1),
        (".param pi=3\nR1 x y 1k tc1='pi*1m'", 2, "formulas have already", 0),
        (".param a=agauss(0,1,3)\nR1 x y 1k tc1=1m", 1, "a function of chance", 1),
        ("R1 x y 'agauss(1k,1,3)' tc1=1m", 1, "the value: agauss()", 1),
        (".model m r (rsh='gauss(1,2,3)' tc1=1m)", 1, "rsh: gauss()", 1),
        (".model m r (rsh=-5 tc1=1m)", 1, "rsh: -5 ohm", 1),
        (".subckt s a b w=1m\nR1 a b 1k tc1=w\n.ends", 2, "where the block of line 1 is used", 0),
        (".if (a)\n.param k=1m\n.endif\nR1 a b 1k tc1=k", 4, "under a condition", 0),
        (".if (a)\nR1 a b 1k tc1=1m\n.endif", 2, "under a condition", 0),
        (".if (a)\n.model m r tc1=1m\n.endif\n.model m r tc1=2m", 4, "under a condition", 0),
        (".if (a)\n.options tnom=25\n.endif\nR1 a b 1 tc1=1m", 4, "may or may not hold", 0),
        (".options tnom=25\n.options tnom=27\nR1 a b 1 tc1=1m", 3, "on lines 1 and 2", 0),
        (".options tnom=x\nR1 a b 1 tc1=1m", 2, "on line 1 is not understood", 0),
        (".options tnom=x\nR1 a b 1 tc1=1m tnom=25", 1, "does not define", 1),
        (".lib tt\n.param k=1m\n.endl\nR1 a b 1 tc1=k", 4, "does not define here", 0),
        (".lib 'other.lib' tt", 1, "another file", 0),
        (".include other.lib", 1, "another file", 0),
        (".model m r tce=1", 1, "another law", 0),
        (".model m r tc1=1m tc3=1n", 1, "another law", 0),
        ("R1 a b 1k tc=1m,2u,3n", 1, "another law", 0),
        ("R1 a b 1k tc1=1m tc1=2m", 1, "tc1 twice", 0),
        (".model m r tc1=1m\n.model M r tc1=2m\nR1 a b m", 2, "a second time, after line 1", 0),
        (".model m nmos tc1=1m", 1, "not of a resistor", 0),
        (".model m", 1, "without a name and a kind", 0),
        ("R1 a b 1k", 1, "no tc1 or tc2", 0),
        ("R1 a b nomodel tc1=1m", 1, "no model of this file", 0),
        ("R1 a b 1k nomodel tc1=1m", 1, "no model of this file", 0),
        ("R1 a b 4k7 tc1=1m", 1, "no value", 0),
        ("Resistor test", 1, "is no resistor", 0),
        ("R1 a b 1k tc1=1 tnom=-400", 1, "absolute zero", 0),
        ("R1 a b 1k tc1=1", 1, "a law that reaches zero", 0),
        ("R1 a b '1k tc1=1", 1, "not closed", 0),
        ("R1 a b 1k tc1=", 1, "without a value", 0),
        ("+ tc1=1", 1, "goes on, without one before", 0),
        ("C1 a b 1p", 1, "no resistor line", 0),
        (".ends", 1, "without its beginning", 0),
        (".func f(x)='x'", 1, "function of the file's own", 0),
        (".param f(x)='x'", 1, "without a name", 0),
        ("R1 a b 1k tc1=1m m=2 foo=3", 1, "the key 'foo'", 1),
    ],
)
def test_it_is_listed_with_its_line(text, line, told, materials):
    found = read(text)
    assert told in why(found, line)
    assert bool(why(found, line)) == bool(told)
    assert len(found.materials) == materials


def test_a_multiplied_value_is_not_known():
    assert [r.ohms for r in read("R1 a b 1k tc1=1m m=2\nR2 a b 1k tc1=1m scale=3").resistors] == [None, None]


def test_long_chains_are_worked_out():
    lines = [f".param a{n}='a{n - 1}+1u'" for n in range(5000, 0, -1)]
    found = read("\n".join([*lines, ".param a0=0", "R1 a b 1 tc1=a5000"]))
    assert law(found, "R1")[0] == pytest.approx(5e-3, rel=1e-9)


# --- names -----------------------------------------------------------------------------------------------


def test_hostile_names_become_allowed_ones():
    marks = "R\x1b[31m"
    called = (marks, 'R";', "R/1", "R_1", f"R{'x' * 90}")
    found = read("\n".join(f"{name} a b 1k tc1={n}m" for n, name in enumerate(called, 1)))
    names = list(found.by_name)
    assert names == ["R_31m", "R_1", "R_1_2", "R" + "x" * 39]
    assert any("R_1 is called R_1_2" in note.replace("'", "") for note in found.notes)
    for text in (*found.notes, *(u.text for u in found.unread), *(m.label for m in found.materials)):
        assert text.isprintable()


def test_names_stay_apart_whatever_their_case():
    names, made = Names(), []
    for name in ("a", "A", "a_2", "9", "m_9", "", "x" * 50, "x" * 60):
        free, _ = names.free(name)
        names.take(free)
        made.append(free)
    assert made[:5] == ["a", "A_2", "a_2_2", "m_9", "m_9_2"]
    assert len({name.lower() for name in made}) == len(made)
    assert max(map(len, made)) == 40


# --- there and back ---------------------------------------------------------------------------------------


def back(found):
    content = read_toml_text(parameter_block(found), "block")
    assert content.pop("schema") == 1
    return parse_materials(content["material"], "block")


def test_the_block_reads_back_as_the_same_materials():
    found = read(LIBRARY)
    assert back(found) == found.by_name
    assert "25 degC where a line has none (as the file states)" in parameter_block(found)
    assert "assumed" in parameter_block(read("R1 a b 1k tc1=1m"))


@settings(derandomize=True, max_examples=100, deadline=None)
@given(
    st.floats(-1e-3, 1e-3),
    st.floats(-1e-6, 1e-6),
    st.floats(0.0, 60.0),
    st.floats(1e-9, 1e9),
    st.text(max_size=20),
)
def test_every_digit_survives_the_block(tc1, tc2, tnom, sheet, name):
    found = read(f".model m r (tc1={tc1!r} tc2={tc2!r} tnom={tnom!r} rsh={sheet!r})", name or "t")
    assert back(found) == found.by_name
    [material] = found.materials
    assert material.law.coefficients == (tc1, tc2)
    assert material.ohm_per_square == sheet


def test_a_resistor_list_of_ours_is_read():
    materials = by_name(film("pp", -120.0, 0.55), film("np", 150.0, 0.4))
    network = Series((leg("pp", 12e3), leg("np", 4700.0), leg("pp", 1e3)))
    found = read(resistor_list(network, materials, 298.15, 233.15, 398.15, title="Round trip"))
    assert [(r.name, r.ohms, r.material) for r in found.resistors] == [
        ("R1", 12e3, "R1"),
        ("R2", 4700.0, "R2"),
        ("R3", 1e3, "R1"),
    ]
    assert law(found, "R1") == (-1.2e-4, 5.5e-7, 298.15)
    assert law(found, "R2") == (1.5e-4, 4e-7, 298.15)
    assert found.unread == ()


@settings(derandomize=True, max_examples=30, deadline=None)
@given(st.integers(0, 2**32 - 1), st.integers(1, 10), st.floats(273.15, 343.15))
def test_any_resistor_list_of_ours_is_read(seed, size, reference):
    materials = random_films(seed, 4)
    network = random_tree(np.random.default_rng(seed), tuple(materials), size)
    found = read(resistor_list(network, materials, reference, 233.15, 398.15, title="t"))
    T = np.linspace(233.15, 398.15, 12)
    assert len(found.resistors) == size
    for resistor, original in zip(found.resistors, legs(network), strict=True):
        assert resistor.ohms == pytest.approx(original.ohms, rel=1e-11)
        again = found.by_name[resistor.material].ratio(T, reference)
        assert again == pytest.approx(materials[original.material].ratio(T, reference), rel=1e-9)


# --- any text -----------------------------------------------------------------------------------------------

PIECES = st.sampled_from(
    (
        *"\n\n+*;$'\"{}()=,. \t^\x00\u2028",
        *(".param ", ".model ", "R1 a b ", " r (", "tc1=", "tc=", "rsh=", "1m", "1e9", "-2", "a=b ", "b=a "),
        *(".options tnom=", ".subckt s a b ", ".ends", ".if", ".endif", ".lib x", ".endl"),
    )
)


@settings(derandomize=True, max_examples=400, deadline=2000)
@given(st.one_of(st.text(max_size=200), st.lists(PIECES, max_size=60).map("".join)))
def test_any_text_gives_a_result_or_says_why_not(text):
    try:
        found = read(text)
    except InputError:  # blocks nested too deeply
        return
    for material in found.materials:
        assert np.all(material.ratio(np.array([233.15, 398.15]), material.reference) > 0)
    if found.materials:
        assert back(found) == found.by_name


@pytest.mark.parametrize(
    "text",
    [
        "(" * 300_000,
        "'" * 299_999,
        "R1 a b 1\n" + "+ a\n" * 60_000,
        "R1 a b x=" + "(" * 300_000,
        ".param x=" + "1+" * 100_000 + "1",
        "R1 a b " + "a=1 " * 60_000,
        "\n".join(f"R{'x' * 50} a b 1 tc1={n}u" for n in range(1000)),
    ],
)
def test_long_texts_end_soon(text):
    start = time.process_time()
    found = read(text)
    assert time.process_time() - start < 10.0
    assert found.unread or found.notes


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("a\n" * (MOST_STATEMENTS + 1), "50000 at most"),
        ("x" * 2_000_001, "2000000 at most"),
        (".subckt a b\n" * 21, "nested 21 deep"),
        ("\n".join(f"R{n} a b 1 tc1={n + 1}e-9" for n in range(2001)), "2000 at most"),
    ],
)
def test_too_much_is_refused(text, told):
    with pytest.raises(InputError, match=told):
        read(text)
