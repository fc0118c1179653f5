"""The API reference: a static site from the docstrings, built offline by one command.

    python tests/docs/api_site.py FOLDER

builds it into FOLDER and checks it: every internal link and anchor has to lead somewhere. Needs the extra
``docs``. The command line is left out: ``tcplan --help`` is its reference.
"""

from __future__ import annotations

import sys
from html import escape
from html.parser import HTMLParser
from importlib import import_module
from pathlib import Path
from urllib.parse import unquote, urlsplit

import pdoc
import pdoc.render

PAGES = (
    "tcplan",
    "tcplan.errors",
    "tcplan.units",
    "tcplan.preferred",
    "tcplan.ranges",
    "tcplan.material.model",
    "tcplan.material.law",
    "tcplan.material.polynomial",
    "tcplan.material.laws_physical",
    "tcplan.material.law_table",
    "tcplan.material.law_expression",
    "tcplan.material.spread",
    "tcplan.material.files",
    "tcplan.process",
    "tcplan.network",
    "tcplan.drift",
    "tcplan.goal",
    "tcplan.brief",
    "tcplan.plan",
    "tcplan.plan_file",
    "tcplan.made",
    "tcplan.draws",
    "tcplan.operating",
    "tcplan.ratio.check",
    "tcplan.verify.option",
    "tcplan.budget",
    "tcplan.parts",
    "tcplan.measure.model",
    "tcplan.measure.reading",
    "tcplan.measure.fit",
    "tcplan.measure.compare",
    "tcplan.measure.comparison",
    "tcplan.measure.parameter_lines",
    "tcplan.workflow.planning",
    "tcplan.workflow.budgeting",
    "tcplan.workflow.making",
    "tcplan.workflow.fitting",
    "tcplan.workflow.comparing",
    "tcplan.workflow.ratio",
    "tcplan.workflow.conversions",
    "tcplan.workflow.delivery",
)
"""Modules with a page: what a program calls. ``tcplan.network_reading`` comes along with ``tcplan``."""

_INDEX = """<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>tcplan: reference of the Python functions</title>
<style>body {{ font: 1rem/1.5 sans-serif; max-width: 50rem; margin: 2rem auto; padding: 0 1rem; }}</style>
</head>
<body>
<h1>tcplan: reference of the Python functions</h1>
<ul>
{rows}
</ul>
</body>
</html>
"""


def build(folder: Path) -> list[Path]:
    """Write the site into ``folder`` and return its pages; ``index.html`` lists the others."""
    pdoc.render.configure(docformat="numpy", show_source=False)
    pdoc.pdoc(*PAGES, output_directory=folder)
    pages = [path for path in sorted(folder.rglob("*.html")) if path != folder / "index.html"]
    rows = "\n".join(_row(path.relative_to(folder).as_posix()) for path in pages)
    (folder / "index.html").write_text(_INDEX.format(rows=rows), encoding="utf-8")
    return [folder / "index.html", *pages]


def _row(page: str) -> str:
    """Return the entry of a page in the index: its module and the first line of its docstring."""
    name = page.removesuffix(".html").replace("/", ".")
    first = (import_module(name).__doc__ or "").partition("\n")[0]
    return f'<li><a href="{page}">{name}</a>: {escape(first)}</li>'


class _Page(HTMLParser):
    """What a page offers as anchors, and where its links lead."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.anchors: set[str] = set()
        self.links: list[str] = []
        self.feed(text)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        for name, value in attrs:
            if value and (name == "id" or (tag == "a" and name == "name")):
                self.anchors.add(value)
            if value and name in ("href", "src"):
                self.links.append(value)


def broken_links(folder: Path) -> list[str]:
    """Return the internal links of a site that lead nowhere, each with the page that holds it."""
    pages = {
        path: _Page(path.read_text(encoding="utf-8")) for path in sorted(folder.resolve().rglob("*.html"))
    }
    return [
        f"{path.relative_to(folder.resolve())}: {link}"
        for path, page in pages.items()
        for link in page.links
        if not _leads_somewhere(path, link, pages)
    ]


def _leads_somewhere(path: Path, link: str, pages: dict[Path, _Page]) -> bool:
    parts = urlsplit(link)
    if parts.scheme or parts.netloc:
        return True  # of another site, or data inside the page
    target = (path.parent / unquote(parts.path)).resolve() if parts.path else path
    anchor = unquote(parts.fragment)
    if target not in pages:
        return target.is_file() and not anchor
    return not anchor or anchor in pages[target].anchors


def main(folder: str) -> int:
    """Build and check; the exit code is 1 where a link is broken."""
    pages = build(Path(folder))
    broken = broken_links(Path(folder))
    print(f"{len(pages)} pages in {folder}, {len(broken)} broken links")
    for line in broken:
        print(line, file=sys.stderr)
    return 1 if broken else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1]))
