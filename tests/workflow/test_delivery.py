"""The files of a plan: which there are, in what order, and what becomes of those of an earlier plan."""

import re
from pathlib import Path

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.errors import OutputError
from tcplan.plan import Plan
from tcplan.workflow.delivery import PLAN_FILES, write_plan
from tcplan.workflow.planning import make_plan

SPREAD_FILES = {"spread.svg", "spread.png"}
BARE = re.sub(r"\[material\.\w+\.spread\]\n(\w+ = .*\n)+", "", FILMS)


@pytest.fixture(scope="module")
def stated() -> Plan:
    return make_plan(brief(BRIEF + FILMS))


@pytest.fixture(scope="module")
def bare() -> Plan:
    return make_plan(brief(BRIEF + BARE))


def names(folder: Path) -> set[str]:
    return {path.name for path in folder.iterdir()}


def test_all_files_are_written_in_order(tmp_path: Path, stated: Plan) -> None:
    assert [path.name for path in write_plan(stated, tmp_path)] == list(PLAN_FILES)
    assert names(tmp_path) == set(PLAN_FILES)
    assert set(PLAN_FILES) > SPREAD_FILES


def test_without_a_spread_its_figure_is_not_among_them(tmp_path: Path, bare: Plan) -> None:
    written = [path.name for path in write_plan(bare, tmp_path)]
    assert written == [name for name in PLAN_FILES if name not in SPREAD_FILES]
    assert names(tmp_path) == set(written)


def test_a_figure_of_an_earlier_plan_does_not_stay_beside_this_one(
    tmp_path: Path, stated: Plan, bare: Plan
) -> None:
    write_plan(stated, tmp_path)
    (tmp_path / "notes.txt").write_text("mine")
    write_plan(bare, tmp_path, force=True)
    assert names(tmp_path) == (set(PLAN_FILES) - SPREAD_FILES) | {"notes.txt"}


def test_without_force_such_a_figure_is_in_the_way(tmp_path: Path, bare: Plan) -> None:
    (tmp_path / "spread.svg").write_text("mine")
    with pytest.raises(OutputError, match=r"spread\.svg already there"):
        write_plan(bare, tmp_path)
    assert names(tmp_path) == {"spread.svg"}


def test_a_figure_that_cannot_be_removed_is_told(
    tmp_path: Path, bare: Plan, monkeypatch: pytest.MonkeyPatch
) -> None:
    unlink = Path.unlink

    def refused(path: Path, missing_ok: bool = False) -> None:
        if path.name == "spread.svg":
            raise PermissionError(13, "Permission denied")
        unlink(path, missing_ok=missing_ok)

    monkeypatch.setattr(Path, "unlink", refused)
    with pytest.raises(OutputError, match=r"spread\.svg.*Permission denied"):
        write_plan(bare, tmp_path, force=True)
