"""The resistor list, read back by a parser of this file and solved as a circuit."""

import re
import string
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from makers import by_name, film, random_films, random_tree
from scipy.optimize import linprog

from tcplan.errors import InputError
from tcplan.material.files import published
from tcplan.material.law import Expression, Polynomial, Table, Thermistor
from tcplan.network import Leg, Parallel, Series, legs, resistance, used_materials, value
from tcplan.spec.resistor_list import LONGEST_LINE, LONGEST_NAME, block_name, quadratic, resistor_list

REFERENCE, LOW, HIGH = 298.15, 233.15, 398.15
ELEMENT = re.compile(
    r"(R\d+) (\w+) (\w+) ([-+.0-9e]+) tc1=([-+.0-9e]+) tc2=([-+.0-9e]+) tnom=([-+.0-9e]+)", re.ASCII
)
T = np.linspace(LOW, HIGH, 97)


def parsed(text):
    """Return the name of the block and its resistors: a reader of its own, strict in every line."""
    resistors, name, ended = [], None, None
    assert text.isascii()
    assert text.endswith("\n")
    for line in text[:-1].split("\n"):
        assert len(line) <= LONGEST_LINE
        assert set(line) <= set(string.printable) - set("\t\n\r\v\f")
        if line.startswith("*"):
            continue
        if line.startswith(".subckt"):
            assert name is None
            _, name, *nodes = line.split(" ")
            assert nodes == ["a", "b"]
        elif line.startswith(".ends"):
            assert ended is None
            _, ended = line.split(" ")
        else:
            assert name is not None
            assert ended is None
            found = ELEMENT.fullmatch(line)
            assert found, line
            resistors.append((*found.groups()[:3], *map(float, found.groups()[3:])))
    assert name == ended
    assert len({resistor[0] for resistor in resistors}) == len(resistors)
    return name, resistors


def solved(resistors, at):
    """Return R between a and b at each temperature [K] by nodal analysis: 1 A into a, out at b."""
    nodes = sorted({node for _, one, other, *_ in resistors for node in (one, other)} - {"b"})
    row = {node: k for k, node in enumerate(nodes)}
    drive = np.array([1.0 if node == "a" else 0.0 for node in nodes])
    found = []
    for t in at:
        conductance = np.zeros((len(nodes), len(nodes)))
        for _, one, other, ohms, tc1, tc2, tnom in resistors:
            x = t - 273.15 - tnom
            ends = [row[node] for node in (one, other) if node != "b"]
            conductance[ends, ends] += 1.0 / (ohms * (1.0 + tc1 * x + tc2 * x * x))
            if len(ends) == 2:
                conductance[ends, ends[::-1]] -= 1.0 / (ohms * (1.0 + tc1 * x + tc2 * x * x))
        found.append(np.linalg.solve(conductance, drive)[row["a"]])
    return np.array(found)


def own(network, materials):
    return resistance(
        network, {name: materials[name].ratio(T, REFERENCE) for name in used_materials(network)}
    )


def listed(network, materials, title="t", **more):
    return resistor_list(network, materials, REFERENCE, LOW, HIGH, title=title, **more)


def leg(material, ohms):
    return Leg(material=material, ohms=ohms)


PAIR = by_name(film("pp", -120.0, 0.55), film("np", 150.0, 0.4))
BRIDGE = Series((Parallel((leg("pp", 5100.0), Series((leg("np", 3300.0), leg("pp", 47.5))))), leg("np", 1e4)))


def test_a_small_list_word_for_word():
    text = listed(Series((leg("pp", 14237.123), leg("np", 3763.0))), PAIR, title="Span resistor")
    lines = [line for line in text.splitlines() if not line.startswith("* ")]
    # By hand from the films: -120 ppm/K, 0.55 ppm/K^2 and 150 ppm/K, 0.4 ppm/K^2 at 25 degC.
    assert lines == [
        ".subckt Span_resistor a b",
        "R1 a n1 1.4237123e4 tc1=-1.2e-4 tc2=5.5e-7 tnom=25",
        "R2 n1 b 3.763e3 tc1=1.5e-4 tc2=4e-7 tnom=25",
        ".ends Span_resistor",
    ]
    comments = text.splitlines()
    assert comments[comments.index(lines[1]) - 1] == "* pp, leg a"
    assert comments[0] == "* Span resistor"


def test_nested_networks_get_nodes_of_their_own():
    _, resistors = parsed(listed(BRIDGE, PAIR))
    assert [resistor[1:3] for resistor in resistors] == [("a", "n1"), ("a", "n2"), ("n2", "n1"), ("n1", "b")]
    assert solved(resistors, T) == pytest.approx(own(BRIDGE, PAIR), rel=1e-9)


@settings(derandomize=True, max_examples=40, deadline=None)
@given(st.integers(0, 2**32 - 1), st.integers(1, 14), st.floats(263.15, 343.15))
def test_read_back_it_has_the_resistance_of_the_network(seed, size, reference):
    materials = random_films(seed, 5)
    network = random_tree(np.random.default_rng(seed), tuple(materials), size)
    text = resistor_list(network, materials, reference, LOW, HIGH, title="t")
    _, resistors = parsed(text)
    ratios = {name: material.ratio(T, reference) for name, material in materials.items()}
    assert solved(resistors, T) == pytest.approx(resistance(network, ratios), rel=1e-9)
    assert [resistor[3] for resistor in resistors] == pytest.approx(
        [x.ohms for x in legs(network)], rel=1e-11
    )
    assert "its law is no quadratic" not in text


# ---- laws that are no quadratic


def lawful(law, name="m"):
    return replace(film(name, 0.0), law=law, label=f"Label of {name}", valid=(225.0, 405.0))


LAWS = {
    "cubic": Polynomial(reference=REFERENCE, coefficients=(1e-3, 1e-6, 3e-9)),
    "thermistor": Thermistor(reference=REFERENCE, beta=600.0),
    "table": Table(
        reference=REFERENCE, points=((220.0, 0.9), (260.0, 0.97), (310.0, 1.01), (360.0, 1.08), (410.0, 1.2))
    ),
    "exponential": Expression(reference=REFERENCE, text="exp(B*(1/T - 1/T0))", constants=(("B", -450.0),)),
}


@pytest.mark.parametrize("law", LAWS.values(), ids=LAWS)
def test_what_is_no_quadratic_is_within_the_printed_error(law):
    materials = by_name(lawful(law), film("pp", -120.0, 0.55))
    network = Parallel((Series((leg("m", 4e3), leg("pp", 1e3))), leg("m", 900.0)))
    text = listed(network, materials)
    _, resistors = parsed(text)
    joined = " ".join(line.removeprefix("* ") for line in text.splitlines())
    told = re.search(r"Label of m: its law is no quadratic.*? off by ([.0-9]+) ppm at most", joined)
    error = float(told[1]) * 1e-6
    # Legs that are off by at most a part e leave a network off by at most e: R is homogeneous and rises with
    # every leg (Cohn's theorem, from memory).
    off = solved(resistors, T) / own(network, materials) - 1.0
    assert 0.0 < np.max(np.abs(off)) <= error
    alone = quadratic(materials["m"], REFERENCE, LOW, HIGH)
    fine = np.linspace(LOW, HIGH, 20011)
    x = fine - REFERENCE
    peak = np.max(np.abs((1 + alone.tc1 * x + alone.tc2 * x**2) / materials["m"].ratio(fine, REFERENCE) - 1))
    assert 0.99 * error <= peak <= error
    assert solved(resistors, [REFERENCE]) == pytest.approx([value(network)], rel=1e-11)


@pytest.mark.parametrize("law", LAWS.values(), ids=LAWS)
def test_the_largest_error_is_the_least_there_is(law):
    # The same problem as a linear programme, solved by scipy's HiGHS.
    material = lawful(law)
    grid = np.linspace(LOW, HIGH, 400)
    x, ratio = (grid - REFERENCE) / 100.0, material.ratio(grid, REFERENCE)
    columns, wanted = np.stack([x, x**2], axis=1) / ratio[:, None], 1.0 - 1.0 / ratio
    slack = -np.ones((len(grid), 1))
    least = linprog(
        [0.0, 0.0, 1.0],
        A_ub=np.block([[columns, slack], [-columns, slack]]),
        b_ub=np.concatenate([wanted, -wanted]),
        bounds=[(None, None)] * 3,
    )
    assert quadratic(material, REFERENCE, LOW, HIGH).error == pytest.approx(least.x[2], rel=5e-3)


def test_platinum_is_a_quadratic_above_the_ice_point_only():
    # IEC 60751: R = R0 (1 + A t + B t^2) from 0 degC on, with a third constant below.
    platinum = published("metals")["platinum"]
    above = quadratic(platinum, 273.15, 273.15, 373.15)
    assert (above.tc1, above.tc2) == pytest.approx((3.9083e-3, -5.775e-7), rel=1e-12)
    assert above.error == 0.0
    assert quadratic(platinum, 273.15, 223.15, 373.15).error > 1e-6


def test_a_law_that_no_quadratic_follows_is_refused():
    strong = by_name(lawful(Thermistor(reference=REFERENCE, beta=9000.0)))
    with pytest.raises(InputError, match=r"resistor list: m.*narrower range"):
        listed(leg("m", 1e4), strong)


# ---- text that is not to be trusted

HOSTILE = (
    "x\nR9 a b 0",
    "x\r\n.ends t\n",
    "x\u2028R9 a b 0",
    "x\x85R9 a b 0",
    "x\x0bR9 a b 0\x0c.end",
    "ends with a backslash \\",
    "\x00\x1b[2J",
    "µ Ω ° – wide \U0001f525",
    "y" * 500,
    "",
    "   ",
    ".include x",
    "+ 1k",
    "* $ ; //",
)


@pytest.mark.parametrize("text", HOSTILE)
def test_no_text_breaks_out_of_its_line(text):
    materials = by_name(replace(PAIR["pp"], label="plain"), PAIR["np"])
    # A material refuses such a label already; this writer does not rely on it.
    object.__setattr__(materials["pp"], "label", text)
    found = listed(BRIDGE, materials, title=text, labels=[text, "b", text, "d"])
    name, resistors = parsed(found)
    assert re.fullmatch(r"[A-Za-z][A-Za-z0-9_]{0,59}", name)
    assert len(resistors) == 4
    assert not any(line.endswith("\\") for line in found.splitlines())
    assert solved(resistors, T) == pytest.approx(own(BRIDGE, PAIR), rel=1e-9)


@settings(derandomize=True, max_examples=100, deadline=None)
@given(st.text(max_size=200))
def test_any_title_gives_a_name_and_whole_lines(title):
    name, resistors = parsed(listed(BRIDGE, PAIR, title=title))
    assert re.fullmatch(r"[A-Za-z][A-Za-z0-9_]*", name, re.ASCII)
    assert len(name) <= LONGEST_NAME
    assert len(resistors) == 4


@pytest.mark.parametrize(
    ("title", "name"),
    [
        ("Span resistor, brake-pressure front end", "Span_resistor_brake_pressure_front_end"),
        ("18 kohm", "r_18_kohm"),
        ("__x__", "x"),
        ("--", "resistor"),
        ("a" * 80, "a" * LONGEST_NAME),
    ],
)
def test_names(title, name):
    assert block_name(title) == name


@pytest.mark.parametrize("ohms", [1e-3, 1.0, 10.0, 123456789012.0, 4.7e9, 1 / 3])
def test_values_are_plain_numbers_of_twelve_digits(ohms):
    _, [(_, _, _, found, *_)] = parsed(listed(leg("pp", ohms), PAIR))
    assert found == pytest.approx(ohms, rel=1e-11)


def test_the_cautions_are_in_it():
    words = " ".join(line.removeprefix("* ") for line in listed(BRIDGE, PAIR).splitlines())
    for part in (
        "design estimates",
        "tc1 per K, tc2 per K^2, tnom in degC",
        "Power parts can burn",
        "no spread",
    ):
        assert part in words
