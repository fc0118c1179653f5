"""The made network: ends, bought parts and cuts as members, what they share, and what they no longer do."""

import itertools
from dataclasses import replace

import numpy as np
import pytest
from makers import REFERENCE, by_name, film, grid, leg, need_of

from tcplan.brief.model import Operating
from tcplan.errors import InputError
from tcplan.goal import Limit
from tcplan.made import FilmLeg, FilmUnit, PlainLeg, StockLeg, WireLeg
from tcplan.material.law import Polynomial
from tcplan.material.model import Film, Material
from tcplan.material.spread import Spread
from tcplan.network import Leg, Parallel, Series, legs, resistance, value
from tcplan.operating import operating_point, worst_by_leg
from tcplan.parts.films import FilmRules, film_legs
from tcplan.parts.network import alike, assembled, ends_material, ends_name, made_operating, made_process
from tcplan.process import Corner, Correlation, Parameter, Process, Tracking
from tcplan.worst.evaluation import worst_case

UM = 1e-6
DRAWN = Film(
    min_width=1 * UM,
    preferred_width=2 * UM,
    width_bias=0.05 * UM,
    end_resistance=90 * UM,
    end_tc1=-900e-6,
    spacing=0.6 * UM,
    grid=5e-9,
)
SPREAD = Spread(meaning="limits", value=0.2, tc1=40e-6, end_resistance=0.4, end_tc1=200e-6)
PP = replace(film("pp", -120.0, 0.55, ohm_per_square=320.0), film=DRAWN, spread=SPREAD)
NP = replace(
    film("np", 150.0, 0.4, value_percent=10.0, tc1_spread_ppm=40.0, ohm_per_square=120.0),
    film=Film(min_width=1 * UM, grid=5e-9),
)
UNIT = FilmUnit(material="pp", width=2 * UM, length=10 * UM, body_ohms=1600.0, ends_ohms=90.0, area=26e-12)


def part(name, tc1_ppm, *, value=0.01, tc1_spread_ppm=0.0):
    """Return a family of bought parts with a linear law."""
    return Material(
        name=name,
        label=name,
        source="invented",
        law=Polynomial(reference=REFERENCE, coefficients=(tc1_ppm * 1e-6,)),
        valid=(213.15, 433.15),
        kind="part",
        series="E96",
        spread=Spread(meaning="limits", value=value, tc1=tc1_spread_ppm * 1e-6),
    )


def wire(name, tc1_ppm=90.0, *, value=0.01):
    return replace(part(name, tc1_ppm, value=value), kind="wire", series=None, ohm_per_metre=10.0)


def film_leg(name, *, in_series=3, in_parallel=1, unit=UNIT):
    ohms = unit.ohms * in_series / in_parallel
    return FilmLeg(
        id=name,
        material=unit.material,
        wanted_ohms=ohms,
        unit=unit,
        in_series=in_series,
        in_parallel=in_parallel,
    )


def stock_leg(name, material, *values, joined="series"):
    how = joined if len(values) > 1 else "one"
    return StockLeg(id=name, material=material, wanted_ohms=sum(values), values=values, joined=how)


def wire_leg(name, material, length):
    return WireLeg(id=name, material=material, wanted_ohms=10.0 * length, length=length, ohm_per_metre=10.0)


def ideal_of(kind, *parts):
    return kind(tuple(leg(p.material, p.wanted_ohms) for p in parts))


def ohms_of(assembly, T, reference=REFERENCE):
    ratios = {m.name: m.ratio(T, reference) for m in assembly.materials}
    return resistance(assembly.network, ratios)


def of(material, component):
    return Parameter(material=material, component=component)


# ---- films


@pytest.mark.parametrize("reference", [REFERENCE, REFERENCE + 30.0])
def test_bodies_and_ends_are_the_formula_of_the_unit(reference):
    """R = Rs L/(W - dW) + 2 Re/W of every unit, each by its own law: a twin from W, L and counts alone."""
    wanted = (("a", 9000.0), ("b", 2200.0))
    a, b = film_legs(PP, wanted, reference, FilmRules()).choices[0].legs
    (c,) = film_legs(NP, [("c", 3100.0)], reference, FilmRules()).choices[0].legs
    ideal = Series((leg("pp", 9000.0), Parallel((leg("pp", 2200.0), leg("np", 3100.0)))))
    assembly = assembled(ideal, (a, b, c), by_name(PP, NP))

    def ohms(made, t):
        x, width, length = t - REFERENCE, made.unit.width, made.unit.length
        if made.material == "pp":
            body = 320.0 * length / (width - 0.05 * UM) * (1 - 120e-6 * x + 0.55e-6 * x * x)
            unit = body + 2 * 90.0 * UM / width * (1 - 900e-6 * x)
        else:
            unit = 120.0 * length / width * (1 + 150e-6 * x + 0.4e-6 * x * x)
        return unit * made.in_series / made.in_parallel

    T = grid(count=21)
    twin = [ohms(a, t) + 1 / (1 / ohms(b, t) + 1 / ohms(c, t)) for t in T]
    np.testing.assert_allclose(ohms_of(assembly, T, reference), twin, rtol=1e-12)
    assert [one.material for one in legs(assembly.network)] == ["pp", "pp_ends", "pp", "pp_ends", "np"]
    # the leg in series is opened into its node, so that body and ends stand beside the rest
    assert isinstance(assembly.network, Series)
    assert len(assembly.network.children) == 3


def test_strings_and_units_are_told_of_every_leaf():
    made = film_leg("a", in_series=12, in_parallel=4)
    assembly = assembled(leg("pp", 5000.0), (made,), by_name(PP))
    body, ends = legs(assembly.network)
    assert (body.ohms, body.strings) == (pytest.approx(1600 * 3, rel=1e-15), 4)
    assert (ends.ohms, ends.strings) == (pytest.approx(90 * 3, rel=1e-15), 4)
    assert [(e.leg, e.units, e.strings, e.length) for e in assembly.elements] == [
        ("a", 12, 4, 10 * UM),
        ("a", 12, 4, None),
    ]


def test_scaling_all_counts_leaves_the_drift_unchanged():
    """n times the units in series, in parallel or both: R(T)/R(T_ref) is the same, by R ns/np alone."""
    parts = (film_leg("a", in_series=5), film_leg("b", in_series=2, in_parallel=3))
    ideal, T = ideal_of(Series, *parts), grid(count=21)
    plain = assembled(ideal, parts, by_name(PP))
    for series, parallel in ((2, 2), (3, 1), (1, 5)):
        more = tuple(
            replace(p, in_series=p.in_series * series, in_parallel=p.in_parallel * parallel) for p in parts
        )
        larger = assembled(ideal, more, by_name(PP))
        assert value(larger.network) == pytest.approx(value(plain.network) * series / parallel, rel=1e-12)
        drift = ohms_of(larger, T) / value(larger.network)
        np.testing.assert_allclose(drift, ohms_of(plain, T) / value(plain.network), rtol=1e-12)


def test_ends_have_a_coefficient_and_a_spread_of_their_own():
    ends = ends_material(PP)
    assert ends.law.coefficients == (-900e-6,)
    assert (ends.spread.value, ends.spread.tc1) == (0.4, 200e-6)
    assert ends_material(replace(PP, film=replace(DRAWN, end_tc1=None))).law == PP.law
    assert ends_material(replace(PP, spread=None)).spread is None
    assert ends_material(NP) is None


def test_the_spread_of_the_ends_is_in_the_worst_case():
    """Body and ends in series by hand: at each corner of four spreads, at both ends of the range.

    The laws are linear, so the drift of a device is largest at an end of the range.
    """
    linear = replace(PP, law=Polynomial(reference=REFERENCE, coefficients=(-120e-6,)))
    assembly = assembled(leg("pp", 1690.0), (film_leg("a", in_series=1),), by_name(linear))
    worst = 0.0
    for body, ends, u, v in itertools.product((0.8, 1.2), (0.6, 1.4), (-40e-6, 40e-6), (-2e-4, 2e-4)):
        share = 90 * ends / (1600 * body + 90 * ends)
        slope = (1 - share) * (-120e-6 + u) + share * (-900e-6 + v)
        worst = max(worst, abs(slope) * 125.0)
    found = worst_case(
        assembly.network,
        assembly.by_name,
        {m.name: m.spread for m in assembly.materials},
        need_of(Limit(kind="drift", value=0.01)),
    )
    assert found.upper == pytest.approx(worst, rel=1e-6)


def test_the_width_error_counts_at_the_drawn_width():
    """By hand: (1 + D)/(1 - e/W) - 1 at W = 4 - 0.05 um, whatever the preferred width."""
    stated = replace(PP, spread=replace(SPREAD, width_bias=0.1 * UM))
    unit = replace(UNIT, width=4 * UM)
    assembly = assembled(leg("pp", 5070.0), (film_leg("a", unit=unit),), by_name(stated))
    body = assembly.by_name["pp"]
    made = body.effective_spread(233.15, 423.15)
    assert made.value == pytest.approx(1.2 / (1 - 0.1 / 3.95) - 1, rel=1e-12)
    assert stated.effective_spread(233.15, 423.15).value == pytest.approx(
        1.2 / (1 - 0.1 / 1.95) - 1, rel=1e-12
    )
    ends = assembly.by_name["pp_ends"].effective_spread(233.15, 423.15)
    assert (ends.value, ends.width_bias) == (0.4, None)


# ---- bought parts and wire


def test_every_bought_part_has_a_tolerance_of_its_own():
    """Two parts of one family off on different sides are worse than one common factor: (x1 || y) + x2.

    Both worst cases are by a scalar twin over the corners of the box, at both ends of the range (linear
    laws, so the hot one).
    """
    x, y = part("x", 0.0, value=0.05), part("y", 3000.0, value=0.0)
    parts = (stock_leg("a", "x", 1000.0), stock_leg("b", "y", 500.0), stock_leg("c", "x", 400.0))
    ideal = Series((Parallel((leg("x", 1000.0), leg("y", 500.0))), leg("x", 400.0)))
    assembly = assembled(ideal, parts, by_name(x, y))
    assert [one.material for one in legs(assembly.network)] == ["x_a1", "y_b1", "x_c1"]

    def drift(first, last):
        def ohms(t):
            hot = 500.0 * (1 + 3000e-6 * t)
            return 1 / (1 / (1000.0 * first) + 1 / hot) + 400.0 * last

        return max(abs(ohms(t) / ohms(0.0) - 1) for t in (-65.0, 125.0))

    apart = max(drift(p, q) for p in (0.95, 1.05) for q in (0.95, 1.05))
    common = max(drift(p, p) for p in (0.95, 1.05))
    need = need_of(Limit(kind="drift", value=0.1))
    spreads = {m.name: m.spread for m in assembly.materials}
    found = worst_case(assembly.network, assembly.by_name, spreads, need)
    of_one = worst_case(ideal, by_name(x, y), {"x": x.spread, "y": y.spread}, need)
    for worst, twin in ((found, apart), (of_one, common)):
        assert worst.judged.figure == pytest.approx(twin, rel=1e-6)
        assert twin * (1 - 1e-9) <= worst.upper <= twin * 1.001
    assert found.upper > 1.005 * of_one.upper


def test_a_leg_of_two_parts_is_two_members():
    flat = part("flat", 0.0)
    pair = (stock_leg("a", "flat", 1000.0, 9100.0, joined="parallel"), stock_leg("b", "flat", 47.0, 12.0))
    assembly = assembled(ideal_of(Series, *pair), pair, by_name(flat))
    assert assembly.network == Series(
        (
            Parallel((Leg(material="flat_a1", ohms=1000.0), Leg(material="flat_a2", ohms=9100.0))),
            Leg(material="flat_b1", ohms=47.0),
            Leg(material="flat_b2", ohms=12.0),
        )
    )
    assert [element.leg for element in assembly.elements] == ["a", "a", "b", "b"]
    assert set(assembly.origin) == {(f"flat_{n}", "flat") for n in ("a1", "a2", "b1", "b2")}
    assert {m.spread for m in assembly.materials} == {flat.spread}


def test_cuts_of_one_wire_are_off_together_the_shortest_the_most():
    """By hand: 1 % of the wire, and 1 mm in 2 m, 0.5 m and 4 m: 0.05 %, 0.2 % and 0.025 %."""
    cuts = (wire_leg("a", "up", 2.0), wire_leg("b", "up", 0.5), wire_leg("c", "down", 4.0))
    materials = by_name(wire("up"), wire("down", -70.0))
    assembly = assembled(ideal_of(Series, *cuts), cuts, materials, cut_error=1e-3)
    assert [one.material for one in legs(assembly.network)] == ["up", "up", "down"]
    halves = [assembly.by_name[name].spread.value for name in ("up", "down")]
    assert halves == pytest.approx([0.012, 0.01025], rel=1e-12)
    exact = assembled(ideal_of(Series, *cuts), cuts, materials)
    assert {m.spread.value for m in exact.materials} == {0.01}
    assert [one.ohms for one in legs(exact.network)] == [20.0, 5.0, 40.0]


def test_several_values_share_one_material_for_each_name():
    one, other = ((wire_leg("a", "up", length),) for length in (2.0, 0.5))
    both = [
        assembled(leg("up", cut[0].ohms), cut, by_name(wire("up")), cut_error=1e-3) for cut in (one, other)
    ]
    for turned in (both, both[::-1]):
        assert [a.by_name["up"].spread.value for a in alike(turned)] == pytest.approx([0.012, 0.012])
        assert [a.network for a in alike(turned)] == [a.network for a in turned]


@pytest.mark.parametrize(
    "made", [film_leg("a"), wire_leg("a", "pp", 2.0)], ids=["units of its film", "a cut of its wire"]
)
def test_a_given_member_beside_what_is_made_of_its_material(made):
    """It is as it is, of unknown width and spool: a material of its own, off on its own."""
    material = PP if isinstance(made, FilmLeg) else wire("pp")
    given = PlainLeg(id="b", material="pp", wanted_ohms=400.0)
    assembly = assembled(ideal_of(Series, made, given), (made, given), by_name(material), cut_error=1e-3)
    assert legs(assembly.network)[-1] == Leg(material="pp_b", ohms=400.0)
    assert assembly.by_name["pp_b"] == replace(material, name="pp_b")
    alone = assembled(ideal_of(Series, given, given), (given, replace(given, id="c")), by_name(material))
    assert {one.material for one in legs(alone.network)} == {"pp"}


# ---- names


def test_a_name_that_is_taken_is_refused():
    made = film_leg("a")
    other = film("pp_ends", 10.0)
    with pytest.raises(InputError, match=r"material\.pp: found the name pp_ends, .* twice") as caught:
        assembled(leg("pp", made.ohms), (made,), by_name(PP, other))
    assert "shorter or other names" in str(caught.value)
    flat = part("flat", 0.0)
    with pytest.raises(InputError, match="the name flat_a1"):
        assembled(
            leg("flat", 10.0), (stock_leg("a", "flat", 10.0),), by_name(flat, replace(flat, name="flat_a1"))
        )


@pytest.mark.parametrize("label", ["one", "another"])
def test_long_names_are_cut_short_and_refused_where_they_then_meet(label):
    """40 characters are allowed; two films whose first 35 are alike would have the same ends."""
    first, second = (replace(PP, name="f" * 36 + end, label="one") for end in ("abcd", "efgh"))
    second = replace(second, label=label)
    units = [replace(UNIT, material=m.name) for m in (first, second)]
    made = [film_leg(name, unit=unit) for name, unit in zip("ab", units, strict=True)]
    assert ends_name(first.name) == "f" * 35 + "_ends"
    alone = assembled(leg(first.name, 1.0), made[:1], by_name(first))
    assert alone.materials[1].name == "f" * 35 + "_ends"
    with pytest.raises(InputError, match="_ends, which its parts take, twice"):
        assembled(ideal_of(Series, *made), made, by_name(first, second))


# ---- what is shared


def test_a_corner_moves_every_part_of_its_material():
    flat = part("flat", 0.0)
    parts = (
        film_leg("a"),
        stock_leg("b", "flat", 10.0, 22.0),
        wire_leg("c", "up", 1.0),
        wire_leg("d", "up", 2.0),
    )
    assembly = assembled(ideal_of(Series, *parts), parts, by_name(PP, flat, wire("up")))
    shifts = {
        of("pp", "value"): 0.1,
        of("pp", "end_resistance"): -0.3,
        of("pp", "end_tc1"): 1e-4,
        of("flat", "value"): 0.01,
        of("up", "tc1"): 5e-6,
    }
    process = Process(corners=(Corner(name="slow", shifts=tuple(shifts.items())),))
    (slow,) = made_process(process, assembly).corners
    assert dict(slow.shifts) == {
        of("pp", "value"): 0.1,
        of("pp_ends", "value"): -0.3,
        of("pp_ends", "tc1"): 1e-4,
        of("flat_b1", "value"): 0.01,
        of("flat_b2", "value"): 0.01,
        of("up", "tc1"): 5e-6,
    }


def test_bought_parts_share_nothing_and_ends_keep_their_correlations():
    flat = part("flat", 0.0)
    parts = (film_leg("a"), stock_leg("b", "flat", 10.0), wire_leg("c", "up", 1.0))
    unit = replace(UNIT, material="np", ends_ohms=0.0)
    parts = (*parts, film_leg("d", unit=unit))
    assembly = assembled(ideal_of(Series, *parts), parts, by_name(PP, NP, flat, wire("up")))

    def pair(first, second):
        return Correlation(first=first, second=second, value=0.5)

    kept = [
        pair(of("pp", "value"), of("np", "value")),
        pair(of("pp", "tc1"), of("up", "tc1")),
    ]
    ends = pair(of("pp", "end_resistance"), of("pp", "end_tc1"))
    dropped = [
        pair(of("flat", "value"), of("pp", "value")),
        pair(of("pp", "end_resistance"), of("flat", "value")),
        pair(of("np", "end_resistance"), of("pp", "value")),  # no ends are stated of it
    ]
    process = Process(
        correlations=(*dropped, *kept, ends),
        trackings=(
            Tracking(materials=("pp", "np"), within=1e-5),
            Tracking(materials=("pp", "flat"), within=1e-5),
        ),
    )
    made = made_process(process, assembly)
    assert made.correlations == (*kept, pair(of("pp_ends", "value"), of("pp_ends", "tc1")))
    assert made.trackings == process.trackings[:1]


def test_every_part_heats_itself_as_its_material_does():
    """60 K/W of each part leg, by hand: 2 mA through 1000 ohm and 470 ohm of one leg are 5.88 mW, 0.3528 K.

    A leg without a thermal resistance stays cold.
    """
    flat, up = part("flat", 1000.0), wire("up")
    parts = (stock_leg("a", "flat", 1000.0, 470.0), wire_leg("b", "up", 10.0), film_leg("c"))
    assembly = assembled(ideal_of(Series, *parts), parts, by_name(flat, up, PP))
    asked = Operating(current=2e-3, leg_thermal_resistance=(("flat", 60.0), ("pp", 5.0)))
    made = made_operating(asked, assembly)
    assert dict(made.leg_thermal_resistance) == {
        "flat_a1": 60.0,
        "flat_a2": 60.0,
        "pp": 5.0,
        "pp_ends": 5.0,
    }
    T = np.array([REFERENCE])
    point = operating_point(assembly.network, assembly.by_name, assembly.elements, made, REFERENCE, T)
    rise = 60.0 * 4e-6 * 1470.0  # and by R(T) once more: 1 + 1000 ppm/K of it
    rise = rise * (1 + 1e-3 * rise / (1 - 1e-3 * rise))
    assert point.temperature[0, 0] - REFERENCE == pytest.approx(rise, rel=1e-9)
    assert point.temperature[1, 0] == point.temperature[0, 0]
    assert point.temperature[2, 0] == REFERENCE
    assert point.temperature[3, 0] == point.temperature[4, 0] > REFERENCE  # body and ends, one leg
    assert worst_by_leg(point)["a"].power == pytest.approx(4e-6 * 1470.0 * (1 + 1e-3 * rise), rel=1e-9)


def test_a_common_thermal_resistance_stays_common():
    made = film_leg("a")
    assembly = assembled(leg("pp", made.ohms), (made,), by_name(PP))
    asked = Operating(voltage=5.0, thermal_resistance=300.0)
    assert made_operating(asked, assembly) == asked
    assert made_operating(None, assembly) is None
