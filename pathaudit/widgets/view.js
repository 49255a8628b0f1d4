// The audit on show: joins the parts of the timeline. Knows nothing of where the data comes from (widget.js).

import { armPanel } from "./armpanel.js";
import { rowAxis } from "./axis.js";
import { rowChoice } from "./choice.js";
import { clamp, fixed, nearest } from "./data.js";
import { button, element, focusable } from "./dom.js";
import { findingsPanel } from "./findings.js";
import { listen } from "./gestures.js";
import { keyTable } from "./keys.js";
import { layOut, spotAt } from "./layout.js";
import { notesPanel } from "./notes.js";
import { drawOverlay } from "./overlay.js";
import { headPanel, readoutPanel } from "./readout.js";
import { drawRows } from "./rows.js";
import { theme } from "./theme.js";
import { trialPanel } from "./trial.js";

const MOST_ZOOM = 1 / 2000;

// ask(message, buffers) sends a message to Python, or is null where nobody listens; onCursor(sample) is told where the cursor stands.
export function mount(root, ask, onCursor) {
  const state = { facts: null, data: null, axis: null, far: false, place: null, colours: null, i: 0, selected: -1, chosen: null, tried: null,
                  dragging: false, marking: false, pins: [], marks: [], width: 0, arm: "", span: null, frame: 0, stale: false };
  const listeners = { cursor: [], chosen: [], shown: [], factor: [] };
  const tell = (event, ...values) => listeners[event].forEach((listener) => listener(...values));
  const at = (sample) => nearest(state.data.sample[0], sample);
  const status = element("div", { class: "pa-status", role: "status" });
  const keys = keyTable();

  // What the parts share; samples are the path's own numbers, of which only some are kept and drawn.
  const ui = {
    element, focusable, button, ask, at,
    facts: () => state.facts,
    data: () => state.data,
    sample: () => state.data.sample[0][state.i],
    chosen: () => state.chosen,
    choose: (first, last) => {
      state.chosen = first === null ? null : { first: Math.min(first, last), last: Math.max(first, last) };
      state.tried = null;
      unmark.disabled = !state.chosen;
      repaint(false);
      tell("chosen");
    },
    go: (sample) => moveTo(at(sample)),
    place: (sample) => {
      const i = at(sample);
      return `${fixed(state.facts.offset_s + state.data.time_s[0][i], 2)} s, ${fixed(state.data.distance_mm[0][i], 1)} mm`;
    },
    say: (words) => { status.textContent = words; },
    on: (event, listener) => listeners[event].push(listener),
    key: (key, shown, words, act) => keys.add([key], shown, words, act),      // a key of the timeline that a part answers
  };

  const rowsBase = element("canvas"), rowsOver = element("canvas");
  const rows = focusable("div", { class: "pa-rows", role: "slider", "aria-label": "Place on the path", "aria-valuemin": "0" }, rowsBase, rowsOver);
  const whole = button("whole path", "Show the whole path", () => zoom(Infinity));
  const distance = button("over distance", "Rows over distance, not time", switchAxis), marker = button("mark a stretch", "Dragging in the rows marks a stretch", switchMarking);
  const unmark = button("unmark", "Unmark the stretch", () => ui.choose(null, null));
  const choice = rowChoice(() => { layAll(); repaint(true); });
  const tools = element("div", { class: "pa-tools" }, distance, choice.node, marker, unmark, element("span"), button("−", "Show more of the path", () => zoom(2)),
    button("+", "Show less of the path, larger", () => zoom(0.5)), button("fit", "Fit the marked stretch or the finding", fit), whole, keys.node);
  const head = headPanel(ui), readout = readoutPanel(), arm = armPanel(ui, () => repaint(true));
  const trial = trialPanel(ui), findings = findingsPanel(ui, (k) => goTo(k, true)), notes = notesPanel(ui);
  root.classList.add("pa");
  root.replaceChildren(head.node, readout.node, tools, element("div", { class: "pa-main" }, rows, arm.node), trial.node, findings.node, notes.node, status);
  setPressed();

  function setPressed() {
    distance.setAttribute("aria-pressed", state.far);
    marker.setAttribute("aria-pressed", state.marking);
    whole.disabled = !state.place?.zoomed;
    unmark.disabled = !state.chosen;
  }

  function show(facts, data) {
    const sample = state.data ? ui.sample() : null, ends = state.place?.zoomed ? state.span.map(sampleAt) : null;
    Object.assign(state, { facts, data, axis: rowAxis(facts, data, state.far), selected: -1, width: 0 });
    if (!state.dragging) state.tried = null;
    state.i = sample === null ? firstPlace(facts) : at(sample);
    state.span = ends ? ends.map(state.axis.ofSample) : [0, state.axis.size];
    distance.disabled = !(facts.length_mm > 1e-3);
    [head, arm, findings].forEach((part) => part.show());
    choice.show(facts);
    state.arm = "";
    resize();
    tell("shown");
  }

  function sampleAt(value) {
    return state.data.sample[0][nearest(state.axis.places, value)];
  }

  function resize() {
    const width = Math.floor(root.clientWidth);
    if (!state.facts || !width || width === state.width) return;
    state.width = width;
    root.classList.toggle("pa-narrow", width < 760);
    layAll();
    repaint(true);
  }

  function layAll() {
    const { width, facts, axis, span, pins } = state;
    if (!width) return;
    const wide = width >= 760, rowsWidth = wide ? Math.round(width * 0.63) : width;
    const { height, left, plot, process, lanes, pins: flags } = state.place = layOut(facts, choice.groups(), axis, rowsWidth, span, pins);
    root.dataset.place = JSON.stringify({ span, left, plot, process, lanes: lanes.map(({ index, y, height: tall }) => [index, y, tall]), pins: flags.map((pin) => pin.x) });
    Object.assign(rows.style, { width: `${rowsWidth}px`, height: `${height}px` });
    const size = wide ? [width - rowsWidth - 10, clamp(height, 320, 620)] : [width, 300];
    if (state.arm !== String(size)) arm.fit(...size);
    state.arm = String(size);
    setPressed();
  }

  // Show the span that begins at `start` and is `size` long.
  function showSpan(start, size) {
    const { axis } = state, long = clamp(size, MOST_ZOOM * axis.size, axis.size), from = clamp(start, 0, axis.size - long);
    state.span = [from, from + long];
    layAll();
    repaint(true);
  }

  // Show `size` of the axis in the rows, `about` standing where it stood, or in the middle where it was out of sight.
  function zoomTo(size, about) {
    const [from, to] = state.span, long = clamp(size, MOST_ZOOM * state.axis.size, state.axis.size);
    const share = about >= from && about <= to ? (about - from) / (to - from || 1) : 0.5;
    showSpan(about - share * long, long);
  }

  function zoom(factor, about = here()) {
    if (state.place) zoomTo(factor * (state.span[1] - state.span[0]), about);
  }

  const here = () => state.axis.places[state.i];

  function pan(by) {
    const [from, to] = state.span;
    showSpan(from + by, to - from);
    return true;
  }

  // Fit the marked stretch, else the selected finding, else the worst and shortest at the cursor; a short one keeps something of its neighbourhood.
  function fit() {
    const k = findingHere();
    if (!state.chosen && k < 0) return false;
    fitTo(state.chosen ? stretchEnds() : state.place.findings[k]);
  }

  function fitTo([from, to]) {
    const long = to - from, size = Math.max(1.6 * long, Math.min(10 * long, 0.08 * state.axis.size));
    showSpan(0.5 * (from + to - size), size);
  }

  function findingHere() {
    const { facts: { findings: all }, selected } = state, sample = ui.sample();
    const [found] = all.filter(({ first, last }) => sample >= first && sample <= last)
      .sort((a, b) => (b.severity === "fail") - (a.severity === "fail") || a.last - a.first - b.last + b.first);
    return selected >= 0 ? selected : all.indexOf(found);
  }

  function switchAxis() {
    if (distance.disabled) return false;
    const ends = state.span.map(sampleAt), { zoomed } = state.place;
    state.far = !state.far;
    state.axis = rowAxis(state.facts, state.data, state.far);
    const [from, to] = zoomed ? ends.map(state.axis.ofSample) : [0, state.axis.size];
    showSpan(from, to - from);
  }

  function switchMarking() {
    state.marking = !state.marking;
    setPressed();
  }

  const stretchEnds = () => [state.chosen.first, state.chosen.last].map(state.axis.ofSample);

  // The marked stretch for the overlay, with its length in words.
  function stretch() {
    if (!state.chosen) return null;
    const { time_s: [time], distance_mm: [along] } = state.data, [a, b] = [at(state.chosen.first), at(state.chosen.last)];
    return { ends: stretchEnds(), words: `marked: ${fixed(time[b] - time[a], 2)} s, ${fixed(along[b] - along[a], 1)} mm` };
  }

  // The factor of the marked stretch, where somebody listens to its change: what is being tried, else the least that is in force there.
  function factor() {
    if (!ask || !listeners.factor.length || !state.chosen) return null;
    if (state.tried) return { percent: state.tried, tried: true };
    const column = state.data.factor_percent[0].subarray(at(state.chosen.first), at(state.chosen.last) + 1);
    return { percent: state.facts.retiming.applied ? Math.min(...column) : 100, tried: false };
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
      drawRows(rowsBase, place, state.colours, facts, data, state.marks);
    }
    const marked = stretch();
    drawOverlay(rowsOver, place, state.colours, data, { i, finding: state.selected, stretch: marked, factor: factor() });
    arm.paint(state.colours, i, stale);
    const { found, words } = readout.show(facts, data, i);
    findings.mark(found);
    rows.setAttribute("aria-valuemax", facts.duration_s);
    rows.setAttribute("aria-valuenow", data.time_s[0][i].toFixed(3));
    rows.setAttribute("aria-valuetext", marked ? `${words}, ${marked.words}` : words);
    root.dataset.cursor = i;
    root.dataset.marked = state.chosen ? `${state.chosen.first} ${state.chosen.last}` : "";
    root.dataset.painted = Number(root.dataset.painted || 0) + 1;
  }

  // Where the place lies outside the rows' span they follow it, unless `still`; `quiet`: nobody outside is told.
  function moveTo(i, { selected = -1, quiet = false, still = false } = {}) {
    if (!state.data) return;
    state.i = clamp(i, 0, state.data.time_s[0].length - 1);
    const [from, to] = state.span;
    if (state.place && !still && (here() < from || here() > to)) zoomTo(to - from, here());
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
    const ends = state.place.findings[k], [from, to] = ends.map(state.place.x);
    if (always || to - from < 24) fitTo(ends);
  }

  function step(direction) {
    const found = state.facts.findings;
    const order = found.map((_, k) => k).sort((a, b) => found[a].at - found[b].at || a - b);
    const from = order.indexOf(state.selected);
    const beyond = (k) => direction * (found[k].at - state.i) > 0;
    const next = from >= 0 ? order[from + direction] : direction > 0 ? order.find(beyond) : order.findLast(beyond);
    if (next !== undefined) goTo(next, false);
  }

  // One end of the stretch comes to the cursor; an end that would be passed comes with it.
  function setEnd(end) {
    const sample = ui.sample(), { first, last } = state.chosen || { first: sample, last: sample };
    if (end) ui.choose(Math.min(first, sample), sample);
    else ui.choose(sample, Math.max(last, sample));
  }

  function markFinding() {
    const k = findingHere();
    if (k >= 0) ui.choose(state.facts.findings[k].first, state.facts.findings[k].last);
  }

  function escape() {
    if (!state.chosen && !state.marking) return false;
    state.marking = false;
    ui.choose(null, null);
    setPressed();
  }

  const count = () => state.data.time_s[0].length - 1, far = () => Math.max(1, Math.round(count() / 50)), page = () => Math.max(1, Math.round(count() / 10));
  const by = (amount) => moveTo(state.i + amount), quarter = () => (state.span[1] - state.span[0]) / 4;
  for (const [names, shown, words, act] of [
    [["ArrowRight", "ArrowUp"], "→", "one sample on; with Shift far", (event) => by(event.shiftKey ? far() : 1)],
    [["ArrowLeft", "ArrowDown"], "←", "one sample back; with Shift far", (event) => by(event.shiftKey ? -far() : -1)],
    [["PageUp"], "Page Up", "a tenth of the path on", () => by(page())],
    [["PageDown"], "Page Down", "a tenth of the path back", () => by(-page())],
    [["Home"], "Home", "start of the path", () => by(-Infinity)],
    [["End"], "End", "end of the path", () => by(Infinity)],
    [["n"], "N", "next finding", () => step(1)],
    [["p"], "P", "finding before", () => step(-1)],
    [["+", "="], "+", "show less, larger (also the wheel)", () => zoom(0.5)],
    [["-"], "−", "show more", () => zoom(2)],
    [["0"], "0", "whole path", () => zoom(Infinity)],
    [["f"], "F", "fit the marked stretch or the finding", fit],
    [[","], ",", "slide back", () => pan(-quarter())],
    [["."], ".", "slide on (also the wheel with Shift)", () => pan(quarter())],
    [["["], "[", "the marked stretch begins at the cursor", () => setEnd(0)],
    [["]"], "]", "the marked stretch ends at the cursor", () => setEnd(1)],
    [["s"], "S", "mark the stretch of the finding", markFinding],
    [["m"], "M", "dragging marks a stretch (also with Shift)", switchMarking],
    [["Escape"], "Esc", "unmark the stretch", escape],
    [["d"], "D", "time or distance", switchAxis],
    [["u"], "U", "fold or unfold the joints", choice.foldAll],
    [["r"], "R", "choose and order the rows", choice.open],
    [["?"], "?", "this list", keys.open],
  ]) keys.add(names, shown, words, act);

  // Whoever still holds this view after its end holds no data and no canvas.
  function close() {
    watch.disconnect();
    themes.disconnect();
    cancelAnimationFrame(state.frame);
    root.replaceChildren();
    for (const held of [state, listeners]) for (const name of Object.keys(held)) held[name] = null;
  }

  const px = (x) => sampleAt(state.place.at(x));
  listen(rows, {
    ready: () => Boolean(state.place),
    marking: () => state.marking,
    spot: (x, y) => spotAt(state.place, x, y, state.chosen && stretchEnds().map(state.place.x), factor()?.percent ?? null),
    press: ({ kind, id, k, title }) => {
      if (kind === "pin") notes.choose(id);
      else if (kind === "finding") goTo(k, false);
      else if (kind === "fold") choice.fold(title);
      else return false;
      return true;
    },
    scrub: (x, onStrip) => moveTo(nearest(state.axis.places, onStrip ? state.place.wholeAt(x) : state.place.at(x)), { still: !onStrip }),
    mark: (a, b) => ui.choose(px(a), px(b)),
    moveEnd: (end, x) => {
      const { first, last } = state.chosen;
      ui.choose(...(end ? [first, Math.max(first, px(x))] : [Math.min(last, px(x)), last]));
    },
    factor: (percent, gesture) => {
      state.tried = percent;
      state.dragging = true;
      repaint(false);
      tell("factor", percent / 100, gesture);
    },
    release: () => { state.dragging = false; },
    slide: (dx) => pan(dx / state.place.plot * state.axis.size),
    pan: (dx) => state.place.zoomed && pan(dx / state.place.plot * (state.span[1] - state.span[0])),
    zoomAt: (x, by) => zoom(by, state.place.at(x)),
  });
  rows.addEventListener("keydown", (event) => state.data && keys.onKey(event));
  // The style sheet gives the root a minute colour transition: its end tells that a new theme has arrived. A root that was out of the
  // document meanwhile has none; the page's own mark of the theme tells then.
  for (const type of ["transitionend", "transitioncancel"]) root.addEventListener(type, (event) => event.target === root && repaint(true));
  const themes = new MutationObserver(() => repaint(true));
  themes.observe(document.body, { attributeFilter: ["class", "data-jp-theme-name", "data-jp-theme-light"] });
  const watch = new ResizeObserver(resize);
  watch.observe(root);

  function showTrial(value) {
    trial.show(value);
    state.marks = (value.edits || []).map(({ kind, first, last, percent }) => ({ first, last, words: { lock: "locked", adopt: "accepted", decline: "rejected" }[kind] || `${fixed(percent, 0)} %` }));
    repaint(true);
  }

  function showNotes(value) {
    notes.show(value);
    state.pins = (value.notes || []).map(({ id, sample, settled, stale }, k) => ({ id, sample, filled: !settled, words: `${k + 1}${stale ? "?" : ""}` }));
    layAll();
    repaint(true);
  }

  return { show, showTrial, showNotes, say: ui.say, toSample, close };
}

// The first look is at the worst news: the first finding that fails, else the first finding, else the start.
function firstPlace(facts) {
  const first = facts.findings.find((f) => f.severity === "fail") || facts.findings[0];
  return first ? first.at : 0;
}
