// The path's colour by a measure, in Cividis (J. R. Nunez, C. R. Anderton, R. S. Renslow, PLoS ONE 13(7), 2018): dark is little, light is much.

import { clamp, worstJoint } from "./data.js";

const CIVIDIS = "00224e1235703b496c575d6d7071738a8678a59c74c3b369e1cc55fee838".match(/../g).map((two) => parseInt(two, 16));
export const SHADES = 28;

// `of`: the value at kept sample i. `top`: the least that the scale's end stands for. `log`: a scale of equal ratios.
export const MEASURES = [
  { name: "severity" },
  { name: "busiest joint", title: "busiest joint, % of speed limit", of: (data, i) => (worstJoint(data, i) || [])[1], top: 100 },
  { name: "sigma_min", title: "sigma_min, log scale", of: (data, i) => data.sigma_min[0][i], log: true },
  { name: "tool speed", title: "tool speed, mm/s", of: (data, i) => data.speed_mm_s[0][i] },
  { name: "factor", title: "factor, % of programmed speed", of: (data, i) => data.factor_percent[0][i], top: 100 },
];

// The scale spans the process stretches (air moves may be many times faster and share its ends), without any of them the whole path.
// `ends`: the values at its start, middle and end; shade(i): 0 to SHADES - 1, or -1 where nothing is known.
export function scaleOf({ of, top = 0, log }, data) {
  const values = Array.from(data.time_s[0], (_, i) => of(data, i)), known = (v) => v >= 0 && v < Infinity;
  const inside = values.filter((v, i) => known(v) && data.process[0][i]), used = inside.length ? inside : values.filter(known);
  const most = used.reduce((a, b) => Math.max(a, b), top) || 1;
  const least = log ? clamp(used.reduce((a, b) => Math.min(a, b), most), 1e-4 * most, 0.999 * most) : 0;
  const share = (v) => (log ? Math.log(v / least) / Math.log(most / least) : v / most);
  return {
    ends: [least, log ? Math.sqrt(least * most) : most / 2, most],
    shade: (i) => (values[i] >= 0 ? Math.round(clamp(share(values[i]), 0, 1) * (SHADES - 1)) : -1),
  };
}

export function shadeColour(shade) {
  const at = 9 * shade / (SHADES - 1), k = Math.min(8, Math.floor(at));
  return `rgb(${[0, 1, 2].map((c) => Math.round(CIVIDIS[3 * k + c] + (at - k) * (CIVIDIS[3 * k + 3 + c] - CIVIDIS[3 * k + c]))).join(" ")})`;
}
