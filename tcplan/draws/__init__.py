"""Draws: what is likely of a network over the spread of its materials, lot by lot and unit by unit."""

from tcplan.draws.face import Drawn, check_draws, draw, draw_curves, draw_until
from tcplan.draws.mismatch import DrawnUnits, draw_units

__all__ = ["Drawn", "DrawnUnits", "check_draws", "draw", "draw_curves", "draw_units", "draw_until"]
