"""The account of a ratio: what each cause adds to its highest and to its lowest drift.

Causes are added in a fixed order, each by how much it moves the extreme of those before it, at the
temperature where that side is worst. So they sum to the worst case there.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal, TypeAlias

import numpy as np

from tcplan.brief.model import Allowance
from tcplan.draws.sampling import leg_mismatch
from tcplan.material.spread import Spread
from tcplan.network import legs
from tcplan.process import Process
from tcplan.ratio.mismatch import SIGMAS, drift_sigma
from tcplan.ratio.pair import Pair
from tcplan.ratio.worst import side_at

Kind: TypeAlias = Literal["nominal", "spread", "systematic", "random"]


@dataclass(frozen=True, slots=True, kw_only=True)
class RatioRow:
    """What one cause adds to the highest and to the lowest drift, signed fractions; None when not known.

    A random row is at 3 sigma. ``note`` says what is missing, or where the figure comes from.
    """

    name: str
    kind: Kind
    up: float | None
    down: float | None
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class RatioAccount:
    """The rows, the temperatures [K] at which each side is worst, and the signed totals there.

    Figures are on the scale of the limit: a drift where the limit is wider counts for less. Rows add
    linearly; the random ones among them in root-sum-square.
    """

    rows: tuple[RatioRow, ...]
    up_at: float
    down_at: float
    total_up: float
    total_down: float


def ratio_contributions(
    pair: Pair, up_at: float, down_at: float, allowances: Sequence[Allowance] = ()
) -> RatioAccount:
    """Return the account of a pair.

    Parameters
    ----------
    pair : Pair
        A material without a spread counts as one that does not vary.
    up_at, down_at : float
        Where the drift of any device is highest and lowest [K], as `tcplan.ratio.worst.worst_of` finds.
    allowances : sequence of Allowance
        What else moves the ratio.

    Returns
    -------
    RatioAccount
        Residual curvature, TC1 spread, TC2 spread, value-ratio spread, tracking, mismatch, and allowances.
    """
    weights = _weight(pair, up_at), _weight(pair, down_at)
    rows = [*_spread_rows(pair, (up_at, down_at), weights), _mismatch_row(pair, (up_at, down_at), weights)]
    rows += [_allowance_row(one, pair.need.reference, (up_at, down_at), weights) for one in allowances]
    return RatioAccount(
        rows=tuple(rows),
        up_at=up_at,
        down_at=down_at,
        total_up=_total([(row.kind, row.up) for row in rows], 1.0),
        total_down=_total([(row.kind, row.down) for row in rows], -1.0),
    )


def _total(parts: Sequence[tuple[Kind, float | None]], sign: float) -> float:
    random = [size for kind, size in parts if kind == "random" and size is not None]
    rest = sum(size for kind, size in parts if kind != "random" and size is not None)
    return float(rest + sign * np.sqrt(np.sum(np.square(random))))


def _weight(pair: Pair, at: float) -> float:
    """Return the weight of the tightest limit at a temperature; a band counts as a drift."""
    own = [p for p in pair.need.pieces if p.low <= at <= p.high]
    return min((1.0 if piece.centred else piece.weight for piece in own), default=1.0)


def _growing(pair: Pair) -> tuple[tuple[str, Pair], ...]:
    """Return the pair without any cause but its nominal laws, then with one more of them each time."""
    limits = {name: spread.limits() for name, spread in pair.spreads.items()}
    none = {name: Spread(meaning="limits") for name in limits}
    tc1 = {name: replace(none[name], tc1=s.tc1, tcr=s.tcr) for name, s in limits.items()}
    tc2 = {name: replace(tc1[name], tc2=s.tc2) for name, s in limits.items()}
    alone = replace(pair, tracking=0.0)
    # Without spreads of TC1 nothing is tracked, and without those of values none go in step.
    return (
        ("residual curvature", replace(alone, spreads=none, process=Process())),
        ("TC1 spread", replace(alone, spreads=tc1)),
        ("TC2 spread", replace(alone, spreads=tc2)),
        ("value-ratio spread", alone),
        ("tracking", pair),
    )


def _spread_rows(pair: Pair, at: tuple[float, float], weights: tuple[float, float]) -> list[RatioRow]:
    rows: list[RatioRow] = []
    highest, lowest = 0.0, 0.0
    for name, grown in _growing(pair):
        high = side_at(grown, at[0], weights[0], up=True)
        low = side_at(grown, at[1], weights[1], up=False)
        if rows:  # one more cause never narrows what devices reach
            high, low = max(high, highest), min(low, lowest)
        rows.append(
            RatioRow(
                name=name,
                kind="spread" if rows else "nominal",
                up=high - highest,
                down=low - lowest,
                note=_tracking_note(pair) if name == "tracking" else "",
            )
        )
        highest, lowest = high, low
    return rows


def _tracking_note(pair: Pair) -> str:
    if not pair.shared:
        return "no material is in both resistors"
    return "" if pair.ratio.tracking is not None else "not stated, counted as 0"


def _mismatch_row(pair: Pair, at: tuple[float, float], weights: tuple[float, float]) -> RatioRow:
    sigmas = leg_mismatch(pair.together, pair.materials, pair.need.reference)
    missing = [leg.material for leg, s in zip(legs(pair.together), sigmas, strict=True) if s is None]
    note = f"matching or width not stated: {', '.join(dict.fromkeys(missing))}" if missing else "by area"
    if len(missing) == len(sigmas):
        return RatioRow(name="mismatch", kind="random", up=None, down=None, note=note)
    sizes = SIGMAS * drift_sigma(pair, np.array(at)) / np.array(weights)
    return RatioRow(name="mismatch", kind="random", up=float(sizes[0]), down=-float(sizes[1]), note=note)


def _allowance_row(
    one: Allowance, reference: float, at: tuple[float, float], weights: tuple[float, float]
) -> RatioRow:
    high, low = (
        one.size * (abs(T - reference) if one.per_kelvin else 1.0) / weight
        for T, weight in zip(at, weights, strict=True)
    )
    return RatioRow(
        name=one.name,
        kind=one.kind,
        up=high if one.sides != "down" else 0.0,
        down=-low if one.sides != "up" else 0.0,
        note=one.source,
    )
