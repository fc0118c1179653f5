"""Formulas from text: a small reader of its own, so that no text of a user is ever run.

Allowed are numbers, the names given, pi, brackets, ``+ - * /``, powers as ``**`` or ``^``, and the functions
exp, log (natural), ln (the same), log10, sqrt, sin, cos, tan, atan, sinh, cosh, tanh. Powers bind tighter
than a minus sign before them and group from the right, as in mathematics: -T**2 is -(T**2), 2**3**2 is
2**(3**2).
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from dataclasses import dataclass

from tcplan.errors import ExpressionError, Problem
from tcplan.material.expression_tree import CONSTANTS, FUNCTIONS, MAX_DEPTH, Name, Node, Number, Tree, call
from tcplan.names import nearest_name, shown

__all__ = ["CONSTANTS", "FUNCTIONS", "MAX_LENGTH", "Tree", "allowed_text", "check_names", "parse_expression"]

MAX_LENGTH = 500

_TOKEN = re.compile(
    r"\s*(?:(?P<number>(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)|(?P<name>[A-Za-z_]\w*)|(?P<sign>\*\*|[-+*/^()]))",
    re.ASCII,
)
_NAME = re.compile(r"[A-Za-z_]\w*", re.ASCII)
# how tightly each operator binds to what is left of it, and to what is right of it
_BINDING = {"+": (1, 2), "-": (1, 2), "*": (2, 3), "/": (2, 3), "**": (4, 4)}
_SIGN_BINDING = 3


def parse_expression(text: str, names: Iterable[str], *, where: str = "") -> Tree:
    """Read a formula.

    Parameters
    ----------
    text : str
        The formula, at most 500 characters.
    names : iterable of str
        The names that it may use.
    where : str
        The place of the text, for messages.

    Returns
    -------
    Tree
        The formula, to be evaluated by its methods ``numpy``, ``series`` and ``sympy``.

    Raises
    ------
    ExpressionError
        When the text holds anything else than what is allowed; the message quotes it.
    """
    allowed = tuple(names)
    check_names(allowed, where=where)
    if len(text) > MAX_LENGTH:
        found, expected = f"{len(text)} characters", f"a formula of at most {MAX_LENGTH} characters"
        raise ExpressionError(Problem(where=where, found=found, expected=expected))
    reader = _Reader(text, allowed, where)
    return Tree(text=text, root=reader.whole())


def check_names(names: Iterable[str], *, where: str = "") -> None:
    """Raise when a name cannot be used in a formula: not a word, a function, a constant, or given twice."""
    taken: set[str] = set()
    problems = []
    for name in names:
        if not _NAME.fullmatch(name):
            expected = "a name of letters, digits and _, starting with a letter"
        elif name in FUNCTIONS or name in CONSTANTS:
            expected = "a name that is not a function or constant of formulas"
        elif name in taken:
            expected = "each name once"
        else:
            taken.add(name)
            continue
        problems.append(Problem(where=where, found=f"the name {shown(name)}", expected=expected))
    if problems:
        raise ExpressionError(problems)


def allowed_text(names: Iterable[str]) -> str:
    """Return a list, in words, of what a formula with these names may hold."""
    words = ", ".join((*names, *CONSTANTS))
    return f"numbers, {words}, + - * / ** ^ ( ) and the functions {' '.join(FUNCTIONS)}"


@dataclass(frozen=True, slots=True, kw_only=True)
class _Token:
    kind: str
    text: str
    start: int
    end: int


class _Reader:
    """Operator-precedence reader (Pratt's method) over the tokens of one text."""

    def __init__(self, text: str, names: tuple[str, ...], where: str) -> None:
        self.text, self.names, self.where = text, names, where
        self.tokens = self._tokens()
        self.next = 0
        self.level = 0

    def whole(self) -> Node:
        """Read the whole text as one formula."""
        node = self._expression(0)
        if self._peek().kind != "end":
            raise self._refused(self._peek(), "an operator or the end")
        return node

    def _tokens(self) -> list[_Token]:
        tokens, at = [], 0
        end = len(self.text.rstrip())
        while at < end:
            match = _TOKEN.match(self.text, at)
            if match is None:
                rest = self.text[at:].lstrip()
                start = len(self.text) - len(rest)
                raise self._failed(f"{shown(rest)} at character {start + 1}", allowed_text(self.names))
            kind = str(match.lastgroup)
            word = "**" if match[kind] == "^" else match[kind]
            tokens.append(_Token(kind=kind, text=word, start=match.start(kind), end=match.end()))
            at = match.end()
        tokens.append(_Token(kind="end", text="", start=end, end=end))
        return tokens

    def _peek(self) -> _Token:
        return self.tokens[self.next]

    def _take(self) -> _Token:
        token = self.tokens[self.next]
        self.next += 1
        return token

    def _expression(self, strength: int) -> Node:
        """Read as far as operators bind at least as tightly as ``strength``."""
        self.level += 1
        start = self._peek().start
        if self.level > MAX_DEPTH:
            raise self._failed(f"brackets, signs or powers nested {self.level} deep", f"at most {MAX_DEPTH}")
        left = self._prefix()
        while _BINDING.get(self._peek().text, (-1, 0))[0] >= strength:
            sign = self._take().text
            right = self._expression(_BINDING[sign][1])
            left = call(sign, (left, right), self._quote(start), self.where)
        self.level -= 1
        return left

    def _prefix(self) -> Node:
        token = self._take()
        if token.kind == "number":
            return self._number(token)
        if token.kind == "name":
            return self._name(token)
        if token.text == "(":
            return self._inside_brackets()
        if token.text in ("+", "-"):
            operand = self._expression(_SIGN_BINDING)
            return (
                operand
                if token.text == "+"
                else call("neg", (operand,), self._quote(token.start), self.where)
            )
        raise self._refused(token, "a number, a name, a function or an opening bracket")

    def _inside_brackets(self) -> Node:
        node = self._expression(0)
        token = self._take()
        if token.text != ")":
            raise self._refused(token, "an operator or a closing bracket")
        return node

    def _number(self, token: _Token) -> Node:
        value = float(token.text)
        if not math.isfinite(value):
            raise self._refused(token, "a number of at most 1.8e308")
        return Number(value=value)

    def _name(self, token: _Token) -> Node:
        name = token.text
        called = self._peek().text == "("
        if name in FUNCTIONS and called:
            self._take()
            argument = self._inside_brackets()
            return call(name, (argument,), self._quote(token.start), self.where)
        if name in FUNCTIONS:
            raise self._refused(token, f"{name} with its argument in brackets")
        if name in self.names or name in CONSTANTS:
            return Number(value=CONSTANTS[name]) if name in CONSTANTS else Name(name=name)
        known = tuple(FUNCTIONS) if called else (*self.names, *CONSTANTS, *FUNCTIONS)
        near = nearest_name(name, known)
        what = "the function" if called else "the name"
        position = f"{what} {shown(name)} at character {token.start + 1}"
        raise self._failed(position, allowed_text(self.names), f"Did you mean {near}?" if near else "")

    def _quote(self, start: int) -> str:
        return shown(self.text[start : self.tokens[self.next - 1].end])

    def _refused(self, token: _Token, expected: str) -> ExpressionError:
        if token.kind == "end":
            return self._failed(
                f"the end of {shown(self.text)}" if self.text.strip() else "no formula", expected
            )
        rest = shown(self.text[token.start :])
        return self._failed(f"{rest} at character {token.start + 1}", expected)

    def _failed(self, found: str, expected: str, todo: str = "") -> ExpressionError:
        return ExpressionError(Problem(where=self.where, found=found, expected=expected, todo=todo))
