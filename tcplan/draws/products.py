"""Products of a small matrix with many lots, in pieces too small for the threads of a linear algebra library.

Such a library shares a large product among all cores and waits for each of them. Here every core may be
busy with other lots, and the wait then takes ten times as long as the work.
"""

from __future__ import annotations

import numpy as np

from tcplan.arrays import FloatArray

MOST_MULTIPLICATIONS = 1 << 17  # of one piece: half of where OpenBLAS begins to share


def product(matrix: FloatArray, lots: FloatArray, out: FloatArray | None = None) -> FloatArray:
    """Return matrix @ lots, shape (rows of the matrix, lots); ``out`` must not be one of the two."""
    found = np.empty((len(matrix), lots.shape[1])) if out is None else out
    step = max(64, MOST_MULTIPLICATIONS // matrix.size)
    for start in range(0, lots.shape[1], step):
        part = slice(start, start + step)
        np.matmul(matrix, lots[:, part], out=found[:, part])
    return found


def own_products(table: FloatArray) -> FloatArray:
    """Return table @ table.T, summed in order."""
    step = max(64, MOST_MULTIPLICATIONS // len(table) ** 2)
    parts = [table[:, start : start + step] for start in range(0, table.shape[1], step)]
    found = np.zeros((len(table), len(table)))
    for part in parts:
        found += part @ part.T
    return found
