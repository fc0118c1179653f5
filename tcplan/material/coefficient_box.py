"""What a box TCR leaves open: the ranges of TC1, TC2 and chord TCRs that agree with it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from tcplan.errors import InputError, Problem
from tcplan.material.coefficient_forms import Uncertain, check_span, finite
from tcplan.units import format_celsius


@dataclass(frozen=True, slots=True, kw_only=True)
class BoxLimits:
    """What a box TCR leaves open: each figure lies between minus and plus the value given here.

    Parameters
    ----------
    reference, low, high : float
        Temperatures [K].
    box : Uncertain
        Box TCR, band over span [1/K].
    tc1, tc2 : Uncertain
        [1/K], [1/K^2]
    chords : tuple of (float, Uncertain)
        Each a temperature [K] and the largest chord TCR from the reference [1/K].
    """

    reference: float
    low: float
    high: float
    box: Uncertain
    tc1: Uncertain
    tc2: Uncertain
    chords: tuple[tuple[float, Uncertain], ...]


def box_limits(
    box: Uncertain, reference: float, low: float, high: float, chords_to: Sequence[float] = ()
) -> BoxLimits:
    """Return what a box TCR allows when TC1 is not known: the exact ranges, every one symmetric about 0.

    On u from -1 to 1 over the range the law is p u + q u^2 but for a constant, and its band is 2|p| where
    |p| >= 2|q|, else (|p| + 2|q|)^2/(4|q|). Of all such laws of band B the largest s p + t q is B t where
    t >= s, else B s^2/(2 s - t), for s, t >= 0: see docs/coefficients.md.

    Parameters
    ----------
    box : Uncertain
        Box TCR [1/K], above zero.
    reference, low, high : float
        Temperatures [K], low <= reference <= high.
    chords_to : sequence of float
        Temperatures inside the range to which the chord TCR is wanted [K].

    Raises
    ------
    InputError
        When the temperatures are not in order, or the box TCR is below zero.
    """
    check_span(low, high)
    _check_box(box, reference, low, high, chords_to)
    half, middle = 0.5 * (high - low), 0.5 * (low + high)

    def scaled(factor: float) -> Uncertain:
        uncertainty = None if box.uncertainty is None else finite(factor * box.uncertainty)
        return Uncertain(value=finite(factor * box.value), uncertainty=uncertainty)

    def steepest(at: float) -> Uncertain:
        return scaled(2.0 * _support(1.0, abs(at - middle + reference - middle) / half))

    return BoxLimits(
        reference=reference,
        low=low,
        high=high,
        box=box,
        tc1=steepest(reference),
        tc2=scaled(4.0 / (high - low)),
        chords=tuple((at, steepest(at)) for at in chords_to),
    )


def _support(s: float, t: float) -> float:
    """Return the largest s p + t q of p u + q u^2 with a band of 1 on u from -1 to 1."""
    return t if t >= s else s * s / (2.0 * s - t)


def _check_box(box: Uncertain, reference: float, low: float, high: float, ends: Sequence[float]) -> None:
    outside = [at for at in (reference, *ends) if not low <= at <= high]
    if outside:
        found = f"{format_celsius(outside[0])}, outside {format_celsius(low)} to {format_celsius(high)}"
        raise InputError(Problem(where="box TCR", found=found, expected="temperatures inside its range"))
    if not box.value >= 0.0:
        found = f"a box TCR of {box.value * 1e6:.6g} ppm/K"
        raise InputError(Problem(where="box TCR", found=found, expected="a band over a span, not below 0"))
