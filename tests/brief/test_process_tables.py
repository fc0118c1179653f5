"""What materials share: read from the brief and its files, checked as a whole, cut to what is in use."""

import re
from pathlib import Path

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.brief import parse_brief
from tcplan.errors import InputError
from tcplan.process import Corner, Parameter, Process, Tracking, process_from_dict

WHOLE = BRIEF + FILMS
BARE = """
[material.bare]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "10 ppm/K"
"""
PARTS = """
[material.p1]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "0 ppm/K"
series = "E96"
[material.p1.spread]
meaning = "limits"
tcr = "25 ppm/K"
"""
PARTS += PARTS.replace("p1", "p2").replace("tcr", "tc1")


def at(material, component):
    return Parameter(material=material, component=component)


def tracking(*names, within="3 ppm/K"):
    listed = ", ".join(f'"{name}"' for name in names)
    return f'[[tracking]]\nmaterials = [{listed}]\nwithin = "{within}"\n'


def only(text):
    with pytest.raises(InputError) as caught:
        brief(text)
    assert len(caught.value.problems) == 1, str(caught.value)
    return caught.value.problems[0]


def test_without_tables_nothing_is_shared():
    assert brief().process == Process()
    assert brief().to_dict()["process"] == Process().to_dict()


def test_tables_of_the_brief_and_of_its_file_go_together(tmp_path):
    (tmp_path / "films.toml").write_text("schema = 1\n" + FILMS + tracking("pp", "np"))
    corner = '[corner.slow.pp]\nohm_per_square = "+12 %"\ntc1 = "-20 ppm/K"\n'
    text = BRIEF.replace("[resistor]", 'materials = ["films.toml"]\n[resistor]') + corner
    made = parse_brief(text, "brief.toml", tmp_path)
    assert made.process.trackings == (Tracking(materials=("pp", "np"), within=3e-6),)
    shifts = ((at("pp", "value"), 0.12), (at("pp", "tc1"), -20e-6))
    assert made.process.corners == (Corner(name="slow", shifts=shifts),)
    assert process_from_dict(made.to_dict()["process"]) == made.process


def test_a_corner_in_two_files_is_refused(tmp_path):
    corner = '[corner.slow.pp]\ntc1 = "1 ppm/K"\n'
    (tmp_path / "films.toml").write_text("schema = 1\n" + FILMS + corner)
    text = BRIEF.replace("[resistor]", 'materials = ["films.toml"]\n[resistor]') + corner
    with pytest.raises(InputError, match="the corner slow a second time") as caught:
        parse_brief(text, "brief.toml", tmp_path)
    assert caught.value.problems[0].where == "brief.toml: corner.slow"


def test_what_is_not_in_use_is_left_out_and_still_checked():
    shared = (
        tracking("pp", "np", "p2")
        + '[corner.cold.p1]\nvalue = "0 %"\n'
        + '[corner.slow.pp]\nvalue = "-20 %"\n[corner.slow.np]\ntc1 = "40 ppm/K"\n'
    ).replace('value = "0 %"', 'tc1 = "25 ppm/K"')
    every = brief(WHOLE + PARTS + shared).process
    assert every.trackings[0].materials == ("pp", "np", "p2")
    assert [corner.name for corner in every.corners] == ["cold", "slow"]
    two = brief(WHOLE + PARTS + shared + '[search]\nuse = ["pp", "np"]\n').process
    assert two.trackings == (Tracking(materials=("pp", "np"), within=3e-6),)
    assert [corner.name for corner in two.corners] == ["slow"]
    one = brief(WHOLE + PARTS + shared + '[given]\nnetwork = "pp 18 kohm"\n').process
    assert one.trackings == ()
    assert one.corners == (Corner(name="slow", shifts=((at("pp", "value"), -0.2),)),)
    assert only(WHOLE + PARTS + tracking("pp", "bore") + '[search]\nuse = ["np"]\n')


@pytest.mark.parametrize(
    ("shared", "where", "says"),
    [
        (tracking("pp", "pp"), "tracking[1].materials", "a name twice"),
        (tracking("pp", "bere"), "tracking[1].materials", "Did you mean bare"),
        (tracking("pp", "bare"), "tracking[1].materials", "bare, which has no spread of TC1"),
        (tracking("pp", "np", within="0 ppm/K"), "tracking[1].within", "above zero"),
        (tracking("pp", "np", within="-1 ppm/K"), "tracking[1].within", "above zero"),
        (tracking("pp", "np", within="3 ppm"), "tracking[1].within", "a temperature coefficient"),
        (tracking("pp", "np") + tracking("p2", "np"), "tracking[2].materials", "np, which tracks in another"),
    ],
)
def test_trackings_that_are_refused(shared, where, says):
    found = only(WHOLE + BARE + PARTS + shared)
    assert found.where == f"brief.toml: {where}"
    assert says in str(found)


def test_a_tcr_limit_bounds_a_corner_and_does_not_track():
    made = brief(WHOLE + PARTS + '[corner.hot.p1]\ntc1 = "25 ppm/K"\n')
    assert made.process.corners[0].shift("p1", "tc1") == 25e-6
    assert "write tc1 in its place" in str(only(WHOLE + PARTS + tracking("pp", "p1")))


@pytest.mark.parametrize(
    ("shift", "inside"),
    [
        ('ohm_per_square = "20 %"', True),  # the limit itself: 20 % and 40 ppm/K are stated
        ('ohm_per_square = "-20 %"', True),
        ('ohm_per_square = "20.00001 %"', True),  # rounding of the last digit
        ('ohm_per_square = "20.001 %"', False),
        ('tc1 = "-40 ppm/K"', True),
        ('tc1 = "+40.1 ppm/K"', False),
        ('tc2 = "0.01 ppm/K^2"', False),  # no spread of TC2 is stated
    ],
)
def test_a_corner_lies_inside_the_limits(shift, inside):
    text = f"{WHOLE}[corner.slow.pp]\n{shift}\n"
    if inside:
        assert len(brief(text).process.corners) == 1
    else:
        found = only(text)
        assert found.where == f"brief.toml: corner.slow.pp.{shift.split()[0]}"
        assert "a corner inside the limits" in str(found)


def test_the_limits_of_a_sigma_are_three_times_as_far():
    sigma = WHOLE.replace('meaning = "limits"', 'meaning = "sigma"')
    assert brief(sigma + '[corner.slow.pp]\ntc1 = "120 ppm/K"\n').process.corners
    assert only(sigma + '[corner.slow.pp]\ntc1 = "121 ppm/K"\n').where.endswith("tc1")


@pytest.mark.parametrize(
    ("shared", "where", "says"),
    [
        ('[corner.slow.bare]\ntc1 = "1 ppm/K"\n', "corner.slow.bare.tc1", "no spread"),
        ('[corner.slow.bere]\ntc1 = "1 ppm/K"\n', "corner.slow.bere", "Did you mean bare"),
        ('[corner."a b".pp]\ntc1 = "1 ppm/K"\n', "corner", "the corner name 'a b'"),
        ("[corner.slow]\n", "corner.slow", "without shifts"),
        ("[corner.slow.pp]\n", "corner.slow.pp", "no shift"),
        (
            '[corner.slow.pp]\nohm_per_square = "1 %"\nvalue = "1 %"\n',
            "corner.slow.pp.value",
            "ohm_per_square and value",
        ),
        ('[corner.slow.pp]\ntc1 = "1 %"\n', "corner.slow.pp.tc1", "a temperature coefficient"),
    ],
)
def test_corners_that_are_refused(shared, where, says):
    found = only(WHOLE + BARE + shared)
    assert found.where == f"brief.toml: {where}"
    assert says in str(found)


def test_fifty_corners_and_no_more():
    corners = [f'[corner.c{n}.pp]\ntc1 = "1 ppm/K"\n' for n in range(51)]
    assert len(brief(WHOLE + "".join(corners[:50])).process.corners) == 50
    assert "51 corners" in str(only(WHOLE + "".join(corners)))


def test_a_material_that_cannot_be_read_is_the_one_mistake():
    text = WHOLE.replace('tc1 = "150 ppm/K"', 'tc1 = "150 ppm"')
    assert only(text + tracking("pp", "np")).where == "brief.toml: material.np.tc1"


def test_mistakes_of_shape_are_told_in_the_brief_too():
    found = only(WHOLE + tracking("pp", "np") + "strange = 1\n")
    assert found.where == "brief.toml: tracking[1].strange"


def test_the_example_of_the_documents_is_read_whole(tmp_path):
    text = (Path(__file__).parents[2] / "docs" / "input.md").read_text(encoding="utf-8")
    example = re.search(r"^```toml complete process.toml\n(.*?)^```$", text, re.M | re.S)[1]
    (tmp_path / "process.toml").write_text(example)
    made = parse_brief(
        BRIEF.replace("[resistor]", 'materials = ["process.toml"]\n[resistor]'), "brief.toml", tmp_path
    ).process
    assert [one.value for one in made.correlations] == [-0.6, 0.5]
    assert made.trackings == (Tracking(materials=("poly_low", "poly_mid"), within=15e-6),)
    assert made.corners[0].shift("poly_high", "value") == 0.15
    assert made.corners[0].shift("poly_low", "tc1") == 0.0
