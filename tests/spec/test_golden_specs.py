"""The Markdown spec sheets of two examples are those that were read and kept, byte for byte."""

from __future__ import annotations

import importlib.util
from pathlib import Path

import pytest

_FILE = Path(__file__).with_name("golden_specs.py")
_SPEC = importlib.util.spec_from_file_location("golden_specs", _FILE)
assert _SPEC is not None
assert _SPEC.loader is not None
golden = importlib.util.module_from_spec(_SPEC)
_SPEC.loader.exec_module(golden)


@pytest.mark.parametrize("name", golden.NAMES)
def test_a_spec_sheet_is_the_one_that_is_kept(name: str) -> None:
    assert golden.made(name) == golden.kept(name).read_bytes().decode()


def test_every_sheet_that_is_kept_is_compared() -> None:
    assert sorted(path.stem for path in golden.FOLDER.iterdir()) == sorted(golden.NAMES)
