"""Law bounds of many materials at once: what `law_bounds` gives, without a call for each of them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.material.law import Law, Polynomial
from tcplan.material.spread import Spread, law_bounds


class LawBounds:
    """The range of R(T)/R(reference) of each of some materials over the limits of TC1 and TC2.

    Parameters
    ----------
    laws : sequence of Law
        Each with its own reference.
    spreads : sequence of Spread
        Of either meaning; taken as limits.
    reference : float
        Of the brief [K].
    """

    def __init__(self, laws: Sequence[Law], spreads: Sequence[Spread], reference: float) -> None:
        self._laws, self._spreads, self._reference = tuple(laws), tuple(spreads), reference
        self._own = np.array([law.reference for law in laws])[:, None]
        limits = [spread.limits() for spread in spreads]
        tc1 = np.array([limit.tc1_and_tcr or 0.0 for limit in limits])
        tc2 = np.array([limit.tc2 or 0.0 for limit in limits])
        corners = [(a, b) for a in (-1.0, 1.0) for b in (-1.0, 1.0)]
        self._shifts = [(a * tc1[:, None], b * tc2[:, None]) for a, b in corners]
        polynomials = [(k, law) for k, law in enumerate(laws) if isinstance(law, Polynomial)]
        self._polynomial = np.array([k for k, _ in polynomials], dtype=np.intp)
        degree = max((len(law.coefficients) for _, law in polynomials), default=0)
        self._coefficients = np.zeros((degree, len(polynomials), 1))
        for column, (_, law) in enumerate(polynomials):
            self._coefficients[: len(law.coefficients), column, 0] = law.coefficients
        self._others = [k for k, law in enumerate(laws) if not isinstance(law, Polynomial)]
        at_reference = np.array([reference])
        nominal, y = self._nominal(at_reference), at_reference - self._own
        self._at_reference = [nominal + da * y + db * y**2 for da, db in self._shifts]

    def at(self, T: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the lowest and the highest ratio, shape (materials, T).

        Raises
        ------
        InputError
            When a law reaches zero or below somewhere in the box.
        """
        nominal, y = self._nominal(T), T - self._own
        devices = [nominal + da * y + db * y**2 for da, db in self._shifts]
        if min(float(d.min(initial=1.0)) for d in (*devices, *self._at_reference)) <= 0.0:
            for law, spread in zip(self._laws, self._spreads, strict=True):
                law_bounds(law, spread, self._reference, T)  # says which
        ratios = [device / own for device, own in zip(devices, self._at_reference, strict=True)]
        low, high = np.minimum(ratios[0], ratios[1]), np.maximum(ratios[0], ratios[1])
        for ratio in ratios[2:]:
            np.minimum(low, ratio, out=low)
            np.maximum(high, ratio, out=high)
        return low, high

    def _nominal(self, T: FloatArray) -> FloatArray:
        """Return law(T)/law(own reference) of every material, shape (materials, T)."""
        out = np.empty((len(self._laws), len(T)))
        if len(self._polynomial):
            x = T - self._own[self._polynomial]
            total = np.zeros_like(x)
            for coefficient in self._coefficients[::-1]:
                total = total * x + coefficient
            out[self._polynomial] = 1.0 + x * total
        for k in self._others:
            law = self._laws[k]
            out[k] = np.asarray(law.ratio(T)) / float(law.ratio(law.reference))
        return out
