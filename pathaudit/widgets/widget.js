// Connects a model (anywidget's, or the stub in a one-page report) to the view.

import { unpack } from "./data.js";
import { kernelLink } from "./kernel.js";
import { mount } from "./view.js";

async function render({ model, el }) {
  let timer = 0, shown = 0;
  const root = document.createElement("div");
  el.append(root);
  const link = kernelLink(model, el, (words) => view.say(words), () => trial(false));
  const view = mount(root, link.ask, (sample) => {
    clearTimeout(timer);
    timer = setTimeout(() => link.set("cursor", sample), 150);
  });
  const status = () => view.say(link.status());
  const refresh = async () => {
    const mine = ++shown;
    if (!model.get("block").byteLength) return;      // Python is about to close this model
    try {
      const facts = model.get("facts"), data = await unpack(model.get("block"), facts.layout);
      if (mine !== shown) return;
      view.show(facts, data);
      status();
    } catch (error) {
      view.say(`The timeline cannot be drawn: ${error.message}`);
      throw error;
    }
  };
  const cursor = () => view.toSample(model.get("cursor"));
  const trial = (busy) => {
    const value = model.get("trial");
    if (value) view.showTrial(busy === false ? { ...value, busy } : value);
  };
  const notes = () => model.get("notes") && view.showNotes(model.get("notes"));
  const heard = { "change:block": refresh, "change:status": status, "change:cursor": cursor, "change:trial": trial, "change:notes": notes, "msg:custom": save };
  for (const [name, act] of Object.entries(heard)) model.on(name, act);
  await refresh();
  if (model.get("cursor") > 0) cursor();      // another view stands there, or stood there before the tab was closed
  trial();
  notes();
  return () => {
    clearTimeout(timer);
    shown = -1;
    link.close();
    for (const [name, act] of Object.entries(heard)) model.off(name, act);
    view.close();
    root.remove();      // hosts keep the element that they gave us
  };
}

// A file that Python has made, handed to the person as the browser's download.
function save(content, [text]) {
  if (!content.save) return;
  const url = URL.createObjectURL(new Blob([text], { type: "text/csv" }));
  const link = Object.assign(document.createElement("a"), { href: url, download: content.save });
  link.click();
  setTimeout(() => URL.revokeObjectURL(url), 1000);
}

export default { render };
