"""Bad input: exit code 2, every mistake told in words, nothing written, no traceback."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from makers import BRIEF, FILMS

from tcplan.cli.main import cli

GOOD = BRIEF + FILMS
THERMISTOR = '\n[material.bead]\nsource = "x"\nreference = "25 degC"\nvalid = ["-60 degC", "160 degC"]\n'


@pytest.fixture(autouse=True)
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    return tmp_path


def plan(content: str | bytes, *options: str) -> Result:
    Path("brief.toml").write_bytes(content.encode() if isinstance(content, str) else content)
    return CliRunner().invoke(cli, ["plan", "brief.toml", *options])


def refused(result: Result, folder: Path, *told: str) -> None:
    """Assert that the input was refused in words that hold all of ``told``, and nothing was written."""
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    lines = result.stderr.splitlines()
    errors = [line for line in lines if line.startswith("error: ")]
    assert errors
    assert lines == errors + ([f"{len(errors)} mistakes."] if len(errors) > 1 else [])
    for line in errors:
        assert line.isprintable()
        assert re.match(r"error: .+: found .+; expected .+\.", line), line
    for words in told:
        assert words in result.stderr, (words, result.stderr)
    assert [path.name for path in folder.iterdir() if path.suffix != ".toml"] == []


def changed(old: str, new: str) -> str:
    assert old in GOOD
    return GOOD.replace(old, new, 1)


CASES = {
    "an unknown key": (changed('low = "-40 degC"', 'lwo = "-40 degC"'), ["lwo", "Did you mean low?"]),
    "an unknown material key": (changed("tc2 =", "tc_2 ="), ["tc_2", "Did you mean tc2?"]),
    "a wrong unit": (changed("18 kohm", "18 kg"), ["resistor.value", "'18 kg'", "a resistance"]),
    "a bare number": (changed('"18 kohm"', "18000"), ["resistor.value", "18000", '"18 kohm"']),
    "a number without its unit": (changed("18 kohm", "18000"), ["The unit is missing"]),
    "not a number": (changed("18 kohm", "nan ohm"), ["resistor.value", "finite number"]),
    "infinity": (changed("18 kohm", "inf ohm"), ["resistor.value", "finite number"]),
    "infinity by its exponent": (changed("18 kohm", "1e400 ohm"), ["resistor.value"]),
    "a bare nan": (changed('"18 kohm"', "nan"), ["resistor.value"]),
    "zero": (changed("18 kohm", "0 ohm"), ["resistor.value"]),
    "a value below zero": (changed("18 kohm", "-3 kohm"), ["resistor.value"]),
    "a limit of zero": (changed("6000 ppm", "0 ppm"), ["goal.drift"]),
    "a sheet resistance of zero": (changed("320 ohm", "0 ohm"), ["material.pp.ohm_per_square"]),
    "empty": ("", ["an empty file"]),
    "blank": (" \n\n", ["an empty file"]),
    "not TOML": ("value: 18 kohm\n", ["text that is not TOML", "line 1"]),
    "a key twice": (changed('value = "18 kohm"', 'value = "18 kohm"\nvalue = "1 kohm"'), ["brief.toml"]),
    "binary": (b"\x00\xff\xfe\x89PNG\r\n\x1a\n", ["not UTF-8"]),
    "binary that is UTF-8": (b"schema = 1\x00\x01", ["a binary file"]),
    "a missing materials file": (
        changed("schema = 1", 'schema = 1\nmaterials = ["none.toml"]'),
        ["none.toml", "no such file"],
    ),
    "a folder for a materials file": (
        changed("schema = 1", 'schema = 1\nmaterials = ["."]'),
        ["found a folder"],
    ),
    "a material twice": (GOOD + "[material.pp]\n", ["pp"]),
    "a material in two places": (changed("schema = 1", 'schema = 1\nmaterials = ["f.toml"]'), ["pp twice"]),
    "no source": (changed('source = "invented"\n', ""), ["material.pp.source", "found nothing"]),
    "an empty source": (changed('source = "invented"', 'source = " "'), ["material.pp.source"]),
    "the ends exchanged": (
        changed('low = "-40 degC"\nhigh = "150 degC"', 'low = "150 degC"\nhigh = "-40 degC"'),
        ["a low end below the high end"],
    ),
    "a reference outside": (changed('low = "-40 degC"', 'low = "50 degC"'), ["25 degC", "inside the range"]),
    "beyond what is valid": (
        changed('high = "150 degC"', 'high = "170 degC"'),
        ["outside the validity of pp"],
    ),
    "below absolute zero": (changed('low = "-40 degC"', 'low = "-400 degC"'), ["below absolute zero"]),
    "a law that reaches zero": (changed("-120 ppm/K", "-9000 ppm/K"), ["material.pp"]),
    "a negative law": (changed("0.55 ppm/K^2", "-400 ppm/K^2"), ["material.pp"]),
    "a spread that reaches zero": (changed("20 %", "100 %"), ["ohm_per_square"]),
    "a spread without meaning": (changed('meaning = "limits"\n', ""), ["material.pp.spread.meaning"]),
    "a call outside the list": (
        GOOD + THERMISTOR + "law = \"__import__('os').system('touch pwned')\"\n",
        ["material.bead.law"],
    ),
    "an attribute": (GOOD + THERMISTOR + 'law = "T.__class__"\n', ["material.bead.law"]),
    "a function outside the list": (GOOD + THERMISTOR + 'law = "gamma(T)"\n', ["material.bead.law", "gamma"]),
    "a tower of powers": (GOOD + THERMISTOR + 'law = "9**9**9**9**9*T"\n', ["material.bead"]),
    "an unknown grade": (
        changed('low = "-40 degC"\nhigh = "150 degC"', 'range = "automotive-9"'),
        ["automotive-9", "Did you mean automotive-"],
    ),
    "an unknown material": (GOOD + '[search]\nuse = ["ppp"]\n', ["'ppp'", "Did you mean pp?"]),
    "a network with an unknown material": (GOOD + '[given]\nnetwork = "ppp 1 kohm"\n', ["Did you mean pp?"]),
    "an ambiguous network": (GOOD + '[given]\nnetwork = "pp 1k + np 1k || pp 1k"\n', ["brackets"]),
    "an unknown published set": (
        changed("schema = 1", 'schema = 1\nmaterials = ["published:metalls"]'),
        ["Did you mean published:metals?"],
    ),
    "a later schema": (changed("schema = 1", "schema = 2"), ["schema"]),
    "nested too deeply": (GOOD + f"x = {'[' * 500}{']' * 500}\n", ["nested too deeply"]),
}


@pytest.mark.parametrize("case", CASES)
def test_it_is_refused_in_words(folder: Path, case: str) -> None:
    content, told = CASES[case]
    Path("f.toml").write_text(f"schema = 1\n{FILMS}")
    refused(plan(content), folder, *told)
    assert sorted(path.name for path in folder.iterdir()) == ["brief.toml", "f.toml"]


def test_every_mistake_is_told_at_once(folder: Path) -> None:
    text = GOOD
    wrong = {
        "18 kohm": "18 kg",
        "-40 degC": "-40 F",
        "6000 ppm": "much",
        "-120 ppm/K": "-120",
        'valid = ["-60 degC", "160 degC"]\ntc1 = "150': 'valid = ["160 degC", "-60 degC"]\ntc1 = "150',
    }
    for old, new in wrong.items():
        text = text.replace(old, new, 1)
    result = plan(text)
    refused(result, folder, "resistor.value", "temperature.low", "goal.drift", "pp.tc1", "np.valid")
    assert result.stderr.endswith("5 mistakes.\n")


def test_a_huge_file_is_refused_unread(folder: Path) -> None:
    refused(plan(b"#" * 10_000_000), folder, "10000000 bytes", "2000000 at most")


def test_a_huge_stdin_is_refused(folder: Path) -> None:
    result = CliRunner().invoke(cli, ["plan", "-"], input=b"#" * 10_000_000)
    refused(result, folder, "standard input", "2000000 at most")


@pytest.mark.parametrize("content", [b"\xff\xfe", b"", b"not toml"])
def test_a_bad_stdin_is_refused(folder: Path, content: bytes) -> None:
    refused(CliRunner().invoke(cli, ["plan", "-"], input=content), folder, "standard input")


@pytest.mark.parametrize("name", ["absent.toml", ".", "a\nb\x1b[31m.toml", "/dev/zero", "x" * 5000, "a\x00b"])
def test_a_brief_that_is_no_file(folder: Path, name: str) -> None:
    refused(CliRunner().invoke(cli, ["plan", name]), folder)


NAMES = [
    "a\\nb",
    "a,b",
    'a\\"b',
    "=SUM(A1)",
    "<script>",
    "a b",
    "a\\u001b[31m",
    "a\\u202eb",
    "",
    "x" * 41,
    "-a",
    "@a",
]


@pytest.mark.parametrize("name", NAMES)
def test_a_name_that_is_no_name_is_refused(folder: Path, name: str) -> None:
    text = GOOD.replace("[material.pp]", f'[material."{name}"]').replace(
        "[material.pp.spread]", f'[material."{name}".spread]'
    )
    refused(plan(text), folder, "a letter, then letters, digits and underscores")


@pytest.mark.parametrize("text", ["a\\nb", "a\\u001b[31mb", "a\\u202eb", "a\\rb"])
@pytest.mark.parametrize("key", ["label", "source"])
def test_text_that_could_forge_lines_is_refused(folder: Path, key: str, text: str) -> None:
    line = f'{key} = "{text}"\n' + ('source = "invented"\n' if key == "label" else "")
    refused(plan(changed('source = "invented"\n', line)), folder, f"material.pp.{key}")


def test_a_hostile_title_is_one_harmless_line(folder: Path) -> None:
    result = plan(changed("Test resistor", "=cmd|' /C calc'!A0\\n\\u001b[31m<script>,\\\"x\\\""))
    assert result.exit_code in (0, 1)
    assert "\x1b" not in result.output
    assert "<script>" not in (folder / "brief-plan" / "spec.md").read_text()
    assert "\n=cmd" not in (folder / "brief-plan" / "mix.csv").read_text()


@pytest.mark.parametrize("place", ["/proc/out", "brief.toml", "brief.toml/out", "/dev/null/out", "x" * 300])
def test_a_folder_that_cannot_be_written(folder: Path, place: str) -> None:
    refused(plan(GOOD, "-o", place), folder)
    assert [path.name for path in folder.iterdir()] == ["brief.toml"]


def test_a_folder_that_is_a_file_is_left_alone(folder: Path) -> None:
    Path("taken").write_text("mine")
    result = plan(GOOD, "-o", "taken", "--force")
    assert result.exit_code == 2
    assert "found a file; expected a folder" in result.stderr
    assert Path("taken").read_text() == "mine"
