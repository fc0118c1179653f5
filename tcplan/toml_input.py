"""Bounded reading of a TOML file, and mistakes in its shape told in our words.

Used for every file that a user writes. Nothing here imports pydantic: `shape_problems` takes what
pydantic found as plain data, so that only the readers themselves load it. Long, since each mistake has
words of its own.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterable, Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any, get_args, get_origin

from tcplan.errors import InputError, Problem
from tcplan.input_file import file_bytes, too_large
from tcplan.names import nearest_name, shown

MAX_BYTES = 2_000_000
MAX_DEPTH = 12
_MEANT = "Is it the file you meant?"
_TOML_PLACE = re.compile(
    r"^(?P<text>.*?) \(at (?:line (?P<line>\d+), column (?P<column>\d+)|end of document)\)$", re.S
)
_PLAIN_KEY = re.compile(r"[A-Za-z0-9_-]{1,60}")


def read_toml(path: Path) -> dict[str, Any]:
    """Return the content of a TOML file.

    Parameters
    ----------
    path : Path
        A regular file of 2 MB at most, UTF-8 with or without a byte order mark.

    Returns
    -------
    dict
        As ``tomllib`` gives it, nested 12 deep at most.

    Raises
    ------
    InputError
        When the file is missing, not a file, too large, not text, empty or not TOML.
    """
    return read_toml_text(file_text(path), str(path))


def file_text(path: Path) -> str:
    """Return the text of a regular file of 2 MB at most, UTF-8 with or without a byte order mark.

    Raises
    ------
    InputError
        When the file is missing, not a file, too large or not text.
    """
    return _decoded(file_bytes(path, MAX_BYTES, (".toml",), "a readable TOML file", _MEANT), str(path))


def read_toml_text(text: str, name: str) -> dict[str, Any]:
    """Return the content of TOML text.

    Parameters
    ----------
    text : str
        The whole text.
    name : str
        What messages call it: a path, or "standard input".

    Returns
    -------
    dict
        As ``tomllib`` gives it, nested 12 deep at most.

    Raises
    ------
    InputError
        When the text is too large, empty or not TOML.
    """
    if len(text) > MAX_BYTES:
        raise InputError(too_large(name, f"{len(text)} characters", MAX_BYTES, _MEANT))
    if not text.strip():
        raise InputError(
            Problem(where=name, found="an empty file", expected="TOML text", todo="Is it the file you meant?")
        )
    try:
        content = tomllib.loads(text.removeprefix("\ufeff"))
    except RecursionError as fault:
        raise InputError(_too_deep(name)) from fault
    except ValueError as fault:  # TOMLDecodeError, and integers of thousands of digits
        raise InputError(_toml_problem(str(fault), name)) from fault
    if _is_deeper_than(content, MAX_DEPTH):
        raise InputError(_too_deep(name))
    return content


def place(path: Iterable[str | int]) -> str:
    """Return the dotted form of a path inside a file; a key that is not plain is quoted and cut short."""
    text = ""
    for piece in path:
        if isinstance(piece, int):
            text += f"[{piece + 1}]"
        else:
            key = piece if _PLAIN_KEY.fullmatch(piece) else shown(piece)
            text += f".{key}" if text else key
    return text


def shape_problems(errors: Sequence[Mapping[str, Any]], model: Any, where: str) -> tuple[Problem, ...]:
    """Return the mistakes that a pydantic model found, in our words.

    Parameters
    ----------
    errors : sequence of mapping
        What ``ValidationError.errors()`` gives.
    model : pydantic model class
        The one that found them: it knows the keys to suggest and the examples to show.
    where : str
        The file, or the file and the path to the validated table, put before each place.

    Returns
    -------
    tuple of Problem
        One for each place, in the order found.
    """
    problems: dict[str, Problem] = {}
    for error in errors:
        problem = _shape_problem(error, model, where)
        before = problems.get(problem.where)
        if before is None:
            problems[problem.where] = problem
        elif problem.expected not in before.expected:  # one value that fits no branch of "this or that"
            problems[problem.where] = Problem(
                where=before.where,
                found=before.found,
                expected=f"{before.expected}, or {problem.expected}",
                todo=before.todo or problem.todo,
            )
    return tuple(problems.values())


def join(where: str, path: str) -> str:
    """Return ``path`` inside ``where``: after a colon when ``where`` is a file, else after a dot."""
    if not path or not where:
        return where or path
    return f"{where}.{path}" if ": " in where else f"{where}: {path}"


# ---- reading


def _decoded(content: bytes, name: str) -> str:
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as fault:
        found = f"bytes that are not UTF-8 text (at byte {fault.start + 1})"
        raise InputError(Problem(where=name, found=found, expected="TOML text in UTF-8")) from fault
    if "\0" in text:
        raise InputError(Problem(where=name, found="a binary file", expected="TOML text in UTF-8"))
    return text


def _too_deep(name: str) -> Problem:
    return Problem(
        where=name, found="tables or lists nested too deeply", expected=f"{MAX_DEPTH} levels at most"
    )


def _toml_problem(message: str, name: str) -> Problem:
    match = _TOML_PLACE.match(message)
    text = match["text"] if match else message
    if match and match["line"]:
        name = f"{name}, line {match['line']}, column {match['column']}"
    elif match:
        name = f"{name}, end of file"
    if "twice" in text or "overwrite" in text or "Duplicate" in text:
        keys = re.findall(r"'([^']*)'", text)
        what = place(keys) if keys else "a key or table"
        return Problem(
            where=name, found=f"{what} a second time", expected="each name once", todo="Rename one."
        )
    return Problem(
        where=name,
        found=f"text that is not TOML ({shown(text, 120)[1:-1]})",
        expected="TOML",
        todo='Text goes in double quotes: tc1 = "-120 ppm/K".',
    )


def _is_deeper_than(content: object, depth: int) -> bool:
    # Level by level rather than by recursion: the depth is what is in doubt.
    level: list[object] = [content]
    for _ in range(depth):
        level = [inner for outer in level for inner in _inside(outer)]
    return any(isinstance(item, (dict, list)) for item in level)


def _inside(item: object) -> Iterable[object]:
    if isinstance(item, dict):
        return item.values()
    return item if isinstance(item, list) else ()


# ---- shape


def _shape_problem(error: Mapping[str, Any], model: Any, where: str) -> Problem:
    kind, path = str(error["type"]), tuple(error["loc"])
    if kind == "extra_forbidden":
        return _unknown_key(path, model, where)
    path, _, examples = _followed(path, model)
    expected = _expected(kind, error.get("ctx") or {})
    if examples and kind in ("missing", "string_type"):
        expected += f", such as {examples[0]}"
    if kind == "missing":
        found = "nothing"
    elif kind == "value_error":
        found = str((error.get("ctx") or {}).get("error", error.get("msg", "a wrong value")))
    else:
        found = _found(error.get("input"))
    return Problem(where=join(where, place(path)), found=found, expected=expected, todo=_todo(kind, error))


def _unknown_key(path: tuple[str | int, ...], model: Any, where: str) -> Problem:
    above, annotation, _ = _followed(path[:-1], model)
    known = tuple(_keys(annotation))
    near = nearest_name(str(path[-1]), known)
    return Problem(
        where=join(where, place((*above, path[-1]))),
        found=f"the unknown key {shown(str(path[-1]))}",
        expected="a known key" if near else "one of " + ", ".join(known),
        todo=f"Did you mean {near}?" if near else "",
    )


def _followed(path: tuple[str | int, ...], model: Any) -> tuple[tuple[str | int, ...], Any, Sequence[Any]]:
    """Return the part of the path that is keys of the file, what belongs there, and its examples.

    For a value of several forms pydantic ends the path with the name of the form: that is cut off.
    """
    annotation, examples = model, ()
    for count, piece in enumerate(path):
        inner = _inner(annotation, piece)
        if inner is None:
            return path[:count], annotation, examples
        annotation, examples = inner
    return path, annotation, examples


def _inner(annotation: Any, piece: str | int) -> tuple[Any, Any] | None:
    for branch in _branches(annotation):
        if isinstance(piece, str) and (field := _keys(branch).get(piece)) is not None:
            return field.annotation, field.examples or ()
        origin, arguments = get_origin(branch), get_args(branch)
        if origin is dict and isinstance(piece, str):
            return arguments[1], ()
        if origin in (list, tuple) and isinstance(piece, int) and arguments:
            return arguments[min(piece, len(arguments) - 1)], ()
    return None


def _branches(annotation: Any) -> Iterator[Any]:
    if hasattr(annotation, "model_fields") or get_origin(annotation) in (dict, list, tuple):
        yield annotation
        return
    for branch in get_args(annotation):
        yield from _branches(branch)


def _keys(annotation: Any) -> dict[str, Any]:
    fields: dict[str, Any] = {}
    for branch in _branches(annotation):
        for name, field in getattr(branch, "model_fields", {}).items():
            fields[field.alias or name] = field
    return fields


_EXPECTED = {
    "missing": "this key",
    "string_type": "text in quotes",
    "int_type": "a whole number",
    "int_from_float": "a whole number",
    "float_type": "a number",
    "finite_number": "a finite number",
    "bool_type": "true or false",
    "dict_type": "a table",
    "model_type": "a table",
    "model_attributes_type": "a table",
    "list_type": "a list in square brackets",
    "tuple_type": "a list in square brackets",
}
_LIMITS = {
    "too_short": ("min_length", "{} entries or more"),
    "too_long": ("max_length", "{} entries at most"),
    "string_too_short": ("min_length", "{} characters or more"),
    "string_too_long": ("max_length", "{} characters at most"),
    "greater_than": ("gt", "a number above {}"),
    "greater_than_equal": ("ge", "a number of {} or more"),
    "less_than": ("lt", "a number below {}"),
    "less_than_equal": ("le", "a number of {} at most"),
}


def _expected(kind: str, context: Mapping[str, Any]) -> str:
    if kind in ("literal_error", "enum"):
        return str(context.get("expected", "one of the known words")).replace("'", '"')
    if kind in _LIMITS:
        key, text = _LIMITS[kind]
        return text.format(context.get(key, "?"))
    return _EXPECTED.get(kind, "a value of the documented form")


def _todo(kind: str, error: Mapping[str, Any]) -> str:
    if kind == "literal_error" and isinstance(error.get("input"), str):
        words = re.findall(r"'([^']*)'", str((error.get("ctx") or {}).get("expected", "")))
        near = nearest_name(error["input"], words)
        return f"Did you mean {near}?" if near else ""
    if kind == "string_type" and isinstance(error.get("input"), (int, float)):
        return "A quantity is text with its unit."
    return ""


def _found(value: object) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, (int, float)):
        return f"the number {shown(value)}"
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, (list, tuple)):
        return f"a list of {len(value)}"
    return shown(value)
