// The arm at the cursor in an honest perspective: floor, path, part frame on one canvas, the arm and what moves on another.

import { clamp, niceStep, worstJoint } from "./data.js";
import { fit, text } from "./theme.js";

export function armView(facts, data) {
  const samples = data.time_s[0].length;
  const base = column(facts.base, 3), part = column(facts.part, 3);
  const points = facts.joints.length + 2;
  const point = (k, i) => [data.points_m[3 * k][i], data.points_m[3 * k + 1][i], data.points_m[3 * k + 2][i]];
  const axis = (k, i) => [data.axes[3 * k][i], data.axes[3 * k + 1][i], data.axes[3 * k + 2][i]];
  const onPath = (i) => [data.path_m[0][i], data.path_m[1][i], data.path_m[2][i]];
  const seen = [base, part, ...pick(samples, 200).map(onPath),
                ...pick(samples, 24).flatMap((i) => Array.from({ length: points }, (_, k) => point(k, i)))].filter(finite);
  const box = bounds(seen);
  const centre = box.map(([low, high]) => 0.5 * (low + high));
  const radius = 0.5 * Math.hypot(...box.map(([low, high]) => high - low)) || 1;
  const floor = Math.min(0, base[2], part[2]);
  const away = Math.atan2(centre[1] - base[1], centre[0] - base[0]) - 0.9;
  const camera = { turn: away, tilt: 0.38, width: 1, height: 1, scale: 1, shift: [0, 0] };

  function project(p) {
    const [x, y, z] = [p[0] - centre[0], p[1] - centre[1], p[2] - centre[2]];
    const ct = Math.cos(camera.turn), st = Math.sin(camera.turn), ce = Math.cos(camera.tilt), se = Math.sin(camera.tilt);
    const depth = 3.4 * radius - (ce * (ct * x + st * y) + se * z);
    const size = camera.scale / Math.max(depth, 0.1 * radius);
    return [camera.width / 2 + camera.shift[0] + size * (ct * y - st * x),
            camera.height / 2 + camera.shift[1] - size * (ce * z - se * (ct * x + st * y)), size];
  }

  // The whole of path and arm fills the view as it is first seen; orbiting then keeps this scale.
  function frameAll(width, height) {
    Object.assign(camera, { width, height, scale: 1, shift: [-width / 2, -height / 2] });
    const tips = [0, 1, 2].map((k) => part.map((v, r) => v + 0.2 * radius * facts.part[r][k]));
    const [xs, ys] = bounds([...seen, ...tips].map(project));
    const scale = 0.84 * Math.min(width / (xs[1] - xs[0] || 1), height / (ys[1] - ys[0] || 1));
    camera.scale = scale;
    camera.shift = [-scale * 0.5 * (xs[0] + xs[1]), -scale * 0.5 * (ys[0] + ys[1])];
  }

  function polyline(context, list, colour, width, dash = []) {
    context.strokeStyle = colour;
    context.lineWidth = width;
    context.lineJoin = context.lineCap = "round";
    context.setLineDash(dash);
    context.beginPath();
    list.forEach((p, k) => (k ? context.lineTo(p[0], p[1]) : context.moveTo(p[0], p[1])));
    context.stroke();
    context.setLineDash([]);
  }

  function drawFloor(context, colours) {
    const step = niceStep(2 * radius, 6);
    const [x0, x1, y0, y1] = [...box[0], ...box[1]].map((v, k) => step * (k % 2 ? Math.ceil(v / step + 0.3) : Math.floor(v / step - 0.3)));
    for (let x = x0; x <= x1 + 1e-9; x += step) polyline(context, [project([x, y0, floor]), project([x, y1, floor])], colours.faint, 1);
    for (let y = y0; y <= y1 + 1e-9; y += step) polyline(context, [project([x0, y, floor]), project([x1, y, floor])], colours.faint, 1);
    return step;
  }

  // Air moves dotted, clean process stretches thin, warn and fail thicker, fail with a light core so that it shows without its colour.
  function drawPath(context, colours) {
    const kind = (i) => (data.severity[0][i] ? data.severity[0][i] : data.process[0][i] ? 0 : -1);
    const styles = { "-1": [colours.soft, 1.2, [1, 4]], 0: [colours.line, 1.8], 1: [colours.warn, 3.5], 2: [colours.fail, 5] };
    const step = Math.max(1, Math.floor(samples / 1500));
    for (let start = 0; start < samples - 1;) {
      const code = kind(start), list = [project(onPath(start))];
      let i = start + 1;
      for (; i < samples && kind(i) === code; i++) if (i % step === 0) list.push(project(onPath(i)));
      list.push(project(onPath(Math.min(i, samples - 1))));
      polyline(context, list, ...styles[code]);
      if (code === 2) polyline(context, list, colours.ground, 1.4);
      start = i;
    }
  }

  function drawFrame(context, pose, length, colours, words) {
    const origin = project(column(pose, 3));
    ["X", "Y", "Z"].forEach((name, k) => {
      const end = project(column(pose, 3).map((v, r) => v + length * pose[r][k]));
      polyline(context, [origin, end], colours.frame[k], 2);
      text(context, name, end[0] + 5, end[1] - 4, { colour: colours.soft, size: 10, family: colours.font });
    });
    if (words) text(context, words, origin[0] - 6, origin[1] + 11, { colour: colours.soft, size: 10, family: colours.font, align: "right" });
  }

  function drawStage(canvas, colours) {
    const context = fit(canvas, camera.width, camera.height);
    const step = drawFloor(context, colours);
    drawPath(context, colours);
    drawFrame(context, facts.part, 0.16 * radius, colours, "part");
    text(context, `grid ${Math.round(1000 * step)} mm`, camera.width - 8, camera.height - 10,
         { colour: colours.soft, align: "right", family: colours.font });
  }

  function drawArm(canvas, colours, i) {
    const context = fit(canvas, camera.width, camera.height);
    const chain = [[base[0], base[1], Math.min(floor, base[2])], base, ...Array.from({ length: points }, (_, k) => point(k, i))];
    if (!chain.every(finite)) {
      polyline(context, [project(chain[0]), project(base)], colours.soft, 6);
      const at = project(onPath(i));
      ring(context, at, 5, colours.fail, colours.ground);
      text(context, "not reached: no posture to draw", 10, 14, { colour: colours.ink, family: colours.font });
      return;
    }
    const flat = chain.map(project);
    const last = flat.length - 1;
    const girth = (k) => clamp((0.075 - 0.05 * (k / last)) * radius * flat[k][2], 4, 26);
    for (const [colour, more] of [[colours.soft, 2], [colours.tube, 0]]) {
      for (let k = 0; k < last - 1; k++) polyline(context, [flat[k], flat[k + 1]], colour, girth(k + 1) + more);
    }
    polyline(context, [flat[last - 1], flat[last]], colours.ink, 2.4);
    drawJoints(context, colours, i, flat, girth);
    ring(context, flat[last], 3.5, colours.ink, colours.ground);
  }

  // Each joint's axis as a short line: joints that line up are seen to line up. The busiest joint is named when it is past its warn line.
  function drawJoints(context, colours, i, flat, girth) {
    facts.joints.forEach((name, k) => {
      const at = point(k, i), along = axis(k, i), reach = 0.11 * radius;
      const ends = [1, -1].map((side) => project(at.map((v, r) => v + side * reach * along[r])));
      polyline(context, ends, colours.soft, 1.4, [4, 2]);
      ring(context, flat[k + 2], Math.max(3, girth(k + 2) * 0.42), colours.soft, colours.ground);
    });
    const worst = worstJoint(data, i), [[warn], [fail]] = facts.rows[0].bounds;
    if (!worst || worst[1] < warn) return;
    const [k, share] = worst, at = flat[k + 2];
    ring(context, at, Math.max(5, girth(k + 2) * 0.6), share > fail ? colours.fail : colours.warn, colours.ground, 3);
    text(context, `${facts.joints[k]} ${share.toFixed(0)} %`, at[0] + 14, at[1] - 14,
         { colour: colours.ink, size: 12, weight: "600", family: colours.font });
  }

  function ring(context, [x, y], r, colour, fill, width = 1.5) {
    context.beginPath();
    context.arc(x, y, r, 0, 7);
    context.fillStyle = fill;
    context.fill();
    context.strokeStyle = colour;
    context.lineWidth = width;
    context.stroke();
  }

  function orbit(dx, dy) {
    camera.turn -= 0.01 * dx;
    camera.tilt = clamp(camera.tilt + 0.008 * dy, -0.2, 1.5);
  }

  function reset() {
    camera.turn = away;
    camera.tilt = 0.38;
  }

  return { frameAll, drawStage, drawArm, orbit, reset };
}

function column(pose, k) {
  return [pose[0][k], pose[1][k], pose[2][k]];
}

function finite(p) {
  return p.every(Number.isFinite);
}

function pick(count, most) {
  const step = Math.max(1, Math.floor(count / most));
  return Array.from({ length: Math.ceil(count / step) }, (_, k) => k * step);
}

function bounds(list) {
  return [0, 1, 2].map((k) => [Math.min(...list.map((p) => p[k])), Math.max(...list.map((p) => p[k]))]);
}
