"""The code table of a trim as CSV."""

from __future__ import annotations

import csv
import io

import numpy as np

from tcplan.parts.trim.bits import code_ohms
from tcplan.parts.trim.model import Row, TrimPlan

COLUMNS = ("code", "leg", "ohms", "step_ppm_of_whole")


def codes_csv(plan: TrimPlan) -> str:
    """Return the value of every leg at every code, nominal and at the reference (RFC 4180).

    ``step_ppm_of_whole`` is what the code adds to the whole over the one before it; empty for code 0. Of a
    cut only the head remains.
    """
    stream = io.StringIO()
    writer = csv.writer(stream)
    writer.writerow(COLUMNS)
    for row in plan.rows:
        writer.writerows(_lines(row))
    return stream.getvalue()


def _lines(row: Row) -> list[tuple[str, str, str, str]]:
    codes = np.arange(2 ** len(row.bit_ohms))
    ohms = code_ohms(row, codes, 1.0)
    steps = np.diff(ohms) / row.step_ohms * row.step * 1e6
    return [
        (str(code), row.leg, repr(float(own)), repr(float(steps[code - 1])) if code else "")
        for code, own in zip(codes.tolist(), ohms, strict=True)
    ]
