"""A course: the moves of a tool along exact geometry, with a speed but no times yet. Readers write a `Draft` and finish it."""

from dataclasses import dataclass, field

import numpy as np

from ..conventions import FARTHEST, MM, frozen
from ..errors import ReadError
from ..kernels.rotations import carry_frames, continuous_wxyz, wxyz_from_matrix
from ..runs import runs
from .curves import spline
from .shapes import ARC, CURVE, LINE, STILL, Arcs, Curves, Lines
from .turning import EVEN, SPLINED, Even, Splined, between

HALF_TURN = np.pi - 1e-6  # rad: beyond, the way round is open
CURVE_TURN = 0.5 * np.pi  # rad between two points of a curve: beyond, a spline of quaternions says little
LENGTHS = 0.7, 1.4
"""What the length of a splined quaternion may be; half way between orientations 90 deg apart an even one has cos 22.5 deg = 0.92."""
SAME_POINT = 1e-9  # m
SLOWEST, FASTEST = 1e-9, 1e4  # m/s; what lies outside is a mistake in the unit


@dataclass(frozen=True, eq=False)
class Course:
    """m moves, each from where the one before ends. SI units, part frame, read-only arrays.

    kind (m,): LINE, ARC, CURVE, STILL.  row (m,): the move's row in `lines`, `arcs` or `curves`.  length (m,) m, exact on lines and arcs.
    turn_kind, turn_row (m,): the same for how the tool turns: EVEN in `even`, SPLINED in `splined`.
    spin_free: only the tool axis is given, +Z of the frames.
    speed (m,) m/s, NaN where none is stated.  dwell (m,) s to stand.  air (m,): no process runs.
    zone (m,) m: how far from the corner after this move the tool may leave the path; 0 stops there; NaN is left to the choice for the whole path.
    line (m,): the line of `file` that each comes from.  first_line: that of the point where the course begins.  label: m texts.
    notes: sentences on what was assumed or mended while reading.
    """

    kind: np.ndarray
    row: np.ndarray
    length: np.ndarray
    lines: Lines
    arcs: Arcs
    curves: Curves
    turn_kind: np.ndarray
    turn_row: np.ndarray
    even: Even
    splined: Splined
    spin_free: bool
    speed: np.ndarray
    dwell: np.ndarray
    air: np.ndarray
    zone: np.ndarray
    line: np.ndarray
    first_line: int
    label: tuple
    file: str
    sha256: str
    notes: tuple

    @property
    def moves(self) -> int:
        return len(self.kind)

    def at(self, move, t):
        """Position, first and second derivative by the move's parameter, (N, 3) each, of moves (N,) at t (N,)."""
        return at(self.kind[move], self.row[move], (self.lines, self.arcs, self.curves), t)

    def quaternion(self, move, t) -> np.ndarray:
        """(N, 4)"""
        out = np.empty((len(move), 4))
        for kind, table in ((EVEN, self.even), (SPLINED, self.splined)):
            mine = self.turn_kind[move] == kind
            out[mine] = table.at(self.turn_row[move[mine]], t[mine])
        return out


def at(kind, row, tables, t):
    """Position, first and second derivative, (N, 3) each, where the move is of `kind` (N,) and stands in `row` (N,) of the tables of lines, arcs, curves."""
    out = np.empty((3, len(kind), 3))
    for kinds, table in zip(((LINE, STILL), (ARC,), (CURVE,)), tables, strict=True):
        mine = np.isin(kind, kinds)
        if mine.any():
            out[:, mine] = table.at(row[mine], t[mine])
    return out


@dataclass
class Draft:
    """Moves as a reader finds them, one call a move; `finish` makes the Course. Points are 3 numbers in m.

    Orientations are numbers of poses that the reader adds by `pose` (a unit quaternion, or a tool axis where spin_free).
    """

    file: str
    sha256: str
    spin_free: bool
    begin: tuple
    first_line: int
    first_pose: int = 0
    poses: list = field(default_factory=list)
    notes: list = field(default_factory=list)
    moves: list = field(default_factory=list)
    arcs: list = field(default_factory=list)
    middles: dict = field(default_factory=dict)

    def pose(self, values) -> int:
        """The number of an orientation; the same as before where nothing changed."""
        if not self.poses or self.poses[-1] != values:
            self.poses.append(values)
        return len(self.poses) - 1

    @property
    def here(self):
        """The point at which the next move begins."""
        return self.moves[-1][1] if self.moves else self.begin

    @property
    def pose_here(self):
        return self.moves[-1][2] if self.moves else self.first_pose

    def line_to(self, end, line, *, pose=None, speed=np.nan, air=False, zone=np.nan, label=""):
        """A straight line; a move to the same point turns the tool in place, or is nothing at all and left out."""
        pose = self.pose_here if pose is None else pose
        kind = LINE if _apart(end, self.here) > SAME_POINT else STILL
        if kind == LINE or pose != self.pose_here:
            self._add(kind, end if kind == LINE else self.here, pose, speed, air, zone, line, label)

    def arc_about(self, end, centre, normal, sweep, line, *, pose=None, speed=np.nan, air=False, zone=np.nan, label="", middle=None):
        """Anticlockwise by `sweep` rad about the unit `normal` through `centre`; middle: (share of the sweep, pose) that the tool also takes."""
        self.arcs.append((*self.here, *centre, *normal, sweep))
        if middle:
            self.middles[len(self.moves)] = middle
        self._add(ARC, end, self.pose_here if pose is None else pose, speed, air, zone, line, label)

    def curve_to(self, end, line, *, pose=None, speed=np.nan, air=False, zone=np.nan, label=""):
        """On along the smooth curve through the ends of all neighbouring moves of this kind and the point before them."""
        if _apart(end, self.here) <= SAME_POINT:
            raise ReadError(self.file, f"line {line}", "a point of a curve twice", "points that differ; to stand still, end the curve there")
        self._add(CURVE, end, self.pose_here if pose is None else pose, speed, air, zone, line, label)

    def dwell(self, seconds, line, *, air=False, label=""):
        if seconds > 0.0:
            self._add(STILL, self.here, self.pose_here, np.nan, air, 0.0, line, label, seconds)

    def _add(self, kind, end, pose, speed, air, zone, line, label, dwell=0.0):
        self.moves.append((kind, end, pose, speed, air, zone, line, label, dwell))

    def finish(self) -> Course:
        """Raises ReadError where the moves make no course."""
        if not self.moves:
            raise ReadError(self.file, "", "no move", "at least one move from a point to another")
        kind, end, pose, speed, air, zone, line, label, dwell = zip(*self.moves, strict=True)
        kind, line, pose = np.array(kind, dtype=np.uint8), np.array(line, dtype=np.int64), np.array([self.first_pose, *pose])
        points = np.array([self.begin, *end], dtype=np.float64)
        self._check_points(points, line)
        self._check_speeds(np.array(speed), line)
        arcs, curve = self._arc_table(points[1:][kind == ARC]), kind == CURVE
        bent = [(first, last + 1) for first, last in runs(curve).tolist()]
        curves = Curves(_padded([spline(points[a : b + 1], _chords(points[a : b + 1])) for a, b in bent]))
        row = np.arange(len(kind))
        row[kind == ARC], row[curve] = np.arange((kind == ARC).sum()), np.arange(curve.sum())
        lines = Lines(points[:-1], points[1:])
        length = np.where(kind == LINE, np.linalg.norm(points[1:] - points[:-1], axis=1), 0.0)
        length[kind == ARC] = arcs.length
        length[curve] = curve_lengths(curves)
        turned = self._turning(kind, pose, line, bent, points)
        numbers = (frozen(values, dtype) for values, dtype in ((speed, float), (dwell, float), (air, bool), (zone, float)))
        return Course(
            frozen(kind, np.uint8), frozen(row, np.int64), frozen(length), lines, arcs, curves, *turned, self.spin_free, *numbers,
            frozen(line, np.int64), int(self.first_line), label, str(self.file), self.sha256, tuple(self.notes),
        )  # fmt: skip

    def _check_points(self, points, line):
        bad = ~(np.abs(points) <= FARTHEST).all(axis=1)
        if bad.any():
            k = int(np.argmax(bad))
            where, far = self.first_line if k == 0 else line[k - 1], points[k][np.argmax(~(np.abs(points[k]) <= FARTHEST))]
            raise ReadError(self.file, f"line {where}", f"a tool centre point at {far:g} m", f"coordinates within {FARTHEST:g} m (check the unit)")

    def _check_speeds(self, speed, line):
        bad = ~np.isnan(speed) & ~((speed >= SLOWEST) & (speed <= FASTEST))
        if bad.any():
            k = int(np.argmax(bad))
            raise ReadError(self.file, f"line {line[k]}", f"a speed of {speed[k] / MM:g} mm/s", f"{SLOWEST / MM:g} to {FASTEST / MM:g} mm/s (check the unit)")

    def _arc_table(self, ends):
        given = np.array(self.arcs, dtype=np.float64).reshape(-1, 10)
        start, centre, normal, sweep = given[:, :3], given[:, 3:6], given[:, 6:9], given[:, 9]
        out = start - centre
        first = out - normal * np.sum(out * normal, axis=1, keepdims=True)  # the centre is taken at the height of the start
        second = np.cross(normal, first)
        reached = start - first + np.cos(sweep)[:, None] * first + np.sin(sweep)[:, None] * second
        return Arcs(start - first, first, second, sweep, ends - reached)

    def _turning(self, kind, pose, line, bent, points):
        """Kind and row of each move's turning, and the tables. bent: first move of each run of curves, and the one behind its last."""
        used = np.zeros(len(self.poses), dtype=bool)
        used[pose] = True
        used[[middle for _, middle in self.middles.values()]] = True
        numbers = np.cumsum(used) - 1
        values = np.array([value for value, on in zip(self.poses, used, strict=True) if on], dtype=np.float64)
        quaternions = continuous_wxyz(wxyz_from_matrix(carry_frames(values)) if self.spin_free else values)
        pose = numbers[pose]
        at_points = quaternions[pose]
        turn = between(at_points[:-1], at_points[1:])
        self._check_turns(kind, np.linalg.norm(turn, axis=1), line)
        splined, row = [], np.arange(len(kind))
        how = np.full(len(kind), EVEN, dtype=np.uint8)
        for a, b in bent:
            if turn[a:b].any():
                how[a:b], row[a:b] = SPLINED, np.arange(b - a) + sum(map(len, splined))
                splined.append(spline(continuous_wxyz(at_points[a : b + 1]), _chords(points[a : b + 1])))
        for move, (share, middle) in self.middles.items():
            through = continuous_wxyz(np.stack([at_points[move], quaternions[numbers[middle]], at_points[move + 1]]))
            self._check_turns(np.array([CURVE]), np.linalg.norm(between(through[:-1], through[1:]), axis=1).max(keepdims=True), line[move : move + 1])
            how[move], row[move] = SPLINED, sum(map(len, splined))
            splined.append(_parabola(through, share)[None])
        table = np.concatenate(splined) if splined else np.zeros((0, 4, 4))
        self._check_splined(table, line[how == SPLINED], row[how == SPLINED])
        return frozen(how, np.uint8), frozen(row, np.int64), Even(at_points[:-1], turn), Splined(table)

    def _check_turns(self, kind, angle, line):
        wide = angle > np.where(kind == CURVE, CURVE_TURN, HALF_TURN)
        if wide.any():
            k = int(np.argmax(wide))
            most = "at most 90 deg between points of a curve" if kind[k] == CURVE else "less than half a turn, so that the way round is clear"
            raise ReadError(self.file, f"line {line[k]}", f"a tool that turns by {np.degrees(angle[k]):.4g} deg in one move", f"{most}: give a point between")


    def _check_splined(self, table, line, row):
        """Refuse turning that swings out between its points: the length of the quaternion, before it is scaled to 1, shows it."""
        if len(row):
            lengths = np.array([np.linalg.norm(table[row].transpose(0, 2, 1) @ t ** np.arange(4.0), axis=1) for t in np.linspace(0.0, 1.0, 33)])
            wild = (lengths.min(axis=0) < LENGTHS[0]) | (lengths.max(axis=0) > LENGTHS[1])
            if wild.any():
                where = f"line {line[np.argmax(wild)]}"
                raise ReadError(self.file, where, "a tool whose turning swings out between the points of a curve", "points at distances that differ less, or less turning between close ones")


def _apart(a, b):
    return max(abs(a[0] - b[0]), abs(a[1] - b[1]), abs(a[2] - b[2]))


def _chords(points):
    return np.linalg.norm(np.diff(points, axis=0), axis=1)


def _padded(cubics):
    table = np.concatenate(cubics) if cubics else np.zeros((0, 4, 3))
    return np.concatenate([table, np.zeros((len(table), 2, 3))], axis=1)


PARTS = 16
"""Parts of a curve's interval over which its length is summed: then 8 nodes each are exact to the last digits."""


def curve_lengths(curves):
    """(r,) m, the whole length of each curve."""
    rows = np.arange(len(curves.coefficients))
    return sum((curves.length(rows, np.full(len(rows), k / PARTS), np.full(len(rows), (k + 1) / PARTS)) for k in range(PARTS)), np.zeros(len(rows)))


def _parabola(through, share):
    """(4, c) coefficients of the parabola that takes three values (3, c) at 0, `share` and 1."""
    start, middle, end = through
    square = (middle - start - share * (end - start)) / (share * (share - 1.0))
    return np.stack([start, end - start - square, square, np.zeros_like(start)])
