"""Every example in a docstring runs, and the functions that are used most have one."""

from __future__ import annotations

import doctest
import pkgutil
from importlib import import_module
from pathlib import Path

import pytest

import tcplan

ROOT = Path(__file__).parents[2]
WITH_EXAMPLES = (
    "brief.reading.read_brief",
    "material.files.published",
    "material.files.read_materials",
    "material.polynomial.Polynomial",
    "network.network_text",
    "network.shares",
    "network_reading.parse_network",
    "preferred.nearest_preferred",
    "ranges.named_range",
    "ranges.temperature_range",
    "units.format_ohms",
    "units.parse_quantity",
    "workflow.planning.make_plan",
)


def found_in(module: str) -> list[doctest.DocTest]:
    """Return the docstrings of a module that hold examples; only those defined in it."""
    return [test for test in doctest.DocTestFinder().find(import_module(module)) if test.examples]


def modules_with_examples() -> list[str]:
    names = ["tcplan", *(found.name for found in pkgutil.walk_packages(tcplan.__path__, "tcplan."))]
    prompts = {
        path.relative_to(ROOT).with_suffix("").as_posix().replace("/", ".").removesuffix(".__init__")
        for path in (ROOT / "tcplan").rglob("*.py")
        if ">>> " in path.read_text(encoding="utf-8")
    }
    assert prompts <= set(names)
    return sorted(prompts)


EXAMPLES = [test for module in modules_with_examples() for test in found_in(module)]


@pytest.mark.parametrize("example", EXAMPLES, ids=lambda test: test.name)
def test_the_example_runs(example: doctest.DocTest, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)  # examples name files of examples/
    report: list[str] = []
    failures, tried = doctest.DocTestRunner(verbose=False).run(example, out=report.append, clear_globs=False)
    assert tried > 0
    assert failures == 0, "".join(report)


@pytest.mark.parametrize("name", WITH_EXAMPLES)
def test_what_is_used_most_has_an_example(name: str) -> None:
    assert f"tcplan.{name}" in {test.name for test in EXAMPLES}


def test_a_wrong_example_is_found() -> None:
    """The runner fails where the answer is another one, so that the tests above can fail."""
    wrong = doctest.DocTestParser().get_doctest(">>> 1 + 1\n3\n", {}, "wrong", None, 0)
    assert doctest.DocTestRunner(verbose=False).run(wrong, out=lambda text: None).failed == 1
