"""Laws of sensors, as published: platinum, the B law of thermistors, Steinhart-Hart."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, ClassVar

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material import series
from tcplan.material.law_base import (
    Law,
    above_zero,
    checked_reference,
    finite,
    freeze,
    temperature_symbol,
    to_degC,
)
from tcplan.material.series import Series
from tcplan.units import ZERO_CELSIUS

if TYPE_CHECKING:
    import sympy

# IEC 60751: R(t) = R0 [1 + A t + B t^2 + C (t - 100) t^3], t in degC, C only below 0 degC
PLATINUM_A = 3.9083e-3
PLATINUM_B = -5.775e-7
PLATINUM_C = -4.183e-12


@dataclass(frozen=True, slots=True, kw_only=True)
class Platinum(Law):
    """R(T) of platinum sensors, both branches; established from -200 to 850 degC.

    Parameters
    ----------
    reference : float
        The temperature at which the ratio is 1 [K].

    References
    ----------
    IEC 60751.
    """

    kind: ClassVar[str] = "platinum"

    def __post_init__(self) -> None:
        freeze(self, reference=checked_reference(self.reference))
        if not self._value(np.asarray(self.reference)) > 0.0:
            raise InputError(
                Problem(
                    where="reference",
                    found=f"{to_degC(self.reference):g} degC, where the law is not above zero",
                    expected="a reference from -200 to 850 degC",
                )
            )

    def ratio(self, temperature: FloatArray | float) -> FloatArray:
        """Return R(T)/R(reference); see `Law.ratio`."""
        at = np.asarray(temperature, dtype=np.float64)
        return np.asarray(self._value(at) / self._value(np.asarray(self.reference)))

    def symbolic(self) -> sympy.Expr:
        """Return the formula, two pieces; see `Law.symbolic`."""
        import sympy

        symbol = temperature_symbol()
        t = symbol - sympy.Float(ZERO_CELSIUS)
        warm = 1 + sympy.Float(PLATINUM_A) * t + sympy.Float(PLATINUM_B) * t**2
        cold = warm + sympy.Float(PLATINUM_C) * (t - 100) * t**3
        scale = sympy.Float(float(self._value(np.asarray(self.reference))))
        return sympy.Piecewise((cold / scale, symbol < sympy.Float(ZERO_CELSIUS)), (warm / scale, True))

    def parameters(self) -> dict[str, object]:
        """Return reference_degC; see `Law.parameters`."""
        return {"law": self.kind, "reference_degC": to_degC(self.reference)}

    @property
    def breakpoints(self) -> tuple[float, ...]:
        """0 degC, where the third derivative jumps."""
        return (ZERO_CELSIUS,)

    def _value(self, temperature: FloatArray) -> FloatArray:
        t = temperature - ZERO_CELSIUS
        cold = np.where(t < 0.0, PLATINUM_C, 0.0)
        return np.asarray(1.0 + t * (PLATINUM_A + t * (PLATINUM_B + cold * t * (t - 100.0))))

    def _series(self, temperature: FloatArray | float, order: int) -> Series:
        t = series.variable(np.asarray(temperature, dtype=np.float64) - ZERO_CELSIUS, order)
        square = series.multiply(t, t)
        warm = series.add(series.scale(t, PLATINUM_A), series.scale(square, PLATINUM_B))
        cubic = series.multiply(series.multiply(square, t), (t[0] - 100.0, *t[1:]))
        cold = series.scale(cubic, np.where(t[0] < 0.0, PLATINUM_C, 0.0))
        total = series.add(warm, cold)
        return (1.0 + total[0], *total[1:])


@dataclass(frozen=True, slots=True, kw_only=True)
class Thermistor(Law):
    """R(T)/R(reference) = exp[B (1/T - 1/reference)].

    Parameters
    ----------
    reference : float
        The temperature at which the ratio is 1 [K].
    beta : float
        B value [K], above zero.

    Raises
    ------
    InputError
        When B is not above zero.

    References
    ----------
    IEC 60539-1.
    """

    kind: ClassVar[str] = "thermistor"
    beta: float

    def __post_init__(self) -> None:
        beta = above_zero(self.beta, "beta", "the B value of a thermistor, above 0 K")
        freeze(self, reference=checked_reference(self.reference), beta=beta)

    def ratio(self, temperature: FloatArray | float) -> FloatArray:
        """Return R(T)/R(reference); see `Law.ratio`."""
        at = np.asarray(temperature, dtype=np.float64)
        with np.errstate(all="ignore"):
            return np.asarray(np.exp(self.beta * (1.0 / at - 1.0 / self.reference)))

    def symbolic(self) -> sympy.Expr:
        """Return the formula; see `Law.symbolic`."""
        import sympy

        return sympy.exp(self.beta * (1 / temperature_symbol() - 1 / sympy.Float(self.reference)))

    def parameters(self) -> dict[str, object]:
        """Return reference_degC and beta_K; see `Law.parameters`."""
        return {"law": self.kind, "reference_degC": to_degC(self.reference), "beta_K": self.beta}

    def _series(self, temperature: FloatArray | float, order: int) -> Series:
        inverse = series.divide(series.constant(self.beta, order), series.variable(temperature, order))
        return _exp_of_change(inverse)


@dataclass(frozen=True, slots=True, kw_only=True)
class SteinhartHart(Law):
    """1/T = A + B ln R + C (ln R)^3, solved for R in closed form.

    With p = B/C, q = (A - 1/T)/C and w = (3 q/2 p) sqrt(3/p), ln R = -2 sqrt(p/3) sinh[asinh(w)/3]: the only
    real root, because A + B l + C l^3 rises with l when B and C are above zero.

    Parameters
    ----------
    reference : float
        The temperature at which the ratio is 1 [K].
    a, b, c : float
        The constants [1/K], for R in ohm; b and c above zero.

    Raises
    ------
    InputError
        When b or c is not above zero.

    References
    ----------
    Steinhart and Hart, Deep-Sea Research 15 (1968) 497.
    """

    kind: ClassVar[str] = "steinhart-hart"
    a: float
    b: float
    c: float

    def __post_init__(self) -> None:
        need = "a constant above zero, without which resistance does not fall at every temperature"
        freeze(
            self,
            reference=checked_reference(self.reference),
            a=finite(self.a, "a"),
            b=above_zero(self.b, "b", need),
            c=above_zero(self.c, "c", need),
        )
        if not 0.0 < self.ohms(self.reference) < math.inf:
            constants = f"{self.a:g}, {self.b:g}, {self.c:g}"
            raise InputError(
                Problem(
                    where="a, b, c",
                    found=f"{constants}, whose law gives no resistance at {to_degC(self.reference):g} degC",
                    expected="constants in 1/K for R in ohm, near 1e-3, 2e-4 and 1e-7",
                )
            )

    def ratio(self, temperature: FloatArray | float) -> FloatArray:
        """Return R(T)/R(reference); see `Law.ratio`."""
        at = np.asarray(temperature, dtype=np.float64)
        with np.errstate(all="ignore"):
            change = self._log_ohms(at) - self._log_ohms(np.asarray(self.reference))
            # library functions may differ in the last digit between one value and many
            return np.asarray(np.where(at == self.reference, 1.0, np.exp(change)))

    def symbolic(self) -> sympy.Expr:
        """Return the formula; see `Law.symbolic`."""
        import sympy

        size, gain = self._constants()
        w = gain * (sympy.Float(self.a) - 1 / temperature_symbol())
        log_ohms = -sympy.Float(size) * sympy.sinh(sympy.asinh(w) / 3)
        return sympy.exp(log_ohms - sympy.Float(float(self._log_ohms(np.asarray(self.reference)))))

    def parameters(self) -> dict[str, object]:
        """Return reference_degC and the three constants; see `Law.parameters`."""
        constants = {"a_per_K": self.a, "b_per_K": self.b, "c_per_K": self.c}
        return {"law": self.kind, "reference_degC": to_degC(self.reference), **constants}

    def ohms(self, temperature: FloatArray | float) -> FloatArray:
        """Return R(T) [ohm] itself, which these constants state in full."""
        with np.errstate(all="ignore"):
            return np.asarray(np.exp(self._log_ohms(np.asarray(temperature, dtype=np.float64))))

    def _constants(self) -> tuple[float, float]:
        """Return 2 sqrt(p/3), and w per unit of A - 1/T."""
        p = self.b / self.c
        return 2.0 * math.sqrt(p / 3.0), 1.5 / self.b * math.sqrt(3.0 * (self.c / self.b))

    def _log_ohms(self, temperature: FloatArray) -> FloatArray:
        size, gain = self._constants()
        return np.asarray(-size * np.sinh(np.arcsinh(gain * (self.a - 1.0 / temperature)) / 3.0))

    def _series(self, temperature: FloatArray | float, order: int) -> Series:
        size, gain = self._constants()
        inverse = series.divide(series.constant(1.0, order), series.variable(temperature, order))
        w = series.scale(series.subtract(series.constant(self.a, order), inverse), gain)
        third = series.scale(series.asinh(w), 1.0 / 3.0)
        return _exp_of_change(series.scale(series.sinh(third), -size))


def steinhart_hart_from_points(points: tuple[tuple[float, float], ...], reference: float) -> SteinhartHart:
    """Return the Steinhart-Hart law through three points.

    Parameters
    ----------
    points : three pairs of float
        (T [K], R [ohm]), T rising.
    reference : float
        The temperature at which the ratio is 1 [K].

    Raises
    ------
    InputError
        When there are not three points with T rising and R above zero and falling, or when the law
        through them has a constant that is not above zero.
    """
    _check_three(points)
    inverse = [1.0 / t for t, _ in points]
    logs = [math.log(r) for _, r in points]
    near = (inverse[1] - inverse[0]) / (logs[1] - logs[0])
    far = (inverse[2] - inverse[0]) / (logs[2] - logs[0])
    c = (far - near) / (logs[2] - logs[1]) / sum(logs)
    b = near - c * (logs[0] ** 2 + logs[0] * logs[1] + logs[1] ** 2)
    a = inverse[0] - (b + c * logs[0] ** 2) * logs[0]
    return SteinhartHart(reference=reference, a=a, b=b, c=c)


def _check_three(points: tuple[tuple[float, float], ...]) -> None:
    rising = all(0.0 < p[0] < q[0] < math.inf for p, q in pairwise(points))
    falling = all(math.inf > p[1] > q[1] > 0.0 for p, q in pairwise(points))
    if len(points) != 3 or not rising or not falling or abs(sum(math.log(r) for _, r in points)) < 1e-9:
        raise InputError(
            Problem(
                where="points",
                found=", ".join(f"({t:g} K, {r:g} ohm)" for t, r in points) or "no point",
                expected="three points with rising temperature and falling resistance above zero",
            )
        )


def _exp_of_change(log_ratio: Series) -> Series:
    """Return exp of a series less its first coefficient: a common factor, whose exp could overflow."""
    return series.exp((np.zeros_like(log_ratio[0]), *log_ratio[1:]))
