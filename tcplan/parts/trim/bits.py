"""A row of bits: the value of a code, the gaps between codes, and the codes next to a value.

The steps of a device are not alike: a code is searched among all of them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.parts.trim.model import Row

AT_ONCE = 1 << 20  # values in memory


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Factor:
    """What the body and the ends of a film are multiplied with, of one shape."""

    body: FloatArray
    ends: FloatArray

    @classmethod
    def of(cls, body: float, ends: float | None = None) -> Factor:
        """Return the factor of one device; its ends as its body if not given."""
        return cls(body=np.asarray(body), ends=np.asarray(body if ends is None else ends))

    @property
    def each(self) -> Factor:
        """The same with one more axis, for several codes of each device."""
        return Factor(body=self.body[..., None], ends=self.ends[..., None])

    def taken(self, part: slice) -> Factor:
        """Return that of some devices."""
        return Factor(body=self.body[part], ends=self.ends[part])

    def ohms(self, piece: tuple[float, float]) -> FloatArray:
        """Return the value of a piece [ohm] from its body and its ends."""
        return np.asarray(self.body * piece[0] + self.ends * piece[1])


def set_bits(row: Row, codes: IntArray) -> BoolArray:
    """Return which bits are set, shape (*codes, bits)."""
    return np.asarray((codes[..., None] >> np.arange(len(row.bit_ohms))) & 1, dtype=np.bool_)


def code_ohms(row: Row, codes: IntArray, factor: Factor, switch: float | None = None) -> FloatArray:
    """Return the value of a leg [ohm] at some codes.

    Parameters
    ----------
    row : Row
    codes : int array, any shape
    factor : Factor
        What the film is multiplied with, of a shape that goes with ``codes``.
    switch : float, optional
        Of a switch that is on [ohm], at the temperature of the factor; that of the row if not given.
    """
    own = row.switch_ohms if switch is None else switch
    base, *bits = row.pieces
    total = np.asarray(factor.ohms(base) + np.zeros(codes.shape))
    for k, bit in enumerate(bits):
        unit = factor.ohms(bit)
        total = total + np.where((codes >> k) & 1, unit, _bypassed(unit, own))
    return total


def ends(row: Row, factor: Factor) -> tuple[FloatArray, FloatArray]:
    """Return the values with all bits cleared and with all set, of the shape of ``factor``."""
    none = np.zeros(factor.body.shape, dtype=np.intp)
    return code_ohms(row, none, factor), code_ohms(row, none + 2 ** len(row.bit_ohms) - 1, factor)


def largest_gap(row: Row, factor: Factor) -> float:
    """Return the largest gap between neighbouring values of all codes of one device [ohm]."""
    base, *bits = row.pieces
    table = _sums(factor.ohms(base)[None], bits, factor.each, row.switch_ohms)
    return float(np.diff(np.sort(table, axis=None)).max())


def _bypassed(units: FloatArray, switch: float) -> FloatArray:
    return np.asarray(units * switch / (units + switch))


# --- the codes next to a value --------------------------------------------------------------------------


def codes_beside(row: Row, factor: Factor, wanted: FloatArray, each_side: int = 1) -> IntArray:
    """Return the codes next to a wanted value, exactly, shape (devices, 2 each_side).

    First those at or below it, nearest first, then those above. Where one side has too few, its place is
    taken by the last one of that side, or by the nearest of the other.

    Parameters
    ----------
    row : Row
    factor : Factor, shape (devices,)
        What the film is multiplied with.
    wanted : array, shape (devices,)
        The value wanted of the leg [ohm].
    each_side : int
    """
    found = np.empty((len(wanted), 2 * each_side), dtype=np.intp)
    width = 2 ** (len(row.bit_ohms) - len(row.bit_ohms) // 2)
    step = max(1, AT_ONCE // width)
    for start in range(0, len(wanted), step):
        part = slice(start, start + step)
        found[part] = _beside(row, factor.taken(part), wanted[part], each_side)
    return found


def _beside(row: Row, factor: Factor, wanted: FloatArray, each_side: int) -> IntArray:
    """Return the same from the sums of the lower bits, in order, and those of the upper ones.

    The nearest codes have no more upper parts than there are codes, and these are the upper parts whose own
    nearest code is nearest.
    """
    base, *bits = row.pieces
    half = len(bits) // 2
    lower = _sums(factor.ohms(base), bits[:half], factor, row.switch_ohms)
    upper = _sums(np.zeros(len(wanted)), bits[half:], factor, row.switch_ohms)
    order = np.argsort(lower, axis=1)
    lower = np.take_along_axis(lower, order, axis=1)
    rest = wanted[:, None] - upper
    at = np.stack(
        [np.searchsorted(own, values, side="right") for own, values in zip(lower, rest, strict=True)]
    )
    below, nearest = _one_side(lower, rest, at, each_side, -1)
    above, other = _one_side(lower, rest, at, each_side, 1)
    lacking, over = ~np.isfinite(nearest), ~np.isfinite(other)
    below[lacking], above[over] = above[lacking, :1], below[over, :1]
    places = np.concatenate([below, above], axis=1)
    low, high = places % lower.shape[1], places // lower.shape[1]
    return np.asarray(np.take_along_axis(order, low, axis=1) + (high << half))


def _sums(
    first: FloatArray, bits: Sequence[tuple[float, float]], factor: Factor, switch: float
) -> FloatArray:
    """Return the values of all codes of some bits, shape (devices, codes)."""
    table = first[:, None]
    for bit in bits:
        units = factor.ohms(bit)[:, None]
        table = np.concatenate([table + _bypassed(units, switch), table + units], axis=1)
    return table


def _one_side(
    lower: FloatArray, rest: FloatArray, at: IntArray, count: int, side: int
) -> tuple[IntArray, FloatArray]:
    """Return the places (upper part times all lower ones, and lower part) of the nearest codes of one side.

    Nearest first; where there are too few the last one again. Beside them the distance of the nearest.
    """
    size = lower.shape[1]
    first = at - 1 if side < 0 else at
    few = min(count, rest.shape[1])
    upper = np.argpartition(_off(lower, rest, first), few - 1, axis=1)[:, :few]
    own = np.take_along_axis(first, upper, axis=1)[:, :, None] + side * np.arange(min(count, size))
    wide = own.reshape(len(own), -1)
    upper = np.repeat(upper, own.shape[2], axis=1)
    off = _off(lower, np.take_along_axis(rest, upper, axis=1), wide)
    chosen, nearest = _least(off, count)
    places = upper * size + np.clip(wide, 0, size - 1)
    return np.take_along_axis(places, chosen, axis=1), nearest


def _off(lower: FloatArray, rest: FloatArray, at: IntArray) -> FloatArray:
    """Return how far the lower parts at some places are from what is wanted of them; infinite beyond."""
    size = lower.shape[1]
    own = np.take_along_axis(lower, np.clip(at, 0, size - 1), axis=1)
    return np.where((at >= 0) & (at < size), np.abs(own - rest), np.inf)


def _least(distance: FloatArray, count: int) -> tuple[IntArray, FloatArray]:
    """Return the places of the least distances, least first, and the least one; infinite ones as the last."""
    some = min(count, distance.shape[1])
    at = np.argpartition(distance, some - 1, axis=1)[:, :some]
    own = np.take_along_axis(distance, at, axis=1)
    order = np.argsort(own, axis=1, kind="stable")
    at, own = np.take_along_axis(at, order, axis=1), np.take_along_axis(own, order, axis=1)
    last = np.maximum(np.isfinite(own).sum(axis=1) - 1, 0)[:, None]
    places = np.minimum(np.arange(count)[None, :], last)
    return np.take_along_axis(at, places, axis=1), own[:, 0]
