"""The smaller commands: new, materials, ranges, coefficients, --version and --help."""

from __future__ import annotations

import json
import re
import subprocess
import sys
from fractions import Fraction
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from makers import FILMS

from tcplan import __version__
from tcplan.cli.main import COMMANDS, cli

ROOT = Path(__file__).parents[2]


def invoke(*arguments: str) -> Result:
    return CliRunner().invoke(cli, list(arguments))


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLUMNS", raising=False)
    return tmp_path


# --- new --------------------------------------------------------------------------------------


@pytest.mark.parametrize("arguments", [[], ["demo"], ["a folder/deep"]])
def test_the_example_runs_as_it_is(folder: Path, arguments: list[str]) -> None:
    result = invoke("new", *arguments)
    assert result.exit_code == 0
    words = re.findall(r"'[^']*'|\S+", result.stdout.strip())
    assert words[:2] == ["tcplan", "plan"]
    planned = invoke(*(word.strip("'") for word in words[1:]))
    assert planned.exit_code == 0, planned.output
    assert "MET" in planned.stdout.split("\n")[0]
    assert "invented" in (folder / "brief-plan" / "spec.md").read_text()


def test_new_does_not_overwrite(folder: Path) -> None:
    Path("films.toml").write_text("mine")
    result = invoke("new")
    assert result.exit_code == 2
    assert "films.toml already there" in result.stderr
    assert [path.name for path in folder.iterdir()] == ["films.toml"]
    assert invoke("new", "--force").exit_code == 0
    assert "schema = 1" in Path("films.toml").read_text()


# --- materials and ranges -----------------------------------------------------------------------


def test_the_published_sets_are_listed(folder: Path) -> None:
    listed = invoke("materials").stdout
    sets = json.loads(invoke("materials", "--json").stdout)
    for name, held in sets.items():
        assert f"{name}\n" in listed
        assert set(held) <= set(re.findall(r"\w+", listed))
        shown = invoke("materials", name)
        assert shown.exit_code == 0
        assert re.findall(r"^(\w+): ", shown.stdout, re.MULTILINE) == held


def test_a_material_is_told_with_its_source(folder: Path) -> None:
    Path("films.toml").write_text(f"schema = 1\n{FILMS}")
    shown = invoke("materials", "films.toml").stdout
    for told in (
        "polynomial: 1 - 120e-6*(T - 298.15) + 0.55e-6*(T - 298.15)^2",
        "TC1 -120 ppm/K, TC2 0.55 ppm/K^2, at 25 degC",
        "valid   -60 degC to 160 degC",
        "size    320 ohm per square",
        "spread  limits: sheet resistance 20 %, TC1 40 ppm/K",
        "source  invented",
    ):
        assert told in shown
    data = json.loads(invoke("materials", "films.toml", "--json").stdout)
    assert list(data) == ["pp", "np"]
    assert data["pp"]["source"] == "invented"


def test_mistakes_of_a_materials_file_are_all_told(folder: Path) -> None:
    bad = FILMS.replace('tc1 = "-120 ppm/K"', "tc1 = -120").replace('source = "invented"', "", 1)
    Path("films.toml").write_text(f"schema = 1\n{bad}")
    result = invoke("materials", "films.toml")
    assert result.exit_code == 2
    assert result.stdout == ""
    assert result.stderr.endswith("2 mistakes.\n")


def test_the_ranges_have_their_numbers_and_standards(folder: Path) -> None:
    shown = invoke("ranges").stdout
    # AEC-Q100 and AEC-Q200, tables of temperature grades
    assert re.search(r"automotive-1 +-40 to 125 degC +AEC-Q100 grade 1\n", shown)
    assert re.search(r"passive-4 +0 to +70 degC +AEC-Q200 grade 4\n", shown)
    data = json.loads(invoke("ranges", "--json").stdout)
    assert {
        "name": "passive-0",
        "low_degC": -50.0,
        "high_degC": 150.0,
        "standard": "AEC-Q200 grade 0",
    } in data
    assert len(data) == len(shown.splitlines())


# --- coefficients -------------------------------------------------------------------------------

# IEC 60751: coefficients at 0 degC; computed at other references with d the shift and
# D = 1 + a d + b d^2: a' = (a + 2 b d)/D, b' = b/D.
PLATINUM = ["--tc1", "3908.3 ppm/K", "--tc2", "-0.5775 ppm/K^2", "--reference", "0 degC"]


@pytest.mark.parametrize(
    ("to", "tc1", "tc2"),
    [
        ("25 degC", 3535.277853, -0.5262694756),
        ("20 degC", 3604.298961, -0.5357465895),
        ("0 degC", 3908.3, -0.5775),
    ],
)
def test_platinum_at_another_reference(folder: Path, to: str, tc1: float, tc2: float) -> None:
    data = json.loads(invoke("coefficients", *PLATINUM, "--to", to, "--json").stdout)
    assert data["tc1_ppm_per_K"] == pytest.approx(tc1, rel=1e-9)
    assert data["tc2_ppm_per_K2"] == pytest.approx(tc2, rel=1e-9)


def test_chords_of_platinum_from_25_degc(folder: Path) -> None:
    # IEC 60751 with the definition of MIL-STD-202 method 304; above 0 degC the quadratic is exact
    hot = json.loads(
        invoke("coefficients", *PLATINUM, "--to", "25 degC", "--hot", "125 degC", "--json").stdout
    )
    [chord] = hot["chords"]
    assert (chord["to_degC"], chord["u_ppm_per_K"]) == (125.0, None)
    assert chord["tcr_ppm_per_K"] == pytest.approx(3482.651, abs=1e-3)


def test_two_chords_to_coefficients_by_exact_arithmetic(folder: Path) -> None:
    # chord(x) = A + B x, x from the reference: B = (30 + 35)/(100 + 80), A = 30 - 100 B
    b = Fraction(65, 180)
    chords = ["--cold=-55 degC", "--cold-tcr=-35 ppm/K", "--hot=125 degC", "--hot-tcr=30 ppm/K"]
    data = json.loads(invoke("coefficients", *chords, "--json").stdout)
    assert data["tc1_ppm_per_K"] == pytest.approx(float(30 - 100 * b), rel=1e-12)
    assert data["tc2_ppm_per_K2"] == pytest.approx(float(b), rel=1e-12)
    assert [c["tcr_ppm_per_K"] for c in data["chords"]] == pytest.approx([-35.0, 30.0], rel=1e-12)


def test_a_value_may_begin_with_a_minus_sign(folder: Path) -> None:
    apart = invoke("coefficients", "--tc1", "-120 ppm/K", "--tc2", "0.55 ppm/K^2", "--cold", "-55 degC")
    joined = invoke("coefficients", "--tc1=-120 ppm/K", "--tc2=0.55 ppm/K^2", "--cold=-55 degC")
    assert apart.exit_code == 0
    assert apart.stdout == joined.stdout
    # -120 - 0.55 * 80 = -164; the peak is 120/(2 * 0.55) K above 25 degC
    assert re.match(
        r"TC1 at 25 degC +-120 ppm/K\nTC2 at 25 degC +0\.55 ppm/K\^2\n"
        r"chord TCR to -55 degC +-164 ppm/K\npeak at +134\.091 degC\n",
        apart.stdout,
    )


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        ([], ["no --tc1"]),
        (
            ["--tc1", "3 ppm", "--to", "warm"],
            ["--tc1: found '3 ppm', a ratio", "--to: found 'warm'", "2 mistakes."],
        ),
        (["--tc1", "3 ppm/K", "--hot-tcr", "3 ppm/K"], ["--tc1 and --hot-tcr together"]),
        (["--hot-tcr", "3 ppm/K", "--hot", "85 degC"], ["no --cold, --cold-tcr"]),
        (["--tc1", "-10000 ppm/K", "--to", "150 degC"], ["-0.25 at 150 degC"]),
        (
            ["--cold", "85 degC", "--cold-tcr", "1 ppm/K", "--hot", "0 degC", "--hot-tcr", "2 ppm/K"],
            ["cold below"],
        ),
    ],
)
def test_wrong_coefficients_are_refused(folder: Path, arguments: list[str], told: list[str]) -> None:
    result = invoke("coefficients", *arguments)
    assert result.exit_code == 2
    assert result.stdout == ""
    for words in told:
        assert words in result.stderr


# --- the command itself ---------------------------------------------------------------------------


def test_the_version() -> None:
    result = invoke("--version")
    assert (result.exit_code, result.stdout) == (0, f"tcplan {__version__}\n")


@pytest.mark.parametrize("command", [[], *([name] for name in COMMANDS)])
def test_help_has_examples_and_keeps_to_the_width(command: list[str]) -> None:
    result = invoke(*command, "--help")
    assert result.exit_code == 0
    assert re.search(r"Examples?|Start here", result.stdout)
    assert max(map(len, result.stdout.splitlines())) <= 80


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        (["pan"], "no such command 'pan'. Did you mean plan?"),
        (["frobnicate"], "Choose one of plan, budget, parts, fit"),
        (["plan"], "BRIEF"),
        (["plan", "x.toml", "--jsn"], "--json"),
        (["ranges", "x"], "x"),
    ],
)
def test_wrong_use_is_one_line_and_two(arguments: list[str], told: str) -> None:
    result = invoke(*arguments)
    assert result.exit_code == 2
    assert result.stdout == ""
    assert result.stderr.startswith("error: command line: ")
    assert told in result.stderr
    assert len(result.stderr.splitlines()) == 1


def test_no_command_shows_the_help() -> None:
    result = invoke()
    assert result.exit_code == 2
    assert result.stdout == ""
    assert result.stderr.startswith("Usage: tcplan [OPTIONS] COMMAND")


def test_the_version_loads_nothing_heavy() -> None:
    script = (
        "import sys\nfrom tcplan.cli.main import cli\n"
        "cli.main(['--version'], standalone_mode=False)\nprint(*sorted(sys.modules))"
    )
    result = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=True, cwd=ROOT
    )
    loaded = {name.split(".")[0] for name in result.stdout.split()}
    assert not loaded & {"numpy", "scipy", "sympy", "pydantic", "matplotlib", "jinja2", "pint", "rich"}
    assert not {"tcplan.cli.plan", "tcplan.workflow"} & set(result.stdout.split())
