"""The shape of a measurement file: its tables and keys. Values are read and checked elsewhere."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from tcplan.errors import Problem
from tcplan.toml_input import shape_problems

MOST_SWEEPS = 50
MOST_LINES = 1000


class _Shape(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, defer_build=True)


def _text(example: str) -> Any:
    return Field(default=None, examples=[f'"{example}"'])


class _SweepShape(_Shape):
    file: str = Field(examples=['"red_film.csv"'])
    source: str = Field(examples=['"chamber run 12"'])
    label: str | None = _text("Red film, 320 ohm per square")
    model: Literal["polynomial", "platinum", "thermistor", "steinhart-hart"] | None = None
    law: str | None = _text("exp(B*(1/T - 1/T0))")
    start: dict[str, float] | None = None
    order: Annotated[int, Field(ge=1, le=3)] | None = None
    reference: str | None = _text("25 degC")
    squares: Annotated[float, Field(gt=0)] | None = None
    length: str | None = _text("1.2 m")
    exclude: Annotated[list[int], Field(max_length=MOST_LINES)] | None = None


class _ErrorsShape(_Shape):
    chamber_offset: str | None = _text("0.15 K")
    chamber_scale: str | None = _text("0.1 %")
    lead: str | None = _text("20 mohm")
    lead_tc1: str | None = _text("3900 ppm/K")
    meter_scale: str | None = _text("50 ppm")


class _SpreadShape(_Shape):
    meaning: Literal["limits", "sigma"] | None = None
    coverage: str | None = _text("99.73 %")
    confidence: str | None = _text("95 %")


class _RequestShape(_Shape):
    version: Annotated[int, Field(ge=1, le=1)] = Field(alias="schema", examples=["1"])
    sweep: Annotated[dict[str, _SweepShape], Field(min_length=1, max_length=MOST_SWEEPS)]
    same_devices: bool | None = None
    errors: _ErrorsShape | None = None
    spread: _SpreadShape | None = None


def shape_mistakes(data: Mapping[str, Any], where: str) -> tuple[Problem, ...]:
    """Return what is wrong with the tables and keys of a measurement file, in our words."""
    try:
        _RequestShape.model_validate(data)
    except ValidationError as error:
        return shape_problems(error.errors(include_url=False), _RequestShape, where)
    return ()
