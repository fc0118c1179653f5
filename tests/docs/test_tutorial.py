"""The tutorial: its commands are run as they stand, and print what it says they print."""

from __future__ import annotations

import re

import pytest
from doc_pages import ROOT, Player

TUTORIAL = (ROOT / "docs" / "tutorial.md").read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def played(tmp_path_factory: pytest.TempPathFactory) -> Player:
    return Player(folder=tmp_path_factory.mktemp("afternoon")).play(TUTORIAL)


def test_every_command_prints_what_the_page_says(played: Player) -> None:
    assert [command.split()[1] for command in played.commands if command.startswith("tcplan")] == [
        "fit",
        "plan",
        "plan",
        "budget",
        "parts",
        "compare",
    ]
    assert played.outputs > 20


def test_the_files_that_are_named_are_there(played: Player) -> None:
    """Names in the prose with one of the folders of the commands in front."""
    named = re.findall(r"`((?:fitted|out|made|first)/[\w.-]+)`", TUTORIAL)
    assert {"fitted/materials.toml", "out/spec.html", "made/parts.csv", "made/placement.svg"} <= set(named)
    for name in named:
        assert (played.folder / name).is_file(), name


def test_the_amber_film_makes_more_than_half_of_the_total() -> None:
    """What the text says of the account, from the figures that it prints: 2890 of 5210 ppm."""
    spread = re.search(r"^TC1 spread +spread +\+(\d+)", TUTORIAL, re.M)
    total = re.search(r"^total +\+(\d+)", TUTORIAL, re.M)
    assert spread is not None
    assert total is not None
    assert int(spread[1]) > 0.5 * int(total[1])
