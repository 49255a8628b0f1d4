"""The task path: the tool poses over time, in the part frame.

`path_from` takes columns that lie in memory; `reading.timed_csv` takes a file. Both end in `assemble`, the one place where
the column names of a timed path get their meaning.
"""

import hashlib
import math
import mmap
import re
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from .conventions import FARTHEST, INCH, LATEST, SHORTEST_STEP, UNIT_TOLERANCE, owned
from .errors import ReadError, first_repeated, quoted
from .kernels import rotations

TIME = {"t_s": lambda v: v, "t_ms": lambda v: v / 1000.0}
LENGTH = {"mm": lambda v: v / 1000.0, "m": lambda v: v, "in": lambda v: v * INCH}
ANGLE = {"deg": np.deg2rad, "rad": lambda v: v}
QUATERNION = ("qw", "qx", "qy", "qz")
AXIS = ("i", "j", "k")
MEANING = frozenset(
    [*TIME, *QUATERNION, *AXIS, "process", "label"]
    + [f"{c}_{unit}" for c in "xyz" for unit in LENGTH]
    + [f"r{c}_{unit}" for c in "xyz" for unit in ANGLE]
)
"""Every column name that this module understands; all others are handed through."""

BLOCK = 1 << 13  # rows worked on at once: what is formed on the way stays in the processor's cache and is too small to be asked from the system anew

PIECE = 32 * BLOCK  # rows that are worth another thread

LONG = 4 << 20  # bytes; from here on NumPy asks for huge pages

ORIENTATIONS = "qw,qx,qy,qz or rx_deg,ry_deg,rz_deg (or _rad) or i,j,k"


@dataclass(frozen=True, eq=False)
class Path:
    """Tool poses over time in the part frame: N samples, SI units, read-only arrays.

    time (N,) s, strictly increasing.  position (N, 3) m, the tool centre point.
    rotation (N, 3, 3): columns are the tool axes in the part frame.
    spin_free: only the tool axis was given; `rotation` is then a frame with that +Z, carried along by the least turns.
    process (N,) bool: the process runs (all True where nothing was said).  label: N texts, '' where none.
    columns, cells: the source's header and, for each column, its N values as given (raw text for a file), to hand through.
    file, sha256: the source and the hash of its bytes.
    source_line (N,) int: for each sample the line of the file that it comes from; None where the source has no lines to name.
    made: plain sentences on how the samples came about (sampled, repaired, assumed); empty where they are the file's own.
    """

    time: np.ndarray
    position: np.ndarray
    rotation: np.ndarray
    spin_free: bool
    process: np.ndarray
    label: tuple
    columns: tuple
    cells: tuple
    file: str
    sha256: str
    source_line: np.ndarray | None = None
    made: tuple = ()

    @property
    def samples(self) -> int:
        return len(self.time)

    @property
    def duration(self) -> float:
        """s"""
        return float(self.time[-1] - self.time[0])

    @cached_property
    def distance(self) -> np.ndarray:
        """(N,) m, cumulated along the straight lines between the positions."""
        steps = np.linalg.norm(np.diff(self.position, axis=0), axis=1)
        return owned(np.concatenate([[0.0], np.cumsum(steps)]))

    @property
    def length(self) -> float:
        """m"""
        return float(self.distance[-1])


def path_from(columns, *, name: str = "arrays") -> Path:
    """A path from a mapping or a DataFrame whose keys are the column names of a timed path.

    >>> path = path_from({"t_s": [0, 1], "x_mm": [0, 50], "y_mm": [0, 0], "z_mm": [0, 0], "i": [0, 0], "j": [0, 0], "k": [-1, -1]})
    >>> path.duration, path.length, path.spin_free
    (1.0, 0.05, True)

    `name` stands where errors name a file. Raises ReadError.
    """
    header = tuple(str(key) for key in columns.keys())
    twice = first_repeated(header)
    if twice is not None:
        raise ReadError(name, f"column {twice}", "the column twice", "each column once")
    values = {str(key): _column_array(name, str(key), columns[key]) for key in columns.keys()}
    lengths = {len(array) for array in values.values()}
    if len(lengths) > 1:
        raise ReadError(name, "", f"columns of {min(lengths)} and {max(lengths)} values", "the same number of values in every column")
    return assemble(
        header, tuple(values.values()), lambda column: _numbers(name, column, values[column]),
        name=name, sha256=_hash(values), place=lambda row: f"row {row + 1}",
    )  # fmt: skip


def _column_array(name, column, values):
    try:
        array = np.array(values)
    except ValueError:
        raise ReadError(name, f"column {column}", "values of different shapes", "one number a sample") from None
    if array.ndim != 1:
        raise ReadError(name, f"column {column}", f"an array of shape {array.shape}", "one number a sample")
    array.flags.writeable = False
    return array


def _numbers(name, column, array):
    """(N,) float64; texts are read as Python reads them."""
    if array.dtype.kind in "biuf":
        return array.astype(np.float64)
    if array.dtype.kind in "OU":
        try:
            return array.astype(np.float64)
        except (TypeError, ValueError, OverflowError):
            row = next(row for row, value in enumerate(array) if not _is_number(value))
            mend = " (write a point in place of the decimal comma)" if _is_number(str(array[row]).replace(",", ".")) else ""
            raise ReadError(name, f"row {row + 1}, column {column}", _shown(array[row]), f"a number{mend}") from None
    raise ReadError(name, f"column {column}", f"values of type {array.dtype}", "numbers")


def _is_number(value):
    try:
        float(value)
    except (TypeError, ValueError, OverflowError):
        return False
    return True


def _shown(value):
    return quoted(value) if isinstance(value, str) else f"{quoted(value)[1:-1]} ({type(value).__name__})"


def _hash(values):
    digest = hashlib.sha256()
    for column, array in values.items():
        digest.update(repr((column, array.dtype.str)).encode())
        digest.update("\0".join(map(str, array)).encode() if array.dtype == object else array.tobytes())
    return digest.hexdigest()


def assemble(header, cells, numbers, *, name, sha256, place, label=None, lines=None, made=()) -> Path:
    """Build a Path from named columns.

    header, cells: the column names and, for each, its values as given.
    numbers(column) -> (N,) float64; raises ReadError.  place(row) -> words that name a row for the user.
    label: the texts of the column of that name, where they are at hand already.  lines, made: the path's `source_line` and `made`.
    """
    filling = Filling(header, name)
    values = [numbers(column) for column in filling.columns]
    rows = len(values[0])
    filling.make_room(rows)

    def put(start):
        filling.put(start, [array[start : start + PIECE] for array in values], lambda row: place(start + row))

    _each(put, range(0, rows, PIECE))
    return filling.path(rows, cells, sha256=sha256, place=place, label=label, lines=lines, made=made)


def _each(work, starts):
    """Do the work for each; much of it is shared by two threads."""
    if len(starts) < 2:
        for start in starts:
            work(start)
        return
    with ThreadPoolExecutor(2) as pool:
        list(pool.map(work, starts))


class Filling:
    """The arrays of a path while its rows are put in, block by block, in any order and by several threads.

    header, name: the source's column names, and its name in messages. Raises ReadError where these columns do not make a timed path.
    columns: those whose numbers are needed, in the order in which `put` takes them.
    What is formed on the way is as long as a block, so that a path of millions of samples needs little more memory than it keeps.
    """

    def __init__(self, header, name):
        self.header, self.name = tuple(header), name
        scaled = [self._given("time", TIME), *(self._given(f"the tool centre point's {c}", _units(c, LENGTH)) for c in "xyz")]
        self.form, turned = self._orientation()
        scaled += turned
        if "process" in self.header:
            scaled.append(("process", _as_given))
        self.columns, self._convert = zip(*scaled)
        self.time, self.position, self.rotation, self.process = np.empty(0), np.empty((0, 3)), np.empty((0, 3, 3)), np.empty(0, bool)

    def _given(self, title, units):
        """The column that gives one quantity, and its conversion; `units` maps column names to conversions."""
        given = [column for column in units if column in self.header]
        if len(given) > 1:
            raise ReadError(self.name, "header", f"both {given[0]} and {given[1]}", f"{title} once")
        if not given:
            raise ReadError(self.name, "header", self._missing(units), f"{title} as {_either(units)}")
        return given[0], units[given[0]]

    def _missing(self, wanted):
        """What to say was found where none of the `wanted` columns is there: a column that looks like a try at one."""
        stem = next(iter(wanted)).split("_")[0]
        names = {stem, "time"} if stem == "t" else {stem}
        near = [c for c in self.header if c not in MEANING and re.match("[a-z]*", c.lower())[0] in names]
        if near:
            return f"a column {quoted(near[0])}" + (" without a unit" if near[0].lower() in names else "")
        return f"the columns {quoted(', '.join(self.header))}"

    def _orientation(self):
        """The one form of orientation that the header has, and its columns with their conversions."""
        angles = [_units(f"r{c}", ANGLE) for c in "xyz"]
        groups = {"quaternion": [{c: _as_given} for c in QUATERNION], "angles": angles, "axis": [{c: _as_given} for c in AXIS]}
        there = {form: [any(c in self.header for c in names) for names in group] for form, group in groups.items()}
        whole = [form for form, found in there.items() if all(found)]
        if len(whole) > 1:
            columns = [c for form in whole for names in groups[form] for c in names if c in self.header]
            raise ReadError(self.name, "header", f"two forms of the orientation ({', '.join(columns)})", f"exactly one of {ORIENTATIONS}")
        if not whole:
            raise _no_orientation(self, groups, there)
        titles = [f"the turn about {c}" for c in "XYZ"] if whole == ["angles"] else [""] * 4
        return whole[0], [self._given(title, names) for title, names in zip(titles, groups[whole[0]])]

    def make_room(self, rows):
        """Room for so many rows; what was put in stays. Nobody may put rows in meanwhile."""
        for field in ("time", "position", "rotation", "process"):
            old = getattr(self, field)
            new = _room((rows, *old.shape[1:]), old.dtype)
            new[: min(rows, len(old))] = old[:rows]
            setattr(self, field, new)

    def put(self, start, values, place):
        """Check and convert rows: an array (M,) for each of `columns`, for the rows from `start` on; place(k) names row k of these. Raises ReadError."""
        for at in range(0, len(values[0]), BLOCK):
            self._put_block(start + at, [array[at : at + BLOCK] for array in values], lambda k: place(at + k))  # noqa: B023  used before the next turn

    def _put_block(self, start, values, place):
        rows = slice(start, start + len(values[0]))
        for column, block in zip(self.columns, values):
            _refuse(~np.isfinite(block), lambda k: ReadError(self.name, f"{place(k)}, column {column}", f"{block[k]}", "a finite number"))
        time, x, y, z, *turned = (convert(block) for convert, block in zip(self._convert, values))
        expected = f"times within {LATEST:g} s (check the unit of the column)"
        _refuse(~(np.abs(time) <= LATEST), lambda k: ReadError(self.name, place(k), f"time {time[k]:g} s", expected))
        self.time[rows] = time
        for c, block in enumerate((x, y, z)):
            expected = f"coordinates within {FARTHEST:g} m (check the unit of the column)"
            _refuse(~(np.abs(block) <= FARTHEST), lambda k: ReadError(self.name, place(k), f"a tool centre point at {block[k]:g} m", expected))
            self.position[rows, c] = block
        self._put_rotation(self.rotation[rows], turned, place)
        if "process" in self.header:
            process = turned[-1]
            _refuse((process != 0) & (process != 1), lambda k: ReadError(self.name, place(k), f"process = {process[k]:g}", "1 while the process runs or 0 on an air move"))
            self.process[rows] = process
        else:
            self.process[rows] = True

    def _put_rotation(self, out, turned, place):
        if self.form == "angles":
            out[:] = rotations.matrix_from_rpy(np.stack(turned[:3], axis=-1))
        elif self.form == "quaternion":
            rotations.matrix_from_wxyz(np.stack(self._unit(turned[:4], QUATERNION, "a quaternion", place)).T, out)
        else:  # the turns about the axes are chosen when all are there
            for c, block in enumerate(self._unit(turned[:3], AXIS, "a tool axis", place)):
                out[:, c, 2] = block

    def _unit(self, vectors, columns, title, place):
        """One block of vectors, an array a component, with length 1: what is within the tolerance of 1 is scaled to it."""
        with np.errstate(over="ignore"):
            length = np.sqrt(sum(value * value for value in vectors))
        off = ~(np.abs(length - 1.0) <= UNIT_TOLERANCE)
        _refuse(off, lambda k: ReadError(self.name, place(k), f"{title} of length {length[k]:.6g} ({', '.join(columns)})", "length 1"))
        return [value / length for value in vectors]

    def path(self, rows, cells, *, sha256, place, label=None, lines=None, made=()) -> Path:
        """The Path of the first `rows` rows, all of which were put in; the rest as in `assemble`. Raises ReadError."""
        if rows < 2:
            raise ReadError(self.name, "", f"{rows} sample" + "s" * (rows != 1), "at least 2 samples")
        time, position, rotation, process = (array[:rows] for array in (self.time, self.position, self.rotation, self.process))
        _check_increasing(self.name, time, place)
        if self.form == "axis":
            for start in range(0, rows, BLOCK):
                block = rotation[start : start + BLOCK]
                block[:] = _carried_on(block[:, :, 2].copy(), rotation[start - 1] if start else None)
        if label is None:
            label = map(str, cells[self.header.index("label")]) if "label" in self.header else ("",) * rows
        lines = None if lines is None else owned(lines)
        arrays = owned(time), owned(position), owned(rotation), self.form == "axis", owned(process)
        return Path(*arrays, tuple(label), self.header, tuple(cells), str(self.name), sha256, lines, tuple(made))


def _room(shape, dtype):
    """An array for values that are written once. A long one gets its memory in the system's small pages: NumPy asks for huge ones, and clearing
    those costs more than all that is written into them, twice so where two threads come to one at the same time."""
    size = math.prod(shape) * dtype.itemsize
    if size < LONG or not hasattr(mmap, "MAP_ANONYMOUS"):
        return np.empty(shape, dtype)
    return np.frombuffer(mmap.mmap(-1, size, flags=mmap.MAP_PRIVATE | mmap.MAP_ANONYMOUS), dtype).reshape(shape)


def _as_given(values):
    return values


def _refuse(bad, error):
    """Raise error(k) for the first row k of a block that is bad."""
    if bad.any():
        raise error(int(np.argmax(bad)))


def _check_increasing(name, time, place):
    for start in range(0, len(time), BLOCK):
        late = ~(np.diff(time[start : start + BLOCK + 1]) >= SHORTEST_STEP)
        if late.any():
            row = start + int(np.argmax(late)) + 1
            found = f"time {time[row]:.9g} s after {time[row - 1]:.9g} s in {place(row - 1)}"
            raise ReadError(name, place(row), found, "times that strictly increase (a recorded log is repaired when it is read as format recorded)")


def _units(name, units):
    return {f"{name}_{unit}": convert for unit, convert in units.items()}


def _either(names):
    *first, last = names
    return f"{', '.join(first)} or {last}" if first else last


def _carried_on(axes, before):
    """Frames on the axes (M, 3), each reached from the one before by the least turn; the first from the frame `before`.

    The least turn does not depend on the spin: frames carried from any first frame differ from these by one spin about their +Z.
    """
    if before is None:
        return rotations.carry_frames(axes)
    frames = rotations.carry_frames(np.concatenate([before[None, :, 2], axes]))
    c, s = frames[0, :, :2].T @ before[:, 0]
    size = np.hypot(c, s)
    c, s = c / size, s / size
    return frames[1:] @ np.array([[c, -s, 0.0], [s, c, 0.0], [0.0, 0.0, 1.0]])


def _no_orientation(source, groups, there):
    for form, found in there.items():
        if any(found):
            missing = [_either(names) for names, ok in zip(groups[form], found) if not ok]
            return ReadError(source.name, "header", f"an orientation without {', '.join(missing)}", f"all of one form: {ORIENTATIONS}")
    near = [c for c in source.header if c.lower() in ("rx", "ry", "rz", "roll", "pitch", "yaw", "a", "b", "c")]
    found = f"a column {quoted(near[0])} without a unit or a known meaning" if near else "no orientation"
    return ReadError(source.name, "header", found, ORIENTATIONS)
