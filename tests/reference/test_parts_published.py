"""Parts against hand figures: sheet and squares, mismatch of many units, values of the E series.

The tables of the E series themselves are in test_preferred_published.py.
"""

import math

import numpy as np
import pytest

from tcplan.made import FilmLeg
from tcplan.material.law import Polynomial
from tcplan.material.model import Film, Material
from tcplan.parts.films import FilmRules, film_legs
from tcplan.parts.stock import candidates

REFERENCE, UM = 298.15, 1e-6
MATCHING = 1.5e-2 * UM  # 1.5 %*um, CHECKS row of mismatch: an invented figure of usual size


def film(**table: float) -> Material:
    """Return an invented film of 320 ohm per square."""
    return Material(
        name="red",
        label="red",
        source="invented",
        law=Polynomial(reference=REFERENCE, coefficients=(-120e-6,)),
        valid=(213.15, 433.15),
        kind="film",
        ohm_per_square=320.0,
        film=Film(min_width=1 * UM, grid=5e-9, **table),
    )


def drawn(wanted: list[float], data: Material, most: int = 16) -> tuple[FilmLeg, ...]:
    """Return legs of the smallest way to draw values [ohm] within 0.01 %."""
    names = [f"leg{k}" for k in range(len(wanted))]
    legs = list(zip(names, wanted, strict=True))
    result = film_legs(data, legs, REFERENCE, FilmRules(most_count=most, error=1e-4))
    return result.choices[0].legs


# ---- sheet and squares


@pytest.mark.parametrize("ohms", [1.6e3, 4.8e3, 16e3, 90e3])
def test_resistance_is_sheet_times_squares(ohms: float) -> None:
    # R = sheet * L/W: common practice, no source. Without bias and ends nothing else is in it.
    (leg,) = drawn([ohms], film(preferred_width=2 * UM))
    squares = leg.in_series / leg.in_parallel * leg.unit.length / leg.unit.width
    assert leg.ohms == pytest.approx(320.0 * squares, rel=1e-12)
    assert leg.ohms == pytest.approx(ohms, rel=1.001e-4)
    assert leg.unit.ends_ohms == 0.0


def test_ten_squares_with_bias_and_ends_by_hand() -> None:
    # By hand: 20 um x 2 um, 0.1 um lost in the width: 320 * 20/1.9 = 3368.421 ohm; two ends of 38 ohm um
    # over 2 um: 38 ohm. R = sheet * L/W with W as it conducts: common practice, no source.
    data = film(preferred_width=2 * UM, width_bias=0.1 * UM, end_resistance=38 * UM)
    (leg,) = drawn([3406.421052631579], data, most=1)
    assert leg.unit.length == pytest.approx(20 * UM, rel=1e-12)
    assert (leg.unit.body_ohms, leg.unit.ends_ohms) == pytest.approx((3368.421052631579, 38.0), rel=1e-12)


# ---- mismatch of n units


def test_mismatch_falls_with_the_root_of_the_area_and_of_the_number() -> None:
    # Pelgrom, Duinmaijer, Welbers, JSSC 24 (1989) 1433, law from memory: sigma(dR/R) of a pair is
    # matching/sqrt(W L). A single resistor carries 1/sqrt(2) of it, n units 1/sqrt(n) of that.
    for width in (1 * UM, 2 * UM, 4 * UM):
        legs = drawn([24e3, 8e3], film(preferred_width=width, matching=MATCHING))
        for leg in legs:
            units = leg.in_series * leg.in_parallel
            single = MATCHING / math.sqrt(width * leg.unit.length) / math.sqrt(2)
            assert leg.mismatch == pytest.approx(single / math.sqrt(units), rel=1e-12)


@pytest.mark.parametrize("ratio", [(3, 1), (9, 1), (5, 4)])
def test_mismatch_of_the_ratio_of_two_legs_is_that_of_their_units(ratio: tuple[int, int]) -> None:
    # Each unit drawn on its own by the law above; two legs of one array, compared with what their own
    # mismatch says. 40000 draws know a sigma to 0.35 %.
    legs = drawn([8e3 * ratio[0], 8e3 * ratio[1]], film(preferred_width=2 * UM, matching=MATCHING))
    rng = np.random.Generator(np.random.Philox(sum(ratio)))
    log_ratio = np.zeros(40_000)
    for sign, leg in zip((1, -1), legs, strict=True):
        sigma = MATCHING / math.sqrt(2 * leg.unit.width * leg.unit.length)
        units = 1 + sigma * rng.standard_normal((40_000, leg.in_parallel, leg.in_series))
        log_ratio += sign * -np.log(np.sum(1 / np.sum(units, axis=-1), axis=-1))
    said = math.hypot(*(leg.mismatch or 0.0 for leg in legs))
    assert np.std(log_ratio) == pytest.approx(said, rel=0.02)


# ---- values of the E series


@pytest.mark.parametrize(
    ("series", "below", "above"),
    [("E12", 12, 15), ("E24", 13, 15), ("E96", 133, 137)],  # IEC 60063: the widest step of each table
)
def test_no_value_is_farther_from_a_stock_value_than_half_the_widest_step(
    series: str, below: int, above: int
) -> None:
    # By hand: between a and b the farthest value is their mean, off by (b - a)/(b + a).
    widest = (above - below) / (above + below)
    scale = 100.0 / 10 ** math.floor(math.log10(below))
    farthest = (below + above) / 2 * scale
    for wanted in (*np.geomspace(100.0, 1000.0, 500), farthest):
        (nearest,) = candidates(float(wanted), series, 10.0, 1e4, False, 1)
        assert abs(nearest.ohms / wanted - 1) <= widest * (1 + 1e-12)
    (nearest,) = candidates(farthest, series, 10.0, 1e4, False, 1)
    assert abs(nearest.ohms / farthest - 1) == pytest.approx(widest, rel=1e-9)
    assert nearest.ohms in (below * scale, above * scale)
