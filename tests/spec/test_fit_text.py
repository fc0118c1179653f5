"""What is said of a fit: digits, probabilities, lists that stay short, nothing said that is not so."""

import re

import pytest
from campaigns import NINE, fitted_text, sweep_text

from tcplan.measure.request import SpreadRules
from tcplan.spec.fit_text import _known, device_rows, facts, head


def told(one, refused=0):
    return {label: " ".join(texts) for label, texts in facts(one, refused)}


@pytest.mark.parametrize(
    ("value", "uncertainty", "text"),
    [
        (-637.2345, 2.16, "-637.2 +- 2.2"),
        (0.90004, 0.00182, "0.9000 +- 0.0018"),
        (3431.7321, 32.4, "3432 +- 32"),
        (123456.0, 2300.0, "123500 +- 2300"),
        (-0.00001, 0.3, "0.00 +- 0.30"),
        (1.5, 0.0, "1.5 +- 0"),
        (1.123456789e-15, 1.2e-17, "1.123e-15 +- 1.2e-17"),
        (2.58412e-9, 1.24e-10, "2.58e-9 +- 1.2e-10"),
        (-7.98e-5, 3.0e-7, "-7.980e-5 +- 3.0e-7"),
    ],
)
def test_values_end_at_the_second_digit_of_their_uncertainty(value, uncertainty, text):
    """JCGM 100, 7.2.6: two digits of a standard uncertainty, and the value to the same."""
    assert _known(value, uncertainty) == text


def test_the_head():
    assert head(fitted_text(sweep_text(2, 3))) == (
        "film: 54 readings of 6 devices of 2 lots, -55 degC to 140 degC"
    )
    assert head(fitted_text(sweep_text(1, 1))) == "film: 9 readings of one device, -55 degC to 140 degC"


def test_one_device_says_nothing_of_a_spread():
    facts_of_it = told(fitted_text(sweep_text(1, 1)))
    assert facts_of_it["Spread"] == (
        "One device says nothing of it: the material is written without a spread."
    )
    assert list(facts_of_it) == ["Law", "Spread", "Readings"]


def test_one_lot_says_so():
    text = told(fitted_text(sweep_text(1, 5)))
    assert "sigma of device" in text["Spread"]
    assert " and lot" not in text["Spread"]
    assert "of devices of such a lot with 95 % confidence" in text["Spread"]
    assert text["Note"].startswith("One lot: nothing is known of how lots differ")


def test_one_device_of_each_lot():
    text = told(fitted_text(sweep_text(5, 1)))
    assert "R: sigma of any device" in text["Spread"]
    assert "cannot be told apart" in text["Note"]


def test_coverage_and_confidence_are_told():
    text = told(fitted_text(sweep_text(3, 2), SpreadRules(coverage=0.9, confidence=0.99)))
    assert "Limits hold 90 % of all devices with 99 % confidence." in text["Spread"]


def test_limits_are_rounded_outward():
    one = fitted_text(sweep_text(4, 3))
    shown = float(re.search(r"TC1: [^;]*; limits \+-([\d.]+) ppm/K", told(one)["Spread"])[1])
    half = one.found.scatter("tc1").half_width * 1e6
    assert half <= shown <= 1.01 * half


def test_probabilities_are_never_zero():
    law = told(fitted_text(sweep_text(2, 3)))["Law"]
    assert "The quadratic term is significant (p below 0.001, all devices together)." in law
    assert "(p below 0.001)." in told(fitted_text(sweep_text(1, 1)))["Law"]


def test_a_line_is_said_to_be_one():
    straight = told(fitted_text(sweep_text(1, 9, tc2=0.0)))["Law"]
    assert re.search(r"not significant \(p 0\.\d+, all .*\): it is kept; --order 1 leaves it out\.", straight)
    few = told(fitted_text(sweep_text(1, 1, (0.0, 0.0, 50.0))))["Law"]
    assert "A line was fitted: there are too few readings for a quadratic term." in few
    assert "quadratic" not in told(fitted_text(sweep_text(1, 9), order=2))["Law"]


def test_readings_that_scatter_more_than_stated():
    good = sweep_text(2, 3, stated=True)
    assert re.search(
        r"known to 50 ppm as stated \(1 sigma\), and scatter by [\d.]+ times that\.",
        told(fitted_text(good))["Readings"],
    )
    bad = good.replace(",50\n", ",20\n")
    assert "times that: more than stated (p below 0.001)." in told(fitted_text(bad))["Readings"]
    assert "about their law (1 sigma)" in told(fitted_text(sweep_text(1, 2)))["Readings"]


def test_no_reading_left_over():
    text = told(fitted_text(sweep_text(1, 1, (0.0, 50.0, 100.0), stated=True), order=2))
    assert text["Readings"] == "They are known to 50 ppm as stated; none is left over to check that."


def test_lack_of_fit():
    twice = sorted((*NINE, *NINE))
    bent = told(fitted_text(sweep_text(1, 3, twice), order=1))["Readings"]
    assert "Lack of fit (p below 0.001, all devices together), most in D" in bent
    assert re.search(
        r"Repeats show no lack of fit \(p [\d.]+\)", told(fitted_text(sweep_text(1, 1, twice)))["Readings"]
    )


def moved_down(text, readings, share):
    """Return a sweep whose readings after the first half of each device are lower by a share."""
    head, *lines = text.strip().split("\n")
    moved = [head]
    for n, line in enumerate(lines):
        t, R, rest = line.split(",", 2)
        moved.append(f"{t},{float(R) * (1 - share * (2 * (n % readings) >= readings))!r},{rest}")
    return "\n".join(moved) + "\n"


def test_repeats_that_hysteresis_spoils_tell_nothing():
    once = (*NINE, *NINE[::-1])
    text = told(fitted_text(moved_down(sweep_text(1, 3, once, noise=5e-6), 18, 300e-6)))["Readings"]
    assert "Repeats cannot tell a lack of fit in every device: the ways differ" in text
    assert "no lack of fit" not in text
    twice = tuple(sorted((*NINE, *NINE)))
    text = told(fitted_text(moved_down(sweep_text(1, 3, twice + twice[::-1], noise=5e-6), 36, 300e-6)))
    assert "Repeats show no lack of fit" in text["Readings"]


def test_hysteresis_is_told_with_its_sign_and_where():
    up_down = (*NINE, *NINE[::-1])
    quiet = told(fitted_text(sweep_text(1, 2, up_down)))["Readings"]
    assert "Hysteresis, down less up:" in quiet
    lines = sweep_text(1, 6, up_down, noise=5e-6).split("\n")
    moved = [lines[0]]
    for n, line in enumerate(lines[1:-1]):
        t, R, rest = line.split(",", 2)
        moved.append(f"{t},{float(R) * (1 - 300e-6 * (n % 18 > 8))!r},{rest}")
    loud = told(fitted_text("\n".join(moved) + "\n"))["Readings"]
    assert re.search(r"down less up: -(29|30)\d(\.\d)? ppm in the mean", loud)
    assert loud.endswith("significant (p below 0.001, all devices together); by itself in every device.")


def test_outliers_are_listed_farthest_first_and_not_all():
    lines = tuple(5 + 41 * k for k in range(12))
    text = sweep_text(1, 12, tuple(range(-40, 121, 4)), outliers=lines)
    one = fitted_text(text)
    flagged = [flag.line for fit in one.fits for flag in fit.flags if flag.outlier]
    assert set(lines) <= set(flagged)
    flags = told(one)["Flags"]
    assert flags.startswith("Outliers, kept unless excluded: line ")
    assert f"and {len(flagged) - 8} more." in flags
    sizes = [abs(float(size)) for size in re.findall(r"\(([-+\d.]+) sigma\)", flags)]
    assert sizes == sorted(sizes, reverse=True)


def test_leverage_is_told():
    text = sweep_text(1, 1, (20.0, 21.0, 22.0, 23.0, 24.0, 25.0, 120.0), tc2=0.0)
    assert "High leverage, the law hangs on them: line 8." in told(fitted_text(text, order=1))["Flags"]


def test_what_is_left_out_and_refused_is_told():
    text = sweep_text(1, 2) + "25,overload,D0,L0\n" + "".join(f"{k},x,D0,L0\n" for k in range(20))
    found = told(fitted_text(text, exclude=(5, 4)), refused=21)
    assert found["Left out"] == "As asked, lines 4, 5."
    assert found["Refused"].startswith(
        "21 rows are no readings; fit.json lists them. Line 20: found 'overload'"
    )
    assert found["Refused"].count("Line ") == 8


def test_the_table_of_devices():
    one = fitted_text(sweep_text(2, 2, names=lambda n, k: (f"lot {n} with a name that is long", f"D{k}")))
    first, *rows = device_rows(one)
    assert first == ("device", "lot", "R, ohm", "TC1, ppm/K", "TC2, ppm/K^2", "sigma, ppm")
    assert len(rows) == 4
    assert all(len(cell) <= 22 for row in rows for cell in row)
    assert rows[0][1] == "lot 0 with a n.."
    assert re.fullmatch(r"-3\d\d\.\d+ \+- \d\.\d+", rows[0][3])


def test_a_thermistor_has_its_own_words():
    rows = "".join(f"{t},{r}\n" for t, r in ((0, 28704), (25, 10000.5), (50, 4101), (85, 1451.5), (100, 987)))
    one = fitted_text(f"T [degC],R [ohm]\n{rows}", model="thermistor")
    assert re.search(r"beta 343\d\.\d+ \+- \d\.\d K\.", told(one)["Law"])
