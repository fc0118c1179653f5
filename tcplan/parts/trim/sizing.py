"""The bits of a leg: how many, and how large, so that the codes cover its spread in small enough steps.

Clearing a bit closes the switch across its unit r: what it takes away is d = r^2/(r + S), with S the
resistance of the switch. With d_k no more than all lower ones together and the step, no two neighbouring
values of codes are farther apart than the step. Switches do not move with the film, so that has to hold in
every device: it is kept in the nominal one and in those at both limits of the leg.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from tcplan.errors import InputError, Problem
from tcplan.made import MOST_COUNT
from tcplan.parts.trim.bits import Factor, largest_gap
from tcplan.parts.trim.drawing import Drawing, Free, Limit, Piece
from tcplan.parts.trim.members import Member
from tcplan.parts.trim.model import Row
from tcplan.units import format_ohms

MOST_BITS = 16
HALVINGS = 200
ROUNDING = 1e-9
_CLOSE = 1e-12  # of the step of a row


@dataclass(frozen=True, slots=True, kw_only=True)
class _Sized:
    """Bits of a step [ohm], the rest of the leg, and by how much they cover more than is wanted [ohm]."""

    base: Piece
    bits: tuple[Piece, ...]
    excess: float


@dataclass(frozen=True, slots=True, kw_only=True)
class _Wish:
    """A leg, the values that its codes restore [ohm], and its switches [ohm]."""

    member: Member
    wanted: float
    lowest: float
    highest: float
    switch: float

    @property
    def drawing(self) -> Drawing:
        return self.member.strip or Free()

    def ohms(self, step: float) -> float:
        """Return the step of the leg [ohm] for one of the whole, as a fraction."""
        return step * self.wanted / self.member.share


def row_for(member: Member, wanted: float, step: float, switch: float, *, more: float = 0.0) -> Row:
    """Return the row of fewest bits that covers the spread of a leg in small enough steps.

    Parameters
    ----------
    member : Member
        With its limits and its share.
    wanted : float
        Value that the codes restore [ohm], in every device within its limits.
    step : float
        The largest gap between codes that is allowed, of the whole, as a fraction.
    switch : float
        Of a switch that is on [ohm].
    more : float
        By how much the wanted value itself may move to both sides, as a fraction.

    Raises
    ------
    InputError
        When 16 bits are too coarse or the bits too small to draw, with the step that can be had, or the
        bits leave nothing of the leg.
    """
    wish = _Wish(
        member=member,
        wanted=wanted,
        lowest=wanted * (1.0 - more),
        highest=wanted * (1.0 + more),
        switch=switch,
    )
    for count in range(1, MOST_BITS + 1):
        if _sized(wish, count, wish.ohms(step * (1.0 + ROUNDING))).excess >= 0.0:
            sized = _just_covering(wish, count, wish.ohms(step * (1.0 + ROUNDING)))
            if max(bit.strings for bit in sized.bits) > MOST_COUNT:
                raise InputError(_strings_problem(wish, step, count, sized))
            return _row(wish, sized)
    finest = _row(wish, _just_covering(wish, MOST_BITS, wanted))
    found = f"{step * 1e6:g} ppm, for which {MOST_BITS} bits on leg {member.id} are not enough"
    raise InputError(_step_problem(found, finest.gap))


def _just_covering(wish: _Wish, count: int, high: float) -> _Sized:
    """Return so many bits of the least step that cover the spread, from one [ohm] that may do."""
    low = 0.0
    found = _sized(wish, count, high)
    for _ in range(HALVINGS):
        if found.excess >= 0.0:
            break
        low, high = high, 2.0 * high
        found = _sized(wish, count, high)
    while high - low > _CLOSE * high:
        middle = 0.5 * (low + high)
        now = _sized(wish, count, middle)
        if now.excess >= 0.0:
            found, high = now, middle
        else:
            low = middle
    if not wish.drawing.fits(found.base):
        raise InputError(_rest_problem(wish, count))
    return found


def _sized(wish: _Wish, count: int, step: float) -> _Sized:
    """Return so many bits of a step [ohm], each as large as the lower ones and the step allow.

    The rest of the leg is that with which the highest device, all bits cleared, has the lowest value.
    """
    limits, switch = wish.member.limits, wish.switch
    taken = [0.0] * len(limits)
    bits = []
    for _ in range(count):
        most = [(limit, _unit(below + step, switch)) for limit, below in zip(limits, taken, strict=True)]
        bits.append(wish.drawing.bit(most))
        taken = [b + _taken(bits[-1].at(limit), switch) for limit, b in zip(limits, taken, strict=True)]
    low, high = limits[0], limits[-1]
    set_high = sum(bit.at(high) for bit in bits)
    base = wish.drawing.base(high, wish.lowest - (set_high - taken[-1]))
    excess = base.at(low) + sum(bit.at(low) for bit in bits) - wish.highest
    return _Sized(base=base, bits=tuple(bits), excess=excess)


def _unit(taken: float, switch: float) -> float:
    """Return the unit whose clearing takes so much away [ohm]: the root of r^2 = d (r + S)."""
    return 0.5 * (taken + math.sqrt(taken * (taken + 4.0 * switch)))


def _taken(unit: float, switch: float) -> float:
    return unit * unit / (unit + switch)


def _row(wish: _Wish, sized: _Sized) -> Row:
    member, drawing = wish.member, wish.drawing
    ohms = [bit.body + bit.ends for bit in sized.bits]
    per_ohm = member.share / wish.wanted
    least = _taken(ohms[0], wish.switch)
    drawn = [one for bit in sized.bits if (one := drawing.drawn(bit)) is not None]
    row = Row(
        leg=member.id,
        material=member.material,
        wanted_ohms=wish.wanted,
        base_ohms=sized.base.body + sized.base.ends,
        bit_ohms=tuple(ohms),
        switch_ohms=wish.switch,
        step_ohms=least,
        step=per_ohm * least,
        half_width=member.half_width,
        base=drawing.drawn(sized.base),
        bits=tuple(drawn),
    )
    return row.with_gaps(tuple(per_ohm * largest_gap(row, _factor(limit)) for limit in member.limits))


def _factor(limit: Limit) -> Factor:
    return Factor.of(*limit)


# --- what can not be had --------------------------------------------------------------------------------


def _step_problem(found: str, gap: float) -> Problem:
    least = math.ceil(gap * 1e6 * 100.0) / 100.0
    return Problem(
        where="trim.step",
        found=found,
        expected=f"{least:g} ppm or more",
        todo=f'Write step = "{least:g} ppm", or use a film with less spread.',
    )


def _strings_problem(wish: _Wish, step: float, count: int, sized: _Sized) -> Problem:
    """Return that the least bit can not be drawn, with the step of the most bits that can."""
    found = (
        f"{step * 1e6:g} ppm, for which the least bit of leg {wish.member.id} is "
        f"{max(bit.strings for bit in sized.bits)} squares in parallel, more than {MOST_COUNT}"
    )
    for fewer in range(count - 1, 0, -1):
        sized = _just_covering(wish, fewer, wish.wanted)
        if max(bit.strings for bit in sized.bits) <= MOST_COUNT:
            break
    return _step_problem(found, _row(wish, sized).gap)


def _rest_problem(wish: _Wish, count: int) -> Problem:
    leg = f"leg {wish.member.id}, {format_ohms(wish.wanted)}"
    if count * wish.switch >= wish.wanted:
        return Problem(
            where="trim.switch_resistance",
            found=f"{format_ohms(wish.switch)}: with {count} bits the switches alone exceed {leg}",
            expected="switches that are small beside the leg",
            todo="Use larger switches, or a coarser step.",
        )
    return Problem(
        where="trim",
        found=f"{leg}: {count} bits leave less than a square of it",
        expected="bits that are small beside the leg",
        todo="Use larger switches, a coarser step, or a film with less spread.",
    )
