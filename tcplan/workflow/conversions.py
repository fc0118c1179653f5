"""The smaller jobs: briefs from standard input, materials and parameter lines, coefficients, a formula."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from tcplan.brief import Brief, parse_brief
from tcplan.errors import InputError, Problem
from tcplan.material.coefficient_forms import (
    Peak,
    Quadratic,
    Uncertain,
    box_tcr,
    chord,
    chord_covariance,
    correlation_of,
    moved,
    peak,
    ratio,
)
from tcplan.material.files import published, read_materials
from tcplan.material.model import Interval, Material, interval_problem
from tcplan.measure.parameter_lines import ASSUMED_VALID, read_parameter_lines
from tcplan.measure.parameter_record import ParameterLines
from tcplan.network import symbolic, used_materials
from tcplan.plan import Plan
from tcplan.toml_input import file_text
from tcplan.units import from_celsius


def brief_from_bytes(content: bytes, folder: Path) -> Brief:
    """Return the checked brief that came in on standard input.

    Parameters
    ----------
    content : bytes
        TOML, UTF-8 with or without a byte order mark.
    folder : Path
        What the names of materials files are relative to.
    """
    name = "standard input"
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as fault:
        found = f"bytes that are not UTF-8 text (at byte {fault.start + 1})"
        raise InputError(Problem(where=name, found=found, expected="TOML text in UTF-8")) from fault
    return parse_brief(text, name, folder)


def materials_of(name: str) -> dict[str, Material]:
    """Return the materials of a file, or of a set that comes with tcplan: ``published:NAME``."""
    prefix = "published:"
    return published(name.removeprefix(prefix)) if name.startswith(prefix) else read_materials(Path(name))


PARAMETER_SUFFIXES = (".lib", ".mod", ".cir", ".sp", ".spi")
"""Names of files that are taken as parameter lines."""


def parameter_lines_of(name: str, valid: Interval = ASSUMED_VALID) -> ParameterLines:
    """Return what a file of parameter lines holds, one material at least.

    Parameters
    ----------
    name : str
        A file, 2 MB at most, UTF-8.
    valid : (float, float)
        Range of the materials [K], which such a file does not state.

    Raises
    ------
    InputError
        When there is no law in it, or the range is none; what was not read is told then.
    """
    if problem := interval_problem("--valid", valid):
        raise InputError(problem)
    found = read_parameter_lines(_text_of(Path(name)), name, valid=valid)
    if found.materials:
        return found
    first = [f"line {u.line}: {u.why}" for u in found.unread[:3]]
    todo = f"Not read: {'; '.join(first)}." if first else ""
    expected = "one resistor line or .model of a resistor at least, with tc1 or tc2"
    raise InputError(Problem(where=name, found="no law of a resistor", expected=expected, todo=todo))


def _text_of(path: Path) -> str:
    try:
        return file_text(path)
    except InputError as error:  # the reader of files speaks of TOML
        problems = (replace(p, expected=p.expected.replace("TOML ", "")) for p in error.problems)
        raise InputError(problems) from error


@dataclass(frozen=True, slots=True, kw_only=True)
class Coefficients:
    """One law in every form that coefficients are stated in.

    Parameters
    ----------
    form : Quadratic
        TC1 and TC2 about the reference where they are wanted.
    chords : tuple of (float, Uncertain)
        Temperatures [K] and chord TCRs from the reference [1/K].
    chord_correlation : float, optional
        Of the two chord TCRs; None unless there are two with uncertainties.
    peak : Peak, optional
        None where the law has no peak.
    box : Uncertain, optional
        Box TCR from the first to the second temperature of ``chords`` [1/K]; None unless there are two,
        the lower one first.
    ratios : tuple of (float, Uncertain)
        Temperatures [K] and R(T)/R(reference).
    """

    form: Quadratic
    chords: tuple[tuple[float, Uncertain], ...]
    chord_correlation: float | None
    peak: Peak | None
    box: Uncertain | None
    ratios: tuple[tuple[float, Uncertain], ...]


def coefficients_at(
    form: Quadratic, reference: float, chords_to: Sequence[float] = (), ratios_at: Sequence[float] = ()
) -> Coefficients:
    """Return a law about another reference, in every form.

    Parameters
    ----------
    form : Quadratic
    reference : float
        Where the coefficients are wanted [K].
    chords_to : sequence of float
        Temperatures to which the chord TCR is wanted [K]; with two, cold and hot, the box TCR too.
    ratios_at : sequence of float
        Temperatures at which R(T)/R(reference) is wanted [K].
    """
    about = moved(form, reference)
    two = len(chords_to) == 2 and chords_to[0] < chords_to[1]
    return Coefficients(
        form=about,
        chords=tuple((at, chord(about, at)) for at in chords_to),
        chord_correlation=correlation_of(chord_covariance(about, *chords_to)) if two else None,
        peak=peak(about),
        box=box_tcr(about, *chords_to) if two else None,
        ratios=tuple((at, ratio(about, at)) for at in ratios_at),
    )


def symbolic_formula(plan: Plan) -> str:
    """Return R(T) [ohm] of the chosen option as one formula of T [K], made by sympy."""
    option, reference = plan.best, from_celsius(plan.range.reference_degC)
    names = used_materials(option.network)
    ratios = {name: plan.by_name[name].law.referred_to(reference).symbolic() for name in names}
    return str(symbolic(option.network, ratios))
