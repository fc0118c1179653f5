"""Text in columns for a terminal: paragraphs after a label, and verdicts in their colour."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable

import click

COLOURS = {"MET": "green", "NOT MET": "red", "NOT JUDGED": "yellow"}


def wrapped(text: str, width: int, first: str = "", rest: str = "") -> list[str]:
    """Return text in lines of at most ``width`` columns, after ``first`` and then ``rest``."""
    return textwrap.wrap(
        text, width, initial_indent=first, subsequent_indent=rest, break_on_hyphens=False
    ) or [first.rstrip()]


def labelled(label: str, texts: Iterable[str], width: int, column: int) -> list[str]:
    """Return texts after a label in a column of its own; nothing when there are none."""
    lines: list[str] = []
    for text in texts:
        if text:
            first = label if not lines else ""
            lines.extend(wrapped(text, width, first.ljust(column), " " * column))
    return lines


def coloured(verdict: str, *, colour: bool) -> str:
    """Return a verdict in its colour, where colour is wanted."""
    return click.style(verdict, fg=COLOURS[verdict]) if colour and verdict in COLOURS else verdict
