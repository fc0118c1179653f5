"""The grid of an array as text: read back cell by cell, its legend, and how a large one is shortened."""

import re
from collections import Counter
from dataclasses import replace

import pytest
from makers import film

from tcplan.made import FilmLeg, FilmUnit
from tcplan.material.model import Film
from tcplan.parts.placement import place
from tcplan.spec.placement_text import MOST_ROWS, grid_text

UM = 1e-6
FILM = replace(film("pp", 100.0), film=Film(min_width=UM, spacing=0.6 * UM, end_length=0.5 * UM))


def placed(counts, length=4.0, sides=None, material=FILM):
    unit = FilmUnit(
        material="pp", width=UM, length=length * UM, body_ohms=1e3, ends_ohms=0.0, area=length * UM**2
    )
    legs = [
        FilmLeg(id=name, material="pp", wanted_ohms=1e3, unit=unit, in_series=count, in_parallel=1)
        for name, count in counts.items()
    ]
    return place(legs, material, sides=sides)


def test_a_small_array_word_for_word():
    placement = placed({"a": 4, "b": 4}, sides={"a": 0, "b": 1})
    # The outline by hand: 6 * (1 + 0.6) um by 2 * (4 + 2 * 0.5 + 0.6) um.
    assert grid_text(placement) == (
        ". a b a b .",
        ". b a b a .",
        "Units of pp by leg: a 4, b 4; 4 dummies (.).",
        "Outline 9.6 um wide, 11.2 um high, 107.5 um^2: 2 x 6 cells of 1.6 um x 5.6 um.",
        "Both sides of the ratio have one centroid.",
    )


@pytest.mark.parametrize("names", ["ab", ["a", "b1"], ["first", "x"]])
def test_the_grid_reads_back(names):
    placement = placed({names[0]: 31, names[1]: 12})
    lines = grid_text(placement)[: len(placement.rows)]
    assert tuple(tuple(line.split()) for line in lines) == placement.rows


def test_cells_of_one_letter_close_up_before_they_are_cut():
    placement = placed({"a": 60}, length=200.0)
    assert placement.columns == 62
    assert grid_text(placement)[0] == "." + 60 * "a" + "."


@pytest.mark.parametrize("name", ["a", "b12"])
@pytest.mark.parametrize("width", [40, 80])
def test_a_wide_array_is_shortened_and_says_so(name, width):
    placement = placed({name: 300}, length=3000.0)
    [row, *words] = grid_text(placement, width)
    start, end = (re.sub(r"[. ]", "", part) for part in row.split(" ... "))
    told = re.search(r"first (\d+) and the last (\d+) of (\d+) columns", " ".join(words))
    shown = [int(number) for number in told.groups()]
    assert shown[:2] == [len(start) // len(name) + 1, len(end) // len(name) + 1]  # a dummy at each end
    assert shown[2] == placement.columns == 302
    assert len(row) <= width


def test_a_high_array_is_shortened_and_says_so():
    placement = placed({"a": 2000, "b": 2000})
    lines = grid_text(placement)
    high = placed({"a": 300}, length=0.01, material=replace(FILM, film=Film(min_width=UM)))
    text = " ".join(grid_text(high))
    assert len(high.rows) > MOST_ROWS
    assert f"the first 20 and the last 20 of {len(high.rows)} rows" in text
    assert f"{len(high.rows)} x {high.columns} cells" in text
    assert Counter(len(line) <= 80 for line in lines) == {True: len(lines)}


@pytest.mark.parametrize("width", [40, 60, 80])
def test_no_line_is_too_wide(width):
    many = {f"{chr(97 + k % 26)}{k // 26 or ''}": 9 + k for k in range(60)}
    for placement in (placed(many), placed({"a": 1, "b": 1}, sides={"a": 0, "b": 1})):
        assert max(map(len, grid_text(placement, width))) <= width


def test_what_is_not_possible_and_not_stated_is_said():
    placement = placed(
        {"a": 1, "b": 1}, sides={"a": 0, "b": 1}, material=replace(FILM, film=Film(min_width=UM))
    )
    text = " ".join(grid_text(placement))
    assert "no common centroid in any array" in text
    assert "1 um apart" in text
    assert "No spacing is stated for pp" in text
    assert "No end_length is stated for pp" in text
