"""Trim by codes: at one temperature, which restores mix and value, and at two, which also nulls a slope."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.errors import InputError, Problem
from tcplan.material.spread import law_bounds
from tcplan.network import legs
from tcplan.parts.trim.bits import code_ohms
from tcplan.parts.trim.coded import coded_drift, coded_network
from tcplan.parts.trim.codes import (
    TwoPoints,
    leg_factor,
    leg_ohms,
    one_temperature_codes,
    perfect_pair,
    two_temperature_codes,
    with_legs,
)
from tcplan.parts.trim.devices import stat, whole
from tcplan.parts.trim.members import Member, trimmed
from tcplan.parts.trim.model import Reached, Row, Stat, TrimPlan
from tcplan.parts.trim.sizing import row_for
from tcplan.parts.trim.task import Task

LEAST_DIFFERENCE = 1e-6  # 1/K, between the TC1 of two legs
MOST_MOVE = 0.9  # of a leg, which a slope may ask for


def one_temperature(task: Task) -> TrimPlan:
    """Return a trim by codes that are chosen from the values of the films at the reference."""
    members = tuple(m for m in trimmed(task.members) if m.half_width > 0.0)
    if not members:
        raise InputError(_no_range_problem())
    others = _others(task, members)
    rows = tuple(_row(task, member, others) for member in members)
    chosen = one_temperature_codes(task.devices, members, rows, task.target)
    leaves = task.devices.ohms([task.need.reference])[0]
    return TrimPlan(
        method="one-temperature",
        target_ohms=task.target,
        draws=task.draws,
        seed=task.seed,
        before=task.reached(task.devices.drift(np.ones(leaves.shape)), leaves, members),
        after=_after(task, members, rows, chosen.codes),
        perfect=_perfect(task, members, chosen.exact),
        rows=rows,
        out_of_codes=float(np.mean(chosen.out)),
        ideal_switches=_ideal_switches(task, rows, chosen.codes),
    )


def two_temperatures(task: Task) -> TrimPlan:
    """Return a trim by codes of two legs, chosen from the values at the reference and at another temperature.

    The two legs are those whose TC1 differ most.
    """
    if task.trim.temperatures is None:
        raise ValueError("no temperatures")
    reference = task.need.reference
    other = next(t for t in task.trim.temperatures if t != reference)
    members = _most_different(task)
    first, second = _slope_rows(task, members, other)
    leaves = task.devices.ohms([reference, other])
    points = TwoPoints(
        devices=task.devices,
        members=members,
        rows=(first, second),
        leaves=(leaves[0], leaves[1]),
        target=task.target,
        goal=task.wanted_ratio(other),
        switch=1.0 + task.trim.switch_tc1 * (other - reference),
    )
    chosen = two_temperature_codes(points)
    drift = task.devices.drift(np.ones(leaves[0].shape))
    chord = _chord(task, leaves[0], leaves[1], other)
    return TrimPlan(
        method="two-temperatures",
        target_ohms=task.target,
        draws=task.draws,
        seed=task.seed,
        before=task.reached(drift, leaves[0], members, chord),
        after=_after(task, members, points.rows, chosen.codes, other),
        perfect=_perfect(task, members, perfect_pair(points), other),
        rows=points.rows,
        out_of_codes=float(np.mean(chosen.out)),
        temperatures=task.trim.temperatures,
        ideal_switches=_ideal_switches(task, points.rows, chosen.codes),
    )


def _row(task: Task, member: Member, more: float = 0.0) -> Row:
    trim = task.trim
    return row_for(member, task.wanted_ohms(member), trim.step, trim.switch_resistance, more=more)


def _others(task: Task, members: Sequence[Member]) -> float:
    """Return by how much the legs with bits have to move for the spread of all others, as a fraction."""
    own = {member.id for member in members}
    spread = sum(member.share * member.half_width for member in task.members if member.id not in own)
    return min(MOST_MOVE, spread / sum(member.share for member in members))


# --- what is reached ------------------------------------------------------------------------------------


def _after(
    task: Task,
    members: Sequence[Member],
    rows: Sequence[Row],
    codes: Sequence[IntArray],
    other: float | None = None,
) -> Reached:
    """Return what devices reach with their codes, switches included."""
    reference, tc1 = task.need.reference, task.trim.switch_tc1
    drift = _drift(task, rows, codes)

    def values(temperature: float) -> list[FloatArray]:
        leaves = task.devices.ohms([temperature])[0]
        switch = 1.0 + tc1 * (temperature - reference)
        own = [
            code_ohms(row, code, leg_factor(leaves, m), row.switch_ohms * switch)
            for row, code, m in zip(rows, codes, members, strict=True)
        ]
        return with_legs(leaves, members, own)

    first = values(reference)
    chord = None if other is None else _chord(task, first, values(other), other)
    return task.reached(drift, first, members, chord)


def _drift(task: Task, rows: Sequence[Row], codes: Sequence[IntArray]) -> FloatArray:
    """Return the judged drift of devices with their codes."""
    reference, tc1 = task.need.reference, task.trim.switch_tc1
    coded = coded_network(task.network, task.members, rows, task.materials, tc1, reference)
    return coded_drift(task.devices, coded, rows, codes)


def _ideal_switches(task: Task, rows: Sequence[Row], codes: Sequence[IntArray]) -> Stat | None:
    """Return the drift of the same devices with the same codes, were the switches of 0 ohm."""
    if task.trim.switch_resistance == 0.0:
        return None
    return stat(_drift(task, [replace(row, switch_ohms=0.0) for row in rows], codes))


def _perfect(task: Task, members: Sequence[Member], exact: FloatArray, other: float | None = None) -> Reached:
    """Return what devices reach with codes as fine as one likes, and no switches."""
    leaves = task.devices.ohms([task.need.reference])[0]
    own = [value / leg_ohms(leaves, m) for m, value in zip(members, exact, strict=True)]
    factors = task.factors(members, own)
    chord = None
    if other is not None:
        chord = _chord(task, leaves * factors, task.devices.ohms([other])[0] * factors, other)
    return task.reached(task.devices.drift(factors), leaves * factors, members, chord)


def _chord(task: Task, first: Sequence[FloatArray], second: Sequence[FloatArray], other: float) -> FloatArray:
    """Return what is left of the slope between the reference and another temperature [1/K]."""
    ratio = whole(task.network, second) / whole(task.network, first)
    return np.asarray((ratio - task.wanted_ratio(other)) / (other - task.need.reference))


# --- the two legs ---------------------------------------------------------------------------------------


def _most_different(task: Task) -> tuple[Member, Member]:
    """Return the two legs of different films whose TC1 differ most."""
    candidates = trimmed(task.members)
    slopes = {member.id: _leg_tc1(task, member) for member in candidates}
    pairs = list(itertools.combinations(candidates, 2))
    best = max(pairs, key=lambda pair: abs(slopes[pair[0].id] - slopes[pair[1].id]), default=None)
    if best is None or abs(slopes[best[0].id] - slopes[best[1].id]) < LEAST_DIFFERENCE:
        raise InputError(
            Problem(
                where="trim.method",
                found="two-temperatures without two films of different TC1",
                expected="two films whose TC1 differ",
                todo='Write method = "one-temperature", or add a film of another TC1.',
            )
        )
    return best


def _leg_tc1(task: Task, member: Member) -> float:
    """Return the TC1 of a film leg at the reference [1/K], its ends included."""
    own = legs(task.network)
    terms = [
        own[k].ohms * task.materials[own[k].material].referred_taylor(task.need.reference, 1)[0]
        for k in member.leaves
    ]
    return sum(terms) / member.ohms


def _slope_rows(task: Task, members: tuple[Member, Member], other: float) -> tuple[Row, Row]:
    """Return the bits of the two legs; sized again with what the switches of the first ones add."""
    change = task.trim.switch_resistance * abs(task.trim.switch_tc1 * (other - task.need.reference))
    rows = _moved_rows(task, members, other, 0.0)
    switches = sum(
        member.share * len(row.bit_ohms) * change / row.wanted_ohms
        for member, row in zip(members, rows, strict=True)
    )
    return _moved_rows(task, members, other, switches) if switches else rows


def _moved_rows(task: Task, members: tuple[Member, Member], other: float, switches: float) -> tuple[Row, Row]:
    """Return the bits of the two legs for a drift of the switches, as a fraction of the whole."""
    moves, others = _slope_moves(task, members, other, switches), _others(task, members)
    first, second = (
        _row(task, m, more=min(MOST_MOVE, more + others)) for m, more in zip(members, moves, strict=True)
    )
    return first, second


def _slope_moves(
    task: Task, members: tuple[Member, Member], other: float, switches: float
) -> tuple[float, float]:
    """Return by how much each of the two legs has to move to null the slope, as fractions.

    To first order: a mix that shifts a part s of the whole from one leg to the other moves the drift at
    the other temperature by s times the difference of their own. The drift to be nulled is the nominal one
    with the limits of all laws and what the switches add.
    """
    at = np.array([other])
    to_null = abs(_nominal_drift(task, other)) + switches
    for member in task.members:
        for k in member.leaves:
            leaf = legs(task.network)[k]
            law, spread = task.materials[leaf.material].law, task.spreads[leaf.material]
            low, high = law_bounds(law, spread, task.need.reference, at)
            part = leaf.ohms / member.ohms * member.share
            to_null += part * 0.5 * float((high - low)[0])
    apart = abs(_leg_ratio(task, members[0], other) - _leg_ratio(task, members[1], other))
    first, second = (min(MOST_MOVE, to_null / max(apart, 1e-12) / member.share) for member in members)
    return first, second


def _leg_ratio(task: Task, member: Member, temperature: float) -> float:
    at, own = np.array([temperature]), legs(task.network)
    terms = [
        own[k].ohms * float(task.materials[own[k].material].ratio(at, task.need.reference)[0])
        for k in member.leaves
    ]
    return sum(terms) / member.ohms


def _nominal_drift(task: Task, temperature: float) -> float:
    at, own = np.array([temperature]), legs(task.network)
    leaves = [leaf.ohms * task.materials[leaf.material].ratio(at, task.need.reference) for leaf in own]
    first = whole(task.network, [np.array([leaf.ohms]) for leaf in own])
    return float((whole(task.network, leaves) / first)[0]) - task.wanted_ratio(temperature)


def _no_range_problem() -> Problem:
    return Problem(
        where="trim",
        found="films whose values have a spread of zero",
        expected="a value that can be off, else there is nothing to trim",
        todo="Remove [trim], or state the spread of the values.",
    )
