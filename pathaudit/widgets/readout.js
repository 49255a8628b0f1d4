// What is said above the rows: the verdict and what was audited, and the numbers at the cursor.

import { fixed, worstJoint } from "./data.js";
import { button, element } from "./dom.js";

const READOUT = [["time", "s"], ["distance", "mm"], ["tool speed", "mm/s"], ["as suggested", "mm/s"],
  ["busiest joint, of limit", ""], ["reserve", "×"], ["sigma_min", ""]];

export function headPanel(ui) {
  const node = element("div", { class: "pa-head" }), retimed = element("p");
  let tallest = 0;

  // The rows below do not move while a trial changes the sentence: it keeps the height that it once had at this width.
  function keep() {
    tallest = Math.max(tallest, retimed.offsetHeight);
    retimed.style.minHeight = `${tallest}px`;
  }

  function fit() {
    tallest = 0;
    retimed.style.minHeight = "";
    keep();
  }

  function show() {
    const facts = ui.facts(), again = facts.retiming;
    const said = [facts.file, `${facts.samples.toLocaleString("en")} samples`, `${fixed(facts.duration_s, 2)} s`, `${fixed(facts.length_mm, 0)} mm`];
    if (facts.spread) said.push(facts.spread);
    if (facts.shown < facts.samples) said.push(`${facts.shown.toLocaleString("en")} drawn, every peak kept`);
    const needed = again.feasible && again.slowest_percent < 99.95;
    const retiming = again.applied ? `Shown at other speeds than programmed. ${again.why}`
      : needed ? `Suggested retiming: ${again.why}` : again.why;
    node.replaceChildren(element("span", { class: "pa-verdict" }, element("i", { class: `pa-swatch pa-${facts.verdict}` }), facts.verdict),
      element("b", {}, facts.name), element("span", {}, said.join(" · ")), retimed);
    retimed.replaceChildren(retiming);
    if (ui.ask && (needed || again.applied)) offer(again.applied);
    keep();
  }

  function offer(applied) {
    const words = applied ? "Show as programmed" : "Show as retimed";
    retimed.append(" ", button(words, words, () => {
      ui.say("Waiting for the kernel ...");
      ui.ask(applied ? { do: "show", name: "as programmed" } : { do: "accept" });
    }));
  }

  return { node, show, fit };
}

export function readoutPanel() {
  const names = READOUT.map(([name]) => element("span", {}, name)), values = READOUT.map(() => element("b"));
  const here = element("b"), lost = element("b");
  const node = element("div", { class: "pa-read" },
    ...READOUT.map(([, unit], k) => element("div", {}, names[k], values[k], element("span", { class: "pa-unit" }, unit))),
    element("div", { class: "pa-where" }, element("span", {}, "at the cursor"), here),
    element("div", { class: "pa-lost" }, element("span", {}, "lost direction"), lost));
  const set = (one, words) => { if (one.textContent !== words) one.textContent = one.title = words; };

  // Gives the findings at kept sample i, and the place in words for those who listen.
  function show(facts, data, i) {
    const time = data.time_s[0][i], sample = data.sample[0][i], worst = worstJoint(data, i), reserve = data.reserve[0][i];
    const other = data.before_speed_mm_s || data.suggested_speed_mm_s;
    const said = [fixed(facts.offset_s + time, 3), fixed(data.distance_mm[0][i], 1), fixed(data.speed_mm_s[0][i], 1), other ? fixed(other[0][i], 1) : "–",
                  worst ? `${facts.joints[worst[0]]} ${worst[1].toFixed(0)} %` : "–",
                  reserve === Infinity ? "at rest" : reserve > 99 ? "> 99" : fixed(reserve, 2), fixed(data.sigma_min[0][i], 3)];
    set(names[3], data.before_speed_mm_s ? "as programmed" : "as suggested");
    said.forEach((value, k) => set(values[k], value));
    const found = facts.findings.filter((f) => time >= f.from_s - 1e-6 && time <= f.to_s + 1e-6);
    const words = found.length ? found.map((f) => `${f.number} ${f.severity}: ${f.kind} ${f.joint}`.trim()).join(" · ") : "no finding";
    const gone = facts.lost.find(([from, to]) => sample >= from && sample <= to);
    const line = data.line ? `line ${data.line[0][i]}` : "";
    set(here, line ? `${line} · ${words}` : words);
    set(lost, gone ? `can hardly ${gone[2]}` : "none");
    return { found, words: `${said[0]} seconds, ${said[1]} millimetres, busiest joint ${said[4]}, ${line && `${line}, `}${words}${gone ? `, the tool can hardly ${gone[2]}` : ""}` };
  }

  return { node, show };
}
