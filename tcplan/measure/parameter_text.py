"""Parameter lines as text: statements joined from their lines, without comments, cut into words and pairs."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from tcplan.errors import InputError, Problem
from tcplan.toml_input import MAX_BYTES

MOST_STATEMENTS = 50_000
LONGEST_STATEMENT = 20_000
_LINE_END = re.compile(r"\r\n|\r|\n")
_CLOSING = {"'": "'", '"': '"', "{": "}"}
_BLANK = " \t\f\v\xa0"
_APART = _BLANK + "()"
_WORD_ENDS = _BLANK + "=(),'\"{"
_VALUE_ENDS = _BLANK + ",)"


@dataclass(frozen=True, slots=True, kw_only=True)
class Statement:
    """One statement: the number of its first line, and its text without comments, on one line."""

    line: int
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Word:
    """A word of a statement; ``key`` is its name where it is "name = value", else empty.

    ``formula`` is whether the value stands in quotes or braces, which are taken off.
    """

    value: str
    key: str = ""
    formula: bool = False
    after_comma: bool = False


class NotClosed(ValueError):
    """A quote, brace or bracket without its end, or an "=" without a name or a value."""


def statements(text: str, name: str) -> tuple[Statement, ...]:
    """Return the statements of a text, in order.

    Parameters
    ----------
    text : str
        2 MB at most; any line ends. A line that begins with ``+`` goes on the statement before it; ``*``
        begins a line of comment, ``;`` a comment anywhere, ``$`` one after a blank.
    name : str
        What messages call it.

    Raises
    ------
    InputError
        When the text is too large, or holds more than 50 000 statements.
    """
    if len(text) > MAX_BYTES:
        found = f"{len(text)} characters"
        raise InputError(Problem(where=name, found=found, expected=f"{MAX_BYTES} at most"))
    joined: list[tuple[int, list[str]]] = []
    for n, raw in enumerate(_LINE_END.split(text.removeprefix("\ufeff")), 1):
        line = _without_comment(raw).strip(_BLANK)
        if not line:
            continue
        if line.startswith("+") and joined:
            joined[-1][1].append(line[1:])
        else:
            joined.append((n, [line]))
    if len(joined) > MOST_STATEMENTS:
        found = f"{len(joined)} statements"
        raise InputError(Problem(where=name, found=found, expected=f"{MOST_STATEMENTS} at most"))
    return tuple(Statement(line=n, text=" ".join(pieces)) for n, pieces in joined)


def _without_comment(line: str) -> str:
    if line.lstrip(_BLANK).startswith("*"):
        return ""
    quote = ""
    for k, mark in enumerate(line):
        if quote:
            quote = "" if mark == quote else quote
        elif mark in "'\"":
            quote = mark
        elif mark == ";" or (mark == "$" and (k == 0 or line[k - 1] in _BLANK)):
            return line[:k]
    # a quote that does not close is an apostrophe: what looks like a comment after it is one
    return re.sub(r"(?:;|(?:^|(?<=\s))\$).*$", "", line) if quote else line


def words(text: str) -> tuple[Word, ...]:
    """Return the words of a statement; brackets around words are blanks, and so are commas.

    Raises
    ------
    NotClosed
        When a quote, brace or bracket is not closed, or an "=" has no name before it or no value after it.
    """
    return tuple(_words(text))


def _words(text: str) -> Iterator[Word]:
    at, comma = 0, False
    while (at := _skipped(text, at, _APART)) < len(text):
        if text[at] == ",":
            at, comma = at + 1, True
            continue
        if text[at] == "=":
            raise NotClosed('an "=" without a name before it')
        value, formula, at = _quoted(text, at) if text[at] in _CLOSING else _plain(text, at)
        after = _skipped(text, at, _BLANK)
        if not formula and after < len(text) and text[after] == "=":
            key = value.lower()
            value, formula, at = _value(text, _skipped(text, after + 1, _BLANK))
            yield Word(key=key, value=value, formula=formula, after_comma=comma)
        else:
            yield Word(value=value, formula=formula, after_comma=comma)
        comma = False


def _skipped(text: str, at: int, marks: str) -> int:
    while at < len(text) and text[at] in marks:
        at += 1
    return at


def _quoted(text: str, at: int) -> tuple[str, bool, int]:
    end = text.find(_CLOSING[text[at]], at + 1)
    if end < 0:
        raise NotClosed(f"a {text[at]} that is not closed")
    return text[at + 1 : end], True, end + 1


def _plain(text: str, at: int) -> tuple[str, bool, int]:
    end = at
    while end < len(text) and text[end] not in _WORD_ENDS:
        end += 1
    return text[at:end], False, end


def _value(text: str, at: int) -> tuple[str, bool, int]:
    """Return the value after an "=": in quotes, or up to a blank, a comma or the end of its brackets."""
    if at >= len(text) or text[at] in ",)":
        raise NotClosed('an "=" without a value after it')
    if text[at] in _CLOSING:
        return _quoted(text, at)
    end, level = at, 0
    while end < len(text) and (level or text[end] not in _VALUE_ENDS):
        level += {"(": 1, ")": -1}.get(text[end], 0)
        end += 1
    if level:
        raise NotClosed("a ( that is not closed")
    return text[at:end], False, end
