"""Numbers, text and comments of a measured material as a materials file writes them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from decimal import Decimal
from textwrap import wrap

from tcplan.material.spread import Meaning
from tcplan.measure.spread import Estimate, Population, Scatter
from tcplan.units import format_celsius, format_ohms

FULL = 15  # significant digits that a float always keeps
WIDTH = 98  # of a comment
UNITS = {"value": (1e2, "%"), "tc1": (1e6, "ppm/K"), "tc2": (1e6, "ppm/K^2"), "tc3": (1e6, "ppm/K^3")}
_WORDS = {"value": "R", "tc1": "TC1", "tc2": "TC2"}
_ESCAPED = {'"': '\\"', "\\": "\\\\", "\b": "\\b", "\t": "\\t", "\n": "\\n", "\f": "\\f", "\r": "\\r"}


def toml_text(text: str) -> str:
    """Return text as a basic string of TOML: whatever it holds, it stays one value on one line."""
    marks = (_ESCAPED.get(mark) or (mark if mark.isprintable() else _by_number(mark)) for mark in text)
    return '"' + "".join(marks) + '"'


def _by_number(mark: str) -> str:
    code = ord(mark)
    if 0xD800 <= code <= 0xDFFF:  # half a character, which TOML cannot hold
        code = 0xFFFD
    return f"\\u{code:04X}" if code <= 0xFFFF else f"\\U{code:08X}"


def rounded(value: float, uncertainty: float) -> float:
    """Return a value to the second digit of its uncertainty; with all digits when that is zero."""
    if not 0.0 < uncertainty < math.inf:
        return value
    place = math.floor(math.log10(uncertainty)) - 1
    if abs(value) >= 10.0 ** (place + FULL):
        return value
    return float(Decimal(repr(float(value))).quantize(Decimal(1).scaleb(place))) + 0.0  # no minus zero


def number(value: float) -> str:
    """Return a number with all its digits, and none that only arithmetic made."""
    return f"{value:.{FULL}g}"


def in_unit(value: float, key: str) -> str:
    """Return a coefficient or a half-width [SI] in the unit that people write it in."""
    scale, unit = UNITS[key]
    return f"{number(value * scale)} {unit}"


def account(found: Population, meaning: Meaning, remarks: Sequence[str] = ()) -> list[str]:
    """Return comment lines: how many devices there are, what is known of each component, remarks."""
    each = ", ".join(str(count) for count in found.counts[:20]) + (", .." if found.lots > 20 else "")
    lots = f" of {counted(found.lots, 'lot')}" + (f" ({each})" if found.lots > 1 else "")
    over = f"every one read from {format_celsius(found.low)} to {format_celsius(found.high)}"
    lines = [f"{counted(found.devices, 'device')}{lots}, {over}; mean R {format_ohms(found.ohms)}."]
    if found.devices > 1:
        lines.append(_meaning_of(found, meaning))
        lines.append(f"Standard deviations, each with its {100 * found.confidence:g} % interval:")
    lines += [_scatter_line(one) for one in found.scatters]
    lines += [*found.notes, *map(_printable, remarks)]
    told = (wrap(line, WIDTH, subsequent_indent="  ") for line in lines)
    return [f"# {line}" for lines in told for line in lines]


def _printable(text: str) -> str:
    """Return text that a comment may hold: names of devices come from files."""
    return "".join(mark if mark.isprintable() else " " for mark in text)


def _meaning_of(found: Population, meaning: Meaning) -> str:
    if meaning == "sigma":
        return "Half-widths are standard deviations as estimated, without a margin for few devices."
    part, confidence = 100 * found.coverage, 100 * found.confidence
    these = "all devices" if found.lots > 1 else "all devices of such a lot"
    return f"Limits hold {part:g} % of {these} with {confidence:g} % confidence (tolerance intervals)."


def _scatter_line(one: Scatter) -> str:
    named = (("devices", one.device), ("lots", one.lot), ("together", one.total))
    told = [f"{word} {_estimate(estimate, one.name)}" for word, estimate in named if estimate is not None]
    mean = f"mean known to {_short(one.uncertainty, one.name)} (standard uncertainty)"
    return f"{_WORDS[one.name]}: " + "; ".join([mean, *told]) + "."


def _estimate(estimate: Estimate, key: str) -> str:
    scale, unit = UNITS[key]
    low, high = f"{estimate.low * scale:.2g}", f"{estimate.high * scale:.2g}"
    return f"{_short(estimate.sigma, key)} ({low} to {high} {unit})"


def _short(value: float, key: str) -> str:
    scale, unit = UNITS[key]
    return f"{value * scale:.2g} {unit}"


def counted(many: int, word: str) -> str:
    """Return a count and its word."""
    return f"{many} {word}" if many == 1 else f"{many} {word}s"
