"""Briefs: what is read, and every mistake reported at once with its place."""

from pathlib import Path

import numpy as np
import pytest
from makers import BRIEF, FILMS, brief

from tcplan.brief import parse_brief, read_brief
from tcplan.errors import InputError
from tcplan.network import Parallel, network_text, value

WHOLE = BRIEF + FILMS


def changed(*pairs, text=WHOLE):
    for old, new in pairs:
        assert old in text
        text = text.replace(old, new, 1)
    return text


def problems(text):
    with pytest.raises(InputError) as caught:
        brief(text)
    return [str(problem) for problem in caught.value.problems]


def test_a_plain_brief():
    made = brief()
    assert made.title == "Test resistor"
    assert made.target.ohms == 18000.0
    assert (made.over.low, made.over.high, made.over.reference) == (233.15, 423.15, 298.15)
    assert made.goal.limits[0].value == pytest.approx(0.006)
    assert made.goal.judge == "nominal"
    assert made.rules.arrangements == ("single", "series", "parallel", "mixed")
    assert [m.name for m in made.materials] == ["np", "pp"]
    assert len(made.sha256) == 64


def test_named_range_with_rise():
    text = changed(('low = "-40 degC"\nhigh = "150 degC"', 'range = "automotive-1"\nrise = "10 K"'))
    over = brief(text).over
    assert (over.low_degC, over.high_degC, over.rise) == (-40.0, 135.0, 10.0)


def test_every_limit():
    goal = 'drift = "1 %"\nband = "1.5 %"\nchord_tcr = "50 ppm/K"\nbox_tcr = "60 ppm/K"\n'
    goal += 'mask = [["0 degC", "70 degC", "0.1 %"], ["-40 degC", "150 degC", "0.3 %"]]'
    made = brief(changed(('drift = "6000 ppm"', goal)))
    assert [limit.kind for limit in made.goal.limits] == ["drift", "band", "chord_tcr", "box_tcr", "mask"]
    assert made.goal.limits[4].windows[0].high == 343.15


@pytest.mark.parametrize(
    ("goal", "at_150"),
    [
        ('tc1 = "3000 ppm/K"', 1 + 3000e-6 * 125),
        ('tc1 = "100 ppm/K"\ntc2 = "0.5 ppm/K^2"', 1 + 100e-6 * 125 + 0.5e-6 * 125**2),
        ('law = "exp(a*(T - T0))"\n[goal.law_parameters]\na = 0.003', np.exp(0.003 * 125)),
        (
            'table = [["-40 degC", "-2 %"], ["25 degC", "0 %"], ["90 degC", "2 %"], ["150 degC", "4 %"]]',
            1.04,
        ),
    ],
)
def test_wanted_laws(goal, at_150):
    made = brief(changed(('drift = "6000 ppm"', f'drift = "6000 ppm"\n{goal}')))
    T = np.array([298.15, 423.15])
    np.testing.assert_allclose(made.goal.wanted_ratio(T, 298.15), [1.0, at_150], rtol=1e-9)


def test_the_quantile_is_a_judge():
    assert brief().goal.quantile == 0.9973
    made = brief(changed(('drift = "6000 ppm"', 'drift = "6000 ppm"\njudge = "quantile"')))
    assert (made.goal.judge, made.goal.quantile) == ("quantile", 0.9973)
    made = brief(changed(('drift = "6000 ppm"', 'drift = "1 %"\njudge = "quantile"\nquantile = 0.99')))
    assert (made.goal.judge, made.goal.quantile) == ("quantile", 0.99)
    assert made.to_dict()["goal"]["quantile"] == 0.99


def test_how_well_the_value_is_met():
    assert (brief().target.tolerance, brief().target.trim_step) == (None, None)
    made = brief(changed(('value = "18 kohm"', 'value = "18 kohm"\ntolerance = "1 %"')))
    assert (made.target.ohms, made.target.tolerance, made.target.trim_step) == (18000.0, 0.01, None)
    made = brief(changed(('value = "18 kohm"', 'value = "18 kohm"\ntrim_step = "0.1 %"')))
    assert made.to_dict()["resistor"] == {
        "value_ohms": 18000.0,
        "also_ohms": [],
        "at_most_ohms": None,
        "tolerance": None,
        "trim_step": pytest.approx(0.001),
    }
    coil = '[[fixed]]\nmaterial = "pp"\nvalue = "1 kohm"\n'
    free = changed(('value = "18 kohm"', 'value = "free"\ntolerance = "2 %"'))
    assert brief(free + coil).target.tolerance == 0.02


STEEP = """
[material.steep]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-7000 ppm/K"
[material.steep.spread]
meaning = "limits"
tc1 = "1000 ppm/K"
"""


def test_a_spread_over_which_a_law_reaches_zero_names_its_material():
    """By hand: 1 - 0.008 * 125 = 0 at the hot end, with TC1 at its limit."""
    [found] = problems(WHOLE + STEEP)
    assert found.startswith("brief.toml: material.steep.spread: found a law that reaches zero or below")
    assert brief(WHOLE + STEEP + '[search]\nuse = ["pp", "np"]').by_name.keys() == {"np", "pp"}
    assert brief(WHOLE + STEEP.replace("1000 ppm", "990 ppm")).by_name["steep"].spread.tc1 == 990e-6


def test_a_value_that_could_reach_zero_at_the_reference_names_its_material():
    """By hand: (1 + 0.95)(1 + 0.001 * 65)/1 - 1 > 1, 65 K from the material's own reference."""
    far = STEEP.replace("-7000", "0").replace('"25 degC"', '"90 degC"') + 'value = "95 %"\n'
    [found] = problems(WHOLE + far)
    assert found.startswith("brief.toml: material.steep.spread: found a value that is uncertain by")


def test_given_network_as_written_and_scaled():
    given = '[given]\nnetwork = "pp 5k1 || np 3k3"\n'
    assert value(brief(WHOLE + given).given) == pytest.approx(1 / (1 / 5100 + 1 / 3300))
    scaled = brief(WHOLE + given + "scaled = true\n").given
    assert value(scaled) == pytest.approx(18000.0)
    assert isinstance(scaled, Parallel)
    assert network_text(scaled).startswith("pp ")


def test_a_file_and_its_materials_file(tmp_path):
    (tmp_path / "films.toml").write_text("schema = 1\n" + FILMS)
    path = tmp_path / "brief.toml"
    path.write_text(BRIEF.replace("[resistor]", 'materials = ["films.toml"]\n[resistor]'))
    assert [m.name for m in read_brief(path).materials] == ["np", "pp"]


def test_published_materials():
    text = BRIEF.replace("[resistor]", 'materials = ["published:alloys"]\n[resistor]')
    text = text.replace("-40 degC", "0 degC").replace("150 degC", "100 degC")
    made = brief(text + '[search]\nuse = ["nichrome", "constantan"]\n')
    assert [m.name for m in made.materials] == ["constantan", "nichrome"]


def test_all_mistakes_at_once():
    text = changed(
        ('value = "18 kohm"', "value = 18000"),
        ('drift = "6000 ppm"', 'dirft = "6000 ppm"\nband = "5 V"'),
        ('tc1 = "-120 ppm/K"', 'tc1 = "-120 ppm"'),
        ('low = "-40 degC"', 'low = "-40"'),
    )
    found = "\n".join(problems(text))
    for part in (
        "resistor.value",
        "dirft",
        "Did you mean drift",
        "goal.band",
        "material.pp.tc1",
        "temperature.low",
    ):
        assert part in found


@pytest.mark.parametrize(
    ("change", "says"),
    [
        (('title = "Test resistor"\n', ""), "title"),
        (("schema = 1", "schema = 2"), "schema"),
        (("schema = 1", "schema = true"), "schema"),
        (('value = "18 kohm"', 'value = "0 ohm"'), "above zero"),
        (('value = "18 kohm"', 'value = "-1 ohm"'), "above zero"),
        (('value = "18 kohm"', 'value = "nan ohm"'), "resistor.value"),
        (('value = "18 kohm"', 'value = "inf ohm"'), "resistor.value"),
        (('value = "18 kohm"', 'value = "1e999 ohm"'), "resistor.value"),
        (('value = "18 kohm"', 'value = "free"'), "value"),
        (('value = "18 kohm"', ""), "value"),
        (('value = "18 kohm"', 'value = "18 kohm"\nat_most = "20 kohm"'), "one of the two"),
        (('low = "-40 degC"', 'low = "160 degC"'), "low"),
        (('low = "-40 degC"', 'low = "30 degC"'), "reference"),
        (('low = "-40 degC"', 'low = "-80 degC"'), "validity of"),
        (('low = "-40 degC"', 'range = "automotive-9"\nlow = "-40 degC"'), "range together"),
        (('low = "-40 degC"\nhigh = "150 degC"', 'range = "automotiv-1"'), "Did you mean"),
        (('low = "-40 degC"\n', ""), "low and high"),
        (('drift = "6000 ppm"', 'drift = "0 ppm"'), "above zero"),
        (('drift = "6000 ppm"', 'drift = "6000 ppm"\njudge = "quantil"'), "Did you mean quantile"),
        (('drift = "6000 ppm"', 'drift = "6000 ppm"\nquantile = 0.99'), "quantile without its judge"),
        (('drift = "6000 ppm"', 'judge = "worst-case"\nquantile = 0.99'), "quantile without its judge"),
        (('drift = "6000 ppm"', 'judge = "quantile"\nquantile = 0.49'), "0.5"),
        (('drift = "6000 ppm"', 'judge = "quantile"\nquantile = 1.0'), "0.999999 at most"),
        (('drift = "6000 ppm"', 'judge = "quantile"\nquantile = "99 %"'), "a number"),
        (('drift = "6000 ppm"', 'judge = "quantile"\nquantile = nan'), "finite"),
        (('value = "18 kohm"', 'value = "18 kohm"\ntolerance = "100 %"'), "less than 100 %"),
        (('value = "18 kohm"', 'value = "18 kohm"\ntolerance = "0 %"'), "above zero"),
        (('value = "18 kohm"', 'value = "18 kohm"\ntrim_step = "-1 %"'), "above zero"),
        (('value = "18 kohm"', 'value = "18 kohm"\ntrim_step = 1'), "text in quotes"),
        (
            ('value = "18 kohm"', 'value = "18 kohm"\ntolerance = "1 %"\ntrim_step = "0.1 %"'),
            "tolerance and trim_step together",
        ),
        (('drift = "6000 ppm"', 'mask = [["70 degC", "0 degC", "1 %"]]'), "low below high"),
        (('drift = "6000 ppm"', 'mask = [["0 degC", "70 degC"]]'), "3 entries"),
        (('drift = "6000 ppm"', 'tc1 = "1 ppm/K"\nlaw = "1"'), "one wanted law"),
        (('drift = "6000 ppm"', "law = \"__import__('os')\""), "goal.law"),
        (('drift = "6000 ppm"', 'law = "T.real"'), "goal.law"),
        (('drift = "6000 ppm"', 'law = "1 - (T - T0)/10"'), "goal"),
        (
            ('drift = "6000 ppm"', 'table = [["0 degC", "0 %"], ["25 degC", "0 %"], ["50 degC", "1 %"]]'),
            "range",
        ),
    ],
)
def test_refusals(change, says):
    assert says in "\n".join(problems(changed(change)))


@pytest.mark.parametrize(
    ("more", "says"),
    [
        ('[search]\nuse = ["pq"]', "one of np, pp"),
        ('[search]\nuse = ["pp", "pp"]', "each name once"),
        ('[search]\nmin_share = "60 %"', "0 % to 50 %"),
        ("[search]\nmin_share = 3", "text in quotes"),
        ("[search]\nmax_materials = 0", "1 or more"),
        ("[search]\nmax_materials = 2.5", "whole number"),
        ('[search]\narrangements = ["serial"]', "Did you mean"),
        ('[[fixed]]\nmaterial = "pp"\nvalue = "20 kohm"', "more than the fixed"),
        ('[[fixed]]\nmaterial = "pp"\nvalue = "20 kohm"\nplace = "bridge"', "place"),
        ('[[fixed]]\nmaterial = "xx"\nvalue = "2 kohm"', "a material named"),
        (
            '[[fixed]]\nmaterial = "pp"\nvalue = "2 kohm"\n'
            '[[fixed]]\nmaterial = "pp"\nvalue = "90 kohm"\nplace = "parallel"',
            "all of them in one place",
        ),
        (
            '[search]\narrangements = ["parallel"]\n[[fixed]]\nmaterial = "pp"\nvalue = "2 kohm"',
            "where the fixed member is",
        ),
        ('[given]\nnetwork = "pp 5k1 + qq 1k"', "one of np, pp"),
        ('[given]\nnetwork = "pp 5k1"\n[search]\nmax_legs = 2', "[given]"),
        ("[given]\nnetwork = 12", "text in quotes"),
        ("[strange]\nkey = 1", "strange"),
    ],
)
def test_refusals_of_members(more, says):
    assert says in "\n".join(problems(WHOLE + more))


def test_a_brief_without_materials():
    assert "materials" in "\n".join(problems(BRIEF))


def test_a_material_in_two_places(tmp_path):
    (tmp_path / "films.toml").write_text("schema = 1\n" + FILMS)
    text = WHOLE.replace("[resistor]", 'materials = ["films.toml"]\n[resistor]', 1)
    with pytest.raises(InputError, match="twice"):
        parse_brief(text, "brief.toml", tmp_path)


@pytest.mark.parametrize("name", ["missing.toml", "."])
def test_materials_file_that_is_none(name, tmp_path):
    text = WHOLE.replace("[resistor]", f'materials = ["{name}"]\n[resistor]', 1)
    with pytest.raises(InputError, match=r"no such file|folder"):
        parse_brief(text, "brief.toml", tmp_path)


def test_extrapolation_is_allowed_only_with_an_added_spread():
    wide = changed(('high = "150 degC"', 'high = "170 degC"'))
    assert "validity" in "\n".join(problems(wide))
    table = 'extrapolate_to = ["-60 degC", "175 degC"]\n[material.{0}.extrapolation]\ntc1 = "9 ppm/K"\n'
    for name in ("pp", "np"):
        wide = wide.replace(f"[material.{name}.spread]", table.format(name) + f"[material.{name}.spread]")
    made = brief(wide)
    assert made.by_name["pp"].is_extrapolated(made.over.low, made.over.high)


def test_the_title_is_one_line():
    made = brief(changed(('title = "Test resistor"', 'title = "a\\nb\\u001b[31m"')))
    assert "\n" not in made.title
    assert "\x1b" not in made.title


@pytest.mark.parametrize("text", ["", "\n", "not toml", "schema = 1\nschema = 1", "\x00", "a = " + "[" * 500])
def test_what_is_not_a_brief(text):
    with pytest.raises(InputError):
        brief(text)


def test_a_large_file_is_refused_at_once(tmp_path):
    path = tmp_path / "brief.toml"
    path.write_bytes(b"# " + b"x" * 10_000_000)
    with pytest.raises(InputError, match="bytes"):
        read_brief(Path(path))
