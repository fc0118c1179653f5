"""The tables of a trim as CSV: the codes, and the bits as they are drawn (RFC 4180)."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator

import numpy as np

from tcplan.parts.trim.bits import Factor, code_ohms
from tcplan.parts.trim.model import Row, TrimPlan

CODE_COLUMNS = ("code", "leg", "ohms", "step_ppm_of_whole", "of")
BIT_COLUMNS = ("leg", "piece", "strings", "units", "length_m", "width_m", "ohms", "of")


def codes_csv(*plans: TrimPlan) -> str:
    """Return the value of every leg at every code, nominal and at the reference.

    ``step_ppm_of_whole`` is what the code adds to the whole over the one before it, below zero where codes
    overlap; empty for code 0. ``of`` is the label of the plan. Of a cut only the head remains.
    """
    return _table(CODE_COLUMNS, ((*line, plan.label) for plan in plans for line in _codes(plan)))


def bits_csv(*plans: TrimPlan) -> str:
    """Return how the rest of every leg with bits and each of its bits are drawn.

    ``piece`` is base, or the number of a bit from 1, least first; a string of it is ``units`` whole units
    and one segment of ``length_m``. What is not drawn has its value alone. ``of`` is the label of the plan.
    Of a cut only the head remains.
    """
    return _table(BIT_COLUMNS, ((*line, plan.label) for plan in plans for line in _bits(plan)))


def _table(head: tuple[str, ...], lines: Iterable[tuple[str, ...]]) -> str:
    stream = io.StringIO()
    writer = csv.writer(stream)
    writer.writerow(head)
    writer.writerows(lines)
    return stream.getvalue()


def _codes(plan: TrimPlan) -> Iterator[tuple[str, ...]]:
    for row in plan.rows:
        codes = np.arange(2 ** len(row.bit_ohms))
        ohms = code_ohms(row, codes, Factor.of(1.0))
        steps = np.diff(ohms) / row.step_ohms * row.step * 1e6
        for code, own in zip(codes.tolist(), ohms, strict=True):
            yield str(code), row.leg, repr(float(own)), repr(float(steps[code - 1])) if code else ""


def _bits(plan: TrimPlan) -> Iterator[tuple[str, ...]]:
    for row in plan.rows:
        names = ("base", *(str(k) for k in range(1, len(row.bit_ohms) + 1)))
        for name, sizes, ohms in zip(names, _sizes(row), (row.base_ohms, *row.bit_ohms), strict=True):
            yield row.leg, name, *sizes, repr(ohms)


def _metres(size: float) -> str:
    """Return a size without what arithmetic adds to a step of the grid."""
    return f"{size:.12g}"


def _sizes(row: Row) -> list[tuple[str, ...]]:
    """Return strings, units, length and width of each piece; empty where it is not drawn."""
    if row.base is None:
        return [("",) * 4] * (1 + len(row.bit_ohms))
    return [
        (str(one.strings), str(one.units), _metres(one.length), _metres(one.width))
        for one in (row.base, *row.bits)
    ]
