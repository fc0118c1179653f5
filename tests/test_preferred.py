"""E series: membership and neighbours."""

import math

import pytest

from tcplan.errors import InputError
from tcplan.preferred import SERIES, nearest_preferred, preferred_values


@pytest.mark.parametrize("series", SERIES)
def test_one_decade_rising(series: str) -> None:
    values = preferred_values(series)
    assert len(values) == int(series[1:])
    assert list(values) == sorted(set(values))
    assert values[-1] < 10 * values[0]


@pytest.mark.parametrize(("coarse", "fine"), [("E3", "E6"), ("E6", "E12"), ("E12", "E24"), ("E48", "E96")])
def test_a_coarser_series_is_every_second_value_of_the_finer(coarse: str, fine: str) -> None:
    assert preferred_values(coarse) == preferred_values(fine)[::2]


@pytest.mark.parametrize("series", SERIES)
@pytest.mark.parametrize("decade", range(-3, 8))
def test_a_member_is_its_own_neighbour(series: str, decade: int) -> None:
    for significand in preferred_values(series):
        member = float(f"{significand}e{decade}")
        assert nearest_preferred(member, series) == (member, member)
        assert nearest_preferred(member * (1 + 1e-12), series) == (member, member)
        assert nearest_preferred(member * (1 - 1e-12), series) == (member, member)


@pytest.mark.parametrize("series", SERIES)
def test_neighbours_against_a_plain_scan(series: str) -> None:
    members = [float(f"{s}e{d}") for d in range(-2, 4) for s in preferred_values(series)]
    for step in range(400):
        value = 10 ** (0.5 + step / 200)
        below = max(m for m in members if m <= value * (1 + 1e-9))
        above = min(m for m in members if m >= value * (1 - 1e-9))
        assert nearest_preferred(value, series) == (below, above)


def test_neighbours_across_the_decade() -> None:
    assert nearest_preferred(9.5e3, "E24") == (9100.0, 10000.0)
    assert nearest_preferred(0.095, "E3") == (0.047, 0.1)


def test_unknown_series_names_the_nearest() -> None:
    with pytest.raises(InputError, match="Did you mean E96"):
        preferred_values("e96")
    with pytest.raises(InputError, match="one of E3, E6"):
        nearest_preferred(100.0, "preferred")


@pytest.mark.parametrize("value", [0.0, -10.0, math.nan, math.inf, 1e-300, 1e300])
def test_what_no_part_can_have_is_refused(value: float) -> None:
    with pytest.raises(InputError, match="a resistance from"):
        nearest_preferred(value, "E96")
