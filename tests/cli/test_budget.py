"""``tcplan budget``: the table, exit codes, ranges, new data, pipes and bad input."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from makers import BRIEF, FILMS

from tcplan.cli import budget as module
from tcplan.cli.main import cli
from tcplan.errors import InputError
from tcplan.spec.budget_text import budget_markdown
from tcplan.workflow.budgeting import budget_of, plan_to_budget

ROOT = Path(__file__).parents[2]
ALLOWANCE = """
[[allowance]]
name = "ageing"
size = "500 ppm"
sides = "up"
kind = "systematic"
source = "life test, invented"
"""
MET, NOT_MET = "9000 ppm", "7000 ppm"


def text(limit: str | None, more: str = "") -> str:
    goal = "" if limit is None else f'drift = "{limit}"\njudge = "worst-case"'
    return BRIEF.replace('drift = "6000 ppm"', goal) + FILMS + more


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLUMNS", raising=False)
    return tmp_path


def invoke(*arguments: str, stdin: str | None = None) -> Result:
    return CliRunner().invoke(cli, list(arguments), input=stdin)


def budget(limit: str | None, *options: str, more: str = "") -> Result:
    Path("brief.toml").write_text(text(limit, more))
    return invoke("budget", "brief.toml", "--draws", "0", *options)


# --- exit codes and the words -----------------------------------------------------------------------


@pytest.mark.parametrize(("limit", "code", "word"), [(MET, 0, "MET"), (NOT_MET, 1, "NOT MET")])
def test_the_verdict_is_said_and_is_the_exit_code(folder: Path, limit: str, code: int, word: str) -> None:
    result = budget(limit)
    assert result.exit_code == code, result.output
    head = " ".join(result.stdout.split("\n\n")[1].split())
    assert head.endswith(f": {word}")
    assert ("ppm over" in head) is (word == "NOT MET")
    assert result.stderr == ""


def test_no_limit_is_nothing_to_miss(folder: Path) -> None:
    result = budget(None)
    assert result.exit_code == 0
    assert "no limit given" in result.stdout


def test_no_spread_is_not_judged(folder: Path) -> None:
    bare = re.sub(r"\[material\.pp\.spread\](\n\w.*)+", "", FILMS)
    Path("brief.toml").write_text(BRIEF.replace("6000 ppm", "90000 ppm") + bare)
    result = invoke("budget", "brief.toml")
    assert result.exit_code == 1
    assert "NOT JUDGED" in result.stdout
    assert "No spread is stated for pp: the total is without it." in " ".join(result.stdout.split())


def test_an_allowance_is_a_row_with_its_source(folder: Path) -> None:
    shown = budget(MET, more=ALLOWANCE).stdout
    assert re.search(r"^ageing +systematic +\+500 +0$", shown, re.M)
    assert "ageing: life test, invented." in shown


def test_rows_and_facts(folder: Path) -> None:
    shown = budget(MET).stdout
    for row in ("residual curvature", "TC1 spread", "TC2 spread", "value-ratio spread", "total"):
        assert re.search(rf"^{row} .*[+-]?\d", shown, re.M), row
    assert re.search(r"^ends \(not in the plan\) +estimate +not known +not known$", shown, re.M)
    flat = " ".join(shown.split())
    for told in (
        "Total error of the value: +",
        "all value spreads at their limits",
        "1 % more pp sheet resistance",
        "10 ppm/K more TC1 of",
        "Spreads count as limits; a stated sigma counts 3 times.",
        "3 sigma (99.73 %)",
        "Not included:",
        "Power parts can burn.",
    ):
        assert told in flat, told


def test_the_sensitivity_is_that_of_a_real_step(folder: Path) -> None:
    """1 % more sheet resistance as new data, drawn as it is, moves the nominal by what was announced."""
    shown = " ".join(budget(MET).stdout.split())
    word, ppm = re.search(r"1 % more pp sheet resistance (costs|saves) ([\d.]+) ppm", shown).groups()
    Path("new.toml").write_text("schema = 1\n" + FILMS.replace('"320 ohm"', '"323.2 ohm"'))
    [one] = json.loads(budget(MET, "--materials", "new.toml", "--json").stdout)["budgets"]
    moved = one["budget"]["nominal_ppm"] - one["before"]["nominal_ppm"]
    expected = float(ppm) if word == "costs" else -float(ppm)
    # of second order: 1 % of a step of 1 %
    assert moved == pytest.approx(expected, rel=0.03)


def test_wires_have_no_ends(folder: Path) -> None:
    shown = invoke("budget", str(ROOT / "examples/coil_swamp/brief.toml"), "--draws", "0").stdout
    assert re.search(r"^ends \(not in the plan\) +estimate +none +none$", shown, re.M)


# --- ranges, options, new data --------------------------------------------------------------------------


def test_a_range_that_is_not_covered_does_not_stop_the_others(folder: Path) -> None:
    result = budget(MET, "--range=-70:60", "--range", "industrial")
    assert result.exit_code == 1
    flat = " ".join(result.stdout.split())
    assert "-70 to 60 degC: NOT COVERED by the data: " in flat
    assert "-40 to 85 degC (industrial), reference 25 degC: total " in flat


def test_every_option(folder: Path) -> None:
    Path("brief.toml").write_text(text(MET))
    invoke("plan", "brief.toml", "-o", "out")
    plan = json.loads(Path("out/plan.json").read_text())
    shown = json.loads(invoke("budget", "out/plan.json", "--all", "--json", "--draws", "0").stdout)
    assert [one["option"] for one in shown["budgets"]] == [option["id"] for option in plan["options"]]
    assert shown["title"] == "Test resistor"


def test_old_new_and_change(folder: Path) -> None:
    Path("new.toml").write_text("schema = 1\n" + FILMS.replace('"-120 ppm/K"', '"-150 ppm/K"'))
    shown = budget(MET, "--materials", "new.toml").stdout
    assert re.search(r"^figure, in ppm +old +new +change$", shown, re.M)
    old, new, change = re.search(r"^nominal +(\S+) +(\S+) +(\S+)$", shown, re.M).groups()
    assert float(new) - float(old) == pytest.approx(float(change), rel=0.01)
    assert "New data for" in shown


# --- draws ------------------------------------------------------------------------------------------------


def test_draws_are_printed_with_their_intervals(folder: Path) -> None:
    Path("brief.toml").write_text(text(MET))
    result = invoke("budget", "brief.toml", "--draws", "3000", "--seed", "5")
    flat = " ".join(result.stdout.split())
    assert re.search(r"99\.73 % of lots are within [\d.]+ ppm \(95 % interval [\d.]+ (to|up)", flat)
    assert "3000 draws, seed 5" in flat
    # none of 3000 outside proves no more than 0.025^(1/3000) = 99.877 % (Clopper and Pearson 1934)
    assert "3000 of 3000 lots are inside the limit: 99.877 % to 100 %" in flat
    assert re.search(r"Variance of the drift at -?[\d.]+ degC", flat)
    again = invoke("budget", "brief.toml", "--draws", "3000", "--seed", "5")
    assert again.stdout == result.stdout


def test_within_a_lot_when_mismatch_is_known(folder: Path) -> None:
    matched = FILMS
    for name in ("pp", "np"):
        matched += f'[material.{name}.film]\nmin_width = "1 um"\nmatching = "1 %*um"\n'
    Path("brief.toml").write_text(text(MET).replace(FILMS, matched))
    flat = " ".join(invoke("budget", "brief.toml", "--draws", "2000").stdout.split())
    assert "mismatch 3 sigma " in flat
    assert "Within a lot 100 % of units are inside in the mean" in flat


# --- forms ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("columns", ["40", "80", "200"])
def test_no_line_is_too_wide(folder: Path, monkeypatch: pytest.MonkeyPatch, columns: str) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    Path("new.toml").write_text("schema = 1\n" + FILMS)
    shown = budget(MET, "--materials", "new.toml", "--range", "all", more=ALLOWANCE).stdout
    widest = max(len(line) for line in shown.splitlines())
    assert widest <= max(60, min(80, int(columns)))


def test_json_is_whole_and_finite(folder: Path) -> None:
    def refuse(name: str) -> None:
        raise AssertionError(name)

    Path("brief.toml").write_text(text(MET, ALLOWANCE))
    result = invoke("budget", "brief.toml", "--json", "--draws", "2000")
    data = json.loads(result.stdout, parse_constant=refuse)
    [one] = data["budgets"]
    made = one["budget"]
    known = [row for row in made["rows"] if row["up_ppm"] is not None]
    assert sum(row["up_ppm"] for row in known) == pytest.approx(made["total_up_ppm"])
    assert made["limit_ppm"] - made["peak_ppm"] == pytest.approx(made["margin_ppm"])
    assert one["lots"]["quantile_figure_ppm"] < made["worst_case_ppm"]
    assert one["lots"]["draws"] == 2000
    assert len(one["lots"]["histogram"]["edges_ppm"]) == len(one["lots"]["histogram"]["counts"]) + 1


def test_a_pipe_from_plan(folder: Path) -> None:
    Path("brief.toml").write_text(text(MET))
    plan = invoke("plan", "brief.toml", "--json").stdout
    assert invoke("budget", "-", "--draws", "0", stdin=plan).stdout == budget(MET).stdout


def test_markdown_is_escaped(folder: Path) -> None:
    Path("brief.toml").write_text(text(MET, ALLOWANCE.replace('"ageing"', '"a|b <i>"')))
    plan = plan_to_budget("brief.toml")
    shown = budget_markdown(plan, budget_of(plan))
    assert r"| a\|b &lt;i&gt; | systematic | +500 | 0 |".replace("+", r"+") in shown.replace(r"\+", "+")
    assert shown.startswith("## ")
    assert "MET" in shown.splitlines()[0]


def test_colour_only_where_it_is_wanted(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "colourful", lambda: True)
    assert module._coloured(["x: MET"], "MET") == ["x: \x1b[32mMET\x1b[0m"]
    assert module._coloured(["x: NOT MET"], "NOT MET") == ["x: \x1b[31mNOT MET\x1b[0m"]
    monkeypatch.undo()
    assert "\x1b" not in CliRunner().invoke(cli, ["ranges"]).stdout
    assert module._coloured(["x: MET"], "MET") == ["x: MET"]


def test_it_runs_as_a_program(folder: Path) -> None:
    run = subprocess.run(
        [sys.executable, "-m", "tcplan", "budget", str(ROOT / "examples/brake_sensor_films/brief.toml")],
        capture_output=True,
        text=True,
        check=False,
        env={"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT)},
    )
    assert run.returncode == 0, run.stderr
    assert max(len(line) for line in run.stdout.splitlines()) <= 80
    assert "Span resistor, brake-pressure front end" in run.stdout


# --- bad input --------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("options", "told"),
    [
        (["--range", "automotiv-1"], "automotive-1"),
        (["--range", "60:20"], "60:20"),
        (["--range", "a:b"], "'a:b'"),
        (["--draws", "-5"], "draws"),
        (["--draws", "100000000000"], "hours"),
        (["--precision", "0 %"], "--precision"),
        (["--precision", "5"], "--precision"),
        (["--materials", "missing.toml"], "missing.toml"),
        (["--seed", "-1"], "--seed"),
    ],
)
def test_wrong_options_are_told(folder: Path, options: list[str], told: str) -> None:
    Path("brief.toml").write_text(text(MET))
    result = invoke("budget", "brief.toml", *options)
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    assert told in result.stderr
    assert "Traceback" not in result.stderr


@pytest.mark.parametrize("content", ["", "{}", "[1, 2]", "\x00", "null", '{"schema": 1}'])
def test_what_is_no_plan_is_told(folder: Path, content: str) -> None:
    Path("plan.json").write_text(content)
    for result in (invoke("budget", "plan.json"), invoke("budget", "-", stdin=content)):
        assert result.exit_code == 2
        assert result.stdout == ""
        assert result.stderr.startswith("error: ")
    with pytest.raises(InputError):
        plan_to_budget("plan.json")


def test_a_missing_file_is_told(folder: Path) -> None:
    result = invoke("budget", "nothing.json")
    assert result.exit_code == 2
    assert "nothing.json" in result.stderr


def test_the_output_of_the_text_is_what_is_printed(folder: Path) -> None:
    document = (ROOT / "docs/budget.md").read_text(encoding="utf-8")
    [shown] = re.findall(r"^```text output\n(.*?)^```$", document, re.M | re.S)
    result = invoke("budget", str(ROOT / "examples/brake_sensor_films/brief.toml"))
    assert result.stdout == shown
