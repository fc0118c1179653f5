"""Lots of a ratio: closed forms of the tracking alone, and never beyond the worst case."""

from dataclasses import replace

import numpy as np
import pytest
from makers import by_name, film, need_of
from ratio_pairs import films, pair

from tcplan.goal import Limit
from tcplan.material.spread import Spread
from tcplan.ratio import lots
from tcplan.ratio.lots import drawn_lots, lot_figures
from tcplan.ratio.worst import worst_of

T = 4e-6
ARM = 125.0  # K, from 25 to 150 degC, the longer one


def one_film(shape):
    """A film whose law is flat and whose value alone varies, which cancels."""
    made = film("red", 0.0, 0.0, value_percent=15.0)
    return by_name(replace(made, spread=Spread(meaning="limits", value=0.15, shape=shape)))


def stated(one):
    return {name: material.spread for name, material in one.materials.items()}


def test_normal_tracking_alone_has_its_closed_form():
    """Each resistor is off by sigma t/6, their difference by sqrt(2) t/6; 99.73 % are within 3 of these."""
    one = pair("gain", "red 1k", "red 2k", one_film("normal"), T)
    found = drawn_lots(one, stated(one), count=40_000)
    assert found.low <= T / np.sqrt(2) * ARM <= found.high
    assert found.figure == pytest.approx(T / np.sqrt(2) * ARM, rel=0.04)


def test_rectangular_tracking_alone_has_its_closed_form():
    """The difference of two rectangulars of half-width t/2 is triangular: P(|d| <= y) = 1 - (1 - y/t)^2."""
    one = pair("gain", "red 1k", "red 2k", one_film("rectangular"), T)
    found = drawn_lots(one, stated(one), count=40_000)
    exact = T * (1 - np.sqrt(1 - 0.9973)) * ARM
    assert found.low <= exact * (1 + 1e-3)
    assert found.high >= exact * (1 - 1e-3)
    # No lot is beyond the worst case, which is t x to first order.
    assert found.largest <= worst_of(one).upper


def test_a_yield_is_that_of_the_normal_distribution():
    """At a limit of one sigma of the difference, 68.27 % are inside (standard tables)."""
    sigma = np.sqrt(2) * T / 6 * ARM
    one = pair(
        "gain",
        "red 1k",
        "red 2k",
        one_film("normal"),
        T,
        need=need_of(Limit(kind="drift", value=sigma)),
    )
    found = drawn_lots(one, stated(one))
    assert found.inside_low <= 0.682689 * (1 + 1e-3)
    assert found.inside_high >= 0.682689 * (1 - 1e-3)


def test_common_spreads_cancel_in_every_lot():
    two = films(np.random.default_rng(5), ("a", "b"))
    one = pair("divider", "a 1k + b 2k", "a 2k + b 4k", two)
    assert lot_figures(one, stated(one), count=500).max() < 1e-13


def test_a_figure_is_that_of_the_whole_range(monkeypatch):
    """The parabola through the highest points, against a grid 40 times finer."""
    two = films(np.random.default_rng(6), ("a", "b"))
    one = pair("gain", "a 1k + b 2k", "b 1k", two, need=need_of(Limit(kind="band", value=1e-3)))
    own = lot_figures(one, stated(one), count=200)
    monkeypatch.setattr(lots, "POINTS", 40 * (lots.POINTS - 1) + 1)
    np.testing.assert_allclose(own, lot_figures(one, stated(one), count=200), rtol=1e-4)


def test_a_seed_gives_the_same_lots_and_another_others():
    two = films(np.random.default_rng(6), ("a", "b"))
    one = pair("gain", "a 1k + b 2k", "a 1k", two, 2e-6)
    first = lot_figures(one, stated(one), count=100)
    np.testing.assert_array_equal(first, lot_figures(one, stated(one), count=300)[:100])
    assert not np.allclose(first, lot_figures(one, stated(one), count=100, seed=2))
