"""A ratio checked: its value, what it drifts at nominal, in lots and at worst, and the verdict."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from tcplan import __version__
from tcplan.brief.model import Brief
from tcplan.drift import breakpoints, extremes, panels
from tcplan.errors import InternalError
from tcplan.goal import Judged, Requirement, requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.plan import Verdict
from tcplan.ratio.account import RatioAccount, RatioRow, ratio_contributions
from tcplan.ratio.lots import RatioLots, drawn_lots
from tcplan.ratio.mismatch import Mismatch, mismatch_of, value_range
from tcplan.ratio.pair import Pair
from tcplan.ratio.worst import RatioWorst, worst_of
from tcplan.units import to_celsius

POINTS = 129  # temperatures at which the mismatch of the drift is looked at


@dataclass(frozen=True, slots=True, kw_only=True)
class RatioCheck:
    """What was found of the ratio of a brief; figures are fractions, temperatures [K].

    ``value`` is the ratio at the reference; ``value_low`` and ``value_high`` are how far the value spreads
    move it, None where one is not stated. ``worst`` and ``lots`` are None when a material states no spread.
    """

    brief: Brief
    pair: Pair
    value: float
    value_low: float | None
    value_high: float | None
    nominal: Judged
    band: float
    worst: RatioWorst | None
    lots: RatioLots | None
    mismatch: Mismatch
    account: RatioAccount
    verdict: Verdict

    @property
    def without_spread(self) -> tuple[str, ...]:
        """The materials that state no spread."""
        return tuple(name for name in self.pair.names if name not in self.pair.spreads)

    @property
    def total_met(self) -> bool | None:
        """Whether the total of the account is within the limit; None without one, or of a band."""
        need = self.pair.need
        if need.scale is None or need.centred:
            return None
        return need.met(max(self.account.total_up, -self.account.total_down))

    def to_dict(self) -> dict[str, Any]:
        """Return ratio.json; see docs/ratio.md."""
        over, need, ratio = self.brief.over, self.pair.need, self.pair.ratio
        asked = self.brief.to_dict()
        return {
            "schema": 1,
            "tcplan": __version__,
            "brief": {key: asked[key] for key in ("title", "sha256", "goal", "process", "allowances")},
            "range": {
                "name": over.name,
                "low_degC": over.low_degC,
                "high_degC": over.high_degC,
                "reference_degC": over.reference_degC,
                "rise_K": over.rise,
            },
            "ratio": {
                **ratio.to_dict(),
                "value": self.value,
                "spread_down_ppm": _ppm(self.value_low),
                "spread_up_ppm": _ppm(self.value_high),
            },
            "limit": {
                "kind": need.kind,
                "drift_ppm": _ppm(need.scale),
                "judge": need.goal.judge,
                "quantile": need.goal.quantile,
            },
            "materials": {name: self.pair.materials[name].to_dict() for name in sorted(self.pair.names)},
            "nominal": {
                "figure_ppm": _ppm(self.nominal.figure),
                "at_degC": to_celsius(self.nominal.at),
                "band_ppm": _ppm(self.band),
            },
            "worst_case": None if self.worst is None else _worst_dict(self.worst),
            "likely": None if self.lots is None else _lots_dict(self.lots),
            "mismatch": {
                "sigma_ppm": _ppm(self.mismatch.value),
                "drift_sigma_ppm": _ppm(self.mismatch.drift),
                "at_degC": None if self.mismatch.at is None else to_celsius(self.mismatch.at),
                "unstated": list(self.mismatch.unstated),
            },
            "account": _account_dict(self.account),
            "verdict": self.verdict,
        }


def pair_of(brief: Brief) -> Pair:
    """Return the pair of a brief with a ratio; spreads as limits, over the range of the brief."""
    if brief.ratio is None:
        raise InternalError("a brief without a ratio")
    found = {m.name: m.effective_spread(brief.over.low, brief.over.high) for m in brief.materials}
    return Pair(
        ratio=brief.ratio,
        materials=brief.by_name,
        spreads={name: spread for name, spread in found.items() if spread is not None},
        need=requirement(brief.goal, brief.over),
        process=brief.process,
        tracking=brief.ratio.tracking or 0.0,
    )


def check_ratio(brief: Brief) -> RatioCheck:
    """Return what is found of the ratio of a brief.

    Parameters
    ----------
    brief : Brief
        With a ``ratio``.

    Returns
    -------
    RatioCheck
    """
    pair, need, over = pair_of(brief), requirement(brief.goal, brief.over), brief.over
    nominal = pair.judge(pair.nominal())
    splits = (*breakpoints(pair.materials, pair.names), *need.breakpoints())
    curve = pair.curve(pair.nominal())
    ends = extremes(lambda T: curve(T) - need.wanted(T), panels(over.low, over.high, splits))
    stated = {m.name: s for m in brief.materials if (s := _stated(m, brief)) is not None}
    known = len(stated) == len(pair.names)
    worst = worst_of(pair) if known else None
    lots = drawn_lots(pair, stated) if known else None
    moved = value_range(pair) if known else (None, None)
    at = (ends.high.at, ends.low.at) if worst is None else (worst.high_at, worst.low_at)
    return RatioCheck(
        brief=brief,
        pair=pair,
        value=pair.value(),
        value_low=moved[0],
        value_high=moved[1],
        nominal=nominal,
        band=ends.band,
        worst=worst,
        lots=lots,
        mismatch=mismatch_of(pair, np.linspace(over.low, over.high, POINTS)),
        account=ratio_contributions(pair, *at, brief.allowances),
        verdict=_verdict(need, nominal, worst, lots),
    )


def _stated(material: Material, brief: Brief) -> Spread | None:
    """Return the spread as stated, the extrapolation's added where the range asks for it."""
    outside = material.is_extrapolated(brief.over.low, brief.over.high)
    if material.spread is None or not outside or material.extrapolation is None:
        return material.spread
    return material.spread.widened(material.extrapolation)


def _verdict(need: Requirement, nominal: Judged, worst: RatioWorst | None, lots: RatioLots | None) -> Verdict:
    """Return whether the limit is met; a bound, or an interval, must be inside as a whole."""
    if need.scale is None:
        return "NOT JUDGED"
    low: float | None
    high: float | None
    if need.goal.judge == "nominal":
        low = high = nominal.figure
    elif need.goal.judge == "quantile":
        low, high = (None, None) if lots is None else (lots.low, lots.high)
    else:
        low, high = (None, None) if worst is None else (worst.judged.figure, worst.upper)
    if high is not None and need.met(high):
        return "MET"
    return "NOT JUDGED" if low is None or need.met(low) else "NOT MET"


def _ppm(fraction: float | None) -> float | None:
    return None if fraction is None else fraction * 1e6


def _worst_dict(worst: RatioWorst) -> dict[str, Any]:
    device = worst.device
    return {
        "figure_ppm": _ppm(worst.judged.figure),
        "at_degC": to_celsius(worst.judged.at),
        "upper_bound_ppm": _ppm(worst.upper),
        "closed": worst.closed,
        "point": {
            name: {
                "factor": factor,
                "tc1": device.shifts[name][0] * 1e6,
                "tc2": device.shifts[name][1] * 1e6,
                "apart_first": device.apart[name][0] * 1e6,
                "apart_second": device.apart[name][1] * 1e6,
            }
            for name, factor in device.factors.items()
        },
    }


def _lots_dict(lots: RatioLots) -> dict[str, Any]:
    return {
        "fraction": lots.fraction,
        "figure_ppm": _ppm(lots.figure),
        "low_ppm": _ppm(lots.low),
        "high_ppm": _ppm(lots.high),
        "inside": lots.inside,
        "inside_low": lots.inside_low,
        "inside_high": lots.inside_high,
        "largest_ppm": _ppm(lots.largest),
        "draws": lots.draws,
        "seed": lots.seed,
    }


def _account_dict(account: RatioAccount) -> dict[str, Any]:
    return {
        "rows": [_row_dict(row) for row in account.rows],
        "up_at_degC": to_celsius(account.up_at),
        "down_at_degC": to_celsius(account.down_at),
        "total_up_ppm": _ppm(account.total_up),
        "total_down_ppm": _ppm(account.total_down),
    }


def _row_dict(row: RatioRow) -> dict[str, Any]:
    return {
        "name": row.name,
        "kind": row.kind,
        "up_ppm": _ppm(row.up),
        "down_ppm": _ppm(row.down),
        "note": row.note,
    }
