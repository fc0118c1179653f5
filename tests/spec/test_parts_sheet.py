"""What is said of a made plan: which labels there are, in which order, and which notes for which parts."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from tcplan.brief import parse_brief
from tcplan.parts.record import MadePlan
from tcplan.spec.parts_sheet import facts
from tcplan.workflow.making import PartsRules, make_parts
from tcplan.workflow.planning import make_plan

HEAD = """
schema = 1
title = "Invented resistor"
[temperature]
low = "-40 degC"
high = "125 degC"
reference = "25 degC"
[goal]
drift = "{limit}"
judge = "worst-case"
"""
SLATE = """
[material.slate]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "200 degC"]
tc1 = "-150 ppm/K"
ohm_per_square = "300 ohm"
[material.slate.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "20 ppm/K"
"""
DRAWN = """
[material.slate.film]
min_width = "2 um"
end_resistance = "60 ohm*um"
end_tc1 = "-1900 ppm/K"
"""
FLAT = """
[material.flat]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "20 ppm/K"
series = "E96"
[material.flat.spread]
meaning = "limits"
value = "0.1 %"
tcr = "25 ppm/K"
"""
WIRE = """
[material.up]
source = "invented"
reference = "20 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-90 ppm/K"
ohm_per_metre = "13.8 ohm/m"
[material.up.spread]
meaning = "limits"
ohm_per_metre = "2 %"
tc1 = "10 ppm/K"
"""
COIL = """
[material.coil]
source = "invented"
reference = "20 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "3930 ppm/K"
[material.coil.spread]
meaning = "limits"
value = "2 %"
tc1 = "30 ppm/K"
"""
OPERATING = """
[operating]
voltage = "6 V"
"""
SIZES = "W is the drawn width, across the current; L is along it, between the inner edges of the ends."


def made_of(
    network: str, more: str, *, value: str = '"12 kohm"', limit: str = "3 %", scaled: bool = False
) -> MadePlan:
    given = f'[given]\n{"scaled = true" if scaled else ""}\nnetwork = "{network}"\n'
    text = f"{HEAD.format(limit=limit)}[resistor]\nvalue = {value}\n{given}{more}"
    return make_parts(make_plan(parse_brief(text, "brief.toml", Path())), PartsRules())


def said(made: MadePlan) -> dict[str, tuple[str, ...]]:
    return dict(facts(made))


@pytest.fixture(scope="module")
def drawn() -> MadePlan:
    return made_of("slate 12 kohm", OPERATING + SLATE + DRAWN)


def test_the_order_of_the_labels(drawn: MadePlan) -> None:
    labels = [label for label, _ in facts(drawn)]
    assert labels == ["Reaches", "Units", "Carries", "Note", "Assumed"]
    mixed = made_of("flat 9 kohm + up 3 kohm", FLAT + WIRE)
    assert [label for label, _ in facts(mixed)] == ["Reaches", "Buy", "Cut", "Note", "Assumed"]


def test_every_sentence_says_something(drawn: MadePlan) -> None:
    for _, texts in facts(drawn):
        assert texts
        assert all(text.strip() for text in texts)


def test_a_drawn_film_says_from_which_edges_it_is_measured(drawn: MadePlan) -> None:
    assert any(note.startswith(SIZES) for note in said(drawn)["Note"])
    bought = made_of("flat 12 kohm", FLAT)
    assert not any(note.startswith(SIZES) for note in said(bought)["Note"])


def test_bought_parts_and_wire_say_what_varies() -> None:
    """12 kohm to 0.1 % are two E96 values; the wire of 3 kohm is 3000/(13.8 (1 - 90e-6 * 5)) m."""
    notes = said(made_of("flat 9 kohm + up 3 kohm", FLAT + WIRE))
    assert "As made, every bought part varies on its own, within its tolerance and its TCR." in notes["Note"]
    assert "As made, the error of a cut, 500 um, is part of the tolerance of the wire." in notes["Note"]
    [cut] = notes["Cut"]
    metres = 3000 / (13.8 * (1 - 90e-6 * 5))
    assert cut.startswith("1 x ")
    assert float(cut.split(" ")[2]) == pytest.approx(metres, abs=0.5e-3 + 1e-9)
    assert " of up (up), 3 kohm at 25 degC by 13.79 ohm/m" in cut
    assert all(" of flat (flat): E96, " in line for line in notes["Buy"])


def test_what_has_no_size_is_told_unless_it_is_given() -> None:
    loose = said(made_of("coil 1 kohm + flat 11 kohm", COIL + FLAT, limit="20 %"))
    told = "No ohm_per_square, ohm_per_metre or series is stated for coil: it stays as it is."
    assert told in loose["Note"]
    text = HEAD.format(limit="20 %") + '[resistor]\nvalue = "12 kohm"\n'
    text += '[[fixed]]\nmaterial = "coil"\nvalue = "1 kohm"\n[search]\nuse = ["flat"]\n' + COIL + FLAT
    fixed = make_parts(make_plan(parse_brief(text, "brief.toml", Path())), PartsRules())
    assert told not in said(fixed)["Note"]


def test_a_film_without_what_is_needed_to_draw_it_is_told() -> None:
    notes = said(made_of("slate 12 kohm", SLATE))["Note"]
    assert notes[0] == "No unit cell without [material.slate.film]: slate stays as it is."
    assert not any(note.startswith(SIZES) for note in notes)


def test_several_values_are_told_apart() -> None:
    made = made_of("slate 12 kohm", OPERATING + SLATE + DRAWN, value='["12 kohm", "24 kohm"]', scaled=True)
    lines = said(made)
    starts = [text.split(" ideal")[0] for text in lines["Reaches"] if " ideal" in text]
    assert starts == ["12 kohm:", "24 kohm:"]
    assert [text for text in lines["Carries"] if text.endswith("kohm:")] == ["12 kohm:", "24 kohm:"]
    assert len(lines["Units"]) == 1  # one unit cell for all


def test_the_load_is_by_hand(drawn: MadePlan) -> None:
    """V^2/R of both falling laws is most where it is hottest, at 125 degC."""
    carries = said(drawn)["Carries"]
    assert carries[0].startswith("Each leg at the operating point, the most over the range")
    leg = drawn.parts.made[0].legs[0]
    own = drawn.loads[0][0]
    unit = leg.unit  # type: ignore[union-attr]
    hot = unit.body_ohms * (1 - 150e-6 * 100) + unit.ends_ohms * (1 - 1900e-6 * 100)
    ohms = hot * leg.in_series / leg.in_parallel  # type: ignore[union-attr]
    assert own.power == pytest.approx(36.0 / ohms, rel=1e-9)
    assert carries[1].startswith("a: 6 V, ")


def test_a_mix_found_again_is_told(drawn: MadePlan) -> None:
    one = drawn.parts.made[0]
    moved = replace(one, legs=(replace(one.legs[0], wanted_ohms=12_100.0),))
    parts = replace(drawn.parts, made=(moved,))
    told = "The mix was found again with the ends in it: legs differ from those of the plan."
    assert told in said(replace(drawn, plan=replace(drawn.plan, parts=parts)))["Note"]
    assert told not in said(drawn)["Note"]


def test_a_free_total_that_was_moved_is_told() -> None:
    """The least total is at its limit; with an error of the cut it is beyond, so it has to grow."""
    text = HEAD.format(limit="2 %") + '[resistor]\nvalue = "free"\n[[fixed]]\nmaterial = "coil"\n'
    text += 'value = "400 ohm"\n[search]\nuse = ["up"]\n' + COIL + WIRE
    rules = PartsRules(cut_error=0.1)
    made = make_parts(make_plan(parse_brief(text, "brief.toml", Path())), rules)
    assert made.verdict == "MET"
    whole = sum(leg.wanted_ohms for leg in made.parts.made[0].legs)
    by = whole / sum(leg["ohms"] for leg in made.ideal.to_dict()["legs"]) - 1
    [told] = [note for note in said(made)["Note"] if note.startswith("The total is free")]
    assert float(told.split("moved by ")[1].split(" %")[0]) == pytest.approx(by * 100, rel=5e-3)
    assert by > 0.0
    whole_total = made_of("up 12 kohm", WIRE)
    assert not any("free" in note for note in said(whole_total)["Note"])


def test_why_it_misses_is_told_after_what_it_reaches(drawn: MadePlan) -> None:
    stopped = replace(drawn, stops="The ends of the units stop it.")
    assert [label for label, _ in facts(stopped)][:2] == ["Reaches", "Stops"]
    assert said(stopped)["Stops"] == ("The ends of the units stop it.",)


def test_what_is_said_is_text_for_any_format(drawn: MadePlan) -> None:
    """No marks of a format: writers escape it for theirs."""
    assert json.loads(json.dumps(facts(drawn))) == [[label, list(texts)] for label, texts in facts(drawn)]
    assert "Power parts can burn." in said(drawn)["Assumed"]
