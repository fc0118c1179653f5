"""The files of a made plan and of a made ratio: which there are, whole or not at all, never over others."""

from __future__ import annotations

import csv
import io
import json
from dataclasses import replace
from pathlib import Path

import pytest

from tcplan.brief import parse_brief
from tcplan.errors import OutputError
from tcplan.parts.record import MadePlan, MadeRatio
from tcplan.plan import plan_json
from tcplan.plan_file import read_plan
from tcplan.workflow.made_files import (
    PARTS_FILES,
    RATIO_PARTS_FILES,
    check_out,
    list_text,
    ratio_parts_json,
    write_list,
    write_parts,
    write_ratio_parts,
)
from tcplan.workflow.made_ratio import make_ratio_parts
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan

HEAD = """
schema = 1
title = "Invented resistor"
[temperature]
low = "-40 degC"
high = "125 degC"
reference = "25 degC"
[goal]
drift = "9000 ppm"
judge = "worst-case"
"""
SLATE = """
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
"""
OCHRE = """
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
TRIM = """
[trim]
method = "one-temperature"
step = "0.5 %"
switch_resistance = "100 ohm"
"""


def made_of(network: str, more: str, value: str = "12 kohm") -> MadePlan:
    text = f'{HEAD}[resistor]\nvalue = "{value}"\n[given]\nnetwork = "{network}"\n{more}'
    return make_parts(make_plan(parse_brief(text, "brief.toml", Path())), PartsRules())


@pytest.fixture(scope="module")
def trimmed() -> MadePlan:
    return made_of("slate 8 kohm + ochre 4 kohm", TRIM + SLATE + OCHRE)


@pytest.fixture(scope="module")
def bought() -> MadePlan:
    return made_of("flat 12 kohm", FLAT)


@pytest.fixture(scope="module")
def ratio() -> MadeRatio:
    text = HEAD + '[ratio]\nkind = "gain"\nfirst = "ochre 9 kohm"\nsecond = "ochre 3 kohm"\n' + OCHRE
    return make_ratio_parts(parse_brief(text, "brief.toml", Path()), PartsRules())


@pytest.fixture(scope="module")
def bought_ratio() -> MadeRatio:
    text = HEAD + '[ratio]\nkind = "gain"\nfirst = "flat 9 kohm"\nsecond = "flat 1 kohm"\n' + FLAT
    return make_ratio_parts(parse_brief(text, "brief.toml", Path()), PartsRules())


def names(folder: Path) -> list[str]:
    return sorted(path.name for path in folder.iterdir())


def refuse(name: str) -> None:
    raise AssertionError(name)


# --- which files there are -------------------------------------------------------------------------------


def test_films_with_a_trim_have_all_files_in_their_order(trimmed: MadePlan, tmp_path: Path) -> None:
    folder = tmp_path / "new" / "made"
    paths = write_parts(trimmed, folder)
    assert paths == tuple(folder / name for name in PARTS_FILES)
    assert names(folder) == sorted(PARTS_FILES)
    for path in paths:
        start = path.read_bytes()[:200]
        if path.suffix == ".png":  # PNG specification, W3C, 5.2: the signature of a file
            assert start.startswith(b"\x89PNG\r\n\x1a\n")
        elif path.suffix == ".svg":
            assert b"<svg" in path.read_bytes()[:2000]
    codes = list(csv.DictReader(io.StringIO((folder / "trim-codes.csv").read_text(encoding="utf-8"))))
    assert len(codes) > 2


def test_without_films_there_is_no_figure(bought: MadePlan, tmp_path: Path) -> None:
    write_parts(bought, tmp_path)
    assert names(tmp_path) == ["parts.csv", "plan.json", "spec.html"]


def test_one_way_to_draw_it_is_no_trade(trimmed: MadePlan, tmp_path: Path) -> None:
    write_parts(replace(trimmed, ways=trimmed.ways[:1], way=trimmed.ways[0], trims=()), tmp_path)
    assert names(tmp_path) == ["parts.csv", "placement.png", "placement.svg", "plan.json", "spec.html"]


def test_the_plan_that_is_written_is_read_again_as_it_is(trimmed: MadePlan, tmp_path: Path) -> None:
    write_parts(trimmed, tmp_path)
    text = (tmp_path / "plan.json").read_text(encoding="utf-8")
    json.loads(text, parse_constant=refuse)  # no NaN, no infinity
    again = read_plan(text)
    assert again.parts is not None
    assert again.parts.made == trimmed.parts.made
    assert again.parts.option == trimmed.ideal.id
    assert plan_json(again) == text


def test_a_ratio_has_its_own_files(ratio: MadeRatio, bought_ratio: MadeRatio, tmp_path: Path) -> None:
    assert write_ratio_parts(ratio, tmp_path / "a") == tuple(tmp_path / "a" / n for n in RATIO_PARTS_FILES)
    assert names(tmp_path / "a") == sorted(RATIO_PARTS_FILES)
    write_ratio_parts(bought_ratio, tmp_path / "b")
    assert names(tmp_path / "b") == ["parts.csv", "ratio.json"]
    data = json.loads((tmp_path / "a" / "ratio.json").read_text(encoding="utf-8"), parse_constant=refuse)
    assert data == json.loads(ratio_parts_json(ratio))
    rows = list(csv.DictReader(io.StringIO((tmp_path / "a" / "parts.csv").read_text(encoding="utf-8"))))
    assert [row["resistor"] for row in rows] == ["first", "second"]
    for row, side in zip(rows, ("first", "second"), strict=True):
        assert float(row["ohms"]) == data["parts"][side][0]["ohms"]


# --- never over others, all or none ----------------------------------------------------------------------


def test_a_file_in_the_way_stops_all_of_them(bought: MadePlan, tmp_path: Path) -> None:
    (tmp_path / "parts.csv").write_text("mine")
    with pytest.raises(OutputError, match=r"parts\.csv already there.*--force"):
        write_parts(bought, tmp_path)
    assert names(tmp_path) == ["parts.csv"]
    assert (tmp_path / "parts.csv").read_text() == "mine"


def test_a_file_that_these_parts_do_not_have_is_in_the_way_too(bought: MadePlan, tmp_path: Path) -> None:
    """A trade figure of other parts beside these would pass for theirs."""
    (tmp_path / "trade.svg").write_text("of others")
    with pytest.raises(OutputError, match=r"trade\.svg"):
        write_parts(bought, tmp_path)
    assert names(tmp_path) == ["trade.svg"]


def test_force_replaces_them_and_leaves_nothing_of_earlier_parts(
    trimmed: MadePlan, bought: MadePlan, tmp_path: Path
) -> None:
    write_parts(trimmed, tmp_path)
    (tmp_path / "notes.txt").write_text("mine")
    write_parts(bought, tmp_path, force=True)
    assert names(tmp_path) == ["notes.txt", "parts.csv", "plan.json", "spec.html"]
    assert "slate" not in (tmp_path / "plan.json").read_text()


def test_force_leaves_nothing_of_an_earlier_ratio(
    ratio: MadeRatio, bought_ratio: MadeRatio, tmp_path: Path
) -> None:
    write_ratio_parts(ratio, tmp_path)
    with pytest.raises(OutputError):
        write_ratio_parts(bought_ratio, tmp_path)
    write_ratio_parts(bought_ratio, tmp_path, force=True)
    assert names(tmp_path) == ["parts.csv", "ratio.json"]


def test_a_folder_in_the_way_stops_all_of_them_even_with_force(
    bought: MadePlan, ratio: MadeRatio, tmp_path: Path
) -> None:
    (tmp_path / "parts.csv").mkdir()
    for write, made in ((write_parts, bought), (write_ratio_parts, ratio)):
        with pytest.raises(OutputError, match="a folder by the name"):
            write(made, tmp_path, force=True)  # type: ignore[operator]
    assert names(tmp_path) == ["parts.csv"]


def test_a_fault_half_way_leaves_what_was_there(
    bought: MadePlan, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The second file cannot take its name, as on a full disk: the first is taken back."""
    for name in ("plan.json", "parts.csv"):
        (tmp_path / name).write_text(f"old {name}")
    rename = Path.rename

    def full(self: Path, target: Path) -> Path:
        if Path(target).name == "parts.csv" and "kept" not in self.name:
            raise OSError(28, "No space left on device")
        return rename(self, target)

    monkeypatch.setattr(Path, "rename", full)
    with pytest.raises(OutputError, match="No space left"):
        write_parts(bought, tmp_path, force=True)
    monkeypatch.undo()
    assert "plan.json" in names(tmp_path)
    assert (tmp_path / "plan.json").read_text() == "old plan.json"


# --- the resistor list -----------------------------------------------------------------------------------


def test_the_list_has_a_block_for_each_value() -> None:
    given = '[given]\nscaled = true\nnetwork = "ochre 12 kohm"\n'
    text = f'{HEAD}[resistor]\nvalue = ["12 kohm", "24 kohm"]\n{given}{OCHRE}'
    made = make_parts(make_plan(parse_brief(text, "brief.toml", Path())), PartsRules())
    lines = list_text(made).splitlines()
    starts = [line for line in lines if line.startswith(".subckt")]
    assert len(starts) == len([line for line in lines if line.startswith(".ends")]) == 2
    assert len(set(starts)) == 2  # two blocks of one name could not be read together
    values = [float(line.split()[3]) for line in lines if line.startswith("R1 ")]
    assert values == pytest.approx([12e3, 24e3], rel=1e-3)


def test_the_list_holds_ends_and_is_never_written_over(trimmed: MadePlan, tmp_path: Path) -> None:
    path = tmp_path / "r.cir"
    assert write_list(trimmed, path) == path
    text = path.read_text(encoding="ascii")
    assert text == list_text(trimmed)
    own = trimmed.parts.made[0].legs
    values = [float(line.split()[3]) for line in text.splitlines() if line.startswith("R")]
    slate, ochre = own
    parts = [slate.unit.body_ohms, slate.unit.ends_ohms]
    by_hand = [one * slate.in_series / slate.in_parallel for one in parts] + [ochre.ohms]
    assert values == pytest.approx(by_hand, rel=1e-11)
    with pytest.raises(OutputError, match="already there"):
        write_list(trimmed, path)
    write_list(trimmed, path, force=True)


def test_what_cannot_be_written_is_told_before_the_work(tmp_path: Path) -> None:
    there = tmp_path / "r.cir"
    there.write_text("mine")
    with pytest.raises(OutputError, match=r"r\.cir already there"):
        check_out(None, PARTS_FILES, str(there), force=False)
    check_out(None, PARTS_FILES, str(there), force=True)
    with pytest.raises(OutputError, match=r"r\.cir"):
        check_out(str(there), PARTS_FILES, force=True)  # a file where the folder should be
    (tmp_path / "plan.json").write_text("mine")
    with pytest.raises(OutputError, match=r"plan\.json already there"):
        check_out(str(tmp_path), PARTS_FILES, force=False)
    check_out(str(tmp_path / "new"), PARTS_FILES, str(tmp_path / "new" / "r.cir"), force=False)
    assert names(tmp_path) == ["plan.json", "r.cir"]


@pytest.mark.parametrize("name", ["plan.json", "../made/parts.csv", "trim-codes.csv"])
def test_a_list_by_the_name_of_another_file_is_refused(tmp_path: Path, name: str) -> None:
    folder = tmp_path / "made"
    with pytest.raises(OutputError, match="--list"):
        check_out(str(folder), PARTS_FILES, str(folder / name), force=True)
    with pytest.raises(OutputError, match="--list"):
        check_out(None, PARTS_FILES, "", force=True)
    assert names(tmp_path) == []
