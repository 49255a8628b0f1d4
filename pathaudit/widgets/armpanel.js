// The arm's place in the timeline: its two canvases, and turning the view by mouse and keys.

import { armView } from "./arm.js";
import { element, focusable, taken } from "./dom.js";

// repaint(): ask for all pictures to be drawn again.
export function armPanel(ui, repaint) {
  const stage = element("canvas"), over = element("canvas");
  const node = focusable("div", { class: "pa-arm", role: "img", "aria-label": "The arm at the cursor; arrow keys turn the view" }, stage, over);
  let view = null;

  function show() {
    view = armView(ui.facts(), ui.data());
  }

  function fit(width, height) {
    node.style.width = `${width}px`;
    node.style.height = `${height}px`;
    view.frameAll(width, height);
  }

  // Draw the arm at kept sample i; `all`: the floor and the path too.
  function paint(colours, i, all) {
    if (all) view.drawStage(stage, colours);
    view.drawArm(over, colours, i);
  }

  function turn(dx, dy) {
    view.orbit(dx, dy);
    repaint();
  }

  function reset() {
    view.reset();
    repaint();
  }

  node.addEventListener("pointerdown", (event) => node.setPointerCapture(event.pointerId));
  node.addEventListener("pointermove", (event) => node.hasPointerCapture(event.pointerId) && turn(event.movementX, event.movementY));
  node.addEventListener("dblclick", reset);
  node.addEventListener("keydown", (event) => {
    const by = { ArrowLeft: [-8, 0], ArrowRight: [8, 0], ArrowUp: [0, -8], ArrowDown: [0, 8] }[event.key];
    if (by) turn(...by);
    else if (event.key === "Home") reset();
    else return;
    taken(event);
  });

  return { node, show, fit, paint };
}
