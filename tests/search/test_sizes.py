"""What can be made: limits on the legs' values and on their area, against values tried one by one."""

from dataclasses import replace
from itertools import combinations, pairwise

import numpy as np
import pytest
from makers import by_name, film, grid, leg, need_of, over, random_films
from scipy.optimize import linprog

from tcplan.network import arrangement, legs, value
from tcplan.plan import Sizes, Space
from tcplan.search.linear import search_space
from tcplan.search.mixed_search import mixed_proposals
from tcplan.verify.bound import arrangement_bound
from tcplan.verify.option import Case, nominal_figure

INF = float("inf")
V = 1000.0
T = grid(count=191)
FREE = Sizes(least_ohms=(0.0,) * 3, most_ohms=(INF,) * 3, area_per_ohm=(1e-12, 2e-12, 0.5e-12))
LIMITS = {
    "wide": replace(FREE, least_ohms=(1e-3,) * 3, most_ohms=(1e7,) * 3, max_area=1.0),
    "least": replace(FREE, least_ohms=(150.0, 300.0, 220.0)),
    "most": replace(FREE, most_ohms=(900.0, 1500.0, 700.0)),
    "both": replace(FREE, least_ohms=(120.0, 200.0, 150.0), most_ohms=(1500.0, 2500.0, 1800.0)),
}


def space(kind, names, sizes, most=3, size=3, **more):
    return Space(
        arrangement=kind,
        materials=tuple(names),
        most=most,
        min_share=0.0,
        ohms=V,
        legs=size,
        sizes=sizes,
        **more,
    )


def found(of, films, few=2):
    """Return the networks that are put forward and the figures, best first."""
    need = need_of()
    search = mixed_proposals if of.arrangement == "mixed" else search_space
    case = Case(materials=films, spreads={}, over=over(), need=need)
    proposals = search(of, need, films, few)
    return sorted(((nominal_figure(p.network, case), p) for p in proposals), key=lambda row: row[0])


def within(of, network, slack):
    """Whether every leg and the area are within their limits, from the network alone."""
    sizes, area = of.sizes, 0.0
    fine = abs(value(network) / V - 1.0) <= 1e-6
    for part in legs(network):
        if part in of.fixed:
            continue
        k = of.materials.index(part.material)
        fine &= sizes.least_ohms[k] * (1 - slack) <= part.ohms <= sizes.most_ohms[k] * (1 + slack)
        area += sizes.area_per_ohm[k] * part.ohms
    return fine and area <= sizes.max_area * (1 + slack)


# --- by hand: the values of all legs but one, scanned in logarithms ----------------------------


def values_of(kind, two):
    """Return the values of three legs of V ohm, when two of them are given; NaN where there are none."""
    first, second = two
    with np.errstate(divide="ignore", invalid="ignore"):
        if kind == "series":
            third = V - first - second
        elif kind == "parallel":
            third = 1.0 / (1.0 / V - 1.0 / first - 1.0 / second)
        elif kind == "series of a bundle":  # third + (first || second)
            third = V - 1.0 / (1.0 / first + 1.0 / second)
        else:  # third || (first + second)
            third = 1.0 / (1.0 / V - 1.0 / (first + second))
    return first, second, np.where((third > 0) & (third < INF), third, np.nan)


def resistance_of(kind, ohms, laws):
    a, b, c = (value[..., None] * law for value, law in zip(ohms, laws, strict=True))
    if kind == "series":
        return a + b + c
    if kind == "parallel":
        return 1.0 / (1.0 / a + 1.0 / b + 1.0 / c)
    if kind == "series of a bundle":
        return c + 1.0 / (1.0 / a + 1.0 / b)
    return 1.0 / (1.0 / c + 1.0 / (a + b))


def peaks(kind, two, laws, sizes, which):
    """Return the peaks for two leg values, infinite where the network can not be made."""
    ohms = values_of(kind, two)
    fine = np.isfinite(ohms[2])
    ohms = (*ohms[:2], np.where(fine, ohms[2], 1.0))
    area = 0.0
    for k, own in zip(which, ohms, strict=True):
        fine &= (own >= sizes.least_ohms[k]) & (own <= sizes.most_ohms[k])
        area = area + sizes.area_per_ohm[k] * own
    fine &= area <= sizes.max_area
    drift = resistance_of(kind, ohms, laws) / V - 1.0
    return np.where(fine, np.max(np.abs(drift), axis=-1), INF)


def zoomed(cost, centre, half, rounds=70):
    """Return the least cost on grids of ln(ohms) that close in on their best point."""
    best, offsets = INF, np.linspace(-1.0, 1.0, 17)
    for _ in range(rounds):
        one, other = np.meshgrid(centre[0] + half * offsets, centre[1] + half * offsets, indexing="ij")
        figures = cost((np.exp(one), np.exp(other)))
        at = np.unravel_index(int(np.argmin(figures)), figures.shape)
        if figures[at] <= best:
            best, centre = float(figures[at]), (one[at], other[at])
        half *= 0.8
    return best


def three_by_hand(kinds, names, films, sizes, kept=4):
    """Return the least peak of three legs: a grid of each kind and choice of films, the best zoomed."""
    axis = np.linspace(np.log(V * 5e-3), np.log(V * 2e2), 51)
    one, other = np.meshgrid(axis, axis, indexing="ij")
    starts = []
    for kind in kinds:
        for which in choices(kind, len(names)):
            laws = [films[names[k]].ratio(T, 298.15) for k in which]

            def cost(two, kind=kind, laws=laws, which=which):
                return peaks(kind, two, laws, sizes, which)

            figures = cost((np.exp(one), np.exp(other)))
            for at in np.argsort(figures, axis=None)[:40:13]:
                where = np.unravel_index(int(at), figures.shape)
                starts.append((float(figures[where]), kind, which, cost, (one[where], other[where])))
    starts.sort(key=lambda start: start[:3])
    return min(zoomed(cost, centre, 0.3) for *_, cost, centre in starts[:kept])


def choices(kind, count):
    """Return which films the three legs are of; in one node each is used once."""
    if kind in ("series", "parallel"):
        return list(combinations(range(count), 3))
    return [(a, b, c) for a, b in combinations(range(count), 2) for c in range(count)]


def two_by_hand(kind, names, films, sizes):
    """Return the least peak of one leg or two of one node: the share of the first on a fine scan."""
    best = INF
    for i, j in [*combinations(range(len(names)), 2), *((k, k) for k in range(len(names)))]:
        s = np.linspace(0.0, 1.0, 20_001)[1:-1] if i != j else np.array([1.0])
        parts = (s, 1 - s) if i != j else (s,)
        ohms = [V * p if kind == "series" else V / p for p in parts]
        which = (i, j) if i != j else (i,)
        fine, area = np.ones(len(s), dtype=bool), 0.0
        for k, own in zip(which, ohms, strict=True):
            fine &= (own >= sizes.least_ohms[k] * (1 - 1e-12)) & (own <= sizes.most_ohms[k] * (1 + 1e-12))
            area = area + sizes.area_per_ohm[k] * own
        fine &= area <= sizes.max_area * (1 + 1e-12)
        if not fine.any():
            continue
        laws = [films[names[k]].ratio(T, 298.15) for k in which]
        p = [part[fine][:, None] for part in parts]
        ratio = sum(a * b for a, b in zip(p, laws, strict=True))
        if kind == "parallel":
            ratio = 1.0 / sum(a / b for a, b in zip(p, laws, strict=True))
        best = min(best, float(np.max(np.abs(ratio - 1.0), axis=1).min()))
    return best


def areas(names, films, kind, parts):
    """Return limits of area at these parts of the area of the best network without a limit."""
    network = found(space(kind, names, FREE), films)[0][1].network
    whole = sum(FREE.area_per_ohm[names.index(part.material)] * part.ohms for part in legs(network))
    return [replace(FREE, max_area=part * whole) for part in parts]


# --- series and parallel -----------------------------------------------------------------------


@pytest.mark.parametrize("kind", ["series", "parallel"])
@pytest.mark.parametrize("name", LIMITS)
def test_values_of_two_legs_against_a_scan(kind, name):
    films, sizes = random_films(8, 3), LIMITS[name]
    names = sorted(films)
    of = space(kind, names, sizes, most=2)
    figure, proposal = found(of, films)[0]
    assert within(of, proposal.network, 1e-9)
    # The scan is 5e-5 wide; it misses the best share by half of that and is never below it.
    slow = two_by_hand(kind, names, films, sizes)
    assert slow * (1 - 1e-4) >= figure * (1 - 2e-4)
    assert figure == pytest.approx(slow, rel=5e-3)


@pytest.mark.parametrize("kind", ["series", "parallel"])
@pytest.mark.parametrize(("name", "seed"), [("least", 8), ("most", 8), ("both", 9), ("both", 12)])
def test_values_of_three_legs_against_a_grid(kind, name, seed):
    films, sizes = random_films(seed, 3), LIMITS[name]
    names = sorted(films)
    of = space(kind, names, sizes)
    figure, proposal = found(of, films)[0]
    assert within(of, proposal.network, 1e-9)
    slow = min(three_by_hand([kind], names, films, sizes), two_by_hand(kind, names, films, sizes))
    assert figure <= slow * (1 + 1e-4)
    assert slow <= figure * (1 + 1e-2)


@pytest.mark.parametrize("kind", ["series", "parallel"])
@pytest.mark.parametrize("seed", [1, 2, 3, 8])
@pytest.mark.parametrize("part", [0.95, 0.8, 0.5])
def test_area_against_a_grid(kind, seed, part):
    """A limit below the area of the best network: nothing is larger, and nothing better is smaller.

    Areas are those of films: some 1e-9 m^2.
    """
    films = random_films(seed, 3)
    names = sorted(films)
    (sizes,) = areas(names, films, kind, [part])
    of = space(kind, names, sizes)
    slow = min(three_by_hand([kind], names, films, sizes), two_by_hand(kind, names, films, sizes))
    got = found(of, films)
    if not got:
        assert slow == INF
        return
    figure, _ = got[0]
    assert all(within(of, p.network, 1e-6) for _, p in got)
    assert figure <= slow * (1 + 2e-4)
    assert slow <= figure * (1 + 1e-2)


@pytest.mark.parametrize("kind", ["series", "parallel"])
@pytest.mark.parametrize("name", [*LIMITS, "area"])
def test_the_bound_is_below_the_optimum_and_tight(kind, name):
    films, need = random_films(8, 3), need_of()
    names = sorted(films)
    sizes = areas(names, films, kind, [0.95])[0] if name == "area" else LIMITS[name]
    of = space(kind, names, sizes)
    figure, proposal = found(of, films)[0]
    bound = arrangement_bound(proposal.space, proposal.certificate, need, films, figure)
    slow = min(three_by_hand([kind], names, films, sizes), two_by_hand(kind, names, films, sizes))
    assert bound <= slow * (1 + 1e-4)
    assert figure * (1 - 1e-5) <= bound <= figure


def test_series_with_limits_is_a_linear_programme():
    """scipy's HiGHS on a dense grid: one programme a support, since a leg is there or not."""
    films, sizes = random_films(21, 3), LIMITS["both"]
    names, slow = sorted(films), INF
    for size in (1, 2, 3):
        for support in combinations(range(3), size):
            drift = np.array([films[names[k]].ratio(T, 298.15) - 1.0 for k in support]).T
            one = np.ones((len(T), 1))
            result = linprog(
                np.r_[np.zeros(size), 1.0],
                A_ub=np.vstack([np.c_[drift, -one], np.c_[-drift, -one]]),
                b_ub=np.zeros(2 * len(T)),
                A_eq=np.r_[np.ones(size), 0.0][None, :],
                b_eq=[1.0],
                bounds=[(sizes.least_ohms[k] / V, sizes.most_ohms[k] / V) for k in support] + [(0, None)],
            )
            slow = min(slow, float(result.fun)) if result.status == 0 else slow
    figure, _ = found(space("series", names, sizes), films)[0]
    assert figure == pytest.approx(slow, rel=1e-4)


def test_limits_that_leave_nothing():
    films = random_films(8, 3)
    names = sorted(films)
    for kind in ("series", "parallel", "mixed"):
        for sizes in (
            replace(FREE, least_ohms=(1e6,) * 3, most_ohms=(2e6,) * 3),
            replace(FREE, max_area=1e-12),
        ):
            if kind == "parallel" and sizes.max_area == INF:
                sizes = replace(FREE, most_ohms=(900.0,) * 3)  # in parallel no leg is below the total
            assert found(space(kind, names, sizes), films) == []


def test_six_materials_with_both_limits():
    """Every support up to six legs, all of 50 to 400 ohm: what is found can be made."""
    films = random_films(5, 6)
    sizes = Sizes(least_ohms=(50.0,) * 6, most_ohms=(400.0,) * 6, area_per_ohm=(1e-12,) * 6)
    of = space("series", sorted(films), sizes, most=6)
    figure, proposal = found(of, films)[0]
    assert within(of, proposal.network, 1e-9)
    fewer, _ = found(replace(of, most=3), films)[0]
    assert figure <= fewer * (1 + 1e-9)


def test_looser_limits_are_never_worse():
    films = random_films(8, 3)
    names = sorted(films)
    for kind in ("series", "parallel"):
        figures = [
            found(space(kind, names, replace(FREE, least_ohms=(least,) * 3)), films)[0][0]
            for least in (300.0, 200.0, 100.0, 50.0, 0.0)
        ]
        assert all(b <= a * (1 + 1e-9) for a, b in pairwise(figures))


# --- mixed -------------------------------------------------------------------------------------


BUNDLES = ("series of a bundle", "bundle of a series")


@pytest.mark.parametrize(
    ("name", "seed"), [("wide", 8), ("least", 8), ("most", 8), ("both", 9), ("both", 12), ("least", 9)]
)
def test_values_of_mixed_legs_against_a_grid(name, seed):
    films, sizes = random_films(seed, 3), LIMITS[name]
    names = sorted(films)
    of = space("mixed", names, sizes)
    got = found(of, films)
    assert all(within(of, p.network, 1e-6) for _, p in got)
    slow = three_by_hand(BUNDLES, names, films, sizes, kept=12)
    assert got[0][0] <= slow * (1 + 2e-3)
    assert slow <= got[0][0] * (1 + 2e-2)


@pytest.mark.parametrize(("seed", "area"), [(8, 2.0e-9), (9, 1.6e-9), (10, 1.2e-9), (11, 1.2e-9)])
def test_area_of_mixed_legs_against_a_grid(seed, area):
    films, sizes = random_films(seed, 3), replace(FREE, max_area=area)
    names = sorted(films)
    of = space("mixed", names, sizes)
    got = found(of, films)
    assert all(within(of, p.network, 1e-6) for _, p in got)
    slow = three_by_hand(BUNDLES, names, films, sizes, kept=12)
    assert got[0][0] <= slow * (1 + 2e-3)
    assert slow <= got[0][0] * (1 + 2e-2)


def test_limits_of_four_mixed_legs_are_kept():
    films, sizes = random_films(22, 3), replace(LIMITS["both"], max_area=4e-9)
    of = space("mixed", sorted(films), sizes, size=4)
    got = found(of, films)
    assert any(len(legs(p.network)) == 4 for _, p in got)
    assert all(within(of, p.network, 1e-6) and arrangement(p.network) == "mixed" for _, p in got)


def test_limits_beside_a_coil():
    """Copper of 50 ohm in series: the bundle holds 950 ohm, and the coil has no limit of its own."""
    films = {**by_name(film("cu", 3900.0)), **random_films(10, 3)}
    names = sorted(set(films) - {"cu"})
    coil = leg("cu", 50.0)
    sizes = replace(FREE, least_ohms=(300.0,) * 3, most_ohms=(4000.0,) * 3)
    of = space("mixed", names, sizes, size=2, fixed=(coil,), fixed_share=(0.05, 0.05))
    got = found(of, films)
    assert got
    assert all(within(of, p.network, 1e-6) and coil in p.network.children for _, p in got)
    free, _ = found(replace(of, sizes=FREE), films)[0]
    assert got[0][0] >= free * (1 - 1e-9)
