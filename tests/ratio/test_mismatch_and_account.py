"""Mismatch of a ratio against its law and finite differences; the account against its own sum."""

from dataclasses import replace

import numpy as np
import pytest
from makers import by_name, film
from ratio_pairs import films, pair

from tcplan.brief.model import Allowance
from tcplan.material.model import Film
from tcplan.network import Leg, mapped
from tcplan.ratio.account import ratio_contributions
from tcplan.ratio.mismatch import mismatch_of, sensitivities
from tcplan.ratio.worst import worst_of

T = np.linspace(-40, 150, 39) + 273.15
MATCHING = 1.2e-8  # 1.2 %*um


def matched(material):
    return replace(material, film=Film(min_width=1e-6, preferred_width=4e-6, matching=MATCHING))


def test_a_pair_of_equal_resistors_has_the_matching_of_a_pair():
    """Pelgrom's law (JSSC 24 (1989) 1433, from memory): sigma of a pair = matching/sqrt(W L)."""
    red = by_name(matched(film("red", -120.0, value_percent=10.0, ohm_per_square=100.0)))
    found = mismatch_of(pair("gain", "red 10k", "red 10k", red), T)
    area = 4e-6 * (100 * 4e-6)  # 100 squares
    assert found.value == pytest.approx(MATCHING / np.sqrt(area), rel=1e-12)
    assert found.drift == pytest.approx(0.0, abs=1e-15)
    assert found.unstated == ()


def test_a_divider_carries_the_share_of_the_other_resistor():
    """d ln q = (1 - q)(d ln R2 - d ln R1); four times the area halves a sigma."""
    red = by_name(matched(film("red", -120.0, value_percent=10.0)))
    found = mismatch_of(pair("divider", "red 30k", "red 10k", red), T)
    small, large = (MATCHING / np.sqrt(2) / (4e-6 * np.sqrt(n)) for n in (100, 300))
    assert found.value == pytest.approx(0.75 * np.hypot(small, large), rel=1e-12)


@pytest.mark.parametrize("kind", ["gain", "divider"])
def test_sensitivities_are_derivatives(kind):
    """By finite difference of each leg."""
    two = films(np.random.default_rng(2), ("a", "b"))
    one = pair(kind, "(a 1k || b 2k) + a 3k", "b 2k + a 1k", two)
    own, step = sensitivities(one, T), 1e-6

    def ratio(k, sign):
        count = iter(range(9))

        def moved(leg):
            change = step * sign if next(count) == k else 0.0
            return Leg(material=leg.material, ohms=leg.ohms * (1 + change))

        first, second = (mapped(n, moved) for n in (one.ratio.first, one.ratio.second))
        other = pair(kind, first, second, two)
        return other.value() * other.curve(other.nominal())(T)

    for k in range(5):
        slope = (np.log(ratio(k, 1)) - np.log(ratio(k, -1))) / (2 * step)
        np.testing.assert_allclose(own[k], slope, atol=1e-8)


def test_what_is_not_stated_is_named():
    both = by_name(matched(film("red", -120.0, value_percent=10.0)), film("blue", 100.0, value_percent=10.0))
    found = mismatch_of(pair("gain", "red 10k", "blue 10k", both), T)
    assert found.unstated == ("blue",)
    assert found.value > 0
    none = mismatch_of(pair("gain", "blue 10k", "blue 10k", both), T)
    assert none.value is None
    assert none.drift is None


@pytest.mark.parametrize("kind", ["gain", "divider"])
def test_the_account_adds_up_to_the_worst_case(kind):
    one = pair(kind, "a 1k + b 2k", "a 2k", films(np.random.default_rng(9), ("a", "b")), 3e-6)
    worst = worst_of(one)
    account = ratio_contributions(one, worst.high_at, worst.low_at)
    assert max(account.total_up, -account.total_down) == pytest.approx(worst.judged.figure, rel=2e-3)
    names = [row.name for row in account.rows]
    assert names == [
        "residual curvature",
        "TC1 spread",
        "TC2 spread",
        "value-ratio spread",
        "tracking",
        "mismatch",
    ]
    assert all(row.up >= 0 >= row.down for row in account.rows[1:5])
    nominal = one.curve(one.nominal())(np.array([worst.high_at]))[0] - 1
    assert account.rows[0].up == pytest.approx(nominal, rel=1e-9)


def test_in_one_film_tracking_is_all_there_is():
    """The common spread cancels: of the account of one film only tracking, and mismatch, are left."""
    red = by_name(matched(film("red", -120.0, 0.5, value_percent=15.0, tc1_spread_ppm=40.0)))
    one = pair("divider", "red 9k", "red 1k", red, 3e-6)
    worst = worst_of(one)
    rows = {row.name: row for row in ratio_contributions(one, worst.high_at, worst.low_at).rows}
    for name in ("residual curvature", "TC1 spread", "TC2 spread", "value-ratio spread"):
        assert rows[name].up == pytest.approx(0.0, abs=1e-12)
    assert rows["tracking"].up == pytest.approx(worst.judged.figure, rel=1e-3)


def test_allowances_join_the_account():
    red = by_name(film("red", -120.0, 0.5, value_percent=15.0))
    one = pair("gain", "red 9k", "red 1k", red)
    common = {"source": "invented"}
    allowances = (
        Allowance(name="stress", size=40e-6, sides="up", kind="systematic", **common),
        Allowance(name="drift", size=1e-6, per_kelvin=True, kind="random", **common),
    )
    account = ratio_contributions(one, 298.15 + 100.0, 298.15 - 50.0, allowances)
    assert account.total_up == pytest.approx(40e-6 + 100e-6, rel=1e-9)
    assert account.total_down == pytest.approx(-50e-6, rel=1e-9)
