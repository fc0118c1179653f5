"""parts.csv: one row a leg of every value, or a bought part of it, at full precision (RFC 4180).

Empty where it does not apply; the load is that of the whole leg.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator, Mapping, Sequence

from tcplan.made import FilmLeg, MadeLeg, StockLeg, WireLeg
from tcplan.material.model import Material
from tcplan.parts.record import Load
from tcplan.plan import MadeValue
from tcplan.spec.mix_csv import text_cell

COLUMNS = (
    "value_ohms",
    "leg",
    "material",
    "wanted_ohms",
    "ohms",
    "squares",
    "in_series",
    "in_parallel",
    "width_m",
    "length_m",
    "area_m2",
    "mismatch",
    "ohm_per_metre",
    "part",
    "part_ohms",
    "joined",
    "voltage_V",
    "current_A",
    "power_W",
    "current_density_A_per_m",
)


def parts_csv(
    made: Sequence[MadeValue],
    loads: Sequence[Sequence[Load]],
    materials: Mapping[str, Material],
    reference: float,
) -> str:
    """Return the rows of the legs of every value.

    Parameters
    ----------
    made : sequence of MadeValue
    loads : sequence of sequence of Load
        Of every value, leg by leg; empty without an operating point.
    materials : mapping of name to Material
        Those of the plan.
    reference : float
        Of the plan [K].
    """
    rows = []
    for k, one in enumerate(made):
        by_leg = {load.leg: load for load in loads[k]} if loads else {}
        for leg in one.legs:
            load = by_leg.get(leg.id)
            for own in _rows(leg, materials[leg.material], reference):
                rows.append({"value_ohms": repr(one.target_ohms), **own, **_load(load)})
    return _written(COLUMNS, rows)


def legs_csv(
    resistors: Sequence[tuple[str, Sequence[MadeLeg]]], materials: Mapping[str, Material], reference: float
) -> str:
    """Return the rows of the legs of named resistors, such as the two of a ratio."""
    rows = [
        {"resistor": name, **row}
        for name, legs in resistors
        for leg in legs
        for row in _rows(leg, materials[leg.material], reference)
    ]
    return _written(("resistor", *COLUMNS[1:-4]), rows)


def _written(columns: Sequence[str], rows: Sequence[Mapping[str, str]]) -> str:
    stream = io.StringIO()
    writer = csv.writer(stream)
    writer.writerow(columns)
    writer.writerows([row.get(column, "") for column in columns] for row in rows)
    return stream.getvalue()


def _rows(leg: MadeLeg, material: Material, reference: float) -> Iterator[dict[str, str]]:
    """Yield the rows of a leg: one, or one a part where it is of two."""
    plain = _plain(leg)
    if isinstance(leg, FilmLeg):
        yield plain | _film(leg, material, reference)
    elif isinstance(leg, StockLeg):
        for n, ohms in enumerate(leg.values, 1):
            yield plain | {"part": str(n), "part_ohms": repr(ohms), "joined": leg.joined}
    elif isinstance(leg, WireLeg):
        yield plain | {"length_m": repr(leg.length), "ohm_per_metre": repr(leg.ohm_per_metre)}
    else:
        yield plain


def _plain(leg: MadeLeg) -> dict[str, str]:
    return {
        "leg": leg.id,
        "material": text_cell(leg.material),
        "wanted_ohms": repr(leg.wanted_ohms),
        "ohms": repr(leg.ohms),
    }


def _film(leg: FilmLeg, material: Material, reference: float) -> dict[str, str]:
    body = leg.unit.body_ohms * leg.in_series / leg.in_parallel
    squares = material.squares(body, reference)
    return {
        "squares": "" if squares is None else repr(squares),
        "in_series": str(leg.in_series),
        "in_parallel": str(leg.in_parallel),
        "width_m": repr(leg.unit.width),
        "length_m": repr(leg.unit.length),
        "area_m2": repr(leg.area),
        "mismatch": "" if leg.mismatch is None else repr(leg.mismatch),
    }


def _load(load: Load | None) -> dict[str, str]:
    if load is None:
        return {}
    return {
        "voltage_V": repr(load.voltage),
        "current_A": repr(load.current),
        "power_W": repr(load.power),
        "current_density_A_per_m": "" if load.density is None else repr(load.density),
    }
