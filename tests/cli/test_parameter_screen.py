"""``tcplan materials`` with parameter lines: the document's example, the block, JSON, refusals."""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from tcplan.cli.main import cli
from tcplan.material.files import read_materials

ROOT = Path(__file__).parents[2]
DOCUMENT = (ROOT / "docs" / "parameter-lines.md").read_text(encoding="utf-8")
[LIBRARY] = re.findall(r"^```text file\n(.*?)^```$", DOCUMENT, re.M | re.S)
[PRINTED] = re.findall(r"^```text output\n(.*?)^```$", DOCUMENT, re.M | re.S)


def invoke(*arguments: str) -> Result:
    return CliRunner().invoke(cli, ["materials", *arguments])


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLUMNS", raising=False)
    (tmp_path / "films.lib").write_text(LIBRARY, encoding="utf-8")
    return tmp_path


def test_the_example_of_the_document(folder: Path) -> None:
    assert invoke("films.lib").stdout == PRINTED


@pytest.mark.parametrize("name", ["x.LIB", "x.mod", "x.cir", "x.sp", "x.spi"])
def test_names_that_are_taken_as_parameter_lines(folder: Path, name: str) -> None:
    (folder / name).write_text(LIBRARY)
    assert invoke(name).stdout == PRINTED.replace("films.lib", name)


def test_any_name_with_the_option(folder: Path) -> None:
    (folder / "films.txt").write_text(LIBRARY)
    assert invoke("films.txt", "--lines").stdout == PRINTED.replace("films.lib", "films.txt")
    assert invoke("films.txt").exit_code == 2


def test_the_block_is_a_materials_file(folder: Path) -> None:
    result = invoke("films.lib", "--block", "--valid", "-55 degC", "150 degC")
    assert result.exit_code == 0
    (folder / "films.toml").write_text(result.stdout)
    found = read_materials(folder / "films.toml")
    assert list(found) == ["red_film", "blue_film", "R2"]
    assert found["red_film"].valid == (218.15, 423.15)
    assert found["red_film"].ohm_per_square == 384.0
    assert "line 3: " in result.stderr
    assert "agauss()" in result.stderr


def test_json_holds_everything(folder: Path) -> None:
    data = json.loads(invoke("films.lib", "--json").stdout)
    assert (data["nominal_degC"], data["nominal_assumed"]) == (25.0, False)
    assert [(r["name"], r["ohms"], r["material"]) for r in data["resistors"]] == [
        ("R1", 12e3, "red_film"),
        ("R2", 1e-3, "R2"),
    ]
    assert data["materials"]["blue_film"]["law"]["reference_degC"] == 27.0
    assert [u["line"] for u in data["unread"]] == [3, 4, 6]
    assert data["valid_degC"] == [-40.0, 125.0]


def test_a_long_list_is_cut_on_the_screen(folder: Path) -> None:
    (folder / "long.lib").write_text("R1 a b 1k tc1=1m\n" + "C1 a b 1p\n" * 40)
    assert "  and 10 more; --json lists them all" in invoke("long.lib").stdout
    assert len(json.loads(invoke("long.lib", "--json").stdout)["unread"]) == 40


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        (["nowhere.lib"], "no such file"),
        (["empty.lib"], "no law of a resistor"),
        (["latin.lib"], "expected text in UTF-8"),
        (["films.lib", "--valid", "150 degC", "0 degC"], "--valid: found 150 degC to 0 degC"),
        (["films.lib", "--valid", "cold", "hot"], "--valid"),
        (["films.lib", "--json", "--block"], "choose one"),
        (["--lines"], "needs a FILE"),
        (["films.toml", "--block"], "add --lines"),
        (["published:metals", "--valid", "0 degC", "1 degC"], "add --lines"),
    ],
)
def test_wrong_use_is_told(folder: Path, arguments: list[str], told: str) -> None:
    (folder / "empty.lib").write_text("* nothing\nR1 a b 1k\n")
    (folder / "latin.lib").write_bytes(b"* 5 \xb5m\n")
    result = invoke(*arguments)
    assert result.exit_code == 2
    assert result.stdout == ""
    assert told in result.stderr
