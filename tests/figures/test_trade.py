"""The figure of the trade: its points, the one taken, the limit, and labels that can be read."""

import xml.etree.ElementTree as ET

import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from tcplan.figures.style import figure_style
from tcplan.figures.trade import draw_trade, trade_figure_files

LONG = "a_film_with_a_name_of_forty_characters_1 4 um x 17.66 um, blue_film 2 um x 33.215 um, "
FRONT = [(1.2e-9 * 1.7**k, 4.2e-3 * (0.85 + 0.3 / (k + 1)), f"way {k}") for k in range(5)]
CASES = {
    "one": ([(1.2e-9, 4.2e-3, "red_film 4 um x 40 um")], 0, 5e-3),
    "front": (FRONT, 2, 4e-3),
    "far apart": ([(1.2e-8 * 2.5**k, 4.2e-2 * 0.6**k, 3 * LONG) for k in range(12)], None, 5.0),
    "close": ([(1.2e-8 * (1 + 0.01 * k), 4.2e-3 * (1 - 1e-3 * k), "x") for k in range(13)], 12, None),
    "no drift": ([(1e-9, 1e-3, "a"), (2e-9, 0.0, "b")], 1, None),
}


@pytest.fixture(params=CASES.values(), ids=CASES.keys())
def case(request):
    points, taken, limit = request.param
    with figure_style():
        figure = Figure(figsize=(7.2, 5.5))
        ax = figure.add_axes((0.115, 0.5, 0.62, 0.44))
        artists = draw_trade(ax, points, taken, limit)
        FigureCanvasAgg(figure).draw()
    return request.param, figure, ax, artists


def test_each_way_is_a_point(case):
    (points, taken, _), _, ax, artists = case
    factor = 1e6 if "mm^2" in ax.get_xlabel() else 1e12  # mm^2 and um^2 in a square metre
    areas, drifts = artists.ways.get_data()
    assert list(areas) == pytest.approx([point[0] * factor for point in points])
    assert list(drifts) == pytest.approx([point[1] * 1e6 for point in points])
    marked = [] if taken is None else [(points[taken][0] * factor, points[taken][1] * 1e6)]
    assert [pytest.approx(at) for at in marked] == list(zip(*artists.taken.get_data(), strict=True))
    (x0, x1), (y0, y1) = ax.get_xlim(), ax.get_ylim()
    assert all(x0 < x < x1 and y0 < y < y1 for x, y in zip(areas, drifts, strict=True))


def test_the_limit_is_a_line_or_said_to_be_beyond(case):
    (_, _, limit), _, ax, artists = case
    if limit is None:
        assert artists.limit is None
        return
    assert list(artists.limit.get_ydata()) == pytest.approx([limit * 1e6] * 2)
    low, high = ax.get_ylim()
    assert ("beyond this scale" in artists.limit.get_label()) == (not low < limit * 1e6 < high)


def test_numbers_and_labels_say_which_is_which(case):
    (points, taken, _), figure, _, artists = case
    assert [text.get_text() for text in artists.numbers] == [str(n + 1) for n in range(len(points))]
    lines = artists.labels.get_text().split("\n")
    assert len(lines) == len(points)
    assert [n for n, line in enumerate(lines) if "(taken)" in line] == ([] if taken is None else [taken])
    renderer = FigureCanvasAgg(figure).get_renderer()
    assert artists.labels.get_window_extent(renderer).x1 <= figure.bbox.width
    boxes = [text.get_window_extent(renderer) for text in artists.numbers]
    for n, one in enumerate(boxes):
        assert not any(one.shrunk(0.95, 0.8).overlaps(other.shrunk(0.95, 0.8)) for other in boxes[n + 1 :])


@pytest.mark.parametrize(("ratio", "scale"), [(1.0, "linear"), (4.9, "linear"), (5.1, "log"), (1e5, "log")])
def test_the_axis_of_area_is_logarithmic_when_areas_lie_far_apart(ratio, scale):
    with figure_style():
        ax = Figure().add_axes((0.1, 0.3, 0.6, 0.6))
        draw_trade(ax, [(1e-9, 2e-3, "a"), (1e-9 * ratio, 1e-3, "b")])
    assert ax.get_xscale() == scale
    assert ax.get_yscale() == "linear"


@pytest.mark.parametrize(("area", "unit"), [(9e-8, "um^2"), (2e-7, "mm^2")])
def test_the_unit_of_area_reads_well(area, unit):
    with figure_style():
        ax = Figure().add_axes((0.1, 0.3, 0.6, 0.6))
        draw_trade(ax, [(area, 2e-3, "a")])
    assert ax.get_xlabel() == f"Area ({unit})"


def test_ways_in_any_order_are_joined_by_their_area():
    with figure_style():
        ax = Figure().add_axes((0.1, 0.3, 0.6, 0.6))
        artists = draw_trade(ax, FRONT[::-1], 0)
    assert list(artists.ways.get_xdata()) == sorted(artists.ways.get_xdata())
    assert artists.taken.get_xdata()[0] == max(artists.ways.get_xdata())
    assert artists.numbers[0].xy[0] == max(artists.ways.get_xdata())


@pytest.mark.parametrize("given", CASES.values(), ids=CASES.keys())
def test_the_files_are_the_same_every_time_and_whole(given):
    files = trade_figure_files(*given)
    assert files == trade_figure_files(*given)
    assert list(files) == ["trade.svg", "trade.png"]
    root = ET.fromstring(files["trade.svg"])
    assert [child.tag.split("}")[1] for child in root][:2] == ["title", "desc"]
    assert files["trade.png"].startswith(b"\x89PNG")
