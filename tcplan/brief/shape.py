"""The shape of a brief: its tables and keys. Values are read and checked elsewhere."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from tcplan.errors import Problem
from tcplan.material.files import process_mistakes, process_tables
from tcplan.toml_input import shape_problems

MOST_ROWS = 200
MOST_ALLOWANCES = 50
MOST_VALUES = 16


class _Shape(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, defer_build=True)


def _text(example: str) -> Any:
    return Field(default=None, examples=[f'"{example}"'])


_Triple = Annotated[list[str], Field(min_length=3, max_length=3)]
_Pair = Annotated[list[str], Field(min_length=2, max_length=2)]


class _ResistorShape(_Shape):
    value: str | Annotated[list[str], Field(min_length=1, max_length=MOST_VALUES)] | None = _text("18 kohm")
    at_most: str | None = _text("3 kohm")
    tolerance: str | None = _text("1 %")
    trim_step: str | None = _text("0.1 %")


class _TemperatureShape(_Shape):
    range: str | None = _text("automotive-1")
    low: str | None = _text("-40 degC")
    high: str | None = _text("125 degC")
    rise: str | None = _text("10 K")
    reference: str | None = _text("25 degC")


class _GoalShape(_Shape):
    drift: str | None = _text("6000 ppm")
    band: str | None = _text("8000 ppm")
    chord_tcr: str | None = _text("25 ppm/K")
    box_tcr: str | None = _text("25 ppm/K")
    mask: Annotated[list[_Triple], Field(min_length=1, max_length=MOST_ROWS)] | None = None
    judge: Literal["nominal", "worst-case", "quantile"] | None = None
    quantile: Annotated[float, Field(ge=0.5, le=0.999999)] | None = None
    tc1: str | None = _text("3000 ppm/K")
    tc2: str | None = _text("0.5 ppm/K^2")
    law: str | None = _text("exp(a*(T - T0))")
    law_parameters: dict[str, float] | None = None
    table: Annotated[list[_Pair], Field(min_length=3, max_length=MOST_ROWS)] | None = None


class _SearchShape(_Shape):
    arrangements: Annotated[list[str], Field(min_length=1, max_length=4)] | None = None
    use: Annotated[list[str], Field(min_length=1)] | None = None
    max_materials: Annotated[int, Field(ge=1, le=12)] | None = None
    max_legs: Annotated[int, Field(ge=1, le=12)] | None = None
    min_share: str | None = _text("3 %")
    min_squares: Annotated[float, Field(gt=0, le=1e6)] | None = None
    max_squares: Annotated[float, Field(gt=0, le=1e9)] | None = None
    min_length: str | None = _text("20 mm")
    stock_values: _Pair | None = Field(default=None, examples=['["1 ohm", "10 Mohm"]'])
    max_area: str | None = _text("0.02 mm^2")


class _FixedShape(_Shape):
    material: str
    value: str = Field(examples=['"412 ohm"'])
    place: Literal["series", "parallel"] | None = None


class _GivenShape(_Shape):
    network: str = Field(examples=['"film_a 12 kohm + (film_b 4k7 || film_c 3k3)"'])
    scaled: bool | None = None


class _RatioShape(_Shape):
    kind: Literal["divider", "gain"]
    first: str = Field(examples=['"film_a 9 kohm"'])
    second: str = Field(examples=['"film_a 1 kohm"'])
    tracking: str | None = _text("3 ppm/K")


class _TrimShape(_Shape):
    method: Literal["one-temperature", "two-temperatures", "cut"]
    step: str | None = _text("0.05 %")
    switch_resistance: str | None = _text("150 ohm")
    switch_tc1: str | None = _text("3500 ppm/K")
    temperatures: _Pair | None = Field(default=None, examples=['["25 degC", "125 degC"]'])
    largest_cut: str | None = _text("30 %")


class _OperatingShape(_Shape):
    voltage: str | None = _text("5 V")
    current: str | None = _text("2 mA")
    thermal_resistance: str | None = _text("150 K/W")
    leg_thermal_resistance: dict[str, str] | None = None


class _AllowanceShape(_Shape):
    name: str = Field(examples=['"ageing"'])
    size: str = Field(examples=['"200 ppm"'])
    sides: Literal["both", "up", "down"] | None = None
    kind: Literal["systematic", "random"]
    source: str = Field(examples=['"life test report, 1000 h"'])


class _BriefShape(_Shape):
    version: Annotated[int, Field(ge=1, le=1)] = Field(alias="schema", examples=["1"])
    title: str = Field(examples=['"Span resistor"'])
    materials: list[str] | None = None
    material: dict[str, Any] | None = None
    resistor: _ResistorShape | None = None
    temperature: _TemperatureShape
    goal: _GoalShape | None = None
    search: _SearchShape | None = None
    fixed: Annotated[list[_FixedShape], Field(max_length=16)] | None = None
    given: _GivenShape | None = None
    ratio: _RatioShape | None = None
    trim: _TrimShape | None = None
    operating: _OperatingShape | None = None
    allowance: Annotated[list[_AllowanceShape], Field(max_length=MOST_ALLOWANCES)] | None = None
    # What the materials share has one shape here and in materials files: `process_mistakes` checks it.
    correlation: Any = None
    tracking: Any = None
    corner: Any = None


def shape_mistakes(data: Mapping[str, Any], where: str) -> tuple[Problem, ...]:
    """Return what is wrong with the tables and keys of a brief, in our words."""
    shared = process_mistakes(process_tables(data), where)
    try:
        _BriefShape.model_validate(data)
    except ValidationError as error:
        return (*shape_problems(error.errors(include_url=False), _BriefShape, where), *shared)
    return shared
