// What lies over the rows and moves: the cursor with its numbers, the selected finding, the marked stretch and the factor that is tried on it.

import { clamp, fixed } from "./data.js";
import { factorLane, heightOf } from "./layout.js";
import { clipTo } from "./rows.js";
import { boxed, stroke } from "./strip.js";
import { fit, text } from "./theme.js";

// i: kept sample at the cursor; finding: number of the selected one, or -1; stretch: {ends: [from, to] on the axis, words} or null;
// factor: {percent, tried} or null, where it cannot be dragged.
export function drawOverlay(canvas, place, colours, data, { i, finding, stretch, factor }) {
  const context = fit(canvas, place.width, place.height);
  context.save();
  clipTo(context, place, place.top - 4, place.height);
  if (finding >= 0) outline(context, place, place.findings[finding], colours.ink, [4, 3]);
  context.restore();
  if (stretch) drawStretch(context, place, colours, stretch, factor);
  drawCursor(context, place, colours, data, i);
}

function outline(context, place, ends, colour, dash, width = 1) {
  const [a, b] = ends.map(place.x), right = Math.max(a + 2, b), top = place.top - 2, low = place.bottom - 1;
  stroke(context, [[a, top], [right, top], [right, low], [a, low], [a, top - width / 2]], colour, width, dash);
}

function drawStretch(context, place, colours, { ends, words }, factor) {
  const [a, b] = ends.map(place.x), { left, plot, bottom, process } = place;
  const [from, to] = ends.map(place.whole);
  stroke(context, [[from, process - 5], [from, process + 5], [Math.max(from + 1, to), process + 5], [Math.max(from + 1, to), process - 5]], colours.line, 1.5);
  context.save();
  clipTo(context, place, place.top - 4, place.height);
  outline(context, place, ends, colours.line, [], 2);
  for (const x of [a, b]) {
    context.fillStyle = colours.line;
    context.fillRect(x - 3, place.top - 4, 6, 9);
  }
  if (factor) drawFactor(context, place, colours, [a, b], factor);
  context.restore();
  if (b < left || a > left + plot) return;
  context.font = `11px ${colours.font}`;
  const half = context.measureText(words).width / 2;
  boxed(context, words, clamp((Math.max(a, left) + Math.min(b, left + plot)) / 2, half + 4, place.width - half - 4), bottom + 30, colours);
}

// The handle that is dragged up and down; while it is dragged, the factor that is asked for.
function drawFactor(context, place, colours, [a, b], { percent, tried }) {
  const lane = factorLane(place);
  if (!lane) return;
  const y = heightOf(lane, percent), from = Math.max(a, place.left), middle = (from + Math.min(b, place.left + place.plot)) / 2;
  stroke(context, [[a, y], [b, y]], colours.line, tried ? 3 : 2, tried ? [] : [2, 2]);
  context.fillStyle = colours.line;
  context.fillRect(middle - 9, y - 3, 18, 6);
  if (tried) boxed(context, `${percent.toFixed(0)} %`, middle, y > lane.y + lane.height / 2 ? y - 13 : y + 13, colours);
}

function drawCursor(context, place, colours, data, i) {
  const at = place.axis.places[i], x = Math.round(place.x(at)) + 0.5, above = Math.round(place.whole(at)) + 0.5, { process } = place;
  const inside = x >= place.left - 1 && x <= place.left + place.plot + 1;
  context.globalAlpha = 0.6;      // a peak right under the cursor still shows
  if (inside) stroke(context, [[x, place.zoomed ? place.top : process], [x, place.bottom]], colours.ink);
  context.globalAlpha = 1;
  context.fillStyle = colours.ink;
  context.beginPath();
  for (const [px, py] of [[above - 5, process - 9], [above + 5, process - 9], [above, process - 2]]) context.lineTo(px, py);
  context.fill();
  for (const lane of place.lanes) {
    const { row } = lane, [name, column] = row.lines.at(-1), value = data[name][column][i], y = heightOf(lane, value);
    if (!row.word) text(context, fixed(value, row.digits), place.width - 4, lane.y + lane.height / 2, { colour: colours.ink, align: "right", family: colours.mono });
    if (!inside || !(y > lane.y - 1 && y <= lane.y + lane.height + 1)) continue;
    context.beginPath();
    context.arc(x, y, 2.5, 0, 7);
    context.fill();
  }
}
