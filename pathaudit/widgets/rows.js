// The rows over one time axis: a base picture that is drawn when data, size, span or theme change, and a light overlay for the cursor.
// The strip at the top always shows the whole path; the rows show the span [from, to] of it.

import { clamp, fixed, niceStep } from "./data.js";
import { fit, hatch, text } from "./theme.js";

const HEAD = 17, GAP = 7, BLOCK = 17, AXIS = 26, RIGHT = 62;

// Where everything stands for a given width and span of time. Blocks are the findings on the strip, stacked where they would overlap.
export function layOut(facts, width, [from, to]) {
  const left = width < 520 ? 66 : 84;
  const plot = Math.max(40, width - left - RIGHT);
  const duration = facts.duration_s || 1;
  const whole = (time) => left + plot * (time / duration);
  const x = (time) => left + plot * ((time - from) / (to - from || 1));
  const ends = [];
  const blocks = facts.findings.map((finding) => {
    const middle = 0.5 * (whole(finding.from_s) + whole(finding.to_s));
    const wide = Math.max(18, whole(finding.to_s) - whole(finding.from_s));
    const start = clamp(middle - wide / 2, left, left + plot - wide);
    let level = ends.findIndex((end) => end + 2 <= start);
    if (level < 0) level = ends.length < 6 ? ends.length : ends.indexOf(Math.min(...ends));
    ends[level] = start + wide;
    return { finding, x: start, width: wide, level };
  });
  const strip = HEAD;
  let y = strip + (BLOCK + 2) * Math.max(1, ends.length) + 19;
  const process = y - 10;
  const rows = facts.rows.map((row) => {
    if (row.head) y += HEAD + GAP;
    const place = { row, y, height: row.height };
    y += row.height + 2;
    return place;
  });
  return { left, plot, width, height: y + AXIS, from, to, offset: facts.offset_s, x, whole, strip, blocks, process, rows, axis: y + 2,
           zoomed: to - from < duration * 0.999, time: (px) => from + clamp((px - left) / plot, 0, 1) * (to - from),
           wholeTime: (px) => clamp((px - left) / plot, 0, 1) * duration };
}

function heightOf(place, value) {
  const { row, y, height } = place;
  const share = row.log ? Math.log(Math.max(value, row.low) / row.low) / Math.log(row.high / row.low) : (value - row.low) / (row.high - row.low);
  return y + height - height * share;
}

// The overlay's share: everything that moves with the cursor.
export function drawCursor(canvas, place, colours, data, i, selected) {
  const context = fit(canvas, place.width, place.height);
  const block = place.blocks[selected];
  if (block) outline(context, place, colours, block.finding);
  const x = Math.round(place.x(data.time_s[0][i])) + 0.5, above = Math.round(place.whole(data.time_s[0][i])) + 0.5;
  context.strokeStyle = context.fillStyle = colours.ink;
  context.beginPath();
  context.moveTo(x, place.zoomed ? place.rows[0].y : place.process);
  context.lineTo(x, place.axis);
  context.globalAlpha = 0.6;      // a peak right under the cursor still shows
  context.stroke();
  context.globalAlpha = 1;
  context.beginPath();
  context.moveTo(above - 5, place.process - 7);
  context.lineTo(above + 5, place.process - 7);
  context.lineTo(above, place.process);
  context.fill();
  for (const at of place.rows) {
    const [name, column] = at.row.lines[at.row.lines.length - 1];
    const value = data[name][column][i];
    text(context, fixed(value, at.row.digits), place.width - 4, at.y + at.height / 2, { colour: colours.ink, align: "right", family: colours.mono });
    const y = heightOf(at, value);
    if (y > at.y - 1 && y <= at.y + at.height + 1) {
      context.beginPath();
      context.arc(x, y, 2.5, 0, 7);
      context.fill();
    }
  }
}

function outline(context, place, colours, finding) {
  const x = place.x(finding.from_s), width = Math.max(2, place.x(finding.to_s) - x), top = place.rows[0].y - 2;
  context.save();
  clipTo(context, place, top - 1, place.axis);
  context.strokeStyle = colours[finding.severity];
  context.setLineDash([4, 3]);
  context.strokeRect(x, top, width, place.axis - 2 - top);
  context.restore();
}

function clipTo(context, place, top, bottom) {
  context.beginPath();
  context.rect(place.left - 1, top, place.plot + 2, bottom - top);
  context.clip();
}

export function drawRows(canvas, place, colours, facts, data) {
  const context = fit(canvas, place.width, place.height);
  drawStrip(context, place, colours, facts);
  for (const at of place.rows) drawRow(context, place, at, colours, facts, data);
  if (place.zoomed) drawSpan(context, place, colours);
  const gap = hatch(context, "gap", colours.soft);
  const top = place.rows[0].y, bottom = place.axis - 4;
  context.save();
  clipTo(context, place, top, bottom);
  for (const [from, to] of facts.gaps) {
    const x = place.x(from), width = Math.max(2, place.x(to) - x);
    context.fillStyle = gap;
    context.fillRect(x, top, width, bottom - top);
    if (width > 70) label(context, "not reached", clamp(x + width / 2, place.left + 40, place.left + place.plot - 40), top + 12, colours);
  }
  context.restore();
  drawAxis(context, place, colours);
}

// Which piece of the strip the rows show.
function drawSpan(context, place, colours) {
  const a = place.whole(place.from), b = Math.max(a + 2, place.whole(place.to)), y = place.process, low = place.rows[0].y - HEAD - 2;
  context.strokeStyle = colours.ink;
  context.strokeRect(a, y - 4, b - a, 8);
  context.strokeStyle = colours.quiet;
  context.beginPath();
  context.moveTo(a, y + 4);
  context.lineTo(place.left, low);
  context.moveTo(b, y + 4);
  context.lineTo(place.left + place.plot, low);
  context.stroke();
}

function label(context, words, x, y, colours) {
  context.font = `11px ${colours.font}`;
  const half = context.measureText(words).width / 2 + 4;
  context.fillStyle = colours.ground;
  context.fillRect(x - half, y - 8, 2 * half, 16);
  text(context, words, x, y, { colour: colours.ink, align: "center", family: colours.font });
}

function drawStrip(context, place, colours, facts) {
  const { left, plot, strip, process } = place;
  const small = { colour: colours.soft, family: colours.font, align: "right" };
  text(context, "findings", left - 8, strip + BLOCK / 2, small);
  text(context, "at cursor", place.width - 4, strip + BLOCK / 2, small);
  if (!place.blocks.length) text(context, "none", left + 2, strip + BLOCK / 2, { ...small, align: "left" });
  for (const { finding, x, width, level } of place.blocks) {
    const y = strip + level * (BLOCK + 2), colour = colours[finding.severity];
    context.fillStyle = hatch(context, finding.severity, colour);
    context.fillRect(x, y, width, BLOCK);
    context.strokeStyle = colour;
    context.lineWidth = finding.severity === "fail" ? 2 : 1;
    context.setLineDash(finding.severity === "fail" ? [] : [3, 2]);
    context.strokeRect(x, y, width, BLOCK);
    context.setLineDash([]);
    context.lineWidth = 1;
    const words = width > 64 ? `${finding.number} ${finding.severity}` : `${finding.number}`;
    label(context, words, x + width / 2, y + BLOCK / 2, colours);
  }
  text(context, "process", left - 8, process, small);
  context.fillStyle = colours.soft;
  context.fillRect(left, process - 2, plot, 4);
  for (const [from, to] of facts.air) {
    const x = place.whole(from), width = Math.max(1, place.whole(to) - x);
    context.fillStyle = colours.ground;
    context.fillRect(x, process - 3, width, 6);
    context.strokeStyle = colours.soft;
    context.setLineDash([2, 3]);
    context.beginPath();
    context.moveTo(x, process + 0.5);
    context.lineTo(x + width, process + 0.5);
    context.stroke();
    context.setLineDash([]);
    if (width > 34) label(context, "air", x + width / 2, process, { ...colours, ink: colours.soft });
  }
}

function drawRow(context, place, at, colours, facts, data) {
  const { row, y, height } = at;
  const { left, plot } = place;
  const small = { colour: colours.soft, family: colours.font };
  if (row.head) text(context, row.head, left, y - HEAD / 2 - 1, small);
  context.fillStyle = colours.lane;
  context.fillRect(left, y, plot, height);
  if (row.ticks.length) drawTicks(context, place, at, colours);
  else text(context, row.title, left - 8, y + height / 2, { ...small, colour: colours.ink, align: "right" });
  const index = facts.rows.indexOf(row);
  context.save();
  clipTo(context, place, y, y + height);
  context.fillStyle = colours.ground;
  for (const [from, to] of facts.air) context.fillRect(place.x(from), y, place.x(to) - place.x(from), height);
  context.strokeStyle = colours.faint;
  context.strokeRect(left - 0.5, y + 0.5, plot + 1, height - 1);
  for (const finding of facts.findings) {
    if (finding.row !== index) continue;
    const x = place.x(finding.from_s);
    context.globalAlpha = 0.35;
    context.fillStyle = hatch(context, finding.severity, colours[finding.severity]);
    context.fillRect(x, y, Math.max(2, place.x(finding.to_s) - x), height);
    context.globalAlpha = 1;
  }
  drawBounds(context, place, at, colours);
  if (row.lines.length > 1) drawShortage(context, place, at, colours, data);
  context.restore();
  for (const line of row.lines) drawLine(context, place, at, colours, data, line);
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
    if (y < at.y || y > at.y + at.height) continue;
    context.strokeStyle = colours.quiet;
    context.setLineDash(severity === "warn" ? [1, 3] : []);
    context.beginPath();
    context.moveTo(place.left, y);
    context.lineTo(place.left + place.plot, y);
    context.stroke();
    context.setLineDash([]);
  }
}

// A line in its own colour, drawn again thicker and in the severity's colour where it lies beyond a bound.
function drawLine(context, place, at, colours, data, [name, column, style]) {
  const { row, y, height } = at;
  const zone = (from, to, colour, width) => {
    context.save();
    context.beginPath();
    context.rect(place.left, from, place.plot, to - from);
    context.clip();
    context.strokeStyle = colour;
    context.lineWidth = width;
    context.lineJoin = "round";
    if (style === "ceiling") context.setLineDash([6, 3]);
    trace(context, place, data.time_s[0], data[name][column], (value) => heightOf(at, Math.min(value, row.high)));
    context.stroke();
    context.restore();
  };
  const top = style === "ceiling" ? y + 1 : y;
  zone(top, y + height, style === "ceiling" ? colours.soft : colours.line, style === "ceiling" ? 1.2 : 1.4);
  if (style === "ceiling") return;
  for (const [value, severity] of row.bounds) {
    const edge = clamp(heightOf(at, value), y, y + height);
    if (row.bad === "above") zone(y - 1, edge, colours[severity], severity === "fail" ? 2.4 : 1.8);
    else zone(edge, y + height + 1, colours[severity], severity === "fail" ? 2.4 : 1.8);
  }
}

// Where the programmed tool speed lies above the largest possible: what is under the one and over the other.
function drawShortage(context, place, at, colours, data) {
  const [ceiling, line] = at.row.lines.map(([name, column]) => data[name][column]), { low, high } = at.row;
  const region = (values, missing, edge) => {
    context.beginPath();
    context.moveTo(place.x(data.time_s[0][0]), edge);
    values.forEach((value, i) => context.lineTo(place.x(data.time_s[0][i]), heightOf(at, Number.isFinite(value) ? Math.min(value, high) : missing)));
    context.lineTo(place.x(data.time_s[0].at(-1)), edge);
  };
  context.save();
  region(line, low, at.y + at.height);
  context.clip();
  region(ceiling, high, at.y);
  context.fillStyle = hatch(context, "fail", colours.fail);
  context.fill();
  context.restore();
}

// One path through the samples; where several fall on a pixel column only its first, least, greatest and last are drawn. NaN leaves a gap.
function trace(context, place, time, values, toY) {
  let column = NaN, low = 0, high = 0, last = 0, x = 0, open = false;
  const flush = () => {
    if (Number.isNaN(column)) return;
    if (low !== last) context.lineTo(x, low);
    if (high !== last) context.lineTo(x, high);
    context.lineTo(x, last);
  };
  context.beginPath();
  for (let i = 0; i < time.length; i++) {
    const value = values[i];
    if (Number.isNaN(value)) {
      flush();
      column = NaN;
      open = false;
      continue;
    }
    const y = toY(value), at = place.x(time[i]);
    if (Math.floor(at) !== column) {
      flush();
      column = Math.floor(at);
      x = at;
      low = high = y;
      if (!open) context.moveTo(x, y);
      open = true;
    }
    low = Math.min(low, y);
    high = Math.max(high, y);
    last = y;
  }
  flush();
}

function drawAxis(context, place, colours) {
  const { plot, axis, from, to, offset } = place;
  const step = niceStep(to - from, plot / 80);
  const digits = Math.max(0, -Math.floor(Math.log10(step) + 1e-9));
  context.strokeStyle = colours.soft;
  context.beginPath();
  for (let k = Math.ceil((offset + from) / step - 1e-4); k * step <= offset + to + 1e-4 * step; k++) {
    const x = Math.round(place.x(k * step - offset)) + 0.5;
    context.moveTo(x, axis);
    context.lineTo(x, axis + 4);
    text(context, fixed(k * step, digits), x, axis + 13, { colour: colours.soft, align: "center", family: colours.font });
  }
  context.stroke();
  text(context, "time, s", place.width - 4, axis + 13, { colour: colours.soft, align: "right", family: colours.font });
}

// The finding whose block lies under a point of the strip, or -1.
export function blockAt(place, px, py) {
  return place.blocks.findIndex(({ x, width, level }) => {
    const y = place.strip + level * (BLOCK + 2);
    return px >= x - 1 && px <= x + width + 1 && py >= y - 1 && py <= y + BLOCK + 1;
  });
}
