"""The figures of a fit: every reading where it belongs, bands and limits as computed, text that fits."""

import math
import xml.etree.ElementTree as ET
from itertools import pairwise

import numpy as np
import pytest
from campaigns import NINE, fitted_text, sweep_text
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from tcplan.figures.fit import FIT_INCHES, draw_fit, fit_figure, fit_figure_files
from tcplan.figures.fit_devices import DEVICES_INCHES, devices_figure, draw_devices, positions
from tcplan.figures.fit_groups import MOST_POINTS, groups_of
from tcplan.figures.fit_residuals import MOST_LINES, draw_residuals, residuals_figure, residuals_of
from tcplan.figures.style import figure_style
from tcplan.measure.fit_curves import ohms_curves, ratio_curves


def long_names(lot, device):
    return f"wafer lot with a very long name number {lot}", f"device of great length {device}"


CASES = {
    "one device": lambda: fitted_text(sweep_text(1, 1, tuple(range(-55, 141, 5)), outliers=(20,))),
    "three lots": lambda: fitted_text(sweep_text(3, 4, outliers=(20, 50))),
    "forty devices": lambda: fitted_text(sweep_text(1, 40, outliers=(20, 50, 77, 200, 201))),
    "forty lots": lambda: fitted_text(sweep_text(40, 2)),
    "one of each": lambda: fitted_text(sweep_text(5, 1)),
    "long names": lambda: fitted_text(
        sweep_text(9, 3, names=long_names, tc1=3e-3, ohms=2.3e6),
        name="a_name_of_the_greatest_length_of_forty_x",
    ),
    "no names": lambda: fitted_text(
        "T [degC],R [ohm]\n" + "".join(f"{t},{1e-3 * (300 + t)}\n" for t in NINE)
    ),
}


@pytest.fixture(scope="module", params=CASES.values(), ids=CASES.keys())
def one(request):
    return request.param()


def drawn(figure):
    FigureCanvasAgg(figure).draw()
    return figure


@pytest.fixture
def fit(one):
    with figure_style():
        figure = Figure(figsize=FIT_INCHES)
        ax, below = figure.add_axes((0.11, 0.55, 0.6, 0.4)), figure.add_axes((0.11, 0.08, 0.6, 0.36))
        yield ax, below, draw_fit(ax, below, one)


def points_of(lines):
    return sorted(point for line in lines for point in zip(*line.get_data(), strict=True))


def test_every_reading_is_drawn_in_both_panels(one, fit):
    ax, below, artists = fit
    degC = (one.sweep.T - 273.15).tolist()
    unit = {"Gohm": 1e9, "Mohm": 1e6, "kohm": 1e3, "ohm": 1.0, "mohm": 1e-3}[ax.get_ylabel()[3:-1]]
    expected = sorted(zip(degC, (one.sweep.R / unit).tolist(), strict=True))
    np.testing.assert_allclose(points_of(artists.ohms_points), expected, rtol=1e-12)
    own = np.array([one.fits[k].ohms for k in one.sweep.device])
    departure = (one.sweep.R / own / one.found.law.ratio(one.sweep.T) - 1.0) * 1e6
    np.testing.assert_allclose(
        points_of(artists.drift_points), sorted(zip(degC, departure.tolist(), strict=True)), atol=1e-6
    )
    for panel, lines in ((ax, artists.ohms_points), (below, artists.drift_points)):
        (x0, x1), (y0, y1) = panel.get_xlim(), panel.get_ylim()
        assert all(x0 < x < x1 and y0 < y < y1 for x, y in points_of(lines))


def edges_of(collection):
    return collection.get_paths()[0].get_extents()


def test_law_band_and_limits_are_those_that_are_computed(one, fit):
    _, _, artists = fit
    T = artists.law.get_xdata() + 273.15
    curves, ratio = ohms_curves(one, T), ratio_curves(one, T)
    unit = curves.value[0] / artists.law.get_ydata()[0]
    np.testing.assert_allclose(artists.law.get_ydata() * unit, curves.value, rtol=1e-12)
    assert math.log10(unit) % 3 == pytest.approx(0.0, abs=1e-9)
    assert edges_of(artists.drift_band).y1 == pytest.approx(ratio.band.max() * 1e6)
    if len(one.fits) == 1:
        assert artists.ohms_limits is artists.drift_limits is None
        return
    assert edges_of(artists.drift_limits).y1 == pytest.approx(ratio.limits.max() * 1e6)
    top = curves.value * (1.0 + curves.limits) / unit
    assert edges_of(artists.ohms_limits).y1 == pytest.approx(top.max())


def test_residuals_have_their_lines_and_outliers_their_names(one):
    with figure_style():
        ax = Figure(figsize=(7.2, 3.6)).add_axes((0.11, 0.125, 0.6, 0.8))
        artists = draw_residuals(ax, one)
    found = residuals_of(one) * 1e6
    assert len(points_of(artists.points)) == len(found)
    np.testing.assert_allclose(sorted(y for _, y in points_of(artists.points)), sorted(found), atol=1e-9)
    sigma = math.sqrt(np.mean([fit.sigma**2 for fit in one.fits])) * 1e6
    assert [line.get_ydata()[0] for line in artists.sigma] == pytest.approx([2 * sigma, -2 * sigma])
    flagged = {flag.line for fit in one.fits for flag in fit.flags if flag.outlier}
    assert len(artists.outliers.get_xdata()) == len(flagged)
    named = [int(text.get_text()) for text in artists.lines]
    assert set(named) <= flagged
    assert len(named) == min(len(flagged), MOST_LINES)
    at = {int(line): abs(y) for line, y in zip(one.sweep.line, found, strict=True)}
    assert [at[line] for line in named] == sorted((at[line] for line in named), reverse=True)


def test_devices_stand_in_the_plane_and_in_both_rows(one):
    with figure_style():
        figure = Figure(figsize=DEVICES_INCHES)
        ax = figure.add_axes((0.11, 0.5, 0.6, 0.455))
        rows = figure.add_axes((0.11, 0.27, 0.86, 0.15)), figure.add_axes((0.11, 0.05, 0.86, 0.15))
        artists = draw_devices(ax, rows, one)
    tc1 = sorted(fit.value("tc1") * 1e6 for fit in one.fits)
    percent = sorted((fit.ohms / one.found.ohms - 1.0) * 100.0 for fit in one.fits)
    plane = points_of([bars.lines[0] for bars in artists.plane])
    np.testing.assert_allclose([x for x, _ in plane], percent, atol=1e-9)
    np.testing.assert_allclose(sorted(y for _, y in plane), tc1, rtol=1e-9)
    np.testing.assert_allclose(
        sorted(y for _, y in points_of(b.lines[0] for b in artists.rows[0])), percent, atol=1e-9
    )
    np.testing.assert_allclose(
        sorted(y for _, y in points_of(b.lines[0] for b in artists.rows[1])), tc1, rtol=1e-9
    )
    bars = [np.ptp(segment[:, 1]) for b in artists.rows[1] for segment in b.lines[2][0].get_segments()]
    u = [fit.point_covariance[1][1] ** 0.5 * 1e6 for fit in one.fits]
    np.testing.assert_allclose(
        sorted(bars), sorted(4.0 * np.array(u)), rtol=1e-6, atol=1e-12
    )  # 2 to either side


def test_the_ellipse_is_of_two_sigma_with_the_correlation(one):
    with figure_style():
        figure = devices_figure(one)
    [ellipse] = [p for p in figure.axes[0].patches if p.get_label().startswith("2 sigma")] or [None]
    if len(one.fits) == 1:
        assert ellipse is None
        return
    x, y = ellipse.get_xy().T
    value, tc1 = one.found.scatter("value"), one.found.scatter("tc1")
    assert np.ptp(x) == pytest.approx(4.0 * value.total.sigma * 100.0, rel=1e-3)
    assert np.ptp(y) == pytest.approx(4.0 * tc1.total.sigma * 1e6, rel=1e-3)
    r = one.found.correlation.value if one.found.correlation else 0.0
    # along the ellipse x = s cos, y - m = t (r cos + sqrt(1 - r^2) sin): the mean product is s t r/2
    middle = y - tc1.mean * 1e6
    size = np.ptp(x) * np.ptp(middle) / 4.0
    assert np.mean(x[:-1] * middle[:-1]) == pytest.approx(0.5 * r * size, abs=1e-3 * size)
    assert ("correlation" in ellipse.get_label()) == (one.found.correlation is not None)


@pytest.mark.parametrize("figure_of", [fit_figure, residuals_figure, devices_figure])
def test_all_text_is_on_the_page_and_ticks_do_not_collide(one, figure_of):
    with figure_style():
        figure = drawn(figure_of(one))
        renderer = FigureCanvasAgg(figure).get_renderer()
        for ax in figure.axes:
            texts = [ax.title, ax._left_title, ax.xaxis.label, ax.yaxis.label, *ax.texts]
            texts += ax.get_legend().get_texts() if ax.get_legend() else []
            for text in texts:
                box = text.get_window_extent(renderer)
                assert box.width == 0 or (
                    box.x0 >= 0 and box.y0 >= 0 and box.x1 <= figure.bbox.x1 and box.y1 <= figure.bbox.y1
                ), text.get_text()
            numbers = [t.get_text() for t in ax.get_yticklabels()]
            assert len(set(numbers)) == len(numbers)
            ticks = [t.get_window_extent(renderer) for t in ax.get_xticklabels() if t.get_text()]
            ticks = [box for box in ticks if ax.bbox.x0 - 30 <= box.x0 <= ax.bbox.x1]
            assert all(left.x1 <= right.x0 for left, right in pairwise(ticks))


def test_lots_are_told_apart_and_the_rest_is_grey():
    few, many = fitted_text(sweep_text(9, 2)), fitted_text(sweep_text(12, 2))
    assert [group.label for group in groups_of(few)] == [f"lot L{k}" for k in range(9)]
    assert [group.label for group in groups_of(many)][7:] == ["lot L7", "4 more lots"]
    for one in (few, many):
        groups = groups_of(one)
        assert len({group.colour for group in groups}) == len(groups)
        assert sorted(k for group in groups for k in group.devices) == list(range(len(one.fits)))


def test_devices_of_a_lot_stand_together_whatever_their_order():
    at = positions(("a", "b", "a", "c", "b"))
    assert at.tolist() == [0.0, 3.0, 1.0, 6.0, 4.0]


def test_of_very_many_readings_flagged_ones_are_always_drawn():
    T = np.linspace(-40, 125, 3 * MOST_POINTS)
    text = sweep_text(1, 1, tuple(T.tolist()), outliers=(5003,))
    one = fitted_text(text)
    with figure_style():
        artists = draw_residuals(Figure().add_axes((0.1, 0.1, 0.6, 0.8)), one)
    assert len(points_of(artists.points)) <= MOST_POINTS + 50
    k = int(np.flatnonzero(one.sweep.line == 5003)[0])
    assert any(x == one.sweep.T[k] - 273.15 for x, _ in points_of(artists.points))


def test_the_files_are_whole_and_the_same_every_time():
    one = fitted_text(sweep_text(2, 2, names=lambda n, k: (f"<b>{n}$", f"$\\frac{k}")))
    files = fit_figure_files(one)
    assert files == fit_figure_files(one)
    assert list(files) == [
        f"film-{kind}.{end}" for kind in ("fit", "residuals", "devices") for end in ("svg", "png")
    ]
    for name, content in files.items():
        if name.endswith("png"):
            assert content.startswith(b"\x89PNG")
            continue
        root = ET.fromstring(content)
        assert [child.tag.split("}")[1] for child in root][:2] == ["title", "desc"]
        assert b"<script" not in content
