"""The TC1-TC2 figure: points, hull and contours against plain recomputation; names that do not collide."""

import itertools

import numpy as np
import pytest
from makers import SIX_FILMS, brief
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.text import Text
from scipy.spatial import ConvexHull

from tcplan.figures.contours import PeakDrift, convex_hull, round_levels
from tcplan.figures.files import slope_curvature_figure
from tcplan.figures.slope_curvature import draw_slope_curvature, is_crowded
from tcplan.figures.style import figure_style
from tcplan.plan import Plan
from tcplan.workflow.planning import make_plan

SIX = tuple(film[:3] for film in SIX_FILMS)
THREE = (("up", 300.0, 0.5), ("down", -280.0, 0.6), ("bent", 20.0, -0.4))
PEAK = PeakDrift(cold=-65.0, hot=125.0)


def plan_of(films=SIX, goal='drift = "6000 ppm"', own="25 degC", low="-40 degC") -> Plan:
    text = 'schema = 1\ntitle = "t"\n[resistor]\nvalue = "18 kohm"\n'
    text += f'[temperature]\nlow = "{low}"\nhigh = "150 degC"\n[goal]\n{goal}\n'
    for name, tc1, tc2 in films:
        text += (
            f'[material.{name}]\nsource = "invented"\nreference = "{own}"\nvalid = ["-60 degC", "160 degC"]\n'
            f'tc1 = "{tc1} ppm/K"\ntc2 = "{tc2} ppm/K^2"\nohm_per_square = "100 ohm"\n'
        )
    return make_plan(brief(text))


def drawn(plan):
    figure = Figure(figsize=(7.2, 4.5))
    FigureCanvasAgg(figure)
    ax = figure.add_axes((0.115, 0.285, 0.38 if is_crowded(plan) else 0.865, 0.66))
    with figure_style():
        artists = draw_slope_curvature(ax, plan)
    return ax, artists


def planes(artists):
    return [plane for plane in (artists.whole, artists.near) if plane is not None]


def at(line):
    return float(line.get_xdata()[0]), float(line.get_ydata()[0])


def brute_peak(tc1, tc2, cold=-65.0, hot=125.0):
    x = np.linspace(cold, hot, 19001)
    return float(np.max(np.abs(tc1 * x + tc2 * x**2)))


# --- points -----------------------------------------------------------------------------------


def test_every_material_is_a_point_with_its_name() -> None:
    _, artists = drawn(plan_of())
    for name, tc1, tc2 in SIX:
        assert at(artists.whole.materials[name]) == pytest.approx((tc1, tc2), rel=1e-9)
    named = {text.get_text() for plane in planes(artists) for text in plane.names}
    assert {name for name, *_ in SIX} <= named


def test_coefficients_are_those_at_the_reference_of_the_brief() -> None:
    # R/R(25) = law(T)/law(25) about 25 degC, for a quadratic law about 60 degC: by expansion.
    _, artists = drawn(plan_of(THREE, own="60 degC"))
    for name, tc1, tc2 in THREE:
        a, b, d = tc1 * 1e-6, tc2 * 1e-6, 25.0 - 60.0
        at_25 = 1 + a * d + b * d**2
        expected = ((a + 2 * b * d) / at_25 * 1e6, b / at_25 * 1e6)
        assert at(artists.whole.materials[name]) == pytest.approx(expected, rel=1e-9)


def test_every_option_is_drawn_and_the_chosen_one_alone_is_filled() -> None:
    plan = plan_of()
    _, artists = drawn(plan)
    found = {}
    for plane in planes(artists):
        found |= plane.options
    assert set(found) == {option.id for option in plan.options}
    for option in plan.options:
        expected = option.nominal.tc1_ppm_per_K, option.nominal.tc2_ppm_per_K2
        assert at(found[option.id]) == pytest.approx(expected)
        assert (found[option.id].get_markerfacecolor() != "none") == (option.id == plan.chosen)
    marker = {option.arrangement: found[option.id].get_marker() for option in plan.options}
    assert len(set(marker.values())) == len(marker) >= 3


def test_the_hull_holds_every_series_option_and_its_corners_are_materials() -> None:
    plan = plan_of()
    _, artists = drawn(plan)
    corners = artists.whole.hull.get_xy()
    points = {(tc1, tc2) for _, tc1, tc2 in SIX}
    assert all(min(np.hypot(*np.subtract(c, p)) for p in points) < 1e-6 for c in corners.tolist())
    outside = artists.whole.hull.get_path()
    for option in plan.options:
        if option.arrangement == "series":
            point = (option.nominal.tc1_ppm_per_K, option.nominal.tc2_ppm_per_K2)
            assert outside.contains_point(point, radius=1e-6) or outside.contains_point(point, radius=-1e-6)


def test_the_target_is_the_origin_or_the_wanted_coefficients() -> None:
    _, flat = drawn(plan_of(THREE))
    assert [at(plane.target) for plane in planes(flat) if plane.target] == [(0.0, 0.0)]
    wanted = 'tc1 = "250 ppm/K"\ntc2 = "0.5 ppm/K^2"'
    _, bent = drawn(plan_of(THREE, goal=wanted))
    assert [at(plane.target) for plane in planes(bent) if plane.target] == [pytest.approx((250.0, 0.5))]
    assert any("250 ppm/K" in text.get_text() for text in bent.legend.get_texts())
    plane = planes(bent)[-1]
    for level, line in plane.contours.items():
        tc1, tc2 = line.get_xdata()[100], line.get_ydata()[100]
        assert brute_peak(tc1 - 250.0, tc2 - 0.5) == pytest.approx(level, rel=1e-5)


# --- contours ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("tc1", "tc2", "peak"),
    [
        (100.0, 0.0, 12_500.0),  # the hot end: 100 * 125
        (100.0, -1.0, 10_725.0),  # the cold end: -6500 - 4225
        (100.0, -0.5, 8_612.5),  # the cold end: -6500 - 2112.5; the vertex at 100 K has 5000
        (125.0, -1.0, 12_350.0),  # the cold end: -8125 - 4225
        (0.0, 0.0, 0.0),
    ],
)
def test_peak_of_a_quadratic_by_hand(tc1: float, tc2: float, peak: float) -> None:
    assert float(PEAK.of(np.array(tc1), np.array(tc2))) == pytest.approx(peak, rel=1e-12)


def test_the_vertex_counts_when_it_is_inside() -> None:
    # By hand: 100 x - 1 x^2 over 0..100 has its vertex at 50, 2500, and 0 at both ends.
    warm = PeakDrift(cold=0.0, hot=100.0)
    assert float(warm.of(np.array(100.0), np.array(-1.0))) == pytest.approx(2500.0, rel=1e-12)


def test_peak_agrees_with_a_fine_grid() -> None:
    rng = np.random.default_rng(5)
    for tc1, tc2 in zip(rng.uniform(-200, 200, 100), rng.uniform(-2, 2, 100), strict=True):
        assert float(PEAK.of(tc1, tc2)) == pytest.approx(brute_peak(tc1, tc2), rel=1e-6)


@pytest.mark.parametrize("films", [SIX, THREE], ids=["six", "three"])
def test_every_point_of_a_contour_has_the_peak_drift_of_its_label(films: tuple) -> None:
    _, artists = drawn(plan_of(films))
    for plane in planes(artists):
        assert plane.contours
        labels = [text.get_text().replace("\N{NO-BREAK SPACE}", "") for text in plane.contour_labels]
        assert labels == [f"{level:g} ppm" for level in plane.contours]
        for level, line in plane.contours.items():
            assert f"{level:e}"[0] in "125"
            points = np.array(line.get_xydata())[::40]
            peaks = [brute_peak(*point) for point in points]
            np.testing.assert_allclose(peaks, level, rtol=1e-5)


def test_levels_are_one_two_five_below_the_largest() -> None:
    assert round_levels(12_000.0, 4) == (10_000.0, 5_000.0, 2_000.0, 1_000.0)
    assert round_levels(0.3, 2) == pytest.approx((0.2, 0.1))


@pytest.mark.parametrize("seed", range(5))
def test_the_hull_agrees_with_scipy(seed: int) -> None:
    points = np.random.default_rng(seed).normal(size=(30, 2))
    corners = convex_hull([tuple(p) for p in points.tolist()])
    expected = ConvexHull(points)  # Qhull, for the corners; in two dimensions volume is the area
    assert set(corners) == {tuple(p) for p in points[expected.vertices].tolist()}
    x, y = np.array(corners).T
    area = 0.5 * np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y)
    assert area == pytest.approx(expected.volume, rel=1e-12)


def test_the_hull_of_few_points_or_of_a_line() -> None:
    assert convex_hull([(1.0, 2.0)]) == ((1.0, 2.0),)
    assert convex_hull([(0.0, 0.0), (2.0, 2.0), (1.0, 1.0)]) == ((0.0, 0.0), (2.0, 2.0))


# --- views and text ---------------------------------------------------------------------------


def test_crowded_options_are_enlarged_beside_the_axes() -> None:
    plan = plan_of()
    ax, artists = drawn(plan)
    assert is_crowded(plan)
    assert not artists.inset.bbox.overlaps(ax.bbox)
    frame = artists.frame.get_bbox()
    np.testing.assert_allclose(artists.inset.get_xlim(), frame.intervalx)
    np.testing.assert_allclose(artists.inset.get_ylim(), frame.intervaly)
    for point in ((0.0, 0.0), at(artists.near.options[plan.chosen])):
        assert frame.contains(*point)
    assert artists.inset.get_ylabel() == ax.get_ylabel()


def test_materials_close_together_need_no_enlarged_part() -> None:
    ax, artists = drawn(plan_of((("down", -30.0, 0.5), ("up", 25.0, 0.4), ("flat", 3.0, 0.6))))
    assert artists.near is artists.inset is artists.frame is None
    assert ax.get_xlim()[0] < -30.0 < 25.0 < ax.get_xlim()[1]
    assert ax.get_ylim()[0] < 0.0 < 0.6 < ax.get_ylim()[1]


def test_axes_say_what_they_show_with_units() -> None:
    ax, _ = drawn(plan_of())
    assert ax.get_xlabel() == "TC1 at 25 °C (ppm/K)"
    assert ax.get_ylabel() == "TC2 (ppm/K²)"


CROWD = tuple(
    (f"a_film_with_quite_a_long_name_{n}", -60.0 + 15.0 * n, 0.5 + 0.02 * (n % 3)) for n in range(9)
)
MANY = tuple((f"m{n:02d}", -900.0 + 130.0 * n, 0.1 * (n * 7 % 11) - 0.2) for n in range(16))
CASES = {"six": SIX, "three": THREE, "crowd": CROWD, "many": MANY, "one": THREE[:1]}


@pytest.mark.parametrize("case", CASES)
def test_no_text_covers_another_or_leaves_its_axes(case: str) -> None:
    ax, artists = drawn(plan_of(CASES[case]))
    renderer = ax.figure.canvas.get_renderer()
    ax.figure.draw(renderer)
    for part, plane in zip((ax, artists.inset), planes(artists), strict=False):
        texts = [*plane.names, *plane.contour_labels]
        boxes = [
            text.get_tightbbox(renderer) if text in plane.contour_labels else ink(text, renderer)
            for text in texts
        ]
        assert len(boxes) >= 2
        for (one, a), (other, b) in itertools.combinations(zip(texts, boxes, strict=True), 2):
            assert not a.shrunk(0.96, 0.8).overlaps(b), (one.get_text(), other.get_text())
        for text, box in zip(texts, boxes, strict=True):
            assert part.bbox.padded(2).containsx(box.x0), text.get_text()
            assert part.bbox.padded(2).containsx(box.x1), text.get_text()


def ink(text, renderer):
    """Return the rectangle of a text, without the line from a name to its point."""
    return Text.get_window_extent(text, renderer)


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("goal", ['drift = "600 ppm"', 'tc1 = "-12345.6 ppm/K"\ntc2 = "61.2345 ppm/K^2"'])
def test_the_legend_lies_below_the_axes_and_on_the_page(case: str, goal: str) -> None:
    low = "0 degC"  # a law with TC1 = -12345.6 ppm/K and TC2 = 61.2 ppm/K^2 stays above zero from here on
    plan = plan_of(CASES[case], goal, low=low)
    with figure_style():
        figure = slope_curvature_figure(plan)
        renderer = FigureCanvasAgg(figure).get_renderer()
        figure.draw(renderer)
    ax = figure.axes[0]
    box = ax.get_legend().get_window_extent(renderer)
    assert box.y1 <= ax.xaxis.get_tightbbox(renderer).y0 + 1
    assert min(box.x0, box.y0) >= 0
    assert box.x1 <= figure.bbox.x1
    assert ("all series mixes" in [t.get_text() for t in ax.get_legend().get_texts()]) == (case != "one")
