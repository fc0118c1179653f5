"""The brief: a file that says what is wanted, read whole and checked before anything is done."""

from tcplan.brief.model import Allowance, Brief, Fixed, Ratio, SearchRules, Target
from tcplan.brief.reading import parse_brief, read_brief

__all__ = ["Allowance", "Brief", "Fixed", "Ratio", "SearchRules", "Target", "parse_brief", "read_brief"]
