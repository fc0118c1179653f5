"""Printing: results on stdout, talk on stderr, nothing raw that could steer a terminal."""

from __future__ import annotations

import json
import os
import re
import shutil
import sys
from typing import Any

import click

from tcplan.errors import OutputError, Problem

WIDEST, NARROWEST = 80, 40
_STYLE = re.compile(r"(\x1b\[[0-9]{1,2}m)")


def say(text: str) -> None:
    """Print a result on stdout; what a reader that has gone away misses is no fault."""
    _send(_harmless(text).encode(_encoding(), "backslashreplace") + b"\n")


def say_json(data: Any) -> None:
    """Print data as JSON on stdout."""
    say_json_text(json.dumps(data, indent=2, ensure_ascii=False, allow_nan=False) + "\n")


def say_json_text(text: str) -> None:
    """Print JSON text on stdout, in UTF-8 whatever the terminal is."""
    _send(text.encode())


def complain(text: str) -> None:
    """Print talk on stderr, one line, without control characters."""
    try:
        click.echo(_harmless(" ".join(text.split("\n"))), err=True)
    except OSError:  # nobody is left to be told
        return


def colourful() -> bool:
    """Whether stdout is a terminal that wants colour; NO_COLOR is honoured."""
    plain = os.environ.get("NO_COLOR") or os.environ.get("TERM") == "dumb"
    return sys.stdout.isatty() and not plain


def width() -> int:
    """Return the columns to print in: at most 80, and 80 where nothing is known."""
    return max(NARROWEST, min(WIDEST, shutil.get_terminal_size((WIDEST, 24)).columns))


def _harmless(text: str) -> str:
    """Return text with every control character escaped, but line ends and, on a terminal, styles."""
    pieces = _STYLE.split(text) if colourful() else [text]
    return "".join(piece if n % 2 else _escaped(piece) for n, piece in enumerate(pieces))


def _escaped(text: str) -> str:
    return "".join(mark if mark.isprintable() or mark == "\n" else repr(mark)[1:-1] for mark in text)


def _encoding() -> str:
    return sys.stdout.encoding or "utf-8"


def _send(content: bytes) -> None:
    try:
        sys.stdout.buffer.write(content)
        sys.stdout.buffer.flush()
    except BrokenPipeError:
        _let_go()
    except OSError as fault:
        _let_go()
        raise OutputError(
            Problem(
                where="standard output",
                found=f"a place that cannot be written ({fault.strerror})",
                expected="a terminal, a pipe or a file with room left",
            )
        ) from fault


def _let_go() -> None:
    """Point stdout at nothing, so that Python's own flush at the end finds no fault."""
    nothing = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nothing, sys.stdout.fileno())
    os.close(nothing)
