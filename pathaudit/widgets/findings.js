// The table of findings: sorted by any column, filtered by severity and by text.

import { fixed } from "./data.js";
import { element, focusable, severityMark, taken } from "./dom.js";

const range = (a, b, digits) => `${fixed(a, digits)} – ${fixed(b, digits)}`;

// Heading, what is shown (finding, start of the clock), what is sorted by, class of the cell.
const FINDING_COLUMNS = [
  ["no.", (f) => String(f.number), (f) => f.number, "pa-number"],
  ["severity", (f) => severityMark(f.severity), (f) => (f.severity === "fail" ? 0 : 1)],
  ["finding", (f) => (f.joint ? `${f.kind}, ${f.joint}` : f.kind), (f) => `${f.kind} ${f.joint}`],
  ["from – to, s", (f, start) => range(start + f.from_s, start + f.to_s, 2), (f) => f.from_s, "pa-number"],
  ["from – to, mm", (f) => range(f.from_mm ?? NaN, f.to_mm ?? NaN, 0), (f) => f.from_mm ?? Infinity, "pa-number"],
  ["worst", (f) => f.worst, (f) => f.worst],
  ["why", (f) => `${f.why} ${f.line || ""}`.trim(), (f) => f.why, "pa-why"],
];

// choose(k): go to finding k.
export function findingsPanel(ui, choose) {
  const body = element("tbody"), rows = new Map();
  const heads = FINDING_COLUMNS.map(([name], k) => element("th", { scope: "col" }, ui.button(name, `Sort by ${name}`, () => sort(k))));
  const head = element("thead", {}, element("tr", {}, ...heads));
  const severity = focusable("select", { "aria-label": "Which findings are listed" },
    ...["all", "fail", "warn"].map((name) => element("option", { value: name }, name === "all" ? "all findings" : `${name} only`)));
  const words = focusable("input", { type: "search", placeholder: "with the words ...", "aria-label": "List only findings with these words" });
  const count = element("span", { role: "status" });
  const bar = element("div", { class: "pa-filter" }, severity, words, count);
  const node = element("div", { class: "pa-found" }, bar, element("div", { class: "pa-list" }, element("table", { class: "pa-findings" }, head, body)));
  let column = 0, falling = false;

  function show() {
    const { findings, offset_s: start } = ui.facts();
    rows.clear();
    findings.forEach((f, k) => {
      const row = focusable("tr", { "aria-selected": "false" }, ...FINDING_COLUMNS.map(([, shown, , kind = ""]) => element("td", { class: kind }, shown(f, start))));
      row.addEventListener("click", () => choose(k));
      row.addEventListener("keydown", (event) => onKey(event, row, k));
      rows.set(f, row);
    });
    bar.hidden = findings.length < 2;
    fill();
  }

  function sort(k) {
    falling = k === column && !falling;
    column = k;
    fill();
  }

  function fill() {
    const by = FINDING_COLUMNS[column][2], wanted = words.value.trim().toLowerCase();
    const order = (a, b) => (typeof by(a) === "number" ? by(a) - by(b) : by(a).localeCompare(by(b), "en", { numeric: true })) || a.number - b.number;
    const listed = [...rows.keys()].filter((f) => (severity.value === "all" || f.severity === severity.value)
      && rows.get(f).textContent.toLowerCase().includes(wanted)).sort((a, b) => (falling ? order(b, a) : order(a, b)));
    heads.forEach((one, k) => one.setAttribute("aria-sort", k !== column ? "none" : falling ? "descending" : "ascending"));
    head.hidden = !listed.length;
    count.textContent = listed.length < rows.size ? `${listed.length} of ${rows.size}` : "";
    const none = rows.size ? "No finding is like this." : "No findings.";
    body.replaceChildren(...(listed.length ? listed.map((f) => rows.get(f)) : [element("tr", {}, element("td", { colspan: "7" }, none))]));
  }

  function onKey(event, row, k) {
    const next = { ArrowDown: row.nextSibling, ArrowUp: row.previousSibling }[event.key];
    if (next) next.focus();
    else if (event.key === "Enter" || event.key === " ") choose(k);
    else return;
    taken(event);
  }

  function select(selected) {
    [...rows.values()].forEach((row, k) => row.setAttribute("aria-selected", k === selected));
  }

  // Mark the findings that hold at the cursor.
  function mark(found) {
    for (const [f, row] of rows) row.classList.toggle("pa-here", found.includes(f));
  }

  severity.addEventListener("change", fill);
  words.addEventListener("input", fill);
  return { node, show, select, mark };
}
