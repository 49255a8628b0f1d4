// The audit on show: header, readout, rows, arm, findings. Knows nothing of where the data comes from (widget.js) and asks no kernel.

import { armView } from "./arm.js";
import { clamp, fixed, nearest, worstJoint } from "./data.js";
import { blockAt, drawCursor, drawRows, layOut } from "./rows.js";
import { theme } from "./theme.js";

const READOUT = [["time", "s"], ["distance", "mm"], ["tool speed", "mm/s"], ["busiest joint", "of limit"], ["reserve", "×"], ["sigma_min", ""]];
const KEYS = "Keys on the timeline: ← → one sample · with Shift far · Page Up, Page Down · Home, End · N next finding, P previous · + − 0 zoom · drag the arm to turn it";
const MOST_ZOOM = 1 / 2000;

function element(name, attributes = {}, ...children) {
  const made = document.createElement(name);
  for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
  made.append(...children);
  return made;
}

// Everything that takes the focus keeps JupyterLab's shortcuts away from itself.
function focusable(name, attributes, ...children) {
  return element(name, { tabindex: "0", "data-lm-suppress-shortcuts": "true", ...attributes }, ...children);
}

function severityMark(severity) {
  return element("span", { class: "pa-mark" }, element("i", { class: `pa-swatch pa-${severity}` }), severity);
}

// onCursor(sample) is told where the cursor stands; askRetimed(on), where there is somebody to ask, fetches the audit of the retimed path.
export function mount(root, onCursor, askRetimed) {
  const parts = skeleton(root);
  const state = { facts: null, data: null, arm: null, place: null, colours: null, i: 0, selected: -1, width: 0, span: null, onStrip: false, frame: 0, stale: false };

  function show(facts, data) {
    const sample = state.data ? state.data.sample[0][state.i] : null, ends = state.place && state.place.zoomed ? state.span.map(sampleAt) : null;
    Object.assign(state, { facts, data, arm: armView(facts, data), selected: -1, width: 0 });
    state.i = sample === null ? firstPlace(facts) : nearest(data.sample[0], sample);
    state.span = ends ? ends.map((end) => data.time_s[0][nearest(data.sample[0], end)]) : [0, facts.duration_s];
    fillHead(parts.head, facts, askRetimed);
    fillFindings(parts.findings, facts, choose);
    resize();
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
    const armWidth = wide ? width - rowsWidth - 10 : width, armHeight = wide ? state.place.height : 300;
    parts.rows.style.width = `${rowsWidth}px`;
    parts.rows.style.height = `${state.place.height}px`;
    parts.arm.style.width = `${armWidth}px`;
    parts.arm.style.height = `${armHeight}px`;
    state.arm.frameAll(armWidth, armHeight);
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
    parts.whole.disabled = !state.place.zoomed;
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
    const { facts, data, place, arm, i } = state;
    if (state.stale) {
      state.stale = false;
      state.colours = theme(root);
      drawRows(parts.rowsBase, place, state.colours, facts, data);
      arm.drawStage(parts.armBase, state.colours);
    }
    drawCursor(parts.rowsOver, place, state.colours, data, i, state.selected);
    arm.drawArm(parts.armOver, state.colours, i);
    readOut();
    root.dataset.cursor = i;
    root.dataset.painted = Number(root.dataset.painted || 0) + 1;
  }

  function readOut() {
    const { facts, data, i } = state;
    const time = data.time_s[0][i], worst = worstJoint(data, i), reserve = data.reserve[0][i];
    const values = [fixed(facts.offset_s + time, 3), fixed(data.distance_mm[0][i], 1), fixed(data.speed_mm_s[0][i], 1),
                    worst ? `${facts.joints[worst[0]]} ${worst[1].toFixed(0)} %` : "–",
                    reserve === Infinity ? "at rest" : reserve > 99 ? "> 99" : fixed(reserve, 2), fixed(data.sigma_min[0][i], 3)];
    values.forEach((value, k) => { if (parts.values[k].textContent !== value) parts.values[k].textContent = value; });
    const here = facts.findings.filter((f) => time >= f.from_s - 1e-6 && time <= f.to_s + 1e-6);
    const said = here.length ? here.map((f) => `${f.number} ${f.severity}: ${f.kind} ${f.joint}`.trim()).join(" · ") : "no finding";
    if (parts.here.textContent !== said) {
      parts.here.textContent = parts.here.title = said;
      [...parts.findings.rows].forEach((row, k) => row.classList.toggle("pa-here", here.includes(facts.findings[k])));
    }
    const slider = parts.rows;
    slider.setAttribute("aria-valuemax", facts.duration_s);
    slider.setAttribute("aria-valuenow", time.toFixed(3));
    slider.setAttribute("aria-valuetext", `${values[0]} seconds, ${values[1]} millimetres, busiest joint ${values[3]}, ${said}`);
  }

  // Where the place lies outside the rows' span they follow it, unless `still`; `quiet`: nobody is told.
  function moveTo(i, { selected = -1, quiet = false, still = false } = {}) {
    if (!state.data) return;
    state.i = clamp(i, 0, state.data.time_s[0].length - 1);
    const time = state.data.time_s[0][state.i], [from, to] = state.span;
    if (state.place && !still && (time < from || time > to)) zoomTo(to - from, time);
    if (selected !== state.selected) {
      state.selected = selected;
      [...parts.findings.rows].forEach((row, k) => row.setAttribute("aria-selected", k === selected));
    }
    repaint(false);
    if (!quiet) onCursor(state.data.sample[0][state.i]);
  }

  // Follow another view of the same model; our own place comes back this way too, and changes nothing.
  function toSample(sample) {
    const i = state.data ? nearest(state.data.sample[0], sample) : state.i;
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
    const findings = state.facts.findings;
    const order = findings.map((_, k) => k).sort((a, b) => findings[a].at - findings[b].at || a - b);
    const from = order.indexOf(state.selected);
    const beyond = (k) => direction * (findings[k].at - state.i) > 0;
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
    event.preventDefault();
    event.stopPropagation();
  }

  function onScrub(event) {
    if (!state.place || (event.type === "pointermove" && !event.buttons)) return;
    const box = parts.rows.getBoundingClientRect(), x = event.clientX - box.left, y = event.clientY - box.top;
    if (event.type === "pointerdown") {
      parts.rows.focus({ preventScroll: true });
      const block = blockAt(state.place, x, y);
      if (block >= 0) return choose(block);
      state.onStrip = y < state.place.process + 8;
      parts.rows.setPointerCapture(event.pointerId);
    } else if (!parts.rows.hasPointerCapture(event.pointerId)) return;
    moveTo(nearest(state.data.time_s[0], state.onStrip ? state.place.wholeTime(x) : state.place.time(x)), { still: !state.onStrip });
  }

  // A pinch, or the wheel with Ctrl: the plain wheel stays the page's.
  function onWheel(event) {
    if (!state.place || !event.ctrlKey) return;
    event.preventDefault();
    zoomTo(1.002 ** event.deltaY * (state.span[1] - state.span[0]), state.place.time(event.clientX - parts.rows.getBoundingClientRect().left));
  }

  function turn(dx, dy) {
    state.arm.orbit(dx, dy);
    repaint(true);
  }

  function onOrbit(event) {
    if (event.type === "pointerdown") parts.arm.setPointerCapture(event.pointerId);
    else if (parts.arm.hasPointerCapture(event.pointerId)) turn(event.movementX, event.movementY);
  }

  function onOrbitKey(event) {
    const by = { ArrowLeft: [-8, 0], ArrowRight: [8, 0], ArrowUp: [0, -8], ArrowDown: [0, 8] }[event.key];
    if (by) turn(...by);
    else if (event.key === "Home") { state.arm.reset(); repaint(true); }
    else return;
    event.preventDefault();
    event.stopPropagation();
  }

  // Whoever still holds this view after its end holds no data and no canvas.
  function close() {
    watch.disconnect();
    themes.disconnect();
    cancelAnimationFrame(state.frame);
    root.replaceChildren();
    for (const name of Object.keys(state)) state[name] = null;
    for (const name of Object.keys(parts)) delete parts[name];
  }

  parts.rows.addEventListener("keydown", onKey);
  parts.rows.addEventListener("wheel", onWheel, { passive: false });
  [[parts.nearer, 0.5], [parts.farther, 2], [parts.whole, Infinity]].forEach(([button, factor]) => button.addEventListener("click", () => zoom(factor)));
  for (const type of ["pointerdown", "pointermove"]) {
    parts.rows.addEventListener(type, onScrub);
    parts.arm.addEventListener(type, onOrbit);
  }
  parts.arm.addEventListener("keydown", onOrbitKey);
  parts.arm.addEventListener("dblclick", () => { state.arm.reset(); repaint(true); });
  // The style sheet gives the root a minute colour transition: its end tells that a new theme has arrived. A root that was out of the
  // document meanwhile has none; the page's own mark of the theme tells then.
  for (const type of ["transitionend", "transitioncancel"]) root.addEventListener(type, (event) => event.target === root && repaint(true));
  const themes = new MutationObserver(() => repaint(true));
  themes.observe(document.body, { attributeFilter: ["class", "data-jp-theme-name", "data-jp-theme-light"] });
  const watch = new ResizeObserver(resize);
  watch.observe(root);

  return {
    show, say: (words) => { parts.status.textContent = words; },
    toSample,
    close,
  };
}

// The first look is at the worst news: the first finding that fails, else the first finding, else the start.
function firstPlace(facts) {
  const first = facts.findings.find((f) => f.severity === "fail") || facts.findings[0];
  return first ? first.at : 0;
}

function skeleton(root) {
  root.classList.add("pa");
  root.replaceChildren();
  const layers = () => [element("canvas"), element("canvas")];
  const head = element("div", { class: "pa-head" });
  const values = READOUT.map(() => element("b"));
  const here = element("b");
  const [farther, nearer, whole] = [["−", "Show more of the path"], ["+", "Show less of the path, larger"], ["whole path", "Show the whole path"]]
    .map(([words, name]) => focusable("button", { type: "button", "aria-label": name, title: name }, words));
  whole.disabled = true;
  const readout = element("div", { class: "pa-read" },
    ...READOUT.map(([name, unit], k) => element("div", {}, element("span", {}, name), values[k], element("span", { class: "pa-unit" }, unit))),
    element("div", { class: "pa-where" }, element("span", {}, "at the cursor"), here),
    element("div", { class: "pa-zoom" }, farther, nearer, whole));
  const [rowsBase, rowsOver] = layers(), [armBase, armOver] = layers();
  const rows = focusable("div", { class: "pa-rows", role: "slider", "aria-label": "Place on the path", "aria-valuemin": "0" }, rowsBase, rowsOver);
  const arm = focusable("div", { class: "pa-arm", role: "img", "aria-label": "The arm at the cursor; arrow keys turn the view" }, armBase, armOver);
  const findings = element("tbody");
  const table = element("table", { class: "pa-findings" },
    element("thead", {}, element("tr", {}, ...["", "", "finding", "from – to, s", "from – to, mm", "worst", "why"].map((name) => element("th", {}, name)))), findings);
  const status = element("div", { class: "pa-status", role: "status" });
  root.append(head, readout, element("div", { class: "pa-main" }, rows, arm), element("div", { class: "pa-list" }, table),
    element("div", { class: "pa-keys" }, KEYS), status);
  return { head, values, here, rows, rowsBase, rowsOver, arm, armBase, armOver, findings, farther, nearer, whole, status };
}

function fillHead(head, facts, askRetimed) {
  const again = facts.retiming;
  const said = [facts.file, `${facts.samples.toLocaleString("en")} samples`, `${fixed(facts.duration_s, 2)} s`, `${fixed(facts.length_mm, 0)} mm`];
  if (facts.shown < facts.samples) said.push(`${facts.shown.toLocaleString("en")} drawn, every peak kept`);
  const needed = again.feasible && again.slowest_percent < 99.95;
  const retiming = again.applied
    ? `Shown with the suggested retiming (${again.style}), slowest ${fixed(again.slowest_percent, 0)} % of the programmed speed.`
    : needed ? `Suggested retiming: ${again.why}` : again.why;
  head.replaceChildren(element("span", { class: "pa-verdict" }, element("i", { class: `pa-swatch pa-${facts.verdict}` }), facts.verdict),
    element("b", {}, facts.name), element("span", {}, said.join(" · ")), element("p", {}, retiming));
  if (!askRetimed || !(needed || again.applied)) return;
  const button = focusable("button", { type: "button", "aria-pressed": again.applied }, again.applied ? "Show as programmed" : "Show as retimed");
  button.addEventListener("click", () => askRetimed(!again.applied));
  head.lastChild.append(" ", button);
}

function fillFindings(body, facts, choose) {
  const cell = (words, kind = "") => element("td", { class: kind }, words);
  const range = (a, b, digits) => `${fixed(a, digits)} – ${fixed(b, digits)}`;
  body.replaceChildren(...facts.findings.map((f, k) => {
    const row = focusable("tr", { "aria-selected": "false" }, cell(String(f.number), "pa-number"), cell(severityMark(f.severity)),
      cell(f.joint ? `${f.kind}, ${f.joint}` : f.kind), cell(range(facts.offset_s + f.from_s, facts.offset_s + f.to_s, 2), "pa-number"),
      cell(range(f.from_mm ?? NaN, f.to_mm ?? NaN, 0), "pa-number"), cell(f.worst), cell(f.why, "pa-why"));
    row.addEventListener("click", () => choose(k));
    row.addEventListener("keydown", (event) => {
      if (event.key !== "Enter" && event.key !== " ") return;
      choose(k);
      event.preventDefault();
      event.stopPropagation();
    });
    return row;
  }));
  body.parentNode.tHead.hidden = !facts.findings.length;
  if (!facts.findings.length) body.replaceChildren(element("tr", {}, element("td", { colspan: "7" }, "No findings.")));
}
