"""Correlations of a brief: what may be named, each pair once, and whether they can all hold together."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.material.model import NAME, Material
from tcplan.names import nearest_name, shown
from tcplan.process import COMPONENTS, Component, Correlation, Parameter
from tcplan.table_reader import TableReader

MOST_CORRELATIONS = 200
LEAST_EIGENVALUE = -1e-9  # what rounding leaves of zero
VALUE_KEYS = ("ohm_per_square", "ohm_per_metre", "value")
COMPONENT_OF: dict[str, Component] = {name: name for name in COMPONENTS}
COMPONENT_OF |= {"ohm_per_square": "value", "ohm_per_metre": "value"}

Correlations = list[tuple[TableReader, Correlation]]
"""Each with the table that it was read from, for messages."""

_Pair = frozenset[Parameter]
_Merged = dict[Parameter, Parameter]


@dataclass(frozen=True, slots=True)
class Known:
    """The materials that may be named; unless they are all, an unknown name is not a mistake."""

    materials: Mapping[str, Material]
    all_of_them: bool

    def material(self, table: TableReader, key: str, name: str) -> Material | None:
        """Return a material; one that is not known is a mistake at ``key``."""
        if name not in self.materials and self.all_of_them:
            near = nearest_name(name, self.materials)
            listed = ", ".join(sorted(self.materials)[:12])
            todo = f"Did you mean {near}?" if near else ""
            table.refuse(key, f"a material named {shown(name)}", f"one of {listed}", todo)
        return self.materials.get(name)

    def parameter(self, table: TableReader, text: str) -> Parameter | None:
        """Return the parameter that a text such as "red_film.tc1" names, if it has a spread."""
        name, _, word = text.partition(".")
        component = COMPONENT_OF.get(word)
        if component is None:
            near = nearest_name(word, COMPONENT_OF)
            todo = f"Did you mean {name}.{near}?" if near and NAME.fullmatch(name) else ""
            expected = "a material, a point and one of " + ", ".join(COMPONENT_OF)
            table.refuse("between", f"the parameter {shown(text)}", expected, todo)
            return None
        material = self.material(table, "between", name)
        if material is None:
            return None
        if material.spread is None or getattr(material.spread, component) is None:
            found, expected = f"{text}, which has no spread", f"{word} in [material.{name}.spread]"
            table.refuse("between", found, expected, "What does not vary is not correlated.")
            return None
        return Parameter(material=name, component=component)


def read_correlations(sources: Sequence[TableReader], known: Known) -> Correlations:
    """Return the correlations of the brief and its files. Mistakes go to the readers."""
    read = _read(sources, known)
    one_etch = _one_etch(known.materials, read)
    correlations = _once(read, one_etch)
    _check_possible(correlations, one_etch)
    return correlations


def words(one: Correlation) -> str:
    """Return the two parameters of a correlation in words."""
    return " and ".join(f"{p.material}.{p.component}" for p in (one.first, one.second))


def _read(sources: Sequence[TableReader], known: Known) -> Correlations:
    tables = [table for source in sources for table in source.rows("correlation")]
    if len(tables) > MOST_CORRELATIONS:
        tables[MOST_CORRELATIONS].refuse("", f"{len(tables)} correlations", f"{MOST_CORRELATIONS} at most")
    read = [(table, _correlation(table, known)) for table in tables[:MOST_CORRELATIONS]]
    return [(table, one) for table, one in read if one is not None]


def _correlation(table: TableReader, known: Known) -> Correlation | None:
    texts, value = table.texts("between"), table.number("value")
    if len(texts) != 2:
        return None  # the shape tells it
    first, second = known.parameter(table, texts[0]), known.parameter(table, texts[1])
    if first is None or second is None or value is None or not -1.0 <= value <= 1.0:
        return None
    if first == second:
        table.refuse("between", f"{texts[0]} with itself", "two different parameters")
        return None
    return Correlation(first=first, second=second, value=value)


def _once(correlations: Correlations, one_etch: _Merged) -> Correlations:
    """Return the first correlation of each pair; a second one is a mistake."""
    seen: dict[_Pair, tuple[TableReader, Correlation]] = {}
    for table, one in correlations:
        pair = _pair(one, one_etch)
        if pair in seen:
            table.refuse("between", f"{words(one)} a second time", "each pair once", "Remove one.")
        else:
            seen[pair] = (table, one)
    return list(seen.values())


def _one_etch(materials: Mapping[str, Material], correlations: Correlations) -> _Merged:
    """Return for the width error of each film that shares one, by its etch, that of the first such film.

    Films of an etch for which a correlation between two widths is stated have width errors of their own.
    """
    etches = {name: film.etch for name, m in materials.items() if (film := m.film) is not None and film.etch}
    apart = {
        etches.get(one.first.material)
        for _, one in correlations
        if one.first.component == one.second.component == "width_bias"
        and etches.get(one.first.material) == etches.get(one.second.material)
    }
    first: dict[str, Parameter] = {}
    merged: _Merged = {}
    for name, etch in etches.items():
        if etch not in apart:
            own = Parameter(material=name, component="width_bias")
            merged[own] = first.setdefault(etch, own)
    return merged


def _check_possible(correlations: Correlations, one_etch: _Merged) -> None:
    """Refuse correlations that no random values can have, and name the pair that is most to blame."""
    values = {_pair(one, one_etch): one.value for _, one in correlations}
    for block in _blocks(values):
        matrix = _matrix(block, values)
        least = _least_eigenvalue(matrix)
        if least >= LEAST_EIGENVALUE:
            continue
        tried = []
        for table, one in correlations:
            pair = _pair(one, one_etch)
            if pair <= set(block):
                tried.append((_least_eigenvalue(_without(matrix, block, pair)), table, one))
        best, table, worst = max(tried, key=lambda row: row[0])
        table.refuse(
            "value",
            f"{worst.value:g} between {words(worst)}, which the other correlations exclude",
            f"a positive semi-definite matrix (its smallest eigenvalue is {least:.3g})",
            f"Look at this pair first: without it the smallest eigenvalue is {best:.3g}.",
        )


def _blocks(pairs: Iterable[_Pair]) -> list[list[Parameter]]:
    """Return the parameters that are linked with one another, sorted, block by block."""
    blocks: list[set[Parameter]] = []
    for pair in pairs:
        linked = [block for block in blocks if block & pair]
        blocks = [block for block in blocks if not block & pair]
        blocks.append(set(pair).union(*linked))
    return sorted(sorted(block) for block in blocks)


def _matrix(block: Sequence[Parameter], values: Mapping[_Pair, float]) -> FloatArray:
    at = {parameter: k for k, parameter in enumerate(block)}
    matrix = np.eye(len(block))
    for pair, value in values.items():
        if pair <= set(block):
            i, j = (at[parameter] for parameter in pair)
            matrix[i, j] = matrix[j, i] = value
    return matrix


def _without(matrix: FloatArray, block: Sequence[Parameter], pair: _Pair) -> FloatArray:
    i, j = (block.index(parameter) for parameter in pair)
    reduced = matrix.copy()
    reduced[i, j] = reduced[j, i] = 0.0
    return reduced


def _least_eigenvalue(matrix: FloatArray) -> float:
    return float(np.linalg.eigvalsh(matrix)[0])


def _pair(one: Correlation, merged: _Merged) -> _Pair:
    return frozenset(merged.get(parameter, parameter) for parameter in (one.first, one.second))
