"""Temperature ranges: ends, rise, reference, and their text."""

import math
from dataclasses import FrozenInstanceError

import pytest

from tcplan.errors import InputError
from tcplan.ranges import GRADES, TemperatureRange, named_range, temperature_range


def test_properties_of_a_named_range() -> None:
    chosen = named_range("automotive-1")
    assert (chosen.low, chosen.high, chosen.reference, chosen.rise) == (233.15, 398.15, 298.15, 0.0)
    assert (chosen.low_degC, chosen.high_degC, chosen.reference_degC) == (-40.0, 125.0, 25.0)
    assert chosen.span == 165.0


def test_the_rise_is_added_at_the_high_end() -> None:
    chosen = named_range("automotive-1", rise=10.0)
    assert (chosen.low_degC, chosen.high_degC, chosen.ambient_high) == (-40.0, 135.0, 398.15)
    same = temperature_range(233.15, 398.15, 298.15, rise=10.0)
    assert (same.low, same.high, same.rise) == (chosen.low, chosen.high, chosen.rise)


@pytest.mark.parametrize("name", GRADES)
def test_text_always_prints_the_numbers(name: str) -> None:
    grade = GRADES[name]
    text = named_range(name).text()
    assert text.startswith(f"{grade.low_degC:g} degC to {grade.high_degC:g} degC (")
    assert name in text
    assert grade.standard in text


def test_text() -> None:
    assert named_range("automotive-1").text() == "-40 degC to 125 degC (automotive-1, AEC-Q100 grade 1)"
    risen = temperature_range(233.15, 398.15, 298.15, rise=10.0)
    assert risen.text() == "ambient -40 degC to 125 degC, element 10 K above at the high end"
    assert temperature_range(273.15, 310.65, 293.15, name="room").text() == "0 degC to 37.5 degC (room)"


def test_unknown_grade_names_the_nearest_and_lists_all() -> None:
    with pytest.raises(InputError, match="Did you mean automotive-1") as caught:
        named_range("automotive1")
    assert all(name in str(caught.value) for name in GRADES)


def test_reference_outside_is_refused() -> None:
    with pytest.raises(InputError, match=r"reference: found 200 degC; expected .* -40 degC to 125 degC"):
        named_range("automotive-1", reference=473.15)


def test_reference_in_the_rise_is_inside() -> None:
    assert temperature_range(233.15, 398.15, 403.15, rise=10.0).reference_degC == 130.0


@pytest.mark.parametrize(
    ("low", "high", "reference", "rise"),
    [
        (398.15, 233.15, 298.15, 0.0),
        (298.15, 298.15, 298.15, 0.0),
        (398.15, 233.15, 298.15, 200.0),
        (0.0, 398.15, 298.15, 0.0),
        (-40.0, 125.0, 25.0, 0.0),
        (math.nan, 398.15, 298.15, 0.0),
        (233.15, math.inf, 298.15, 0.0),
        (233.15, 398.15, math.nan, 0.0),
        (233.15, 398.15, 298.15, -1.0),
        (233.15, 398.15, 298.15, math.nan),
        (233.15, 398.15, 298.15, math.inf),
    ],
)
def test_what_is_no_range_is_refused(low: float, high: float, reference: float, rise: float) -> None:
    with pytest.raises(InputError):
        temperature_range(low, high, reference, rise)


def test_all_mistakes_are_reported_together() -> None:
    with pytest.raises(InputError) as caught:
        TemperatureRange(low=-1.0, high=math.nan, reference=math.inf, rise=-1.0)
    assert [problem.where for problem in caught.value.problems] == ["low", "high", "reference", "rise"]


def test_a_range_is_a_value() -> None:
    first = named_range("industrial")
    assert first == named_range("industrial")
    assert hash(first) == hash(named_range("industrial"))
    with pytest.raises(FrozenInstanceError):
        first.low = 0.0  # type: ignore[misc]
    with pytest.raises(TypeError):
        GRADES["new"] = GRADES["industrial"]  # type: ignore[index]
