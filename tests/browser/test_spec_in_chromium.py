"""The HTML spec sheet in a real browser: on a phone, on a desk, on paper, and with hostile text.

Not among the tests that run by default, as it needs Chromium: ``python -m pytest tests/browser``.
"""

from __future__ import annotations

import re
import struct
from collections.abc import Iterator
from pathlib import Path

import pytest
from chromium import Chromium
from makers import BRIEF, FILMS, brief

from tcplan.brief import read_brief
from tcplan.figures.files import figure_files
from tcplan.plan import Plan
from tcplan.workflow.planning import make_plan
from tcplan.workflow.specs import make_spec, spec_files

EXAMPLES = Path(__file__).parents[2] / "examples"
HOSTILE = (
    "<script>window.hit=1</script><img src=x onerror='hit=1'>"
    '"><svg onload="hit=1"><style>*{display:none}</style> --></title>'
)
PAPERS = {"A4": (8.27, 11.69), "Letter": (8.5, 11.0)}  # inches, ISO 216 and ANSI A


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Chromium]:
    opened = Chromium(tmp_path_factory.mktemp("chromium"))
    yield opened
    opened.close()


def written(plan: Plan, folder: Path) -> Path:
    path = folder / "spec.html"
    path.write_bytes(spec_files(make_spec(plan), figure_files(plan))["spec.html"])
    return path


@pytest.fixture(scope="module")
def page(tmp_path_factory: pytest.TempPathFactory) -> Path:
    plan = make_plan(read_brief(EXAMPLES / "brake_sensor_films" / "brief.toml"))
    return written(plan, tmp_path_factory.mktemp("page"))


@pytest.fixture(scope="module")
def long_names(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A page with the longest names that a materials file may have, and hostile labels and sources."""
    films = FILMS.replace("material.pp", f"material.{'p' * 40}").replace(
        "material.np", f"material.{'n' * 40}"
    )
    films = films.replace('source = "invented"', f"source = '''{HOSTILE}'''\nlabel = '''{HOSTILE}'''", 1)
    films = films.replace('source = "invented"', f'source = "{"y" * 150}"\nlabel = "{"x" * 90}"', 1)
    plan = make_plan(brief(BRIEF.replace('"Test resistor"', f"'''{HOSTILE}'''") + films))
    return written(plan, tmp_path_factory.mktemp("long"))


def troubles(browser: Chromium) -> list[object]:
    """Return what the page complained of: errors, warnings and exceptions."""
    methods = ("Log.entryAdded", "Runtime.exceptionThrown", "Runtime.consoleAPICalled")
    return [event for event in browser.events if event["method"] in methods]


def requests(browser: Chromium) -> set[str]:
    return {
        event["params"]["request"]["url"].split("#")[0]
        for event in browser.events
        if event["method"] == "Network.requestWillBeSent"
    }


@pytest.mark.parametrize("width", [400, 1200])
def test_it_fits_the_window_and_asks_for_nothing(browser: Chromium, page: Path, width: int) -> None:
    browser.sized(width)
    browser.open(page)
    assert troubles(browser) == []
    assert requests(browser) == {page.as_uri()}
    assert (
        browser.value("document.documentElement.scrollWidth") <= browser.value("window.innerWidth") == width
    )
    png = browser.picture()
    assert struct.unpack(">2I", png[16:24]) == (width, 900)  # PNG, 11.2.2: width and height
    assert len(png) > 20_000


@pytest.mark.parametrize("width", [400, 1200])
def test_long_and_hostile_names_fit_too_and_run_nothing(
    browser: Chromium, long_names: Path, width: int
) -> None:
    browser.sized(width)
    browser.open(long_names)
    assert browser.value("typeof window.hit") == "undefined"
    assert browser.value("document.scripts.length + document.images.length") == 0
    assert browser.value("getComputedStyle(document.body).display") == "block"
    assert browser.value("document.querySelector('h1').textContent") == HOSTILE
    assert requests(browser) == {long_names.as_uri()}
    assert troubles(browser) == []
    assert browser.value("document.documentElement.scrollWidth") <= width


def test_this_browser_would_run_a_script(browser: Chromium, tmp_path: Path) -> None:
    """Else the tests above could not fail."""
    path = tmp_path / "page.html"
    path.write_text(f"<!DOCTYPE html><title>x</title>{HOSTILE.split('<style>')[0]}")
    browser.open(path)
    assert browser.value("window.hit") == 1
    assert len(requests(browser)) == 2


def test_every_region_that_scrolls_is_reached_by_the_keyboard(browser: Chromium, page: Path) -> None:
    browser.sized(400)
    browser.open(page)
    lost = (
        "[...document.querySelectorAll('.scroll,pre')].filter(e => (e.focus(), document.activeElement !== e))"
    )
    assert browser.value(f"{lost}.length") == 0
    assert browser.value("[...document.querySelectorAll('.scroll')].some(e => e.scrollWidth > e.clientWidth)")


def test_it_is_dark_where_that_is_asked_for(browser: Chromium, page: Path) -> None:
    colour = "getComputedStyle(document.documentElement).getPropertyValue('--page').trim()"
    browser.open(page)
    found = []
    for scheme in ("light", "dark"):
        browser.media(scheme=scheme)
        found.append(
            (browser.value(colour), browser.value("getComputedStyle(document.body).backgroundColor"))
        )
    browser.media()
    assert found == [("#ffffff", "rgb(255, 255, 255)"), ("#14181d", "rgb(20, 24, 29)")]


@pytest.mark.parametrize("paper", PAPERS)
def test_it_is_printed_on_the_expected_pages(browser: Chromium, page: Path, paper: str) -> None:
    browser.open(page)
    pdf = browser.printed(*PAPERS[paper])
    pages = re.findall(rb"/Type\s*/Page\b", pdf)
    assert len(pages) in (7, 8, 9)  # 8 with the fonts of Debian; wider ones take a page more
    width, height = (72.0 * inches for inches in PAPERS[paper])
    boxes = {tuple(map(float, box.split())) for box in re.findall(rb"/MediaBox \[([^]]*)\]", pdf)}
    for box in boxes:
        assert box == pytest.approx((0.0, 0.0, width, height), abs=1.0)


@pytest.mark.parametrize("which", ["page", "long_names"])
def test_no_table_is_wider_than_the_paper(
    browser: Chromium, which: str, request: pytest.FixtureRequest
) -> None:
    browser.sized(680)  # px of 180 mm, what the margins leave of A4, the narrower one
    browser.open(request.getfixturevalue(which))
    browser.media("print")
    wide = (
        "[...document.querySelectorAll('table,svg,pre,p')].filter(e => e.getBoundingClientRect().right > 681)"
    )
    assert browser.value(f"{wide}.map(e => e.textContent.slice(0, 40))") == []
    assert browser.value("getComputedStyle(document.querySelector('nav')).display") == "none"
    assert browser.value("getComputedStyle(document.querySelector('tbody tr')).breakInside") == "avoid"
    browser.media()
