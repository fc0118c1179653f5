"""Parts in words: every figure against one worked by hand."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from makers import by_name, film

from tcplan.brief import parse_brief
from tcplan.made import FilmLeg, FilmUnit, PlainLeg, StockLeg, WireLeg
from tcplan.parts.films import FilmChoice
from tcplan.parts.record import FilmWay, Load, MadePlan
from tcplan.plan import MadeValue
from tcplan.spec.parts_text import (
    HEAD,
    WAYS_HEAD,
    against_ideal,
    buying,
    cutting,
    leg_row,
    load_text,
    made_of,
    made_text,
    unit_sentences,
    units_text,
    way_row,
)
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan

REFERENCE = 298.15
UNIT = FilmUnit(  # 100 ohm per square: 5 um x 2 um is 2.5 squares, 250 ohm; the ends are 1/26 of the whole
    material="slate", width=2e-6, length=5e-6, body_ohms=250.0, ends_ohms=10.0, area=13e-12
)
MATERIALS = by_name(film("slate", -150.0), film("ochre", 300.0))


def drawn(
    name: str = "a", series: int = 4, parallel: int = 1, mismatch: float | None = None, unit: FilmUnit = UNIT
) -> FilmLeg:
    return FilmLeg(
        id=name,
        material=unit.material,
        wanted_ohms=1000.0,
        unit=unit,
        in_series=series,
        in_parallel=parallel,
        mismatch=mismatch,
    )


def stock(*values: float, joined: str = "one", name: str = "b") -> StockLeg:
    return StockLeg(id=name, material="flat", wanted_ohms=1234.5, values=values, joined=joined)  # type: ignore[arg-type]


def wire(length: float, name: str = "c", material: str = "up") -> WireLeg:
    return WireLeg(id=name, material=material, wanted_ohms=300.0, length=length, ohm_per_metre=13.8)


def plain(name: str = "d") -> PlainLeg:
    return PlainLeg(id=name, material="coil", wanted_ohms=412.0)


PLAN = """
schema = 1
title = "Invented resistor"
[resistor]
value = "12 kohm"
[temperature]
low = "-40 degC"
high = "125 degC"
reference = "25 degC"
[goal]
drift = "9000 ppm"
judge = "worst-case"
[given]
network = "flat 7.5 kohm + flat 4.5 kohm"
[material.flat]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "40 ppm/K"
series = "E24"
[material.flat.spread]
meaning = "limits"
value = "1 %"
tcr = "25 ppm/K"
"""


def made_plan(text: str = PLAN, *, pairs: bool = False) -> MadePlan:
    return make_parts(make_plan(parse_brief(text, "brief.toml", Path())), PartsRules(pairs=pairs))


@pytest.fixture(scope="module")
def made() -> MadePlan:
    return made_plan()


def value_of(made: MadePlan, *legs: object, target: float = 12e3) -> MadeValue:
    """Return what is made at a value, with other legs: only their words are looked at."""
    option = made.parts.made[0].option
    return MadeValue(target_ohms=target, value_error=0.0, legs=legs, option=option)  # type: ignore[arg-type]


# --- legs ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("leg", "words"),
    [
        (drawn(series=1), "1 unit"),
        (drawn(series=4), "4 units in series"),
        (drawn(series=1, parallel=3), "1 unit each, 3 strings in parallel"),
        (drawn(series=2, parallel=3), "2 units in series each, 3 strings in parallel"),
        (stock(1200.0), "1.2 kohm"),
        (stock(1000.0, 220.0, joined="series"), "1 kohm + 220 ohm"),
        (stock(1000.0, 2200.0, joined="parallel"), "1 kohm || 2.2 kohm"),
        (wire(21.734), "21.734 m of wire"),
        (plain(), "as it is"),
    ],
)
def test_what_a_leg_is_made_of(leg: object, words: str) -> None:
    assert made_of(leg) == words  # type: ignore[arg-type]


def test_a_row_is_as_wide_as_its_head() -> None:
    """4 units of 260 ohm are 1040 ohm; 1k || 2k2 is 687.5 ohm; 412 ohm stay."""
    assert leg_row(drawn()) == ("a", "slate", "1 kohm", "1.04 kohm", "4 units in series")
    row = leg_row(stock(1000.0, 2200.0, joined="parallel"))
    assert row == ("b", "flat", "1.234 kohm", "687.5 ohm", "1 kohm || 2.2 kohm")
    assert leg_row(plain()) == ("d", "coil", "412 ohm", "412 ohm", "as it is")
    assert len(HEAD) == len(row)


# --- units -----------------------------------------------------------------------------------------------


def test_a_unit_in_a_sentence() -> None:
    """6 units of 13 um^2; the ends are 10 of 260 ohm, 3.846 %; matching is told where it is known."""
    [text] = unit_sentences([drawn("a", mismatch=4.72e-4), drawn("b", series=2)], MATERIALS, REFERENCE)
    assert text == (
        "slate: W 2 um, L 5 um, 2.5 squares, 260 ohm a unit, ends 3.846 % of it; 6 units, 78 um^2; "
        "mismatch of a leg, sigma: a 472 ppm."
    )


def test_without_ends_or_matching_nothing_is_said_of_them() -> None:
    bare = FilmUnit(material="ochre", width=1e-6, length=3e-6, body_ohms=300.0, ends_ohms=0.0, area=4.8e-12)
    [text] = unit_sentences([drawn(series=1, unit=bare)], MATERIALS, REFERENCE)
    assert text == "ochre: W 1 um, L 3 um, 3 squares, 300 ohm a unit; 1 unit, 4.8 um^2; mismatch not known."


def test_one_sentence_for_each_film_over_all_values(made: MadePlan) -> None:
    ochre = FilmUnit(material="ochre", width=1e-6, length=3e-6, body_ohms=300.0, ends_ohms=0.0, area=4.8e-12)
    one = value_of(made, drawn("a", mismatch=5e-4), drawn("b", unit=ochre), stock(1e3), target=1e3)
    two = value_of(made, drawn("a", series=8, mismatch=2.5e-4), drawn("b", unit=ochre), target=2e3)
    slate, other = units_text([one, two], MATERIALS, REFERENCE)
    assert "12 units, 156 um^2" in slate
    assert slate.endswith("a of 1 kohm 500 ppm, a of 2 kohm 250 ppm.")
    assert other.startswith("ochre: ")
    assert units_text([value_of(made, stock(1e3))], MATERIALS, REFERENCE) == ()


# --- lists -----------------------------------------------------------------------------------------------


def test_what_to_buy_and_what_to_cut(made: MadePlan) -> None:
    one = value_of(made, stock(1e3, 2.2e3, joined="series"), wire(7.243), wire(21.734))
    two = value_of(made, stock(1e3), wire(7.243), wire(1.5, material="down"), plain())
    flat = made.plan.by_name["flat"]
    sold = {"flat": replace(flat, label="Chip, 1 %")}
    traded = "of flat (Chip, 1 %): E24, 1 % or closer, TCR within 25 ppm/K of its nominal"
    assert buying([one, two], (), sold) == (f"2 x 1 kohm {traded}", f"1 x 2.2 kohm {traded}")
    spools = {name: replace(flat, name=name, label=f"Spool {name}") for name in ("up", "down")}
    assert cutting([one, two], spools, 25.0) == (  # 13.8 ohm/m: 20.7, 299.9 and 99.95 ohm
        "1 x 1.5 m of down (Spool down), 20.7 ohm at 25 degC by 13.8 ohm/m",
        "1 x 21.734 m of up (Spool up), 299.9 ohm at 25 degC by 13.8 ohm/m",
        "2 x 7.243 m of up (Spool up), 99.95 ohm at 25 degC by 13.8 ohm/m",
    )
    other = value_of(made, plain())
    assert buying([other], (), sold) == cutting([other], spools, 25.0) == ()


def test_the_power_of_a_part_is_its_own_not_that_of_its_leg(made: MadePlan) -> None:
    """2 mA through 1 kohm + 2.2 kohm: 4 and 8.8 mW. 3 V across 1 kohm || 2.2 kohm: 9 and 4.09 mW."""
    flat = {"flat": made.plan.by_name["flat"]}
    for joined, load, powers in (
        (
            "series",
            Load(leg="b", voltage=6.4, current=2e-3, power=12.8e-3, temperature=398.15),
            ("4 mW", "8.8 mW"),
        ),
        (
            "parallel",
            Load(leg="b", voltage=3.0, current=4.36e-3, power=13.1e-3, temperature=398.15),
            ("9 mW", "4.09 mW"),
        ),
    ):
        told = buying([value_of(made, stock(1e3, 2.2e3, joined=joined))], [[load]], flat)
        ends = [text.rsplit(", at most ", 1)[1] for text in told]
        assert ends == [f"{power} each" for power in powers], joined


def test_what_a_leg_carries() -> None:
    """82.6 A/m of width is 0.0826 mA/um."""
    loads = [
        Load(leg="a", voltage=5.0, current=1.652e-4, power=8.26e-4, temperature=398.15, density=82.6),
        Load(leg="b", voltage=0.25, current=1e-3, power=2.5e-4, temperature=398.15),
    ]
    assert load_text(loads) == (
        "a: 5 V, 165.2 uA, 826 uW, 125 degC, 0.0826 mA/um of width",
        "b: 250 mV, 1 mA, 250 uW, 125 degC",
    )


def test_a_way_to_draw_the_films() -> None:
    choice = FilmChoice(unit=UNIT, legs=(drawn(),), area=52e-12, error=4e-4)
    other = FilmUnit(material="ochre", width=1e-6, length=3e-6, body_ohms=300.0, ends_ohms=0.0, area=4.8e-12)
    others = FilmChoice(unit=other, legs=(), area=48e-12, error=9.5e-4)
    way = FilmWay(choices=(choice, others), figure=7.6412e-3, area=130e-12)  # of the arrays, with dummies
    row = way_row(way, taken=True)
    # a worst case is rounded outward to 3 digits (docs/plan.md)
    assert row == ("*", "130 um^2", "7650 ppm", "0.095 %", "slate 2 um x 5 um, ochre 1 um x 3 um")
    assert way_row(way, taken=False)[0] == " "
    assert len(row) == len(WAYS_HEAD)


# --- against the ideal -----------------------------------------------------------------------------------


def test_beside_the_ideal_one(made: MadePlan) -> None:
    """40 ppm/K at 100 K is 4000 ppm; all parts at their TCR limit, 25 ppm/K more, 6500 ppm.

    Both parts are of E24 (IEC 60063), of which no two make 12 kohm to 0.1 %.
    """
    one = made.parts.made[0]
    values = sorted(value for leg in one.legs for value in leg.values)  # type: ignore[union-attr]
    e24 = (3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6, 6.2, 6.8, 7.5, 8.2, 9.1)
    assert all(value / 1e3 in e24 for value in values)
    error = sum(values) / 12e3 - 1
    assert 1e-3 < abs(error) < 0.02
    sentences = against_ideal(made.ideal, one)
    assert sentences[0] == "Ideal 4000 ppm nominal, as made 4000 ppm."
    assert sentences[1] == "Ideal 6500 ppm in the worst case, as made 6500 ppm."
    assert sentences[2].startswith("The value as made is ")
    told = float(sentences[2].split(", ")[1].removesuffix(" % off."))
    assert told == pytest.approx(error * 100, abs=5e-3)
    assert against_ideal(made.ideal, one, several=True)[0].startswith("12 kohm: ideal 4000 ppm nominal")


def test_a_worst_case_that_is_not_known_is_told(made: MadePlan) -> None:
    """Ideal materials state their spreads; a part without one leaves the made worst case open."""
    one = made.parts.made[0]
    without = replace(one, option=replace(one.option, worst_case=None))
    assert "The worst case as made is not stated: a part of it states no spread." in against_ideal(
        made.ideal, without
    )
    bare = replace(made.ideal, worst_case=None)
    assert len(against_ideal(bare, without)) == 2


def test_a_bound_that_leaves_it_open_is_told(made: MadePlan) -> None:
    """Where nothing hangs on the bound, or it differs by rounding only, it is not told."""
    one = made.parts.made[0]
    worst = one.option.worst_case
    assert worst is not None

    def told(bound_ppm: float, verdict: str) -> str:
        option = replace(
            one.option,
            worst_case=replace(worst, upper_bound_ppm=bound_ppm),
            verdict=verdict,  # type: ignore[arg-type]
        )
        return against_ideal(made.ideal, replace(one, option=option))[1]

    plain = "Ideal 6500 ppm in the worst case, as made 6500 ppm"
    assert told(9123.0, "NOT JUDGED") == f"{plain} found, at most 9130 ppm guaranteed."
    assert told(9123.0, "MET") == told(worst.peak_ppm * (1 + 1e-4), "NOT JUDGED") == f"{plain}."


def test_the_made_network_in_words(made: MadePlan) -> None:
    text = made_text(made.parts.made[0].option)
    assert "flat_a1 " in text
    assert "flat_b1 " in text
    assert text.count(" + ") == 1
