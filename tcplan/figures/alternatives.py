"""The best option of each arrangement beside the chosen one: which they are, and their lines."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from tcplan.arrays import FloatArray
from tcplan.figures.limits import FITS, Unit
from tcplan.figures.style import NAME_WIDTH, OPTION, OPTION_DASHES, SMALL_SIZE, shortened, text_width
from tcplan.plan import Option, Plan

APART = 0.04  # of the height of a panel: what is nearer than this lies under the thick line


def best_of_each(plan: Plan) -> dict[str, Option]:
    """Return the best series, parallel, mixed and given option, as far as there are, by kind.

    The chosen one is left out, and so are single materials, which are drawn as such.
    """
    first: dict[str, Option] = {}
    for option in plan.options:  # best first
        first.setdefault("given" if option.role == "given" else option.arrangement, option)
    return {kind: first[kind] for kind in OPTION_DASHES if kind in first and first[kind].id != plan.chosen}


def draw_alternatives(
    ax: Axes, options: Mapping[str, Option], degC: FloatArray, drifts: Mapping[str, FloatArray], unit: Unit
) -> dict[str, Line2D]:
    """Draw the drift of options by kind, each kind with a dash of its own."""
    lines: dict[str, Line2D] = {}
    for kind, drift in drifts.items():
        (lines[kind],) = ax.plot(degC, drift * unit.factor, color=OPTION, lw=1.1, zorder=5.5)
        lines[kind].set(linestyle=OPTION_DASHES[kind], label=_words(kind, options[kind].id))
    return lines


def worth_enlarging(
    drifts: Mapping[str, FloatArray], own: FloatArray, seen: tuple[float, float], view: tuple[float, float]
) -> dict[str, FloatArray]:
    """Return the drifts to draw once more, at the scale of the chosen option.

    Parameters
    ----------
    drifts : mapping of kind to array
    own : array
        The drift of the chosen option.
    seen : (float, float)
        The lowest and the highest drift of the panel of all: what is apart there needs no more.
    view : (float, float)
        The same of the panel of the chosen option: what is neither in it, nor at most ``FITS``
        times as large as the chosen option, would flatten it.
    """
    least, most = APART * (seen[1] - seen[0]), FITS * np.max(np.abs(own))
    return {
        kind: drift
        for kind, drift in drifts.items()
        if np.max(np.abs(drift - own)) < least
        and (np.max(np.abs(drift)) <= most or (view[0] <= np.min(drift) and np.max(drift) <= view[1]))
    }


def _words(kind: str, name: str) -> str:
    """Return what the legend says of an option, such as ``best parallel: parallel-1``."""
    start = "" if kind == name else f"{kind}: " if kind == "given" else f"best {kind}: "
    return start + shortened(name, NAME_WIDTH - text_width(start, SMALL_SIZE), SMALL_SIZE)
