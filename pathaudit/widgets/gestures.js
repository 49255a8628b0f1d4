// Mouse, pen, fingers and wheel on the rows. What they do is told to `desk` (view.js).

const POINTERS = { pin: "pointer", finding: "pointer", fold: "pointer", edge: "col-resize", factor: "ns-resize", window: "grab" };

export function listen(rows, desk) {
  const held = new Map();      // pointer -> px; two of them pinch
  let spot = null, start = 0, last = 0, moved = false, gesture = Date.now();
  const place = (event) => {
    const box = rows.getBoundingClientRect();
    return [event.clientX - box.left, event.clientY - box.top];
  };

  function onDown(event) {
    if (!desk.ready() || event.button > 0) return;
    const [x, y] = place(event);
    rows.focus({ preventScroll: true });
    rows.setPointerCapture(event.pointerId);
    held.set(event.pointerId, x);
    spot = desk.spot(x, y);
    start = last = x;
    moved = false;
    if (spot.kind === "rows" && (event.shiftKey || desk.marking())) spot = { kind: "mark" };
    if (spot.kind === "factor") gesture += 1;
    if (desk.press(spot)) spot = null;
    else if (spot.kind === "whole" || spot.kind === "rows") desk.scrub(x, spot.kind === "whole");
  }

  function drag(x, y) {
    const { kind } = spot;
    if (kind === "whole" || kind === "rows") desk.scrub(x, kind === "whole");
    else if (kind === "mark") desk.mark(start, x);
    else if (kind === "edge") desk.moveEnd(spot.end, x);
    else if (kind === "factor") desk.factor(y, gesture);
    else desk.slide(x - last);
    last = x;
  }

  function onMove(event) {
    if (!desk.ready()) return;
    const [x, y] = place(event);
    if (!event.buttons) {
      rows.style.cursor = POINTERS[desk.spot(x, y).kind] || (desk.marking() ? "crosshair" : "");
      return;
    }
    if (!rows.hasPointerCapture(event.pointerId)) return;
    if (held.size === 2) return pinch(event.pointerId, x);
    held.set(event.pointerId, x);
    moved = moved || Math.abs(x - start) > 2 || spot?.kind === "factor";
    if (spot && moved) drag(x, y);
  }

  function pinch(pointer, x) {
    const other = [...held].find(([id]) => id !== pointer)[1], was = Math.abs(held.get(pointer) - other), now = Math.abs(x - other);
    held.set(pointer, x);
    spot = null;
    if (was > 10 && now > 10) desk.zoomAt((x + other) / 2, was / now);
  }

  function onUp(event) {
    held.delete(event.pointerId);
    if (spot && desk.ready()) {
      if (!moved && (spot.kind === "window" || spot.kind === "mark")) desk.scrub(start, spot.kind === "window");
      desk.release();
    }
    spot = null;
  }

  // A pinch or the wheel with Ctrl zooms; the plain wheel is the page's until the timeline has the focus. Sideways, or with Shift, it slides.
  function onWheel(event) {
    if (!desk.ready()) return;
    const across = event.shiftKey ? event.deltaX || event.deltaY : Math.abs(event.deltaX) > Math.abs(event.deltaY) ? event.deltaX : 0;
    if (across && !event.ctrlKey ? !desk.pan(across) : !event.ctrlKey && document.activeElement !== rows) return;
    event.preventDefault();
    if (!across || event.ctrlKey) desk.zoomAt(place(event)[0], 1.002 ** event.deltaY);
  }

  rows.addEventListener("pointerdown", onDown);
  rows.addEventListener("pointermove", onMove);
  for (const type of ["pointerup", "pointercancel"]) rows.addEventListener(type, onUp);
  rows.addEventListener("wheel", onWheel, { passive: false });
}
