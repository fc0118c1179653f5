"""What a budget holds, as plain frozen records; the names carry the units."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

from tcplan.draws import Drawn, DrawnUnits
from tcplan.plan import RangeRecord, Verdict
from tcplan.ranges import TemperatureRange

Nature: TypeAlias = Literal["nominal", "spread", "estimate", "systematic", "random"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Contribution:
    """One row: what it adds to the highest and to the lowest drift, each where that side peaks [ppm].

    Both are signed, and None when not known; ``note`` then says what is missing, else where the figure
    comes from. ``most_ppm`` is its largest magnitude anywhere in the range. A random row is at 3 sigma.
    """

    name: str
    kind: Nature
    up_ppm: float | None
    down_ppm: float | None
    most_ppm: float | None
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class AtReference:
    """How far the value can be off at the reference temperature, each side [ppm], and why."""

    up_ppm: float
    down_ppm: float
    source: Literal["value spread", "tolerance", "trim step"]


@dataclass(frozen=True, slots=True, kw_only=True)
class TotalError:
    """The error of the value with its drift, the worst of each side over the range [ppm]."""

    up_ppm: float
    down_ppm: float
    at_up_degC: float
    at_down_degC: float
    reference: AtReference


@dataclass(frozen=True, slots=True, kw_only=True)
class Sensitivity:
    """What the nominal judged figure gains when one parameter of one material moves a step, each way.

    The step is 1 % of a value, 10 ppm/K of TC1 and 0.1 ppm/K^2 of TC2. Where several temperatures share
    the peak, the two ways need not be opposite.
    """

    material: str
    parameter: Literal["value", "tc1", "tc2"]
    step: str
    more_ppm: float
    less_ppm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Knowledge:
    """What the spread of the laws alone leaves of any network, and what would have to be known better.

    ``tc1_now_ppm_per_K`` and ``tc1_needed_ppm_per_K`` are half-widths, as limits, of the TC1 of
    ``material``; the second is None when its TC1 alone cannot do it. ``material`` is empty when the
    floor is within the limit, or there is no limit.
    """

    floor_ppm: float
    at_degC: float
    material: str = ""
    tc1_now_ppm_per_K: float | None = None
    tc1_needed_ppm_per_K: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Budget:
    """The budget of one option over one range.

    Figures are on the scale of the limit: a drift at a temperature where the limit is wider counts for
    less. ``total_up_ppm`` and ``total_down_ppm`` are signed; ``peak_ppm`` is what the limit is set against.
    ``random_up_ppm`` and ``random_down_ppm`` are the random rows together, in root-sum-square.
    """

    option: str
    network: str
    range: RangeRecord
    limit_kind: str
    rows: tuple[Contribution, ...]
    random_up_ppm: float
    random_down_ppm: float
    total_up_ppm: float
    total_down_ppm: float
    at_up_degC: float
    at_down_degC: float
    peak_ppm: float
    limit_ppm: float | None
    verdict: Verdict
    nominal_ppm: float
    worst_case_ppm: float
    worst_case_bound_ppm: float
    worst_case_at_degC: float
    total_error: TotalError | None
    sensitivities: tuple[Sensitivity, ...]
    knowledge: Knowledge | None
    without_spread: tuple[str, ...]
    notes: tuple[str, ...] = ()

    @property
    def at_degC(self) -> float:  # noqa: N802 - a value that is not SI wears its unit
        """Where the larger of the two totals is reached."""
        return self.at_up_degC if self.total_up_ppm >= -self.total_down_ppm else self.at_down_degC

    @property
    def margin_ppm(self) -> float | None:
        """The limit less the total, negative when it is passed; None without a limit."""
        return None if self.limit_ppm is None else self.limit_ppm - self.peak_ppm


@dataclass(frozen=True, slots=True, kw_only=True)
class Draws:
    """How many lots to draw, from which seed; with a precision, until the interval is so narrow.

    ``precision`` is the width of the interval of the quantile over the quantile, a fraction.
    """

    count: int = 20_000
    seed: int = 1
    precision: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class LotFigures:
    """What the draws found; ``units`` is None without a limit, or when no mismatch is known."""

    drawn: Drawn
    units: DrawnUnits | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Account:
    """One option over one range: its budget, or why the data do not cover the range.

    ``before`` is the budget with the plan's own data, when new ones were given; ``lots`` what the draws
    found, when they were asked for and every material states a spread; ``changed`` says what the new data
    change in the drawn legs.
    """

    option: str
    over: TemperatureRange
    budget: Budget | None
    before: Budget | None = None
    lots: LotFigures | None = None
    not_covered: str = ""
    changed: tuple[str, ...] = ()
