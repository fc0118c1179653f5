"""The tree of a formula as an expression of sympy."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING, Any

from tcplan.errors import ExpressionError, Problem
from tcplan.material.expression_tree import FUNCTIONS, Name, Node, Number, folded
from tcplan.names import shown

if TYPE_CHECKING:
    import sympy


def symbolic(root: Node, symbols: Mapping[str, Any], quote: str) -> sympy.Expr:
    """Return a node in symbols; ``quote`` is the text for messages."""
    result = _walk(root, symbols, quote)
    return _sympy_number(result) if isinstance(result, float) else result


def _walk(node: Node, symbols: Mapping[str, Any], quote: str) -> Any:
    """Return a sympy expression, or a float for what is constant.

    Whatever becomes constant (T - T) is turned into a float at once, so that sympy never computes with a
    number out of the range of floats: a tower of powers or exponentials would keep it busy for ever.
    """
    if isinstance(node, Name):
        return symbols[node.name]
    if isinstance(node, Number):
        return node.value
    arguments = [_walk(a, symbols, quote) for a in node.arguments]
    if all(isinstance(a, float) for a in arguments):
        constants = tuple(Number(value=a) for a in arguments)
        return folded(node.operation, constants, quote, "")
    if (
        node.operation == "**"
        and isinstance(arguments[1], float)
        and not isinstance(node.arguments[1], Number)
    ):
        # the limits of exponents were kept on numbers as written, which this one was not
        found = f"{quote}, with an exponent that is always {arguments[1]:g}"
        raise ExpressionError(Problem(where="", found=found, expected="the exponent as a number"))
    result = _apply_sympy(node.operation, [_sympy_number(a) for a in arguments])
    return _float_of(result, quote) if result.is_number else result


def _apply_sympy(operation: str, arguments: list[Any]) -> Any:
    import sympy

    a, b = arguments[0], arguments[-1]
    if operation == "**":
        return a**b if b.is_number else sympy.exp(b * sympy.log(a))
    if operation == "log10":
        return sympy.log(a) / sympy.Float(math.log(10.0))
    if operation in FUNCTIONS:
        return getattr(sympy, operation)(a)
    results: dict[str, Callable[[], Any]] = {
        "+": lambda: a + b,
        "-": lambda: a - b,
        "*": lambda: a * b,
        "/": lambda: a / b,
        "neg": lambda: -a,
    }
    return results[operation]()


def _sympy_number(value: Any) -> Any:
    """Return a float as a number of sympy, a small whole one as an integer (T**2, not T**2.0)."""
    import sympy

    if not isinstance(value, float):
        return value
    return sympy.Integer(int(value)) if value.is_integer() and abs(value) <= 1000.0 else sympy.Float(value)


def _float_of(number: Any, quote: str) -> float:
    try:
        value = float(number)
    except (TypeError, OverflowError):
        value = math.nan
    if not math.isfinite(value):
        raise ExpressionError(
            Problem(
                where="",
                found=f"{quote}, part of which is always {shown(str(number))}",
                expected="finite real values",
            )
        )
    return value
