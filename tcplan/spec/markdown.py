"""The Markdown spec sheet: every text is escaped unless it is Markdown already."""

from __future__ import annotations

import re
from collections.abc import Iterator

from tcplan.spec.spec import Block, Cell, Code, Picture, Points, Spec, Table

_SPECIAL = re.compile(r"([\\`*_\[\]|#~$!])")
_ENTITIES = str.maketrans({"&": "&amp;", "<": "&lt;", ">": "&gt;"})
_LIST_MARK = re.compile(r"^([-+]|[0-9]+[.)])(?=\s|$)")


class Markdown(str):
    """Text that is Markdown already and is printed as it is."""

    __slots__ = ()


def escaped(text: object) -> Markdown:
    """Return text that Markdown and the HTML made of it show as it is, on one line."""
    if isinstance(text, Markdown):
        return text
    line = " ".join(str(text).split())
    plain = _SPECIAL.sub(r"\\\1", line.translate(_ENTITIES))
    return Markdown(_LIST_MARK.sub(lambda mark: f"{mark[1][:-1]}\\{mark[1][-1]}", plain))


def code(text: object) -> Markdown:
    """Return text as a code span, fit for a table cell too."""
    line = " ".join(str(text).split())
    return Markdown(f"{_ticks(line, 1)}{_padded(line)}{_ticks(line, 1)}")


def cell(text: object) -> Markdown:
    """Return text as a code span in a table, where a bar would end the cell."""
    return Markdown(code(text).replace("|", r"\|"))


def fenced(text: str, language: str = "") -> Markdown:
    """Return text as a block of code."""
    fence = _ticks(text, 3)
    return Markdown(f"{fence}{language}\n{text}\n{fence}")


def spec_markdown(spec: Spec) -> str:
    """Return a spec sheet as Markdown.

    Parameters
    ----------
    spec : Spec

    Returns
    -------
    str
        With relative links to the figures, which lie beside it as SVG.
    """
    return "\n\n".join([f"# {escaped(spec.title)}", *_body(spec)]) + "\n"


def _body(spec: Spec) -> Iterator[str]:
    for section in spec.sections:
        yield f"## {escaped(section.title)}"
        for block in section.blocks:
            yield _block(block)


def _block(block: Block) -> str:
    if isinstance(block, Table):
        return _table(block)
    if isinstance(block, Picture):
        return f"![{escaped(block.alt)}]({block.name}.svg)\n\n{escaped(block.caption)}"
    if isinstance(block, Points):
        return "\n".join(f"- {escaped(item)}" for item in block.items)
    if isinstance(block, Code):
        return fenced(block.text, block.language)
    return f"**{escaped(block.text)}**" if block.strong else escaped(block.text)


def _table(table: Table) -> str:
    """Return a table under its caption."""
    head = " | ".join(escaped(column.title) for column in table.head)
    rule = " | ".join("---:" if column.numeric else "---" for column in table.head)
    rows = [" | ".join(map(_cell, row)) for row in table.rows]
    lines = "\n".join(f"| {row} |" for row in (head, rule, *rows))
    return f"{escaped(table.caption)}:\n\n{lines}"


def _cell(own: Cell) -> str:
    return cell(own.text) if own.code else escaped(own.text)


def _ticks(text: str, least: int) -> str:
    """Return a run of backticks that is not in the text."""
    longest = max((len(run) for run in re.findall(r"`+", text)), default=0)
    return "`" * max(least, longest + 1)


def _padded(line: str) -> str:
    return f" {line} " if not line or "`" in (line[0], line[-1]) else line
