"""The arm at one sample in perspective, with mounting, path and frames: the still counterpart of arm.js, on a surface (surfaces.py)."""

import numpy as np

from .drawn_rows import thinned
from .rows import nice_step
from .skeleton import skeleton
from .surfaces import FAINT, GREEN, GROUND, INK, LINE, SEVERITY, SOFT, TUBE

_STYLES = ((SOFT, 1.2, (1, 4)), (LINE, 1.8, ()), (SEVERITY["warn"], 3.5, ()), (SEVERITY["fail"], 5.0, ()))      # air, clean, warn, fail
_SIDES = ((0, 0), (1, -1), (-1, -1), (1, 1), (-1, 1), (0, -2), (0, 2), (2, 0), (-2, 0), (2, -3), (-2, -3), (2, 3), (-2, 3))
_PLATE = np.array([[1, 1], [-1, 1], [-1, -1], [1, -1], [1, 1], [-1, -1], [1, -1], [-1, 1]])      # a square, and its diagonals


def draw_arm(surface, box, facts, arrays, at):
    """Draw into box (x, y, width, height) the arm at kept sample `at`."""
    view, words = _View(box, facts, arrays), _Words(surface, box)
    x, y, width, height = box
    words.write(x + 8, y + 12, f"arm at {arrays['time_s'][at]:.2f} s")
    step = _draw_floor(surface, view)
    grid = f"grid {1e3 * step:.0f} mm"
    words.write(x + width - 8 - surface.text_width(grid), y + height - 11, grid)
    _draw_legend(surface, view, words)
    _draw_mounting(surface, view, words)
    _draw_path(surface, view, arrays)
    _draw_frame(surface, view, words, view.part, 0.14, "part")
    _draw_chain(surface, view, words, facts, arrays, at)
    surface.rect(x, y, width, height, stroke=FAINT)


class _View:
    """An eye beside the cell that sees the whole of path and arm, and what the arm stands on."""

    def __init__(self, box, facts, arrays):
        self.base, self.part, self.box = np.array(facts["base"]), np.array(facts["part"]), box
        path = arrays["path_m"].astype(float)
        posed = skeleton(facts, arrays["joints"][::max(1, len(path) // 24)])
        seen = np.vstack([self.base[:3, 3], self.part[:3, 3], path[::max(1, len(path) // 200)], posed.points.reshape(-1, 3), posed.roots.reshape(-1, 3)])
        seen = seen[np.isfinite(seen).all(axis=1)]
        self._stand(seen)
        seen = np.vstack([seen, self.foot, [*self.part[:2, 3], self.floor]])
        self.low, self.high = seen.min(axis=0), seen.max(axis=0)
        self.centre, self.radius = 0.5 * (self.low + self.high), _half_diagonal(seen)
        plate = self.foot + _PLATE[:4] @ (0.1 * self.radius * self.base[:3, :2]).T
        axes = 0.11 * self.radius * np.array([[[1]], [[-1]]])[..., None] * posed.axes + posed.points[:, :-2]
        tools = posed.tool[:, None, :, 3] + 0.08 * self.radius * np.swapaxes(posed.tool[:, :, :3], 1, 2)
        tips = np.vstack([plate, self.part[:3, 3] + 0.17 * self.radius * self.part[:3, :3].T, axes.reshape(-1, 3), tools.reshape(-1, 3)])
        self._place(np.vstack([seen, tips[np.isfinite(tips).all(axis=1)]]))

    def _stand(self, seen):
        """The floor, unless it is so far below everything that it would only make the rest small, and where the base is carried."""
        origin, up = self.base[:3, 3], self.base[:3, 2]
        lowest, ground, reach = seen[:, 2].min(), min(0.0, origin[2], self.part[2, 3]), _half_diagonal(seen)
        self.floor = lowest if lowest - ground > reach else ground
        self.upright = up[2] > 0.98
        self.foot = origin + (self.floor - origin[2] if self.upright else -0.14 * reach) * up
        self.mounting = "base" if self.upright else "base, hanging" if up[2] < -0.98 else "base, on a wall" if abs(up[2]) < 0.2 else "base, tilted"

    def _place(self, seen):
        along, box = self.centre - self.base[:3, 3], self.box
        turn, tilt = np.arctan2(along[1], along[0]) - 0.9, 0.38
        ct, st, ce, se = np.cos(turn), np.sin(turn), np.cos(tilt), np.sin(tilt)
        self.axes = np.array([[-st, ct, 0], [-se * ct, -se * st, ce], [ce * ct, ce * st, se]])
        self.scale, self.shift = 1.0, np.zeros(2)
        flat = self.project(seen)[0]
        spread = np.maximum(np.ptp(flat, axis=0), 1e-9)
        self.scale = float(min((box[2] - 64) / spread[0], (box[3] - 72) / spread[1]))
        middle = np.array([box[0] + box[2] / 2, box[1] + box[3] / 2 - 4])
        self.shift = middle - self.scale * 0.5 * (flat.min(axis=0) + flat.max(axis=0))

    def project(self, points):
        """Points (K, 3) in the world: (K, 2) px and (K,) px per metre there."""
        right, up, near = ((np.atleast_2d(points) - self.centre) @ self.axes.T).T
        size = self.scale / np.maximum(3.4 * self.radius - near, 0.1 * self.radius)
        return np.column_stack([size * right, -size * up]) + self.shift, size


def _half_diagonal(points):
    return 0.5 * float(np.linalg.norm(np.ptp(points, axis=0))) or 1.0


class _Words:
    """Words inside a box, none over another."""

    def __init__(self, surface, box):
        self._surface, self._box, self._used = surface, box, []

    def write(self, x, y, words, **style):
        self._used.append((x, y, self._surface.text_width(words)))
        self._surface.text(x, y, words, **style)

    def at_edge(self, places, words, side=1):
        """Under the lowest of places (K, 2) in px, or above the highest (side = -1)."""
        self.beside(places[np.argmax(side * places[:, 1])] + (0, 10 * side), words)

    def beside(self, place, words, away=0.0, **style):
        """Beside a place in px, on the first side that is clear (away = 0: on it, where that is); left out where there is no room."""
        wide, (left, top, width, height) = self._surface.text_width(words), self._box
        for side, level in _SIDES[away > 0:]:
            gap = (7 * abs(side) + away) * np.sign(side)
            x = place[0] + gap - (wide if side < 0 else 0 if side else wide / 2)
            y = place[1] + (9 + away / 2) * level
            clear = all(x > u + w + 3 or u > x + wide + 3 or abs(y - v) >= 14 for u, v, w in self._used)
            if clear and left + 2 < x < left + width - wide - 2 and top + 8 < y < top + height - 8:
                return self.write(x, y, words, **style)


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


def _draw_mounting(surface, view, words):
    """What carries the base: a post on a plate, which is crossed where it is not the floor."""
    plate, _ = view.project(view.foot + _PLATE[:5 if view.upright else 8] @ (0.1 * view.radius * view.base[:3, :2]).T)
    surface.line(plate, SOFT, 1.2)
    post, size = view.project(np.array([view.foot, view.base[:3, 3]]))
    for colour, more in ((SOFT, 2), (TUBE, 0)):
        surface.line(post, colour, float(np.clip(0.072 * view.radius * size[1], 4, 48)) + more)
    words.at_edge(plate, view.mounting, 1 if view.upright else -1)


def _draw_stretch(surface, line, code):
    """Air moves dotted, warn and fail thicker, fail with a light core so that it shows without its colour."""
    surface.line(line, *_STYLES[code])
    if code == 3:
        surface.line(line, GROUND, 1.4)


def _draw_path(surface, view, arrays):
    flat = view.project(arrays["path_m"].astype(float))[0]
    code = np.where(arrays["severity"] > 0, arrays["severity"] + 1, arrays["process"] > 0).astype(int)
    changes = np.flatnonzero(np.diff(code)) + 1
    for first, end in zip(np.r_[0, changes], np.r_[changes, len(code)]):
        piece = flat[first:end + 1]
        _draw_stretch(surface, thinned(piece[:, 0], piece[:, 1]), code[first])


def _draw_legend(surface, view, words):
    x, y = view.box[0] + 10, view.box[1] + view.box[3] - 11
    for code, name in enumerate(("air", "clean", "warn", "fail")):
        _draw_stretch(surface, np.array([[x, y], [x + 18, y]]), code)
        words.write(x + 24, y, name)
        x += 36 + surface.text_width(name)


def _draw_frame(surface, view, words, pose, length, name):
    origin = pose[:3, 3]
    along = length * view.radius * pose[:3, :3].T
    flat, _ = view.project(np.vstack([origin, origin + along, origin + 1.25 * along]))
    for k, colour in enumerate((SEVERITY["fail"], GREEN, LINE)):
        surface.line(flat[[0, k + 1]], colour, 2)
        words.beside(flat[k + 4], "XYZ"[k])
    words.at_edge(flat[:1], name)


def _draw_chain(surface, view, words, facts, arrays, at):
    posed = skeleton(facts, arrays["joints"][at:at + 1])
    points, roots = posed.points[0], posed.roots[0]
    if not np.isfinite(points).all():
        (spot,), _ = view.project(arrays["path_m"][at].astype(float))
        surface.circle(*spot, 5, GROUND, SEVERITY["fail"])
        words.write(view.box[0] + 8, view.box[1] + 28, "not reached: no posture to draw", colour=INK)
        return
    slides = [*facts["prismatic"], False, False]
    chain = [view.base[:3, 3], *(p for k, point in enumerate(points) for p in ((roots[k], point) if slides[k] else (point,)))]
    flat, size = view.project(np.array(chain))
    last = len(flat) - 1
    girth = _girth(view, size, np.arange(last + 1) / last)
    for colour, more in ((SOFT, 2), (TUBE, 0)):
        for k in range(last - 1):
            surface.line(flat[k:k + 2], colour, float(girth[k] + more))
    surface.line(flat[last - 1:], INK, 2.4)
    _draw_joints(surface, view, words, facts, posed, arrays["share_percent"][at])
    _draw_frame(surface, view, words, posed.tool[0], 0.08, "tool")
    surface.circle(*flat[last], 3.5, GROUND, INK)


def _girth(view, size, share):
    return np.clip((0.07 - 0.05 * share) * view.radius * size, 4, 48)


def _draw_joints(surface, view, words, facts, posed, share):
    """Each joint's axis as a short line; a square slides. The busiest joint is named past its warn line."""
    n = len(facts["joints"])
    flat, size = view.project(posed.points[0, :n])
    radius = np.maximum(3.0, 0.42 * _girth(view, size, np.arange(n) / n))
    for k, axis in enumerate(posed.axes[0]):
        surface.line(view.project(posed.points[0, k] + 0.11 * view.radius * np.outer([1, -1], axis))[0], SOFT, 1.4, (4, 2))
        _mark(surface, flat[k], radius[k], SOFT, 1.5, facts["prismatic"][k])
    (warn, _), (fail, _) = facts["rows"][0]["bounds"]
    if not np.isfinite(share).any() or np.nanmax(share) < warn:
        return
    k = int(np.nanargmax(share))
    _mark(surface, flat[k], radius[k] + 2, SEVERITY["fail" if share[k] > fail else "warn"], 3, facts["prismatic"][k])
    words.beside(flat[k], f"{facts['joints'][k]} {share[k]:.0f} %", float(radius[k]) + 4, colour=INK, bold=True)


def _mark(surface, place, r, colour, width, square):
    if square:
        surface.rect(place[0] - r, place[1] - r, 2 * r, 2 * r, GROUND, colour, width)
    else:
        surface.circle(*place, r, GROUND, colour, width)
