"""The smaller jobs: a brief from standard input, materials by name, coefficients, a formula."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from tcplan.brief import Brief, parse_brief
from tcplan.errors import InputError, Problem
from tcplan.material.files import published, read_materials
from tcplan.material.law import Law, chord_tcr
from tcplan.material.model import Material
from tcplan.network import symbolic, used_materials
from tcplan.plan import Plan
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


@dataclass(frozen=True, slots=True, kw_only=True)
class Coefficients:
    """TC1 [1/K] and TC2 [1/K^2] about ``reference`` [K]; each chord is (temperature [K], TCR [1/K])."""

    reference: float
    tc1: float
    tc2: float
    chords: tuple[tuple[float, float], ...]


def coefficients_at(law: Law, reference: float, chords_to: Sequence[float] = ()) -> Coefficients:
    """Return the coefficients of a law about another reference, and its chord TCRs from there.

    Parameters
    ----------
    law : Law
    reference : float
        Where the coefficients are wanted [K].
    chords_to : sequence of float
        Temperatures to which the chord TCR is wanted [K].
    """
    moved = law.referred_to(reference)
    tc1, tc2 = moved.taylor(reference, 2)
    chords = tuple((at, chord_tcr(moved, at, reference)) for at in chords_to)
    return Coefficients(reference=reference, tc1=tc1, tc2=tc2, chords=chords)


def symbolic_formula(plan: Plan) -> str:
    """Return R(T) [ohm] of the chosen option as one formula of T [K], made by sympy."""
    option, reference = plan.best, from_celsius(plan.range.reference_degC)
    names = used_materials(option.network)
    ratios = {name: plan.by_name[name].law.referred_to(reference).symbolic() for name in names}
    return str(symbolic(option.network, ratios))
