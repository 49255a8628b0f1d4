// The base picture of the rows, drawn when data, size, span or theme change.

import { clamp, fixed, niceStep } from "./data.js";
import { factorLane, HEAD, heightOf } from "./layout.js";
import { boxed, drawStrip, stroke } from "./strip.js";
import { fit, hatch, shortened, text } from "./theme.js";

// marks: {first, last, words}, pieces of the path that somebody holds or has changed.
export function drawRows(canvas, place, colours, facts, data, marks) {
  const context = fit(canvas, place.width, place.height);
  const small = { colour: colours.soft, family: colours.font };
  drawStrip(context, place, colours);
  for (const { words, y } of place.heads) text(context, shortened(context, words, place.width - place.left, small), place.left, y, small);
  for (const title of place.titles) drawTitle(context, place, colours, title);
  for (const at of place.lanes) drawLane(context, place, at, colours, facts, data);
  drawMarks(context, place, colours, marks);
  drawAxis(context, place, colours);
}

export function clipTo(context, place, top, bottom) {
  context.beginPath();
  context.rect(place.left - 1, top, place.plot + 2, bottom - top);
  context.clip();
}

// A bracket at the top of the factor row, with its word where there is room.
function drawMarks(context, place, colours, marks) {
  const lane = factorLane(place);
  if (!lane) return;
  context.save();
  clipTo(context, place, lane.y, lane.y + lane.height);
  for (const { first, last, words } of marks) {
    const [a, b] = [first, last].map((sample) => place.x(place.axis.ofSample(sample))), y = lane.y + 4;
    stroke(context, [[a, y + 5], [a, y], [Math.max(b, a + 2), y], [Math.max(b, a + 2), y + 5]], colours.ink);
    if (words && b - a > 6.5 * words.length) boxed(context, words, clamp((a + b) / 2, place.left, place.left + place.plot), lane.y + 9, colours);
  }
  context.restore();
}

// The sign that folds a group, and its name where it has no line of words above it.
function drawTitle(context, place, colours, { group, middle, words }) {
  const x = words ? 4 : place.left - 16, style = { colour: colours.ink, family: colours.font, weight: group.folded || group.lanes.length < 2 ? "" : "600" };
  context.fillStyle = colours.soft;
  context.beginPath();
  for (const [dx, dy] of group.folded ? [[0, -4], [5, 0], [0, 4]] : [[-1, -2], [7, -2], [3, 3]]) context.lineTo(x + dx, middle + dy);
  context.fill();
  if (words) text(context, shortened(context, group.title, place.left - 24, style), 16, middle, style);
}

function drawLane(context, place, at, colours, facts, data) {
  const { row, y, height, title } = at, { left, plot } = place;
  context.fillStyle = colours.lane;
  context.fillRect(left, y, plot, height);
  if (title) text(context, title, left - 8, y + height / 2, { colour: colours.ink, align: "right", family: colours.font });
  else if (at.ticks) drawTicks(context, place, at, colours);
  context.save();
  clipTo(context, place, y, y + height);
  context.fillStyle = colours.ground;
  for (const [from, to] of place.air) context.fillRect(place.x(from), y, place.x(to) - place.x(from), height);
  context.strokeStyle = colours.faint;
  context.strokeRect(left - 0.5, y + 0.5, plot + 1, height - 1);
  facts.findings.forEach((finding, k) => drawBand(context, place, at, colours, finding, place.findings[k]));
  if (!row.word) drawBounds(context, place, at, colours);
  if (row.lines[0][2] === "ceiling") drawShortage(context, place, at, colours, data);
  context.restore();
  for (const line of row.lines) drawLine(context, place, at, colours, data, line);
  drawGaps(context, place, at, colours);
  if (row.word) boxed(context, row.word, left + 92, y + height / 2, { ...colours, ink: colours.soft, ground: colours.lane });
}

// Where nothing was reached; the uppermost lane says so.
function drawGaps(context, place, at, colours) {
  const { y, height } = at, gap = hatch(context, "gap", colours.soft);
  context.save();
  clipTo(context, place, y, y + height);
  for (const [from, to] of place.gaps) {
    const x = place.x(from), width = Math.max(2, place.x(to) - x);
    context.fillStyle = gap;
    context.fillRect(x, y, width, height);
    const middle = clamp(x + width / 2, place.left + 40, place.left + place.plot - 40);
    if (at === place.lanes[0] && width > 70) boxed(context, "not reached", middle, y + height / 2, colours);
  }
  context.restore();
}

// A finding fills its own lane; one of a lane that is folded away is shown at the foot of the lane that stands for it.
function drawBand(context, place, { row, index, group, y, height }, colours, { row: own, severity }, [from, to]) {
  const away = own !== index && group.folded && group.lanes.includes(own);
  if (own !== index && !away) return;
  const x = place.x(from), width = Math.max(2, place.x(to) - x), top = away ? y + height - 4 : y;
  context.globalAlpha = away ? 1 : 0.35;
  context.fillStyle = hatch(context, severity, colours[severity]);
  context.fillRect(x, top, width, y + height - top);
  context.globalAlpha = 1;
  const shown = Math.min(x + width, place.left + place.plot) - Math.max(x, place.left);
  if (!away && place.zoomed && shown > 60 && height > 18 && row.lines.length) {
    text(context, severity, Math.max(x, place.left) + 4, y + 7, { colour: colours.ink, size: 10, family: colours.font });
  }
}

function drawTicks(context, place, at, colours) {
  for (const [value, words] of at.row.ticks) {
    const y = clamp(heightOf(at, value), at.y + 5, at.y + at.height - 5);
    text(context, words, place.left - 8, y, { colour: colours.soft, align: "right", family: colours.font });
  }
}

function drawBounds(context, place, at, colours) {
  for (const [value, severity] of at.row.bounds) {
    const y = Math.round(heightOf(at, value)) + 0.5;
    if (y >= at.y && y <= at.y + at.height) stroke(context, [[place.left, y], [place.left + place.plot, y]], colours.quiet, 1, severity === "warn" ? [1, 3] : []);
  }
}

// A line in its own colour, drawn again thicker and in the severity's colour where it lies beyond a bound.
function drawLine(context, place, at, colours, data, [name, column, style]) {
  if (style === "band") return drawSpread(context, place, at, colours, data[name], column);
  const { row, y, height } = at;
  const path = trace(place, data[name][column], (value) => heightOf(at, clamp(value, row.low, row.high)));
  const zone = (from, to, colour, width, dash = []) => {
    if (to <= from) return;
    context.save();
    clipTo(context, place, from, to);
    context.strokeStyle = colour;
    context.lineWidth = width;
    context.lineJoin = "round";
    context.setLineDash(dash);
    context.stroke(path);
    context.restore();
  };
  if (style === "ceiling") return zone(y + 1, y + height, colours.soft, 1.2, [6, 3]);
  if (style === "before") return zone(y, y + height, colours.ink, 1.1, [1.5, 2.5]);
  zone(y - 1, y + height + 1, colours.line, 1.4);
  for (const [value, severity] of row.bounds) {
    const edge = clamp(heightOf(at, value), y, y + height), width = severity === "fail" ? 2.4 : 1.8;
    const above = row.bad === "above" || (row.bad === "outside" && value > 50);
    if (above) zone(y - 1, edge, colours[severity], width);
    else zone(edge, y + height + 1, colours[severity], width);
  }
}

// Between a band's lower edge and its upper one, half of the columns further on, as far as poses are reached.
function drawSpread(context, place, at, colours, columns, column) {
  const { samples: [first, last], axis: { places } } = place, { row, y, height } = at, lows = columns[column], highs = columns[column + columns.length / 2];
  const spot = (values, k) => [place.x(places[k]), heightOf(at, clamp(values[k], row.low, row.high))];
  context.save();
  clipTo(context, place, y, y + height);
  context.fillStyle = colours.line;
  context.globalAlpha = 0.3;
  context.beginPath();
  for (let i = first, start = first; i <= last + 1; i++) {
    if (i <= last && Number.isFinite(lows[i])) continue;
    if (i > start) context.moveTo(...spot(lows, start));
    for (let k = start; k < i; k++) context.lineTo(...spot(highs, k));
    for (let k = i - 1; k >= start; k--) context.lineTo(...spot(lows, k));
    start = i + 1;
  }
  context.fill();
  context.restore();
}

// Where the tool speed lies above the largest possible: what is under the one and over the other.
function drawShortage(context, place, at, colours, data) {
  const [ceiling, line] = [at.row.lines[0], at.row.lines.at(-1)].map(([name, column]) => data[name][column]), { low, high } = at.row;
  const [first, last] = place.samples, x = (i) => place.x(place.axis.places[i]);
  const region = (values, missing, edge) => {
    context.beginPath();
    context.moveTo(x(first), edge);
    for (let i = first; i <= last; i++) context.lineTo(x(i), heightOf(at, Number.isFinite(values[i]) ? Math.min(values[i], high) : missing));
    context.lineTo(x(last), edge);
  };
  context.save();
  region(line, low, at.y + at.height);
  context.clip();
  region(ceiling, high, at.y);
  context.fillStyle = hatch(context, "fail", colours.fail);
  context.fill();
  context.restore();
}

// One path through the samples in sight; where several fall on a pixel column only its first, least, greatest and last are drawn. NaN leaves a gap.
function trace(place, values, toY) {
  const path = new Path2D(), { samples: [first, end], axis: { places } } = place;
  let column = NaN, low = 0, high = 0, last = 0, x = 0, open = false;
  const flush = () => {
    if (Number.isNaN(column)) return;
    if (low !== last) path.lineTo(x, low);
    if (high !== last) path.lineTo(x, high);
    path.lineTo(x, last);
  };
  for (let i = first; i <= end; i++) {
    const value = values[i];
    if (Number.isNaN(value)) {
      flush();
      column = NaN;
      open = false;
      continue;
    }
    const y = toY(value), at = place.x(places[i]);
    if (Math.floor(at) !== column) {
      flush();
      column = Math.floor(at);
      x = at;
      low = high = y;
      if (!open) path.moveTo(x, y);
      open = true;
    }
    low = Math.min(low, y);
    high = Math.max(high, y);
    last = y;
  }
  flush();
  return path;
}

function drawAxis(context, place, colours) {
  const { plot, bottom, from, to, axis: { offset, name } } = place;
  const step = niceStep(to - from, plot / 80);
  const digits = Math.max(0, -Math.floor(Math.log10(step) + 1e-9));
  for (let k = Math.ceil((offset + from) / step - 1e-4); k * step <= offset + to + 1e-4 * step; k++) {
    const x = Math.round(place.x(k * step - offset)) + 0.5;
    stroke(context, [[x, bottom], [x, bottom + 4]], colours.soft);
    text(context, fixed(k * step, digits), x, bottom + 13, { colour: colours.soft, align: "center", family: colours.font });
  }
  text(context, name, place.left - 16, bottom + 13, { colour: colours.soft, align: "right", family: colours.font });
}
