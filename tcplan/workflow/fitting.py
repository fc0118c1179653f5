"""From sweeps to a materials file: every material fitted, and what they share."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import combinations
from pathlib import Path

from tcplan import __version__
from tcplan.errors import InputError, Problem
from tcplan.measure.block import correlation_block, material_block, tracking_block
from tcplan.measure.fitted import FittedMaterial, fitted
from tcplan.measure.reading import ReadSweep, parse_sweep, read_sweep
from tcplan.measure.request import FitRequest
from tcplan.measure.tracking import MeasuredTracking, tracking_of
from tcplan.names import shown
from tcplan.output import check_folder, write_files
from tcplan.spec.fit_data import fit_data
from tcplan.spec.fit_text import quality

FIT_FILES = ("materials.toml", "fit.json")
FIGURES = ("fit", "residuals", "devices")
"""What the figures of a material are called, after its name."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Fitted:
    """All materials of a request, and how the TC1 of those measured on the same devices track.

    ``tracking`` holds pairs of materials whose TC1 are shown to move together, and stay closer together than
    their limits say; only where the request says that they are on the same devices. ``refused`` is how many
    rows of each file were no readings.
    """

    request: FitRequest
    materials: tuple[FittedMaterial, ...]
    tracking: tuple[tuple[tuple[str, str], MeasuredTracking], ...]
    refused: Mapping[str, int]


def fit_request(request: FitRequest, content: Mapping[str, bytes] | None = None) -> Fitted:
    """Return all materials of a request, fitted.

    Parameters
    ----------
    request : FitRequest
    content : mapping of str to bytes, optional
        Readings that do not come from the file of their material, by its name.

    Raises
    ------
    InputError
        With every file that can not be read, every device that can not be fitted, and devices said to be the
        same whose lots differ.
    """
    given = content or {}
    found: list[FittedMaterial] = []
    refused: dict[str, int] = {}
    problems: list[Problem] = []
    for one in request.sweeps:
        try:
            read = _read(one.file, given.get(one.name))
            refused[one.name] = read.refused
            found.append(fitted(one, read.sweep, request.errors, request.spread, read.notes))
        except InputError as error:
            problems.extend(error.problems)
    if problems:
        raise InputError(problems)
    materials, tracking = _tracking(request, found)
    return Fitted(request=request, materials=materials, tracking=tracking, refused=refused)


def _read(file: Path, content: bytes | None) -> ReadSweep:
    return read_sweep(file) if content is None else parse_sweep(content, "standard input")


Tracked = tuple[tuple[str, str], MeasuredTracking]


def _tracking(
    request: FitRequest, found: Sequence[FittedMaterial]
) -> tuple[tuple[FittedMaterial, ...], tuple[Tracked, ...]]:
    """Return the materials and the pairs whose TC1 track, each material in one pair at most.

    Where a pair does not, a note of its second material says why. Equal names alone say nothing of devices:
    without ``same_devices`` there is no pair.
    """
    if not request.same_devices:
        return tuple(found), ()
    pairs = list(combinations(found, 2))
    if problems := [problem for pair in pairs for problem in _other_lots(*pair)]:
        raise InputError(problems)
    written: list[Tracked] = []
    notes: dict[str, list[str]] = {one.request.name: [] for one in found}
    for first, second in pairs:
        names = first.request.name, second.request.name
        told = _tracked(request, first, second, {name for pair, _ in written for name in pair})
        if isinstance(told, str):
            notes[names[1]].append(f"No tracking with {names[0]}: {told}.")
        else:
            written.append((names, told))
    return tuple(replace(one, notes=(*one.notes, *notes[one.request.name])) for one in found), tuple(written)


def _tracked(
    request: FitRequest, first: FittedMaterial, second: FittedMaterial, taken: set[str]
) -> MeasuredTracking | str:
    """Return how the TC1 of two materials track, or why that is not written."""
    rules = request.spread
    if len(_both(first, second)) < 2:
        return "fewer than two devices have readings of both"
    if held := [one.request.name for one in (first, second) if _is_correlated(one)]:
        return f"TC1 of {' and of '.join(held)} stands in a correlation with R"
    if held := sorted(taken & {first.request.name, second.request.name}):
        return f"{' and '.join(held)} stands in a tracking already"
    tracked = tracking_of(
        first.by_device,
        second.by_device,
        first.lot_of,
        request.errors,
        coverage=rules.coverage,
        confidence=rules.confidence,
    )
    if not tracked.is_shown:
        return f"the data do not show that their TC1 move together{_correlated(tracked)}"
    halves = [_tc1_half_width(one) for one in (first, second)]
    if any(half is None or half <= tracked.half_width for half in halves):
        return "the limits of the difference of TC1 are not below those of both"
    return tracked


def _correlated(tracked: MeasuredTracking) -> str:
    """Return the correlation of the two TC1 in words."""
    one = tracked.correlation
    return (
        ""
        if one is None
        else f" (correlation {one.value:.2f}, 95 % interval {one.low:.2f} to {one.high:.2f})"
    )


def _both(first: FittedMaterial, second: FittedMaterial) -> tuple[str, ...]:
    """Return the names of devices that carry both materials."""
    return tuple(name for name in first.sweep.devices if name and name in second.sweep.devices)


def _other_lots(first: FittedMaterial, second: FittedMaterial) -> Iterator[Problem]:
    """Yield devices of equal name that can not be the same pieces, since their lots differ."""
    here, there = first.lot_of, second.lot_of
    for name in _both(first, second):
        if here[name] != there[name]:
            yield Problem(
                where=f"sweep.{second.request.name}: device {shown(name)}",
                found=_lot_words(there[name]),
                expected=f"{_lot_words(here[name])}, as in sweep.{first.request.name}",
                todo="Correct the lot or the name of the device, or take same_devices out.",
            )


def _lot_words(lot: str) -> str:
    return f"lot {shown(lot)}" if lot else "no lot"


def _is_correlated(one: FittedMaterial) -> bool:
    """Whether its TC1 stands in a correlation already: it may not stand in a tracking as well."""
    return one.found.correlation is not None and one.found.correlation.is_shown


def _tc1_half_width(one: FittedMaterial) -> float | None:
    return next((s.half_width for s in one.found.scatters if s.name == "tc1"), None)


# --- what is handed over --------------------------------------------------------------------------------


def materials_text(fits: Fitted) -> str:
    """Return the materials file of what was fitted: materials, correlations and tracking."""
    meaning = fits.request.spread.meaning
    blocks = ["# Made by tcplan fit from the readings that each material names.\nschema = 1\n"]
    for one in fits.materials:
        asked = one.request
        blocks.append(
            material_block(
                asked.name,
                one.found,
                source=asked.source,
                label=asked.label,
                size=asked.size,
                meaning=meaning,
                remarks=(f"Readings: {' '.join(quality(one))}", *one.notes),
            )
        )
    for one in fits.materials:
        if _is_correlated(one):
            blocks.append(correlation_block(one.request.name, one.found, size=one.request.size))
    blocks.extend(tracking_block(names, [tracked]) for names, tracked in fits.tracking)
    return "\n".join(block.rstrip("\n") + "\n" for block in blocks)


def fit_json(fits: Fitted) -> str:
    """Return fit.json as text, at full precision; never NaN or infinity."""
    data = {
        "schema": 1,
        "tcplan": __version__,
        "materials": {one.request.name: fit_data(one, fits.refused) for one in fits.materials},
        "tracking": [
            {"materials": list(names), "within_per_K": tracked.half_width} for names, tracked in fits.tracking
        ],
    }
    return json.dumps(data, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def check_fit_out(request: FitRequest, folder: Path, *, force: bool = False) -> None:
    """Refuse a folder in which the files of a fit cannot be written, before anything is computed.

    Raises
    ------
    OutputError
        With every file that is in the way.
    """
    names = [one.name for one in request.sweeps]
    figures = [f"{name}-{kind}.{end}" for name in names for kind in FIGURES for end in ("svg", "png")]
    check_folder(folder, (*FIT_FILES, *figures), force=force)


def write_fit(fits: Fitted, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write materials.toml, fit.json and the figures of every material, all of them or none.

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written.
    """
    from tcplan.figures.fit import fit_figure_files

    check_fit_out(fits.request, folder, force=force)
    contents = {"materials.toml": materials_text(fits).encode(), "fit.json": fit_json(fits).encode()}
    for one in fits.materials:
        contents |= fit_figure_files(one)
    return write_files(folder, contents, force=force)
