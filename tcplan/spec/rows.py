"""The tables of a spec sheet as rows of printed text: options, legs, figures, materials."""

from __future__ import annotations

from dataclasses import dataclass

from tcplan.material.law import law_text
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import leg_names, legs, network_text, shares
from tcplan.plan import Option, Plan
from tcplan.spec import numbers
from tcplan.spec.asked import longer_arm_K
from tcplan.spec.statements import (
    SIZE_WORDS,
    fraction_text,
    likely_text,
    nominal_text,
    spread_ppm,
    worst_text,
)
from tcplan.units import (
    format_celsius,
    format_ohms,
    format_ppm_per_K,
    format_ppm_per_K2,
    format_si,
    from_celsius,
)


@dataclass(frozen=True, slots=True, kw_only=True)
class OptionRow:
    """One option: figures in ppm as text, sizes of its legs (empty where none is known)."""

    id: str
    network: str
    sizes: str
    nominal: str
    likely: str
    worst_case: str
    verdict: str
    chosen: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class LegRow:
    """One leg; ``size`` is its squares or wire length, empty where none is known."""

    id: str
    material: str
    value: str
    share: str
    size: str


@dataclass(frozen=True, slots=True, kw_only=True)
class MaterialRow:
    """One material: its law about its own reference, and where it comes from."""

    name: str
    label: str
    law: str
    coefficients: str
    reference: str
    valid: str
    size: str
    spread: str
    source: str
    extrapolated: bool = False


def option_row(plan: Plan, option: Option) -> OptionRow:
    """Return the row of an option."""
    sizes = leg_sizes(plan, option)
    return OptionRow(
        id=option.id,
        network=network_text(option.network, lambda leg: f"{leg.material} {format_ohms(leg.ohms)}"),
        sizes=", ".join([*(size or "-" for size in sizes), *_area(option)]) if any(sizes) else "",
        nominal=nominal_text(plan, option),
        likely=likely_text(plan, option) if option.likely else "",
        worst_case=worst_text(plan, option),
        verdict=option.verdict if plan.limit.drift_ppm is not None else "no limit",
        chosen=option.id == plan.chosen,
    )


def leg_sizes(plan: Plan, option: Option) -> tuple[str, ...]:
    """Return squares of a film, length of a wire, else nothing, for each leg."""
    reference, found = from_celsius(plan.range.reference_degC), []
    for leg, squares in zip(legs(option.network), option.squares, strict=True):
        length = plan.by_name[leg.material].length(leg.ohms, reference)
        text = f"{numbers.number(squares)} squares" if squares is not None else ""
        found.append(format_si(length, "m") if length is not None else text)
    return tuple(found)


def _area(option: Option) -> list[str]:
    """Return the area of all legs in words, when it is known."""
    if option.area is None:
        return []
    if option.area < 1e-8:
        return [f"{numbers.number(option.area * 1e12, 3)} um^2 in all"]
    return [f"{numbers.number(option.area * 1e6, 3)} mm^2 in all"]


def leg_rows(plan: Plan, option: Option) -> tuple[LegRow, ...]:
    """Return the legs of an option."""
    rows = zip(
        leg_names(len(option.squares)),
        legs(option.network),
        shares(option.network),
        leg_sizes(plan, option),
        strict=True,
    )
    return tuple(
        LegRow(
            id=name,
            material=leg.material,
            value=format_ohms(leg.ohms),
            share=numbers.percent(share),
            size=size or "not stated",
        )
        for name, leg, share, size in rows
    )


def figure_rows(plan: Plan, option: Option) -> tuple[tuple[str, str], ...]:
    """Return the figures of an option, each with its name and its unit."""
    nominal, spread = option.nominal, spread_ppm(option)

    def ppm(figure: float) -> str:
        return f"{numbers.nominal(figure, spread)} ppm"

    per_K = None if spread is None else spread / longer_arm_K(plan)
    chords = (("cold", nominal.chord_cold_ppm_per_K), ("hot", nominal.chord_hot_ppm_per_K))
    rows = [
        ("judged figure, nominal", f"{nominal_text(plan, option)} ppm"),
        (f"judged figure, {fraction_text(plan)} of lots", _ppm(likely_text(plan, option))),
        ("judged figure, worst case", _worst(plan, option)),
        *((f"judged figure, corner {name}", f"{numbers.worst(c)} ppm") for name, c in option.corners.items()),
        ("peak drift, nominal", f"{ppm(nominal.peak_ppm)} at {numbers.number(nominal.at_degC)} degC"),
        ("band, nominal", ppm(nominal.band_ppm)),
        ("box TCR, nominal", f"{numbers.nominal(nominal.box_tcr_ppm_per_K, per_K)} ppm/K"),
    ]
    rows += [
        (f"chord TCR, {end}, nominal", f"{numbers.nominal(tcr, per_K)} ppm/K")
        for end, tcr in chords
        if tcr is not None
    ]
    return tuple(rows)


def _ppm(text: str) -> str:
    return text if text == "not stated" else f"{text} ppm"


def _worst(plan: Plan, option: Option) -> str:
    worst = option.worst_case
    if worst is None:
        return "not stated"
    method = "exact" if worst.method == "exact" else "found by search, with its bound"
    return f"{worst_text(plan, option)} ppm at {numbers.number(worst.at_degC)} degC ({method})"


def material_row(material: Material, *, extrapolated: bool = False) -> MaterialRow:
    """Return what is known of a material, about its own reference."""
    tc1, tc2 = material.referred_taylor(material.reference, 2)
    low, high = material.valid
    return MaterialRow(
        name=material.name,
        label=material.label,
        law=law_text(material.law),
        coefficients=f"TC1 {format_ppm_per_K(tc1)}, TC2 {format_ppm_per_K2(tc2)}",
        reference=format_celsius(material.reference),
        valid=f"{format_celsius(low)} to {format_celsius(high)}",
        size=size_text(material),
        spread=spread_text(material),
        source=material.source,
        extrapolated=extrapolated,
    )


def size_text(material: Material) -> str:
    """Return what the material is sold or drawn by."""
    if material.ohm_per_square is not None:
        return f"{format_ohms(material.ohm_per_square)} per square"
    if material.ohm_per_metre is not None:
        return f"{format_si(material.ohm_per_metre, 'ohm')} per metre"
    return f"series {material.series}" if material.series else "not stated"


def spread_text(material: Material) -> str:
    """Return the half-widths with their meaning, or that none is stated."""
    spread = material.spread
    if spread is None:
        return "not stated"
    parts = _half_widths(spread, SIZE_WORDS.get(material.kind, "value"))
    return f"{spread.meaning}: {', '.join(parts) or 'none'}"


def _half_widths(spread: Spread, size: str) -> list[str]:
    stated = (
        (size, spread.value, numbers.percent),
        ("TC1", spread.tc1, format_ppm_per_K),
        ("TC2", spread.tc2, format_ppm_per_K2),
    )
    return [f"{name} {show(half)}" for name, half, show in stated if half is not None]
