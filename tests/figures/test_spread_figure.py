"""The figure of the spread: its lots against lots drawn by hand, its marks, its words, its legends."""

import re
from dataclasses import replace

import numpy as np
import pytest
from makers import brief
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Text
from scipy.stats import beta

from tcplan.figures.files import figure_files, spread_figure
from tcplan.figures.lots import lots_of
from tcplan.figures.spread import draw_spread
from tcplan.figures.style import figure_style
from tcplan.plan import Plan
from tcplan.workflow.planning import make_plan

REFERENCE = 25.0
LIMITS = (0.10, 30.0, 0.1)  # of sheet resistance, TC1 (ppm/K) and TC2 (ppm/K^2), as in the briefs
# name, TC1 ppm/K, TC2 ppm/K^2, own reference degC; all invented
FILMS = (("np", 150.0, 0.4, 25.0), ("pp", -120.0, 0.55, 27.0))
HEAD = """
schema = 1
title = "t"
[resistor]
value = "18 kohm"
[temperature]
low = "-40 degC"
high = "150 degC"
[search]
arrangements = ["{1}"]
[goal]
{0}
"""
FILM = """
[material.{0}]
source = "invented"
reference = "{3} degC"
valid = ["-60 degC", "160 degC"]
tc1 = "{1} ppm/K"
tc2 = "{2} ppm/K^2"
ohm_per_square = "100 ohm"
"""
SPREAD = """
[material.{0}.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "30 ppm/K"
tc2 = "0.1 ppm/K^2"
"""
CORNERS = """
[corner.slow.np]
ohm_per_square = "8 %"
tc1 = "20 ppm/K"
[corner.slow.pp]
ohm_per_square = "-6 %"
tc2 = "0.05 ppm/K^2"
[corner.fast.pp]
tc1 = "-25 ppm/K"
"""


def lots_by_hand(plan, films, degC, count, seed=7):
    """R(T)/R(25 degC) - 1 of lots, (count, T); each parameter normal, its limits 3 sigma."""
    rng = np.random.default_rng(seed)
    devices = {f[0]: 1.0 + LIMITS[0] / 3 * rng.standard_normal((count, 1)) for f in films}
    shifts = {f[0]: [u / 3 * rng.standard_normal((count, 1)) for u in LIMITS[1:]] for f in films}
    return network_drift(plan, films, degC, devices, shifts)


def network_drift(plan, films, degC, factors, shifts):
    """R(T)/R(25 degC) - 1 of the chosen option, from its tree and its legs, for devices given by film."""
    data = next(o for o in plan.to_dict()["options"] if o["id"] == plan.chosen)
    members = {leg["id"]: leg for leg in data["legs"]}
    films = {film[0]: film for film in films}

    def law(name, t, moved):
        _, tc1, tc2, own = films[name]
        a, b = moved
        return 1 + (tc1 + a) * 1e-6 * (t - own) + (tc2 + b) * 1e-6 * (t - own) ** 2

    def ohms(node, t):
        ((kind, content),) = node.items()
        if kind == "series":
            return sum(ohms(child, t) for child in content)
        if kind == "parallel":
            return 1.0 / sum(1.0 / ohms(child, t) for child in content)
        leg = members[content]
        name = leg["material"]
        at_reference = leg["ohms"] * factors[name]
        return at_reference * law(name, t, shifts[name]) / law(name, REFERENCE, shifts[name])

    return ohms(data["tree"], np.asarray(degC)) / ohms(data["tree"], REFERENCE) - 1.0


def plan_of(goal='drift = "5000 ppm"', films=FILMS, *, more="", spread=True, arrangement="series") -> Plan:
    text = HEAD.format(goal, arrangement)
    for film in films:
        text += FILM.format(*film) + (SPREAD.format(film[0]) if spread else "")
    return make_plan(brief(text + more))


def drawn(plan):
    """Return the two axes of the figure and what was drawn on them."""
    with figure_style():
        figure = spread_figure(plan, lots_of(plan))
        FigureCanvasAgg(figure)
        axes = [figure.add_axes(ax.get_position()) for ax in figure.axes]
        for old in figure.axes[:2]:
            old.remove()
        artists = draw_spread(*axes, plan, lots_of(plan))
        figure.draw(figure.canvas.get_renderer())
    return (*axes, artists)


def scale(label):
    return 1e-2 if label.endswith("(%)") else 1e-6


def xy(line, ax):
    return np.array(line.get_xdata(), float), np.array(line.get_ydata(), float) * scale(ax.get_ylabel())


def places(artists, ax):
    """Return where each mark stands, as a fraction."""
    return {name: line.get_xdata()[0] * scale(ax.get_xlabel()) for name, line in artists.marks.items()}


# --- the curves -------------------------------------------------------------------------------


def test_the_lots_spread_as_those_drawn_by_hand() -> None:
    plan = plan_of()
    ax, _, artists = drawn(plan)
    curves = np.array(artists.lots.get_segments())
    assert 60 <= len(curves) <= 100
    degC, drift = curves[0, :, 0], curves[:, :, 1] * 1e-6
    assert (degC[0], degC[-1]) == ax.get_xlim() == (-40.0, 150.0)
    by_hand = lots_by_hand(plan, FILMS, degC, 20_000)
    far = np.abs(degC - 25.0) > 20.0
    # 80 lots tell a sigma to 8 %, and a mean to 0.11 sigma.
    np.testing.assert_allclose(drift.std(axis=0)[far], by_hand.std(axis=0)[far], rtol=0.3)
    off = (drift.mean(axis=0) - by_hand.mean(axis=0))[far] / by_hand.std(axis=0)[far]
    assert np.max(np.abs(off)) < 0.4
    np.testing.assert_allclose(drift[:, degC == 25.0], 0.0, atol=1e-15)


def test_the_nominal_and_the_worst_device_are_the_networks_own() -> None:
    plan = plan_of('drift = "5000 ppm"\njudge = "worst-case"')
    ax, _, artists = drawn(plan)
    still = {name: 1.0 for name, *_ in FILMS}, {name: (0.0, 0.0) for name, *_ in FILMS}
    degC, drift = xy(artists.nominal, ax)
    np.testing.assert_allclose(drift, network_drift(plan, FILMS, degC, *still), atol=1e-12)
    point = plan.best.worst_case.point
    moved = {n: d.ohm_per_square for n, d in point.items()}, {n: (d.tc1, d.tc2) for n, d in point.items()}
    degC, drift = xy(artists.worst, ax)
    np.testing.assert_allclose(drift, network_drift(plan, FILMS, degC, *moved), atol=1e-12)
    assert np.max(np.abs(drift)) * 1e6 == pytest.approx(plan.best.worst_case.peak_ppm, rel=1e-9)


def test_each_named_corner_is_the_device_that_the_brief_names() -> None:
    plan = plan_of(more=CORNERS)
    ax, _, artists = drawn(plan)
    devices = {
        "slow": ({"np": 1.08, "pp": 0.94}, {"np": (20.0, 0.0), "pp": (0.0, 0.05)}),
        "fast": ({"np": 1.0, "pp": 1.0}, {"np": (0.0, 0.0), "pp": (-25.0, 0.0)}),
    }
    assert list(artists.corners) == list(devices)
    for name, device in devices.items():
        degC, drift = xy(artists.corners[name], ax)
        np.testing.assert_allclose(drift, network_drift(plan, FILMS, degC, *device), atol=1e-12)
        assert artists.corners[name].get_label() == f"corner {name}"
        assert np.max(np.abs(drift)) * 1e6 == pytest.approx(plan.best.corners[name], rel=1e-6)
    markers = {line.get_marker() for line in artists.corners.values()}
    assert len(markers) == 2


def test_without_corners_none_is_drawn() -> None:
    _, _, artists = drawn(plan_of())
    assert artists.corners == {}
    assert artists.others == ()


def test_corners_beyond_the_markers_share_one_entry() -> None:
    more = "".join(f'[corner.c{k:02d}.np]\ntc1 = "{k - 6} ppm/K"\n' for k in range(12))
    _, _, artists = drawn(plan_of(more=more))
    assert (len(artists.corners), len(artists.others)) == (9, 3)
    texts = [text.get_text() for text in artists.legends[0].get_texts()]
    assert [text for text in texts if "other" in text] == ["3 other corners"]
    assert len({line.get_marker() for line in artists.corners.values()}) == 9


def test_the_roles_differ_without_colour() -> None:
    _, _, artists = drawn(plan_of('drift = "5000 ppm"\njudge = "quantile"', more=CORNERS))
    marks = artists.marks.values()
    assert len({str(line._dash_pattern) for line in marks}) == len(artists.marks)  # no public way
    assert artists.lots.get_linewidth()[0] < 1.0 < artists.nominal.get_linewidth()
    assert artists.worst.get_linestyle() != artists.nominal.get_linestyle()


# --- the histogram ----------------------------------------------------------------------------


def test_the_histogram_is_that_of_peaks_found_by_hand() -> None:
    plan = plan_of()
    _, below, artists = drawn(plan)
    counts, edges, _ = artists.histogram.get_data()
    assert counts.sum() == plan.best.likely.draws == 20_000
    peaks = np.abs(lots_by_hand(plan, FILMS, np.linspace(-40, 150, 381), 20_000)).max(axis=1)
    cumulative = np.cumsum(counts) / counts.sum()
    expected = np.searchsorted(np.sort(peaks), edges[1:] * scale(below.get_xlabel())) / len(peaks)
    # Kolmogorov and Smirnov, two samples: 1.95 sqrt(2/20000) at one in a thousand (from memory).
    assert np.max(np.abs(cumulative - expected)) < 0.02


def test_the_marks_stand_at_the_figures_of_the_plan() -> None:
    plan = plan_of('drift = "5000 ppm"\njudge = "worst-case"')
    option = plan.best
    _, below, artists = drawn(plan)
    expected = {
        "nominal": option.nominal.figure_ppm,
        "quantile": option.likely.peak_ppm,
        "worst": option.worst_case.peak_ppm,
        "limit": 5000.0,
    }
    assert places(artists, below) == pytest.approx({name: ppm * 1e-6 for name, ppm in expected.items()})
    labels = {name: line.get_label() for name, line in artists.marks.items()}
    assert labels["limit"] == "limit: 5000 ppm"
    assert [name for name, label in labels.items() if "judged" in label] == ["worst"]
    counts, edges, _ = artists.histogram.get_data()
    beyond = counts[edges[:-1] * 1e-6 >= option.likely.peak_ppm * 1e-6].sum() / counts.sum()
    assert beyond == pytest.approx(0.0027, abs=0.0027)  # what one bin holds beside the mark


@pytest.mark.parametrize(("judge", "name"), [("nominal", "nominal"), ("quantile", "quantile")])
def test_what_is_judged_is_said_to_be(judge: str, name: str) -> None:
    _, _, artists = drawn(plan_of(f'drift = "5000 ppm"\njudge = "{judge}"'))
    assert [n for n, line in artists.marks.items() if "judged" in line.get_label()] == [name]


def test_printed_figures_are_rounded_up_but_never_past_a_limit_that_they_keep() -> None:
    plan = plan_of('drift = "5000 ppm"')
    peak = plan.best.likely.peak_ppm
    near = replace(plan, limit=replace(plan.limit, drift_ppm=peak * (1 + 1e-6)))
    for other in (plan, near):
        _, _, artists = drawn(other)
        text = artists.marks["quantile"].get_label()
        printed = float(re.search(r"within ([\d\xa0.]+) ppm", text)[1].replace("\xa0", ""))
        assert peak <= printed * (1 + 1e-6)
        assert printed < 1.01 * peak
    assert printed <= near.limit.drift_ppm * (1 + 1e-6)


@pytest.mark.parametrize("limit", ["4600 ppm", "1.5 %", "1 ppm"])
def test_the_words_are_the_exact_binomial_interval(limit: str) -> None:
    plan = plan_of(f'drift = "{limit}"')
    _, _, artists = drawn(plan)
    words = artists.words.get_text().replace("\xa0", "")
    draws, inside = 20_000, round(plan.best.likely.inside * 20_000)
    said = "none" if inside == 0 else "all" if inside == draws else str(inside)
    assert words.startswith(f"The judged figure: {said} ")
    assert "20000 drawn lots" in words
    # Clopper and Pearson, by quantiles of the beta distribution of scipy.
    low = beta.ppf(0.025, inside, draws - inside + 1) if inside else 0.0
    high = beta.ppf(0.975, inside + 1, draws - inside) if inside < draws else 1.0
    printed = [float(text) / 100 for text in re.findall(r"([\d.]+) %", words)[:2]]
    assert printed[0] <= low < printed[0] + 1.0001e-4
    assert printed[1] - 1.0001e-4 < high <= printed[1]


def test_the_three_limits_of_that_test_have_some_all_and_none_inside() -> None:
    found = [plan_of(f'drift = "{limit}"').best.likely.inside for limit in ("4600 ppm", "1.5 %", "1 ppm")]
    assert 0.0 < found[0] < 1.0
    assert found[1:] == [1.0, 0.0]


def test_without_a_limit_no_fraction_is_told() -> None:
    _, _, artists = drawn(plan_of('judge = "nominal"'))
    assert "limit" not in artists.marks
    assert "%" not in artists.words.get_text()


def test_a_quantile_that_the_draws_do_not_reach_is_not_printed() -> None:
    plan = plan_of('drift = "5000 ppm"\njudge = "quantile"\nquantile = 0.9999')
    assert plan.best.likely.high_ppm is None
    _, _, artists = drawn(plan)
    assert artists.marks["quantile"].get_label() == "99.99 % of lots, judged:\ntoo few drawn to tell"


def test_a_limit_far_off_is_said_to_be_beyond_the_scale() -> None:
    _, below, artists = drawn(plan_of('drift = "40 %"'))
    assert "beyond this scale" in artists.marks["limit"].get_label()
    assert below.get_xlim()[1] * scale(below.get_xlabel()) < 0.4


@pytest.mark.parametrize(
    ("goal", "words"),
    [
        ('drift = "5000 ppm"', "Peak drift"),
        ('band = "5000 ppm"', "Band of the drift"),
        ('box_tcr = "30 ppm/K"', "Band of the drift"),
        ('chord_tcr = "60 ppm/K"', "Chord TCR times the longer arm"),
        ('mask = [["-40 degC", "150 degC", "0.5 %"]]', "Drift against the mask, at its tightest line"),
        ('drift = "5000 ppm"\nbox_tcr = "30 ppm/K"', "Judged figure"),
    ],
)
def test_the_axis_says_which_figure_it_is_and_in_what_unit(goal: str, words: str) -> None:
    plan = plan_of(goal)
    _, below, artists = drawn(plan)
    assert below.get_xlabel() == f"{words} (ppm)"
    assert below.get_ylabel() == "Lots"
    assert places(artists, below)["nominal"] == pytest.approx(plan.best.nominal.figure_ppm * 1e-6)


def test_large_figures_are_in_per_cent() -> None:
    ax, below, _ = drawn(plan_of('drift = "2 %"', FILMS[:1], arrangement="single"))
    assert ax.get_ylabel() == "Drift (%)"
    assert below.get_xlabel() == "Peak drift (%)"


def test_lots_that_do_not_differ_are_one_bar_at_the_nominal_figure() -> None:
    text = HEAD.format('drift = "5000 ppm"', "series")
    text += "".join(FILM.format(*film) + SPREAD.format(film[0]) for film in FILMS)
    still = re.sub(r'"(10 %|30 ppm/K|0\.1 ppm/K\^2)"', lambda m: '"0 ' + m[1].split(" ")[1] + '"', text)
    _, below, artists = drawn(make_plan(brief(still)))
    counts, edges, _ = artists.histogram.get_data()
    (bar,) = np.flatnonzero(counts)
    low, high = below.get_xlim()
    assert abs(edges[bar] * 1e-6 - places(artists, below)["nominal"]) < 0.02 * (high - low) * 1e-6


# --- layout -----------------------------------------------------------------------------------

WIDE = "W" * 37
MANY = "".join(f'[corner.c{k:02d}{WIDE}.np]\ntc1 = "{k - 6} ppm/K"\n' for k in range(12))
GOALS = 'drift = "600 ppm"\nchord_tcr = "1234.56 ppm/K"\nband = "900 ppm"\nbox_tcr = "5 ppm/K"\n'


@pytest.mark.parametrize(
    ("goal", "more"),
    [
        ('drift = "5000 ppm"', CORNERS),
        (GOALS + 'judge = "worst-case"', MANY),
        ('drift = "40 %"\njudge = "quantile"\nquantile = 0.99991', ""),
        ('judge = "nominal"', ""),
    ],
)
def test_nothing_covers_anything_else_and_all_is_on_the_page(goal: str, more: str) -> None:
    ax, below, artists = drawn(plan_of(goal, more=more))
    renderer = ax.figure.canvas.get_renderer()
    page = ax.figure.bbox
    legends = [legend.get_window_extent(renderer) for legend in artists.legends]
    texts = [part.get_window_extent(renderer) for part in (ax.xaxis.label, artists.words, below.xaxis.label)]
    for box in (*legends, *texts):
        assert page.x0 <= box.x0
        assert box.x1 <= page.x1
        assert page.y0 <= box.y0
        assert box.y1 <= page.y1
    for legend in legends:
        assert not any(legend.overlaps(other) for other in (ax.bbox, below.bbox, *texts))
    assert not legends[0].overlaps(legends[1])
    assert not texts[0].overlaps(texts[1])
    assert texts[1].y1 < ax.bbox.y0


def test_no_text_is_read_as_mathematics() -> None:
    plan = plan_of(more=CORNERS)
    ax, below, _ = drawn(plan)
    texts = [text for part in (ax, below) for text in part.findobj(Text) if text.get_text()]
    legends = [text for part in (ax, below) for text in part.get_legend().get_texts()]
    assert not any(text.get_parse_math() for text in (*legends, ax.title, below.title) if text in texts)


# --- where the spread is not stated -----------------------------------------------------------


def test_without_a_spread_there_is_no_such_figure() -> None:
    plan = plan_of(spread=False)
    assert lots_of(plan) is None
    assert not [name for name in figure_files(plan) if name.startswith("spread")]


def test_one_material_without_a_spread_is_enough_to_leave_it_out() -> None:
    plan = plan_of(spread=False, more=SPREAD.format("np"))
    assert {leg["material"] for leg in plan.best.to_dict()["legs"]} == {"np", "pp"}
    assert lots_of(plan) is None


def test_outside_its_range_a_material_spreads_more() -> None:
    wider = 'extrapolate_to = ["-60 degC", "160 degC"]\n[material.{0}.extrapolation]\ntc1 = "30 ppm/K"\n'
    text = HEAD.format('drift = "5000 ppm"', "series")
    for film in FILMS:
        stated = FILM.format(*film).replace('"160 degC"]', '"140 degC"]')
        text += stated + wider.format(film[0]) + SPREAD.format(film[0])
    lots = lots_of(make_plan(brief(text)))
    assert [spread.limits().tc1 for spread in lots.spreads.values()] == pytest.approx([60e-6, 60e-6])
