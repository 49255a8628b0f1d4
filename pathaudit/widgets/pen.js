// Strokes and words on a canvas, in the theme's colours by name. `used` holds [left, y, width] of words, so that none are written over others.

import { fit, text } from "./theme.js";

const SIDES = [[0, 0], [1, -1], [-1, -1], [1, 1], [-1, 1], [0, -2], [0, 2], [2, 0], [-2, 0], [2, -3], [-2, -3], [2, 3], [-2, 3]];

export function pen(canvas, colours, { width, height }, used = []) {
  const context = fit(canvas, width, height);
  context.lineJoin = context.lineCap = "round";

  function stroke(colour, thick, dash = []) {
    context.strokeStyle = colours[colour] || colour;
    context.lineWidth = thick;
    context.setLineDash(dash);
    context.stroke();
  }

  function line(list, ...style) {
    context.beginPath();
    list.forEach((p) => context.lineTo(p[0], p[1]));
    stroke(...style);
  }

  function oval([x, y], radii, turn, ...style) {
    context.beginPath();
    context.ellipse(x, y, ...radii, turn, 0, 7);
    stroke(...style);
  }

  function mark([x, y], r, colour, thick = 1.5, square = false) {
    context.beginPath();
    if (square) context.rect(x - r, y - r, 2 * r, 2 * r); else context.arc(x, y, r, 0, 7);
    context.fillStyle = colours.ground;
    context.fill();
    stroke(colour, thick);
  }

  function widthOf(words, weight = "") {
    context.font = `${weight} 11px ${colours.font}`;
    return context.measureText(words).width;
  }

  // The light edge keeps words readable on lines.
  function write(words, x, y, colour = "soft", weight = "") {
    used.push([x, y, widthOf(words, weight)]);
    context.textAlign = "left";
    context.textBaseline = "middle";
    context.strokeStyle = colours.ground;
    context.lineWidth = 3;
    context.strokeText(words, x, y);
    text(context, words, x, y, { colour: colours[colour], weight, family: colours.font });
  }

  // Words beside a place, `away` px from it (0: on it, where that is free), clear of all other words and inside; left out where there is no room.
  function label(words, [x, y], away, colour, weight) {
    const wide = widthOf(words, weight);
    for (const [side, level] of away ? SIDES.slice(1) : SIDES) {
      const left = x + (7 * side + away * Math.sign(side)) - wide * (1 - Math.sign(side)) / 2, at = y + (9 + away / 2) * level;
      const clear = used.every(([l, t, w]) => left > l + w + 3 || l > left + wide + 3 || Math.abs(at - t) > 13);
      if (clear && left > 2 && at > 8 && left + wide < width - 2 && at < height - 8) return write(words, left, at, colour, weight);
    }
  }

  return { line, oval, mark, widthOf, write, label };
}
