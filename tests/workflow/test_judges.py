"""The three judges: what each designs for, and what stands beside it."""

import numpy as np
import pytest
from makers import BRIEF, FILMS, SIX_FILMS, brief

from tcplan.errors import InputError
from tcplan.plan_file import plan_from_dict
from tcplan.workflow.planning import make_plan

SIX = "".join(
    f"""
[material.{name}]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
tc1 = "{tc1} ppm/K"
tc2 = "{tc2} ppm/K^2"
[material.{name}.spread]
meaning = "limits"
value = "{value} %"
tc1 = "{half} ppm/K"
"""
    for name, tc1, tc2, value, half in SIX_FILMS
)


def judged(judge, films=SIX, more="", limit="8000 ppm"):
    text = BRIEF.replace('drift = "6000 ppm"', f'drift = "{limit}"\njudge = "{judge}"')
    return make_plan(brief(text + more + films))


@pytest.fixture(scope="module")
def plans():
    return {judge: judged(judge) for judge in ("nominal", "worst-case", "quantile")}


def least(plan, figure):
    return min(figure(option) for option in plan.options)


def test_each_judge_is_best_at_its_own_figure(plans):
    worst = {judge: least(plan, lambda o: o.worst_case.peak_ppm) for judge, plan in plans.items()}
    likely = {judge: least(plan, lambda o: o.likely.peak_ppm) for judge, plan in plans.items()}
    nominal = {judge: least(plan, lambda o: o.nominal.figure_ppm) for judge, plan in plans.items()}
    assert worst["worst-case"] <= min(worst.values())
    assert likely["quantile"] <= min(likely.values()) * (1 + 1e-9)
    assert nominal["nominal"] <= min(nominal.values())
    assert worst["nominal"] > 1.2 * worst["worst-case"]


def test_the_prototype_s_worst_cases_are_found_and_proved(plans):
    """Independent prototype: 8898.83 ppm in series, 8014.34 in parallel, of these six films."""
    best = {}
    for option in plans["worst-case"].options:
        best.setdefault(option.arrangement, option)
    for kind, ppm in (("series", 8898.83), ("parallel", 8014.34)):
        option = best[kind]
        assert option.worst_case.peak_ppm == pytest.approx(ppm, abs=0.01)
        assert (option.proof.kind, option.proof.of) == ("global", "worst-case")
    mixed = best["mixed"]
    assert mixed.worst_case.peak_ppm < 7050
    assert mixed.proof.kind == "global"
    assert mixed.proof.gap_ppm <= 0.0101 * mixed.worst_case.peak_ppm


def test_a_quantile_lies_below_the_worst_case_and_says_how_sure_it_is(plans):
    for plan in plans.values():
        for option in plan.options:
            likely = option.likely
            assert likely.fraction == 0.9973
            assert likely.low_ppm <= likely.peak_ppm <= likely.high_ppm
            assert likely.peak_ppm <= option.worst_case.upper_bound_ppm * 1.05  # normals go beyond limits
            assert likely.inside_low <= likely.inside <= likely.inside_high


def test_the_quantile_judges_by_the_end_of_its_interval(plans):
    limit = plans["quantile"].limit.drift_ppm
    for option in plans["quantile"].options:
        likely = option.likely
        expected = (
            "MET" if likely.high_ppm <= limit else "NOT MET" if likely.low_ppm > limit else "NOT JUDGED"
        )
        assert option.verdict == expected


def test_the_same_brief_gives_the_same_draws():
    one, two = judged("quantile", FILMS), judged("quantile", FILMS)
    assert one == two


def test_a_plan_with_quantiles_and_corners_comes_back():
    corner = '[corner.slow.pp]\nohm_per_square = "+12 %"\ntc1 = "-20 ppm/K"\n'
    plan = judged("worst-case", FILMS, corner)
    assert plan_from_dict(plan.to_dict()) == plan


def test_a_corner_is_the_drift_of_its_device_by_hand():
    """pp at 1.12 times its sheet and -140 ppm/K beside a nominal np: a quadratic, its ends by hand."""
    corner = '[corner.slow.pp]\nohm_per_square = "+12 %"\ntc1 = "-20 ppm/K"\n'
    given = '[given]\nnetwork = "pp 12 kohm + np 6 kohm"\n'
    plan = judged("worst-case", FILMS, corner + given)
    x = np.array([-65.0, 125.0])
    ohms = 12e3 * 1.12 * (1 - 140e-6 * x + 0.55e-6 * x**2) + 6e3 * (1 + 150e-6 * x + 0.4e-6 * x**2)
    peak = np.max(np.abs(ohms / (12e3 * 1.12 + 6e3) - 1)) * 1e6
    assert plan.best.corners["slow"] == pytest.approx(peak, rel=1e-9)
    assert plan.best.corners["slow"] < plan.best.worst_case.peak_ppm


def test_without_a_spread_nothing_is_likely_and_nothing_is_judged():
    bare = FILMS.replace(
        '[material.np.spread]\nmeaning = "limits"\nohm_per_square = "10 %"\ntc1 = "40 ppm/K"\n', ""
    )
    plan = judged("quantile", bare)
    both = [option for option in plan.options if option.likely is None]
    assert both
    assert all(option.verdict == "NOT JUDGED" and option.worst_case is None for option in both)


def test_values_in_full_step_are_kept_in_step():
    step = '[[correlation]]\nbetween = ["pp.ohm_per_square", "np.ohm_per_square"]\nvalue = 1\n'
    same = FILMS.replace('"10 %"', '"20 %"')
    free, joined = judged("worst-case", same), judged("worst-case", same, step)
    figures = [least(plan, lambda o: o.worst_case.peak_ppm) for plan in (joined, free)]
    assert figures[0] < 0.98 * figures[1]
    point = joined.best.worst_case.point
    assert len({round(d.ohm_per_square, 12) for d in point.values()}) == 1


STEP = '[[correlation]]\nbetween = ["pp.ohm_per_square", "np.ohm_per_square"]\nvalue = 1\n'


def test_a_corner_that_tears_a_full_step_is_refused():
    """Half the limits of both is a device of the box; of one alone it is none, and would be worse than it."""
    fits = '[corner.slow.pp]\nohm_per_square = "+10 %"\n[corner.slow.np]\nohm_per_square = "+5 %"\n'
    plan = judged("worst-case", FILMS, STEP + fits)
    assert all(o.corners["slow"] <= o.worst_case.upper_bound_ppm for o in plan.options)
    torn = '[corner.odd.pp]\nohm_per_square = "+20 %"\n[corner.odd.np]\nohm_per_square = "-10 %"\n'
    for corner in (torn, '[corner.odd.pp]\nohm_per_square = "+20 %"\n'):
        with pytest.raises(InputError, match="the same part of both limits"):
            judged("worst-case", FILMS, STEP + corner)


def test_values_in_full_step_are_undone_together():
    """With equal half-widths the ratio is exact: undoing both values moves nothing, so neither is a mover."""
    same = FILMS.replace('"10 %"', '"20 %"')
    plan = judged("worst-case", same, STEP)
    two = next(o for o in plan.options if o.arrangement == "series")
    assert {m.parameter for m in two.worst_case.movers} <= {"tc1", "tc2"}
    free = judged("worst-case", same)
    assert any(
        m.parameter == "ohm_per_square"
        for o in free.options
        if o.arrangement == "series"
        for m in o.worst_case.movers
    )


def test_at_most_is_a_bound_and_free_is_the_least():
    """With a bound the simplest of the least figure is chosen, though a smaller total would do."""
    coil = '[[fixed]]\nmaterial = "np"\nvalue = "400 ohm"\n'
    text = BRIEF.replace('drift = "6000 ppm"', 'drift = "12000 ppm"')
    free = make_plan(brief(text.replace('value = "18 kohm"', 'value = "free"') + coil + FILMS))
    most = make_plan(brief(text.replace('value = "18 kohm"', 'at_most = "40 kohm"') + coil + FILMS))
    assert free.best.role == "least total"
    assert most.best.verdict == "MET"
    same = [o for o in most.options if len(o.squares) == len(most.best.squares) and o.verdict == "MET"]
    assert most.best.nominal.figure_ppm == min(o.nominal.figure_ppm for o in same)
