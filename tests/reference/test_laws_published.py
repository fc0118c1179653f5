"""Laws against published figures; the source stands beside each."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tcplan.material.law import (
    Expression,
    Platinum,
    Polynomial,
    Table,
    Thermistor,
    check_positive,
    chord_tcr,
    from_peak,
    steinhart_hart_from_points,
)

ZERO = 273.15

# IEC 60751: coefficients of the standard; four decimals computed from its formula
PLATINUM_OHMS = {
    -200: 18.5201,
    -55: 78.3189,
    -40: 84.2707,
    -20: 92.1599,
    0: 100.0,
    25: 109.7347,
    50: 119.3971,
    85: 132.8033,
    100: 138.5055,
    125: 147.9514,
    150: 157.3251,
    200: 175.8560,
    850: 390.4811,
}


@pytest.mark.parametrize(("celsius", "ohms"), PLATINUM_OHMS.items())
def test_platinum_law_follows_iec_60751(celsius: int, ohms: float) -> None:
    law = Platinum(reference=ZERO)
    assert 100.0 * float(law.ratio(celsius + ZERO)) == pytest.approx(ohms, abs=5.01e-5)


def test_platinum_is_within_the_printed_table_of_iec_60751() -> None:
    # IEC 60751 prints 18.53 ohm at -200 degC, 0.01 ohm steps
    assert 100.0 * float(Platinum(reference=ZERO).ratio(ZERO - 200.0)) == pytest.approx(18.53, abs=0.0101)


@pytest.mark.parametrize(
    ("celsius", "tc1", "tc2"),
    # computed from IEC 60751's A and B: a' = (a + 2 b d)/D, b' = b/D, D = 1 + a d + b d^2
    [(25.0, 3.535277853e-3, -5.262694756e-7), (20.0, 3.604298961e-3, -5.357465895e-7)],
)
def test_platinum_referred_to_room_temperature(celsius: float, tc1: float, tc2: float) -> None:
    at_zero = Polynomial(reference=ZERO, coefficients=(3.9083e-3, -5.775e-7))
    moved = at_zero.referred_to(celsius + ZERO)
    assert moved.coefficients == pytest.approx((tc1, tc2), rel=1e-9)
    assert moved.referred_to(ZERO).coefficients == pytest.approx(at_zero.coefficients, rel=1e-12)
    assert Platinum(reference=ZERO).taylor(celsius + ZERO, 2) == pytest.approx((tc1, tc2), rel=1e-9)


@pytest.mark.parametrize(
    ("celsius", "tcr_ppm"),
    # IEC 60751 with the definition of MIL-STD-202 method 304
    [(-55, 3578.608), (-40, 3570.011), (85, 3503.702), (125, 3482.651), (150, 3469.494)],
)
def test_platinum_chord_tcr(celsius: int, tcr_ppm: float) -> None:
    chord = chord_tcr(Platinum(reference=ZERO), celsius + ZERO, 25.0 + ZERO)
    assert chord * 1e6 == pytest.approx(tcr_ppm, abs=6e-4)


def test_platinum_box_tcr() -> None:
    # IEC 60751 with the definition of MIL-STD-202 method 304
    law = Platinum(reference=25.0 + ZERO)
    span = float(law.ratio(125.0 + ZERO) - law.ratio(ZERO - 55.0))
    assert span / 180.0 * 1e6 == pytest.approx(3525.299, abs=6e-4)


@pytest.mark.parametrize(
    ("celsius", "alpha"),
    # IEC 60028: 0.00393 per K at 20 degC; NBS Handbook 100, table 2, for the others (from memory)
    [(0, 0.004265), (15, 0.004009), (25, 0.003854), (30, 0.003781), (50, 0.003516)],
)
def test_copper_alpha_at_other_temperatures(celsius: int, alpha: float) -> None:
    copper = Polynomial(reference=20.0 + ZERO, coefficients=(0.00393,))
    (moved,) = copper.referred_to(celsius + ZERO).coefficients
    assert moved == pytest.approx(alpha, abs=5.01e-7)


def test_nichrome_and_constantan_from_wire_tables() -> None:
    # CRC Handbook of Chemistry and Physics, wire tables: resistivities in 1e-8 ohm m; shares computed
    celsius = (0.0, 20.0, 25.0, 100.0)
    nichrome, constantan = (
        Table(reference=20.0 + ZERO, points=tuple((c + ZERO, r) for c, r in zip(celsius, rows, strict=True)))
        for rows in ((107.3, 107.5, 107.6, 108.3), (45.43, 45.38, 45.35, 45.11))
    )
    hot, cold = 100.0 + ZERO, ZERO
    rises = [chord_tcr(law, hot, 20.0 + ZERO) for law in (nichrome, constantan)]
    assert rises[0] * 1e6 == pytest.approx(93.02, abs=0.0051)
    assert rises[1] * 1e6 == pytest.approx(-74.37, abs=0.0051)
    share = -rises[1] / (rises[0] - rises[1])
    assert share == pytest.approx(0.444290, abs=5.1e-7)
    drift = share * nichrome.ratio(cold) + (1.0 - share) * constantan.ratio(cold) - 1.0
    assert float(drift) * 1e6 == pytest.approx(-214.3, abs=0.051)


@pytest.mark.parametrize(
    ("celsius", "ohms"),
    # IEC 60539-1, the B formula; 10 kohm at 25 degC with B = 3435 K, computed
    [(0, 28704.29), (50, 4101.19), (85, 1451.35), (100, 987.04), (125, 553.74)],
)
def test_thermistor_b_law(celsius: int, ohms: float) -> None:
    law = Thermistor(reference=25.0 + ZERO, beta=3435.0)
    assert 1e4 * float(law.ratio(celsius + ZERO)) == pytest.approx(ohms, abs=5.01e-3)


def test_steinhart_hart_constants_from_three_points() -> None:
    # the form of Steinhart and Hart, 1968; constants widely published for these three points
    points = ((278.15, 25000.0), (298.15, 10000.0), (318.15, 4000.0))
    law = steinhart_hart_from_points(points, 298.15)
    assert (law.a, law.b, law.c) == pytest.approx((2.108508173e-3, 0.7979204727e-4, 6.535076315e-7), rel=1e-9)
    for temperature, ohms in points:
        assert float(law.ohms(temperature)) == pytest.approx(ohms, rel=1e-12)
        assert 1e4 * float(law.ratio(temperature)) == pytest.approx(ohms, rel=1e-12)


# DIN 43760, nickel: coefficients of the standard, ohms computed from its formula
NICKEL = "1 + a*(T-273.15) + b*(T-273.15)^2 + d*(T-273.15)^4 - f*(T-273.15)^6"
NICKEL_OHMS = {
    -60: 69.5203,
    -40: 79.1312,
    25: 114.1292,
    85: 151.5728,
    100: 161.7785,
    125: 179.6303,
    150: 198.6348,
}


@pytest.mark.parametrize(("celsius", "ohms"), NICKEL_OHMS.items())
def test_nickel_as_a_formula_and_as_a_polynomial(celsius: int, ohms: float) -> None:
    constants = (("a", 5.485e-3), ("b", 6.650e-6), ("d", 2.805e-11), ("f", 2e-17))
    formula = Expression(reference=ZERO, text=NICKEL, constants=constants)
    polynomial = Polynomial(reference=ZERO, coefficients=(5.485e-3, 6.650e-6, 0.0, 2.805e-11, 0.0, -2e-17))
    for law in (formula, polynomial):
        assert 100.0 * float(law.ratio(celsius + ZERO)) == pytest.approx(ohms, abs=5.01e-5)


@pytest.mark.parametrize("tc1", [-10e-6, 10e-6])
@pytest.mark.parametrize("tc2", [-7e-7, -3e-7])
def test_manganin_peaks_near_room_temperature(tc1: float, tc2: float) -> None:
    # NBS Monograph 39 (from memory): a within 10 ppm/K of zero, b from -0.7 to -0.3 ppm/K^2 about 25 degC;
    # so the peak lies between 25 - 16.7 and 25 + 16.7 degC
    law = Polynomial(reference=25.0 + ZERO, coefficients=(tc1, tc2))
    peak = 25.0 + ZERO - tc1 / (2.0 * tc2)
    assert abs(peak - 25.0 - ZERO) < 16.7
    assert float(law.slope(peak)) == pytest.approx(0.0, abs=1e-18)
    curvature = law.taylor(peak, 2)[1]
    again = from_peak(peak, curvature, 25.0 + ZERO)
    assert again.coefficients == pytest.approx(law.coefficients, rel=1e-12)


def test_copper_reaches_zero_where_its_inferred_zero_is() -> None:
    # copper's inferred zero-resistance temperature, -234.5 degC, follows from IEC 60028's alpha at 20 degC
    copper = Polynomial(reference=20.0 + ZERO, coefficients=(0.00393,))
    with pytest.raises(Exception, match=r"reaches zero at -234\.4[0-9] degC"):
        check_positive(copper, 20.0, 400.0, "material.copper")
    assert math.isclose(20.0 - 1.0 / 0.00393, -234.453, abs_tol=1e-3)
    assert np.all(copper.ratio(np.array([ZERO - 200.0, 400.0])) > 0.0)
