"""The bytes of a regular file of bounded size, with a message for everything that can be in the way."""

from __future__ import annotations

from collections.abc import Collection
from pathlib import Path

from tcplan.errors import InputError, Problem
from tcplan.names import nearest_name, shown

MOST_NAMES = 1000
"""Of a folder that are looked through for a name like the one that is missing."""


def file_bytes(path: Path, most: int, suffixes: Collection[str], expected: str, todo: str) -> bytes:
    """Return the content of a regular file.

    Parameters
    ----------
    path : Path
    most : int
        Its greatest size, in bytes.
    suffixes : collection of str
        Of the files whose name may have been meant, such as ".toml".
    expected : str
        What it should be, such as "a readable TOML file".
    todo : str
        What to do with a file that is too large.

    Raises
    ------
    InputError
        When the file is missing, not a regular file, too large, or cannot be read.
    """
    name = str(path)
    try:
        if path.is_dir():
            raise InputError(Problem(where=name, found="a folder", expected="a file"))
        if not path.exists():
            raise InputError(_missing(path, suffixes))
        if not path.is_file():
            raise InputError(Problem(where=name, found="a device or pipe", expected="a regular file"))
        if (size := path.stat().st_size) > most:
            raise InputError(too_large(name, f"{size} bytes", most, todo))
        with path.open("rb") as stream:
            return stream.read(most + 1)
    except (OSError, ValueError) as fault:  # ValueError: a zero byte in the name
        reason = getattr(fault, "strerror", None) or str(fault)
        raise InputError(
            Problem(
                where=shown(name),
                found=f"a file that cannot be read ({reason})",
                expected=expected,
                todo="Check the name and the permissions.",
            )
        ) from fault


def too_large(name: str, found: str, most: int, todo: str) -> Problem:
    """Return that a file, or a text in its place, is too large."""
    return Problem(where=name, found=found, expected=f"{most} at most", todo=todo)


def _missing(path: Path, suffixes: Collection[str]) -> Problem:
    near = None
    if path.parent.is_dir():
        names = sorted(entry.name for entry in path.parent.iterdir() if entry.suffix in suffixes)
        near = nearest_name(path.name, names[:MOST_NAMES])
    todo = f"Did you mean {path.parent / near}?" if near else "Check the name and the folder."
    return Problem(where=str(path), found="no such file", expected="a file", todo=todo)
