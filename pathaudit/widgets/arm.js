// The arm at the cursor: floor, mounting, path and part frame on one canvas, the arm and what moves with it on another.

import { clamp, niceStep, worstJoint } from "./data.js";
import { bounds, eyeOn } from "./eye.js";
import { pen } from "./pen.js";
import { MEASURES, SHADES, scaleOf, shadeColour } from "./shading.js";
import { along, column, postureAt, velocityEllipsoid } from "./space.js";

// `old`: the view that this one takes the place of. Its choices stay, and where it shows the same place, the eye too.
export function armView(facts, data, old) {
  const last = data.time_s[0].length - 1, process = data.process[0];
  const onPath = (i) => data.path_m.map((values) => values[i]);
  const postures = pick(last, 24).map((i) => postureAt(facts, data, i)).filter(Boolean);
  const room = roomOf(facts, pick(last, 200).map(onPath), postures);
  const { radius, place } = room, look = { measure: 0, ellipsoid: false, ...(old && old.look) };
  if (!old || old.place !== place) Object.assign(look, { turn: room.views[3][0], tilt: room.views[3][1], width: 0 });
  const eye = eyeOn(room, look), { project } = eye;
  const fastest = Math.max(1e-9, ...postures.map((one) => velocityEllipsoid(facts, one).axes[0][0]));
  let scale = {}, tip = room.centre, standing = [];

  // A new size shows all; an eye that was taken over has its size already.
  function frameAll(width, height) {
    if (width !== look.width || height !== look.height) eye.fitTo(width, height);
  }

  const girth = (at, share) => clamp((0.07 - 0.05 * share) * radius * at[2], 4, 48);

  function tube({ line }, list) {
    for (const [colour, more] of [["soft", 2], ["tube", 0]]) {
      list.slice(1).forEach((to, k) => line([list[k], to], colour, girth(list[k], k / list.length) + more));
    }
  }

  function drawFloor({ line }) {
    const step = niceStep(2 * radius, 6), ends = room.box.slice(0, 2).map(([low, high]) => [Math.floor(low / step - 0.3), Math.ceil(high / step + 0.3)]);
    ends.forEach(([low, high], k) => {
      for (let at = low; at <= high; at++) {
        line(ends[1 - k].map((to) => project([...(k ? [to, at] : [at, to]).map((v) => step * v), room.floor])), "faint", 1);
      }
    });
    return `grid ${Math.round(1000 * step)} mm`;
  }

  // What carries the base: a post on a plate, which is crossed where it is not the floor.
  function drawMounting(draw) {
    const flat = room.plate.map(project);
    draw.line([0, 1, 2, 3, 0, 2, 3, 1].slice(0, room.upright ? 5 : 8).map((k) => flat[k]), "soft", 1.2);
    tube(draw, [room.foot, column(facts.base, 3)].map(project));
    atEdge(draw, room.mounting, flat, room.upright ? 1 : -1);
  }

  // Words under the lowest of some places, or above the highest (side = -1).
  function atEdge({ label }, words, flat, side = 1) {
    const [x, y] = flat.reduce((a, b) => (side * (b[1] - a[1]) > 0 ? b : a));
    label(words, [x, y + 10 * side], 0);
  }

  // Runs of equal kind(i), each drawn through its places on the path up to the next.
  function alongPath(kind, draw) {
    for (let i = 0; i < last;) {
      const code = kind(i), list = [project(onPath(i))];
      do list.push(project(onPath(++i))); while (i < last && kind(i) === code);
      draw(code, list);
    }
  }

  // Air moves dotted, warn and fail thicker, fail with a light core so that it shows without its colour.
  function drawSeverity({ line, write, widthOf }, y) {
    const styles = [["soft", 1.2, [1, 4]], ["line", 1.8], ["warn", 3.5], ["fail", 5]];
    const stretch = (code, list) => {
      line(list, ...styles[code]);
      if (code > 2) line(list, "ground", 1.4);
    };
    alongPath((i) => (data.severity[0][i] ? data.severity[0][i] + 1 : process[i]), stretch);
    ["air", "clean", "warn", "fail"].reduce((x, words, code) => {
      stretch(code, [[x, y], [x + 18, y]]);
      write(words, x + 24, y);
      return x + 36 + widthOf(words);
    }, 10);
  }

  // The process with an edge, air moves thin, dotted where nothing is known; and the scale of the colours.
  function drawMeasure({ line, write, widthOf }, y, measure) {
    if (scale.measure !== measure) scale = { measure, ...scaleOf(measure, data) };
    alongPath((i) => process[i], (on, list) => on && line(list, "soft", 6));
    alongPath((i) => 2 * scale.shade(i) + process[i], (code, list) => {
      if (code < 0) line(list, "soft", 1.2, [1, 4]); else line(list, shadeColour(code >> 1), code % 2 ? 4 : 2);
    });
    for (let k = 0; k < SHADES; k++) line([[12 + 5 * k, y - 16], [16 + 5 * k, y - 16]], shadeColour(k), 8);
    write(measure.title, 10, y - 30);
    scale.ends.forEach((value, k) => {
      const words = String(Number(value.toPrecision(3)));
      write(words, 10 + k * (5 * SHADES - widthOf(words)) / 2, y);
    });
  }

  function drawFrame({ line, label }, pose, length, words) {
    const at = (by, k) => project(along(column(pose, 3), by * length * radius, column(pose, k)));
    ["fail", "#009E73", "line"].forEach((colour, k) => {
      line([at(0, k), at(1, k)], colour, 2);
      label("XYZ"[k], at(1.25, k), 0);
    });
    atEdge({ label }, words, [at(0, 0)]);
  }

  function drawStage(canvas, colours) {
    const draw = pen(canvas, colours, look, standing = [[0, 14, 260]]), y = look.height - 12, grid = drawFloor(draw);      // the top line is kept free
    if (look.measure) drawMeasure(draw, y, MEASURES[look.measure]); else drawSeverity(draw, y);
    draw.write(grid, look.width - 8 - draw.widthOf(grid), y);
    drawMounting(draw);
    drawFrame(draw, facts.part, 0.14, "part");
  }

  function drawArm(canvas, colours, i) {
    const draw = pen(canvas, colours, look, [...standing]), posture = postureAt(facts, data, i);
    tip = onPath(i);
    if (!posture) {
      draw.mark(project(tip), 5, "fail");
      return draw.write("not reached: no posture to draw", 10, 14, "ink");
    }
    const { points, roots } = posture, flat = points.map(project), flange = flat.length - 2;
    tube(draw, [project(column(facts.base, 3)), ...flat.slice(0, -1).flatMap((p, k) => (facts.prismatic[k] ? [project(roots[k]), p] : [p]))]);
    draw.line(flat.slice(flange), "ink", 2.4);
    if (look.ellipsoid) drawEllipsoid(draw, posture);
    drawJoints(draw, i, flat, posture);
    drawFrame(draw, posture.tool, 0.08, "tool");
    draw.mark(flat[flange + 1], 3.5, "ink");
  }

  // Each joint's axis as a short line: joints that line up are seen to line up; a square slides. The busiest joint is named past its warn line.
  function drawJoints({ line, mark, label }, i, flat, posture) {
    const size = (k) => Math.max(3, 0.42 * girth(flat[k], k / facts.joints.length));
    facts.joints.forEach((name, k) => {
      line(axisOf(posture, k, radius).map(project), "soft", 1.4, [4, 2]);
      mark(flat[k], size(k), "soft", 1.5, facts.prismatic[k]);
    });
    const [k, share] = worstJoint(data, i) || [], [[warn], [fail]] = facts.rows[0].bounds;
    if (!(share >= warn)) return;
    mark(flat[k], size(k) + 2, share > fail ? "fail" : "warn", 3, facts.prismatic[k]);
    label(`${facts.joints[k]} ${share.toFixed(0)} %`, flat[k], size(k) + 4, "ink", "600");
  }

  // Outline and axes of the velocity ellipsoid, through the projection as it is at the tool point. Equal lengths are equal speeds all along the path.
  function drawEllipsoid({ line, oval, label, write }, posture) {
    const { w, axes } = velocityEllipsoid(facts, posture), tool = column(posture.tool, 3), at = project(tool), size = 0.18 * radius / fastest;
    const mm = (speed) => (1000 * speed).toFixed(0);
    const slope = [0, 1, 2].map((r) => project(tool.map((v, k) => v + (k === r ? 1e-4 * radius : 0))).map((v, k) => (v - at[k]) / (1e-4 * radius) * size));
    const seen = (direction) => [0, 1].map((k) => slope.reduce((sum, s, r) => sum + s[k] * direction[r], 0));
    const [[a, b], [, d]] = [0, 1].map((k) => seen(w.map((row) => seen(row)[k])));
    const half = Math.hypot((a - d) / 2, b);
    oval(at, [half, -half].map((v) => Math.sqrt(Math.max(0, (a + d) / 2 + v))), Math.atan2(2 * b, a - d) / 2, "ink", 1.6);
    axes.forEach(([speed, direction], k) => {
      const end = (by) => seen(direction).map((v, r) => at[r] + by * speed * v);
      line([end(-1), end(1)], "ink", 1, [5, 3]);
      if (!k) label(`${mm(speed)} mm/s`, end(1), 1, "ink");
    });
    write(`half axes ${axes.map(([speed]) => mm(speed)).join(", ")} mm/s`, 10, 14, "ink");
  }

  // By hand the eye turns about the middle of the cell, or the tool point where the view has come nearer, and comes nearer to that unless told where.
  const orbit = (dx, dy) => eye.orbit(dx, dy, look.scale > 1.4 * look.fitted ? tip : room.centre);
  const zoom = (factor, ...at) => eye.zoom(factor, ...(at.length ? at : project(tip)));
  return { ...eye, look, place, frameAll, drawStage, drawArm, orbit, zoom };
}

// The size of the scene and what the arm stands on, from places of the path and some postures.
function roomOf(facts, path, postures) {
  const [x, y, up, base] = [0, 1, 2, 3].map((k) => column(facts.base, k)), part = column(facts.part, 3);
  const seen = [base, part, ...path, ...postures.flatMap((one) => [...one.roots, ...one.points])], low = bounds(seen)[2][0], upright = up[2] > 0.98;
  const ground = Math.min(0, base[2], part[2]), floor = low - ground > halfDiagonal(seen) ? low : ground;      // one far below all else would only make that small
  const foot = along(base, upright ? floor - base[2] : -0.14 * halfDiagonal(seen), up);
  seen.push(foot, [part[0], part[1], floor]);
  const box = bounds(seen), centre = box.map(([from, to]) => 0.5 * (from + to)), radius = halfDiagonal(seen);
  const plate = [[1, 1], [-1, 1], [-1, -1], [1, -1]].map(([a, b]) => along(along(foot, 0.1 * radius * a, x), 0.1 * radius * b, y));
  const tips = (pose, length) => [0, 1, 2].map((k) => along(column(pose, 3), length * radius, column(pose, k)));
  seen.push(...plate, ...tips(facts.part, 0.17), ...postures.flatMap((one) => [...tips(one.tool, 0.08), ...facts.joints.flatMap((name, k) => axisOf(one, k, radius))]));
  return {
    floor, foot, plate, upright, box, centre, radius, seen, place: JSON.stringify([facts.base, facts.part, facts.links, facts.length_mm]),
    mounting: upright ? "base" : up[2] < -0.98 ? "base, hanging" : Math.abs(up[2]) < 0.2 ? "base, on a wall" : "base, tilted",
    views: [[-Math.PI / 2, 0], [0, 0], [-Math.PI / 2, Math.PI / 2], [Math.atan2(centre[1] - base[1], centre[0] - base[0]) - 0.9, 0.38]],
  };
}

// The ends of the short line that shows the axis of joint k.
function axisOf({ points, axes }, k, radius) {
  return [1, -1].map((side) => along(points[k], 0.11 * side * radius, axes[k]));
}

function halfDiagonal(list) {
  return 0.5 * Math.hypot(...bounds(list).map(([low, high]) => high - low)) || 1;
}

// At most about `most` sample numbers from 0 to `last`, evenly.
function pick(last, most) {
  const step = Math.max(1, Math.floor(last / most));
  return Array.from({ length: Math.ceil((last + 1) / step) }, (_, k) => k * step);
}
