"""A finished figure as files: the same bytes every time, with words for those who do not see it."""

from __future__ import annotations

import html
import io

from matplotlib.figure import Figure

from tcplan.figures.style import PNG_DPI


def picture_files(name: str, figure: Figure, title: str, description: str) -> dict[str, bytes]:
    """Return a figure as SVG with words for those who do not see it, and as PNG, by file name.

    The SVG has no date, writer's version, or document type that points to a web address.
    """
    content, picture = io.StringIO(), io.BytesIO()
    figure.savefig(content, format="svg", metadata=dict.fromkeys(("Date", "Creator", "Format", "Type")))
    figure.savefig(picture, format="png", dpi=PNG_DPI, metadata={"Software": None})
    text = content.getvalue()
    start = text.index("<svg")
    inside = text.index(">", start) + 1
    words = f"\n <title>{html.escape(title)}</title>\n <desc>{html.escape(description)}</desc>"
    svg = f'<?xml version="1.0" encoding="utf-8"?>\n{text[start:inside]}{words}{text[inside:]}'
    return {f"{name}.svg": svg.encode(), f"{name}.png": picture.getvalue()}
