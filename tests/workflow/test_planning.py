"""Ranking: what is shown, what is chosen, and what must never be dropped."""

from makers import BRIEF, brief

from tcplan.network import legs
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
