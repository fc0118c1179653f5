"""The error tree: every fault that tcplan raises on purpose.

TcplanError
|-- InputError          the input is wrong; carries every Problem found
|   |-- UnitError       a quantity: not a number, wrong dimension, no unit
|   |-- ExpressionError text that is not an allowed formula or network
|   `-- OutputError     a file that cannot or must not be written
|-- NoAnswer            the input is right, and no network can do it
|-- Stopped             the work was ended before its answer
`-- InternalError       a check of tcplan's own work failed
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Problem:
    """One mistake: where it is, what was found, what was expected, what to do next."""

    where: str
    found: str
    expected: str
    todo: str = ""

    def __str__(self) -> str:
        place = f"{self.where}: " if self.where else ""
        hint = f" {self.todo}" if self.todo else ""
        return f"{place}found {self.found}; expected {self.expected}.{hint}"

    def inside(self, where: str) -> Problem:
        """Return the same problem with ``where`` put before its place."""
        place = f"{where}: {self.where}" if self.where else where
        return Problem(where=place, found=self.found, expected=self.expected, todo=self.todo)


class TcplanError(Exception):
    """Root of all errors raised on purpose."""


class InputError(TcplanError):
    """The input is wrong. ``problems`` lists every mistake found, in the order of the input."""

    def __init__(self, problems: Problem | Iterable[Problem]) -> None:
        self.problems = (problems,) if isinstance(problems, Problem) else tuple(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


class UnitError(InputError):
    """A quantity that is not a number, has the wrong dimension or lacks its unit."""


class ExpressionError(InputError):
    """Text that is not an allowed formula or network."""


class OutputError(InputError):
    """A file that cannot or must not be written."""


class NoAnswer(TcplanError):
    """The input is right, and no network of these materials can do what it asks."""


class Stopped(TcplanError):
    """The work was ended before its end; ``best`` is the best answer so far, a plan, or None."""

    def __init__(self, message: str = "", best: object = None) -> None:
        self.best = best
        super().__init__(message)


class InternalError(TcplanError):
    """A check of tcplan's own work failed: a fault of tcplan, not of the input."""
