"""The house rules: who imports whom, what an import costs, what no tracked file holds."""

import ast
import re
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

import pathaudit as pa

ROOT = Path(__file__).parents[1]
PACKAGE = ROOT / "pathaudit"

ORDER = [
    "conventions", "errors", "runs", "writing", "kernels", "taskpath", "course", "arm", "tolerances", "cell", "given", "reading", "converting", "capacity", "motion", "measures", "between",
    "proof", "causes", "findings", "hidden", "retiming", "edits", "by_hand", "changes", "earlier", "against", "pipeline", "spread", "notes", "report", "charts", "widgets", "cli",
    "__main__",
]  # fmt: skip
"""From the top of the house to the bottom: a module imports only from rooms above its own, or from its own room."""

LATE = {("arm", "reading"), ("retiming", "pipeline"), ("against", "report"), ("pipeline", "report"), ("pipeline", "widgets")}
"""Calls downwards for a user's convenience (`Arm.from_urdf`, `retiming.audit()`, `audit.findings`, showing an audit): inside functions only."""


def modules():
    return sorted(file for file in PACKAGE.rglob("*.py") if file != PACKAGE / "__init__.py" and "demo" not in file.parts)


def name_of(file):
    return ".".join(file.relative_to(PACKAGE).with_suffix("").parts).removesuffix(".__init__")


def imports(file):
    """(module inside the package, stands in a function) of each import of the package by itself."""
    tree = ast.parse(file.read_text("utf-8"))
    late = {id(node) for function in ast.walk(tree) if isinstance(function, (ast.FunctionDef, ast.AsyncFunctionDef)) for node in ast.walk(function)}
    here = ["pathaudit", *file.relative_to(PACKAGE).with_suffix("").parts]
    for node in ast.walk(tree):
        if isinstance(node, ast.ImportFrom) and (node.level or (node.module or "").split(".")[0] == "pathaudit"):
            base = (here[: -node.level] if node.level else []) + (node.module.split(".") if node.module else [])
            for alias in node.names:
                deeper = PACKAGE.joinpath(*base[1:], alias.name)
                target = [*base, alias.name] if deeper.with_suffix(".py").exists() or deeper.is_dir() else base
                yield ".".join(target[1:]), id(node) in late
        elif isinstance(node, ast.Import):
            for alias in node.names:
                if alias.name.split(".")[0] == "pathaudit":
                    yield alias.name.partition(".")[2], id(node) in late


def room(module):
    return module.split(".")[0]


def test_every_module_has_its_room():
    assert {room(name_of(file)) for file in modules()} <= set(ORDER)


@pytest.mark.parametrize("file", modules(), ids=name_of)
def test_imports_go_upwards(file):
    mine = room(name_of(file))
    for module, late in imports(file):
        if module and room(module) != mine:
            upwards = ORDER.index(room(module)) < ORDER.index(mine)
            assert upwards or (late and (mine, room(module)) in LATE), f"{name_of(file)} imports {module}"


def test_no_two_modules_import_each_other():
    above = {name_of(file): {module for module, late in imports(file) if not late} for file in modules()}

    def settle(module, trail=()):
        assert module not in trail, f"a circle of imports: {' -> '.join((*trail, module))}"
        for other in above.get(module, ()):
            settle(other, (*trail, module))

    for module in above:
        settle(module)


def loaded(statements):
    """Top-level names of the modules outside the standard library that `statements` load in a new interpreter."""
    code = f"import sys\nbefore = set(sys.modules)\n{statements}\nprint(*{{m.split('.')[0] for m in set(sys.modules) - before}})"
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.split()
    return {name for name in found if name not in sys.stdlib_module_names and not name.startswith("_")}


def test_importing_the_package_loads_numpy_at_most():
    assert loaded("import pathaudit") <= {"pathaudit", "numpy"}


def test_reading_and_describing_load_numpy_at_most():
    assert loaded("import pathaudit as pa\npa.Arm, pa.Path, pa.Cell, pa.Thresholds, pa.path_from, pa.read_path, pa.read_cell, pa.ReadError") <= {"pathaudit", "numpy"}


def test_checking_loads_no_table_or_widget_library():
    heavy = {"pandas", "scipy", "plotly", "ipywidgets", "anywidget", "PIL", "IPython", "matplotlib"}
    assert not heavy & loaded("import pathaudit as pa\npa.audit\nimport pathaudit.cli, pathaudit.report.tables, pathaudit.report.text, pathaudit.writing")


def test_every_public_name_is_there():
    for name in pa.__all__:
        assert getattr(pa, name) is not None
    assert set(pa.__all__) <= set(dir(pa))
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        pa.nothing


def test_the_audit_is_the_function_however_it_was_imported():
    import pathaudit.pipeline

    assert pa.audit is pathaudit.pipeline.audit and callable(pa.audit)


def test_versions_agree():
    assert tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]["version"] == pa.__version__


@pytest.mark.parametrize("file", modules(), ids=name_of)
def test_nothing_prints(file):
    calls = [node.func.id for node in ast.walk(ast.parse(file.read_text("utf-8"))) if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)]
    assert "print" not in calls


def tracked():
    listing = subprocess.run(["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, text=True)
    if listing.returncode:
        pytest.skip("not a git checkout")
    return [ROOT / name for name in listing.stdout.split("\0") if name]


def test_no_tracked_file_holds_a_path_of_a_machine():
    places = re.compile(rb"(?<![\w.])/(?:work|root|home|Users|tmp/team)/\w|[A-Z]:\\\\?Users")
    held = [f"{file.relative_to(ROOT)}: {found[0].decode()}" for file in tracked() if file.is_file() and (found := places.search(file.read_bytes()))]
    assert not held
