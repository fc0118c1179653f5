"""E series against IEC 60063 and against an independent package that prints its tables."""

import pytest

from tcplan.preferred import SERIES, preferred_values

# IEC 60063, table of the E24 series; also printed in most component catalogues.
E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)


def test_e24_as_printed() -> None:
    assert preferred_values("E24") == E24


@pytest.mark.parametrize(
    ("series", "values"),
    [  # IEC 60063, tables of the coarser series
        ("E3", (10, 22, 47)),
        ("E6", (10, 15, 22, 33, 47, 68)),
        ("E12", (10, 12, 15, 18, 22, 27, 33, 39, 47, 56, 68, 82)),
    ],
)
def test_coarse_series_as_printed(series: str, values: tuple[int, ...]) -> None:
    assert preferred_values(series) == values


def test_e24_exceptions_are_the_only_ones() -> None:
    # IEC 60063: these eight differ from the rounded geometric series; all others agree with it.
    computed = [round(10 ** (1 + i / 24)) for i in range(24)]
    assert sorted(set(preferred_values("E24")) - set(computed)) == [27, 30, 33, 36, 39, 43, 47, 82]


def test_e192_exception_and_index_91() -> None:
    # IEC 60063: 920 in place of the computed 919; the value at index 91 is 298.
    values = preferred_values("E192")
    assert values[185] == 920
    assert 919 not in values
    assert values[91] == 298
    assert [i for i in range(192) if values[i] != round(10 ** (2 + i / 192))] == [185]


@pytest.mark.parametrize("series", SERIES)
def test_against_eseries(series: str) -> None:
    import eseries  # type: ignore[import-untyped]

    # eseries 1.2.1, which holds the tables of IEC 60063 digit by digit.
    assert preferred_values(series) == tuple(eseries.series(getattr(eseries, series)))
