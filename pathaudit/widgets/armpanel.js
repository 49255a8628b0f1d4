// The arm's place in the timeline: its bar of views and choices, its two canvases, and moving the eye by mouse, wheel and keys.

import { armView } from "./arm.js";
import { button, element, focusable, taken } from "./dom.js";
import { keyTable } from "./keys.js";
import { MEASURES } from "./shading.js";

const VIEWS = ["front", "side", "top", "three-quarter"];
const ELLIPSOID = "Velocity ellipsoid: how fast the tool point can go each way, joint speeds counted in shares of their limits";

// repaint(): ask for all pictures to be drawn again.
export function armPanel(ui, repaint) {
  let view = null;

  // What a hand does to the view, and then the picture again.
  const act = (how) => (event) => {
    how(event);
    repaint();
  };
  const stage = element("canvas"), over = element("canvas"), keys = keyTable("Keys of the view", "Keys on the view of the arm");
  const node = focusable("div", { class: "pa-arm", role: "img", "aria-label": "The arm at the cursor; arrow keys turn the view" }, stage, over);
  const measure = focusable("select", { "aria-label": "Colour of the path", title: "Colour of the path" },
    ...MEASURES.map(({ name }, k) => element("option", { value: k }, name)));
  measure.addEventListener("change", act(() => { view.look.measure = Number(measure.value); }));
  const ellipsoid = button("ellipsoid", ELLIPSOID, act(() => ellipsoid.setAttribute("aria-pressed", view.look.ellipsoid = !view.look.ellipsoid)));
  ellipsoid.setAttribute("aria-pressed", false);
  const all = act(() => view.fitTo()), from = VIEWS.map((_, k) => act(() => view.view(k)));
  const bar = element("div", { class: "pa-arm-bar" }, ...VIEWS.map((name, k) => button(k < 3 ? name : "3/4", `${name} view`, from[k])),
    button("fit", "Show all of path and arm", all), measure, ellipsoid, keys.node);
  const pane = element("div", { class: "pa-arm-pane" }, bar, node);

  function show() {
    view = armView(ui.facts(), ui.data(), view);
  }

  function fit(width, height) {
    pane.style.width = `${width}px`;
    const room = height - bar.offsetHeight;
    node.style.height = `${room}px`;
    view.frameAll(width - 2, room - 2);
  }

  // Draw the arm at kept sample i; `all`: the floor and the path too.
  function paint(colours, i, all) {
    if (all) view.drawStage(stage, colours);
    view.drawArm(over, colours, i);
  }

  const move = (dx, dy) => act((event) => (event.shiftKey ? view.pan : view.orbit)(dx, dy));
  for (const entry of [
    [["ArrowLeft"], "← →", "turn, with Shift move", move(-8, 0)],
    [["ArrowRight"], "", "", move(8, 0)],
    [["ArrowUp"], "↑ ↓", "tilt, with Shift move", move(0, -8)],
    [["ArrowDown"], "", "", move(0, 8)],
    [["+", "="], "+", "nearer to the tool (also the wheel, after a click or with Ctrl)", act(() => view.zoom(1.25))],
    [["-"], "−", "farther", act(() => view.zoom(0.8))],
    ...VIEWS.map((name, k) => [[`${k + 1}`], k + 1, `${name} view`, from[k]]),
    [["Home"], "Home", "all of path and arm", all],
  ]) keys.add(...entry);

  node.addEventListener("keydown", keys.onKey);
  node.addEventListener("dblclick", from[3]);
  node.addEventListener("pointerdown", (event) => node.setPointerCapture(event.pointerId));
  node.addEventListener("pointermove", (event) => node.hasPointerCapture(event.pointerId) && move(event.movementX, event.movementY)(event));
  // The plain wheel stays the page's until the view has the focus.
  node.addEventListener("wheel", (event) => {
    if (!event.ctrlKey && document.activeElement !== node) return;
    act(() => view.zoom(1.002 ** -event.deltaY, event.offsetX, event.offsetY))();
    taken(event);
  }, { passive: false });

  return { node: pane, show, fit, paint };
}
