"""The HTML spec sheet: one file that needs nothing else, made to be printed; every text is escaped."""

from __future__ import annotations

import html
import re
from collections.abc import Mapping
from importlib import resources

from tcplan.spec.spec import Picture, Spec

WIDE = 400.0  # points; wider drawings scroll on a narrow screen, so that their text stays legible
_VERDICTS = {"MET": "met", "NOT MET": "failed", "NOT JUDGED": "open"}
_STYLE = re.compile(r"<defs>\s*<style[^>]*>\*\{([^{}]*)\}</style>\s*</defs>")
_NAMES = re.compile(r'(\bid="|(?:xlink:)?href="#|url\(#)')


def spec_html(spec: Spec, figures: Mapping[str, str]) -> str:
    """Return a spec sheet as one HTML file.

    Parameters
    ----------
    spec : Spec
    figures : mapping of str to str
        SVG text by the name of the picture, as the figures of a plan are written; a picture without one is
        told by its words.

    Returns
    -------
    str
        Without a script, and without an address but the name space of SVG.
    """
    from jinja2 import Environment, StrictUndefined
    from markupsafe import Markup

    environment = Environment(
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    drawn = {
        block.name: Markup(inline_svg(figures[block.name], block))
        for section in spec.sections
        for block in section.blocks
        if isinstance(block, Picture) and block.name in figures
    }
    template = resources.files("tcplan.spec").joinpath("templates", "spec.html.j2")
    return environment.from_string(template.read_text(encoding="utf-8")).render(
        spec=spec, drawn=drawn, mark=_VERDICTS.get(spec.verdict, "none")
    )


def inline_svg(text: str, picture: Picture) -> str:
    """Return SVG fit to stand in HTML: names of its own, its title and its words tied to it.

    Parameters
    ----------
    text : str
        A whole SVG file with a title and a description, from this program's figures.
    picture : Picture
        Whose name goes before every id, and whose ``alt`` takes the place of the description.

    Notes
    -----
    The style sheet of the drawing would hold for the whole page: it becomes the style of its root.
    """
    name = re.sub(r"[^a-z0-9]", "-", picture.name.casefold())
    body = text[text.index("<svg") :]
    body = re.sub(r"<!--.*?-->", "", body, flags=re.DOTALL)
    style = match[1] if (match := _STYLE.search(body)) else ""
    body = _STYLE.sub("", body, count=1)
    body = _NAMES.sub(lambda found: f"{found[1].replace('xlink:', '')}{name}-", body)
    words = f'<desc id="{name}-words">{html.escape(picture.alt)}</desc>'
    body = re.sub(r"<desc>.*?</desc>", lambda _: words, body, count=1, flags=re.DOTALL)
    body = body.replace("<title>", f'<title id="{name}-title">', 1)
    end = body.index(">")
    return _root(body[:end], name, style) + body[end:].rstrip()


def _root(tag: str, name: str, style: str) -> str:
    """Return the opening of the drawing, with its role, what names it and its style."""
    kept = re.sub(r'\s(?:xmlns:xlink|version)="[^"]*"', "", tag)
    width = re.search(r'\swidth="([0-9.]+)pt"', kept)
    size = "wide" if width is not None and float(width[1]) > WIDE else "small"
    named = f'role="img" aria-labelledby="{name}-title {name}-words"'
    return f'{kept} class="{size}" {named} style="{html.escape(style)}"'
