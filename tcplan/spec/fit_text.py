"""What a fit found, in words: the law with its uncertainties, the spread, and what stands out."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

from tcplan.measure.fitted import FittedMaterial
from tcplan.measure.model import Fit
from tcplan.measure.spread import Scatter
from tcplan.spec import numbers
from tcplan.units import format_celsius, format_ohms

MOST_SAID = 8  # devices or lines that are named
RISK = 0.05
SCALES = {"tc1": (1e6, "ppm/K"), "tc2": (1e6, "ppm/K^2"), "tc3": (1e6, "ppm/K^3")}
WORDS = {"value": "R", "tc1": "TC1", "tc2": "TC2", "tc3": "TC3"}
SCATTER_SCALES = {"value": (1e2, "%"), "tc1": (1e6, "ppm/K"), "tc2": (1e6, "ppm/K^2")}

Fact = tuple[str, tuple[str, ...]]


def head(one: FittedMaterial) -> str:
    """Return the first line of a material: what was read."""
    found = one.found
    lots = f" of {found.lots} lots" if found.lots > 1 else ""
    devices = f"{found.devices} devices{lots}" if found.devices > 1 else "one device"
    low, high = format_celsius(found.low), format_celsius(found.high)
    return f"{one.request.name}: {len(one.sweep.T)} readings of {devices}, {low} to {high}"


def facts(one: FittedMaterial, refused: int) -> tuple[Fact, ...]:
    """Return the labels and sentences of a material; those that have nothing to say are left out."""
    found: Sequence[Fact] = (
        ("Law", tuple(_law(one))),
        ("Spread", tuple(_spread(one))),
        ("Fit", tuple(_quality(one))),
        ("Flags", tuple(_flags(one))),
        ("Refused", tuple(_refused(one, refused))),
        ("Note", (*one.notes, *one.found.notes)),
    )
    return tuple((label, kept) for label, texts in found if (kept := tuple(t for t in texts if t)))


def _law(one: FittedMaterial) -> Iterator[str]:
    found = one.found
    values = zip(found.names, found.values, found.uncertainties, strict=True)
    for name, value, uncertainty in values:
        if name == "R":
            percent = numbers.number(uncertainty / value * 100.0, 2)
            at = format_celsius(one.request.reference)
            yield f"R({at}) {format_ohms(value)} +- {percent} % (standard uncertainty of the mean)."
        else:
            scale, unit = SCALES.get(name, (1.0, ""))
            word = WORDS.get(name, name)
            spread = numbers.number(uncertainty * scale, 2)
            yield f"{word} {numbers.number(value * scale, 5)} +- {spread} {unit}".rstrip() + "."
    if one.quadratic is not None:
        dropped = one.quadratic > RISK
        p = numbers.number(one.quadratic, 2) if one.quadratic >= 1e-3 else "below 0.001"
        yield (
            f"The quadratic term is not significant in any device (p {p} or more): a line was fitted."
            if dropped
            else f"The quadratic term is significant (p {p} in the device that shows it best)."
        )


def _spread(one: FittedMaterial) -> Iterator[str]:
    """Yield the scatter of each component over devices and lots, with what the data support."""
    found = one.found
    for scatter in found.scatters:
        yield _scatter(scatter, found.coverage, found.confidence)
    correlation = found.correlation
    if correlation is not None:
        shown = "written as a correlation" if correlation.is_shown else "not shown by the data"
        yield (
            f"Correlation of R with TC1 {numbers.number(correlation.value, 2)} "
            f"({numbers.number(correlation.low, 2)} to {numbers.number(correlation.high, 2)}): {shown}."
        )


def _scatter(scatter: Scatter, coverage: float, confidence: float) -> str:
    scale, unit = SCATTER_SCALES[scatter.name]
    parts = [
        f"{word} {numbers.number(estimate.sigma * scale, 2)}"
        for word, estimate in (("device", scatter.device), ("lot", scatter.lot))
        if estimate is not None
    ]
    if not parts:
        return f"{WORDS[scatter.name]}: one device says nothing of the spread."
    half = ""
    if scatter.half_width is not None:
        half = (
            f"; +-{numbers.number(scatter.half_width * scale, 3)} {unit} holds "
            f"{numbers.percent(coverage)} of devices at {numbers.percent(confidence)} confidence"
        )
    return f"{WORDS[scatter.name]}: sigma of {' and '.join(parts)} {unit}{half}."


def _quality(one: FittedMaterial) -> Iterator[str]:
    """Yield how the readings lie about their laws."""
    sigmas = [fit.sigma for fit in one.fits]
    yield f"Readings scatter by {_ppm(min(sigmas))} to {_ppm(max(sigmas))} about their law, 1 sigma."
    lacking = _named(one, lambda fit: fit.lack_of_fit is not None and fit.lack_of_fit.probability < RISK)
    if lacking:
        yield f"Lack of fit (95 %) in {lacking}: the law is too simple for these readings."
    moved = [fit.hysteresis for fit in one.fits if fit.hysteresis is not None]
    if moved:
        significant = _named(one, lambda fit: fit.hysteresis is not None and fit.hysteresis.significant)
        most = max(abs(h.most) for h in moved)
        told = f"significant in {significant}" if significant else "not significant"
        yield f"Hysteresis between the ways up and down: {_ppm(most)} at most, {told}."


def _named(one: FittedMaterial, is_so: Callable[[Fit], bool]) -> str:
    names = [
        name or "the device" for name, fit in zip(one.sweep.devices, one.fits, strict=True) if is_so(fit)
    ]
    more = f" and {len(names) - MOST_SAID} more" if len(names) > MOST_SAID else ""
    return ", ".join(names[:MOST_SAID]) + more


def _flags(one: FittedMaterial) -> Iterator[str]:
    """Yield the readings that stand out; none is left out unasked."""
    flags = [flag for fit in one.fits for flag in fit.flags]
    outliers = [
        f"line {flag.line} ({numbers.number(flag.studentised, 3)} sigma)" for flag in flags if flag.outlier
    ]
    levers = [f"line {flag.line}" for flag in flags if not flag.outlier]
    if outliers:
        yield f"Outliers, kept unless excluded: {_listed(outliers)}."
    if levers:
        yield f"High leverage, the law hangs on them: {_listed(levers)}."


def _listed(words: Sequence[str]) -> str:
    more = f" and {len(words) - MOST_SAID} more" if len(words) > MOST_SAID else ""
    return ", ".join(words[:MOST_SAID]) + more


def _refused(one: FittedMaterial, count: int) -> Iterator[str]:
    """Yield the rows that are no readings, by line."""
    if not count:
        return
    yield f"{count} {'rows are' if count > 1 else 'row is'} no reading; fit.json lists them."
    for row in one.sweep.refused[:MOST_SAID]:
        yield f"line {row.line}: found {row.found}; expected {row.expected}."


def _ppm(figure: float) -> str:
    return f"{numbers.number(figure * 1e6, 3)} ppm"


def device_rows(one: FittedMaterial) -> tuple[tuple[str, ...], ...]:
    """Return a table of the devices, its head first."""
    names = [name for name in one.found.names if name in ("R", *SCALES)]
    table = [("device", "lot", *(f"{WORDS.get(n, n)}{_unit(n)}" for n in names), "sigma, ppm")]
    for name, lot, fit in zip(one.sweep.devices, one.lots, one.fits, strict=True):
        table.append((name or "-", lot or "-", *(_cell(fit, n) for n in names), f"{fit.sigma * 1e6:.3g}"))
    return tuple(table)


def _unit(name: str) -> str:
    return ", ohm" if name == "R" else f", {SCALES[name][1]}"


def _cell(fit: Fit, name: str) -> str:
    scale = 1.0 if name == "R" else SCALES[name][0]
    value, uncertainty = fit.value(name) * scale, fit.uncertainty(name) * scale
    return f"{numbers.number(value, 6)} +- {numbers.number(uncertainty, 2)}"
