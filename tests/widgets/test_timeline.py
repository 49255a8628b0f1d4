"""The widget without a browser: its traits, its messages, the three outputs."""

import base64
import html
import json
import sys
import time
from threading import Event
from types import SimpleNamespace

import nbconvert
import nbformat
import numpy as np
import pytest
from example_arms import swaying_audit
from fake_audit import fake_audit

from pathaudit.report.tables import retimed_csv
from pathaudit.widgets import timeline as module
from pathaudit.widgets.still_form import still_form
from pathaudit.widgets.timeline import Timeline


@pytest.fixture
def audit():
    return fake_audit(1200)


@pytest.fixture
def timeline(audit):
    made = Timeline(audit)
    yield made
    made.close()


def from_browser(timeline, content):
    """Deliver a message as the browser's would arrive."""
    timeline._handle_msg({"content": {"data": content}, "buffers": []})


def test_the_state_is_small_and_plain(timeline):
    state = timeline.get_state()
    json.dumps(state["facts"], allow_nan=False)
    assert isinstance(state["block"], bytes) and 10_000 < len(state["block"]) < 200_000
    assert state["facts"]["layout"][0] == ["sample", 1]
    assert len(state["_esm"]) < 45_000


def test_the_cursor_comes_from_the_browser(timeline):
    from_browser(timeline, {"method": "update", "state": {"cursor": 734}, "buffer_paths": []})
    assert timeline.cursor == 734


def settled(timeline):
    """Wait until the worker has nothing left to do."""
    timeline.session._worker._pool.submit(lambda: None).result(20)


def ask(timeline, **content):
    from_browser(timeline, {"method": "custom", "content": content})
    if timeline.session._worker._pool:
        settled(timeline)


@pytest.fixture(scope="module")
def real():
    return swaying_audit(2)


@pytest.fixture
def bench(real):
    made = Timeline(real)
    yield made
    made.close()


def test_the_suggestion_is_taken_over_and_given_back(bench, real):
    given = bench.block
    assert bench.facts["retiming"]["applied"] is False and bench.trial["offers"]
    ask(bench, do="accept")
    assert bench.facts["retiming"]["applied"] is True and bench.block != given and bench.status == ""
    assert bench.facts["duration_s"] == pytest.approx(real.suggestion.duration)
    assert {offer["state"] for offer in bench.trial["offers"]} == {"accepted"}
    assert {change["what"] for change in bench.trial["changes"]} >= {"gone"} or any(c["what"] == "better" for c in bench.trial["changes"])
    ask(bench, do="show", name="as programmed")
    assert bench.block == given and bench.session.shown.audit is real


def test_the_browser_slows_locks_frees_undoes(bench):
    ask(bench, do="slow", first=40, last=80, factor=0.5, gesture=1)
    ask(bench, do="slow", first=40, last=80, factor=0.4, gesture=1)
    ask(bench, do="lock", first=100, last=90)
    assert [(e["kind"], e["first"], e["last"]) for e in bench.trial["edits"]] == [("slow", 40, 80), ("lock", 90, 100)]
    assert bench.trial["edits"][0]["percent"] == pytest.approx(40.0)
    assert bench.trial["why"].startswith("Slows") and bench.trial["undo"] and not bench.trial["redo"]
    ask(bench, do="undo")
    ask(bench, do="undo")
    assert bench.trial["edits"] == [] and bench.trial["redo"] and bench.trial["changes"] == []
    ask(bench, do="redo")
    ask(bench, do="free", first=0, last=60)
    assert [(e["first"], e["last"]) for e in bench.trial["edits"]] == [(61, 80)]


def test_a_stretch_of_the_suggestion_is_rejected(bench):
    offer = bench.trial["offers"][0]
    ask(bench, do="accept")
    ask(bench, do="reject", first=offer["first"], last=offer["last"])
    states = [o["state"] for o in bench.trial["offers"]]
    assert states[0] == "rejected" and set(states[1:]) <= {"accepted"}


def test_variants_are_kept_shown_dropped_and_written(bench, real, monkeypatch):
    sent = []
    monkeypatch.setattr(bench, "send", lambda content, buffers=None: sent.append((content, buffers)))
    ask(bench, do="accept")
    ask(bench, do="keep", name="as suggested")
    assert [(v["name"], v["shown"]) for v in bench.trial["variants"]] == [("as programmed", False), ("as suggested", True)]
    ask(bench, do="export", name="as suggested")
    (content, (text,)), = sent
    assert content == {"save": "arrays-as-suggested.csv"}
    assert text.decode() == retimed_csv(bench.session.shown.retiming)
    ask(bench, do="show", name="as programmed")
    ask(bench, do="export", name="as programmed")
    assert len(sent) == 1 and "no other times to write" in bench.status
    ask(bench, do="drop", name="as suggested")
    assert [v["name"] for v in bench.trial["variants"]] == ["as programmed"]


def test_a_failure_in_the_worker_is_shown(bench, monkeypatch):
    monkeypatch.setattr("pathaudit.widgets.session.by_hand", lambda *_: 1 / 0)
    ask(bench, do="slow", first=1, last=5, factor=0.5)
    assert bench.status == "That did not work. ZeroDivisionError: division by zero" and bench.trial["edits"] == []


@pytest.mark.parametrize("content, words", [
    ({"do": "something unknown"}, "something unknown"), ({}, "None"), ({"do": "slow", "first": 0, "last": 3}, "factor"), ({"do": "keep", "name": " "}, "expected one of your own"),
    ({"do": "show", "name": "never kept"}, "never kept"), ({"do": "slow", "first": "x", "last": 3, "factor": 1}, "x"),
])
def test_a_message_that_cannot_be_meant_is_told(bench, content, words):
    from_browser(bench, {"method": "custom", "content": content})
    assert bench.status.startswith("That did not work.") and words in bench.status


def test_a_stretch_beyond_the_path_is_cut_to_it(bench, real):
    ask(bench, do="slow", first=-50, last=10**9, factor=0.9)
    assert [(e["first"], e["last"]) for e in bench.trial["edits"]] == [(0, real.path.samples - 1)]


def test_a_note_from_the_browser_is_kept_and_shown(bench, tmp_path):
    bench.noting._file = str(tmp_path / "job.notes.toml")
    ask(bench, do="note add", sample=40, finding=None, author="A. Weber", text="first line\nsecond")
    assert [(n["text"], n["sample"], n["author"]) for n in bench.notes["notes"]] == [("first line\nsecond", 40, "A. Weber")]
    assert (tmp_path / "job.notes.toml").exists() and bench.notes["fault"] == ""
    ask(bench, do="note add", sample=40, finding=None, author="A. Weber", text="  ")
    assert "without words" in bench.notes["fault"] and bench.status == ""


def test_what_is_told_is_plain_json(bench):
    ask(bench, do="slow", first=10, last=50, factor=0.5)
    json.dumps(bench.trial, allow_nan=False)


@pytest.mark.parametrize("samples, n", [(2, 1), (2, 12), (200_000, 6)])
def test_any_size_of_path(samples, n):
    timeline = Timeline(fake_audit(samples, n))
    assert len(timeline.block) < 600_000
    timeline.close()


def test_the_still_form_is_small_and_holds_everything(audit):
    picture, tables = still_form(audit)
    assert set(picture) == {"image/svg+xml", "image/png", "text/plain"} and set(tables) == {"text/html", "text/plain"}
    assert base64.b64decode(picture["image/png"])[:8] == b"\x89PNG\r\n\x1a\n"
    assert len(json.dumps([picture, tables])) <= 200_000
    for words in ("near-singular", audit.path.sha256, audit.suggestion.why, "This is not a risk assessment.", "FAIL"):
        assert words in tables["text/html"]


@pytest.mark.parametrize("sanitize", [False, True])
def test_an_export_of_a_notebook_can_be_read(audit, sanitize):
    new = nbformat.v4.new_output
    view = {"application/vnd.jupyter.widget-view+json": {"model_id": "gone", "version_major": 2, "version_minor": 0}, "text/plain": "Path audit"}
    cell = nbformat.v4.new_code_cell("audit", outputs=[new("display_data", bundle) for bundle in (view, *still_form(audit))])
    page, _ = nbconvert.HTMLExporter(sanitize_html=sanitize).from_notebook_node(nbformat.v4.new_notebook(cells=[cell]))
    assert "data:image/png;base64" in page or "<svg" in page
    for words in (*(finding.why for finding in audit.finding_list), audit.path.sha256):
        assert words in html.unescape(page)
    assert not any(f"&lt;{tag}" in page for tag in ("p&gt;", "th", "td", "tr", "div", "b&gt;"))      # no tag of ours is shown as text
    assert not sanitize or "model not found" not in page and "max-width: 100%; }" not in page[page.index("Cautions"):]


class Events(list):
    """What is to be called when a cell has run."""

    def register(self, event, act):
        assert event == "post_run_cell"
        self.append(act)

    def unregister(self, event, act):
        self.remove(act)


class Handle:
    """A displayed output that can be drawn again."""

    def __init__(self, bundles):
        self.bundles = bundles

    def update(self, bundle, raw):
        self.bundles.append(bundle)


@pytest.fixture
def notebook(monkeypatch):
    """A notebook's shell, as far as show() looks at it; gathers what is displayed, and what is displayed anew."""
    out = []

    def display(bundle, raw, display_id=None):
        out.append(bundle)
        return Handle(out) if display_id else None

    shell = SimpleNamespace(kernel=object(), execution=1, events=Events())
    shell.get_parent = lambda: {"metadata": {"cellId": "cell"}, "header": {"msg_id": shell.execution}}
    fake = SimpleNamespace(get_ipython=lambda: shell)
    monkeypatch.setitem(sys.modules, "IPython", fake)
    monkeypatch.setitem(sys.modules, "IPython.display", SimpleNamespace(display=display))
    monkeypatch.setattr(module, "_ON_SHOW", {})
    return shell, out


def test_three_outputs_in_a_notebook(notebook, audit):
    _, out = notebook
    module.show(audit)
    assert [next(iter(bundle)) for bundle in out] == ["application/vnd.jupyter.widget-view+json", "image/svg+xml", "text/html"]
    assert out[0]["text/plain"] == "Path audit of Bracket cell <7>: fail, 4 findings"


def test_the_still_form_follows_what_is_tried(notebook, real, monkeypatch):
    shell, out = notebook
    desk = module.show(real)
    assert len(out) == 3
    desk.accept()
    shell.events[0](None)      # the cell has run
    assert [next(iter(bundle)) for bundle in out[3:]] == ["image/svg+xml", "text/html"]
    assert "Shown at other speeds than programmed" in out[4]["text/html"]
    desk.note("look here <b>", float(real.time[20]))
    shell.events[0](None)
    assert "look here &lt;b&gt;" in out[6]["text/html"] and "look here" in out[6]["text/plain"]
    del out[5:]
    shell.events[0](None)
    assert len(out) == 5      # nothing has changed since
    monkeypatch.setattr("pathaudit.widgets.still_form.QUIET", 0.05)
    desk.undo()
    for _ in range(100):
        if len(out) == 7:
            break
        time.sleep(0.05)
    assert len(out) == 7 and "Shown at other speeds" not in out[6]["text/html"] and "look here" in out[6]["text/html"]
    (_, (timeline,)), = module._ON_SHOW.values()
    timeline.close()
    assert shell.events == []


def test_plain_text_in_a_terminal(notebook, audit):
    shell, out = notebook
    del shell.kernel
    module.show(audit)
    (bundle,) = out
    assert list(bundle) == ["text/plain"]
    assert bundle["text/plain"].startswith("FAIL") and audit.finding_list[0].why.split(",")[0] in bundle["text/plain"].replace("\n", " ")


def test_notes_stay_in_the_file_named_where_there_is_no_notebook(notebook, real, tmp_path):
    shell, _ = notebook
    del shell.kernel
    desk = module.show(real, tmp_path / "mine.notes.toml")
    desk.note("look here", float(real.time[20]), "A. Weber")
    assert "look here" in (tmp_path / "mine.notes.toml").read_text(encoding="utf-8")


def test_a_cell_that_is_run_again_lets_its_old_timelines_go(notebook, audit):
    shell, _ = notebook
    module.show(audit)
    module.show(audit)
    (_, first), = module._ON_SHOW.values()
    assert len(first) == 2 and all(widget.comm is not None for widget in first)
    shell.execution = 2
    module.show(audit)
    (_, second), = module._ON_SHOW.values()
    assert len(second) == 1
    assert all(widget.comm is None and widget.layout.comm is None for widget in first)
    second[0].close()


def test_nothing_that_is_drawn_changes_the_audit(audit):
    before = audit.joints.copy(), audit.rates.speed_share.copy()
    Timeline(audit).close()
    still_form(audit)
    np.testing.assert_array_equal(audit.joints, before[0])
    np.testing.assert_array_equal(audit.rates.speed_share, before[1])


def test_what_the_worker_does_is_said_until_it_is_given_up(bench, monkeypatch):
    begun, go = Event(), Event()
    monkeypatch.setattr(module, "LONG", 0)
    monkeypatch.setattr(bench, "drawn", lambda variant: (begun.set(), go.wait(10)))
    bench._on_message(bench, {"do": "slow", "first": 0, "last": 100, "factor": 0.5}, [])
    assert begun.wait(10) and bench.status.startswith("Working: ") and bench.trial["busy"]
    bench._on_message(bench, {"do": "cancel"}, [])
    assert bench.status == "" and not bench.trial["busy"]
    go.set()
