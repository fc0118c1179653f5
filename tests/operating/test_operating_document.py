"""docs/operating.md: its examples are read, and its figures hold."""

import re
from pathlib import Path

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.operating import raising, refusals

TEXT = (Path(__file__).parents[2] / "docs" / "operating.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"^```toml\n(.*?)^```$", TEXT, re.M | re.S)


@pytest.mark.parametrize("block", BLOCKS, ids=["common", "by leg"])
def test_the_examples_are_read(block):
    table, _, material = block.partition("[material.red_film]\n")
    whole = (BRIEF + FILMS).replace("pp]", "red_film]").replace("pp.", "red_film.")
    key = 'ohm_per_square = "320 ohm"\n'
    made = brief(whole.replace(key, key + material) + "\n" + table)
    assert made.operating.heats
    assert (made.by_name["red_film"].voltage_coefficient is not None) == bool(material)


def test_the_numbers_of_the_program_are_those_of_the_text():
    assert f"moves by more than {raising.FAR:g}" in " ".join(TEXT.split())
    assert f"rounded down to {refusals.DIGITS} digits" in " ".join(TEXT.split())
    method = (Path(__file__).parents[2] / "docs" / "method.md").read_text(encoding="utf-8")
    assert raising.FINEST == 1e-7
    assert "to 1 part in 10^7" in method
