"""What docs/fit.md shows and states is so; its commands are run in tests/examples."""

import json
import re
from pathlib import Path

import click
import numpy as np
import pytest
from campaigns import NINE, fitted_text, sweep_text
from click.testing import CliRunner
from measured_fits import fit_of
from scipy import stats

from tcplan.cli.fit import command
from tcplan.cli.main import cli
from tcplan.measure.fit_checks import RISK
from tcplan.measure.fit_readings import FARTHEST
from tcplan.measure.fit_repeats import NEARNESS
from tcplan.measure.population import population
from tcplan.measure.request_shape import MOST_LINES, MOST_SWEEPS
from tcplan.spec.fit_data import fit_data

ROOT = Path(__file__).parents[2]
TEXT = (ROOT / "docs" / "fit.md").read_text(encoding="utf-8")
FLAT = re.sub(r"\s+", " ", TEXT)


def test_the_screen_that_is_shown_is_printed():
    [shown] = re.findall(r"^```output\n(.*?)^```$", TEXT, re.M | re.S)
    result = CliRunner().invoke(cli, ["fit", str(ROOT / "examples" / "film_campaign" / "campaign.toml")])
    assert len(shown.splitlines()) > 10
    assert result.stdout.startswith(shown)


def test_every_option_is_in_the_table():
    part = TEXT[TEXT.index("## 1.") : TEXT.index("## 2.")]
    told = set(re.findall(r"`(--?[a-z0-9-]+)", "\n".join(re.findall(r"^\|.*$", part, re.M))))
    known = {
        name
        for option in command.params
        if isinstance(option, click.Option)
        for name in option.opts
        if name not in ("-h", "--help", "--output")
    }
    assert told == known


def keys_inside(data):
    if isinstance(data, list):
        for item in data[:3]:
            yield from keys_inside(item)
    elif isinstance(data, dict):
        for key, item in data.items():
            yield key
            yield from keys_inside(item)


def test_the_fields_of_the_data_are_documented():
    twice = (*NINE, *NINE[::-1])
    one = fitted_text(sweep_text(3, 2, twice, stated=True) + "1,x,D0,L0,50\n")
    data = json.loads(json.dumps(fit_data(one, {"film": 1})))
    top = set(data) | set(data["devices"][0]) | set(data["scatter"]["tc1"])
    coded = set(re.findall(r"\w+", " ".join(re.findall(r"`([^`]+)`", TEXT[TEXT.index("## 7.") :]))))
    assert top - {"device", "lot"} <= coded
    assert {"hysteresis", "covariance", "half_width"} <= top


def test_numbers_in_the_text_are_those_of_the_package():
    assert f"up to {MOST_SWEEPS}; NAME" in FLAT
    assert f"are left out, up to {MOST_LINES}" in FLAT
    assert (RISK, FARTHEST, NEARNESS) == (0.05, 0.5, 0.1)
    assert "outside by at most half their span" in FLAT
    assert "readings within 0.1 K are one temperature" in FLAT
    assert "5 % over the number of readings" in FLAT


def test_eight_lots_give_limits_that_are_as_wide_as_told():
    """One device a lot and no noise: k^2 = z^2 (1 + 1/8) 7/chi2(5 %, 7), by hand from tables: 5.72."""
    z, chi = stats.norm.ppf(0.5 + 0.9973 / 2), stats.chi2.ppf(0.05, 7)
    by_hand = z * np.sqrt((1 + 1 / 8) * 7 / chi)
    assert by_hand == pytest.approx(5.72, abs=0.01)
    off = np.arange(8.0) - 3.5
    off *= 0.01 / off.std(ddof=1)
    fits = [fit_of(1000.0 * (1.0 + x), (1e-6,)) for x in off]
    found = population(fits, [str(k) for k in range(8)], [str(k) for k in range(8)])
    assert found.scatter("value").half_width == pytest.approx(by_hand * 0.01, rel=0.01)
    assert "about 5.7 %" in FLAT
