"""Placement: every unit once, the outline by hand and by trial of all, one centroid wherever there can be."""

import itertools
import math
from collections import Counter
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from makers import film

from tcplan.errors import InputError
from tcplan.made import FilmLeg, FilmUnit
from tcplan.material.model import Film
from tcplan.parts.placement import DUMMY, place

UM = 1e-6
FILM = replace(film("pp", 100.0), film=Film(min_width=UM, spacing=0.6 * UM, end_length=0.5 * UM))
RATIO = {"a": 0, "b": 1}


def unit(width=1.0, length=4.0):
    sizes = {"width": width * UM, "length": length * UM}
    return FilmUnit(material="pp", body_ohms=1e3, ends_ohms=0.0, area=width * length * UM**2, **sizes)


def legs(counts, size=None):
    size = size or unit()
    return [
        FilmLeg(id=name, material="pp", wanted_ohms=1e3, unit=size, in_series=count, in_parallel=1)
        for name, count in counts.items()
    ]


def positions(placement, names):
    """Return where the units of some legs are [m], by looking at every cell."""
    return np.array(
        [
            (x * placement.pitch_x, y * placement.pitch_y)
            for y, row in enumerate(placement.rows)
            for x, name in enumerate(row)
            if name in names
        ]
    )


def centroid(placement, names):
    return positions(placement, names).mean(axis=0)


def check_whole(placement, counts):
    """Every unit once, rows of one length, a dummy at both ends of each."""
    cells = Counter(name for row in placement.rows for name in row)
    assert {name: cells[name] for name in counts} == counts
    assert cells[DUMMY] == placement.dummies == sum(cells.values()) - sum(counts.values())
    assert {len(row) for row in placement.rows} == {placement.columns}
    assert all(row[0] == row[-1] == DUMMY for row in placement.rows)
    assert placement.units == sum(counts.values())


# ---- the outline


def test_the_outline_is_the_hand_figure():
    # By hand: pitch 1 + 0.6 = 1.6 um and 4 + 2 * 0.5 + 0.6 = 5.6 um. Eight units in 2 rows of 4, a dummy at
    # both ends of each: 6 * 1.6 = 9.6 um by 2 * 5.6 = 11.2 um. One row is 16 um wide, three are 16.8 um high.
    placement = place(legs({"a": 4, "b": 4}), FILM)
    assert placement.pitch_x == pytest.approx(1.6 * UM, rel=1e-12)
    assert placement.pitch_y == pytest.approx(5.6 * UM, rel=1e-12)
    assert (len(placement.rows), placement.columns) == (2, 6)
    assert placement.width == pytest.approx(9.6 * UM, rel=1e-12)
    assert placement.height == pytest.approx(11.2 * UM, rel=1e-12)
    assert placement.area == pytest.approx(107.52e-12, rel=1e-12)
    assert placement.dummies == 4
    assert placement.notes == ()


@pytest.mark.parametrize("count", [1, 2, 5, 16, 37, 100])
@pytest.mark.parametrize("length", [0.5, 4.0, 60.0])
def test_no_other_number_of_rows_fits_in_a_smaller_square(count, length):
    placement = place(legs({"a": count}, unit(length=length)), FILM)
    own = max(placement.width, placement.height)
    for rows in range(1, count + 1):  # the slow twin: all of them
        columns = math.ceil(count / rows) + 2
        square = max(columns * placement.pitch_x, rows * placement.pitch_y)
        assert own <= square * (1 + 1e-12), f"{rows} rows"


def test_what_is_not_stated_counts_nothing_and_is_said():
    bare = replace(FILM, film=Film(min_width=UM))
    placement = place(legs({"a": 3}), bare)
    assert (placement.pitch_x, placement.pitch_y) == (UM, 4 * UM)
    assert placement.width == placement.columns * UM
    assert ["spacing" in note or "end_length" in note for note in placement.notes] == [True, True]


def test_one_unit_stands_between_two_dummies():
    assert place(legs({"a": 1}), FILM).rows == ((DUMMY, "a", DUMMY),)


def test_the_largest_case_is_whole_and_near_a_square():
    counts = dict.fromkeys("abcdef", 64 * 64)
    placement = place(legs(counts), FILM, sides={name: k % 2 for k, name in enumerate(counts)})
    check_whole(placement, counts)
    assert placement.distance == 0.0
    assert 0.95 < placement.width / placement.height < 1.05
    assert placement == place(legs(counts), FILM, sides={name: k % 2 for k, name in enumerate(counts)})


# ---- one centroid
#
# Two sides with one centroid have no error from a linear gradient: the definition (common practice, no
# source). All else follows from sums over the cells.


def test_two_and_two_are_cross_coupled():
    square = replace(FILM, film=Film(min_width=4 * UM))
    assert place(legs({"a": 2, "b": 2}, unit(4.0, 8.0)), square, sides=RATIO).rows == (
        (DUMMY, "a", "b", DUMMY),
        (DUMMY, "b", "a", DUMMY),
    )


def test_in_one_row_two_and_two_are_mirrored():
    placement = place(legs({"a": 2, "b": 2}, unit(1.0, 50.0)), FILM, sides=RATIO)
    assert placement.rows == ((DUMMY, *"abba", DUMMY),)


@pytest.mark.parametrize("length", [0.2, 4.0, 90.0])
def test_every_pair_of_counts_but_one_and_one_has_one_centroid(length):
    for a, b in itertools.product(range(1, 14), repeat=2):
        placement = place(legs({"a": a, "b": b}, unit(length=length)), FILM, sides=RATIO)
        check_whole(placement, {"a": a, "b": b})
        apart = np.hypot(*(centroid(placement, "a") - centroid(placement, "b")))
        assert apart == pytest.approx(placement.distance, abs=1e-15)
        assert (placement.distance == 0.0) == ((a, b) != (1, 1)) == (placement.why_not == "")


def possible(a, b, rows, columns):
    """Whether any arrangement at all has coinciding centroids: all of them are tried, in whole numbers."""
    cells = list(itertools.product(range(rows), range(columns)))
    for first in itertools.combinations(cells, a):
        ax, ay = sum(x for _, x in first), sum(y for y, _ in first)
        rest = [cell for cell in cells if cell not in first]
        for second in itertools.combinations(rest, b):
            if a * sum(x for _, x in second) == b * ax and a * sum(y for y, _ in second) == b * ay:
                return True
    return False


@pytest.mark.parametrize("length", [0.2, 1.0, 2.0, 4.0, 90.0])
def test_wherever_some_arrangement_of_the_outline_has_one_centroid_one_is_found(length):
    tried = 0
    for a, b in itertools.product(range(1, 7), repeat=2):
        placement = place(legs({"a": a, "b": b}, unit(length=length)), FILM, sides=RATIO)
        rows, columns = len(placement.rows), placement.columns - 2
        if rows * columns <= 12:
            tried += 1
            assert (placement.distance == 0.0) == possible(a, b, rows, columns)
    assert tried > 10


@pytest.mark.parametrize("outline", [(1, 2), (2, 1), (1, 5), (3, 3), (3, 4)])
def test_one_and_one_never_have_one_centroid(outline):
    assert not possible(1, 1, *outline)


@pytest.mark.parametrize("length", [4.0, 0.2, 0.05])
def test_one_and_one_stand_as_near_as_they_can(length):
    flat = replace(FILM, film=replace(FILM.film, end_length=0.0))
    placement = place(legs({"a": 1, "b": 1}, unit(length=length)), flat, sides=RATIO)
    assert placement.distance == pytest.approx(min(1.6, length + 0.6) * UM, rel=1e-12)
    assert "One unit against one" in placement.why_not


@st.composite
def ratios(draw):
    counts = {name: draw(st.integers(1, 40)) for name in "abcde"[: draw(st.integers(2, 5))]}
    sides = {name: draw(st.integers(0, 1)) for name in counts}
    sides["a"], sides["b"] = 0, 1
    return counts, sides, draw(st.sampled_from([0.3, 2.0, 11.0, 300.0]))


@settings(derandomize=True, max_examples=60, deadline=None)
@given(ratios(), st.floats(-1e3, 1e3), st.floats(-1e3, 1e3))
def test_a_linear_gradient_leaves_the_ratio_of_two_sides(case, across, along):
    counts, sides, length = case
    placement = place(legs(counts, unit(length=length)), FILM, sides=sides)
    check_whole(placement, counts)
    means = []
    for side in (0, 1):
        where = positions(placement, [name for name in counts if sides[name] == side])
        means.append(float((1.0 + where @ np.array([across, along])).mean()))
    single = sum(counts.values()) == 2
    assert single or means[0] == pytest.approx(means[1], rel=1e-12)


@settings(derandomize=True, max_examples=40, deadline=None)
@given(st.dictionaries(st.sampled_from("abcdef"), st.integers(1, 50), min_size=1))
def test_without_sides_legs_of_even_counts_share_the_middle_of_the_array(counts):
    placement = place(legs(counts), FILM)
    check_whole(placement, counts)
    middle = (
        (placement.columns - 1) / 2 * placement.pitch_x,
        (len(placement.rows) - 1) / 2 * placement.pitch_y,
    )
    for name, count in counts.items():
        if count % 2 == 0 and count > 0:
            assert centroid(placement, name) == pytest.approx(middle, rel=1e-12)
    assert placement.distance is None
    assert placement.why_not == ""


def test_legs_of_one_side_only_have_no_second_centroid():
    placement = place(legs({"a": 2, "b": 2}), FILM, sides={"a": 1, "b": 1})
    assert placement.distance is None
    assert "one side" in placement.why_not


# ---- refusals


@pytest.mark.parametrize(
    ("given_legs", "sides", "words"),
    [
        ([], None, "no legs"),
        ([*legs({"a": 2}), *legs({"b": 2}, unit(2.0))], None, "several unit cells"),
        ([*legs({"a": 2}), *legs({"a": 3})], None, "an id twice"),
        (legs({"a": 2, ".": 2}), None, "dummies"),
        (legs({"a": 2, "b": 2}), {"a": 0}, "for leg b"),
        (legs({"a": 2, "b": 2}), {"a": 0, "b": 2}, "for leg b"),
    ],
)
def test_refused(given_legs, sides, words):
    with pytest.raises(InputError, match=words):
        place(given_legs, FILM, sides=sides)


def test_legs_of_another_film_are_refused():
    with pytest.raises(InputError, match="placement of np"):
        place(legs({"a": 2}), replace(FILM, name="np"))
