"""The layout, the import order and the fences, read from the code itself."""

import ast
import json
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
PACKAGE = ROOT / "tcplan"
MODULES = sorted(PACKAGE.rglob("*.py"))

# Leftmost first; a module imports only from its own group or from groups further left.
ORDER = [
    {"arrays", "effort", "errors", "trees"},
    {"names", "minimax"},
    {"units", "output", "input_file"},
    {"ranges", "preferred", "toml_input", "table_reader", "material"},
    {"process"},
    {"network"},
    {"network_reading", "made"},
    {"drift"},
    {"goal"},
    {"brief"},
    {"plan"},
    {"plan_file", "mixes", "worst", "draws", "ratio", "operating"},
    {"search", "verify", "budget", "parts", "measure"},
    {"spec", "figures"},
    {"workflow"},
    {"cli"},
    {"__main__"},
]
APART = [
    ("search", "parts"),
    ("search", "measure"),
    ("verify", "measure"),
    ("budget", "measure"),
    ("parts", "measure"),
    ("verify", "parts"),
    ("budget", "parts"),
    ("search", "verify"),
    ("search", "budget"),
    ("verify", "budget"),
    ("search", "worst"),
    ("spec", "figures"),
    ("ranges", "material"),
]  # never import each other
FENCES = {
    "sympy": ("material/", "network.py"),
    "scipy": ("search/", "minimax.py", "draws/", "parts/", "measure/"),
    "matplotlib": ("figures/",),
    "click": ("cli/", "__main__.py"),
    "rich": ("cli/",),
    "pydantic": ("material/files.py", "brief/shape.py", "plan_file.py", "measure/request_shape.py"),
    "openpyxl": ("measure/",),
    "pint": ("units.py",),
    "jinja2": ("spec/",),
    "distributed": ("workflow/executors.py",),
}


def relative(path):
    return path.relative_to(PACKAGE).as_posix()


def group(path):
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imports(path):
    """Yield (module, inside a function or a type-checking block) for each import."""
    tree = ast.parse(path.read_text())
    top = {id(node) for node in tree.body}
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            for alias in node.names:
                yield alias.name, id(node) not in top
        elif isinstance(node, ast.ImportFrom):
            yield node.module or "", id(node) not in top


def rank(name):
    return next((k for k, names in enumerate(ORDER) if name in names), None)


def test_the_top_level_is_fixed():
    listed = subprocess.run(
        ["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False
    ).stdout.split("\n")
    names = {line.split("/")[0] for line in listed if line} or {p.name for p in ROOT.iterdir()}
    visible = {name for name in names if not name.startswith(".")}
    built = {"build", "dist", "tcplan.egg-info"}
    allowed = {"README.md", "DEVELOPERS.md", "pyproject.toml", "tcplan", "tests", "examples", "docs"}
    assert visible - built == allowed


@pytest.mark.parametrize("path", MODULES, ids=relative)
def test_imports_point_left(path):
    own = group(path)
    if own == "__init__":
        return
    assert rank(own) is not None, f"{own} has no place in the import order"
    for module, _ in imports(path):
        parts = module.split(".")
        if parts[0] != "tcplan" or len(parts) == 1:
            continue
        assert rank(parts[1]) is not None, module
        assert rank(parts[1]) <= rank(own), f"{relative(path)} imports {module}, to its right"
        for pair in APART:
            assert not (own in pair and parts[1] in pair and own != parts[1]), f"{own} imports {module}"


@pytest.mark.parametrize("path", MODULES, ids=relative)
def test_fences(path):
    for module, _ in imports(path):
        where = FENCES.get(module.split(".")[0])
        if where is not None:
            assert relative(path).startswith(where), f"{relative(path)} imports {module}"


@pytest.mark.parametrize("path", MODULES, ids=relative)
def test_nothing_dangerous_or_chatty(path):
    for node in ast.walk(ast.parse(path.read_text())):
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name):
            assert node.func.id not in ("eval", "exec", "compile", "__import__"), relative(path)
            if node.func.id in ("print", "exit"):
                assert relative(path).startswith(("cli/", "__main__.py"))
        if isinstance(node, (ast.Attribute, ast.Name)):
            name = node.attr if isinstance(node, ast.Attribute) else node.id
            assert name not in ("sympify", "parse_expr"), relative(path)


@pytest.mark.parametrize("path", MODULES, ids=relative)
def test_every_module_has_content_and_says_what_it_is(path):
    tree = ast.parse(path.read_text())
    assert ast.get_docstring(tree), relative(path)
    if path.name != "__init__.py":
        kinds = (ast.FunctionDef, ast.ClassDef, ast.Assign, ast.AnnAssign)
        assert any(isinstance(node, kinds) for node in tree.body), f"{relative(path)} is an empty shell"


@pytest.mark.parametrize("path", MODULES, ids=relative)
def test_public_functions_have_docstrings(path):
    for node in ast.parse(path.read_text()).body:
        if isinstance(node, (ast.FunctionDef, ast.ClassDef)) and not node.name.startswith("_"):
            assert ast.get_docstring(node), f"{relative(path)}: {node.name}"


def loaded_by(code):
    script = f"{code}\nimport sys, json; print(json.dumps(sorted(sys.modules)))"
    result = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, check=True, cwd=ROOT
    )
    return set(json.loads(result.stdout.splitlines()[-1]))  # parents of submodules are there too


def test_importing_tcplan_is_cheap():
    heavy = {"sympy", "scipy", "matplotlib", "pint", "numpy", "pydantic", "jinja2", "click"}
    assert not heavy & loaded_by("import tcplan")


def test_a_plan_of_films_needs_no_heavy_library():
    code = (
        "from pathlib import Path\nimport tcplan\n"
        "tcplan.make_plan(tcplan.read_brief(Path('examples/brake_sensor_films/brief.toml')))"
    )
    assert not {"sympy", "scipy.optimize", "matplotlib", "pint"} & loaded_by(code)


def test_the_public_list_is_guarded():
    import tcplan

    assert sorted(tcplan.__all__) == [
        "Brief",
        "Goal",
        "InputError",
        "Leg",
        "Limit",
        "Material",
        "NoAnswer",
        "Option",
        "Parallel",
        "Plan",
        "Polynomial",
        "Problem",
        "Series",
        "Spread",
        "TcplanError",
        "TemperatureRange",
        "__version__",
        "make_plan",
        "named_range",
        "network_text",
        "parse_network",
        "parse_quantity",
        "plan_json",
        "published",
        "read_brief",
        "read_materials",
        "read_plan",
        "temperature_range",
        "write_plan",
    ]
    for name in tcplan.__all__:
        assert getattr(tcplan, name) is not None
    with pytest.raises(AttributeError):
        tcplan.nothing_of_the_kind  # noqa: B018


def test_the_version_is_stated_once():
    import tomllib

    import tcplan

    assert tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]["version"] == tcplan.__version__
