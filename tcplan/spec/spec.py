"""The content of a spec sheet: sections of blocks, all in words and rounded, that the writers only write."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

CAUTIONS = (
    "Figures are design estimates from the data below, to be confirmed on silicon or hardware.",
    "Package stress, ageing, humidity and self-heating need their own allowance and check.",
    "Power parts can burn.",
    "Safety-related use follows the applicable standards, local codes and licensed practice.",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """What stands in a table: its text, and where its number comes from (:func:`plan_path`), or empty.

    ``code`` marks names and formulas, which are set as such.
    """

    text: str
    source: str = ""
    code: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Words:
    """A paragraph; ``strong`` is what has to be seen first."""

    text: str
    strong: bool = False
    kind: Literal["words"] = "words"


@dataclass(frozen=True, slots=True, kw_only=True)
class Points:
    """A list."""

    items: tuple[str, ...]
    kind: Literal["points"] = "points"


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """A column of a table; the numbers of a ``numeric`` one stand below each other."""

    title: str
    numeric: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """A table; the first cell of a row names the row."""

    caption: str
    head: tuple[Column, ...]
    rows: tuple[tuple[Cell, ...], ...]
    kind: Literal["table"] = "table"

    def __post_init__(self) -> None:
        if any(len(row) != len(self.head) for row in self.rows):
            raise ValueError(f"a row of {self.caption!r} is not as long as its head")


@dataclass(frozen=True, slots=True, kw_only=True)
class Picture:
    """A figure by the name of its file, without the ending; ``alt`` says what is seen in it."""

    name: str
    alt: str
    caption: str
    kind: Literal["picture"] = "picture"


@dataclass(frozen=True, slots=True, kw_only=True)
class Code:
    """Formulas to copy, as text or as LaTeX."""

    text: str
    language: Literal["", "math"] = ""
    kind: Literal["code"] = "code"


Block: TypeAlias = Words | Points | Table | Picture | Code


@dataclass(frozen=True, slots=True, kw_only=True)
class Section:
    """A part of a spec sheet; ``key`` is its name in links."""

    key: str
    title: str
    blocks: tuple[Block, ...]

    @property
    def tables(self) -> tuple[Table, ...]:
        """The tables of the section."""
        return tuple(block for block in self.blocks if isinstance(block, Table))


@dataclass(frozen=True, slots=True, kw_only=True)
class Spec:
    """A spec sheet in words; ``verdict`` is MET, NOT MET, NOT JUDGED, or that no limit is given."""

    title: str
    headline: str
    verdict: str
    sections: tuple[Section, ...]

    def section(self, key: str) -> Section:
        """Return a section by its key."""
        return next(section for section in self.sections if section.key == key)


def plan_path(*keys: str | int) -> str:
    """Return where a number comes from: ``plan.json#`` and its path.

    Parameters
    ----------
    *keys : str or int
        From the root of plan.json.

    References
    ----------
    RFC 6901, JavaScript Object Notation (JSON) Pointer.
    """
    return "plan.json#" + pointer(*keys)


def pointer(*keys: str | int) -> str:
    """Return keys as a JSON Pointer (RFC 6901)."""
    return "".join(f"/{str(key).replace('~', '~0').replace('/', '~1')}" for key in keys)


def words(*texts: str) -> tuple[Words, ...]:
    """Return a paragraph for each text that is not empty."""
    return tuple(Words(text=text) for text in texts if text)


def points(*texts: str) -> tuple[Points, ...]:
    """Return a list of the texts that are not empty; nothing when there are none."""
    kept = tuple(text for text in texts if text)
    return (Points(items=kept),) if kept else ()


def columns(*titles: str, numeric: str = "") -> tuple[Column, ...]:
    """Return columns; ``numeric`` has an "n" at the place of each that holds numbers."""
    marks = numeric.ljust(len(titles))
    return tuple(Column(title=t, numeric=mark == "n") for t, mark in zip(titles, marks, strict=True))
