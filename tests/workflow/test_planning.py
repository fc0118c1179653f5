"""Ranking: what is shown, what is chosen, and what must never be dropped."""

import pytest
from makers import BRIEF, brief

from tcplan.network import legs, value
from tcplan.workflow.planning import make_plan

PAIR = """
[material.a]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc2 = "0.503 ppm/K^2"
tc1 = "0 ppm/K"
[material.b]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "-50.5 ppm/K"
tc2 = "1.0 ppm/K^2"
"""


def test_an_option_that_meets_the_limit_gives_way_to_none_that_does_not():
    """a alone reaches 5030 ppm by hand (0.503 * 100^2), a mix within 1 % of it, the limit between them."""
    text = BRIEF.replace("6000 ppm", "5000 ppm").replace("150 degC", "125 degC") + PAIR
    plan = make_plan(brief(text))
    assert plan.best.verdict == "MET"
    single = next(o for o in plan.options if o.arrangement == "single")
    assert single.nominal.peak_ppm > 5000 > plan.best.proof.figure_ppm


def test_the_simplest_that_meets_the_limit_is_chosen():
    text = BRIEF.replace("6000 ppm", "9000 ppm").replace("150 degC", "125 degC") + PAIR
    plan = make_plan(brief(text))
    assert len(legs(plan.best.network)) == 1
    assert plan.best.verdict == "MET"


def test_options_are_ranked_by_the_judged_figure():
    plan = make_plan(brief(BRIEF + PAIR))
    figures = [option.proof.figure_ppm for option in plan.options]
    assert figures == sorted(figures)


def films(count):
    return "".join(
        f"""
[material.m{k}]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "{-900 + 400 * k} ppm/K"
tc2 = "{0.2 + 0.01 * k:.2f} ppm/K^2"
"""
        for k in range(count)
    )


def test_what_is_too_much_to_search_is_said():
    text = BRIEF + "[search]\nmax_legs = 6\nmax_materials = 3\n" + films(7)
    note = next(note for note in make_plan(brief(text)).notes if note.startswith("Too many mixed"))
    assert "at most 4 legs" in note or "at most 5 legs" in note


def test_a_mixed_network_that_is_best_without_its_nodes_falls_back():
    """All slopes fall: the flattest film alone is the limit of every mixed network of them."""
    falling = films(3).replace('tc1 = "300', 'tc1 = "-1300').replace('tc1 = "-100', 'tc1 = "-700')
    assert 'tc1 = "-100' not in falling
    plan = make_plan(brief(BRIEF + '[search]\narrangements = ["mixed"]\n' + falling))
    single = make_plan(brief(BRIEF + '[search]\narrangements = ["single"]\n' + falling))
    assert plan.best.proof.figure_ppm <= single.best.proof.figure_ppm * (1 + 1e-6)


def test_a_small_search_leaves_nothing_out():
    assert not any("Too many" in note for note in make_plan(brief(BRIEF + PAIR)).notes)


def test_the_total_beside_a_fixed_member_is_exact():
    text = BRIEF + films(5) + '[[fixed]]\nmaterial = "m0"\nvalue = "2 kohm"\n'
    for place, total, kinds in (
        ("series", "18 kohm", {"series", "mixed"}),
        ("parallel", "500 ohm", {"parallel", "mixed"}),
    ):
        made = make_plan(brief(text.replace("18 kohm", total) + f'place = "{place}"\n'))
        assert {option.arrangement for option in made.options} == kinds
        for option in made.options:
            assert value(option.network) == pytest.approx(made.target.ohms, rel=1e-12)
            assert any(leg.ohms == pytest.approx(2000.0, rel=1e-12) for leg in legs(option.network))
