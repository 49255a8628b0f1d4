"""Points with a speed, from a CSV file: a header row, one point a line; how the tool gets to each point stands in its row.

Columns: the point and its orientation as in a timed path; `speed_mm_s` (`_mm_min`, `_m_min`, `_m_s`, `_in_min`); `move` (line, arc, curve);
`blend_mm` (`_m`, `_in`); `dwell_s`; `process`; `label`. An empty cell of orientation, speed or process goes on as in the row before.
"""

import csv
from dataclasses import dataclass

import numpy as np

from ..conventions import FARTHEST, INCH, MM, UNIT_TOLERANCE
from ..course import Course, Draft
from ..errors import ReadError, first_repeated, quoted
from ..kernels.rotations import matrix_from_rpy, wxyz_from_matrix
from ..taskpath import ANGLE, AXIS, LENGTH, ORIENTATIONS, QUATERNION, TIME
from .csv_table import holds_cells, is_number, not_a_number, split_header
from .geometry import axis_asked
from .sources import decode

EXPECTED = "points with a speed as CSV text"
SPEEDS = {"speed_mm_s": MM, "speed_m_s": 1.0, "speed_mm_min": MM / 60.0, "speed_m_min": 1.0 / 60.0, "speed_in_min": INCH / 60.0}
BLENDS = {"blend_mm": MM, "blend_m": 1.0, "blend_in": INCH}
MOVES = ("line", "arc", "curve")
PLACES = tuple(f"{c}_{unit}" for c in "xyz" for unit in LENGTH)
TURNS = tuple(f"r{c}_{unit}" for c in "xyz" for unit in ANGLE)
KNOWN = frozenset([*PLACES, *QUATERNION, *AXIS, *TURNS, *SPEEDS, *BLENDS, "move", "dwell_s", "process", "label"])
FLAT = 1e-6
"""The sine of the angle at the start of an arc, between its middle point and its end, below which the three lie in a line."""


def read_waypoints(data: bytes, name, sha256: str, options) -> Course:
    """The moves through the points. options.axis: the tool's +Z, where the file has no orientation. Raises ReadError."""
    return _Course(_Rows(name, decode(name, data, EXPECTED)), sha256, options.axis).course()


class _Rows:
    """Cells by column name, and numbers with NaN where a cell is empty."""

    def __init__(self, name, text):
        self.name = name
        used = [(number, line) for number, line in enumerate(text.split("\n"), 1) if holds_cells(line)]
        if not used:
            raise ReadError(name, "", "only comments", "a header row and points")
        self.header, delimiter = split_header(used[0][1], KNOWN)
        twice = first_repeated(filter(None, self.header))
        if twice:
            raise ReadError(name, "header", f"the column {quoted(twice)} twice", "each column once")
        self.line = [number for number, _ in used[1:]]
        rows = [self._split(number, line, delimiter) for number, line in used[1:]]
        self.cells = dict(zip(self.header, zip(*rows, strict=True), strict=True)) if rows else {column: () for column in self.header}

    def _split(self, number, line, delimiter):
        try:
            cells = next(csv.reader([line], delimiter=delimiter, strict=True))
        except csv.Error as error:
            raise ReadError(self.name, f"line {number}", f"quotes that cannot be read ({error})", "every quoted cell closed on its own line") from None
        if len(cells) != len(self.header):
            hint = "; a decimal comma splits a number in two" if delimiter == "," and len(cells) > len(self.header) else ""
            raise ReadError(self.name, f"line {number}", f"{len(cells)} cells", f"{len(self.header)} as in the header{hint}")
        return cells

    def refuse(self, row, found, expected):
        return ReadError(self.name, f"line {self.line[row]}", found, expected)

    def numbers(self, column, may_be_empty=True):
        """(n,) float64"""
        out = np.full(len(self.line), np.nan)
        for row, cell in enumerate(self.cells[column]):
            if cell.strip() or not may_be_empty:
                if not is_number(cell):
                    raise ReadError(self.name, f"line {self.line[row]}, column {column}", *not_a_number(cell))
                out[row] = float(cell)
                if not np.isfinite(out[row]):
                    raise ReadError(self.name, f"line {self.line[row]}, column {column}", f"{out[row]}", "a finite number")
        return out

    def one_of(self, columns, title):
        """The one of `columns` that is there, or None."""
        there = [column for column in columns if column in self.header]
        if len(there) > 1:
            raise ReadError(self.name, "header", f"both {there[0]} and {there[1]}", f"{title} once")
        return there[0] if there else None

    def positions(self):
        """(n, 3) m"""
        out = np.empty((len(self.line), 3))
        for k, c in enumerate("xyz"):
            column = self.one_of([f"{c}_{unit}" for unit in LENGTH], f"the tool centre point's {c}")
            if column is None:
                near = f"a column {quoted(c)} without a unit" if c in self.header else f"the columns {quoted(', '.join(self.header))}"
                raise ReadError(self.name, "header", near, f"the tool centre point's {c} as {c}_mm, {c}_m or {c}_in")
            out[:, k] = LENGTH[column.split("_")[1]](self.numbers(column, may_be_empty=False))
        far = ~(np.abs(out) <= FARTHEST)
        if far.any():
            row, k = np.argwhere(far)[0]
            raise self.refuse(row, f"a tool centre point at {out[row, k]:g} m", f"coordinates within {FARTHEST:g} m (check the unit of the column)")
        return out

    def scaled(self, units, title, least=0.0):
        """(n,) SI, NaN where the cell is empty or the column is missing; the values are at least `least`, or above 0 where that is None."""
        column = self.one_of(units, title)
        if column is None:
            return np.full(len(self.line), np.nan)
        values = self.numbers(column) * units[column]
        wrong = values <= 0.0 if least is None else values < least
        if wrong.any():
            row = int(np.argmax(wrong))
            raise self.refuse(row, f"{column} = {self.cells[column][row].strip()}", "a number above 0" if least is None else f"{least:g} or more")
        return values

    def poses(self):
        """(n, 4) quaternions or (n, 3) tool axes, rows of NaN where the cells are empty; None where the file has no orientation."""
        groups = [QUATERNION, tuple(self.one_of([f"r{c}_{unit}" for unit in ANGLE], f"the turn about {c.upper()}") for c in "xyz"), AXIS]
        whole = [group for group in groups if all(column in self.header for column in group)]
        if len(whole) > 1:
            raise ReadError(self.name, "header", "two forms of the orientation", f"exactly one of {ORIENTATIONS}")
        if not whole:
            part = [column for group in groups for column in group if column in self.header]
            if part:
                raise ReadError(self.name, "header", f"an orientation of {', '.join(part)} alone", f"all of one form: {ORIENTATIONS}")
            return None
        values = np.stack([self.numbers(column) for column in whole[0]], axis=1)
        given = ~np.isnan(values)
        torn = given.any(axis=1) & ~given.all(axis=1)
        if torn.any():
            raise self.refuse(int(np.argmax(torn)), "a part of an orientation", f"all of {', '.join(whole[0])}, or none to go on as in the row before")
        if whole[0] == groups[1]:
            angles = np.stack([ANGLE[column.split("_")[1]](values[:, k]) for k, column in enumerate(whole[0])], axis=1)
            out = np.full((len(values), 4), np.nan)
            out[given[:, 0]] = wxyz_from_matrix(matrix_from_rpy(angles[given[:, 0]]))
            return out
        with np.errstate(over="ignore"):
            length = np.linalg.norm(values, axis=1)
        bad = given[:, 0] & ~(np.abs(length - 1.0) <= UNIT_TOLERANCE)
        if bad.any():
            row, what = int(np.argmax(bad)), "a tool axis" if whole[0] == AXIS else "a quaternion"
            raise self.refuse(row, f"{what} of length {length[row]:.6g} ({', '.join(whole[0])})", "length 1")
        return values / length[:, None]


@dataclass(frozen=True)
class _Row:
    """What one row asks for. speed m/s, NaN where none is stated; blend m, NaN where the cell is empty."""

    number: int
    place: tuple
    pose: tuple | None
    move: str
    speed: float
    blend: float
    dwell: float
    air: bool
    label: str


class _Course:
    def __init__(self, rows, sha256, axis):
        self.rows, self.sha256, self.axis, self.name = rows, sha256, axis, rows.name
        if set(TIME) & set(rows.header):
            raise ReadError(self.name, "header", "a column of times", "points without times, or format timed (--format timed)")
        self.poses = rows.poses()
        if self.poses is not None and axis is not None:
            raise ReadError(self.name, "header", "an orientation, and the choice axis (--axis) as well", "one of them")
        self.list = list(self._list())

    def _list(self):
        rows = self.rows
        if len(rows.line) < 2:
            raise ReadError(self.name, "", f"{len(rows.line)} point" + "s" * (len(rows.line) != 1), "at least 2 points")
        places, speed = rows.positions(), _carried(rows.scaled(SPEEDS, "the speed", None))
        blend, dwell = rows.scaled(BLENDS, "the blend radius"), np.nan_to_num(rows.scaled({"dwell_s": 1.0}, "the dwell"))
        if "speed" in rows.header:
            raise ReadError(self.name, "header", "a column 'speed' without a unit", f"one of {', '.join(SPEEDS)}")
        process = rows.numbers("process") if "process" in rows.header else np.ones(len(rows.line))
        wrong = ~np.isnan(process) & (process != 0.0) & (process != 1.0)
        if wrong.any():
            row = int(np.argmax(wrong))
            raise rows.refuse(row, f"process = {process[row]:g}", "1 while the process runs or 0 on an air move")
        process = np.nan_to_num(_carried(process), nan=1.0)
        moves, labels = (rows.cells.get(column, ("",) * len(rows.line)) for column in ("move", "label"))
        for k, number in enumerate(rows.line):
            move = moves[k].strip() or "line"
            if move not in MOVES:
                raise rows.refuse(k, f"move {quoted(move)}", f"one of {', '.join(MOVES)}")
            pose = None if self.poses is None or np.isnan(self.poses[k, 0]) else tuple(self.poses[k].tolist())
            yield _Row(number, tuple(places[k].tolist()), pose, move, float(speed[k]), float(blend[k]), float(dwell[k]), process[k] == 0.0, labels[k])

    def course(self):
        """Raises ReadError."""
        first = self.list[0]
        if first.move != "line" or first.blend > 0.0:
            raise self.rows.refuse(0, "a move or a blend in the first row", "both empty there: it is the point at which the path begins")
        axes = self.poses is None or self.poses.shape[1] == 3
        draft = Draft(self.name, self.sha256, axes, first.place, first.number)
        draft.pose(self._first_pose(first))
        draft.dwell(first.dwell, first.number, air=first.air, label=first.label)
        k = 1
        while k < len(self.list):
            k += self._arc(draft, k) if self.list[k].move == "arc" else self._step(draft, k)
        draft.notes += self._notes()
        return draft.finish()

    def _first_pose(self, first):
        if self.poses is None:
            if self.axis is None:
                raise ReadError(self.name, "header", "no orientation", f"{ORIENTATIONS}, or axis (--axis i,j,k): the tool's +Z, towards the work, in the part frame")
            return tuple(self.axis)
        if first.pose is None:
            raise self.rows.refuse(0, "no orientation in the first row", "all its cells filled")
        return first.pose

    def _step(self, draft, k):
        """The line or the piece of a curve that leads to row k; returns the rows used."""
        row = self.list[k]
        pose = draft.pose_here if row.pose is None else draft.pose(row.pose)
        if row.move == "curve":
            if row.blend > 0.0 and k + 1 < len(self.list) and self.list[k + 1].move == "curve" and not row.dwell:
                raise self.rows.refuse(k, "a blend inside a curve", "an empty cell: a curve has no corner there")
            draft.curve_to(row.place, row.number, pose=pose, speed=row.speed, air=row.air, zone=row.blend, label=row.label)
        else:
            draft.line_to(row.place, row.number, pose=pose, speed=row.speed, air=row.air, zone=row.blend, label=row.label)
        draft.dwell(row.dwell, row.number, air=row.air, label=row.label)
        return 1

    def _arc(self, draft, k):
        """The arc through row k to the row after it."""
        if k + 1 == len(self.list) or self.list[k + 1].move != "arc":
            raise self.rows.refuse(k, "one row of an arc", "two rows with move arc: its middle point, then its end")
        middle, end = self.list[k], self.list[k + 1]
        if middle.dwell or middle.blend > 0.0:
            raise self.rows.refuse(k, "a dwell or a blend at the middle point of an arc", "both empty there")
        if middle.air != end.air or not (middle.speed == end.speed or np.isnan([middle.speed, end.speed]).all()):
            raise self.rows.refuse(k + 1, "another speed or process than at the arc's middle point", "the same in both rows of an arc")
        centre, normal, sweep, share = self._circle(k, np.array(draft.here), np.array(middle.place), np.array(end.place))
        start = draft.pose_here
        through = None if middle.pose is None else draft.pose(middle.pose)
        pose = draft.pose(end.pose) if end.pose is not None else start if through is None else through
        through = None if through is None or through == start == pose else (share, through)
        draft.arc_about(end.place, tuple(centre), tuple(normal), sweep, end.number, pose=pose, speed=end.speed, air=end.air, zone=end.blend,
                        label=end.label, middle=through)  # fmt: skip
        draft.dwell(end.dwell, end.number, air=end.air, label=end.label)
        return 2

    def _circle(self, k, start, middle, end):
        """Centre, normal, sweep and the middle point's share of it. The centre is (|a|^2 b - |b|^2 a) x n / (2 n.n) from the start, n = a x b."""
        a, b = middle - start, end - start
        normal = np.cross(a, b)
        size = np.linalg.norm(normal)
        if np.linalg.norm(b) <= 1e-9 * max(np.linalg.norm(a), 1e-9):
            raise self.rows.refuse(k + 1, "an arc that ends where it begins", "two arcs for a full circle")
        if not size > FLAT * np.linalg.norm(a) * np.linalg.norm(b):
            raise self.rows.refuse(k, "a middle point in line with the ends of its arc", "a point beside that line, or move line")
        centre = start + np.cross((a @ a) * b - (b @ b) * a, normal) / (2.0 * size**2)
        normal = normal / size
        out = start - centre

        def angle(point):
            turned = point - centre
            return float(np.arctan2(normal @ np.cross(out, turned), out @ turned)) % (2.0 * np.pi)

        sweep = angle(end)
        return centre, normal, sweep, angle(middle) / sweep

    def _notes(self):
        unused = [column for column in self.rows.header if column not in KNOWN]
        if unused:
            yield f"Columns that points have no use for were left out: {', '.join(unused)}."
        if self.poses is None:
            yield axis_asked(self.axis)


def _carried(values):
    """Each NaN as the value before it; those at the start stay."""
    known = np.maximum.accumulate(np.where(np.isnan(values), -1, np.arange(len(values))))
    return np.where(known < 0, np.nan, values[np.maximum(known, 0)])
