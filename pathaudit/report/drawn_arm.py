"""The arm at one sample in perspective, with path and part frame: the still counterpart of arm.js, on a surface (surfaces.py)."""

import numpy as np

from .drawn_rows import thinned
from .rows import nice_step
from .surfaces import FAINT, GREEN, GROUND, INK, LINE, SEVERITY, SOFT, TUBE


def draw_arm(surface, box, facts, arrays, at):
    """Draw into box (x, y, width, height) the arm at kept sample `at`."""
    view = _View(box, facts, arrays)
    x, y, width, height = box
    step = _draw_floor(surface, view)
    _draw_path(surface, view, arrays)
    _draw_frame(surface, view, np.array(facts["part"]))
    _draw_chain(surface, view, facts, arrays, at)
    surface.rect(x, y, width, height, stroke=FAINT)
    surface.text(x + 8, y + 12, f"arm at {arrays['time_s'][at]:.2f} s")
    surface.text(x + width - 8, y + height - 10, f"grid {1e3 * step:.0f} mm", align="right")


class _View:
    """A camera beside the cell that sees the whole of path and arm."""

    def __init__(self, box, facts, arrays):
        self.base, self.part = np.array(facts["base"]), np.array(facts["part"])
        points, path = arrays["points_m"].astype(float), arrays["path_m"].astype(float)
        few, some = max(1, len(path) // 24), max(1, len(path) // 200)
        seen = np.vstack([self.base[:3, 3], self.part[:3, 3], path[::some], points[::few].reshape(-1, 3)])
        seen = seen[np.isfinite(seen).all(axis=1)]
        self.low, self.high = seen.min(axis=0), seen.max(axis=0)
        self.centre = 0.5 * (self.low + self.high)
        self.radius = 0.5 * float(np.linalg.norm(self.high - self.low)) or 1.0
        self.floor = min(0.0, self.base[2, 3], self.part[2, 3])
        along = self.centre - self.base[:3, 3]
        turn, tilt = np.arctan2(along[1], along[0]) - 0.9, 0.38
        ct, st, ce, se = np.cos(turn), np.sin(turn), np.cos(tilt), np.sin(tilt)
        self.axes = np.array([[-st, ct, 0], [-se * ct, -se * st, ce], [ce * ct, ce * st, se]])
        self.scale, self.shift = 1.0, np.zeros(2)
        tips = self.part[:3, 3] + 0.2 * self.radius * self.part[:3, :3].T
        flat = self.project(np.vstack([seen, tips]))[0]
        spread = np.maximum(np.ptp(flat, axis=0), 1e-9)
        self.scale = 0.84 * float(min(box[2] / spread[0], box[3] / spread[1]))
        self.shift = np.array([box[0] + box[2] / 2, box[1] + box[3] / 2]) - self.scale * 0.5 * (flat.min(axis=0) + flat.max(axis=0))
        self.box = box

    def project(self, points):
        """Points (K, 3) in the world: (K, 2) px and (K,) px per metre there."""
        right, up, near = ((np.atleast_2d(points) - self.centre) @ self.axes.T).T
        size = self.scale / np.maximum(3.4 * self.radius - near, 0.1 * self.radius)
        return np.column_stack([size * right, -size * up]) + self.shift, size


def _draw_floor(surface, view):
    step = nice_step(2 * view.radius, 6)
    low, high = np.floor(view.low / step - 0.3), np.ceil(view.high / step + 0.3)
    for axis in (0, 1):
        for k in np.arange(low[axis], high[axis] + 1):
            ends = np.full((2, 3), view.floor)
            ends[:, axis] = k * step
            ends[:, 1 - axis] = low[1 - axis] * step, high[1 - axis] * step
            piece = _clipped(view.project(ends)[0], view.box)
            if piece is not None:
                surface.line(piece, FAINT)
    return step


def _clipped(ends, box):
    """The part of a straight line inside a box (Liang and Barsky 1984), or None."""
    start, along = ends[0], ends[1] - ends[0]
    first, last = 0.0, 1.0
    for axis in (0, 1):
        for edge, sign in ((box[axis], -1.0), (box[axis] + box[axis + 2], 1.0)):
            room, rate = sign * (edge - start[axis]), sign * along[axis]
            if abs(rate) < 1e-12:
                if room < 0:
                    return None
            elif rate > 0:
                last = min(last, room / rate)
            else:
                first = max(first, room / rate)
    return None if first >= last else np.array([start + first * along, start + last * along])


def _draw_path(surface, view, arrays):
    flat = view.project(arrays["path_m"].astype(float))[0]
    kind = np.where(arrays["severity"] > 0, arrays["severity"], np.where(arrays["process"] > 0, 0, -1)).astype(int)
    styles = {-1: (SOFT, 1.2, (1, 4)), 0: (LINE, 1.8, ()), 1: (SEVERITY["warn"], 3.5, ()), 2: (SEVERITY["fail"], 5.0, ())}
    changes = np.flatnonzero(np.diff(kind)) + 1
    for first, end in zip(np.r_[0, changes], np.r_[changes, len(kind)]):
        piece = flat[first:end + 1]
        line = thinned(piece[:, 0], piece[:, 1])
        surface.line(line, *styles[kind[first]])
        if kind[first] == 2:
            surface.line(line, GROUND, 1.4)


def _draw_frame(surface, view, pose):
    origin = pose[:3, 3]
    for k, (name, colour) in enumerate(zip("XYZ", (SEVERITY["fail"], GREEN, LINE))):
        ends, _ = view.project(np.array([origin, origin + 0.16 * view.radius * pose[:3, k]]))
        surface.line(ends, colour, 2)
        surface.text(ends[1, 0] + 5, ends[1, 1] - 4, name, size=10)
    (at,), _ = view.project(origin)
    surface.text(at[0] - 6, at[1] + 11, "part", align="right", size=10)


def _draw_chain(surface, view, facts, arrays, at):
    base, points = view.base[:3, 3], arrays["points_m"][at].astype(float)
    foot = np.array([base[0], base[1], min(view.floor, base[2])])
    if not np.isfinite(points).all():
        surface.line(view.project(np.array([foot, base]))[0], SOFT, 6)
        (spot,), _ = view.project(arrays["path_m"][at].astype(float))
        surface.circle(*spot, 5, GROUND, SEVERITY["fail"])
        surface.text(view.box[0] + 8, view.box[1] + 28, "not reached: no posture to draw", INK)
        return
    flat, size = view.project(np.vstack([foot, base, points]))
    last = len(flat) - 1
    girth = np.clip((0.075 - 0.05 * np.arange(last + 1) / last) * view.radius * size, 4, 26)
    for colour, more in ((SOFT, 2), (TUBE, 0)):
        for k in range(last - 1):
            surface.line(flat[k:k + 2], colour, float(girth[k + 1] + more))
    surface.line(flat[last - 1:], INK, 2.4)
    for k, axis in enumerate(arrays["axes"][at].astype(float)):
        surface.line(view.project(points[k] + 0.11 * view.radius * np.outer([1, -1], axis))[0], SOFT, 1.4, (4, 2))
        surface.circle(*flat[k + 2], max(3.0, 0.42 * girth[k + 2]), GROUND, SOFT)
    _name_busiest(surface, facts, arrays["share_percent"][at], flat[2:], girth[2:])
    surface.circle(*flat[last], 3.5, GROUND, INK)


def _name_busiest(surface, facts, share, flat, girth):
    (warn, _), (fail, _) = facts["rows"][0]["bounds"]
    if not np.isfinite(share).any() or np.nanmax(share) < warn:
        return
    k = int(np.nanargmax(share))
    surface.circle(*flat[k], max(5.0, 0.6 * girth[k]), GROUND, SEVERITY["fail" if share[k] > fail else "warn"], 3)
    surface.text(flat[k, 0] + 14, flat[k, 1] - 14, f"{facts['joints'][k]} {share[k]:.0f} %", INK, size=12, bold=True)
