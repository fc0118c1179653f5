"""Parts of a plan: what is made, recomputed from plan.json alone, at every value, and what is refused."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from makers import BRIEF, brief

import tcplan.workflow.made_films as made_films
from tcplan.brief import read_brief
from tcplan.cli.main import cli
from tcplan.errors import InputError
from tcplan.made import FilmLeg, PlainLeg, StockLeg, WireLeg
from tcplan.network import legs, value
from tcplan.parts.films import FilmRules
from tcplan.plan import plan_json
from tcplan.plan_file import read_plan
from tcplan.workflow.made_task import POINTS
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan

EXAMPLES = Path(__file__).parents[2] / "examples"
FILMS = """
[material.pp]
source = "invented"
reference = "27 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-120 ppm/K"
tc2 = "0.55 ppm/K^2"
ohm_per_square = "320 ohm"
[material.pp.spread]
meaning = "limits"
ohm_per_square = "20 %"
tc1 = "40 ppm/K"
end_resistance = "40 %"
end_tc1 = "200 ppm/K"
[material.pp.film]
min_width = "2 um"
width_bias = "0.05 um"
end_resistance = "90 ohm*um"
end_tc1 = "-900 ppm/K"
matching = "1.2 %*um"
spacing = "0.6 um"
grid = "5 nm"
[material.np]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "150 ppm/K"
tc2 = "0.4 ppm/K^2"
ohm_per_square = "120 ohm"
[material.np.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "40 ppm/K"
[material.np.film]
min_width = "1 um"
spacing = "0.6 um"
"""
STOCK = """
[material.flat]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-30 ppm/K"
series = "E96"
[material.flat.spread]
meaning = "limits"
value = "0.1 %"
tcr = "25 ppm/K"
[material.rising]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "900 ppm/K"
series = "E24"
[material.rising.spread]
meaning = "limits"
value = "1 %"
tcr = "100 ppm/K"
"""
WIRE = """
[material.up]
source = "invented"
reference = "20 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "93 ppm/K"
ohm_per_metre = "13.8 ohm/m"
[material.down]
source = "invented"
reference = "20 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-74 ppm/K"
ohm_per_metre = "5.8 ohm/m"
"""
RULES = PartsRules(films=FilmRules())
SERIES = '[search]\narrangements = ["series"]\n'


def plan_of(materials, *, judge="worst-case", limit="9500 ppm", value='"18 kohm"', more=SERIES):
    text = BRIEF.replace('drift = "6000 ppm"', f'drift = "{limit}"\njudge = "{judge}"')
    return make_plan(brief(text.replace('"18 kohm"', value) + more + materials))


@pytest.fixture(scope="module")
def films():
    return make_parts(plan_of(FILMS), RULES)


@pytest.fixture(scope="module")
def several():
    return make_parts(plan_of(FILMS, value='["18 kohm", "36 kohm", "5 kohm"]'), RULES)


# ---- from W, L and counts alone


def unit_ohms(row, t):
    """Return R = Rs L/(W - dW) + 2 Re/W of a unit of plan.json at t degC, from the data of FILMS alone."""
    width, length, x = row["width_m"] * 1e6, row["length_m"] * 1e6, t - 27.0  # um, K
    if row["material"] == "pp":
        body = 320 * length / (width - 0.05) * (1 - 120e-6 * x + 0.55e-6 * x**2)
        return body + 2 * 90 / width * (1 - 900e-6 * x)
    return 120 * length / width * (1 + 150e-6 * (t - 25) + 0.4e-6 * (t - 25) ** 2)


def total_ohms(rows, t):
    """Return R of a series network of legs of units at t degC."""
    return sum(unit_ohms(row, t) * row["in_series"] / row["in_parallel"] for row in rows)


def test_a_film_leg_by_hand(films):
    """Every leg from W, L and counts alone, its body carried from 27 to 25 degC by its own law."""
    rows = json.loads(plan_json(films.plan))["parts"]["made"][0]["legs"]
    for row in rows:
        ohms = unit_ohms(row, 25.0) * row["in_series"] / row["in_parallel"]
        assert row["ohms"] == pytest.approx(ohms, rel=1e-9)
        assert row["ohms"] == pytest.approx(row["wanted_ohms"], rel=1.001e-3)
        steps = row["width_m"] / 5e-9, row["length_m"] / 5e-9
        assert steps == pytest.approx(tuple(map(round, steps)), abs=1e-6)
    assert [row["mismatch"] is not None for row in rows] == [row["material"] == "pp" for row in rows]


def test_the_made_network_drifts_as_its_units_do(several):
    """R(T) of bodies and ends at every value, by hand on a fine grid, against the figures of plan.json."""
    data, t = json.loads(plan_json(several.plan))["parts"], np.linspace(-40, 150, 20001)
    for made in data["made"]:
        rows = made["legs"]
        peak = np.max(np.abs(total_ohms(rows, t) / total_ohms(rows, 25.0) - 1)) * 1e6
        assert made["option"]["nominal"]["peak_ppm"] == pytest.approx(peak, rel=1e-6)
        assert made["value_error"] == pytest.approx(
            total_ohms(rows, 25.0) / made["target_ohms"] - 1, abs=1e-9
        )
        assert made["option"]["worst_case"]["peak_ppm"] >= made["option"]["nominal"]["peak_ppm"]
    assert "pp_ends" in data["materials"]


def test_ends_move_the_drift_and_their_spread_the_worst_case(films):
    made = films.parts.made[0].option
    assert made.nominal.figure_ppm != pytest.approx(films.ideal.nominal.figure_ppm, rel=1e-4)
    assert "pp_ends" in made.worst_case.point
    assert made.worst_case.peak_ppm > films.ideal.worst_case.peak_ppm
    assert made.likely is not None


def test_the_plan_with_its_parts_comes_back(films, several):
    for made in (films, several):
        assert read_plan(plan_json(made.plan)) == made.plan
        assert made.parts.option == made.ideal.id == made.plan.chosen
        assert made.plan.options == replace(made.plan, parts=None).options


def test_the_ways_are_a_trade_and_the_first_within_the_limit_is_taken():
    """At 9100 ppm the way of least area is not enough, and the next one is taken."""
    made = make_parts(plan_of(FILMS, limit="9100 ppm"), RULES)
    areas, figures = [way.area for way in made.ways], [way.figure for way in made.ways]
    assert areas == sorted(areas)
    assert figures == sorted(figures, reverse=True)
    assert figures[0] > 9100e-6
    assert made.way == next(way for way in made.ways if way.figure <= 9100e-6)
    drawn = sum(leg.area for leg in made.parts.made[0].legs)
    assert made.way.area >= drawn * (1 - 1e-12)  # of the whole: dummies and ends beside the units
    assert made.verdict == "MET"
    assert made.parts.made[0].option.worst_case.upper_bound_ppm <= made.way.figure * 1e6 * (1 + 1e-9)


def test_a_smaller_error_is_kept():
    finer = make_parts(plan_of(FILMS), PartsRules(films=FilmRules(error=1e-5)))
    assert all(abs(leg.ohms / leg.wanted_ohms - 1) <= 1e-5 * (1 + 1e-9) for leg in finer.parts.made[0].legs)
    assert abs(finer.parts.made[0].value_error) <= 1e-5


# ---- several values, one mix


def test_several_values_are_of_one_unit_and_counts_scale(several):
    """18, 36 and 5 kohm: each film has one unit at all of them, and ohms follow the values."""
    made = several.parts.made
    assert [one.target_ohms for one in made] == pytest.approx([18e3, 36e3, 5e3], rel=1e-12)
    assert len({leg.material for leg in made[0].legs}) == 2
    for k, leg in enumerate(made[0].legs):
        assert {one.legs[k].unit for one in made} == {leg.unit}
        for one, factor in zip(made, (1.0, 2.0, 5 / 18), strict=True):
            assert one.legs[k].id == leg.id
            assert one.legs[k].wanted_ohms == pytest.approx(leg.wanted_ohms * factor, rel=1e-9)
            counts = one.legs[k].in_series / one.legs[k].in_parallel
            assert counts == pytest.approx(leg.in_series / leg.in_parallel * factor, rel=2.1e-3)
    assert all(abs(one.value_error) <= 1e-3 for one in made)
    assert [one.option.id for one in made] == [f"{several.ideal.id}-made-{k}" for k in (1, 2, 3)]
    assert several.verdict == "MET"


def test_values_that_are_nearly_alike_are_kept_apart():
    plan = plan_of(FILMS, value='["18.0001 kohm", "18.0004 kohm"]')
    made = make_parts(plan, RULES).parts.made
    for one in made:
        assert sum(leg.wanted_ohms for leg in one.legs) == pytest.approx(one.target_ohms, rel=1e-9)


# ---- the mix found again


def test_the_mix_found_again_is_not_worse_than_that_of_the_plan(monkeypatch):
    """Ends with a fifth of some units: the judged figure falls by a part that is no rounding."""
    heavy = FILMS.replace('"90 ohm*um"', '"900 ohm*um"')
    again = make_parts(plan_of(heavy), RULES)
    monkeypatch.setattr(made_films, "_found_again", lambda *_: None)
    plain = make_parts(plan_of(heavy), RULES)
    best, before = (min(way.figure for way in made.ways) for made in (again, plain))
    assert best <= before * 0.99
    assert value(again.parts.made[0].option.network) == pytest.approx(18e3, rel=1e-3)
    wanted = [leg.wanted_ohms for leg in again.parts.made[0].legs]
    assert sum(wanted) == pytest.approx(18e3, rel=1e-9)
    assert wanted != pytest.approx([leg.ohms for leg in legs(again.ideal.network)], rel=1e-3)


def test_a_mix_found_again_that_can_not_be_drawn_leaves_that_of_the_plan(monkeypatch):
    def out_of_reach(task, done, way):
        a, *rest = legs(task.networks[0])
        return (replace(task.networks[0], children=(replace(a, ohms=1e12), *rest)),)

    monkeypatch.setattr(made_films, "_found_again", out_of_reach)
    made = make_parts(plan_of(FILMS), RULES)
    wanted = [leg.wanted_ohms for leg in made.parts.made[0].legs]
    assert wanted == pytest.approx([leg.ohms for leg in legs(made.ideal.network)], rel=1e-12)


# ---- under power


@pytest.mark.parametrize("most", [1, 64])
def test_a_leg_above_its_current_gets_wider_or_more_strings(most):
    """60 V over 18 kohm is 3.4 mA: at 0.5 mA/um and 2 um at least, 1.7 um * strings do not carry it."""
    limited = FILMS.replace('matching = "1.2 %*um"', 'matching = "1.2 %*um"\nmax_current = "0.5 mA/um"')
    power = '[operating]\nvoltage = "60 V"\n'
    free = make_parts(plan_of(power + FILMS), RULES)
    rules = PartsRules(films=FilmRules(most_count=most, error=0.01))
    made = make_parts(plan_of(power + limited), rules)
    carried = next(leg for leg in made.parts.made[0].legs if leg.material == "pp")
    thin = next(leg for leg in free.parts.made[0].legs if leg.material == "pp")
    across = thin.in_parallel * thin.unit.width
    assert 60 / 18e3 / across > 500.0  # A/m: without the limit it is above it
    assert carried.in_parallel * carried.unit.width > across
    assert carried.in_parallel <= most
    loads = {load.leg: load for load in made.loads[0]}
    load = loads[carried.id]
    assert load.density == pytest.approx(load.current / carried.in_parallel / carried.unit.width, rel=1e-12)
    assert load.density <= 500.0 * (1 + 1e-9)  # of what is made, over the whole range


def test_loads_are_those_of_the_network_by_hand():
    """10 V over the made network without heat: I = V/R(T), the largest over the range, and V of each leg."""
    made = make_parts(plan_of('[operating]\nvoltage = "10 V"\n' + FILMS), RULES)
    rows = json.loads(plan_json(made.plan))["parts"]["made"][0]["legs"]
    t = np.linspace(-40, 150, POINTS)
    current = 10.0 / total_ohms(rows, t)
    for row, load in zip(rows, made.loads[0], strict=True):
        ohms = unit_ohms(row, t) * row["in_series"] / row["in_parallel"]
        assert load.current == pytest.approx(np.max(current), rel=1e-9)
        assert load.voltage == pytest.approx(np.max(current * ohms), rel=1e-9)
        assert load.power == pytest.approx(np.max(current**2 * ohms), rel=1e-9)


# ---- stock, wire and given members


def test_stock_parts_are_of_their_series():
    made = make_parts(plan_of(STOCK), RULES)
    (one,) = made.parts.made
    assert abs(one.value_error) <= 1e-3
    for leg in one.legs:
        assert isinstance(leg, StockLeg)
        step = 96 if leg.material == "flat" else 24
        for ohms in leg.values:
            mantissa = ohms / 10 ** np.floor(np.log10(ohms))
            digits = 2 if step == 96 else 1
            assert mantissa == pytest.approx(round(mantissa, digits), abs=1e-9)
        assert leg.ohms == pytest.approx(leg.wanted_ohms, rel=0.03)
    assert value(one.option.network) == pytest.approx(18e3, rel=1e-3)
    assert {m.name for m in made.parts.materials} == {m.material for m in legs(one.option.network)}


def test_wire_is_cut():
    made = make_parts(plan_of(WIRE, judge="nominal"), RULES)
    for leg in made.parts.made[0].legs:
        assert isinstance(leg, WireLeg)
        per_metre = {"up": 13.8 * (1 + 93e-6 * 5), "down": 5.8 * (1 - 74e-6 * 5)}[leg.material]
        assert leg.length == pytest.approx(leg.wanted_ohms / per_metre, abs=0.5e-3 + 1e-9)
        assert leg.ohms == pytest.approx(leg.length * per_metre, rel=1e-12)


@pytest.mark.parametrize("use", ["", 'use = ["up", "down"]\n'])
def test_fixed_members_stay_as_they_are(use):
    """Also beside a cut of the same wire, of which a spread is stated."""
    spread = '[material.{0}.spread]\nmeaning = "limits"\nohm_per_metre = "1 %"\n'
    coil = '[[fixed]]\nmaterial = "up"\nvalue = "400 ohm"\n'
    data = coil + WIRE + spread.format("up") + spread.format("down")
    made = make_parts(plan_of(data, more=SERIES + use), RULES)
    own = made.parts.made[0].legs
    assert [(leg.material, leg.ohms) for leg in own if isinstance(leg, PlainLeg)] == [("up", 400.0)]
    assert any(isinstance(leg, WireLeg) for leg in own)
    assert len(legs(made.parts.made[0].option.network)) == len(own)
    assert read_plan(plan_json(made.plan)) == made.plan


def test_a_fixed_member_beside_units_of_its_film():
    given = '[[fixed]]\nmaterial = "pp"\nvalue = "400 ohm"\n'
    plan = plan_of(given + FILMS, limit="14000 ppm", more=SERIES + 'use = ["pp", "np"]\n')
    made = make_parts(plan, RULES)
    own = made.parts.made[0].legs
    assert isinstance(own[0], PlainLeg)
    assert any(isinstance(leg, FilmLeg) for leg in own)
    assert own[0].ohms == 400.0
    assert "pp_a" in {m.name for m in made.parts.materials}


def test_materials_of_several_values_are_those_they_were_checked_with():
    """By hand: 0.5 mm in the shorter cut, that of 3 ohm, beside the 1 % of the wire."""
    spread = '[material.{0}.spread]\nmeaning = "limits"\nohm_per_metre = "1 %"\n'
    data = WIRE + spread.format("up") + spread.format("down")
    made = make_parts(plan_of(data, value='["18 kohm", "3 ohm"]'), PartsRules(cut_error=0.5e-3))
    by_name = {material.name: material for material in made.parts.materials}
    for leg in made.parts.made[1].legs:
        assert by_name[leg.material].spread.value == pytest.approx(0.01 + 0.5e-3 / leg.length, rel=1e-9)
    for assembly in made.assemblies:
        assert assembly.by_name == by_name


def test_a_free_total_is_moved_until_the_limit_is_kept():
    """The least total of the ideal has no room for a cut: a little more of it has, the coil as it is."""
    plan = make_plan(read_brief(EXAMPLES / "coil_swamp" / "brief.toml"))
    made = make_parts(plan, PartsRules(cut_error=20e-3))
    coil, swamp = made.parts.made[0].legs
    ideal = dict(zip("ab", legs(made.ideal.network), strict=True))
    assert made.ideal.role == "least total"
    assert made.verdict == "MET"
    assert made.stops == ""
    assert (coil.id, coil.ohms) == ("a", 412.0)
    assert 1.0003 * (1 - 1e-9) <= swamp.wanted_ohms / ideal[swamp.id].ohms <= 1.01 * (1 + 1e-9)


# ---- refusals, and the command


def test_what_can_not_be_made_says_the_rule_and_the_nearest():
    with pytest.raises(InputError, match="area"):
        make_parts(plan_of(FILMS), PartsRules(films=FilmRules(max_area=1e-14)))
    with pytest.raises(InputError, match="Did you mean series-1"):
        make_parts(plan_of(FILMS), RULES, "series-9")


def test_the_command(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("plan.json").write_text(plan_json(plan_of(FILMS)), encoding="utf-8")
    result = CliRunner().invoke(cli, ["parts", "plan.json", "-o", "made"])
    assert result.exit_code == 0, result.output
    assert "as made: MET" in result.stdout
    assert all(len(line) <= 80 for line in result.stdout.splitlines())
    assert {"plan.json", "parts.csv"} <= {p.name for p in Path("made").iterdir()}
    again = CliRunner().invoke(cli, ["parts", "plan.json", "-o", "made"])
    assert again.exit_code == 2
    data = json.loads(CliRunner().invoke(cli, ["parts", "plan.json", "--json"]).stdout)
    assert data == json.loads(Path("made/plan.json").read_text(encoding="utf-8"))
    made = make_parts(read_plan(Path("made/plan.json").read_text(encoding="utf-8")), RULES)
    assert json.loads(plan_json(made.plan)) == data  # parts of a plan that has parts are those of the plan
    for wrong in (["--error", "2 ohm"], ["--max-area", "0.00001 um^2"], ["--error", "0 %"]):
        assert CliRunner().invoke(cli, ["parts", "plan.json", *wrong]).exit_code == 2


def test_a_plan_that_lacks_what_parts_need_says_where():
    """A plan.json is input too: a part of its brief that is missing or wrong is told with its place."""
    plan = plan_of(STOCK)
    without = replace(plan, brief={k: v for k, v in plan.brief.items() if k != "fixed"})
    with pytest.raises(InputError, match=r"plan\.brief\.fixed"):
        make_parts(without, RULES)
    wrong = {
        "stock_values_ohms": {**plan.brief, "search": {**plan.brief["search"], "stock_values_ohms": [0, 1]}},
        "also_ohms": {**plan.brief, "resistor": {**plan.brief["resistor"], "also_ohms": [-1.0]}},
    }
    for name, told in wrong.items():
        with pytest.raises(InputError, match=name):
            make_parts(replace(plan, brief=told), RULES)
