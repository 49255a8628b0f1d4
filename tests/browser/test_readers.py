"""Everybody who is handed an audit can read it: picture, verdict, findings, retiming and notes in each reader, with and without a kernel.

No reader shows a message about a widget that it cannot draw, asks for anything off the machine, or has an error of ours in its console.
"""

import base64
import json
import os
import re
import subprocess
import sys

import hosts
import nbconvert
import nbformat
import pytest

import pathaudit as pa
from pathaudit.notes import Notes, new_note, placed, write_notes
from pathaudit.report.page import one_page

PICTURES = """() => [...document.querySelectorAll(".pa-rows canvas, .jp-OutputArea-output img, .jp-OutputArea-output svg, .pa-picture svg, .pa-picture img")]
    .filter((e) => e.checkVisibility() && (e.naturalWidth ?? 1) > 0 && e.getBoundingClientRect().width > 300)
    .filter((e) => e.getBoundingClientRect().right <= e.closest(".jp-OutputArea, body").getBoundingClientRect().right + 1).length"""
"""How many pictures are seen whole."""
BROKEN = re.compile("model not found|loading widget|displaying widget|could not be displayed|instantiate widget|a jupyter widget|cannot be drawn", re.IGNORECASE)
LAB_SAYS = ("widget model not found",)
"""The Lab's own line in the console for every widget whose kernel has ended."""


@pytest.fixture(scope="module")
def audit():
    return pa.audit(pa.read_path(hosts.DEMO / "seam.csv"), pa.read_cell(hosts.DEMO / "cell.toml"))


NOTES = ("The neck touches the clamp <b>here</b>.\nAsk for the shorter one.", "Slower would spoil the bead & the root.")
AUTHOR = "Ada of the night shift"


@pytest.fixture(scope="module")
def notes(lab, audit):
    """Two notes of somebody's, one at a place and one on a finding, in the file beside the notebooks."""
    made = new_note(audit, 300, NOTES[0], AUTHOR), new_note(audit, None, NOTES[1], AUTHOR, finding=1)
    write_notes(lab.root / "seam.notes.toml", Notes(made))
    return placed(Notes(made), audit)


def wanted(audit):
    """What every reader must find in words."""
    return [audit.verdict, audit.cell.name, *(finding.why for finding in audit.finding_list), audit.suggestion.why.split(",")[0],
            AUTHOR, *(line for text in NOTES for line in text.splitlines())]


def plain(text):
    return " ".join(text.split()).casefold()


def missing(audit, text):
    return [words for words in wanted(audit) if plain(words) not in plain(text)]


def assert_read(audit, page):
    """The page shows at least one picture and all the words, and no word about a broken widget."""
    page.wait_for_function(f"() => ({PICTURES})() > 0")
    page.wait_for_function("(words) => document.body.innerText.toLowerCase().includes(words)", arg=audit.finding_list[-1].why.casefold())
    page.wait_for_function("() => !/loading widget|model not found/i.test(document.body.innerText)")
    text = page.locator("body").inner_text()
    assert missing(audit, text) == []
    assert not BROKEN.search(text)


@pytest.fixture(scope="module")
def handed_on(lab, desk, notes):
    """The notebooks that are handed on: run and saved in the Lab without and with the widgets' state, and changed by somebody whom nobody trusts."""
    page = desk.page
    lab.write("made.ipynb", hosts.SHOW)
    lab.open(page, "made.ipynb")
    lab.run(page)
    hosts.painted(page)
    page.wait_for_selector(".pathaudit-tables", state="attached")
    lab.save(page)
    made = {"plain": lab.read("made.ipynb")}
    with lab.saving_state(page):
        lab.save(page)
        made["state"] = lab.read("made.ipynb")
    lab.write("nothing.ipynb", "")
    for name, notebook in list(made.items()):
        lab.store(f"{name}.ipynb", notebook)
        changed = json.loads(json.dumps(notebook))
        changed["cells"][0]["source"] += "\n# from somebody else"
        lab.store(f"{name}-untrusted.ipynb", changed)
    return made


@pytest.fixture(scope="module")
def reader(lab, chromium, handed_on):
    """A Lab that has run nothing: somebody else's, one page for all that is opened there."""
    watched = hosts.Watched(chromium, host_says=LAB_SAYS)
    lab.open(watched.page, "nothing.ipynb")
    yield watched
    watched.close()


def opened(lab, reader, name):
    reader.faults.clear()
    lab.open(reader.page, name)
    return reader.page


def test_jupyterlab_live(handed_on, page, audit):
    assert_read(audit, page)
    assert page.locator(".pathaudit-tables").is_hidden()


@pytest.mark.parametrize("name", ["plain", "state", "plain-untrusted", "state-untrusted"])
def test_jupyterlab_with_nothing_run(lab, reader, audit, name):
    page = opened(lab, reader, f"{name}.ipynb")
    trusted = page.evaluate("jupyterapp.shell.currentWidget.content.model.cells.get(0).trusted")
    assert trusted == ("untrusted" not in name)
    assert_read(audit, page)
    assert lab.ask(page, "'audit' in globals()") == "False"
    assert reader.faults == []


def test_what_was_saved_with_state_is_drawn_and_says_that_nobody_answers(lab, reader):
    page = opened(lab, reader, "state.ipynb")
    before = hosts.painted(page)
    assert "no kernel" in page.locator(".pa-status").inner_text()
    assert page.locator(".pa").evaluate("(root) => getComputedStyle(root.parentNode, '::before').content") == "none"
    page.locator(".pa-rows").focus()
    page.keyboard.press("Home")
    hosts.painted(page, before)
    assert page.locator(".pa").get_attribute("data-cursor") == "0"
    assert reader.faults == []


def test_saving_what_was_never_run_keeps_the_still_form(lab, reader, audit):
    """With nothing run, saving with state wipes the stored state: what is left must be read all the same."""
    lab.store("kept.ipynb", lab.read("state.ipynb"))
    page = opened(lab, reader, "kept.ipynb")
    hosts.painted(page)
    with lab.saving_state(page):
        lab.save(page)
    (cell,) = lab.read("kept.ipynb")["cells"]
    assert [set(output["data"]) for output in cell["outputs"]][1:] == [{"image/svg+xml", "image/png", "text/plain"}, {"text/html", "text/plain"}]
    lab.store("kept-again.ipynb", lab.read("kept.ipynb"))
    assert_read(audit, opened(lab, reader, "kept-again.ipynb"))
    assert reader.faults == []


def test_notebook_7(lab, page, watched, audit, handed_on):
    """Live with a kernel that works already, and a notebook of somebody else's with one that has run nothing."""
    lab.write("seven.ipynb", hosts.SHOW)
    lab.open(page, "seven.ipynb")
    seven = watched(host_says=LAB_SAYS, host_code="/static/notebook/").page      # Notebook trips over its own start now and then
    lab.open_in_notebook(seven, "seven.ipynb")
    lab.run(seven)
    hosts.painted(seven)
    assert_read(audit, seven)
    lab.open_in_notebook(seven, "plain.ipynb")
    assert_read(audit, seven)
    assert seven.locator(".pathaudit-tables").is_visible()


@pytest.fixture(scope="module")
def template_asks(handed_on):
    """What an export asks for without anything of ours in it: the template's own scripts."""
    empty = nbformat.v4.new_notebook(metadata={"widgets": handed_on["state"]["metadata"]["widgets"]})
    return exported(empty, sanitize=False)


def exported(notebook, sanitize):
    return nbconvert.HTMLExporter(sanitize_html=sanitize).from_notebook_node(notebook)[0]


@pytest.mark.parametrize("sanitize", [False, True], ids=["as it is", "sanitised"])
@pytest.mark.parametrize("name", ["plain", "state"])
def test_an_export_to_html(watched, tmp_path, audit, handed_on, template_asks, name, sanitize):
    file = tmp_path / "export.html"
    file.write_text(exported(nbformat.reads(json.dumps(handed_on[name]), 4), sanitize), encoding="utf-8")
    reader = watched(host_says=("net::ERR_NAME_NOT_RESOLVED",))      # the template's scripts
    reader.page.goto(file.as_uri())
    assert_read(audit, reader.page)
    assert [url for url in reader.off_host if url not in template_asks] == []
    reader.faults[:] = [fault for fault in reader.faults if not fault.startswith("off-host")]


@pytest.mark.parametrize("scripts", [True, False], ids=["scripts on", "scripts off"])
def test_the_one_page(watched, tmp_path, audit, notes, scripts):
    file = tmp_path / "audit.html"
    file.write_text(one_page(audit, notes), encoding="utf-8")
    page = watched(java_script_enabled=scripts).page
    page.goto(file.as_uri())
    if scripts:
        hosts.painted(page)
        assert_read(audit, page)
    else:
        assert page.locator(".pa-picture svg").is_visible()
        assert missing(audit, page.locator("body").inner_text()) == []


SCRIPT = f"""import pathaudit as pa
audit = pa.audit(pa.read_path({str(hosts.DEMO / "seam.csv")!r}), pa.read_cell({str(hosts.DEMO / "cell.toml")!r}))
"""


@pytest.mark.parametrize("program, last", [(["-c"], "pa.show(audit)"), (["-m", "IPython", "--no-banner", "--colors=nocolor", "-c"], "audit")],
                         ids=["python", "ipython"])
def test_a_terminal(tmp_path, lab, audit, notes, program, last):
    done = subprocess.run([sys.executable, *program, SCRIPT + last], capture_output=True, text=True, timeout=60, cwd=lab.root,
                          env={**os.environ, "IPYTHONDIR": str(tmp_path), "PYTHONPATH": str(hosts.HERE.parents[1])})
    assert done.returncode == 0 and done.stderr == ""
    assert missing(audit, done.stdout) == []
    assert "{" not in done.stdout and max(map(len, done.stdout.splitlines())) <= 120


def test_what_is_handed_on_is_small(audit, handed_on):
    assert audit.path.samples > 2000
    assert len(json.dumps(handed_on["plain"])) <= 300_000
    assert len(json.dumps(handed_on["state"])) <= 600_000
    _, *still = handed_on["plain"]["cells"][0]["outputs"]
    assert len(still) == 2 and len(json.dumps(still)) <= 200_000
    (picture,) = (output["data"]["image/png"] for output in still if "image/png" in output["data"])
    assert base64.b64decode(picture)[:8] == b"\x89PNG\r\n\x1a\n"
