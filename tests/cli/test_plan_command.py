"""``tcplan plan``: files, first screen, exit codes, pipes and narrow terminals."""

from __future__ import annotations

import json
import os
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from makers import BRIEF, FILMS

import tcplan.workflow.planning
from tcplan.cli.main import cli
from tcplan.errors import InternalError, Stopped
from tcplan.plan_file import read_plan
from tcplan.workflow.delivery import PLAN_FILES

ROOT = Path(__file__).parents[2]
WORST = BRIEF.replace('drift = "6000 ppm"', 'drift = "LIMIT"\njudge = "worst-case"')
MET, NOT_MET, BELOW_FLOOR = "13000 ppm", "7000 ppm", "3000 ppm"


def text(limit: str) -> str:
    return WORST.replace("LIMIT", limit) + FILMS


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLUMNS", raising=False)
    return tmp_path


def plan(limit: str, *options: str) -> Result:
    Path("brief.toml").write_text(text(limit))
    return CliRunner().invoke(cli, ["plan", "brief.toml", *options])


def run(*arguments: str, cwd: Path, stdin: str = "", **environment: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "tcplan", *arguments],
        cwd=cwd,
        input=stdin,
        capture_output=True,
        text=True,
        check=False,
        env={"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT), **environment},
    )


# --- exit codes -------------------------------------------------------------------------------


@pytest.mark.parametrize(("limit", "code"), [(MET, 0), (NOT_MET, 1), (BELOW_FLOOR, 3)])
def test_the_exit_code_is_the_verdict(folder: Path, limit: str, code: int) -> None:
    result = plan(limit)
    assert result.exit_code == code
    assert sorted(path.name for path in (folder / "brief-plan").iterdir()) == sorted(PLAN_FILES)


def test_without_a_limit_it_is_zero(folder: Path) -> None:
    Path("brief.toml").write_text(BRIEF.replace('drift = "6000 ppm"', "") + FILMS)
    result = CliRunner().invoke(cli, ["plan", "brief.toml"])
    assert result.exit_code == 0
    assert result.stdout.startswith("18 kohm, least drift (nominal), -40 to 150 degC: no limit given\n")


def test_not_judged_is_one(folder: Path) -> None:
    without = re.sub(r"\[material\.\w+\.spread\](\n.+)+", "", FILMS)
    Path("brief.toml").write_text(WORST.replace("LIMIT", MET) + without)
    result = CliRunner().invoke(cli, ["plan", "brief.toml"])
    assert result.exit_code == 1
    assert "NOT JUDGED" in result.stdout
    assert "not stated" in result.stdout


def test_what_cannot_be_met_says_so_and_by_how_much(folder: Path) -> None:
    result = plan(BELOW_FLOOR)
    flat = " ".join(result.stdout.split())
    over = re.search(r"reaches ([0-9]+) ppm in the worst case, ([0-9]+) ppm over the limit of 3000 ppm", flat)
    assert over is not None
    assert abs(int(over[1]) - int(over[2]) - 3000) <= 100
    floor = re.search(r"No network of these materials can meet it: the floor is ([0-9]+) ppm", flat)
    assert floor is not None
    assert int(floor[1]) > 3000


def test_no_network_at_all_is_three(folder: Path) -> None:
    fixed = '[[fixed]]\nmaterial = "np"\nvalue = "17 kohm"\n[search]\nuse = ["pp"]\nmin_share = "20 %"\n'
    Path("brief.toml").write_text(text(MET) + fixed)
    result = CliRunner().invoke(cli, ["plan", "brief.toml"])
    assert result.exit_code == 3
    assert result.stderr.startswith("no answer: ")
    assert not (folder / "brief-plan").exists()


@pytest.mark.parametrize(
    ("fault", "code", "said"),
    [
        (KeyboardInterrupt(), 4, "stopped early"),
        (Stopped("enough"), 4, "stopped early: enough"),
        (InternalError("shares"), 5, "a fault of tcplan itself (InternalError: shares)"),
        (ZeroDivisionError("x"), 5, "Please report it"),
    ],
)
def test_faults_have_their_codes(
    folder: Path, monkeypatch: pytest.MonkeyPatch, fault: BaseException, code: int, said: str
) -> None:
    def failing(brief: object, **_: object) -> None:
        raise fault

    monkeypatch.setattr(tcplan.workflow.planning, "make_plan", failing)
    result = plan(MET)
    assert result.exit_code == code
    assert said in result.stderr
    assert "Traceback" not in result.output
    assert result.stdout == ""
    assert not (folder / "brief-plan").exists()


def test_a_fault_shows_where_it_happened_when_asked(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def failing(brief: object, **_: object) -> None:
        raise ZeroDivisionError("x")

    monkeypatch.setenv("TCPLAN_TRACEBACK", "1")
    monkeypatch.setattr(tcplan.workflow.planning, "make_plan", failing)
    assert isinstance(plan(MET).exception, ZeroDivisionError)


# --- files ------------------------------------------------------------------------------------


def test_where_the_files_are_is_told_on_stderr(folder: Path) -> None:
    result = plan(MET, "-o", "out/deep")
    assert result.stderr.startswith(f"wrote {len(PLAN_FILES)} files to out/deep: plan.json, ")
    assert (folder / "out" / "deep" / "spec.md").read_text().startswith("# Test resistor\n")


def test_an_existing_file_stops_it_and_force_replaces(folder: Path) -> None:
    (folder / "out").mkdir()
    (folder / "out" / "spec.md").write_text("mine")
    result = plan(MET, "-o", "out")
    assert result.exit_code == 2
    assert "spec.md already there" in result.stderr
    assert [path.name for path in (folder / "out").iterdir()] == ["spec.md"]
    assert (folder / "out" / "spec.md").read_text() == "mine"
    assert plan(MET, "-o", "out", "--force").exit_code == 0
    assert sorted(path.name for path in (folder / "out").iterdir()) == sorted(PLAN_FILES)


def test_json_alone_writes_nothing(folder: Path) -> None:
    result = plan(MET, "--json")
    assert result.exit_code == 0
    assert read_plan(result.stdout).limit.drift_ppm == 13000.0
    assert [path.name for path in folder.iterdir()] == ["brief.toml"]


def test_json_with_a_folder_prints_what_it_writes(folder: Path) -> None:
    result = plan(NOT_MET, "--json", "-o", "out")
    assert result.exit_code == 1
    assert result.stdout == (folder / "out" / "plan.json").read_text()
    assert (folder / "out" / "drift.png").read_bytes().startswith(b"\x89PNG")


def test_the_same_brief_gives_the_same_bytes(folder: Path) -> None:
    plan(MET, "-o", "one")
    plan(MET, "-o", "two")
    for name in PLAN_FILES:
        assert (folder / "one" / name).read_bytes() == (folder / "two" / name).read_bytes(), name


# --- the first screen ---------------------------------------------------------------------------


def test_the_screen_is_in_its_order(folder: Path) -> None:
    screen = plan(NOT_MET).stdout
    assert screen.startswith("18 kohm, drift within 7000 ppm (worst case), -40 to 150 degC: NOT MET\n")
    marks = ["Assumed ", "Floor ", "  option ", "Chosen ", "Worst at ", "Moved by ", "Centring "]
    places = [screen.index(f"\n{mark}") for mark in marks]
    assert places == sorted(places)
    assert len(re.findall(r"^\* ", screen, re.MULTILINE)) == 1
    for told in ("Not included: package stress", "squares", "Proved optimal"):
        assert told in screen


@pytest.mark.parametrize("columns", [40, 60, 72, 80, 200])
def test_the_screen_keeps_to_the_width(folder: Path, monkeypatch: pytest.MonkeyPatch, columns: int) -> None:
    monkeypatch.setenv("COLUMNS", str(columns))
    for limit in (MET, BELOW_FLOOR):
        lines = plan(limit, "--force").stdout.split("\n")
        assert max(map(len, lines)) <= min(columns, 80)


def test_a_long_network_is_shortened_in_the_middle(folder: Path) -> None:
    network = " + ".join(["(pp 1 kohm || np 2 kohm)"] * 30)
    Path("brief.toml").write_text(text(NOT_MET) + f'[given]\nnetwork = "{network}"\n')
    result = CliRunner().invoke(cli, ["plan", "brief.toml"])
    table = result.stdout.split("* given")[1].split("\n\n")[0]
    assert " ... " in " ".join(table.split())
    assert len(table.split("\n")) <= 12
    whole = json.loads(Path("brief-plan/plan.json").read_text())["options"][0]
    assert len(whole["legs"]) == 60
    assert whole["network"].count("pp") == 30


def test_no_colour_when_it_is_not_a_terminal(folder: Path) -> None:
    assert "\x1b" not in plan(MET).output


@pytest.mark.parametrize(
    ("variable", "coloured"), [({}, True), ({"NO_COLOR": "1"}, False), ({"TERM": "dumb"}, False)]
)
def test_colour_on_a_terminal(folder: Path, variable: dict[str, str], coloured: bool) -> None:
    import pty

    Path("brief.toml").write_text(text(MET))
    main, sub = pty.openpty()
    environment = {"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT), "TERM": "xterm", "COLUMNS": "80"}
    process = subprocess.Popen(
        [sys.executable, "-m", "tcplan", "plan", "brief.toml"],
        stdout=sub,
        stderr=subprocess.DEVNULL,
        env=environment | variable,
    )
    os.close(sub)
    shown = b""
    try:
        while piece := os.read(main, 65536):
            shown += piece
    except OSError:  # what a pseudo-terminal gives at its end
        pass
    os.close(main)
    assert process.wait() == 0
    assert (b"\x1b[32mMET\x1b[0m" in shown) is coloured
    assert (b"\x1b" in shown) is coloured


# --- as a process -------------------------------------------------------------------------------


def test_a_brief_on_stdin(folder: Path) -> None:
    result = run("plan", "-", "-o", "out", cwd=folder, stdin=text(MET))
    assert result.returncode == 0, result.stderr
    assert json.loads((folder / "out" / "plan.json").read_text())["brief"]["title"] == "Test resistor"
    assert max(map(len, result.stdout.split("\n"))) <= 80


def test_a_reader_that_goes_away_is_no_fault(folder: Path) -> None:
    Path("brief.toml").write_text(text(NOT_MET))
    command = f"{sys.executable} -m tcplan plan brief.toml | true; exit ${{PIPESTATUS[0]}}"
    result = subprocess.run(
        ["bash", "-c", command],
        capture_output=True,
        text=True,
        check=False,
        env={"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT)},
    )
    assert result.returncode == 1, result.stderr  # the verdict, as if it had been read
    assert result.stderr.startswith(f"wrote {len(PLAN_FILES)} files to brief-plan")
    assert len(result.stderr.splitlines()) == 1


def test_a_full_disk_behind_stdout_is_told(folder: Path) -> None:
    with Path("/dev/full").open("w") as full:
        result = subprocess.run(
            [sys.executable, "-m", "tcplan", "ranges"],
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
            env={"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT)},
        )
    assert result.returncode == 2
    assert result.stderr.startswith("error: standard output: found a place that cannot be written")


def test_a_terminal_without_the_letters_of_the_title(folder: Path) -> None:
    Path("brief.toml").write_text(text(MET).replace("Test resistor", "Größe ∞"), encoding="utf-8")
    result = run("plan", "brief.toml", cwd=folder, PYTHONIOENCODING="ascii")
    assert result.returncode == 0, result.stderr
    assert "Gr\\xf6\\xdfe \\u221e" in result.stdout


def catches(process: int, number: int) -> bool:
    """Wait until a process has a handler for a signal, as its status in /proc tells."""
    until = time.monotonic() + 20.0
    while time.monotonic() < until:
        caught = re.search(r"SigCgt:\s+([0-9a-f]+)", Path(f"/proc/{process}/status").read_text())
        if caught is not None and int(caught[1], 16) >> (number - 1) & 1:
            return True
        time.sleep(0.01)
    return False


def test_a_signal_stops_it_with_nothing_left(folder: Path) -> None:
    process = subprocess.Popen(
        [sys.executable, "-m", "tcplan", "plan", "-", "-o", "out"],
        cwd=folder,
        stdin=subprocess.PIPE,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.PIPE,
        env={"PATH": os.environ["PATH"], "PYTHONPATH": str(ROOT)},
    )
    assert process.stdin is not None
    assert process.stderr is not None
    assert catches(process.pid, signal.SIGTERM)
    time.sleep(0.3)  # it waits for its brief now
    process.send_signal(signal.SIGTERM)
    with process.stdin, process.stderr:
        said = process.stderr.read().decode()
    assert process.wait() == 4
    assert said == "stopped early: signal 15\n"
    assert list(folder.iterdir()) == []
