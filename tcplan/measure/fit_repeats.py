"""Readings of one temperature: grouped by how near they are."""

from __future__ import annotations

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray

NEARNESS = 0.1
"""Readings within this [K] count as readings of one temperature, when nothing else is said."""


def temperature_groups(T: FloatArray, nearness: float) -> IntArray:
    """Return the number of the group of each reading, from 0 at the coldest.

    From the coldest up, a group takes every reading within ``nearness`` of its first.

    Parameters
    ----------
    T : array, shape (reading,)
        Temperatures [K], in any order, at least one.
    nearness : float
        Width of a group [K].
    """
    order = np.argsort(T, kind="stable")
    rising = T[order]
    starts = np.zeros(len(T), dtype=bool)
    starts[0] = True
    starts[1:] = np.diff(rising) > nearness
    firsts = np.flatnonzero(starts)
    ends = np.append(firsts[1:], len(T))
    # only a chain of close readings that is longer than one group has to be cut step by step
    for first, end in zip(firsts, ends, strict=True):
        if rising[end - 1] - rising[first] > nearness:
            _cut(rising, int(first), int(end), nearness, starts)
    groups = np.empty(len(T), dtype=np.intp)
    groups[order] = np.cumsum(starts) - 1
    return groups


def _cut(rising: FloatArray, first: int, end: int, nearness: float, starts: BoolArray) -> None:
    while True:
        first += int(np.searchsorted(rising[first:end], rising[first] + nearness, side="right"))
        if first >= end:
            return
        starts[first] = True


def group_sums(groups: IntArray, values: FloatArray) -> FloatArray:
    """Return the sum of the values of each group."""
    return np.asarray(np.bincount(groups, weights=values), dtype=np.float64)
