"""The lots: distributions, correlations, tracking and shared width errors, against closed forms."""

from dataclasses import replace

import numpy as np
import pytest
from makers import by_name, film, leg

from tcplan.draws.columns import correlation_root
from tcplan.draws.sampling import BLOCK, leg_mismatch, sampler
from tcplan.errors import InputError
from tcplan.material.model import Film
from tcplan.material.spread import Spread
from tcplan.network import Series
from tcplan.process import Correlation, Parameter, Process, Tracking

INDEPENDENT = Process()


def p(text):
    material, component = text.split(".")
    return Parameter(material=material, component=component)


def correlation(first, second, value):
    return Correlation(first=p(first), second=p(second), value=value)


def films(**spreads):
    return {name: replace(film(name, 100.0), spread=spread) for name, spread in spreads.items()}


def lots(materials, process=INDEPENDENT, blocks=4, seed=3, screened=False):
    """Return the deviation of every parameter over some blocks."""
    sample = sampler(
        tuple(materials),
        materials,
        {n: m.spread for n, m in materials.items()},
        process,
        screened=screened,
    )
    found = [sample.deviations(sample.draw_columns(seed, block)) for block in range(blocks)]
    return {key: np.concatenate([one[key] for one in found]) for key in found[0]}


def limits(**half_widths):
    return Spread(meaning="limits", **half_widths)


def test_limits_are_three_sigma_of_a_normal_and_the_ends_of_a_rectangular():
    drawn = lots(
        films(
            a=limits(value=0.15, tc1=60e-6),
            b=limits(value=0.15, tc1=60e-6, shape="rectangular"),
            c=Spread(meaning="sigma", value=0.05),
        ),
        blocks=16,
    )
    n = 16 * BLOCK
    # Moments of the normal and of the uniform distribution, any text on probability; 5 standard errors.
    for name, sigma in (("a.value", 0.05), ("a.tc1", 20e-6), ("b.value", 0.15 / 3**0.5), ("c.value", 0.05)):
        assert abs(drawn[p(name)].mean()) < 5 * sigma / n**0.5
        assert drawn[p(name)].std() == pytest.approx(sigma, rel=5 / (2 * n) ** 0.5)
    assert np.abs(drawn[p("b.value")]).max() <= 0.15
    assert np.abs(drawn[p("a.value")]).max() > 0.15


def test_a_screened_normal_stays_inside_its_limits():
    inside = lots(films(a=limits(value=0.15)), blocks=16, screened=True)[p("a.value")]
    free = lots(films(a=limits(value=0.15)), blocks=16)[p("a.value")]
    assert 0.149 < np.abs(inside).max() <= 0.15 < np.abs(free).max()
    # Variance of a normal cut at c = 3: 1 - 2 c phi(c)/(2 Phi(c) - 1) = 0.973337 (any text on statistics).
    assert inside.var() == pytest.approx(0.05**2 * 0.973337, rel=0.02)


def test_rectangular_logarithm():
    # JCGM 101 and NPL report DEM-ES-011: ln x for x in 0.1..1.1 has mean -0.66490029, u 0.60622670.
    value = lots(films(a=limits(value=0.5 / 0.6, shape="rectangular")), blocks=123)[p("a.value")]
    logarithm = np.log(0.6 * (1.0 + value))
    assert logarithm.mean() == pytest.approx(-0.66490029, abs=0.003)
    assert logarithm.std() == pytest.approx(0.60622670, abs=0.003)


def test_correlated_inputs_of_an_impedance():
    # JCGM 100, H.2: five readings of V, I and phi give R = V/I cos(phi) = 127.732170, u 0.0710714.
    V = np.array([5.007, 4.994, 5.005, 4.990, 4.999])
    I = np.array([19.663, 19.639, 19.640, 19.685, 19.678]) * 1e-3  # noqa: E741 - a current
    phi = np.array([1.0456, 1.0438, 1.0468, 1.0428, 1.0433])
    means = [one.mean() for one in (V, I, phi)]
    sigma = [one.std(ddof=1) / 5**0.5 / one.mean() for one in (V, I, phi)]
    r = np.corrcoef([V, I, phi])
    materials = films(**{n: Spread(meaning="sigma", value=s) for n, s in zip("vip", sigma, strict=True)})
    pairs = (("v", "i", r[0, 1]), ("v", "p", r[0, 2]), ("i", "p", r[1, 2]))
    process = Process(
        correlations=tuple(correlation(f"{a}.value", f"{b}.value", float(c)) for a, b, c in pairs)
    )
    drawn = lots(materials, process, blocks=32)
    v, i, angle = (mean * (1.0 + drawn[p(f"{n}.value")]) for n, mean in zip("vip", means, strict=True))
    R = v / i * np.cos(angle)
    assert R.mean() == pytest.approx(127.732170, rel=1e-5)
    assert R.std() == pytest.approx(0.0710714, rel=0.01)


@pytest.mark.parametrize("shape", ["normal", "rectangular"])
@pytest.mark.parametrize("screened", [False, True])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_full_correlation_is_exact(shape, screened, sign):
    materials = films(
        a=limits(value=0.15, tc1=60e-6, shape=shape), b=limits(value=0.20, tc1=10e-6, shape=shape)
    )
    process = Process(correlations=(correlation("a.value", "b.value", sign),))
    drawn = lots(materials, process, screened=screened)
    a, b = drawn[p("a.value")], drawn[p("b.value")]
    assert np.abs(a / 0.15 - sign * b / 0.20).max() < 1e-12
    assert np.abs(a).max() > 0.10
    assert abs(np.corrcoef(a, drawn[p("a.tc1")])[0, 1]) < 0.03


def test_partial_correlation_of_normals_and_of_rectangulars():
    process = Process(correlations=(correlation("a.value", "b.tc1", -0.6),))
    for shape in ("normal", "rectangular"):
        materials = films(a=limits(value=0.1, shape=shape), b=limits(tc1=60e-6, shape=shape))
        drawn = lots(materials, process, blocks=16)
        found = np.corrcoef(drawn[p("a.value")], drawn[p("b.tc1")])[0, 1]
        # Of a Gaussian copula: (6/pi) arcsin(rho/2) between the uniforms (Pearson 1907, from memory).
        expected = -0.6 if shape == "normal" else 6 / np.pi * np.arcsin(-0.3)
        assert found == pytest.approx(expected, abs=0.01)


def test_the_root_of_a_singular_matrix_is_exact():
    matrix = np.array([[1.0, 1.0, -1.0], [1.0, 1.0, -1.0], [-1.0, -1.0, 1.0]])
    root = correlation_root(matrix)
    assert root @ root.T == pytest.approx(matrix, abs=1e-14)
    with pytest.raises(InputError, match="contradict"):
        correlation_root(np.array([[1.0, 0.9, -0.9], [0.9, 1.0, 0.9], [-0.9, 0.9, 1.0]]))


@pytest.mark.parametrize(("shape", "screened"), [("rectangular", False), ("normal", True)])
def test_tracking_limits_hold(shape, screened):
    K, within = 25e-6, 3e-6
    materials = films(**{n: limits(tc1=K, shape=shape) for n in "abc"})
    process = Process(trackings=(Tracking(materials=("a", "b", "c"), within=within),))
    drawn = lots(materials, process, blocks=16, screened=screened)
    tc1 = np.array([drawn[p(f"{n}.tc1")] for n in "abc"])
    assert 0.9 * K < np.abs(tc1).max() <= K * (1 + 1e-12)
    assert 0.6 * within < np.ptp(tc1, axis=0).max() <= within * (1 + 1e-12)


def test_tracking_of_normals_holds_at_three_sigma():
    K, within = 25e-6, 3e-6
    process = Process(trackings=(Tracking(materials=("a", "b"), within=within),))
    drawn = lots(films(a=limits(tc1=K), b=limits(tc1=K)), process, blocks=16)
    a, b = drawn[p("a.tc1")], drawn[p("b.tc1")]
    assert 3 * (a - b).std() == pytest.approx(within / 2**0.5, rel=0.02)
    assert 3 * a.std() <= K
    assert np.corrcoef(a, b)[0, 1] > 0.99


def test_tracking_that_does_not_bind_leaves_the_limits():
    process = Process(trackings=(Tracking(materials=("a", "b"), within=1e-3),))
    materials = films(a=limits(tc1=25e-6, shape="rectangular"), b=limits(tc1=25e-6, shape="rectangular"))
    drawn = lots(materials, process, blocks=4)
    assert abs(np.corrcoef(drawn[p("a.tc1")], drawn[p("b.tc1")])[0, 1]) < 0.03
    assert np.abs(drawn[p("a.tc1")]).max() == pytest.approx(25e-6, rel=0.01)


def etched(etch_a, etch_b, process=INDEPENDENT):
    spread = limits(value=0.1, width_bias=0.06e-6)
    materials = {
        n: replace(
            film(n, 100.0),
            spread=spread,
            film=Film(min_width=1e-6, preferred_width=w, width_bias=0.1e-6, etch=etch),
        )
        for n, w, etch in (("a", 1.1e-6, etch_a), ("b", 2.1e-6, etch_b))
    }
    drawn = lots(materials, process)
    return drawn[p("a.width_bias")], drawn[p("b.width_bias")]


def test_films_of_one_etch_share_their_width_error():
    a, b = etched("poly", "poly")
    # One error in micrometres: twice the fraction at half the effective width.
    assert np.abs(a - 2.0 * b).max() < 1e-15
    assert a.std() == pytest.approx(0.02, rel=0.02)
    for pair in (("poly", "metal"), (None, None)):
        a, b = etched(*pair)
        assert abs(np.corrcoef(a, b)[0, 1]) < 0.03
    stated = Process(correlations=(correlation("a.width_bias", "b.width_bias", 0.5),))
    assert np.corrcoef(*etched("poly", "poly", stated))[0, 1] == pytest.approx(0.5, abs=0.02)


def test_a_width_error_moves_the_value_as_sheet_over_width():
    spread = limits(value=0.1, width_bias=0.06e-6)
    material = replace(film("a", 100.0), spread=spread, film=Film(min_width=1e-6, width_bias=0.1e-6))
    sample = sampler(("a",), {"a": material}, {"a": spread}, Process())
    z = sample.draw_columns(1, 0)
    off = sample.deviations(z)
    # R = sheet L/W with W the effective width, common practice.
    expected = (1.0 + off[p("a.value")]) / (1.0 - off[p("a.width_bias")])
    assert sample.fill_rows(z)[0] == pytest.approx(expected, rel=1e-14)


def test_a_normal_tail_never_takes_a_value_to_zero():
    materials = films(a=limits(value=0.95))
    sample = sampler(("a",), materials, {"a": materials["a"].spread}, Process())
    least = min(sample.fill_rows(sample.draw_columns(1, k))[0].min() for k in range(16))
    assert least == 0.01


def test_contradictions_are_input_errors():
    tracked = Process(
        trackings=(Tracking(materials=("a", "b"), within=3e-6),),
        correlations=(correlation("a.tc1", "b.value", 0.5),),
    )
    twice = Process(
        trackings=(
            Tracking(materials=("a", "b"), within=3e-6),
            Tracking(materials=("b", "c"), within=5e-6),
        )
    )
    both = Process(
        correlations=(correlation("a.value", "b.value", 0.5), correlation("b.value", "a.value", 0.4))
    )
    materials = films(**{n: limits(value=0.1, tc1=25e-6) for n in "abc"})
    for process, words in ((tracked, "tracked"), (twice, "two of them"), (both, "0.5 and 0.4")):
        with pytest.raises(InputError, match=words):
            lots(materials, process)
    with pytest.raises(ValueError, match="no spread"):
        sampler(("a",), materials, {}, Process())


def test_what_does_not_vary_has_no_correlation():
    process = Process(
        correlations=(correlation("a.value", "b.value", 0.5), correlation("a.value", "a.end_tc1", 0.5))
    )
    sample = sampler(
        ("a", "b"),
        films(a=limits(value=0.1), b=limits(tc1=1e-6)),
        {"a": limits(value=0.1), "b": limits(tc1=1e-6)},
        process,
    )
    assert sample.root is None
    assert len(sample.columns) == 2


def test_mismatch_of_a_leg_falls_with_the_root_of_its_area():
    # Pelgrom, Duinmaijer, Welbers, JSSC 24 (1989) 1433, law from memory: a pair has matching/sqrt(W L).
    def sigma(width, ohms):
        body = Film(min_width=1e-6, preferred_width=width, matching=1.5e-8)
        materials = by_name(replace(film("a", 100.0, ohm_per_square=100.0), film=body), film("b", 5.0))
        return leg_mismatch(Series((leg("a", ohms), leg("b", 50.0))), materials, 298.15)

    one, unknown = sigma(2e-6, 1000.0)
    assert unknown is None
    assert one == pytest.approx(1.5e-8 / 2**0.5 / (2e-6 * 20e-6) ** 0.5, rel=1e-12)
    assert sigma(4e-6, 1000.0)[0] == pytest.approx(one / 2, rel=1e-12)  # area times 4
    assert sigma(2e-6, 9000.0)[0] == pytest.approx(one / 3, rel=1e-12)  # 9 units
