"""A trim in words: the figures of the trim, rounded as everywhere."""

from dataclasses import replace

import pytest
from makers import by_name, film, leg, need_of

from tcplan.brief.model import Trim
from tcplan.goal import Limit
from tcplan.made import FilmLeg, FilmUnit, PlainLeg
from tcplan.network import Series, legs, value
from tcplan.parts.trim import Stat, trim_plan
from tcplan.process import INDEPENDENT
from tcplan.spec.trim_text import trim_text

NETWORK = Series((leg("pp", 12e3), leg("np", 6e3)))


def said(trim, made=None, label=""):
    materials = by_name(
        film("pp", -150.0, 0.5, value_percent=15.0, tc1_spread_ppm=40.0),
        film("np", 310.0, 0.4, value_percent=15.0, tc1_spread_ppm=40.0),
    )
    made = made or [
        PlainLeg(id=n, material=x.material, wanted_ohms=x.ohms)
        for n, x in zip("ab", legs(NETWORK), strict=True)
    ]
    plan = trim_plan(
        NETWORK,
        made,
        materials,
        {n: m.spread for n, m in materials.items()},
        INDEPENDENT,
        need_of(Limit(kind="drift", value=0.006)),
        trim,
        value(NETWORK),
        draws=400,
        seed=5,
        label=label,
    )
    return plan, trim_text(plan)


def test_codes_at_one_temperature():
    plan, sentences = said(Trim(method="one-temperature", step=2e-3))
    text = " ".join(sentences)
    assert "one temperature: the codes restore the mix of the films, and the value, 18 kohm." in text
    # By hand: 12 kohm from 1/1.15 to 1/0.85 is 3683 ohm, 20.5 % of the whole: 103 steps of 0.2 %, so 7 bits.
    bits, step = len(plan.rows[0].bit_ohms), 12e3 * (1 / 0.85 - 1 / 1.15)
    assert bits == 7
    assert f"Leg a (pp): 10.43 kohm and {bits} bits of {step / 127:.4g} ohm" in text
    assert step / 127 / 18e3 * 1e6 == pytest.approx(1611.05, abs=0.01)
    assert "least step 29 ohm, 1610 ppm of the whole." in text
    # A step is as many ohms of film in every device: 0.85 and 1.15 of 1611.05 ppm.
    assert "at most 1370 ppm of the whole in a device at -15 %, 1860 ppm at +15 %." in text
    assert "Leg a has no drawing: pp has no unit cell." in text
    assert "table of bits" not in text
    assert "drift of 400 devices (seed 5): before " in text
    assert "which one temperature can not trim." in sentences[-1]


def test_codes_at_two_temperatures():
    _, sentences = said(Trim(method="two-temperatures", temperatures=(298.15, 398.15)))
    assert sentences[0].startswith("Trim at 25 degC and 125 degC: ")
    assert "The slope left between the two is " in sentences[-1]
    assert not any("mix" in sentence for sentence in sentences)


def test_a_cut():
    _, sentences = said(Trim(method="cut", largest_cut=0.9))
    text = " ".join(sentences)
    # (18 - 6.9)/13.8 and (18 - 5.1)/(10.2 x 0.8043); 1/1.15 and 1.15/0.85 for the whole.
    assert "Draw leg a to 0.8043 of its nominal value (gain needed 1.572)." in text
    assert "aim at 0.8696 of target, gain 1.353." in text
    assert "After the cut leg a has a share of 66." in text
    assert "A cut of legs a and b instead: gain 1.353, 1.353; worst drift " in text
    assert "A cut of leg b instead: gain " in text
    assert "more than a cut may add" in text


def drawn(name, material, ohms):
    """Return 4 units of 10 squares, 2 um wide, without ends."""
    unit = FilmUnit(
        material=material, width=2e-6, length=2e-5, body_ohms=ohms / 4.0, ends_ohms=0.0, area=5e-11
    )
    return FilmLeg(id=name, material=material, wanted_ohms=ohms, unit=unit, in_series=4, in_parallel=1)


def test_what_is_drawn():
    made = [drawn("a", "pp", 12e3), drawn("b", "np", 6e3)]
    plan, sentences = said(Trim(method="one-temperature", step=2e-3), made)
    text = " ".join(sentences)
    # By hand: 12 kohm/1.15 is 34.78 squares of 300 ohm: 3 units of 10 squares and 4.782 of 2 um, 9.565 um.
    assert "Drawn 2 um wide: rest 1 string of 3 units and L 9.565 um; bit 1 " in text
    bits = plan.rows[0].bits
    # The least bit, about 29 ohm, of squares of 300 ohm: 11 strings at least.
    assert bits[0].strings == 11
    assert f"bit 1 11 strings of L {bits[0].length * 1e6:.6g} um, bit 7 1 string of L " in text
    assert sentences.count("Every bit is in the table of bits.") == 1
    # 2 um wide without spacing: the area is that of all lengths, strings counted.
    area = 2.0 * (60.0 + 9.565 + sum(bit.strings * bit.length * 1e6 for bit in bits))
    assert f"; {area:.4g} um^2 in all." in text


def test_which_resistor():
    for trim in (Trim(method="one-temperature"), Trim(method="cut", largest_cut=0.9)):
        plan, sentences = said(trim, label="40 kohm")
        assert sentences[0].startswith("Trim of 40 kohm ")
        assert trim_text(replace(plan, label=""))[0].startswith("Trim ")
    trim = Trim(method="two-temperatures", temperatures=(298.15, 398.15))
    assert said(trim, label="R2")[1][0].startswith("Trim of R2 at 25 degC and 125 degC: ")


def test_a_drift_that_the_switches_raise_says_so():
    plan, sentences = said(Trim(method="one-temperature", switch_resistance=150.0, switch_tc1=6e-3))
    assert plan.after.drift.median > plan.before.drift.median
    costs = [
        (getattr(plan.after.drift, name) - getattr(plan.ideal_switches, name)) * 1e6
        for name in ("median", "quantile", "worst")
    ]
    assert min(costs) > 100.0
    text = " ".join(sentences)
    found = text.split("before: the switches cost ")[1].split(". With the same codes")[0]
    assert [float(part.split(" ppm")[0]) for part in found.split(", ")] == pytest.approx(costs, rel=5e-3)
    lower = Stat(median=9.0, quantile=9.0, worst=9.0)
    assert "switches" not in " ".join(trim_text(replace(plan, before=replace(plan.before, drift=lower)))[:-1])
    assert "with switches of 0 ohm." in " ".join(trim_text(replace(plan, ideal_switches=None)))


@pytest.mark.parametrize("method", ["one-temperature", "cut"])
def test_every_sentence_ends(method):
    trim = Trim(method=method, largest_cut=0.9)
    assert all(sentence.endswith(".") and "nan" not in sentence for sentence in said(trim)[1])
