"""The widget without a browser: its traits, its messages, the three outputs."""

import base64
import html
import json
import sys
from types import SimpleNamespace

import nbconvert
import nbformat
import numpy as np
import pytest
from fake_audit import fake_audit

from pathaudit.widgets import timeline as module
from pathaudit.widgets.timeline import Timeline, still_form


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


def test_the_retimed_audit_is_fetched_and_given_back(timeline, audit):
    given = timeline.block
    assert timeline.facts["retiming"]["applied"] is False
    timeline.show_retimed(True).result(10)
    assert timeline.facts["retiming"]["applied"] is True and timeline.block != given and timeline.status == ""
    assert timeline.facts["duration_s"] > audit.path.duration
    timeline.show_retimed(False).result(10)
    assert timeline.block == given and timeline.session.shown is audit


def test_the_button_of_the_browser_asks_for_the_retimed_audit(timeline):
    from_browser(timeline, {"method": "custom", "content": {"do": "show retimed", "on": True}})
    timeline.session._worker.submit(lambda: None).result(10)
    assert timeline.facts["retiming"]["applied"] is True


def test_a_failure_in_the_worker_is_shown(timeline, audit):
    def broken():
        raise RuntimeError("no such posture")

    audit.suggestion.audit = broken
    timeline.show_retimed(True).result(10)
    assert timeline.status == "That did not work. RuntimeError: no such posture"


def test_a_failure_in_a_callback_is_shown(timeline, monkeypatch):
    monkeypatch.setattr(timeline.session, "change", lambda *_: 1 / 0)
    from_browser(timeline, {"method": "custom", "content": {"do": "show retimed", "on": True}})
    assert "ZeroDivisionError" in timeline.status
    from_browser(timeline, {"method": "custom", "content": {"do": "something unknown"}})


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


@pytest.fixture
def notebook(monkeypatch):
    """A notebook's shell, as far as show() looks at it; gathers what is displayed."""
    out = []
    shell = SimpleNamespace(kernel=object(), execution=1)
    shell.get_parent = lambda: {"metadata": {"cellId": "cell"}, "header": {"msg_id": shell.execution}}
    fake = SimpleNamespace(get_ipython=lambda: shell)
    monkeypatch.setitem(sys.modules, "IPython", fake)
    monkeypatch.setitem(sys.modules, "IPython.display", SimpleNamespace(display=lambda bundle, raw: out.append(bundle)))
    monkeypatch.setattr(module, "_ON_SHOW", {})
    return shell, out


def test_three_outputs_in_a_notebook(notebook, audit):
    _, out = notebook
    module.show(audit)
    assert [next(iter(bundle)) for bundle in out] == ["application/vnd.jupyter.widget-view+json", "image/svg+xml", "text/html"]
    assert out[0]["text/plain"] == "Path audit of Bracket cell <7>: fail, 4 findings"


def test_plain_text_in_a_terminal(notebook, audit):
    shell, out = notebook
    del shell.kernel
    module.show(audit)
    (bundle,) = out
    assert list(bundle) == ["text/plain"]
    assert bundle["text/plain"].startswith("FAIL") and audit.finding_list[0].why.split(",")[0] in bundle["text/plain"].replace("\n", " ")


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
