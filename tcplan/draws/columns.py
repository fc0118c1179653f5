"""Which random numbers a lot needs, and which parameters they move: the columns of the draws.

Every half-width above zero of a material in use takes one column, in the order of the materials, except:

- films that name one ``etch`` share the column of their width error, unless a correlation is stated
  between the widths of two of them: then each has its own, and the stated correlations hold;
- tracked TC1 are c + d_i: a common column, and one for each material;
- a TCR limit takes two columns, one on each side of the material's reference.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Literal, TypeAlias

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.errors import InputError, Problem
from tcplan.material.model import Material
from tcplan.material.spread import SIGMAS_PER_LIMIT, Shape, Spread
from tcplan.process import Component, Parameter, Process, Tracking

Slot: TypeAlias = Literal["value", "width", "tc1", "cold", "hot", "tc2"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One random number of a lot.

    ``parameters`` are what it counts as; several when they share it. A ``tied`` column is correlated
    with another one, so it is drawn as a normal whatever its shape.
    """

    name: str
    parameters: tuple[Parameter, ...]
    shape: Shape
    tied: bool = False

    @property
    def scale(self) -> float:
        """What a limit is multiplied with: a third for a normal, 1 for a column in -1..1."""
        return 1.0 / SIGMAS_PER_LIMIT if self.shape == "normal" else 1.0

    @property
    def rank(self) -> int:
        """Where it stands: tied ones first, then normals, then rectangulars."""
        return 0 if self.tied else 1 if self.shape == "normal" else 2


@dataclass(frozen=True, slots=True, kw_only=True)
class Term:
    """What one column does to one material: its deviation is ``scale`` times the column."""

    material: int
    slot: Slot
    column: int
    scale: float


@dataclass(slots=True)
class _Draft:
    """Columns by name, and (material, slot, column, half-width) for each effect."""

    columns: dict[str, Column] = field(default_factory=dict)
    effects: list[tuple[int, Slot, str, float]] = field(default_factory=list)

    def add(
        self, k: int, slot: Slot, half_width: float, shape: Shape, parameter: Parameter, name: str = ""
    ) -> None:
        """Add an effect; a column that exists gets one more parameter, and is rectangular if one is."""
        name = name or f"{parameter.material}.{parameter.component}"
        old = self.columns.get(name)
        if old is None:
            self.columns[name] = Column(name=name, parameters=(parameter,), shape=shape)
        elif parameter not in old.parameters:
            both: Shape = "rectangular" if "rectangular" in (shape, old.shape) else "normal"
            self.columns[name] = replace(old, parameters=(*old.parameters, parameter), shape=both)
        self.effects.append((k, slot, name, half_width))


def columns_of(
    names: Sequence[str],
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
) -> tuple[tuple[Column, ...], tuple[Term, ...], FloatArray | None]:
    """Return the columns, what they do, and the root of the correlations of the tied ones.

    Parameters
    ----------
    names : sequence of str
        The materials in use.
    materials, spreads : mapping of name to Material, Spread
    process : Process

    Returns
    -------
    columns : tuple of Column
        Tied ones first, then normals, then rectangulars.
    terms : tuple of Term
    root : array, shape (tied, tied), or None
        The symmetric root of their correlation matrix: the only one that does not depend on the order
        or the signs of eigenvectors, so that a seed gives the same lots everywhere.

    Raises
    ------
    InputError
        When the correlations contradict each other, or one is stated for a tracked TC1.
    """
    draft = _Draft()
    groups = _tracked(names, spreads, process)
    apart = _etches_apart(names, materials, process)
    for k, name in enumerate(names):
        _add_value(draft, k, materials[name], spreads[name].limits(), apart)
        _add_law(draft, k, name, spreads[name].limits(), groups.get(name))
    stated = _stated(draft, process, groups)
    tied = {name for pair in stated for name in pair}
    columns = [replace(column, tied=name in tied) for name, column in draft.columns.items()]
    columns.sort(key=lambda column: column.rank)
    place = {column.name: k for k, column in enumerate(columns)}
    terms = tuple(
        Term(material=k, slot=slot, column=place[name], scale=half * columns[place[name]].scale)
        for k, slot, name, half in draft.effects
    )
    matrix = np.eye(len(tied))
    for (first, second), value in stated.items():
        matrix[place[first], place[second]] = matrix[place[second], place[first]] = value
    return tuple(columns), terms, correlation_root(matrix) if tied else None


def correlation_root(matrix: FloatArray) -> FloatArray:
    """Return the symmetric square root of a correlation matrix, also of a singular one.

    Raises
    ------
    InputError
        When the matrix is not positive semi-definite.
    """
    eigenvalues, vectors = np.linalg.eigh(matrix)
    if eigenvalues[0] < -1e-9:
        raise InputError(
            Problem(
                where="correlation",
                found=f"correlations that contradict each other (least eigenvalue {eigenvalues[0]:.3g})",
                expected="a matrix that is positive semi-definite",
                todo="Make one of them weaker.",
            )
        )
    # The root of a rounding error is not small: what is zero must be exactly zero.
    eigenvalues[eigenvalues < 1e-13 * len(matrix)] = 0.0
    return np.asarray(vectors * np.sqrt(eigenvalues) @ vectors.T)


def _add_value(draft: _Draft, k: int, material: Material, limits: Spread, apart: frozenset[str]) -> None:
    """Add the value and the width error, as a fraction of the effective width."""
    if limits.value:
        draft.add(k, "value", limits.value, limits.shape, _parameter(material.name, "value"))
    width, film = material.effective_width, material.film
    if limits.width_bias and width is not None and film is not None:
        shared = film.etch is not None and film.etch not in apart
        name = f"etch {film.etch}" if shared else ""
        parameter = _parameter(material.name, "width_bias")
        draft.add(k, "width", limits.width_bias / width, limits.shape, parameter, name)


def _add_law(draft: _Draft, k: int, name: str, limits: Spread, group: _Group | None) -> None:
    """Add TC1, tracked or not, the two sides of a TCR limit, and TC2."""
    tc1 = _parameter(name, "tc1")
    if group is not None:
        if group.common:
            draft.add(k, "tc1", group.common, group.shape, tc1, group.name)
        draft.add(k, "tc1", group.own, limits.shape, tc1)
    elif limits.tc1:
        draft.add(k, "tc1", limits.tc1, limits.shape, tc1)
    if limits.tcr:
        draft.add(k, "cold", limits.tcr, "rectangular", tc1, f"{name}.tcr cold")
        draft.add(k, "hot", limits.tcr, "rectangular", tc1, f"{name}.tcr hot")
    if limits.tc2:
        draft.add(k, "tc2", limits.tc2, limits.shape, _parameter(name, "tc2"))


# --- tracking and etch ------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Group:
    """The half-widths of the common and of the own part of tracked TC1."""

    name: str
    shape: Shape
    common: float
    own: float


def _tracked(names: Sequence[str], spreads: Mapping[str, Spread], process: Process) -> dict[str, _Group]:
    """Return the group of every tracked material in use."""
    found: dict[str, _Group] = {}
    for tracking in process.trackings:
        members = [n for n in dict.fromkeys(tracking.materials) if n in names and spreads[n].tc1]
        if len(members) < 2:
            continue
        group = _group(tracking, members, spreads)
        for name in members:
            if name in found:
                raise InputError(_twice_problem(name))
            found[name] = group
    return found


def _group(tracking: Tracking, members: Sequence[str], spreads: Mapping[str, Spread]) -> _Group:
    least = min(spreads[n].limits().tc1 or 0.0 for n in members)
    own = min(0.5 * tracking.within, least)
    rectangular = any(spreads[n].shape == "rectangular" for n in members)
    shape: Shape = "rectangular" if rectangular else "normal"
    return _Group("tracking " + " ".join(members), shape, least - own, own)


def _etches_apart(
    names: Sequence[str], materials: Mapping[str, Material], process: Process
) -> frozenset[str]:
    """Return the etches for which a correlation between the widths of two films is stated."""
    found = set()
    for one in process.correlations:
        pair = (one.first, one.second)
        if all(p.component == "width_bias" and p.material in names for p in pair):
            films = [materials[p.material].film for p in pair]
            etches = {film.etch for film in films if film is not None}
            found |= etches if len(etches) == 1 else set()
    return frozenset(etch for etch in found if etch is not None)


# --- correlations -----------------------------------------------------------------------------------


def _stated(draft: _Draft, process: Process, groups: Mapping[str, _Group]) -> dict[tuple[str, str], float]:
    """Return the correlations by the names of their columns.

    One of a parameter that does not vary has no effect. So has one of an end: ends do not take part.
    """
    found: dict[tuple[str, str], float] = {}
    for one in process.correlations:
        for parameter in (one.first, one.second):
            if parameter.component == "tc1" and parameter.material in groups:
                raise InputError(_tracked_problem(parameter.material))
        for first in _columns_moving(draft, one.first):
            for second in _columns_moving(draft, one.second):
                key = (min(first, second), max(first, second))
                if first != second and found.setdefault(key, one.value) != one.value:
                    raise InputError(_contradiction_problem(key, found[key], one.value))
    return {key: value for key, value in found.items() if value}


def _columns_moving(draft: _Draft, parameter: Parameter) -> Iterator[str]:
    """Yield the column of a parameter, if it has one; the sides of a TCR limit stay on their own."""
    for name, column in draft.columns.items():
        if parameter in column.parameters and ".tcr " not in name:
            yield name


def _parameter(material: str, component: Component) -> Parameter:
    return Parameter(material=material, component=component)


def _tracked_problem(name: str) -> Problem:
    return Problem(
        where="correlation",
        found=f"a correlation of {name}.tc1, which is tracked",
        expected="tracking or correlations for one TC1, not both",
        todo="Remove one of the two.",
    )


def _twice_problem(name: str) -> Problem:
    return Problem(
        where="tracking",
        found=f"{name} in two of them",
        expected="a material in one tracking at most",
        todo="Join the two, with the smaller of their figures.",
    )


def _contradiction_problem(pair: tuple[str, str], first: float, second: float) -> Problem:
    return Problem(
        where="correlation",
        found=f"{first:g} and {second:g} between {pair[0]} and {pair[1]}",
        expected="one value",
        todo="Films of one etch share one width error, so its correlations must agree.",
    )
