"""From a brief with a ratio to its check and its files."""

from __future__ import annotations

import json
from pathlib import Path

from tcplan.brief import Brief
from tcplan.errors import InputError, Problem
from tcplan.output import check_folder, write_files
from tcplan.ratio.check import RatioCheck, check_ratio

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


def refuse_ratio(brief: Brief) -> None:
    """Refuse a brief with a ratio where a resistor is wanted.

    Raises
    ------
    InputError
        With what to do in its place.
    """
    if brief.ratio is not None:
        raise InputError(
            Problem(
                where="ratio",
                found="a brief with [ratio]",
                expected="a brief for a resistor",
                todo="tcplan plan checks the ratio and prints its account.",
            )
        )


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
