"""All devices of a sweep together: one order, lots, what is left out, what cannot be fitted."""

import numpy as np
import pytest
from campaigns import NINE, fitted_text, sweep_text
from scipy import stats

from tcplan.errors import InputError
from tcplan.measure.fitted import combined, scatter_of


def test_devices_stand_in_their_lots():
    one = fitted_text(sweep_text(3, 2))
    assert one.sweep.devices == ("L0/D0", "L0/D1", "L1/D0", "L1/D1", "L2/D0", "L2/D1")
    assert one.lots == ("L0", "L0", "L1", "L1", "L2", "L2")
    assert one.found.counts == (2, 2, 2)
    assert list(one.by_device) == list(one.lot_of) == list(one.sweep.devices)


def test_a_curved_film_keeps_its_quadratic_term():
    one = fitted_text(sweep_text(2, 3))
    assert one.quadratic < 1e-6
    assert {fit.names for fit in one.fits} == {("R", "tc1", "tc2")}


def test_a_straight_film_keeps_the_term_that_is_not_significant():
    one = fitted_text(sweep_text(2, 10, tc2=0.0))
    assert one.quadratic > 0.05
    assert {fit.names for fit in one.fits} == {("R", "tc1", "tc2")}


def test_many_devices_without_a_quadratic_term_do_not_make_one_significant():
    """Of 200 straight files of 20 devices about 5 % pass at p of 0.05, as of any test: 10, sigma 3.1."""
    kept = [
        fitted_text(sweep_text(1, 20, NINE[::2], tc2=0.0, seed=seed)).quadratic <= 0.05 for seed in range(200)
    ]
    assert 1 <= sum(kept) <= 20


def test_a_term_that_no_device_alone_shows_is_seen_by_all_together():
    text = sweep_text(1, 40, tc2=6e-9, noise=60e-6)
    one = fitted_text(text)
    assert sum(fit.last_term <= 0.05 for fit in one.fits) < 0.6 * len(one.fits)
    assert one.quadratic <= 0.05


def test_an_order_that_is_asked_is_kept():
    one = fitted_text(sweep_text(1, 2, tc2=0.0), order=3)
    assert one.quadratic is None
    assert one.fits[0].names == ("R", "tc1", "tc2", "tc3")


def test_too_few_temperatures_for_a_curve_give_a_line():
    one = fitted_text(sweep_text(1, 2, (-40.0, -40.0, 85.0, 85.0)))
    assert one.quadratic is None
    assert one.fits[0].names == ("R", "tc1")


def test_probabilities_together_are_those_of_scipy():
    rng = np.random.default_rng(3)
    p = rng.uniform(0, 1, 7)
    assert combined(p.tolist()) == pytest.approx(stats.combine_pvalues(p, "fisher").pvalue, rel=1e-12)
    assert combined([0.03]) == pytest.approx(0.03, rel=1e-12)
    assert combined([0.0, 0.5]) < 1e-100


def test_the_scatter_is_chi_squared_of_all_devices():
    fits = fitted_text(sweep_text(2, 3, stated=True)).fits
    factor, p = scatter_of(fits)
    total, dof = sum(fit.chi_squared for fit in fits), sum(fit.dof for fit in fits)
    assert dof == 6 * (9 - 3)
    assert factor == pytest.approx((total / dof) ** 0.5, rel=1e-12)
    assert p == pytest.approx(stats.chi2.sf(total, dof), rel=1e-9)
    assert scatter_of(fitted_text(sweep_text(1, 1)).fits) is None


def test_lines_are_left_out():
    text = sweep_text(1, 2)
    whole, less = fitted_text(text), fitted_text(text, exclude=(4, 5))
    assert len(whole.sweep.T) - len(less.sweep.T) == 2
    assert set(whole.sweep.line) - set(less.sweep.line) == {4, 5}
    assert less.fits[1] == whole.fits[1]


def test_a_device_that_is_left_out_whole_is_not_there():
    one = fitted_text(sweep_text(1, 3), exclude=tuple(range(11, 20)))
    assert one.sweep.devices == ("D0", "D2")
    assert one.fits == tuple(fitted_text(sweep_text(1, 3)).fits[k] for k in (0, 2))
    assert "All readings of device D1 are left out." in one.notes


def test_all_left_out_is_refused():
    with pytest.raises(InputError, match="no reading left"):
        fitted_text(sweep_text(1, 1), exclude=tuple(range(2, 11)))


def refusals(text, **request):
    with pytest.raises(InputError) as caught:
        fitted_text(text, **request)
    return [str(problem) for problem in caught.value.problems]


def test_devices_that_cannot_be_fitted_for_one_reason_are_told_once():
    text = sweep_text(1, 1) + "25,1,a,L0\n25,1.1,b,L0\n30,1,c,L0\n"
    first, second = refusals(text, order=1)
    assert first.startswith("film.csv: devices a, b: temperatures: found all readings at one temperature, 25")
    assert second.startswith("film.csv: device c: temperatures: found all readings at one temperature, 30")
    many = "".join(f"25,1,a{k},L0\n" for k in range(40))
    [told] = refusals(sweep_text(1, 1) + many, order=1)
    assert "devices a0, a1, a2, a3, a4 and 35 more: " in told


def test_one_short_device_makes_no_lines_of_all():
    """Two temperatures of one device of many: it is refused, by name and lines, with both ways out."""
    text = sweep_text(1, 3) + "0,1000,a,L0\n0,1000.1,a,L0\n50,990,a,L0\n50,990.1,a,L0\n"
    [told] = refusals(text)
    assert "quadratic term in device a (lines 29, 30, 31, 32), and enough in others" in told
    assert "expected 3 temperatures of every device" in told
    assert "--exclude" in told
    assert "--order 1" in told
    assert {fit.names for fit in fitted_text(text, order=1).fits} == {("R", "tc1")}
    assert {fit.names for fit in fitted_text(text, exclude=(29, 30, 31, 32)).fits} == {("R", "tc1", "tc2")}


def test_a_line_is_not_offered_for_a_device_that_can_have_none():
    [told] = refusals(sweep_text(1, 3) + "25,1,a,L0\n25,1.1,b,L0\n")
    assert "in devices a (line 29), b (line 30), and enough in others" in told
    assert "--order" not in told


def test_another_refusal_than_too_few_readings_makes_no_line():
    """R falls by e^11: the quadratic reaches zero, and so it is refused, not fitted with a line."""
    rows = "".join(f"{t},{float(1e5 * np.exp(-t / 15))!r}\n" for t in range(-40, 126, 15))
    [told] = refusals(f"T [degC],R [ohm]\n{rows}")
    assert "film.csv: law: found" in told
    assert told.endswith("R changes 59874 times over the sweep: try --model thermistor or steinhart-hart.")


def test_hysteresis_of_a_campaign_is_found_as_often_as_the_risk_says():
    """Of 60 campaigns of 15 devices without it 5 % show it in any: 3, and 8 is 3 sigma above."""
    ways = (*NINE[::2], *NINE[::-2])
    shown = [
        any(fit.hysteresis.significant for fit in fitted_text(sweep_text(1, 15, ways, seed=seed)).fits)
        for seed in range(60)
    ]
    assert sum(shown) <= 8


def test_hysteresis_that_no_device_shows_alone_is_seen_by_all_together():
    """40 ppm on 24 devices, noise of 50 ppm: the mean of 9 differences is known to 24 ppm, of all to 5."""
    lines = sweep_text(1, 24, (*NINE, *NINE[::-1]), noise=50e-6).strip().split("\n")
    moved = [lines[0]]
    for n, line in enumerate(lines[1:]):
        t, R, rest = line.split(",", 2)
        moved.append(f"{t},{float(R) * (1 - 40e-6 * (n % 18 > 8))!r},{rest}")
    one = fitted_text("\n".join(moved) + "\n")
    assert sum(fit.hysteresis.significant for fit in one.fits) < 12
    assert one.hysteresis < 1e-6
    assert {fit.lack_of_fit for fit in one.fits} == {None}
    # twin: Student's t of the mean of the means, by scipy.stats
    means = [fit.hysteresis.mean for fit in one.fits]
    u = np.linalg.norm([fit.hysteresis.uncertainty for fit in one.fits])
    expected = 2.0 * stats.t.sf(abs(sum(means)) / u, sum(fit.dof - 1 for fit in one.fits))
    assert one.hysteresis == pytest.approx(expected, rel=1e-6)


def test_a_law_of_the_wrong_kind_is_doubted():
    """Notes only: R falls 47 times as of a bead of 3435 K, or rises 4 times as of platinum."""
    bead = "".join(
        f"{t},{float(1e4 * np.exp(3435 / (t + 273.15) - 3435 / 298.15))!r}\n" for t in range(-20, 81, 10)
    )
    steep, wide = fitted_text(f"T [degC],R [ohm]\n{bead}", order=3).notes
    assert steep == "R changes 47 times over the sweep: try --model thermistor or steinhart-hart."
    assert wide.startswith("Readings scatter by ")
    assert fitted_text(f"T [degC],R [ohm]\n{bead}", model="thermistor").notes == ()
    rising = "".join(f"{t},{100.0 * (1 + 3.9e-3 * t - 5.8e-7 * t * t)!r}\n" for t in range(0, 851, 50))
    [steep] = fitted_text(f"T [degC],R [ohm]\n{rising}").notes
    assert steep.endswith("try --model platinum, or a formula as --law.")
    assert fitted_text(sweep_text(2, 2)).notes == ()


def test_what_cannot_be_put_together_names_the_file():
    rows = "".join(f"{t},{1000 + t},b,L0\n" for t in (150.0, 160.0, 170.0, 180.0))
    with pytest.raises(InputError, match=r"^film\.csv: devices: found readings that all start"):
        fitted_text(sweep_text(1, 1) + rows, order=1, reference=413.15)
