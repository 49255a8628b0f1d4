// Where everything stands in the rows, and what lies under a point of them. The strip at the top always shows the whole path; the rows
// show the span [from, to] of the axis.

import { clamp, nearest } from "./data.js";

export const HEAD = 17, BLOCK = 17, RIGHT = 62, PIN = 16, LOW = 18;
const GAP = 7, TITLE = 15, AXIS = 42;

// groups: as choice.js gives them. pins: {id, sample, words, filled}. Blocks are the findings on the strip, stacked where they would overlap;
// room is kept for `levels` of them, so that the rows do not move while a trial makes findings go.
export function layOut(facts, groups, axis, width, [from, to], pins, levels) {
  const longest = Math.max(...groups.map((group) => group.title.length), 0);
  const left = clamp(6.3 * longest + 30, width < 520 ? 66 : 84, 120);
  const plot = Math.max(40, width - left - RIGHT);
  const whole = (value) => left + plot * (value / axis.size);
  const x = (value) => left + plot * ((value - from) / (to - from || 1));
  const back = (px) => clamp((px - left) / plot, 0, 1);
  const onAxis = (spans) => spans.map((span) => span.map(axis.ofTime));
  const place = { left, plot, width, from, to, axis, x, whole, at: (px) => from + back(px) * (to - from), wholeAt: (px) => back(px) * axis.size,
                  zoomed: to - from < axis.size * 0.999, air: onAxis(facts.air), gaps: onAxis(facts.gaps), lanes: [], heads: [], titles: [],
                  findings: onAxis(facts.findings.map((finding) => [finding.from_s, finding.to_s])) };
  place.samples = [nearest(axis.places, from) - 2, nearest(axis.places, to) + 2].map((k) => clamp(k, 0, axis.places.length - 1));
  place.pins = pinned(place, pins);
  place.strip = HEAD + (pins.length ? PIN : 0);
  place.blocks = stacked(place, facts.findings);
  place.levels = Math.max(levels, ...place.blocks.map(({ level }) => level + 1));
  let y = place.strip + (BLOCK + 2) * place.levels + 19, said = "";
  place.process = y - 10;
  for (const group of groups) {
    const several = group.lanes.length > 1, open = several && !group.folded, low = group.folded && !several;
    if (group.head !== said) place.heads.push({ words: said = group.head, y: (y += HEAD + GAP) - HEAD / 2 - 1 });
    const title = { group, y: several || low ? y : y - HEAD, words: several || low };
    place.top ??= y;
    if (open) y += TITLE;
    for (const index of open ? group.lanes : [group.main]) {
      const row = facts.rows[index], height = low ? LOW : row.height;
      place.lanes.push({ row, index, group, y, height, title: open && row.title, ticks: !low && row.ticks });
      y += height + 2;
    }
    place.titles.push({ ...title, end: y, middle: open ? title.y + 7 : title.words ? (title.y + y) / 2 - 1 : title.y + HEAD / 2 - 1 });
    if (open) y += 3;
  }
  place.top ??= y;
  place.bottom = y + 2;
  place.height = y + AXIS;
  return place;
}

function stacked(place, findings) {
  const ends = [];
  return findings.map((finding, k) => {
    const [a, b] = place.findings[k].map(place.whole), wide = Math.max(18, b - a);
    const start = clamp((a + b - wide) / 2, place.left, place.left + place.plot - wide);
    let level = ends.findIndex((end) => end + 2 <= start);
    if (level < 0) level = ends.length < 6 ? ends.length : ends.indexOf(Math.min(...ends));
    ends[level] = start + wide;
    return { finding, x: start, width: wide, level };
  });
}

// Flags in the order of their places, pushed apart where they would cover each other.
function pinned(place, pins) {
  let end = -Infinity;
  const room = Math.min(20, place.plot / Math.max(1, pins.length));
  return pins.map((pin) => ({ ...pin, foot: place.whole(place.axis.ofSample(pin.sample)) })).sort((a, b) => a.foot - b.foot)
    .map((pin) => ({ ...pin, x: (end = Math.max(end + room, pin.foot)) }))
    .map((pin, k, all) => ({ ...pin, x: Math.min(pin.x, place.left + place.plot + 12 - room * (all.length - 1 - k)) }));
}

export function heightOf({ row, y, height }, value) {
  const share = row.log ? Math.log(Math.max(value, row.low) / row.low) / Math.log(row.high / row.low) : (value - row.low) / (row.high - row.low);
  return y + height - height * share;
}

export function valueAt({ row, y, height }, py) {
  return row.low + (row.high - row.low) * clamp((y + height - py) / height, 0, 1);
}

// The lane in which the factor of the marked stretch is dragged.
export function factorLane(place) {
  return place.lanes.find(({ row }) => row.lines[0][0] === "factor_percent");
}

// What lies under a point: stretch: the marked one in px, where there is one; factor: its percent, where it can be dragged.
export function spotAt(place, px, py, stretch, factor) {
  const pin = py < place.strip - 1 && place.pins.find(({ x }) => px >= x - 3 && px <= x + 14);
  if (pin) return { kind: "pin", id: pin.id };
  const k = place.blocks.findIndex(({ x, width, level }) => {
    const y = place.strip + level * (BLOCK + 2);
    return px >= x - 1 && px <= x + width + 1 && py >= y - 1 && py <= y + BLOCK + 1;
  });
  if (k >= 0) return { kind: "finding", k };
  if (py < place.process + 9) {
    const inside = place.zoomed && py > place.process - 9 && px >= place.whole(place.from) - 3 && px <= place.whole(place.to) + 3;
    return { kind: inside ? "window" : "whole" };
  }
  const title = px < place.left - 2 && place.titles.find(({ y, end }) => py >= y && py < end);
  if (title) return { kind: "fold", title: title.group.title };
  if (stretch && py >= place.top - 4) {
    const lane = factor && factorLane(place);
    if (lane && px > stretch[0] && px < stretch[1] && Math.abs(py - heightOf(lane, factor)) < 7) return { kind: "factor" };
    const end = stretch.findIndex((edge) => Math.abs(px - edge) < 5);
    if (end >= 0) return { kind: "edge", end };
  }
  return { kind: "rows" };
}
