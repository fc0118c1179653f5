"""Networks: shares, slopes, coefficients, text and tree forms."""

from fractions import Fraction

import numpy as np
import pytest
from makers import brute_ratio, by_name, film, leg, random_films, random_tree

from tcplan.errors import ExpressionError, InputError, UnitError
from tcplan.network import (
    Leg,
    Parallel,
    Series,
    arrangement,
    deviated,
    leg_names,
    leg_shares,
    legs,
    network_from_tree,
    network_text,
    resistance,
    scaled,
    shares,
    simplified,
    slope,
    symbolic,
    taylor,
    tree,
    value,
)
from tcplan.network_reading import parse_network

SEEDS = range(15)
T = np.linspace(233.15, 423.15, 13)


def made(seed, size=None):
    rng = np.random.default_rng(seed)
    films = random_films(seed, 3)
    return films, random_tree(rng, tuple(films), size or int(rng.integers(1, 8)))


def ratios_of(films):
    return {name: m.ratio(T, 298.15) for name, m in films.items()}


@pytest.mark.parametrize("seed", SEEDS)
def test_ratio_matches_the_scalar_twin(seed):
    films, network = made(seed)
    fast = resistance(network, ratios_of(films)) / value(network)
    np.testing.assert_allclose(fast, brute_ratio(network, films, T), rtol=1e-12)


@pytest.mark.parametrize("seed", SEEDS)
def test_shares_sum_to_one_and_are_the_derivative(seed):
    """Cohn's theorem: d ln R/d ln R_k >= 0, sum 1; by finite difference."""
    _, network = made(seed)
    found = shares(network)
    assert sum(found) == pytest.approx(1.0, abs=1e-13)
    assert min(found) >= 0
    for k in range(len(found)):
        h = 1e-6
        position = iter(range(len(found)))

        def bump(one: Leg, k=k, position=position, h=h) -> Leg:
            return Leg(material=one.material, ohms=one.ohms * (1 + h * (next(position) == k)))

        from tcplan.network import mapped

        change = np.log(value(mapped(network, bump)) / value(network)) / np.log1p(h)
        assert change == pytest.approx(found[k], abs=1e-6)


@pytest.mark.parametrize("seed", SEEDS)
def test_slope_is_the_weighted_mean_and_the_finite_difference(seed):
    films, network = made(seed)
    got = slope(network, ratios_of(films), {n: m.slope(T) for n, m in films.items()})
    h = 1e-3
    up = brute_ratio(network, films, T + h)
    down = brute_ratio(network, films, T - h)
    np.testing.assert_allclose(got, (np.log(up) - np.log(down)) / (2 * h), rtol=1e-6, atol=1e-10)


@pytest.mark.parametrize("seed", SEEDS)
def test_scaling_changes_no_ratio(seed):
    films, network = made(seed)
    one = brute_ratio(network, films, T)
    np.testing.assert_allclose(one, brute_ratio(scaled(network, 37.5), films, T), rtol=1e-12)
    assert value(scaled(network, 2.0)) == pytest.approx(2 * value(network), rel=1e-14)


@pytest.mark.parametrize("seed", SEEDS)
def test_text_and_tree_round_trip_exactly(seed):
    _, network = made(seed)
    assert parse_network(network_text(network)) == network
    by_id = dict(zip(leg_names(len(legs(network))), legs(network), strict=True))
    assert network_from_tree(tree(network), by_id) == network


@pytest.mark.parametrize("seed", SEEDS)
def test_simplified_is_the_same_resistor(seed):
    films, network = made(seed)
    simple = simplified(network)
    np.testing.assert_allclose(brute_ratio(simple, films, T), brute_ratio(network, films, T), rtol=1e-12)
    assert value(simple) == pytest.approx(value(network), rel=1e-13)
    assert len(legs(simple)) <= len(legs(network))


@pytest.mark.parametrize("seed", SEEDS)
def test_sandwich_holds_for_every_tree(seed):
    """1/sum(p/r) <= R/R_ref <= sum p r, with p the shares at the reference."""
    films, network = made(seed)
    p, names = shares(network), [one.material for one in legs(network)]
    r = ratios_of(films)
    ratio = resistance(network, r) / value(network)
    upper = sum(share * r[n] for share, n in zip(p, names, strict=True))
    lower = 1 / sum(share / r[n] for share, n in zip(p, names, strict=True))
    assert np.all(ratio <= upper * (1 + 1e-13))
    assert np.all(ratio >= lower * (1 - 1e-13))


@pytest.mark.parametrize("seed", range(6))
def test_coefficients_match_sympy(seed):
    """The series arithmetic against sympy's own derivatives of the symbolic network."""
    import sympy as sp

    films, network = made(seed, 4)
    x = sp.Symbol("x")
    expressions = {
        n: 1 + sum(sp.Float(c, 30) * x ** (k + 1) for k, c in enumerate(m.law.taylor(298.15, 2)))
        for n, m in films.items()
    }
    whole = symbolic(network, expressions) / sp.Float(value(network), 30)
    got = taylor(network, {n: m.law.taylor(298.15, 3) for n, m in films.items()})
    for order in (1, 2, 3):
        exact = float(sp.diff(whole, x, order).subs(x, 0)) / {1: 1, 2: 2, 3: 6}[order]
        assert got[order - 1] == pytest.approx(exact, rel=1e-9, abs=1e-18)


def test_symbolic_form_is_exact_on_rationals():
    """A hand-made network in exact rational arithmetic (sympy): (6 || 3) + 4 = 6."""
    import sympy as sp

    network = Series((Parallel((leg("a", 6.0), leg("b", 3.0))), leg("a", 4.0)))
    one = symbolic(
        network,
        {"a": sp.Integer(1), "b": sp.Integer(1)},
        {0: sp.Integer(6), 1: sp.Integer(3), 2: sp.Integer(4)},
    )
    assert one == 6
    assert Fraction(value(network)) == 6


def test_arrangements():
    a, b = leg("a", 1.0), leg("b", 2.0)
    assert arrangement(a) == "single"
    assert arrangement(Series((a, b))) == "series"
    assert arrangement(Parallel((a, b))) == "parallel"
    assert arrangement(Series((a, Parallel((a, b))))) == "mixed"


def test_legs_of_one_material_merge():
    network = Series((leg("a", 1.0), Series((leg("b", 2.0), leg("a", 3.0)))))
    assert simplified(network) == Series((leg("a", 4.0), leg("b", 2.0)))
    assert simplified(Parallel((leg("a", 2.0), leg("a", 2.0)))) == leg("a", 1.0)


def test_deviated_moves_every_leg_of_a_material():
    network = Series((leg("a", 1.0), Parallel((leg("a", 2.0), leg("b", 3.0)))))
    assert [one.ohms for one in legs(deviated(network, {"a": 1.5}))] == [1.5, 3.0, 3.0]


def test_shares_follow_temperature():
    films = by_name(film("a", 4000), film("b", 0))
    network = Series((leg("a", 1.0), leg("b", 1.0)))
    a, b = leg_shares(network, ratios_of(films))
    np.testing.assert_allclose(a + b, 1.0)
    assert a[-1] > 0.5 > a[0]


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("a 5k1", leg("a", 5100.0)),
        ("a 12 kohm + b 4.7 Mohm", Series((leg("a", 12e3), leg("b", 4.7e6)))),
        ("(a 5k1 || b 3k3) + a 10k", Series((Parallel((leg("a", 5100.0), leg("b", 3300.0))), leg("a", 1e4)))),
        ("((a 1 ohm))", leg("a", 1.0)),
        ("a 1e+3 ohm || b 2E+2 ohm", Parallel((leg("a", 1e3), leg("b", 200.0)))),
        ("  a   47R\n||\tb R47 ", Parallel((leg("a", 47.0), leg("b", 0.47)))),
    ],
)
def test_text_forms(text, expected):
    assert parse_network(text) == expected


@pytest.mark.parametrize(
    ("text", "error", "says"),
    [
        ("", ExpressionError, "end of the text"),
        ("a", ExpressionError, "without a value"),
        ("a 5k1 +", ExpressionError, "end of the text"),
        ("(a 5k1", ExpressionError, "not closed"),
        ("a 5k1 | b 3k3", ExpressionError, "||"),
        ("a 5k1 + b 3k3 || c 1k", ExpressionError, "brackets"),
        ("a 5k1) + b 3k3", ExpressionError, "after the end"),
        ("a 12", UnitError, "12"),
        ("a 12 V", UnitError, "V"),
        ("a 0 ohm", InputError, "above zero"),
        ("a -5 ohm", InputError, "above zero"),
        ("a nan ohm", UnitError, "nan"),
        ("(" * 60 + "a 1k" + ")" * 60, ExpressionError, "deep"),
        (" + ".join(["a 1k"] * 80), ExpressionError, "legs"),
        ("a 1k + " * 2000 + "a 1k", ExpressionError, "characters"),
        ("a.__class__ 1k", ExpressionError, "material"),
    ],
)
def test_text_that_is_refused(text, error, says):
    with pytest.raises(error) as caught:
        parse_network(text, ("a", "b", "c"), where="given.network")
    assert says in str(caught.value)
    assert "given.network" in str(caught.value)


def test_an_unknown_material_is_named_with_the_nearest():
    with pytest.raises(ExpressionError, match="Did you mean red_film"):
        parse_network("red_fim 5k1", ("red_film", "blue_film"))


@pytest.mark.parametrize("ohms", [0.0, -1.0, float("nan"), float("inf")])
def test_a_leg_needs_a_value_above_zero(ohms):
    with pytest.raises(InputError, match="above zero"):
        Leg(material="a", ohms=ohms)


def test_a_node_needs_two_members():
    with pytest.raises(InputError, match="two"):
        Series((leg("a", 1.0),))
