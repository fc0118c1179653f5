"""Trim by cuts, which only raise a value: how far below target a leg is drawn, and which leg is cut.

With D the half-width of a value as limits, a leg drawn at 1/(1 + D) of its target is never above it, and
the lowest device then needs a gain of (1 + D)/(1 - D). Where only one leg is cut, it has to cover the
spread of the whole: its own aim and gain are those with which the highest device is just on target
uncut, and the lowest one can still be brought there.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from tcplan.arrays import BoolArray, FloatArray
from tcplan.errors import InputError, Problem
from tcplan.network import legs, value
from tcplan.parts.trim.codes import restored
from tcplan.parts.trim.devices import needed, swing, whole
from tcplan.parts.trim.members import Member, leaf_half_widths, trimmed
from tcplan.parts.trim.model import Cut, Reached, TrimPlan
from tcplan.parts.trim.task import Task

SLOPE_STEP = 0.1  # K, for TC1 by differences
SHARE_STEP = 1e-5


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Candidate:
    """Legs that may be cut, what they are drawn to, their gains, and the wanted body values of devices."""

    members: tuple[Member, ...]
    aims: tuple[float, ...]
    gains: tuple[float, ...]
    wanted: Callable[[FloatArray], tuple[FloatArray, ...]]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Tried:
    """A candidate with its devices, before and after."""

    cut: Cut
    before: Reached | None = None

    @property
    def worst(self) -> float:
        """The worst drift after the cut."""
        return math.inf if self.cut.reached is None else self.cut.reached.drift.worst


def cut(task: Task) -> TrimPlan:
    """Return a trim by cuts; the leg is cut with which the worst drift is least.

    Every film leg is tried alone, and, where there are several, all of them together. Those together are
    taken only where no leg alone can cover the spread.

    Raises
    ------
    InputError
        When every gain is more than a cut may add.
    """
    films = tuple(member for member in task.members if member.film) or trimmed(task.members)
    tried = [_tried(task, _alone(task, member)) for member in films]
    if len(films) > 1:
        tried.append(_tried(task, _together(task, films)))
    possible = [one for one in tried if one.cut.feasible]
    if not possible:
        raise InputError(_gain_problem(task, [one.cut for one in tried]))
    best = min(possible, key=lambda one: (len(one.cut.legs) > 1, one.worst))
    if best.before is None or best.cut.reached is None:
        raise ValueError("a cut without devices")
    rest = sorted((one for one in tried if one is not best), key=lambda one: one.worst)
    aim, gain = _of_whole(task)
    return TrimPlan(
        method="cut",
        target_ohms=task.target,
        draws=task.draws,
        seed=task.seed,
        before=best.before,
        after=best.cut.reached,
        cuts=tuple(one.cut for one in (best, *rest)),
        whole_aim=aim,
        whole_gain=gain,
    )


# --- aims and gains -------------------------------------------------------------------------------------


def _limits(task: Task, sign: float) -> list[FloatArray]:
    """Return all leaves at one end of the limits of their values [ohm]."""
    reference = task.need.reference
    widths = list(leaf_half_widths(task.network, task.materials, task.spreads, reference))
    for member in task.members:
        for k in member.leaves:
            widths[k] = (1.0 + widths[k]) * (1.0 + 3.0 * member.mismatch) - 1.0
    own = legs(task.network)
    return [np.array([leaf.ohms * (1.0 + sign * d)]) for leaf, d in zip(own, widths, strict=True)]


def _of_whole(task: Task) -> tuple[float, float]:
    """Return 1/(1 + D) and (1 + D)/(1 - D) of the whole, with the limits of all legs together."""
    high, low = (
        float(whole(task.network, _limits(task, sign))[0]) / value(task.network) for sign in (1.0, -1.0)
    )
    return 1.0 / high, high / low


def _alone(task: Task, member: Member) -> _Candidate:
    """Return one leg that has to cover the spread of the whole."""
    body = member.leaves[0]
    high, low = _limits(task, 1.0), _limits(task, -1.0)
    at_high = float(needed(task.network, high, body, task.target)[0])
    at_low = float(needed(task.network, low, body, task.target)[0])
    aim = max(0.0, at_high / float(high[body][0]))
    gain = at_low / (float(low[body][0]) * aim) if aim > 0.0 else math.inf

    def wanted(leaves: FloatArray) -> tuple[FloatArray, ...]:
        return (needed(task.network, list(leaves), body, task.target),)

    return _Candidate(members=(member,), aims=(aim,), gains=(gain,), wanted=wanted)


def _together(task: Task, films: tuple[Member, ...]) -> _Candidate:
    """Return all film legs, each with the spread of its own, which restores the mix."""
    widths = [member.half_width for member in films]
    scale = [task.wanted_ohms(member) / member.ohms for member in films]

    def wanted(leaves: FloatArray) -> tuple[FloatArray, ...]:
        own = [task.wanted_ohms(member) for member in films]
        factor = restored(task.devices, leaves, films, own, task.target)
        return tuple(
            factor * ohms - leaves[list(member.leaves[1:])].sum(axis=0)
            for member, ohms in zip(films, own, strict=True)
        )

    return _Candidate(
        members=films,
        aims=tuple(s / (1.0 + d) for s, d in zip(scale, widths, strict=True)),
        gains=tuple((1.0 + d) / (1.0 - d) for d in widths),
        wanted=wanted,
    )


# --- devices --------------------------------------------------------------------------------------------


def _tried(task: Task, candidate: _Candidate) -> _Tried:
    """Return a candidate with what its devices reach."""
    most = 1.0 + task.trim.largest_cut
    finite = [math.isfinite(gain) for gain in candidate.gains]
    bare = Cut(
        legs=tuple(member.id for member in candidate.members),
        aims=candidate.aims,
        gains=tuple(g if ok else None for g, ok in zip(candidate.gains, finite, strict=True)),
        feasible=all(gain <= most * (1.0 + 1e-9) for gain in candidate.gains),
    )
    if not all(finite):
        return _Tried(cut=bare)
    leaves = task.devices.ohms([task.need.reference])[0]
    drawn = _bodies(task, candidate, candidate.aims)
    factors, above, short = drawn.copy(), np.zeros(task.draws, bool), np.zeros(task.draws, bool)
    for member, ohms in zip(candidate.members, candidate.wanted(leaves), strict=True):
        body = member.leaves[0]
        gain = ohms / (leaves[body] * drawn[body])
        above |= gain < 1.0
        short |= gain > most
        factors[body] *= np.clip(gain, 1.0, most)
    before = task.reached(task.devices.drift(drawn), leaves * drawn, candidate.members)
    after = task.reached(task.devices.drift(factors), leaves * factors, candidate.members)
    return _Tried(cut=_described(task, bare, candidate, factors, after, above, short), before=before)


def _bodies(task: Task, candidate: _Candidate, own: tuple[float, ...]) -> FloatArray:
    """Return what each leaf is multiplied with, the bodies of the legs having their own factor."""
    factors = np.ones(task.devices.mismatch.shape)
    for member, factor in zip(candidate.members, own, strict=True):
        factors[member.leaves[0]] = factor
    return factors


def _described(
    task: Task,
    bare: Cut,
    candidate: _Candidate,
    factors: FloatArray,
    after: Reached,
    above: BoolArray,
    short: BoolArray,
) -> Cut:
    """Return a cut with its mix and slopes after it."""
    reference = task.need.reference
    near = (reference - SLOPE_STEP, reference, reference + SLOPE_STEP)
    at = task.devices.ohms([*near, task.low, task.high]) * factors
    before, here, beyond, cold, hot = (whole(task.network, leaves) for leaves in at)
    moved = at[1].copy()
    moved[list(candidate.members[0].leaves)] *= 1.0 + SHARE_STEP
    share = (whole(task.network, moved) / here - 1.0) / SHARE_STEP
    chords = [
        swing((ohms / here - 1.0) / (end - reference)) if abs(end - reference) > SLOPE_STEP else None
        for ohms, end in ((cold, task.low), (hot, task.high))
    ]
    return replace(
        bare,
        reached=after,
        share=swing(share),
        tc1=swing((beyond - before) / (2.0 * SLOPE_STEP) / here),
        cold_chord=chords[0],
        hot_chord=chords[1],
        above=float(np.mean(above)),
        short=float(np.mean(short)),
    )


def _gain_problem(task: Task, cuts: list[Cut]) -> Problem:
    """Return why no cut is possible, with the least cut that is."""
    allowed = f"{100.0 * task.trim.largest_cut:g} %"
    gains = [(max(own), cut.legs) for cut in cuts if (own := [g for g in cut.gains if g is not None])]
    if not gains:
        return Problem(
            where="trim.largest_cut",
            found="no leg whose cut alone brings every device to its target",
            expected="a leg that covers the spread of the whole",
            todo="Use films with less spread, or trim by codes.",
        )
    gain, names = min(gains)
    least = math.ceil((gain - 1.0) * 1000.0 - 1e-9) / 10.0
    return Problem(
        where="trim.largest_cut",
        found=f"{allowed}, where the least gain that is needed is {gain:.4g} (leg {' and '.join(names)})",
        expected=f"{least:g} % or more",
        todo="Allow a larger cut, or use films with less spread.",
    )
