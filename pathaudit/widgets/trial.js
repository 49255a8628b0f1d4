// What a person tries on the speed by hand: a stretch and its factor, the suggestion piece by piece, what it changes, and variants side by side.

import { fixed } from "./data.js";

const PROGRAMMED = "as programmed";
const TOLD = [["gone", "Gone"], ["better", "Better"], ["worse", "Worse"], ["new", "New"]];
const COLUMNS = [["verdict", ""], ["fail", ""], ["warn", ""], ["duration_s", "duration, s", 2], ["slowest_percent", "slowest, %", 0],
  ["busiest_joint_percent", "busiest joint, %", 0], ["acceleration_percent", "acceleration, %", 0], ["least_sigma_min", "sigma_min", 3]];
const PATIENCE = 200;      // ms without an answer until it is said that there is work going on

export function trialPanel(ui) {
  const { element, button } = ui;
  const node = element("section", { class: "pa-trial", "aria-label": "Try other speeds" });
  if (!ui.ask) return { node, show() {}, done() {} };

  let trial = null, gesture = Date.now(), sent = 0, queued = null, waiting = 0;
  const place = element("span", { class: "pa-stretch" });
  const slider = ui.focusable("input", { type: "range", min: "5", max: "100", step: "1", "aria-label": "Factor of the stretch, percent of programmed speed" });
  const number = ui.focusable("input", { type: "number", min: "1", max: "100", step: "any", "aria-label": "Factor of the stretch, percent" });
  const lock = button("keep as programmed", "Lock the stretch: nothing may slow it", () => onStretch("lock"));
  const free = button("take back", "Take back what was tried on the stretch", () => onStretch("free"));
  const undo = button("undo", "Undo the last change", () => ask({ do: "undo" })), redo = button("redo", "Do it again", () => ask({ do: "redo" }));
  const cancel = button("cancel", "Give up the change under way", () => ui.ask({ do: "cancel" }));
  const busy = element("span", { class: "pa-busy", role: "status" }, "working ... ", cancel);
  const offers = element("div", { class: "pa-offers" }), told = element("ul", { class: "pa-told" }), table = element("table", { class: "pa-variants" });
  const name = ui.focusable("input", { type: "text", maxlength: "60", placeholder: "name", "aria-label": "Name of the variant" });
  const keep = button("keep as variant", "Keep what is shown under this name", onKeep);
  busy.hidden = true;
  node.append(element("div", { class: "pa-line" }, element("b", {}, "Try other speeds"), undo, redo, place, element("label", {}, slider, number, " %"), lock, free, busy),
    offers, told, element("div", { class: "pa-line" }, name, keep), table);

  // Asks Python; where no answer comes soon, it is said that there is work going on.
  function ask(message) {
    clearTimeout(waiting);
    if (ui.ask(message) === false) return done();
    waiting = setTimeout(() => { busy.hidden = false; }, PATIENCE);
  }

  function done() {
    clearTimeout(waiting);
    busy.hidden = true;
  }

  function onStretch(act) {
    if (ui.chosen()) ask({ do: act, ...ui.chosen() });
  }

  // While the factor is dragged one message goes out every 30 ms, the last one always.
  function setFactor(factor, drag = gesture) {
    const stretch = ui.chosen();
    if (!stretch || !(factor > 0)) return;
    queued = { do: "slow", ...stretch, factor: Math.min(1, factor), gesture: drag };
    showFactor(100 * queued.factor);
    if (!sent) flush();
  }

  function flush() {
    sent = 0;
    if (!queued) return;
    ask(queued);
    queued = null;
    sent = setTimeout(flush, 30);
  }

  function showFactor(percent) {
    slider.value = percent;
    if (document.activeElement !== number) number.value = String(Number(percent.toFixed(1)));
  }

  function showStretch() {
    const stretch = ui.chosen();
    [slider, number, lock, free].forEach((part) => { part.disabled = !stretch; });
    place.textContent = stretch ? `${ui.place(stretch.first)} to ${ui.place(stretch.last)}` : "mark a stretch: drag with Shift, or [ and ] at the cursor";
    if (!stretch || !trial) return;
    const edit = trial.edits.findLast((e) => e.kind === "slow" && e.first <= stretch.first && stretch.last <= e.last);
    showFactor(edit ? edit.percent : 100);
  }

  function onKeep() {
    const words = name.value.trim();
    if (!words) return name.focus();
    ask({ do: "keep", name: words });
    name.value = "";
  }

  function fillOffers() {
    const all = trial.offers;
    if (!all.length) return offers.replaceChildren();
    const line = (words, state, part) => element("div", { class: "pa-line" }, element("span", {}, words), element("b", {}, state === "open" ? "" : state),
      button("accept", `Accept ${words}`, () => ask({ do: "accept", ...part })), button("reject", `Reject ${words}`, () => ask({ do: "reject", ...part })));
    const state = all.every((offer) => offer.state === all[0].state) ? all[0].state : "open";
    const whole = line(`the suggested retiming, ${all.length} stretch${all.length > 1 ? "es" : ""}`, state, {});
    const each = all.length > 1 ? all.map((offer) => line(`${ui.place(offer.first)} to ${ui.place(offer.last)}, down to ${fixed(offer.slowest_percent, 0)} %`,
      offer.state, { first: offer.first, last: offer.last })) : [];
    offers.replaceChildren(whole, element("div", { class: "pa-each" }, ...each));
  }

  function fillTold() {
    const items = TOLD.map(([what, word]) => [word, trial.changes.filter((change) => change.what === what)]).filter(([, found]) => found.length)
      .map(([word, found]) => element("li", {}, element("b", {}, `${word}: `), found.map((change) => change.words).join("; ")));
    if (trial.why) items.unshift(element("li", {}, trial.why));
    told.replaceChildren(...items);
  }

  function fillVariants() {
    const rows = trial.variants.map((v) => {
      const own = v.name && v.name !== PROGRAMMED;
      const acts = [v.shown ? element("b", {}, "shown") : button("show", `Show ${v.name}`, () => ask({ do: "show", name: v.name })),
        ...(v.name === PROGRAMMED ? [] : [button("CSV", `Save the times of ${v.name || "what is shown"} as CSV`, () => ui.ask({ do: "export", name: v.name }))]),
        ...(own ? [button("drop", `Forget ${v.name}`, () => ask({ do: "drop", name: v.name }))] : [])];
      return element("tr", {}, element("th", { scope: "row" }, v.name || "on trial"),
        ...COLUMNS.map(([key, , digits]) => element("td", {}, digits === undefined ? String(v[key]) : fixed(v[key] ?? NaN, digits))), element("td", {}, ...acts));
    });
    table.hidden = rows.length < 2;
    table.replaceChildren(element("thead", {}, element("tr", {}, element("th", {}, "variant"), ...COLUMNS.map(([key, words]) => element("th", {}, words || key)), element("th", {}))),
      element("tbody", {}, ...rows));
  }

  function show(value) {
    if (value.busy && trial) return;      // what is under way is told by its end
    done();
    trial = value;
    undo.disabled = !trial.undo;
    redo.disabled = !trial.redo;
    fillOffers();
    fillTold();
    fillVariants();
    if (!sent) showStretch();
  }

  slider.addEventListener("input", () => setFactor(slider.value / 100));
  for (const type of ["pointerdown", "focus"]) slider.addEventListener(type, () => { gesture = Date.now(); });
  number.addEventListener("change", () => { gesture = Date.now(); setFactor(number.value / 100); });
  name.addEventListener("keydown", (event) => { if (event.key === "Enter") onKeep(); });
  for (const input of [slider, number, name]) input.addEventListener("keydown", (event) => event.stopPropagation());
  ui.on("factor", setFactor);
  ui.on("chosen", () => { gesture = Date.now(); showStretch(); });
  showStretch();
  return { node, show, done };
}
