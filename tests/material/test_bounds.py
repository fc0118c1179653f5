"""Law bounds of many materials at once, against the slow twin: one call for each of them."""

import numpy as np
import pytest

from tcplan.errors import InputError
from tcplan.material.bounds import LawBounds
from tcplan.material.law import Platinum, Polynomial, Thermistor
from tcplan.material.spread import Spread, law_bounds

T = np.linspace(233.15, 423.15, 97)


def limits(**halves):
    return Spread(meaning="limits", **halves)


@pytest.mark.parametrize("reference", [298.15, 273.15, 300.0])
def test_every_row_is_that_of_its_material(reference):
    laws = [
        Polynomial(reference=298.15, coefficients=(-120e-6, 0.55e-6)),
        Polynomial(reference=300.15, coefficients=(1500e-6,)),
        Polynomial(reference=293.15, coefficients=(10e-6, 1e-7, -1e-10)),
        Platinum(reference=273.15),
        Thermistor(reference=298.15, beta=300.0),
    ]
    spreads = [
        limits(value=0.1, tc1=40e-6, tc2=1e-7),
        limits(tc1=60e-6),
        Spread(meaning="sigma", tc2=2e-8),
        limits(value=0.01),
        limits(tc1=100e-6, tc2=1e-6),
    ]
    low, high = LawBounds(laws, spreads, reference).at(T)
    for k, (law, spread) in enumerate(zip(laws, spreads, strict=True)):
        one, other = law_bounds(law, spread, reference, T)
        np.testing.assert_allclose(low[k], one, rtol=1e-14)
        np.testing.assert_allclose(high[k], other, rtol=1e-14)


def test_none_and_one_temperature():
    law, spread = Polynomial(reference=298.15, coefficients=(1e-3,)), limits(tc1=1e-5)
    bounds = LawBounds([law], [spread], 298.15)
    low, high = bounds.at(np.array([398.15]))
    assert (low[0, 0], high[0, 0]) == pytest.approx((1.099, 1.101), abs=1e-12)
    assert bounds.at(np.empty(0))[0].shape == (1, 0)


def test_a_law_that_reaches_zero_is_refused():
    laws = [Polynomial(reference=298.15, coefficients=(c,)) for c in (1e-3, -7e-3)]
    with pytest.raises(InputError, match="zero or below"):
        LawBounds(laws, [limits(tc1=1e-6), limits(tc1=2e-3)], 298.15).at(T)
