"""Trim: what sets the value of a part after it is made, and what that does to its drift."""

from tcplan.parts.trim.drawing import Drawn
from tcplan.parts.trim.model import Cut, Reached, Row, Stat, Swing, TrimPlan
from tcplan.parts.trim.planning import trim_plan
from tcplan.parts.trim.table import bits_csv, codes_csv

__all__ = [
    "Cut",
    "Drawn",
    "Reached",
    "Row",
    "Stat",
    "Swing",
    "TrimPlan",
    "bits_csv",
    "codes_csv",
    "trim_plan",
]
