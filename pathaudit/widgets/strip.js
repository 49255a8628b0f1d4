// The strip above the rows: pins of notes, findings, process and air of the whole path, and which piece of it the rows show.

import { BLOCK, HEAD } from "./layout.js";
import { hatch, text } from "./theme.js";

export function stroke(context, points, colour, width = 1, dash = []) {
  context.strokeStyle = colour;
  context.lineWidth = width;
  context.setLineDash(dash);
  context.beginPath();
  for (const [x, y] of points) context.lineTo(x, y);
  context.stroke();
  context.setLineDash([]);
  context.lineWidth = 1;
}

// Words in a box of the ground's colour.
export function boxed(context, words, x, y, colours) {
  context.font = `11px ${colours.font}`;
  const half = context.measureText(words).width / 2 + 4;
  context.fillStyle = colours.ground;
  context.fillRect(x - half, y - 8, 2 * half, 16);
  text(context, words, x, y, { colour: colours.ink, align: "center", family: colours.font });
}

export function drawStrip(context, place, colours) {
  const { left, strip, process } = place;
  const small = { colour: colours.soft, family: colours.font, align: "right" };
  text(context, "findings", left - 8, strip + BLOCK / 2, small);
  text(context, "at cursor", place.width - 4, strip + BLOCK / 2, small);
  if (!place.blocks.length) text(context, "none", left + 2, strip + BLOCK / 2, { ...small, align: "left" });
  for (const block of place.blocks) drawBlock(context, place, colours, block);
  if (place.pins.length) text(context, "notes", left - 8, HEAD - 1, small);
  for (const pin of place.pins) drawPin(context, place, colours, pin);
  text(context, "process", left - 8, process, small);
  drawProcess(context, place, colours);
  if (place.zoomed) drawWindow(context, place, colours);
}

function drawBlock(context, place, colours, { finding: { number, severity }, x, width, level }) {
  const y = place.strip + level * (BLOCK + 2), colour = colours[severity];
  context.fillStyle = hatch(context, severity, colour);
  context.fillRect(x, y, width, BLOCK);
  const corners = [[x, y], [x + width, y], [x + width, y + BLOCK], [x, y + BLOCK], [x, y - 0.5]];
  stroke(context, corners, colour, severity === "fail" ? 2 : 1, severity === "fail" ? [] : [3, 2]);
  boxed(context, width > 64 ? `${number} ${severity}` : `${number}`, x + width / 2, y + BLOCK / 2, colours);
}

// A small flag on its mast: filled while the note is open, hollow when settled, with a question mark where its place has changed.
function drawPin(context, place, colours, { x, foot, words, filled }) {
  const y = HEAD - 8;
  stroke(context, [[x + 0.5, y + 7], [foot + 0.5, place.strip - 2]], colours.soft);
  context.fillStyle = filled ? colours.ink : colours.ground;
  context.fillRect(x, y, 17, 13);
  stroke(context, [[x + 0.5, y + 15], [x + 0.5, y + 0.5], [x + 17, y + 0.5], [x + 17, y + 13], [x, y + 13]], colours.ink);
  text(context, words, x + 9, y + 7, { colour: filled ? colours.ground : colours.ink, align: "center", size: 10, family: colours.font });
}

function drawProcess(context, place, colours) {
  const { left, plot, process } = place;
  context.fillStyle = colours.soft;
  context.fillRect(left, process - 2, plot, 4);
  for (const span of place.air) {
    const [x, end] = span.map(place.whole), width = Math.max(1, end - x);
    context.fillStyle = colours.ground;
    context.fillRect(x, process - 3, width, 6);
    stroke(context, [[x, process + 0.5], [x + width, process + 0.5]], colours.soft, 1, [2, 3]);
    if (width > 34) boxed(context, "air", x + width / 2, process, { ...colours, ink: colours.soft });
  }
}

// Which piece of the strip the rows show.
function drawWindow(context, place, colours) {
  const a = place.whole(place.from), b = Math.max(a + 2, place.whole(place.to)), y = place.process, low = place.top - 2;
  context.strokeStyle = colours.ink;
  context.strokeRect(a, y - 6, b - a, 12);
  stroke(context, [[a, y + 6], [place.left, low - HEAD + 4]], colours.quiet);
  stroke(context, [[b, y + 6], [place.left + place.plot, low - HEAD + 4]], colours.quiet);
}
