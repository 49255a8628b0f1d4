// The axis that all rows share: time, or distance along the path. A dwell has no width on the distance axis.

import { clamp } from "./data.js";

// places: where the kept samples lie on it. Spans come in seconds after the first sample, marks by sample number; both find their place here.
export function rowAxis(facts, data, far) {
  const time = data.time_s[0], places = far ? data.distance_mm[0] : time;
  return {
    far, places, size: places.at(-1) || 1, offset: far ? 0 : facts.offset_s, name: far ? "distance, mm" : "time, s",
    ofTime: far ? (value) => between(time, places, value) : (value) => value,
    ofSample: (value) => between(data.sample[0], places, value),
  };
}

// The value of column `to` where the increasing column `from` reaches `value`, on a straight line between samples.
export function between(from, to, value) {
  let low = 0, high = from.length - 1;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (from[middle] <= value) low = middle; else high = middle;
  }
  const step = from[high] - from[low];
  return to[low] + (step ? clamp((value - from[low]) / step, 0, 1) : 0) * (to[high] - to[low]);
}
