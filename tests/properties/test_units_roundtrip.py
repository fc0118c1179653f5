"""What is printed reads back as what it was, and no text gets past the errors."""

import math

from hypothesis import example, given, settings
from hypothesis import strategies as st

from tcplan.errors import UnitError
from tcplan.units import (
    _KINDS,
    format_celsius,
    format_ohms,
    format_ppm,
    format_ppm_per_K,
    format_ppm_per_K2,
    format_si,
    from_celsius,
    parse_quantity,
    round_nominal,
    round_outward,
    to_celsius,
)

FEW = settings(max_examples=150, derandomize=True, deadline=None)
EXACT = 17  # significant digits that identify a double (IEEE 754)
SIZES = st.floats(min_value=1e-15, max_value=1e15)
SIGNED = st.one_of(SIZES, SIZES.map(lambda size: -size), st.just(0.0))


@FEW
@given(SIGNED)
def test_ohms_exactly(value: float) -> None:
    # Prefixes from uohm to Gohm are decimal shifts, so nothing is lost; pohm and nohm go by pint.
    read = parse_quantity(format_ohms(value, EXACT), "ohm")
    assert read == value if abs(value) >= 1e-6 else math.isclose(read, value, rel_tol=1e-15)


@FEW
@given(SIGNED, st.sampled_from(["m", "m^2", "ohm/m", "ohm*m", "A", "A/m", "V", "W", "K/W"]))
def test_si_with_prefixes(value: float, unit: str) -> None:
    read = parse_quantity(format_si(value, unit, EXACT), unit)
    assert math.isclose(read, value, rel_tol=1e-14)


@FEW
@given(SIGNED)
def test_ratios_and_coefficients_exactly(value: float) -> None:
    assert parse_quantity(format_ppm(value, EXACT), "1") == value
    assert parse_quantity(format_ppm_per_K(value, EXACT), "1/K") == value
    assert parse_quantity(format_ppm_per_K2(value, EXACT), "1/K^2") == value


@FEW
@given(SIZES, st.integers(1, 9))
def test_printed_digits_are_within_half_a_unit_of_the_last(value: float, digits: int) -> None:
    read = parse_quantity(format_ohms(value, digits), "ohm")
    assert abs(read - value) <= 0.5000001 * 10 ** (math.floor(math.log10(value)) - digits + 1)


@FEW
@given(st.integers(-27315, 200000))
def test_celsius_to_two_decimals(hundredths: int) -> None:
    celsius = hundredths / 100
    assert to_celsius(from_celsius(celsius)) == celsius
    assert parse_quantity(format_celsius(from_celsius(celsius)), "K") == from_celsius(celsius)


@FEW
@given(st.integers(1, 999), st.integers(0, 999), st.sampled_from("RkKMG"))
def test_resistance_code(whole: int, part: int, letter: str) -> None:
    # IEC 60062: the letter stands where the decimal point does. The code is built here, digit by digit.
    factor = {"R": 1.0, "k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9}[letter]
    read = parse_quantity(f"{whole}{letter}{part}", "ohm")
    assert math.isclose(read, float(f"{whole}.{part}") * factor, rel_tol=1e-15)
    assert parse_quantity(f"{whole}{letter}", "ohm") == whole * factor
    assert math.isclose(parse_quantity(f"{letter}{part}", "ohm"), float(f"0.{part}") * factor, rel_tol=1e-15)


@FEW
@given(SIGNED, st.integers(1, 6))
def test_outward_is_never_inward_and_stays_put(value: float, digits: int) -> None:
    rounded = round_outward(value, digits)
    assert abs(rounded) >= abs(value) * (1 - 1e-9)
    assert abs(rounded) <= abs(value) * (1 + 10.0 ** (1 - digits)) * (1 + 1e-9)
    assert math.copysign(1.0, rounded) == math.copysign(1.0, value)
    assert round_outward(rounded, digits) == rounded


@FEW
@given(st.floats(-1e9, 1e9), st.floats(1e-6, 1e9))
def test_nominal_moves_by_no_more_than_half_its_spread(value: float, spread: float) -> None:
    # The step is below ten tenths of the spread, and at least one tenth of it.
    rounded = round_nominal(value, spread, digits=15)
    assert abs(rounded - value) <= 0.5000001 * spread + 1e-6
    assert round_nominal(rounded, spread, digits=15) == rounded


PIECES = [
    "1",
    "4k7",
    "-",
    "\u2212",
    "e",
    "999",
    ".",
    " ",
    "\u00a0",
    "ohm",
    "Ω",
    "k",
    "K",
    "R",
    "degC",
    "°",
    "ppm",
]
PIECES += [
    "%",
    "/",
    "*",
    "**",
    "^",
    "2",
    "²",
    "⁻",
    "um",
    "(",
    ")",
    "nan",
    "inf",
    "[",
    "'",
    "\x00",
    "if",
    "lambda",
]


@settings(FEW, max_examples=400)
@given(
    st.one_of(st.lists(st.sampled_from(PIECES), max_size=8).map("".join), st.text()),
    st.sampled_from([*_KINDS]),
)
@example("1 if", "1")
@example("1 degC^-1*degC", "1")
@example("1e-99999999999999999999 ohm", "ohm")
def test_any_text_gives_a_finite_value_or_a_unit_error(text: str, unit: str) -> None:
    try:
        value = parse_quantity(text, unit)
    except UnitError as error:
        complete = all(problem.found and problem.expected and problem.todo for problem in error.problems)
    else:
        complete = math.isfinite(value)
    assert complete
