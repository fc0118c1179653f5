"""The parts of a ratio in words."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from tcplan.brief import parse_brief, read_brief
from tcplan.made import PlainLeg, WireLeg
from tcplan.parts.record import MadeRatio
from tcplan.ratio.mismatch import Mismatch
from tcplan.spec.ratio_parts_text import against_ideal, ratio_facts
from tcplan.workflow.made_ratio import make_ratio_parts
from tcplan.workflow.made_task import PartsRules

EXAMPLE = Path(__file__).parents[2] / "examples" / "sense_divider" / "brief.toml"
STOCK = """
schema = 1
title = "Invented pair"
[temperature]
low = "-40 degC"
high = "125 degC"
reference = "25 degC"
[goal]
drift = "9000 ppm"
judge = "worst-case"
[ratio]
kind = "gain"
first = "flat 9.09 kohm"
second = "flat 1 kohm"
[material.flat]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "0 ppm/K"
series = "E96"
[material.flat.spread]
meaning = "limits"
value = "0.1 %"
tcr = "25 ppm/K"
"""


@pytest.fixture(scope="module")
def divider() -> MadeRatio:
    return make_ratio_parts(read_brief(EXAMPLE), PartsRules())


@pytest.fixture(scope="module")
def bought() -> MadeRatio:
    return make_ratio_parts(parse_brief(STOCK, "brief.toml", Path()), PartsRules())


def test_an_exact_ratio_is_off_by_nothing(divider: MadeRatio) -> None:
    """9 units over 1; sides 3 ppm/K apart give 0.9 * 300 ppm at 100 K, and a little of second order."""
    value, nominal, worst, mismatch = against_ideal(divider)
    assert value == "The ratio as made is 0.1, 0 ppm off 0.1."
    assert nominal == "Ideal 0 ppm nominal, as made 0 ppm."
    words = worst.split()
    assert worst.startswith("Ideal ")
    assert words[1] == words[9]  # the ideal, and as made
    assert float(words[1]) == pytest.approx(270.0, rel=0.02)
    first, second = divider.first[0].mismatch, divider.second[0].mismatch  # type: ignore[union-attr]
    sigma = 0.9 * (first**2 + second**2) ** 0.5 * 1e6
    told = float(mismatch.removeprefix("Mismatch of the ratio as made: ").split(" ppm")[0])
    assert mismatch.endswith("1 sigma.")
    assert told == pytest.approx(sigma, rel=5e-3)
    assert told >= sigma  # rounded outward


def test_bought_parts_of_a_ratio(bought: MadeRatio) -> None:
    """1.0025/0.9975 - 1 is 5013 ppm at 100 K: |dR/R| <= k |x|, each part with its own sign."""
    sentences = against_ideal(bought)
    assert sentences[0].endswith("0 ppm off 9.09.")  # both values are of E96 (IEC 60063)
    assert sentences[2] == "Ideal 0 ppm in the worst case, as made 5020 ppm."
    assert sentences[3] == "Mismatch is that of films: there is none here."


def test_an_error_has_its_sign_and_rounding_is_none(bought: MadeRatio) -> None:
    ideal = bought.ideal.value
    for factor, told in ((1.0 - 1.5e-3, "-1500 ppm"), (1.0 + 2.5e-6, "+2.5 ppm"), (1.0 + 2e-16, " 0 ppm")):
        made = replace(bought, checked=replace(bought.checked, value=ideal * factor))
        assert told in against_ideal(made)[0], told


def test_a_worst_case_that_is_not_known_is_left_out(bought: MadeRatio) -> None:
    made = replace(bought, checked=replace(bought.checked, worst=None))
    assert not any("worst case" in sentence for sentence in against_ideal(made))


def test_mismatch_is_told_where_it_is_known(divider: MadeRatio) -> None:
    for unstated, told in (
        ((), "Mismatch of the ratio as made: 124 ppm, 1 sigma."),
        (("other",), "Mismatch of the ratio as made: 124 ppm, 1 sigma."),
        (
            ("red_film",),
            "Mismatch of the ratio as made: 124 ppm, 1 sigma; red_film, of which no matching is stated, "
            "counts as matched.",
        ),
    ):
        known = Mismatch(value=1.234e-4, drift=0.0, at=None, unstated=unstated)
        made = replace(divider, checked=replace(divider.checked, mismatch=known))
        assert against_ideal(made)[-1] == told
    none = Mismatch(value=None, drift=None, at=None, unstated=("red_film",))
    made = replace(divider, checked=replace(divider.checked, mismatch=none))
    assert against_ideal(made)[-1] == "Its mismatch is not known: no matching is stated for red_film."


def opened(divider: MadeRatio, factor: float) -> MadeRatio:
    """Return the divider as if the bound of its worst case had stayed open by a factor."""
    worst = divider.checked.worst
    assert worst is not None
    far = replace(worst, upper=worst.judged.figure * factor, closed=False)
    return replace(divider, checked=replace(divider.checked, worst=far, verdict="NOT JUDGED"))


def test_an_open_bound_is_told_beside_what_is_found(divider: MadeRatio) -> None:
    """The limit of the example is 350 ppm, about 272 ppm are found."""
    sentences = against_ideal(opened(divider, 3.0))
    assert sentences[2].endswith(" in the worst case, as made 273 ppm found, 817 ppm at most.")
    assert sentences[3] == ("Not judged: what is found is within 350 ppm, what is possible at most is not.")


def test_why_a_ratio_is_not_judged(divider: MadeRatio) -> None:
    made = opened(divider, 1.0)
    pair = replace(made.checked.pair, spreads={})
    bare = replace(made, checked=replace(made.checked, pair=pair, worst=None))
    assert "Not judged: no spread is stated for red_film." in against_ideal(bare)
    need = made.checked.pair.need
    likely = replace(need, goal=replace(need.goal, judge="quantile"))
    lots = replace(made, checked=replace(made.checked, pair=replace(made.checked.pair, need=likely)))
    assert "Not judged: the limit is inside the 95 % interval of the quantile." in against_ideal(lots)
    free = replace(made.checked.pair, need=replace(need, scale=None))
    for good in (divider, replace(made, checked=replace(made.checked, pair=free))):
        assert not any(sentence.startswith("Not judged") for sentence in against_ideal(good))


def test_legs_that_are_far_off_are_told(bought: MadeRatio) -> None:
    """9.31 k over 1.02 k of E96 for 9.2 k over 1 k: +1.20 % and +2 %."""
    first = replace(bought.first[0], wanted_ohms=9200.0, values=(9310.0,))  # type: ignore[call-arg]
    second = replace(bought.second[0], values=(1020.0,))  # type: ignore[call-arg]
    made = replace(bought, first=(first,), second=(second,))
    assert against_ideal(made)[1] == (
        "Off what was asked by more than 0.1 %: a +1.2 %, 9.31 kohm for 9.2 kohm; "
        "b +2 %, 1.02 kohm for 1 kohm."
    )
    assert "b +2 %" in against_ideal(replace(made, error=0.015))[1]
    assert "a +1.2 %" not in against_ideal(replace(made, error=0.015))[1]
    assert not any("Off what was asked" in text for text in against_ideal(replace(made, error=0.03)))


def test_what_to_buy_and_what_to_cut_for_a_ratio(bought: MadeRatio) -> None:
    facts = dict(ratio_facts(bought))
    tail = "of flat (flat): E96, 0.1 % or closer, TCR within 25 ppm/K of its nominal"
    assert facts["Buy"] == (f"1 x 1 kohm {tail}", f"1 x 9.09 kohm {tail}")
    wire = WireLeg(id="a", material="flat", wanted_ohms=9.0, length=0.65, ohm_per_metre=13.8)
    cut = dict(ratio_facts(replace(bought, first=(wire,), second=(replace(wire, id="b"),))))
    assert cut["Cut"] == ("2 x 650 mm of flat (flat), 8.97 ohm at 25 degC by 13.8 ohm/m",)
    assert "Buy" not in cut


def test_labels_and_their_order(divider: MadeRatio, bought: MadeRatio) -> None:
    assert [label for label, _ in ratio_facts(divider)] == ["Reaches", "Units", "Assumed"]
    assert [label for label, _ in ratio_facts(bought)] == ["Reaches", "Buy", "Assumed"]
    facts = dict(ratio_facts(divider))
    assert facts["Reaches"] == against_ideal(divider)
    assert "Power parts can burn." in facts["Assumed"]
    plain = replace(divider, first=(PlainLeg(id="a", material="red_film", wanted_ohms=9e4),))
    count = divider.second[0].units  # type: ignore[union-attr]
    assert f"; {count} units, " in dict(ratio_facts(plain))["Units"][0]  # those of the second resistor


def test_both_sides_are_one_sentence_of_units(divider: MadeRatio) -> None:
    [text] = dict(ratio_facts(divider))["Units"]
    count = divider.first[0].units + divider.second[0].units  # type: ignore[union-attr]
    assert f"; {count} units, " in text
    assert "a " in text.split("sigma: ")[1]
    assert "b " in text.split("sigma: ")[1]
