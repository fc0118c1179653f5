"""Parts: an option turned into things that can be drawn, wound or bought, and the network that they make."""

from tcplan.made import FilmLeg, FilmUnit, Made, MadeLeg, PlainLeg, Refusal, StockLeg, WireLeg
from tcplan.parts.network import ends_material, ends_name, made_network

__all__ = [
    "FilmLeg",
    "FilmUnit",
    "Made",
    "MadeLeg",
    "PlainLeg",
    "Refusal",
    "StockLeg",
    "WireLeg",
    "ends_material",
    "ends_name",
    "made_network",
]
