"""Blocks of a materials file: written, read back by the readers of materials files and briefs."""

import tomllib

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from makers import brief
from measured_fits import fit_of, law_fit, lots_of

from tcplan.errors import InputError, InternalError
from tcplan.material.files import parse_materials, read_material_file
from tcplan.material.law import Expression, Platinum, SteinhartHart, Thermistor
from tcplan.measure.block import Size, correlation_block, material_block, material_of, tracking_block
from tcplan.measure.population import population
from tcplan.measure.spread_words import rounded, toml_text
from tcplan.measure.tracking import tracking_of

SQUARES = Size(key="ohm_per_square", count=25.0)
GIVEN = {"source": "invented sweeps, chamber 2", "label": "Red film"}


def red_film(correlation=-0.9):
    return population(
        *lots_of(
            21,
            (4, 4, 3, 4, 4, 4, 4),
            (0.03, 6e-6, 0.02e-6),
            (0.01, 3e-6, 0.01e-6),
            (0.0005, 0.5e-6, 0.002e-6),
            correlation=correlation,
            middle=(8000.0, -120e-6, 0.55e-6),
        )
    )


def read_back(text, name="red_film"):
    return parse_materials(tomllib.loads(text)["material"], "block")[name]


def assert_same(read, made):
    assert (read.label, read.source, read.kind) == (made.label, made.source, made.kind)
    assert type(read.law) is type(made.law)
    T = np.linspace(made.valid[0], made.valid[1], 7)
    assert read.law.ratio(T) == pytest.approx(made.law.ratio(T), rel=1e-12)
    assert read.reference == pytest.approx(made.reference, abs=1e-9)
    assert read.valid == pytest.approx(made.valid, abs=1e-9)
    for key in ("ohm_per_square", "ohm_per_metre"):
        assert getattr(read, key) == (
            None if getattr(made, key) is None else pytest.approx(getattr(made, key), rel=1e-12)
        )
    for key in ("value", "tc1", "tc2"):
        mine, other = (None if m.spread is None else getattr(m.spread, key) for m in (read, made))
        assert mine == (None if other is None else pytest.approx(other, rel=1e-12))


@pytest.mark.parametrize("meaning", ["limits", "sigma"])
@pytest.mark.parametrize("size", [None, SQUARES, Size(key="ohm_per_metre", count=2.5)])
def test_a_block_reads_back(meaning, size):
    found = red_film()
    given = {**GIVEN, "size": size, "meaning": meaning}
    text, made = material_block("red_film", found, **given), material_of("red_film", found, **given)
    read = read_back(text)
    assert_same(read, made)
    assert read.spread.meaning == meaning
    assert read.spread.shape == "normal"
    # Rounding: values by less than their uncertainty shows, half-widths outward in three digits.
    for k, name in ((1, "tc1"), (2, "tc2")):
        assert abs(read.law.coefficients[k - 1] - found.values[k]) <= 0.05 * found.uncertainties[k]
        exact = getattr(found.spread(meaning), name)
        assert exact * (1 - 1e-9) <= getattr(read.spread, name) <= 1.01 * exact
    if size is not None:
        own = getattr(read, size.key) * size.count
        assert abs(own - found.ohms) <= 0.05 * found.uncertainties[0] + 1e-9


def test_what_it_rests_on_is_said():
    text = material_block("red_film", red_film(), size=SQUARES, **GIVEN)
    comments = [line for line in text.splitlines() if line.startswith("#")]
    assert max(map(len, comments)) <= 100
    whole = "\n".join(comments).replace("\n#   ", " ").splitlines()
    assert whole[0] == (
        "# 27 devices of 7 lots (4, 4, 3, 4, 4, 4, 4), every one read from -40 degC to 125 degC; "
        f"mean R {red_film().ohms / 1000:.4g} kohm."
    )
    assert whole[1] == "# Limits hold 99.73 % of all devices with 95 % confidence (tolerance intervals)."
    assert [line.split(":")[0] for line in whole[3:6]] == ["# R", "# TC1", "# TC2"]
    for word in ("devices ", "lots ", "together "):
        assert word in whole[4]
    assert "# Half-widths are standard deviations" in material_block(
        "red_film", red_film(), meaning="sigma", **GIVEN
    )


def test_one_lot_is_said():
    fits = [fit_of(1000.0 + k, (1e-4 + k * 1e-6, 0.0)) for k in range(6)]
    text = material_block("red_film", population(fits, [""] * 6, list("abcdef")), **GIVEN)
    assert "all devices of such a lot" in text
    assert "# One lot: nothing is known of how lots differ" in text
    assert read_back(text).spread.tc1 > 0.0


def test_one_device_has_no_spread():
    text = material_block("red_film", population([fit_of(1e3, (1e-4, 0.0))], ("",), ("",)), **GIVEN)
    assert read_back(text).spread is None
    assert "# One device: nothing is known" in text


def test_readings_near_a_tenth_of_a_degree():
    found = population([fit_of(1e3, (1e-4,), low=233.18, high=398.12)], ("",), ("",))
    assert read_back(material_block("red_film", found, **GIVEN)).valid == pytest.approx((233.15, 398.15))


LAWS = (
    (Platinum(reference=273.15), ("R",), ()),
    (Thermistor(reference=298.15, beta=3435.123456789), ("R", "beta"), (3435.123456789,)),
    (
        SteinhartHart(reference=298.15, a=2.1085e-3, b=0.7979e-4, c=6.535e-7),
        ("R", "a", "b", "c"),
        (2.1085e-3, 0.7979e-4, 6.535e-7),
    ),
    (
        Expression(reference=300.0, text="exp(A*(T - T0))", constants=(("A", 1.23456789e-3),), origin=290.0),
        ("R", "A"),
        (1.23456789e-3,),
    ),
    (Expression(reference=300.0, text="1 + 0.001*(T - T0)"), ("R",), ()),
)


@pytest.mark.parametrize(("law", "names", "values"), LAWS)
def test_every_law_reads_back(law, names, values):
    fits = [law_fit(law, 1e4 * (1 + 0.001 * k), names, values) for k in range(4)]
    found = population(fits, [""] * 4, list("abcd"))
    assert_same(
        read_back(material_block("red_film", found, **GIVEN)), material_of("red_film", found, **GIVEN)
    )


def test_a_law_that_the_file_has_no_form_for():
    found = population([fit_of(1e3, (1e-4, 1e-7, 1e-10, 1e-13))], ("",), ("",))
    with pytest.raises(InputError, match="no form for"):
        material_block("red_film", found, **GIVEN)


# ---- hostile text


def test_quotes_and_backslashes_stay_inside():
    label = 'a "quoted" label \\ # ] = [material.x] \U0001f321'
    text = material_block("red_film", red_film(), source='say "so"\\', label=label)
    assert list(tomllib.loads(text)["material"]) == ["red_film"]
    assert (read_back(text).label, read_back(text).source) == (label, 'say "so"\\')


@pytest.mark.parametrize("label", ["two\nlines", 'x"\n[material.y]', "\x1b[31m", "", "a\x00"])
def test_labels_that_no_file_may_hold(label):
    with pytest.raises(InputError, match=r"material\.red_film\.label"):
        material_block("red_film", red_film(), source="invented", label=label)


def test_names_that_no_file_may_hold():
    with pytest.raises(InputError, match="the material name"):
        material_block("x]\n[material.y", red_film(), source="invented", label="x")
    with pytest.raises(InputError, match="the name of a material"):
        tracking_block(('a"', "b"), ())


@given(st.text(st.characters(exclude_categories=["Cs"]), max_size=40))
def test_any_text_is_one_value_of_toml(text):
    assert tomllib.loads(f"x = {toml_text(text)}") == {"x": text}


def test_half_a_character_is_replaced():
    assert tomllib.loads(f"x = {toml_text(chr(0xD800))}") == {"x": "\ufffd"}


# ---- rounding


@pytest.mark.parametrize(
    ("value", "uncertainty", "expected"),
    [
        # The rule of JCGM 100 7.2.6: an uncertainty in two digits, its value to the same place.
        (-120.3456, 0.123, -120.35),
        (-120.3456, 12.3, -120.0),
        (123456.0, 4567.0, 123500.0),
        (0.004, 5.0, 0.0),
        (1.23456789, 0.0, 1.23456789),
        (1.0 / 3.0, 1e-20, 1.0 / 3.0),
    ],
)
def test_values_end_where_their_uncertainty_does(value, uncertainty, expected):
    assert rounded(value, uncertainty) == expected


# ---- what materials share


def test_a_whole_file_and_a_brief(tmp_path):
    found = red_film()
    lots = lots_of(22, (4,) * 6, (0.03, 6e-6, 0.0), (0.01, 3e-6, 0.0))
    blue = population(*lots)
    names = [f"{lot}/{device}" for lot, device in zip(*lots[1:], strict=True)]
    first = dict(zip(names, lots[0], strict=True))
    second = {
        name: fit_of(5e3, (fit.values[1] + 3e-4 + k % 5 * 1e-6, 0.0))
        for k, (name, fit) in enumerate(first.items())
    }
    green = population(list(second.values()), *lots[1:])
    tracked = tracking_of(first, second, dict(zip(names, lots[1], strict=True)))
    blocks = (
        material_block("red_film", found, size=SQUARES, **GIVEN),
        material_block("blue_film", blue, source="invented", size=SQUARES),
        material_block("green_film", green, source="invented", size=SQUARES),
        correlation_block("red_film", found, size=SQUARES),
        tracking_block(("blue_film", "green_film"), (tracked,)),
    )
    path = tmp_path / "films.toml"
    path.write_text("schema = 1\n" + "\n".join(blocks), encoding="utf-8")
    read = read_material_file(path)
    assert list(read.materials) == ["red_film", "blue_film", "green_film"]
    assert list(read.tables) == ["correlation", "tracking"]
    header, goal = BRIEF.split("[resistor]")
    process = brief(f'{header}materials = ["films.toml"]\n[resistor]{goal}', tmp_path).process
    (one,), (tracking,) = process.correlations, process.trackings
    assert {(p.material, p.component) for p in (one.first, one.second)} == {
        ("red_film", "value"),
        ("red_film", "tc1"),
    }
    assert one.value == pytest.approx(found.correlation.value, abs=0.005)
    assert tracking.materials == ("blue_film", "green_film")
    assert tracked.half_width * (1 - 1e-9) <= tracking.within <= 1.01 * tracked.half_width


BRIEF = """
schema = 1
title = "Made of what was measured"
[resistor]
value = "18 kohm"
[temperature]
low = "-40 degC"
high = "125 degC"
[goal]
drift = "20000 ppm"
"""


def test_a_correlation_that_is_not_shown_is_a_comment():
    for found in (red_film(correlation=0.0), population([fit_of(1e3, (1e-4, 0.0))], ("",), ("",))):
        text = correlation_block("red_film", found)
        assert text.startswith("# No correlation of red_film.value with red_film.tc1")
        assert tomllib.loads(text) == {}


def test_the_widest_pair_of_three_materials_counts():
    def fits(own):
        return {f"d{k}": fit_of(1e3, (a, 0.0)) for k, a in enumerate(own)}

    a, b, c = fits((0.0, 1e-6, 2e-6)), fits((0.0, 2e-6, 1e-6)), fits((0.0, 9e-6, 1e-6))
    pairs = [tracking_of(a, b), tracking_of(a, c), tracking_of(b, c)]
    table = tomllib.loads(tracking_block(("a", "b", "c"), pairs))["tracking"][0]
    assert table["materials"] == ["a", "b", "c"]
    within = float(table["within"].removesuffix(" ppm/K")) * 1e-6
    assert within == pytest.approx(max(pair.half_width for pair in pairs), rel=0.01)
    assert "how lots differ is not in it" in tracking_block(("a", "b", "c"), pairs)
    with pytest.raises(InternalError):
        tracking_block(("a", "b", "c"), pairs[:2])


def test_no_difference_is_a_comment():
    fits = {f"d{k}": fit_of(1e3, (1e-4, 0.0)) for k in range(3)}
    text = tracking_block(("a", "b"), (tracking_of(fits, fits),))
    assert text.startswith("# No tracking of a, b")
    assert tomllib.loads(text) == {}


def test_one_material_tracks_nothing():
    with pytest.raises(InputError, match="two or more"):
        tracking_block(("a", "a"), ())


@pytest.mark.parametrize("count", [0.0, -1.0, float("nan"), float("inf")])
def test_squares_and_lengths_are_above_zero(count):
    with pytest.raises(InputError, match="length"):
        Size(key="ohm_per_metre", count=count)
