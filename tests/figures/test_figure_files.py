"""The figure files: names, formats, the same bytes every time, nothing that points elsewhere."""

import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from dataclasses import replace

import matplotlib
import pytest
from makers import BRIEF, FILMS, brief

from tcplan.figures.files import figure_files
from tcplan.workflow.planning import make_plan

LABEL = 'label = "</text><script>$\\\\frac{$ & x^2_3"\n'


@pytest.fixture(scope="module")
def plan():
    odd = FILMS.replace('source = "invented"\n', 'source = "<b>$\\\\undefined{$</b>"\n' + LABEL)
    return make_plan(brief(BRIEF + odd))


@pytest.fixture(scope="module")
def files(plan):
    return figure_files(plan)


FIGURES = ("network", "drift", "spread", "slope-curvature")


def test_the_eight_files(files) -> None:
    assert list(files) == [f"{name}.{kind}" for name in FIGURES for kind in ("svg", "png")]
    assert all(isinstance(content, bytes) for content in files.values())


@pytest.mark.parametrize(
    ("name", "inches"),
    [("drift.png", (7.2, 5.6)), ("spread.png", (7.2, 5.6)), ("slope-curvature.png", (7.2, 4.5))],
)
def test_png_signature_size_and_resolution(files, name: str, inches: tuple[float, float]) -> None:
    # PNG specification (ISO/IEC 15948): the signature, then IHDR with width and height; pHYs in 1/m.
    content = files[name]
    assert content.startswith(b"\x89PNG\r\n\x1a\n")
    assert content[12:16] == b"IHDR"
    size = [int.from_bytes(content[k : k + 4]) for k in (16, 20)]
    place = content.index(b"pHYs") + 4
    dpi = int.from_bytes(content[place : place + 4]) * 0.0254
    assert 150 <= dpi <= 200
    assert size == [pytest.approx(dpi * inch, abs=1) for inch in inches]
    assert len(content) < 300_000


@pytest.mark.parametrize("name", [f"{name}.svg" for name in FIGURES])
def test_svg_is_well_formed_and_points_nowhere(files, name: str) -> None:
    text = files[name].decode()
    root = ET.fromstring(text)
    assert root.tag == "{http://www.w3.org/2000/svg}svg"
    names = {element.tag.rsplit("}")[-1] for element in root.iter() if isinstance(element.tag, str)}
    assert names.isdisjoint({"script", "image", "foreignObject", "a"})
    for element in root.iter():
        for key, value in element.attrib.items():
            if key.rsplit("}")[-1] == "href":
                assert value.startswith("#")
            assert not key.startswith("on")
            assert all(link.startswith("#") for link in re.findall(r"url\(([^)]*)\)", value))
    assert "@import" not in text
    addresses = set(re.findall(r"https?://[^\"'\s<]+", text))
    assert addresses <= {"http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"}
    assert "<!DOCTYPE" not in text
    assert len(text) < 200_000


@pytest.mark.parametrize("name", [f"{name}.svg" for name in FIGURES])
def test_svg_text_is_drawn_as_paths_so_that_it_needs_no_font(files, name: str) -> None:
    root = ET.fromstring(files[name])
    assert not list(root.iter("{http://www.w3.org/2000/svg}text"))
    assert b"font-family" not in files[name]


@pytest.mark.parametrize("name", FIGURES)
def test_svg_says_in_words_what_it_shows(plan, files, name: str) -> None:
    # SVG 2, 5.8: a title is the first child of what it names, for those who do not see it.
    root = ET.fromstring(files[f"{name}.svg"])
    space = "{http://www.w3.org/2000/svg}"
    assert [element.tag for element in root][:2] == [f"{space}title", f"{space}desc"]
    assert all(len(element.text) > 10 for element in root[:2])
    if name == "network":
        assert all(leg["material"] in root[1].text for leg in plan.best.to_dict()["legs"])


def test_no_id_of_an_option_becomes_markup(plan) -> None:
    # The id of an option in a plan file can be any text.
    odd = "</title><script>alert(1)</script> & $x^{$"
    options = tuple(replace(o, id=odd if o.id == plan.chosen else o.id) for o in plan.options)
    for content in figure_files(replace(plan, chosen=odd, options=options)).values():
        assert b"<script" not in content


def test_the_bytes_are_the_same_every_time_whatever_the_settings(plan, files) -> None:
    with matplotlib.rc_context({"font.size": 20.0, "svg.hashsalt": "other", "svg.fonttype": "none"}):
        assert figure_files(plan) == files


def test_settings_are_left_as_they_were(plan) -> None:
    before = dict(matplotlib.rcParams)
    figure_files(plan)
    assert dict(matplotlib.rcParams) == before


CODE = """
import hashlib, sys
from makers import BRIEF, FILMS, brief
from tcplan.workflow.planning import make_plan
plan = make_plan(brief(BRIEF + FILMS))
loaded = [name for name in ("matplotlib", "matplotlib.pyplot") if name in sys.modules]
from tcplan.figures.files import figure_files
content = b"".join(figure_files(plan).values())
loaded += [n for n in ("matplotlib.pyplot", "scipy.optimize", "sympy", "pint") if n in sys.modules]
print(hashlib.sha256(content).hexdigest(), loaded)
"""


def test_a_fresh_process_writes_the_same_bytes_and_loads_nothing_heavy() -> None:
    def run(seed):
        settings = {"PYTHONPATH": ":".join(sys.path), "PYTHONHASHSEED": seed}
        call = [sys.executable, "-c", CODE]
        return subprocess.run(call, capture_output=True, text=True, check=True, env=settings).stdout

    runs = {run("1"), run("2")}
    assert len(runs) == 1
    assert runs.pop().strip().endswith(" []")
