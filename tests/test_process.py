"""What materials share: groups that move in full step, corners, and the JSON form."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tcplan.material.spread import Spread
from tcplan.process import (
    INDEPENDENT,
    Corner,
    Correlation,
    Parameter,
    Process,
    Tracking,
    Variation,
    process_from_dict,
)

NAMES = ("a", "b", "c", "d")


def value_of(name):
    return Parameter(material=name, component="value")


def joined(*pairs, value=1.0):
    return Process(
        correlations=tuple(Correlation(first=value_of(a), second=value_of(b), value=value) for a, b in pairs)
    )


def test_full_steps_join_and_partial_ones_do_not():
    assert INDEPENDENT.value_groups(NAMES) == (0, 1, 2, 3)
    assert joined(("d", "b")).value_groups(NAMES) == (0, 1, 2, 1)
    assert joined(("a", "b"), ("c", "b")).value_groups(NAMES) == (0, 0, 0, 3)
    assert joined(("a", "b"), value=0.99).value_groups(NAMES) == (0, 1, 2, 3)
    assert joined(("a", "x")).value_groups(NAMES) == (0, 1, 2, 3)


@given(st.lists(st.tuples(st.sampled_from(NAMES), st.sampled_from(NAMES)), max_size=6))
def test_groups_are_the_connected_parts(pairs):
    """Against a plain walk of the graph."""
    groups = joined(*pairs).value_groups(NAMES)
    reach = {name: {name} for name in NAMES}
    for _ in NAMES:
        for a, b in pairs:
            both = reach[a] | reach[b]
            for name in both:
                reach[name] = reach[name] | both
    for i, one in enumerate(NAMES):
        for j, other in enumerate(NAMES):
            assert (groups[i] == groups[j]) == (other in reach[one])


def test_a_tc_that_is_in_full_step_with_another_joins_no_values():
    tc1 = [Parameter(material=name, component="tc1") for name in "ab"]
    process = Process(correlations=(Correlation(first=tc1[0], second=tc1[1], value=1.0),))
    assert process.value_groups(NAMES) == (0, 1, 2, 3)


def test_the_json_form_comes_back():
    process = Process(
        correlations=(
            Correlation(first=value_of("a"), second=Parameter(material="a", component="tc1"), value=-0.6),
        ),
        trackings=(Tracking(materials=("a", "b"), within=3e-6),),
        corners=(
            Corner(
                name="slow", shifts=((value_of("a"), 0.1), (Parameter(material="b", component="tc2"), -1e-7))
            ),
        ),
    )
    assert process_from_dict(process.to_dict()) == process
    assert process_from_dict(INDEPENDENT.to_dict()) == INDEPENDENT


def test_a_corner_shifts_what_it_names():
    corner = Corner(name="slow", shifts=((value_of("a"), 0.1),))
    assert corner.shift("a", "value") == 0.1
    assert corner.shift("a", "tc1") == 0.0
    assert corner.shift("b", "value") == 0.0


def test_a_scaled_variation_has_a_part_of_the_limits():
    spreads = {"a": Spread(meaning="sigma", value=0.05, tc1=20e-6), "b": Spread(meaning="limits", tc2=1e-7)}
    half = Variation(spreads=spreads).scaled(0.5).spreads
    assert half["a"].value == pytest.approx(0.075)
    assert half["a"].tc1 == pytest.approx(30e-6)
    assert half["a"].meaning == half["b"].meaning == "limits"
    assert half["b"].tc2 == pytest.approx(0.5e-7)
    assert half["b"].value is None
