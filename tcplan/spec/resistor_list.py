"""The resistor list: a network as a two-terminal block in the common SPICE text form.

A resistor of that form follows R (1 + tc1 (T - tnom) + tc2 (T - tnom)^2) only; a law that is no such
quadratic over the range is fitted, and the largest error of the fit is printed.
"""

from __future__ import annotations

import re
import textwrap
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import count, islice, pairwise

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.model import Material
from tcplan.network import Leg, Network, Series, leg_names, legs, used_materials, value
from tcplan.spec import numbers
from tcplan.spec.spec import CAUTIONS
from tcplan.units import format_celsius, round_outward, to_celsius

LONGEST_NAME = 60
LONGEST_LINE = 120
_DIGITS = 12
_EXACT = 1e-11  # a law this near its quadratic is one: beyond are the digits that are written
_SAMPLES = 1001
_ROUNDS = 200
_BETWEEN = 1.001  # on the largest error, for what lies between two temperatures


@dataclass(frozen=True, slots=True, kw_only=True)
class Quadratic:
    """What stands for a law: R(T)/R(reference) = 1 + tc1 x + tc2 x^2, x = T - reference.

    Parameters
    ----------
    tc1, tc2 : float
        [1/K], [1/K^2]
    error : float
        Largest relative error of R(T) over the range; 0 where the law is this quadratic.
    """

    tc1: float
    tc2: float
    error: float


def resistor_list(
    network: Network,
    materials: Mapping[str, Material],
    reference: float,
    low: float,
    high: float,
    *,
    title: str,
    labels: Sequence[str] | None = None,
) -> str:
    """Return a network as a two-terminal block of plain text, one line a resistor.

    Parameters
    ----------
    network : Network
        As made, the ends of films as legs of their own.
    materials : mapping of name to Material
        Of all its legs.
    reference, low, high : float
        Reference and range [K].
    title : str
        Of the brief; the name of the block is made from it.
    labels : sequence of str, optional
        What each leg is called in its comment, from left to right; a, b, c and so on by default.

    Returns
    -------
    str
        ASCII, no line longer than 120 characters.

    Raises
    ------
    InputError
        When no quadratic that follows the law of a material stays above zero over the range.
    """
    name = block_name(title)
    fits = {m: quadratic(materials[m], reference, low, high) for m in used_materials(network)}
    called = leg_names(len(legs(network))) if labels is None else labels
    ends = f"{format_celsius(low)} to {format_celsius(high)}"
    header = _header(network, materials, fits, reference, ends, title, name)
    lines = [*(line for text in header for line in _comment(text)), f".subckt {name} a b"]
    tnom = f"tnom={to_celsius(reference):.{_DIGITS}g}"
    for n, (leg, nodes, label) in enumerate(zip(legs(network), _nodes(network), called, strict=True), 1):
        fit = fits[leg.material]
        lines.append(_cut(f"* {_plain(materials[leg.material].label)}, leg {_plain(label)}"))
        coefficients = f"tc1={_number(fit.tc1)} tc2={_number(fit.tc2)} {tnom}"
        lines.append(f"R{n} {nodes} {_number(leg.ohms)} {coefficients}")
    return "\n".join([*lines, f".ends {name}", ""])


def _nodes(network: Network) -> Iterator[str]:
    """Yield the two nodes of each leg, from left to right; the nodes inside are n1, n2, ..."""
    fresh = (f"n{k}" for k in count(1))

    def between(node: Network, top: str, bottom: str) -> Iterator[str]:
        if isinstance(node, Leg):
            yield f"{top} {bottom}"
        elif isinstance(node, Series):
            inner = [top, *islice(fresh, len(node.children) - 1), bottom]
            for child, (one, other) in zip(node.children, pairwise(inner), strict=True):
                yield from between(child, one, other)
        else:
            for child in node.children:
                yield from between(child, top, bottom)

    return between(network, "a", "b")


# --- laws -----------------------------------------------------------------------------------------------


def quadratic(material: Material, reference: float, low: float, high: float) -> Quadratic:
    """Return the quadratic of a law about ``reference`` over a range, all [K].

    Where the law is none, tc1 and tc2 are those of the least largest relative error of R(T) that keep
    R(reference), by Lawson's weights: least squares, each weight times its error, again and again.

    Raises
    ------
    InputError
        When it is not above zero over the whole range.

    References
    ----------
    C. L. Lawson, Contributions to the theory of linear least maximum approximation, thesis, University
    of California, Los Angeles, 1961 (from memory).
    """
    inside = [t for t in material.law.breakpoints if low < t < high]
    T: FloatArray = np.unique(np.concatenate([np.linspace(low, high, _SAMPLES), inside, [reference]]))
    ratio, x = material.ratio(T, reference), T - reference
    tc1, tc2 = material.referred_taylor(reference, 2)
    if _largest(ratio, x, tc1, tc2) <= _EXACT:
        return Quadratic(tc1=tc1, tc2=tc2, error=0.0)
    tc1, tc2 = _fitted(ratio, x)
    if float(np.min(1.0 + tc1 * x + tc2 * x**2)) <= 0.0:
        raise InputError(
            Problem(
                where=f"resistor list: {material.name}",
                found="a law of which no quadratic over the range stays above zero",
                expected="a law near 1 + tc1 x + tc2 x^2",
                todo="Take a narrower range.",
            )
        )
    return Quadratic(tc1=tc1, tc2=tc2, error=_largest(ratio, x, tc1, tc2) * _BETWEEN)


def _largest(ratio: FloatArray, x: FloatArray, tc1: float, tc2: float) -> float:
    return float(np.max(np.abs((1.0 + tc1 * x + tc2 * x**2) / ratio - 1.0)))


def _fitted(ratio: FloatArray, x: FloatArray) -> tuple[float, float]:
    """Return tc1 and tc2 of the least largest relative error; the relative error is linear in them."""
    scale = float(np.max(np.abs(x)))
    columns = np.stack([x / scale, (x / scale) ** 2], axis=1) / ratio[:, None]
    wanted = 1.0 - 1.0 / ratio
    weights: FloatArray = np.ones_like(x)
    best = np.inf
    found: FloatArray = np.zeros(2)
    for _ in range(_ROUNDS):
        root = np.sqrt(weights)
        solved = np.linalg.lstsq(columns * root[:, None], wanted * root, rcond=None)[0]
        errors = np.abs(columns @ solved - wanted)
        if (peak := float(errors.max())) < best:
            best, found = peak, np.asarray(solved, dtype=np.float64)
        weights = weights * errors / np.max(weights * errors)
    return float(found[0] / scale), float(found[1] / scale**2)


# --- words ----------------------------------------------------------------------------------------------


def _header(
    network: Network,
    materials: Mapping[str, Material],
    fits: Mapping[str, Quadratic],
    reference: float,
    ends: str,
    title: str,
    name: str,
) -> Iterator[str]:
    at = format_celsius(reference)
    yield f"{_plain(title)}"
    yield f"Two-terminal block {name} between the nodes a and b: {_number(value(network))} ohm at {at}."
    yield (
        "R(T) = R (1 + tc1 (T - tnom) + tc2 (T - tnom)^2): R in ohm, tc1 per K, tc2 per K^2, tnom in degC, "
        f"the reference {at}. A simulator that takes no tnom on the line needs {at} as its nominal "
        "temperature."
    )
    for material, fit in fits.items():
        yield f"{_plain(materials[material].label)}: {_law_words(fit, ends)}"
    yield "Nominal values: no spread, no mismatch, no voltage coefficient, no self-heating."
    yield from CAUTIONS


def _law_words(fit: Quadratic, ends: str) -> str:
    if fit.error == 0.0:
        return "its law is this quadratic."
    error = numbers.number(round_outward(fit.error * 1e6))
    return (
        f"its law is no quadratic; tc1 and tc2 are those of the least largest error from {ends} that keep "
        f"the value at the reference. R(T) of a leg is off by {error} ppm at most."
    )


def block_name(title: str) -> str:
    """Return a name for a block: letters, digits and underscores, a letter first, 60 at most."""
    name = re.sub(r"[^A-Za-z0-9]+", "_", title).strip("_")
    if not name:
        return "resistor"
    return (name if name[0].isalpha() else f"r_{name}")[:LONGEST_NAME].rstrip("_")


def _plain(text: str) -> str:
    """Return text on one line of printable ASCII; no backslash, which continues a line in some readers."""
    one_line = " ".join(re.sub(r"[\x00-\x20\x7f-\xa0\u2028\u2029]+", " ", text).split())
    return re.sub(r"[^ -~]", "?", one_line).replace("\\", "/")


def _comment(text: str) -> list[str]:
    """Return a comment; a text longer than a line goes on in the next ones."""
    return textwrap.wrap(
        text, LONGEST_LINE, initial_indent="* ", subsequent_indent="* ", break_on_hyphens=False
    ) or ["*"]


def _cut(line: str) -> str:
    return line if len(line) <= LONGEST_LINE else f"{line[: LONGEST_LINE - 3]}..."


def _number(number: float) -> str:
    """Return a number with 12 digits and no suffix, such as 1.234e4."""
    mantissa, _, exponent = f"{number:.{_DIGITS - 1}e}".partition("e")
    power = int(exponent)
    return mantissa.rstrip("0").rstrip(".") + (f"e{power}" if power else "")
