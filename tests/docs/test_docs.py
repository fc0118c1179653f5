"""The documents are true: their examples are read, their code is run, their tables are compared.

What a document states is checked against the package; figures that it works out are checked against
sources named beside the check.
"""

import ast
import json
import math
import re
import subprocess
import sys
from pathlib import Path

import pytest
from makers import SIX_FILMS, brief

import tcplan
from tcplan import drift, errors
from tcplan.brief import read_brief
from tcplan.brief.shape import _BriefShape
from tcplan.cli import exits
from tcplan.goal import KINDS
from tcplan.material.files import _MaterialShape, published, published_names, read_materials
from tcplan.material.law_parameters import LAW_KINDS
from tcplan.network import legs
from tcplan.plan import plan_json
from tcplan.ranges import GRADES
from tcplan.search import mixed, mixed_search, polish, solver, supports
from tcplan.trees import assigned_trees, shapes
from tcplan.units import parse_quantity
from tcplan.verify import question, tree_bound
from tcplan.workflow import proposals
from tcplan.workflow.planning import make_plan
from tcplan.worst import cells, evaluation

ROOT = Path(__file__).parents[2]
DOCS = sorted((ROOT / "docs").glob("*.md"))
TEXTS = [*DOCS, ROOT / "DEVELOPERS.md"]
WIDEST = 110


def text(name):
    return (ROOT / name).read_text(encoding="utf-8")


def blocks(name, kind):
    """Return (what follows the kind, content) of the fenced blocks of one kind in a document."""
    found = re.findall(rf"^```{kind}([^\n]*)\n(.*?)^```$", text(name), re.M | re.S)
    return [(label.strip(), content) for label, content in found]


def tables(name):
    """Return the rows of all tables of a document, cells stripped; heads and rules included."""
    lines = [line for line in text(name).splitlines() if line.startswith("|")]
    return [[cell.strip() for cell in re.split(r"(?<!\\)\|", line)[1:-1]] for line in lines]


def coded(name):
    """Return every word that stands in code: between backticks, in a fence or in an indented block."""
    whole = text(name)
    spans = re.findall(r"`+([^`]+)`+", whole)
    fenced = re.findall(r"^```[^\n]*\n(.*?)^```$", whole, re.M | re.S)
    return set(re.findall(r"[A-Za-z_]\w*", " ".join([*spans, *fenced])))


# --- form ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("path", TEXTS, ids=lambda p: p.name)
def test_links_lead_somewhere(path):
    for target in re.findall(r"\]\(([^)#]+)\)", path.read_text(encoding="utf-8")):
        assert (path.parent / target).is_file(), f"{path.name}: {target}"


@pytest.mark.parametrize("path", TEXTS, ids=lambda p: p.name)
def test_prose_fits_the_columns(path):
    """Tables and fenced blocks cannot be wrapped; everything else is."""
    prose = re.sub(r"^```.*?^```$", "", path.read_text(encoding="utf-8"), flags=re.M | re.S)
    for line in prose.splitlines():
        assert line.startswith("|") or len(line) <= WIDEST, line


@pytest.mark.parametrize("path", TEXTS, ids=lambda p: p.name)
def test_tables_are_whole(path):
    """Every row of a table has as many cells as its head, else a reader loses a column."""
    width = None
    for line in path.read_text(encoding="utf-8").splitlines():
        cells = len(re.split(r"(?<!\\)\|", line)) if line.startswith("|") else None
        assert cells is None or width is None or cells == width, line
        width = cells


def test_sections_that_are_cited_exist():
    for path in TEXTS:
        for target, number in re.findall(r"\]\(([a-z]+\.md)\),? section (\d+)", path.read_text("utf-8")):
            assert re.search(rf"^## {number}\. ", text(f"docs/{target}"), re.M), f"{path.name}: {number}"


# --- input.md -----------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """Return a folder that holds every complete example of input.md under its name."""
    place = tmp_path_factory.mktemp("examples")
    for label, content in blocks("docs/input.md", "toml"):
        mark, name = label.split()
        assert mark == "complete"
        (place / name).write_text(content, encoding="utf-8")
    return place


EXAMPLES = [label.split()[1] for label, _ in blocks("docs/input.md", "toml")]
BRIEFS = [label.split()[1] for label, content in blocks("docs/input.md", "toml") if "\ntitle = " in content]


def test_there_are_examples_of_both_files():
    assert len(BRIEFS) >= 4
    assert len(set(EXAMPLES) - set(BRIEFS)) >= 2
    assert len(set(EXAMPLES)) == len(EXAMPLES)


@pytest.mark.parametrize("name", sorted(set(EXAMPLES) - set(BRIEFS)))
def test_complete_materials_files_are_read(folder, name):
    assert read_materials(folder / name)


@pytest.mark.parametrize("name", BRIEFS)
def test_complete_briefs_run(folder, name):
    plan = make_plan(read_brief(folder / name))
    assert plan.best.nominal.peak_ppm >= 0


def test_the_coil_example_gives_the_least_total(folder):
    plan = make_plan(read_brief(folder / "coil.toml"))
    assert plan.best.role == "least total"


def test_every_law_form_is_shown(folder):
    kinds = {
        m.law.kind for name in ("films.toml", "laws.toml") for m in read_materials(folder / name).values()
    }
    assert kinds == set(LAW_KINDS)


def keys_of(model):
    """Yield every key of a shape, those of its tables included."""
    for name, field in model.model_fields.items():
        yield field.alias or name
        for inner in re.findall(r"_\w+Shape", str(field.annotation)):
            yield from keys_of(getattr(sys.modules[model.__module__], inner))


@pytest.mark.parametrize("model", [_BriefShape, _MaterialShape], ids=lambda m: m.__name__)
def test_every_key_is_documented(model):
    known = set(keys_of(model))
    assert {"spread", "film", "tc1"} <= known or {"goal", "rise", "place"} <= known
    assert known <= coded("docs/input.md")


def test_units_in_the_table_are_read():
    """The unit of each example in the first column, and every unit in the second, is accepted."""
    units = {
        "resistance": "ohm",
        "temperature": "K",
        "difference, rise, B value": "delta_K",
        "TC1, TCR": "1/K",
        "TC2": "1/K^2",
        "TC3": "1/K^3",
        "ratio": "1",
        "length": "m",
        "area": "m^2",
        "resistance per length": "ohm/m",
        "resistance times length": "ohm*m",
        "matching": "1*m",
        "current per width": "A/m",
    }
    rows = {row[0]: row for row in tables("docs/input.md") if len(row) == 3 and row[0] in units}
    assert set(rows) == set(units)
    for kind, (_, example, others) in rows.items():
        parse_quantity(re.search(r'"([^"]+)"', example)[1], units[kind])
        for unit in others.split(";")[0].replace("or a code (below)", "").split():
            assert parse_quantity(f"2 {unit.rstrip(',')}", units[kind]) > 0


@pytest.mark.parametrize(
    ("code", "ohms"), [("4k7", 4700.0), ("4K7", 4700.0), ("R47", 0.47), ("10k", 10e3), ("2M2", 2.2e6)]
)
def test_codes_of_the_text(code, ohms):
    """IEC 60062: the letter stands for the point and the multiplier."""
    assert f"`{code}`" in text("docs/input.md")
    assert parse_quantity(code, "ohm") == pytest.approx(ohms, rel=1e-15)


def test_named_ranges_are_those_of_the_package():
    rows = {row[0]: row for row in tables("docs/input.md") if row[0] in GRADES}
    assert list(rows) == list(GRADES)
    for name, grade in GRADES.items():
        assert rows[name][1:] == [f"{grade.low_degC:g}", f"{grade.high_degC:g}", grade.standard]


def test_published_sets_are_those_of_the_package():
    rows = {row[0].strip("`"): row[1] for row in tables("docs/input.md") if row[0].startswith("`published:")}
    assert set(rows) == {f"published:{name}" for name in published_names()}
    for name in published_names():
        assert rows[f"published:{name}"].split(", ") == list(published(name))


# --- plan.md ------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def plan(folder):
    return make_plan(read_brief(folder / "brief.toml"))


def keys_inside(data, free=("materials", "point", "law_parameters")):
    """Yield every key of plain data; names that the user chose are left out."""
    if isinstance(data, list):
        for item in data:
            yield from keys_inside(item)
    elif isinstance(data, dict):
        for key, item in data.items():
            yield key
            inside = item.values() if key in free and isinstance(item, dict) else [item]
            for part in inside:
                yield from keys_inside(part)


@pytest.mark.parametrize("name", BRIEFS)
def test_every_field_of_a_plan_is_documented(folder, name):
    data = json.loads(plan_json(make_plan(read_brief(folder / name))))
    found = set(keys_inside(data))
    assert {"schema", "proof", "lower_bound_ppm", "valid_K"} <= found
    assert found <= coded("docs/plan.md")


def test_every_law_and_kind_of_limit_is_documented():
    first = {row[0] for row in tables("docs/plan.md")}
    assert set(LAW_KINDS) <= first
    assert set(KINDS) <= {word for cell in first for word in cell.split(", ")}


def recomputed(plan, tmp_path):
    """Run the program of plan.md, as it stands, on a plan; return the two figures that it prints."""
    [(_, code)] = blocks("docs/plan.md", "python")
    assert "tcplan" not in code  # it stands on plan.json alone
    (tmp_path / "plan.json").write_text(plan_json(plan), encoding="utf-8")
    (tmp_path / "again.py").write_text(code, encoding="utf-8")
    run = subprocess.run(
        [sys.executable, "-W", "error", "again.py"], cwd=tmp_path, capture_output=True, text=True, check=True
    )
    return [float(word) for word in run.stdout.split()]


@pytest.mark.parametrize("name", ["brief.toml", "given.toml", "coil.toml"])
def test_the_program_of_the_text_finds_the_peak_again(folder, tmp_path, name):
    plan = make_plan(read_brief(folder / name))
    own, stated = recomputed(plan, tmp_path)
    # 20001 points: the grid misses a peak by at most curvature * (step/2)^2/2, here below 1e-3 ppm
    assert own == pytest.approx(stated, abs=1e-3)
    assert stated > 1.0


def test_the_figure_is_bound_plus_gap(plan):
    assert "`proof.lower_bound_ppm + proof.gap_ppm`" in text("docs/plan.md")
    for option in json.loads(plan_json(plan))["options"]:
        figure, of = option["proof"]["lower_bound_ppm"] + option["proof"]["gap_ppm"], option["proof"]["of"]
        told = option["nominal"]["figure_ppm"] if of == "nominal" else option["worst_case"]["peak_ppm"]
        assert figure == pytest.approx(told, rel=1e-9)
        assert option["nominal"]["figure_ppm"] == pytest.approx(option["nominal"]["peak_ppm"], rel=1e-9)


def test_the_point_is_a_factor_and_two_shifts(plan):
    """The worst device of a series mix, put together by hand as plan.md says, reaches the worst case."""
    option = next(o for o in plan.options if o.arrangement == "series")
    x = option.worst_case.at_degC
    over = plan.range.reference_degC
    total = {x: 0.0, over: 0.0}
    for leg in json.loads(plan_json(plan))["options"][plan.options.index(option)]["legs"]:
        law = plan.by_name[leg["material"]].law.parameters()
        at = option.worst_case.point[leg["material"]]

        def device(t, law=law, at=at):
            y = t - law["reference_degC"]
            return (
                1
                + (law["tc1_ppm_per_K"] + at.tc1) * 1e-6 * y
                + (law["tc2_ppm_per_K2"] + at.tc2) * 1e-6 * y * y
            )

        for t in total:
            total[t] += leg["ohms"] * at.ohm_per_square * device(t) / device(over)
    drift = abs(total[x] / total[over] - 1) * 1e6
    assert drift == pytest.approx(option.worst_case.peak_ppm, rel=1e-9)


# --- method.md ----------------------------------------------------------------------------------


ONE_NODE = 'arrangements = ["single", "series", "parallel"]\nmax_materials = 6\nmax_legs = 6'
MIXED = 'arrangements = ["mixed"]\nmax_materials = 3\nmax_legs = 3'


def six_films_brief(search=ONE_NODE):
    """Return a brief over the six films of method.md, as its table states them."""
    rows = [row for row in tables("docs/method.md") if len(row) == 5 and row[0] in {n for n, *_ in SIX_FILMS}]
    assert len(rows) == 6
    films = "".join(
        f'[material.{name}]\nsource = "invented"\nreference = "25 degC"\nvalid = ["-60 degC", "160 degC"]\n'
        f'tc1 = "{tc1} ppm/K"\ntc2 = "{tc2} ppm/K^2"\nohm_per_square = "100 ohm"\n'
        f'[material.{name}.spread]\nmeaning = "limits"\nohm_per_square = "{value} %"\n'
        f'tc1 = "{spread} ppm/K"\n'
        for name, tc1, tc2, value, spread in rows
    )
    return (
        'schema = 1\ntitle = "six"\n[resistor]\nvalue = "10 kohm"\n'
        '[temperature]\nlow = "-40 degC"\nhigh = "150 degC"\n[goal]\ndrift = "6000 ppm"\n'
        f"[search]\n{search}\n{films}"
    )


def test_the_six_films_are_as_worked_out():
    """4062.5 and 10123.75 by hand; 671.090 from an independent program that fixed it beforehand."""
    plan = make_plan(brief(six_films_brief()))
    stated = {row[0]: row for row in tables("docs/method.md") if row[0] in ("single", "series", "parallel")}
    by_hand = {"single": 10123.75, "series": 4062.5, "parallel": 671.090}
    for kind, row in stated.items():
        option = next(o for o in plan.options if o.arrangement == kind)
        assert option.proof.kind == "global"
        assert float(row[2]) == pytest.approx(by_hand[kind], abs=1e-9)
        assert option.proof.figure_ppm == pytest.approx(by_hand[kind], abs=6e-4)
        assert option.worst_case.peak_ppm == pytest.approx(float(row[3]), abs=0.06)
    assert plan.floor.worst_case_ppm == pytest.approx(4878.05, abs=5e-3)
    assert "4878.05 ppm" in text("docs/method.md")


def in_one_line(name):
    return re.sub(r"\s+", " ", text(name))


def test_the_mixed_networks_are_as_worked_out():
    """635.2908 and 1232.9379: scipy's Nelder-Mead on 3001 temperatures, without any of the package."""
    row = next(row for row in tables("docs/method.md") if row[0] == "mixed, 3 legs")
    best = make_plan(brief(six_films_brief(MIXED))).options[0]
    assert best.proof.kind == "global"
    assert float(row[2]) == pytest.approx(635.2908, abs=1e-3)
    assert best.proof.figure_ppm == pytest.approx(635.2908, rel=1e-5)
    assert f"none is below {best.proof.lower_bound_ppm:.3f}" in in_one_line("docs/method.md")
    assert best.worst_case.peak_ppm == pytest.approx(float(row[3]), rel=1e-4)
    kohms = {leg.material: leg.ohms / 1e3 for leg in legs(best.network)}
    assert kohms == {name: pytest.approx(ohms, rel=2e-4) for ohms, name in legs_of_the_row(row)}


def legs_of_the_row(row):
    return [(float(ohms), name) for name, ohms in re.findall(r"(\w+) ([\d.]+) kohm", row[1])]


def test_two_films_as_worked_out():
    """18442 and 12967 from the independent program that fixed the six films beforehand."""
    search = 'use = ["hi", "sp"]\nmax_materials = 2\nmax_legs = 3'
    plan = make_plan(brief(six_films_brief(search)))
    expected = {"series": 18442.1, "parallel": 12967.2, "mixed": 1232.938}
    for kind, figure in expected.items():
        option = next(o for o in plan.options if o.arrangement == kind)
        assert option.proof.kind == "global"
        assert option.proof.figure_ppm == pytest.approx(figure, rel=5e-6)
    assert "18442.1 ppm in series, 12967.2 in parallel, and 1232.94 as hi + (hi || sp)" in in_one_line(
        "docs/method.md"
    )


def test_the_sized_mix_by_hand():
    """Of 20 kohm at most, two legs in parallel are both 20 kohm: the harmonic mean of their laws."""
    search = ONE_NODE + "\nmax_squares = 200"
    plan = make_plan(brief(six_films_brief(search)))
    option = next(o for o in plan.options if o.arrangement == "parallel")
    hi, nd = 1 - 1400e-6 * 125 + 3e-6 * 125**2, 1 + 1500e-6 * 125 + 0.6e-6 * 125**2
    by_hand = (2 / (1 / hi + 1 / nd) - 1) * 1e6
    assert f"2/(1/{hi:.6f} + 1/{nd:.6f}) - 1" in text("docs/method.md")
    assert f"{by_hand:.2f} ppm" in text("docs/method.md")
    assert option.proof.figure_ppm == pytest.approx(by_hand, rel=1e-9)
    assert option.squares == pytest.approx((200.0, 200.0), rel=1e-9)
    series = next(o for o in plan.options if o.arrangement == "series")
    assert series.squares == pytest.approx((66.7, 33.3), abs=0.05)


def test_the_bend_of_an_inverse():
    """Brute force over the mixes of 0.8 and 1.25."""
    mixes = [k / 1000 for k in range(1001)]
    bend = max(w / 0.8 + (1 - w) / 1.25 - 1 / (w * 0.8 + (1 - w) * 1.25) for w in mixes)
    assert bend == pytest.approx(0.05, abs=1e-6)
    assert "For m = 0.8 and M = 1.25 the first term is 0.05." in in_one_line("docs/method.md")


def test_the_counts_of_trees():
    """1, 2, 4, 10, 24, 66: two-terminal series-parallel networks, Riordan and Shannon 1942 (from memory)."""
    assert "1, 2, 4, 10, 24 and 66" in in_one_line("docs/method.md")
    assert [len(shapes(size)) for size in range(1, 7)] == [1, 2, 4, 10, 24, 66]
    assert "give 30, 220 and 1260 trees of 2, 3 and 4 legs" in in_one_line("docs/method.md")
    assert [len(assigned_trees(size, 6, 3)) for size in (2, 3, 4)] == [30, 220, 1260]


def spaced(number):
    return f"{number:,}".replace(",", " ")


def test_numbers_of_the_program_that_the_method_states():
    weaker = [f"{part:g}" for part in tree_bound.WEAKER[1:]]
    said = in_one_line("docs/method.md")
    for phrase in (
        f"at {drift.CHECKS} points, evenly spaced",
        f"after {drift.MOST_PANELS} panels",
        f"Above {spaced(supports.MOST_SUPPORTS)} supports",
        f"after {supports.MOST_SOLVES} solves",
        f"at most {solver.TANGENTS} times",
        f"about {spaced(proposals.MOST_TREES)} trees",
        f"{proposals.MOST_MIXED_LEGS} at most, of at most max_materials",
        f"at {mixed.NODES} Chebyshev nodes a piece",
        f"a grid of {mixed.POINTS[1]} points for one share, {mixed.POINTS[2]} each for two",
        f"The {mixed.KEPT} best grid minima of a shape",
        f"all by {polish.PROBED} steps, the better half by {polish.PROBED} more",
        f"and the last {polish.FINISHED} to the end",
        f"found on {polish.GRID} points a piece",
        f"falls below {mixed_search.VANISHED:.0e}".replace("e-0", "e-"),
        f"The rows are {question.NODES} Chebyshev nodes",
        f"{spaced(tree_bound.BASE_CELLS)} and {tree_bound.CELLS_A_TREE} more for each tree",
        f"the limits {', '.join(weaker[:-1])} and {weaker[-1]} of U",
        f"after {spaced(cells.MOST_CELLS)} cells",
        f"over {evaluation.BAND_CELLS} cells or more",
    ):
        assert phrase in said, phrase


def test_the_worst_case_of_the_series_mix_by_hand():
    """Laws at their highest at 150 degC; pp, below the mean, at its lowest value, np at its highest."""
    pp, np_ = (
        1 - 120e-6 * 125 + 0.55e-6 * 125**2 + 40e-6 * 125,
        1 + 150e-6 * 125 + 0.4e-6 * 125**2 + 40e-6 * 125,
    )
    low, high = 2 / 3 * 0.8, 1 / 3 * 1.1
    worst = (low * pp + high * np_) / (low + high) - 1
    row = next(row for row in tables("docs/method.md") if row[0] == "series" and len(row) == 4)
    assert float(row[3]) == pytest.approx(worst * 1e6, abs=5e-3)


def test_the_weights_of_the_text_prove_the_series_bound():
    """Any weights prove the least column mean: the two of the text give the figures of the text."""
    weights = {-65.0: 0.63332, 125.0: 0.36668}
    means = {
        name: sum(w * (tc1 * x + tc2 * x * x) for x, w in weights.items()) for name, tc1, tc2, *_ in SIX_FILMS
    }
    assert all(f"{w:.5f}"[1:] in text("docs/method.md") for w in weights.values())
    assert min(means.values()) == pytest.approx(4062.5, abs=0.1)
    for name, figure in (("hi", 18678), ("nd", 12047), ("sp", 17838), ("nw", 84986)):
        assert f"{name} {figure}" in text("docs/method.md")
        assert means[name] == pytest.approx(figure, abs=1.6)  # five digits of the weights


AB = """
schema = 1
title = "Two films"
[resistor]
value = "10 kohm"
[temperature]
low = "-40 degC"
high = "125 degC"
{rest}
[material.A]
source = "invented"
reference = "25 degC"
valid = ["-40 degC", "125 degC"]
tc1 = "250 ppm/K"
tc2 = "0.5 ppm/K^2"
[material.A.spread]
meaning = "limits"
value = "10 %"
[material.B]
source = "invented"
reference = "25 degC"
valid = ["-40 degC", "125 degC"]
tc1 = "-1800 ppm/K"
tc2 = "1.9 ppm/K^2"
[material.B.spread]
meaning = "limits"
value = "15 %"
"""


def bundle(t, a, b):
    """Return R of (A 700 || B 600) + A 1000, with value factors a and b."""
    x = t - 25.0
    film_a, film_b = a * (1 + 250e-6 * x + 0.5e-6 * x * x), b * (1 - 1800e-6 * x + 1.9e-6 * x * x)
    return 1 / (1 / (700 * film_a) + 1 / (600 * film_b)) + 1000 * film_a


def worst_of(a, b):
    return max(abs(bundle(t, a, b) / bundle(25.0, a, b) - 1) for t in range(-40, 126)) * 1e6


def test_the_floor_of_two_films_is_their_parallel_mix():
    plan = make_plan(brief(AB.format(rest="")))
    assert plan.floor.nominal_ppm == pytest.approx(1401.86, abs=5e-3)
    parallel = next(o for o in plan.options if o.arrangement == "parallel")
    assert parallel.proof.figure_ppm == pytest.approx(plan.floor.nominal_ppm, rel=1e-6)


def test_a_worst_point_inside_the_box():
    """Brute force over factors and whole degrees, without any of the package."""
    corners = max(worst_of(a, b) for a in (0.9, 1.1) for b in (0.85, 1.15))
    inside = max(worst_of(a, 0.85 + 0.3 * k / 200) for a in (0.9, 1.1) for k in range(201))
    assert f"{corners:.1f} ppm at its worst corner" in text("docs/method.md").replace("\n", " ")
    assert f"{inside:.1f} ppm at its worst point" in text("docs/method.md").replace("\n", " ")
    network = '[given]\nnetwork = "(A 700 ohm || B 600 ohm) + A 1 kohm"'
    worst = make_plan(brief(AB.format(rest=network))).best.worst_case
    assert inside <= worst.upper_bound_ppm
    assert worst.peak_ppm == pytest.approx(inside, rel=1e-4)


def test_platinum_about_another_reference():
    """IEC 60751 coefficients, shifted as the text says: a' = (a + 2 b d)/D, b' = b/D."""
    a, b, d = 3.9083e-3, -5.775e-7, 25.0
    whole = 1 + a * d + b * d * d
    assert f"{(a + 2 * b * d) / whole:.6e}".replace("e-0", "e-") in text("docs/method.md")
    assert f"{b / whole:.6e}".replace("e-0", "e-") in text("docs/method.md")


def test_half_of_the_exponent_is_a_tanh():
    """(e^I - 1)/(e^I + 1) = tanh(I/2), an identity; here at the integral of 1000 ppm/K over 190 K."""
    assert math.expm1(0.19) / (math.exp(0.19) + 1) == pytest.approx(math.tanh(0.095), rel=1e-14)
    assert "tanh(I/2)" in text("docs/method.md")


# --- errors.md, glossary.md, DEVELOPERS.md ------------------------------------------------------


def error_classes(root=errors.TcplanError):
    yield root
    for child in root.__subclasses__():
        yield from error_classes(child)


def test_every_error_class_has_its_row_and_exit_code():
    codes = {row[0].strip("`"): row[-1] for row in tables("docs/errors.md") if len(row) == 4}
    for kind in error_classes():
        assert kind.__name__ in codes
    problem = errors.Problem(where="x", found="y", expected="z")
    raised = {
        "InputError": errors.InputError(problem),
        "UnitError": errors.UnitError(problem),
        "ExpressionError": errors.ExpressionError(problem),
        "OutputError": errors.OutputError(problem),
        "NoAnswer": errors.NoAnswer("none"),
        "Stopped": errors.Stopped(""),
        "InternalError": errors.InternalError("x"),
    }

    for name, error in raised.items():

        def fails(error=error):
            raise error

        assert str(exits.exit_code(fails)) == codes[name], name


def test_every_exit_code_is_explained():
    rows = [row[0] for row in tables("docs/errors.md") if len(row) == 2 and row[0].isdigit()]
    assert rows == [str(code) for code in range(6)]


def test_the_message_that_is_shown_is_the_message():
    with pytest.raises(errors.InputError) as raised:
        brief(AB.format(rest='[goal]\ndrfit = "1 %"'))
    assert f"    {raised.value}\n" in text("docs/errors.md")


def test_quoted_messages_are_in_the_code():
    """Every message that errors.md lists is a part of a message of the code; '..' is what varies."""
    code = "\n".join(path.read_text(encoding="utf-8") for path in sorted((ROOT / "tcplan").rglob("*.py")))
    plain = re.sub(r'"\s*\n\s*f?"', "", code)  # a text that is joined from several lines
    plain = re.sub(r"\s+", " ", re.sub(r"\{[^{}\n]*\}", "..", plain)).replace('\\"', '"')
    rows = [row[0].replace("\\|", "|") for row in tables("docs/errors.md") if len(row) == 2]
    phrases = rows[rows.index("message") :]
    phrases = [phrase for phrase in phrases if phrase != "message" and phrase.strip("-")]
    assert len(phrases) > 35
    for phrase in phrases:
        for part in re.split(r"\.\.|; ", phrase):
            assert re.sub(r"^(found|expected) ", "", part.strip()) in plain, phrase


def test_the_glossary_is_in_order_and_says_each_word_once():
    words = [row[0] for row in tables("docs/glossary.md")][2:]
    assert words == sorted(words, key=str.casefold)
    assert len(set(words)) == len(words)


def test_the_glossary_holds_the_words_of_plan_and_brief():
    words = {row[0] for row in tables("docs/glossary.md")}
    expected = "arrangement band brief drift floor goal law leg mask material network option plan proof share"
    assert set(expected.split()) | {"slope", "spread", "target", "verdict", "worst case"} <= words


def architecture(name):
    """Return a constant of the architecture test, read without running it."""
    tree = ast.parse(text("tests/test_architecture.py"))
    for node in tree.body:
        if isinstance(node, ast.Assign) and node.targets[0].id == name:
            return ast.literal_eval(node.value)
    raise LookupError(name)


def test_the_import_order_is_the_one_that_is_checked():
    [(_, order)] = blocks("DEVELOPERS.md", "")[:1]
    listed = [set(line.split(", ")) for line in order.strip().splitlines()]
    assert listed == architecture("ORDER")


def test_the_fences_are_those_that_are_checked():
    rows = {row[0]: set(re.findall(r"`([^`]+)`", row[1])) for row in tables("DEVELOPERS.md") if len(row) == 3}
    for library, places in architecture("FENCES").items():
        assert rows[library] == set(places)


def test_the_layout_names_everything_and_nothing_else():
    cells = " ".join(row[0] for row in tables("DEVELOPERS.md"))
    named = {path.rstrip("/") for path in re.findall(r"`(tcplan/[^`]+)`", cells)}
    inside = [
        p for p in (ROOT / "tcplan").iterdir() if p.suffix == ".py" or (p.is_dir() and any(p.glob("*.py")))
    ]
    held = {p.relative_to(ROOT).as_posix() for p in inside}
    assert named == held - {"tcplan/__init__.py"}


def test_files_that_are_named_exist():
    for name in re.findall(r"`((?:tests|docs)/[\w/.]+\.\w+)`", text("DEVELOPERS.md")):
        assert (ROOT / name).is_file(), name


def test_names_of_the_code_that_are_named_exist():
    """What DEVELOPERS.md tells to change is there to be changed."""
    code = "\n".join(path.read_text(encoding="utf-8") for path in sorted((ROOT / "tcplan").rglob("*.py")))
    section = text("DEVELOPERS.md").split("## How to add")[1].split("## Tests")[0]
    for name in re.findall(r"`(_?[A-Za-z_]+)`", section):
        assert re.search(rf"\b{name}\b", code), name


def test_the_public_reader_that_is_named_exists(plan):
    assert "`tcplan.read_plan(text)`" in text("docs/plan.md")
    assert tcplan.read_plan(plan_json(plan)) == plan


def test_the_same_brief_gives_the_same_file(folder, plan):
    assert plan_json(make_plan(read_brief(folder / "brief.toml"))) == plan_json(plan)
