"""The HTML spec sheet: valid, closed, readable by all, and harmless whatever the user wrote."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from pathlib import Path
from xml.etree.ElementTree import Element

import html5lib  # the parsing algorithm of the HTML standard, errors included
import pytest
from makers import BRIEF, FILMS, brief
from markdown_it import MarkdownIt

from tcplan.errors import InputError
from tcplan.figures.files import figure_files
from tcplan.plan import Plan, plan_json
from tcplan.spec.html import inline_svg, spec_html
from tcplan.spec.markdown import spec_markdown
from tcplan.spec.mix_csv import mix_csv
from tcplan.spec.spec import Cell, Column, Picture, Section, Spec, Table, Words
from tcplan.spec.spec_json import spec_json
from tcplan.workflow.planning import make_plan
from tcplan.workflow.specs import make_spec, spec_files

SVG = "{http://www.w3.org/2000/svg}"
HOSTILE = (
    "<script>window.hit=1</script> \" onload='x' \"><img src=x onerror=hit()> | `c` ]]> --> {{ 7*7 }} "
    "&lt; =1+1"
)
BODY = "{http://www.w3.org/1999/xhtml}"


@pytest.fixture(scope="module")
def plan() -> Plan:
    films = FILMS.replace('source = "invented"', f"source = '''{HOSTILE}'''\nlabel = '''{HOSTILE}'''", 1)
    return make_plan(brief(BRIEF.replace('"Test resistor"', f"'''{HOSTILE}'''") + films))


@pytest.fixture(scope="module")
def page(plan: Plan) -> str:
    return spec_files(make_spec(plan), figure_files(plan))["spec.html"].decode()


@pytest.fixture(scope="module")
def tree(page: str) -> Element:
    return html5lib.HTMLParser(strict=True).parse(page)


def named(tree: Element, *names: str) -> list[Element]:
    return [node for node in tree.iter() if node.tag in {f"{BODY}{name}" for name in names}]


# --- valid and closed -----------------------------------------------------------------------------


def test_it_parses_without_one_error_of_the_html_standard(page: str) -> None:
    html5lib.HTMLParser(strict=True).parse(page)  # raises at the first error
    assert page.startswith("<!DOCTYPE html>")


def test_a_parser_that_finds_no_error_would_find_one() -> None:
    with pytest.raises(html5lib.html5parser.ParseError):
        html5lib.HTMLParser(strict=True).parse("<!DOCTYPE html><title>x</title><p id=a id=b>x</div>")


def test_it_has_no_address_but_the_name_space_of_svg(page: str) -> None:
    assert set(re.findall(r"""\b[a-z]+://[^"'\s<)]*""", page)) == {"http://www.w3.org/2000/svg"}
    assert not re.search(r"@import|\burl\((?!#)", page)


def test_it_has_no_script_and_forbids_any(tree: Element) -> None:
    assert not named(tree, "script", "iframe", "object", "embed", "link", "img", "base", "form")
    assert not [key for node in tree.iter() for key in node.attrib if str(key).casefold().startswith("on")]
    policies = [
        node.get("content")
        for node in named(tree, "meta")
        if node.get("http-equiv") == "Content-Security-Policy"
    ]
    assert policies == ["default-src 'none'; style-src 'unsafe-inline'"]


def test_every_link_and_label_leads_to_one_element(page: str, tree: Element) -> None:
    ids = [node.get("id") for node in tree.iter() if node.get("id")]
    assert len(ids) == len(set(ids))
    links = [node.get("href") for node in tree.iter() if node.get("href")]
    labels = [name for node in tree.iter() for name in (node.get("aria-labelledby") or "").split()]
    masks = re.findall(r"url\(#([^)]+)\)", page)
    assert {link[0] for link in links if link} == {"#"}
    assert {*(link[1:] for link in links if link), *labels, *masks} <= set(ids)
    assert len(links) > 12


# --- readable by all ------------------------------------------------------------------------------


def test_headings_are_in_order_and_the_page_has_a_language_and_a_title(tree: Element) -> None:
    levels = [int(node.tag[-1]) for node in named(tree, "h1", "h2", "h3", "h4")]
    assert levels == [1] + [2] * 12
    root = next(tree.iter(f"{BODY}html"))
    assert root.get("lang") == "en"
    assert [node.text for node in named(tree, "title")] == [f"{HOSTILE}: spec sheet"]
    assert len(named(tree, "main")) == 1


def test_tables_have_captions_and_scopes_and_scroll_by_the_keyboard(tree: Element) -> None:
    tables = named(tree, "table")
    assert len(tables) > 8
    for table in tables:
        (caption,) = named(table, "caption")
        assert caption.text
        assert {node.get("scope") for node in named(table, "th")} == {"col", "row"}
        for row in named(table, "tr")[1:]:
            assert next(node.get("scope") for node in row) == "row"
    regions = [node for node in named(tree, "div") if "scroll" in (node.get("class") or "")]
    assert all((node.get("role"), node.get("tabindex")) == ("region", "0") for node in regions)
    assert all(node.get("aria-label") for node in regions)


def test_figures_have_a_role_and_words(plan: Plan, tree: Element) -> None:
    drawn = list(tree.iter(f"{SVG}svg"))
    pictures = [b for s in make_spec(plan).sections for b in s.blocks if isinstance(b, Picture)]
    assert len(drawn) == len(pictures) == 4
    for svg, picture in zip(drawn, pictures, strict=True):
        assert svg.get("role") == "img"
        assert [node.text for node in svg.iter(f"{SVG}desc")] == [picture.alt]


def colours(page: str) -> list[dict[str, str]]:
    """Return the colours of the light and of the dark page."""
    blocks = re.findall(r":root \{([^}]*)\}", page)
    return [dict(re.findall(r"--(\w+): (#[0-9a-f]{6})", block)) for block in blocks]


def luminance(colour: str) -> float:
    """Return the relative luminance of WCAG 2.1."""
    parts = [int(colour[n : n + 2], 16) / 255.0 for n in (1, 3, 5)]
    linear = [p / 12.92 if p <= 0.03928 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    high, low = sorted((luminance(one), luminance(other)), reverse=True)
    return (high + 0.05) / (low + 0.05)


def test_colours_have_the_contrast_of_wcag_aa(page: str) -> None:
    """WCAG 2.1, 1.4.3: text 4.5 to 1; what marks the focus, 1.4.11, 3 to 1. White on black is 21."""
    assert contrast("#ffffff", "#000000") == pytest.approx(21.0)
    light, dark = colours(page)
    assert set(light) == set(dark)
    for palette in (light, dark):
        for name in ("ink", "soft", "link", "met", "failed", "open", "none"):
            assert contrast(palette[name], palette["page"]) >= 4.5, name
        for name in ("ink", "soft"):
            assert contrast(palette[name], palette["tint"]) >= 4.5, name
    assert contrast(light["page"], dark["page"]) > 10.0


# --- harmless -------------------------------------------------------------------------------------


def text_of(node: Element) -> str:
    return "".join(node.itertext())


def test_hostile_text_is_read_as_it_was_written(tree: Element) -> None:
    (body,) = named(tree, "body")
    assert text_of(body).count(HOSTILE) == 3  # title, label, source
    (heading,) = named(tree, "h1")
    assert heading.text == HOSTILE


def test_what_reorders_text_is_refused_where_it_is_read() -> None:
    for mark in ("\u202e", "\u2066", "\u200f", "\n"):
        films = FILMS.replace('source = "invented"', f'source = "a{mark!s}b"'.replace("\n", "\\n"), 1)
        with pytest.raises(InputError, match="printable"):
            make_plan(brief(BRIEF + films))


def parts_of(text: str) -> Iterator[Spec]:
    table = Table(
        caption=text, head=(Column(title=text),), rows=((Cell(text=text, code=True),), (Cell(text=text),))
    )
    blocks = (Words(text=text, strong=True), table, Picture(name="a", alt=text, caption=text))
    yield Spec(
        title=text, headline=text, verdict="MET", sections=(Section(key="k", title=text, blocks=blocks),)
    )


@pytest.mark.parametrize(
    "text",
    [
        HOSTILE,
        "</title></style><svg onload=x>",
        "a\nb\n\n# c",
        "\u202eabc",
        "=cmd()",
        "-->",
        "&amp;",
        "`a`|`b`",
        "<!-- ",
        "\u05d0\u05d1 12",
    ],
)
def test_no_text_becomes_markup_in_any_form(text: str) -> None:
    for spec in parts_of(text):
        page = spec_html(spec, {"a": f"<svg width='1pt'><title>t</title><desc>d</desc><!-- {'x'} --></svg>"})
        tree = html5lib.HTMLParser(strict=True).parse(page)
        assert not named(tree, "script", "img")
        assert not [node for node in tree.iter(f"{SVG}svg") if node.get("onload")]
        assert [text_of(node) for node in named(tree, "h1")] == [text]
        assert {text_of(node) for node in named(tree, "td", "th")} == {text}
        html = MarkdownIt("commonmark", {"html": True}).enable("table").render(spec_markdown(spec))
        assert not re.search(r"<(script|svg|a)\b", html)
        assert html.count("<h1>") == html.count("<table>") == 1
        assert html.count("<h2>") == 1
        assert len(re.findall("<td>", html)) == 2
        assert json.loads(spec_json(spec))["title"] == text


def test_a_name_in_the_table_of_the_mix_is_no_formula(plan: Plan) -> None:
    cells = [cell for line in mix_csv(plan).splitlines() for cell in line.split(",")]
    assert not [cell for cell in cells if cell.startswith(("=", "@"))]


# --- the drawings ---------------------------------------------------------------------------------


def test_a_drawing_gets_names_of_its_own(plan: Plan) -> None:
    text = figure_files(plan)["drift.svg"].decode()
    picture = Picture(name="drift", alt='a "b" <c>', caption="x")
    own = inline_svg(text, picture)
    assert not own.startswith("<?xml")
    assert "<!--" not in own
    assert "<style" not in own
    assert "xlink" not in own
    assert 'style="stroke-linejoin: round; stroke-linecap: butt"' in own
    assert "a &quot;b&quot; &lt;c&gt;</desc>" in own
    assert all(name.startswith("drift-") for name in re.findall(r'\bid="([^"]*)"', own))
    before, after = (len(re.findall(r"<(?:path|use|g)\b", each)) for each in (text, own))
    assert before == after


def test_without_its_drawing_a_picture_is_told_in_words(plan: Plan) -> None:
    page = spec_html(make_spec(plan), {})
    html5lib.HTMLParser(strict=True).parse(page)
    assert "<svg" not in page
    assert "Schematic" in page


def test_the_same_plan_gives_the_same_bytes_and_no_date(plan: Plan, page: str, tmp_path: Path) -> None:
    from tcplan.plan_file import read_plan

    again = read_plan(plan_json(plan))
    assert spec_files(make_spec(again), figure_files(again))["spec.html"].decode() == page
    (body,) = named(html5lib.HTMLParser(strict=True).parse(page), "body")
    assert not re.search(r"\b(19|20)[0-9]{2}-[0-9]{2}-[0-9]{2}\b", text_of(body))
