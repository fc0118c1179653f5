"""A trim in words: the figures of the trim, rounded as everywhere."""

import pytest
from makers import by_name, film, leg, need_of

from tcplan.brief.model import Trim
from tcplan.goal import Limit
from tcplan.made import PlainLeg
from tcplan.network import Series, legs, value
from tcplan.parts.trim import trim_plan
from tcplan.process import INDEPENDENT
from tcplan.spec.trim_text import trim_text

NETWORK = Series((leg("pp", 12e3), leg("np", 6e3)))


def said(trim):
    materials = by_name(
        film("pp", -150.0, 0.5, value_percent=15.0, tc1_spread_ppm=40.0),
        film("np", 310.0, 0.4, value_percent=15.0, tc1_spread_ppm=40.0),
    )
    made = [
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


@pytest.mark.parametrize("method", ["one-temperature", "cut"])
def test_every_sentence_ends(method):
    trim = Trim(method=method, largest_cut=0.9)
    assert all(sentence.endswith(".") and "nan" not in sentence for sentence in said(trim)[1])
