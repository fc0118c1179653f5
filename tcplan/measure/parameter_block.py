"""Materials from parameter lines as the text of a materials file, which reads back as the same materials."""

from __future__ import annotations

import json
from decimal import Decimal

from tcplan.errors import InternalError
from tcplan.material.law import Polynomial
from tcplan.material.model import Material
from tcplan.measure.parameter_record import ParameterLines
from tcplan.units import format_celsius, to_celsius


def parameter_block(found: ParameterLines) -> str:
    """Return a whole materials file (TOML), every number to its last digit.

    Parameters
    ----------
    found : ParameterLines
        With one material at least.
    """
    head = [
        "schema = 1",
        f"# From {found.source}. {nominal_words(found)}",
        "# The range in valid is not in that file: check it. No spread is stated there either.",
    ]
    if found.unread:
        head.append(f"# {len(found.unread)} statements or parts of them were not read.")
    return "\n".join([*head, *(line for m in found.materials for line in _table(m)), ""])


def nominal_words(found: ParameterLines) -> str:
    """Return the nominal temperature of the file, and where it comes from, as a sentence."""
    if found.tnom is None:
        return "Nominal temperature not known: lines without one of their own are not read."
    whence = "that of the form, assumed: the file states none" if found.tnom_assumed else "as the file states"
    return f"Nominal temperature {format_celsius(found.tnom)} where a line has none ({whence})."


def _table(material: Material) -> list[str]:
    law = material.law
    if not isinstance(law, Polynomial) or len(law.coefficients) != 2:
        raise InternalError(f"{material.name}: not a law of tc1 and tc2")
    low, high = (_celsius(end) for end in material.valid)
    size = [] if material.ohm_per_square is None else [f'ohm_per_square = "{material.ohm_per_square!r} ohm"']
    return [
        "",
        f"[material.{material.name}]",
        f"label = {_text(material.label)}",
        f"source = {_text(material.source)}",
        f'reference = "{_celsius(law.reference)}"',
        f'valid = ["{low}", "{high}"]',
        f'tc1 = "{_ppm(law.coefficients[0])} ppm/K"',
        f'tc2 = "{_ppm(law.coefficients[1])} ppm/K^2"',
        *size,
    ]


def _text(text: str) -> str:
    # a TOML string takes the escapes of JSON, as long as no mark is written as a pair of them
    return json.dumps(text, ensure_ascii=False)


def _celsius(kelvin: float) -> str:
    return f"{to_celsius(kelvin)!r} degC"


def _ppm(value: float) -> str:
    """Return a number times a million by its decimal point alone: reading it gives the same float."""
    moved = Decimal(repr(value)).scaleb(6).normalize()
    return format(moved, "f" if not moved or -9 <= moved.adjusted() <= 12 else "e")
