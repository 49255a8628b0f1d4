// The arm's place in the timeline: its bar of views and choices, its two canvases, and moving the eye by mouse, wheel and keys.

import { armView } from "./arm.js";
import { button, element, focusable, taken } from "./dom.js";
import { MEASURES } from "./shading.js";

const VIEWS = ["front", "side", "top", "three-quarter"];
const ELLIPSOID = "Velocity ellipsoid: how fast the tool point can go each way, joint speeds counted in shares of their limits";

// repaint(): ask for all pictures to be drawn again.
export function armPanel(ui, repaint) {
  const stage = element("canvas"), over = element("canvas");
  const box = focusable("div", { class: "pa-arm", role: "img", "aria-label": "The arm at the cursor. Arrow keys turn it, with Shift move it, plus and minus zoom, "
    + "1 front, 2 side, 3 top, 4 three-quarter view, Home shows all" }, stage, over);
  const measure = focusable("select", { "aria-label": "Colour of the path", title: "Colour of the path" },
    ...MEASURES.map(({ name }, k) => element("option", { value: k }, name)));
  const ellipsoid = button("ellipsoid", ELLIPSOID, act(() => {
    view.look.ellipsoid = !view.look.ellipsoid;
    ellipsoid.setAttribute("aria-pressed", view.look.ellipsoid);
  }));
  ellipsoid.setAttribute("aria-pressed", false);
  measure.addEventListener("change", act(() => { view.look.measure = Number(measure.value); }));
  const bar = element("div", { class: "pa-arm-bar" },
    ...VIEWS.map((name, k) => button(k < 3 ? name : "3/4", `View from the ${name}`, act(() => view.view(k)))),
    button("fit", "Show all of path and arm", act(() => view.fitTo())), measure, ellipsoid);
  const node = element("div", { class: "pa-arm-pane" }, bar, box);
  let view = null;

  // What a hand does to the view, and then the picture again.
  function act(how) {
    return (...given) => {
      how(...given);
      repaint();
    };
  }

  function show() {
    view = armView(ui.facts(), ui.data(), view);
  }

  function fit(width, height) {
    node.style.width = `${width}px`;
    const room = height - bar.offsetHeight;
    box.style.height = `${room}px`;
    view.frameAll(width - 2, room - 2);
  }

  // Draw the arm at kept sample i; `all`: the floor and the path too.
  function paint(colours, i, all) {
    if (all) view.drawStage(stage, colours);
    view.drawArm(over, colours, i);
  }

  box.addEventListener("pointerdown", (event) => box.setPointerCapture(event.pointerId));
  box.addEventListener("pointermove", (event) => {
    if (box.hasPointerCapture(event.pointerId)) act(event.shiftKey ? view.pan : view.orbit)(event.movementX, event.movementY);
  });
  box.addEventListener("dblclick", act(() => view.view(3)));
  // The plain wheel stays the page's until the view has the focus.
  box.addEventListener("wheel", (event) => {
    if (!event.ctrlKey && document.activeElement !== box) return;
    act(view.zoom)(1.002 ** -event.deltaY, event.offsetX, event.offsetY);
    taken(event);
  }, { passive: false });
  box.addEventListener("keydown", (event) => {
    if (event.altKey || event.ctrlKey || event.metaKey) return;
    const by = { ArrowLeft: [-8, 0], ArrowRight: [8, 0], ArrowUp: [0, -8], ArrowDown: [0, 8] }[event.key];
    const factor = { "+": 1.25, "=": 1.25, "-": 0.8 }[event.key];
    if (by) (event.shiftKey ? view.pan : view.orbit)(...by);
    else if (factor) view.zoom(factor);
    else if ("1234".includes(event.key)) view.view(event.key - 1);
    else if (event.key === "Home") view.fitTo();
    else return;
    repaint();
    taken(event);
  });

  return { node, show, fit, paint };
}
