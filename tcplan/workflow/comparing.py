"""Measured devices beside their plan: plan, option and sweep to a comparison and its files."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path

from tcplan.arrays import FloatArray
from tcplan.budget import Case
from tcplan.budget.contributions import class_extremes
from tcplan.budget.rebuilt import Asked, asked_of
from tcplan.goal import requirement
from tcplan.measure.compare import compare
from tcplan.measure.comparison import Comparison, Expected
from tcplan.measure.model import CommonErrors, Sweep
from tcplan.network import legs, used_materials
from tcplan.output import check_folder, write_files
from tcplan.parts.network import made_process
from tcplan.plan import Option, Plan
from tcplan.process import Process
from tcplan.workflow.as_made import assembly_of, parts_of, plan_as_made
from tcplan.workflow.options import given_positions, option_of

COMPARE_FILES = ("compare.json", "compare.svg", "compare.png")
ONE_BY_ONE = 120
"""Temperatures of a mixed network at which the band is searched; of more its quick bound is taken."""

NEAR = 1e-9  # relative; one value and the same

_NO_COMMON_ERRORS = CommonErrors()


@dataclass(frozen=True, slots=True, kw_only=True)
class Asking:
    """What to compare with: an option by its id, or what the parts of the plan make.

    ``drift_only`` says that R at the reference tells nothing of the materials, as after a trim.
    """

    option: str | None = None
    as_made: bool = False
    drift_only: bool = False


def compare_plan(
    plan: Plan, sweep: Sweep, asking: Asking, common: CommonErrors = _NO_COMMON_ERRORS
) -> Comparison:
    """Return what a sweep says of an option of a plan.

    Parameters
    ----------
    plan : Plan
    sweep : Sweep
        Of one or several devices.
    asking : Asking
        Which option; the chosen one, or the first value that is made, when none is named.
    common : CommonErrors
        Standard uncertainties of what is common to the sweep.

    Raises
    ------
    InputError
        For an unknown option, a plan without parts, or a sweep that cannot be compared.
    """
    return compare(sweep, expected_of(plan, asking), common)


def expected_of(plan: Plan, asking: Asking) -> Expected:
    """Return what a plan says of an option, or of what its parts make."""
    asked = asked_of(plan)
    if asking.as_made:
        return _of_made(plan, asked, asking)
    option = option_of(plan, asking.option)
    own = legs(option.network)
    return _expected(
        plan,
        asked,
        option,
        asked.process,
        asking,
        tuple(range(len(own))),
        given_positions(asked, option.network),
    )


def _of_made(plan: Plan, asked: Asked, asking: Asking) -> Expected:
    made_plan = plan_as_made(plan)
    option = option_of(made_plan, asking.option)
    made = next(one for one in parts_of(plan).made if one.option.id == option.id)
    ideal, assembly = option_of(plan, parts_of(plan).option), assembly_of(plan, made)
    order = [leg.id for leg in made.legs]
    changed = tuple(order.index(element.leg) for element in assembly.elements)
    process = made_process(asked.process, assembly)
    return _expected(
        made_plan, asked, option, process, asking, changed, given_positions(asked, ideal.network)
    )


def _expected(
    plan: Plan,
    asked: Asked,
    option: Option,
    process: Process,
    asking: Asking,
    changed: tuple[int, ...],
    fixed: frozenset[int],
) -> Expected:
    over, materials = asked.over, plan.by_name
    names = used_materials(option.network)
    drawn = {name: materials[name].drawn_spread(over.low, over.high) for name in names}
    return Expected(
        name=option.id,
        network=option.network,
        materials=materials,
        spreads={name: spread for name, spread in drawn.items() if spread is not None},
        need=requirement(asked.goal, over),
        over=over,
        band=_band(plan, asked, option, process),
        process=process,
        tolerance=asked.tolerance,
        quantile=plan.limit.quantile,
        changed=changed,
        fixed=fixed,
        level_known=not (asking.drift_only or asked.trim is not None),
        seed=option.likely.seed if option.likely is not None else 1,
    )


def _band(
    plan: Plan, asked: Asked, option: Option, process: Process
) -> Callable[[FloatArray], tuple[FloatArray, FloatArray]]:
    """Return T to the lowest and highest drift over the spread, as the budget has them."""
    case = Case(
        materials=plan.by_name,
        over=asked.over,
        need=requirement(asked.goal, asked.over),
        process=process,
    )
    box = case.box(option.network)

    def band(T: FloatArray) -> tuple[FloatArray, FloatArray]:
        up, down = class_extremes(box, T, exact=len(T) <= ONE_BY_ONE)
        return down[-1], up[-1]

    return band


# --- files ----------------------------------------------------------------------------------------------


def check_compare_out(folder: Path, *, force: bool) -> None:
    """Refuse a folder that the files of a comparison cannot go into."""
    check_folder(folder, COMPARE_FILES, force=force)


def write_comparison(
    plan: Plan, comparison: Comparison, asking: Asking, folder: Path, *, force: bool = False
) -> tuple[Path, ...]:
    """Write compare.json and the figure of a comparison, all of them or none.

    Parameters
    ----------
    plan : Plan
        That the comparison was made with.
    comparison : Comparison
    asking : Asking
    folder : Path
        Made when it does not exist.
    force : bool
        Whether files that exist may be replaced.

    Returns
    -------
    tuple of Path

    Raises
    ------
    OutputError
        When a file is in the way or cannot be written.
    """
    from tcplan.figures.compare import compare_figure_files
    from tcplan.spec.compare_data import comparison_data

    shown_plan = plan_as_made(plan) if asking.as_made else plan
    data = comparison_data(shown_plan, comparison)
    text = json.dumps(data, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
    figures = compare_figure_files(replace(shown_plan, chosen=comparison.name), comparison)
    contents = {"compare.json": text.encode(), **figures}
    return write_files(folder, {name: contents[name] for name in COMPARE_FILES}, force=force)
