"""Named grades against the standards that define them."""

import pytest

from tcplan.ranges import GRADES, named_range

# AEC-Q100, part operating temperature grades: ambient, degC.
AEC_Q100 = {
    "automotive-0": (-40.0, 150.0),
    "automotive-1": (-40.0, 125.0),
    "automotive-2": (-40.0, 105.0),
    "automotive-3": (-40.0, 85.0),
}
# AEC-Q200, table of temperature grades of passive components: ambient, degC.
AEC_Q200 = {
    "passive-0": (-50.0, 150.0),
    "passive-1": (-40.0, 125.0),
    "passive-2": (-40.0, 105.0),
    "passive-3": (-40.0, 85.0),
    "passive-4": (0.0, 70.0),
}
# Common practice, no source: catalogues agree on these, some print other ends for "industrial".
PRACTICE = {"commercial": (0.0, 70.0), "industrial": (-40.0, 85.0), "military": (-55.0, 125.0)}
PUBLISHED = AEC_Q100 | AEC_Q200 | PRACTICE


@pytest.mark.parametrize(("name", "ends"), PUBLISHED.items())
def test_ends_as_published(name: str, ends: tuple[float, float]) -> None:
    chosen = named_range(name)
    assert (chosen.low_degC, chosen.high_degC) == ends


def test_no_grade_without_a_published_pair() -> None:
    assert list(GRADES) == list(PUBLISHED)


def test_each_grade_names_its_standard() -> None:
    for group, standard in ((AEC_Q100, "AEC-Q100 grade"), (AEC_Q200, "AEC-Q200 grade")):
        assert all(GRADES[name].standard == f"{standard} {name[-1]}" for name in group)
    assert all("common practice" in GRADES[name].standard for name in PRACTICE)


def test_25_degC_is_298_15_K() -> None:  # noqa: N802 - units
    # SI Brochure (BIPM), 9th edition, 2.3.1: t/degC = T/K - 273.15.
    assert named_range("commercial").reference == 298.15
