"""The bound on two resistors of one shape: against sampled devices, the tangents, and closed forms."""

from dataclasses import replace

import numpy as np
import pytest
from makers import by_name, film, random_tree
from ratio_pairs import devices, drift_of, films, pair

from tcplan.network import leg_shares, mapped, used_materials
from tcplan.network_reading import parse_network
from tcplan.ratio import cells
from tcplan.ratio.same_shape import leg_share_ranges, same_shape_of
from tcplan.ratio.space import space_of
from tcplan.ratio.vertices import Cells, start_cells
from tcplan.ratio.worst import worst_of

T = np.linspace(-40, 150, 9) + 273.15


def resized(rng, network, most):
    """Return the network with every leg 2.5 times as large, and off by a random factor."""
    return mapped(network, lambda leg: replace(leg, ohms=leg.ohms * 2.5 * np.exp(rng.uniform(-most, most))))


def alike(seed, most=0.02, kind=None):
    """Return a random pair of nearly equal networks, and its generator."""
    rng = np.random.default_rng(seed)
    names = ("a", "b", "c")[: 2 + seed % 2]
    made = films(rng, names, (298.15,) if seed % 2 else (273.15, 300.15))
    first = random_tree(rng, names, 3 + seed % 3)
    used = {name: made[name] for name in used_materials(first)}
    second, tracking = resized(rng, first, most), float(rng.uniform(0, 6e-6))
    return pair(kind or ("gain", "divider")[seed % 2], first, second, used, tracking), rng


def grid_of(space):
    return space.grid(T, np.ones_like(T))


def bounds(one, low=None, high=None):
    """Return the highest and lowest drift that the bound allows, by temperature, over a part of the box."""
    space, shape = space_of(one), same_shape_of(one)
    grid = grid_of(space)
    many = Cells(
        np.tile(-space.half if low is None else low, (len(T), 1)),
        np.tile(space.half if high is None else high, (len(T), 1)),
        np.arange(len(T)),
        np.full(len(T), np.inf),
    )
    up, down = (shape.bound(space, grid, many, up=up) for up in (True, False))
    return np.expm1(up), np.expm1(-down)


@pytest.mark.parametrize("most", [0.0, 0.02, 0.8])
@pytest.mark.parametrize("seed", range(6))
def test_no_device_is_beyond_the_bound(seed, most):
    """Drift by scalars, from the definition, of devices inside and at the corners of the box."""
    one, rng = alike(seed, most)
    assert same_shape_of(one) is not None
    highest, lowest = bounds(one)
    for device in devices(one, rng, 300):
        drift = drift_of(one, *device, T)
        assert np.all(drift <= highest + 1e-12)
        assert np.all(drift >= lowest - 1e-12)


@pytest.mark.parametrize("kind", ["gain", "divider"])
@pytest.mark.parametrize("seed", range(4))
def test_at_one_point_the_bound_is_what_that_device_reaches(seed, kind):
    """Without a width only the shares on the way of the laws are open: 1/4 of d l of a step at most."""
    one, rng = alike(seed, 0.05, kind)
    space = space_of(one)
    z = rng.uniform(-1, 1, len(space.half)) * space.half
    highest, lowest = bounds(one, z, z)
    for up, told in ((True, highest), (False, lowest)):
        for k, t in enumerate(T):
            device = space.device(z, float(t), up=up)
            reached = drift_of(one, device.factors, device.shifts, device.apart, T[k : k + 1])[0]
            off = told[k] - reached if up else reached - told[k]
            # l is 0.35 at most here (1500 ppm/K and curvature over 125 K), d is 0.1.
            assert -1e-12 <= off <= 0.25 * 0.1 * 0.35 * 0.25


def test_of_one_film_the_bound_is_exact():
    """(r + t x/2)/(r - t x/2), r = 1 + a x: shares are 1, and there is no second derivative."""
    t, a = 4e-6, -200e-6
    one = pair("gain", "p 3k", "p 1k", by_name(film("p", -200.0, value_percent=20.0)), t)
    x = T - 298.15
    highest, lowest = bounds(one)
    half = 0.5 * t * np.abs(x)
    assert highest == pytest.approx((1 + a * x + half) / (1 + a * x - half) - 1, rel=1e-6, abs=1e-15)
    assert lowest == pytest.approx((1 + a * x - half) / (1 + a * x + half) - 1, rel=1e-6, abs=1e-15)


def test_equal_networks_without_tracking_are_flat_by_the_bound():
    one, _ = alike(3, 0.0)
    still = pair(one.ratio.kind, one.ratio.first, one.ratio.second, one.materials)
    highest, lowest = bounds(still)
    assert np.abs(highest).max() < 1e-14
    assert np.abs(lowest).max() < 1e-14


@pytest.mark.parametrize("seed", range(4))
def test_it_is_never_above_the_bound_by_tangents(seed, monkeypatch):
    one, rng = alike(seed)
    space = space_of(one)
    grid = grid_of(space)
    found = [cells.side_extreme(space, grid, up=up, work=300_000) for up in (True, False)]
    monkeypatch.setattr(cells, "same_shape_of", lambda _: None)
    for new in found:
        old = cells.side_extreme(space, grid, up=new.up, work=300_000)
        assert old.figure <= new.upper * (1 + 1e-9)
        assert new.figure <= new.upper <= old.upper * (1 + cells.SHAPE_GAP)
    highest = max(float(np.abs(drift_of(one, *device, T)).max()) for device in devices(one, rng, 200))
    assert highest <= max(new.upper for new in found) * (1 + 1e-9)


def test_films_with_ends_are_closed_with_little_work(monkeypatch):
    """Four materials that all spread, counts alike on both sides: the tangents left 7 times the figure."""
    made = by_name(
        film("p", -310.0, 0.6, value_percent=15.0, tc1_spread_ppm=20.0, tc2_spread_ppm=0.05),
        film("pe", 800.0, value_percent=40.0, tc1_spread_ppm=200.0),
        film("q", 350.0, 0.3, value_percent=12.0, tc1_spread_ppm=25.0),
        film("qe", -700.0, value_percent=30.0, tc1_spread_ppm=150.0),
    )
    one = pair(
        "divider",
        "p 11.76 kohm + pe 240 ohm + q 10.85 kohm + qe 150 ohm",
        "p 3.92 kohm + pe 80.0004 ohm + q 3.61667 kohm + qe 50 ohm",
        made,
        2e-6,
    )
    counted = []
    own = cells._examined
    monkeypatch.setattr(cells, "_examined", lambda *given: counted.append(len(given[1])) or own(*given))
    found = worst_of(one)
    # To first order tracking times 125 K times the 3/4 of the divider.
    assert found.judged.figure == pytest.approx(2e-6 * 125 * 0.75, rel=0.1)
    assert found.judged.figure <= found.upper <= found.judged.figure * (1 + 1e-3)
    assert max(counted) <= cells.FIRST
    rng = np.random.default_rng(5)
    many = devices(one, rng, 400)
    assert max(float(np.abs(drift_of(one, *device, T)).max()) for device in many) <= found.upper * (1 + 1e-9)


def test_very_unequal_shares_are_left_to_the_tangents():
    """9 to 1 over 1 to 9: nothing cancels, and the bound by tangents closes as before."""
    rng = np.random.default_rng(2)
    one = pair("gain", "a 9k + b 1k", "a 1k + b 9k", films(rng, ("a", "b")), 2e-6)
    found = worst_of(one)
    assert found.upper <= found.judged.figure * (1 + 1e-3)
    assert same_shape_of(one) is not None


@pytest.mark.parametrize(
    ("first", "second", "same"),
    [
        ("a 1k + b 2k", "b 7k + a 3k", True),
        ("(a 1k || b 2k) + a 1k", "a 3k + (b 1k || a 9k)", True),
        ("a 1k + a 2k", "a 5k", True),
        ("a 1k + b 2k", "a 1k || b 2k", False),
        ("a 1k + b 2k", "a 1k", False),
        ("a 1k + b 2k", "a 1k + c 2k", False),
    ],
)
def test_which_resistors_have_one_shape(first, second, same):
    made = films(np.random.default_rng(0), ("a", "b", "c"))
    assert (same_shape_of(pair("gain", first, second, made)) is not None) == same


@pytest.mark.parametrize("text", ["a 1k + b 2k + c 3k", "(a 1k || b 2k) + c 3k", "a 5k || (b 2k + c 1k)"])
def test_ranges_of_shares_hold_all_shares(text):
    network, rng = parse_network(text), np.random.default_rng(4)
    low, high = np.log([[800.0], [1500.0], [900.0]]), np.log([[1300.0], [2500.0], [3500.0]])
    least, most = leg_share_ranges(network, (low, high))
    for _ in range(200):
        value = np.exp(rng.uniform(low, high))
        one = mapped(network, lambda leg: replace(leg, ohms=1.0))
        share = np.array(leg_shares(one, dict(zip("abc", value, strict=True))))
        assert np.all(least - 1e-12 <= share)
        assert np.all(share <= most + 1e-12)


def test_the_first_cells_hold_the_whole_box():
    one, _ = alike(1)
    space = space_of(one)
    first = start_cells(space, 2)
    assert set(first.at.tolist()) == {0, 1}
    assert np.all(first.low <= first.high)
    assert np.all(np.abs(np.concatenate([first.low, first.high])) <= space.half)
