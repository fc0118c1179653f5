"""Raising the drive from zero along the stable branch, as far as there is one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray
from tcplan.operating.device import Device, State, correction, stable, state_of

ITERATIONS = 20
CLOSE = 1e-11  # of ln R: Newton's next step would be its square
FAR = 0.1  # of ln R in one step of the drive: a larger one could reach another branch
FINEST = 1e-7  # of the drive: how near to its limit it is followed
LEAST = 1e-12  # of the drive: below it none is possible
MOST_STEPS = 3000


@dataclass(frozen=True, slots=True)
class Raised:
    """Where raising the drive ended.

    ``part`` is 1 when the whole drive is reached, else the largest part that is; ``state`` belongs to
    it, and ``stuck`` says at which temperatures there was no going on.
    """

    part: float
    state: State
    stuck: BoolArray


def raised(device: Device, T: FloatArray, drive: float) -> Raised:
    """Return the state at a drive, reached from zero without leaving the stable branch.

    The drive grows by steps that halve when Newton's method does not settle nearby, when the solution
    is not stable, or when a leaf leaves the temperatures that its material is usable for, and double
    otherwise. So the limit is found by halving, too.

    Parameters
    ----------
    device : Device
    T : array, shape (T,)
        Ambient temperatures [K], inside what every material is usable for.
    drive : float
        Voltage [V] or current [A].
    """
    with np.errstate(all="ignore"):
        x = device.cold(T)
        state, stuck = state_of(device, T, 0.0, x), np.zeros(len(T), dtype=bool)
        part, step = 0.0, 1.0
        for _ in range(MOST_STEPS):
            aim = min(1.0, part + step)
            found, next_x, bad = _settled(device, T, aim * drive, x)
            if bad.any():
                stuck, step = bad, 0.5 * step
                if step < max(FINEST * part, LEAST):
                    break
                continue
            part, x, state, step = aim, next_x, found, 2.0 * step
            if part >= 1.0:
                return Raised(1.0, state, np.zeros(len(T), dtype=bool))
    return Raised(part, state, stuck)


def _settled(
    device: Device, T: FloatArray, drive: float, start: FloatArray
) -> tuple[State, FloatArray, BoolArray]:
    """Return the solution near a start by Newton's method, and at which temperatures there is none."""
    x = start
    state = state_of(device, T, drive, x)
    for _ in range(ITERATIONS):
        try:
            step = correction(state)
        except np.linalg.LinAlgError:
            return state, x, np.ones(len(T), dtype=bool)
        lost = np.asarray(~(np.abs(x + step - start) <= FAR).all(axis=0))  # not a number is lost, too
        if lost.any():
            return state, x, lost
        x = x + step
        state = state_of(device, T, drive, x)
        open_ = np.asarray((np.abs(step) > CLOSE).any(axis=0))
        if not open_.any():
            return state, x, _unfit(device, state)
    return state, x, open_


def _unfit(device: Device, state: State) -> BoolArray:
    """Return at which temperatures a solution does not count."""
    wrong = np.asarray(~np.isfinite(state.missing).all(axis=0) | state.outside.any(axis=0))
    return wrong if wrong.any() else ~stable(device, state)
