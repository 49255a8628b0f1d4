"""What goes wrong around a timeline is told in words, and what it shows stays readable."""

import hosts
import pytest
from hosts import SHOWN, painted

from pathaudit.report.script import joined_modules

GONE, SILENT = "The kernel behind this timeline has ended", "The kernel has not answered yet"
KERNEL = "jupyterapp.shell.currentWidget.sessionContext.session.kernel"
ACCEPT = "Accept the suggested"


def live(lab, page, name, source=hosts.SHOW):
    lab.write(name, source)
    lab.open(page, name)
    lab.run(page)
    painted(page)


def says(page, words):
    page.wait_for_function("(words) => { const said = document.querySelector('.pa-status').textContent; return words ? said.includes(words) : !said; }", arg=words)


def scrubs(page, view=0):
    """The cursor moves by keys, and nothing stands in the way."""
    page.locator(".pa-rows").nth(view).focus()
    for key, place in (("Home", "0"), ("ArrowRight", "1")):
        page.keyboard.press(key)
        page.wait_for_function("([view, place]) => document.querySelectorAll('.pa')[view].dataset.cursor === place", arg=[view, place])


def accept(page):
    page.get_by_role("button", name=ACCEPT).first.click()


def accepted(page):
    page.wait_for_function("() => document.querySelector('.pa-offers').textContent.includes('accepted')")


def test_a_kernel_that_ends_is_told_and_the_timeline_stays(lab, page, desk):
    """Restarted, which a crash is too, and shut down: one after the other on one notebook."""
    live(lab, page, "ended.ipynb")
    page.evaluate("jupyterapp.shell.currentWidget.sessionContext.restartKernel()")
    says(page, GONE)
    scrubs(page)
    accept(page)
    says(page, GONE)
    assert page.locator(".pa-busy").is_hidden()
    run_again(lab, page)
    page.evaluate("jupyterapp.shell.currentWidget.sessionContext.shutdown()")
    scrubs(page)
    accept(page)
    says(page, GONE)
    scrubs(page)
    page.evaluate("jupyterapp.shell.currentWidget.sessionContext.startKernel()")
    lab.wait_for_kernel(page)
    # the Lab itself says so of what it was asking a kernel that has ended, where it comes to ask
    desk.faults[:] = [fault for fault in desk.faults if "Canceled future for create_subshell_request" not in fault]


def run_again(lab, page):
    """A new kernel and the cell run again put a new timeline in place of the one that was left."""
    lab.wait_for_kernel(page)
    page.evaluate("document.querySelector('.pa').dataset.old = 'yes'")
    lab.run(page)
    page.wait_for_function("() => document.querySelector('.pa[data-painted]:not([data-old])')")
    says(page, "")


def test_what_is_asked_while_the_connection_is_lost_is_answered_when_it_is_back(lab, page):
    live(lab, page, "lost.ipynb")
    page.evaluate(f"() => {{ const k = {KERNEL}; window.connect = k._createSocket; k._createSocket = () => {{}}; k._ws.close(); }}")
    page.wait_for_function(f"() => {KERNEL}.connectionStatus === 'connecting'")
    scrubs(page)
    accept(page)
    scrubs(page)
    assert page.locator(".pa-offers").inner_text().count("accepted") == 0
    page.evaluate(f"() => {{ const k = {KERNEL}; k._createSocket = window.connect; k._createSocket(); }}")
    accepted(page)
    says(page, "")


def test_a_closed_tab_that_is_opened_again_goes_on(lab, page):
    live(lab, page, "closed.ipynb")
    accept(page)
    accepted(page)
    page.locator(".pa-rows").focus()
    page.keyboard.press("End")
    lab.wait_for_answer(page, SHOWN.format("closed") + "[0].cursor == audit.path.samples - 1", "True")
    last = page.locator(".pa").get_attribute("data-cursor")
    page.evaluate("""async () => {
        const before = jupyterapp.shell.currentWidget, path = before.context.path;
        await before.context.save();
        before.dispose();
        await (await jupyterapp.commands.execute('docmanager:open', { path })).context.ready;
    }""")
    lab.wait_for_kernel(page)
    painted(page)
    page.wait_for_function("(last) => document.querySelector('.pa').dataset.cursor === last", arg=last)
    accepted(page)
    page.get_by_role("button", name="Undo the last change").click()
    page.wait_for_function("() => !document.querySelector('.pa-offers').textContent.includes('accepted')")


def test_two_views_of_one_timeline_move_together(lab, page):
    live(lab, page, "views.ipynb")
    page.evaluate("""async () => {
        const panel = jupyterapp.shell.currentWidget;
        panel.content.activeCellIndex = 0;
        await jupyterapp.commands.execute('notebook:create-output-view');
        jupyterapp.shell.activateById(panel.id);
    }""")
    page.wait_for_function("() => document.querySelectorAll('.pa[data-painted]').length === 2")
    for view in (0, 1):
        page.locator(".pa-rows").nth(view).focus()
        page.keyboard.press(["End", "Home"][view])
        page.wait_for_function("(end) => new Set([...document.querySelectorAll('.pa')].map((e) => e.dataset.cursor)).size === 1"
                               " && (document.querySelector('.pa').dataset.cursor === '0') === end", arg=bool(view))
    page.evaluate("() => [...jupyterapp.shell.widgets('main')].filter((e) => e !== jupyterapp.shell.currentWidget).forEach((e) => e.dispose())")


def test_a_timeline_made_behind_another_tab_is_drawn_when_it_is_shown(lab, page):
    lab.write("behind.ipynb", "")
    (lab.root / "front.txt").write_text("in front")
    lab.open(page, "behind.ipynb")
    go = lab.root / "behind.go"
    page.evaluate("(source) => { window.behind = jupyterapp.shell.currentWidget; window.behind.content.model.cells.get(0).sharedModel.setSource(source); }",
                  f"import os, time\nwhile not os.path.exists({str(go)!r}): time.sleep(0.01)\n{hosts.SHOW}")
    lab.run(page)
    page.evaluate("() => { jupyterapp.commands.execute('docmanager:open', { path: 'front.txt' }); }")
    page.wait_for_function("() => jupyterapp.shell.currentWidget?.context?.path === 'front.txt' && window.behind.isHidden")
    go.touch()
    page.wait_for_selector(".pathaudit-tables", state="attached", timeout=60000)
    assert page.locator(".pa[data-painted]").count() == 0
    page.evaluate("() => { const front = jupyterapp.shell.currentWidget; jupyterapp.shell.activateById(window.behind.id); front.dispose(); }")
    painted(page)
    assert page.locator(".pa-rows canvas").first.bounding_box()["width"] > 300
    scrubs(page)


ANY_PATH = f"""import sys
sys.path[:0] = {[str(hosts.HERE.parent)]!r}
import dataclasses
import numpy as np
import pathaudit as pa
from example_arms import cell_of, path_of_motion, puma
arm = puma()
def of(samples):
    time = np.linspace(0, min(20.0, 0.01 * samples), samples)
    joints = np.array([0.3, -1.1, 1.4, -0.7, 0.9, 0.2]) + 0.3 * np.sin(np.outer(time, 0.7 + 0.2 * np.arange(6)) + np.arange(6))
    cell = cell_of(arm, start=joints[0])
    return pa.audit(path_of_motion(cell, time, joints), cell)
"""


@pytest.mark.parametrize("make", ["of(2)", "of(200_000)"], ids=["2 samples", "200,000 samples"])
def test_the_shortest_and_the_longest_path(lab, page, make):
    live(lab, page, f"any{len(make)}.ipynb", f"{ANY_PATH}\n{make}")
    scrubs(page)
    says(page, "")


def test_a_path_that_is_reached_in_part_and_one_that_is_not_at_all(lab, page):
    moved = "dataclasses.replace(cell, part=cell.part @ np.array([[1, 0, 0, {} - cell.part[0, 3]], [0, 1, 0, 0], [0, 0, 1, 0], [0, 0, 0, 1.0]]))"
    live(lab, page, "unreached.ipynb", hosts.SHOW.removesuffix("audit") + "import dataclasses, numpy as np\ncell, path = audit.cell, audit.path\n"
         + "\n".join(f"pa.show(pa.audit(path, {moved.format(x)}))" for x in (1.4, 5.0)) + "\nNone")
    page.wait_for_function("() => document.querySelectorAll('.pa[data-painted]').length === 2")
    for view in (0, 1):
        scrubs(page, view)
    assert page.locator(".pa-verdict").all_inner_texts() == ["FAIL", "FAIL"]
    assert "unreachable" in page.locator(".pa-findings").first.inner_text()
    assert "–" in page.locator(".pa-read").nth(1).inner_text()


@pytest.fixture
def link(watched):
    """kernelLink on a page without a host, with a clock of its own; window.said gathers what it says, window.heard what it listens to."""
    page = watched(fresh=True).page
    page.clock.install()
    page.set_content("<div id='el'></div>")
    page.add_script_tag(type="module", content=joined_modules() + """
        window.said = []; window.sent = []; window.heard = {}; window.ends = 0;
        window.model = { get: () => "a status", set() {}, save_changes() {}, on: (name, act) => { heard[name] = act; }, off: (name) => { delete heard[name]; },
                         send: (message, callbacks) => { if (window.dead) throw new Error("disposed"); sent.push(callbacks); } };
        window.begin = () => { window.link = kernelLink(model, document.getElementById("el"), (words) => said.push(words), () => { window.ends++; }); };""")
    page.wait_for_function("() => Boolean(window.begin)")
    page.evaluate("begin()")
    return page


def test_a_kernel_that_stays_silent_is_told_until_it_answers(link):
    assert link.evaluate("window.link.ask({ do: 'undo' })") is True
    link.clock.fast_forward(3000)
    assert link.evaluate("said") == []
    link.clock.fast_forward(3000)
    assert [words.startswith(SILENT) for words in link.evaluate("said")] == [True]
    link.evaluate("sent[0].iopub.status()")
    assert link.evaluate("said")[1:] == ["a status"]
    link.evaluate("window.link.ask({ do: 'undo' }); sent[1].iopub.status()")
    link.clock.fast_forward(10000)
    assert len(link.evaluate("said")) == 2


def test_a_kernel_that_cannot_be_reached_is_told_once_it_is_tried(link):
    link.evaluate("() => { window.dead = true; }")
    assert link.evaluate("window.link.ask({ do: 'undo' })") is False
    link.clock.fast_forward(10000)
    assert link.evaluate("[said.at(-1), window.ends]") == [link.evaluate("said[0]"), 1] and link.evaluate("said[0]").startswith(GONE)
    link.evaluate("window.link.close()")
    assert link.evaluate("Object.keys(heard)") == []


def test_what_was_saved_with_the_notebook_has_nobody_to_ask(link):
    link.evaluate("() => { document.getElementById('el').className = 'jupyter-widgets-disconnected'; begin(); }")
    assert link.evaluate("window.link.ask") is None
    assert "no kernel" in link.evaluate("window.link.status()")
    link.evaluate("window.link.set('cursor', 3)")
    assert link.evaluate("window.ends") == 0
