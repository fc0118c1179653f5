"""What is asked of the drift: limits, the law that is wanted, and one form for them all.

Every kind of goal becomes pieces of the range on which |drift - centre| <= limit * L: ``figure`` is
the least value of ``limit`` that holds, so that one mechanism searches, proves and judges them all.
The centre is free for a band and 0 for the rest.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from typing import Literal, TypeAlias

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.drift import Curve, Extreme, extremes, panels
from tcplan.errors import InputError, Problem
from tcplan.material.law import Law
from tcplan.ranges import TemperatureRange

LimitKind: TypeAlias = Literal["drift", "band", "chord_tcr", "box_tcr", "mask"]
Judge: TypeAlias = Literal["nominal", "worst-case", "quantile"]
KINDS: tuple[LimitKind, ...] = ("drift", "band", "chord_tcr", "box_tcr", "mask")


@dataclass(frozen=True, slots=True, kw_only=True)
class Window:
    """One line of a mask: between ``low`` and ``high`` [K] the drift stays within ``limit``."""

    low: float
    high: float
    limit: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Limit:
    """One limit.

    ``value`` is a fraction (drift, band), 1/K (chord_tcr, box_tcr), or the tightest line of a mask.
    """

    kind: LimitKind
    value: float
    windows: tuple[Window, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Piece:
    """Over [low, high] [K] the goal asks |drift - centre| <= figure * weight."""

    low: float
    high: float
    weight: float
    centred: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Goal:
    """The limits, how they are judged, and the wanted law (None is flat).

    ``quantile`` is the fraction of lots that has to be inside the limits; it counts as a judge only
    when ``judge`` is "quantile".
    """

    limits: tuple[Limit, ...] = ()
    judge: Judge = "nominal"
    wanted: Law | None = None
    quantile: float = 0.9973

    def wanted_ratio(self, temperature: FloatArray, reference: float) -> FloatArray:
        """Return t(T), the wanted R(T)/R(T_ref); 1 when flat."""
        if self.wanted is None:
            return np.ones_like(temperature)
        at_reference = float(self.wanted.ratio(np.array([reference]))[0])
        return np.asarray(self.wanted.ratio(temperature) / at_reference)


@dataclass(frozen=True, slots=True, kw_only=True)
class Requirement:
    """A goal over a range: its pieces, and the figure at which the limit is just met.

    ``scale`` is that figure as a drift (a fraction; None when no limit is given): the drift for
    a drift limit, the band for a band or box limit, the chord times the longer arm for a chord
    limit, the tightest line for a mask. With several limits it is that of the first.
    """

    kind: str
    pieces: tuple[Piece, ...]
    scale: float | None
    reference: float
    goal: Goal

    @property
    def centred(self) -> bool:
        """Whether the centre is free."""
        return any(piece.centred for piece in self.pieces)

    def wanted(self, temperature: FloatArray) -> FloatArray:
        """Return t(T), the wanted R(T)/R(T_ref)."""
        return self.goal.wanted_ratio(temperature, self.reference)

    def breakpoints(self) -> tuple[float, ...]:
        """Return where the wanted law is not smooth [K]."""
        return self.goal.wanted.breakpoints if self.goal.wanted else ()

    def met(self, figure: float) -> bool:
        """Whether a figure is within the limit; one part in 1e9 is rounding, not drift."""
        return self.scale is None or figure <= self.scale * (1.0 + 1e-9)


@dataclass(frozen=True, slots=True, kw_only=True)
class Judged:
    """The figure of one curve and where the drift that sets it is reached [K]."""

    figure: float
    at: float
    centre: float


def requirement(goal: Goal, over: TemperatureRange) -> Requirement:
    """Return the goal over a range in the one form that search, proof and judgement use."""
    order = sorted(goal.limits, key=lambda limit: KINDS.index(limit.kind))
    if not order:
        whole = Piece(low=over.low, high=over.high, weight=1.0)
        return Requirement(kind="none", pieces=(whole,), scale=None, reference=over.reference, goal=goal)
    scale = _own_scale(order[0], over)
    pieces = [
        replace(piece, weight=piece.weight * _own_scale(limit, over) / scale)
        for limit in order
        for piece in _own_pieces(limit, over)
    ]
    return Requirement(
        kind=" and ".join(limit.kind for limit in order),
        pieces=tuple(_tightest_centred(pieces)),
        scale=scale,
        reference=over.reference,
        goal=goal,
    )


def _tightest_centred(pieces: Iterable[Piece]) -> list[Piece]:
    """Keep only the tightest of several bands: each spans the range, so the rest are implied."""
    listed = list(pieces)
    bands = [piece for piece in listed if piece.centred]
    tightest = min(bands, key=lambda piece: piece.weight, default=None)
    return [piece for piece in listed if not piece.centred or piece is tightest]


def _arm(over: TemperatureRange) -> float:
    return max(over.high - over.reference, over.reference - over.low)


def _own_scale(limit: Limit, over: TemperatureRange) -> float:
    """Return the drift that corresponds to the limit, as a fraction."""
    if limit.kind == "chord_tcr":
        return limit.value * _arm(over)
    if limit.kind == "box_tcr":
        return limit.value * (over.high - over.low)
    return limit.value


def _own_pieces(limit: Limit, over: TemperatureRange) -> list[Piece]:
    """Return the pieces of one limit, with weights relative to its own scale."""
    whole = Piece(low=over.low, high=over.high, weight=1.0)
    makers: dict[str, Callable[[], list[Piece]]] = {
        "drift": lambda: [whole],
        "band": lambda: [replace(whole, weight=0.5, centred=True)],
        "box_tcr": lambda: [replace(whole, weight=0.5, centred=True)],
        "chord_tcr": lambda: [
            Piece(low=end, high=end, weight=abs(end - over.reference) / _arm(over))
            for end in (over.low, over.high)
            if end != over.reference
        ],
        "mask": lambda: _mask_pieces(limit, over),
    }
    return makers[limit.kind]()


def _mask_pieces(limit: Limit, over: TemperatureRange) -> list[Piece]:
    """Return one piece a line, each cut to the range; where lines overlap the tighter binds."""
    pieces = [
        Piece(
            low=max(window.low, over.low),
            high=min(window.high, over.high),
            weight=window.limit / limit.value,
        )
        for window in limit.windows
        if window.low <= over.high and window.high >= over.low
    ]
    if not pieces:
        raise InputError(
            Problem(
                where="goal.mask",
                found="no line inside the temperature range",
                expected=f"lines between {over.low_degC:g} and {over.high_degC:g} degC",
            )
        )
    return pieces


def judged(ratio: Curve, need: Requirement, law_breakpoints: Iterable[float] = ()) -> Judged:
    """Return the figure of a curve R(T)/R(T_ref) against a requirement.

    Raises
    ------
    InternalError
        When the curve is not finite inside the range.
    """

    def drift(temperature: FloatArray) -> FloatArray:
        return ratio(temperature) - need.wanted(temperature)

    splits = (*law_breakpoints, *need.breakpoints())
    best = Judged(figure=-1.0, at=need.reference, centre=0.0)
    for piece in need.pieces:
        ends = extremes(drift, panels(piece.low, piece.high, splits))
        centre = 0.5 * (ends.high.value + ends.low.value) if piece.centred else 0.0
        peak: Extreme = ends.peak
        width = 0.5 * ends.band if piece.centred else peak.value
        if width / piece.weight > best.figure:
            best = Judged(figure=width / piece.weight, at=peak.at, centre=centre)
    return best
