"""A campaign file: every key read, every mistake named with its place, all of them at once."""

import re
import sys
from pathlib import Path

import pytest

from tcplan.errors import InputError
from tcplan.measure.block import Size
from tcplan.measure.fit_laws import Formula
from tcplan.measure.model import CommonErrors
from tcplan.measure.request import FitRequest, SpreadRules, SweepRequest
from tcplan.measure.request_file import parse_request, read_request
from tcplan.measure.request_shape import _RequestShape

DOCUMENT = (Path(__file__).parents[2] / "docs" / "fit.md").read_text(encoding="utf-8")
[EXAMPLE] = re.findall(r"^```toml complete\n(.*?)^```$", DOCUMENT, re.M | re.S)
LEAST = 'schema = 1\n[sweep.film]\nfile = "film.csv"\nsource = "run 12"\n'


def test_the_example_of_the_document_is_read():
    assert parse_request(EXAMPLE, "campaign.toml", Path("lab")) == FitRequest(
        sweeps=(
            SweepRequest(
                name="red_film",
                file=Path("lab/red_film.csv"),
                source="chamber run 12",
                label="Red film",
                reference=300.15,
                order=2,
                size=Size(key="ohm_per_square", count=50.0),
                exclude=(14, 40),
            ),
            SweepRequest(
                name="bead",
                file=Path("lab/bead.csv"),
                source="chamber run 13",
                model=Formula(text="exp(B*(1/T - 1/T0))", start=(("B", 3400.0),)),
            ),
        ),
        errors=CommonErrors(
            chamber_offset=0.15, chamber_scale=1e-3, lead=0.02, lead_tc1=3.9e-3, meter_scale=50e-6
        ),
        spread=SpreadRules(meaning="limits", coverage=0.9973, confidence=0.95),
        same_devices=True,
    )


def test_what_is_not_said():
    [one] = parse_request(LEAST, "c.toml", Path()).sweeps
    assert one == SweepRequest(name="film", file=Path("film.csv"), source="run 12")
    assert (one.model, one.order, one.reference, one.size) == ("polynomial", None, 298.15, None)
    assert parse_request(LEAST, "c.toml", Path()).spread == SpreadRules()
    assert parse_request(LEAST, "c.toml", Path()).errors == CommonErrors()


def test_one_sweep_has_no_devices_in_common_with_another():
    with pytest.raises(InputError, match=r"c\.toml.*same_devices: found one sweep"):
        parse_request(f"same_devices = true\n{LEAST}", "c.toml", Path())
    assert not parse_request(f"same_devices = false\n{LEAST}", "c.toml", Path()).same_devices


@pytest.mark.parametrize("model", ["polynomial", "platinum", "thermistor", "steinhart-hart"])
def test_models(model):
    [one] = parse_request(f'{LEAST}model = "{model}"\n', "c.toml", Path()).sweeps
    assert one.model == model


def test_a_formula_that_is_known_in_full_needs_no_start():
    [one] = parse_request(f'{LEAST}law = "1 + 0.0039*(T - T0)"\n', "c.toml", Path()).sweeps
    assert one.model == Formula(text="1 + 0.0039*(T - T0)")


def test_a_wire_has_a_length():
    [one] = parse_request(f'{LEAST}length = "1.2 m"\n', "c.toml", Path()).sweeps
    assert one.size == Size(key="ohm_per_metre", count=1.2)


def test_sigma():
    assert parse_request(f'{LEAST}[spread]\nmeaning = "sigma"\n', "c", Path()).spread.meaning == "sigma"


MISTAKES = {
    "no schema": (LEAST.replace("schema = 1\n", ""), "schema"),
    "a later schema": (LEAST.replace("schema = 1", "schema = 2"), "schema"),
    "no sweep": ("schema = 1\n", "sweep"),
    "an unknown table": (f"{LEAST}[erors]\n", "erors"),
    "an unknown key": (f"{LEAST}sqares = 3\n", "sweep.film.sqares"),
    "no file": (LEAST.replace('file = "film.csv"\n', ""), "sweep.film.file"),
    "a file of zero bytes in its name": (LEAST.replace("film.csv", "a\\u0000"), "sweep.film.file"),
    "no source": (LEAST.replace('source = "run 12"\n', ""), "sweep.film.source"),
    "an empty source": (LEAST.replace("run 12", " "), "sweep.film.source"),
    "no text for a source": (LEAST.replace("run 12", ""), "sweep.film.source"),
    "a source of two lines": (LEAST.replace("run 12", "a\\nb"), "sweep.film.source"),
    "an empty label": (f'{LEAST}label = ""\n', "sweep.film.label"),
    "a name that is none": (LEAST.replace("sweep.film", 'sweep."a b"'), "sweep.'a b'"),
    "an unknown model": (f'{LEAST}model = "cubic"\n', "sweep.film.model"),
    "a law and a model": (
        f'{LEAST}model = "platinum"\nlaw = "exp(B/T)"\nstart = {{ B = 1.0 }}\n',
        "sweep.film.law",
    ),
    "a law and an order": (f'{LEAST}order = 2\nlaw = "exp(B/T)"\nstart = {{ B = 1.0 }}\n', "sweep.film.law"),
    "a parameter without start": (f'{LEAST}law = "exp(B/T)"\n', "sweep.film.law"),
    "a formula that is not finite": (f'{LEAST}law = "1/(T - T0)"\n', "sweep.film.law"),
    "start without a law": (f"{LEAST}start = {{ B = 1.0 }}\n", "sweep.film.start"),
    "a start that is no number": (f'{LEAST}law = "B*T"\nstart = {{ B = "x" }}\n', "sweep.film.start.B"),
    "a start that is infinite": (f'{LEAST}law = "B*T"\nstart = {{ B = inf }}\n', "sweep.film.start.B"),
    "a law that is no formula": (f'{LEAST}law = "B**"\nstart = {{ B = 1.0 }}\n', "sweep.film.law"),
    "a call in a law": (f'{LEAST}law = "open(B)"\nstart = {{ B = 1.0 }}\n', "sweep.film.law"),
    "an order of 0": (f"{LEAST}order = 0\n", "sweep.film.order"),
    "an order of 4": (f"{LEAST}order = 4\n", "sweep.film.order"),
    "an order of platinum": (f'{LEAST}order = 2\nmodel = "platinum"\n', "sweep.film.order"),
    "an order that is text": (f'{LEAST}order = "2"\n', "sweep.film.order"),
    "a reference without a unit": (f'{LEAST}reference = "25"\n', "sweep.film.reference"),
    "a reference below absolute zero": (f'{LEAST}reference = "-300 degC"\n', "sweep.film.reference"),
    "no squares": (f"{LEAST}squares = 0\n", "sweep.film.squares"),
    "squares that are no number": (f"{LEAST}squares = nan\n", "sweep.film.squares"),
    "squares and a length": (f'{LEAST}squares = 3\nlength = "1 m"\n', "sweep.film.length"),
    "a length of zero": (f'{LEAST}length = "0 m"\n', "sweep.film.length"),
    "a length in ohm": (f'{LEAST}length = "3 ohm"\n', "sweep.film.length"),
    "lines that are text": (f'{LEAST}exclude = "12"\n', "sweep.film.exclude"),
    "a line that is text": (f'{LEAST}exclude = ["12"]\n', "sweep.film.exclude[1]"),
    "an error without a unit": (f'{LEAST}[errors]\nlead = "20"\n', "errors.lead"),
    "an error of the wrong kind": (f'{LEAST}[errors]\nchamber_offset = "1 %"\n', "errors.chamber_offset"),
    "an error below zero": (f'{LEAST}[errors]\nmeter_scale = "-1 ppm"\n', "errors.meter_scale"),
    "a meaning that is none": (f'{LEAST}[spread]\nmeaning = "range"\n', "spread.meaning"),
    "a coverage of all": (f'{LEAST}[spread]\ncoverage = "100 %"\n', "spread.coverage"),
    "a coverage of little": (f'{LEAST}[spread]\ncoverage = "5 %"\n', "spread.coverage"),
    "a confidence beyond 1": (f'{LEAST}[spread]\nconfidence = "950 %"\n', "spread.confidence"),
}


@pytest.mark.parametrize("case", MISTAKES)
def test_each_mistake_is_told_at_its_place(case):
    text, where = MISTAKES[case]
    with pytest.raises(InputError) as caught:
        parse_request(text, "c.toml", Path())
    assert [problem.where for problem in caught.value.problems] == [f"c.toml: {where}"]


def test_a_negative_tc1_of_a_lead_is_none():
    assert parse_request(f'{LEAST}[errors]\nlead_tc1 = "-5 ppm/K"\n', "c", Path()).errors.lead_tc1 == -5e-6


def test_all_mistakes_are_told_at_once():
    text = (
        f'{LEAST}order = 5\nlength = "x"\n[sweep.b]\nfile = "b.csv"\n[errors]\nled = "1 ohm"\n'
        '[spread]\ncoverage = "2"\n'
    )
    with pytest.raises(InputError) as caught:
        parse_request(text, "c.toml", Path())
    found = {problem.where.removeprefix("c.toml: ") for problem in caught.value.problems}
    assert found == {
        "sweep.film.order",
        "sweep.film.length",
        "sweep.b.source",
        "errors.led",
        "spread.coverage",
    }


def test_a_missing_file_names_the_nearest(tmp_path):
    (tmp_path / "campaign.toml").write_text(LEAST)
    with pytest.raises(InputError, match=r"Did you mean .*campaign\.toml"):
        read_request(tmp_path / "campain.toml")
    assert read_request(tmp_path / "campaign.toml").sweeps[0].file == tmp_path / "film.csv"


def keys_of(model):
    for name, field in model.model_fields.items():
        yield field.alias or name
        for inner in re.findall(r"_\w+Shape", str(field.annotation)):
            yield from keys_of(getattr(sys.modules[model.__module__], inner))


def test_every_key_is_in_the_document_and_no_other():
    known = set(keys_of(_RequestShape))
    assert {"chamber_offset", "squares", "confidence"} <= known
    part = DOCUMENT[DOCUMENT.index("## 2.") : DOCUMENT.index("## 3.")]
    told = set(re.findall(r"^\| `(\w+)` \|", part, re.M))
    assert told == known - {"schema", "sweep", "errors", "spread"}
    assert all(f"{name}" in EXAMPLE for name in ("schema", "[sweep.", "[errors]", "[spread]"))


def test_an_offset_of_the_chamber_is_a_difference():
    """0.15 degC of an offset is 0.15 K, not 273.3 K."""
    text = f'{LEAST}[errors]\nchamber_offset = "0.15 degC"\n'
    assert parse_request(text, "campaign.toml", Path()).errors.chamber_offset == pytest.approx(0.15)
