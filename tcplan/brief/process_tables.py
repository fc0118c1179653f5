"""What the materials of a brief share: its [[correlation]], [[tracking]] and [corner.NAME] tables.

They may stand in the brief and in its materials files, and name materials of any of them. All are
checked; those of materials that are not in use are then left out.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence

from tcplan.brief.correlation_tables import (
    COMPONENT_OF,
    VALUE_KEYS,
    Correlations,
    Known,
    read_correlations,
    words,
)
from tcplan.material.model import NAME, Material
from tcplan.names import shown
from tcplan.process import FULL_STEP, Corner, Parameter, Process, Tracking
from tcplan.table_reader import TableReader

MOST_TRACKINGS = 200
MOST_CORNERS = 50
ROUNDING = 1.000001  # of a shift that is written to few digits
_SHIFT_UNITS = {"value": "1", "tc1": "1/K", "tc2": "1/K^2"}
_LIMIT_OF = {"value": "value", "tc1": "tc1_and_tcr", "tc2": "tc2"}
_SHOWN_IN = {"value": (100.0, "%"), "tc1": (1e6, "ppm/K"), "tc2": (1e6, "ppm/K^2")}
SAME_STEP = 1e-6
_IN_PLACE_OF_TCR = "A tcr has a sign of its own on each side: write tc1 in its place."
_Trackings = list[tuple[TableReader, Tracking]]


def read_process(
    sources: Sequence[TableReader],
    materials: Mapping[str, Material],
    used: Collection[str],
    *,
    all_read: bool = True,
) -> Process:
    """Return what the materials in use share. Mistakes go to the readers.

    Parameters
    ----------
    sources : sequence of TableReader
        The brief and its materials files.
    materials : mapping
        All known materials by name.
    used : collection of str
        The names of those in use.
    all_read : bool
        Whether all materials could be read: only then is an unknown name a mistake of its own.
    """
    known = Known(materials, all_read)
    correlations = read_correlations(sources, known)
    trackings = _read_trackings(sources, known)
    _check_tracked(correlations, trackings)
    tracked = [_tracking_of(tracking, used) for _, tracking in trackings]
    corners = _read_corners(sources, known)
    _check_in_step(sources, correlations, corners, known)
    cornered = [_corner_of(corner, used) for corner in corners]
    return Process(
        correlations=tuple(c for _, c in correlations if {c.first.material, c.second.material} <= set(used)),
        trackings=tuple(tracking for tracking in tracked if tracking is not None),
        corners=tuple(corner for corner in cornered if corner is not None),
    )


def _tracking_of(tracking: Tracking, used: Collection[str]) -> Tracking | None:
    names = tuple(name for name in tracking.materials if name in used)
    return Tracking(materials=names, within=tracking.within) if len(names) > 1 else None


def _corner_of(corner: Corner, used: Collection[str]) -> Corner | None:
    shifts = tuple((parameter, shift) for parameter, shift in corner.shifts if parameter.material in used)
    return Corner(name=corner.name, shifts=shifts) if shifts else None


def _read_trackings(sources: Sequence[TableReader], known: Known) -> _Trackings:
    tables = [table for source in sources for table in source.rows("tracking")]
    if len(tables) > MOST_TRACKINGS:
        tables[MOST_TRACKINGS].refuse("", f"{len(tables)} tables of tracking", f"{MOST_TRACKINGS} at most")
    found: _Trackings = []
    for table in tables[:MOST_TRACKINGS]:
        one = _tracking(table, known)
        taken = {name for _, other in found for name in other.materials}
        if one is not None and (again := [name for name in one.materials if name in taken]):
            told = f"{again[0]}, which tracks in another table too"
            table.refuse("materials", told, "each material in one table of tracking")
        elif one is not None:
            found.append((table, one))
    return found


def _tracking(table: TableReader, known: Known) -> Tracking | None:
    names, within = table.texts("materials"), table.above_zero("within", "1/K")
    before = len(table.problems)
    if len(set(names)) < len(names):
        table.refuse("materials", "a name twice", "two or more different materials")
    for name in dict.fromkeys(names):
        material = known.material(table, "materials", name)
        if material is not None and (material.spread is None or material.spread.tc1 is None):
            found, expected = f"{name}, which has no spread of TC1", f"tc1 in [material.{name}.spread]"
            todo = "" if material.spread is None or material.spread.tcr is None else _IN_PLACE_OF_TCR
            table.refuse("materials", found, expected, todo)
    readable = len(names) > 1 and all(name in known.materials for name in names)
    if not readable or within is None or len(table.problems) > before:
        return None
    return Tracking(materials=names, within=within)


def _check_tracked(correlations: Correlations, trackings: _Trackings) -> None:
    """Refuse a correlation of a TC1 that tracks: it would be stated for the sum of two parts."""
    tracked = {name for _, tracking in trackings for name in tracking.materials}
    for table, one in correlations:
        for parameter in (one.first, one.second):
            if parameter.component == "tc1" and parameter.material in tracked:
                found = f"{words(one)}, and {parameter.material} in a table of tracking"
                table.refuse("between", found, "one of correlation and tracking for a TC1")
                break


# ---- corners


def _check_in_step(
    sources: Sequence[TableReader], correlations: Correlations, corners: Sequence[Corner], known: Known
) -> None:
    """Refuse a corner that moves values apart which a correlation of 1 moves in full step.

    It would be worse than any worst case, which holds them together.
    """
    for corner in corners:
        for _, one in correlations:
            pair = (one.first, one.second)
            if one.value < FULL_STEP or any(p.component != "value" for p in pair):
                continue
            steps = [_step_of(corner, p.material, known) for p in pair]
            if None in steps or abs(float(steps[0] or 0.0) - float(steps[1] or 0.0)) <= SAME_STEP:
                continue
            first, second = (p.material for p in pair)
            table = next(
                inner
                for source in sources
                if (inner := source.inner("corner")) is not None and corner.name in inner.table
            )
            table.refuse(
                corner.name,
                f"values of {first} and {second} at {steps[0]:+.3g} and {steps[1]:+.3g} of their limits",
                "the same part of both limits, as their correlation is 1",
                "The worst case holds such values together, and would not cover this corner.",
            )


def _step_of(corner: Corner, name: str, known: Known) -> float | None:
    """Return which part of its limits the value of a material is off in a corner."""
    material = known.materials.get(name)
    half = material.spread.limits().value if material is not None and material.spread is not None else None
    return corner.shift(name, "value") / half if half else None


def _read_corners(sources: Sequence[TableReader], known: Known) -> list[Corner]:
    found: dict[str, Corner] = {}
    tables = [table for source in sources if (table := source.inner("corner")) is not None]
    count = sum(len(table.table) for table in tables)
    if count > MOST_CORNERS:
        tables[-1].refuse("", f"{count} corners", f"{MOST_CORNERS} at most")
        return []
    for table in tables:
        for name in table.table:
            corner = _corner(table, name, known)
            if name in found:
                table.refuse(name, f"the corner {name} a second time", "each name once", "Rename one.")
            elif corner is not None:
                found[name] = corner
    return list(found.values())


def _corner(table: TableReader, name: str, known: Known) -> Corner | None:
    inner = table.inner(name)
    if not NAME.fullmatch(name):
        expected = "a letter, then letters, digits and underscores, 40 at most"
        table.refuse("", f"the corner name {shown(name)}", expected)
        return None
    if inner is None:
        return None  # the shape tells it
    shifts = tuple(shift for material in inner.table for shift in _shifts(inner, material, known))
    if not inner.table:
        inner.refuse("", "a corner without shifts", f"one or more tables [corner.{name}.MATERIAL]")
    return Corner(name=name, shifts=shifts) if shifts else None


def _shifts(corner: TableReader, name: str, known: Known) -> list[tuple[Parameter, float]]:
    """Return the shifts of one material in a corner."""
    at = name if NAME.fullmatch(name) else ""
    material, table = known.material(corner, at, name), corner.inner(name)
    if material is None or table is None:
        return []
    sizes = [key for key in VALUE_KEYS if table.has(key)]
    if len(sizes) > 1:
        table.refuse(sizes[1], " and ".join(sizes), "one of the three: all are the value")
    if not table.table:
        table.refuse("", "no shift", "ohm_per_square, ohm_per_metre or value, tc1 or tc2")
    found = []
    for key in (*sizes[:1], "tc1", "tc2"):
        component = COMPONENT_OF[key]
        shift = table.quantity(key, _SHIFT_UNITS[component])
        if shift is not None and _is_inside(table, key, shift, material):
            found.append((Parameter(material=name, component=component), shift))
    return found


def _is_inside(table: TableReader, key: str, shift: float, material: Material) -> bool:
    """Whether a shift lies within the limits of its spread, as a corner does."""
    component = COMPONENT_OF[key]
    limits = None if material.spread is None else material.spread.limits()
    limit = None if limits is None else getattr(limits, _LIMIT_OF[component])
    if limit is not None and abs(shift) <= limit * ROUNDING:
        return True
    scale, unit = _SHOWN_IN[component]
    stated = "no spread" if limit is None else f"limits of {scale * limit:.6g} {unit}"
    table.refuse(
        key,
        f"a shift of {scale * shift:g} {unit}, and {stated} in [material.{material.name}.spread]",
        "a corner inside the limits",
        "Widen the spread to what the process delivers, or correct the corner.",
    )
    return False
