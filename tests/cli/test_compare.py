"""``tcplan compare``: the screen, exit codes, JSON, files, parts as made, bad input."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner, Result
from makers import BRIEF, FILMS
from measured_composites import scalar_ohms

from tcplan.cli.main import cli
from tcplan.network import value
from tcplan.plan_file import read_plan

DEGREES = (-40.0, 0.0, 25.0, 85.0, 150.0)
ENDS = """
[material.pp.film]
min_width = "2 um"
end_resistance = "35 ohm*um"
end_tc1 = "-900 ppm/K"
grid = "5 nm"
[material.np.film]
min_width = "2 um"
grid = "5 nm"
"""


def invoke(*arguments: str, stdin: str | None = None) -> Result:
    return CliRunner().invoke(cli, list(arguments), input=stdin)


@pytest.fixture(scope="module")
def planned(tmp_path_factory: pytest.TempPathFactory) -> str:
    folder = tmp_path_factory.mktemp("planned")
    (folder / "brief.toml").write_text(BRIEF.replace("6000", "9000") + FILMS)
    return invoke("plan", str(folder / "brief.toml"), "--json").stdout


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, planned: str) -> Path:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLUMNS", raising=False)
    Path("plan.json").write_text(planned)
    return tmp_path


def write_sweep(
    off: dict[tuple[str, str], float] | None = None, factor: float = 1.0, header: str = ""
) -> None:
    plan = read_plan(Path("plan.json").read_text())
    rows = [header or "device;T [degC];R [ohm];u(R) [ohm]"]
    for t in DEGREES:
        ohms = factor * scalar_ohms(plan.best.network, plan.by_name, off or {}, t + 273.15)
        rows.append(f"D1;{t};{ohms:.4f};0.2")
    Path("sweep.csv").write_text("\n".join(rows) + "\n")


def test_the_screen_tells_value_drift_deviations_and_new_legs(folder: Path) -> None:
    write_sweep({("pp", "tc1"): 10e-6})
    result = invoke("compare", "plan.json", "sweep.csv", "--chamber-offset", "0.2 K", "--lead", "20 mohm")
    assert result.exit_code == 0, result.output
    assert all(len(line) <= 80 for line in result.stdout.splitlines())
    whole = " ".join(result.stdout.split())
    for words in ("D1: inside the predicted band", "pp TC1", "chamber offset", "lead", "sigma together",
                  "Leg values that would centre it", "becomes the planned 18 kohm", "limit of 9000 ppm",
                  "no tolerance is given", "Plausible"):  # fmt: skip
        assert words in whole, words


def test_a_device_outside_is_the_exit_code(folder: Path) -> None:
    write_sweep({("pp", "tc1"): 300e-6})
    result = invoke("compare", "plan.json", "sweep.csv")
    assert result.exit_code == 1
    assert "OUTSIDE the predicted band" in result.stdout
    assert "NOT PLAUSIBLE" in result.stdout
    assert "Leg values that would centre it" not in result.stdout
    assert "a probability under 0.1 %" in " ".join(result.stdout.split())


def test_json_holds_every_reading(folder: Path) -> None:
    write_sweep({("np", "value"): 0.02})
    result = invoke("compare", "-", "sweep.csv", "--json", stdin=Path("plan.json").read_text())
    data = json.loads(result.stdout)
    one = data["devices"][0]
    assert [point["degC"] for point in one["points"]] == list(DEGREES)
    plan = read_plan(Path("plan.json").read_text())
    at, reference = (
        scalar_ohms(plan.best.network, plan.by_name, {("np", "value"): 0.02}, t + 273.15)
        for t in (150.0, 25.0)
    )
    assert one["points"][-1]["drift_ppm"] == pytest.approx(1e6 * (at / reference - 1.0), abs=0.01)
    assert one["ohms"] == pytest.approx(reference, rel=1e-8)
    assert data["planned_ohms"] == pytest.approx(value(plan.best.network))
    assert len(data["predicted"]["degC"]) == len(data["predicted"]["likely_low_ppm"])
    assert {row["material"] for row in data["centring"]["legs"]} == {"pp", "np"}


def test_a_sweep_on_stdin_is_that_of_the_file(folder: Path) -> None:
    write_sweep({("pp", "tc1"): 10e-6})
    from_file = invoke("compare", "plan.json", "sweep.csv", "--json")
    from_stdin = invoke("compare", "plan.json", "-", "--json", stdin=Path("sweep.csv").read_text())
    assert from_stdin.exit_code == 0, from_stdin.output
    both = [json.loads(one.stdout) for one in (from_file, from_stdin)]
    assert both[0].pop("source") == "sweep.csv"
    assert both[1].pop("source") == "standard input"
    assert both[0] == both[1]
    twice = invoke("compare", "-", "-", stdin="{}")
    assert twice.exit_code == 2
    assert "one of them on stdin" in twice.stderr


def write_devices(rows: dict[str, dict[tuple[str, str], float]], *more: str) -> None:
    plan = read_plan(Path("plan.json").read_text())
    lines = ["device;T [degC];R [ohm]"]
    for name, off in rows.items():
        for k, t in enumerate(DEGREES):
            ohms = scalar_ohms(plan.best.network, plan.by_name, off, t + 273.15) * (1.0 + 1e-5 * (-1) ** k)
            lines.append(f"{name};{t};{ohms:.4f}")
    Path("sweep.csv").write_text("\n".join([*lines, *more]) + "\n")


def test_many_devices_are_a_line_each_and_the_worst_in_detail(folder: Path) -> None:
    far = {f"far-{k}": {("pp", "tc1"): (300 + 10 * k) * 1e-6} for k in range(7)}
    near = {f"near-{k}": {("pp", "tc1"): 1e-6 * k} for k in range(13)}
    write_devices(near | far)
    result = invoke("compare", "plan.json", "sweep.csv")
    assert result.exit_code == 1, result.output
    lines = result.stdout.splitlines()
    assert all(len(line) <= 80 for line in lines)
    table = [line for line in lines if line.startswith(("far-", "near-")) and line.endswith("sigma")]
    assert len(table) == 20
    assert all("OUTSIDE band" in line and "pp TC1" in line for line in table if line.startswith("far-"))
    detailed = [line.split(":")[0] for line in lines if ": OUTSIDE the predicted band" in line]
    assert len(detailed) == 5
    assert all(name.startswith("far-") for name in detailed)
    whole = " ".join(result.stdout.split())
    assert "7 of 20 devices outside; in detail the worst 5 below" in whole
    assert whole.count("ppm as planned") == 10
    assert "3 more devices have less with the new values" in whole
    assert "The mean is without far-0" in whole
    assert len(json.loads(invoke("compare", "plan.json", "sweep.csv", "--json").stdout)["devices"]) == 20


def test_a_device_with_too_few_readings_is_told_and_the_exit_code(folder: Path) -> None:
    write_devices({"D1": {}, "D2": {("pp", "tc1"): 5e-6}}, "short;25;18000", "short;85;18010")
    result = invoke("compare", "plan.json", "sweep.csv")
    assert result.exit_code == 1, result.output
    assert "Give more readings of device short, or leave it out." in " ".join(result.stderr.split())
    assert "None of 2 devices is outside" in result.stdout
    data = json.loads(invoke("compare", "plan.json", "sweep.csv", "--json").stdout)
    assert [one["device"] for one in data["not_compared"]] == ["short"]
    assert [one["device"] for one in data["devices"]] == ["D1", "D2"]
    write_devices({}, "short;25;18000", "short;85;18010")
    assert invoke("compare", "plan.json", "sweep.csv").exit_code == 2


def test_files_are_written_and_not_over_others(folder: Path) -> None:
    write_sweep()
    result = invoke("compare", "plan.json", "sweep.csv", "-o", "out")
    assert result.exit_code == 0, result.output
    assert {path.name for path in Path("out").iterdir()} == {"compare.json", "compare.svg", "compare.png"}
    assert json.loads(Path("out/compare.json").read_text())["option"]
    assert "<title>Measured drift and the plan</title>" in Path("out/compare.svg").read_text()
    assert invoke("compare", "plan.json", "sweep.csv", "-o", "out").exit_code == 2
    assert invoke("compare", "plan.json", "sweep.csv", "-o", "out", "--force").exit_code == 0


def test_parts_as_made_are_compared_leg_by_leg(folder: Path) -> None:
    Path("brief.toml").write_text(BRIEF.replace("6000", "9000") + FILMS + ENDS)
    made = invoke("parts", "brief.toml", "-o", "made", "--most-units", "30")
    assert made.exit_code in (0, 1), made.output
    Path("plan.json").write_text(Path("made/plan.json").read_text())
    plan = read_plan(Path("plan.json").read_text())
    assert plan.parts is not None
    network = plan.parts.made[0].option.network
    materials = {material.name: material for material in plan.parts.materials}
    rows = ["T [degC],R [ohm],u(R) [ohm]"]
    for t in DEGREES:
        total = _ohms(network, materials, t + 273.15)
        rows.append(f"{t},{total:.4f},0.2")
    Path("sweep.csv").write_text("\n".join(rows) + "\n")
    result = invoke("compare", "plan.json", "sweep.csv", "--as-made", "--json")
    assert result.exit_code == 0, result.output
    data = json.loads(result.stdout)
    explained = data["devices"][0]["explanation"]
    assert explained["norm_sigmas"] < 0.05
    factors = {row["material"]: row["factor"] for row in data["centring"]["legs"]}
    assert factors["pp"] == pytest.approx(factors["pp_ends"])
    assert invoke("compare", "plan.json", "sweep.csv", "--as-made", "-o", "out").exit_code == 0


def _ohms(network, materials, t):  # type: ignore[no-untyped-def]
    """Return R of a made network, its laws of any kind, one leg at a time."""
    from tcplan.network import Leg, Series

    if isinstance(network, Leg):
        law = materials[network.material].law
        return network.ohms * float(law.ratio(np.array([t]))[0] / law.ratio(np.array([298.15]))[0])
    parts = [_ohms(child, materials, t) for child in network.children]
    return sum(parts) if isinstance(network, Series) else 1.0 / sum(1.0 / part for part in parts)


def test_rows_that_are_no_readings_are_told(folder: Path) -> None:
    write_sweep()
    with Path("sweep.csv").open("a") as stream:
        stream.write("D1;60;open;0.2\n")
    result = invoke("compare", "plan.json", "sweep.csv")
    assert result.exit_code == 0
    assert "line 7" in result.stderr


def test_drift_only_leaves_the_level_out(folder: Path) -> None:
    write_sweep(factor=1.1)
    told = {
        options: json.loads(invoke("compare", "plan.json", "sweep.csv", "--json", *options).stdout)
        for options in ((), ("--drift-only",))
    }
    norms = [data["devices"][0]["explanation"]["norm_sigmas"] for data in told.values()]
    assert norms[1] < 0.1 < norms[0]
    assert "the drift alone explains" in invoke("compare", "plan.json", "sweep.csv", "--drift-only").stdout


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("--option", "paralel-1"), "expected one of"),
        (("--as-made",), "plan with parts"),
        (("--chamber-offset=-1 K",), "zero or more"),
        (("--chamber-scale", "0.1 K"), "--chamber-scale"),
        (("--lead", "some"), "--lead"),
    ],
)
def test_wrong_options_are_refused(folder: Path, arguments: tuple[str, ...], words: str) -> None:
    write_sweep()
    result = invoke("compare", "plan.json", "sweep.csv", *arguments)
    assert result.exit_code == 2
    assert words in result.stderr


def test_a_sweep_in_the_wrong_unit_is_refused(folder: Path) -> None:
    write_sweep(factor=1e3)
    result = invoke("compare", "plan.json", "sweep.csv")
    assert result.exit_code == 2
    assert "1000 times the plan" in result.stderr.replace("1e+03", "1000")


def test_missing_files_are_told(folder: Path) -> None:
    assert invoke("compare", "plan.json", "nothing.csv").exit_code == 2
    write_sweep()
    assert invoke("compare", "nothing.json", "sweep.csv").exit_code == 2
