"""The equations of a network under power, their derivatives, and whether a solution is stable.

The unknown is x_j = ln R_j of every leaf. With the resistances the network divides its voltage; with the
voltages come the powers, with these the temperatures, and with all of them the resistances again:

    x_j = ln R_j(T_ref) + ln r_j(T + rise_j) + ln(1 + k_j V_j),    rise_j = sum over i of Q_ji P_i
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import BoolArray, FloatArray
from tcplan.material.model import Material
from tcplan.network import Network, legs
from tcplan.operating.division import Division, divide

EDGE = 1e-9  # K; rounding of temperatures


@dataclass(frozen=True, slots=True, kw_only=True)
class Device:
    """A network of leaves with their materials.

    ``per_volt`` is the voltage coefficient across each whole leaf [1/V], shape (leaf,); ``heating`` the
    rise of each leaf by the power of each other [K/W], shape (leaf, leaf). ``by_voltage`` is whether the
    drive is a voltage [V], else it is a current [A].
    """

    network: Network
    materials: tuple[Material, ...]
    reference: float
    per_volt: FloatArray
    heating: FloatArray
    by_voltage: bool

    def cold(self, T: FloatArray) -> FloatArray:
        """Return ln R of every leaf without power, shape (leaf, T)."""
        return np.log(self.ohms)[:, None] + self._log_ratios(np.broadcast_to(T, (len(self.ohms), len(T))))

    @property
    def ohms(self) -> FloatArray:
        """Of every leaf at the reference [ohm]."""
        return np.array([leg.ohms for leg in legs(self.network)])

    @property
    def usable(self) -> tuple[FloatArray, FloatArray]:
        """Lowest and highest temperature of every leaf [K], shape (leaf, 1)."""
        low, high = zip(*(material.usable for material in self.materials), strict=True)
        return np.array(low)[:, None], np.array(high)[:, None]

    def inside(self, temperatures: FloatArray) -> FloatArray:
        """Return temperatures [K] kept inside what is usable: no law is asked for more."""
        low, high = self.usable
        return np.asarray(np.clip(temperatures, low, high))

    def _log_ratios(self, temperatures: FloatArray) -> FloatArray:
        rows = zip(self.materials, self.inside(temperatures), strict=True)
        return np.log(np.stack([material.ratio(row, self.reference) for material, row in rows]))

    def _slopes(self, temperatures: FloatArray) -> FloatArray:
        rows = zip(self.materials, self.inside(temperatures), strict=True)
        return np.stack([material.slope(row) for material, row in rows])


@dataclass(frozen=True, slots=True)
class State:
    """Everything that follows from ln R of the leaves, with derivatives by it; shapes as in `Division`."""

    division: Division
    voltage: FloatArray
    power: FloatArray
    temperature: FloatArray
    heats: FloatArray  # d rise_j/d x_k
    steers: FloatArray  # d ln(1 + k_j V_j)/d x_k
    slopes: FloatArray
    missing: FloatArray  # the right side of the equations minus the left
    outside: BoolArray


def state_of(device: Device, T: FloatArray, drive: float, x: FloatArray) -> State:
    """Return the state of a device at ambient temperatures T [K] with ln R of its leaves (leaf, T)."""
    division = divide(device.network, np.exp(x))
    whole = drive if device.by_voltage else drive * division.ohms
    voltage = whole * division.fractions
    moves = division.moves if device.by_voltage else division.moves + division.shares
    power = voltage**2 * np.exp(-x)
    gains = 2.0 * moves - np.eye(len(x))[:, :, None]  # d ln P_j/d x_k
    temperature = T + device.heating @ power
    stretch = 1.0 + device.per_volt[:, None] * voltage
    cold = np.log(device.ohms)[:, None] + device._log_ratios(temperature)
    low, high = device.usable
    return State(
        division,
        voltage,
        power,
        temperature,
        np.einsum("jl,lt,lkt->jkt", device.heating, power, gains),
        (device.per_volt[:, None] * voltage / stretch)[:, None] * moves,
        device._slopes(temperature),
        cold + np.log(stretch) - x,
        (temperature < low - EDGE) | (temperature > high + EDGE),
    )


def correction(state: State) -> FloatArray:
    """Return the step of Newton's method, shape (leaf, T)."""
    whole = _by_T(state.steers + state.slopes[:, None] * state.heats)
    right = np.moveaxis(state.missing, -1, 0)[..., None]
    step = np.asarray(np.linalg.solve(np.eye(whole.shape[-1]) - whole, right), dtype=np.float64)
    return np.moveaxis(step[..., 0], 0, -1)


def stable(device: Device, state: State) -> BoolArray:
    """Return at which temperatures a solution stays: heat grows less than what it takes, shape (T,).

    With the electrical equations solved, x moves by (1 - B)^-1 S with the rises, S being the slopes and B
    the voltage coefficients' part. All eigenvalues of d(heat)/d(rise), and before them those of B, have
    to be below 1 in their real part; for one common rise this is 1 - d(heat)/d(rise) > 0.
    """
    found = np.ones(state.power.shape[-1], dtype=bool)
    steers = _by_T(state.steers)
    if device.per_volt.any():
        found &= np.linalg.eigvals(steers).real.max(axis=-1) < 1.0
    if device.heating.any():
        slopes = np.moveaxis(state.slopes, -1, 0)[:, :, None] * np.eye(len(state.slopes))
        moved = np.linalg.solve(np.eye(len(state.slopes)) - steers, slopes)
        found &= np.linalg.eigvals(_by_T(state.heats) @ moved).real.max(axis=-1) < 1.0
    return found


def _by_T(table: FloatArray) -> FloatArray:  # noqa: N802 - T is the temperature
    """Return (j, k, T) as (T, j, k)."""
    return np.moveaxis(table, -1, 0)
