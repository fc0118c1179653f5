"""Parts of a plan: what is made, recomputed from parts.json alone, and what is refused."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from makers import BRIEF, brief

from tcplan.cli.main import cli
from tcplan.errors import InputError
from tcplan.network import legs, value
from tcplan.parts.films import FilmRules
from tcplan.parts.record import parts_json
from tcplan.plan import plan_json
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan

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


def plan_of(materials, judge="worst-case"):
    text = BRIEF.replace('drift = "6000 ppm"', f'drift = "9500 ppm"\njudge = "{judge}"')
    return make_plan(brief(text + '[search]\narrangements = ["series"]\n' + materials))


@pytest.fixture(scope="module")
def films():
    return make_parts(plan_of(FILMS), RULES)


def test_a_film_leg_by_hand(films):
    """Every leg from W, L and counts alone, its body carried from 27 to 25 degC by its own law."""
    data = json.loads(parts_json(films))
    for leg in data["legs"]:
        width, length = leg["width_m"] * 1e6, leg["length_m"] * 1e6  # um
        if leg["material"] == "pp":
            at_25 = 1 - 120e-6 * -2 + 0.55e-6 * 4
            unit = 320 * at_25 * length / (width - 0.05) + 2 * 90 / width * (1 - 900e-6 * -2)
        else:
            unit = 120 * length / width
        ohms = unit * leg["in_series"] / leg["in_parallel"]
        assert leg["ohms"] == pytest.approx(ohms, rel=1e-9)
        assert leg["ohms"] == pytest.approx(leg["wanted_ohms"], rel=1.001e-3)
        assert (width / 0.005, length / 0.005) == pytest.approx((round(width / 0.005), round(length / 0.005)))
    assert [leg["mismatch"] is not None for leg in data["legs"]] == [
        leg["material"] == "pp" for leg in data["legs"]
    ]


def test_the_made_network_drifts_as_its_units_do(films):
    """R(T) of bodies and ends by hand, on a fine grid, against the peak that is printed."""
    data, t = json.loads(parts_json(films)), np.linspace(-40, 150, 20001)

    def ohms(t):
        total = np.zeros_like(t)
        for leg in data["legs"]:
            width, length, x = leg["width_m"] * 1e6, leg["length_m"] * 1e6, t - 27.0
            if leg["material"] == "pp":
                body = 320 * length / (width - 0.05) * (1 - 120e-6 * x + 0.55e-6 * x**2)
                unit = body + 2 * 90 / width * (1 - 900e-6 * x)
            else:
                unit = 120 * length / width * (1 + 150e-6 * (t - 25) + 0.4e-6 * (t - 25) ** 2)
            total = total + unit * leg["in_series"] / leg["in_parallel"]
        return total

    peak = np.max(np.abs(ohms(t) / ohms(np.array([25.0])) - 1)) * 1e6
    assert data["made"]["nominal"]["peak_ppm"] == pytest.approx(peak, rel=1e-6)
    assert data["value_error"] == pytest.approx(float(ohms(np.array([25.0]))[0]) / 18e3 - 1, abs=1e-9)
    assert data["made"]["worst_case"]["peak_ppm"] >= data["made"]["nominal"]["peak_ppm"]
    assert "pp_ends" in data["made"]["materials"]


def test_ends_move_the_drift_and_their_spread_the_worst_case(films):
    assert films.checked.nominal.figure_ppm != pytest.approx(films.ideal.nominal.figure_ppm, rel=1e-3)
    assert "pp_ends" in films.checked.worst_case.point
    assert films.checked.likely is not None


def test_the_ways_are_a_trade_and_the_first_within_the_limit_is_taken(films):
    areas, figures = [way.area for way in films.ways], [way.figure for way in films.ways]
    assert areas == sorted(areas)
    assert figures == sorted(figures, reverse=True)
    limit = films.plan.limit.drift_ppm * 1e-6
    first = next(way for way in films.ways if way.figure <= limit)
    assert films.made.area == pytest.approx(first.area, rel=1e-12)
    assert films.checked.verdict == "MET"
    assert (
        films.ways[0].figure > limit
    )  # the least area alone, short units with much of their ends, is no way
    finer = make_parts(plan_of(FILMS), PartsRules(films=FilmRules(error=1e-5)))
    assert abs(finer.value_error) <= 1e-5


def test_stock_parts_are_of_their_series():
    made = make_parts(plan_of(STOCK), RULES)
    assert abs(made.value_error) <= 1e-3
    for leg in made.made.legs:
        step = 96 if leg.material == "flat" else 24
        for ohms in leg.values:
            mantissa = ohms / 10 ** np.floor(np.log10(ohms))
            digits = 2 if step == 96 else 1
            assert mantissa == pytest.approx(round(mantissa, digits), abs=1e-9)
        assert leg.ohms == pytest.approx(leg.wanted_ohms, rel=0.03)
    assert value(made.checked.network) == pytest.approx(18e3, rel=1e-3)


def test_wire_is_cut():
    made = make_parts(plan_of(WIRE, "nominal"), RULES)
    for leg in made.made.legs:
        per_metre = {"up": 13.8 * (1 + 93e-6 * 5), "down": 5.8 * (1 - 74e-6 * 5)}[leg.material]
        assert leg.length == pytest.approx(leg.wanted_ohms / per_metre, abs=0.5e-3 + 1e-9)
        assert leg.ohms == pytest.approx(leg.length * per_metre, rel=1e-12)


def test_fixed_members_and_plain_materials_stay():
    coil = '[[fixed]]\nmaterial = "up"\nvalue = "400 ohm"\n'
    made = make_parts(plan_of(coil + WIRE, "nominal"), RULES)
    plain = [leg for leg in made.made.legs if not hasattr(leg, "length")]
    assert [(leg.material, leg.ohms) for leg in plain] == [("up", 400.0)]
    assert len(legs(made.checked.network)) == len(made.made.legs)


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
    assert "units in series" in result.stdout
    assert all(len(line) <= 80 for line in result.stdout.splitlines())
    assert sorted(p.name for p in Path("made").iterdir()) == ["parts.csv", "parts.json"]
    rows = Path("made/parts.csv").read_text().splitlines()
    assert rows[0].startswith("leg,material,wanted_ohms")
    again = CliRunner().invoke(cli, ["parts", "plan.json", "-o", "made"])
    assert again.exit_code == 2
    data = json.loads(CliRunner().invoke(cli, ["parts", "plan.json", "--json"]).stdout)
    assert data == json.loads(Path("made/parts.json").read_text())
    for wrong in (["--error", "2 ohm"], ["--max-area", "0.00001 um^2"], ["--error", "0 %"]):
        assert CliRunner().invoke(cli, ["parts", "plan.json", *wrong]).exit_code == 2


def test_a_plan_that_lacks_what_parts_need_says_where():
    """A plan.json is input too: a part of its brief that is missing or wrong is told with its place."""
    plan = plan_of(STOCK)
    without = replace(plan, brief={k: v for k, v in plan.brief.items() if k != "fixed"})
    with pytest.raises(InputError, match=r"plan\.brief\.fixed"):
        make_parts(without, RULES)
    wrong = replace(
        plan, brief={**plan.brief, "search": {**plan.brief["search"], "stock_values_ohms": [0, 1]}}
    )
    with pytest.raises(InputError, match="stock_values_ohms"):
        make_parts(wrong, RULES)
