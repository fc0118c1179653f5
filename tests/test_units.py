"""Text to SI and back: what is read, what is refused and how it is printed."""

import math
import subprocess
import sys

import pint
import pytest

from tcplan.errors import InternalError, UnitError
from tcplan.units import (
    _KINDS,
    PPM,
    ZERO_CELSIUS,
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

# Values by the SI prefixes and by t/degC = T/K - 273.15: SI Brochure (BIPM), 9th edition.
READ = [
    ("12 kohm", "ohm", 12e3),
    ("12kohm", "ohm", 12e3),
    ("  320 ohm ", "ohm", 320.0),
    ("12 kΩ", "ohm", 12e3),
    ("12 k\u2126", "ohm", 12e3),
    ("12\u00a0kΩ", "ohm", 12e3),
    ("2 mohm", "ohm", 2e-3),
    ("2 Mohm", "ohm", 2e6),
    ("2 MOhm", "ohm", 2e6),
    ("1.5e3 ohms", "ohm", 1500.0),
    ("25 degC", "K", 298.15),
    ("-40 degC", "K", 233.15),
    ("\u221240 °C", "K", 233.15),
    ("\u201340 °C", "K", 233.15),
    ("25 ℃", "K", 298.15),
    ("25 ºC", "K", 298.15),
    ("25 deg C", "K", 298.15),
    ("298.15 K", "K", 298.15),
    ("-273.15 degC", "K", 0.0),
    ("10 K", "delta_K", 10.0),
    ("10 degC", "delta_K", 10.0),
    ("500 mK", "delta_K", 0.5),
    ("-120 ppm/K", "1/K", -120e-6),
    ("\u2212120 ppm/°C", "1/K", -120e-6),
    ("-120 ppm / K", "1/K", -120e-6),
    ("-120ppm/degC", "1/K", -120e-6),
    ("120 ppm·K⁻¹", "1/K", 120e-6),
    ("120 ppm K^-1", "1/K", 120e-6),
    ("0.393 %/K", "1/K", 0.00393),
    ("0.00393 1/K", "1/K", 0.00393),
    ("3.93e-3 /K", "1/K", 0.00393),
    ("0.55 ppm/K^2", "1/K^2", 0.55e-6),
    ("0.55 ppm/K**2", "1/K^2", 0.55e-6),
    ("0.55 ppm/K²", "1/K^2", 0.55e-6),
    ("0.55 ppm/°C²", "1/K^2", 0.55e-6),
    ("0.55 ppm·K⁻²", "1/K^2", 0.55e-6),
    ("0.001 ppm/K³", "1/K^3", 1e-9),
    ("15 %", "1", 0.15),
    ("15%", "1", 0.15),
    ("6000 ppm", "1", 0.006),
    ("50 ppb", "1", 50e-9),
    ("5 nm", "m", 5e-9),
    ("0.6 µm", "m", 0.6e-6),
    ("0.6 μm", "m", 0.6e-6),
    ("500 um^2", "m^2", 500e-12),
    ("500 µm²", "m^2", 500e-12),
    ("8.5 ohm/m", "ohm/m", 8.5),
    ("35 ohm*um", "ohm*m", 35e-6),
    ("35 Ω·µm", "ohm*m", 35e-6),
    ("35 ohm um", "ohm*m", 35e-6),
    ("35 um*ohm", "ohm*m", 35e-6),
    ("1 mA", "A", 1e-3),
    ("0.6 mA/um", "A/m", 600.0),
    ("5 V", "V", 5.0),
    ("100 mW", "W", 0.1),
    ("150 K/W", "K/W", 150.0),
    ("150 °C/W", "K/W", 150.0),
    ("1.2 %*um", "1*m", 1.2e-8),
    ("1.2 %µm", "1*m", 1.2e-8),
    ("1.2 %·µm", "1*m", 1.2e-8),
    # A thousandth of an inch: 1959 yard and pound agreement, 1 inch = 25.4 mm. Not in the table: by pint.
    ("10 thou", "m", 254e-6),
    # 1 degF is 5/9 K.
    ("5 ppm/degF", "1/K", 9e-6),
]


@pytest.mark.parametrize(("text", "unit", "value"), READ)
def test_read(text: str, unit: str, value: float) -> None:
    assert parse_quantity(text, unit) == pytest.approx(value, rel=1e-15, abs=0.0)


@pytest.mark.parametrize(
    ("code", "ohms"),
    [  # IEC 60062, examples of the letter code; R47, 4R7, 470R and 4K7 are printed there (from memory)
        ("R47", 0.47),
        ("4R7", 4.7),
        ("470R", 470.0),
        ("4K7", 4700.0),
        ("4k7", 4700.0),
        ("5k1", 5100.0),
        ("10k", 10e3),
        ("10K", 10e3),
        ("1M5", 1.5e6),
        ("59R04", 59.04),
        ("1G", 1e9),
    ],
)
def test_resistance_code(code: str, ohms: float) -> None:
    assert parse_quantity(code, "ohm") == ohms


@pytest.mark.parametrize("text", ["4k7", "10K", "R47"])
@pytest.mark.parametrize("unit", [unit for unit in _KINDS if unit not in ("ohm", "K", "delta_K")])
def test_a_code_is_for_resistances_only(text: str, unit: str) -> None:
    with pytest.raises(UnitError):
        parse_quantity(text, unit)


def test_K_is_kilo_only_in_a_code() -> None:  # noqa: N802 - K is the letter
    assert parse_quantity("10K", "ohm") == 10e3
    assert parse_quantity("10K", "K") == 10.0
    with pytest.raises(UnitError, match="4k7"):
        parse_quantity("10 K", "ohm")


@pytest.mark.parametrize(
    ("text", "unit", "message"),
    [
        ("12 V", "ohm", "found '12 V', a voltage; expected a resistance such as \"12 kohm\""),
        ("320 ppm", "1/K", "a ratio; expected a temperature coefficient"),
        ("40 ppm/K", "1/K^2", "a temperature coefficient; expected a second"),
        ("5 um", "1*m", "a length; expected a matching coefficient"),
        ("1.2 %*um", "m", "a matching coefficient; expected a length"),
        ("25 C", "K", r"of dimension \[current\] \* \[time\]"),
        ("12 kohm", "K", "a resistance; expected a temperature"),
        ("10 %*ohm", "ohm", "of dimension"),
        ("5 ppm*ppm/K", "1/K", "of dimension"),
        ("5 mil", "1", "without a dimension; expected a ratio"),  # pint's mil is an angle
        ("77 degF", "K", "Write it in degC or K"),
        ("10 degF", "delta_K", "Write it in degC or K"),
        ("3 dB", "1", "expected a ratio"),
        ("3 dBm", "W", "expected a power"),  # a unit with another zero
        ("12 Kohm", "ohm", 'Did you mean "kohm"'),
        ("5 foo", "m", "unknown unit 'foo'"),
        ("12,000 ohm", "ohm", "no thousands separator"),
        ("12 000 ohm", "ohm", "no thousands separator"),
        ("12\u202f000 ohm", "ohm", "no thousands separator"),
        ("12'000 ohm", "ohm", "no thousands separator"),
        ("12_000 ohm", "ohm", "no thousands separator"),
        ("4,7 kohm", "ohm", "a point for the decimals"),
        ("4,7k", "ohm", "a point for the decimals"),
        ("4.7k", "ohm", 'Write "4.7 kohm"'),
        ("12", "ohm", 'The unit is missing: write "12 kohm"'),
        ("0.15", "1", 'The unit is missing: write "15 %"'),
        ("25", "K", 'write "25 degC"'),
        ("±40 ppm/K", "1/K", "without its sign"),
        ("-300 degC", "K", "below absolute zero"),
        ("-1 K", "K", "below absolute zero"),
        ("nan ohm", "ohm", "finite number"),
        ("inf K", "K", "finite number"),
        ("1e999 ohm", "ohm", "finite number"),
        ("1e308 Mohm", "ohm", "too large"),
        ("1e308 thou^2*yd", "1", "found"),
        ("", "ohm", "finite number"),
        ("kohm", "ohm", "finite number"),
        ("١٢ ohm", "ohm", "finite number"),  # digits of another script
        ("12 ohm*", "ohm", "found"),
        ("12 ohm 13", "ohm", "found"),
        ("0x10 ohm", "ohm", "found"),
        ("10 ^-6/K", "1/K", "found"),
        ("1 __import__('os')", "ohm", "found"),
        ("1 (ohm)", "ohm", "found"),
        ("1" * 50 + " ohm", "ohm", "finite number"),
        ("x" * 1000, "ohm", "1000 characters"),
    ],
)
def test_refused(text: str, unit: str, message: str) -> None:
    with pytest.raises(UnitError, match=message):
        parse_quantity(text, unit)


NOT_TEXT = [12, 12.0, True, None, [12, "ohm"], {"ohm": 12}, b"12 ohm", math.nan, 10**5000]


@pytest.mark.parametrize("value", NOT_TEXT, ids=range(len(NOT_TEXT)))
@pytest.mark.parametrize("unit", ["ohm", "1"])
def test_what_is_not_text_is_refused_with_an_example(value: object, unit: str) -> None:
    with pytest.raises(UnitError, match=r'Write the number and its unit as text: "1[25] '):
        parse_quantity(value, unit)


@pytest.mark.parametrize("tower", ["K^9^9^9^9", "K**9**9**9", "(K^9)^9", "K^99999999", "K^(9^9^9)", "K^1e9"])
def test_exponent_towers_never_reach_pint(tower: str, monkeypatch: pytest.MonkeyPatch) -> None:
    def not_here() -> None:
        raise AssertionError

    monkeypatch.setattr("tcplan.units._registry", not_here)
    with pytest.raises(UnitError):
        parse_quantity(f"1 {tower}", "1/K")


def test_message_is_short_and_without_control_characters() -> None:
    with pytest.raises(UnitError) as caught:
        parse_quantity("\x1b[31m" + "9" * 190, "ohm", where="films.toml: red_film")
    assert str(caught.value).startswith("films.toml: red_film: found ")
    assert str(caught.value).isprintable()
    assert len(str(caught.value)) < 250


def test_an_unknown_canonical_unit_is_a_fault_of_the_program() -> None:
    with pytest.raises(InternalError):
        parse_quantity("12 kohm", "kohm")


@pytest.mark.parametrize("unit", _KINDS)
def test_each_example_in_a_message_is_readable(unit: str) -> None:
    assert math.isfinite(parse_quantity(_KINDS[unit].example, unit))


@pytest.fixture(scope="module")
def registry() -> pint.UnitRegistry[float]:
    """Pint's own registry, in which percent and ppm have no dimension."""
    own: pint.UnitRegistry[float] = pint.UnitRegistry()
    own.define("ppb = 1e-9")
    return own


@pytest.mark.parametrize(
    ("unit", "text", "exponent"),
    [(unit, text, power) for unit, kind in _KINDS.items() for text, power in kind.exponents.items()],
)
def test_the_table_agrees_with_pint(
    registry: pint.UnitRegistry[float], unit: str, text: str, exponent: int
) -> None:
    target = {"delta_K": "K", "1": "", "1*m": "m"}.get(unit, unit)
    one = registry.Quantity(1.0, registry.parse_units(text.replace("%", "percent")))
    assert one.to(target).magnitude == pytest.approx(10.0**exponent, rel=1e-14)


# One of each unit that ordinary briefs and materials files are written with.
ORDINARY = {
    "ohm": ("12 kohm", "412 ohm", "12 kΩ", "4k7"),
    "K": ("27 degC", "-40 °C", "298.15 K"),
    "delta_K": ("10 K", "10 degC"),
    "1/K": ("-120 ppm/K", "-900 ppm/°C"),
    "1/K^2": ("0.55 ppm/K^2", "0.55 ppm/°C²"),
    "1": ("15 %", "6000 ppm"),
    "m": ("1 um", "0.05 µm", "5 nm"),
    "ohm*m": ("35 ohm*um",),
    "A/m": ("0.6 mA/um",),
    "1*m": ("1.2 %*um",),
}


def test_ordinary_units_are_read_without_pint() -> None:
    code = (
        "import sys; from tcplan.units import parse_quantity;"
        f"[parse_quantity(text, unit) for unit, texts in {ORDINARY!r}.items() for text in texts];"
        "sys.exit('pint' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_temperatures_are_clean() -> None:
    # SI Brochure (BIPM), 9th edition, 2.3.1: t/degC = T/K - 273.15.
    assert ZERO_CELSIUS == 273.15
    assert to_celsius(298.15) == 25.0
    assert to_celsius(233.15) == -40.0
    assert from_celsius(-40.0) == 233.15
    assert PPM == 1e-6


@pytest.mark.parametrize(
    ("value", "digits", "text"),
    [
        (14238.7, 4, "14.24 kohm"),
        (18e3, 4, "18 kohm"),
        (999.96, 4, "1 kohm"),
        (999.94, 4, "999.9 ohm"),
        (0.0, 4, "0 ohm"),
        (-0.0, 4, "0 ohm"),
        (-412.0, 4, "-412 ohm"),
        (0.47, 4, "470 mohm"),
        (1e13, 4, "10000 Gohm"),
        (14238.7, 2, "14 kohm"),
        (math.inf, 4, "inf ohm"),
    ],
)
def test_format_ohms(value: float, digits: int, text: str) -> None:
    assert format_ohms(value, digits) == text


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (5e-9, "m", "5 nm"),
        (500e-12, "m^2", "500 um^2"),
        (2.5e-6, "m^2", "2.5 mm^2"),
        (600.0, "A/m", "600 A/m"),
        (1e-12, "A", "1 pA"),
        (35e-6, "ohm*m", "35 uohm*m"),
    ],
)
def test_format_si(value: float, unit: str, text: str) -> None:
    assert format_si(value, unit) == text


def test_format_si_refuses_units_without_a_prefix() -> None:
    with pytest.raises(InternalError):
        format_si(1e-6, "1/K")


@pytest.mark.parametrize(
    ("fraction", "text"),
    [
        (0.006, "6000 ppm"),
        (1.2e-9, "0.0012 ppm"),
        (0.0, "0 ppm"),
        (-0.0, "0 ppm"),
        (-0.0123456, "-12300 ppm"),
        (1.0, "1000000 ppm"),
        (3e-6, "3 ppm"),
        (1e-16, "1e-10 ppm"),
        (math.nan, "nan ppm"),
    ],
)
def test_format_ppm(fraction: float, text: str) -> None:
    assert format_ppm(fraction) == text


def test_format_coefficients() -> None:
    assert format_ppm_per_K(-120e-6) == "-120 ppm/K"
    assert format_ppm_per_K(3.9083e-3) == "3908 ppm/K"
    assert format_ppm_per_K2(0.55e-6) == "0.55 ppm/K^2"
    assert format_ppm_per_K2(-5.775e-7, digits=2) == "-0.58 ppm/K^2"


@pytest.mark.parametrize(
    ("kelvin", "text"),
    [
        (233.15, "-40 degC"),
        (273.15, "0 degC"),
        (273.149999, "0 degC"),
        (310.65, "37.5 degC"),
        (300.0, "26.85 degC"),
        (310.12345, "36.97 degC"),
        (math.nan, "nan degC"),
    ],
)
def test_format_celsius(kelvin: float, text: str) -> None:
    assert format_celsius(kelvin) == text


@pytest.mark.parametrize(
    ("value", "digits", "rounded"),
    [
        (6000.0, 3, 6000.0),
        (6000.0000000001, 3, 6000.0),
        (5999.9999999999, 3, 6000.0),
        (6000.1, 3, 6010.0),
        (0.1234, 3, 0.124),
        (-0.1234, 3, -0.124),
        (0.123, 3, 0.123),
        (999.1, 3, 1000.0),
        (6343.2, 2, 6400.0),
        (0.0, 3, 0.0),
        (math.inf, 3, math.inf),
    ],
)
def test_round_outward(value: float, digits: int, rounded: float) -> None:
    assert round_outward(value, digits) == rounded


@pytest.mark.parametrize(
    ("value", "spread", "digits", "rounded"),
    [
        (14238.7, None, 4, 14240.0),
        (14238.7, 0.0, 4, 14240.0),
        (14238.7, 2000.0, 4, 14200.0),  # a tenth is 200
        (14238.7, 2100.0, 4, 14000.0),  # a tenth is 210, the step 500
        (3454.8, 4038.2, 4, 3500.0),
        (14238.7, 100.0, 6, 14240.0),  # a tenth is exactly 10
        (14238.7, 1e-3, 4, 14240.0),
        (-37.2, -50.0, 4, -35.0),
        (1.9, 40.0, 4, 0.0),
        (0.0, 1.0, 4, 0.0),
    ],
)
def test_round_nominal(value: float, spread: float | None, digits: int, rounded: float) -> None:
    assert round_nominal(value, spread, digits) == rounded


def test_round_nominal_leaves_no_minus_zero() -> None:
    assert math.copysign(1.0, round_nominal(-3.0, 100.0)) == 1.0
