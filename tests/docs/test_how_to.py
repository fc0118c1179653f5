"""The how-to pages: every brief in them runs, and every printed line is printed."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from doc_pages import ROOT, Player, blocks_of

PAGES = sorted((ROOT / "docs" / "how-to").glob("*.md"))
JOBS = {
    "a-ratio",
    "check-a-network",
    "chord-tcr",
    "compare",
    "new-data",
    "operating-point",
    "over-the-spread",
    "parameter-file",
    "quantile",
    "stock-parts",
    "swamp-a-coil",
    "trim",
    "unit-cells",
    "wire",
}


def test_there_is_a_page_for_every_job() -> None:
    assert {page.stem for page in PAGES} == JOBS


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.stem)
def test_the_page_is_what_happens(page: Path, tmp_path: Path) -> None:
    played = Player(folder=tmp_path).play(page.read_text(encoding="utf-8"))
    assert played.files >= 1
    assert played.commands
    assert played.outputs >= 1


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.stem)
def test_links_and_columns(page: Path) -> None:
    """As tests/docs/test_docs.py has it for the pages above this folder."""
    text = page.read_text(encoding="utf-8")
    targets = re.findall(r"\]\(([^)#]+)\)", text)
    assert targets
    assert all((page.parent / target).is_file() for target in targets), targets
    prose = re.sub(r"^```.*?^```$", "", text, flags=re.M | re.S)
    assert max(len(line) for line in prose.splitlines()) <= 110


def test_the_index_names_every_document() -> None:
    docs = ROOT / "docs"
    index = (docs / "README.md").read_text(encoding="utf-8")
    for path in (*docs.glob("*.md"), *PAGES):
        name = path.relative_to(docs).as_posix()
        assert name == "README.md" or f"]({name})" in index, name


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.stem)
def test_the_page_has_its_parts(page: Path) -> None:
    heads = re.findall(r"^## (.*)$", page.read_text(encoding="utf-8"), re.M)
    assert heads == ["Brief", "Command", "What to read", "Pitfalls"]


@pytest.mark.parametrize(
    ("page", "problem"),
    [
        (
            "```toml brief.toml\nschema = 1\n```\n```commands\ntcplan plan brief.toml\n```\n",
            "error: brief.toml",
        ),
        ("```commands\ntcplan ranges\n```\n```output\nautomotive-7\n```\n", "not printed: automotive-7"),
        ("```python\nprint()\n```\n", "a block that is not played"),
    ],
)
def test_a_page_that_is_not_true_is_found(page: str, problem: str, tmp_path: Path) -> None:
    assert blocks_of(page)
    with pytest.raises(AssertionError, match=problem):
        Player(folder=tmp_path).play(page)
