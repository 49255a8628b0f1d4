// Which groups of rows are shown, in which order, and which are folded. It is kept by title, so that it outlives the data.

import { button, element, focusable, popover } from "./dom.js";

// changed(): the rows have to be laid out anew.
export function rowChoice(changed) {
  const list = element("div", { class: "pa-choice" });
  const { node, open, box } = popover("rows", "Which rows are shown, and in which order", list, fill);
  let groups = [], first = [];

  // Take the groups of new data. Those that were known before stay as they were left.
  function show(facts) {
    const known = new Map(groups.map((group, k) => [group.title, { ...group, k }]));
    first = facts.groups.map((group) => ({ ...group, shown: true }));
    groups = first.map((group, k) => {
      const { folded, shown, k: place } = known.get(group.title) || { ...group, k };
      return { ...group, folded, shown, place };
    }).sort((a, b) => a.place - b.place);
    if (!box.hidden) fill();
  }

  function change(act) {
    act();
    changed();
    if (box.hidden) return;
    const held = document.activeElement?.dataset.at;
    box.focus();      // leaving the box would close it
    fill();
    const again = list.querySelector(`[data-at="${CSS.escape(held || "")}"]`);
    (again && !again.disabled ? again : list.querySelector("input"))?.focus();
  }

  const fold = (title) => change(() => { groups = groups.map((g) => (g.title === title ? { ...g, folded: !g.folded } : g)); });

  // All joints at once: folded, or where they are so already, unfolded.
  function foldAll() {
    const folded = groups.some((g) => g.lanes.length > 1 && !g.folded);
    change(() => { groups = groups.map((g) => (g.lanes.length > 1 ? { ...g, folded } : g)); });
  }

  function move(k, by) {
    change(() => { [groups[k], groups[k + by]] = [groups[k + by], groups[k]]; });
  }

  function fill() {
    const act = (words, title, at, disabled, does) => {
      const made = button(words, title, does);
      made.dataset.at = at;
      made.disabled = disabled;
      return made;
    };
    list.replaceChildren(...groups.map((group, k) => {
      const { title } = group, tick = focusable("input", { type: "checkbox", "data-at": `box ${title}` });
      tick.checked = group.shown;
      tick.addEventListener("change", () => change(() => { groups = groups.map((g) => (g === group ? { ...g, shown: tick.checked } : g)); }));
      return element("div", {}, element("label", {}, tick, ` ${title}`),
        act(group.folded ? "unfold" : "fold", `${group.folded ? "Unfold" : "Fold"} ${title}`, `fold ${title}`, false, () => fold(title)),
        act("↑", `Move ${title} up`, `up ${title}`, !k, () => move(k, -1)),
        act("↓", `Move ${title} down`, `down ${title}`, k === groups.length - 1, () => move(k, 1)));
    }), act("as at first", "Show all rows in the first order", "first", false, () => change(() => { groups = first; })));
  }

  return { node, open, show, fold, foldAll, groups: () => groups.filter((group) => group.shown) };
}
