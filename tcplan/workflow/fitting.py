"""From sweeps to a materials file: every material fitted, and what they share."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import combinations
from pathlib import Path

from tcplan import __version__
from tcplan.errors import InputError, Problem
from tcplan.measure.block import correlation_block, material_block, tracking_block
from tcplan.measure.fitted import FittedMaterial, fitted
from tcplan.measure.reading import ReadSweep, parse_sweep, read_sweep
from tcplan.measure.request import FitRequest
from tcplan.measure.tracking import MeasuredTracking, tracking_of
from tcplan.output import check_folder, write_files
from tcplan.spec.fit_data import fit_data
from tcplan.spec.fit_text import quality

FIT_FILES = ("materials.toml", "fit.json")
FIGURES = ("fit", "residuals", "devices")
"""What the figures of a material are called, after its name."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Fitted:
    """All materials of a request, and how the TC1 of those measured on the same devices track.

    ``tracking`` holds pairs of materials whose TC1 stay closer together than their limits say. ``refused``
    is how many rows of each file were no readings.
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
        With every file that can not be read, and every device that can not be fitted.
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
    return Fitted(
        request=request,
        materials=tuple(found),
        tracking=tuple(_tracking(request, found)),
        refused=refused,
    )


def _read(file: Path, content: bytes | None) -> ReadSweep:
    return read_sweep(file) if content is None else parse_sweep(content, "standard input")


def _tracking(
    request: FitRequest, found: list[FittedMaterial]
) -> Iterator[tuple[tuple[str, str], MeasuredTracking]]:
    """Yield the pairs measured on the same devices whose TC1 track, each material in one pair at most."""
    taken: set[str] = set()
    rules = request.spread
    for first, second in combinations(found, 2):
        names = first.request.name, second.request.name
        both = set(first.by_device) & set(second.by_device) - {""}
        if len(both) < 2 or taken & set(names) or any(_is_correlated(one) for one in (first, second)):
            continue
        tracked = tracking_of(
            first.by_device,
            second.by_device,
            first.lot_of,
            coverage=rules.coverage,
            confidence=rules.confidence,
        )
        halves = [_tc1_half_width(one) for one in (first, second)]
        if None not in halves and tracked.half_width < min(h for h in halves if h is not None):
            taken |= set(names)
            yield names, tracked


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
