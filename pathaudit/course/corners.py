"""What happens where two moves meet: a smooth join, an exact stop, or a rounding whose curvature is continuous."""

import re
from dataclasses import dataclass

import numpy as np

from ..conventions import INCH, MM
from ..errors import ModelError, quoted
from .curves import angle_between, joining_quintic
from .moves import PARTS, Course, curve_lengths
from .shapes import CURVE, STILL, Curves, curvature
from .turning import EVEN, Blended, splined_rate

SMOOTH = np.radians(0.1)
"""rad: directions that differ by less are passed without a stop. Coordinates rounded to 1 um leave less between lines of a few mm."""
SMOOTH_TURN = np.radians(0.01) / MM
"""rad/m: the same for the rate at which the tool turns along the path."""
SHARPEST = np.radians(175.0)
"""rad: a path that turns back further than this is not rounded but stopped."""
LEAST = 1e-6
"""m: a rounding that would begin nearer to its corner than this is none, and the tool stops there."""
SIDEWAYS = 0.8
"""Share of the acceleration ceiling for going round a bend. The rest along the path is then at least 0.6 of it: 0.8^2 + 0.6^2 = 1."""

LENGTHS = {"mm": MM, "m": 1.0, "in": INCH}
SPEEDS = {"mm/s": MM, "m/s": 1.0, "mm/min": MM / 60.0, "m/min": 1.0 / 60.0, "in/min": INCH / 60.0}


@dataclass(frozen=True)
class Corner:
    """How corners are passed that say nothing themselves: an exact stop, or rounded within `radius` m of the corner, or at `speed` m/s."""

    radius: float = 0.0
    speed: float = 0.0

    def __str__(self):
        if self.speed:
            return f"at {self.speed / MM:.6g} mm/s"
        return f"within {self.radius / MM:.6g} mm" if self.radius else "exact stop"


def corner_from(text, name="corner") -> Corner:
    """A Corner from words: 'stop', a length such as '5mm', a speed such as '40mm/s'. Raises ModelError.

    >>> corner_from("5mm"), corner_from("3 m/min").speed
    (Corner(radius=0.005, speed=0.0), 0.05)
    """
    found = re.fullmatch(r"\s*(\d+\.?\d*|\.\d+)\s*([a-z]+(?:/[a-z]+)?)\s*", str(text), re.ASCII)
    if str(text).strip() == "stop":
        return Corner()
    if found and float(found[1]) > 0.0 and found[2] in LENGTHS:
        return Corner(radius=float(found[1]) * LENGTHS[found[2]])
    if found and float(found[1]) > 0.0 and found[2] in SPEEDS:
        return Corner(speed=float(found[1]) * SPEEDS[found[2]])
    raise ModelError(name, quoted(text), "stop, a radius such as 5mm or a speed such as 40mm/s")


@dataclass(frozen=True, eq=False)
class Rounded:
    """The joins of a course of m moves and the roundings put into it, one row a rounding.

    smooth (m - 1,) bool: passed without a stop.  bend (m - 1,) rad between the directions of the two moves.
    at (r,): the move before each rounding.  asked, used (r,) m: how far from the corner the path is left.  deviation (r,) m: the least distance
    between the corner and the commanded path (the round-off of ISO 9283, as commanded; the attained one is measured on the arm).
    speed (r,) m/s: not to be passed, inf where none is set.  curves, turning: a row each.  length (r,) m.
    cut_start, cut_end (m,) m of arc length that the roundings take from each move.
    """

    smooth: np.ndarray
    bend: np.ndarray
    at: np.ndarray
    asked: np.ndarray
    used: np.ndarray
    deviation: np.ndarray
    speed: np.ndarray
    curves: Curves
    turning: Blended
    length: np.ndarray
    cut_start: np.ndarray
    cut_end: np.ndarray


def round_corners(course: Course, corner: Corner, speed, acceleration) -> Rounded:
    """Round what is to be rounded. speed (m,) m/s of each move, acceleration m/s2: the ceilings that a rounding by speed goes by."""
    move = np.arange(course.moves - 1)
    moving = course.kind != STILL
    after, before = _look(course, move, course.length[:-1], moving[:-1]), _look(course, move + 1, np.zeros(len(move)), moving[1:])
    bend, turn_step = angle_between(after[1], before[1]), np.linalg.norm(after[4] - before[4], axis=1)
    both = moving[:-1] & moving[1:]
    smooth = both & (bend <= SMOOTH) & (turn_step <= SMOOTH_TURN)
    zone, limit = _zones(course, corner, bend, speed, acceleration)
    tightest = np.maximum(np.linalg.norm(after[2], axis=1), np.linalg.norm(before[2], axis=1))
    used = np.minimum(zone, 0.5 * np.minimum(course.length[:-1], course.length[1:]))
    used = np.minimum(used, 0.5 / np.maximum(tightest, 1e-300))  # of an arc no more than half its radius
    at = np.flatnonzero(both & ~smooth & (course.air[:-1] == course.air[1:]) & (bend < SHARPEST) & (used > LEAST))
    asked, used = zone[at], used[at]
    start = _look(course, at, course.length[at] - used, moving[at])
    end = _look(course, at + 1, used, moving[at])
    curves = Curves(joining_quintic(start[0], end[0], (start[1], end[1]), (start[2], end[2])))
    length = curve_lengths(curves)
    turning = Blended(start[3], start[4] * length[:, None], end[3], end[4] * length[:, None])
    cut_start, cut_end = np.zeros(course.moves), np.zeros(course.moves)
    cut_start[at + 1], cut_end[at] = used, used
    deviation = _nearest(curves, after[0][at])
    return Rounded(smooth, bend, at, asked, used, deviation, limit[at], curves, turning, length, cut_start, cut_end)


def _look(course, move, s, moving):
    """Position, tangent, curvature vector, quaternion and turning per metre at arc length s (N,) of moves (N,); zeros where they do not move."""
    t = parameter(course, move, s)
    place, slope, bend = course.at(move, t)
    tangent, per, bent = curvature(slope, bend)
    rate = np.zeros((len(move), 3))
    even = course.turn_kind[move] == EVEN
    rate[even] = course.even.turn[course.turn_row[move[even]]]
    rate[~even] = splined_rate(course.splined, course.turn_row[move[~even]], t[~even])
    on = np.asarray(moving)[:, None]
    return place, np.where(on, tangent, 0.0), np.where(on, bent, 0.0), course.quaternion(move, t), np.where(on, rate / np.maximum(per, 1e-300)[:, None], 0.0)


def parameter(course: Course, move, s):
    """(N,) the parameter of moves (N,) at their arc length s (N,)."""
    t = np.clip(s / np.where(course.length[move] > 0.0, course.length[move], 1.0), 0.0, 1.0)
    bent = np.flatnonzero((course.kind[move] == CURVE) & (t > 0.0) & (t < 1.0))
    if len(bent):
        row = course.row[move[bent]]
        edges = np.linspace(0.0, 1.0, PARTS + 1)
        parts = np.stack([course.curves.length(row, np.full(len(row), a), np.full(len(row), b)) for a, b in zip(edges[:-1], edges[1:], strict=True)], axis=1)
        ends = np.cumsum(parts, axis=1)
        part = np.minimum((ends < s[bent, None]).sum(axis=1), PARTS - 1)
        k = np.arange(len(bent))
        t[bent] = course.curves.parameter(row, edges[part], edges[part + 1], parts[k, part], s[bent] - (ends[k, part] - parts[k, part]))
    return t


def _zones(course, corner, bend, speed, acceleration):
    """For each join how far from it the path may be left (m), and the speed (m/s) that a rounding by speed may not pass."""
    zone, limit = course.zone[:-1].copy(), np.full(course.moves - 1, np.inf)
    open_ = np.isnan(zone)
    zone[open_] = corner.radius
    if corner.speed:
        held = np.minimum(corner.speed, np.minimum(speed[:-1], speed[1:]))
        with np.errstate(over="ignore"):
            by_speed = held**2 * peak_factor(np.minimum(bend, SHARPEST)) / (SIDEWAYS * acceleration)
        zone[open_], limit[open_] = by_speed[open_], held[open_]
    return zone, limit


def peak_factor(bend):
    """(k,) the largest curvature of the rounding of a corner between straight lines times its distance from the corner; bend (k,) rad below pi."""
    flat = np.zeros((len(bend), 3))
    into, out = flat + [1.0, 0.0, 0.0], np.stack([np.cos(bend), np.sin(bend), 0.0 * bend], axis=1)
    curves = Curves(joining_quintic(-into, out, (into, out), (flat, flat)))
    rows = np.arange(len(bend))
    peak = np.zeros(len(bend))
    for t in np.linspace(0.0, 0.5, 33):  # symmetric
        _, slope, second = curves.at(rows, np.full(len(bend), t))
        peak = np.maximum(peak, np.linalg.norm(curvature(slope, second)[2], axis=1))
    return 1.001 * peak


def _nearest(curves, points):
    """(r,) m, the least distance of points (r, 3) from the curve of the same row: the best of 33 places, refined by Newton."""
    rows = np.arange(len(points))
    places = np.linspace(0.0, 1.0, 33)
    apart = np.array([np.linalg.norm(curves.at(rows, np.full(len(rows), t))[0] - points, axis=1) for t in places]).reshape(33, -1)
    t = places[np.argmin(apart, axis=0)]
    least = apart.min(axis=0)
    for _ in range(6):
        place, slope, bend = curves.at(rows, t)
        off = place - points
        rise = np.sum(slope * slope + off * bend, axis=1)
        t = np.clip(t - np.sum(off * slope, axis=1) / np.where(rise > 0.0, rise, np.inf), 0.0, 1.0)
        least = np.minimum(least, np.linalg.norm(curves.at(rows, t)[0] - points, axis=1))
    return least
