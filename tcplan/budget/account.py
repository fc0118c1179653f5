"""From a checked option to its budget: rows, totals, and the limit."""

from __future__ import annotations

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.budget.case import Case
from tcplan.budget.knowledge import knowledge
from tcplan.budget.model import Budget, Contribution, TotalError
from tcplan.budget.sensitivity import sensitivities
from tcplan.budget.sheet import Sheet, peak, sheet, temperatures
from tcplan.budget.value_error import reference_error, total_errors
from tcplan.drift import breakpoints, ratio_curve
from tcplan.goal import judged
from tcplan.network import Network, network_text, used_materials
from tcplan.plan import Option, RangeRecord, Verdict
from tcplan.units import to_celsius
from tcplan.worst.box import Worst
from tcplan.worst.evaluation import worst_case


def budget(option: Option, case: Case) -> Budget:
    """Return the budget of one checked option.

    Parameters
    ----------
    option : Option
    case : Case
        With the materials of its network, valid over the range.

    Returns
    -------
    Budget
        Contributions are added with their signs at each temperature, and only then the peak is taken.
    """
    network, need = option.network, case.need
    box = case.box(network)
    worst = worst_case(box.network, box.materials, box.spreads, need, case.process)
    T, weight = temperatures(need, case.over.low, case.over.high, worst.judged.at)
    whole = sheet(network, case, T, weight, exact=False)
    high = peak(network, case, whole, lambda s: s.total_up / s.weight)
    low = peak(network, case, whole, lambda s: -s.total_down / s.weight)
    top, bottom = _ppm(high.total_up / high.weight), _ppm(low.total_down / low.weight)
    reached = _reached(top, bottom, whole, worst, case)
    ratio = ratio_curve(box.network, case.materials, need.reference)
    missing = case.without_spread(network)
    return Budget(
        option=option.id,
        network=network_text(box.network),
        range=_range(case),
        limit_kind=need.kind,
        rows=_rows(whole, high, low),
        random_up_ppm=_ppm(high.random_up / high.weight),
        random_down_ppm=_ppm(low.random_down / low.weight),
        total_up_ppm=top,
        total_down_ppm=bottom,
        at_up_degC=to_celsius(float(high.T[0])),
        at_down_degC=to_celsius(float(low.T[0])),
        peak_ppm=reached,
        limit_ppm=None if need.scale is None else need.scale * 1e6,
        verdict=_verdict(reached, worst, case, missing),
        nominal_ppm=judged(ratio, need, breakpoints(case.materials, box.names)).figure * 1e6,
        worst_case_ppm=worst.judged.figure * 1e6,
        worst_case_bound_ppm=worst.upper * 1e6,
        worst_case_at_degC=to_celsius(worst.judged.at),
        total_error=_total_error(network, case, whole),
        sensitivities=sensitivities(box.network, case.materials, need),
        knowledge=knowledge(case),
        without_spread=missing,
        notes=_notes(network, case, worst),
    )


def _ppm(fraction: FloatArray) -> float:
    """Return the only number of an array, in ppm."""
    return float(fraction[0]) * 1e6


def _range(case: Case) -> RangeRecord:
    over = case.over
    return RangeRecord(
        name=over.name,
        low_degC=over.low_degC,
        high_degC=over.high_degC,
        reference_degC=over.reference_degC,
        rise_K=over.rise,
    )


def _rows(whole: Sheet, high: Sheet, low: Sheet) -> tuple[Contribution, ...]:
    """Return each row at the peaks of both sides, on the scale of the limit."""
    found = []
    for row, top, bottom in zip(whole.rows, high.rows, low.rows, strict=True):
        up = None if top.up is None else _ppm(top.up / high.weight)
        down = None if bottom.down is None else _ppm(bottom.down / low.weight)
        most = None
        if row.up is not None and row.down is not None and up is not None and down is not None:
            anywhere = np.abs(np.stack([row.up, row.down])).max(axis=0) / whole.weight
            most = max(float(anywhere.max()) * 1e6, abs(up), abs(down))
        found.append(
            Contribution(name=row.name, kind=row.kind, up_ppm=up, down_ppm=down, most_ppm=most, note=row.note)
        )
    return tuple(found)


# --- the limit ----------------------------------------------------------------------------------------


def _reached(top: float, bottom: float, whole: Sheet, worst: Worst, case: Case) -> float:
    """Return what the limit is set against [ppm].

    Of a band the highest and the lowest drift of all devices together are one bound; the worst band of
    any device, with everything else added at its own worst, is another.
    """
    if not case.need.centred:
        return max(top, -bottom)
    above = float(((whole.total_up - whole.worst_up) / whole.weight).max()) * 1e6
    below = float(((whole.worst_down - whole.total_down) / whole.weight).max()) * 1e6
    together = top - bottom
    plain = max(top, -bottom) if any(not piece.centred for piece in case.need.pieces) else 0.0
    return max(plain, min(together, worst.upper * 1e6 + above + below))


def _verdict(reached: float, worst: Worst, case: Case, missing: tuple[str, ...]) -> Verdict:
    """Return whether the total is within the limit; what is only a bound may leave it open."""
    if case.need.scale is None:
        return "NOT JUDGED"
    if case.need.met(reached * 1e-6):
        return "NOT JUDGED" if missing else "MET"
    # For a band the sum is a bound; for a mixed network the worst case is known to 1 part in 10^4.
    open_ = reached * 1e-6 - (worst.upper - worst.judged.figure)
    least = worst.judged.figure if case.need.centred else open_
    return "NOT JUDGED" if case.need.met(least) else "NOT MET"


def _notes(network: Network, case: Case, worst: Worst) -> tuple[str, ...]:
    missing = case.without_spread(network)
    spreads = case.spreads()
    outside = [
        name
        for name in used_materials(network)
        if case.materials[name].is_extrapolated(case.over.low, case.over.high)
    ]
    stated = [name for name in used_materials(network) if name not in missing]
    unstated = {
        words: [name for name in stated if part in spreads[name].unstated]
        for part, words in (("value", "value"), ("tc1", "TC1"), ("tc2", "TC2"))
    }
    zero = "; ".join(f"{words} of {', '.join(names)}" for words, names in unstated.items() if names)
    judge = case.need.goal.judge
    candidates = (
        f"The brief judges the {judge} figure; here the limit is held against the whole total."
        if judge != "worst-case" and case.need.scale is not None
        else "",
        f"No spread is stated for {', '.join(missing)}: the total is without it." if missing else "",
        f"No half-width stated, so counted as 0: {zero}." if zero else "",
        f"EXTRAPOLATED beyond its valid range: {', '.join(outside)}." if outside else "",
        "A band is bounded by the highest and the lowest drift of all devices, which need not be those "
        "of one." if case.need.centred else "",
        "The spread of the values is a guaranteed bound, at most 0.01 % wide."
        if worst.method == "cells"
        else "",
    )  # fmt: skip
    return tuple(note for note in candidates if note)


# --- the value ----------------------------------------------------------------------------------------


def _total_error(network: Network, case: Case, whole: Sheet) -> TotalError | None:
    """Return the error of the value over the whole range; None when that at the reference is not known."""
    reference = reference_error(network, case)
    if reference is None:
        return None

    def above(s: Sheet) -> FloatArray:
        return total_errors(network, case, reference, s.T, s.worst_up, s.total_up, 1)

    def below(s: Sheet) -> FloatArray:
        return -total_errors(network, case, reference, s.T, s.worst_down, s.total_down, -1)

    high, low = peak(network, case, whole, above), peak(network, case, whole, below)
    return TotalError(
        up_ppm=float(above(high)[0]) * 1e6,
        down_ppm=-float(below(low)[0]) * 1e6,
        at_up_degC=to_celsius(float(high.T[0])),
        at_down_degC=to_celsius(float(low.T[0])),
        reference=reference,
    )
