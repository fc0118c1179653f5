"""Statements of a file of parameter lines sorted by what they are, each with the blocks that it stands in.

A block is a subcircuit or a section of a library: its parameters and models are its own. What stands under
a condition is not read, since nothing says whether it holds.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from tcplan.errors import InputError, Problem
from tcplan.measure.parameter_text import NotClosed, Statement, statements, words
from tcplan.measure.parameter_values import Definition
from tcplan.names import shown

DEEPEST = 20
_SHOWN = 80

Placed = tuple[Statement, tuple[int, ...]]


@dataclass(frozen=True, slots=True, kw_only=True)
class Unread:
    """A statement, or a part of it, that was not read: its line, its text cut short, and why."""

    line: int
    text: str
    why: str


@dataclass(slots=True)
class Scoped:
    """The statements that matter, in order, each with its blocks from the outermost.

    ``blocked`` are the parameters, ``doubtful_models`` the models and ``doubtful_tnom`` the nominal
    temperature of which nothing says which value holds.
    """

    parameters: list[Placed] = field(default_factory=list)
    options: list[Placed] = field(default_factory=list)
    models: list[Placed] = field(default_factory=list)
    resistors: list[Placed] = field(default_factory=list)
    blocked: list[Definition] = field(default_factory=list)
    doubtful_models: set[tuple[tuple[int, ...], str]] = field(default_factory=set)
    doubtful_tnom: str = ""
    unread: list[Unread] = field(default_factory=list)


_KINDS = {
    ".param": "parameters",
    ".params": "parameters",
    ".parameter": "parameters",
    ".parameters": "parameters",
    ".option": "options",
    ".options": "options",
    ".opt": "options",
    ".model": "models",
}
_ENDS = {".ends": ".subckt", ".eom": ".subckt", ".endl": ".lib"}
_SILENT = (".end",)
_ELSEWHERE = (".include", ".inc", ".lib")
_UNDER_CONDITION = "under a condition: nothing says whether it holds"


@dataclass(slots=True)
class _Sorter:
    name: str
    found: Scoped = field(default_factory=Scoped)
    scope: tuple[int, ...] = ()
    open: list[str] = field(default_factory=list)
    conditions: int = 0
    blocks: int = 0

    def take(self, statement: Statement) -> None:
        first = re.split(r"[\s=(,]", statement.text, maxsplit=1)[0].lower()
        if self._conditional(statement, first):
            return
        if first in _ENDS:
            self._close(statement, first)
        elif first in (".subckt", ".macro") or (first == ".lib" and self._is_section(statement)):
            self._open(statement, ".lib" if first == ".lib" else ".subckt")
        elif first in _KINDS:
            self._sort(statement, _KINDS[first])
        elif first[:1] == "r":
            self._sort(statement, "resistors")
        elif first not in _SILENT:
            self._left(statement, _reason(first))

    def _sort(self, statement: Statement, kind: str) -> None:
        if kind == "options" and self.scope:
            self._left(statement, "an option inside a block")
            self._doubt_tnom(statement)
            return
        getattr(self.found, kind).append((statement, self.scope))

    def _conditional(self, statement: Statement, first: str) -> bool:
        """Whether a statement is a condition or stands under one; it is listed then."""
        if first == ".if":
            self.conditions += 1
        elif not self.conditions and first not in (".else", ".elseif", ".endif"):
            return False
        if first == ".endif":
            self.conditions = max(self.conditions - 1, 0)
        self._left(statement, _UNDER_CONDITION)
        self._doubt(statement, _KINDS.get(first, ""))
        return True

    def _doubt(self, statement: Statement, kind: str) -> None:
        """Note what a statement under a condition leaves open outside it too."""
        if kind == "parameters":
            self._block(statement, f"the value on line {statement.line} stands under a condition")
        elif kind == "models" and len(pieces := statement.text.split(maxsplit=2)) > 1:
            self.found.doubtful_models.add((self.scope, pieces[1].lower()))
        elif kind == "options":
            self._doubt_tnom(statement)

    def _doubt_tnom(self, statement: Statement) -> None:
        if "tnom" in _defined(statement):
            why = f"the nominal temperature on line {statement.line} may or may not hold"
            self.found.doubtful_tnom = why

    def _block(self, statement: Statement, why: str) -> None:
        for name in _defined(statement):
            self.found.blocked.append(
                Definition(name=name, text="", line=statement.line, scope=self.scope, blocked=why)
            )

    def _is_section(self, statement: Statement) -> bool:
        """Whether .lib opens a section, ``.lib NAME``: one that fetches a file has a path or two words."""
        rest = statement.text.split()[1:]
        return len(rest) == 1 and re.fullmatch(r"\w+", rest[0]) is not None

    def _open(self, statement: Statement, kind: str) -> None:
        self.blocks += 1
        self.scope = (*self.scope, self.blocks)
        self.open.append(kind)
        if len(self.open) > DEEPEST:
            where, found = f"{self.name}: line {statement.line}", f"blocks nested {len(self.open)} deep"
            raise InputError(Problem(where=where, found=found, expected=f"{DEEPEST} at most"))
        self._block(statement, f"the value is given where the block of line {statement.line} is used")

    def _close(self, statement: Statement, first: str) -> None:
        if not self.open or self.open[-1] != _ENDS[first]:
            self._left(statement, f"{first} without its beginning")
            return
        self.open.pop()
        self.scope = self.scope[:-1]

    def _left(self, statement: Statement, why: str) -> None:
        text = shown(statement.text, _SHOWN)[1:-1] if statement.text.isprintable() else shown(statement.text)
        self.found.unread.append(Unread(line=statement.line, text=text, why=why))


def scoped(text: str, name: str) -> Scoped:
    """Return the statements of a text by what they are.

    Parameters
    ----------
    text : str
        2 MB at most.
    name : str
        What messages call it.

    Raises
    ------
    InputError
        When the text is too large, or its blocks are nested more than 20 deep.
    """
    sorter = _Sorter(name)
    for statement in statements(text, name):
        sorter.take(statement)
    return sorter.found


def _defined(statement: Statement) -> tuple[str, ...]:
    """Return the names that a statement gives a value to."""
    try:
        return tuple(word.key for word in words(statement.text) if word.key)
    except NotClosed:
        return ()


def _reason(first: str) -> str:
    if first in _ELSEWHERE:
        return "another file, which is not read"
    if first in (".func", ".function"):
        return "a function of the file's own"
    if first.startswith("."):
        return "a statement that says nothing of the law of a resistor, or is not known"
    if first.startswith("+"):
        return "a line that goes on, without one before it"
    return "no resistor line"
