"""Parts in words: what each leg is made of, what the whole then reaches, and the trade of a unit cell."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import replace

from tcplan.made import FilmLeg, FilmUnit, MadeLeg, StockLeg, WireLeg
from tcplan.material.model import Material
from tcplan.network import network_text, value
from tcplan.parts.record import FilmWay, Load
from tcplan.parts.wire import cutting_list
from tcplan.plan import MadeValue, Option, WorstCase
from tcplan.spec import numbers
from tcplan.units import format_celsius, format_length, format_ohms, format_si

HEAD = ("leg", "material", "wanted", "made", "of")
CLOSED = 1e-3  # a bound that is nearer than this to what is reached is not told beside it
WAYS_HEAD = ("", "area", "judged", "error", "units, W x L")


def leg_row(leg: MadeLeg) -> tuple[str, str, str, str, str]:
    """Return the printed row of one leg."""
    return leg.id, leg.material, format_ohms(leg.wanted_ohms), format_ohms(leg.ohms), made_of(leg)


def made_of(leg: MadeLeg) -> str:
    """Return what a leg is made of."""
    if isinstance(leg, FilmLeg):
        strings = f", {leg.in_parallel} strings in parallel" if leg.in_parallel > 1 else ""
        each = " each" if leg.in_parallel > 1 else ""
        plural = "units in series" if leg.in_series > 1 else "unit"
        return f"{leg.in_series} {plural}{each}{strings}"
    if isinstance(leg, StockLeg):
        joint = {"one": "", "series": " + ", "parallel": " || "}[leg.joined]
        return joint.join(format_ohms(v) for v in leg.values)
    if isinstance(leg, WireLeg):
        return f"{format_length(leg.length)} of wire"
    return "as it is"


def units_text(
    made: Sequence[MadeValue], materials: Mapping[str, Material], reference: float
) -> tuple[str, ...]:
    """Return a sentence about the unit cell of each film, which the legs of all values share."""
    several = len(made) > 1
    drawn = [
        replace(leg, id=f"{leg.id} of {format_ohms(one.target_ohms)}") if several else leg
        for one in made
        for leg in one.legs
        if isinstance(leg, FilmLeg)
    ]
    return unit_sentences(drawn, materials, reference)


def unit_sentences(
    legs: Sequence[FilmLeg], materials: Mapping[str, Material], reference: float
) -> tuple[str, ...]:
    """Return a sentence about the unit cell of each film among legs."""
    cells = {leg.material: leg.unit for leg in legs}
    return tuple(
        _unit_text(unit, [leg for leg in legs if leg.material == name], materials[name], reference)
        for name, unit in cells.items()
    )


def _unit_text(unit: FilmUnit, own: Sequence[FilmLeg], material: Material, reference: float) -> str:
    squares = material.squares(unit.body_ohms, reference)
    of = "" if squares is None else f", {numbers.number(squares, 4)} squares"
    ends = f", ends {numbers.percent(unit.ends_ohms / unit.ohms)} of it" if unit.ends_ohms > 0 else ""
    area = sum(leg.area for leg in own) * 1e12
    count = sum(leg.units for leg in own)
    return (
        f"{unit.material}: W {format_length(unit.width)}, L {format_length(unit.length)}{of}, "
        f"{format_ohms(unit.ohms)} a unit{ends}; {count} {'units' if count > 1 else 'unit'}, "
        f"{numbers.number(area, 4)} um^2{_matched(own)}."
    )


def _matched(own: Sequence[FilmLeg]) -> str:
    known = [
        f"{leg.id} {numbers.number(leg.mismatch * 1e6, 3)} ppm" for leg in own if leg.mismatch is not None
    ]
    return f"; mismatch of a leg, sigma: {', '.join(known)}" if known else "; mismatch not known"


def cutting(
    made: Sequence[MadeValue], materials: Mapping[str, Material], reference_degC: float
) -> tuple[str, ...]:
    """Return the cutting list of the wire of all values, a line each."""
    return wire_lines([leg for one in made for leg in one.legs], materials, reference_degC)


def wire_lines(
    legs: Sequence[MadeLeg], materials: Mapping[str, Material], reference_degC: float
) -> tuple[str, ...]:
    """Return the cutting list of the wire among legs, a line each."""
    own = [leg for leg in legs if isinstance(leg, WireLeg)]
    per_metre = {leg.material: leg.ohm_per_metre for leg in own}
    at = f"at {numbers.stated(reference_degC)} degC"
    return tuple(
        f"{count} x {format_length(length)} of {name} ({materials[name].label}), "
        f"{format_ohms(length * per_metre[name])} {at} by {format_si(per_metre[name], 'ohm/m')}"
        for name, length, count in cutting_list(own)
    )


def buying(
    made: Sequence[MadeValue], loads: Sequence[Sequence[Load]], materials: Mapping[str, Material]
) -> tuple[str, ...]:
    """Return how many of each stock part are needed for all values, a line each."""
    own: list[StockLeg] = []
    powers: dict[tuple[str, float], float] = {}
    for k, one in enumerate(made):
        by_leg = {load.leg: load for load in loads[k]} if loads else {}
        for leg in (leg for leg in one.legs if isinstance(leg, StockLeg)):
            own.append(leg)
            for ohms in leg.values if leg.id in by_leg else ():
                power = part_power(leg, ohms, by_leg[leg.id])
                powers[leg.material, ohms] = max(powers.get((leg.material, ohms), 0.0), power)
    return stock_lines(own, materials, powers)


def stock_lines(
    legs: Sequence[StockLeg],
    materials: Mapping[str, Material],
    powers: Mapping[tuple[str, float], float] | None = None,
) -> tuple[str, ...]:
    """Return how many of each stock part legs need, a line each, with the most power [W] of one where known.

    ``powers`` are by material and value [ohm].
    """
    counts = Counter((leg.material, ohms) for leg in legs for ohms in leg.values)
    return tuple(
        f"{count} x {format_ohms(ohms)} of {name} ({materials[name].label}): {_traded(materials[name])}"
        f"{_at_most((powers or {}).get((name, ohms)))}"
        for (name, ohms), count in sorted(counts.items())
    )


def part_power(leg: StockLeg, ohms: float, load: Load) -> float:
    """Return the power [W] of one part of a leg, by its current in series, by its voltage in parallel."""
    if leg.joined == "parallel":
        return load.voltage**2 / ohms
    return load.current**2 * ohms


def _traded(material: Material) -> str:
    """Return by what a part is ordered: its series, tolerance and TCR, as limits."""
    spread = None if material.spread is None else material.spread.limits()
    words = [str(material.series)]
    if spread is not None and spread.value is not None:
        words.append(f"{numbers.percent(spread.value)} or closer")
    if spread is not None and spread.tcr is not None:
        words.append(f"TCR within {numbers.number(spread.tcr * 1e6, 4)} ppm/K of its nominal")
    return ", ".join(words)


def _at_most(power: float | None) -> str:
    return "" if power is None else f", at most {format_si(power, 'W', 3)} each"


def load_text(loads: Sequence[Load]) -> tuple[str, ...]:
    """Return what each leg carries at the operating point, the largest over the range."""
    return tuple(
        f"{load.leg}: {format_si(load.voltage, 'V')}, {format_si(load.current, 'A')}, "
        f"{format_si(load.power, 'W')}, {format_celsius(load.temperature)}{_density(load)}"
        for load in loads
    )


def _density(load: Load) -> str:
    if load.density is None:
        return ""
    return f", {numbers.number(load.density * 1e-3, 3)} mA/um of width"


def against_ideal(ideal: Option, made: MadeValue, *, several: bool = False) -> tuple[str, ...]:
    """Return what a made network reaches beside the ideal one, and the error of its value."""
    option = made.option
    nominal = f"{_ppm(ideal.nominal.figure_ppm)} nominal, as made {_ppm(option.nominal.figure_ppm)}"
    first = f"{format_ohms(made.target_ohms)}: ideal" if several else "Ideal"
    sentences = [f"{first} {nominal}."]
    if ideal.worst_case is not None and option.worst_case is not None:
        before = _ppm(ideal.worst_case.peak_ppm)
        sentences.append(f"Ideal {before} in the worst case, as made {_reached(option, option.worst_case)}.")
    elif ideal.worst_case is not None:
        sentences.append("The worst case as made is not stated: a part of it states no spread.")
    error = f"{_percent(made.value_error)} off"
    sentences.append(f"The value as made is {format_ohms(value(option.network))}, {error}.")
    return tuple(sentences)


def _reached(option: Option, worst: WorstCase) -> str:
    """Return the figure of a worst case, with its bound where that keeps the option from being judged."""
    found, most = _ppm(worst.peak_ppm), _ppm(worst.upper_bound_ppm)
    if option.verdict != "NOT JUDGED" or worst.upper_bound_ppm <= worst.peak_ppm * (1.0 + CLOSED):
        return found
    return f"{found} found, at most {most} guaranteed"


def _ppm(figure: float) -> str:
    return f"{numbers.worst(figure)} ppm"


def _percent(error: float) -> str:
    text = numbers.signed(float(f"{error * 100.0:.3g}"))
    return f"{text} %"


def way_row(way: FilmWay, *, taken: bool) -> tuple[str, str, str, str, str]:
    """Return one way to draw all films: area, judged figure, largest value error of a leg, units."""
    units = ", ".join(
        f"{c.unit.material} {format_length(c.unit.width)} x {format_length(c.unit.length)}"
        for c in way.choices
    )
    return (
        "*" if taken else " ",
        f"{numbers.number(way.area * 1e12, 4)} um^2",
        f"{numbers.worst(way.figure * 1e6)} ppm",
        f"{numbers.number(way.error * 100.0, 2)} %",
        units,
    )


def made_text(made: Option) -> str:
    """Return the made network, ends and parts as legs of their own."""
    return network_text(made.network, lambda leg: f"{leg.material} {format_ohms(leg.ohms)}")
