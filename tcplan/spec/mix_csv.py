"""mix.csv: the legs of the chosen option, at full precision (RFC 4180)."""

from __future__ import annotations

import csv
import io

from tcplan.network import leg_names, legs, shares
from tcplan.plan import Plan
from tcplan.units import from_celsius

COLUMNS = ("leg", "material", "ohms", "share", "squares", "area_m2", "tc1_ppm_per_K", "tc2_ppm_per_K2")
_RISKY = ("=", "+", "-", "@", "\t", "\r", "\n")


def mix_csv(plan: Plan) -> str:
    """Return mix.csv of a plan: one row a leg, coefficients about the reference of the brief.

    Parameters
    ----------
    plan : Plan

    Returns
    -------
    str
        Lines end in CR LF; a cell is empty where nothing is known.

    References
    ----------
    RFC 4180, Common format for comma-separated values.
    """
    option, reference = plan.best, from_celsius(plan.range.reference_degC)
    stream = io.StringIO()
    writer = csv.writer(stream)
    writer.writerow(COLUMNS)
    rows = zip(
        leg_names(len(option.squares)),
        legs(option.network),
        shares(option.network),
        option.squares,
        option.areas,
        strict=True,
    )
    for name, leg, share, squares, area in rows:
        tc1, tc2 = plan.by_name[leg.material].referred_taylor(reference, 2)
        sizes = ("" if size is None else repr(size) for size in (squares, area))
        cells = (repr(leg.ohms), repr(share), *sizes, repr(tc1 * 1e6), repr(tc2 * 1e6))
        writer.writerow((name, text_cell(leg.material), *cells))
    return stream.getvalue()


def text_cell(text: str) -> str:
    """Return text that a spreadsheet does not take for a formula."""
    return f"'{text}" if text.startswith(_RISKY) else text
