// The audit on show: joins the parts of the timeline. Knows nothing of where the data comes from (widget.js).

import { armPanel } from "./armpanel.js";
import { clamp, fixed, nearest } from "./data.js";
import { button, element, focusable, taken } from "./dom.js";
import { findingsPanel } from "./findings.js";
import { notesPanel } from "./notes.js";
import { headPanel, readoutPanel } from "./readout.js";
import { blockAt, drawCursor, drawRows, layOut } from "./rows.js";
import { theme } from "./theme.js";
import { trialPanel } from "./trial.js";

const KEYS = "Keys on the timeline: ← → one sample · with Shift far · Page Up, Page Down · Home, End · N next finding, P previous · + − 0 zoom · drag the arm to turn it";
const MOST_ZOOM = 1 / 2000;

// ask(message, buffers) sends a message to Python, or is null where nobody listens; onCursor(sample) is told where the cursor stands.
export function mount(root, ask, onCursor) {
  const state = { facts: null, data: null, place: null, colours: null, i: 0, selected: -1, chosen: null, width: 0, span: null, onStrip: false, frame: 0, stale: false };
  const listeners = { cursor: [], chosen: [], shown: [], factor: [] };
  const tell = (event, ...values) => listeners[event].forEach((listener) => listener(...values));
  const at = (sample) => nearest(state.data.sample[0], sample);
  const status = element("div", { class: "pa-status", role: "status" });

  // What the parts share; samples are the path's own numbers, of which only some are kept and drawn.
  const ui = {
    element, focusable, button, ask, at,
    facts: () => state.facts,
    data: () => state.data,
    sample: () => state.data.sample[0][state.i],
    chosen: () => state.chosen,
    choose: (first, last) => {
      state.chosen = first === null ? null : { first: Math.min(first, last), last: Math.max(first, last) };
      repaint(true);
      tell("chosen");
    },
    go: (sample) => moveTo(at(sample)),
    place: (sample) => {
      const i = at(sample);
      return `${fixed(state.facts.offset_s + state.data.time_s[0][i], 2)} s, ${fixed(state.data.distance_mm[0][i], 1)} mm`;
    },
    say: (words) => { status.textContent = words; },
    on: (event, listener) => listeners[event].push(listener),
  };

  const rowsBase = element("canvas"), rowsOver = element("canvas");
  const rows = focusable("div", { class: "pa-rows", role: "slider", "aria-label": "Place on the path", "aria-valuemin": "0" }, rowsBase, rowsOver);
  const whole = button("whole path", "Show the whole path", () => zoom(Infinity));
  whole.disabled = true;
  const zoomers = element("div", { class: "pa-zoom" }, button("−", "Show more of the path", () => zoom(2)),
    button("+", "Show less of the path, larger", () => zoom(0.5)), whole);
  const head = headPanel(ui), readout = readoutPanel(zoomers), arm = armPanel(ui, () => repaint(true));
  const trial = trialPanel(ui), findings = findingsPanel(ui, choose), notes = notesPanel(ui);
  root.classList.add("pa");
  root.replaceChildren(head.node, readout.node, element("div", { class: "pa-main" }, rows, arm.node), trial.node, findings.node, notes.node,
    element("div", { class: "pa-keys" }, KEYS), status);

  function show(facts, data) {
    const sample = state.data ? state.data.sample[0][state.i] : null, ends = state.place && state.place.zoomed ? state.span.map(sampleAt) : null;
    Object.assign(state, { facts, data, selected: -1, width: 0 });
    state.i = sample === null ? firstPlace(facts) : at(sample);
    state.span = ends ? ends.map((end) => data.time_s[0][at(end)]) : [0, facts.duration_s];
    [head, arm, findings].forEach((part) => part.show());
    resize();
    tell("shown");
  }

  function sampleAt(time) {
    return state.data.sample[0][nearest(state.data.time_s[0], time)];
  }

  function resize() {
    const width = Math.floor(root.clientWidth);
    if (!state.facts || !width || width === state.width) return;
    state.width = width;
    const wide = width >= 760;
    root.classList.toggle("pa-narrow", !wide);
    const rowsWidth = wide ? Math.round(width * 0.63) : width;
    state.place = layOut(state.facts, rowsWidth, state.span);
    rows.style.width = `${rowsWidth}px`;
    rows.style.height = `${state.place.height}px`;
    arm.fit(wide ? width - rowsWidth - 10 : width, wide ? state.place.height : 300);
    repaint(true);
  }

  // Show `length` seconds in the rows, `about` standing where it stood, or in the middle where it was out of sight.
  function zoomTo(length, about) {
    const { duration_s: duration } = state.facts, [from, to] = state.span;
    const size = clamp(length, Math.min(duration, MOST_ZOOM * duration), duration);
    const share = about >= from && about <= to ? (about - from) / (to - from || 1) : 0.5;
    const start = clamp(about - share * size, 0, duration - size);
    state.span = [start, start + size];
    state.place = layOut(state.facts, state.place.width, state.span);
    whole.disabled = !state.place.zoomed;
    repaint(true);
  }

  function zoom(factor) {
    if (state.place) zoomTo(factor * (state.span[1] - state.span[0]), state.data.time_s[0][state.i]);
  }

  // Painting waits for the next frame and happens once in it; `all` draws the base pictures too.
  function repaint(all) {
    state.stale = state.stale || all;
    if (!state.frame) state.frame = requestAnimationFrame(paint);
  }

  function paint() {
    state.frame = 0;
    if (!state.place) return;
    const { facts, data, place, i, stale } = state;
    state.stale = false;
    if (stale) {
      state.colours = theme(root);
      drawRows(rowsBase, place, state.colours, facts, data);
    }
    drawCursor(rowsOver, place, state.colours, data, i, state.selected);
    arm.paint(state.colours, i, stale);
    const { found, words } = readout.show(facts, data, i);
    findings.mark(found);
    rows.setAttribute("aria-valuemax", facts.duration_s);
    rows.setAttribute("aria-valuenow", data.time_s[0][i].toFixed(3));
    rows.setAttribute("aria-valuetext", words);
    root.dataset.cursor = i;
    root.dataset.painted = Number(root.dataset.painted || 0) + 1;
  }

  // Where the place lies outside the rows' span they follow it, unless `still`; `quiet`: nobody outside is told.
  function moveTo(i, { selected = -1, quiet = false, still = false } = {}) {
    if (!state.data) return;
    state.i = clamp(i, 0, state.data.time_s[0].length - 1);
    const time = state.data.time_s[0][state.i], [from, to] = state.span;
    if (state.place && !still && (time < from || time > to)) zoomTo(to - from, time);
    if (selected !== state.selected) findings.select(state.selected = selected);
    repaint(false);
    if (!quiet) onCursor(ui.sample());
    tell("cursor");
  }

  // Follow another view of the same model; our own place comes back this way too, and changes nothing.
  function toSample(sample) {
    const i = state.data ? at(sample) : state.i;
    if (i !== state.i) moveTo(i, { quiet: true });
  }

  // Go to a finding; one that would be a mere tick in the rows is shown large.
  function choose(k) {
    const finding = state.facts.findings[k], long = finding.to_s - finding.from_s;
    moveTo(finding.at, { selected: k });
    if (state.place && long / (state.span[1] - state.span[0]) * state.place.plot < 24) {
      state.span = [0, 0];
      zoomTo(10 * long, 0.5 * (finding.from_s + finding.to_s));
    }
  }

  function step(direction) {
    const found = state.facts.findings;
    const order = found.map((_, k) => k).sort((a, b) => found[a].at - found[b].at || a - b);
    const from = order.indexOf(state.selected);
    const beyond = (k) => direction * (found[k].at - state.i) > 0;
    const next = from >= 0 ? order[from + direction] : direction > 0 ? order.find(beyond) : order.findLast(beyond);
    if (next !== undefined) choose(next);
  }

  function onKey(event) {
    if (!state.data || event.altKey || event.ctrlKey || event.metaKey) return;
    const last = state.data.time_s[0].length - 1, far = Math.max(1, Math.round(last / 50)), page = Math.max(1, Math.round(last / 10));
    const by = (amount) => () => moveTo(state.i + amount);
    const act = {
      ArrowRight: by(event.shiftKey ? far : 1), ArrowUp: by(event.shiftKey ? far : 1),
      ArrowLeft: by(event.shiftKey ? -far : -1), ArrowDown: by(event.shiftKey ? -far : -1),
      PageUp: by(page), PageDown: by(-page), Home: by(-Infinity), End: by(Infinity),
      n: () => step(1), p: () => step(-1), "+": () => zoom(0.5), "=": () => zoom(0.5), "-": () => zoom(2), 0: () => zoom(Infinity),
    }[event.key.length === 1 ? event.key.toLowerCase() : event.key];
    if (!act) return;
    act();
    taken(event);
  }

  function onScrub(event) {
    if (!state.place || (event.type === "pointermove" && !event.buttons)) return;
    const box = rows.getBoundingClientRect(), x = event.clientX - box.left, y = event.clientY - box.top;
    if (event.type === "pointerdown") {
      rows.focus({ preventScroll: true });
      const block = blockAt(state.place, x, y);
      if (block >= 0) return choose(block);
      state.onStrip = y < state.place.process + 8;
      rows.setPointerCapture(event.pointerId);
    } else if (!rows.hasPointerCapture(event.pointerId)) return;
    moveTo(nearest(state.data.time_s[0], state.onStrip ? state.place.wholeTime(x) : state.place.time(x)), { still: !state.onStrip });
  }

  // A pinch, or the wheel with Ctrl: the plain wheel stays the page's.
  function onWheel(event) {
    if (!state.place || !event.ctrlKey) return;
    event.preventDefault();
    zoomTo(1.002 ** event.deltaY * (state.span[1] - state.span[0]), state.place.time(event.clientX - rows.getBoundingClientRect().left));
  }

  // Whoever still holds this view after its end holds no data and no canvas.
  function close() {
    watch.disconnect();
    themes.disconnect();
    cancelAnimationFrame(state.frame);
    root.replaceChildren();
    for (const held of [state, listeners]) for (const name of Object.keys(held)) held[name] = null;
  }

  rows.addEventListener("keydown", onKey);
  rows.addEventListener("wheel", onWheel, { passive: false });
  for (const type of ["pointerdown", "pointermove"]) rows.addEventListener(type, onScrub);
  // The style sheet gives the root a minute colour transition: its end tells that a new theme has arrived. A root that was out of the
  // document meanwhile has none; the page's own mark of the theme tells then.
  for (const type of ["transitionend", "transitioncancel"]) root.addEventListener(type, (event) => event.target === root && repaint(true));
  const themes = new MutationObserver(() => repaint(true));
  themes.observe(document.body, { attributeFilter: ["class", "data-jp-theme-name", "data-jp-theme-light"] });
  const watch = new ResizeObserver(resize);
  watch.observe(root);

  return { show, showTrial: trial.show, showNotes: notes.show, say: ui.say, toSample, close };
}

// The first look is at the worst news: the first finding that fails, else the first finding, else the start.
function firstPlace(facts) {
  const first = facts.findings.find((f) => f.severity === "fail") || facts.findings[0];
  return first ? first.at : 0;
}
