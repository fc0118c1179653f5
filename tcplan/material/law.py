"""Laws of resistance against temperature, R(T)/R(reference): the one place to import them from."""

from __future__ import annotations

from tcplan.material.law_base import Law, temperature_symbol
from tcplan.material.law_check import check_positive
from tcplan.material.law_expression import Expression
from tcplan.material.law_parameters import LAW_KINDS, law_from_parameters
from tcplan.material.law_table import Table
from tcplan.material.law_words import law_latex, law_text
from tcplan.material.laws_physical import Platinum, SteinhartHart, Thermistor, steinhart_hart_from_points
from tcplan.material.polynomial import Polynomial, chord_tcr, from_chords, from_peak

__all__ = [
    "LAW_KINDS",
    "Expression",
    "Law",
    "Platinum",
    "Polynomial",
    "SteinhartHart",
    "Table",
    "Thermistor",
    "check_positive",
    "chord_tcr",
    "from_chords",
    "from_peak",
    "law_from_parameters",
    "law_latex",
    "law_text",
    "steinhart_hart_from_points",
    "temperature_symbol",
]
