"""Stock values of one leg: the nearest of an E series, alone and two in series or in parallel, exactly."""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.made import Joined, Refusal
from tcplan.material.model import Material
from tcplan.network import Network, leg_names, legs
from tcplan.preferred import preferred_values
from tcplan.units import format_ohms

_SAME = 1e-12  # values and errors closer than this differ by arithmetic only
_MEMBER = 1e-9  # relative; how far arithmetic may put a limit from a value
_JOINED: tuple[Joined, ...] = ("one", "series", "parallel")


@dataclass(frozen=True, slots=True, kw_only=True)
class Candidate:
    """One stock value, or two joined in series or in parallel (smaller first), and what they make [ohm]."""

    values: tuple[float, ...]
    joined: Joined
    ohms: float


def stock_values(series: str, lowest: float, highest: float) -> tuple[float, ...]:
    """Return the values of an E series from ``lowest`` to ``highest`` [ohm], both included, rising.

    Raises
    ------
    InputError
        If there is no such series, or no value of it inside the limits.

    References
    ----------
    IEC 60063, Preferred number series for resistors and capacitors.
    """
    significands = preferred_values(series)
    if not 0.0 < lowest <= highest < math.inf:
        raise InputError(_no_values(f"{lowest:g} to {highest:g} ohm", "two finite values above zero, rising"))
    digits = len(str(significands[0]))
    decades = range(math.floor(math.log10(lowest)) - digits, math.floor(math.log10(highest)) + 1)
    # Through text, so that 0.47 ohm is the float 0.47 to the last bit.
    listed = (float(f"{significand}e{decade}") for decade in decades for significand in significands)
    inside = tuple(v for v in listed if lowest * (1 - _MEMBER) <= v <= highest * (1 + _MEMBER))
    if not inside:
        found = f"no value of {series} from {format_ohms(lowest)} to {format_ohms(highest)}"
        raise InputError(_no_values(found, "at least one value inside the limits"))
    return inside


def candidates(
    wanted_ohms: float, series: str, lowest: float, highest: float, pairs: bool, few: int
) -> tuple[Candidate, ...]:
    """Return the ``few`` stock values nearest to a wanted one, of all values and all pairs.

    Parameters
    ----------
    wanted_ohms : float
        The ideal value [ohm].
    series : str
        An E series.
    lowest, highest : float
        Of the single parts [ohm].
    pairs : bool
        Whether two parts in series or in parallel are allowed.
    few : int
        How many different values to return.

    Returns
    -------
    tuple of Candidate
        The nearest first, by relative error; where that is equal, fewer parts first. Of several ways
        to the same value only one: fewer parts, else series, else the more equal pair.

    Raises
    ------
    InputError
        If there is no such series, or a size or count is not above zero.
    """
    check_counts(few=few)
    if not 0.0 < wanted_ohms < math.inf:
        raise InputError(_no_values(f"a wanted value of {wanted_ohms:g} ohm", "a finite value above zero"))
    values = np.array(stock_values(series, lowest, highest))
    rows = [np.stack([values, values, values, np.zeros_like(values)])]
    if pairs:
        rows += [_pairs(values, wanted_ohms, few, kind) for kind in ("series", "parallel")]
    return _nearest(np.concatenate(rows, axis=1), wanted_ohms, few)


def _pairs(values: FloatArray, wanted: float, few: int, joined: Joined) -> FloatArray:
    """Return rows (smaller, larger, together, kind) of pairs: for each value its nearest partners.

    With one part held, what the pair makes rises with the other: the best partners stand around the
    exact one in the sorted values. The nearest of all pairs are among the nearest of their smaller part.
    """
    if joined == "series":
        partner = wanted - values
    else:
        rest = 1.0 / wanted - 1.0 / values
        partner = np.where(rest > 0.0, 1.0 / np.where(rest > 0.0, rest, 1.0), np.inf)
    own = np.arange(len(values))[:, None]
    position = np.searchsorted(values, partner)[:, None] + np.arange(-few, few)
    row, column = np.nonzero((position >= own) & (position < len(values)))
    small, large = values[row], values[position[row, column]]
    together = small + large if joined == "series" else 1.0 / (1.0 / small + 1.0 / large)
    return np.stack([small, large, together, np.full_like(small, _JOINED.index(joined))])


def _nearest(rows: FloatArray, wanted: float, few: int) -> tuple[Candidate, ...]:
    """Return the nearest different values of rows (smaller, larger, together, kind)."""
    rows = rows[:, np.argsort(rows[2], kind="stable")]
    group = np.r_[0, np.cumsum(np.diff(rows[2]) > _SAME * rows[2, 1:])]
    rows = rows[:, np.lexsort((-rows[0], rows[3], group))]
    rows = rows[:, np.unique(group, return_index=True)[1]]  # groups are sorted, before as after
    error = rounded(np.abs(rows[2] / wanted - 1.0))
    chosen = rows[:, np.lexsort((rows[2], rows[3] > 0, error))[:few]]
    return tuple(
        Candidate(
            values=(float(small),) if kind == 0 else (float(small), float(large)),
            joined=_JOINED[int(kind)],
            ohms=float(together),
        )
        for small, large, together, kind in chosen.T
    )


def stock_refusals(
    network: Network,
    materials: Mapping[str, Material],
    *,
    lowest: float,
    highest: float,
    pairs: bool = True,
    given: Collection[int] = (),
) -> tuple[Refusal, ...]:
    """Return the legs whose value no stock part or pair reaches, each with the nearest value.

    The parameters are those of `stock_choices`.
    """
    refused = []
    for position, series in stock_positions(network, materials, given).items():
        leg = legs(network)[position]
        values, times = stock_values(series, lowest, highest), 2.0 if pairs else 1.0
        least, most = values[0] / times, values[-1] * times
        if least * (1 - _MEMBER) <= leg.ohms <= most * (1 + _MEMBER):
            continue
        refused.append(
            Refusal(
                leg=leg_names(position + 1)[position],
                rule="stock",
                found=f"{format_ohms(leg.ohms)} of {leg.material} ({series})",
                nearest=format_ohms(least if leg.ohms < least else most),
            )
        )
    return tuple(refused)


def stock_positions(
    network: Network, materials: Mapping[str, Material], given: Collection[int]
) -> dict[int, str]:
    """Return the positions of the legs that are to be stock parts, and their series."""
    series = [materials[leg.material].series for leg in legs(network)]
    return {k: name for k, name in enumerate(series) if name is not None and k not in given}


def rounded(fractions: FloatArray) -> FloatArray:
    """Return fractions without what is arithmetic only, so that equal ones tie."""
    return np.asarray(np.round(fractions, 12), dtype=np.float64)


def _no_values(found: str, expected: str) -> Problem:
    return Problem(
        where="stock values", found=found, expected=expected, todo="Check the limits of the stock."
    )


def check_counts(**counts: int) -> None:
    """Refuse counts below 1."""
    wrong = [Problem(where=n, found=str(c), expected="at least 1") for n, c in counts.items() if c < 1]
    if wrong:
        raise InputError(wrong)
