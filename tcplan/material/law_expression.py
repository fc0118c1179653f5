"""A law given by a formula in T and T0."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, ClassVar

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import ExpressionError, Problem
from tcplan.material import series
from tcplan.material.expression import Tree, check_names, parse_expression
from tcplan.material.law_base import Law, checked_reference, finite, freeze, temperature_symbol, to_degC
from tcplan.material.series import Series
from tcplan.names import nearest_name, shown

if TYPE_CHECKING:
    import sympy

Constants = tuple[tuple[str, float], ...]
TEMPERATURES = ("T", "T0")


@dataclass(frozen=True, slots=True, kw_only=True)
class Expression(Law):
    """R(T) from a formula, divided by its value at the reference.

    Parameters
    ----------
    reference : float
        The temperature at which the ratio is 1 [K].
    text : str
        The formula in T and T0 [K] and the constants; see `tcplan.material.expression`.
    constants : tuple of pairs (str, float)
        The name and the value of each constant of the formula.
    origin : float, optional
        The value of T0 [K]; the reference when left out. It stays when the law is referred to another
        temperature, because 1 + a*(T - T0) with another T0 would be another law.

    Raises
    ------
    ExpressionError
        When the formula is not allowed, a constant is missing or not used, or the value at the reference is
        not above zero.
    """

    kind: ClassVar[str] = "expression"
    text: str
    constants: Constants = ()
    origin: float | None = None

    def __post_init__(self) -> None:
        reference = checked_reference(self.reference)
        origin = reference if self.origin is None else checked_reference(self.origin)
        constants = tuple((name, finite(value, name)) for name, value in self.constants)
        freeze(self, reference=reference, origin=origin, constants=constants)
        value = _scale(self)
        if not (np.isfinite(value) and value > 0.0):
            raise ExpressionError(
                Problem(
                    where="law",
                    found=f"{shown(self.text)}, which is {value:g} at {to_degC(reference):g} degC",
                    expected="a formula with a finite value above zero at the reference",
                )
            )

    @property
    def tree(self) -> Tree:
        """The formula, with its names."""
        return _tree(self.text, tuple(name for name, _ in self.constants))

    @property
    def names(self) -> frozenset[str]:
        """The names that the formula uses."""
        return self.tree.names

    @property
    def scale(self) -> float:
        """The value of the formula at the reference, by which it is divided."""
        return _scale(self)

    @property
    def is_ratio(self) -> bool:
        """Whether the formula itself is 1 at the reference."""
        return self.scale == 1.0

    def ratio(self, temperature: FloatArray | float) -> FloatArray:
        """Return R(T)/R(reference); not finite where the formula has no value; see `Law.ratio`."""
        at = np.asarray(temperature, dtype=np.float64)
        value = _bound(self).numpy({"T": at}) / _scale(self)
        # library functions may differ in the last digit between one value and many
        return np.asarray(np.where(at == self.reference, 1.0, value))

    def symbolic(self) -> sympy.Expr:
        """Return the formula with its constants as numbers; see `Law.symbolic`."""
        import sympy

        formula = _bound(self).sympy({"T": temperature_symbol()})
        scale = _scale(self)
        return formula if scale == 1.0 else formula / sympy.Float(scale)

    def parameters(self) -> dict[str, object]:
        """Return the formula, its constants, reference_degC and t0_degC; see `Law.parameters`."""
        return {
            "law": self.kind,
            "reference_degC": to_degC(self.reference),
            "text": self.text,
            "law_parameters": dict(self.constants),
            "t0_degC": to_degC(self.origin or self.reference),
        }

    def _series(self, temperature: FloatArray | float, order: int) -> Series:
        return _bound(self).series({"T": series.variable(temperature, order)})


@lru_cache(maxsize=256)
def _tree(text: str, names: tuple[str, ...]) -> Tree:
    """Read the formula of a law whose constants have these names; all of them must be used."""
    reserved = [name for name in names if name in TEMPERATURES]
    if reserved:
        found, need = f"a constant named {reserved[0]}", "other names: T and T0 are temperatures [K]"
        raise ExpressionError(Problem(where="law_parameters", found=found, expected=need))
    check_names(names, where="law_parameters")
    tree = parse_expression(text, (*TEMPERATURES, *names), where="law")
    problems = [_unused(name, text, tree) for name in names if name not in tree.names]
    if problems:
        raise ExpressionError(problems)
    return tree


def _unused(name: str, text: str, tree: Tree) -> Problem:
    near = nearest_name(name, tree.names)
    return Problem(
        where="law_parameters",
        found=f"{name}, which {shown(text)} does not use",
        expected="only constants of the formula",
        todo=f"Take it out, or is it the {near} of the formula?" if near else "Take it out.",
    )


@lru_cache(maxsize=256)
def _bound(law: Expression) -> Tree:
    return law.tree.bind({**dict(law.constants), "T0": float(law.origin or law.reference)})


@lru_cache(maxsize=256)
def _scale(law: Expression) -> float:
    return float(_bound(law).numpy({"T": law.reference}))
