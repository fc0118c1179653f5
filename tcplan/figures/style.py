"""How all figures look: colours, markers, sizes, and text that fits.

The nine material colours were found by a search over a grid of sRGB, for the set whose least
distance is largest: in CIELAB the pairs, near black and the red of the limit included, are at
least 40 apart in normal sight and 17 apart in full protanopia, deuteranopia and tritanopia
(matrices of Machado, Oliveira and Fernandes, 2009). Every line colour has a contrast of 3:1 or more
on white (WCAG 2.1, success criterion 1.4.11). A material also has a marker of its own, and roles
differ in width and dash, so that a print in black and white can be read.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Literal, TypeAlias

import matplotlib
from matplotlib.font_manager import FontProperties
from matplotlib.textpath import text_to_path

Dash: TypeAlias = Literal["-"] | tuple[float, tuple[float, ...]]

MATERIAL_COLOURS = (
    "#336688",
    "#cc55bb",
    "#889900",
    "#442288",
    "#009988",
    "#771144",
    "#6688ff",
    "#aa8866",
    "#224400",
)
MARKERS = ("o", "s", "^", "D", "v", "P", "X", "<", "h")
DASHES: tuple[Dash, ...] = ("-", (0.0, (5.0, 1.5)), (0.0, (1.5, 1.5)))
CHOSEN = "#111111"
LIMIT = "#c01030"
LIMIT_FILL = "#f6dde1"
WORST = "#336688"
SPREAD_FILL = "#bacddbb3"  # clear enough for what lies below it
SPREAD_EDGE = "#8fa9bc"
SPREAD_LINE = "#557f9d"
OTHER = "#8c8c8c"
FAINT = "#d9d9d9"
OPTION = "#808080"
OPTION_DASHES: dict[str, Dash] = {
    "series": (0.0, (8.0, 2.0)),
    "parallel": (0.0, (3.0, 1.3)),
    "mixed": (0.0, (6.0, 1.3, 1.2, 1.3)),
    "given": (0.0, (1.2, 1.2)),
}
WORST_DASH: Dash = (0.0, (4.0, 2.0))
QUANTILE_DASH: Dash = (0.0, (1.5, 1.2))
LIMIT_DASHES: tuple[Dash, ...] = (
    (0.0, (7.0, 2.0, 1.5, 2.0)),
    (0.0, (7.0, 2.0, 1.5, 2.0, 1.5, 2.0)),
    (0.0, (2.5, 2.0)),
)

TEXT_SIZE = 8.0  # points; the figure goes on a page at its own size
SMALL_SIZE = 7.5
NAME_WIDTH = 112.0  # points that a name may take in a legend
DRIFT_INCHES = (7.2, 5.6)
PLANE_INCHES = (7.2, 4.5)
PNG_DPI = 160


@dataclass(frozen=True, slots=True, kw_only=True)
class Look:
    """Colour, marker and dash of one material, the same in all figures."""

    colour: str
    marker: str
    dash: Dash


@contextmanager
def figure_style() -> Iterator[None]:
    """Draw and save inside this: a reader's own matplotlib settings change nothing."""
    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(
            {
                "font.size": TEXT_SIZE,
                "axes.titlesize": TEXT_SIZE,
                "axes.titlelocation": "left",
                "axes.titley": 1.0,  # fixed: finding a free place measures every label twice
                "axes.linewidth": 0.6,
                "axes.axisbelow": True,
                "text.parse_math": False,
                # Paths look the same on every machine; as text the labels would take the width of
                # whatever font the reader has, and no longer fit where they were placed.
                "svg.fonttype": "path",
                "svg.hashsalt": "tcplan",
            }
        )
        yield


def looks(names: Sequence[str], first: Sequence[str]) -> dict[str, Look]:
    """Return the look of the materials that get one: those of ``first``, then the rest in order."""
    order = dict.fromkeys((*first, *names))
    coloured = [name for name, _ in zip(order, MATERIAL_COLOURS, strict=False)]
    return {
        name: Look(colour=MATERIAL_COLOURS[n], marker=MARKERS[n], dash=DASHES[n % len(DASHES)])
        for n, name in enumerate(coloured)
    }


def text_width(text: str, size: float = TEXT_SIZE) -> float:
    """Return the width [points] of text set at a size [points]."""
    width, _, _ = text_to_path.get_text_width_height_descent(text, FontProperties(size=size), False)
    return float(width)


def shortened(text: str, width: float, size: float = TEXT_SIZE, head: float = 0.5) -> str:
    """Return text that is no wider than ``width`` [points], cut in the middle with an ellipsis.

    Parameters
    ----------
    text : str
    width, size : float
        [points]
    head : float
        The part of what is kept that comes from the beginning.
    """
    whole = text_width(text, size)
    # A first guess from the mean width of a letter; measuring is slow.
    kept, short = min(len(text), int(1.1 * len(text) * width / max(whole, width)) + 1), text
    while whole > width and kept > 1:
        front = min(kept, max(1, math.ceil(kept * head)))
        short = f"{text[:front]}\N{HORIZONTAL ELLIPSIS}{text[len(text) - kept + front :]}"
        whole = text_width(short, size)
        kept -= 1
    return short


def short_names(names: Sequence[str], width: float = NAME_WIDTH, size: float = TEXT_SIZE) -> dict[str, str]:
    """Return each name cut to ``width`` [points], at a place that keeps the names apart if there is one."""
    best: dict[str, str] = {}
    for head in (0.5, 0.25, 0.75):
        trial = {name: shortened(name, width, size, head) for name in names}
        if len(set(trial.values())) > len(set(best.values())):
            best = trial
        if len(set(best.values())) == len(names):
            break
    return best


def percent_text(fraction: float) -> str:
    """Return a fraction in percent, with all digits that it was stated with."""
    return f"{100.0 * fraction:.10g} %"


def number_text(number: float) -> str:
    """Return a number for a label: 6 digits, thousands apart from 10 000, a real minus sign."""
    form = ",.0f" if abs(number) >= 1e5 else ",.6g" if abs(number) >= 1e4 else ".6g"
    return f"{number:{form}}".replace(",", "\N{NO-BREAK SPACE}").replace("-", "\N{MINUS SIGN}")
