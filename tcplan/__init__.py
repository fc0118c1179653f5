"""tcplan: a temperature-coefficient compensation planner for near-zero-drift composite resistors.

The public names are listed in ``__all__``; each loads its module only when it is first used.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

__version__ = "0.1.0"

_HOMES = {
    "TcplanError": "errors",
    "InputError": "errors",
    "NoAnswer": "errors",
    "Problem": "errors",
    "TemperatureRange": "ranges",
    "named_range": "ranges",
    "temperature_range": "ranges",
    "parse_quantity": "units",
    "Material": "material.model",
    "Spread": "material.spread",
    "Polynomial": "material.law",
    "read_materials": "material.files",
    "published": "material.files",
    "Leg": "network",
    "Series": "network",
    "Parallel": "network",
    "network_text": "network",
    "parse_network": "network_reading",
    "Goal": "goal",
    "Limit": "goal",
    "Brief": "brief",
    "read_brief": "brief",
    "Plan": "plan",
    "Option": "plan",
    "read_plan": "plan_file",
    "plan_json": "plan",
    "make_plan": "workflow.planning",
    "write_plan": "workflow.delivery",
}

__all__ = ["__version__", *_HOMES]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'tcplan' has no attribute {name!r}")
    value = getattr(import_module(f"tcplan.{_HOMES[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)
