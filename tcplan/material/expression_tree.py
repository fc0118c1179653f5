"""The tree of a formula: what it may hold, its limits, and its value in numbers, series or symbols."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, TypeAlias

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import ExpressionError, Problem
from tcplan.material import series
from tcplan.material.series import Series
from tcplan.names import shown

if TYPE_CHECKING:
    import sympy

MAX_DEPTH = 50
MAX_EXPONENT = 20.0
# sympy multiplies out whole factors under a power: nested powers must stay small, or it counts without end
MAX_DEGREE = 100.0

CONSTANTS: dict[str, float] = {"pi": math.pi}
# smooth on their domain, every one: a law needs derivatives (so no abs, min, max, floor)
FUNCTIONS: dict[str, Callable[[Any], Any]] = {
    "exp": np.exp,
    "log": np.log,
    "ln": np.log,
    "log10": np.log10,
    "sqrt": np.sqrt,
    "sin": np.sin,
    "cos": np.cos,
    "tan": np.tan,
    "atan": np.arctan,
    "sinh": np.sinh,
    "cosh": np.cosh,
    "tanh": np.tanh,
}
_ARITHMETIC: dict[str, Callable[..., Any]] = {
    "+": np.add,
    "-": np.subtract,
    "*": np.multiply,
    "/": np.divide,
    "**": np.power,
    "neg": np.negative,
}
_SERIES: dict[str, Callable[..., Series]] = {
    "+": series.add,
    "-": series.subtract,
    "*": series.multiply,
    "/": series.divide,
    "neg": series.negative,
    **series.FUNCTIONS,
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Number:
    """A number, finite."""

    value: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Name:
    """A name whose value is given later."""

    name: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Call:
    """An operation or a function of other nodes; made by `call`, which keeps the limits."""

    operation: str
    arguments: tuple[Node, ...]
    depth: int = field(compare=False)


Node: TypeAlias = Number | Name | Call


@dataclass(frozen=True, slots=True, kw_only=True)
class Tree:
    """A formula that was read from text: hashable, harmless, evaluated without running any of the text."""

    text: str
    root: Node

    @property
    def names(self) -> frozenset[str]:
        """The names that the formula uses."""
        return frozenset(_names(self.root))

    def bind(self, values: Mapping[str, float]) -> Tree:
        """Return the formula with numbers put in the place of some names.

        Raises
        ------
        ExpressionError
            When a part becomes a constant that is not finite, or an exponent becomes too large.
        """
        return Tree(text=self.text, root=_bind(self.root, values, shown(self.text)))

    def numpy(self, values: Mapping[str, FloatArray | float]) -> FloatArray:
        """Return the value; not finite (without a warning) where the formula has none.

        Parameters
        ----------
        values : mapping
            A number or an array for each name; they are broadcast together.
        """
        with np.errstate(all="ignore"):
            return np.asarray(_number(self.root, values), dtype=np.float64)

    def series(self, values: Mapping[str, Series]) -> Series:
        """Return the truncated power series, given that of each name (at least one name)."""
        order = len(next(iter(values.values()))) - 1
        with np.errstate(all="ignore"):
            return _series(self.root, values, order)

    def sympy(self, symbols: Mapping[str, sympy.Expr | float]) -> sympy.Expr:
        """Return the formula in symbols.

        Parameters
        ----------
        symbols : mapping
            A symbol, an expression or a number for each name.

        Raises
        ------
        ExpressionError
            When a part is a constant without a finite real value.
        """
        from tcplan.material.expression_symbolic import symbolic

        numbers = {n: float(v) for n, v in symbols.items() if not getattr(v, "free_symbols", None)}
        return symbolic(self.bind(numbers).root, symbols, shown(self.text))


def call(operation: str, arguments: tuple[Node, ...], quote: str, where: str = "") -> Node:
    """Return an operation on nodes: a number when they all are numbers, within the limits of formulas.

    Parameters
    ----------
    operation : str
        ``+ - * / ** neg`` or the name of a function.
    arguments : tuple of nodes
        What it works on.
    quote, where : str
        The text and its place, for messages.

    Raises
    ------
    ExpressionError
        When the result is a constant that is not finite, an exponent is too large, or the nesting too deep.
    """
    if operation == "**":
        _check_power(*arguments, quote=quote, where=where)
    if all(isinstance(a, Number) for a in arguments):
        return Number(value=folded(operation, arguments, quote, where))
    depth = 1 + max(a.depth if isinstance(a, Call) else 0 for a in arguments)
    if depth > MAX_DEPTH:
        raise ExpressionError(
            Problem(
                where=where,
                found=f"{quote}, nested or chained {depth} deep",
                expected=f"a formula at most {MAX_DEPTH} deep",
            )
        )
    return Call(operation=operation, arguments=arguments, depth=depth)


def folded(operation: str, arguments: tuple[Any, ...], quote: str, where: str) -> float:
    """Return the value of an operation on numbers, or raise when it is not finite."""
    with np.errstate(all="ignore"):
        value = float(_NUMBERS[operation](*(np.float64(a.value) for a in arguments)))
    if not math.isfinite(value):
        raise ExpressionError(
            Problem(
                where=where,
                found=f"{quote}, a constant part that gives {value}",
                expected="constants with a finite value",
            )
        )
    return value


def _check_power(base: Node, exponent: Node, *, quote: str, where: str) -> None:
    if isinstance(exponent, Number) and not abs(exponent.value) <= MAX_EXPONENT:
        raise ExpressionError(
            Problem(
                where=where,
                found=f"{quote}, a power of {exponent.value:g}",
                expected=f"an exponent from -{MAX_EXPONENT:g} to {MAX_EXPONENT:g}, or one that varies with T",
                todo="Write a large power as exp(n*log(x)).",
            )
        )
    degree = _degree(base) * (abs(exponent.value) if isinstance(exponent, Number) else 1.0)
    if degree > MAX_DEGREE:
        raise ExpressionError(
            Problem(
                where=where,
                found=f"{quote}, nested powers of degree {degree:g}",
                expected=f"a degree of at most {MAX_DEGREE:g}",
            )
        )


def _degree(node: Node) -> float:
    """Return a bound on the degree of a node as a rational formula of its simplest parts."""
    if isinstance(node, Number):
        return 0.0
    if isinstance(node, Name) or node.operation in FUNCTIONS:
        return 1.0
    degrees = [_degree(a) for a in node.arguments]
    if node.operation == "**":
        exponent = node.arguments[1]
        return degrees[0] * abs(exponent.value) if isinstance(exponent, Number) else 1.0
    return sum(degrees) if node.operation in "*/" else max(degrees)


def _names(node: Node) -> set[str]:
    if isinstance(node, Call):
        return set().union(*(_names(a) for a in node.arguments))
    return {node.name} if isinstance(node, Name) else set()


def _bind(node: Node, values: Mapping[str, float], quote: str) -> Node:
    if isinstance(node, Name) and node.name in values:
        return Number(value=float(values[node.name]))
    if isinstance(node, Call):
        return call(node.operation, tuple(_bind(a, values, quote) for a in node.arguments), quote)
    return node


_NUMBERS: dict[str, Callable[..., Any]] = {**_ARITHMETIC, **FUNCTIONS}


def _number(node: Node, values: Mapping[str, Any]) -> Any:
    if isinstance(node, Call):
        return _NUMBERS[node.operation](*[_number(a, values) for a in node.arguments])
    # as a numpy number, so that 1/0 is an infinity and not an exception
    return np.float64(node.value) if isinstance(node, Number) else np.asarray(values[node.name], np.float64)


def _series(node: Node, values: Mapping[str, Series], order: int) -> Series:
    if isinstance(node, Name):
        return values[node.name]
    if isinstance(node, Number):
        return series.constant(node.value, order)
    if node.operation == "**":
        base, exponent = node.arguments
        if isinstance(exponent, Number):
            return series.power(_series(base, values, order), exponent.value)
        return series.general_power(_series(base, values, order), _series(exponent, values, order))
    return _SERIES[node.operation](*(_series(a, values, order) for a in node.arguments))
