"""What is to be fitted: sweeps, each of one material, their common errors, and what spread is wanted."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

from tcplan.material.spread import Meaning
from tcplan.measure.block import Size
from tcplan.measure.fit import ModelName
from tcplan.measure.fit_laws import Formula
from tcplan.measure.model import CommonErrors
from tcplan.measure.population import CONFIDENCE, COVERAGE
from tcplan.ranges import REFERENCE


@dataclass(frozen=True, slots=True, kw_only=True)
class SweepRequest:
    """One material and the file of its readings.

    Parameters
    ----------
    name : str
        Of the material.
    file : Path
    source : str
        Where the readings come from; it becomes the source of the material.
    label : str, optional
    model : ModelName or Formula
    order : int, optional
        Of a polynomial; None takes 2, or 1 where no device has readings for it.
    reference : float
        Of the law [K].
    size : Size, optional
        What the devices are made of.
    exclude : tuple of int
        Lines of readings that are left out.
    """

    name: str
    file: Path
    source: str
    label: str | None = None
    model: ModelName | Formula = "polynomial"
    order: int | None = None
    reference: float = REFERENCE
    size: Size | None = None
    exclude: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class SpreadRules:
    """What the stated spread means: limits that hold ``coverage`` of all devices, or a standard deviation."""

    meaning: Meaning = "limits"
    coverage: float = COVERAGE
    confidence: float = CONFIDENCE


@dataclass(frozen=True, slots=True, kw_only=True)
class FitRequest:
    """All sweeps that are fitted together: films of one campaign share its errors, and may share lots.

    ``same_devices`` is whether devices of equal name in the sweeps are the same pieces, of the same lots.
    """

    sweeps: tuple[SweepRequest, ...]
    errors: CommonErrors = field(default_factory=CommonErrors)
    spread: SpreadRules = field(default_factory=SpreadRules)
    same_devices: bool = False
