"""What the solver needs of a model: value, derivatives, start, and the way to the parameters by name."""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import ClassVar

from tcplan.arrays import FloatArray
from tcplan.material.law import Law


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Named:
    """Parameters as they are reported, and their derivatives for those that were solved for."""

    names: tuple[str, ...]
    values: FloatArray
    jacobian: FloatArray


class Curve(ABC):
    """R(T) [ohm] with parameters ``theta`` that least squares solves for.

    ``relative`` says what is alike at every temperature when no uncertainty is stated: the scatter
    relative to R (laws over which R changes many times), or the scatter in ohm. ``last`` is whether the last
    parameter is a term that can be left out.
    """

    linear: ClassVar[bool]
    relative: ClassVar[bool] = False
    last: ClassVar[bool] = False
    count: int

    @abstractmethod
    def value(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return R(T) [ohm], shape (reading,); not finite where theta is not allowed."""

    @abstractmethod
    def jacobian(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return dR/dtheta, shape (reading, parameter)."""

    @abstractmethod
    def slope(self, theta: FloatArray, T: FloatArray) -> FloatArray:
        """Return dR/dT [ohm/K], shape (reading,)."""

    @abstractmethod
    def start(self, T: FloatArray, R: FloatArray) -> FloatArray:
        """Return parameters to start from; linear curves need none and return zeros."""

    @abstractmethod
    def named(self, theta: FloatArray) -> Named:
        """Return the parameters by name, "R" at the reference first, and d(named)/dtheta."""

    @abstractmethod
    def law(self, theta: FloatArray) -> Law:
        """Return R(T)/R(reference)."""
