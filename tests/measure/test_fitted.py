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


def test_a_straight_film_is_fitted_with_a_line():
    one = fitted_text(sweep_text(2, 10, tc2=0.0))
    assert one.quadratic > 0.05
    assert {fit.names for fit in one.fits} == {("R", "tc1")}


def test_many_devices_without_a_quadratic_term_do_not_make_one():
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


def test_every_device_that_cannot_be_fitted_is_named():
    text = sweep_text(1, 1) + "25,1,a,L0\n25,1.1,b,L0\n"
    with pytest.raises(InputError) as caught:
        fitted_text(text)
    told = [str(problem) for problem in caught.value.problems]
    assert [line.split(": ")[1] for line in told] == ["device a", "device b"]
    assert all("one temperature" in line for line in told)


def test_what_cannot_be_put_together_names_the_file():
    rows = "".join(f"{t},{1000 + t},b,L0\n" for t in (150.0, 160.0, 170.0, 180.0))
    with pytest.raises(InputError, match=r"^film\.csv: devices: found readings that all start"):
        fitted_text(sweep_text(1, 1) + rows, order=1, reference=413.15)
