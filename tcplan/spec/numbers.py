"""How numbers are printed: worst cases outward, bounds inward, nominal no finer than its spread.

Every function takes figures in the unit that it prints. Full precision is in plan.json only.
"""

from __future__ import annotations

from decimal import ROUND_FLOOR, Decimal

from tcplan.units import nominal_step, round_nominal, round_outward

WORST_DIGITS = 3
VALUE_DIGITS = 4
STATED_DIGITS = 6  # of what the user wrote: it is repeated, not rounded
MOST_DIGITS = 12
SMALLEST_PPM = 0.001  # below this a figure is rounding, and is not printed as a number
ROUNDING = 1e-9  # relative; what arithmetic leaves of a figure that is meant to have few digits


def number(value: float, digits: int = VALUE_DIGITS) -> str:
    """Return a number with so many significant digits, without needless zeros or an exponent."""
    exact = Decimal(repr(float(value)))
    if not exact:
        return "0"
    short = exact.quantize(Decimal(1).scaleb(exact.adjusted() - digits + 1)).normalize()
    return format(short, "f" if -7 <= short.adjusted() <= MOST_DIGITS else "e")


def signed(value: float, digits: int = VALUE_DIGITS) -> str:
    """Return a number that always has its sign; 0 has none."""
    text = number(value, digits)
    return f"+{text}" if value > 0 else text


def worst(figure_ppm: float, limit_ppm: float | None = None) -> str:
    """Return a worst case [ppm], rounded outward to 3 digits.

    Where outward rounding alone would pass a limit that the figure keeps, more digits are printed.
    """
    figure_ppm = _kept(figure_ppm, limit_ppm)
    for digits in range(WORST_DIGITS, MOST_DIGITS):
        rounded = round_outward(figure_ppm, digits)
        if limit_ppm is None or not figure_ppm <= limit_ppm < rounded:
            return _ppm(rounded)
    return _ppm(round_outward(figure_ppm, MOST_DIGITS))


def bound(figure_ppm: float, limit_ppm: float | None = None) -> str:
    """Return a lower bound [ppm], rounded down to 3 digits, so that the printed bound still holds.

    Where rounding would hide that the bound is above a limit, more digits are printed.
    """
    if figure_ppm < SMALLEST_PPM:
        return "0"
    for digits in range(WORST_DIGITS, MOST_DIGITS):
        rounded = _down(figure_ppm, digits)
        if limit_ppm is None or not rounded <= limit_ppm < figure_ppm:
            return _ppm(rounded)
    return _ppm(_down(figure_ppm, MOST_DIGITS))


def _down(figure_ppm: float, digits: int) -> float:
    exact = Decimal(repr(float(figure_ppm)))
    place = Decimal(1).scaleb(exact.adjusted() - digits + 1)
    near = exact.quantize(place)
    if abs(near - exact) > exact * Decimal(repr(ROUNDING)):
        near = exact.quantize(place, rounding=ROUND_FLOOR)
    return float(near)


def nominal(figure_ppm: float, spread_ppm: float | None, limit_ppm: float | None = None) -> str:
    """Return a nominal figure [ppm], no finer than a tenth of its spread; "under N" when that leaves 0.

    With the limit that it is judged by, rounding never puts it on the other side of the limit.
    """
    figure_ppm = _kept(figure_ppm, limit_ppm)
    printed, most = _nominal(figure_ppm, spread_ppm)
    if limit_ppm is not None and figure_ppm <= limit_ppm < most:
        return f"under {stated(limit_ppm)}"
    if limit_ppm is not None and most <= limit_ppm < figure_ppm:
        return f"over {stated(limit_ppm)}"
    return printed


def _kept(figure_ppm: float, limit_ppm: float | None) -> float:
    """Return the limit for a figure that passes it by rounding only: such a figure meets it."""
    if limit_ppm is not None and limit_ppm < figure_ppm <= limit_ppm * (1.0 + ROUNDING):
        return limit_ppm
    return figure_ppm


def _nominal(figure_ppm: float, spread_ppm: float | None) -> tuple[str, float]:
    """Return the text of a nominal figure and the figure that a reader takes from it."""
    known = spread_ppm is not None and abs(spread_ppm) >= SMALLEST_PPM
    step = nominal_step(spread_ppm) if spread_ppm is not None and known else SMALLEST_PPM
    rounded = round_nominal(figure_ppm, spread_ppm if known else None)
    if rounded == 0.0 or abs(figure_ppm) < SMALLEST_PPM:
        return f"under {number(step)}", step
    return number(rounded, MOST_DIGITS), rounded


def stated(value: float) -> str:
    """Return a number that the user stated, as stated."""
    return number(value, STATED_DIGITS)


def percent(fraction: float) -> str:
    """Return a share or a half-width in percent."""
    return f"{number(fraction * 100.0)} %"


def _ppm(rounded: float) -> str:
    return number(rounded, MOST_DIGITS)
