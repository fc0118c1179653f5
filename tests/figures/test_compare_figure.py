"""The figure of a comparison: its points, bars, curves and bands are those of the comparison."""

import numpy as np
import pytest
from makers import brief
from matplotlib.figure import Figure
from measured_composites import device_ohms, sweep_of

from tcplan.figures.compare import compare_figure_files, draw_compare
from tcplan.figures.style import figure_style
from tcplan.workflow.comparing import Asking, compare_plan
from tcplan.workflow.planning import make_plan

T = np.array([-40.0, -10.0, 25.0, 60.0, 110.0, 150.0]) + 273.15


@pytest.fixture(scope="module")
def case():
    plan = make_plan(brief())
    runs = [device_ohms(plan.best.network, plan.by_name, {("pp", "tc1"): s * 8e-6}, T) for s in range(12)]
    device = np.repeat(np.arange(12), len(T))
    names = tuple(f"<D{k}>" for k in range(12))
    sweep = sweep_of(np.tile(T, 12), np.concatenate(runs), 2.0, names=names, device=device)
    return plan, compare_plan(plan, sweep, Asking())


def test_points_bars_and_curves_are_those_of_the_comparison(case):
    plan, comparison = case
    with figure_style():
        ax = Figure().add_axes((0.1, 0.1, 0.6, 0.8))
        drawn = draw_compare(ax, plan, comparison)
    factor = 1e6 if "ppm" in ax.get_ylabel() else 1e2
    for one, points, curve in zip(comparison.devices, drawn.points, drawn.explained, strict=True):
        marks, _, (bars,) = points
        drift = np.array([point.drift for point in one.points])
        bar = 2.0 * np.array([point.uncertainty for point in one.points])
        assert marks.get_xdata() == pytest.approx(T - 273.15)
        assert marks.get_ydata() == pytest.approx(drift * factor)
        ends = np.array([segment[:, 1] for segment in bars.get_segments()])
        assert ends == pytest.approx(np.column_stack([drift - bar, drift + bar]) * factor, abs=1e-9)
        assert curve.get_ydata() == pytest.approx(np.array(one.curve) * factor)
    assert drawn.worst[0].get_ydata() == pytest.approx(np.array(comparison.curves.highest) * factor)
    assert drawn.worst[1].get_ydata() == pytest.approx(np.array(comparison.curves.lowest) * factor)
    assert drawn.likely is not None
    words = [text.get_text() for text in drawn.legend.get_texts()]
    assert "4 more devices" in words
    assert sum(word.startswith("<D") for word in words) == 8
    assert "predicted, nominal" in words


def test_files_are_the_same_every_time_and_escaped(case):
    plan, comparison = case
    first, second = (compare_figure_files(plan, comparison) for _ in range(2))
    assert first == second
    assert set(first) == {"compare.svg", "compare.png"}
    assert b"<desc>" in first["compare.svg"]
    assert first["compare.png"].startswith(b"\x89PNG")
