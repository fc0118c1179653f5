"""The files of a made plan, all of them or none."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from pathlib import Path

from tcplan.errors import OutputError, Problem
from tcplan.names import shown
from tcplan.output import check_folder, write_files
from tcplan.parts.record import FilmWay, MadePlan, MadeRatio
from tcplan.plan import plan_json
from tcplan.units import format_length, from_celsius
from tcplan.workflow.delivery import remove_earlier

PARTS_FILES = (
    "plan.json",
    "spec.html",
    "parts.csv",
    "placement.svg",
    "placement.png",
    "trade.svg",
    "trade.png",
    "trim-codes.csv",
    "trim-bits.csv",
)


def write_parts(made: MadePlan, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write the plan with its parts, its spec sheet, parts.csv and the figures, all of them or none.

    Parameters
    ----------
    made : MadePlan
    folder : Path
        Made when it does not exist.
    force : bool
        Whether files that exist may be replaced.

    Returns
    -------
    tuple of Path
        In the order of ``PARTS_FILES``: without the placement where nothing is drawn, without the trade
        where there is only one way to draw it, without the codes where nothing is trimmed.

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written.
    """
    check_folder(folder, PARTS_FILES, force=force)
    contents = _contents(made)
    return _write(folder, PARTS_FILES, contents, force=force)


def _write(
    folder: Path, names: Sequence[str], contents: Mapping[str, bytes], *, force: bool
) -> tuple[Path, ...]:
    """Write the files that there are, in the order of ``names``; those of earlier parts go."""
    paths = write_files(folder, {name: contents[name] for name in names if name in contents}, force=force)
    remove_earlier(folder / name for name in names if name not in contents)
    return paths


def _contents(made: MadePlan) -> dict[str, bytes]:
    from tcplan.figures.files import figure_files
    from tcplan.figures.placement import placement_figure_files
    from tcplan.figures.trade import trade_figure_files
    from tcplan.parts.trim import bits_csv, codes_csv
    from tcplan.spec.parts_csv import parts_csv
    from tcplan.workflow.specs import make_spec, spec_files

    plan, parts = made.plan, made.parts
    reference = from_celsius(plan.range.reference_degC)
    found = {
        "plan.json": plan_json(plan).encode(),
        # Markdown has no figures of its own, and those of the plan do not lie here.
        "spec.html": spec_files(make_spec(plan), figure_files(plan))["spec.html"],
        "parts.csv": parts_csv(parts.made, made.loads, plan.by_name, reference).encode(),
    }
    placements = [one for own in made.placements for one in own]
    if placements:
        found |= placement_figure_files(placements)
    if len(made.ways) > 1 and made.way is not None:
        limit = plan.limit.drift_ppm
        points = [(way.area, way.figure, _units(way)) for way in made.ways]
        found |= trade_figure_files(
            points, made.ways.index(made.way), None if limit is None else limit * 1e-6
        )
    if any(trim.rows for trim in made.trims):
        found["trim-codes.csv"] = codes_csv(*made.trims).encode()
        found["trim-bits.csv"] = bits_csv(*made.trims).encode()
    return found


def _units(way: FilmWay) -> str:
    """Return the unit cells of a way, such as "2 um x 80 um"."""
    return ", ".join(f"{format_length(c.unit.width)} x {format_length(c.unit.length)}" for c in way.choices)


RATIO_PARTS_FILES = ("ratio.json", "parts.csv", "placement.svg", "placement.png")


def write_ratio_parts(made: MadeRatio, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write the ratio with its parts, parts.csv and the placement, all of them or none.

    Parameters and errors are those of :func:`write_parts`; the files those of ``RATIO_PARTS_FILES``.
    """
    from tcplan.figures.placement import placement_figure_files
    from tcplan.spec.parts_csv import legs_csv

    check_folder(folder, RATIO_PARTS_FILES, force=force)
    brief = made.ideal.brief
    rows = [("first", made.first), ("second", made.second)]
    found = {
        "ratio.json": ratio_parts_json(made).encode(),
        "parts.csv": legs_csv(rows, brief.by_name, brief.over.reference).encode(),
    }
    if made.placements:
        found |= placement_figure_files(made.placements)
    return _write(folder, RATIO_PARTS_FILES, found, force=force)


def ratio_parts_json(made: MadeRatio) -> str:
    """Return ratio.json with its parts as text, at full precision; never NaN or infinity."""
    return json.dumps(made.to_dict(), indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def list_text(made: MadePlan) -> str:
    """Return the made networks of all values as a resistor list."""
    from tcplan.spec.resistor_list import resistor_list

    over = made.plan.range
    blocks = [
        resistor_list(
            assembly.network,
            assembly.by_name,
            from_celsius(over.reference_degC),
            from_celsius(over.low_degC),
            from_celsius(over.high_degC),
            title=f"{made.plan.brief['title']} {one.option.id}",
            labels=[element.leg for element in assembly.elements],
        )
        for one, assembly in zip(made.parts.made, made.assemblies, strict=True)
    ]
    return "\n".join(blocks)


def check_out(folder: str | None, names: Sequence[str], listing: str | None = None, *, force: bool) -> None:
    """Refuse a folder, or a resistor list, that can not be written, before the work is done.

    Parameters
    ----------
    folder : str, optional
        Where files of these names go.
    names : sequence of str
    listing : str, optional
        The file of the resistor list.
    force : bool

    Raises
    ------
    OutputError
        When a file is in the way, without ``force``, or the list is none or one of the other files.
    """
    if folder is not None:
        check_folder(Path(folder), names, force=force)
    if listing is None:
        return
    path = Path(listing)
    own = () if folder is None else tuple((Path(folder) / name).resolve() for name in names)
    if not path.name or path.resolve() in own:
        expected = "the name of a file that -o does not write"
        raise OutputError(Problem(where="--list", found=shown(listing), expected=expected))
    check_folder(path.parent, (path.name,), force=force)


def write_list(made: MadePlan, path: Path, *, force: bool = False) -> Path:
    """Write the resistor list of a made plan."""
    (written,) = write_files(path.parent, {path.name: list_text(made).encode()}, force=force)
    return written
