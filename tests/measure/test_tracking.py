"""Tracking of two materials on the same devices."""

import numpy as np
import pytest
from measured_fits import fit_of

from tcplan.draws.statistics import tolerance_factor
from tcplan.errors import InputError
from tcplan.measure.population import population
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
