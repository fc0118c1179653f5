"""Parts: an option turned into things that can be drawn, wound or bought, and the network that they make."""

from tcplan.made import FilmLeg, FilmUnit, MadeLeg, PlainLeg, Refusal, StockLeg, WireLeg
from tcplan.parts.network import Assembly, assembled, ends_material, ends_name

__all__ = [
    "Assembly",
    "FilmLeg",
    "FilmUnit",
    "MadeLeg",
    "PlainLeg",
    "Refusal",
    "StockLeg",
    "WireLeg",
    "assembled",
    "ends_material",
    "ends_name",
]
