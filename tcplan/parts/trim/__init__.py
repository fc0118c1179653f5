"""Trim: what sets the value of a part after it is made, and what that does to its drift."""

from tcplan.parts.trim.model import Cut, Reached, Row, Stat, Swing, TrimPlan
from tcplan.parts.trim.planning import trim_plan
from tcplan.parts.trim.table import codes_csv

__all__ = ["Cut", "Reached", "Row", "Stat", "Swing", "TrimPlan", "codes_csv", "trim_plan"]
