"""What an option is made of: values of each kind of leg, exact values, and the way to plain data and back."""

import json
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tcplan.made import (
    MOST_COUNT,
    FilmLeg,
    FilmUnit,
    PlainLeg,
    StockLeg,
    WireLeg,
    exact,
    leg_from_dict,
    leg_to_dict,
)

sizes = st.floats(min_value=1e-15, max_value=1e12)
counts = st.integers(min_value=1, max_value=64)
names = st.text("abcdefgh_", min_size=1, max_size=12)
units = st.builds(
    FilmUnit,
    material=st.just("pp"),
    width=sizes,
    length=sizes,
    body_ohms=sizes,
    ends_ohms=st.just(0.0) | sizes,
    area=sizes,
)
films = st.builds(
    FilmLeg,
    id=names,
    material=st.just("pp"),
    wanted_ohms=sizes,
    unit=units,
    in_series=counts,
    in_parallel=counts,
    mismatch=st.none() | sizes,
)
singles = st.builds(
    StockLeg,
    id=names,
    material=names,
    wanted_ohms=sizes,
    values=st.tuples(sizes),
    joined=st.just("one"),
)
pairs = st.builds(
    StockLeg,
    id=names,
    material=names,
    wanted_ohms=sizes,
    values=st.tuples(sizes, sizes),
    joined=st.sampled_from(["series", "parallel"]),
)
wires = st.builds(WireLeg, id=names, material=names, wanted_ohms=sizes, length=sizes, ohm_per_metre=sizes)
plain = st.builds(PlainLeg, id=names, material=names, wanted_ohms=sizes)
all_legs = films | singles | pairs | wires | plain

FILM = FilmLeg(
    id="a",
    material="pp",
    wanted_ohms=6000.0,
    unit=FilmUnit(material="pp", width=2e-6, length=1e-5, body_ohms=1600.0, ends_ohms=40.0, area=2.6e-11),
    in_series=11,
    in_parallel=3,
    mismatch=1e-3,
)
STOCK = StockLeg(id="b", material="flat", wanted_ohms=900.0, values=(1000.0, 9100.0), joined="parallel")
WIRE = WireLeg(id="c", material="up", wanted_ohms=25.0, length=2.0, ohm_per_metre=12.5)
PLAIN = PlainLeg(id="d", material="coil", wanted_ohms=412.0)


@given(all_legs)
def test_a_leg_comes_back_from_the_text_of_its_data(leg):
    assert leg_from_dict(json.loads(json.dumps(leg_to_dict(leg)))) == leg


def test_values_by_hand():
    # (1600 + 40) * 11/3 = 6013.33 ohm in 33 units of 26 um^2; 1000 || 9100 = 9100/10.1; 2 m of 12.5 ohm/m.
    assert FILM.ohms == pytest.approx(1640 * 11 / 3, rel=1e-15)
    assert (FILM.units, FILM.area) == (33, pytest.approx(33 * 2.6e-11, rel=1e-15))
    assert STOCK.ohms == pytest.approx(9100 / 10.1, rel=1e-15)
    assert replace(STOCK, joined="series").ohms == 10100.0
    assert replace(STOCK, values=(1000.0,), joined="one").ohms == 1000.0
    assert WIRE.ohms == 25.0
    assert PLAIN.ohms == 412.0


def test_the_data_hold_the_value_as_made():
    for leg in (FILM, STOCK, WIRE, PLAIN):
        row = leg_to_dict(leg)
        assert row["ohms"] == leg.ohms
        assert (row["id"], row["material"], row["wanted_ohms"]) == (leg.id, leg.material, leg.wanted_ohms)
    assert [leg_to_dict(leg)["kind"] for leg in (FILM, STOCK, WIRE, PLAIN)] == [
        "film",
        "stock",
        "wire",
        "plain",
    ]


@given(all_legs, st.floats(min_value=1e-3, max_value=1e9))
def test_an_exact_leg_has_the_value(leg, ohms):
    assert exact(leg, ohms).ohms == pytest.approx(ohms, rel=1e-12)
    assert type(exact(leg, ohms)) is type(leg)


def test_an_exact_leg_keeps_what_its_parts_share():
    made = exact(FILM, 12345.0)
    assert made.unit.ends_ohms / made.unit.ohms == pytest.approx(40 / 1640, rel=1e-15)
    assert (made.in_series, made.in_parallel, made.unit.width) == (11, 3, 2e-6)
    assert exact(STOCK, 77.0).values[0] / exact(STOCK, 77.0).values[1] == pytest.approx(10 / 91, rel=1e-15)
    assert exact(WIRE, 5.0).length == pytest.approx(0.4, rel=1e-15)


@pytest.mark.parametrize(
    ("leg", "change"),
    [
        (FILM, {"kind": "foil"}),
        (FILM, {"kind": "stock"}),
        (FILM, {"in_series": 0}),
        (FILM, {"in_series": 2.0}),
        (FILM, {"in_parallel": True}),
        (FILM, {"in_parallel": MOST_COUNT + 1}),
        (FILM, {"unit_ends_ohms": -1.0}),
        (FILM, {"unit_ends_ohms": False}),
        (FILM, {"unit_body_ohms": 0.0}),
        (FILM, {"width_m": "2 um"}),
        (FILM, {"mismatch": 0.0}),
        (STOCK, {"values_ohms": []}),
        (STOCK, {"values_ohms": [1000.0]}),
        (STOCK, {"values_ohms": [1000.0, 9100.0, 1.0]}),
        (STOCK, {"values_ohms": "12"}),
        (STOCK, {"values_ohms": 12}),
        (STOCK, {"values_ohms": [10**400, 1.0]}),
        (STOCK, {"joined": "one"}),
        (STOCK, {"joined": "star"}),
        (STOCK, {"joined": ["series"]}),
        (WIRE, {"length_m": float("inf")}),
        (WIRE, {"length_m": float("nan")}),
        (WIRE, {"ohm_per_metre": None}),
        (PLAIN, {"wanted_ohms": True}),
        (PLAIN, {"wanted_ohms": "412"}),
        (PLAIN, {"wanted_ohms": 10**400}),
    ],
)
def test_what_is_no_leg_is_refused(leg, change):
    with pytest.raises((KeyError, TypeError, ValueError)):
        leg_from_dict(leg_to_dict(leg) | change)


@pytest.mark.parametrize("leg", [FILM, STOCK, WIRE, PLAIN])
def test_every_entry_is_needed(leg):
    row = leg_to_dict(leg)
    for key in set(row) - {"ohms"}:
        with pytest.raises(KeyError):
            leg_from_dict({k: v for k, v in row.items() if k != key})
