"""A row of bits: its size for a range and a step, the value of a code, and the codes next to a value.

Clearing bit k of a row closes the switch across its unit r: what it takes away is d = r^2/(r + S), with S
the resistance of the switch, so r = (d + sqrt(d^2 + 4 d S))/2 for d = 2^k times the step. That holds for
the nominal device; in another one the steps are not alike, and a code is searched among all of them.
"""

from __future__ import annotations

import math

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.errors import InputError, Problem
from tcplan.parts.trim.members import Member
from tcplan.parts.trim.model import Row
from tcplan.units import format_ohms

MOST_BITS = 16
AT_ONCE = 1 << 20  # values of codes in memory
HALVINGS = 200
ROUNDING = 1e-9


def row_for(member: Member, wanted: float, step: float, switch: float, *, more: float = 0.0) -> Row:
    """Return the row of fewest bits that covers the spread of a leg in small enough steps.

    Parameters
    ----------
    member : Member
        With its half-width D and its share.
    wanted : float
        Value that the codes restore [ohm], in every device within (1 - D)..(1 + D).
    step : float
        The largest one of the whole that is allowed, as a fraction.
    switch : float
        Of a switch that is on [ohm].
    more : float
        By how much the wanted value itself may move to both sides, as a fraction.

    Raises
    ------
    InputError
        When 16 bits are too coarse, with the step that they have, or the switches are too much.
    """
    for count in range(1, MOST_BITS + 1):
        row = _row(member, wanted, switch, count, more)
        if row.step <= step * (1.0 + ROUNDING):
            return row
    least = math.ceil(row.step * 1e6 * 100.0) / 100.0
    raise InputError(
        Problem(
            where="trim.step",
            found=f"{step * 1e6:g} ppm, for which {MOST_BITS} bits on leg {member.id} are not enough",
            expected=f"{least:g} ppm or more",
            todo=f'Write step = "{least:g} ppm", or use a film with less spread.',
        )
    )


def _row(member: Member, wanted: float, switch: float, count: int, more: float) -> Row:
    """Return the row of so many bits whose codes just cover the spread."""
    low, high = 0.0, wanted
    for _ in range(HALVINGS):
        if _covers(member, wanted, switch, count, more, high) >= 0.0:
            break
        high *= 2.0
    for _ in range(HALVINGS):
        middle = 0.5 * (low + high)
        if _covers(member, wanted, switch, count, more, middle) >= 0.0:
            high = middle
        else:
            low = middle
        if high - low <= 1e-14 * high:
            break
    units = _units(high, switch, count)
    base = _base(member, wanted, switch, more, units)
    if base <= 0.0:
        raise InputError(_switches_problem(member, wanted, switch, count))
    return Row(
        leg=member.id,
        material=member.material,
        wanted_ohms=wanted,
        base_ohms=base,
        bit_ohms=tuple(units.tolist()),
        switch_ohms=switch,
        step_ohms=high,
        step=member.share * high / wanted,
        half_width=member.half_width,
    )


def _units(step: float, switch: float, count: int) -> FloatArray:
    taken = step * 2.0 ** np.arange(count)
    return np.asarray(0.5 * (taken + np.sqrt(taken**2 + 4.0 * taken * switch)))


def _base(member: Member, wanted: float, switch: float, more: float, units: FloatArray) -> float:
    """Return the rest of the leg with which its highest device, all bits cleared, has the lowest value."""
    factor = 1.0 + member.half_width
    return (wanted * (1.0 - more) - float(_bypassed(factor * units, switch).sum())) / factor


def _covers(member: Member, wanted: float, switch: float, count: int, more: float, step: float) -> float:
    """Return by how much the lowest device with all bits set is above the highest value wanted."""
    units = _units(step, switch, count)
    total = _base(member, wanted, switch, more, units) + float(units.sum())
    return (1.0 - member.half_width) * total - wanted * (1.0 + more)


def _bypassed(units: FloatArray, switch: float | FloatArray) -> FloatArray:
    return np.asarray(units * switch / (units + switch))


def _switches_problem(member: Member, wanted: float, switch: float, count: int) -> Problem:
    return Problem(
        where="trim.switch_resistance",
        found=f"{format_ohms(switch)}: with {count} bits the switches alone exceed leg {member.id}, "
        f"{format_ohms(wanted)}",
        expected="switches that are small beside the leg",
        todo="Use larger switches, or a coarser step.",
    )


# --- codes ----------------------------------------------------------------------------------------------


def set_bits(row: Row, codes: IntArray) -> BoolArray:
    """Return which bits are set, shape (*codes, bits)."""
    return np.asarray((codes[..., None] >> np.arange(len(row.bit_ohms))) & 1, dtype=np.bool_)


def code_ohms(
    row: Row, codes: IntArray, factor: FloatArray | float, switch: float | None = None
) -> FloatArray:
    """Return the value of a leg [ohm] at some codes.

    Parameters
    ----------
    row : Row
    codes : int array, any shape
    factor : array or float
        What the film is multiplied with, of a shape that goes with ``codes``.
    switch : float, optional
        Of a switch that is on [ohm], at the temperature of the factor; that of the row if not given.
    """
    own = row.switch_ohms if switch is None else switch
    each = np.asarray(factor, dtype=np.float64)
    total = np.asarray(each * row.base_ohms + np.zeros(codes.shape))
    for k, unit in enumerate(row.bit_ohms):
        units = each * unit
        total = total + np.where((codes >> k) & 1, units, _bypassed(units, own))
    return total


def ends(row: Row, factor: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the values with all bits cleared and with all set, of the shape of ``factor``."""
    none = np.zeros(factor.shape, dtype=np.intp)
    return code_ohms(row, none, factor), code_ohms(row, none + 2 ** len(row.bit_ohms) - 1, factor)


def codes_beside(row: Row, factor: FloatArray, wanted: FloatArray, each_side: int = 1) -> IntArray:
    """Return the codes next to a wanted value, exactly, shape (devices, 2 each_side).

    First those at or below it, nearest first, then those above. Where one side has too few, its place is
    taken by the last one of that side, or by the nearest of the other.

    Parameters
    ----------
    row : Row
    factor, wanted : array, shape (devices,)
        What the film is multiplied with, and the value wanted of the leg [ohm].
    each_side : int
    """
    if row.switch_ohms == 0.0:
        return _even_codes_beside(row, factor, wanted, each_side)
    count = 2 ** len(row.bit_ohms)
    found = np.empty((len(factor), 2 * each_side), dtype=np.intp)
    step = max(1, AT_ONCE // count)
    for start in range(0, len(factor), step):
        part = slice(start, start + step)
        off = _table(row, factor[part]) - wanted[part, None]
        below, above = np.where(off <= 0.0, -off, np.inf), np.where(off > 0.0, off, np.inf)
        found[part, :each_side], nearest = _least(below, each_side)
        found[part, each_side:], other = _least(above, each_side)
        lacking, over = ~np.isfinite(nearest), ~np.isfinite(other)
        own = found[part]
        own[lacking, :each_side] = own[lacking, each_side, None]
        own[over, each_side:] = own[over, 0, None]
    return found


def _even_codes_beside(row: Row, factor: FloatArray, wanted: FloatArray, each_side: int) -> IntArray:
    """Return the same where the steps of a device are all alike."""
    at = np.floor((wanted / factor - row.base_ohms) / row.step_ohms).astype(np.intp)
    moves = np.r_[-np.arange(each_side), 1 + np.arange(each_side)]
    return np.asarray(np.clip(at[:, None] + moves, 0, 2 ** len(row.bit_ohms) - 1))


def _table(row: Row, factor: FloatArray) -> FloatArray:
    """Return the values of all codes, shape (devices, codes)."""
    table = (factor * row.base_ohms)[:, None]
    for unit in row.bit_ohms:
        units = (factor * unit)[:, None]
        table = np.concatenate([table + _bypassed(units, row.switch_ohms), table + units], axis=1)
    return table


def _least(distance: FloatArray, count: int) -> tuple[IntArray, FloatArray]:
    """Return the places of the least distances, least first, and the least one; infinite ones as the last."""
    if count == 1:
        at = np.argmin(distance, axis=1)[:, None]
        return at, np.take_along_axis(distance, at, axis=1)[:, 0]
    some = min(count, distance.shape[1])
    at = np.argpartition(distance, some - 1, axis=1)[:, :some]
    own = np.take_along_axis(distance, at, axis=1)
    order = np.argsort(own, axis=1, kind="stable")
    at, own = np.take_along_axis(at, order, axis=1), np.take_along_axis(own, order, axis=1)
    last = np.maximum(np.isfinite(own).sum(axis=1) - 1, 0)[:, None]
    places = np.minimum(np.arange(count)[None, :], last)
    return np.take_along_axis(at, places, axis=1), own[:, 0]
