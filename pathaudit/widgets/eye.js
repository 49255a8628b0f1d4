// The eye that a scene is seen with, in central perspective: world metres to pixels, and how the eye moves.

import { clamp } from "./data.js";
import { along } from "./space.js";

const RIGHT_ANGLE = Math.PI / 2;

// `look` holds the eye, so that a later one can take it over; `seen` are the points that belong in the picture, `views` are [turn, tilt] in radians.
export function eyeOn({ centre, radius, seen, views }, look) {
  function project(p) {
    const [x, y, z] = along(p, -1, centre), ct = Math.cos(look.turn), st = Math.sin(look.turn), ce = Math.cos(look.tilt), se = Math.sin(look.tilt);
    const ahead = ct * x + st * y, size = look.scale / Math.max(3.4 * radius - ce * ahead - se * z, 0.1 * radius);
    return [look.x + size * (ct * y - st * x), look.y - size * (ce * z - se * ahead), size];
  }

  // All that there is to see, with room around it for words.
  function fitTo(width = look.width, height = look.height) {
    Object.assign(look, { width, height, scale: 1, x: 0, y: 0 });
    const [xs, ys] = bounds(seen.map(project));
    look.scale = look.fitted = Math.min((width - 64) / (xs[1] - xs[0] || 1e-9), (height - 72) / (ys[1] - ys[0] || 1e-9));
    pan((width - look.scale * (xs[0] + xs[1])) / 2, (height - look.scale * (ys[0] + ys[1])) / 2 - 4);
  }

  function view(k) {
    [look.turn, look.tilt] = views[k];
    fitTo();
  }

  function pan(dx, dy) {
    look.x += dx;
    look.y += dy;
  }

  // The place `about` stays where it is seen.
  function orbit(dx, dy, about) {
    const [x, y] = project(about);
    look.turn -= 0.01 * dx;
    look.tilt = clamp(look.tilt + 0.008 * dy, -RIGHT_ANGLE, RIGHT_ANGLE);
    const after = project(about);
    pan(x - after[0], y - after[1]);
  }

  // What is seen at (x, y) stays there.
  function zoom(factor, x, y) {
    const by = clamp(look.scale * factor, 0.4 * look.fitted, 25 * look.fitted) / look.scale;
    look.scale *= by;
    pan((by - 1) * (look.x - x), (by - 1) * (look.y - y));
  }

  return { project, fitTo, view, orbit, pan, zoom };
}

// [least, most] of each coordinate.
export function bounds(list) {
  return [0, 1, 2].map((k) => [Math.min(...list.map((p) => p[k])), Math.max(...list.map((p) => p[k]))]);
}
