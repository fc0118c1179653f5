"""From raw sweeps to a worst-case plan and a budget, by the three commands of docs/fit.md."""

import json
import re
import shlex
import shutil
import tomllib
from pathlib import Path

import film_campaign
import numpy as np
import pytest
import recomputed_plans as recomputed
from click.testing import CliRunner

from tcplan.cli.main import cli
from tcplan.material.files import read_materials

ROOT = Path(__file__).parents[2]
EXAMPLE = ROOT / "examples" / "film_campaign"


@pytest.fixture(scope="module")
def run(tmp_path_factory):
    """Return a folder in which the three commands were run, and their results."""
    folder = tmp_path_factory.mktemp("campaign")
    shutil.copytree(EXAMPLE, folder / "examples" / "film_campaign", ignore=shutil.ignore_patterns("fitted"))
    text = (ROOT / "docs" / "fit.md").read_text(encoding="utf-8")
    [block] = re.findall(r"^```commands\n(.*?)^```$", text, re.M | re.S)
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)
        results = [CliRunner().invoke(cli, shlex.split(line)[1:]) for line in block.splitlines()]
    return folder, results


def test_the_three_commands_answer(run):
    _, results = run
    assert len(results) == 3
    assert [result.exit_code for result in results] == [0, 0, 0], [result.stderr for result in results]
    assert results[1].stdout.split("\n")[0].endswith(": MET")
    assert re.search(r"^total ", results[2].stdout, re.M)


def test_the_files_are_those_of_the_generator():
    for name, text in film_campaign.files().items():
        assert (EXAMPLE / name).read_text(encoding="utf-8") == text, name


def found(run):
    return json.loads((run[0] / "examples/film_campaign/fitted/fit.json").read_text())["materials"]


@pytest.mark.parametrize("name", film_campaign.FILMS)
def test_means_are_the_truth_within_their_uncertainty(run, name):
    """The truth is what the generator was told. 3.5 standard uncertainties: 7 degrees of freedom of lots."""
    film, mean = film_campaign.FILMS[name], found(run)[name]["mean"]
    truth = {"R": film.sheet_ohm * film.squares, "tc1": film.tc1_ppm * 1e-6, "tc2": film.tc2_ppm * 1e-6}
    for key, value in truth.items():
        assert abs(mean[key]["value"] - value) <= 3.5 * mean[key]["standard_uncertainty"], key
        assert mean[key]["standard_uncertainty"] < 0.02 * abs(value)


@pytest.mark.parametrize("name", film_campaign.FILMS)
def test_every_device_is_the_truth_within_its_uncertainty(run, name):
    """4 standard uncertainties for 72 figures a film; without u(R) a device has 6 degrees of freedom."""
    devices = film_campaign.devices_of(name)
    fits = found(run)[name]["devices"]
    assert [(one["lot"], one["device"]) for one in fits] == [(d.lot, f"{d.lot}/{d.name}") for d in devices]
    within = 5.5 if name == "moss_film" else 4.0
    for device, fit in zip(devices, fits, strict=True):
        truth = (device.ohms, device.tc1_ppm * 1e-6, device.tc2_ppm * 1e-6)
        for k, value in enumerate(truth):
            off = abs(list(fit["parameters"].values())[k] - value)
            assert off <= within * fit["covariance"][k][k] ** 0.5, (device, k)


@pytest.mark.parametrize("name", film_campaign.FILMS)
def test_spreads_hold_the_truth(run, name):
    film, scatter = film_campaign.FILMS[name], found(run)[name]["scatter"]
    lot_tc1 = (film.tc1_lot_ppm**2 + (film.tc1_per_percent * film.sheet_lot_percent) ** 2) ** 0.5
    truth = {
        ("value", "lot"): film.sheet_lot_percent * 1e-2,
        ("value", "device"): film.sheet_device_percent * 1e-2,
        ("tc1", "lot"): lot_tc1 * 1e-6,
        ("tc1", "device"): film.tc1_device_ppm * 1e-6,
        ("tc2", "device"): film.tc2_device_ppm * 1e-6,
    }
    outside = [
        key
        for key, sigma in truth.items()
        if not scatter[key[0]][key[1]]["low"] <= sigma <= scatter[key[0]][key[1]]["high"]
    ]
    assert len(outside) <= 1, outside  # each interval has 95 % confidence
    for key in ("value", "tc1"):  # 99.73 % of devices of a normal population are within 3 sigma
        total = (truth[key, "lot"] ** 2 + truth[key, "device"] ** 2) ** 0.5
        assert 3.0 * total < scatter[key]["half_width"] < 9.0 * total


def test_the_correlation_that_was_made_is_found_and_no_other(run):
    text = (run[0] / "examples/film_campaign/fitted/materials.toml").read_text()
    [table] = tomllib.loads(text)["correlation"]
    assert table["between"] == ["amber_film.ohm_per_square", "amber_film.tc1"]
    film = film_campaign.FILMS["amber_film"]
    by_lot = film.tc1_per_percent * film.sheet_lot_percent**2
    across = (film.sheet_lot_percent**2 + film.sheet_device_percent**2) ** 0.5
    along = (film.tc1_lot_ppm**2 + by_lot**2 / film.sheet_lot_percent**2 + film.tc1_device_ppm**2) ** 0.5
    told = found(run)["amber_film"]["correlation_value_tc1"]
    assert told["low"] <= by_lot / (across * along) <= told["high"] < 0.0


def test_films_of_other_pieces_do_not_track(run):
    """Devices of the three films have equal names, and are other pieces: the campaign does not say else."""
    folder = run[0] / "examples/film_campaign"
    assert "same_devices" not in (folder / "campaign.toml").read_text()
    assert "tracking" not in tomllib.loads((folder / "fitted/materials.toml").read_text())
    assert json.loads((folder / "fitted/fit.json").read_text())["tracking"] == []


def test_hysteresis_and_bad_rows_are_told(run):
    data = found(run)
    moved = [one["hysteresis"] for one in data["iron_film"]["devices"]]
    # the loop is a parabola of 120 ppm at its height: its mean is 2/3 of that, less at 9 temperatures
    mean = sum(one["mean"] for one in moved) / len(moved)
    assert mean * 1e6 == pytest.approx(2.0 / 3.0 * 120.0, rel=0.2)
    # 80 ppm are 3 times their uncertainty in one device: few pass a limit for 24 devices, all together do
    assert sum(one["significant"] for one in moved) < len(moved) // 2
    assert [row["line"] for row in data["amber_film"]["refused"]] == [43, 134]
    assert data["moss_film"]["excluded_lines"] == [99]


def test_the_reading_that_is_left_out_was_the_outlier(tmp_path):
    for path in EXAMPLE.iterdir():
        if path.is_file():
            shutil.copy(path, tmp_path)
    campaign = tmp_path / "campaign.toml"
    text = campaign.read_text()
    assert "exclude = [99]" in text
    campaign.write_text(re.sub("^exclude = .*$", "", text, flags=re.M))
    result = CliRunner().invoke(cli, ["fit", str(campaign), "--json"])
    devices = json.loads(result.stdout)["materials"]["moss_film"]["devices"]
    flagged = {f["line"]: abs(f["studentised"]) for d in devices for f in d["flags"] if f["outlier"]}
    assert max(flagged, key=lambda line: flagged[line]) == 99


def test_every_figure_of_the_plan_is_recomputed(run):
    """From plan.json alone, with the laws, tree walk and extremes of recomputed_plans.py."""
    plan = json.loads((run[0] / "tcplan-out" / "plan.json").read_text())
    chosen = next(option for option in plan["options"] if option["id"] == plan["chosen"])
    assert chosen["verdict"] == "MET"
    assert recomputed.figure(plan, recomputed.ratio_curve(plan, chosen)) == pytest.approx(
        chosen["nominal"]["figure_ppm"], rel=1e-6
    )
    worst = chosen["worst_case"]
    reached = recomputed.figure(plan, recomputed.ratio_curve(plan, chosen, worst["point"]))
    assert worst["peak_ppm"] == pytest.approx(reached, rel=1e-6)
    assert worst["upper_bound_ppm"] <= plan["limit"]["drift_ppm"]
    recomputed.check_spread_box(plan)


def test_the_devices_that_were_made_stay_within_the_plan(run):
    """200 lots of the generator's own films, not of the fit: all within the worst case of the plan."""
    plan = json.loads((run[0] / "tcplan-out" / "plan.json").read_text())
    chosen = next(option for option in plan["options"] if option["id"] == plan["chosen"])
    noise, materials = (
        film_campaign.noise_of("more lots"),
        read_materials(run[0] / "examples/film_campaign/fitted/materials.toml"),
    )
    names = sorted({leg["material"] for leg in chosen["legs"]})
    for _ in range(200):
        device = {}
        for name in names:
            film, own = film_campaign.FILMS[name], materials[name]
            percent = noise(film.sheet_lot_percent)
            tc1 = film.tc1_ppm + film.tc1_per_percent * percent + noise(film.tc1_lot_ppm)
            sheet = film.sheet_ohm * (1.0 + (percent + noise(film.sheet_device_percent)) / 100.0)
            device[name] = {
                "ohm_per_square": sheet / own.ohm_per_square,
                "tc1": tc1 + noise(film.tc1_device_ppm) - own.law.coefficients[0] * 1e6,
                "tc2": film.tc2_ppm + noise(film.tc2_device_ppm) - own.law.coefficients[1] * 1e6,
            }
        curve = recomputed.ratio_curve(plan, chosen, device)
        span = plan["range"]
        ends = np.linspace(span["low_degC"], span["high_degC"], 56)
        drift = max(abs(curve(t) - 1.0) for t in ends) * 1e6
        assert drift <= chosen["worst_case"]["upper_bound_ppm"]
