"""The spec sheet: rounding, honesty, escaping, and a formula that gives the drift back."""

from __future__ import annotations

import dataclasses
import json
import re
from decimal import Decimal

import numpy as np
import pytest
from makers import BRIEF, FILMS, brief
from markdown_it import MarkdownIt  # an independent reader of Markdown

from tcplan.drift import ratio_curve
from tcplan.material.expression import parse_expression
from tcplan.network import value
from tcplan.plan import Plan, plan_json
from tcplan.spec import numbers
from tcplan.spec.formula import coefficients, composite_formula
from tcplan.spec.markdown import code, escaped, spec_markdown
from tcplan.spec.summary import summary_of
from tcplan.workflow.conversions import symbolic_formula
from tcplan.workflow.planning import make_plan
from tcplan.workflow.specs import make_spec

WORST = BRIEF.replace('drift = "6000 ppm"', 'drift = "7000 ppm"\njudge = "worst-case"')
EASY = WORST.replace("7000 ppm", "13000 ppm")
REFERENCE = 298.15
TEMPERATURES = np.linspace(233.15, 423.15, 39)


def plan_of(text: str) -> Plan:
    return make_plan(brief(text))


@pytest.fixture(scope="module")
def judged() -> Plan:
    return plan_of(WORST + FILMS)


def sentences(plan: Plan) -> str:
    spec = summary_of(plan)
    return " ".join([spec.headline, *spec.outcome, *spec.assumptions, spec.floor, spec.reason, spec.proof])


# --- numbers ----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("figure", "limit", "text"),
    [
        (11042.08, None, "11100"),
        (6000.0000000001, None, "6000"),
        (0.123401, None, "0.124"),
        (5996.2, 5998.0, "5997"),  # to 3 digits it would be 6000, past the limit that it keeps
        (6001.0, 6000.0, "6010"),
    ],
)
def test_worst_cases_are_rounded_outward(figure: float, limit: float | None, text: str) -> None:
    assert numbers.worst(figure, limit) == text
    assert float(text) >= figure * (1 - 1e-9)


@pytest.mark.parametrize(("figure", "text"), [(3925.5, "3920"), (4062.5, "4060"), (0.0, "0"), (7e-5, "0")])
def test_bounds_are_rounded_down(figure: float, text: str) -> None:
    assert numbers.bound(figure) == text
    assert float(text) <= figure


@pytest.mark.parametrize(
    ("figure", "spread", "limit", "text"),
    [
        (3925.5, 7116.0, None, "4000"),  # a tenth of the spread is 712, so thousands
        (3.0, 4000.0, None, "under 500"),
        (0.0, None, None, "under 0.001"),
        (671.09, None, None, "671.1"),
        (671.09, 0.0, None, "671.1"),
        (5800.0, 7000.0, 5900.0, "under 5900"),  # 6000 would be past the limit that it keeps
        (6100.0, 7000.0, 6000.0, "over 6000"),
        (5800.0, 7000.0, 6000.0, "6000"),
    ],
)
def test_nominal_is_no_finer_than_a_tenth_of_its_spread(
    figure: float, spread: float | None, limit: float | None, text: str
) -> None:
    assert numbers.nominal(figure, spread, limit) == text


@pytest.mark.parametrize(
    ("number", "digits", "text"),
    [(18557.0258, 4, "18560"), (-0.03, 4, "-0.03"), (1e-9, 3, "1e-9"), (0, 4, "0")],
)
def test_numbers_are_plain(number: float, digits: int, text: str) -> None:
    assert numbers.number(number, digits) == text


# --- what is said -----------------------------------------------------------------------------


def test_a_nominal_figure_is_never_alone(judged: Plan) -> None:
    for row in summary_of(judged).options:
        assert row.nominal
        assert float(row.worst_case.split(" ")[0])
    nominal = plan_of(BRIEF + FILMS)
    said = next(line for line in summary_of(nominal).outcome if "nominal" in line)
    assert re.search(r"at nominal and \d+ ppm in the worst case", said)


def test_what_is_not_met_says_by_how_much(judged: Plan) -> None:
    worst = judged.best.worst_case
    assert worst is not None
    over = Decimal(re.search(r"([0-9.]+) ppm over the limit", sentences(judged))[1])  # type: ignore[index]
    true = worst.peak_ppm - 7000.0
    assert true <= over <= Decimal(true) * Decimal("1.01")


def test_no_spread_is_not_stated_and_not_judged() -> None:
    without = re.sub(r"\[material\.np\.spread\](\n.+)+", "", FILMS)
    plan = plan_of(WORST + without + '\n[given]\nnetwork = "pp 12 kohm + np 6 kohm"\n')
    assert "NOT JUDGED" in summary_of(plan).headline
    assert "no spread is stated for np." in sentences(plan)
    assert "| judged figure, worst case | not stated |" in spec_markdown(make_spec(plan))


SIGMA = ('"limits"\nohm_per_square = "20 %"', '"sigma"\nohm_per_square = "7 %"')
BEYOND = ('"160 degC"]\ntc1 = "150', '"149 degC"]\nextrapolate_to = ["-60 degC", "151 degC"]\ntc1 = "150')
SAME = ("", "")


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (SIGMA, "pp at 3 times the stated sigma"),
        (BEYOND, "EXTRAPOLATED beyond its valid range: np"),
        (SAME, "No half-width stated, so counted as 0: TC2 of np, pp."),
        (SAME, "Not included: package stress, ageing, humidity, self-heating, mismatch."),
    ],
)
def test_assumptions_are_told(change: tuple[str, str], said: str) -> None:
    films = FILMS.replace(*change, 1)
    if "extrapolate_to" in films:
        films += '[material.np.extrapolation]\ntc1 = "5 ppm/K"\n'
    assert said in sentences(plan_of(WORST + films))


def test_a_band_is_designed_for_at_nominal_and_says_so() -> None:
    """The two ends of a band belong to one device, so its worst case is not searched for."""
    band = WORST.replace('drift = "7000 ppm"', 'band = "9000 ppm"')
    assert "Designed for nominal drift, judged on the worst case: " in sentences(plan_of(band + FILMS))
    assert "Designed for nominal drift" not in sentences(plan_of(WORST + FILMS))


@pytest.mark.parametrize(
    ("goal", "said"),
    [
        ('band = "9000 ppm"', "the band, highest minus lowest drift, against 9000 ppm"),
        ('box_tcr = "50 ppm/K"', "the band; divided by 190 K it is the box TCR, against 9500 ppm"),
        ('chord_tcr = "50 ppm/K"', "the larger chord TCR times 125 K, the longer arm, against 6250 ppm"),
        (
            'mask = [["-40 degC", "150 degC", "0.9 %"]]',
            "scaled to the tightest line of the mask, against 9000 ppm",
        ),
    ],
)
def test_the_judged_figure_is_named_for_every_kind_of_limit(goal: str, said: str) -> None:
    assert said in sentences(plan_of(BRIEF.replace('drift = "6000 ppm"', goal) + FILMS))


def test_a_given_network_states_its_own_value() -> None:
    plan = plan_of(WORST + FILMS + '[given]\nnetwork = "pp 12 kohm + np 6.3 kohm"\n')
    assert "own value is 18.3 kohm, 1.667 % above the 18 kohm asked for" in sentences(plan)
    assert "Designed for nominal" not in sentences(plan)


def test_the_verdict_and_the_proof_are_about_the_data(judged: Plan) -> None:
    assert judged.best.proof.kind == "global"
    assert "Proved optimal among" in summary_of(judged).proof
    assert "for these data" in summary_of(judged).proof
    searched = next(option for option in judged.options if option.proof.kind == "searched")
    other = dataclasses.replace(judged, chosen=searched.id)
    assert re.search(r"Best found; no such network is below \d+ ppm worst-case", summary_of(other).proof)


# --- the formula --------------------------------------------------------------------------------

THERMISTOR = """
[material.bead]
source = "invented"
reference = "25 degC"
valid = ["-60 degC", "160 degC"]
law = "thermistor"
beta = "3435 K"
"""
OTHER_REFERENCE = FILMS.replace('reference = "25 degC"', 'reference = "60 degC"', 1)
NETWORKS = [
    (FILMS, "pp 18 kohm"),
    (FILMS, "pp 12 kohm + np 6 kohm"),
    (OTHER_REFERENCE, "(pp 12 kohm || np 6 kohm) + np 3 kohm"),
    (FILMS + THERMISTOR, "((bead 47 kohm + pp 22 kohm) || np 30 kohm) + pp 1 kohm"),
]


@pytest.mark.parametrize(("films", "network"), NETWORKS)
def test_the_printed_formula_gives_the_drift_back(films: str, network: str) -> None:
    plan = plan_of(BRIEF + films + f'[given]\nnetwork = "{network}"\n')
    text, latex = composite_formula(plan, plan.best)
    lines = dict(line.split(" = ", 1) for line in text.split("\n"))
    ratios = {
        name.removesuffix("(T)"): parse_expression(formula, ["T"]).numpy({"T": TEMPERATURES})
        for name, formula in lines.items()
        if name != "R(T)"
    }
    whole = parse_expression(re.sub(r"(r_\w+)\(T\)", r"\1", lines["R(T)"]), ratios)
    printed = whole.numpy(ratios) / value(plan.best.network) - 1.0
    exact = ratio_curve(plan.best.network, plan.by_name, REFERENCE)(TEMPERATURES) - 1.0
    # the laws are printed to 6 digits: of a drift of up to 0.3 that is less than 1 ppm
    assert printed == pytest.approx(exact, abs=1e-6)
    assert latex.count("&=") == len(lines)


@pytest.mark.parametrize(("films", "network"), NETWORKS)
def test_the_symbolic_formula_gives_the_drift_back(films: str, network: str) -> None:
    plan = plan_of(BRIEF + films + f'[given]\nnetwork = "{network}"\n')
    printed = parse_expression(symbolic_formula(plan), ["T"]).numpy({"T": TEMPERATURES})
    exact = ratio_curve(plan.best.network, plan.by_name, REFERENCE)(TEMPERATURES)
    assert printed / value(plan.best.network) == pytest.approx(exact, rel=1e-12)


def test_the_coefficients_of_a_series_are_the_weighted_means() -> None:
    plan = plan_of(BRIEF + FILMS + '[given]\nnetwork = "pp 12 kohm + np 6 kohm"\n')
    # second-order theory of a series: A = sum w a, B = sum w b, with 2/3 and 1/3
    assert coefficients(plan, plan.best) == pytest.approx((-30.0, 0.5, 0.0), abs=1e-9)


def test_a_law_given_as_a_formula_is_printed() -> None:
    law = 'law = "exp(B*(1/T - 1/T0))"\n[material.bead.law_parameters]\nB = 3435\n'
    bead = THERMISTOR.replace('law = "thermistor"\nbeta = "3435 K"\n', law)
    plan = plan_of(BRIEF + FILMS + bead + '[given]\nnetwork = "bead 10 kohm"\n')
    text, latex = composite_formula(plan, plan.best)
    assert "exp(B*(1/T - 1/T0)), B = 3435" in text
    assert r"r_{\mathrm{bead}}(T)" in latex


# --- the Markdown -------------------------------------------------------------------------------


def rendered(markdown: str) -> str:
    return MarkdownIt("commonmark", {"html": True}).enable("table").render(markdown)


def test_the_sheet_has_its_parts(judged: Plan) -> None:
    html = rendered(spec_markdown(make_spec(judged)))
    for part in (section.title for section in make_spec(judged).sections):
        assert f"<h2>{part}</h2>" in html
    assert html.count("<table>") == sum(len(section.tables) for section in make_spec(judged).sections)
    assert len(
        re.findall(r"<tr>", html.split("<h2>Why this option</h2>")[1].split("</table>")[0])
    ) == 1 + len(judged.options)
    assert judged.brief["sha256"] in html
    for caution in ("confirmed on silicon or hardware", "ageing, humidity", "can burn", "licensed practice"):
        assert caution in html
    assert re.findall(r'src="([^"]+)"', html) == [
        "network.svg",
        "drift.svg",
        "spread.svg",
        "slope-curvature.svg",
    ]


def test_the_sheet_has_no_date_and_is_the_same_every_time(judged: Plan) -> None:
    assert spec_markdown(make_spec(judged)) == spec_markdown(make_spec(judged))
    assert not re.search(r"\b20[0-9]{2}-[0-9]{2}-[0-9]{2}\b", spec_markdown(make_spec(judged)))


HOSTILE = "<script>alert(1)</script> [x](javascript:y) ![i](z.png) `c` | ~~s~~ *b* __u__ &lt; # $m$"


def test_no_text_of_the_user_becomes_markup() -> None:
    films = FILMS.replace('source = "invented"', f'source = "{HOSTILE}"\nlabel = "{HOSTILE}"', 1)
    plan = plan_of(BRIEF.replace("Test resistor", HOSTILE) + films)
    html = rendered(spec_markdown(make_spec(plan)))
    assert "<script" not in html
    assert "<a " not in html
    assert html.count("<img") == 4
    shown = re.sub(r"<[^>]+>", "", html).replace("&lt;", "<").replace("&gt;", ">").replace("&amp;", "&")
    assert shown.count(HOSTILE) == 3  # title, label and source are read as they were written


@pytest.mark.parametrize(
    "text", ["- item", "+ item", "1. item", "12) item", "a\n\n# b", "=", "> q", "\\", "a|b"]
)
def test_escaped_text_is_one_paragraph_of_itself(text: str) -> None:
    html = rendered(f"x\n\n{escaped(text)}\n")
    plain = " ".join(text.split()).replace("&", "&amp;").replace(">", "&gt;")
    assert html == f"<p>x</p>\n<p>{plain}</p>\n"


@pytest.mark.parametrize("text", ["a", "`", "a``b`", "`a", "pp 1 kohm || np 2 kohm"])
def test_a_code_span_holds_its_text(text: str) -> None:
    assert rendered(code(text)) == f"<p><code>{text}</code></p>\n"


def test_every_figure_on_the_sheet_comes_from_the_plan(judged: Plan) -> None:
    # A plan that went through its file gives the same sheet: nothing else is known to it.
    from tcplan.plan_file import plan_from_dict

    again = plan_from_dict(json.loads(plan_json(judged)))
    assert spec_markdown(make_spec(again)) == spec_markdown(make_spec(judged))


def test_the_easy_limit_is_met_by_the_simplest() -> None:
    plan = plan_of(EASY + FILMS)
    assert plan.best.verdict == "MET"
    assert summary_of(plan).reason == "the simplest that meets the limit"


def test_a_floor_above_the_limit_is_printed_above_it() -> None:
    """6000.1 rounded down to 3 digits would read as the limit itself."""
    assert float(numbers.bound(6000.1, 6000.0)) > 6000.0
    assert numbers.bound(6000.1) == "6000"
    assert numbers.bound(6543.2, 6000.0) == "6540"
