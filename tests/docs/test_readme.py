"""README: two commands, each on one line, and a first screen that is the real one."""

import re
import subprocess
import sys
from pathlib import Path

from tcplan.brief import parse_brief, read_brief
from tcplan.workflow.planning import make_plan

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text()


def test_two_commands_do_all_the_set_up():
    commands = [line for line in README.splitlines() if line.startswith("python3 -m venv")]
    assert len(commands) == 2
    assert "tcplan plan examples/" in commands[0]
    assert commands[1].endswith("-m pytest")


def test_the_printed_screen_is_the_real_one(tmp_path):
    result = subprocess.run(
        [
            sys.executable,
            "-m",
            "tcplan",
            "plan",
            "examples/brake_sensor_films/brief.toml",
            "-o",
            tmp_path / "o",
        ],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=True,
        env={"PATH": "", "COLUMNS": "80"},
    )
    blocks = re.findall(r"^```\n(.*?)^```$", README, flags=re.M | re.S)
    printed = next(block for block in blocks if "Chosen" in block)
    assert _shape(printed) == _shape(result.stdout)
    assert printed.splitlines()[:4] == result.stdout.splitlines()[:4]


def _shape(text):
    """Return the words of a screen with every number as #: the last digits may differ by machine."""
    return re.sub(r"\d[\d.]*", "#", " ".join(text.split()))


def test_links_lead_somewhere():
    for target in re.findall(r"\]\(([^)#]+)\)", README):
        assert (ROOT / target).exists(), target


def test_the_mixing_table_is_the_real_one():
    plan = make_plan(read_brief(ROOT / "examples" / "flat_mixed_films" / "brief.toml"))
    assert {len(o.squares) for o in plan.options if o.verdict == "MET"} == {
        4
    }  # "only a network of four legs"
    for kind in ("single", "series", "parallel", "mixed"):
        option = next(o for o in plan.options if o.arrangement == kind)
        figures = option.nominal.peak_ppm, option.worst_case.peak_ppm, option.area * 1e12
        row = re.search(rf"^\| {kind} \|(.*)\|$", README, flags=re.M).group(1)
        printed = [float(cell) for cell in row.split("|")]
        assert printed == [float(f"{figure:.0f}") for figure in figures]


def test_the_table_of_the_judges_is_what_the_example_gives():
    path = ROOT / "examples" / "brake_sensor_films" / "brief.toml"
    for judge in ("nominal", "quantile", "worst-case"):
        told = path.read_text().replace('judge = "worst-case"', f'judge = "{judge}"')
        plan = make_plan(parse_brief(told, "brief.toml", path.parent))
        for kind in ("parallel", "mixed"):
            row = re.search(rf"^\| {judge} \| {kind} \|(.*)\|$", README, flags=re.M).group(1)
            option = next(o for o in plan.options if o.arrangement == kind)
            figures = option.nominal.figure_ppm, option.likely.peak_ppm, option.worst_case.peak_ppm
            assert [int(cell) for cell in row.split("|")] == [round(figure) for figure in figures]
            if judge == "worst-case":
                assert (option.proof.kind, option.proof.of) == ("global", "worst-case")
            if judge == "nominal":
                flattest = min(plan.options, key=lambda o: o.nominal.figure_ppm)
                assert flattest.nominal.figure_ppm < 0.11 * 9000  # "a tenth of the limit"
                assert flattest.worst_case.peak_ppm > 3 * 9000  # "more than three times the limit"
