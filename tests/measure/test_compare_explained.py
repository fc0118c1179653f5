"""What explains a device: a scalar twin, the pseudo-inverse, the multivariate normal, and coverage."""

import numpy as np
import pytest
from makers import by_name, film, leg
from measured_composites import MIXED, PARALLEL, REFERENCE, SERIES, device_ohms, films

from tcplan.material.spread import Spread
from tcplan.measure.composite import UNIFORM, composite_of
from tcplan.measure.explained import Measured, explain
from tcplan.measure.model import CommonErrors
from tcplan.network import Parallel, value
from tcplan.process import Correlation, Parameter, Process, Tracking

T = np.array([-40.0, -10.0, 25.0, 60.0, 90.0, 120.0, 150.0]) + 273.15
NONE = CommonErrors()


def composite(network, materials, process=None):
    spreads = {name: m.spread for name, m in materials.items()}
    more = () if process is None else (process,)
    return composite_of(network, materials, spreads, REFERENCE, *more)


def off_of(own, deviations):
    return {(q.material, q.slot): d for q, d in zip(own.quantities, deviations.tolist(), strict=True)}


def generator(seed):
    return np.random.Generator(np.random.Philox(seed))


# --- the composite -------------------------------------------------------------------------------


@pytest.mark.parametrize("network", [SERIES, PARALLEL, MIXED], ids=["series", "parallel", "mixed"])
@pytest.mark.parametrize("reference", [REFERENCE, 300.15])
def test_a_device_is_that_of_the_scalar_twin(network, reference):
    # Outside: resistances of series and parallel legs written out one by one (the twin of the tests).
    spreads = {"value_percent": 10.0, "tc1_spread_ppm": 30.0, "tc2_spread_ppm": 0.1}
    laws = {name: [1e6 * c for c in m.law.coefficients] for name, m in films().items()}
    materials = by_name(*(film(name, *tcs, reference=reference, **spreads) for name, tcs in laws.items()))
    own = composite(network, materials)
    deviations = own.root @ generator(3).standard_normal(own.root.shape[1])
    found = own.response(deviations, T)
    assert found.ohms == pytest.approx(device_ohms(network, materials, off_of(own, deviations), T), rel=1e-12)


@pytest.mark.parametrize("network", [SERIES, PARALLEL, MIXED], ids=["series", "parallel", "mixed"])
def test_derivatives_are_those_of_differences(network):
    # Outside: central differences.
    own = composite(network, films())
    at = own.root @ generator(4).standard_normal(own.root.shape[1])
    found = own.response(at, T)
    for k, quantity in enumerate(own.quantities):
        step = np.zeros(len(at))
        step[k] = 1e-3 * quantity.sigma
        around = [own.response(at + sign * step, T).ohms for sign in (1, -1)]
        slope = (around[0] - around[1]) / (2.0 * step[k])
        assert found.jacobian[:, k] == pytest.approx(slope, abs=1e-5 * np.max(np.abs(slope)))
    slope = (own.response(at, T + 0.01).ohms - own.response(at, T - 0.01).ohms) / 0.02
    assert found.slope == pytest.approx(slope, abs=1e-7 * np.max(np.abs(slope)))


def test_standard_deviations_are_a_third_of_limits_sigma_itself_or_uniform():
    # Outside: a normal with limits at 3 sigma (common practice); a uniform of half-width h has h/sqrt(3)
    # (JCGM 100, 4.3.7).
    made = {}
    for name, spread in (
        ("pp", Spread(meaning="limits", value=0.12)),
        ("np", Spread(meaning="sigma", value=0.05, tc1=1e-5)),
        ("nd", Spread(meaning="limits", value=0.09, shape="rectangular")),
    ):
        made[name] = spread
    own = composite_of(SERIES, films(), made, REFERENCE)
    found = {(q.material, q.slot): q.sigma for q in own.quantities}
    assert found == pytest.approx(
        {
            ("pp", "value"): 0.04,
            ("np", "value"): 0.05,
            ("np", "tc1"): 1e-5,
            ("nd", "value"): 0.09 / np.sqrt(3),
        }
    )
    assert pytest.approx(1.0 / np.sqrt(3.0)) == UNIFORM


def test_correlation_and_tracking_are_in_the_covariance():
    # Outside: the covariance of correlated numbers, and of c + d_i, |c| <= K - w/2, |d_i| <= w/2, at 3 sigma.
    pair = Correlation(first=Parameter(material="pp", component="value"),
                       second=Parameter(material="np", component="value"), value=0.6)  # fmt: skip
    process = Process(correlations=(pair,), trackings=(Tracking(materials=("pp", "np"), within=10e-6),))
    own = composite(PARALLEL, films(), process)
    names = [(q.material, q.slot) for q in own.quantities]
    covariance = own.root @ own.root.T
    values = covariance[names.index(("pp", "value")), names.index(("np", "value"))]
    assert values == pytest.approx(0.6 * 0.04 * 0.03)
    shared = covariance[names.index(("pp", "tc1")), names.index(("np", "tc1"))]
    assert shared == pytest.approx(((24e-6 - 5e-6) / 3.0) ** 2)


# --- least norm ----------------------------------------------------------------------------------


def linear():
    """Return a series network that is linear in its deviations: laws only."""
    return composite(SERIES, films(value=False))


def test_an_exactly_solvable_case_gives_the_pseudo_inverse():
    # Outside: numpy.linalg.pinv, the least-norm solution of an underdetermined linear system.
    own, at = linear(), np.array([233.15, 423.15])
    truth = own.root @ generator(5).standard_normal(own.root.shape[1])
    ohms = device_ohms(SERIES, films(), off_of(own, truth), at)
    start = own.response(own.nominal(), at)
    jacobian = start.jacobian @ own.root
    least = own.root @ (np.linalg.pinv(jacobian) @ (ohms - start.ohms))
    found = explain(own, Measured(T=at, ohms=ohms, sigma=1e-7 * ohms), NONE)
    assert np.array(found.values) == pytest.approx(least, rel=1e-4)
    assert found.norm == pytest.approx(
        np.linalg.norm(np.linalg.pinv(jacobian) @ (ohms - start.ohms)), rel=1e-4
    )


def test_value_covariance_and_chi_square_are_those_of_the_multivariate_normal():
    # Outside: conditioning of a joint normal, mean C J^T (J C J^T + S)^-1 y, covariance C - that J C, and the
    # chi-square y^T (J C J^T + S)^-1 y of a normal vector y (textbook formulas).
    own = linear()
    start = own.response(own.nominal(), T)
    rng = generator(6)
    truth = own.root @ rng.standard_normal(own.root.shape[1])
    sigma = np.full(len(T), 2.0)
    ohms = device_ohms(SERIES, films(), off_of(own, truth), T) + rng.normal(0.0, sigma)
    prior = own.root @ own.root.T
    middle = np.linalg.inv(start.jacobian @ prior @ start.jacobian.T + np.diag(sigma**2))
    gain = prior @ start.jacobian.T @ middle
    found = explain(own, Measured(T=T, ohms=ohms, sigma=sigma), NONE)
    assert np.array(found.values) == pytest.approx(gain @ (ohms - start.ohms), rel=1e-6)
    scale = np.sqrt(np.outer(np.diag(prior), np.diag(prior)))
    left = prior - gain @ start.jacobian @ prior
    assert np.array(found.covariance) / scale == pytest.approx(left / scale, abs=1e-7)
    whole = (ohms - start.ohms) @ middle @ (ohms - start.ohms)
    assert found.spread.squares + found.misfit.squares == pytest.approx(whole, rel=1e-6)
    assert found.spread.dof + found.misfit.dof == len(T)


# --- coverage ------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def many():
    """Return (off by how many uncertainties, probabilities of both checks) of 1600 devices."""
    own, rng, common = composite(PARALLEL, films()), generator(7), CommonErrors(chamber_offset=0.3)
    off, checks = [], []
    for _ in range(1600):
        truth = own.root @ rng.standard_normal(own.root.shape[1])
        shifted = T + 0.3 * rng.standard_normal()
        exact = own.response(truth, shifted).ohms
        ohms = exact * (1.0 + 20e-6 * rng.standard_normal(len(T)))
        found = explain(own, Measured(T=T, ohms=ohms, sigma=20e-6 * ohms), common)
        uncertainty = np.array([d.uncertainty for d in found.deviations])
        off.append((np.array(found.values) - truth) / uncertainty)
        checks.append((found.spread.probability, found.misfit.probability))
    return np.array(off), np.array(checks)


def test_the_truth_is_inside_95_percent_in_95_percent(many):
    # Outside: the definition of coverage; 1600 devices of 6 deviations leave about 0.4 % of chance.
    assert 0.94 <= np.mean(np.abs(many[0]) <= 1.96) <= 0.96


def test_both_probabilities_are_even(many):
    # Outside: a probability of more is uniform between 0 and 1 where the model holds.
    for column in many[1].T:
        for part in (0.05, 0.5):
            sigma = np.sqrt(part * (1.0 - part) / len(column))
            assert abs(np.mean(column < part) - part) < 4.0 * sigma


# --- what the readings cannot tell ---------------------------------------------------------------


def test_two_legs_of_alike_films_are_not_told_apart():
    # Outside: two equal materials in one node act by the sum of their deviations only.
    alike = by_name(*(film(n, 100.0, 0.5, value_percent=9.0, tc1_spread_ppm=30.0) for n in ("one", "two")))
    own = composite(Parallel((leg("one", 1e4), leg("two", 1e4))), alike)
    ohms = own.response(own.nominal(), T).ohms * 1.02
    found = explain(own, Measured(T=T, ohms=ohms, sigma=1e-6 * ohms), NONE)
    values = [d for d in found.deviations if d.slot == "value"]
    assert values[0].value == pytest.approx(values[1].value, rel=1e-3)
    assert values[0].left == pytest.approx(np.sqrt(0.5), rel=1e-3)
    names = [(found.deviations[i].slot, found.deviations[k].slot, round(c, 2)) for i, k, c in found.twins]
    assert ("value", "value", -1.0) in names


def test_a_device_beyond_the_spread_is_not_plausible():
    own = composite(PARALLEL, films())
    off = {("pp", "tc1"): 150e-6}  # 15 sigma
    ohms = device_ohms(PARALLEL, films(), off, T)
    found = explain(own, Measured(T=T, ohms=ohms, sigma=2e-5 * ohms), NONE)
    assert found.spread.probability < 1e-4
    bent = ohms * (1.0 + 2e-3 * np.sin((T - 233.15) / 15.0))  # no material bends so
    assert explain(own, Measured(T=T, ohms=bent, sigma=2e-5 * ohms), NONE).misfit.probability < 1e-6


def test_a_free_level_leaves_the_drift_alone():
    # Outside: with the level free, all readings times a constant say the same of the laws.
    own = composite(PARALLEL, films())
    ohms = device_ohms(PARALLEL, films(), {("pp", "tc1"): 8e-6}, T)
    found = [
        explain(own, Measured(T=T, ohms=f * ohms, sigma=2e-5 * f * ohms), NONE, level_known=False)
        for f in (1.0, 1.3)
    ]
    assert np.array(found[0].values) == pytest.approx(found[1].values, rel=1e-2, abs=1e-9)
    assert explain(own, Measured(T=T, ohms=1.3 * ohms, sigma=2e-5 * ohms), NONE).norm > 3.0 * found[1].norm


def test_readings_of_nothing_like_it_end_with_a_misfit():
    own = composite(PARALLEL, films())
    ohms = np.full(len(T), 2.0 * value(PARALLEL)) * (1.0 + 0.5 * np.sin(T))
    found = explain(own, Measured(T=T, ohms=ohms, sigma=1e-6 * ohms), NONE)
    assert found.misfit.probability < 1e-9
    assert found.largest > 0.1
