"""What a film part must keep, checked."""

from __future__ import annotations

import math
from dataclasses import dataclass

from tcplan.errors import InputError, Problem


@dataclass(frozen=True, slots=True, kw_only=True)
class FilmRules:
    """What a film part must keep.

    Parameters
    ----------
    most_count : int
        Units in series, and strings in parallel, of a leg; 256 at most.
    error : float
        Largest relative value error of a leg.
    max_area : float, optional
        Of all legs of the film together [m^2].
    mismatch : float, optional
        Largest sigma of dR/R of a leg.
    max_length_squares, min_squares : float
        Largest and least L/W of a unit.
    currents : tuple of (str, float)
        Name of a leg and the largest current through the whole of it [A]. Kept where the film states
        ``max_current``; names of other films' legs are of no account.
    max_width : float, optional
        Of a unit [m], where mismatch or current ask for a wide one. When not given, 100 times the least
        width of the film, or what one unit of the least length needs for the mismatch if that is more.
    """

    most_count: int = 64
    error: float = 1e-3
    max_area: float | None = None
    mismatch: float | None = None
    max_length_squares: float = 200.0
    min_squares: float = 1.0
    currents: tuple[tuple[str, float], ...] = ()
    max_width: float | None = None

    def __post_init__(self) -> None:
        checks = (
            ("most_count", self.most_count, 1 <= self.most_count <= 256, "a whole number from 1 to 256"),
            ("error", self.error, 0.0 < self.error < 1.0, "above 0 and below 1"),
            ("max_area", self.max_area, self.max_area is None or self.max_area > 0.0, "above 0"),
            ("mismatch", self.mismatch, self.mismatch is None or self.mismatch > 0.0, "above 0"),
            ("min_squares", self.min_squares, self.min_squares > 0.0, "above 0"),
            (
                "max_length_squares",
                self.max_length_squares,
                self.min_squares <= self.max_length_squares < math.inf,
                "finite, and not below min_squares",
            ),
            (
                "max_width",
                self.max_width,
                self.max_width is None or 0.0 < self.max_width < math.inf,
                "finite, above 0",
            ),
            (
                "currents",
                dict(self.currents),
                all(0.0 <= current < math.inf for _, current in self.currents)
                and len(dict(self.currents)) == len(self.currents),
                "one current of each leg, finite and not below 0",
            ),
        )
        if problems := [
            Problem(where=f"parts.{key}", found=f"{value}", expected=expected)
            for key, value, good, expected in checks
            if not good
        ]:
            raise InputError(problems)
