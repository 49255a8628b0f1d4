"""What a person waits for, timed in a real Chromium that shows JupyterLab: from the input to the end of the frame that shows its effect."""

import sys
import tempfile
from pathlib import Path
from statistics import median, quantiles

from .timing import Row, spelled

TESTS = Path(__file__).resolve().parents[1]
sys.path.append(str(TESTS / "browser"))

PREPARE = f"""import sys
sys.path.append({str(TESTS)!r})
import pathaudit as pa
from tests.benchmarks.in_process import path_of_motion, smooth_motion
def made(samples):
    cell, time, joints = smooth_motion(samples, duration=samples / 100)
    audit = pa.audit(path_of_motion(cell, time, joints), cell)
    audit.suggestion
    return audit
"""
"""Audits of an open six-axis arm, the same motion that is timed in process."""

HARNESS = """
// Time from act() to the end of the first frame painted once done(root) holds, in ms.
window.timed = (act, done) => new Promise((resolve, reject) => {
  const start = performance.now(), channel = new MessageChannel();
  setTimeout(() => reject(new Error(`nothing seen within 30 s of ${act}`)), 30000);
  channel.port1.onmessage = () => resolve(performance.now() - start);
  const watch = new MutationObserver(() => {
    const root = document.querySelector(".pa[data-painted]:not([data-old])");
    if (!root || !done(root)) return;
    watch.disconnect();
    requestAnimationFrame(() => channel.port2.postMessage(null));
  });
  watch.observe(document.body, { subtree: true, childList: true, attributes: true, attributeFilter: ["data-painted", "hidden"] });
  act();
});
window.head = () => document.querySelector(".pa:not([data-old]) .pa-head")?.textContent;
const pause = (ms) => new Promise((resolve) => setTimeout(resolve, ms));

// One cell of the notebook, run again: the old timeline is marked, the new one is waited for.
window.rerun = (cell) => {
  const panel = jupyterapp.shell.currentWidget;
  panel.content.activeCellIndex = cell;
  document.querySelectorAll(".pa").forEach((root) => { root.dataset.old = "yes"; });
  return timed(() => { jupyterapp.commands.execute("notebook:run-cell"); }, () => true);
};

// Arrow keys as they arrive, spread over the frames.
window.steps = async (count) => {
  const rows = document.querySelector(".pa-rows"), found = [];
  rows.focus();
  for (let k = 0; k < count; k++) {
    await pause(20 + 16 * Math.random());
    const before = document.querySelector(".pa").dataset.painted;
    found.push(await timed(() => rows.dispatchEvent(new KeyboardEvent("keydown", { key: "ArrowRight", bubbles: true, cancelable: true })),
                           (root) => root.dataset.painted !== before));
  }
  return found;
};

// The factor of the marked stretch, as the slider gives it: seen when the head tells another duration and the rows are painted with it.
window.slide = (percent) => {
  const slider = document.querySelector(".pa-trial input[type=range]");
  slider.value = percent;
  slider.dispatchEvent(new Event("input", { bubbles: true }));
};
window.tries = async (count, from) => {
  const found = [];
  for (let k = 0; k < count; k++) {
    await pause(150 + 16 * Math.random());
    const before = head();
    found.push(await timed(() => slide(from - k), () => head() !== before));
  }
  return found;
};

// Work that takes long is begun and given up.
window.cancels = async (count) => {
  const found = [], busy = document.querySelector(".pa-busy");
  for (let k = 0; found.length < count && k < 3 * count; k++) {
    const before = head();
    slide(80 - k);
    while (busy.hidden && head() === before) await pause(5);
    await pause(60 * Math.random());
    if (busy.hidden) continue;      // done before it could be given up
    found.push(await timed(() => busy.querySelector("button").click(), () => busy.hidden));
    await pause(50);
  }
  return found;
};
"""


def in_browser():
    """All of it, with one server and one browser."""
    import hosts

    from pathaudit.report.script import joined_modules, shared_module

    with tempfile.TemporaryDirectory() as folder, hosts.browser() as chromium:
        lab = hosts.Lab(Path(folder))
        try:
            rows = _displays(lab, hosts.Watched(chromium)) + _work(lab, hosts.Watched(chromium))
        finally:
            lab.close()
    size = len(joined_modules().encode())
    return [*rows, Row("JavaScript of the timeline", f"{size / 1000:.1f} kB", None, "<= 60 kB", f"{len(shared_module()) / 1000:.1f} kB as it travels")]


def _open(lab, watched, name, samples):
    """A notebook that holds an audit and shows it in its second cell, which has not been run yet."""
    page = watched.page
    lab.write(name, f"{PREPARE}audit = made({samples})", "audit")
    lab.open(page, name)
    page.evaluate(HARNESS)
    page.evaluate("jupyterapp.shell.currentWidget.content.activeCellIndex = 0")
    page.evaluate("jupyterapp.commands.execute('notebook:run-cell')")
    lab.wait_for_answer(page, "audit.path.samples", str(samples))
    return page


def _displays(lab, watched, samples=2_000, fresh=5, again=20):
    """The first display in a kernel and a page that have shown nothing, and 20 more of the same cell once the page has warmed up."""
    first = []
    for k in range(fresh):
        page = _open(lab, watched, f"first-{k}.ipynb", samples)
        first.append(page.evaluate("rerun(1)"))
        if k < fresh - 1:
            page.evaluate("jupyterapp.shell.currentWidget.sessionContext.shutdown()")
            page.goto("about:blank")
    devtools = watched.context.new_cdp_session(page)
    devtools.send("Performance.enable")
    for _ in range(5):      # what the browser compiles and fetches late is no growth
        page.evaluate("rerun(1)")
    before = _heap(devtools)
    repeated = [page.evaluate("rerun(1)") for _ in range(again)]
    growth = (_heap(devtools) - before) / 1e6
    watched.close()
    return [
        _row(f"first display of {samples:,} samples", first, "<= 0.6 s", "from running the cell to the painted frame, the widget's imports in the kernel included"),
        _row("the same cell run again", repeated, "<= 0.35 s"),
        Row(f"heap that {again} runs of the cell leave in the browser", f"{growth:.2f} MB", None, "<= 2 MB", f"after {before / 1e6:.0f} MB with the first six"),
    ]


def _heap(devtools):
    """Bytes of JavaScript's heap in use after all garbage is gone."""
    for _ in range(3):
        devtools.send("HeapProfiler.collectGarbage")
    return next(m["value"] for m in devtools.send("Performance.getMetrics")["metrics"] if m["name"] == "JSHeapUsedSize")


def _work(lab, watched):
    """Cursor steps, other speeds and their repaint, and giving up, on paths of growing length."""
    rows = []
    for samples, reach in ((2_000, "<= 100 ms (p90)"), (20_000, "<= 250 ms (p90)")):
        page = _shown(lab, watched, samples)
        if samples == 20_000:
            rows.append(_row(f"cursor step, {samples:,} samples", page.evaluate("steps(60)"), "<= 20 ms", "arrow key to painted frame, the arm with it"))
        rows.append(_row(f"another speed tried, {samples:,} samples", page.evaluate("tries(40, 89)"), reach, "slider to painted frame, retiming and audit of the whole path inside"))
    page = _shown(lab, watched, 200_000)
    rows.append(_row("giving up a change, 200,000 samples", page.evaluate("cancels(15)"), "<= 100 ms", "button to the panel at rest"))
    watched.close()
    return rows


def _shown(lab, watched, samples):
    """The audit on show with the whole path marked, and one change made: what is loaded at first use is there."""
    page = _open(lab, watched, f"work-{samples}.ipynb", samples)
    page.evaluate("rerun(1)")
    page.locator(".pa-rows").focus()
    for key in ("Home", "[", "End", "]"):
        page.keyboard.press(key)
    page.wait_for_function("(last) => document.querySelector('.pa').dataset.marked === `0 ${last}`", arg=samples - 1)
    page.evaluate("tries(1, 95)")
    return page


def _row(work, times_ms, reach, note=""):
    p90 = quantiles(times_ms, n=10, method="inclusive")[-1]
    return Row(work, median(times_ms) / 1e3, None, reach, "; ".join(filter(None, (f"p90 {spelled(p90 / 1e3)} of {len(times_ms)}", note))))
