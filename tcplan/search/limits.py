"""Limits on the legs of a mixed network: least share, value and area, in logarithms of the shares."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.mixes import total_of
from tcplan.plan import Space
from tcplan.search.curves import Path, log_ohms, log_shares, path_slopes


@dataclass(frozen=True, slots=True)
class LegLimits:
    """Limits on every leg, by material: ``lowest`` and ``highest`` bound ln(ohms/total).

    ``area`` is the area of a leg of the total value [m^2]; that of all legs is at most ``max_area``.
    A material that is not chosen (a fixed member) has no limit of its own. Where the share x of the fixed
    members sets the total, "total" above is their own value, and ln(total/that) is ``total`` times ln x:
    -1 for members in series, 1 in parallel, 0 for a given total.
    """

    min_share: float
    lowest: FloatArray
    highest: FloatArray
    area: FloatArray
    max_area: float
    total: int = 0

    @property
    def any(self) -> bool:
        """Whether anything is asked."""
        bounded = bool(np.isfinite(self.lowest).any() or np.isfinite(self.highest).any())
        return bounded or self.min_share > 0 or self.max_area < np.inf

    def excess(self, routes: tuple[Path, ...], materials: IntArray, shares: FloatArray) -> FloatArray:
        """Return the largest excess (in ln) of each tree and point; below zero inside the limits.

        ``materials`` has the shape (trees, legs), ``shares`` (shares, trees, points).
        """
        worst = np.full(shares.shape[1:], -np.inf)
        area = np.zeros(shares.shape[1:])
        for leg, path in enumerate(routes):
            kind = materials[:, leg][:, None]
            own = log_ohms(path, shares) + self.total * np.log(shares[0])
            low, high = self.lowest[kind], self.highest[kind]
            worst = np.maximum(worst, np.maximum(low - own, own - high))
            if self.min_share > 0:
                short = np.log(self.min_share) - log_shares(path, shares)
                worst = np.maximum(worst, np.where(kind < len(self.lowest) - 1, short, -np.inf))
            area += self.area[kind] * np.exp(own)
        if self.max_area < np.inf:
            with np.errstate(divide="ignore"):
                worst = np.maximum(worst, np.log(area / self.max_area))
        return worst

    def rows(
        self, routes: tuple[Path, ...], materials: tuple[int, ...], x: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return every excess (in ln) of one tree, and its derivatives by the shares."""
        if not self.any:
            return np.zeros(0), np.zeros((0, len(x)))
        values: list[float] = []
        slopes: list[FloatArray] = []
        area, area_slope = 0.0, np.zeros(len(x))
        for kind, path in zip(materials, routes, strict=True):
            own = float(log_ohms(path, x)) + self.total * float(np.log(x[0]))
            own_slope = path_slopes(path, x, of_ohms=True)
            own_slope[0] += self.total / x[0]
            if self.min_share > 0 and self.chosen(kind):
                values.append(float(np.log(self.min_share) - log_shares(path, x)))
                slopes.append(-path_slopes(path, x, of_ohms=False))
            if np.isfinite(self.lowest[kind]):
                values.append(float(self.lowest[kind]) - own)
                slopes.append(-own_slope)
            if np.isfinite(self.highest[kind]):
                values.append(own - float(self.highest[kind]))
                slopes.append(own_slope)
            area += float(self.area[kind] * np.exp(own))
            area_slope += self.area[kind] * np.exp(own) * own_slope
        if self.max_area < np.inf and area > 0:
            values.append(float(np.log(area / self.max_area)))
            slopes.append(area_slope / area)
        return np.array(values), np.array(slopes).reshape(-1, len(x))

    def chosen(self, kind: int) -> bool:
        """Whether a position is that of a chosen material, not of the fixed members."""
        return kind < len(self.lowest) - 1


def limits_of(space: Space) -> LegLimits:
    """Return the limits of a space; the last position is that of the fixed members."""
    count = len(space.materials)
    low, high = np.full(count + 1, -np.inf), np.full(count + 1, np.inf)
    area, most = np.zeros(count + 1), np.inf
    own, total = total_of(space)
    if space.sizes is not None:
        with np.errstate(divide="ignore"):
            low[:count] = np.log(np.array(space.sizes.least_ohms) / own)
            high[:count] = np.log(np.array(space.sizes.most_ohms) / own)
        area[:count] = np.array(space.sizes.area_per_ohm) * own
        most = space.sizes.max_area
    return LegLimits(space.min_share, low, high, area, most, total)
