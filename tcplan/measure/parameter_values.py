"""Values in parameter lines: numbers with their suffixes, and arithmetic read by the reader of formulas."""

from __future__ import annotations

import math
import re
from collections import deque
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from tcplan.errors import ExpressionError
from tcplan.material.expression import CONSTANTS, FUNCTIONS, parse_expression
from tcplan.names import shown

RANDOM = frozenset(
    ("gauss", "agauss", "tgauss", "unif", "aunif", "limit", "mc", "flat", "rand", "random", "rnd")
)
_EXPONENTS = {
    "t": 12,
    "g": 9,
    "k": 3,
    "m": -3,
    "u": -6,
    "\u00b5": -6,
    "\u03bc": -6,
    "n": -9,
    "p": -12,
    "f": -15,
}
_MIL = 25.4e-6
_LETTERS = "[a-z\u00b5\u03bc\u03c9\u2126]"
_NUMBER = re.compile(rf"([+-]?)(\d+\.?\d*|\.\d+)(?:e([+-]?\d{{1,4}}))?({_LETTERS}*)", re.ASCII)
_INNER = re.compile(
    rf"(?<![\w.])(?:(?P<number>(?:\d+\.?\d*|\.\d+)(?:e[+-]?\d{{1,4}})?{_LETTERS}*)|(?P<name>[a-z_]\w*))",
    re.ASCII,
)
_LONGEST_NUMBER = 60
_TWO_MEANINGS = ("a", "e", "x")  # atto or a unit, half an exponent, mega or a unit: by the simulator


class NotUnderstood(ValueError):
    """Text that is no number and no arithmetic that can be worked out; the words say why."""


def number(text: str) -> float | None:
    """Return a number with its suffix, any case: 12k, 1.5meg, 10u, 2mil, 5kohm; None when it is none.

    The suffixes are t g meg k m u n p f and mil; letters after them, or after the number, are a unit and
    count for nothing. Letters that begin with a, e or x mean different things in different simulators.
    """
    match = _NUMBER.fullmatch(text.lower()) if len(text) <= _LONGEST_NUMBER else None
    if match is None or match[4].startswith(_TWO_MEANINGS):
        return None
    sign, digits, power, letters = match.groups()
    exponent = int(power or 0)
    if letters.startswith("mil"):
        value = float(f"{sign}{digits}e{exponent}") * _MIL
    else:
        step = 6 if letters.startswith("meg") else _EXPONENTS.get(letters[:1], 0)
        value = float(f"{sign}{digits}e{exponent + step}")
    return value if math.isfinite(value) else None


def is_milli(text: str) -> bool:
    """Whether a number ends in a capital M, which means milli here."""
    return re.fullmatch(r"[+-]?[0-9.]+(?:[eE][+-]?[0-9]+)?M(?![eE][gG]|[iI][lL])[A-Za-z]*", text) is not None


@dataclass(frozen=True, slots=True, kw_only=True)
class Definition:
    """``name = text`` on a line of a scope, lower case; ``blocked`` says why it has no value here, or ""."""

    name: str
    text: str
    line: int
    scope: tuple[int, ...]
    blocked: str = ""


@dataclass(slots=True)
class Values:
    """What each parameter is worth, by (scope, name): a number, or why it has none."""

    known: dict[tuple[tuple[int, ...], str], float | str] = field(default_factory=dict)

    def of(self, text: str, scope: tuple[int, ...]) -> float:
        """Return the value of a number, a parameter or a formula.

        Raises
        ------
        NotUnderstood
            With the reason.
        """
        plain = number(text.strip())
        if plain is not None:
            return plain
        formula, names = _prepared(text)
        values = {
            name: self._value(name, scope) for name in names if self._place(name, scope) or name != "pi"
        }
        if "pi" in values:
            raise NotUnderstood("pi, which the file defines and formulas have already")
        try:
            tree = parse_expression(formula, sorted(names - set(CONSTANTS)))
            value = float(tree.numpy(values))
        except ExpressionError as error:
            raise NotUnderstood(f"{shown(text)}: found {error.problems[0].found}") from error
        if not math.isfinite(value):
            raise NotUnderstood(f"{shown(text)}, which is {value}")
        return value

    def _place(self, name: str, scope: tuple[int, ...]) -> tuple[tuple[int, ...], str] | None:
        """Return where a name is defined, seen from a scope: the innermost place."""
        for depth in range(len(scope), -1, -1):
            if (scope[:depth], name) in self.known:
                return scope[:depth], name
        return None

    def _value(self, name: str, scope: tuple[int, ...]) -> float:
        place = self._place(name, scope)
        if place is None:
            raise NotUnderstood(f"the parameter {shown(name)}, which the file does not define here")
        value = self.known[place]
        if isinstance(value, str):
            raise NotUnderstood(f"the parameter {shown(name)}, of which {value}")
        return value


def _prepared(text: str) -> tuple[str, frozenset[str]]:
    """Return a formula with plain numbers, in lower case, and the names in it."""
    lower = text.lower()
    if "^" in lower.replace("**", ""):
        raise NotUnderstood(f"{shown(text)}: the sign ^ differs between simulators; write **")
    names: set[str] = set()

    def plain(match: re.Match[str]) -> str:
        if match["number"] is None:
            names.add(match["name"])
            return match["name"]
        after = lower[match.end() : match.end() + 1]
        value = number(match["number"])
        if value is None or after.isalnum() or after in ("_", "."):
            raise NotUnderstood(f"{shown(text)}, with a number that is not one")
        return repr(value)

    formula = _INNER.sub(plain, lower)
    if chance := sorted(names & RANDOM):
        raise NotUnderstood(f"{chance[0]}(), a function of chance: it has no one value")
    return formula, frozenset(names) - set(FUNCTIONS)


def evaluated(definitions: Iterable[Definition]) -> Values:
    """Return the values of all parameters, each after those that it is made of.

    A parameter that is defined twice in one scope with different texts, in terms of itself, or by something
    that is not understood has no value, and neither has what is made of it.
    """
    table = _unique(definitions)
    values = Values(known=dict.fromkeys(table, "the value is not worked out"))
    needs = {place: _needs(values, definition) for place, definition in table.items()}
    users: dict[tuple[tuple[int, ...], str], list[tuple[tuple[int, ...], str]]] = {
        place: [] for place in table
    }
    waiting = {place: len(inner) for place, inner in needs.items()}
    for place, inner in needs.items():
        for other in inner:
            users[other].append(place)
    ready = deque(place for place, count in waiting.items() if count == 0)
    while ready:
        place = ready.popleft()
        values.known[place] = _outcome(values, table[place])
        for user in users[place]:
            waiting[user] -= 1
            if waiting[user] == 0:
                ready.append(user)
    for place, count in waiting.items():
        if count:
            values.known[place] = f"the value on line {table[place].line} leads back to itself"
    return values


def _unique(definitions: Iterable[Definition]) -> Mapping[tuple[tuple[int, ...], str], Definition]:
    table: dict[tuple[tuple[int, ...], str], Definition] = {}
    for new in definitions:
        old = table.get((new.scope, new.name))
        if old is not None and (old.text != new.text or old.blocked or new.blocked):
            blocked = f"there are two values, on lines {old.line} and {new.line}"
            new = Definition(name=new.name, text=new.text, line=new.line, scope=new.scope, blocked=blocked)
        table[new.scope, new.name] = new
    return table


def _needs(values: Values, definition: Definition) -> set[tuple[tuple[int, ...], str]]:
    """Return the places of the parameters in a definition that the file defines."""
    if definition.blocked or number(definition.text.strip()) is not None:
        return set()
    try:
        _, names = _prepared(definition.text)
    except NotUnderstood:
        return set()
    places = (values._place(name, definition.scope) for name in names)
    return {place for place in places if place is not None}


def _outcome(values: Values, definition: Definition) -> float | str:
    if definition.blocked:
        return definition.blocked
    try:
        return values.of(definition.text, definition.scope)
    except NotUnderstood as reason:
        return f"the value on line {definition.line} is not understood ({_short(str(reason))})"


def _short(text: str) -> str:
    """Return a reason cut short: a chain of them would grow without end."""
    return text if len(text) <= 160 else f"{text[:157]}..."
