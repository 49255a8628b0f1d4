// The notes pinned to the path: read by everybody, written where a kernel listens. A text that was typed stays until Python has it.

import { taken } from "./dom.js";

export function notesPanel({ element, focusable, button, ask, finding, sample, place, go, key }) {
  const node = element("section", { class: "pa-notes", "aria-label": "Notes" });
  const list = element("div", { role: "list" }), state = element("span"), fault = element("div", { class: "pa-mark", role: "alert" });
  const typed = {}, about = element("b"), text = focusable("textarea", { rows: 3, "aria-label": "Text of the note" });
  const form = element("div", { hidden: "" }, about, text, button("save", "Save the note (Ctrl and Enter)", save), button("cancel", "Leave it (Esc)", leave));
  const filter = focusable("select", { "aria-label": "Notes listed" }, element("option", {}, "all"), element("option", {}, "open"));
  const author = field("Your name", "author"), file = field("File; another name saves them there", "file");
  const add = button("write a note", "At the cursor or on the selected finding", () => write({ where: "" }));
  let notes = [], draft = null, sent = false;

  function field(title, what) {
    const made = focusable("input", { "aria-label": title, title });
    made.addEventListener("change", () => ask({ do: `note ${what}`, [what]: made.value }));
    return made;
  }

  // `typed` holds what is not saved yet, by note; "" is the new one.
  function write({ id = "", where, text: saved = "" }) {
    const on = finding();
    draft = { id, sample: sample(), finding: on < 0 ? null : on };
    about.textContent = where || (on < 0 ? place(draft.sample) : `finding ${on + 1}`);
    text.value = typed[id] ?? saved;
    form.hidden = false;
    text.focus();
  }

  function save() {
    sent = ask({ do: draft.id ? "note edit" : "note add", ...draft, text: text.value }) !== false;
  }

  function leave() {
    if (draft.id) delete typed[draft.id];
    form.hidden = true;
    (buttons(draft.id)[1] || add).focus();
  }

  const buttons = (id) => list.querySelectorAll(`[data-id="${id}"] button`);

  function remover(id) {
    const made = button("delete", "Delete the note; asks once", () => {
      if (made.textContent === "sure?") ask({ do: "note delete", id });
      made.textContent = "sure?";
    });
    made.addEventListener("blur", () => { made.textContent = "delete"; });
    return made;
  }

  function row(note, k) {
    const { id, settled, stale, mark } = note;
    const done = settled ? "reopen" : "settle";
    const acts = ask ? [button("edit", `edit note ${k + 1}`, () => write(note)), button(done, `${done} note ${k + 1}`, () => ask({ do: "note settle", id, settled: !settled })), remover(id)] : [];
    const parts = [["", note.text], ...(note.others || []).map(({ by, text: other }) => [`or, by ${by}: `, other]), ["To decide: ", mark], ["Stale: ", stale]];
    return element("div", { role: "listitem", class: settled ? "pa-settled" : "", "data-id": id },
      element("div", { class: "pa-line" }, element("b", {}, `${k + 1}${stale ? "?" : ""}`), button(note.where, `Note ${k + 1}, ${note.where}`, () => go(note.sample)),
        [note.status, note.author, note.date, note.edited, note.finding].filter(Boolean).join(" · "), ...acts),
      ...parts.filter(([, words]) => words).map(([head, words]) => element("div", { dir: "auto" }, element("b", {}, head), words)));
  }

  function fill() {
    const held = document.activeElement, id = held?.closest("[data-id]")?.dataset.id, at = [...buttons(id)].indexOf(held);
    list.replaceChildren(...notes.map(row).filter((_, k) => !filter.selectedIndex || !notes[k].settled));
    if (at >= 0) (buttons(id)[at] || add).focus();
  }

  function show(told) {
    notes = told.notes;
    node.hidden = !ask && !notes.length;
    author.value = told.author;
    file.value = told.file;
    state.textContent = told.state;
    fault.textContent = told.fault;
    fill();
    if (sent && notes.some((note) => note.text === text.value)) {
      delete typed[draft.id];
      leave();
    }
    sent = false;
  }

  function choose(id) {
    filter.selectedIndex = 0;
    fill();
    // After the press that led here has set the focus.
    setTimeout(() => buttons(id)[0]?.focus());
  }

  filter.addEventListener("change", fill);
  text.addEventListener("input", () => { typed[draft.id] = text.value; });
  text.addEventListener("keydown", (event) => {
    const act = { Escape: leave, Enter: (event.ctrlKey || event.metaKey) && save }[event.key];
    if (act) act(taken(event));
  });
  node.append(element("div", { class: "pa-line" }, element("b", {}, "Notes"), filter, ...(ask ? [add, "signed", author, "in", file, button("read again", "Read the file again", () => ask({ do: "note reload" })), state] : [])), fault, ...(ask ? [form] : []), list);
  if (ask) key("w", "W", "write a note", () => add.click());
  return { node, show, choose };
}
