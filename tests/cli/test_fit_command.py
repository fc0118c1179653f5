"""``tcplan fit``: options, bad input, screens, and what it writes is read by what follows."""

from __future__ import annotations

import io
import json
from pathlib import Path

import openpyxl
import pytest
from campaigns import NINE, sweep_text
from click.testing import CliRunner, Result

from tcplan.cli.main import cli
from tcplan.material.files import read_materials

SOURCE = ("--source", "run 12")


@pytest.fixture(autouse=True)
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLUMNS", raising=False)
    return tmp_path


def fit(content: str | bytes, *options: str, name: str = "film.csv", source: bool = True) -> Result:
    Path(name).write_bytes(content.encode() if isinstance(content, str) else content)
    return CliRunner().invoke(cli, ["fit", name, *(SOURCE if source else ()), *options])


def data(result: Result) -> dict:
    assert result.exit_code == 0, result.output
    [one] = json.loads(result.stdout)["materials"].values()
    return one


def refused(result: Result, *told: str) -> None:
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    lines = result.stderr.splitlines()
    assert all(line.startswith("error: ") or line.endswith(" mistakes.") for line in lines), lines
    for words in told:
        assert words in result.stderr, (words, result.stderr)


# --- options ----------------------------------------------------------------------------------------


def test_a_sweep_is_fitted() -> None:
    result = fit(sweep_text(3, 2))
    assert result.exit_code == 0
    assert result.stdout.startswith("film: 54 readings of 6 devices of 3 lots, -55 degC to 140 degC\n")
    assert result.stderr == ""
    assert "L0/D0" in result.stdout


def test_options_reach_the_fit() -> None:
    told = data(
        fit(
            sweep_text(2, 2),
            *("--material", "red", "--order", "3", "--reference", "30 degC", "--exclude", "3, 14"),
            *("--coverage", "90 %", "--confidence", "80 %", "--json"),
        )
    )
    assert (told["reference_degC"], told["excluded_lines"]) == (30.0, [3, 14])
    assert list(told["mean"]) == ["R", "tc1", "tc2", "tc3"]
    assert (told["coverage"], told["confidence"]) == (0.9, 0.8)


def test_common_errors_widen_the_covariance_only() -> None:
    plain = data(fit(sweep_text(1, 1), "--json"))["devices"][0]
    wide = data(fit(sweep_text(1, 1), "--chamber-offset", "0.5 K", "--meter-scale", "100 ppm", "--json"))[
        "devices"
    ][0]
    assert wide["parameters"] == plain["parameters"]
    assert wide["point_covariance"] == plain["point_covariance"] == plain["covariance"]
    # a gain of 100 ppm moves R by 100 ppm, and so does an offset of 0.5 K at 350 ppm/K by 175 ppm
    more = wide["covariance"][0][0] - plain["covariance"][0][0]
    ohms = plain["parameters"]["R"]
    assert more == pytest.approx((ohms * 1e-6) ** 2 * (100**2 + 175**2), rel=0.05)


@pytest.mark.parametrize(("option", "kind"), [(("--squares", "50"), "film"), (("--length", "2 m"), "wire")])
def test_a_block_is_read_back(option: tuple[str, str], kind: str) -> None:
    result = fit(sweep_text(3, 2), *option, "--label", "A film", "--block")
    Path("m.toml").write_text(result.stdout)
    material = read_materials(Path("m.toml"))["film"]
    assert (material.kind, material.label, material.source) == (kind, "A film", "run 12")
    assert material.spread is not None
    assert material.spread.meaning == "limits"


def test_a_spread_as_sigma() -> None:
    Path("m.toml").write_text(fit(sweep_text(3, 2), "--sigma", "--block").stdout)
    assert read_materials(Path("m.toml"))["film"].spread.meaning == "sigma"


def test_a_formula_with_start_values() -> None:
    rows = "".join(f"{t},{r}\n" for t, r in ((0, 28704), (25, 10000), (50, 4101), (85, 1451), (100, 987)))
    options = ("--law", "exp(B*(1/T - 1/T0))", "--start", "B=3000")
    told = data(fit(f"T [degC],R [ohm]\n{rows}", *options, "--json"))
    assert told["mean"]["B"]["value"] == pytest.approx(3435.0, abs=2.0)  # IEC 60539-1 table of CHECKS 13


def test_standard_input() -> None:
    arguments = ["fit", "-", *SOURCE]
    result = CliRunner().invoke(cli, arguments, input=sweep_text(1, 2))
    assert result.exit_code == 0
    assert result.stdout.startswith("sweep: 18 readings")
    empty = CliRunner().invoke(cli, arguments, input="")
    refused(empty, "standard input: found no text")


def test_a_workbook() -> None:
    book = openpyxl.Workbook()
    for line in sweep_text(1, 2).splitlines():
        cells = line.split(",")
        book.active.append([float(c) if c[-1].isdigit() and c[0] not in "DL" else c for c in cells])
    content = io.BytesIO()
    book.save(content)
    result = fit(content.getvalue(), name="film.xlsx")
    assert result.exit_code == 0, result.output
    assert result.stdout == fit(sweep_text(1, 2)).stdout
    piped = CliRunner().invoke(cli, ["fit", "-", *SOURCE], input=content.getvalue())
    assert piped.stdout.startswith("sweep: 18 readings")


# --- what is wrong with the options -----------------------------------------------------------------

WRONG = {
    "no source": ((), "--source: found nothing"),
    "a source of two lines": (("--source", "a\nb"), "--source: found"),
    "a name": ((*SOURCE, "--material", "a b"), "--material: found the material name 'a b'"),
    "an order": ((*SOURCE, "--order", "4"), "--order: found"),
    "an order of another law": ((*SOURCE, "--order", "2", "--model", "thermistor"), "--order: found"),
    "squares": ((*SOURCE, "--squares", "0"), "--squares: found"),
    "squares that are infinite": ((*SOURCE, "--squares", "inf"), "--squares: found"),
    "both sizes": ((*SOURCE, "--squares", "5", "--length", "1 m"), "--length: found squares and a length"),
    "a length": ((*SOURCE, "--length", "1 ohm"), "--length: found"),
    "lines": ((*SOURCE, "--exclude", "2;3"), "--exclude: found '2;3'"),
    "a range of lines": ((*SOURCE, "--exclude", "2-3"), "such as 12,40; ranges are not known"),
    "no lines": ((*SOURCE, "--exclude", ""), "--exclude: found"),
    "a line without a reading": ((*SOURCE, "--exclude", "1,7"), "film.csv: found line 1 to exclude"),
    "a start": ((*SOURCE, "--law", "B*T", "--start", "B"), "--start: found 'B'"),
    "a start without a law": ((*SOURCE, "--start", "B=1"), "--start: found start values without a law"),
    "a start of nan": ((*SOURCE, "--law", "B*T", "--start", "B=nan"), "--start: found"),
    "a law": ((*SOURCE, "--law", "__import__('os')"), "--law: found"),
    "a law and a model": ((*SOURCE, "--law", "T", "--model", "platinum"), "--law: found a law beside"),
    "a reference": ((*SOURCE, "--reference", "25"), "--reference: found '25'"),
    "a reference far off": ((*SOURCE, "--reference", "400 degC"), "reference: found 400 degC"),
    "a coverage": ((*SOURCE, "--coverage", "100 %"), "--coverage: found"),
    "a confidence": ((*SOURCE, "--confidence", "10 %"), "--confidence: found"),
    "an error": ((*SOURCE, "--lead", "-1 ohm"), "--lead: found '-1 ohm'"),
    "an error without a unit": ((*SOURCE, "--chamber-offset", "1"), "--chamber-offset: found '1'"),
    "two forms": ((*SOURCE, "--json", "--block"), "found --json and --block"),
}


@pytest.mark.parametrize("case", WRONG)
def test_wrong_options_are_told_as_options(case: str) -> None:
    options, words = WRONG[case]
    refused(fit(sweep_text(1, 1), *options, source=False), words)


def test_several_wrong_options_are_told_at_once() -> None:
    result = fit(sweep_text(1, 1), "--order", "9", "--coverage", "x", "--length", "1 K")
    refused(result, "--order", "--coverage", "--length", "3 mistakes.")


# --- what is wrong with the readings ----------------------------------------------------------------

BAD = {
    "fewer than coefficients": (
        "T [degC],R [ohm]\n25,1000\n50,1001\n",
        ("--order", "2"),
        "distinct temperatures",
    ),
    "too few to show scatter": ("T [degC],R [ohm]\n25,1000\n50,1001\n", ("--order", "1"), "without u(R)"),
    "one temperature": (
        "T [degC],R [ohm]\n" + "25,1000\n" * 6,
        (),
        "all readings at one temperature, 25 degC",
    ),
    "u(T) alone": ("T [degC],R [ohm],u(T) [K]\n25,1,0.1\n50,2,0.1\n75,3,0.1\n", (), "temperatures alone"),
    "duplicate headers": ("T [degC],R [ohm],R [kohm]\n25,1,1\n", (), "found 2 columns of R"),
    "mixed units": ("T [degC],R [ohm]\n25,1 kohm\n50,2 kohm\n", (), "1 kohm"),
    "no unit": ("T,R [ohm]\n25,1\n", (), "column 'T': found no unit"),
    "nothing but NaN": ("T [degC],R [ohm]\n25,nan\n50,nan\n", (), "nan"),
    "zero": ("T [degC],R [ohm]\n25,0\n50,-3\n", (), "no readings among 2 rows"),
    "empty": ("", (), "no text"),
    "binary": (b"\x00\x01\x02", (), "binary"),
    "no readings": ("T [degC],R [ohm]\n", (), "no rows below the header"),
    "a device of one temperature": (sweep_text(1, 1) + "25,1,x,L0\n25,1,x,L0\n", (), "device x"),
    "a law through zero": (
        "T [degC],R [ohm]\n0,100\n10,1\n20,90\n30,1\n60,0.1\n",
        ("--order", "1"),
        "reaches zero",
    ),
    "a coil as a thermistor": (
        "T [degC],R [ohm]\n0,1\n50,2\n90,3\n",
        ("--model", "thermistor"),
        "does not fall",
    ),
}


@pytest.mark.parametrize("case", BAD)
def test_bad_readings_are_refused_in_words(case: str, folder: Path) -> None:
    content, options, words = BAD[case]
    refused(fit(content, *options, "-o", "out"), words)
    assert [path.name for path in folder.iterdir()] == ["film.csv"]


GOOD = sweep_text(1, 2)
FORMS = {
    "a byte order mark": b"\xef\xbb\xbf" + GOOD.encode(),
    "CR": GOOD.replace("\n", "\r").encode(),
    "CR LF": GOOD.replace("\n", "\r\n").encode(),
    "tabs": GOOD.replace(",", "\t").encode(),
    "decimal commas": GOOD.replace(",", ";").replace(".", ",").encode(),
}


@pytest.mark.parametrize("form", FORMS)
def test_forms_of_text_are_read_alike(form: str) -> None:
    assert fit(FORMS[form]).stdout == fit(GOOD).stdout


def test_rows_that_are_no_readings_are_told_and_the_rest_counts() -> None:
    rows = "25,nan,D0,L0\n25,=1+1,D0,L0\n=cmd|' /C calc'!A0,1,D0,L0\n25,text,D0,L0\n,,,\n25,-5,D0,L0\n"
    result = fit(GOOD + rows)
    assert result.exit_code == 0
    assert "5 rows are no readings; fit.json lists them." in result.stdout
    for line in (20, 21, 22, 23, 25):
        assert f"Line {line}: found" in result.stdout
    told = data(fit(GOOD + rows, "--json"))
    assert [row["line"] for row in told["refused"]] == [20, 21, 22, 23, 25]
    assert told["devices"] == data(fit(GOOD, "--json"))["devices"]


def test_names_that_could_steer_a_terminal_are_refused_rows() -> None:
    result = fit(GOOD + "25,1000,\x1b[31mred,L0\n")
    assert "\x1b" not in result.output
    assert "Line 20: found" in " ".join(result.stdout.split())


def test_formulas_for_names_stay_text() -> None:
    content = GOOD.replace("D0", "=SUM(A1)").replace("D1", '<script>"')
    result = fit(content, "-o", "out")
    assert result.exit_code == 0, result.output
    assert read_materials(Path("out/materials.toml"))
    for path in Path("out").glob("*.svg"):
        assert "<script" not in path.read_text()


def test_many_rows() -> None:
    rows = "".join(f"{-40 + k % 160},{1000 + k % 160 + 0.1 * (k % 7)}\n" for k in range(20_000))
    told = data(fit("T [degC],R [ohm]\n" + rows, "--json"))
    assert told["readings"] == 20_000
    assert told["mean"]["tc1"]["value"] == pytest.approx(1.0 / 1065.3, rel=1e-5)


# --- screens and files ------------------------------------------------------------------------------


@pytest.mark.parametrize("columns", ["40", "60", "80", "200"])
def test_screens_keep_to_their_width(monkeypatch: pytest.MonkeyPatch, columns: str) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    text = sweep_text(
        3, 30, names=lambda n, k: (f"lot {n}", f"a device of a rather long name {k}"), outliers=(30,)
    )
    lines = fit(text + "1,x,a,b\n").stdout.splitlines()
    assert max(len(line) for line in lines) <= min(int(columns), 80)
    assert any("kohm" in line for line in lines)


def test_the_screen_of_many_devices_is_short() -> None:
    twice = (*NINE, *NINE[::-1])
    text = sweep_text(20, 10, twice, outliers=tuple(range(40, 3000, 60)), stated=True)
    lines = fit(text).stdout.splitlines()
    assert len(lines) < 50
    assert lines[-1] == "and 188 more devices in fit.json"


def test_files_are_written_and_named() -> None:
    result = fit(sweep_text(1, 2), "-o", "out")
    names = ["materials.toml", "fit.json"]
    names += [f"film-{kind}.{end}" for kind in ("fit", "residuals", "devices") for end in ("svg", "png")]
    assert sorted(path.name for path in Path("out").iterdir()) == sorted(names)
    assert result.stderr.startswith("wrote out/materials.toml, out/fit.json")
    again = fit(sweep_text(1, 2), "-o", "out")
    refused(again, "already there", "--force")
    assert fit(sweep_text(1, 2), "-o", "out", "--force").exit_code == 0


def test_a_folder_in_the_way_is_told_before_the_fit(folder: Path) -> None:
    Path("out").write_text("mine")
    refused(
        CliRunner().invoke(cli, ["fit", "absent.csv", *SOURCE, "-o", "out"]),
        "found a file; expected a folder",
    )
    assert Path("out").read_text() == "mine"


def test_json_is_the_file() -> None:
    result = fit(sweep_text(2, 2), "-o", "out", "--json")
    assert result.stdout == Path("out/fit.json").read_text()


def test_a_missing_file_names_the_nearest() -> None:
    fit(sweep_text(1, 1))
    refused(CliRunner().invoke(cli, ["fit", "flim.csv", *SOURCE]), "no such file", "film.csv")


# --- campaigns --------------------------------------------------------------------------------------

CAMPAIGN = '[sweep.red]\nfile = "red.csv"\nsource = "x"\n[sweep.blue]\nfile = "blue.csv"\nsource = "y"\n'


@pytest.fixture
def campaign() -> str:
    Path("lab").mkdir()
    Path("lab/red.csv").write_text(sweep_text(2, 2))
    Path("lab/blue.csv").write_text(sweep_text(2, 2, seed=3))
    Path("lab/all.toml").write_text(f"schema = 1\n{CAMPAIGN}")
    return "lab/all.toml"


def test_a_campaign_is_fitted(campaign: str) -> None:
    result = CliRunner().invoke(cli, ["fit", campaign, "-o", "out"])
    assert result.exit_code == 0, result.output
    assert result.stdout.startswith("red: ")
    assert "\n\nblue: " in result.stdout
    assert list(read_materials(Path("out/materials.toml"))) == ["red", "blue"]


@pytest.mark.parametrize(
    "options", [("--order", "2"), ("--source", "x"), ("--sigma",), ("--lead", "1 ohm"), ("--start", "B=1")]
)
def test_options_of_one_sweep_are_refused_with_a_campaign(campaign: str, options: tuple[str, ...]) -> None:
    result = CliRunner().invoke(cli, ["fit", campaign, *options])
    refused(result, f"{options[0]} with a campaign", "in the file itself")


def test_every_mistake_of_a_campaign_is_told(campaign: str) -> None:
    Path(campaign).write_text(f"schema = 1\n{CAMPAIGN}ordr = 2\n[errors]\nlead = 3\n")
    refused(
        CliRunner().invoke(cli, ["fit", campaign]), "sweep.blue.ordr", "Did you mean order?", "errors.lead"
    )


def test_every_file_that_fails_is_told(campaign: str) -> None:
    Path("lab/red.csv").unlink()
    Path("lab/blue.csv").write_text("T [degC],R [ohm]\n25,1\n")
    refused(CliRunner().invoke(cli, ["fit", campaign, "-o", "out"]), "red.csv", "blue.csv", "2 mistakes.")
    assert not Path("out").exists()
