"""The API reference: it builds without a network, holds the public names, and no link of it is broken."""

from __future__ import annotations

import shutil
import subprocess
import sys
from importlib import import_module
from pathlib import Path

import pytest
from doc_pages import ROOT

import tcplan

BUILDER = ROOT / "tests" / "docs" / "api_site.py"
OFFLINE = """
import runpy, socket, sys
def refuse(*args, **kwargs):
    raise OSError("no network here")
socket.socket.connect = socket.create_connection = socket.getaddrinfo = refuse
sys.argv = sys.argv[1:]
runpy.run_path(sys.argv[0], run_name="__main__")
"""


def command(folder: Path, *program: str) -> subprocess.CompletedProcess[str]:
    """Run the builder as the documented command does, with warnings as errors."""
    run = [sys.executable, "-W", "error", *program, str(BUILDER), str(folder)]
    return subprocess.run(run, cwd=ROOT, capture_output=True, text=True, check=False)


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return the site, built in a process that can reach no other."""
    folder = tmp_path_factory.mktemp("reference") / "site"
    done = command(folder, "-c", OFFLINE)
    assert done.returncode == 0, done.stdout + done.stderr
    assert done.stdout.endswith("0 broken links\n")
    return folder


def builder():
    """Return the module of the builder, which is no part of the package."""
    sys.path.insert(0, str(BUILDER.parent))
    try:
        return import_module("api_site")
    finally:
        sys.path.remove(str(BUILDER.parent))


def test_every_public_name_is_there(site: Path) -> None:
    page = (site / "tcplan.html").read_text(encoding="utf-8")
    for name in tcplan.__all__:
        own = f'id="{name}"' in page
        assert own or (site / "tcplan" / f"{name}.html").is_file(), name


def test_the_index_names_every_page(site: Path) -> None:
    index = (site / "index.html").read_text(encoding="utf-8")
    pages = [path for path in site.rglob("*.html") if path.name != "index.html"]
    assert len(pages) > 30
    for path in pages:
        assert f'href="{path.relative_to(site).as_posix()}"' in index


def test_docstrings_are_shown_with_their_sections(site: Path) -> None:
    page = (site / "tcplan" / "units.html").read_text(encoding="utf-8")
    start = page.index('id="parse_quantity"')
    section = page[start : page.index("</section>", start)]
    for head in ("Parameters", "Returns", "Raises", "References", "Examples"):
        assert f">{head}</h6>" in section
    assert "-0.00012" in section


def test_nothing_is_loaded_from_elsewhere(site: Path) -> None:
    """Only what a reader clicks may lead out: no script, style or picture of another host."""
    for path in site.rglob("*.html"):
        page = path.read_text(encoding="utf-8")
        for mark in ('src="http', 'src="//', '<link rel="stylesheet" href="http', "@import url(http"):
            assert mark not in page, path.name


@pytest.mark.parametrize(
    ("wrong", "link"),
    [
        ('<a href="tcplan/absent.html">x</a>', "tcplan/absent.html"),
        ('<a href="tcplan/units.html#no_such_name">x</a>', "tcplan/units.html#no_such_name"),
        ('<a href="#nowhere">x</a>', "#nowhere"),
        ('<img src="absent.png">', "absent.png"),
    ],
)
def test_a_broken_link_is_found(site: Path, tmp_path: Path, wrong: str, link: str) -> None:
    copy = tmp_path / "site"
    shutil.copytree(site, copy)
    page = copy / "index.html"
    page.write_text(page.read_text(encoding="utf-8").replace("</ul>", f"</ul>{wrong}"), encoding="utf-8")
    assert builder().broken_links(copy) == [f"index.html: {link}"]


def test_links_that_lead_somewhere_are_not_found(tmp_path: Path) -> None:
    (tmp_path / "a.html").write_text(
        '<p id="here"><a href="b.html#there">x</a><a href="https://x.y">x</a></p>'
    )
    (tmp_path / "b.html").write_text('<a name="there" href="a.html#here">x</a><a href="data.bin">x</a>')
    (tmp_path / "data.bin").write_bytes(b"0")
    assert builder().broken_links(tmp_path) == []
