// Which piece of the axis the rows show.

import { clamp } from "./data.js";

const MOST_ZOOM = 1 / 2000;

// state: the view's, with axis, span and the kept sample i; laid(): lay the rows out anew and have them painted.
export function rowSpan(state, laid) {
  const here = () => state.axis.places[state.i], size = () => state.span[1] - state.span[0];

  function show(start, long) {
    const { size: all } = state.axis, held = clamp(long, MOST_ZOOM * all, all), from = clamp(start, 0, all - held);
    state.span = [from, from + held];
    laid();
  }

  // `about` stays where it stood, or comes to the middle where it was out of sight.
  function zoom(factor, about = here()) {
    const [from, to] = state.span, { size: all } = state.axis, long = clamp(factor * size(), MOST_ZOOM * all, all);
    show(about - (about >= from && about <= to ? (about - from) / (to - from || 1) : 0.5) * long, long);
  }

  function follow() {
    if (here() < state.span[0] || here() > state.span[1]) zoom(1);
  }

  function pan(by) {
    show(state.span[0] + by, size());
  }

  // A short piece keeps something of its neighbourhood.
  function fit([from, to]) {
    const long = Math.max(1.6 * (to - from), Math.min(10 * (to - from), 0.08 * state.axis.size));
    show(0.5 * (from + to - long), long);
  }

  return { show, zoom, follow, pan, fit, size, zoomed: () => size() < 0.999 * state.axis.size };
}
