// The keys of the timeline: what is listed in the help is what is heard.

import { element, popover, taken } from "./dom.js";

// Each entry: the keys that do it, how they are written, what they do, the act (event), and whether Ctrl, Alt or Shift may be held.
export function keyTable(title = "All keys", head = "Keys on the timeline") {
  const entries = [];
  const list = element("table");
  const fill = () => list.replaceChildren(...entries.filter(([, , words]) => words)
    .map(([, shown, words]) => element("tr", {}, element("th", {}, shown), element("td", {}, words))));
  const help = popover("?", title, element("div", { class: "pa-help" }, element("b", {}, head), list), fill);

  function add(keys, shown, words, act) {
    for (const key of keys) entries.push([key, shown, key === keys[0] ? words : "", act]);
  }

  function onKey(event) {
    if (event.altKey || event.ctrlKey || event.metaKey) return;
    const key = event.key.length === 1 ? event.key.toLowerCase() : event.key;
    const entry = entries.find(([one]) => one === key);
    if (entry && entry[3](event) !== false) taken(event);
  }

  return { add, onKey, ...help };
}
