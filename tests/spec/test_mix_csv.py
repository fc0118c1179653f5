"""mix.csv: RFC 4180, full precision, no cell that a spreadsheet runs."""

from __future__ import annotations

import csv
import io

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.network import legs, shares
from tcplan.plan import Plan
from tcplan.spec.mix_csv import mix_csv, text_cell
from tcplan.workflow.planning import make_plan


@pytest.fixture(scope="module")
def plan() -> Plan:
    return make_plan(brief(BRIEF + FILMS))


def test_the_columns_and_the_line_ends(plan: Plan) -> None:
    lines = mix_csv(plan).split("\r\n")
    assert lines[0] == "leg,material,ohms,share,squares,area_m2,tc1_ppm_per_K,tc2_ppm_per_K2"
    assert lines[-1] == ""  # RFC 4180, 2: each record on a line of its own, ended by CR LF
    assert "\n" not in "".join(lines)


def test_the_numbers_are_those_of_the_plan_to_the_last_bit(plan: Plan) -> None:
    rows = list(csv.DictReader(io.StringIO(mix_csv(plan), newline="")))
    network = plan.best.network
    assert [float(row["ohms"]) for row in rows] == [leg.ohms for leg in legs(network)]
    assert [float(row["share"]) for row in rows] == list(shares(network))
    assert [float(row["squares"]) for row in rows] == list(plan.best.squares)
    stated = {"pp": (-120.0, 0.55), "np": (150.0, 0.4)}  # the materials of the brief, at its reference
    for row in rows:
        found = (float(row["tc1_ppm_per_K"]), float(row["tc2_ppm_per_K2"]))
        assert found == pytest.approx(stated[row["material"]], rel=1e-12)


def test_coefficients_are_about_the_reference_of_the_brief() -> None:
    # The coefficients of IEC 60751 at 0 degC, re-referenced by hand to 25 degC with d = 25 and
    # D = 1 + a d + b d^2: a' = (a + 2 b d)/D, b' = b/D.
    text = BRIEF.replace('title = "Test resistor"', 'title = "Pt"\nmaterials = ["published:metals"]')
    text += '[search]\nuse = ["platinum"]\narrangements = ["single"]\n'
    [row] = csv.DictReader(io.StringIO(mix_csv(make_plan(brief(text))), newline=""))
    assert float(row["tc1_ppm_per_K"]) == pytest.approx(3535.277853, rel=1e-9)
    assert float(row["tc2_ppm_per_K2"]) == pytest.approx(-0.5262694756, rel=1e-9)
    assert row["squares"] == ""


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r"])
def test_text_that_a_spreadsheet_would_run_is_guarded(start: str) -> None:
    assert text_cell(f"{start}HYPERLINK(1)") == f"'{start}HYPERLINK(1)"


def test_ordinary_text_is_left_alone() -> None:
    assert text_cell("red_film") == "red_film"
