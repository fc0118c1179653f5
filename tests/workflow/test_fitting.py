"""From sweeps to a materials file: what is written is read back, several materials, files all or none."""

import json
import math
import tomllib
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from campaigns import NINE, sweep_text
from scipy.optimize import brentq

from tcplan.errors import InputError, OutputError
from tcplan.material.files import read_materials
from tcplan.measure.block import Size, material_block
from tcplan.measure.model import CommonErrors
from tcplan.measure.request import FitRequest, SpreadRules, SweepRequest
from tcplan.units import parse_quantity
from tcplan.workflow.fitting import check_fit_out, fit_json, fit_request, materials_text, write_fit


def request_of(folder, spread=None, same=False, **texts):
    sweeps = []
    for name, text in texts.items():
        (folder / f"{name}.csv").write_text(text)
        sweeps.append(
            SweepRequest(
                name=name,
                file=folder / f"{name}.csv",
                source="run 12",
                size=Size(key="ohm_per_square", count=50.0),
            )
        )
    return FitRequest(sweeps=tuple(sweeps), spread=spread or SpreadRules(), same_devices=same)


def test_what_is_written_is_read_back(tmp_path):
    fits = fit_request(request_of(tmp_path, red=sweep_text(6, 3), blue=sweep_text(1, 1, seed=2)))
    paths = write_fit(fits, tmp_path / "out")
    names = [
        f"{n}-{k}.{e}"
        for n in ("red", "blue")
        for k in ("fit", "residuals", "devices")
        for e in ("svg", "png")
    ]
    assert [path.name for path in paths] == ["materials.toml", "fit.json", *names]
    materials = read_materials(tmp_path / "out" / "materials.toml")
    assert list(materials) == ["red", "blue"]
    red, found = materials["red"], fits.materials[0].found
    assert red.source == "run 12"
    assert red.ohm_per_square == pytest.approx(found.ohms / 50.0, rel=found.uncertainties[0] / found.ohms)
    assert red.law.coefficients[0] == pytest.approx(found.values[1], abs=0.05 * found.uncertainties[1])
    half = found.scatter("value").half_width
    assert half <= red.spread.value <= half * 1.01  # three digits, outward
    assert (red.valid, materials["blue"].spread) == ((218.15, 413.15), None)


def steinhart_hart(T):
    """Return R(T) through (5 degC, 2.5), (25 degC, 1), (45 degC, 0.4); widely published constants."""
    a, b, c = 2.108508173e-3, 0.7979204727e-4, 6.535076315e-7
    log_ohms = [brentq(lambda x, t=t: a + b * x + c * x**3 - 1.0 / t, 1.0, 20.0) for t in T.tolist()]
    return np.exp(np.array(log_ohms)) / 1e4


@pytest.mark.parametrize(
    ("model", "law"),
    [
        ("thermistor", lambda T: np.exp(3435.0 * (1.0 / T - 1.0 / 298.15))),
        ("platinum", lambda T: 1.0 + 3.9083e-3 * (T - 273.15) - 5.775e-7 * (T - 273.15) ** 2),
        ("steinhart-hart", steinhart_hart),
    ],
)
def test_every_model_is_written_in_a_form_that_is_read(tmp_path, model, law):
    """The laws: IEC 60539-1 and IEC 60751 at 0 degC and above."""
    T = np.linspace(273.15, 373.15, 11)
    rng = np.random.default_rng(5)
    rows = "".join(
        f"{t!r},{1e4 * (1 + 0.01 * k) * r * (1 + rng.normal(0, 1e-5))!r},d{k}\n"
        for k in range(3)
        for t, r in zip(T.tolist(), law(T).tolist(), strict=True)
    )
    (tmp_path / "bead.csv").write_text(f"T [K],R [ohm],device\n{rows}")
    one = SweepRequest(name="bead", file=tmp_path / "bead.csv", source="run 1", model=model)
    fits = fit_request(FitRequest(sweeps=(one,)))
    write_fit(fits, tmp_path / "out")
    material = read_materials(tmp_path / "out" / "materials.toml")["bead"]
    np.testing.assert_allclose(material.law.ratio(T), law(T) / law(np.array([298.15])), rtol=2e-4)


def other_devices(lot, device):
    return f"L{lot}", f"chip {lot}.{device}"


def tracked_texts(apart=1e-6, chips=2):
    """Return two films on the same chips, whose TC1 move together by 20 ppm/K and apart by far less."""
    rng = np.random.default_rng(8)
    texts = {"red": [], "blue": []}
    for lot in range(6):
        for chip in range(chips):
            both = rng.normal(0.0, 20e-6)
            for name, tc1 in (("red", -100e-6), ("blue", 300e-6)):
                own, ohms = tc1 + both + rng.normal(0.0, apart), 1e3 * (1 + rng.normal(0, 0.01))
                texts[name] += [
                    f"{t!r},{ohms * (1 + own * (t - 25.0) + rng.normal(0.0, 1e-5))!r},{lot}.{chip},{lot}"
                    for t in NINE
                ]
    return {name: "T [degC],R [ohm],device,lot\n" + "\n".join(rows) + "\n" for name, rows in texts.items()}


def test_materials_on_the_same_devices_track(tmp_path):
    fits = fit_request(request_of(tmp_path, same=True, **tracked_texts()))
    [(names, tracked)] = fits.tracking
    assert names == ("red", "blue")
    assert tracked.difference == pytest.approx(-400e-6, abs=3e-6)
    assert tracked.half_width < 0.3 * min(one.found.scatter("tc1").half_width for one in fits.materials)
    text = materials_text(fits)
    assert text.count("[[tracking]]") == 1
    assert "[[correlation]]" not in text
    (tmp_path / "m.toml").write_text(text)
    assert list(read_materials(tmp_path / "m.toml")) == ["red", "blue"]
    [table] = tomllib.loads(text)["tracking"]
    assert table["materials"] == ["red", "blue"]
    within = parse_quantity(table["within"], "1/K")
    assert tracked.half_width <= within <= 1.01 * tracked.half_width


def why_not(fits):
    """Return what the notes of the second material say of tracking; nothing is written."""
    assert fits.tracking == ()
    assert "[[tracking]]" not in materials_text(fits)
    return [note for one in fits.materials for note in one.notes if "tracking" in note]


def test_equal_names_alone_are_no_reason(tmp_path):
    assert why_not(fit_request(request_of(tmp_path, **tracked_texts()))) == []


def test_materials_on_other_devices_do_not(tmp_path):
    texts = {"red": sweep_text(3, 2), "blue": sweep_text(3, 2, names=other_devices)}
    [note] = why_not(fit_request(request_of(tmp_path, same=True, **texts)))
    assert note == "No tracking with red: fewer than two devices have readings of both."


def test_films_that_do_not_move_together_do_not(tmp_path):
    texts = {
        name: sweep_text(4, 3, seed=seed, stated=True, names=lambda n, k: (f"L{n}", f"{n}.{k}"))
        for name, seed in (("red", 1), ("blue", 2))
    }
    fits = fit_request(request_of(tmp_path, same=True, **texts))
    [note] = why_not(fits)
    assert note.startswith("No tracking with red: the data do not show that their TC1 move together (corr")
    comment = " ".join(line.lstrip("# ") for line in materials_text(fits).splitlines())
    assert note in comment
    assert note in json.loads(fit_json(fits))["materials"]["blue"]["notes"]


def test_a_difference_that_is_no_closer_is_not_written(tmp_path):
    # TC1 share 20 ppm/K of 34 ppm/K: they move together, and apart by 39 ppm/K, more than each by itself.
    fits = fit_request(request_of(tmp_path, same=True, **tracked_texts(apart=28e-6, chips=12)))
    [note] = why_not(fits)
    assert note == "No tracking with red: the limits of the difference of TC1 are not below those of both."


def test_a_material_is_in_one_pair(tmp_path):
    texts = tracked_texts()
    fits = fit_request(request_of(tmp_path, same=True, **texts, green=texts["blue"]))
    assert [names for names, _ in fits.tracking] == [("red", "blue")]
    assert [note for note in fits.materials[2].notes if "tracking" in note] == [
        "No tracking with red: red stands in a tracking already.",
        "No tracking with blue: blue stands in a tracking already.",
    ]


def test_lots_of_the_same_devices_agree(tmp_path):
    texts = tracked_texts()
    texts["blue"] = texts["blue"].replace(",0.1,0\n", ",0.1,9\n")
    assert fit_request(request_of(tmp_path, **texts)).tracking == ()
    with pytest.raises(InputError) as caught:
        fit_request(request_of(tmp_path, same=True, **texts))
    [problem] = caught.value.problems
    assert problem.where == "sweep.blue: device '0.1'"
    assert (problem.found, problem.expected) == ("lot '9'", "lot '0', as in sweep.red")


def test_a_scale_of_the_chamber_widens_what_is_written(tmp_path):
    request = request_of(tmp_path, same=True, **tracked_texts())
    [(_, plain)] = fit_request(request).tracking
    # By hand: 3 standard deviations of 0.5 % of the difference of 400 ppm/K are 6 ppm/K.
    [(_, found)] = fit_request(replace(request, errors=CommonErrors(chamber_scale=0.005))).tracking
    assert np.sqrt(found.half_width**2 - plain.half_width**2) == pytest.approx(6e-6, rel=0.02)


def test_a_tc1_in_a_correlation_is_not_in_a_tracking(tmp_path):
    rng, rows = np.random.default_rng(9), {"red": [], "blue": []}
    for lot in range(8):
        for chip in range(3):
            both = rng.normal(0.0, 20e-6)
            for name in rows:
                own, ohms = both + rng.normal(0.0, 1e-6), 1e3 * (1.0 + 500.0 * both)
                rows[name] += [
                    f"{t!r},{ohms * (1 + own * (t - 25.0) + rng.normal(0.0, 1e-5))!r},{lot}.{chip},{lot}"
                    for t in NINE
                ]
    texts = {n: "T [degC],R [ohm],device,lot\n" + "\n".join(r) + "\n" for n, r in rows.items()}
    fits = fit_request(request_of(tmp_path, same=True, **texts))
    [note] = why_not(fits)
    assert note == "No tracking with red: TC1 of red and of blue stands in a correlation with R."
    text = materials_text(fits)
    assert text.count("[[correlation]]") == 2
    (tmp_path / "m.toml").write_text(text)
    assert len(read_materials(tmp_path / "m.toml")) == 2


def test_sigma_is_written_as_such(tmp_path):
    fits = fit_request(request_of(tmp_path, SpreadRules(meaning="sigma"), red=sweep_text(6, 3)))
    (tmp_path / "m.toml").write_text(materials_text(fits))
    spread = read_materials(tmp_path / "m.toml")["red"].spread
    sigma = fits.materials[0].found.scatter("tc1").total.sigma
    assert spread.meaning == "sigma"
    assert sigma <= spread.tc1 <= 1.01 * sigma


def numbers_in(data):
    if isinstance(data, dict):
        data = list(data.values())
    if isinstance(data, list):
        for item in data:
            yield from numbers_in(item)
    elif isinstance(data, float):
        yield data


def test_the_data_are_all_there_and_finite(tmp_path):
    text = sweep_text(3, 2, (*NINE, *NINE[::-1]), stated=True) + "25,n/a,D9,L9,50\n"
    fits = fit_request(request_of(tmp_path, red=text))
    data = json.loads(fit_json(fits))
    red = data["materials"]["red"]
    assert all(math.isfinite(number) for number in numbers_in(data))
    assert red["refused_rows"] == 1
    assert red["refused"][0]["line"] == 3 * 2 * 18 + 2
    assert len(red["devices"]) == 6
    device, fit = red["devices"][0], fits.materials[0].fits[0]
    assert tuple(device["parameters"].values()) == fit.values
    assert device["hysteresis"]["mean"] == fit.hysteresis.mean
    assert device["residuals"] == list(fit.residuals)
    assert red["lots_devices"] == [2, 2, 2]


def test_repeats_that_do_not_differ_are_no_fault_of_the_data(tmp_path):
    rows = "".join(f"{t},{1000 + t * t / 50}\n" for t in (0, 25, 25, 50, 75, 75, 100, 110))
    rows += "".join(f"{t},{1000 + t * t / 50 + t**3 / 1e4}\n" for t in (0, 25, 100, 110))
    (tmp_path / "a.csv").write_text(f"T [degC],R [ohm]\n{rows}")
    for order in (1, 2):
        one = SweepRequest(name="a", file=tmp_path / "a.csv", source="x", order=order)
        json.loads(fit_json(fit_request(FitRequest(sweeps=(one,)))))
    rows = "".join(
        f"{t},{r}\n" for t, r in ((0, 1000), (0, 1000), (50, 1001), (50, 1001), (100, 1004), (100, 1004))
    )
    (tmp_path / "a.csv").write_text(f"T [degC],R [ohm]\n{rows}")
    one = SweepRequest(name="a", file=tmp_path / "a.csv", source="x", order=1)
    [device] = json.loads(fit_json(fit_request(FitRequest(sweeps=(one,)))))["materials"]["a"]["devices"]
    assert device["lack_of_fit"]["probability"] < 0.01


def test_all_files_that_cannot_be_read_are_told(tmp_path):
    request = request_of(tmp_path, red=sweep_text(1, 1), blue="nothing\n", green="T [degC],R [ohm]\n25,1\n")
    (tmp_path / "red.csv").unlink()
    with pytest.raises(InputError) as caught:
        fit_request(request)
    told = " ".join(str(problem) for problem in caught.value.problems)
    assert all(f"{name}.csv" in told for name in ("red", "blue", "green"))


def test_the_quality_of_the_readings_is_a_comment_of_the_material(tmp_path):
    twice = sorted((*NINE, *NINE))
    text = materials_text(fit_request(request_of(tmp_path, red=sweep_text(1, 3, twice, stated=True))))
    comment = " ".join(line[1:].strip() for line in text.splitlines() if line.startswith("#"))
    assert "Readings: They are known to 50 ppm as stated (1 sigma), and scatter by " in comment
    assert "Repeats show no lack of fit (p " in comment
    found = fit_request(request_of(tmp_path, red=sweep_text(1, 2))).materials[0].found
    block = material_block("red", found, source="x", remarks=["odd\nb = 1\x07 \u2028c = 2"])
    assert list(tomllib.loads(block)) == ["material"]


def test_files_are_written_all_or_none(tmp_path):
    fits = fit_request(request_of(tmp_path, red=sweep_text(1, 1)))
    out = tmp_path / "out"
    out.mkdir()
    (out / "red-fit.png").write_text("mine")
    for attempt in (lambda: write_fit(fits, out), lambda: check_fit_out(fits.request, out)):
        with pytest.raises(OutputError, match=r"red-fit\.png already there"):
            attempt()
    assert [path.name for path in out.iterdir()] == ["red-fit.png"]
    assert len(write_fit(fits, out, force=True)) == 8
    assert (out / "red-fit.png").read_bytes().startswith(b"\x89PNG")


def test_content_that_is_given_is_not_read_from_a_file(tmp_path):
    one = SweepRequest(name="red", file=Path("-"), source="x")
    text = sweep_text(1, 1).encode()
    fits = fit_request(FitRequest(sweeps=(one,)), {"red": text})
    assert fits.materials[0].sweep.source == "standard input"
