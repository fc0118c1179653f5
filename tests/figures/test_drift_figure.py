"""The drift figure: its curves against plain recomputation, its limits, labels, colours and legends."""

import itertools
import re
from dataclasses import replace

import numpy as np
import pytest
from makers import brief
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.text import Text

from tcplan.figures.drift import draw_drift
from tcplan.figures.style import (
    CHOSEN,
    LIMIT,
    MATERIAL_COLOURS,
    OPTION,
    OTHER,
    figure_style,
    number_text,
    text_width,
)
from tcplan.network import Leg, Parallel, Series, mapped
from tcplan.plan import Deviation, Plan
from tcplan.workflow.planning import make_plan

# name, TC1 ppm/K, TC2 ppm/K^2, own reference degC; all invented
FILMS = (("hi", -1400.0, 3.0, 25.0), ("np", 150.0, 0.4, 25.0), ("pp", -120.0, 0.55, 27.0))
HEAD = """
schema = 1
title = "t"
[resistor]
value = "18 kohm"
[temperature]
low = "-40 degC"
high = "150 degC"
"""
SPREAD = """
[material.{0}.spread]
meaning = "limits"
ohm_per_square = "10 %"
tc1 = "30 ppm/K"
tc2 = "0.1 ppm/K^2"
"""


def plan_of(goal='drift = "6000 ppm"', films=FILMS, *, spread=True) -> Plan:
    text = HEAD + f"[goal]\n{goal}\n"
    for name, tc1, tc2, own in films:
        text += (
            f'[material.{name}]\nsource = "invented"\nlabel = "50 $ ^_{{ film"\nreference = "{own} degC"\n'
            f'valid = ["-60 degC", "160 degC"]\ntc1 = "{tc1} ppm/K"\ntc2 = "{tc2} ppm/K^2"\n'
            f'ohm_per_square = "100 ohm"\n{SPREAD.format(name) if spread else ""}'
        )
    return make_plan(brief(text))


def drawn(plan):
    figure = Figure(figsize=(7.2, 5.6))
    FigureCanvasAgg(figure)
    ax, residual_ax = figure.add_axes((0.11, 0.475, 0.6, 0.485)), figure.add_axes((0.11, 0.08, 0.6, 0.325))
    with figure_style():
        return ax, residual_ax, draw_drift(ax, residual_ax, plan)


def scale(ax):
    """Return what turns the data of an axis into a fraction, read from its label."""
    return {"Drift (ppm)": 1e-6, "Drift (%)": 1e-2}[ax.get_ylabel()]


def xy(line, ax):
    return np.array(line.get_xdata(), float), np.array(line.get_ydata(), float) * scale(ax)


def ratio(film, degC, da=0.0, db=0.0):
    """R(T)/R(25 degC) of a quadratic law about its own reference, in plain numpy."""
    _, tc1, tc2, own = film

    def law(t):
        return 1 + (tc1 + da) * 1e-6 * (t - own) + (tc2 + db) * 1e-6 * (t - own) ** 2

    return law(degC) / law(25.0)


def composite(plan, degC, point=None):
    """R(T)/R(25 degC) of the chosen option from its tree and its legs alone."""
    data = next(o for o in plan.to_dict()["options"] if o["id"] == plan.chosen)
    films = {film[0]: film for film in FILMS}
    members = {leg["id"]: leg for leg in data["legs"]}

    def ohms(node, t):
        ((kind, content),) = node.items()
        if kind == "series":
            return sum(ohms(child, t) for child in content)
        if kind == "parallel":
            return 1.0 / sum(1.0 / ohms(child, t) for child in content)
        leg = members[content]
        moved = point[leg["material"]] if point else None
        shift = (moved.tc1, moved.tc2) if moved else (0.0, 0.0)
        size = leg["ohms"] * (moved.ohm_per_square if moved else 1.0)
        return size * (1.0 if t is None else ratio(films[leg["material"]], t, *shift))

    return ohms(data["tree"], degC) / ohms(data["tree"], None)


def test_every_material_is_drawn_at_its_own_drift() -> None:
    ax, _, artists = drawn(plan_of())
    assert set(artists.materials) == {"hi", "np", "pp"}
    for film in FILMS:
        degC, drift = xy(artists.materials[film[0]], ax)
        assert (degC[0], degC[-1]) == (-40.0, 150.0)
        np.testing.assert_allclose(drift, ratio(film, degC) - 1, rtol=1e-9, atol=1e-12)


def test_the_chosen_option_is_the_composite_of_its_legs_in_both_panels() -> None:
    plan = plan_of()
    ax, residual_ax, artists = drawn(plan)
    for part, line in ((ax, artists.chosen), (residual_ax, artists.residual)):
        degC, drift = xy(line, part)
        np.testing.assert_allclose(drift, composite(plan, degC) - 1, rtol=0, atol=1e-12)


def test_the_peak_marks_sit_where_verify_found_them_and_nothing_is_higher() -> None:
    plan = plan_of()
    _, residual_ax, artists = drawn(plan)
    for mark, line, record in zip(
        artists.peaks,
        (artists.residual, artists.worst),
        (plan.best.nominal, plan.best.worst_case),
        strict=True,
    ):
        at, height = xy(mark, residual_ax)
        assert at[0] == record.at_degC
        assert abs(height[0]) * 1e6 == pytest.approx(record.peak_ppm, rel=1e-9)
        assert np.max(np.abs(xy(line, residual_ax)[1])) <= abs(height[0]) * (1 + 1e-12)


def test_the_worst_case_line_is_the_drift_of_the_worst_device() -> None:
    plan = plan_of('drift = "6000 ppm"\njudge = "worst-case"')
    _, residual_ax, artists = drawn(plan)
    degC, drift = xy(artists.worst, residual_ax)
    expected = composite(plan, degC, plan.best.worst_case.point) - 1
    np.testing.assert_allclose(drift, expected, rtol=0, atol=1e-12)
    assert artists.worst.get_linestyle() != artists.residual.get_linestyle()


# --- the spread of the lots -------------------------------------------------------------------


def band_edges(artists, ax):
    """Return temperatures and the lower and upper edge of the band, from the outline drawn."""
    points = artists.spread.get_paths()[0].vertices
    degC = np.unique(points[:, 0])
    heights = [points[points[:, 0] == at, 1] * scale(ax) for at in degC]
    return degC, np.array([h.min() for h in heights]), np.array([h.max() for h in heights])


@pytest.mark.parametrize(("fraction", "within"), [(0.9973, 0.002), (0.9, 0.02)])
def test_the_band_holds_its_fraction_of_lots_drawn_by_hand(fraction: float, within: float) -> None:
    plan = plan_of(f'drift = "6000 ppm"\njudge = "quantile"\nquantile = {fraction}')
    _, residual_ax, artists = drawn(plan)
    degC, lower, upper = band_edges(artists, residual_ax)
    rng, count = np.random.default_rng(3), 20_000
    limits = Deviation(ohm_per_square=0.1, tc1=30.0, tc2=0.1)  # those of SPREAD; normal, 3 sigma
    point = {
        name: replace(
            limits,
            ohm_per_square=1.0 + limits.ohm_per_square / 3 * rng.standard_normal((count, 1)),
            tc1=limits.tc1 / 3 * rng.standard_normal((count, 1)),
            tc2=limits.tc2 / 3 * rng.standard_normal((count, 1)),
        )
        for name in ("hi", "np", "pp")
    }
    drift = composite(plan, degC, point) - 1
    inside = np.mean((drift >= lower) & (drift <= upper), axis=0)
    away = np.abs(degC - 25.0) > 1.0  # at the reference all lots are alike
    np.testing.assert_allclose(inside[away], fraction, rtol=0, atol=within)
    below = np.mean(drift < lower, axis=0)[away]
    np.testing.assert_allclose(below, 0.5 * (1 - fraction), rtol=0, atol=within)
    assert artists.spread.get_label() == f"{100 * fraction:g} % of lots,\nat each temperature"


def test_the_band_lies_behind_the_curves_and_in_view() -> None:
    _, residual_ax, artists = drawn(plan_of())
    degC, lower, upper = band_edges(artists, residual_ax)
    assert (degC[0], degC[-1]) == residual_ax.get_xlim()
    least, most = (edge * scale(residual_ax) for edge in residual_ax.get_ylim())
    assert least < lower.min() < upper.max() < most
    lines = [line for line in residual_ax.lines if len(line.get_xdata()) > 2]
    assert artists.spread.get_zorder() < min(line.get_zorder() for line in lines)
    assert artists.spread.get_label() in [text.get_text() for text in artists.legends[1].get_texts()]


def test_a_fraction_that_the_draws_do_not_support_is_not_claimed() -> None:
    _, _, artists = drawn(plan_of('drift = "6000 ppm"\njudge = "quantile"\nquantile = 0.99999'))
    assert artists.spread.get_label() == "all 20\xa0000 lots drawn"


def test_without_the_spread_of_every_material_there_is_no_band() -> None:
    assert drawn(plan_of(spread=False))[2].spread is None
    plan = plan_of(films=FILMS[1:])
    bare = tuple(replace(m, spread=None) if m.name == "np" else m for m in plan.materials)
    assert drawn(plan)[2].spread is not None
    assert drawn(replace(plan, materials=bare))[2].spread is None


# --- the best option of each arrangement --------------------------------------------------------

SERIES = Series((Leg(material="np", ohms=1e3), Leg(material="pp", ohms=1.2e3)))
PARALLEL = Parallel((Leg(material="np", ohms=1e3), Leg(material="pp", ohms=0.8e3)))
MIXED = Series((PARALLEL, Leg(material="hi", ohms=20.0)))


def option_like(plan, network, name, role=""):
    return replace(plan.best, id=name, network=network, role=role)


def with_options(plan, *options):
    """Return the plan with these options, best first, its own chosen one and a worse one of each kind."""
    worse = [
        option_like(plan, network, f"worse-{n}")
        for n, network in enumerate((SERIES, PARALLEL, MIXED, Leg(material="np", ohms=1e3)))
    ]
    return replace(plan, options=(*options, plan.best, *worse))


def test_the_best_of_each_arrangement_is_drawn_beside_the_chosen_option() -> None:
    plan = plan_of(spread=False)
    best = {
        "series": option_like(plan, SERIES, "series-9"),
        "parallel": option_like(plan, PARALLEL, "parallel-9"),
        "mixed": option_like(plan, MIXED, "mixed-9"),
        "given": option_like(plan, MIXED, "given", "given"),
    }
    ax, _, artists = drawn(with_options(plan, *best.values()))
    assert list(artists.options) == list(best)
    labels = [line.get_label() for line in artists.options.values()]
    assert labels == [
        "best series: series-9",
        "best parallel: parallel-9",
        "best mixed: mixed-9",
        "given",
    ]
    degC, drift = xy(artists.options["mixed"], ax)
    r = {film[0]: ratio(film, degC) for film in FILMS}
    ohms = 1.0 / (1.0 / (1e3 * r["np"]) + 1.0 / (0.8e3 * r["pp"])) + 20.0 * r["hi"]
    np.testing.assert_allclose(drift, ohms / (1.0 / (1 / 1e3 + 1 / 0.8e3) + 20.0) - 1, rtol=0, atol=1e-12)
    assert len({str(line._dash_pattern) for line in artists.options.values()}) == 4  # no public way
    assert all(line.get_linewidth() < artists.chosen.get_linewidth() for line in artists.options.values())


def test_the_chosen_option_and_single_materials_are_not_drawn_twice() -> None:
    plan = plan_of(spread=False)
    (chosen,) = (o for o in plan.options if o.id == plan.chosen)
    single = option_like(plan, Leg(material="np", ohms=1e3), "single-9")
    _, _, artists = drawn(replace(plan, options=(single, chosen)))
    assert artists.options == artists.residual_options == {}


BIG = ("big", 9000.0, 0.0, 25.0)  # a film that makes the panel of all as high as the whole value


def against(plan, network):
    """Return what is drawn of one more option beside a chosen one, here PARALLEL, and how they compare."""
    options = (option_like(plan, network, "more"), option_like(plan, PARALLEL, plan.chosen))
    ax, residual_ax, artists = drawn(replace(plan, options=options))
    (line,) = artists.options.values()
    away = np.max(np.abs(np.subtract(line.get_ydata(), artists.chosen.get_ydata())))
    times = np.max(np.abs(line.get_ydata())) / np.max(np.abs(artists.chosen.get_ydata()))
    low, high = ax.get_ylim()
    return artists, residual_ax, times, away / (high - low)


def test_what_cannot_be_told_from_the_chosen_one_is_drawn_below_too() -> None:
    plan = plan_of(films=(*FILMS, BIG), spread=False)
    artists, residual_ax, times, away = against(plan, Series((PARALLEL, Leg(material="hi", ohms=50.0))))
    assert away < 0.03
    assert 1.0 < times < 4.0
    degC, drift = xy(artists.residual_options["mixed"], residual_ax)
    expected = xy(artists.options["mixed"], artists.chosen.axes)[1]
    np.testing.assert_allclose(drift, expected, rtol=1e-12)
    assert (degC[0], degC[-1]) == residual_ax.get_xlim()
    low, high = (edge * scale(residual_ax) for edge in residual_ax.get_ylim())
    assert low < drift.min() < drift.max() < high


def test_what_would_flatten_the_chosen_one_is_left_out_below() -> None:
    plan = plan_of(films=(*FILMS, BIG), spread=False)
    artists, _, times, away = against(plan, Series((PARALLEL, Leg(material="hi", ohms=220.0))))
    assert away < 0.03
    assert times > 5.0
    assert artists.residual_options == {}


def test_what_stands_apart_above_is_not_drawn_again_below() -> None:
    plan = plan_of(films=FILMS[1:], spread=False)
    apart = Series((Leg(material="np", ohms=3e3), Leg(material="pp", ohms=1e3)))
    artists, _, times, away = against(plan, apart)
    assert away > 0.05
    assert times < 4.0
    assert artists.residual_options == {}


def test_without_a_spread_there_is_no_worst_case_line() -> None:
    _, _, artists = drawn(plan_of(spread=False))
    assert artists.worst is None
    assert len(artists.peaks) == 1


def test_each_axis_has_one_unit_that_fits_its_data() -> None:
    ax, residual_ax, _ = drawn(plan_of())  # singles reach 12.8 %, the composite some thousand ppm
    assert (ax.get_ylabel(), residual_ax.get_ylabel()) == ("Drift (%)", "Drift (ppm)")
    assert residual_ax.get_xlabel() == "Temperature (°C)"
    assert ax.get_xlim() == residual_ax.get_xlim() == (-40.0, 150.0)


def test_a_drift_limit_is_two_lines_in_each_panel() -> None:
    ax, residual_ax, artists = drawn(plan_of('drift = "6000 ppm"'))
    for part, limits in ((ax, artists.limits), (residual_ax, artists.residual_limits)):
        levels = sorted(level for line in limits for level in set(xy(line, part)[1]))
        np.testing.assert_allclose(levels, [-0.006, 0.006])
    low, high = residual_ax.get_ylim()
    assert low < -6000 < 6000 < high


def test_a_mask_is_drawn_in_steps_and_the_tighter_line_binds() -> None:
    lines = (
        '["-40 degC", "100 degC", "0.3 %"], ["0 degC", "70 degC", "0.1 %"], ["120 degC", "200 degC", "0.5 %"]'
    )
    _, residual_ax, artists = drawn(plan_of(f"mask = [{lines}]"))
    degC, upper = xy(artists.residual_limits[0], residual_ax)
    assert degC.tolist() == [-40, 0, 0, 70, 70, 100, 100, 120, 120, 150]
    np.testing.assert_allclose(
        upper, [0.003, 0.003, 0.001, 0.001, 0.003, 0.003, np.nan, np.nan, 0.005, 0.005]
    )
    np.testing.assert_allclose(xy(artists.residual_limits[1], residual_ax)[1], -upper)


@pytest.mark.parametrize(
    ("goal", "width_ppm"), [('band = "4000 ppm"', 4000.0), ('box_tcr = "20 ppm/K"', 20.0 * 190.0)]
)
def test_a_band_is_shaded_around_the_middle_of_the_curve(goal: str, width_ppm: float) -> None:
    plan = plan_of(goal)
    _, _, artists = drawn(plan)
    (band,) = artists.residual_limits
    heights = np.unique(np.round(band.get_paths()[0].vertices[:, 1], 6))
    assert heights[-1] - heights[0] == pytest.approx(width_ppm)
    drift = (composite(plan, np.linspace(-40, 150, 20001)) - 1) * 1e6
    assert (heights[0] + heights[-1]) / 2 == pytest.approx((drift.min() + drift.max()) / 2, abs=0.01)


def test_a_band_judged_on_the_worst_case_is_laid_around_that_curve() -> None:
    plan = plan_of('band = "9000 ppm"\njudge = "worst-case"')
    _, _, artists = drawn(plan)
    heights = artists.residual_limits[0].get_paths()[0].vertices[:, 1]
    worst = artists.worst.get_ydata()
    assert (heights.min() + heights.max()) / 2 == pytest.approx((min(worst) + max(worst)) / 2, abs=1.0)
    assert "worst case" in artists.residual_limits[0].get_label()


def test_a_chord_limit_opens_from_the_reference() -> None:
    _, residual_ax, artists = drawn(plan_of('chord_tcr = "60 ppm/K"'))
    degC, upper = xy(artists.residual_limits[0], residual_ax)
    np.testing.assert_allclose(upper, 60e-6 * np.abs(degC - 25.0))
    np.testing.assert_allclose(xy(artists.residual_limits[1], residual_ax)[1], -upper)
    assert degC.tolist() == [-40.0, 25.0, 150.0]


def test_without_a_limit_none_is_drawn() -> None:
    _, _, artists = drawn(plan_of('judge = "nominal"'))
    assert artists.limits == artists.residual_limits == ()


def test_each_of_several_limits_has_a_dash_of_its_own() -> None:
    _, _, artists = drawn(plan_of('drift = "6000 ppm"\nchord_tcr = "60 ppm/K"'))
    drift, _, chord, _ = artists.residual_limits
    assert "6000 ppm" in drift.get_label()
    assert "60 ppm/K" in chord.get_label()
    assert drift._dash_pattern != chord._dash_pattern  # matplotlib has no public way to read it


def test_a_limit_far_off_the_scale_is_said_to_be_so() -> None:
    _, residual_ax, artists = drawn(plan_of('drift = "50 %"', spread=False))
    assert "beyond this scale" in artists.residual_limits[0].get_label()
    assert residual_ax.get_ylim()[1] * scale(residual_ax) < 0.5


def test_a_wanted_law_is_taken_off_every_curve() -> None:
    plan = plan_of('tc1 = "3000 ppm/K"\ntc2 = "0.5 ppm/K^2"')
    ax, residual_ax, artists = drawn(plan)
    degC, drift = xy(artists.materials["hi"], ax)
    x = degC - 25.0
    wanted = 1 + 3000e-6 * x + 0.5e-6 * x**2
    np.testing.assert_allclose(drift, ratio(FILMS[0], degC) - wanted, rtol=0, atol=1e-12)
    np.testing.assert_allclose(
        xy(artists.residual, residual_ax)[1], composite(plan, degC) - wanted, atol=1e-12
    )


def test_the_reference_is_marked_in_both_panels() -> None:
    _, _, artists = drawn(plan_of())
    assert [list(line.get_xdata()) for line in artists.references] == [[25, 25], [25, 25]]


def test_beyond_nine_materials_the_rest_are_grey_under_one_entry() -> None:
    films = [(f"m{n:02d}", -900.0 + 130.0 * n, 0.1 * (n % 7) - 0.2, 25.0) for n in range(14)]
    plan = plan_of(films=films, spread=False)
    _, _, artists = drawn(plan)
    assert len(artists.materials) == 9
    assert len(artists.others) == 5
    assert {leg["material"] for leg in plan.best.to_dict()["legs"]} <= set(artists.materials)
    assert {line.get_color() for line in artists.others} == {OTHER}
    texts = [text.get_text() for text in artists.legends[0].get_texts()]
    assert [text for text in texts if "other" in text] == ["5 other materials"]
    assert len(texts) == 9 + 1 + len(artists.options) + 3  # the chosen option, the limit, the reference
    looks = [(line.get_color(), line.get_marker()) for line in artists.materials.values()]
    assert len({colour for colour, _ in looks}) == len({marker for _, marker in looks}) == 9


def test_long_names_are_cut_in_the_middle_and_stay_apart() -> None:
    stem = "a_long_name_for_a_film_of_this_process_"
    films = [(stem + letter, tc1, 0.5, 25.0) for letter, tc1 in (("a", -900.0), ("b", 40.0), ("c", 600.0))]
    _, _, artists = drawn(plan_of(films=films))
    names = [line.get_label() for line in artists.materials.values()]
    assert len(set(names)) == 3
    for name in names:
        head, tail = name.split("…")
        assert stem.startswith(head)
        assert any(film[0].endswith(tail) for film in films)
        assert text_width(name) < 115


def test_legends_cover_no_curve_and_stay_on_the_page() -> None:
    stem = "WWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWW"
    films = [(f"{stem}{n:02d}", -900.0 + 130.0 * n, 0.1 * (n % 7) - 0.2, 25.0) for n in range(14)]
    goal = 'drift = "600 ppm"\nchord_tcr = "1234.56 ppm/K"\nband = "900 ppm"\nbox_tcr = "5 ppm/K"\n'
    goal += 'judge = "worst-case"'
    plan = plan_of(goal, films)
    more = [
        option_like(plan, network, f"W{stem}-{n}", role)
        for n, (network, role) in enumerate(((SERIES, ""), (PARALLEL, ""), (MIXED, ""), (MIXED, "given")))
    ]
    films_of = {"hi": films[0][0], "np": films[6][0], "pp": films[13][0]}
    more = [
        replace(o, network=mapped(o.network, lambda g: Leg(material=films_of[g.material], ohms=g.ohms)))
        for o in more
    ]
    ax, residual_ax, artists = drawn(replace(plan, options=(*more, *plan.options)))
    assert len(artists.options) == 4
    renderer = ax.figure.canvas.get_renderer()
    ax.figure.draw(renderer)
    page = ax.figure.bbox
    boxes = [legend.get_window_extent(renderer) for legend in artists.legends]
    for part, box in zip((ax, residual_ax), boxes, strict=True):
        assert not box.overlaps(part.bbox)
        assert page.x0 <= box.x0
        assert box.x1 <= page.x1
        assert page.y0 <= box.y0
        assert box.y1 <= page.y1
    assert not boxes[0].overlaps(boxes[1])


def test_no_text_is_read_as_mathematics() -> None:
    # No name can hold a dollar sign; the id of an option from a plan file can.
    plan = plan_of()
    odd = replace(
        plan,
        chosen="$x^{$",
        options=tuple(replace(o, id="$x^{$" if o.id == plan.chosen else o.id) for o in plan.options),
    )
    figure = Figure()
    FigureCanvasAgg(figure)
    draw_drift(*figure.subplots(2), odd)  # with matplotlib's own settings, which do read mathematics
    figure.draw(figure.canvas.get_renderer())
    texts = [text for text in figure.findobj(Text) if "$x^{$" in text.get_text()]
    assert len(texts) == 2  # the legend above, the title below
    assert not any(text.get_parse_math() for text in texts)


def test_a_composite_that_cancels_exactly_is_flat_on_the_scale_of_its_limit() -> None:
    films = [("up", 500.0, 0.0, 25.0), ("down", -500.0, 0.0, 25.0)]
    plan = plan_of('drift = "100 ppm"', films, spread=False)
    _, residual_ax, artists = drawn(plan)
    assert np.max(np.abs(artists.residual.get_ydata())) < 1e-6
    assert residual_ax.get_ylim()[0] < -100 < 100 < residual_ax.get_ylim()[1]


def test_the_chosen_option_is_the_thickest_line() -> None:
    ax, _, artists = drawn(plan_of())
    others = [line.get_linewidth() for line in ax.lines if line is not artists.chosen]
    assert max(others) < artists.chosen.get_linewidth()


@pytest.mark.parametrize(
    ("number", "text"),
    [(0.3 - 0.1, "0.2"), (-2500.0, "−2500"), (10_000.0, "10\xa0000"), (1e7, "10\xa0000\xa0000"), (0.0, "0")],
)
def test_numbers_are_written_without_exponents(number: float, text: str) -> None:
    assert number_text(number) == text


# --- colours ----------------------------------------------------------------------------------


def linear(colour):
    assert re.fullmatch("#[0-9a-f]{6}", colour)
    sRGB = np.array([int(colour[k : k + 2], 16) for k in (1, 3, 5)]) / 255
    return np.where(sRGB <= 0.04045, sRGB / 12.92, ((sRGB + 0.055) / 1.055) ** 2.4)


def test_line_colours_have_a_contrast_of_three_to_one_on_white() -> None:
    # WCAG 2.1: relative luminance and contrast ratio, coefficients from memory.
    for colour in (*MATERIAL_COLOURS, CHOSEN, LIMIT, OPTION, OTHER):
        luminance = linear(colour) @ [0.2126, 0.7152, 0.0722]
        assert 1.05 / (luminance + 0.05) >= 3.0, colour


# Machado, Oliveira and Fernandes, IEEE TVCG 15 (2009) 1291: severity 1.0, from memory.
SIGHT = {
    "normal": (np.eye(3), 40.0),
    "protanopia": (
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]],
        17.0,
    ),
    "deuteranopia": (
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]],
        17.0,
    ),
    "tritanopia": (
        [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]],
        17.0,
    ),
}


def cielab(rgb):
    """CIE 1976 L*a*b* of linear sRGB under D65; matrix of IEC 61966-2-1, from memory."""
    matrix = np.array(
        [
            [0.4124564, 0.3575761, 0.1804375],
            [0.2126729, 0.7151522, 0.0721750],
            [0.0193339, 0.1191920, 0.9503041],
        ]
    )
    t = matrix @ np.clip(rgb, 0, 1) / matrix.sum(axis=1)
    f = np.where(t > 216 / 24389, np.cbrt(t), (24389 / 27 * t + 16) / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


@pytest.mark.parametrize("sight", SIGHT)
def test_line_colours_are_told_apart_in_every_kind_of_sight(sight: str) -> None:
    matrix, least = SIGHT[sight]
    seen = {c: cielab(np.array(matrix) @ linear(c)) for c in (*MATERIAL_COLOURS, CHOSEN, LIMIT)}
    for one, other in itertools.combinations(seen, 2):
        assert np.linalg.norm(seen[one] - seen[other]) >= least, (one, other)
