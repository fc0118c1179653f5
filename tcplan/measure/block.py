"""A measured population as text for a materials file: the material, its spread, what it shares with others.

A value is written to the second digit of its standard uncertainty, a half-width to three digits, outward.
Constants of laws other than polynomials depend on one another and keep all their digits.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from tcplan.errors import InputError, InternalError, Problem
from tcplan.material.law import Expression, Law, Platinum, Polynomial, SteinhartHart, Thermistor
from tcplan.material.model import NAME, Kind, Material, text_problems
from tcplan.material.spread import Meaning, Spread
from tcplan.measure.spread import Population
from tcplan.measure.spread_words import account, counted, in_unit, number, rounded, toml_text
from tcplan.measure.tracking import MeasuredTracking
from tcplan.names import shown
from tcplan.units import from_celsius, round_outward, to_celsius

SizeKey = Literal["ohm_per_square", "ohm_per_metre"]
FILE_COEFFICIENTS = 3  # tc1, tc2, tc3
_KINDS: dict[str, Kind] = {"ohm_per_square": "film", "ohm_per_metre": "wire"}
_SIZE_UNITS = {"ohm_per_square": "ohm", "ohm_per_metre": "ohm/m"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Size:
    """What the devices are made of: R is ``count`` times the size of the material.

    Parameters
    ----------
    key : {"ohm_per_square", "ohm_per_metre"}
        Of the materials file.
    count : float
        Squares, or the length [m], of each device.
    """

    key: SizeKey
    count: float

    def __post_init__(self) -> None:
        if not (math.isfinite(self.count) and self.count > 0.0):
            where = "squares" if self.key == "ohm_per_square" else "length"
            raise InputError(Problem(where=where, found=f"{self.count:g}", expected="a number above zero"))


def material_of(
    name: str,
    found: Population,
    *,
    source: str,
    label: str | None = None,
    size: Size | None = None,
    meaning: Meaning = "limits",
) -> Material:
    """Return the material that a population states, rounded as `material_block` writes it.

    Parameters
    ----------
    name, source : str
        Of the material; the source says where the readings come from.
    found : Population
    label : str, optional
        The name when absent.
    size : Size, optional
        Makes it a film or a wire; without it the material has no size.
    meaning : {"limits", "sigma"}
        Of the half-widths; see `Population.spread`.

    Returns
    -------
    Material
        Valid over the temperatures that every device has readings of, to a tenth of a degree; without a
        spread when there is one device.

    Raises
    ------
    InputError
        When name, label or source are not allowed in a materials file, the file has no form for the law, or
        so few devices leave the value open to 100 %.
    """
    label = name if label is None else label
    if problems := text_problems(name, label, source):
        raise InputError(problems)
    spread = found.spread(meaning)
    key = None if size is None else size.key
    sizes = {} if size is None else {size.key: _size_of(found, size)}
    return Material(
        name=name,
        label=label,
        source=source,
        law=_rounded_law(found),
        valid=(_to_tenth(found.low), _to_tenth(found.high)),
        kind="plain" if key is None else _KINDS[key],
        ohm_per_square=sizes.get("ohm_per_square"),
        ohm_per_metre=sizes.get("ohm_per_metre"),
        spread=None if spread is None else _outward(spread),
    )


def material_block(
    name: str,
    found: Population,
    *,
    source: str,
    label: str | None = None,
    size: Size | None = None,
    meaning: Meaning = "limits",
    remarks: Sequence[str] = (),
) -> str:
    """Return the ``[material.NAME]`` of a materials file, with its spread and what it rests on as comments.

    Parameters and what is raised are those of `material_of`; ``remarks`` are sentences that are written as
    comments too.

    Returns
    -------
    str
        TOML, without the line ``schema = 1``; it ends with a line break.
    """
    material = material_of(name, found, source=source, label=label, size=size, meaning=meaning)
    lines = [
        *account(found, meaning, remarks),
        f"[material.{name}]",
        f"label = {toml_text(material.label)}",
        f"source = {toml_text(source)}",
        f'reference = "{number(to_celsius(material.reference))} degC"',
        f'valid = ["{number(to_celsius(material.valid[0]))} degC", '
        f'"{number(to_celsius(material.valid[1]))} degC"]',
    ]
    if size is not None:
        ohms = getattr(material, size.key)
        lines.append(f'{size.key} = "{number(ohms)} {_SIZE_UNITS[size.key]}"')
    lines += _law_lines(material.law, name)
    if material.spread is not None:
        lines += _spread_lines(name, material.spread, "value" if size is None else size.key)
    return "\n".join(lines) + "\n"


def correlation_block(name: str, found: Population, *, size: Size | None = None) -> str:
    """Return the ``[[correlation]]`` of the value with TC1, or a comment that says why there is none.

    A TC1 stands in a table of tracking or in one of correlation, not in both.
    """
    one, key = found.correlation, "value" if size is None else size.key
    if one is None:
        return f"# No correlation of {name}.{key} with {name}.tc1: too few devices, or no scatter to see.\n"
    told = f"{one.value:.2f}, {100 * found.confidence:g} % interval {one.low:.2f} to {one.high:.2f}"
    told += f", from {counted(found.devices, 'device')} of {counted(found.lots, 'lot')}"
    if not one.is_shown:
        return f"# No correlation of {name}.{key} with {name}.tc1: {told}, which holds 0.\n"
    between = f'between = ["{name}.{key}", "{name}.tc1"]'
    return f"# {told}\n[[correlation]]\n{between}\nvalue = {one.value:.2f}\n"


def tracking_block(names: Sequence[str], found: Sequence[MeasuredTracking]) -> str:
    """Return the ``[[tracking]]`` of materials, or a comment when no difference beyond noise is seen.

    Parameters
    ----------
    names : sequence of str
        Two materials or more; each stands in one table of tracking at most.
    found : sequence of MeasuredTracking
        Of every pair of them; the widest counts.

    Raises
    ------
    InputError
        For a name that is none of a material, and fewer than two.
    """
    problems = [
        Problem(where="tracking", found=shown(name), expected="the name of a material")
        for name in names
        if not NAME.fullmatch(name)
    ]
    if len(set(names)) < 2:
        problems.append(Problem(where="tracking", found="one material", expected="two or more"))
    if problems:
        raise InputError(problems)
    if len(found) != len(names) * (len(names) - 1) // 2:
        raise InternalError("tracking of several materials needs every pair of them")
    widest = max(found, key=lambda one: one.half_width)
    told = f"{100 * widest.coverage:g} % of devices with {100 * widest.confidence:g} % confidence, "
    told += f"from {counted(widest.devices, 'device')} of {counted(len(widest.counts), 'lot')}"
    if len(widest.counts) == 1:
        told += "; how lots differ is not in it"
    if not widest.half_width > 0.0:
        return f"# No tracking of {', '.join(names)}: the difference of TC1 does not scatter; {told}.\n"
    within = in_unit(round_outward(widest.half_width), "tc1")
    listed = ", ".join(f'"{name}"' for name in names)
    return f'# {told}\n[[tracking]]\nmaterials = [{listed}]\nwithin = "{within}"\n'


# ---- rounding


def _size_of(found: Population, size: Size) -> float:
    return rounded(found.ohms / size.count, found.uncertainties[0] / size.count)


def _rounded_law(found: Population) -> Law:
    law = found.law
    if not isinstance(law, Polynomial):
        return law
    pairs = zip(law.coefficients, found.uncertainties[1:], strict=True)
    return Polynomial(reference=law.reference, coefficients=tuple(rounded(c, u) for c, u in pairs))


def _outward(spread: Spread) -> Spread:
    halves = (spread.value, spread.tc1, spread.tc2)
    value, tc1, tc2 = (None if half is None else round_outward(half) for half in halves)
    return Spread(meaning=spread.meaning, value=value, tc1=tc1, tc2=tc2)


def _to_tenth(kelvin: float) -> float:
    """Return a temperature [K] to a tenth of a degree: a chamber at -39.97 degC is meant to be at -40."""
    return from_celsius(round(to_celsius(kelvin), 1))


# ---- the lines of the block


def _law_lines(law: Law, name: str) -> list[str]:
    if isinstance(law, Polynomial) and len(law.coefficients) <= FILE_COEFFICIENTS:
        pairs = enumerate(law.coefficients, 1)
        return [f'tc{n} = "{in_unit(c, f"tc{n}")}"' for n, c in pairs]
    if isinstance(law, Platinum):
        return ['law = "platinum"']
    if isinstance(law, Thermistor):
        return ['law = "thermistor"', f'beta = "{law.beta!r} K"']
    if isinstance(law, SteinhartHart):
        return ['law = "steinhart-hart"', f"a = {law.a!r}", f"b = {law.b!r}", f"c = {law.c!r}"]
    if isinstance(law, Expression):
        return _formula_lines(law, name)
    raise InputError(
        Problem(
            where=f"material.{name}",
            found=f"a law of the kind {law.kind} that a materials file has no form for",
            expected="a polynomial of order 1 to 3, platinum, thermistor, Steinhart-Hart or a formula",
        )
    )


def _formula_lines(law: Expression, name: str) -> list[str]:
    """Return the formula; the file takes T0 for the reference, so another T0 is written as a number."""
    text = law.text
    if law.origin is not None and law.origin != law.reference:
        text = re.sub(r"\bT0\b", f"({law.origin!r})", text)
    lines = [f"law = {toml_text(text)}"]
    if law.constants:
        lines.append(f"[material.{name}.law_parameters]")
        lines += [f"{key} = {value!r}" for key, value in law.constants]
    return lines


def _spread_lines(name: str, spread: Spread, size: str) -> list[str]:
    lines = [f"[material.{name}.spread]", f'meaning = "{spread.meaning}"', 'shape = "normal"']
    for key in ("value", "tc1", "tc2"):
        half = getattr(spread, key)
        if half is not None:
            lines.append(f'{size if key == "value" else key} = "{in_unit(half, key)}"')
    return lines
