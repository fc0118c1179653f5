"""``tcplan coefficients``: every form in and out, uncertainties in every notation, tables, refusals."""

from __future__ import annotations

import json
import re
import shlex
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from tcplan.cli.coefficient_input import uncertain
from tcplan.cli.main import cli
from tcplan.errors import InputError

ROOT = Path(__file__).parents[2]
DOCUMENT = (ROOT / "docs" / "coefficients.md").read_text(encoding="utf-8")
COMMANDS = re.findall(r"^```text output\n\$ tcplan (.*?)\n\n(.*?)^```$", DOCUMENT, re.M | re.S)


def invoke(*arguments: str) -> Result:
    return CliRunner().invoke(cli, ["coefficients", *arguments])


def data(*arguments: str) -> dict:
    result = invoke(*arguments, "--json")
    assert result.exit_code == 0, result.output
    return json.loads(result.stdout)


def test_the_document_has_an_example_of_each_form() -> None:
    whole = " ".join(command for command, _ in COMMANDS)
    for name in ("--tc1", "--cold-tcr", "--peak", "--box-tcr", "--point"):
        assert name in whole


@pytest.mark.parametrize(("command", "printed"), COMMANDS, ids=lambda text: text[:30])
def test_the_examples_of_the_document(command: str, printed: str) -> None:
    name, *arguments = shlex.split(command.replace("\\\n", " "))
    assert name == "coefficients"
    assert invoke(*arguments).stdout == printed


# --- uncertainties ----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "text",
    [
        "-120 +- 6 ppm/K",
        "-120+-6 ppm/K",
        "-120 ppm/K +- 6 ppm/K",
        "(-120 +- 6) ppm/K",
        "-120 ppm/K +- 5 %",
        "-120 +/- 6 ppm/K",
        "-120 \u00b1 6 ppm/K",
        "-120 ppm/K +- 6e-6 1/K",
        "\u2212120 ppm/K +- 0.0006 %/K",
    ],
)
def test_notations_of_an_uncertainty(text: str) -> None:
    read = uncertain(text, "1/K", "--tc1")
    assert (read.value, read.uncertainty) == pytest.approx((-120e-6, 6e-6), rel=1e-12)


def test_an_uncertainty_of_a_temperature_is_a_difference() -> None:
    for text in ("45 +- 2 degC", "45 degC +- 2 K", "(45 +- 2) degC"):
        read = uncertain(text, "K", "--peak")
        assert (read.value, read.uncertainty) == (318.15, 2.0)


def test_a_number_without_one_has_none() -> None:
    assert uncertain("5 ppm/K", "1/K", "").uncertainty is None
    assert uncertain("5 +- 0 ppm/K", "1/K", "").uncertainty == 0.0


@pytest.mark.parametrize(
    "text",
    ["5 +- -1 ppm/K", "5 +- 1 +- 1 ppm/K", "5 +- ppm/K", "+- 5 ppm/K", "5 +- 1", "5 +- 1 K", "(5 +- 1"],
)
def test_what_is_no_uncertainty(text: str) -> None:
    with pytest.raises(InputError, match="--tc1"):
        uncertain(text, "1/K", "--tc1")


def test_a_correlation_is_carried() -> None:
    # var(TC1 + 100 K TC2) = 5^2 + 100^2 0.02^2 + 2 r 5 2 ppm^2/K^2; r = -0.5: 25 + 4 - 10
    given = ["--tc1=-120 +- 5 ppm/K", "--tc2=0.55 +- 0.02 ppm/K^2", "--hot=125 degC"]
    assert data(*given, "--correlation", "-0.5")["chords"][0]["u_ppm_per_K"] == pytest.approx(19**0.5)
    assert data(*given)["chords"][0]["u_ppm_per_K"] == pytest.approx(29**0.5)
    assert data(*given)["correlation"] == 0.0


def test_digits_follow_the_uncertainty() -> None:
    shown = invoke("--tc1", "-120.123456 +- 5.123 ppm/K").stdout
    assert re.search(r"^TC1 at 25 degC +-120\.1 \+- 5\.1 ppm/K$", shown, re.M)


# --- forms --------------------------------------------------------------------------------------------


def test_chords_in_and_out_again() -> None:
    ends = ["--cold=-55 degC", "--hot=125 degC"]
    told = ["--cold-tcr=-35 +- 4 ppm/K", "--hot-tcr=30 +- 3 ppm/K", "--correlation=0.25"]
    found = data(*ends, *told)
    assert [c["tcr_ppm_per_K"] for c in found["chords"]] == pytest.approx([-35, 30], rel=1e-12)
    assert [c["u_ppm_per_K"] for c in found["chords"]] == pytest.approx([4, 3], rel=1e-12)
    assert found["chord_correlation"] == pytest.approx(0.25, rel=1e-9)


def test_a_peak_in_and_out_again() -> None:
    found = data("--peak", "45 +- 2 degC", "--tc2", "-0.04 +- 0.002 ppm/K^2", "--reference", "20 degC")
    # about the peak R is 1 - 0.04e-6 * 25^2 at 20 degC, its slope -2 * 0.04e-6 * (-25)
    assert found["tc1_ppm_per_K"] == pytest.approx(2.0 / (1 - 25e-6), rel=1e-12)
    assert found["peak"]["at_degC"] == pytest.approx(45.0, rel=1e-12)
    assert found["peak"]["tc2_ppm_per_K2"] == pytest.approx(-0.04, rel=1e-12)
    assert found["peak"]["u_at_K"] == pytest.approx(2.0, rel=1e-9)
    assert found["peak"]["u_tc2_ppm_per_K2"] == pytest.approx(0.002, rel=1e-9)


def test_a_table_out_and_in_again() -> None:
    given = ["--tc1=-120 ppm/K", "--tc2=0.55 ppm/K^2"]
    at = ["-55 degC", "60 degC", "125 degC"]
    ratios = data(*given, *(word for t in at for word in ("--at", t)))["ratios"]
    points = [w for r in ratios for w in ("--point", f"{r['at_degC']!r} degC: {r['ratio']!r} kohm")]
    found = data(*points)
    assert found["tc1_ppm_per_K"] == pytest.approx(-120, rel=1e-12)
    assert found["tc2_ppm_per_K2"] == pytest.approx(0.55, rel=1e-12)
    assert found["table"]["ohms"] == pytest.approx(1000.0, rel=1e-12)
    assert found["table"]["dof"] == 0


def test_a_table_from_a_file(tmp_path: Path) -> None:
    path = tmp_path / "table.txt"
    path.write_text(
        "# invented\r\n-40 degC : 993.2 ohm +- 0.1 ohm\r\n\r\n25 degC, 1000.2 +- 0.1 ohm # here\r\n"
        "85 degC;1.011 kohm +- 0.01 %\n125 degC\t1k02 +- 0.1 ohm\n",
        encoding="utf-8-sig",
    )
    found = data("--table", str(path), "--to", "20 degC")
    assert [p["ohms"] for p in found["table"]["points"]] == [993.2, 1000.2, 1011.0, 1020.0]
    assert found["table"]["points"][2]["u_ohms"] == pytest.approx(0.1011)
    assert found["reference_degC"] == 20.0
    assert found["u_tc1_ppm_per_K"] > 0


def test_the_largest_residual_is_said() -> None:
    ohms = (1000.0, 1001.0, 1000.0, 1001.0)
    points = [f"{25 * n} degC: {r} ohm" for n, r in enumerate(ohms)]
    given = [word for p in points for word in ("--point", p)]
    # of four points evenly spaced a quadratic leaves the third difference times (-1, 3, -3, 1)/20
    left = [4 * k / 20 for k in (-1, 3, -3, 1)]
    expected = [off / (r - off) * 1e6 for r, off in zip(ohms, left, strict=True)]
    found = data(*given)["table"]["points"]
    assert [p["residual_ppm"] for p in found] == pytest.approx(expected, rel=1e-9)
    assert re.search(r"^largest residual +600 ppm at 25 degC$", invoke(*given).stdout, re.M)


def test_a_box_tcr_leaves_a_range_open() -> None:
    found = data("--box-tcr", "25 ppm/K", "--cold", "-55 degC", "--hot", "125 degC", "--at", "25 degC")
    # least band of b x^2 over a span s: b s^2/4 (Chebyshev), so |TC2| <= 4 * 25/180
    assert found["tc2_ppm_per_K2"] == pytest.approx([-5 / 9, 5 / 9], rel=1e-12)
    assert [c["to_degC"] for c in found["chords"]] == [-55.0, 125.0, 25.0]
    # the chord to the reference itself is the slope there: TC1
    assert found["chords"][2]["tcr_ppm_per_K"] == found["tc1_ppm_per_K"]
    assert found["u_box_tcr_ppm_per_K"] is None


# --- refusals -------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        (["--tc1", "1 ppm/K", "--peak", "45 degC"], "--tc1 and --peak together"),
        (["--peak", "45 degC"], "no --tc2"),
        (["--box-tcr", "25 ppm/K"], "no --cold, --hot"),
        (["--box-tcr", "25 ppm/K", "--cold", "0 degC", "--hot", "70 degC", "--to", "20 degC"], "no --to"),
        (["--box-tcr", "25 ppm/K", "--cold", "70 degC", "--hot", "0 degC"], "lower temperature first"),
        (["--box-tcr", "25 ppm/K", "--tc2", "1 ppm/K^2"], "--box-tcr and --tc2 together"),
        (["--point", "25 degC"], "a temperature and a resistance"),
        (["--point", "25 degC: 1 kohm"], "1 different temperatures"),
        (["--point", "25 degC: 1 kohm", "--tc1", "1 ppm/K"], "--tc1 and --point together"),
        (["--table", "nowhere.txt"], "no such file"),
        (["--tc1", "1 ppm/K", "--correlation", "0.5"], "two coefficients with their uncertainties"),
        (["--tc1", "1 +- 1 ppm/K", "--tc2", "1 +- 1 ppm/K^2", "--correlation", "nan"], "from -1 to 1"),
        (["--tc1", "1 +- 1e300 ppm/K", "--hot", "85 degC"], "range of floats"),
        (["--tc1", "1 ppm/K", "--at", "hot"], "--at"),
        (["--tc1", "1 ppm/K", "--reference", "25 +- 1 degC"], "--reference"),
        (["--tc1", "1 ppm/K", "--tc2", "x", "--at", "y"], "2 mistakes"),
    ],
)
def test_wrong_input_is_told(arguments: list[str], told: str) -> None:
    result = invoke(*arguments)
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    assert told in result.stderr


def test_points_with_and_without_uncertainty_do_not_mix() -> None:
    points = ["0 degC: 1 kohm +- 1 ohm", "25 degC: 1 kohm", "50 degC: 1 kohm +- 1 ohm"]
    result = invoke(*(word for p in points for word in ("--point", p)))
    assert result.exit_code == 2
    assert "uncertainties at 2 of 3 points" in result.stderr
