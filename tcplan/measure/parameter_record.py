"""What a file of parameter lines holds, as plain frozen records in SI units."""

from __future__ import annotations

from dataclasses import dataclass

from tcplan.material.model import Interval, Material
from tcplan.measure.parameter_scopes import Unread


@dataclass(frozen=True, slots=True, kw_only=True)
class ResistorLine:
    """One resistor: its name and line, its value [ohm] where it is understood, and its material if any."""

    name: str
    line: int
    ohms: float | None
    material: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ParameterLines:
    """What a file of parameter lines holds.

    Parameters
    ----------
    source : str
        What the file is called.
    materials : tuple of Material
        One for each model and each different set of coefficients on resistor lines; films where a sheet
        resistance is stated.
    resistors : tuple of ResistorLine
        In the order of the file.
    unread : tuple of Unread
        Statements, or parts of them, that were not understood or do not matter, by line.
    notes : tuple of str
        What a reader should know: names that were changed, capitals that mean milli.
    tnom : float, optional
        Nominal temperature where a line states none [K]; None where the file leaves it open.
    tnom_assumed : bool
        Whether that is the 27 degC of the form, not the file's own.
    valid : (float, float)
        Range of the materials [K]; it is not in the file.
    """

    source: str
    materials: tuple[Material, ...]
    resistors: tuple[ResistorLine, ...]
    unread: tuple[Unread, ...]
    notes: tuple[str, ...]
    tnom: float | None
    tnom_assumed: bool
    valid: Interval

    @property
    def by_name(self) -> dict[str, Material]:
        """The materials by name."""
        return {material.name: material for material in self.materials}
