"""The spec sheets that are compared byte for byte; run as a program it writes them anew.

``python tests/spec/golden_specs.py`` in the root of the repository; read the difference before it is kept.
"""

from __future__ import annotations

from pathlib import Path

from tcplan.brief import read_brief
from tcplan.spec.markdown import spec_markdown
from tcplan.workflow.planning import make_plan
from tcplan.workflow.specs import make_spec

FOLDER = Path(__file__).parent / "golden"
EXAMPLES = Path(__file__).parents[2] / "examples"
NAMES = ("brake_sensor_films", "cabinet_reference_wire")


def made(name: str) -> str:
    """Return the Markdown spec sheet of an example, as it is made now."""
    return spec_markdown(make_spec(make_plan(read_brief(EXAMPLES / name / "brief.toml"))))


def kept(name: str) -> Path:
    """Return where that of an example is kept."""
    return FOLDER / f"{name}.md"


if __name__ == "__main__":
    FOLDER.mkdir(exist_ok=True)
    for one in NAMES:
        kept(one).write_text(made(one), encoding="utf-8", newline="\n")
