// The table of findings.

import { fixed } from "./data.js";
import { element, focusable, severityMark, taken } from "./dom.js";

// choose(k): go to finding k.
export function findingsPanel(ui, choose) {
  const body = element("tbody");
  const head = element("thead", {}, element("tr", {}, ...["", "", "finding", "from – to, s", "from – to, mm", "worst", "why"].map((name) => element("th", {}, name))));
  const node = element("div", { class: "pa-list" }, element("table", { class: "pa-findings" }, head, body));
  const cell = (words, kind = "") => element("td", { class: kind }, words);
  const range = (a, b, digits) => `${fixed(a, digits)} – ${fixed(b, digits)}`;

  function show() {
    const { findings, offset_s: offset } = ui.facts();
    body.replaceChildren(...findings.map((f, k) => {
      const row = focusable("tr", { "aria-selected": "false" }, cell(String(f.number), "pa-number"), cell(severityMark(f.severity)),
        cell(f.joint ? `${f.kind}, ${f.joint}` : f.kind), cell(range(offset + f.from_s, offset + f.to_s, 2), "pa-number"),
        cell(range(f.from_mm ?? NaN, f.to_mm ?? NaN, 0), "pa-number"), cell(f.worst), cell(f.why, "pa-why"));
      row.addEventListener("click", () => choose(k));
      row.addEventListener("keydown", (event) => {
        if (event.key !== "Enter" && event.key !== " ") return;
        choose(k);
        taken(event);
      });
      return row;
    }));
    head.hidden = !findings.length;
    if (!findings.length) body.replaceChildren(element("tr", {}, element("td", { colspan: "7" }, "No findings.")));
  }

  function select(selected) {
    [...body.rows].forEach((row, k) => row.setAttribute("aria-selected", k === selected));
  }

  // Mark the findings that hold at the cursor.
  function mark(found) {
    [...body.rows].forEach((row, k) => row.classList.toggle("pa-here", found.includes(ui.facts().findings[k])));
  }

  return { node, show, select, mark };
}
