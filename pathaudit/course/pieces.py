"""A course cut into pieces over which curvature and turning can be bounded by one number each: what timing and sampling work on."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from .corners import Rounded, parameter
from .moves import Course, at
from .shapes import ARC, CURVE, STILL, Curves, curvature
from .turning import BLENDED, EVEN, SPLINED, between

BLEND_PIECES = 8, 16  # of a rounding, at least and at most
TURN_OF_PIECE = 0.1  # rad of direction, or of the tool, in one piece of a curve
MOST_PIECES = 32  # of a curve's interval
LOOKS = np.linspace(0.0, 1.0, 5)
"""Where a piece is looked at for its bounds; half the largest step between neighbouring looks is added to the largest value."""


@dataclass(frozen=True, eq=False)
class Pieces:
    """p pieces in the order of the path, over the moves of `course` and the roundings of `rounded`.

    move (p,): whose source line, label and process they have.  kind, row, low, high (p,): the geometry and its range of the parameter.
    turn_kind, turn_row (p,), turn_low, turn_high (p,): the turning; BLENDED runs evenly in arc length, all else with the parameter.
    length (p,) m, of a turn in place rad.  dwell (p,) s.  curvature (p,) 1/m, turning (p,) rad/m, turning_change (p,) rad/m2: upper bounds.
    speed (p,) m/s, of a turn in place inf.  stops (p - 1,) bool: an exact stop between a piece and the next.
    """

    course: Course
    rounded: Rounded
    move: np.ndarray
    kind: np.ndarray
    row: np.ndarray
    low: np.ndarray
    high: np.ndarray
    turn_kind: np.ndarray
    turn_row: np.ndarray
    turn_low: np.ndarray
    turn_high: np.ndarray
    length: np.ndarray
    dwell: np.ndarray
    speed: np.ndarray
    stops: np.ndarray

    @cached_property
    def tables(self):
        course = self.course
        return course.lines, course.arcs, Curves(np.concatenate([course.curves.coefficients, self.rounded.curves.coefficients]))

    def parameter(self, piece, s) -> np.ndarray:
        """(N,) the geometry's parameter at arc length s (N,) into pieces (N,)."""
        low, high, length = self.low[piece], self.high[piece], self.length[piece]
        t = low + (high - low) * np.clip(s / np.where(length > 0.0, length, 1.0), 0.0, 1.0)
        bent = self.kind[piece] == CURVE
        t[bent] = self.tables[2].parameter(self.row[piece[bent]], low[bent], high[bent], length[bent], s[bent])
        return t

    def position(self, piece, s) -> np.ndarray:
        """(N, 3) m"""
        return at(self.kind[piece], self.row[piece], self.tables, self.parameter(piece, s))[0]

    def pose(self, piece, s):
        """Position (N, 3) m and unit quaternion (N, 4) at arc length s (N,) into pieces (N,)."""
        t = self.parameter(piece, s)
        return at(self.kind[piece], self.row[piece], self.tables, t)[0], self._quaternion(piece, s, t)

    def _quaternion(self, piece, s, t):
        blended = self.turn_kind[piece] == BLENDED
        share = np.clip(s / np.where(self.length[piece] > 0.0, self.length[piece], 1.0), 0.0, 1.0)
        t = np.where(blended, self.turn_low[piece] + share * (self.turn_high[piece] - self.turn_low[piece]), t)
        out = np.empty((len(piece), 4))
        for kind, table in ((EVEN, self.course.even), (SPLINED, self.course.splined), (BLENDED, self.rounded.turning)):
            mine = self.turn_kind[piece] == kind
            if mine.any():
                out[mine] = table.at(self.turn_row[piece[mine]], t[mine])
        return out

    @cached_property
    def curvature(self) -> np.ndarray:
        bound = np.zeros(len(self.kind))
        arc, bent = np.flatnonzero(self.kind == ARC), np.flatnonzero(self.kind == CURVE)
        arcs = self.course.arcs
        bound[arc] = (arcs.radius * arcs.sweep**2 / np.maximum(arcs.length, 1e-300) ** 2)[self.row[arc]]
        looked = [self._bend(bent, look) for look in LOOKS] if len(bent) else []
        bound[bent] = _bound(np.stack(looked)) if looked else 0.0
        return bound

    def _bend(self, piece, look):
        t = self.low[piece] + look * (self.high[piece] - self.low[piece])
        _, slope, bend = at(self.kind[piece], self.row[piece], self.tables, t)
        return np.linalg.norm(curvature(slope, bend)[2], axis=1)

    @cached_property
    def _turned(self):
        """Bounds of the turning, and of its change along the path, where it is not even."""
        turning, change = np.zeros(len(self.kind)), np.zeros(len(self.kind))
        even = self.turn_kind == EVEN
        whole = np.where(self.kind == STILL, 1.0, self.course.length[self.move])
        angle = np.linalg.norm(self.course.even.turn, axis=1)[np.where(even, self.turn_row, 0)]
        turning[even] = (angle / np.where(whole > 0.0, whole, 1.0))[even]
        uneven = np.flatnonzero(~even)
        if len(uneven):
            q, gaps = self._looked_at(uneven)
            step = between(q[:-1], q[1:]) / gaps[:, :, None]
            turning[uneven] = _bound(np.linalg.norm(step, axis=2))
            change[uneven] = _bound(np.linalg.norm(np.diff(step, axis=0), axis=2) / (0.5 * (gaps[1:] + gaps[:-1])))
        return turning, change

    def _looked_at(self, piece):
        """Quaternions (9, N, 4) at nine places along pieces (N,), and the distances (8, N) m between them."""
        shares, gaps = np.linspace(0.0, 1.0, 9), np.broadcast_to(self.length[piece] / 8.0, (8, len(piece))).copy()
        q = np.empty((9, len(piece), 4))
        for k, share in enumerate(shares):
            for kind, table in ((SPLINED, self.course.splined), (BLENDED, self.rounded.turning)):
                mine = np.flatnonzero(self.turn_kind[piece] == kind)
                low, high = self.turn_low[piece[mine]], self.turn_high[piece[mine]]
                q[k, mine] = table.at(self.turn_row[piece[mine]], low + share * (high - low))
        bent = np.flatnonzero((self.turn_kind[piece] == SPLINED) & (self.kind[piece] == CURVE))  # whose turning goes by the parameter
        low, span = self.low[piece[bent]], (self.high - self.low)[piece[bent]]
        for k in range(8):
            gaps[k, bent] = self.tables[2].length(self.row[piece[bent]], low + shares[k] * span, low + shares[k + 1] * span)
        return q, np.maximum(gaps, 1e-300)

    @property
    def turning(self) -> np.ndarray:
        return self._turned[0]

    @property
    def turning_change(self) -> np.ndarray:
        return self._turned[1]


def _bound(values):
    """An upper bound of smooth values (looks, N) from a few: the largest and half the largest step between neighbours."""
    return values.max(axis=0) + 0.5 * np.abs(np.diff(values, axis=0)).max(axis=0)


def cut(course: Course, rounded: Rounded, speed) -> Pieces:
    """The pieces of a course; speed (m,) m/s of each move."""
    parts = [_of_moves(course, rounded, speed), _of_roundings(course, rounded, speed)]
    columns = {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}
    order = np.lexsort((columns.pop("within"), columns.pop("place")))
    columns = {name: values[order] for name, values in columns.items()}
    stops = ~(rounded.smooth | np.isin(np.arange(course.moves - 1), rounded.at))
    last = np.flatnonzero(np.diff(columns["owner"]))  # between pieces of different moves or roundings: owner is 2 k of a move, 2 k + 1 of a rounding
    ends = np.zeros(len(order) - 1, dtype=bool)
    from_move = columns["owner"][last] % 2 == 0
    to_move = columns["owner"][last + 1] % 2 == 0
    straight = last[from_move & to_move]
    ends[straight] = stops[columns["owner"][straight] // 2]
    columns.pop("owner")
    return Pieces(course, rounded, stops=ends, **columns)


def _of_moves(course, rounded, speed):
    left = course.length - rounded.cut_start - rounded.cut_end
    move = np.arange(course.moves)
    low = parameter(course, move, rounded.cut_start)
    high = np.where(rounded.cut_end > 0.0, parameter(course, move, course.length - rounded.cut_end), 1.0)
    still = course.kind == STILL
    turn = np.linalg.norm(course.even.turn, axis=1)
    length = np.where(still, np.where(course.dwell > 0.0, 0.0, turn), np.maximum(left, 0.0))
    curve = course.kind == CURVE
    count = np.where(still | (length > 1e-12), 1, 0)
    count[curve & (count > 0)] = _curve_pieces(course, low, high)[curve & (count > 0)]
    owner = np.repeat(move, count)
    within = np.arange(len(owner)) - np.repeat(np.cumsum(count) - count, count)
    span = (high - low)[owner] / count[owner]
    a = low[owner] + within * span
    b = np.where(within + 1 == count[owner], high[owner], a + span)
    bent = np.flatnonzero(course.kind[owner] == CURVE)
    length = length[owner]
    length[bent] = course.curves.length(course.row[owner[bent]], a[bent], b[bent])
    return {
        "place": 2 * owner, "within": within, "owner": 2 * owner, "move": owner, "kind": course.kind[owner], "row": course.row[owner], "low": a, "high": b,
        "turn_kind": course.turn_kind[owner], "turn_row": course.turn_row[owner], "turn_low": a, "turn_high": b, "length": length,
        "dwell": course.dwell[owner], "speed": np.where(still, np.inf, speed)[owner],
    }  # fmt: skip


def _curve_pieces(course, low, high):
    """For each move how many pieces its part of a curve needs; other moves are not looked at."""
    move = np.flatnonzero(course.kind == CURVE)
    count = np.ones(course.moves, dtype=int)
    if len(move):
        looks = np.linspace(0.0, 1.0, 9)[:, None]
        places = low[move] + looks * (high - low)[move]
        tangents = np.stack([curvature(*course.at(move, t)[1:])[0] for t in places])
        bent = 2.0 * np.arcsin(np.minimum(0.5 * np.linalg.norm(np.diff(tangents, axis=0), axis=2), 1.0)).sum(axis=0)
        q = np.stack([course.quaternion(move, t) for t in places])
        turned = np.linalg.norm(between(q[:-1], q[1:]), axis=2).sum(axis=0)
        count[move] = np.clip(np.ceil(np.maximum(bent, turned) / TURN_OF_PIECE), 2, MOST_PIECES)
    return count


def _of_roundings(course, rounded, speed):
    count = 2 * np.ceil(0.5 * np.clip(rounded.bend[rounded.at] / TURN_OF_PIECE, *BLEND_PIECES)).astype(int)
    number = np.repeat(np.arange(len(count)), count)
    within, at = np.arange(len(number)) - np.repeat(np.cumsum(count) - count, count), rounded.at[number]
    a, b = within / count[number], (within + 1) / count[number]
    length = rounded.curves.length(number, a, b)
    done = np.cumsum(length)
    before = done - length - np.repeat((done - length)[np.cumsum(count) - count], count) if len(number) else done
    whole = rounded.length[number]
    turns = (course.turn_kind[at] != EVEN) | (rounded.turning.turn_in[number] != 0.0).any(axis=1) | (rounded.turning.turn_out[number] != 0.0).any(axis=1)
    slower = np.minimum(np.minimum(speed[at], speed[np.minimum(at + 1, course.moves - 1)]), rounded.speed[number])
    return {
        "place": 2 * at + 1, "within": within, "owner": 2 * at + 1, "move": at + (within >= count[number] // 2), "kind": np.full(len(at), CURVE, dtype=np.uint8),
        "row": len(course.curves.coefficients) + number, "low": a, "high": b, "turn_kind": np.where(turns, BLENDED, course.turn_kind[at]).astype(np.uint8),
        "turn_row": np.where(turns, number, course.turn_row[at]), "turn_low": np.where(turns, before / whole, 1.0), "turn_high": np.where(turns, (before + length) / whole, 1.0),
        "length": length, "dwell": np.zeros(len(at)), "speed": slower,
    }  # fmt: skip
