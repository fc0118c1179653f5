"""The array type of the whole package."""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
import numpy.typing as npt

FloatArray: TypeAlias = npt.NDArray[np.float64]
"""Float64 array; temperature [K] is the last axis."""

IntArray: TypeAlias = npt.NDArray[np.intp]
"""Array of positions."""

BoolArray: TypeAlias = npt.NDArray[np.bool_]
"""Array of truth values."""
