"""docs/ratio.md is true: its output, its fields, its example."""

import json
import re
import tomllib
from pathlib import Path

from tcplan.brief import read_brief
from tcplan.cli.ratio_screen import ratio_screen
from tcplan.ratio import cells, worst
from tcplan.workflow.ratio import make_ratio, ratio_json

ROOT = Path(__file__).parents[2]
TEXT = (ROOT / "docs" / "ratio.md").read_text(encoding="utf-8")
EXAMPLE = ROOT / "examples" / "sense_divider" / "brief.toml"


def test_the_output_is_that_of_the_example():
    [printed] = re.findall(r"^```text output\n(.*?)^```$", TEXT, re.M | re.S)
    assert printed == ratio_screen(make_ratio(read_brief(EXAMPLE)), 80) + "\n"


def test_the_table_of_the_brief_is_that_of_the_example():
    [shown] = re.findall(r"^```toml\n(.*?)^```$", TEXT, re.M | re.S)
    assert tomllib.loads(shown)["ratio"] == tomllib.loads(EXAMPLE.read_text(encoding="utf-8"))["ratio"]


def keys_inside(data):
    """Yield every key of plain data; what is as in plan.json, and names of materials, are left out."""
    for key, item in data.items():
        yield key
        if key in ("goal", "process", "allowances", "materials"):
            continue
        for part in [*item.values()] if key == "point" else item if isinstance(item, list) else [item]:
            if isinstance(part, dict):
                yield from keys_inside(part)


def test_every_field_is_documented():
    spans = re.findall(r"`([^`\n]+)`", TEXT)
    coded = set(re.findall(r"\w+", " ".join(spans)))
    found = set(keys_inside(json.loads(ratio_json(make_ratio(read_brief(EXAMPLE))))))
    assert {"apart_first", "drift_sigma_ppm", "total_up_ppm"} <= found
    assert found <= coded


def test_the_gaps_are_those_of_the_text():
    assert "1 part in 20 000" in TEXT
    assert cells.GAP == 1 / 20_000
    assert "more than 0.1 % apart" in TEXT.replace("\n", " ")
    assert worst.CLOSED == 1e-3
