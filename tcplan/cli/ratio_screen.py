"""The screen of a ratio, at most as wide as asked."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

import click

from tcplan.cli.paragraphs import COLOURS, labelled, wrapped
from tcplan.goal import Limit
from tcplan.network import Network, network_text, used_materials
from tcplan.ranges import GRADES
from tcplan.ratio.account import RatioRow
from tcplan.ratio.check import RatioCheck
from tcplan.ratio.mismatch import SIGMAS
from tcplan.spec import numbers
from tcplan.units import format_ohms, to_celsius

LABEL = 10
SMALLEST = 5e-10  # a contribution below this is rounding
CAUTION = (
    "Figures are design estimates, to be confirmed on silicon or hardware. Package stress, ageing, humidity "
    "and self-heating need their own allowance and check. Power parts can burn. Safety-related use follows "
    "the applicable standards, local codes and licensed practice."
)


def ratio_screen(check: RatioCheck, width: int, *, colour: bool = False) -> str:
    """Return the screen of a ratio.

    Parameters
    ----------
    check : RatioCheck
    width : int
        Columns.
    colour : bool
        Whether to colour the verdict.

    Returns
    -------
    str
        Lines of at most ``width`` columns.
    """
    blocks = (
        _asked(check, width, colour=colour),
        labelled("Assumed", _assumed(check), width, LABEL),
        _found(check, width),
        _account(check, width),
    )
    return "\n\n".join("\n".join(block) for block in blocks if block)


def _verdict(check: RatioCheck) -> str:
    return "no limit given" if check.pair.need.scale is None else check.verdict


def _asked(check: RatioCheck, width: int, *, colour: bool) -> list[str]:
    goal, ratio, over = check.pair.need.goal, check.pair.ratio, check.brief.over
    judge = {"worst-case": "worst case", "quantile": f"{numbers.percent(goal.quantile)} of lots"}
    limits = " and ".join(_limit(limit) for limit in goal.limits) or "no limit"
    low, high, at = (numbers.stated(t) for t in (over.low_degC, over.high_degC, over.reference_degC))
    head = (
        f"{ratio.kind.capitalize()} of {numbers.number(check.value)}, {limits} "
        f"({judge.get(goal.judge, 'nominal')}), {low} to {high} degC: {_verdict(check)}"
    )
    lines = wrapped(head, width)
    if colour and check.verdict in COLOURS and lines[-1].endswith(check.verdict):
        rest = lines[-1].removesuffix(check.verdict)
        lines[-1] = f"{rest}{click.style(check.verdict, fg=COLOURS[check.verdict])}"
    grade = GRADES.get(over.name)
    name = f" ({over.name}, {grade.standard})" if grade else ""
    rise = f", {numbers.stated(over.rise)} K of rise included at the high end" if over.rise else ""
    formula = "second/(first + second)" if ratio.kind == "divider" else "first/second"
    texts = [
        f"{check.brief.title}: {low} to {high} degC{name}{rise}, reference {at} degC.",
        f"The ratio is {formula}, first {_shown(ratio.first)}, second {_shown(ratio.second)}.",
        *(f"Mask, {line}." for limit in goal.limits for line in _mask(limit)),
    ]
    return [*lines, *(line for text in texts for line in wrapped(text, width))]


def _limit(limit: Limit) -> str:
    if limit.kind == "mask":
        return "drift inside its mask"
    words = {"chord_tcr": "chord TCR", "box_tcr": "box TCR"}.get(limit.kind, limit.kind)
    unit = "ppm/K" if limit.kind in ("chord_tcr", "box_tcr") else "ppm"
    return f"{words} within {numbers.stated(limit.value * 1e6)} {unit}"


def _mask(limit: Limit) -> list[str]:
    return [
        f"{numbers.stated(to_celsius(w.low))} to {numbers.stated(to_celsius(w.high))} degC: "
        f"{numbers.stated(w.limit * 1e6)} ppm"
        for w in limit.windows
    ]


def _shown(network: Network) -> str:
    return network_text(network, lambda leg: f"{leg.material} {format_ohms(leg.ohms)}")


# --- what is assumed ----------------------------------------------------------------------------------


def _assumed(check: RatioCheck) -> list[str]:
    pair, over = check.pair, check.brief.over
    outside = [n for n in pair.names if pair.materials[n].is_extrapolated(over.low, over.high)]
    texts = [
        _figures(check),
        "One device has one value and one law of each material, common to both resistors.",
        _tracking(check),
        _parts(check),
        f"No spread is stated for {', '.join(check.without_spread)}: the worst case and lots are not known."
        if check.without_spread
        else "",
        _unstated(check),
        "Not included: ends, package stress, ageing, humidity, self-heating, but for stated allowances.",
        f"EXTRAPOLATED beyond its valid range: {', '.join(outside)}." if outside else "",
        CAUTION,
    ]
    return [text for text in texts if text]


def _figures(check: RatioCheck) -> str:
    need = check.pair.need
    kind = need.kind.split(" and ")[0]
    words = {
        "band": "the band, highest minus lowest drift",
        "box_tcr": "the band",
        "chord_tcr": "the larger chord TCR times the longer arm",
        "mask": "the drift on the scale of the tightest line of the mask",
    }
    scale = "" if need.scale is None else f", against {numbers.stated(need.scale * 1e6)} ppm"
    wanted = "" if need.goal.wanted is None else " less the wanted law"
    return (
        f"Drift is q(T)/q(reference) - 1{wanted}; figures are "
        f"{words.get(kind, 'its peak over the whole range')}{scale}."
    )


def _tracking(check: RatioCheck) -> str:
    pair = check.pair
    if not pair.shared:
        return "No material is in both resistors, so tracking has no effect."
    names = ", ".join(pair.shared)
    if pair.ratio.tracking is None:
        return f"Tracking is not stated, so counted as 0: both resistors have one TC1 of {names}."
    within = numbers.stated(pair.ratio.tracking * 1e6)
    return f"The TC1 of two resistors of {names} differ by at most {within} ppm/K (limits)."


def _parts(check: RatioCheck) -> str:
    pair = check.pair
    parts = [name for name in pair.shared if pair.materials[name].kind == "part"]
    if not parts or pair.ratio.tracking is not None:
        return ""
    return (
        f"Two bought parts of {', '.join(parts)} need not share their TCR: state their tracking, up to "
        "twice the TCR limit."
    )


def _unstated(check: RatioCheck) -> str:
    parts, spreads = [], check.pair.spreads
    for key, words in (("value", "value"), ("tc1", "TC1"), ("tc2", "TC2")):
        names = [n for n in check.pair.names if n in spreads and key in spreads[n].unstated]
        if names:
            parts.append(f"{words} of {', '.join(names)}")
    return f"No half-width stated, so counted as 0: {'; '.join(parts)}." if parts else ""


# --- what was found -----------------------------------------------------------------------------------


def _found(check: RatioCheck, width: int) -> list[str]:
    facts = (
        ("Ratio", _value(check)),
        ("Nominal", _nominal(check)),
        ("Lots", _lots(check)),
        ("Worst", _worst(check)),
        ("Mismatch", _mismatch(check)),
        ("Verdict", f"{_verdict(check)}."),
    )
    return [line for label, text in facts for line in labelled(label, [text], width, LABEL)]


def _value(check: RatioCheck) -> str:
    text = f"{numbers.number(check.value, 6)} at the reference"
    low, high = check.value_low, check.value_high
    if low is None or high is None:
        return f"{text}; what the value spreads do to it is not known."
    if max(-low, high) < SMALLEST:
        return f"{text}; the value spreads cancel."
    return f"{text}; the value spreads move it by {_signed_percent(low)} to {_signed_percent(high)} of it."


def _signed_percent(fraction: float) -> str:
    return f"{numbers.signed(fraction * 100.0, 3)} %"


def _nominal(check: RatioCheck) -> str:
    need = check.pair.need
    if check.nominal.figure < SMALLEST:
        return "0 ppm."
    limit = None if need.scale is None else need.scale * 1e6
    spread = None if check.worst is None else check.worst.judged.figure * 1e6
    return f"{numbers.nominal(check.nominal.figure * 1e6, spread, limit)} ppm, at {_degC(check.nominal.at)}."


def _lots(check: RatioCheck) -> str:
    lots, need = check.lots, check.pair.need
    if lots is None:
        return "not known."
    limit = None if need.scale is None else need.scale * 1e6
    high = "no upper bound from so few" if lots.high is None else f"{numbers.worst(lots.high * 1e6, limit)}"
    text = (
        f"{numbers.percent(lots.fraction)} of lots are within {numbers.worst(lots.figure * 1e6)} ppm (95 % "
        f"interval {numbers.bound(lots.low * 1e6, limit)} to {high}); {lots.draws} draws, seed {lots.seed}."
    )
    if lots.inside is None or lots.inside_low is None or lots.inside_high is None:
        return text
    return (
        f"{text} {lots.inside * 100.0:.6g} % of them are inside the limit (exact 95 % interval "
        f"{lots.inside_low * 100.0:.5g} % to {lots.inside_high * 100.0:.5g} %)."
    )


def _worst(check: RatioCheck) -> str:
    worst, need = check.worst, check.pair.need
    if worst is None:
        return "NOT JUDGED: a material states no spread."
    limit = None if need.scale is None else need.scale * 1e6
    figure = f"{numbers.worst(worst.judged.figure * 1e6, limit)} ppm, at {_degC(worst.judged.at)}"
    bound = f"no device is above {numbers.worst(worst.upper * 1e6, limit)} ppm"
    how = bound if worst.closed else f"found by search; {bound}"
    points = "; ".join(text for name in worst.device.factors if (text := _point(check, name)))
    return f"{figure}; {how}." + (f" Reached with {points}." if points else "")


def _point(check: RatioCheck, name: str) -> str:
    """Return where one material is at the worst point, only what is off."""
    if check.worst is None:
        return ""
    device = check.worst.device
    (tc1, tc2), (first, second) = device.shifts[name], device.apart[name]
    parts = [
        (f"value {_signed_percent(device.factors[name] - 1.0)}", device.factors[name] - 1.0),
        (f"TC1 {numbers.signed(tc1 * 1e6)} ppm/K", tc1),
        (f"TC2 {numbers.signed(tc2 * 1e6)} ppm/K^2", tc2),
        (f"{numbers.signed(first * 1e6)} ppm/K in the first", first),
        (f"{numbers.signed(second * 1e6)} ppm/K in the second", second),
    ]
    off = [text for text, size in parts if abs(size) > 1e-12]
    return f"{name} {', '.join(off)}" if off else ""


def _mismatch(check: RatioCheck) -> str:
    found = check.mismatch
    if found.value is None or found.drift is None or found.at is None:
        names = ", ".join(found.unstated or used_materials(check.pair.together))
        return f"not known: no matching or width of {names}."
    still = found.drift < SMALLEST
    drift = "0" if still else f"{numbers.number(found.drift * 1e6, 3)} ppm at {_degC(found.at)}"
    sigma = numbers.number(found.value * 1e6, 3)
    text = f"sigma of the ratio {sigma} ppm, from unit to unit; of its drift {drift}."
    return f"{text} Without {', '.join(found.unstated)}, not stated." if found.unstated else text


def _degC(kelvin: float) -> str:  # noqa: N802 - a value that is not SI wears its unit
    return f"{numbers.number(to_celsius(kelvin), 3)} degC"


# --- the account --------------------------------------------------------------------------------------


def _account(check: RatioCheck, width: int) -> list[str]:
    account = check.account
    heads = ("contribution", "kind", "highest", "lowest")
    at = ("", "", f"at {_degC(account.up_at)}", f"at {_degC(account.down_at)}")
    rows = [(row.name, _kind(row), _size(row.up), _size(row.down)) for row in account.rows]
    total = ("total", "", _size(account.total_up), _size(account.total_down))
    lines = _columns([heads, at, *rows, total], width)
    notes = [f"{row.name}: {row.note}." for row in account.rows if row.note]
    rule = "-" * max(len(line) for line in lines)
    told = [
        "In ppm, signed, where each side is worst. Rows add linearly, each by what it adds to those above "
        f"it; random rows, at {numbers.number(SIGMAS)} sigma, in root-sum-square. The limit is judged "
        "without mismatch and allowances.",
        *_against(check),
        *notes,
    ]
    return [*lines[:-1], rule, lines[-1], "", *labelled("Account", told, width, LABEL)]


def _against(check: RatioCheck) -> list[str]:
    """Return the total against the limit; of a band the two sides are no one figure."""
    need, account = check.pair.need, check.account
    if need.scale is None or check.total_met is None:
        return []
    total, limit = max(account.total_up, -account.total_down), need.scale * 1e6
    side = "within" if check.total_met else "BEYOND"
    return [f"The total, {numbers.worst(total * 1e6, limit)} ppm, is {side} {numbers.stated(limit)} ppm."]


def _kind(row: RatioRow) -> str:
    return f"{numbers.number(SIGMAS)} sigma" if row.kind == "random" else row.kind


def _size(fraction: float | None) -> str:
    if fraction is None:
        return "not known"
    return "0" if abs(fraction) < SMALLEST else numbers.signed(fraction * 1e6, 3)


def _columns(rows: Sequence[tuple[str, ...]], across: int) -> list[str]:
    """Return rows in columns two apart: two flush left, the rest flush right; long names are cut."""
    widths = [max(len(row[n]) for row in rows) for n in range(len(rows[0]))]
    widths[0] = min(widths[0], max(12, across - sum(widths[1:]) - 2 * (len(widths) - 1)))
    lines = []
    for row in rows:
        name, *more = textwrap.wrap(row[0], widths[0]) or [""]
        cells = [name.ljust(widths[0]), row[1].ljust(widths[1])]
        cells += [cell.rjust(wide) for cell, wide in zip(row[2:], widths[2:], strict=True)]
        lines += ["  ".join(cells).rstrip(), *more]
    return lines
