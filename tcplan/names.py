"""Text for messages: the nearest known name, and found text cut short and made harmless."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

_LONGEST_NAME = 100


def nearest_name(name: str, known: Iterable[str]) -> str | None:
    """Return the known name that ``name`` was most likely meant to be, whatever its case.

    Parameters
    ----------
    name : str
        The name as it was found.
    known : iterable of str
        The names that would have been right; the first wins a tie.

    Returns
    -------
    str or None
        A member of ``known``, or None when nothing is close.
    """
    if len(name) > _LONGEST_NAME:  # the comparison takes time quadratic in the length
        return None
    by_folded: dict[str, str] = {}
    for candidate in known:
        by_folded.setdefault(candidate.casefold(), candidate)
    close = difflib.get_close_matches(name.casefold(), by_folded, n=1)
    return by_folded[close[0]] if close else None


def shown(text: object, limit: int = 60) -> str:
    """Return the repr of what was found, on one line, without control characters, cut to a limit.

    Parameters
    ----------
    text : object
        What was found in the input; any type.
    limit : int
        The greatest number of characters to return.

    Returns
    -------
    str
        Text that is safe to print on a terminal; ``...`` marks a cut.
    """
    # The text is cut before its repr, as an input can be megabytes long.
    whole = repr(str(text[: limit + 1])) if isinstance(text, str) else _one_line(text)
    return whole if len(whole) <= limit else f"{whole[: max(limit - 3, 0)]}..."[:limit]


def _one_line(value: object) -> str:
    """Return the repr of a value that is not text, with every control character escaped."""
    try:
        raw = repr(value)
    except ValueError:  # Python refuses to write integers of thousands of digits
        return f"a very large {type(value).__name__}"
    return "".join(mark if mark.isprintable() else repr(mark)[1:-1] for mark in raw[:1000])
