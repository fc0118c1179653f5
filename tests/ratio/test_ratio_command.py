"""``tcplan plan`` on a brief with [ratio]: the screen, the files, the exit codes."""

import json
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from makers import FILMS, brief
from matplotlib.figure import Figure

from tcplan.brief import parse_brief, read_brief
from tcplan.cli.main import cli
from tcplan.cli.ratio_screen import ratio_screen
from tcplan.errors import InputError
from tcplan.figures.ratio import draw_ratio, ratio_figure_files
from tcplan.workflow.planning import make_plan
from tcplan.workflow.ratio import RATIO_FILES, make_ratio, ratio_json

EXAMPLES = Path(__file__).parents[2] / "examples"
RATIOS = sorted(
    path
    for path in EXAMPLES.glob("*/brief.toml")
    if "[ratio]" in path.read_text(encoding="utf-8").split("\n")
)
EXPECTED = {"sense_divider": "MET"}

BRIEF = """
schema = 1
title = "Test ratio"
[temperature]
low = "-40 degC"
high = "150 degC"
[goal]
drift = "{limit} ppm"
judge = "{judge}"
[ratio]
kind = "gain"
first = "pp 9 kohm + np 4k7"
second = "pp 1 kohm"
tracking = "3 ppm/K"
"""


def run(*arguments):
    return CliRunner().invoke(cli, ["plan", *map(str, arguments)])


def written(tmp_path, limit=20000, judge="worst-case", films=FILMS):
    path = tmp_path / "brief.toml"
    path.write_text(BRIEF.format(limit=limit, judge=judge) + films, encoding="utf-8")
    return path


# --- the example ----------------------------------------------------------------------------------


def test_every_ratio_example_has_an_entry():
    assert {path.parent.name for path in RATIOS} == set(EXPECTED)


@pytest.mark.parametrize("path", RATIOS, ids=lambda path: path.parent.name)
def test_the_example_is_recomputed_from_its_file_alone(path):
    """The worst device of ratio.json, put together by hand as docs/ratio.md says."""
    data = json.loads(ratio_json(make_ratio(read_brief(path))))
    assert data["verdict"] == EXPECTED[path.parent.name]
    (name, entry), *rest = data["materials"].items()
    assert not rest
    law, worst = entry["law"], data["worst_case"]
    point, over = worst["point"][name], data["range"]
    ohms = [float(data["ratio"][key].split()[1]) for key in ("first", "second")]

    def ratio(t):
        def device(at):
            y = at - law["reference_degC"]
            tc1, tc2 = law["tc1_ppm_per_K"] + point["tc1"], law["tc2_ppm_per_K2"] + point["tc2"]
            return 1 + tc1 * 1e-6 * y + tc2 * 1e-6 * y * y

        common = device(t) / device(over["reference_degC"])
        x = t - over["reference_degC"]
        first, second = (
            r * (common + point[key] * 1e-6 * x)
            for r, key in zip(ohms, ("apart_first", "apart_second"), strict=True)
        )
        return second / (first + second)

    drift = (ratio(worst["at_degC"]) / ratio(over["reference_degC"]) - 1) * 1e6
    assert abs(drift) == pytest.approx(worst["figure_ppm"], rel=1e-9)
    assert worst["figure_ppm"] <= worst["upper_bound_ppm"] <= data["limit"]["drift_ppm"]
    assert data["ratio"]["value"] == pytest.approx(0.1, rel=1e-12)
    assert (data["ratio"]["spread_down_ppm"], data["ratio"]["spread_up_ppm"]) == pytest.approx(
        (0, 0), abs=1e-9
    )


@pytest.mark.parametrize("path", RATIOS, ids=lambda path: path.parent.name)
def test_the_same_brief_gives_the_same_file(path):
    read = read_brief(path)
    assert ratio_json(make_ratio(read)) == ratio_json(make_ratio(read))


# --- the command ----------------------------------------------------------------------------------


def test_the_command_writes_its_files_and_tells_the_verdict(tmp_path):
    result = run(written(tmp_path, 300000), "-o", tmp_path / "out")
    assert result.exit_code == 0, result.output
    assert {path.name for path in (tmp_path / "out").iterdir()} == set(RATIO_FILES)
    lines = result.stdout.splitlines()
    assert lines[0].endswith("MET")
    assert all(len(line) <= 80 for line in lines)
    again = run(written(tmp_path, 300000), "-o", tmp_path / "out")
    assert again.exit_code == 2
    assert "--force" in again.output


@pytest.mark.parametrize(
    ("limit", "judge", "verdict", "code"),
    [
        (300000, "worst-case", "MET", 0),
        (10, "worst-case", "NOT MET", 1),
        (10, "quantile", "NOT MET", 1),
        (300000, "quantile", "MET", 0),
        (10, "nominal", "NOT MET", 1),
    ],
)
def test_exit_codes(tmp_path, limit, judge, verdict, code):
    result = run(written(tmp_path, limit, judge), "--json")
    assert result.exit_code == code
    assert json.loads(result.stdout)["verdict"] == verdict


def test_without_a_spread_nothing_is_judged_at_worst(tmp_path):
    bare = FILMS.replace(
        '[material.np.spread]\nmeaning = "limits"\nohm_per_square = "10 %"\ntc1 = "40 ppm/K"\n', ""
    )
    assert bare != FILMS
    result = run(written(tmp_path, 300000, films=bare), "--json")
    data = json.loads(result.stdout)
    assert result.exit_code == 1
    assert data["verdict"] == "NOT JUDGED"
    assert data["worst_case"] is None
    assert data["likely"] is None
    shown = run(written(tmp_path, 300000, films=bare), "-o", tmp_path / "out").stdout
    assert "No spread is stated for np" in " ".join(shown.split())
    assert "NOT JUDGED" in shown
    assert run(written(tmp_path, 300000, "nominal", bare), "--json").exit_code == 0


def test_what_is_assumed_is_said(tmp_path):
    text = BRIEF.format(limit=20000, judge="worst-case").replace('tracking = "3 ppm/K"\n', "") + FILMS
    check = make_ratio(parse_brief(text, "brief.toml", Path()))
    told = " ".join(ratio_screen(check, 80).split())
    assert "Tracking is not stated, so counted as 0" in told
    assert "matching or width not stated: pp, np" in told
    assert "No half-width stated, so counted as 0: TC2 of pp, np." in told
    for width in (40, 60, 80):
        assert all(len(line) <= max(width, 56) for line in ratio_screen(check, width).splitlines())


def test_a_mask_and_a_wanted_law_are_judged():
    text = BRIEF.format(limit=1, judge="worst-case").replace(
        'drift = "1 ppm"',
        'mask = [["0 degC", "70 degC", "1 %"], ["-40 degC", "150 degC", "30 %"]]\ntc1 = "95 ppm/K"',
    )
    check = make_ratio(parse_brief(text + FILMS, "brief.toml", Path()))
    assert check.pair.need.kind == "mask"
    assert check.worst.judged.figure >= check.nominal.figure
    assert "Mask, 0 to 70 degC: 10000 ppm." in ratio_screen(check, 80)


def test_a_resistor_is_wanted_elsewhere():
    read = read_brief(RATIOS[0])
    with pytest.raises(InputError, match="ratio"):
        make_plan(read)
    with pytest.raises(InputError, match="without"):
        make_ratio(brief())


def test_the_budget_of_a_ratio_over_several_ranges():
    """Over automotive-0 the total of the account passes the limit, and the exit code says so."""
    example = str(RATIOS[0])
    result = CliRunner().invoke(cli, ["budget", example])
    assert result.exit_code == 0, result.output
    assert "package stress" in result.stdout
    wider = CliRunner().invoke(cli, ["budget", example, "--range", "industrial", "--range", "automotive-0"])
    assert wider.exit_code == 1
    assert wider.stdout.count("Divider of 0.1") == 2
    assert "BEYOND" in wider.stdout
    data = json.loads(CliRunner().invoke(cli, ["budget", example, "--json"]).stdout)
    assert len(data["ratios"]) == 1
    wrong = CliRunner().invoke(cli, ["budget", example, "--all"])
    assert wrong.exit_code != 0
    outside = CliRunner().invoke(cli, ["budget", example, "--range=-100:25"])
    assert outside.exit_code != 0


def test_bought_parts_are_asked_for_their_tracking():
    """A TCR limit is that of one part: two parts of a series need not share it."""
    part = (
        '[material.chip]\nsource = "invented"\nreference = "25 degC"\nvalid = ["-60 degC", "160 degC"]\n'
        'tc1 = "0 ppm/K"\nseries = "E96"\n[material.chip.spread]\nmeaning = "limits"\nvalue = "0.1 %"\n'
        'tcr = "25 ppm/K"\n'
    )
    text = BRIEF.format(limit=20000, judge="worst-case").replace("pp 9 kohm + np 4k7", "chip 9k09")
    text = text.replace("pp 1 kohm", "chip 1 kohm").replace('tracking = "3 ppm/K"\n', "")
    check = make_ratio(parse_brief(text + part, "brief.toml", Path()))
    assert check.worst.judged.figure == pytest.approx(0.0, abs=1e-12)
    assert "Two bought parts of chip need not share their TCR" in " ".join(ratio_screen(check, 80).split())


# --- the figure -----------------------------------------------------------------------------------


@pytest.mark.parametrize("limit", ['drift = "400 ppm"', 'band = "600 ppm"', 'chord_tcr = "4 ppm/K"'])
def test_the_figure_shows_the_curves_and_the_limits(limit):
    text = BRIEF.format(limit=1, judge="worst-case").replace('drift = "1 ppm"', limit)
    check = make_ratio(parse_brief(text + FILMS, "brief.toml", Path()))
    ax = Figure().add_subplot()
    drawn = draw_ratio(ax, check)
    x, y = drawn.worst.get_data()
    factor = 1e6 if "ppm" in ax.get_ylabel() else 1e2
    at = check.worst.judged.at - 273.15
    curve = check.pair.curve(check.worst.device)(np.array([check.worst.judged.at]))[0] - 1
    assert np.interp(at, x, y) == pytest.approx(curve * factor, rel=1e-3)
    assert drawn.limits
    files = ratio_figure_files(check)
    assert files["drift.png"].startswith(b"\x89PNG")
    assert b"<title>Drift of the ratio" in files["drift.svg"]
    assert b"http://purl.org" not in files["drift.svg"] or b"DOCTYPE" not in files["drift.svg"]
