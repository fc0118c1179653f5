"""Lengths of wire by hand, the cutting list and the tolerance of a cut."""

from dataclasses import replace

import pytest
from makers import film

from tcplan.errors import InputError
from tcplan.made import WireLeg
from tcplan.parts.wire import cutting_list, relative_error_of, wire_legs, wire_refusals

AT_20, AT_25 = 293.15, 298.15


def wire(tc1_ppm: float = 0.0, ohm_per_metre: float = 12.5, reference: float = AT_25):
    made = film("alloy", tc1_ppm, reference=reference)
    return replace(made, kind="wire", ohm_per_square=None, ohm_per_metre=ohm_per_metre)


def test_lengths_by_hand() -> None:
    # 12.5 ohm/m: 100 ohm is 8 m; 33.33 ohm is 2.6664 m, cut at 2.666 m, 33.325 ohm.
    first, second = wire_legs(wire(), [("a", 100.0), ("b", 33.33)], AT_25)
    assert (first.id, first.material, first.length, first.wanted_ohms) == ("a", "alloy", 8.0, 100.0)
    assert second.length == 2.666
    assert second.ohm_per_metre == pytest.approx(12.5, rel=1e-15)
    assert second.ohms == pytest.approx(33.325, rel=1e-12)


def test_ohm_per_metre_is_taken_to_the_reference_of_the_plan() -> None:
    # Copper of 4 ohm/m at 20 degC with 3930 ppm/K (IEC 60028): at 25 degC 4 (1 + 5 * 0.00393) = 4.0786 ohm/m,
    # so that 412 ohm at 25 degC are 101.015 m (412 / 4.0786 = 101.0150...).
    copper = wire(tc1_ppm=3930.0, ohm_per_metre=4.0, reference=AT_20)
    (coil,) = wire_legs(copper, [("a", 412.0)], AT_25)
    assert coil.ohm_per_metre == pytest.approx(4.0786, rel=1e-12)
    assert coil.length == 101.015


def test_another_step() -> None:
    # 33.33 ohm is 2.6664 m: 2.665 m to the nearest 5 mm, 2.7 m to the nearest 10 cm.
    lengths = [wire_legs(wire(), [("a", 33.33)], AT_25, step=s)[0].length for s in (5e-3, 0.1, 1e-4)]
    assert lengths == [2.665, 2.7, 2.6664]


def test_lengths_are_clean_decimals() -> None:
    for steps in range(1, 3000):
        (leg,) = wire_legs(wire(), [("a", 12.5e-3 * steps)], AT_25)
        assert repr(leg.length) == repr(float(f"{steps}e-3"))


def test_a_length_is_not_rounded_below_the_shortest() -> None:
    # 0.2004 m is above the shortest 0.2003 m; the nearest millimetre, 0.200 m, is not.
    (leg,) = wire_legs(wire(), [("a", 0.2004 * 12.5)], AT_25, min_length=0.2003)
    assert leg.length == 0.201
    (leg,) = wire_legs(wire(), [("a", 0.2 * 12.5)], AT_25, min_length=0.2)
    assert leg.length == 0.2


def test_too_short_is_refused_with_the_nearest() -> None:
    # By hand: at 12.5 ohm/m, 1 ohm is 80 mm; the shortest, 0.15 m, is 1.875 ohm.
    legs = [("a", 100.0), ("b", 1.0)]
    (refused,) = wire_refusals(wire(), legs, AT_25, min_length=0.15)
    assert (refused.leg, refused.rule) == ("b", "length of wire")
    assert refused.found == "80 mm of alloy (1 ohm)"
    assert refused.nearest == "150 mm, 1.875 ohm"
    with pytest.raises(InputError, match=r"leg b: found 80 mm .* The nearest is 150 mm, 1\.875 ohm"):
        wire_legs(wire(), legs, AT_25, min_length=0.15)


def test_less_than_half_a_step_is_refused() -> None:
    # 5 mohm at 12.5 ohm/m is 0.4 mm, which rounds to nothing; one step, 1 mm, is 12.5 mohm.
    (refused,) = wire_refusals(wire(), [("a", 5e-3)], AT_25)
    assert refused.nearest == "1 mm, 12.5 mohm"
    assert wire_refusals(wire(), [("a", 7.5e-3)], AT_25) == ()


def test_what_is_no_wire_or_no_length_is_refused() -> None:
    with pytest.raises(InputError, match="found a film; expected a wire"):
        wire_legs(film("red", 100.0), [("a", 100.0)], AT_25)
    with pytest.raises(InputError, match="step of length"):
        wire_legs(wire(), [("a", 100.0)], AT_25, step=0.0)
    with pytest.raises(InputError, match="min_length") as caught:
        wire_legs(wire(), [("a", 100.0)], AT_25, step=float("nan"), min_length=-1.0)
    assert len(caught.value.problems) == 2


def cut(name: str, material: str, length: float) -> WireLeg:
    return WireLeg(id=name, material=material, wanted_ohms=1.0, length=length, ohm_per_metre=10.0)


def test_the_cutting_list() -> None:
    legs = [
        cut("a", "m2", 1.5),
        cut("b", "m1", 0.25),
        cut("c", "m2", 3.0),
        cut("d", "m2", 1.5),
        cut("e", "m1", 1.5),
    ]
    rows = cutting_list(legs)
    assert rows == (("m1", 1.5, 1), ("m1", 0.25, 1), ("m2", 3.0, 1), ("m2", 1.5, 2))
    assert cutting_list([]) == ()


def test_a_tolerance_of_the_cut() -> None:
    # By hand: 2 mm in 0.5 m is 0.4 %, in 8 m 0.025 %.
    legs = [cut("a", "m1", 0.5), cut("b", "m1", 8.0)]
    assert relative_error_of(legs, 2e-3) == pytest.approx((0.004, 0.00025), rel=1e-12)
    assert relative_error_of(legs, 0.0) == (0.0, 0.0)


@pytest.mark.parametrize("tolerance", [-1e-3, 0.5, float("nan")])
def test_a_tolerance_has_to_be_below_the_length(tolerance: float) -> None:
    with pytest.raises(InputError, match="length tolerance"):
        relative_error_of([cut("a", "m1", 0.5), cut("b", "m1", 8.0)], tolerance)
