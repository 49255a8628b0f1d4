// Colours and patterns. Ground, ink and fonts follow the page; lines and severities are Okabe and Ito's colours, which most eyes tell apart;
// the orange is darker on a light ground, where it would not stand out.

export function theme(root) {
  const style = getComputedStyle(root);
  const ink = channels(style.color), ground = channels(style.backgroundColor);
  const mix = (share) => `rgb(${ground.map((value, k) => Math.round(value + share * (ink[k] - value))).join(" ")})`;
  const dark = ground[0] + ground[1] + ground[2] < 380;
  return {
    ink: mix(1), soft: mix(0.66), quiet: mix(0.4), faint: mix(0.15), lane: mix(0.045), tube: mix(0.2), ground: mix(0),
    line: dark ? "#56B4E9" : "#0072B2", warn: dark ? "#E69F00" : "#B97F00", fail: dark ? "#E8701A" : "#D55E00",
    font: style.fontFamily, mono: style.getPropertyValue("--pa-mono").trim(),
  };
}

function channels(colour) {
  return colour.match(/[\d.]+/g).slice(0, 3).map(Number);
}

// A fill that says the severity without its colour: wide stripes for warn, a tight grid for fail, falling stripes where nothing was reached.
export function hatch(context, kind, colour) {
  const size = kind === "fail" ? 5 : 8;
  const tile = document.createElement("canvas");
  const ratio = context.getTransform().a || 1;
  tile.width = tile.height = Math.round(size * ratio);
  const draw = tile.getContext("2d");
  draw.scale(tile.width / size, tile.height / size);
  draw.strokeStyle = colour;
  draw.lineWidth = kind === "gap" ? 1 : 1.3;
  const stripe = (falling) => {
    draw.beginPath();
    for (const shift of [-size, 0, size]) {
      draw.moveTo(shift - 1, falling ? -1 : size + 1);
      draw.lineTo(shift + size + 1, falling ? size + 1 : -1);
    }
    draw.stroke();
  };
  if (kind !== "gap") stripe(false);
  if (kind !== "warn") stripe(true);
  const pattern = context.createPattern(tile, "repeat");
  pattern.setTransform(new DOMMatrix().scale(size / tile.width));
  return pattern;
}

// Fit a canvas to its place at the screen's own resolution; gives a context in CSS pixels.
export function fit(canvas, width, height) {
  const ratio = window.devicePixelRatio || 1;
  const w = Math.round(width * ratio), h = Math.round(height * ratio);
  if (canvas.width !== w || canvas.height !== h) {
    canvas.width = w;
    canvas.height = h;
    canvas.style.width = `${width}px`;
    canvas.style.height = `${height}px`;
  }
  const context = canvas.getContext("2d");
  context.setTransform(ratio, 0, 0, ratio, 0, 0);
  context.clearRect(0, 0, width, height);
  return context;
}

export function text(context, words, x, y, { colour, align = "left", size = 11, family, weight = "" }) {
  context.font = `${weight} ${size}px ${family}`;
  context.textAlign = align;
  context.textBaseline = "middle";
  context.fillStyle = colour;
  context.fillText(words, x, y);
}

// The words as far as there is room for them.
export function shortened(context, words, room, { size = 11, family, weight = "" }) {
  context.font = `${weight} ${size}px ${family}`;
  if (context.measureText(words).width <= room) return words;
  let end = words.length - 1;
  while (end > 1 && context.measureText(`${words.slice(0, end)}…`).width > room) end -= 1;
  return `${words.slice(0, end)}…`;
}
