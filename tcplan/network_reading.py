"""The text form of a network, read: ``(red_film 5k1 || blue_film 3.3 kohm) + red_film 10k``."""

from __future__ import annotations

import re
from collections.abc import Collection
from dataclasses import dataclass

from tcplan.errors import ExpressionError, InputError, Problem
from tcplan.names import nearest_name, shown
from tcplan.network import Leg, Network, Parallel, Series
from tcplan.units import parse_quantity

MAX_TEXT = 4000
MAX_LEGS = 64
MAX_DEPTH = 20
_TOKEN = re.compile(r"\s*(\|\||[()+]|[^\s()+|]+)")
_FORM = 'a network such as "film_a 12 kohm + (film_b 4k7 || film_c 3k3)"'


@dataclass(slots=True)
class _Reader:
    """A recursive-descent reader over tokens; ``where`` is named in every refusal."""

    tokens: list[str]
    materials: Collection[str] | None
    where: str
    at: int = 0
    legs: int = 0

    def refuse(self, found: str, expected: str, todo: str = "") -> ExpressionError:
        return ExpressionError(Problem(where=self.where, found=found, expected=expected, todo=todo))

    def peek(self) -> str:
        return self.tokens[self.at] if self.at < len(self.tokens) else ""

    def take(self) -> str:
        token = self.peek()
        self.at += 1
        return token

    def node(self, depth: int) -> Network:
        """Read members joined by one kind of sign; the two kinds need brackets between them."""
        if depth > MAX_DEPTH:
            raise self.refuse(f"brackets {depth} deep", f"at most {MAX_DEPTH}")
        members = [self.member(depth)]
        sign = self.peek()
        while self.peek() in ("+", "||"):
            if self.take() != sign:
                raise self.refuse(
                    "+ and || side by side",
                    "brackets between series (+) and parallel (||)",
                    "Write a + (b || c) or (a + b) || c.",
                )
            members.append(self.member(depth))
        if len(members) == 1:
            return members[0]
        return Series(tuple(members)) if sign == "+" else Parallel(tuple(members))

    def member(self, depth: int) -> Network:
        token = self.take()
        if token == "(":
            inner = self.node(depth + 1)
            if self.take() != ")":
                raise self.refuse("a bracket that is not closed", _FORM)
            return inner
        if token in ("", ")", "+", "||"):
            raise self.refuse(shown(token) if token else "the end of the text", _FORM)
        return self.leg(token)

    def leg(self, name: str) -> Leg:
        self.legs += 1
        if self.legs > MAX_LEGS:
            raise self.refuse(f"more than {MAX_LEGS} legs", f"at most {MAX_LEGS}")
        if self.materials is not None and name not in self.materials:
            near = nearest_name(name, self.materials)
            hint = f"Did you mean {near}?" if near else ""
            known = "one of " + ", ".join(sorted(self.materials)[:12])
            raise self.refuse(f"a material named {shown(name)}", known, hint)
        words = []
        while self.peek() not in ("", "(", ")", "+", "||"):
            words.append(self.take())
        if not words:
            raise self.refuse(f"{shown(name)} without a value", f'"{name} 12 kohm" or "{name} 4k7"')
        return Leg(material=name, ohms=_positive(" ".join(words), f"{self.where}: {name}"))


def _positive(text: str, where: str) -> float:
    ohms = parse_quantity(text, "ohm", where=where)
    if ohms <= 0:
        raise InputError(Problem(where=where, found=shown(text), expected="a value above zero"))
    return ohms


def _tokens(text: str, where: str) -> list[str]:
    # A sign inside a number ("1e+3 ohm") is not a series sign: exponents keep their "+".
    text = re.sub(r"(?<=\d)([eE])\+(?=\d)", r"\1", text)
    tokens = _TOKEN.findall(text)
    if "".join(tokens) != re.sub(r"\s+", "", text):
        raise ExpressionError(Problem(where=where, found="a single |", expected="|| for parallel"))
    return tokens


def parse_network(text: str, materials: Collection[str] | None = None, *, where: str = "network") -> Network:
    """Return the network that ``text`` states; values at the reference temperature.

    Parameters
    ----------
    text : str
        ``+`` series, ``||`` parallel, brackets; each leg a material and a value with its unit
        ("12 kohm") or an IEC 60062 code ("4k7").
    materials : collection of str, optional
        The names that are known; any name when None.
    where : str
        What is named as the place in a refusal.

    Raises
    ------
    ExpressionError, UnitError, InputError

    Examples
    --------
    >>> from tcplan.network import value
    >>> network = parse_network("(red_film 6k || blue_film 3 kohm) + red_film 10k")
    >>> value(network)
    12000.0
    """
    if not isinstance(text, str) or len(text) > MAX_TEXT:
        raise ExpressionError(
            Problem(where=where, found=shown(str(text)), expected=f"{_FORM}, at most {MAX_TEXT} characters")
        )
    reader = _Reader(tokens=_tokens(text, where), materials=materials, where=where)
    network = reader.node(0)
    if reader.peek():
        raise reader.refuse(f"{shown(reader.peek())} after the end of the network", _FORM)
    return network
