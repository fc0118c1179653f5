"""Codes of every device: chosen at one temperature, or at two."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.parts.trim.bits import Factor, code_ohms, codes_beside, ends
from tcplan.parts.trim.devices import Devices, whole
from tcplan.parts.trim.members import Member
from tcplan.parts.trim.model import Row

STEPS = 40
EACH_SIDE = 8
"""Codes on each side of the exact answer, on either leg, among which those at two temperatures are chosen."""
AT_ONCE = 1 << 18  # pairs of codes in memory
_FAR = 3.0  # of the logarithm of a leg over its wanted value
_CLOSE = 1e-12


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Chosen:
    """What is chosen for every device.

    ``codes`` has an array (devices,) a row; ``exact`` (rows, devices) are the values [ohm] that codes as
    fine as one likes would give the legs; ``out`` says of which devices the bits do not reach.
    """

    codes: tuple[IntArray, ...]
    exact: FloatArray
    out: BoolArray


def with_legs(leaves: FloatArray, members: Sequence[Member], ohms: Sequence[FloatArray]) -> list[FloatArray]:
    """Return the values of all leaves [ohm], some legs having the values given: the body has it all."""
    found = list(leaves)
    for member, own in zip(members, ohms, strict=True):
        found[member.leaves[0]] = own
        for k in member.leaves[1:]:
            found[k] = np.zeros(1)
    return found


def leg_ohms(leaves: FloatArray, member: Member) -> FloatArray:
    """Return the value of a film leg [ohm]: its body and its ends."""
    return np.asarray(leaves[list(member.leaves)].sum(axis=0))


def leg_factor(leaves: FloatArray, member: Member) -> Factor:
    """Return what the body and the ends of a film leg are multiplied with."""
    own = [leaves[k] / ohms for k, ohms in zip(member.leaves, member.parts, strict=True)]
    return Factor(body=own[0], ends=own[-1])


# --- at one temperature ---------------------------------------------------------------------------------


def restored(
    devices: Devices, leaves: FloatArray, members: Sequence[Member], wanted: Sequence[float], target: float
) -> FloatArray:
    """Return the common factor of the wanted values of some legs that brings the whole to its target.

    Parameters
    ----------
    devices : Devices
    leaves : array, shape (leaves, devices)
        Values at the reference [ohm].
    members, wanted
        The legs and their wanted values [ohm].
    target : float
        [ohm].

    Returns
    -------
    array, shape (devices,)
    """
    factor = np.ones(leaves.shape[1])

    def total(f: FloatArray) -> FloatArray:
        return whole(devices.network, with_legs(leaves, members, [f * own for own in wanted]))

    for _ in range(STEPS):
        now = total(factor)
        slope = (total(factor * (1.0 + 1e-6)) - now) / 1e-6
        move = np.clip((target - now) / slope, -0.5, 0.5)
        factor = np.clip(factor * (1.0 + move), np.exp(-_FAR), np.exp(_FAR))
        if np.abs(move).max() < _CLOSE:
            break
    return factor


def one_temperature_codes(
    devices: Devices, members: Sequence[Member], rows: Sequence[Row], target: float
) -> Chosen:
    """Return the codes that restore the mix, and then the value.

    The legs with bits get one common factor that brings the whole to its target, so the mix between them is
    nominal. Of the codes next to these values, below and above for each leg, the set is taken with which
    the whole is nearest to its target.
    """
    leaves = devices.ohms([devices.need.reference])[0]
    factor = restored(devices, leaves, members, [row.wanted_ohms for row in rows], target)
    exact = np.stack([factor * row.wanted_ohms for row in rows])
    films = [leg_factor(leaves, m) for m in members]
    beside = [codes_beside(row, f, own) for row, f, own in zip(rows, films, exact, strict=True)]
    values = [code_ohms(row, codes, f.each) for row, codes, f in zip(rows, beside, films, strict=True)]
    best: FloatArray = np.full(leaves.shape[1], np.inf)
    picked = [codes[:, 0].copy() for codes in beside]
    for sides in itertools.product((0, 1), repeat=len(rows)):
        own = [value[:, side] for value, side in zip(values, sides, strict=True)]
        error = np.abs(whole(devices.network, with_legs(leaves, members, own)) / target - 1.0)
        better = error < best
        best = np.where(better, error, best)
        for k, side in enumerate(sides):
            picked[k][better] = beside[k][better, side]
    return Chosen(codes=tuple(picked), exact=exact, out=_out(rows, films, exact))


def _out(rows: Sequence[Row], films: Sequence[Factor], exact: FloatArray) -> BoolArray:
    """Return which devices want a value beyond the codes of a leg by more than half a step."""
    out = np.zeros(exact.shape[1], dtype=np.bool_)
    for row, film, own in zip(rows, films, exact, strict=True):
        low, high = ends(row, film)
        half = 0.5 * row.step_ohms
        out |= (own < low - half) | (own > high + half)
    return out


# --- at two temperatures --------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class TwoPoints:
    """What is measured of every device: leaves at the reference and at another temperature [ohm].

    ``goal`` is the wanted ratio between the two, ``switch`` that of a switch.
    """

    devices: Devices
    members: tuple[Member, Member]
    rows: tuple[Row, Row]
    leaves: tuple[FloatArray, FloatArray]
    target: float
    goal: float
    switch: float

    def errors(self, at_reference: list[FloatArray], at_other: list[FloatArray]) -> tuple[FloatArray, ...]:
        """Return how far the whole is off at both temperatures, as fractions."""
        network = self.devices.network
        first = whole(network, at_reference) / self.target - 1.0
        return first, whole(network, at_other) / (self.target * self.goal) - 1.0

    def films(self, which: int) -> list[Factor]:
        """Return what the film of each leg is multiplied with, at one of the temperatures."""
        return [leg_factor(self.leaves[which], m) for m in self.members]

    def ratios(self) -> list[FloatArray]:
        """Return the ratio of each leg as made between the two temperatures."""
        first, other = self.leaves
        return [leg_ohms(other, m) / leg_ohms(first, m) for m in self.members]


def two_temperature_codes(points: TwoPoints) -> Chosen:
    """Return the codes of two legs with which the whole is nearest to its target at both temperatures.

    The two legs are solved for exactly; then of the 8 codes on each side, on either leg, the pair is taken
    whose larger one of the two errors is least. The solution is repeated with the ratios that the legs
    have with these codes, since switches, and the ends of bits, move them.
    """
    films = points.films(0)
    exact = _solved(points, points.ratios())
    aims, codes = exact, _best_pair(points, exact)
    moved = any(row.switch_ohms or row.base is not None for row in points.rows)
    for _ in range(2 if moved else 0):
        own = [_coded_ratio(points, k, code) for k, code in enumerate(codes)]
        aims = _solved(points, own)
        codes = _best_pair(points, aims)
    return Chosen(codes=codes, exact=exact, out=_out(points.rows, films, aims))


def perfect_pair(points: TwoPoints) -> FloatArray:
    """Return the values of the two legs [ohm] with codes as fine as one likes, shape (2, devices)."""
    return _solved(points, points.ratios())


def _coded_ratio(points: TwoPoints, k: int, code: IntArray) -> FloatArray:
    row = points.rows[k]
    at_other = code_ohms(row, code, points.films(1)[k], row.switch_ohms * points.switch)
    return np.asarray(at_other / code_ohms(row, code, points.films(0)[k]))


def _solved(points: TwoPoints, ratios: Sequence[FloatArray]) -> FloatArray:
    """Return the values of the legs [ohm] that null both errors, by Newton's method on their logarithms."""
    wanted = np.array([row.wanted_ohms for row in points.rows])[:, None]
    logs = np.zeros((2, points.leaves[0].shape[1]))

    def errors(x: FloatArray) -> FloatArray:
        own = list(np.exp(x) * wanted)
        other = [leg * ratio for leg, ratio in zip(own, ratios, strict=True)]
        first = with_legs(points.leaves[0], points.members, own)
        return np.stack(points.errors(first, with_legs(points.leaves[1], points.members, other)))

    for _ in range(STEPS):
        now = errors(logs)
        move = _newton(errors, logs, now)
        logs = np.clip(logs + np.clip(move, -0.3, 0.3), -_FAR, _FAR)
        if np.abs(move).max() < _CLOSE:
            break
    return np.asarray(np.exp(logs) * wanted)


def _newton(errors: Callable[[FloatArray], FloatArray], logs: FloatArray, now: FloatArray) -> FloatArray:
    tiny = 1e-6
    a = (errors(logs + np.array([[tiny], [0.0]])) - now) / tiny
    b = (errors(logs + np.array([[0.0], [tiny]])) - now) / tiny
    determinant = a[0] * b[1] - a[1] * b[0]
    safe = np.where(np.abs(determinant) < 1e-300, 1e-300, determinant)
    first = (b[0] * now[1] - b[1] * now[0]) / safe
    return np.stack([first, (a[1] * now[0] - a[0] * now[1]) / safe])


def _best_pair(points: TwoPoints, aims: FloatArray) -> tuple[IntArray, IntArray]:
    """Return the codes whose larger error is least, among those beside the aims."""
    films = points.films(0)
    beside = [
        codes_beside(row, film, aim, EACH_SIDE)
        for row, film, aim in zip(points.rows, films, aims, strict=True)
    ]
    values = []
    for which, switch in ((0, 1.0), (1, points.switch)):
        values.append(
            [
                code_ohms(row, codes, film.each, row.switch_ohms * switch)
                for row, codes, film in zip(points.rows, beside, points.films(which), strict=True)
            ]
        )
    count, width = beside[0].shape
    found = np.empty(count, dtype=np.intp)
    step = max(1, AT_ONCE // width**2)
    for start in range(0, count, step):
        part = slice(start, start + step)
        sides = [
            with_legs(
                points.leaves[which][:, part, None, None],
                points.members,
                [values[which][0][part, :, None], values[which][1][part, None, :]],
            )
            for which in (0, 1)
        ]
        first, second = points.errors(*sides)
        worst = np.maximum(np.abs(first), np.abs(second))
        found[part] = np.argmin(worst.reshape(len(worst), -1), axis=1)
    one, other = np.divmod(found, width)
    devices = np.arange(count)
    return beside[0][devices, one], beside[1][devices, other]
