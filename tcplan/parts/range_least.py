"""The least of any stretch of a row of numbers, for many stretches at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray


@dataclass(frozen=True, slots=True, eq=False)
class RangeLeast:
    """Where the least is in every stretch of 1, 2, 4, 8 and so on numbers.

    Any stretch is covered by two of those, which overlap.

    References
    ----------
    Bender, Farach-Colton, LATIN 2000, LNCS 1776, 88: the sparse table for range minimum queries.
    """

    numbers: FloatArray
    table: IntArray

    @staticmethod
    def of(numbers: FloatArray) -> RangeLeast:
        """Return the table of these numbers."""
        table: list[IntArray] = [np.arange(numbers.size)]
        while 2 ** len(table) <= numbers.size:
            last, half = table[-1], 2 ** (len(table) - 1)
            left, right = last[: numbers.size - half], np.roll(last, -half)[: numbers.size - half]
            least = np.where(numbers[right] < numbers[left], right, left)
            table.append(np.concatenate((least, last[numbers.size - half :])))
        return RangeLeast(numbers=numbers, table=np.asarray(table))

    def at(self, first: IntArray, after: IntArray) -> IntArray:
        """Return the position of the least from each ``first`` to the one before ``after``, never empty."""
        power = np.frexp(after - first)[1] - 1
        left, right = self.table[power, first], self.table[power, after - 2**power]
        at: IntArray = np.where(self.numbers[right] < self.numbers[left], right, left)
        return at
