"""The arrays as drawn: every cell in its place, to scale, letters on their units, nothing over anything."""

import xml.etree.ElementTree as ET
from dataclasses import replace

import numpy as np
import pytest
from makers import film
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from tcplan.figures.labels import page_box
from tcplan.figures.placement import (
    LEAST_TEXT,
    MOST_CELLS,
    draw_placement,
    leg_colours,
    placement_figure,
    placement_figure_files,
    view_of,
)
from tcplan.figures.style import figure_style
from tcplan.made import FilmLeg, FilmUnit
from tcplan.material.model import Film
from tcplan.parts.placement import DUMMY, place

UM = 1e-6
LONG = "a_film_with_a_name_of_forty_characters_1"


def placed(counts, width=1.0, length=4.0, name="pp", sides=None, spacing=0.6 * UM):
    material = replace(film(name, 100.0), film=Film(min_width=UM, spacing=spacing, end_length=0.5 * UM))
    unit = FilmUnit(
        material=name, width=width * UM, length=length * UM, body_ohms=1e3, ends_ohms=0.0, area=UM**2
    )
    legs = [
        FilmLeg(id=leg, material=name, wanted_ohms=1e3, unit=unit, in_series=count, in_parallel=1)
        for leg, count in counts.items()
    ]
    return place(legs, material, sides=sides)


MANY = {f"{chr(97 + k % 26)}{k // 26 or ''}": 3 + k % 7 for k in range(40)}
CASES = {
    "one unit": placed({"a": 1}),
    "two sides": placed({"a": 12, "b": 7}, sides={"a": 0, "b": 1}),
    "not possible": placed({"a": 1, "b": 1}, sides={"a": 0, "b": 1}, name=LONG, spacing=None),
    "long units": placed({"a": 31, "b12": 90, "first": 2}, width=2.0, length=200.0, name=LONG),
    "thin": placed({"a": 1}, length=300.0),
    "flat": placed({"a": 10}, width=100.0, length=1.0),
    "many legs": placed(MANY, width=5.0, length=5.0),
    "large": placed(dict.fromkeys("abcdef", 300)),
}


def drawn(placement):
    with figure_style():
        figure = placement_figure([placement])
        [ax] = figure.axes
        ax.clear()
        artists = draw_placement(ax, placement)
        FigureCanvasAgg(figure).draw()
    return figure, ax, artists


@pytest.fixture(params=CASES.values(), ids=CASES.keys(), scope="module")
def case(request):
    return (request.param, *drawn(request.param))


def boxes(collection):
    """Return (left, bottom, right, top) of each rectangle [m]."""
    found = [path.get_extents() for path in collection.get_paths()]
    return np.array([(box.x0, box.y0, box.x1, box.y1) for box in found])


def cell(placement, box, high):
    """Return the row and the column of a rectangle, from its middle."""
    column, row = (
        0.5 * (box[0] + box[2]) / placement.pitch_x,
        (high - 0.5 * (box[1] + box[3])) / placement.pitch_y,
    )
    assert column % 1 == pytest.approx(0.5, abs=1e-6)
    assert row % 1 == pytest.approx(0.5, abs=1e-6)
    return int(row), int(column)


def test_every_cell_that_is_shown_is_drawn_once_in_the_colour_of_its_leg(case):
    placement, _, _, artists = case
    view = view_of(placement)
    high = view.rows * placement.pitch_y
    found = {}
    for box, colour in zip(boxes(artists.units), artists.units.get_facecolor(), strict=True):
        found[cell(placement, box, high)] = tuple(colour[:3])
    spare = {cell(placement, box, high) for box in boxes(artists.dummies)}
    colours = leg_colours(placement)
    for y, row in enumerate(placement.rows[: view.rows]):
        for x, name in enumerate(row[: view.columns]):
            assert ((y, x) in spare) == (name == DUMMY)
            if name != DUMMY:
                assert found.pop((y, x)) == pytest.approx(colours[name])
    assert not found


def test_units_have_their_size_and_do_not_touch(case):
    placement, _, _, artists = case
    sizes = boxes(artists.units)
    assert sizes[:, 2] - sizes[:, 0] == pytest.approx(placement.unit_width, rel=1e-6)
    ends = 2.0 * placement.end_length
    assert sizes[:, 3] - sizes[:, 1] == pytest.approx(placement.unit_length + ends, rel=1e-6)


def test_it_is_to_scale_or_says_that_it_is_not(case):
    _, _, ax, artists = case
    page, (x0, x1), (y0, y1) = page_box(ax), ax.get_xlim(), ax.get_ylim()
    across, up = (page.right - page.left) / (x1 - x0), (page.top - page.bottom) / (y1 - y0)
    to_scale = across == pytest.approx(up, rel=1e-6)
    told = artists.note is not None and "Not to scale" in artists.note.get_text()
    assert to_scale != told


def test_letters_stand_on_units_of_their_leg(case):
    placement, figure, _, artists = case
    shown = len(artists.units.get_paths())
    assert len(artists.letters) in (0, shown)
    renderer = FigureCanvasAgg(figure).get_renderer()
    view = view_of(placement)
    high = view.rows * placement.pitch_y
    for text in artists.letters:
        x, y = text.get_position()
        assert (
            placement.rows[int((high - y) / placement.pitch_y)][int(x / placement.pitch_x)] == text.get_text()
        )
        assert text.get_fontsize() >= LEAST_TEXT
        width = text.get_window_extent(renderer).width * 72.0 / figure.dpi
        assert width <= placement.unit_width * view.across + 1.0


def test_nothing_covers_anything_and_all_is_on_the_page(case):
    placement, figure, ax, artists = case
    renderer = FigureCanvasAgg(figure).get_renderer()
    words = [artists.title, *artists.dimensions[2:], *([artists.note] if artists.note else [])]
    extents = [word.get_window_extent(renderer) for word in words]
    extents.append(artists.legend.get_window_extent(renderer))
    view = view_of(placement)
    low, high = ax.transData.transform(
        [(0.0, 0.0), (view.columns * placement.pitch_x, view.rows * placement.pitch_y)]
    )
    for n, one in enumerate(extents):
        assert one.x0 >= 0.0
        assert one.y0 >= 0.0
        assert one.x1 <= figure.bbox.width
        assert one.y1 <= figure.bbox.height
        apart = one.x0 >= high[0] - 1 or one.x1 <= low[0] + 1 or one.y0 >= high[1] - 1 or one.y1 <= low[1] + 1
        assert apart, n
        for other in extents[n + 1 :]:
            assert not one.shrunk(0.99, 0.9).overlaps(other.shrunk(0.99, 0.9)), (n, other)


def test_the_dimensions_are_those_of_the_outline():
    placement = CASES["two sides"]
    _, _, artists = drawn(placement)
    # By hand: 3 rows of 7 and 2 dummies, 9 * 1.6 um by 3 * 5.6 um.
    assert [text.get_text() for text in artists.dimensions[2:]] == ["14.4 um", "16.8 um"]
    assert artists.title.get_text() == "pp: 19 units, 3 x 9 cells, 14.4 um x 16.8 um"
    assert artists.note.get_text() == "Unit: W 1 um, L 4 um. Both sides of the ratio have one centroid."
    assert [text.get_text() for text in artists.legend.get_texts()] == ["a: 12", "b: 7", "dummies: 8"]


def test_of_a_large_array_a_part_is_shown_and_that_is_said():
    placement = CASES["large"]
    _, _, artists = drawn(placement)
    view = view_of(placement)
    assert view.rows * view.columns <= MOST_CELLS
    assert f"{view.rows} of {len(placement.rows)} rows, {view.columns} of {placement.columns}" in (
        artists.note.get_text()
    )
    assert artists.dimensions == ()


def test_one_panel_a_film():
    with figure_style():
        figure = placement_figure([CASES["two sides"], CASES["thin"], CASES["flat"]])
        FigureCanvasAgg(figure).draw()
    assert [ax.get_title(loc="left").split(":")[0] for ax in figure.axes] == ["pp"] * 3
    tops = [ax.get_position().y1 for ax in figure.axes]
    bottoms = [ax.get_position().y0 for ax in figure.axes]
    assert all(low > top for low, top in zip(bottoms, tops[1:], strict=False))
    assert bottoms[-1] > 0.0


def test_the_files_are_the_same_every_time_and_whole():
    placements = [CASES["two sides"], CASES["not possible"]]
    files = placement_figure_files(placements)
    assert files == placement_figure_files(placements)
    assert list(files) == ["placement.svg", "placement.png"]
    assert files["placement.png"].startswith(b"\x89PNG")
    root = ET.fromstring(files["placement.svg"])
    assert [child.tag.split("}")[1] for child in root][:2] == ["title", "desc"]
    assert LONG in root[1].text
    assert b"http://www.w3.org/2000/svg" in files["placement.svg"]
    assert b"<dc:date>" not in files["placement.svg"]


def test_it_draws_on_any_axes():
    with figure_style():
        artists = draw_placement(
            Figure(figsize=(3.0, 3.0)).add_axes((0.1, 0.2, 0.5, 0.6)), CASES["two sides"]
        )
    assert len(artists.units.get_paths()) == 19
