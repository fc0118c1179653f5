"""Materials files: every form of law, every refusal with its place, and several mistakes at once."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tcplan.errors import InputError
from tcplan.material.files import (
    _ProcessShape,
    parse_materials,
    published,
    published_names,
    read_material_file,
    read_materials,
)
from tcplan.material.law import Expression, Platinum, Polynomial, Thermistor
from tcplan.material.model import Material, material_from_dict
from tcplan.material.spread import Spread
from tcplan.toml_input import MAX_BYTES, read_toml, read_toml_text

RED_FILM = """
schema = 1
[material.red_film]
label = "Red film, 320 ohm per square"
source = "process table, rev C"
reference = "27 degC"
valid = ["-55 degC", "150 degC"]
tc1 = "-120 ppm/K"
tc2 = "0.55 ppm/K^2"
ohm_per_square = "320 ohm"
[material.red_film.spread]
meaning = "limits"
ohm_per_square = "15 %"
tc1 = "40 ppm/K"
tc2 = "0.1 ppm/K^2"
[material.red_film.film]
min_width = "1 um"
width_bias = "0.05 um"
end_resistance = "35 ohm*um"
end_tc1 = "-900 ppm/K"
matching = "1.2 %*um"
spacing = "0.6 um"
grid = "5 nm"
max_current = "0.6 mA/um"
"""
HEAD = """
schema = 1
[material.m]
source = "invented"
reference = "25 degC"
valid = ["-40 degC", "125 degC"]
"""


def read(tmp_path: Path, text: str | bytes) -> dict[str, Material]:
    path = tmp_path / "films.toml"
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return read_materials(path)


def one(tmp_path: Path, body: str) -> Material:
    return read(tmp_path, HEAD + body)["m"]


def refused(tmp_path: Path, text: str | bytes) -> list[tuple[str, str]]:
    """Return (place inside the file, whole message) of each mistake."""
    with pytest.raises(InputError) as caught:
        read(tmp_path, text)
    file = str(tmp_path / "films.toml")
    for problem in caught.value.problems:
        assert problem.where.startswith(file)
        assert problem.found
        assert problem.expected
        message = str(problem)
        assert "\n" not in message
        assert "pydantic" not in message
        assert "http" not in message
    return [(p.where.removeprefix(file).removeprefix(": "), str(p)) for p in caught.value.problems]


def only(tmp_path: Path, body: str) -> tuple[str, str]:
    found = refused(tmp_path, HEAD + body)
    assert len(found) == 1, found
    return found[0]


def test_a_film_is_read_into_si(tmp_path: Path) -> None:
    material = read(tmp_path, RED_FILM)["red_film"]
    assert material.kind == "film"
    assert material.law == Polynomial(reference=300.15, coefficients=(-120e-6, 0.55e-6))
    assert material.valid == (218.15, 423.15)
    assert material.ohm_per_square == 320.0
    assert material.spread == Spread(meaning="limits", value=0.15, tc1=40e-6, tc2=0.1e-6)
    assert material.film is not None
    assert material.film.end_resistance == pytest.approx(35e-6, rel=1e-15)
    assert material.film.matching == pytest.approx(1.2e-8, rel=1e-15)
    assert material.film.max_current == pytest.approx(600.0, rel=1e-15)
    assert material.film.preferred_width is None
    assert material_from_dict(material.to_dict()) == material


def test_the_label_defaults_to_the_name(tmp_path: Path) -> None:
    assert one(tmp_path, 'tc1 = "0 ppm/K"').label == "m"


def test_order_and_names_are_kept(tmp_path: Path) -> None:
    second = HEAD.replace("schema = 1", "").replace("material.m", "material.a")
    assert list(read(tmp_path, f'{HEAD}tc1 = "1 ppm/K"{second}tc1 = "2 ppm/K"')) == ["m", "a"]


# ---- the forms of law


def test_one_two_or_three_coefficients(tmp_path: Path) -> None:
    assert one(tmp_path, 'tc1 = "80 ppm/K"').law == Polynomial(reference=298.15, coefficients=(80e-6,))
    law = one(tmp_path, 'tc1 = "80 ppm/K"\ntc3 = "0.001 ppm/K^3"').law
    assert law == Polynomial(reference=298.15, coefficients=(80e-6, 0.0, 1e-9))


def test_two_chords_give_the_quadratic_through_both(tmp_path: Path) -> None:
    law = one(
        tmp_path, 'cold = "-55 degC"\ncold_tcr = "-40 ppm/K"\nhot = "125 degC"\nhot_tcr = "25 ppm/K"'
    ).law
    # Definition of the chord TCR: [R(T)/R(T_ref) - 1]/(T - T_ref).
    assert float(law.ratio(218.15)) == pytest.approx(1.0 - 40e-6 * (218.15 - 298.15), rel=1e-14)
    assert float(law.ratio(398.15)) == pytest.approx(1.0 + 25e-6 * 100.0, rel=1e-14)


def test_peak_form(tmp_path: Path) -> None:
    law = one(tmp_path, 'peak = "45 degC"\ntc2 = "-0.04 ppm/K^2"').law
    assert float(law.slope(318.15)) == pytest.approx(0.0, abs=1e-18)
    assert float(law.ratio(298.15)) == 1.0


def test_named_laws(tmp_path: Path) -> None:
    assert one(tmp_path, 'law = "platinum"').law == Platinum(reference=298.15)
    assert one(tmp_path, 'law = "thermistor"\nbeta = "3435 K"').law == Thermistor(
        reference=298.15, beta=3435.0
    )


def test_thermistor_values(tmp_path: Path) -> None:
    # IEC 60539-1 formula, 10 kohm at 25 degC, B 3435.
    law = one(tmp_path, 'law = "thermistor"\nbeta = "3435 K"').law
    expected = [28704.29, 4101.19, 1451.35, 987.04, 553.74]
    at = np.array([0.0, 50.0, 85.0, 100.0, 125.0]) + 273.15
    np.testing.assert_allclose(1e4 * law.ratio(at), expected, rtol=1e-5)


@pytest.mark.parametrize(
    "body",
    [
        "a = 2.108508173e-3\nb = 0.7979204727e-4\nc = 6.535076315e-7",
        'points = [["5 degC", "25 kohm"], ["25 degC", "10k"], ["45 degC", "4000 ohm"]]',
    ],
)
def test_steinhart_hart_by_constants_and_by_points(tmp_path: Path, body: str) -> None:
    # Constants published widely, of (5 degC, 25000), (25, 10000), (45, 4000).
    law = one(tmp_path, 'law = "steinhart-hart"\n' + body).law
    np.testing.assert_allclose(1e4 * law.ratio(np.array([278.15, 318.15])), [25000.0, 4000.0], rtol=1e-6)


def test_table_counts_only_the_ratios(tmp_path: Path) -> None:
    laws = [
        one(
            tmp_path,
            'law = "table"\n'
            f'points = [["-40 degC", "9.86 {u}ohm"], ["25 degC", "10 {u}ohm"], ["125 degC", "11 {u}ohm"]]',
        ).law
        for u in ("k", "")
    ]
    at = np.array([233.15, 298.15, 398.15])
    np.testing.assert_allclose(laws[0].ratio(at), [0.986, 1.0, 1.1], rtol=1e-12)
    np.testing.assert_allclose(laws[0].ratio(at), laws[1].ratio(at), rtol=1e-12)


def test_expression_with_its_numbers(tmp_path: Path) -> None:
    material = one(tmp_path, 'law = "exp(B*(1/T - 1/T0))"\n[material.m.law_parameters]\nB = 3435')
    assert isinstance(material.law, Expression)
    at = np.array([273.15, 350.0])
    expected = [math.exp(3435.0 * (1 / t - 1 / 298.15)) for t in at]
    np.testing.assert_allclose(material.law.ratio(at), expected, rtol=1e-12)
    assert material_from_dict(material.to_dict()) == material


def test_wire_part_and_plain(tmp_path: Path) -> None:
    wire = one(
        tmp_path,
        'tc1 = "0 ppm/K"\nohm_per_metre = "8.5 ohm/m"\n'
        '[material.m.spread]\nmeaning = "sigma"\nohm_per_metre = "2 %"',
    )
    part = one(
        tmp_path, 'tc1 = "0 ppm/K"\nseries = "E96"\n[material.m.spread]\nmeaning = "limits"\nvalue = "1 %"'
    )
    plain = one(tmp_path, 'tc1 = "0 ppm/K"')
    assert (wire.kind, wire.ohm_per_metre) == ("wire", 8.5)
    assert wire.spread == Spread(meaning="sigma", value=0.02)
    rectangular = Spread(meaning="limits", value=0.01, shape="rectangular")
    assert (part.kind, part.series, part.spread) == ("part", "E96", rectangular)
    assert (plain.kind, plain.spread) == ("plain", None)


def test_extrapolation(tmp_path: Path) -> None:
    material = one(
        tmp_path,
        'tc1 = "0 ppm/K"\nextrapolate_to = ["-55 degC", "175 degC"]\n'
        '[material.m.extrapolation]\ntc1 = "20 ppm/K"',
    )
    assert material.usable == (218.15, 448.15)
    assert material.extrapolation == Spread(meaning="limits", tc1=20e-6)


def test_inline_materials_of_a_brief() -> None:
    table: dict[str, Any] = {
        "source": "invented",
        "reference": "25 degC",
        "valid": ["0 degC", "70 degC"],
        "tc1": "5 ppm/K",
    }
    assert parse_materials({"a": table}, "brief.toml")["a"].valid == (273.15, 343.15)
    with pytest.raises(InputError, match=r"^brief\.toml: material\.a\.tc1: "):
        parse_materials({"a": {**table, "tc1": "5 ppm"}}, "brief.toml")


# ---- refusals: the file


def test_missing_file_names_the_nearest(tmp_path: Path) -> None:
    (tmp_path / "films.toml").write_text(RED_FILM)
    with pytest.raises(InputError, match=r"no such file.*films\.toml"):
        read_materials(tmp_path / "film.toml")


def test_folder(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="a folder"):
        read_materials(tmp_path)


def test_device() -> None:
    if not Path("/dev/null").exists():
        pytest.fail("no device to test with")
    with pytest.raises(InputError, match="a device or pipe"):
        read_materials(Path("/dev/null"))


def test_impossible_path() -> None:
    for name in ("a\0b.toml", "x" * 5000):
        with pytest.raises(InputError):
            read_materials(Path(name))


@pytest.mark.parametrize("content", ["", " \n\n", "\ufeff"])
def test_empty(tmp_path: Path, content: str) -> None:
    assert "an empty file" in refused(tmp_path, content)[0][1]


def test_only_comments_is_told_as_missing(tmp_path: Path) -> None:
    assert [place for place, _ in refused(tmp_path, "# nothing\n")] == ["schema", "material"]


@pytest.mark.parametrize("content", [b"\x89PNG\r\n\x1a\n\x00\xff", b"schema = 1\0", b"PK\x03\x04\xfe"])
def test_binary(tmp_path: Path, content: bytes) -> None:
    message = refused(tmp_path, content)[0][1]
    assert "binary" in message or "not UTF-8" in message


def test_ten_megabytes_are_refused_without_reading_them(tmp_path: Path) -> None:
    path = tmp_path / "films.toml"
    with path.open("wb") as stream:
        stream.truncate(10_000_000)
    with pytest.raises(InputError, match="10000000 bytes"):
        read_materials(path)
    with pytest.raises(InputError, match="characters"):
        read_toml_text("#" * (MAX_BYTES + 1), "standard input")


def test_not_toml_names_line_and_column(tmp_path: Path) -> None:
    place, message = refused(tmp_path, "schema = 1\n[material.m]\ntc1 = -120 ppm/K\n")[0]
    assert place.startswith(", line 3, column ")
    assert "not TOML" in message


def test_unfinished_toml(tmp_path: Path) -> None:
    place, message = refused(tmp_path, 'schema = 1\nx = "')[0]
    assert "line" in place or "end of file" in place
    assert "not TOML" in message


@pytest.mark.parametrize("text", [HEAD + 'tc1 = "1 ppm/K"\n[material.m]\n', HEAD + 'source = "again"\n'])
def test_duplicates(tmp_path: Path, text: str) -> None:
    assert "a second time" in refused(tmp_path, text)[0][1]


@pytest.mark.parametrize(
    "text", ["x = " + "[" * 20000 + "]" * 20000, "x = " + "[" * 50 + "]" * 50, "a." * 3000 + "b = 1"]
)
def test_deep_nesting(tmp_path: Path, text: str) -> None:
    assert "nested too deeply" in refused(tmp_path, text)[0][1]


def test_huge_numbers(tmp_path: Path) -> None:
    assert refused(tmp_path, "schema = " + "9" * 10000)
    assert refused(tmp_path, "schema = " + "9" * 300)[0][0] == "schema"


def test_byte_order_mark_is_accepted(tmp_path: Path) -> None:
    assert "red_film" in read(tmp_path, b"\xef\xbb\xbf" + RED_FILM.encode())


def test_windows_line_ends_are_accepted(tmp_path: Path) -> None:
    assert "red_film" in read(tmp_path, RED_FILM.replace("\n", "\r\n"))


def test_read_toml_returns_plain_data(tmp_path: Path) -> None:
    path = tmp_path / "x.toml"
    path.write_text('schema = 1\n[a]\nb = "c"\n')
    assert read_toml(path) == {"schema": 1, "a": {"b": "c"}}


@pytest.mark.parametrize("schema", ["2", '"1"', "true", "1.0", "nan"])
def test_other_schemas(tmp_path: Path, schema: str) -> None:
    text = (HEAD + 'tc1 = "1 ppm/K"').replace("schema = 1", f"schema = {schema}")
    assert [place for place, _ in refused(tmp_path, text)] == ["schema"]


def test_unknown_table(tmp_path: Path) -> None:
    place, message = refused(tmp_path, HEAD + 'tc1 = "1 ppm/K"\n[materials.b]\nx = 1')[0]
    assert place == "materials"
    assert "Did you mean material?" in message


# ---- refusals: one material


def test_unknown_key_with_the_nearest(tmp_path: Path) -> None:
    place, message = only(tmp_path, 'tc1 = "1 ppm/K"\nohm_per_sqare = "320 ohm"')
    assert place == "material.m.ohm_per_sqare"
    assert "Did you mean ohm_per_square?" in message


@pytest.mark.parametrize(
    ("body", "place"),
    [
        ('tc1 = "1 ppm"', "tc1"),
        ('tc1 = "nan ppm/K"', "tc1"),
        ('tc1 = "inf ppm/K"', "tc1"),
        ('tc1 = "1e999 ppm/K"', "tc1"),
        ('tc1 = "1"', "tc1"),
        ('tc1 = ""', "tc1"),
        ("tc1 = 120", "tc1"),
        ("tc1 = nan", "tc1"),
        ("tc1 = true", "tc1"),
        ("tc1 = 1979-05-27", "tc1"),
        ("tc1 = {a = 1}", "tc1"),
        ('tc1 = ["1 ppm/K"]', "tc1"),
        ('tc1 = "1 ppm/K"\nohm_per_square = "320 K"', "ohm_per_square"),
        ('tc1 = "1 ppm/K"\nohm_per_square = "0 ohm"', "ohm_per_square"),
        ('tc1 = "1 ppm/K"\nseries = "E95"', "series"),
        ('tc1 = "1 ppm/K"\nlabel = "two\\nlines"', "label"),
        ('tc1 = "1 ppm/K"\nlabel = ""', "label"),
        ('tc1 = "1 ppm/K"\nspread = "15 %"', "spread"),
        ('tc1 = "1 ppm/K"\n[material.m.spread]\ntc1 = "1 ppm/K"', "spread.meaning"),
        ('tc1 = "1 ppm/K"\n[material.m.spread]\nmeaning = "limit"', "spread.meaning"),
        ('tc1 = "1 ppm/K"\n[material.m.spread]\nmeaning = "limits"\ntc1 = "-5 ppm/K"', "spread.tc1"),
        ('tc1 = "1 ppm/K"\n[material.m.spread]\nmeaning = "limits"\nvalue = "120 %"', "spread.value"),
        ('tc1 = "1 ppm/K"\n[material.m.spread]\nmeaning = "limits"\nvalue = "5 ohm"', "spread.value"),
        ('tc1 = "1 ppm/K"\nextrapolate_to = ["-55 degC", "175 degC"]', "extrapolation"),
        ('tc1 = "1 ppm/K"\n[material.m.extrapolation]\ntc1 = "5 ppm/K"', "extrapolate_to"),
        ('tc1 = "1 ppm/K"\n[material.m.film]\nmin_width = "1 um"', "film"),
        ('tc1 = "1 ppm/K"\nohm_per_square = "1 ohm"\n[material.m.film]\ngrid = "5 nm"', "film.min_width"),
        (
            'tc1 = "1 ppm/K"\nohm_per_square = "1 ohm"\n[material.m.film]\nmin_width = "0 um"',
            "film.min_width",
        ),
        ('peak = "1e300 K"\ntc2 = "1 ppm/K^2"', "peak"),
        (
            'law = "table"\npoints = [["0 degC", "1 ohm"], ["25 degC", "1 ohm"], ["1e300 K", "2 ohm"]]',
            "points[3]",
        ),
        ('law = "thermistor"', "beta"),
        ('law = "thermistor"\nbeta = "-5 K"', "beta"),
        ('law = "steinhart-hart"\na = 1e-3\nb = 2e-4\nc = nan', "c"),
        ('law = "exp(B*T)"\n[material.m.law_parameters]\nB = 1' + "0" * 400, "law_parameters.B"),
        ('law = "steinhart-hart"\na = 1e-3\nb = 1.7e308\nc = -1.0', "c"),
        ('law = "table"\npoints = [["0 degC", "1 ohm"], ["25 degC"], ["50 degC", "2 ohm"]]', "points[2]"),
        (
            'law = "table"\npoints = [["0 degC", "1 ohm"], ["25 degC", "0 ohm"], ["50 degC", "2 ohm"]]',
            "point 2",
        ),
        ('law = "exp(B*T)"\n[material.m.law_parameters]\nB = "3"', "law_parameters.B"),
        ("law = \"__import__('os')\"", "law"),
        ('law = "exp("', "law"),
        ('law = ""', "law"),
    ],
)
def test_each_mistake_is_told_at_its_place(tmp_path: Path, body: str, place: str) -> None:
    assert only(tmp_path, body)[0] == f"material.m.{place}"


def test_a_bare_number_is_told_to_need_a_unit(tmp_path: Path) -> None:
    _, message = only(tmp_path, "tc1 = 120")
    assert "the number 120" in message
    assert '"-120 ppm/K"' in message


@pytest.mark.parametrize(
    ("missing", "place"), [("source", "source"), ("reference", "reference"), ("valid", "valid")]
)
def test_required_keys(tmp_path: Path, missing: str, place: str) -> None:
    text = "\n".join(line for line in HEAD.splitlines() if not line.startswith(missing)) + '\ntc1 = "1 ppm/K"'
    found = refused(tmp_path, text)
    assert [where for where, _ in found] == [f"material.m.{place}"]
    assert "found nothing" in found[0][1]


def test_an_empty_source_is_no_source(tmp_path: Path) -> None:
    text = (HEAD + 'tc1 = "1 ppm/K"').replace('"invented"', '" "')
    assert [where for where, _ in refused(tmp_path, text)] == ["material.m.source"]


@pytest.mark.parametrize(
    "valid",
    ['["125 degC", "-40 degC"]', '["-300 degC", "25 degC"]', '["25 degC"]', '"25 degC"', '["0", "1 K"]'],
)
def test_wrong_ranges(tmp_path: Path, valid: str) -> None:
    text = (HEAD + 'tc1 = "1 ppm/K"').replace('["-40 degC", "125 degC"]', valid)
    assert [where for where, _ in refused(tmp_path, text)] == ["material.m.valid"]


@pytest.mark.parametrize("tc1", ["-10000 ppm/K", "-50000 ppm/K", "20000 ppm/K"])
def test_a_law_that_reaches_zero_in_its_range(tmp_path: Path, tc1: str) -> None:
    place, message = only(tmp_path, f'tc1 = "{tc1}"')
    assert place == "material.m"
    assert "reaches zero" in message


@pytest.mark.parametrize(
    "name", [r"a\nb", "a,b", r"a\"b", "a=b", "<script>", "a b", "", "9a", "'", "x" * 41, r"\u001b[2J", "=1+1"]
)
def test_names_that_could_do_harm(tmp_path: Path, name: str) -> None:
    text = (HEAD + 'tc1 = "1 ppm/K"').replace("[material.m]", f'[material."{name}"]')
    found = refused(tmp_path, text)
    assert len(found) == 1
    assert "the material name" in found[0][1]
    assert found[0][1].isprintable()


@pytest.mark.parametrize(
    ("text", "near"),
    [
        ("platnum", "platinum"),
        ("Thermistor", "thermistor"),
        ("steinhart-heart", "steinhart-hart"),
        ("tabel", "table"),
    ],
)
def test_a_misspelt_law_is_suggested(tmp_path: Path, text: str, near: str) -> None:
    assert f"Did you mean {near}?" in only(tmp_path, f'law = "{text}"')[1]


@pytest.mark.parametrize(
    "body",
    [
        'tc1 = "1 ppm/K"\nlaw = "platinum"',
        'tc1 = "1 ppm/K"\npeak = "45 degC"\ntc2 = "-0.04 ppm/K^2"',
        'cold_tcr = "1 ppm/K"\npeak = "45 degC"',
        "",
    ],
)
def test_exactly_one_form_of_law(tmp_path: Path, body: str) -> None:
    assert "exactly one of" in only(tmp_path, body)[1]


@pytest.mark.parametrize(
    ("body", "place"),
    [
        ('tc1 = "1 ppm/K"\nbeta = "3 K"', "beta"),
        ('law = "platinum"\ntc2 = "1 ppm/K^2"', "tc2"),
        ('law = "thermistor"\nbeta = "3435 K"\na = 1.0', "a"),
        ('peak = "45 degC"', "tc2"),
        ('tc2 = "1 ppm/K^2"', "tc1"),
        ('cold = "0 degC"\ncold_tcr = "1 ppm/K"\nhot = "60 degC"', "hot_tcr"),
        ('law = "exp(2*T/T0)"\npoints = []', "points"),
    ],
)
def test_the_keys_of_one_form(tmp_path: Path, body: str, place: str) -> None:
    assert only(tmp_path, body)[0] == f"material.m.{place}"


@pytest.mark.parametrize(
    ("size", "wrong", "right"),
    [
        ('ohm_per_metre = "8 ohm/m"', "ohm_per_square", "ohm_per_metre"),
        ('ohm_per_square = "8 ohm"', "value", "ohm_per_square"),
        ('series = "E24"', "ohm_per_metre", "value"),
        ("", "ohm_per_square", "value"),
    ],
)
def test_the_spread_of_the_size_has_the_key_of_the_kind(
    tmp_path: Path, size: str, wrong: str, right: str
) -> None:
    body = f'tc1 = "1 ppm/K"\n{size}\n[material.m.spread]\nmeaning = "limits"\n{wrong} = "5 %"'
    place, message = only(tmp_path, body)
    assert place == f"material.m.spread.{wrong}"
    assert f"Write {right} instead." in message


def test_a_half_width_that_is_too_wide_is_told_at_the_key_of_the_file(tmp_path: Path) -> None:
    body = 'tc1 = "1 ppm/K"\nohm_per_square = "8 ohm"\n[material.m.spread]\nmeaning = "limits"\n'
    assert only(tmp_path, body + 'ohm_per_square = "120 %"')[0] == "material.m.spread.ohm_per_square"


def test_two_sizes(tmp_path: Path) -> None:
    assert only(tmp_path, 'tc1 = "1 ppm/K"\nseries = "E24"\nohm_per_metre = "8 ohm/m"')[0] == "material.m"


def test_a_material_that_is_no_table(tmp_path: Path) -> None:
    found = refused(tmp_path, "schema = 1\n[material]\nm = 3\n")
    assert found[0][0] == "material.m"
    assert "a table" in found[0][1]


def test_every_mistake_of_every_material_is_told_in_one_error(tmp_path: Path) -> None:
    text = (
        RED_FILM.replace('"-120 ppm/K"', '"-120 ppm"', 1)
        .replace('"15 %"', '"15 ohm"')
        .replace("grid =", "gird =")
    )
    text += """
[material.b]
reference = "25 degC"
valid = ["150 degC", "-55 degC"]
law = "platnum"
[material."c,d"]
source = "invented"
reference = "25 degC"
valid = ["0 degC", "500 degC"]
tc1 = "-6000 ppm/K"
[extra]
"""
    places = [place for place, _ in refused(tmp_path, text)]
    assert sorted(places) == sorted(
        [
            "extra",
            "material.red_film.tc1",
            "material.red_film.spread.ohm_per_square",
            "material.red_film.film.gird",
            "material.b.source",
            "material.b.valid",
            "material.b.law",
            "material.'c,d'",
            "material.'c,d'",
        ]
    )


def test_unknown_published_file() -> None:
    assert published_names() == ("alloys", "metals")
    with pytest.raises(InputError, match="Did you mean published:metals"):
        published("metal")
    with pytest.raises(InputError, match="no such published file"):
        published("../files")


# ---- spreads of ends, widths and bought parts; what materials share

PART = 'tc1 = "0 ppm/K"\nseries = "E96"\n[material.m.spread]\nmeaning = "limits"\n'
WIRE = 'tc1 = "0 ppm/K"\nohm_per_metre = "8.5 ohm/m"\n[material.m.spread]\n'
FILM_SPREAD = 'tc1 = "0 ppm/K"\nohm_per_square = "320 ohm"\n[material.m.spread]\nmeaning = "limits"\n'
FILM_TABLE = '[material.m.film]\nmin_width = "1 um"\nend_resistance = "35 ohm*um"\netch = "poly"\n'


def test_every_half_width_of_a_film_is_read_into_si(tmp_path: Path) -> None:
    body = 'end_resistance = "40 %"\nend_tc1 = "200 ppm/K"\nwidth_bias = "0.02 um"\n'
    made = one(tmp_path, FILM_SPREAD + body + FILM_TABLE)
    assert made.spread == Spread(meaning="limits", end_resistance=0.4, end_tc1=200e-6, width_bias=0.02e-6)
    assert made.film is not None
    assert made.film.etch == "poly"
    assert material_from_dict(made.to_dict()) == made


def test_a_tcr_limit_is_read_in_a_part(tmp_path: Path) -> None:
    made = one(tmp_path, PART + 'value = "0.1 %"\ntcr = "25 ppm/K"\n')
    assert made.spread == Spread(meaning="limits", value=0.001, tcr=25e-6, shape="rectangular")


@pytest.mark.parametrize(
    ("body", "shape"),
    [
        (PART, "rectangular"),
        (PART + 'shape = "normal"', "normal"),
        (WIRE + 'meaning = "limits"', "rectangular"),
        (WIRE + 'meaning = "sigma"', "normal"),
        (FILM_SPREAD, "normal"),
        (FILM_SPREAD + 'shape = "rectangular"', "rectangular"),
        ('tc1 = "0 ppm/K"\n[material.m.spread]\nmeaning = "limits"', "normal"),
    ],
)
def test_what_is_bought_is_rectangular_unless_its_sigma_is_stated(
    tmp_path: Path, body: str, shape: str
) -> None:
    spread = one(tmp_path, body).spread
    assert spread is not None
    assert spread.shape == shape


@pytest.mark.parametrize(
    ("body", "where", "says"),
    [
        (PART + 'tcr = "25 ppm/K"\ntc1 = "5 ppm/K"', "spread.tc1", "tcr and tc1 together"),
        (PART + 'tcr = "25 ppm/K"\ntc2 = "0.1 ppm/K^2"', "spread.tc2", "tcr and tc2 together"),
        (PART + 'tcr = "-25 ppm/K"', "spread.tcr", "zero or more"),
        (PART + 'width_bias = "0.1 um"', "spread.width_bias", "no widths"),
        (FILM_SPREAD + 'tcr = "25 ppm/K"', "spread.tcr", "in parts only"),
        (FILM_SPREAD + 'end_tc1 = "25 ppm/K"', "spread.end_tc1", "no ends"),
        (FILM_SPREAD + 'end_resistance = "100 %"\n' + FILM_TABLE, "spread.end_resistance", "below 100 %"),
        (FILM_SPREAD + 'width_bias = "1.1 um"\n' + FILM_TABLE, "spread.width_bias", "Draw it wider"),
        (FILM_SPREAD + 'shape = "square"', "spread.shape", "rectangular"),
        (
            WIRE + 'meaning = "sigma"\nshape = "rectangular"',
            "spread.shape",
            "rectangular with standard deviations",
        ),
        (FILM_SPREAD + FILM_TABLE.replace("poly", "two words"), "film.etch", "a letter"),
    ],
)
def test_half_widths_that_mean_nothing_are_refused(tmp_path: Path, body: str, where: str, says: str) -> None:
    place, message = only(tmp_path, body)
    assert place == f"material.m.{where}"
    assert says in message


SHARED = """
[[correlation]]
between = ["red_film.ohm_per_square", "red_film.tc1"]
value = -0.6
[[tracking]]
materials = ["red_film", "other"]
within = "3 ppm/K"
[corner.slow.red_film]
ohm_per_square = "+12 %"
"""


def test_what_materials_share_is_kept_as_it_stands(tmp_path: Path) -> None:
    path = tmp_path / "films.toml"
    path.write_text(RED_FILM + SHARED)
    made = read_material_file(path)
    assert made.where == str(path)
    assert made.materials == read_materials(path)
    assert set(made.tables) == {"correlation", "tracking", "corner"}
    assert made.tables["correlation"][0]["value"] == -0.6


@pytest.mark.parametrize(
    ("change", "where", "says"),
    [
        (("value = -0.6", "value = -1.6"), "correlation[1].value", "-1"),
        (("value = -0.6", 'value = "-0.6"'), "correlation[1].value", "a number"),
        (("value = -0.6", "value = nan"), "correlation[1].value", "finite"),
        (("value = -0.6", ""), "correlation[1].value", "-0.6"),
        ((', "red_film.tc1"]', "]"), "correlation[1].between", "2 entries"),
        ((', "other"]', "]"), "tracking[1].materials", "2 entries"),
        (("within =", "witin ="), "tracking[1].witin", "Did you mean within"),
        (('"+12 %"', "12"), "corner.slow.red_film.ohm_per_square", "text in quotes"),
        (('ohm_per_square = "+', 'ohm_per_squar = "+'), "corner.slow.red_film.ohm_per_squar", "Did you mean"),
        (("[corner.slow.red_film]", "[corner.slow]"), "corner.slow.ohm_per_square", "a table"),
        (("[[correlation]]", "[[corelation]]"), "corelation", "Did you mean correlation"),
    ],
)
def test_the_shape_of_what_materials_share_is_checked(
    tmp_path: Path, change: tuple[str, str], where: str, says: str
) -> None:
    text = RED_FILM + SHARED.replace(*change)
    assert text != RED_FILM + SHARED
    found = refused(tmp_path, text)
    assert any(place == where and says in message for place, message in found), found


def test_every_key_of_what_materials_share_is_documented() -> None:
    text = (Path(__file__).parents[2] / "docs" / "input.md").read_text(encoding="utf-8")
    tables = _ProcessShape.model_json_schema()
    inner = (shape["properties"] for shape in tables["$defs"].values())
    keys = {*tables["properties"], *(key for properties in inner for key in properties)}
    assert {"between", "within", "tc2", "corner"} <= keys
    assert [key for key in keys if key not in text] == []
