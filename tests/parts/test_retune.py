"""The mix found again: a hand figure, the total and the shape kept, and never worse than before."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from makers import leg, random_tree

from tcplan.network import Parallel, Series, legs, value
from tcplan.parts.retune import retuned, with_values

NAMES = ("a", "b", "c")


def slope_at(network, slopes):
    """Return |sum of R_k slope_k| / R of a series network."""
    own = legs(network)
    return abs(sum(one.ohms * slopes[one.material] for one in own)) / value(network)


def test_ends_in_the_mix_move_it_to_the_hand_figure():
    """A leg of -100 ppm/K and one of 200 ppm/K cancel at 2 to 1.

    With a tenth of the first as ends of -1000 ppm/K it has 0.9 * -100 - 0.1 * 1000 = -190 ppm/K as a
    whole: they cancel at 200 to 190.
    """
    slopes = {"a": -190.0, "b": 200.0}
    ideal = Series((leg("a", 2000.0), leg("b", 1000.0)))
    found = retuned(ideal, lambda network: slope_at(network, slopes))
    a, b = legs(found)
    assert a.ohms / b.ohms == pytest.approx(200 / 190, rel=1e-4)
    assert value(found) == pytest.approx(3000.0, rel=1e-12)


def test_the_best_mix_stays_itself():
    slopes = {"a": -100.0, "b": 200.0}
    ideal = Series((leg("a", 2000.0), leg("b", 1000.0)))
    assert retuned(ideal, lambda network: slope_at(network, slopes)) is ideal
    single = leg("a", 47.0)
    assert retuned(single, lambda _: 1.0) is single


@settings(deadline=None, max_examples=30)
@given(st.integers(0, 10_000), st.integers(2, 4))
def test_the_figure_is_never_worse_and_the_total_is_kept(seed, size):
    rng = np.random.default_rng(seed)
    ideal, wanted = random_tree(rng, NAMES, size), np.exp(rng.uniform(-0.5, 0.5, size))

    def figure(network):  # has kinks, as the peak of a drift has
        off = [one.ohms / was.ohms for one, was in zip(legs(network), legs(ideal), strict=True)]
        return float(np.max(np.abs(np.log(np.array(off) / wanted))))

    found = retuned(ideal, figure)
    assert figure(found) <= figure(ideal)
    assert value(found) == pytest.approx(value(ideal), rel=1e-9)
    assert [one.material for one in legs(found)] == [one.material for one in legs(ideal)]


def test_values_take_the_shape_of_the_network():
    shape = Series((leg("a", 1.0), Parallel((leg("b", 2.0), leg("a", 3.0))), leg("c", 4.0)))
    made = with_values(shape, [10.0, 20.0, 30.0, 40.0])
    assert made == Series((leg("a", 10.0), Parallel((leg("b", 20.0), leg("a", 30.0))), leg("c", 40.0)))
    assert with_values(made, [one.ohms for one in legs(shape)]) == shape
    strung = Series((legs(shape)[0], type(legs(shape)[0])(material="b", ohms=2.0, strings=3)))
    assert [one.strings for one in legs(with_values(strung, [5.0, 6.0]))] == [1, 3]
