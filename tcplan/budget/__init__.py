"""The budget of a checked option: everything that moves its value, against the limit."""

from tcplan.budget.account import budget
from tcplan.budget.case import Case
from tcplan.budget.model import (
    Account,
    AtReference,
    Budget,
    Contribution,
    Draws,
    Knowledge,
    LotFigures,
    Nature,
    Sensitivity,
    TotalError,
)

__all__ = [
    "Account",
    "AtReference",
    "Budget",
    "Case",
    "Contribution",
    "Draws",
    "Knowledge",
    "LotFigures",
    "Nature",
    "Sensitivity",
    "TotalError",
    "budget",
]
