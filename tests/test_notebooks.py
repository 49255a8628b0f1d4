"""The notebooks run from top to bottom, are short, and their stored outputs are what a run gives."""

import json
import re
import shutil

import make_demo
import pytest

NOTEBOOKS = sorted(make_demo.NOTEBOOKS.glob("*.ipynb"))


def ids(file):
    return file.name


@pytest.fixture(scope="module", params=make_demo.NOTEBOOK_NAMES)
def run_again(request, tmp_path_factory):
    """(stored, run again in a copy of the demo) of each notebook."""
    folder = tmp_path_factory.mktemp("demo") / "cell"
    shutil.copytree(make_demo.DEMO, folder, ignore=shutil.ignore_patterns("__pycache__", ".*"))
    stored = json.loads((make_demo.NOTEBOOKS / request.param).read_text("utf-8"))
    return stored, make_demo.run_notebook(folder, request.param)


def said(cell):
    """What a code cell says: printed lines, and the words and numbers of tables in any layout; not the widget, its picture, its tables."""
    lines, words = [], []
    for output in cell["outputs"]:
        if output.get("name") == "stdout":
            lines += "".join(output["text"]).splitlines()
        elif output["output_type"] == "execute_result":
            words += re.findall(r"[\w.%]+", "".join(output["data"]["text/plain"]))
    return lines, sorted(word for word in words if word not in ("NaN", "None"))  # versions of pandas differ in what an empty cell shows


def code_cells(notebook):
    return [cell for cell in notebook["cells"] if cell["cell_type"] == "code"]


def test_the_notebook_runs_and_says_what_is_stored(run_again):
    stored, fresh = map(code_cells, run_again)
    assert len(stored) == len(fresh)
    for old, new in zip(stored, fresh, strict=True):
        assert said(old) == said(new)
    assert any(said(cell)[0] for cell in fresh)


def test_audits_show_themselves_in_three_outputs(run_again):
    shown = [cell for cell in code_cells(run_again[1]) if any("application/vnd.jupyter.widget-view+json" in o.get("data", {}) for o in cell["outputs"])]
    asked = [cell for cell in code_cells(run_again[1]) if re.search(r"^(audit|moved)$|pa\.show\(", "".join(cell["source"]), re.M)]
    assert shown == asked
    for cell in shown:
        widget, picture, tables = cell["outputs"]
        assert "text/plain" in widget["data"]
        assert {"image/png", "image/svg+xml"} <= set(picture["data"])
        assert "text/html" in tables["data"]


@pytest.mark.parametrize("file", NOTEBOOKS, ids=ids)
def test_notebooks_are_short_stored_with_outputs_and_small(file):
    notebook = json.loads(file.read_text("utf-8"))
    lines = [line for cell in code_cells(notebook) for line in "".join(cell["source"]).splitlines() if line.strip()]
    assert len(lines) <= 45
    assert max(map(len, lines)) <= 110
    assert not [line for line in lines if line.lstrip().startswith(("def ", "class ", "if ", "while ", "import os", "import sys"))]
    assert all(cell["execution_count"] == k for k, cell in enumerate(code_cells(notebook), 1))
    outputs = [output for cell in code_cells(notebook) for output in cell["outputs"]]
    assert not [output for output in outputs if output["output_type"] == "error" or output.get("name") == "stderr"]
    assert "widgets" not in notebook["metadata"]
    assert file.stat().st_size <= 600_000
