"""From a brief with a ratio to its check and its files."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

from tcplan.brief import Brief
from tcplan.errors import InputError, Problem
from tcplan.output import check_folder, write_files
from tcplan.ranges import TemperatureRange
from tcplan.ratio.check import RatioCheck, check_ratio
from tcplan.units import format_celsius

RATIO_FILES = ("ratio.json", "drift.svg", "drift.png")


def make_ratio(brief: Brief) -> RatioCheck:
    """Return what is found of the ratio of a brief.

    Raises
    ------
    InputError
        When the brief asks for no ratio.
    """
    if brief.ratio is None:
        raise InputError(
            Problem(where="ratio", found="a brief without [ratio]", expected="two resistors under [ratio]")
        )
    return check_ratio(brief)


def over_range(brief: Brief, over: TemperatureRange) -> Brief:
    """Return the brief of a ratio over another range.

    Raises
    ------
    InputError
        When a material is not valid over it.
    """
    problems = [
        Problem(
            where=over.text(),
            found=f"a range outside the validity of {material.name}",
            expected=f"within {format_celsius(material.usable[0])} to {format_celsius(material.usable[1])}",
        )
        for material in brief.materials
        if over.low < material.usable[0] - 1e-9 or over.high > material.usable[1] + 1e-9
    ]
    if problems:
        raise InputError(problems)
    return replace(brief, over=over)


def ratio_json(check: RatioCheck) -> str:
    """Return ratio.json as text, at full precision; never NaN or infinity."""
    return json.dumps(check.to_dict(), indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def write_ratio(check: RatioCheck, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write ratio.json and the drift figure of a ratio, all of them or none.

    Parameters
    ----------
    check : RatioCheck
    folder : Path
        Made when it does not exist.
    force : bool
        Whether files that exist may be replaced.

    Returns
    -------
    tuple of Path
        The files, in the order of ``RATIO_FILES``.

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written.
    """
    from tcplan.figures.ratio import ratio_figure_files

    check_folder(folder, RATIO_FILES, force=force)
    contents = {"ratio.json": ratio_json(check).encode(), **ratio_figure_files(check)}
    return write_files(folder, {name: contents[name] for name in RATIO_FILES}, force=force)
