"""The operating point: voltages, powers and temperatures of every leaf of a network under power."""

from tcplan.operating.elements import Element, plain_elements
from tcplan.operating.loads import LegLoad, worst_by_leg
from tcplan.operating.point import OperatingPoint, operating_point

__all__ = [
    "Element",
    "LegLoad",
    "OperatingPoint",
    "operating_point",
    "plain_elements",
    "worst_by_leg",
]
