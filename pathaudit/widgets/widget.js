// Connects a model (anywidget's, or the stub in a one-page report) to the view.

import { unpack } from "./data.js";
import { mount } from "./view.js";

async function render({ model, el }) {
  let timer = 0, shown = 0;
  const root = document.createElement("div");
  el.append(root);
  const view = mount(root, (sample) => {
    clearTimeout(timer);
    timer = setTimeout(() => {
      model.set("cursor", sample);
      model.save_changes();
    }, 150);
  }, model.send && ((on) => {
    view.say("Waiting for the kernel ...");
    model.send({ do: "show retimed", on });
  }));
  const status = () => view.say(model.get("status"));
  const refresh = async () => {
    const mine = ++shown;
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
  model.on("change:block", refresh);
  model.on("change:status", status);
  model.on("change:cursor", cursor);
  await refresh();
  return () => {
    clearTimeout(timer);
    shown = -1;
    model.off("change:block", refresh);
    model.off("change:status", status);
    model.off("change:cursor", cursor);
    view.close();
  };
}

export default { render };
