"""A trim in words: its bits or its cut, the drift before and after, and what remains."""

from __future__ import annotations

from tcplan.parts.trim import Cut, Drawn, Row, Stat, Swing, TrimPlan
from tcplan.spec import numbers
from tcplan.units import format_celsius, format_ohms, format_si


def trim_text(plan: TrimPlan) -> tuple[str, ...]:
    """Return short sentences about a trim."""
    if plan.method == "cut":
        return (*_cut_head(plan), *_reached(plan), *_cut_tail(plan))
    rows = (sentence for row in plan.rows for sentence in (_row(row), _gaps(row), _drawn(row)))
    table = ("Every bit is in the table of bits.",) if any(row.bits for row in plan.rows) else ()
    return (_codes_head(plan), *rows, *table, *_reached(plan), *_switches(plan), *_remains(plan))


def _trim(plan: TrimPlan) -> str:
    return f"Trim of {plan.label}" if plan.label else "Trim"


# --- codes ----------------------------------------------------------------------------------------------


def _codes_head(plan: TrimPlan) -> str:
    target = format_ohms(plan.target_ohms)
    if plan.temperatures is None:
        what = f"the codes restore the mix of the films, and the value, {target}"
        return f"{_trim(plan)} at one temperature: {what}."
    low, high = map(format_celsius, plan.temperatures)
    what = f"the codes set the value, {target}, and null the slope between the two"
    return f"{_trim(plan)} at {low} and {high}: {what}."


def _row(row: Row) -> str:
    bits = len(row.bit_ohms)
    units = format_ohms(row.bit_ohms[0])
    if bits > 1:
        units = f"{units} to {format_ohms(row.bit_ohms[-1])}"
    return (
        f"Leg {row.leg} ({row.material}): {format_ohms(row.base_ohms)} and {bits} "
        f"{'bit' if bits == 1 else 'bits'} of {units}; least step {format_ohms(row.step_ohms)}, "
        f"{numbers.number(row.step * 1e6, 3)} ppm of the whole."
    )


def _gaps(row: Row) -> str:
    """Return the largest gap between codes where the film is at its limits."""
    low, high = (numbers.worst(gap * 1e6) for gap in (row.gaps[0], row.gaps[-1]))
    limit = numbers.percent(row.half_width)
    return (
        f"Between its codes are at most {low} ppm of the whole in a device at -{limit}, "
        f"{high} ppm at +{limit}."
    )


def _drawn(row: Row) -> str:
    """Return how a leg with bits is drawn: its rest, its least bit and its largest."""
    if row.base is None or row.area is None:
        return f"Leg {row.leg} has no drawing: {row.material} has no unit cell."
    ends = {1: row.bits[0], len(row.bits): row.bits[-1]}
    bits = ", ".join(f"bit {k} {_segments(bit)}" for k, bit in ends.items())
    area = numbers.number(row.area * 1e12, 4)
    return f"Drawn {_size(row.base.width)} wide: rest {_segments(row.base)}; {bits}; {area} um^2 in all."


def _segments(piece: Drawn) -> str:
    strings = f"{piece.strings} string{'s' if piece.strings > 1 else ''} of "
    units = f"{piece.units} unit{'s' if piece.units > 1 else ''} and " if piece.units else ""
    return f"{strings}{units}L {_size(piece.length)}"


def _size(metres: float) -> str:
    return format_si(metres, "m", 6)


def _switches(plan: TrimPlan) -> tuple[str, ...]:
    """Return why the drift is larger after the trim, where it is."""
    before, after, ideal = plan.before.drift, plan.after.drift, plan.ideal_switches
    if after.median <= before.median and after.quantile <= before.quantile and after.worst <= before.worst:
        return ()
    larger = "The drift is larger after the trim than before"
    if ideal is None:
        return (f"{larger}, with switches of 0 ohm.",)
    pairs = ((after.median, ideal.median), (after.quantile, ideal.quantile), (after.worst, ideal.worst))
    if all(own <= without for own, without in pairs):
        return (f"{larger}; it is the curvature that the trim brings out, not the switches.",)
    costs = [numbers.number(round((own - without) * 1e6, 9), 3) for own, without in pairs]
    return (
        f"{larger}: the switches cost {costs[0]} ppm in the median, {costs[1]} ppm at 99.73 %, "
        f"{costs[2]} ppm at worst. With the same codes and switches of 0 ohm it would be {_figures(ideal)}.",
        "Switches of less resistance, or fewer bits by a coarser step, cost less.",
    )


def _remains(plan: TrimPlan) -> tuple[str, ...]:
    out = (
        f"The bits do not reach far enough in {numbers.percent(plan.out_of_codes)} of the devices."
        if plan.out_of_codes
        else "The bits reach far enough in every device drawn."
    )
    if plan.perfect is None:
        return (out,)
    left = f"With perfect codes and no switches the drift would be {_figures(plan.perfect.drift)}"
    if plan.temperatures is None:
        why = "the nominal drift and the spread of the TCs, which one temperature can not trim"
        return out, f"{left}: {why}."
    slope = plan.after.chord
    between = "" if slope is None else f"The slope left between the two is {_slopes(slope)}. "
    return out, f"{between}{left}: that much is curvature, and what lies outside the two."


def _slopes(slope: Stat) -> str:
    median, quantile, worst = (numbers.worst(s * 1e6) for s in (slope.median, slope.quantile, slope.worst))
    return f"{median} ppm/K in the median, {quantile} ppm/K at 99.73 %, {worst} ppm/K at worst"


# --- cuts -----------------------------------------------------------------------------------------------


def _cut_head(plan: TrimPlan) -> tuple[str, ...]:
    chosen = plan.cuts[0]
    drawn = ", ".join(
        f"{leg} to {numbers.number(aim)} of its nominal value (gain needed {_gain(gain)})"
        for leg, aim, gain in zip(chosen.legs, chosen.aims, chosen.gains, strict=True)
    )
    head = f"{_trim(plan)} by a cut, which only raises a value. Draw leg {drawn}."
    if plan.whole_aim is None or plan.whole_gain is None:
        return (head,)
    whole = f"{numbers.number(plan.whole_aim)} of target, gain {numbers.number(plan.whole_gain)}"
    return head, f"The whole, were all of it cut alike: aim at {whole}."


def _cut_tail(plan: TrimPlan) -> tuple[str, ...]:
    chosen, *others = plan.cuts
    found = []
    if chosen.share is not None and chosen.tc1 is not None:
        found.append(
            f"After the cut leg {chosen.legs[0]} has a share of {_swing(chosen.share, 100.0, '%')}; "
            f"TC1 of the whole is {_swing(chosen.tc1, 1e6, 'ppm/K')}."
        )
    ends = (("cold", chosen.cold_chord), ("hot", chosen.hot_chord))
    found += [f"Chord to the {end} end: {_swing(one, 1e6, 'ppm/K')}." for end, one in ends if one is not None]
    if chosen.above or chosen.short:
        found.append(
            f"{numbers.percent(chosen.above)} of the devices are above target before the cut, "
            f"{numbers.percent(chosen.short)} would need more than a cut may add."
        )
    return (*found, *map(_other, others))


def _other(cut: Cut) -> str:
    legs = f"leg{'s' if len(cut.legs) > 1 else ''} {' and '.join(cut.legs)}"
    gains = ", ".join(map(_gain, cut.gains))
    if cut.reached is None:
        return f"A cut of {legs} can not cover the spread."
    why = "" if cut.feasible else ", more than a cut may add"
    drift = numbers.worst(cut.reached.drift.worst * 1e6)
    return f"A cut of {legs} instead: gain {gains}{why}; worst drift {drift} ppm."


def _gain(gain: float | None) -> str:
    return "none is enough" if gain is None else numbers.number(gain)


def _swing(swing: Swing, factor: float, unit: str) -> str:
    median, worst = (numbers.number(s * factor, 3) for s in (swing.median, swing.worst))
    return f"{median} {unit} in the median, {worst} {unit} at worst"


# --- both -----------------------------------------------------------------------------------------------


def _reached(plan: TrimPlan) -> tuple[str, ...]:
    before, after = plan.before, plan.after
    found = [
        f"Judged drift of {plan.draws} devices (seed {plan.seed}): before {_figures(before.drift)}; "
        f"after {_figures(after.drift)}.",
        f"Error of the value: before {_errors(before.value)}; after {_errors(after.value)}.",
    ]
    if plan.method != "two-temperatures":
        found.append(f"Error of the mix: before {_errors(before.mix)}; after {_errors(after.mix)}.")
    return tuple(found)


def _figures(drift: Stat) -> str:
    median, quantile, worst = (numbers.worst(s * 1e6) for s in (drift.median, drift.quantile, drift.worst))
    return f"{median} ppm in the median, {quantile} ppm at 99.73 %, {worst} ppm at worst"


def _errors(error: Stat) -> str:
    return " / ".join(_percent(s) for s in (error.median, error.quantile, error.worst))


def _percent(error: float) -> str:
    return f"{numbers.number(error * 100.0, 2)} %" if error >= 1e-8 else "0 %"
