"""A material: a resistive film, wire or part family with a law R(T), spreads, limits and a source.

Long for a module of this package: what a material is, what it must satisfy and its plain form belong
together.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass, fields, replace
from typing import Any, Literal, get_args

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.law import Law, Table, check_positive, law_from_parameters
from tcplan.material.spread import Spread, spread_from_dict
from tcplan.names import nearest_name, shown
from tcplan.preferred import SERIES
from tcplan.units import format_celsius, format_si

Kind = Literal["film", "wire", "part", "plain"]
Interval = tuple[float, float]
"""(low, high) [K]."""

NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]{0,39}")
LONGEST_LABEL = 120
HOTTEST = 10_000.0
"""No solid is hotter [K]; a temperature beyond is a slip, and would overflow later."""
LONGEST_SOURCE = 500
_SIZE_KEY: dict[str, str] = {"film": "ohm_per_square", "wire": "ohm_per_metre", "part": "series"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Film:
    """What is needed to make a resistor of a film; what is ``None`` is not stated. All in SI units.

    Parameters
    ----------
    min_width : float
        Least drawn width [m].
    preferred_width : float, optional
        Drawn width to start from [m].
    width_bias : float, optional
        Drawn minus effective width, in total [m].
    end_resistance : float, optional
        Of one end, times the width [ohm m].
    end_tc1 : float, optional
        First temperature coefficient of the ends [1/K].
    matching : float, optional
        sigma(dR/R) of a pair times sqrt(W L) [m].
    spacing : float, optional
        Between two bodies [m].
    end_length : float, optional
        Of one end, beyond the inner edge [m].
    grid : float, optional
        Step of the drawn dimensions [m].
    max_current : float, optional
        Per width [A/m].
    etch : str, optional
        The lithography step that sets the width: films that name the same one share one width error.
    """

    min_width: float
    preferred_width: float | None = None
    width_bias: float | None = None
    end_resistance: float | None = None
    end_tc1: float | None = None
    matching: float | None = None
    spacing: float | None = None
    end_length: float | None = None
    grid: float | None = None
    max_current: float | None = None
    etch: str | None = None

    def __post_init__(self) -> None:
        if problems := tuple(_film_problems(self)):
            raise InputError(problems)


@dataclass(frozen=True, slots=True, kw_only=True)
class VoltageCoefficient:
    """k in R = R(0) (1 + k |V|), V across one unit and R = V/I; one of the two.

    Parameters
    ----------
    per_volt : float, optional
        k [1/V] of any unit: one resistor, one unit cell or one bought part.
    metre_per_volt : float, optional
        k times the length of the unit [m/V]; films only.
    """

    per_volt: float | None = None
    metre_per_volt: float | None = None

    def __post_init__(self) -> None:
        given = [size for size in (self.per_volt, self.metre_per_volt) if size is not None]
        if len(given) != 1 or not math.isfinite(given[0]):
            raise InputError(
                Problem(
                    where="voltage_coefficient",
                    found=" and ".join(f"{size:g}" for size in given) or "nothing",
                    expected="one finite value, per volt or length per volt",
                )
            )

    def to_dict(self) -> dict[str, float | None]:
        """Return JSON data, units in the names."""
        return {"per_V": self.per_volt, "m_per_V": self.metre_per_volt}


@dataclass(frozen=True, slots=True, kw_only=True)
class Material:
    """One checked material.

    Parameters
    ----------
    name : str
        A letter, then letters, digits and underscores, 40 at most.
    label : str
        One line of printable text; writers escape it.
    source : str
        Where the data come from; required.
    law : Law
        R(T)/R(law.reference).
    valid : (float, float)
        Range [K] in which the law was established.
    kind : {"film", "wire", "part", "plain"}
        By its size: ``ohm_per_square``, ``ohm_per_metre``, ``series`` or none of them.
    ohm_per_square, ohm_per_metre : float, optional
        Of a film [ohm], of a wire [ohm/m], at the material's own reference.
    series : str, optional
        Of a part: the series of preferred values, such as "E96".
    spread : Spread, optional
        ``None`` is "not stated": such a material is never judged on its worst case.
    film : Film, optional
        What is needed to make it; films only.
    extrapolated : (float, float), optional
        Wider range [K] in which the law may be used, with ``extrapolation`` added to the spread.
    extrapolation : Spread, optional
        The added half-widths, as limits; required with ``extrapolated``.
    voltage_coefficient : VoltageCoefficient, optional
        ``None`` is "not stated".

    Raises
    ------
    InputError
        With every mistake found.
    """

    name: str
    label: str
    source: str
    law: Law
    valid: Interval
    kind: Kind
    ohm_per_square: float | None = None
    ohm_per_metre: float | None = None
    series: str | None = None
    spread: Spread | None = None
    film: Film | None = None
    extrapolated: Interval | None = None
    extrapolation: Spread | None = None
    voltage_coefficient: VoltageCoefficient | None = None

    def __post_init__(self) -> None:
        if problems := (*text_problems(self.name, self.label, self.source), *_data_problems(self)):
            raise InputError(problems)
        low, high = self.usable
        check_positive(self.law, low, high, f"material.{self.name}")

    @property
    def reference(self) -> float:
        """The material's own reference temperature [K]."""
        return self.law.reference

    @property
    def usable(self) -> Interval:
        """Range [K] in which the law may be used at all: ``valid``, or with the extrapolation."""
        if self.extrapolated is None:
            return self.valid
        return min(self.valid[0], self.extrapolated[0]), max(self.valid[1], self.extrapolated[1])

    def is_extrapolated(self, low: float, high: float) -> bool:
        """Return whether the range low..high [K] leaves the range in which the law was established."""
        return low < self.valid[0] or high > self.valid[1]

    def effective_spread(self, low: float, high: float) -> Spread | None:
        """Return the spread over low..high [K]: what the worst case of the material is built from.

        Outside ``valid`` the extrapolation's is added, and the value of a film covers the width error.
        """
        if self.spread is None:
            return None
        spread = self.spread.with_width(self.effective_width)
        if self.extrapolation is None or not self.is_extrapolated(low, high):
            return spread
        return spread.widened(self.extrapolation)

    def drawn_spread(self, low: float, high: float) -> Spread | None:
        """Return the spread over low..high [K] that draws are made from: as stated.

        Outside ``valid`` the extrapolation's is added; the width error of a film is drawn on its own.
        """
        if self.spread is None or self.extrapolation is None or not self.is_extrapolated(low, high):
            return self.spread
        return self.spread.widened(self.extrapolation)

    @property
    def width(self) -> float | None:
        """The drawn width of a film [m], the preferred one, else the least; ``None`` if not stated."""
        return None if self.film is None else self.film.preferred_width or self.film.min_width

    @property
    def effective_width(self) -> float | None:
        """The drawn width less the bias [m]; ``None`` if not stated."""
        if self.film is None or self.width is None:
            return None
        return self.width - (self.film.width_bias or 0.0)

    def ratio(self, T: FloatArray, reference: float) -> FloatArray:
        """Return R(T)/R(reference), of the shape of ``T``; both [K]."""
        ratio: FloatArray = np.asarray(self.law.ratio(T), dtype=np.float64) / self._at(reference)
        return ratio

    def slope(self, T: FloatArray) -> FloatArray:
        """Return d ln R/dT [1/K], of the shape of ``T`` [K]."""
        return self.law.slope(T)

    def referred_taylor(self, reference: float, order: int = 3) -> tuple[float, ...]:
        """Return (TC1, TC2, ...) [1/K^n] about ``reference`` [K]."""
        return tuple(self.law.taylor(reference, order))

    def squares(self, ohms: float, reference: float) -> float | None:
        """Return the squares of a film for a value [ohm] at ``reference`` [K]; ``None`` if no film."""
        if self.ohm_per_square is None:
            return None
        return self._own_value(ohms, reference) / self.ohm_per_square

    def length(self, ohms: float, reference: float) -> float | None:
        """Return the length [m] of a wire for a value [ohm] at ``reference`` [K]; ``None`` if no wire."""
        if self.ohm_per_metre is None:
            return None
        return self._own_value(ohms, reference) / self.ohm_per_metre

    def area(self, ohms: float, reference: float) -> float | None:
        """Return the area [m^2] of a film for a value [ohm] at ``reference`` [K]; ``None`` if unknown.

        Squares times the drawn width times the pitch (width and spacing); ends and dummies not included.
        """
        squares, width = self.squares(ohms, reference), self.width
        if squares is None or self.film is None or width is None:
            return None
        return squares * width * (width + (self.film.spacing or 0.0))

    def to_dict(self) -> dict[str, Any]:
        """Return JSON data that need nothing else; the inverse of `material_from_dict`."""
        return {
            "name": self.name,
            "label": self.label,
            "source": self.source,
            "kind": self.kind,
            "law": dict(self.law.parameters()),
            "valid_K": list(self.valid),
            "ohm_per_square": self.ohm_per_square,
            "ohm_per_metre": self.ohm_per_metre,
            "series": self.series,
            "spread": None if self.spread is None else self.spread.to_dict(),
            "film": None if self.film is None else _film_to_dict(self.film),
            "extrapolated_K": None if self.extrapolated is None else list(self.extrapolated),
            "extrapolation": None if self.extrapolation is None else self.extrapolation.to_dict(),
            "voltage_coefficient": None
            if self.voltage_coefficient is None
            else self.voltage_coefficient.to_dict(),
        }

    def _at(self, reference: float) -> float:
        return float(self.law.ratio(np.asarray([reference], dtype=np.float64))[0])

    def _own_value(self, ohms: float, reference: float) -> float:
        """Return the value at the material's own reference of what is ``ohms`` at ``reference``."""
        return ohms * self._at(self.law.reference) / self._at(reference)


def material_from_dict(data: Mapping[str, Any]) -> Material:
    """Return the material that ``Material.to_dict`` wrote, checked again.

    Raises
    ------
    InputError
        When the data are not such a material.
    """
    try:
        return _from_dict(data)
    except (KeyError, TypeError, ValueError, IndexError, AttributeError) as fault:
        raise InputError(
            Problem(
                where="materials",
                found=f"material data with a missing or wrong entry ({shown(str(fault))})",
                expected="material data as tcplan writes them",
                todo="Make the plan again from its brief.",
            )
        ) from fault


def text_problems(name: str, label: str, source: str) -> tuple[Problem, ...]:
    """Return what is wrong with a material's name, label and source."""
    where = f"material.{name if NAME.fullmatch(name) else shown(name)}"
    return tuple(_text_problems(where, name, label, source))


def interval_problem(where: str, interval: Interval) -> Problem | None:
    """Return what is wrong with a temperature range [K], if anything."""
    low, high = interval
    if 0.0 < low < high <= HOTTEST:
        return None
    return Problem(
        where=where,
        found=f"{_temperature(low)} to {_temperature(high)}",
        expected=f"two temperatures above 0 K and up to {HOTTEST:g} K, the lower one first",
    )


def _text_problems(where: str, name: str, label: str, source: str) -> Iterator[Problem]:
    if not NAME.fullmatch(name):
        yield Problem(
            where=where,
            found=f"the material name {shown(name)}",
            expected="a letter, then letters, digits and underscores, 40 at most",
            todo="Put the long form into label.",
        )
    # Control characters and line breaks could forge lines in a resistor list or a CSV file.
    if not label.isprintable() or not label.strip() or len(label) > LONGEST_LABEL:
        yield Problem(
            where=f"{where}.label",
            found=shown(label),
            expected=f"one line of printable text, 1 to {LONGEST_LABEL} characters",
        )
    if not source.isprintable() or not source.strip() or len(source) > LONGEST_SOURCE:
        yield Problem(
            where=f"{where}.source",
            found=shown(source) if source else "nothing",
            expected=f"one line of printable text, 1 to {LONGEST_SOURCE} characters",
            todo="Name the document and revision the data come from.",
        )


def _data_problems(material: Material) -> Iterator[Problem]:
    where = f"material.{material.name if NAME.fullmatch(material.name) else shown(material.name)}"
    yield from _range_problems(material, where)
    yield from _size_problems(material, where)
    yield from _table_problems(material, where)
    if material.film is not None and material.kind != "film":
        yield Problem(
            where=f"{where}.film",
            found=f"the table [film] in a material without ohm_per_square (a {material.kind})",
            expected="[film] in films only",
            todo="Add ohm_per_square, or remove the table.",
        )
    coefficient = material.voltage_coefficient
    if coefficient is not None and coefficient.metre_per_volt is not None and material.kind != "film":
        yield Problem(
            where=f"{where}.voltage_coefficient",
            found=f"a coefficient times a length, of a {material.kind}",
            expected='one per volt, such as "20 ppm/V"',
            todo="A coefficient per length is for films.",
        )
    yield from _spread_problems(material, where)
    yield from _extrapolation_problems(material, where)


def _spread_problems(material: Material, where: str) -> Iterator[Problem]:
    """Check that each half-width has something that it belongs to."""
    spread, film = material.spread, material.film
    if spread is None:
        return
    if spread.width_bias is not None and film is None:
        yield _homeless(where, "width_bias", "no widths", f"[{where}.film] with min_width")
    for key in ("end_resistance", "end_tc1"):
        if getattr(spread, key) is not None and (film is None or film.end_resistance is None):
            yield _homeless(where, key, "no ends", f"[{where}.film] with end_resistance")
    if spread.tcr is not None and material.kind != "part":
        yield _homeless(where, "tcr", "no series", "a TCR limit in parts only; else tc1")
    try:
        spread.with_width(material.effective_width)
    except InputError as error:
        yield from (replace(p, where=f"{where}.{p.where}") for p in error.problems)


def _homeless(where: str, key: str, lack: str, expected: str) -> Problem:
    return Problem(
        where=f"{where}.spread.{key}",
        found=f"a spread of {key} in a material with {lack}",
        expected=expected,
    )


def _range_problems(material: Material, where: str) -> Iterator[Problem]:
    for key, interval in (("valid", material.valid), ("extrapolate_to", material.extrapolated)):
        if interval is not None and (problem := interval_problem(f"{where}.{key}", interval)):
            yield problem


def _table_problems(material: Material, where: str) -> Iterator[Problem]:
    """A table says nothing outside its points: its range must lie inside them."""
    if not isinstance(material.law, Table) or interval_problem(where, material.valid):
        return
    low, high = material.law.points[0][0], material.law.points[-1][0]
    if material.usable[0] < low - 1e-9 or material.usable[1] > high + 1e-9:
        yield Problem(
            where=f"{where}.valid",
            found=f"{_temperature(material.usable[0])} to {_temperature(material.usable[1])}",
            expected=f"a range inside the points, {_temperature(low)} to {_temperature(high)}",
        )


def _size_problems(material: Material, where: str) -> Iterator[Problem]:
    given = [key for key in _SIZE_KEY.values() if getattr(material, key) is not None]
    wanted = _SIZE_KEY.get(material.kind)
    if material.kind not in get_args(Kind) or given != ([wanted] if wanted else []):
        yield Problem(
            where=where,
            found=f"the kind {shown(str(material.kind))} with " + (" and ".join(given) or "no size"),
            expected="ohm_per_square for a film, ohm_per_metre for a wire, series for a part, else none",
            todo="Give one of the three at most.",
        )
    for key in ("ohm_per_square", "ohm_per_metre"):
        size = getattr(material, key)
        if size is not None and not (math.isfinite(size) and size > 0.0):
            yield Problem(where=f"{where}.{key}", found=f"{size:g}", expected="a finite value above zero")
    if material.series is not None and material.series not in SERIES:
        near = nearest_name(material.series, tuple(SERIES))
        yield Problem(
            where=f"{where}.series",
            found=shown(material.series),
            expected="one of " + ", ".join(SERIES),
            todo=f"Did you mean {near}?" if near else "",
        )


def _extrapolation_problems(material: Material, where: str) -> Iterator[Problem]:
    added = material.extrapolation
    if material.extrapolated is not None and (added is None or not (added.tc1 or added.tc2)):
        yield Problem(
            where=f"{where}.extrapolation",
            found="extrapolate_to without an added spread",
            expected="the half-widths, above zero, that the extrapolation adds",
            todo=f"Add [{where}.extrapolation] with tc1 or tc2.",
        )
    if material.extrapolated is None and added is not None:
        yield Problem(
            where=f"{where}.extrapolate_to",
            found="an added spread without its range",
            expected='the range it is for, such as ["-55 degC", "175 degC"]',
        )


def _film_problems(film: Film) -> Iterator[Problem]:
    for field in fields(film):
        size = getattr(film, field.name)
        if size is None or field.name == "etch":
            continue
        above_zero = field.name in ("min_width", "preferred_width", "grid", "max_current")
        any_sign = field.name in ("width_bias", "end_tc1")
        if not math.isfinite(size) or (not any_sign and size < 0.0) or (above_zero and size == 0.0):
            expected = (
                "finite" if any_sign else "finite and above zero" if above_zero else "finite, not negative"
            )
            yield Problem(
                where=f"film.{field.name}", found=f"{size:g}", expected=f"a value that is {expected}"
            )
    if film.etch is not None and not NAME.fullmatch(film.etch):
        yield Problem(
            where="film.etch",
            found=shown(film.etch),
            expected="a letter, then letters, digits and underscores, 40 at most",
        )
    if film.preferred_width is not None and film.preferred_width < film.min_width:
        yield Problem(
            where="film.preferred_width",
            found=f"{format_si(film.preferred_width, 'm')}, below min_width",
            expected=f"at least min_width, {format_si(film.min_width, 'm')}",
        )
    if film.width_bias is not None and film.width_bias >= film.min_width:
        yield Problem(
            where="film.width_bias",
            found=f"{format_si(film.width_bias, 'm')}, which leaves no effective width",
            expected=f"less than min_width, {format_si(film.min_width, 'm')}",
        )


def _temperature(kelvin: float) -> str:
    return format_celsius(kelvin) if math.isfinite(kelvin) else str(kelvin)


_FILM_KEYS = {
    "min_width": "min_width_m",
    "preferred_width": "preferred_width_m",
    "width_bias": "width_bias_m",
    "end_resistance": "end_resistance_ohm_m",
    "end_tc1": "end_tc1_per_K",
    "matching": "matching_m",
    "spacing": "spacing_m",
    "end_length": "end_length_m",
    "grid": "grid_m",
    "max_current": "max_current_A_per_m",
    "etch": "etch",
}


def _film_to_dict(film: Film) -> dict[str, Any]:
    return {_FILM_KEYS[name]: size for name, size in asdict(film).items()}


def _from_dict(data: Mapping[str, Any]) -> Material:
    spread, film, extrapolation = data["spread"], data["film"], data["extrapolation"]
    return Material(
        name=data["name"],
        label=data["label"],
        source=data["source"],
        kind=data["kind"],
        law=law_from_parameters(data["law"]),
        valid=_interval(data["valid_K"]),
        ohm_per_square=data["ohm_per_square"],
        ohm_per_metre=data["ohm_per_metre"],
        series=data["series"],
        spread=None if spread is None else spread_from_dict(spread),
        film=None if film is None else Film(**{name: film[key] for name, key in _FILM_KEYS.items()}),
        extrapolated=None if data["extrapolated_K"] is None else _interval(data["extrapolated_K"]),
        extrapolation=None if extrapolation is None else spread_from_dict(extrapolation),
        voltage_coefficient=_coefficient(data.get("voltage_coefficient")),  # older plans have none
    )


def _coefficient(data: Mapping[str, Any] | None) -> VoltageCoefficient | None:
    if data is None:
        return None
    sizes = [None if data[key] is None else float(data[key]) for key in ("per_V", "m_per_V")]
    return VoltageCoefficient(per_volt=sizes[0], metre_per_volt=sizes[1])


def _interval(values: list[float]) -> Interval:
    low, high = values
    return low, high
