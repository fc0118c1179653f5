"""Text to SI and back: the only place that knows "12 kohm", "4k7", ppm and degC.

A number is read by ``float`` and only its unit goes further: first to a table of the units that
briefs and materials files use, then to pint, which is loaded only for a unit that is not in the table.
Everything else in tcplan works in SI. Longer than most modules, so that reading and writing stay together.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import ROUND_CEILING, Decimal
from functools import cache
from typing import Any

from tcplan.errors import InternalError, Problem, UnitError
from tcplan.names import nearest_name, shown

ZERO_CELSIUS = 273.15
"""The ice point [K]."""

PPM = 1e-6
"""One part per million."""


@dataclass(frozen=True, slots=True, kw_only=True)
class _Kind:
    """What one canonical unit accepts; ``exponents`` gives each known unit as a power of ten of SI."""

    words: str
    example: str
    pint_units: tuple[str, ...]
    exponents: Mapping[str, int]


# Ratios have a dimension of their own here, so that a matching in %*um is not taken for a length.
_KINDS: Mapping[str, _Kind] = {
    "ohm": _Kind(
        words="a resistance",
        example="12 kohm",
        pint_units=("ohm",),
        exponents={"ohm": 0, "uohm": -6, "mohm": -3, "kohm": 3, "Mohm": 6, "Gohm": 9},
    ),
    "K": _Kind(words="a temperature", example="25 degC", pint_units=("K",), exponents={"K": 0}),
    "delta_K": _Kind(
        words="a temperature difference", example="10 K", pint_units=("K",), exponents={"K": 0, "mK": -3}
    ),
    "1/K": _Kind(
        words="a temperature coefficient",
        example="-120 ppm/K",
        pint_units=("1/K", "tcplan_ratio/K"),
        exponents={"ppm/K": -6, "ppb/K": -9, "%/K": -2, "1/K": 0},
    ),
    "1/K^2": _Kind(
        words="a second temperature coefficient",
        example="0.55 ppm/K^2",
        pint_units=("1/K^2", "tcplan_ratio/K^2"),
        exponents={"ppm/K^2": -6, "ppb/K^2": -9, "%/K^2": -2, "1/K^2": 0},
    ),
    "1/K^3": _Kind(
        words="a third temperature coefficient",
        example="0.001 ppm/K^3",
        pint_units=("1/K^3", "tcplan_ratio/K^3"),
        exponents={"ppm/K^3": -6, "ppb/K^3": -9, "1/K^3": 0},
    ),
    "1": _Kind(
        words="a ratio",
        example="15 %",
        pint_units=("tcplan_ratio",),
        exponents={"%": -2, "percent": -2, "ppm": -6, "ppb": -9},
    ),
    "m": _Kind(
        words="a length",
        example="5 um",
        pint_units=("m",),
        exponents={"m": 0, "km": 3, "cm": -2, "mm": -3, "um": -6, "nm": -9},
    ),
    "m^2": _Kind(
        words="an area",
        example="500 um^2",
        pint_units=("m^2",),
        exponents={"m^2": 0, "cm^2": -4, "mm^2": -6, "um^2": -12, "um*um": -12},
    ),
    "ohm/m": _Kind(
        words="a resistance per length",
        example="8.5 ohm/m",
        pint_units=("ohm/m",),
        exponents={"ohm/m": 0, "mohm/m": -3, "kohm/m": 3, "ohm/km": -3, "ohm/mm": 3},
    ),
    "ohm*m": _Kind(
        words="a resistance times a length",
        example="35 ohm*um",
        pint_units=("ohm*m",),
        exponents={"ohm*m": 0, "ohm*um": -6, "ohm*mm": -3, "ohm*cm": -2, "uohm*cm": -8, "kohm*um": -3},
    ),
    "A": _Kind(
        words="a current", example="1 mA", pint_units=("A",), exponents={"A": 0, "mA": -3, "uA": -6, "nA": -9}
    ),
    "A/m": _Kind(
        words="a current per width",
        example="0.6 mA/um",
        pint_units=("A/m",),
        exponents={"A/m": 0, "A/mm": 3, "mA/um": 3, "uA/um": 0, "mA/mm": 0},
    ),
    "V": _Kind(
        words="a voltage", example="5 V", pint_units=("V",), exponents={"V": 0, "mV": -3, "uV": -6, "kV": 3}
    ),
    "W": _Kind(
        words="a power", example="100 mW", pint_units=("W",), exponents={"W": 0, "mW": -3, "uW": -6, "kW": 3}
    ),
    "K/W": _Kind(
        words="a thermal resistance", example="150 K/W", pint_units=("K/W",), exponents={"K/W": 0, "K/mW": 3}
    ),
    "1/V": _Kind(
        words="a voltage coefficient",
        example="20 ppm/V",
        pint_units=("1/V", "tcplan_ratio/V"),
        exponents={"ppm/V": -6, "ppb/V": -9, "%/V": -2, "1/V": 0},
    ),
    "m/V": _Kind(
        words="a voltage coefficient times a length",
        example="30 ppm*um/V",
        pint_units=("tcplan_ratio*m/V",),
        exponents={"ppm*um/V": -12, "%*um/V": -8, "ppm*mm/V": -9},
    ),
    "1*m": _Kind(
        words="a matching coefficient",
        example="1.2 %*um",
        pint_units=("tcplan_ratio*m",),
        exponents={"%*um": -8, "ppm*um": -12, "%*mm": -5},
    ),
}

_RATIOS = {"%": "tcplan_percent", "percent": "tcplan_percent", "ppm": "tcplan_ppm", "ppb": "tcplan_ppb"}

# What pasted text holds, as the plain text that it stands for.
_PASTED = str.maketrans(
    {
        "\u03a9": "ohm",  # Greek capital omega
        "\u2126": "ohm",  # ohm sign
        "\u00b5": "u",  # micro sign
        "\u03bc": "u",  # Greek small mu
        "\u00b0": "deg",
        "\u00ba": "deg",  # masculine ordinal, often taken for a degree sign
        "\u2103": "degC",
        "\u212a": "K",  # kelvin sign
        "\u2212": "-",
        "\u00b7": "*",
        "\u22c5": "*",
        "\u00d7": "*",
        "\u207b": "^-",
        "\u00b9": "^1",
        "\u00b2": "^2",
        "\u00b3": "^3",
        "\u00a0": " ",
        "\u2007": " ",
        "\u2009": " ",
        "\u202f": " ",
    }
)

_LONGEST_TEXT = 200
_LONGEST_NUMBER = 40
_LONGEST_UNIT = 40
_NUMBER = re.compile(r"([+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+))(?:[eE]([+-]?[0-9]+))?")
_CODE = re.compile(r"(?=.*[0-9])([0-9]{0,4})([RKkMG])([0-9]{0,4})")
_CODE_EXPONENTS = {"R": 0, "k": 3, "K": 3, "M": 6, "G": 9}
_FACTOR = r"(?:[A-Za-z_]+|%)(?:\^-?[1-9])?"
_UNIT = re.compile(rf"(?:1/)?{_FACTOR}(?:[*/]{_FACTOR})*")
_SEPARATOR = re.compile(r"[0-9][ ,'_\u2019][0-9]")


# ---- text to SI


def parse_quantity(text: object, unit: str, *, where: str = "") -> float:
    """Read a quantity and return its SI value.

    Parameters
    ----------
    text : object
        A number and its unit, such as ``"12 kohm"`` or ``"-120 ppm/K"``; for a resistance also an
        IEC 60062 code such as ``"4k7"``. Anything but text is refused, so that no unit is guessed.
    unit : str
        The SI unit of the answer: ohm, K (an absolute temperature), delta_K (a difference), 1/K, 1/K^2,
        1/K^3, 1 (a ratio), m, m^2, ohm/m, ohm*m, A, A/m, V, W, K/W, 1/V, m/V (a ratio times a
        length, per volt) or 1*m (a ratio times a length).
    where : str
        The place of the text in the input, for the message.

    Returns
    -------
    float
        The value [``unit``], finite.

    Raises
    ------
    UnitError
        If it is not one finite number with a unit of the right dimension.

    References
    ----------
    IEC 60062, Marking codes for resistors and capacitors.

    Examples
    --------
    >>> parse_quantity("12 kohm", "ohm"), parse_quantity("4k7", "ohm")
    (12000.0, 4700.0)
    >>> parse_quantity("-120 ppm/K", "1/K")
    -0.00012
    """
    if unit not in _KINDS:
        raise InternalError(f"unknown canonical unit {shown(unit)}")
    kind = _KINDS[unit]
    if not isinstance(text, str):
        raise _refused(kind, where, f"{shown(text)}, which is not text", _write_as(kind))
    if len(text) > _LONGEST_TEXT:
        raise _refused(kind, where, f"{shown(text)}, {len(text)} characters", _write_as(kind))
    plain = re.sub(r"^\u2013", "-", text.translate(_PASTED).strip())  # an en dash as a minus sign
    code = _CODE.fullmatch(plain) if unit == "ohm" else None
    if code:
        whole, letter, part = code.groups()
        return float(f"{whole or 0}.{part or 0}e{_CODE_EXPONENTS[letter]}")
    number = _NUMBER.match(plain)
    if not number or number.end() > _LONGEST_NUMBER or not math.isfinite(float(number[0])):
        found = f"{shown(text)}, which does not start with a finite number"
        raise _refused(kind, where, found, _hint(plain, kind))
    unit_text = _plain_unit(plain[number.end() :])
    if not _UNIT.fullmatch(unit_text) or len(unit_text) > _LONGEST_UNIT:
        raise _refused(kind, where, shown(text), _hint(plain, kind))
    return _checked(_si_value(text, number, unit_text, unit, where), text, unit, where)


def _si_value(text: str, number: re.Match[str], unit_text: str, unit: str, where: str) -> float:
    """Return the value of a number in a unit whose form has been checked."""
    kind = _KINDS[unit]
    if unit == "K" and unit_text == "degC":
        return from_celsius(float(number[0]))
    known = unit_text if unit == "K" else re.sub(r"\bdegC\b", "K", unit_text)
    if known in kind.exponents:
        # Through text, so that "0.55 ppm" is the float 5.5e-07 to the last bit.
        return float(f"{number[1]}e{int(number[2] or 0) + kind.exponents[known]}")
    factor = None if unit == "K" else _pint_factor(known, kind)  # pint has units with other zeros
    if factor is None:
        raise _wrong_unit(text, known, kind, where)
    return float(number[0]) * factor


def _checked(value: float, text: str, unit: str, where: str) -> float:
    kind = _KINDS[unit]
    if not math.isfinite(value):
        raise _refused(kind, where, f"{shown(text)}, too large a number", "Check the exponent.")
    if unit == "K" and value < 0:
        raise _refused(kind, where, f"{shown(text)}, below absolute zero", "Check sign and unit.")
    return value


def _plain_unit(text: str) -> str:
    """Return a unit in its plain form: no spaces, ``^`` for powers, ``*`` between factors."""
    text = text.strip().replace("**", "^").replace("^-^", "^-")
    text = re.sub(r"\s*([*/^])\s*", r"\1", text)
    text = re.sub(r"\bdeg\s+C\b", "degC", text)
    text = re.sub(r"Ohms?\b|ohms\b", "ohm", text)
    text = re.sub(r"\s+|(?<=%)(?=[A-Za-z])", "*", text)
    text = re.sub(r"\*([A-Za-z]+)\^-([1-9])", r"/\1^\2", text)  # ppm*K^-1 is ppm/K
    text = re.sub(r"\^1(?![0-9])", "", text)
    return f"1{text}" if text.startswith("/") else text


@cache
def _registry() -> Any:
    """Return pint's registry with the ratios added; here, because loading pint takes a while."""
    import pint

    registry = pint.UnitRegistry()
    registry.define("tcplan_ratio = [tcplan_ratio]")
    registry.define("tcplan_percent = 0.01 tcplan_ratio")
    registry.define("tcplan_ppm = 1e-6 tcplan_ratio")
    registry.define("tcplan_ppb = 1e-9 tcplan_ratio")
    return registry


def _pint_unit(unit_text: str) -> Any:
    """Return pint's unit, or None when pint does not know it."""
    import pint

    names = re.sub(r"%|[A-Za-z_]+", lambda name: _RATIOS.get(name[0], name[0]), unit_text)
    try:
        unit = _registry().parse_units(names)
        return unit if unit.dimensionality is not None else None
    except (pint.PintError, ArithmeticError, LookupError, SyntaxError, TypeError, ValueError):
        return None


def _pint_factor(unit_text: str, kind: _Kind) -> float | None:
    """Return the SI value of one unit of the right dimension and the usual zero, else None."""
    unit = _pint_unit(unit_text)
    for target in kind.pint_units:
        aim = _registry().parse_units(target)
        if unit is not None and unit.dimensionality == aim.dimensionality:
            zero = float(_registry().Quantity(0.0, unit).to(aim).magnitude)
            factor = float(_registry().Quantity(1.0, unit).to(aim).magnitude)
            return factor if zero == 0.0 and math.isfinite(factor) else None
    return None


def _refused(kind: _Kind, where: str, found: str, todo: str) -> UnitError:
    expected = f'{kind.words} such as "{kind.example}"'
    return UnitError(Problem(where=where, found=found, expected=expected, todo=todo))


def _write_as(kind: _Kind) -> str:
    return f'Write the number and its unit as text: "{kind.example}".'


def _hint(plain: str, kind: _Kind) -> str:
    """Return what to do about text whose form is wrong."""
    if _SEPARATOR.search(plain):
        return 'Write no thousands separator, and a point for the decimals: "12000 ohm", "4.7 kohm".'
    if plain.startswith(("\u00b1", "+/-", "+-")):
        return "Write a half-width without its sign."
    if _NUMBER.fullmatch(plain):
        return f'The unit is missing: write "{kind.example}".'
    return _write_as(kind)


def _wrong_unit(text: str, unit_text: str, kind: _Kind, where: str) -> UnitError:
    """Return the error for a unit of the wrong dimension, or of none that is known."""
    if kind is _KINDS["ohm"] and unit_text in _CODE_EXPONENTS:
        return _refused(kind, where, shown(text), 'Write "4.7 kohm", or the code "4k7" without a space.')
    unit = _pint_unit(unit_text)
    if unit is None:
        near = nearest_name(unit_text, kind.exponents)
        # The first letter can be a prefix: its case is the difference of milli and mega.
        alike = [unit for unit in kind.exponents if unit.casefold() == unit_text.casefold()]
        near = next((unit for unit in alike if unit[:1] == unit_text[:1]), near)
        todo = f'Did you mean "{near}"?' if near else "Check the unit."
        return _refused(kind, where, f"{shown(text)}, with an unknown unit {shown(unit_text)}", todo)
    dimension = _dimension(unit)
    todo = "Write it in degC or K." if kind.words.startswith(dimension) else "Check the unit."
    return _refused(kind, where, f"{shown(text)}, {dimension}", todo)


def _dimension(unit: Any) -> str:
    """Return the dimension of one of pint's units in words."""
    for kind in _KINDS.values():
        for known in kind.pint_units:
            if unit.dimensionality == _registry().parse_units(known).dimensionality:
                return kind.words
    dimension = str(unit.dimensionality).replace("tcplan_", "").replace(" ** ", "^")
    return "without a dimension" if dimension == "dimensionless" else f"of dimension {dimension}"


# ---- temperatures


def to_celsius(kelvin: float) -> float:
    """Return a temperature in degC, to a nanokelvin, so that 298.15 K is 25.0 exactly.

    Parameters
    ----------
    kelvin : float
        Temperature [K].

    Returns
    -------
    float
        Temperature [degC].
    """
    return round(float(kelvin) - ZERO_CELSIUS, 9)


def from_celsius(celsius: float) -> float:
    """Return a temperature in kelvin, to a nanokelvin, so that -40 degC is 233.15 exactly.

    Parameters
    ----------
    celsius : float
        Temperature [degC].

    Returns
    -------
    float
        Temperature [K].
    """
    return round(float(celsius) + ZERO_CELSIUS, 9)


# ---- SI to text


_PREFIXES = {-4: "p", -3: "n", -2: "u", -1: "m", 0: "", 1: "k", 2: "M", 3: "G"}


def format_si(value: float, unit: str, digits: int = 4) -> str:
    """Return a value with an engineering prefix, rounded to a number of significant digits.

    Parameters
    ----------
    value : float
        The value [``unit``].
    unit : str
        An SI unit that can take a prefix, such as ohm, m, m^2, A/m or V.
    digits : int
        Significant digits; zeros at the end are left out.

    Returns
    -------
    str
        Such as ``14.24 kohm`` or ``5 nm``.
    """
    if not re.match(r"[A-Za-z]", unit):
        raise InternalError(f"the unit {shown(unit)} takes no prefix")
    if not math.isfinite(value):
        return f"{float(value)} {unit}"
    power = re.match(r"[A-Za-z]+\^([1-9])", unit)  # a prefix is squared with its unit: um^2 is 1e-12 m^2
    thousand = 3 * int(power[1]) if power else 3
    rounded = _significant(value, digits)
    step = min(max(rounded.adjusted() // thousand, -4), 3) if rounded else 0
    return f"{_decimal_text(rounded.scaleb(-step * thousand))} {_PREFIXES[step]}{unit}"


def format_ohms(value: float, digits: int = 4) -> str:
    """Return a resistance for a reader.

    Parameters
    ----------
    value : float
        Resistance [ohm].
    digits : int
        Significant digits; zeros at the end are left out.

    Returns
    -------
    str
        Such as ``14.24 kohm``.

    Examples
    --------
    >>> format_ohms(12345.6)
    '12.35 kohm'
    """
    return format_si(value, "ohm", digits)


def format_length(metres: float) -> str:
    """Return a length [m] as it is drawn or cut, with all its digits: ``37.755 um``, ``97.611 m``."""
    return format_si(metres, "m", 9)


def format_ppm(fraction: float, digits: int = 3) -> str:
    """Return a ratio in parts per million.

    Parameters
    ----------
    fraction : float
        The ratio, dimensionless: 0.006 is 6000 ppm.
    digits : int
        Significant digits; zeros after the point are left out.

    Returns
    -------
    str
        Such as ``6000 ppm``.
    """
    return _ppm_text(fraction, "ppm", digits)


def format_ppm_per_K(value: float, digits: int = 4) -> str:  # noqa: N802 - K is the unit
    """Return a temperature coefficient in ppm/K.

    Parameters
    ----------
    value : float
        First coefficient or slope [1/K].
    digits : int
        Significant digits; zeros after the point are left out.

    Returns
    -------
    str
        Such as ``-120 ppm/K``.
    """
    return _ppm_text(value, "ppm/K", digits)


def format_ppm_per_K2(value: float, digits: int = 4) -> str:  # noqa: N802
    """Return a second temperature coefficient in ppm/K^2.

    Parameters
    ----------
    value : float
        Second coefficient [1/K^2].
    digits : int
        Significant digits; zeros after the point are left out.

    Returns
    -------
    str
        Such as ``0.55 ppm/K^2``.
    """
    return _ppm_text(value, "ppm/K^2", digits)


def format_celsius(kelvin: float) -> str:
    """Return a temperature in degC, with at most two decimals.

    Parameters
    ----------
    kelvin : float
        Temperature [K].

    Returns
    -------
    str
        Such as ``-40 degC`` or ``37.5 degC``.
    """
    if not math.isfinite(kelvin):
        return f"{float(kelvin)} degC"
    return f"{_decimal_text(Decimal(repr(round(to_celsius(kelvin), 2))))} degC"


# ---- rounding for people


def round_outward(value: float, digits: int = 3) -> float:
    """Return a value whose magnitude is rounded up, so that a printed limit still holds.

    A value within 1e-9 (relative) of one that has these digits is taken for it: arithmetic leaves
    6000.0000000001 where 6000 is meant.

    Parameters
    ----------
    value : float
        Any value; zero and infinities are returned as they are.
    digits : int
        Significant digits to keep.

    Returns
    -------
    float
        The rounded value, with the sign of ``value``.
    """
    if value == 0 or not math.isfinite(value):
        return float(value)
    size = Decimal(repr(abs(float(value))))
    near = _significant(abs(value), digits)
    if abs(size - near) > size * Decimal("1e-9"):
        near = size.quantize(_place(size, digits), rounding=ROUND_CEILING)
    return math.copysign(float(near), value)


def round_nominal(value: float, spread: float | None, digits: int = 4) -> float:
    """Return a nominal figure no finer than a tenth of its spread: more digits would say too much.

    Parameters
    ----------
    value : float
        The nominal figure.
    spread : float or None
        How far it can be from nominal, in the same unit; None when that is not known.
    digits : int
        Significant digits to keep at most.

    Returns
    -------
    float
        The figure rounded to a multiple of ``nominal_step(spread)``.
    """
    if value == 0 or not math.isfinite(value) or (spread is not None and not math.isfinite(spread)):
        return float(value)
    exact = Decimal(repr(float(value)))
    place = _place(exact, digits)
    if spread:
        place = max(place, Decimal(repr(nominal_step(spread))))
    return float((exact / place).to_integral_value() * place) + 0.0  # + 0.0: no minus zero


def nominal_step(spread: float) -> float:
    """Return the least of 1, 2, 5, 10, ... that is at least a tenth of a spread (not 0)."""
    tenth = Decimal(repr(abs(float(spread)))).scaleb(-1)
    power = Decimal(1).scaleb(tenth.adjusted())
    enough = tenth / Decimal("1.000000001")  # rounding of the arithmetic before, not a larger step
    return float(next(power * step for step in (1, 2, 5, 10) if enough <= power * step))


def _place(value: Decimal, digits: int) -> Decimal:
    """Return the power of ten that is the last of so many significant digits."""
    return Decimal(1).scaleb(value.adjusted() - digits + 1)


def _significant(value: float, digits: int) -> Decimal:
    """Return a finite value rounded to significant digits."""
    exact = Decimal(repr(float(value)))
    return exact.quantize(_place(exact, digits)) if exact else Decimal(0)


def _decimal_text(value: Decimal) -> str:
    """Return a decimal without needless zeros, and without an exponent at ordinary sizes."""
    if not value:
        return "0"
    short = value.normalize()
    return format(short, "f" if -7 <= short.adjusted() <= 12 else "e")


def _ppm_text(fraction: float, unit: str, digits: int) -> str:
    if not math.isfinite(fraction):
        return f"{float(fraction)} {unit}"
    return f"{_decimal_text(_significant(fraction, digits).scaleb(6))} {unit}"
