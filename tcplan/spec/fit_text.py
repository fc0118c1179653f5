"""What a fit found, in words: the law with its uncertainties, the spread, and what stands out.

Long, since each thing that a fit can find has words of its own.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from decimal import Decimal

from tcplan.measure.fit_checks import RISK
from tcplan.measure.fitted import FittedMaterial, combined, scatter_of
from tcplan.measure.model import Fit
from tcplan.measure.spread import Population, Scatter
from tcplan.measure.tracking import MeasuredTracking
from tcplan.spec import numbers
from tcplan.units import format_celsius, format_ohms

MOST_LINES = 8  # that are told of each kind
MOST_DEVICES = 4  # that are named
LEAST_TOLD = 1e-3  # of a probability
SMALLEST_PLAIN = 1e-4  # a number below is written with an exponent
SCALES = {
    "tc1": (1e6, "ppm/K"),
    "tc2": (1e6, "ppm/K^2"),
    "tc3": (1e6, "ppm/K^3"),
    "beta": (1.0, "K"),
}
WORDS = {"value": "R", "tc1": "TC1", "tc2": "TC2", "tc3": "TC3"}
SCATTER_SCALES = {"value": (1e2, "%"), "tc1": (1e6, "ppm/K"), "tc2": (1e6, "ppm/K^2")}
NAME_LETTERS = 16  # of a device or a lot in the table

Fact = tuple[str, tuple[str, ...]]


def head(one: FittedMaterial) -> str:
    """Return the first line of a material: what was read."""
    found = one.found
    lots = f" of {found.lots} lots" if found.lots > 1 else ""
    devices = f"{found.devices} devices{lots}" if found.devices > 1 else "one device"
    low, high = format_celsius(found.low), format_celsius(found.high)
    return f"{one.request.name}: {len(one.sweep.T)} readings of {devices}, {low} to {high}"


def facts(one: FittedMaterial, refused: int) -> tuple[Fact, ...]:
    """Return the labels and sentences of a material; those that have nothing to say are left out.

    Parameters
    ----------
    one : FittedMaterial
    refused : int
        How many rows of its file were no readings.
    """
    found: Sequence[Fact] = (
        ("Law", tuple(_law(one))),
        ("Spread", tuple(_spread(one.found))),
        ("Readings", tuple(quality(one))),
        ("Flags", tuple(_flags(one))),
        ("Left out", tuple(_left_out(one))),
        ("Refused", tuple(_refused(one, refused))),
        ("Note", (*one.notes, *_notes(one.found))),
    )
    return tuple((label, texts) for label, texts in found if texts)


def _notes(found: Population) -> Iterator[str]:
    """Yield what the data of several devices do not tell, components by their words."""
    for note in found.notes if found.devices > 1 else ():
        word, colon, rest = note.partition(":")
        yield f"{WORDS[word]}{colon}{rest}" if word in WORDS else note


def tracking_text(names: Sequence[str], tracked: MeasuredTracking) -> str:
    """Return what is said of two materials whose TC1 track."""
    ppm = numbers.worst(tracked.half_width * 1e6)
    return f"TC1 of {names[0]} and {names[1]} track within {ppm} ppm/K of their mean difference."


# --- the law --------------------------------------------------------------------------------------------


def _law(one: FittedMaterial) -> Iterator[str]:
    found, several = one.found, one.found.devices > 1
    values = zip(found.names, found.values, found.uncertainties, strict=True)
    for name, value, u in values:
        if name == "R":
            at = format_celsius(one.request.reference)
            of = " of the mean of the lots" if found.lots > 1 else " of the mean" if several else ""
            share = numbers.number(u / value * 100.0, 2)
            digits = max(4, min(9, math.ceil(math.log10(value / u)) + 1)) if u > 0.0 else 6
            yield f"R({at}) {format_ohms(value, digits)} +- {share} % (standard uncertainty{of})."
        else:
            scale, unit = SCALES.get(name, (1.0, ""))
            yield f"{WORDS.get(name, name)} {_known(value * scale, u * scale)} {unit}".rstrip() + "."
    yield from _quadratic(one)


def _quadratic(one: FittedMaterial) -> Iterator[str]:
    if one.quadratic is not None:
        together = ", all devices together" if len(one.fits) > 1 else ""
        p = f"(p {_probability(one.quadratic)}{together})"
        if one.quadratic > RISK:
            yield f"The quadratic term is not significant {p}: it is kept; --order 1 leaves it out."
        else:
            yield f"The quadratic term is significant {p}."
    elif one.request.model == "polynomial" and one.request.order is None:
        yield "A line was fitted: there are too few readings for a quadratic term."


def _known(value: float, uncertainty: float) -> str:
    """Return a value to the second digit of its uncertainty, with it."""
    if not 0.0 < uncertainty < math.inf:
        return f"{numbers.number(value, 6)} +- {numbers.number(uncertainty, 2)}"
    place = math.floor(math.log10(uncertainty)) - 1
    if max(abs(value), uncertainty) < SMALLEST_PLAIN:
        return f"{_exponent(value, place)} +- {_exponent(uncertainty, place)}"
    if not -12 <= place <= 0:
        digits = max(1, math.floor(math.log10(abs(value) or uncertainty)) - place + 1)
        return f"{numbers.number(value, min(digits, 15))} +- {numbers.number(uncertainty, 2)}"
    return f"{round(value, -place) + 0.0:.{-place}f} +- {uncertainty:.{-place}f}"  # no minus zero


def _exponent(value: float, place: int) -> str:
    """Return a small number to a decimal place, with an exponent."""
    return format(Decimal(repr(float(value))).quantize(Decimal(1).scaleb(place)), "e")


def _probability(p: float) -> str:
    return numbers.number(p, 2) if p >= LEAST_TOLD else "below 0.001"


# --- the spread -----------------------------------------------------------------------------------------


def _spread(found: Population) -> Iterator[str]:
    """Yield the scatter of each component over devices and lots, with what the data support."""
    if found.devices == 1:
        yield "One device says nothing of it: the material is written without a spread."
        return
    part, sure = numbers.percent(found.coverage), numbers.percent(found.confidence)
    for scatter in found.scatters:
        yield _scatter(scatter)
    of = "all devices" if found.lots > 1 else "devices of such a lot"
    yield f"Limits hold {part} of {of} with {sure} confidence."
    correlation = found.correlation
    if correlation is not None:
        shown = "written as a correlation" if correlation.is_shown else "not shown by the data"
        value, low, high = (
            numbers.number(x, 2) for x in (correlation.value, correlation.low, correlation.high)
        )
        yield f"Correlation of R with TC1 {value} ({low} to {high}): {shown}."


def _scatter(scatter: Scatter) -> str:
    scale, unit = SCATTER_SCALES[scatter.name]
    pairs = (("device", scatter.device), ("lot", scatter.lot))
    told = [(word, estimate) for word, estimate in pairs if estimate is not None]
    if not told and scatter.total is not None:  # one device of each lot
        told = [("any device", scatter.total)]
    sigmas = " and ".join(f"{word} {numbers.number(e.sigma * scale, 2)}" for word, e in told)
    half = "" if scatter.half_width is None else f"; limits +-{numbers.worst(scatter.half_width * scale)}"
    return f"{WORDS[scatter.name]}: sigma of {sigmas}{half} {unit}."


# --- the readings ---------------------------------------------------------------------------------------


def quality(one: FittedMaterial) -> Iterator[str]:
    """Yield how the readings lie about their laws."""
    yield from _scatter_of_readings(one)
    yield from _lack_of_fit(one)
    yield from _hysteresis(one)


def _lack_of_fit(one: FittedMaterial) -> Iterator[str]:
    """Yield what repeats say of the law; where hysteresis hides it, that they say nothing."""
    moved = one.hysteresis is not None and one.hysteresis <= RISK
    untold = [
        fit.lack_of_fit is None and fit.hysteresis is not None and (moved or fit.hysteresis.significant)
        for fit in one.fits
    ]
    tests = [fit.lack_of_fit.probability for fit in one.fits if fit.lack_of_fit is not None]
    p = combined(tests) if tests else 1.0
    if any(untold) and p >= RISK:
        yield (
            f"Repeats cannot tell a lack of fit {_where(one, untold)}: the ways differ, and no way has "
            "repeats of its own."
        )
    elif tests:
        together = ", all devices together" if len(tests) > 1 else ""
        found = f"(p {_probability(p)}{together})"
        name = one.sweep.devices[tests.index(min(tests))] if len(tests) == len(one.fits) > 1 else ""
        where = f", most in {_short(name)}" if name else ""
        yield (
            f"Lack of fit {found}{where}: the law is too simple for these readings."
            if p < RISK
            else f"Repeats show no lack of fit {found}."
        )


def _hysteresis(one: FittedMaterial) -> Iterator[str]:
    moved = [fit.hysteresis for fit in one.fits if fit.hysteresis is not None]
    if moved:
        alone = [fit.hysteresis is not None and fit.hysteresis.significant for fit in one.fits]
        together = ", all devices together" if len(moved) > 1 else ""
        most = max((h.most for h in moved), key=abs)
        mean = sum(h.mean for h in moved) / len(moved)
        p = 1.0 if one.hysteresis is None else one.hysteresis
        told = f"{'' if p <= RISK else 'not '}significant (p {_probability(p)}{together})"
        if together and any(alone):
            told += f"; by itself {_where(one, alone)}"
        yield f"Hysteresis, down less up: {_ppm(mean)} in the mean, {_ppm(most)} at most; {told}."


def _scatter_of_readings(one: FittedMaterial) -> Iterator[str]:
    low, high = (_ppm(pick(fit.sigma for fit in one.fits)) for pick in (min, max))
    sigma = low if low == high else f"{low} to {high}"
    found = scatter_of(one.fits)
    if one.fits[0].chi_squared is None:
        yield f"They scatter by {sigma} about their law (1 sigma)."
    elif found is None:
        yield f"They are known to {sigma} as stated; none is left over to check that."
    else:
        factor, p = found
        told = f": more than stated (p {_probability(p)})" if p < RISK else ""
        times = numbers.number(factor, 3)
        yield f"They are known to {sigma} as stated (1 sigma), and scatter by {times} times that{told}."


def _where(one: FittedMaterial, is_so: Sequence[bool]) -> str:
    names = [name or "the device" for name, so in zip(one.sweep.devices, is_so, strict=True) if so]
    if len(one.fits) > 1 and len(names) == len(one.fits):
        return "in every device"
    if len(names) > MOST_DEVICES:
        return f"in {len(names)} of {len(one.fits)} devices"
    return f"in {', '.join(names)}"


# --- what stands out ------------------------------------------------------------------------------------


def _flags(one: FittedMaterial) -> Iterator[str]:
    """Yield the readings that stand out, the farthest first; none is left out unasked."""
    flags = [flag for fit in one.fits for flag in fit.flags]
    outliers = sorted((f for f in flags if f.outlier), key=lambda f: -abs(f.studentised))
    levers = sorted((f for f in flags if not f.outlier), key=lambda f: -f.leverage)
    if outliers:
        told = [f"line {f.line} ({numbers.signed(f.studentised, 2)} sigma)" for f in outliers]
        yield f"Outliers, kept unless excluded: {_listed(told)}."
    if levers:
        yield f"High leverage, the law hangs on them: {_listed([f'line {f.line}' for f in levers])}."


def _left_out(one: FittedMaterial) -> Iterator[str]:
    lines = sorted(set(one.request.exclude))
    if lines:
        word = "line" if len(lines) == 1 else "lines"
        yield f"As asked, {word} {_listed([str(line) for line in lines])}."


def _refused(one: FittedMaterial, count: int) -> Iterator[str]:
    """Yield the rows that are no readings, by line."""
    if not count:
        return
    yield f"{count} {'rows are no readings' if count > 1 else 'row is no reading'}; fit.json lists them."
    for row in one.sweep.refused[:MOST_LINES]:
        yield f"Line {row.line}: found {row.found}; expected {row.expected}."


def _listed(words: Sequence[str]) -> str:
    more = f" and {len(words) - MOST_LINES} more" if len(words) > MOST_LINES else ""
    return ", ".join(words[:MOST_LINES]) + more


def _ppm(figure: float) -> str:
    return f"{numbers.number(figure * 1e6, 3)} ppm"


# --- the devices ----------------------------------------------------------------------------------------


def device_rows(one: FittedMaterial) -> tuple[tuple[str, ...], ...]:
    """Return a table of the devices, its head first: parameters with standard uncertainties, and sigma."""
    names = one.found.names
    head = ("device", "lot", *(f"{WORDS.get(name, name)}{_unit(name)}" for name in names), "sigma, ppm")
    rows = (
        (_short(name), _short(lot), *(_cell(fit, n) for n in names), numbers.number(fit.sigma * 1e6, 3))
        for name, lot, fit in zip(one.sweep.devices, one.lots, one.fits, strict=True)
    )
    return (head, *rows)


def _short(name: str) -> str:
    return (name if len(name) <= NAME_LETTERS else f"{name[: NAME_LETTERS - 2]}..") or "-"


def _unit(name: str) -> str:
    return ", ohm" if name == "R" else f", {SCALES[name][1]}" if name in SCALES else ""


def _cell(fit: Fit, name: str) -> str:
    scale = SCALES[name][0] if name in SCALES else 1.0
    return _known(fit.value(name) * scale, fit.uncertainty(name) * scale)
