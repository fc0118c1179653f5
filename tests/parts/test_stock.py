"""Stock parts: the nearest values and the choice for all legs, against plain enumeration."""

import itertools
import random
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest
from makers import by_name, film, leg, need_of

from tcplan.drift import ratio_curve
from tcplan.errors import InputError
from tcplan.goal import Limit, Window, judged
from tcplan.made import StockLeg
from tcplan.material.law_table import Table
from tcplan.network import Leg, Network, Parallel, Series, legs, mapped, value
from tcplan.parts.stock import Candidate, candidates, stock_refusals, stock_values
from tcplan.parts.stock_choice import MOST_COMBINATIONS, StockChoice, stock_choices

DRIFT = Limit(kind="drift", value=0.01)
BAND = Limit(kind="band", value=0.01)
CHORD = Limit(kind="chord_tcr", value=50e-6)
MASK = Limit(
    kind="mask",
    value=0.001,
    windows=(Window(low=273.15, high=343.15, limit=0.001), Window(low=233.15, high=423.15, limit=0.003)),
)


def part(name: str, tc1_ppm: float, tc2_ppm: float, series: str = "E24"):
    made = film(name, tc1_ppm, tc2_ppm, value_percent=1.0)
    return replace(made, kind="part", ohm_per_square=None, series=series)


def some_parts(series: str):
    return by_name(
        part("up", 800.0, 0.9, series), part("down", -700.0, 1.4, series), film("free", 120.0, 0.3)
    )


def test_values_of_a_decade_as_printed() -> None:
    # IEC 60063, table of the E24 series, in ohm and in kilohm.
    printed = "10 11 12 13 15 16 18 20 22 24 27 30 33 36 39 43 47 51 56 62 68 75 82 91"
    table = tuple(float(v) for v in printed.split())
    assert stock_values("E24", 10.0, 99.0) == table
    assert stock_values("E24", 1e4, 9.9e4) == tuple(1000 * v for v in table)


def test_values_keep_the_exceptions_of_the_standard() -> None:
    # IEC 60063: 920 in E192 where rounding gives 919; 298 at its index 91 (from 1.00).
    values = stock_values("E192", 1.0, 9.99)
    assert 9.2 in values
    assert 9.19 not in values
    assert values[91] == 2.98
    assert len(values) == 192


@pytest.mark.parametrize("series", ["E3", "E12", "E24", "E48", "E96"])
def test_values_over_decades_against_eseries(series: str) -> None:
    import eseries

    # eseries 1.2.1, which holds the tables of IEC 60063 digit by digit.
    theirs = eseries.erange(getattr(eseries, series), 0.1, 1e6)
    assert np.allclose(stock_values(series, 0.1, 1e6), list(theirs), rtol=1e-12, atol=0)


def test_values_include_both_limits() -> None:
    assert stock_values("E3", 22.0, 220.0) == (22.0, 47.0, 100.0, 220.0)
    assert stock_values("E3", 0.47, 0.47) == (0.47,)


@pytest.mark.parametrize("limits", [(0.0, 10.0), (10.0, 1.0), (-1.0, 5.0), (1.0, float("inf")), (23.0, 46.0)])
def test_limits_without_a_value_are_refused(limits: tuple[float, float]) -> None:
    with pytest.raises(InputError, match="Check the limits of the stock"):
        stock_values("E3", *limits)


def exact_values(series: str, lowest: float, highest: float, pairs: bool) -> dict[Fraction, int]:
    """Return every value that one or two parts make, in exact fractions, with its least count."""
    single = [Fraction(repr(v)) for v in stock_values(series, lowest, highest)]
    counts = dict.fromkeys(single, 1)
    if pairs:
        for a, b in itertools.combinations_with_replacement(single, 2):
            for together in (a + b, a * b / (a + b)):
                counts.setdefault(together, 2)
    return counts


@pytest.mark.parametrize("pairs", [False, True])
@pytest.mark.parametrize(("series", "highest"), [("E3", 1e4), ("E12", 1e3), ("E24", 1e4), ("E96", 1e3)])
def test_candidates_are_the_nearest_of_all_pairs(series: str, highest: float, pairs: bool) -> None:
    counts = exact_values(series, 10.0, highest, pairs)
    rng = random.Random(5)
    for few in (1, 3, 8):
        for _ in range(4):
            wanted = 10 ** rng.uniform(1.0, np.log10(highest))
            target = Fraction(wanted)
            best = sorted(counts, key=lambda v: (abs(v / target - 1), counts[v], v))[:few]
            found = candidates(wanted, series, 10.0, highest, pairs, few)
            assert [c.ohms for c in found] == pytest.approx([float(v) for v in best], rel=1e-12)
            assert [len(c.values) for c in found] == [counts[v] for v in best]


def test_candidates_make_what_they_say() -> None:
    for candidate in candidates(3333.0, "E24", 10.0, 1e6, True, 40):
        made = StockLeg(
            id="a", material="up", wanted_ohms=3333.0, values=candidate.values, joined=candidate.joined
        )
        assert made.ohms == candidate.ohms
        assert len(candidate.values) == (1 if candidate.joined == "one" else 2)
        assert set(candidate.values) <= set(stock_values("E24", 10.0, 1e6))


def test_a_member_is_one_part_and_ties_go_to_fewer() -> None:
    # 30 ohm is a member of E24; 15 + 15, 10 + 20, 12 + 18 and 33 || 330 make it too.
    assert candidates(30.0, "E24", 10.0, 1e3, True, 1) == (
        Candidate(values=(30.0,), joined="one", ohms=30.0),
    )
    # By hand: 16 ohm lies as far from 10 as from 22, both members of E3; the lower comes first.
    assert [c.values for c in candidates(16.0, "E3", 10.0, 22.0, False, 2)] == [(10.0,), (22.0,)]
    # By hand, members 10 and 22: 21 is as far from one part (22) as from two (10 + 10).
    assert [c.values for c in candidates(21.0, "E3", 10.0, 22.0, True, 2)] == [(22.0,), (10.0, 10.0)]


def test_of_equal_pairs_the_more_equal_one() -> None:
    # By hand, of E12: 30 = 12 + 18 = 15 + 15; 25 = 10 + 15 only.
    assert candidates(30.0, "E12", 10.0, 82.0, True, 1)[0].values == (15.0, 15.0)
    assert candidates(25.0, "E12", 10.0, 82.0, True, 1)[0].values == (10.0, 15.0)


@pytest.mark.parametrize("wanted", [0.0, -5.0, float("nan"), float("inf")])
def test_a_wanted_value_has_to_be_one(wanted: float) -> None:
    with pytest.raises(InputError, match="finite value above zero"):
        candidates(wanted, "E24", 10.0, 1e6, True, 3)


def with_values(network: Network, values: tuple[float, ...]) -> Network:
    new = iter(values)
    return mapped(network, lambda own: Leg(material=own.material, ohms=next(new)))


def made(network: Network, choice: StockChoice) -> Network:
    ideal = [own.ohms for own in legs(network)]
    return with_values(network, tuple(c.ohms if c else v for c, v in zip(choice.legs, ideal, strict=True)))


def plain_figure(network: Network, materials, need) -> float:
    """Return the figure by the scalar twin: one temperature and one leg at a time."""

    def ohms(node: Network, t: float | None) -> float:
        if isinstance(node, Leg):
            law = materials[node.material].law
            at = 1.0 if t is None else float(law.ratio(np.array([t]))[0])
            return node.ohms * at / (1.0 if t is None else float(law.ratio(np.array([need.reference]))[0]))
        members = [ohms(child, t) for child in node.children]
        return sum(members) if isinstance(node, Series) else 1.0 / sum(1.0 / m for m in members)

    worst = 0.0
    for piece in need.pieces:
        middle, half = 0.5 * (piece.low + piece.high), 0.5 * (piece.high - piece.low)
        nodes = [middle + half * float(np.cos(np.pi * (2 * k + 1) / 34)) for k in range(17)]
        drifts = [ohms(network, t) / ohms(network, None) - 1.0 for t in (piece.low, *nodes, piece.high)]
        width = (max(drifts) - min(drifts)) / 2 if piece.centred else max(map(abs, drifts))
        worst = max(worst, width / piece.weight)
    return worst


def plain_trade(network: Network, materials, need, target: float, options) -> list[tuple[int, float, float]]:
    """Return the trade (parts, figure, value error) of every combination, one at a time."""
    rows = []
    for chosen in itertools.product(*options):
        whole = with_values(network, tuple(ohms for ohms, _ in chosen))
        figure, error = plain_figure(whole, materials, need), value(whole) / target - 1.0
        rows.append((sum(count for _, count in chosen), figure, error))
    keys = sorted({(n, round(f, 12), round(abs(e), 12)) for n, f, e in rows})
    kept = [
        k for k in keys if not any(o != k and all(a <= b for a, b in zip(o, k, strict=True)) for o in keys)
    ]
    return sorted(kept, key=lambda k: (k[1], k[2], k[0]))


def as_keys(choices: tuple[StockChoice, ...]) -> list[tuple[int, float, float]]:
    return [(c.parts, c.figure, abs(c.value_error)) for c in choices]


def assert_same(choices: tuple[StockChoice, ...], wanted: list[tuple[int, float, float]]) -> None:
    assert len(choices) == len(wanted)
    for ours, theirs in zip(as_keys(choices), wanted, strict=True):
        assert ours == pytest.approx(theirs, rel=1e-9, abs=2e-12)


@pytest.mark.parametrize("limits", [(DRIFT,), (BAND,), (CHORD,), (MASK,), (DRIFT, BAND)], ids=str)
def test_the_whole_stock_enumerated_equals_the_optimiser(limits: tuple[Limit, ...]) -> None:
    # Few is above all that E3 makes in one decade: nothing is left out on either side.
    materials, need = some_parts("E3"), need_of(*limits)
    network = Series((leg("up", 31.0), Parallel((leg("down", 47.0), leg("free", 90.0)))))
    own = [(float(v), n) for v, n in exact_values("E3", 10.0, 50.0, True).items()]
    target = value(network)
    wanted = plain_trade(network, materials, need, target, [own, own, [(90.0, 0)]])
    choices = stock_choices(
        network, materials, need, target, lowest=10.0, highest=50.0, few=len(own), keep=10_000
    )
    assert_same(choices, wanted)
    assert choices[0].figure == min(c.figure for c in choices)


def test_three_stock_legs_enumerated() -> None:
    materials, need = some_parts("E12"), need_of(DRIFT)
    network = Parallel((Series((leg("up", 410.0), leg("down", 530.0))), leg("down", 7040.0)))
    options = []
    for own in legs(network):
        near = [candidates(own.ohms, "E12", 10.0, 1e5, pairs, 3) for pairs in (False, True)]
        options.append([(c.ohms, len(c.values)) for c in {*near[0], *near[1]}])
    wanted = plain_trade(network, materials, need, 830.0, options)
    choices = stock_choices(network, materials, need, 830.0, lowest=10.0, highest=1e5, few=3, keep=10_000)
    assert_same(choices, wanted)


def test_figures_and_errors_are_those_of_the_made_network() -> None:
    materials, need = some_parts("E24"), need_of(BAND)
    network = Series((leg("up", 1234.0), Parallel((leg("down", 2345.0), leg("free", 9000.0)))))
    target = value(network)
    for choice in stock_choices(network, materials, need, target, lowest=10.0, highest=1e6):
        whole = made(network, choice)
        assert value(whole) / target - 1.0 == pytest.approx(choice.value_error, abs=1e-14)
        true = judged(ratio_curve(whole, materials, need.reference), need)
        # Nodes can only miss a little of the true peak; a quadratic between two of 17 nodes loses
        # at most (pi/34)^2 = 0.9 % of its own height.
        assert choice.figure <= true.figure * (1 + 1e-9)
        assert choice.figure == pytest.approx(true.figure, rel=0.02)


def test_members_come_back_as_they_are() -> None:
    materials, need = some_parts("E24"), need_of(DRIFT)
    network = Series((leg("up", 4700.0), leg("down", 5100.0)))
    choices = stock_choices(network, materials, need, 9800.0, lowest=10.0, highest=1e6, pairs=False)
    exact = next(c for c in choices if c.value_error == 0.0 and c.parts == 2)
    assert [own.values for own in exact.legs if own] == [(4700.0,), (5100.0,)]
    assert [own.id for own in exact.legs if own] == ["a", "b"]


def test_a_leg_without_a_series_and_a_given_leg_keep_their_value() -> None:
    materials, need = some_parts("E24"), need_of(DRIFT)
    network = Series((leg("free", 333.3), leg("up", 1234.0), leg("down", 777.7)))
    for choice in stock_choices(network, materials, need, 2345.0, lowest=10.0, highest=1e6, given=(1,)):
        assert choice.legs[0] is None
        assert choice.legs[1] is None
        assert choice.legs[2] is not None
        assert choice.parts == len(choice.legs[2].values)


def test_nothing_from_stock_is_the_ideal_network() -> None:
    materials, need = by_name(film("free", 120.0, 0.3)), need_of(DRIFT)
    (only,) = stock_choices(leg("free", 500.0), materials, need, 500.0, lowest=10.0, highest=1e6)
    assert only.legs == (None,)
    assert only.parts == 0
    assert only.value_error == 0.0
    # By hand: x = 125 K above the reference, 120e-6 x + 0.3e-6 x^2 = 0.0196875.
    assert only.figure == pytest.approx(0.0196875, rel=1e-12)


def test_a_wanted_law_is_taken_off() -> None:
    materials = some_parts("E24")
    need = need_of(DRIFT, wanted=materials["up"].law)
    (best, *_) = stock_choices(leg("up", 510.0), materials, need, 510.0, lowest=10.0, highest=1e6)
    assert best.figure == pytest.approx(0.0, abs=1e-15)
    # By hand: at 125 K above the reference, (120 - 800)e-6 x + (0.3 - 0.9)e-6 x^2 = -0.094375.
    (only,) = stock_choices(leg("free", 510.0), materials, need, 510.0, lowest=10.0, highest=1e6)
    assert only.figure == pytest.approx(0.094375, rel=1e-12)


def test_a_peak_at_a_point_of_a_table_is_not_missed() -> None:
    # The table itself says 1.02 at 354 K, and 1 at all other even temperatures: the bump lies between
    # the nodes at 345.6 K and 362.5 K, where the ringing of a spline has died away.
    points = tuple((float(t), 1.02 if t == 354 else 1.0) for t in range(230, 431, 2))
    bump = replace(film("bump", 0.0), law=Table(reference=298.15, points=points), valid=(230.0, 430.0))
    (only,) = stock_choices(
        leg("bump", 100.0), by_name(bump), need_of(DRIFT), 100.0, lowest=10.0, highest=1e6
    )
    assert only.figure == pytest.approx(0.02, rel=1e-9)


def test_more_parts_for_the_same_are_left_out() -> None:
    # By hand, two legs of one material, so that every figure is the same: 70 = 33 + (10 + 27) takes three
    # parts and no error; four parts (15 + 15) + (18 + 22) are no better; two parts, 22 + 47, miss by 1/70.
    materials, need = some_parts("E12"), need_of(DRIFT)
    network = Series((leg("up", 33.0), leg("up", 37.0)))
    choices = stock_choices(network, materials, need, 70.0, lowest=10.0, highest=82.0, few=12, keep=10_000)
    assert [c.parts for c in choices] == [3, 2]
    assert [abs(c.value_error) for c in choices] == pytest.approx([0.0, 1 / 70], abs=1e-14)


def test_the_short_list_holds_the_ends_of_the_long_one() -> None:
    materials, need = some_parts("E24"), need_of(DRIFT)
    network = Series((leg("up", 1234.0), leg("down", 2345.0), leg("up", 987.0)))
    limits = {"lowest": 10.0, "highest": 1e6}
    long = stock_choices(network, materials, need, 4566.0, **limits, keep=10_000)  # type: ignore[arg-type]
    short = stock_choices(network, materials, need, 4566.0, **limits, keep=12)  # type: ignore[arg-type]
    assert len(long) > 12 == len(short)
    assert set(short) < set(long)
    assert short[0] == long[0]
    assert [c.figure for c in short] == sorted(c.figure for c in short)
    assert min(abs(c.value_error) for c in short) == min(abs(c.value_error) for c in long)
    assert {c.parts for c in short} == {c.parts for c in long}
    assert stock_choices(network, materials, need, 4566.0, **limits, keep=1) == (long[0],)  # type: ignore[arg-type]


def test_the_answer_does_not_change_from_run_to_run() -> None:
    materials, need = some_parts("E96"), need_of(DRIFT)
    network = Parallel((leg("up", 1234.0), leg("down", 2345.0), leg("up", 1234.0)))
    once, again = (stock_choices(network, materials, need, 500.0, lowest=10.0, highest=1e6) for _ in range(2))
    assert once == again


def test_many_legs_stay_below_the_most_combinations() -> None:
    materials, need = some_parts("E24"), need_of(DRIFT)
    network = Series(tuple(leg("up" if k % 2 else "down", 103.0 + 17 * k) for k in range(20)))
    choices = stock_choices(network, materials, need, value(network), lowest=10.0, highest=1e6)
    assert all(own is not None for own in choices[0].legs)
    assert MOST_COMBINATIONS < 2**20  # so each leg can only take the one nearest value
    nearest = [candidates(own.ohms, "E24", 10.0, 1e6, True, 1)[0].values for own in legs(network)]
    assert [own.values for own in choices[0].legs if own] == nearest


def test_a_value_that_no_part_reaches_is_refused_with_the_nearest() -> None:
    materials, need = some_parts("E24"), need_of(DRIFT)
    network = Series((leg("up", 4.0), leg("down", 30e6), leg("free", 1.0), leg("up", 5.0)))
    limits = {"lowest": 10.0, "highest": 10e6}
    refused = stock_refusals(network, materials, **limits)  # type: ignore[arg-type]
    # By hand: two of 10 ohm in parallel make 5 ohm, two of 10 Mohm in series 20 Mohm.
    assert [(r.leg, r.rule, r.nearest) for r in refused] == [
        ("a", "stock", "5 ohm"),
        ("b", "stock", "20 Mohm"),
    ]
    single = stock_refusals(network, materials, pairs=False, **limits)  # type: ignore[arg-type]
    assert [(r.leg, r.nearest) for r in single] == [("a", "10 ohm"), ("b", "10 Mohm"), ("d", "10 ohm")]
    assert stock_refusals(network, materials, given=(0, 1), **limits) == ()  # type: ignore[arg-type]
    with pytest.raises(InputError, match="The nearest is 20 Mohm") as caught:
        stock_choices(network, materials, need, 1e3, **limits)  # type: ignore[arg-type]
    assert [problem.where for problem in caught.value.problems] == ["leg a", "leg b"]


@pytest.mark.parametrize("counts", [{"few": 0}, {"keep": 0}, {"few": -1, "keep": 3}])
def test_counts_below_one_are_refused(counts: dict[str, int]) -> None:
    with pytest.raises(InputError, match="at least 1"):
        stock_choices(
            leg("up", 100.0), some_parts("E24"), need_of(DRIFT), 100.0, lowest=10.0, highest=1e6, **counts
        )
