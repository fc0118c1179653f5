"""Parts in words: what each leg is made of, what the whole then reaches, and the trade of a unit cell."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence

from tcplan.network import network_text, value
from tcplan.parts import FilmLeg, MadeLeg, StockLeg, WireLeg
from tcplan.parts.films import FilmChoice
from tcplan.parts.wire import cutting_list
from tcplan.plan import Option
from tcplan.spec import numbers
from tcplan.spec.mix_csv import text_cell
from tcplan.units import format_ohms, format_si

COLUMNS = (
    "leg",
    "material",
    "wanted_ohms",
    "ohms",
    "in_series",
    "in_parallel",
    "width_m",
    "length_m",
    "values_ohms",
    "joined",
)
HEAD = ("leg", "material", "wanted", "made", "of")


def leg_row(leg: MadeLeg) -> tuple[str, str, str, str, str]:
    """Return the printed row of one leg."""
    return leg.id, leg.material, format_ohms(leg.wanted_ohms), format_ohms(leg.ohms), made_of(leg)


def made_of(leg: MadeLeg) -> str:
    """Return what a leg is made of."""
    if isinstance(leg, FilmLeg):
        strings = f", {leg.in_parallel} strings in parallel" if leg.in_parallel > 1 else ""
        each = " each" if leg.in_parallel > 1 else ""
        return f"{leg.in_series} units in series{each}{strings}"
    if isinstance(leg, StockLeg):
        joint = {"one": "", "series": " + ", "parallel": " || "}[leg.joined]
        return joint.join(format_ohms(v) for v in leg.values)
    if isinstance(leg, WireLeg):
        return f"{format_si(leg.length, 'm')} of wire"
    return "as it is"


def units_text(legs: Sequence[MadeLeg]) -> tuple[str, ...]:
    """Return a sentence about the unit cell of each film."""
    cells = {leg.material: leg.unit for leg in legs if isinstance(leg, FilmLeg)}
    found = []
    for material, unit in cells.items():
        own = [leg for leg in legs if isinstance(leg, FilmLeg) and leg.material == material]
        count = sum(leg.units for leg in own)
        ends = f", ends {numbers.percent(unit.ends_ohms / unit.ohms)} of it" if unit.ends_ohms > 0 else ""
        mismatch = ", ".join(
            f"{leg.id} {numbers.number(leg.mismatch * 1e6, 3)} ppm" for leg in own if leg.mismatch is not None
        )
        matched = f"; mismatch of a leg, sigma: {mismatch}" if mismatch else "; mismatch not known"
        found.append(
            f"{material}: W {format_si(unit.width, 'm')}, L {format_si(unit.length, 'm')}, "
            f"{format_ohms(unit.ohms)} a unit{ends}; {count} units, "
            f"{numbers.number(sum(leg.area for leg in own) * 1e12, 4)} um^2{matched}."
        )
    return tuple(found)


def cutting(legs: Sequence[MadeLeg]) -> tuple[str, ...]:
    """Return the cutting list of the wire, a line each."""
    rows = cutting_list([leg for leg in legs if isinstance(leg, WireLeg)])
    return tuple(f"{count} x {format_si(length, 'm')} of {material}" for material, length, count in rows)


def against_ideal(ideal: Option, made: Option) -> tuple[str, ...]:
    """Return what the made network reaches beside the ideal one, and the error of its value."""
    error = value(made.network) / value(ideal.network) - 1.0
    nominal = f"{_ppm(ideal.nominal.figure_ppm)} nominal, as made {_ppm(made.nominal.figure_ppm)}"
    sentences = [f"Ideal {nominal}."]
    if ideal.worst_case is not None and made.worst_case is not None:
        before, after = ideal.worst_case.peak_ppm, made.worst_case.peak_ppm
        sentences.append(f"Ideal {_ppm(before)} in the worst case, as made {_ppm(after)}.")
    elif ideal.worst_case is not None:
        sentences.append("The worst case as made is not stated: the ends of a film have no spread.")
    sentences.append(f"The value as made is {format_ohms(value(made.network))}, {_percent(error)} off.")
    return tuple(sentences)


def _ppm(figure: float) -> str:
    return f"{numbers.worst(figure)} ppm"


def _percent(error: float) -> str:
    text = numbers.signed(float(f"{error * 100.0:.3g}"))
    return f"{text} %"


def way_row(choices: Sequence[FilmChoice], figure: float) -> tuple[str, str, str, str]:
    """Return one way to draw all films: area, judged figure, largest value error of a leg, units."""
    area = sum(choice.area for choice in choices)
    error = max(choice.error for choice in choices)
    units = ", ".join(
        f"{c.unit.material} {format_si(c.unit.width, 'm')} x {format_si(c.unit.length, 'm')}" for c in choices
    )
    return (
        f"{numbers.number(area * 1e12, 4)} um^2",
        f"{numbers.worst(figure * 1e6)} ppm",
        f"{numbers.number(error * 100.0, 2)} %",
        units,
    )


def made_text(made: Option) -> str:
    """Return the made network, ends and parts as legs of their own."""
    return network_text(made.network, lambda leg: f"{leg.material} {format_ohms(leg.ohms)}")


def parts_csv(legs: Sequence[MadeLeg]) -> str:
    """Return parts.csv: one row a leg, values at full precision (RFC 4180); empty where it does not apply."""
    stream = io.StringIO()
    writer = csv.writer(stream)
    writer.writerow(COLUMNS)
    for leg in legs:
        row = dict.fromkeys(COLUMNS, "")
        row.update(
            leg=leg.id,
            material=text_cell(leg.material),
            wanted_ohms=repr(leg.wanted_ohms),
            ohms=repr(leg.ohms),
        )
        if isinstance(leg, FilmLeg):
            row.update(in_series=str(leg.in_series), in_parallel=str(leg.in_parallel))
            row.update(width_m=repr(leg.unit.width), length_m=repr(leg.unit.length))
        elif isinstance(leg, StockLeg):
            row.update(values_ohms=" ".join(map(repr, leg.values)), joined=leg.joined)
        elif isinstance(leg, WireLeg):
            row.update(length_m=repr(leg.length))
        writer.writerow(row.values())
    return stream.getvalue()
