"""Tracking of two materials on the same devices."""

import numpy as np
import pytest
from fit_sweeps import quadratic, sweep_of
from measured_fits import fit_of, law_fit
from scipy.special import ndtr

from tcplan.draws.statistics import tolerance_factor
from tcplan.errors import InputError
from tcplan.material.law import Thermistor
from tcplan.measure.fit import fit
from tcplan.measure.model import CommonErrors
from tcplan.measure.population import population
from tcplan.measure.spread_laws import tc1_moves
from tcplan.measure.tracking import tracking_of


def pair_of(seed, count, shared, apart, noise=0.0):
    """Return fits of two materials whose TC1 share a part and have a part of their own."""
    rng = np.random.Generator(np.random.Philox(seed))
    common = rng.normal(0, shared, count)
    covariance = np.diag([0.0, noise, 0.0]) ** 2
    made = []
    for tc1 in (-100e-6, 200e-6):
        own = tc1 + common + rng.normal(0, apart, count) + rng.normal(0, noise, count)
        made.append({f"d{k}": fit_of(1e3, (a, 0.0), noise=covariance) for k, a in enumerate(own)})
    return made


def test_the_shared_part_does_not_count():
    first, second = pair_of(1, 12, shared=20e-6, apart=1e-6)
    found = tracking_of(first, second)
    # Independent twin: numpy's standard deviation of the differences, with Howe's factor.
    off = [first[name].values[1] - second[name].values[1] for name in first]
    assert found.difference == pytest.approx(np.mean(off), rel=1e-9)
    assert found.total.sigma == pytest.approx(np.std(off, ddof=1), rel=1e-9)
    assert found.half_width == pytest.approx(
        tolerance_factor(12, 0.9973, 0.95) * np.std(off, ddof=1), rel=1e-9
    )
    names = [[""] * 12, list(first)]
    limits = [population(list(fits.values()), *names).scatter("tc1").half_width for fits in (first, second)]
    assert found.is_closer_than(limits)
    assert not found.is_closer_than([0.4 * found.half_width, 0.5 * found.half_width])
    assert (found.devices, found.unpaired) == (12, ())


def test_noise_of_both_fits_is_taken_off():
    found = [tracking_of(*pair_of(seed, 100, shared=5e-6, apart=1e-6, noise=2e-6)) for seed in range(60)]
    # The own parts make a variance of 2, the noise one of 8 more; 60 times 99 freedoms know 10 to 2 %.
    variance = np.mean([one.total.sigma**2 if not one.total.floored else 0.0 for one in found])
    assert variance == pytest.approx(2e-12, abs=0.8e-12)
    held = [one.total.low < np.sqrt(2) * 1e-6 < one.total.high for one in found]
    assert np.mean(held) > 0.85


def test_lots_count():
    first, second = pair_of(3, 6, shared=5e-6, apart=1e-6)
    lots = {name: f"lot {k // 2}" for k, name in enumerate(first)}
    found = tracking_of(first, second, lots)
    assert found.counts == (2, 2, 2)
    # Fewer lots than devices know less: the limits are wider than those of six independent devices.
    assert found.half_width > tracking_of(first, second).half_width


def test_devices_of_one_material_are_named():
    first, second = pair_of(4, 5, shared=5e-6, apart=1e-6)
    del first["d0"], second["d4"]
    found = tracking_of(first, second)
    assert found.devices == 3
    assert found.unpaired == ("d4", "d0")


def test_one_device_tells_no_tracking():
    first, second = pair_of(5, 3, shared=5e-6, apart=1e-6)
    with pytest.raises(InputError, match="two or more devices"):
        tracking_of({"d0": first["d0"]}, second)
    with pytest.raises(InputError, match="0 devices that carry both"):
        tracking_of(first, {"x": second["d0"]})


def test_lots_and_references_are_checked():
    first, second = pair_of(6, 3, shared=5e-6, apart=1e-6)
    first["d1"] = fit_of(1e3, (0.0, 0.0), reference=300.0)
    with pytest.raises(InputError) as caught:
        tracking_of(first, second, {"d0": "a", "d1": "a"})
    assert [problem.where for problem in caught.value.problems] == ["tracking", "device 'd2'"]


# ---- errors that both materials share


@pytest.mark.parametrize("order", [1, 2, 3])
@pytest.mark.parametrize(
    "common",
    [
        CommonErrors(chamber_offset=0.3),
        CommonErrors(chamber_scale=0.005),
        CommonErrors(lead=0.5, lead_tc1=3.9e-3),
        CommonErrors(meter_scale=1e-3),
    ],
)
def test_common_errors_move_tc1_as_in_the_fit(order, common):
    """Twin: the covariance that the fit itself adds for this error, through its own derivatives."""
    T = np.linspace(233.15, 398.15, 9)
    law = {"tc1": -640e-6, "tc2": 0.9e-6 * (order > 1), "tc3": 2e-10 * (order > 2)}
    found = fit(
        sweep_of(T, quadratic(T, ohms=100.0, **law), 1e-6), "polynomial", 298.15, order=order, common=common
    )
    added = found.covariance[1][1] - found.point_covariance[1][1]
    assert np.sum(tc1_moves(found, common) ** 2) == pytest.approx(added, rel=1e-5, abs=1e-22)


def campaign(rng, common):
    """Return two films on four lots of three devices, and by what the common errors of a sweep are off.

    The errors are put into R(T) itself, whose Taylor coefficients about the reference are then exact.
    """
    off, scale, lead = (
        rng.normal(0.0, u) for u in (common.chamber_offset, common.chamber_scale, common.lead)
    )
    films, lots = ({}, {}), {}
    for lot in range(4):
        for device in range(3):
            name = f"L{lot}/{device}"
            lots[name] = f"L{lot}"
            shared = rng.normal(0.0, 8e-6)
            for made, tc1, tc2, ohms, own in (
                (0, -640e-6, 0.9e-6, 100.0, 0.0),
                (1, 1450e-6, 0.5e-6, 1e3, 0.5e-6),
            ):
                a = tc1 + shared + rng.normal(0.0, own)
                # R(x) with x = T - T0 read as off + (1 + scale) x, beside a lead
                value = ohms * (1 + a * off + tc2 * off**2) + lead
                slope = ohms * (a + 2 * tc2 * off) * (1 + scale) + lead * common.lead_tc1
                bend = ohms * tc2 * (1 + scale) ** 2
                films[made][name] = fit_of(value, (slope / value, bend / value))
    return (*films, lots)


@pytest.mark.parametrize(
    "common",
    [
        CommonErrors(),
        CommonErrors(chamber_scale=0.005),
        CommonErrors(chamber_offset=1.0),
        CommonErrors(lead=0.05, lead_tc1=3.9e-3),
    ],
)
def test_limits_hold_with_errors_that_do_not_cancel(common):
    """Truth: the difference of TC1 is normal, -2090 ppm/K with a standard deviation of 0.5 ppm/K."""
    rng, held = np.random.Generator(np.random.Philox(21)), []
    for _ in range(150):
        found = tracking_of(*campaign(rng, common), common)
        off, half = found.difference + 2090e-6, found.half_width
        held.append(ndtr((half - off) / 0.5e-6) - ndtr((-half - off) / 0.5e-6) >= 0.9973)
    # 95 % confidence, less four standard errors of 150 campaigns.
    assert np.mean(held) > 0.95 - 4 * np.sqrt(0.95 * 0.05 / 150)


def test_errors_are_in_the_uncertainty_of_the_difference():
    first, second = pair_of(7, 6, shared=5e-6, apart=1e-6)
    plain = tracking_of(first, second)
    found = tracking_of(first, second, common=CommonErrors(chamber_scale=0.01))
    # By hand: the scale moves the difference by itself, -300 ppm/K, times 1 %.
    added = np.sqrt(found.uncertainty**2 - plain.uncertainty**2)
    assert added == pytest.approx(0.01 * abs(found.difference), rel=0.02)
    assert found.half_width > plain.half_width
    assert found.total == plain.total


def test_laws_that_are_no_polynomials_take_the_most():
    def bead(k, beta, u):
        law, common = Thermistor(reference=298.15, beta=beta + k), np.diag([0.0, u**2])
        return law_fit(law, 1e4, ("R", "beta"), (law.beta,), common=common)

    first = {f"d{k}": bead(k, 3400.0, 30.0) for k in range(4)}
    second = {f"d{k}": bead(2 * k, 3900.0, 40.0) for k in range(4)}
    plain = {f"d{k}": bead(2 * k, 3900.0, 0.0) for k in range(4)}
    shared, alone = tracking_of(first, second), tracking_of(first, plain)
    # TC1 = -B/T^2 of the B law (IEC 60539-1): 30 K and 40 K of B add up to 70 K at the most.
    assert shared.uncertainty**2 - alone.uncertainty**2 == pytest.approx(
        (70.0**2 - 30.0**2) / 298.15**4, rel=1e-6
    )


# ---- whether the two move together


def test_a_shared_part_is_shown_and_chance_is_not():
    assert tracking_of(*pair_of(1, 12, shared=20e-6, apart=1e-6)).is_shown
    shown = [
        tracking_of(*pair_of(100 + seed, 8, shared=0.0, apart=5e-6, noise=1e-6)).is_shown
        for seed in range(300)
    ]
    # One end of a 95 % interval: 2.5 %, and four standard errors of 300.
    assert np.mean(shown) < 0.025 + 4 * np.sqrt(0.025 * 0.975 / 300)


def test_noise_without_u_is_not_taken_off():
    first, second = pair_of(9, 40, shared=5e-6, apart=1e-6, noise=4e-6)
    bare = [
        {
            n: fit_of(f.ohms, f.values[1:], noise=np.array(f.point_covariance), stated=False)
            for n, f in fits.items()
        }
        for fits in (first, second)
    ]
    off = [first[name].values[1] - second[name].values[1] for name in first]
    # Independent twin: numpy's standard deviation of the differences as they are.
    assert tracking_of(*bare).total.sigma == pytest.approx(np.std(off, ddof=1), rel=1e-9)
    assert tracking_of(first, bare[1]).total.sigma > tracking_of(first, second).total.sigma
