"""Fits against published data sets and certified values; the source stands beside each."""

from __future__ import annotations

import math

import numpy as np
import pytest
from fit_sweeps import covariance_of_products, sweep_of

from tcplan.measure.bands import ohms_band
from tcplan.measure.fit import fit
from tcplan.measure.fit_laws import Formula
from tcplan.measure.referred import referred

ZERO = 273.15


def test_a_quadratic_agrees_with_certified_values():
    # NIST Statistical Reference Datasets, Pontius (load cell calibration); certified estimates and deviations
    x = np.tile(np.arange(1, 21) * 150_000.0, 2)
    first = (
        ".11019 .21956 .32949 .43899 .54803 .65694 .76562 .87487 .98292 1.09146 "
        "1.20001 1.30822 1.41599 1.52399 1.63194 1.73947 1.84646 1.95392 2.06128 2.16844"
    )
    second = (
        ".11052 .22018 .32939 .43886 .54798 .65739 .76596 .87474 .98300 1.09150 "
        "1.20004 1.30818 1.41613 1.52408 1.63159 1.73965 1.84696 1.95445 2.06177 2.16829"
    )
    y = np.array([float(word) for word in (first + " " + second).split()])
    origin = 100_000.0  # the load 0 as a reference temperature, which must lie above 0 K
    found = fit(sweep_of(x + origin, y), "polynomial", origin, order=2)
    values, covariance = covariance_of_products(found)
    certified = [0.673565789473684e-3, 0.732059160401003e-6, -0.316081871345029e-14]
    deviations = [0.107938612033077e-3, 0.157817399981659e-9, 0.486652849992036e-16]
    assert values == pytest.approx(certified, rel=1e-9)
    assert np.sqrt(np.diag(covariance)) == pytest.approx(deviations, rel=1e-8)
    per_reading = found.ohms * found.law.ratio(x + origin)
    s = found.sigma / math.sqrt(np.mean(per_reading**-2.0))
    assert s == pytest.approx(0.205177424076185e-3, rel=1e-8)


MGH10_OHMS = [34780, 28610, 23650, 19630, 16370, 13720, 11540, 9744]
MGH10_OHMS += [8261, 7030, 6005, 5147, 4427, 3820, 3307, 2872]


@pytest.mark.parametrize("start", [(4000.0, 250.0), (40_000.0, 2500.0), (3000.0, 0.0)])
def test_a_thermistor_formula_agrees_with_certified_values(start):
    # NIST Statistical Reference Datasets, MGH10 (Meyer's thermistor): b1 exp(b2/(T + b3)); certified values.
    # The first start is the second one of NIST.
    x = np.arange(50.0, 126.0, 5.0)
    formula = Formula(text="exp(b2/(T + b3))", start=(("b2", start[0]), ("b3", start[1])))
    found = fit(sweep_of(x, MGH10_OHMS), formula, 85.0)
    ohms, b2, b3 = found.values
    factor = math.exp(-b2 / (85.0 + b3))
    b1 = ohms * factor
    assert (b1, b2, b3) == pytest.approx((5.6096364710e-3, 6181.3463463, 345.22363462), rel=1e-6)
    assert found.uncertainty("b2") == pytest.approx(23.309021107, rel=1e-6)
    assert found.uncertainty("b3") == pytest.approx(0.78486103508, rel=1e-6)
    gradient = np.array([factor, -b1 / (85.0 + b3), b1 * b2 / (85.0 + b3) ** 2])
    assert math.sqrt(gradient @ found.covariance @ gradient) == pytest.approx(1.5687892471e-4, rel=1e-5)
    residuals = np.array(found.residuals) * ohms * found.law.ratio(x)
    assert np.sum(residuals**2) == pytest.approx(87.945855171, rel=1e-6)


def test_a_line_agrees_with_the_example_of_the_guide():
    # JCGM 100:2008 (GUM), example H.3: corrections of a thermometer, a line about 20 degC, and its value at
    # 30 degC. The guide fits corrections near 0; 1 ohm is added to them, so that they are resistances.
    t = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511]
    b = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160]
    found = fit(sweep_of(np.array(t) + ZERO, 1.0 + np.array(b)), "polynomial", 20.0 + ZERO, order=1)
    values, covariance = covariance_of_products(found)
    deviations = np.sqrt(np.diag(covariance))
    assert values[0] - 1.0 == pytest.approx(-0.17120379, rel=1e-5)
    assert values[1] == pytest.approx(0.0021827, rel=3e-5)
    assert deviations == pytest.approx([0.0028776, 0.00066794], rel=1e-5)
    assert covariance[0, 1] / np.prod(deviations) == pytest.approx(-0.93042960, rel=1e-5)
    ohms, half = ohms_band(found, np.array([30.0 + ZERO]))
    assert ohms[0] - 1.0 == pytest.approx(-0.14937681, rel=1e-5)
    # Student's t of 9 degrees of freedom at 95 %, any table (GUM table G.2: 2.26)
    assert half[0] / 2.2621571628 == pytest.approx(0.00413860, rel=1e-5)
    assert referred(found, 30.0 + ZERO).uncertainty("R") == pytest.approx(0.00413860, rel=1e-5)


def test_steinhart_hart_through_three_points():
    # widely published constants for these three points; the form is that of Steinhart and Hart (1968)
    T, R = np.array([5.0, 25.0, 45.0]) + ZERO, np.array([25e3, 10e3, 4e3])
    found = fit(sweep_of(T, R, u_R=1e-3 * R), "steinhart-hart", 25.0 + ZERO)
    assert found.names == ("R", "a", "b", "c")
    assert found.values[1:] == pytest.approx((2.108508173e-3, 0.7979204727e-4, 6.535076315e-7), rel=1e-9)
    assert found.ohms == pytest.approx(10e3, rel=1e-9)
    assert found.dof == 0


def test_platinum_from_published_resistances():
    # IEC 60751: coefficients of the standard; four decimals computed from its formula
    table = {-200: 18.5201, -55: 78.3189, -40: 84.2707, -20: 92.1599, 0: 100.0, 25: 109.7347, 50: 119.3971}
    table |= {85: 132.8033, 100: 138.5055, 125: 147.9514, 150: 157.3251, 200: 175.8560, 850: 390.4811}
    T = np.array(list(table)) + ZERO
    found = fit(sweep_of(T, list(table.values()), u_R=5e-5 / math.sqrt(3.0)), "platinum", ZERO)
    published = {"R": 100.0, "a": 3.9083e-3, "b": -5.775e-7, "c": -4.183e-12}
    for name, value in published.items():
        assert abs(found.value(name) - value) < 3.0 * found.uncertainty(name)
        assert found.value(name) == pytest.approx(value, rel=2e-4)
    assert found.ohms * found.law.ratio(T) == pytest.approx(list(table.values()), abs=1e-4)


def test_the_b_law_from_published_resistances():
    # IEC 60539-1 formula, 10 kohm at 25 degC, B 3435 K; two decimals computed
    table = {0: 28704.29, 25: 10000.0, 50: 4101.19, 85: 1451.35, 100: 987.04, 125: 553.74}
    T = np.array(list(table)) + ZERO
    found = fit(sweep_of(T, list(table.values())), "thermistor", 25.0 + ZERO)
    assert found.names == ("R", "beta")
    assert found.values == pytest.approx((10e3, 3435.0), rel=3e-6)
