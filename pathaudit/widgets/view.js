// The audit on show: joins the parts of the timeline. Knows nothing of where the data comes from (widget.js).

import { armPanel } from "./armpanel.js";
import { rowAxis } from "./axis.js";
import { rowChoice } from "./choice.js";
import { clamp, fixed, nearest } from "./data.js";
import { button, element, focusable, watching } from "./dom.js";
import { findingsPanel } from "./findings.js";
import { listen } from "./gestures.js";
import { keyTable } from "./keys.js";
import { factorLane, layOut, spotAt, valueAt } from "./layout.js";
import { notesPanel } from "./notes.js";
import { drawOverlay } from "./overlay.js";
import { headPanel, readoutPanel } from "./readout.js";
import { drawRows } from "./rows.js";
import { rowSpan } from "./span.js";
import { markedStretch } from "./stretch.js";
import { theme } from "./theme.js";
import { trialPanel } from "./trial.js";

// ask(message, buffers) sends a message to Python, or is null where nobody listens; onCursor(sample) is told where the cursor stands.
export function mount(root, ask, onCursor) {
  const state = { facts: null, data: null, axis: null, far: false, place: null, colours: null, i: 0, selected: -1, chosen: null, marking: false,
                  pins: [], marks: [], levels: 1, width: 0, arm: "", span: null, frame: 0, stale: false };
  const listeners = { cursor: [], chosen: [], shown: [], factor: [] };
  const tell = (event, ...values) => listeners[event].forEach((listener) => listener(...values));
  const at = (sample) => nearest(state.data.sample[0], sample);
  const status = element("div", { class: ask ? "pa-status pa-room" : "pa-status", role: "status" });
  const keys = keyTable();

  // What the parts share; samples are the path's own numbers, of which only some are kept and drawn.
  const ui = {
    element, focusable, button, ask, at,
    facts: () => state.facts,
    data: () => state.data,
    sample: () => state.data.sample[0][state.i],
    chosen: () => state.chosen,
    finding: () => state.selected,      // the number of the finding that is selected, or -1
    choose: (first, last) => stretch.mark(first, last),
    go: (sample) => moveTo(at(sample)),
    place: (sample) => {
      const i = at(sample);
      return `${fixed(state.facts.offset_s + state.data.time_s[0][i], 2)} s, ${fixed(state.data.distance_mm[0][i], 1)} mm`;
    },
    say: (words) => { status.textContent = words; },
    on: (event, listener) => listeners[event].push(listener),
    key: (key, shown, words, act) => keys.add([key], shown, words, act),      // a key of the timeline that a part answers
  };
  const span = rowSpan(state, laid), stretch = markedStretch(ui, state, tell, () => repaint(false));

  const rowsBase = element("canvas"), rowsOver = element("canvas");
  const rows = focusable("div", { class: "pa-rows", role: "slider", "aria-label": "Place on the path", "aria-valuemin": "0" }, rowsBase, rowsOver);
  const whole = button("whole path", "Show the whole path", () => span.zoom(Infinity)), unmark = button("unmark", "Unmark the stretch", () => stretch.mark(null));
  const distance = button("over distance", "Rows over distance, not time", switchAxis), marker = button("mark a stretch", "Dragging in the rows marks a stretch", switchMarking);
  const choice = rowChoice(laid);
  const tools = element("div", { class: "pa-tools" }, distance, choice.node, marker, unmark, element("span"), button("−", "Show more of the path", () => span.zoom(2)),
    button("+", "Show less of the path, larger", () => span.zoom(0.5)), button("fit", "Fit the marked stretch or the finding", fit), whole, keys.node);
  // By so many samples, by so many of equal pieces of the path.
  const by = (amount) => moveTo(state.i + amount), piece = (parts) => Math.max(1, Math.round((state.data.time_s[0].length - 1) / parts));
  const arrow = (sign) => (event) => by(sign * (event.shiftKey ? piece(50) : 1));
  for (const entry of [
    [["ArrowRight", "ArrowUp"], "→", "one sample on; with Shift far", arrow(1)],
    [["ArrowLeft", "ArrowDown"], "←", "one sample back; with Shift far", arrow(-1)],
    [["PageUp"], "Page Up", "a tenth of the path on", () => by(piece(10))],
    [["PageDown"], "Page Down", "a tenth of the path back", () => by(-piece(10))],
    [["Home"], "Home", "start of the path", () => by(-Infinity)],
    [["End"], "End", "end of the path", () => by(Infinity)],
    [["n"], "N", "next finding", () => step(1)],
    [["p"], "P", "finding before", () => step(-1)],
    [["+", "="], "+", "show less, larger (also the wheel)", () => span.zoom(0.5)],
    [["-"], "−", "show more", () => span.zoom(2)],
    [["0"], "0", "whole path", () => span.zoom(Infinity)],
    [["f"], "F", "fit the marked stretch or the finding", fit],
    [[","], ",", "slide back", () => span.pan(-span.size() / 4)],
    [["."], ".", "slide on (also the wheel with Shift)", () => span.pan(span.size() / 4)],
    [["["], "[", "the marked stretch begins here", () => stretch.setEnd(0)],
    [["]"], "]", "the marked stretch ends here", () => stretch.setEnd(1)],
    [["s"], "S", "mark the stretch of the finding", markFinding],
    [["m"], "M", "dragging marks (also with Shift)", switchMarking],
    [["Escape"], "Esc", "unmark the stretch", escape],
    [["d"], "D", "time or distance", switchAxis],
    [["u"], "U", "fold or unfold the joints", choice.foldAll],
    [["r"], "R", "choose and order the rows", choice.open],
    [["?"], "?", "this list", keys.open],
  ]) keys.add(...entry);

  const head = headPanel(ui), readout = readoutPanel(), arm = armPanel(ui, () => repaint(true));
  const trial = trialPanel(ui), findings = findingsPanel(ui, (k) => goTo(k, true)), notes = notesPanel(ui);
  root.classList.add("pa");
  root.replaceChildren(head.node, readout.node, status, tools, element("div", { class: "pa-main" }, rows, arm.node), trial.node, findings.node, notes.node);

  function show(facts, data) {
    const sample = state.data && ui.sample(), ends = state.data && span.zoomed() && state.span.map(sampleAt);
    Object.assign(state, { facts, data, axis: rowAxis(facts, data, state.far), selected: -1, place: null, arm: "" });
    stretch.answered();
    state.i = sample === null ? firstPlace(facts) : at(sample);
    state.span = ends ? ends.map(state.axis.ofSample) : [0, state.axis.size];
    distance.disabled = !(facts.length_mm > 1e-3);
    [head, arm, findings].forEach((part) => part.show());
    choice.show(facts);
    if (Math.floor(root.clientWidth) === state.width) laid();
    else resize();
    tell("shown");
  }

  function sampleAt(value) {
    return state.data.sample[0][nearest(state.axis.places, value)];
  }

  function resize() {
    const width = Math.floor(root.clientWidth);
    if (!state.facts || !width || (width === state.width && state.place)) return;
    state.width = width;
    root.classList.toggle("pa-narrow", width < 760);
    head.fit();
    laid();
  }

  // Lay the rows out for what is to be shown now, and have all painted.
  function laid() {
    const { width, facts, axis, pins } = state;
    if (!width) return;
    const wide = width >= 760, rowsWidth = wide ? Math.round(width * 0.63) : width;
    const { height } = state.place = layOut(facts, choice.groups(), axis, rowsWidth, state.span, pins, state.levels);
    state.levels = state.place.levels;
    Object.assign(rows.style, { width: `${rowsWidth}px`, height: `${height}px` });
    const size = wide ? [width - rowsWidth - 10, clamp(height, 320, 620)] : [width, 300];
    if (state.arm !== String(size)) arm.fit(...size);
    state.arm = String(size);
    root.dataset.place = placeWords(state.place);
    repaint(true);
  }

  function switchAxis() {
    if (distance.disabled) return false;
    const ends = span.zoomed() && state.span.map(sampleAt);
    state.far = !state.far;
    state.axis = rowAxis(state.facts, state.data, state.far);
    const [from, to] = ends ? ends.map(state.axis.ofSample) : [0, state.axis.size];
    span.show(from, to - from);
  }

  function switchMarking() {
    state.marking = !state.marking;
    repaint(false);
  }

  // The selected finding, else the worst and shortest at the cursor.
  function findingHere() {
    const { facts: { findings: all }, selected } = state, sample = ui.sample();
    const [found] = all.filter(({ first, last }) => sample >= first && sample <= last)
      .sort((a, b) => (b.severity === "fail") - (a.severity === "fail") || a.last - a.first - b.last + b.first);
    return selected >= 0 ? selected : all.indexOf(found);
  }

  function fit() {
    const ends = stretch.ends() || state.place.findings[findingHere()];
    if (ends) span.fit(ends);
  }

  function markFinding() {
    const finding = state.facts.findings[findingHere()];
    if (finding) stretch.mark(finding.first, finding.last);
  }

  // Painting waits for the next frame and happens once in it; `all` draws the base pictures too.
  function repaint(all) {
    state.stale = state.stale || all;
    if (!state.frame) state.frame = requestAnimationFrame(paint);
  }

  function paint() {
    state.frame = 0;
    if (!state.place) return;
    const { facts, data, place, i, stale, chosen } = state, marked = stretch.shown();
    state.stale = false;
    if (stale) {
      state.colours = theme(root);
      drawRows(rowsBase, place, state.colours, facts, data, state.marks);
    }
    drawOverlay(rowsOver, place, state.colours, data, { i, finding: state.selected, stretch: marked, factor: stretch.factor() });
    arm.paint(state.colours, i, stale);
    const { found, words } = readout.show(facts, data, i);
    findings.mark(found);
    distance.setAttribute("aria-pressed", state.far);
    marker.setAttribute("aria-pressed", state.marking);
    whole.disabled = !place.zoomed;
    unmark.disabled = !marked;
    rows.setAttribute("aria-valuemax", facts.duration_s);
    rows.setAttribute("aria-valuenow", data.time_s[0][i].toFixed(3));
    rows.setAttribute("aria-valuetext", marked ? `${words}, ${marked.words}` : words);
    Object.assign(root.dataset, { cursor: i, marked: chosen ? `${chosen.first} ${chosen.last}` : "", painted: Number(root.dataset.painted || 0) + 1 });
  }

  // Where the place lies outside the rows' span they follow it, unless `still`; `quiet`: nobody outside is told.
  function moveTo(i, { selected = -1, quiet = false, still = false } = {}) {
    if (!state.data) return;
    state.i = clamp(i, 0, state.data.time_s[0].length - 1);
    if (state.place && !still) span.follow();
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

  // Go to a finding and fit it, or only where it would be a mere tick in the rows.
  function goTo(k, always) {
    moveTo(state.facts.findings[k].at, { selected: k });
    if (!state.place) return;
    const [from, to] = state.place.findings[k].map(state.place.x);
    if (always || to - from < 24) span.fit(state.place.findings[k]);
  }

  function step(direction) {
    const found = state.facts.findings;
    const order = found.map((_, k) => k).sort((a, b) => found[a].at - found[b].at || a - b);
    const from = order.indexOf(state.selected);
    const beyond = (k) => direction * (found[k].at - state.i) > 0;
    const next = from >= 0 ? order[from + direction] : direction > 0 ? order.find(beyond) : order.findLast(beyond);
    if (next !== undefined) goTo(next, false);
  }

  function escape() {
    if (!state.chosen && !state.marking) return false;
    state.marking = false;
    stretch.mark(null);
  }

  rows.addEventListener("keydown", (event) => state.place && keys.onKey(event));

  const sampleOf = (x) => sampleAt(state.place.at(x)), share = (dx, whole) => dx / state.place.plot * whole;
  listen(rows, {
    ready: () => Boolean(state.place),
    marking: () => state.marking,
    spot: (x, y) => spotAt(state.place, x, y, stretch.ends()?.map(state.place.x), stretch.factor()?.percent),
    press: ({ kind, id, k, title }) => {
      const act = { pin: () => notes.choose(id), finding: () => goTo(k, false), fold: () => choice.fold(title) }[kind];
      act?.();
      return Boolean(act);
    },
    scrub: (x, onStrip) => moveTo(nearest(state.axis.places, onStrip ? state.place.wholeAt(x) : state.place.at(x)), { still: !onStrip }),
    mark: (a, b) => stretch.mark(sampleOf(a), sampleOf(b)),
    moveEnd: (end, x) => stretch.moveEnd(end, sampleOf(x)),
    factor: (y, gesture) => stretch.drag(clamp(valueAt(factorLane(state.place), y), 1, 100), gesture),
    release: stretch.release,
    slide: (dx) => span.pan(share(dx, state.axis.size)),
    pan: (dx) => state.place.zoomed && (span.pan(share(dx, span.size())), true),
    zoomAt: (x, factor) => span.zoom(factor, state.place.at(x)),
  });

  // The style sheet gives the root a minute colour transition: its end tells that a new theme has arrived. A root that was out of the
  // document meanwhile has none; the page's own mark of the theme tells then.
  for (const type of ["transitionend", "transitioncancel"]) root.addEventListener(type, (event) => event.target === root && repaint(true));
  const themed = { attributeFilter: ["class", "data-jp-theme-name", "data-jp-theme-light"] };
  const watches = [watching(MutationObserver, document.body, themed, () => repaint(true)), watching(ResizeObserver, root, {}, resize)];

  function showTrial(value) {
    trial.show(value);
    state.marks = (value.edits || []).map(({ kind, first, last, percent }) => ({ first, last, words: { lock: "locked", adopt: "accepted", decline: "rejected" }[kind] || `${fixed(percent, 0)} %` }));
    repaint(true);
  }

  function showNotes(value) {
    notes.show(value);
    state.pins = (value.notes || []).map(({ id, sample, settled, stale }, k) => ({ id, sample, filled: !settled, words: `${k + 1}${stale ? "?" : ""}` }));
    laid();
  }

  // Whoever still holds this view after its end holds no data and no canvas.
  function close() {
    watches.forEach((stop) => stop());
    cancelAnimationFrame(state.frame);
    root.replaceChildren();
    for (const held of [state, listeners]) for (const name of Object.keys(held)) held[name] = null;
  }

  return { show, showTrial, showNotes, say: ui.say, toSample, close };
}

// The first look is at the worst news: the first finding that fails, else the first finding, else the start.
function firstPlace(facts) {
  const first = facts.findings.find((f) => f.severity === "fail") || facts.findings[0];
  return first ? first.at : 0;
}

// Where things stand, for whoever looks at the page from outside.
function placeWords({ from, to, left, plot, process, lanes, pins }) {
  return JSON.stringify({ span: [from, to], left, plot, process, lanes: lanes.map(({ index, y, height }) => [index, y, height]), pins: pins.map(({ x }) => x) });
}
