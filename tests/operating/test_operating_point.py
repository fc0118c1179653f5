"""The operating point against closed forms, a slow scalar twin, and its own power balance.

One leg R = R0 (1 + a x): textbook electrothermal feedback, from memory; worked out again beside each check.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
import pytest
from makers import REFERENCE, by_name, film, leg, random_tree, six_films

from tcplan.brief.model import Operating
from tcplan.errors import InputError, InternalError
from tcplan.material.law import Thermistor
from tcplan.material.model import Film, Material, VoltageCoefficient
from tcplan.network import Leg, Network, Parallel, Series, legs
from tcplan.operating import Element, operating_point, plain_elements, worst_by_leg

T = np.array([253.15, 298.15, 348.15])


def point(network: Network, materials: Mapping[str, Material], operating: Operating, at=T, **more):
    elements = more.pop("elements", None) or plain_elements(network, materials, REFERENCE)
    return operating_point(network, materials, elements, operating, REFERENCE, at, **more)


def with_volts(material: Material, ppm: float) -> Material:
    return replace(material, voltage_coefficient=VoltageCoefficient(per_volt=ppm * 1e-6))


def thermistor(beta: float = 3435.0) -> Material:
    return Material(
        name="t",
        label="t",
        source="invented",
        law=Thermistor(reference=REFERENCE, beta=beta),
        valid=(223.15, 523.15),
        kind="plain",
    )


# --- the twin -----------------------------------------------------------------------------------------


def twin(
    network: Network,
    materials: Mapping[str, Material],
    elements: Sequence[Element],
    operating: Operating,
    ambient: float,
) -> tuple[float, list[float], list[float]]:
    """Return R, voltages and temperatures by plain fixed-point iteration, the drive in 40 steps."""
    leaves = legs(network)
    ohms = [one.ohms * ratio_of(materials[one.material], ambient) for one in leaves]
    heat, volts = [ambient] * len(leaves), [0.0] * len(leaves)
    drive = operating.voltage if operating.voltage is not None else operating.current
    for step in range(1, 41):
        for _ in range(2000):
            before = list(ohms)
            total = whole(network, iter(ohms))
            volts = [0.0] * len(leaves)
            top = drive * step / 40 if operating.voltage is not None else drive * step / 40 * total
            spread_out(network, ohms, top, 0, volts)
            powers = [v * v / r for v, r in zip(volts, ohms, strict=True)]
            heat = [ambient + rise(k, powers, leaves, elements, operating) for k in range(len(leaves))]
            for k, one in enumerate(leaves):
                material = materials[one.material]
                stretch = 1.0 + coefficient(material, elements[k]) * volts[k] / elements[k].units
                ohms[k] = one.ohms * ratio_of(material, heat[k]) * stretch
            if max(abs(a / b - 1) for a, b in zip(ohms, before, strict=True)) < 1e-15:
                break
    return whole(network, iter(ohms)), volts, heat


def ratio_of(material: Material, t: float) -> float:
    return float(material.law.ratio(np.array([t]))[0] / material.law.ratio(np.array([REFERENCE]))[0])


def coefficient(material: Material, element: Element) -> float:
    stated = material.voltage_coefficient
    if stated is None:
        return 0.0
    return stated.per_volt if stated.per_volt is not None else stated.metre_per_volt / element.length


def rise(k, powers, leaves, elements, operating) -> float:
    if operating.thermal_resistance is not None:
        return operating.thermal_resistance * sum(powers)
    own = dict(operating.leg_thermal_resistance).get(leaves[k].material, 0.0)
    alike = [p for p, e in zip(powers, elements, strict=True) if e.leg == elements[k].leg]
    return own * sum(alike)


def whole(node: Network, ohms) -> float:
    if isinstance(node, Leg):
        return next(ohms)
    parts = [whole(child, ohms) for child in node.children]
    return sum(parts) if isinstance(node, Series) else 1.0 / sum(1.0 / part for part in parts)


def spread_out(node: Network, ohms, top: float, start: int, volts) -> int:
    """Write the voltage of every leaf below a node; return the place after its last leaf."""
    if isinstance(node, Leg):
        volts[start] = top
        return start + 1
    counts = [len(legs(child)) for child in node.children]
    at = start
    total = whole(node, iter(ohms[start : start + sum(counts)]))
    for child, count in zip(node.children, counts, strict=True):
        part = whole(child, iter(ohms[at : at + count])) / total if isinstance(node, Series) else 1.0
        at = spread_out(child, ohms, top * part, at, volts)
    return at


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("kind", ["voltage", "current"])
@pytest.mark.parametrize("common", [True, False])
def test_the_twin_agrees(seed: int, kind: str, common: bool) -> None:
    rng = np.random.default_rng(seed)
    materials = {
        name: with_volts(material, float(rng.uniform(-300, 600))) for name, material in six_films().items()
    }
    network = random_tree(rng, tuple(materials), 5)
    elements = [
        replace(e, units=int(rng.integers(1, 4))) for e in plain_elements(network, materials, REFERENCE)
    ]
    total = point(network, materials, Operating(voltage=1e-6)).cold_ohms[1]
    # Some 40 K of rise in the whole, or in legs that take all of its power.
    drive = {"voltage": math.sqrt(0.2 * total)} if kind == "voltage" else {"current": math.sqrt(0.2 / total)}
    heat = (
        {"thermal_resistance": 200.0}
        if common
        else {"leg_thermal_resistance": tuple((name, 250.0) for name in list(materials)[:4])}
    )
    operating = Operating(**drive, **heat)
    found = point(network, materials, operating, elements=elements)
    for k, ambient in enumerate(T):
        ohms, volts, heat_of = twin(network, materials, elements, operating, float(ambient))
        assert found.ohms[k] == pytest.approx(ohms, rel=1e-10)
        assert found.voltage[:, k] == pytest.approx(volts, rel=1e-10)
        assert found.temperature[:, k] == pytest.approx(heat_of, rel=1e-10)


@pytest.mark.parametrize("seed", range(8))
def test_powers_sum_to_what_goes_in(seed: int) -> None:
    """Tellegen's theorem (from memory): the powers of all branches of a network sum to zero."""
    rng = np.random.default_rng(seed)
    materials = {name: with_volts(m, 100.0) for name, m in six_films().items()}
    network = random_tree(rng, tuple(materials), 6)
    found = point(network, materials, Operating(voltage=3.0, thermal_resistance=100.0))
    np.testing.assert_allclose(found.power.sum(axis=0), found.total_voltage * found.total_current, rtol=1e-12)
    np.testing.assert_allclose(found.ohms, found.total_voltage / found.total_current, rtol=1e-12)


# --- one leg by hand ----------------------------------------------------------------------------------


@pytest.mark.parametrize("tc1", [-900.0, 0.0, 2000.0])
def test_one_leg_at_a_current(tc1: float) -> None:
    """rise = Rth I^2 R0 (1 + a (x + rise)), so rise = Rth I^2 R(Ta)/(1 - Rth I^2 R0 a)."""
    a, ohms, current, heat = tc1 * 1e-6, 1000.0, 5e-3, 2000.0
    found = point(
        leg("m", ohms), by_name(film("m", tc1)), Operating(current=current, thermal_resistance=heat)
    )
    cold = ohms * (1.0 + a * (T - REFERENCE))
    rise_ = heat * current**2 * cold / (1.0 - heat * current**2 * ohms * a)
    np.testing.assert_allclose(found.temperature[0] - T, rise_, rtol=1e-11)
    np.testing.assert_allclose(found.ohms, cold + ohms * a * rise_, rtol=1e-12)
    np.testing.assert_allclose(found.cold_ohms, cold, rtol=1e-14)


@pytest.mark.parametrize("tc1", [-900.0, 2000.0])
def test_one_leg_at_a_voltage(tc1: float) -> None:
    """rise (R(Ta) + R0 a rise) = Rth V^2: the root of the quadratic that is 0 at V = 0."""
    a, ohms, volts, heat = tc1 * 1e-6, 1000.0, 5.0, 2000.0
    found = point(leg("m", ohms), by_name(film("m", tc1)), Operating(voltage=volts, thermal_resistance=heat))
    cold = ohms * (1.0 + a * (T - REFERENCE))
    root = np.sqrt(cold**2 + 4.0 * ohms * a * heat * volts**2)
    np.testing.assert_allclose(found.temperature[0] - T, (root - cold) / (2.0 * ohms * a), rtol=1e-9)


def test_a_voltage_coefficient_by_hand() -> None:
    """5 V over two units: 2.5 V each, 40 ppm/V: R is 100 ppm up. Per length: 30 ppm*um/V * 2.5 V/3 um."""
    one = with_volts(film("m", 0.0), 40.0)
    two_units = (Element(leg="a", units=2),)
    found = point(leg("m", 1e3), by_name(one), Operating(voltage=5.0), elements=two_units)
    np.testing.assert_allclose(found.ohms, 1000.1, rtol=1e-13)
    np.testing.assert_allclose(found.unit_voltage, 2.5, rtol=1e-13)
    by_length = replace(one, voltage_coefficient=VoltageCoefficient(metre_per_volt=30e-12))
    long = (Element(leg="a", units=2, length=3e-6),)
    found = point(leg("m", 1e3), by_name(by_length), Operating(voltage=5.0), elements=long)
    np.testing.assert_allclose(found.ohms, 1000.025, rtol=1e-13)
    assert point(leg("m", 1e3), by_name(by_length), Operating(voltage=5.0)).no_length == ("m",)


def test_a_voltage_coefficient_at_a_current_by_hand() -> None:
    """V = I R0 (1 + k V), so V = I R0/(1 - k I R0); two strings share the current."""
    one, volts, k = with_volts(film("m", 0.0), 20000.0), 10.0, 0.02
    found = point(
        leg("m", 1e3), by_name(one), Operating(current=volts / 1e3), elements=(Element(leg="a", strings=2),)
    )
    np.testing.assert_allclose(found.total_voltage, volts / (1.0 - k * volts), rtol=1e-12)
    np.testing.assert_allclose(found.unit_current, 5e-3, rtol=1e-12)


def test_plain_elements_know_the_length_of_a_film() -> None:
    """1000 ohm of 100 ohm per square on 2 um less 0.2 um of bias: 10 squares of 1.8 um."""
    drawn = replace(film("m", 0.0), film=Film(min_width=2e-6, width_bias=0.2e-6))
    network = Series((leg("m", 1e3), leg("p", 5e2)))
    body, plain = plain_elements(network, by_name(drawn, film("p", 0.0)), REFERENCE)
    assert body.length == pytest.approx(18e-6, rel=1e-12)
    assert (body.leg, plain.leg, plain.length) == ("a", "b", None)
    two = Leg(material="m", ohms=1e3, strings=2)  # each string is 2000 ohm
    assert plain_elements(two, by_name(drawn), REFERENCE)[0].length == pytest.approx(36e-6, rel=1e-12)


# --- stability ----------------------------------------------------------------------------------------


def problem(network: Network, materials: Mapping[str, Material], operating: Operating, at=T, **more):
    with pytest.raises(InputError) as caught:
        point(network, materials, operating, at, **more)
    [found] = caught.value.problems
    assert found.where == "operating"
    return found


def limit_of(found) -> float:
    number, unit, *_ = found.expected.split()
    return float(number) * {"V": 1.0, "mV": 1e-3, "A": 1.0, "mA": 1e-3, "uA": 1e-6}[unit]


def test_a_thermistor_at_a_voltage_runs_away() -> None:
    """V^2 = theta R(Ta + theta)/Rth has its top where 1 + theta d ln R/dT = 0, so theta = T^2/B.

    With T = Ta + theta: T^2 - B T + B Ta = 0, the lower root. That is the largest voltage with a stable
    point; textbook, from memory (turnover of a thermistor, for a voltage source).
    """
    beta, ambient, ohms, heat = 3435.0, 298.15, 10e3, 200.0
    top = (beta - math.sqrt(beta**2 - 4.0 * beta * ambient)) / 2.0
    at_top = ohms * math.exp(beta * (1.0 / top - 1.0 / ambient))
    most = math.sqrt((top - ambient) * at_top / heat)
    only = (np.array([ambient]), by_name(thermistor(beta)), leg("t", ohms))
    at, materials, network = only
    found = problem(network, materials, Operating(voltage=2.0 * most, thermal_resistance=heat), at)
    assert "thermal runaway" in found.found
    assert "25 degC" in found.found
    assert most * (1.0 - 2e-3) < limit_of(found) <= most
    fine = point(network, materials, Operating(voltage=most * 0.9999, thermal_resistance=heat), at)
    assert fine.temperature[0, 0] < top
    named = limit_of(found)
    assert point(network, materials, Operating(voltage=named, thermal_resistance=heat), at).ohms[0] > 0.0


def test_the_hottest_ambient_decides() -> None:
    found = problem(
        leg("t", 10e3), by_name(thermistor()), Operating(voltage=60.0, thermal_resistance=200.0), T
    )
    assert "75 degC" in found.found


def test_a_thermistor_at_a_current_does_not_run_away() -> None:
    """Its resistance falls, so that the power falls with the heat: d(heat)/d(rise) is below zero."""
    hot = point(leg("t", 10e3), by_name(thermistor()), Operating(current=0.01, thermal_resistance=200.0))
    assert (hot.temperature[0] - T > 20.0).all()


def test_runaway_of_one_leg_at_a_current() -> None:
    """The rise Rth I^2 R(Ta)/(1 - Rth I^2 R0 a) has no bound as Rth I^2 R0 a goes to 1.

    The material is usable to 433.15 K: the largest current is the one whose rise ends there.
    """
    a, ohms, heat, ambient = 4e-3, 1000.0, 1000.0, 298.15
    room = 433.15 - ambient
    most = math.sqrt(room / (heat * ohms * (1.0 + a * room)))
    assert heat * most**2 * ohms * a < 1.0
    materials, network, at = by_name(film("m", 4000.0)), leg("m", ohms), np.array([ambient])
    beyond = math.sqrt(1.001 / (heat * ohms * a))
    found = problem(network, materials, Operating(current=beyond, thermal_resistance=heat), at)
    assert "leaves -60 degC to 160 degC" in found.found
    assert most * (1.0 - 2e-3) < limit_of(found) <= most
    wide = by_name(replace(film("m", 4000.0), valid=(213.15, 9999.0)))
    near = math.sqrt(0.95 / (heat * ohms * a))  # rise = 0.95/(0.05 a) = 4750 K
    far = point(network, wide, Operating(current=near, thermal_resistance=heat), at)
    assert far.temperature[0, 0] - ambient == pytest.approx(4750.0, rel=1e-9)


def test_a_voltage_coefficient_can_leave_no_point() -> None:
    """V = I R0/(1 - k I R0) has no end at k I R0 = 1: 50 mA at 1000 ohm and 2 %/V."""
    found = problem(leg("m", 1e3), by_name(with_volts(film("m", 0.0), 20000.0)), Operating(current=0.06))
    assert "voltage coefficients" in found.found
    assert 0.0499 < limit_of(found) <= 0.05


def test_two_legs_that_heat_themselves_can_run_away() -> None:
    """Two thermistors in parallel, each alone as in the closed form: the same limit as one."""
    network = Parallel((leg("t", 10e3), leg("t", 10e3)))
    own = Operating(voltage=60.0, leg_thermal_resistance=(("t", 200.0),))
    alone = Operating(voltage=60.0, thermal_resistance=200.0)
    both = problem(network, by_name(thermistor()), own)
    one = problem(leg("t", 10e3), by_name(thermistor()), alone)
    assert limit_of(both) == limit_of(one)


def test_an_ambient_that_no_drive_helps() -> None:
    found = problem(leg("m", 1e3), by_name(film("m", 0.0)), Operating(voltage=1.0), np.array([450.0]))
    assert "ambient temperature of 176.85 degC" in found.found
    assert "where m is usable" in found.expected


def test_an_ambient_at_the_very_end_leaves_no_room() -> None:
    at = np.array([433.15])
    found = problem(
        leg("m", 1e3), by_name(film("m", 0.0)), Operating(voltage=5.0, thermal_resistance=100.0), at
    )
    assert "leaves -60 degC to 160 degC" in found.found


# --- legs ---------------------------------------------------------------------------------------------


def test_leaves_of_one_leg_share_their_heat() -> None:
    """10 mA through 900 + 100 ohm of one leg: 0.1 W, 40 K at 400 K/W; the other leg stays cold."""
    materials = by_name(film("m", 0.0), film("m_ends", 0.0), film("n", 0.0))
    network = Series((leg("m", 900.0), leg("m_ends", 100.0), leg("n", 500.0)))
    elements = (Element(leg="a"), Element(leg="a"), Element(leg="b"))
    operating = Operating(current=0.01, leg_thermal_resistance=(("m", 400.0),))
    found = point(network, materials, operating, elements=elements)
    np.testing.assert_allclose(found.temperature - T, [[40.0] * 3, [40.0] * 3, [0.0] * 3], rtol=1e-12)
    assert found.not_heated == ("n",)
    assert found.not_stated == ("m", "m_ends", "n")
    loads = worst_by_leg(found)
    assert found.joined == {"a": "series", "b": "one"}
    assert loads["a"].voltage == pytest.approx(10.0)
    assert loads["a"].power == pytest.approx(0.1)
    assert loads["a"].current == pytest.approx(0.01)
    assert loads["b"].power == pytest.approx(0.05)


def test_leaves_in_parallel_and_apart() -> None:
    """12 V over 1000 || 1000 ohm: 24 mA; a pair that stands apart is told by its largest leaf."""
    materials = by_name(film("m", 0.0))
    pair = Parallel((leg("m", 1e3), leg("m", 1e3)))
    both = point(pair, materials, Operating(voltage=12.0), elements=(Element(leg="a"), Element(leg="a")))
    load = worst_by_leg(both)["a"]
    assert (both.joined["a"], load.voltage) == ("parallel", pytest.approx(12.0))
    assert load.current == pytest.approx(0.024)
    apart = Series((leg("m", 1e3), Parallel((leg("m", 1e3), leg("m", 1e3)))))
    names = (Element(leg="a"), Element(leg="a"), Element(leg="b"))
    split = point(apart, materials, Operating(voltage=12.0), elements=names)
    load = worst_by_leg(split)["a"]
    assert (split.joined["a"], load.voltage, load.current) == (
        "apart",
        pytest.approx(8.0),
        pytest.approx(0.008),
    )
    assert load.power == pytest.approx(8.0 * 0.008 + 4.0 * 0.004)


def test_wrong_elements() -> None:
    with pytest.raises(InputError, match="0 units"):
        Element(leg="a", units=0)
    with pytest.raises(InputError, match="above zero"):
        Element(leg="a", length=0.0)
    with pytest.raises(InternalError):
        point(
            leg("m", 1.0), by_name(film("m", 0.0)), Operating(voltage=1.0), elements=(Element(leg="a"),) * 2
        )
