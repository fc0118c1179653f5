"""``tcplan parts``: what it prints, what it writes, its exit codes, and what it refuses."""

from __future__ import annotations

import json
import os
import pty
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from tcplan.cli.main import cli

ROOT = Path(__file__).parents[2]
EXAMPLE = ROOT / "examples" / "sense_divider" / "brief.toml"

HEAD = """
schema = 1
title = "Invented resistor"
[temperature]
low = "-40 degC"
high = "125 degC"
reference = "25 degC"
"""
GOAL = '[goal]\ndrift = "{limit}"\njudge = "worst-case"\n'
ONE = '[resistor]\nvalue = "12 kohm"\n[given]\nnetwork = "{network}"\n'
FILMS = """
[material.slate]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "200 degC"]
tc1 = "-150 ppm/K"
ohm_per_square = "300 ohm"
[material.slate.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "20 ppm/K"
end_resistance = "30 %"
[material.slate.film]
min_width = "2 um"
end_resistance = "60 ohm*um"
end_tc1 = "-1900 ppm/K"
matching = "1 %*um"
spacing = "0.6 um"
[material.ochre]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "200 degC"]
tc1 = "300 ppm/K"
ohm_per_square = "100 ohm"
[material.ochre.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "20 ppm/K"
[material.ochre.film]
min_width = "2 um"
spacing = "0.6 um"
"""
FLAT = """
[material.flat]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "20 ppm/K"
series = "E96"
[material.flat.spread]
meaning = "limits"
value = "0.1 %"
tcr = "25 ppm/K"
"""
LONG = "a_material_of_the_longest_name_there_is1"
NETWORK = "slate 8 kohm + ochre 4 kohm"
OPERATING = '[operating]\nvoltage = "6 V"\n'


def brief(limit: str | None = "9000 ppm", network: str = NETWORK, more: str = OPERATING + FILMS) -> str:
    goal = "" if limit is None else GOAL.format(limit=limit)
    return HEAD + goal + ONE.format(network=network) + more


def ratio(first: str, second: str, limit: str | None = "9000 ppm") -> str:
    goal = "" if limit is None else GOAL.format(limit=limit)
    return HEAD + goal + f'[ratio]\nkind = "gain"\nfirst = "{first}"\nsecond = "{second}"\n' + FLAT


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLUMNS", raising=False)
    Path("brief.toml").write_text(brief())
    Path("bought.toml").write_text(brief(network="flat 12 kohm", more=FLAT))
    return tmp_path


def invoke(*arguments: str, stdin: str | None = None) -> Result:
    return CliRunner().invoke(cli, ["parts", *arguments], input=stdin)


def refused(*arguments: str, stdin: str | None = None) -> str:
    """Return what is told on stderr of wrong input: code 2, nothing on stdout, no traceback."""
    result = invoke(*arguments, stdin=stdin)
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    assert "Traceback" not in result.stderr
    assert result.stderr.startswith("error: ")
    return result.stderr


def names(folder: str) -> list[str]:
    return sorted(path.name for path in Path(folder).iterdir())


def flat(text: str) -> str:
    return " ".join(text.split())


# --- verdicts and exit codes -----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("limit", "code", "told"),
    [("9000 ppm", 0, "MET"), ("2000 ppm", 1, "NOT MET"), (None, 0, "no limit given")],
)
def test_the_verdict_is_the_first_line_and_the_exit_code(
    folder: Path, limit: str | None, code: int, told: str
) -> None:
    Path("brief.toml").write_text(brief(limit))
    result = invoke("brief.toml")
    assert result.exit_code == code, result.output
    assert result.stdout.splitlines()[0] == f"Invented resistor, given as made: {told}"
    assert result.stderr == ""


def test_what_cannot_be_judged_is_code_1(folder: Path) -> None:
    bare = FLAT[: FLAT.index("[material.flat.spread]")]
    Path("brief.toml").write_text(brief(network="flat 12 kohm", more=bare))
    result = invoke("brief.toml")
    assert result.exit_code == 1
    assert result.stdout.splitlines()[0].endswith("as made: NOT JUDGED")


def test_the_screen_holds_legs_ways_arrays_and_facts(folder: Path) -> None:
    shown = invoke("brief.toml").stdout
    assert "leg  material  wanted  made" in shown
    assert "a    slate     8 kohm  " in shown
    assert "* is taken, the smallest tried that keeps the limit:" in shown
    assert ". a" in shown
    labels = ("Reaches", "Units", "Carries", "Note", "Assumed")
    places = [shown.index(f"\n{label:<9}") for label in labels]
    assert places == sorted(places)


def test_a_way_that_misses_the_limit_is_not_said_to_keep_it(folder: Path) -> None:
    Path("brief.toml").write_text(brief("2000 ppm"))
    shown = flat(invoke("brief.toml").stdout)
    assert "keeps the limit" not in shown
    assert "* is taken, of the least figure:" in shown


def test_another_option(folder: Path) -> None:
    text = HEAD + GOAL.format(limit="2 %") + '[resistor]\nvalue = "12 kohm"\n' + FILMS
    Path("brief.toml").write_text(text)
    plan = CliRunner().invoke(cli, ["plan", "brief.toml", "--json"]).stdout
    Path("plan.json").write_text(plan)
    ids = [option["id"] for option in json.loads(plan)["options"]]
    other = next(one for one in ids if one != json.loads(plan)["chosen"])
    made = json.loads(invoke("plan.json", "--option", other, "--json").stdout)
    assert made["parts"]["option"] == other
    assert made["parts"]["made"][0]["option"]["id"] == f"{other}-made"


# --- forms -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("columns", ["40", "60", "80", "200"])
@pytest.mark.parametrize("what", ["films", "long", "ratio"])
def test_no_line_is_too_wide(folder: Path, monkeypatch: pytest.MonkeyPatch, columns: str, what: str) -> None:
    text = {
        "films": brief(),
        "long": brief(network=NETWORK.replace("slate", LONG), more=OPERATING + FILMS.replace("slate", LONG)),
        "ratio": EXAMPLE.read_text(encoding="utf-8"),
    }[what]
    Path("brief.toml").write_text(text)
    monkeypatch.setenv("COLUMNS", columns)
    result = invoke("brief.toml")
    assert result.exit_code in (0, 1), result.output
    assert max(len(line) for line in result.stdout.splitlines()) <= min(80, int(columns))


def test_json_is_the_plan_with_its_parts(folder: Path) -> None:
    def refuse(name: str) -> None:
        raise AssertionError(name)

    result = invoke("brief.toml", "--json", "-o", "out")
    data = json.loads(result.stdout, parse_constant=refuse)
    assert result.stdout == Path("out/plan.json").read_text(encoding="utf-8")
    assert data["parts"]["option"] == data["chosen"] == "given"
    assert result.stderr.startswith("wrote ")


def test_colour_on_a_terminal_but_never_with_no_color(folder: Path) -> None:
    """On a terminal: green for MET; NO_COLOR of any value, or TERM=dumb, takes it away (no-color.org)."""

    def shown(**more: str) -> bytes:
        upper, lower = pty.openpty()
        names = {"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT), "TERM": "xterm", **more}
        command = [sys.executable, "-m", "tcplan", "parts", "bought.toml"]
        with subprocess.Popen(command, stdout=lower, stderr=subprocess.PIPE, env=names) as run:
            os.close(lower)
            found = b""
            try:
                while piece := os.read(upper, 65536):
                    found += piece
            except OSError:  # how the end of a terminal is told on Linux
                pass
            assert run.wait() == 0
        os.close(upper)
        return found

    assert b"\x1b[32m" in shown()
    for more in ({"NO_COLOR": "1"}, {"TERM": "dumb"}):
        plain = shown(**more)
        assert b"as made: MET" in plain
        assert b"\x1b" not in plain


# --- plans, pipes and files ------------------------------------------------------------------------------


def test_a_plan_on_stdin_is_made_like_its_file(folder: Path) -> None:
    plan = CliRunner().invoke(cli, ["plan", "brief.toml", "--json"]).stdout
    Path("plan.json").write_text(plan)
    piped = invoke("-", "-o", "piped", stdin=plan)
    assert piped.exit_code == 0, piped.output
    assert piped.stdout == invoke("plan.json").stdout == invoke("brief.toml").stdout
    again = invoke("-", "--json", stdin=Path("piped/plan.json").read_text())  # made again from its own output
    assert json.loads(again.stdout) == json.loads(Path("piped/plan.json").read_text())


def test_which_files_are_written_is_told(folder: Path) -> None:
    result = invoke("brief.toml", "-o", "out", "--list", "r.cir")
    assert result.exit_code == 0, result.output
    told = [Path(path) for path in result.stderr.strip().removeprefix("wrote ").split(", ")]
    assert {path.name for path in told} == {*names("out"), "r.cir"}
    assert all(path.is_file() for path in told)
    assert {"plan.json", "parts.csv", "placement.svg", "trade.svg"} <= set(names("out"))
    assert names(".") == ["bought.toml", "brief.toml", "out", "r.cir"]


def test_files_are_replaced_only_with_force(folder: Path) -> None:
    assert invoke("bought.toml", "-o", "out").exit_code == 0
    before = Path("out/plan.json").read_bytes()
    told = refused("brief.toml", "-o", "out", "--list", "r.cir")
    assert "plan.json, spec.html, parts.csv already there" in told
    assert "--force" in told
    assert Path("out/plan.json").read_bytes() == before
    assert not Path("r.cir").exists()
    assert invoke("brief.toml", "-o", "out", "--force").exit_code == 0
    assert Path("out/plan.json").read_bytes() != before


def test_a_list_on_stdout_is_all_there_is(folder: Path) -> None:
    result = invoke("brief.toml", "--list", "-")
    assert result.exit_code == 0, result.output
    assert result.stdout.splitlines()[-1].startswith(".ends ")
    assert "as made: " not in result.stdout
    assert result.stderr == ""
    assert names(".") == ["bought.toml", "brief.toml"]
    missed = brief("2000 ppm")
    Path("brief.toml").write_text(missed)
    assert invoke("brief.toml", "--list", "-").exit_code == 1


def test_a_list_in_a_file_is_the_one_of_stdout_and_never_written_over(folder: Path) -> None:
    assert invoke("brief.toml", "--list", "r.cir").exit_code == 0
    text = Path("r.cir").read_text(encoding="ascii")
    assert text == invoke("brief.toml", "--list", "-").stdout
    told = refused("bought.toml", "--list", "r.cir", "-o", "out")
    assert "r.cir already there" in told
    assert Path("r.cir").read_text(encoding="ascii") == text
    assert not Path("out").exists()  # all of them or none
    assert invoke("bought.toml", "--list", "r.cir", "--force").exit_code == 0
    assert Path("r.cir").read_text(encoding="ascii") != text


@pytest.mark.parametrize("listing", ["out/plan.json", "out/../out/parts.csv", "./out/trim-codes.csv", ""])
def test_a_list_by_the_name_of_another_file_is_refused(folder: Path, listing: str) -> None:
    told = refused("bought.toml", "-o", "out", "--list", listing, "--force")
    assert told.startswith("error: --list: ")
    assert not Path("out").exists()


def test_a_list_and_json_on_stdout_are_refused(folder: Path) -> None:
    assert "--list - with --json" in refused("brief.toml", "--list", "-", "--json")
    assert invoke("brief.toml", "--list", "r.cir", "--json").exit_code == 0  # one of them goes to a file


# --- wrong use -------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("flag", "wrong"),
    [
        ("--error", "2 ohm"),
        ("--error", "0 %"),
        ("--error", "-1 %"),
        ("--error", "100 %"),
        ("--error", "nan %"),
        ("--max-area", "3 um"),
        ("--max-area", "-1 um^2"),
        ("--max-area", "five"),
        ("--max-width", "2 um^2"),
        ("--max-width", "0 um"),
        ("--mismatch", "1 ppm/K"),
        ("--mismatch", "0 %"),
        ("--wire-step", "1 s"),
        ("--wire-step", "0 mm"),
        ("--cut-error", "3 ohm"),
        ("--cut-error", "-1 mm"),
    ],
)
def test_a_wrong_size_is_told_by_its_flag(folder: Path, flag: str, wrong: str) -> None:
    told = refused("brief.toml", flag, wrong)
    assert told.startswith(f"error: {flag}: found ")
    assert f"'{wrong}'" in told
    assert "expected" in told


@pytest.mark.parametrize(
    ("options", "told"),
    [
        (["--optoin", "x"], "Did you mean '--option'?"),
        (["--max-arae", "1 um^2"], "Did you mean '--max-area'?"),
        (["--option", "givn"], "Did you mean given?"),
        (["--most-units", "0"], "--most-units"),
        (["--most-units", "257"], "--most-units"),
        (["--most-units", "2.5"], "--most-units"),
        (["second.toml"], "second.toml"),
        (["--list", "missing/../brief.toml/r.cir"], "brief.toml"),
    ],
)
def test_wrong_options_are_told(folder: Path, options: list[str], told: str) -> None:
    assert told in refused("brief.toml", *options)


def test_a_cut_without_error_is_no_mistake(folder: Path) -> None:
    assert invoke("bought.toml", "--cut-error", "0 mm").exit_code == 0


def test_what_is_no_plan_is_told(folder: Path) -> None:
    assert "PLAN" in refused()
    assert "nothing.json" in refused("nothing.json")
    assert "plan: found not JSON" in refused("-", stdin="\x00")
    for content in ("", "{}", "[1, 2]", "null"):
        Path("plan.json").write_text(content)
        assert "plan" in refused("plan.json")


def test_a_leg_that_can_not_be_made_says_the_rule_and_the_nearest(folder: Path) -> None:
    told = refused("brief.toml", "--max-area", "1 um^2")
    assert "leg a" in told
    assert "leg b" in told
    assert "area" in told
    assert told.strip().splitlines()[-1] == "2 mistakes."


# --- ratios ----------------------------------------------------------------------------------------------


def test_a_ratio_is_made_of_both_resistors(folder: Path) -> None:
    result = invoke(str(EXAMPLE), "-o", "out")
    assert result.exit_code == 0, result.output
    lines = result.stdout.splitlines()
    assert lines[0].endswith(", as made: MET")
    assert lines.index("First resistor:") < lines.index("Second resistor:")
    assert "Both sides of the ratio have one centroid." in flat(result.stdout)
    assert names("out") == ["parts.csv", "placement.png", "placement.svg", "ratio.json"]
    data = json.loads(invoke(str(EXAMPLE), "--json").stdout)
    assert data == json.loads(Path("out/ratio.json").read_text(encoding="utf-8"))
    assert set(data["parts"]) == {"first", "second", "placement", "made"}
    assert "already there" in refused(str(EXAMPLE), "-o", "out")


def test_the_exit_code_of_a_ratio_is_its_verdict(folder: Path) -> None:
    """Two bought parts of 25 ppm/K each can be 5013 ppm apart at 100 K."""
    for limit, code, told in (
        ("6000 ppm", 0, "MET"),
        ("4000 ppm", 1, "NOT MET"),
        (None, 0, "no limit given"),
    ):
        Path("ratio.toml").write_text(ratio("flat 9.09 kohm", "flat 1 kohm", limit))
        result = invoke("ratio.toml")
        assert result.exit_code == code, result.output
        assert result.stdout.splitlines()[0] == f"Invented resistor, as made: {told}"


@pytest.mark.parametrize("options", [["--option", "given"], ["--list", "-"], ["--list", "r.cir"]])
def test_a_ratio_has_no_options_and_no_list(folder: Path, options: list[str]) -> None:
    told = refused(str(EXAMPLE), *options, "-o", "out")
    assert "--option or --list with the brief of a ratio" in told
    assert names(".") == ["bought.toml", "brief.toml"]


def test_a_ratio_of_too_many_parts_is_told(folder: Path) -> None:
    many = "flat 9 kohm + flat 8 kohm + flat 7 kohm"
    Path("ratio.toml").write_text(ratio(many, "flat 1 kohm + flat 2 kohm"))
    assert "5 materials" in refused("ratio.toml")


# --- the budget of what is made --------------------------------------------------------------------------


def budget(*arguments: str) -> Result:
    return CliRunner().invoke(cli, ["budget", *arguments, "--draws", "0"])


def test_the_budget_as_made(folder: Path) -> None:
    assert invoke("brief.toml", "-o", "out").exit_code == 0
    made, ideal = budget("out/plan.json", "--as-made"), budget("out/plan.json")
    assert made.exit_code == 0, made.output
    assert "given-made, -40 to 125 degC" in made.stdout
    assert "ends (not in the plan)" in ideal.stdout
    assert "ends (not in the plan)" not in made.stdout
    [account] = json.loads(budget("out/plan.json", "--as-made", "--json").stdout)["budgets"]
    assert account["option"] == "given-made"


def test_the_budget_as_made_refuses_what_it_cannot_do(folder: Path) -> None:
    invoke("brief.toml", "-o", "out")
    Path("new.toml").write_text("schema = 1\n" + FILMS)
    for arguments, told in (
        (["brief.toml", "--as-made"], "a plan without parts"),
        (["out/plan.json", "--as-made", "--materials", "new.toml"], "--as-made with --materials or --all"),
        (["out/plan.json", "--as-made", "--all"], "--as-made with --materials or --all"),
        ([str(EXAMPLE), "--as-made"], "--as-made"),
    ):
        result = budget(*arguments)
        assert result.exit_code == 2, arguments
        assert result.stdout == ""
        assert told in result.stderr


def test_a_plan_whose_parts_contradict_themselves_is_told(folder: Path) -> None:
    invoke("brief.toml", "-o", "out")
    data = json.loads(Path("out/plan.json").read_text(encoding="utf-8"))
    data["parts"]["made"][0]["legs"][0]["in_series"] += 1
    Path("plan.json").write_text(json.dumps(data))
    result = budget("plan.json", "--as-made")
    assert result.exit_code == 2
    assert result.stderr.startswith("error: plan.json: plan.parts.made[1].legs: ")
